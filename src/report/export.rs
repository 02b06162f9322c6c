//! What an export says of itself.

use std::fmt::Write as _;

use serde_json::json;

use super::json_text;
use super::layout::{counted, wrapped};
use crate::entry::{RunNumber, SessionLeftOut, SessionNumber};

/// How a run or a session was written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Form {
    /// As the files it came from, to the byte.
    Original,
    /// The same, with points that were left out since at the end of the run file.
    LeftOutAdded,
    /// Written as it stands in the book.
    Written,
    /// The same, but a file cannot say all of it.
    Incomplete,
}

impl Form {
    /// The word for it.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Original => "original",
            Self::LeftOutAdded => "original, points left out added",
            Self::Written => "written",
            Self::Incomplete => "written, incomplete",
        }
    }
}

/// What was exported.
#[derive(Debug, Clone, PartialEq)]
pub struct Exported {
    /// The folder.
    pub folder: String,
    /// Its runs: number, run file, how it was written.
    pub runs: Vec<(RunNumber, String, Form)>,
    /// Its sessions: number, session file, how it was written.
    pub sessions: Vec<(SessionNumber, String, Form)>,
    /// Sessions that stayed behind because divers were not asked for.
    pub sessions_behind: u64,
    /// What was left out of its sessions.
    pub left_out: Vec<LeftOut>,
    /// How many entries of each register.
    pub entries: Vec<(&'static str, usize)>,
    /// How many judgements.
    pub judgements: usize,
    /// How many certificates.
    pub certificates: usize,
    /// Whether divers are in it.
    pub with_divers: bool,
    /// Whether each thousand of runs has a folder of its own.
    pub blocks: bool,
    /// The same of sessions.
    pub session_blocks: bool,
    /// What is to be said of single runs and entries.
    pub notes: Vec<String>,
}

impl Exported {
    fn count(&self, form: Form) -> usize {
        self.runs.iter().filter(|(_, _, of)| *of == form).count()
    }

