//! `rig`: the simulated bench on pseudo-terminals, with its profiles and its log in a folder.

use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::mpsc::{Receiver, RecvTimeoutError};
use std::time::Duration;

use super::output::{make_folder, write_whole};
use super::{ExitStatus, WorkError};
use crate::clock::{Monotonic, Ticks as _};
use crate::entry::{Id, Instrument};
use crate::quantity::text::{span, value};
use crate::quantity::{GaugePressure, Span};
use crate::record::{RegisterEntry, write_register};
use crate::report::rig_words::{RigInstrument, RigShown, SIMULATED};
use crate::rig::{Command, Fault, Rig, RigError, Script, Settings};

/// How commands are written.
pub const COMMANDS: &str = Command::KNOWN;
/// The setup of a session with the rig's cells, in a folder of its own: the profiles beside it are all for the register.
const COUCH: &str = "couch/session.toml";
/// What stands in it. The cells of the rig give 48 mV a bar; a dry calibration at the standard atmosphere in air with
/// 20.9476 % of oxygen (U.S. Standard Atmosphere, 1976, table 3) and in oxygen.
const COUCH_SETUP: &str = r#"record = "session"
place = "couch"
loop = "held"

[cells]
gain = "4 %"
air = ["10.188 mV", "10.188 mV", "10.188 mV"]
oxygen = ["48.636 mV", "48.636 mV", "48.636 mV"]
calibrated_at = { barometer = "1013.25 hPa", temperature = "20 °C", humidity = "0 %", oxygen = "100 %" }
"#;
/// The log in the folder.
const LOG: &str = "sent.jsonl";
/// Seconds between two looks at what was typed, at the clock, and at trouble.
const LOOK_S: f64 = 0.05;

/// A rig to be started.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RigRequest {
    /// The folder that is filled.
    pub into: PathBuf,
    /// Seed of everything that is drawn.
    pub seed: u64,
    /// Faults from the beginning, as they are commanded, without the word `fault`.
    pub faults: Vec<String>,
    /// What is set at the regulator and for how long, as text.
    pub script: Option<String>,
}

/// A rig at work.
#[derive(Debug)]
pub struct Running {
    served: Server,
    folder: PathBuf,
    seed: u64,
}

/// What happens while a rig runs, to be told as it happens.
#[derive(Debug)]
pub enum RigEvent<'a> {
    /// A command was done.
    Done(&'a str),
    /// One was not.
    NotDone(WorkError),
    /// The instruments and ports were asked for.
    Listed(RigShown),
    /// The commands were asked for.
    Asked,
    /// Something in the rig itself failed; it goes on.
    Trouble(WorkError),
}

/// Why a rig ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RigEnd {
    /// Somebody interrupted it.
    Interrupted,
    /// It was told to quit.
    Quit,
    /// Its time was up.
    TimeUp,
    /// No more commands can come.
    NoMoreCommands,
    /// Nobody hears its answers any more.
    Unheard,
}

/// Who gives commands, and when it is over.
#[derive(Debug)]
pub struct Attended<'a> {
    /// Lines that are typed; hung up at the end of them.
    pub commands: &'a Receiver<String>,
    /// Whether there is anybody who could give one: in the background there is not, and the end of the lines means nothing.
    pub anybody: bool,
    /// Set when somebody interrupts.
    pub interrupted: &'a AtomicBool,
    /// How long it runs; without it until it is told to end.
    pub lasts: Option<Span>,
}

/// Starts a rig: everything asked for is read before the first file is written.
///
/// # Errors
/// A fault or script that is none; a folder that cannot be written, holds a file of somebody else's by one of the rig's
/// names, or is in use by another rig; no pseudo-terminals.
pub fn start(request: &RigRequest) -> Result<Running, WorkError> {
    let mut settings = Settings::standard(request.seed)?;
    if let Some(text) = &request.script {
        settings.bench.script = script(text)?;
    }
    let mut rig = Rig::new(settings)?;
    for text in &request.faults {
        let command = command(&format!("fault {text}"))?;
        rig.command(command)?;
    }
    if cfg!(not(unix)) {
        return Err(WorkError::NoPseudoTerminals);
    }
    // The ports are names in this folder, which have to hold wherever a profile is used.
    let folder = request.into.clone();
    let at = std::path::absolute(&folder).unwrap_or_else(|_| folder.clone());
    may_be_written(&at, &rig)?;
    make_folder(&folder)?;
    rig.log_mut().write_to(&folder.join(LOG))?;
    let running = Running { served: serve(rig, &at)?, folder, seed: request.seed };
    for one in running.shown().instruments {
        let text = write_register(&RegisterEntry::Instrument(one.instrument));
        write_whole(Path::new(&one.profile), format!("{SIMULATED}{text}").as_bytes())?;
    }
    let couch = running.folder.join(COUCH);
    make_folder(couch.parent().unwrap_or(&running.folder))?;
    write_whole(&couch, format!("{SIMULATED}{COUCH_SETUP}").as_bytes())?;
    Ok(running)
}

