//! `rig` on the terminal: the list of its ports, then an answer to each line that is typed.

use std::io::{self, BufRead as _, Read as _, Write as _};
use std::sync::mpsc;

use super::arguments::{Global, Rig};
use super::{Ended, interrupt, note, say, with_causes};
use crate::report::rig_words as words;
use crate::work::ExitStatus;
use crate::work::rig::{self, Attended, COMMANDS, RigEnd, RigEvent, RigRequest};

/// Longest line of a command, bytes; what is longer is none.
const LONGEST: u64 = 4096;

pub(super) fn rig(arguments: &Rig, global: &Global) -> Result<ExitStatus, Ended> {
    // Before anything is there that an interruption could leave behind.
    let interrupted = interrupt::flag();
    let running = rig::start(&RigRequest {
        into: arguments.into.clone(),
        seed: arguments.seed,
        faults: arguments.fault.clone(),
        script: arguments.script.clone(),
    })?;
    let begun = running.shown();
    let text = if global.json { words::json(&begun) } else { words::begun(&begun, COMMANDS) };
    say(&text, ExitStatus::Done)?;
    let (send, commands) = mpsc::channel();
    // It ends with the program: nobody can take a thread out of the reading of a line.
    std::thread::spawn(move || {
        while let Some(line) = next_line() {
            if send.send(line).is_err() {
                break;
            }
        }
    });
    let by = Attended {
        commands: &commands,
        anybody: !nowhere(),
        interrupted: &interrupted,
        lasts: arguments.lasts,
    };
    let mut trouble = false;
    let end = running.attend(&by, &mut |event| {
        let text = match event {
            RigEvent::Done(command) => words::done(command),
            RigEvent::NotDone(error) => words::not_done(&with_causes(&error)),
            RigEvent::Listed(rig) => words::list(&rig),
            RigEvent::Asked => words::known(COMMANDS),
            RigEvent::Trouble(error) => {
                trouble = true;
                note(&format!("ebbline: {}", with_causes(&error)));
                return true;
            }
        };
        answer(&text, global)
    });
    running.stop()?;
    let why = match end {
        RigEnd::Interrupted => "interrupted",
        RigEnd::Quit => "quit",
        RigEnd::TimeUp => "its time is up",
        RigEnd::NoMoreCommands => "no more commands can come",
        RigEnd::Unheard => "nobody hears it any more",
    };
    note(words::ended(&begun, why).trim_end());
    Ok(rig::status_of(trouble))
}

/// An answer on stdout, or, where a document stands alone there, on stderr; whether anybody is there to hear it.
fn answer(text: &str, global: &Global) -> bool {
    let written = if global.json {
        io::stderr().write_all(text.as_bytes())
    } else {
        let mut stdout = io::stdout().lock();
        stdout.write_all(text.as_bytes()).and_then(|()| stdout.flush())
    };
    written.is_ok()
}

/// The next line that is typed; none at the end.
fn next_line() -> Option<String> {
    let mut line = Vec::new();
    let mut stdin = io::stdin().lock();
    let read = stdin.by_ref().take(LONGEST).read_until(b'\n', &mut line).ok()?;
    (read > 0).then(|| String::from_utf8_lossy(&line).into_owned())
}

/// Whether the input comes from nowhere: a null device, as of a program in the background.
fn nowhere() -> bool {
    #[cfg(unix)]
    {
        use std::fs::File;
        use std::io::IsTerminal as _;
        use std::os::fd::AsFd as _;
        use std::os::unix::fs::FileTypeExt as _;
        let stdin = io::stdin();
        let device = stdin.as_fd().try_clone_to_owned().map(File::from).and_then(|file| file.metadata());
        !stdin.is_terminal() && device.is_ok_and(|device| device.file_type().is_char_device())
    }
    #[cfg(not(unix))]
    false
}