    fn sessions_of(&self, form: Form) -> usize {
        self.sessions.iter().filter(|(_, _, of)| *of == form).count()
    }
}

/// What somebody left out of a session, which no session file can say.
#[derive(Debug, Clone, PartialEq)]
pub struct LeftOut {
    /// The session.
    pub session: SessionNumber,
    /// Its number in a new book made of the export.
    pub anew: SessionNumber,
    /// What was left out.
    pub what: SessionLeftOut,
}

impl LeftOut {
    /// The command that leaves it out again of a new book. Where the reason or the name holds a character that some
    /// shell may act on, WHY or NAME stands for it.
    #[must_use]
    pub fn command(&self) -> String {
        let SessionLeftOut { stretch_s, why, by, .. } = &self.what;
        let mut text = format!("session leave-out {}", self.anew);
        if let Some((from_s, until_s)) = stretch_s {
            // The fewest digits that come back to the last bit.
            let _ = write!(text, " --from \"{from_s} s\" --until \"{until_s} s\"");
        }
        let _ = write!(text, " --why {}", argument(why).as_deref().unwrap_or("WHY"));
        if let Some(by) = by {
            let _ = write!(text, " --by {}", argument(by).as_deref().unwrap_or("NAME"));
        }
        text
    }
}

/// A text in quotation marks, when no shell sees anything in it but letters.
fn argument(text: &str) -> Option<String> {
    let plain = |c: char| c.is_alphanumeric() || " ,.:;-_()/".contains(c);
    (text.starts_with(char::is_alphanumeric) && text.chars().all(plain)).then(|| format!("\"{text}\""))
}

/// What was exported, as text.
#[must_use]
pub fn text(exported: &Exported) -> String {
    let mut parts =
        vec![counted(exported.runs.len() as u64, "run"), counted(exported.judgements as u64, "judgement")];
    if exported.with_divers {
        parts.push(counted(exported.sessions.len() as u64, "session"));
    }
    let kept = exported.entries.iter().filter(|(_, count)| *count > 0);
    parts.extend(kept.map(|(register, count)| counted(*count as u64, register)));
    let mut text = wrapped("", "  ", &format!("{}: {}", exported.folder, parts.join(", ")));
    text.push_str(&wrapped("  ", "  ", &about_divers(exported)));
    if !exported.left_out.is_empty() {
        let left_out = counted(exported.left_out.len() as u64, "time");
        let line = format!(
            "Something was left out of sessions {left_out}, which no session file can say: the commands that do it again \
             stand in sessions/left-out.toml."
        );
        text.push_str(&wrapped("  ", "  ", &line));
    }
    text.push_str("  README.txt says what is what, and how a new book takes it back.\n");
    text
}

fn about_divers(exported: &Exported) -> String {
    let behind = match exported.sessions_behind {
        0 => String::new(),
        n => format!(" and {}", counted(n, "session")),
    };
    if exported.with_divers {
        "Divers and their sessions are in it: whoever has the folder has their details. The book knows of it, and names it \
         when one is forgotten."
            .to_owned()
    } else {
        format!("Divers{behind} are not in it: --with-divers takes them too.")
    }
}

/// What was exported, as JSON.
#[must_use]
pub fn json(exported: &Exported) -> String {
    let run = |(number, file, form): &(RunNumber, String, Form)| json!({ "run": number.to_string(), "file": file, "form": form.name() });
    let session = |(number, file, form): &(SessionNumber, String, Form)| json!({ "session": number.to_string(), "file": file, "form": form.name() });
    let left_out = |out: &LeftOut| {
        json!({
            "session": out.session.to_string(),
            "in_a_new_book": out.anew.to_string(),
            "command": out.command(),
        })
    };
    let entries: serde_json::Map<String, serde_json::Value> =
        exported.entries.iter().map(|(name, n)| (name.replace(' ', "_"), (*n).into())).collect();
    json_text(&json!({
        "folder": exported.folder,
        "runs": exported.runs.iter().map(run).collect::<Vec<_>>(),
        "sessions": exported.sessions.iter().map(session).collect::<Vec<_>>(),
        "sessions_not_exported": exported.sessions_behind,
        "left_out_of_sessions": exported.left_out.iter().map(left_out).collect::<Vec<_>>(),
        "entries": entries,
        "judgements": exported.judgements,
        "certificates": exported.certificates,
        "with_divers": exported.with_divers,
        "notes": exported.notes,
    }))
}

/// The README of the folder; `head` is the head of the chain when it was made.
#[must_use]
pub fn readme(exported: &Exported, head: &str) -> String {
    let mut text = String::from("Export of an Ebbline book\n\n");
    let mut paragraph = |says: &str| {
        text.push_str(&wrapped("", "", says));
        text.push('\n');
    };
    paragraph(
        "Everything the book holds, in files one can read without the program: TOML is text for people, CSV holds only \
         numbers, times and fixed words, so that a spreadsheet has nothing to run. The folder is made anew with each \
         export; keep your own files elsewhere. It is no substitute for a backup: only the book carries the chain that \
         shows whether something was changed.",
    );
    paragraph(&about_divers(exported));
    text.push_str("The head of the book's chain when this was made\n");
    let _ = writeln!(text, "  {head}\n");
    what_is_where(&mut text, exported);
    how_written(&mut text, exported);
    taking_back(&mut text, exported);
    text
}

fn what_is_where(text: &mut String, exported: &Exported) {
    text.push_str("What is where\n");
    let mut row = |name: &str, says: &str| {
        text.push_str(&wrapped(&format!("  {name:<14}"), &" ".repeat(16), says));
    };
    let runs = if exported.blocks { "runs/*/" } else { "runs/" };
    row("acceptances/", "limits orifices are accepted by, one file each");
    row("orifices/", "the register of orifices, one file each");
    row("instruments/", "flow meters, transducers and the rest, with their papers");
    row("first-stages/", "first stages");
    if exported.with_divers {
        row("divers/", "divers: personal, hand on with care");
    }
    row("shop/", "what stands on certificates, and the logo");
    row(".../earlier/", "earlier revisions of an entry; the number before .toml is the revision");
    row(runs, "a folder for each run: the run file and the readings it names");
    row(
        "judgements/",
        "judgements.csv: each with its figures as they stood, the last one of a run holds; parts.csv: the \
         uncertainty of each by its sources; changes.csv: points corrected, struck or left out; texts.toml: who said \
         what about them",
    );
    if !exported.sessions.is_empty() {
        row(
            if exported.session_blocks { "sessions/*/" } else { "sessions/" },
            "a folder for each session, personal as divers are: the session file, the readings it names, and the run \
             file its injection line comes from, where it names one",
        );
    }
    if !exported.left_out.is_empty() {
        row("", "sessions/left-out.toml: what was left out of sessions, when, why, by whom");
    }
    if exported.certificates > 0 {
        row(
            "certificates.toml",
            "numbers given out, each with its run and the SHA-256 of its files; the files are not here: certificate issue \
             makes them from the book",
        );
    }
    row("entries.toml", "which entry stands in which file, its revision, and when that was written");
    row("book.toml", "the book itself: its head, when it was begun, copies it knows of");
    row("contents.txt", "every file, by which the program knows this folder again");
}

fn how_written(text: &mut String, exported: &Exported) {
    let mut rows = |head: &str, counts: [(usize, &str); 4]| {
        text.push_str(head);
        for (count, says) in counts.into_iter().filter(|(count, _)| *count > 0) {
            text.push_str(&wrapped(&format!("  {count:>6}  "), "          ", says));
        }
    };
    let incomplete = "written, but a file cannot say all of it";
    rows(
        "\nHow runs were written\n",
        [
            (exported.count(Form::Original), "as the files they were imported from, to the byte"),
            (
                exported.count(Form::LeftOutAdded),
                "the same, with points left out since at the end of the run file",
            ),
            (
                exported.count(Form::Written),
                "written as they stand in the book: typed runs, and imported ones whose files would read \
                 differently today (an instrument's papers have changed), name readings elsewhere, or hold more than \
                 numbers",
            ),
            (exported.count(Form::Incomplete), incomplete),
        ],
    );
    if !exported.sessions.is_empty() {
        rows(
            "\nHow sessions were written\n",
            [
                (
                    exported.sessions_of(Form::Original),
                    "as the files they were imported from, to the byte, the run file among them",
                ),
                (exported.sessions_of(Form::LeftOutAdded), "the same, with what was left out"),
                (
                    exported.sessions_of(Form::Written),
                    "written as they stand in the book: typed sessions, and imported ones whose files would read \
                     differently today, name files elsewhere, or hold more than numbers",
                ),
                (exported.sessions_of(Form::Incomplete), incomplete),
            ],
        );
    }
    for note in &exported.notes {
        text.push_str(&wrapped("  - ", "    ", note));
    }
}

fn taking_back(text: &mut String, exported: &Exported) {
    text.push_str("\nTaking it back into a new book (in this folder, in this order)\n\n");
    let mut command = |line: &str| {
        let _ = writeln!(text, "  ebbline --book NEW.db {line}");
    };
    let has = |register: &str| exported.entries.iter().any(|(name, n)| *name == register && *n > 0);
    for (register, line) in [
        ("acceptance", "acceptance add acceptances/*.toml"),
        ("orifice", "orifice add orifices/*.toml"),
        ("instrument", "instrument add instruments/*.toml"),
        ("first stage", "first-stage add first-stages/*.toml"),
        ("diver", "diver add divers/*.toml"),
        ("shop", "shop edit shop/shop.toml"),
    ] {
        if has(register) {
            command(line);
        }
    }
    match (exported.runs.is_empty(), exported.blocks) {
        (true, _) => {}
        (false, false) => command("bench import runs/*/*.toml"),
        (false, true) => command("bench import runs/0000000/*/*.toml     (and so on, folder by folder)"),
    }
    match (exported.sessions.is_empty(), exported.session_blocks) {
        (true, _) => {}
        (false, false) => command("session import sessions/*/S*[0-9].toml"),
        (false, true) => {
            command("session import sessions/0000000/*/S*[0-9].toml     (and so on)");
        }
    }
    text.push('\n');
    text.push_str(&wrapped(
        "",
        "",
        "Runs are numbered anew in the order they are imported; where none is missing they keep their numbers. What a run \
         gives is then the same to the last bit. Judgements are a person's: give bench accept again, in the order of \
         judgements.csv, and the comparison of each run with the one before is there again too.",
    ));
    if !exported.sessions.is_empty() {
        text.push('\n');
        text.push_str(&wrapped(
            "",
            "",
            "The same holds of sessions. Those whose line comes from an orifice of the book have the same uptake once its \
             runs are judged again.",
        ));
    }
    if !exported.left_out.is_empty() {
        text.push('\n');
        text.push_str(&wrapped(
            "",
            "",
            "What was left out of sessions is left out again by these commands, with the numbers that sessions have in \
             the new book; the reasons stand in sessions/left-out.toml, and WHY and NAME stand for those a shell may \
             misread.",
        ));
        text.push('\n');
        for out in &exported.left_out {
            // A command stays on one line, however long, so that it can be copied.
            let _ = writeln!(text, "  ebbline --book NEW.db {}", out.command());
        }
    }
}

#[cfg(test)]
mod tests {
    use chrono::DateTime;

    use super::*;

    #[test]
    fn a_command_holds_no_text_that_a_shell_may_act_on() {
        let number = |n| SessionNumber::new(n).unwrap();
        let command = |stretch_s, why: &str, by: Option<&str>| {
            let at = DateTime::parse_from_rfc3339("2026-11-20T18:05:00+11:00").unwrap();
            let what = SessionLeftOut { stretch_s, why: why.to_owned(), by: by.map(str::to_owned), at };
            LeftOut { session: number(3), anew: number(2), what }.command()
        };
        assert_eq!(
            command(Some((600.5, 720.0)), "mask off, spoke (twice)", Some("A. Invented")),
            "session leave-out S0002 --from \"600.5 s\" --until \"720 s\" --why \"mask off, spoke (twice)\" --by \"A. Invented\""
        );
        for text in [
            "$(rm x)", "`x`", "a \"b\"", "%PATH%", "a & b", "-x", "don't", "=1+1", "a\\", "!x", "“x”",
            "a\nb", "",
        ] {
            assert_eq!(command(None, text, Some(text)), "session leave-out S0002 --why WHY --by NAME");
        }
    }
}