impl Running {
    /// The rig as it is now.
    #[must_use]
    pub fn shown(&self) -> RigShown {
        let plugged = self.served.ports();
        let instruments = self.served.profiles().into_iter().map(|instrument| {
            let is = |(id, found): &(Id, Option<String>)| *id == instrument.id && found.is_some();
            RigInstrument {
                plugged: plugged.iter().any(is),
                profile: profile_of(&self.folder, &instrument).display().to_string(),
                instrument,
            }
        });
        RigShown {
            folder: self.folder.display().to_string(),
            log: self.folder.join(LOG).display().to_string(),
            seed: self.seed,
            instruments: instruments.collect(),
        }
    }

    /// Does what is typed until it is over. `tell` says whether anybody still hears.
    pub fn attend(&self, by: &Attended<'_>, tell: &mut dyn FnMut(RigEvent<'_>) -> bool) -> RigEnd {
        let clock = Monotonic::start();
        let mut open = true;
        loop {
            let left_s = by.lasts.map_or(f64::INFINITY, |lasts| lasts.as_s() - clock.now_s());
            if by.interrupted.load(Ordering::Relaxed) {
                return RigEnd::Interrupted;
            }
            if left_s <= 0.0 {
                return RigEnd::TimeUp;
            }
            for trouble in self.troubles() {
                if !tell(RigEvent::Trouble(trouble)) {
                    return RigEnd::Unheard;
                }
            }
            let look_s = LOOK_S.min(left_s);
            if !open {
                clock.sleep(look_s);
                continue;
            }
            match by.commands.recv_timeout(Duration::from_secs_f64(look_s)) {
                Ok(line) => {
                    if let Some(end) = self.obey(&line, tell) {
                        return end;
                    }
                }
                Err(RecvTimeoutError::Timeout) => {}
                Err(RecvTimeoutError::Disconnected) if by.anybody && by.lasts.is_none() => {
                    return RigEnd::NoMoreCommands;
                }
                Err(RecvTimeoutError::Disconnected) => open = false,
            }
        }
    }

    /// Does what a line says; an end when it says so, or when nobody hears the answer.
    fn obey(&self, line: &str, tell: &mut dyn FnMut(RigEvent<'_>) -> bool) -> Option<RigEnd> {
        let line = line.trim();
        let event = match line {
            "" => return None,
            remark if remark.starts_with('#') => return None,
            "quit" | "exit" => return Some(RigEnd::Quit),
            "list" => RigEvent::Listed(self.shown()),
            "help" | "?" => RigEvent::Asked,
            line => match command(line).and_then(|command| Ok(self.served.command(command)?)) {
                Ok(()) => RigEvent::Done(line),
                Err(error) => RigEvent::NotDone(error),
            },
        };
        (!tell(event)).then_some(RigEnd::Unheard)
    }

    fn troubles(&self) -> Vec<WorkError> {
        let of_log = self.served.rig().log_mut().take_trouble();
        [self.served.take_trouble(), of_log].into_iter().flatten().map(WorkError::from).collect()
    }

    /// Stops it: its ports end, its log is whole.
    ///
    /// # Errors
    /// When it had stopped by itself.
    pub fn stop(self) -> Result<(), WorkError> {
        self.served.stop()?;
        Ok(())
    }
}

/// The status of a rig that ended, with or without trouble on the way.
#[must_use]
pub const fn status_of(trouble: bool) -> ExitStatus {
    if trouble { ExitStatus::Failed } else { ExitStatus::Done }
}

/// A command that a rig for other programs can obey.
fn command(line: &str) -> Result<Command, WorkError> {
    let command = Command::parse(line)?;
    if let Command::Fault { device, fault: fault @ Fault::ClockJump(_), .. } = command {
        let why = "it would have to set the clock of the program that listens, which is another";
        return Err(
            RigError::NotItsFault { device: Id::new(&device).map_err(RigError::from)?, fault, why }.into()
        );
    }
    Ok(command)
}

/// "4 bar 45 s, 5 bar 45 s".
fn script(text: &str) -> Result<Script, WorkError> {
    let steps: Vec<(GaugePressure, f64)> = text.split(',').map(step).collect::<Result<_, _>>()?;
    Ok(Script(steps))
}

fn step(text: &str) -> Result<(GaugePressure, f64), WorkError> {
    let words: Vec<&str> = text.split_whitespace().collect();
    // "4 bar 45 s" and "4bar 45s": where the pressure ends, its unit tells.
    let parted = (1..words.len()).find_map(|at| {
        let (ip, hold) = words.split_at(at);
        let ip = value::<GaugePressure>(&ip.join(" ")).ok()?;
        let hold_s = span(&hold.join(" ")).ok()?.as_s();
        (ip.as_bar() >= 0.0 && hold_s > 0.0).then_some((ip, hold_s))
    });
    parted.ok_or_else(|| WorkError::RigScript(text.trim().to_owned()))
}

fn profile_of(folder: &Path, instrument: &Instrument) -> PathBuf {
    folder.join(format!("{}.toml", instrument.id))
}

/// Whether the folder has room for the rig's files without taking anybody else's place.
fn may_be_written(folder: &Path, rig: &Rig) -> Result<(), WorkError> {
    let refuse = |path: PathBuf, why: &str| Err(WorkError::NotReplaced { path, why: why.to_owned() });
    let mut ours = false;
    for instrument in rig.profiles() {
        let path = profile_of(folder, &instrument);
        if path.exists() {
            let begins = std::fs::read(&path).unwrap_or_default().starts_with(SIMULATED.as_bytes());
            if !begins {
                return refuse(path, "is a file that no rig wrote, and stays as it is");
            }
            ours = true;
        }
    }
    let couch = folder.join(COUCH);
    if couch.exists() && !std::fs::read(&couch).unwrap_or_default().starts_with(SIMULATED.as_bytes()) {
        return refuse(couch, "is a file that no rig wrote, and stays as it is");
    }
    let log = folder.join(LOG);
    if log.exists() && !ours {
        return refuse(log, "is a file that no rig wrote, and stays as it is");
    }
    for port in (0..rig.ports()).filter_map(|port| rig.port_name(port)) {
        let path = folder.join(port);
        // The link of a rig that has ended leads nowhere.
        if path.exists() {
            return refuse(path, "is there, of another rig or of somebody else");
        }
    }
    Ok(())
}

#[cfg(unix)]
type Server = crate::rig::Served;

#[cfg(unix)]
fn serve(rig: Rig, folder: &Path) -> Result<Server, WorkError> {
    Ok(rig.serve(Arc::new(crate::rig::RealTime::new()), Some(folder))?)
}

#[cfg(not(unix))]
use elsewhere::{Server, serve};

/// What stands in the place of a served rig where there are no pseudo-terminals: nothing can be one.
#[cfg(not(unix))]
mod elsewhere {
    use super::{Arc, Command, Id, Instrument, Path, Rig, RigError, WorkError};

    #[derive(Debug)]
    pub(super) enum Server {}

    pub(super) fn serve(_: Rig, _: &Path) -> Result<Server, WorkError> {
        Err(WorkError::NoPseudoTerminals)
    }

    impl Server {
        pub(super) fn ports(&self) -> Vec<(Id, Option<String>)> {
            match *self {}
        }

        pub(super) fn profiles(&self) -> Vec<Instrument> {
            match *self {}
        }

        pub(super) fn rig(&self) -> Box<Rig> {
            match *self {}
        }

        pub(super) fn command(&self, _: Command) -> Result<(), RigError> {
            match *self {}
        }

        pub(super) fn take_trouble(&self) -> Option<RigError> {
            match *self {}
        }

        pub(super) fn stop(self) -> Result<Arc<()>, RigError> {
            match self {}
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_script_is_pressures_and_times() {
        let read = script("4 bar 45 s, 72.5psi 1 min,0 bar 00:00:30").unwrap();
        let steps: Vec<(f64, f64)> = read.0.iter().map(|(ip, s)| (ip.as_bar(), *s)).collect();
        assert_eq!(steps.len(), 3);
        // 72.5 psi are 4.9987 bar: 1 psi is 6894.757 Pa.
        assert!((steps[0].0 - 4.0).abs() < 1e-9 && (steps[1].0 - 4.9987).abs() < 1e-4, "{steps:?}");
        assert_eq!(steps.iter().map(|(_, s)| *s).collect::<Vec<_>>(), [45.0, 60.0, 30.0]);
        for wrong in
            ["", "4 bar", "45 s", "4 45", "4 bar 0 s", "-0.5 bar 5 s", "4 bar 5 s,", "4 L 5 s", "4 bar 5 s 6"]
        {
            assert!(matches!(script(wrong), Err(WorkError::RigScript(_))), "{wrong}");
        }
    }

    #[test]
    fn a_clock_of_another_program_is_not_set() {
        let says = command("fault rig-flow clock-jump 5").unwrap_err().to_string();
        assert!(says.contains("clock-jump") && says.contains("another"), "{says}");
        assert!(command("fault rig-flow silence for 5 s").is_ok());
    }
}
