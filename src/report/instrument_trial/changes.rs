//! Settings that do better, as flags of `instrument edit` and as lines of a profile.

use super::{FIGURES, ProfileFrom, TrialShown};
use crate::report::layout::{counted, wrapped};
use crate::report::number::shortest;
use crate::report::typed::{shell_word, tame};

/// A key of the profile with another value.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ChangeShown {
    /// The key of the file, behind the name of its table where it is in one: `protocol.ends`.
    pub key: &'static str,
    /// The flag for it.
    pub flag: String,
    /// The value as it is; none where there is none.
    pub from: Option<String>,
    /// The value that does better.
    pub to: String,
}

/// Changes under which what was heard gives readings.
#[derive(Debug, Clone, PartialEq)]
pub struct ProposalShown {
    /// What is changed.
    pub changes: Vec<ChangeShown>,
    /// How many readings they gave.
    pub readings: usize,
    /// The first of them, with its unit.
    pub first: Option<(f64, &'static str)>,
    /// How many faults were left.
    pub faults: usize,
}

impl ChangeShown {
    /// The table of the key, empty for none, and the key in it.
    fn place(&self) -> (&str, &str) {
        self.key.split_once('.').unwrap_or(("", self.key))
    }

    /// What is changed, in a few words.
    fn says(&self) -> String {
        let says = match self.key {
            "baud" => format!("the baud rate {}", self.to),
            "frame" => format!("the frame {}", self.to),
            "protocol.ends" => format!("lines that end in {}", tame(&self.to)),
            // It is long, and stands below.
            "protocol.pattern" => return "another pattern".to_owned(),
            "unit" => format!("the unit {}", self.to),
            "protocol.table" => format!("the {} registers", self.to),
            "protocol.word_order" => format!("the {} word first", end_of(&self.to)),
            other => format!("{} {}", other, tame(&self.to)),
        };
        match (self.key, &self.from) {
            (_, None) => format!("{says} instead of none"),
            ("protocol.word_order", Some(from)) => format!("{says} instead of the {}", end_of(from)),
            (_, Some(from)) => format!("{says} instead of {}", tame(from)),
        }
    }

    /// The line of the profile.
    fn line(&self) -> String {
        let (_, key) = self.place();
        let value = if self.key == "baud" { self.to.clone() } else { toml_text(&self.to) };
        format!("{key} = {value}")
    }

    /// The flag with its value for a shell; none where the value cannot be typed.
    fn flag(&self) -> Option<String> {
        let typed = if self.key == "protocol.ends" {
            self.to
                .chars()
                .map(|c| match c {
                    '\r' => Some("\\r".to_owned()),
                    '\n' => Some("\\n".to_owned()),
                    '\t' => Some("\\t".to_owned()),
                    '\\' => Some("\\\\".to_owned()),
                    c => (!c.is_control()).then(|| c.to_string()),
                })
                .collect::<Option<String>>()?
        } else {
            self.to.clone()
        };
        (tame(&typed) == typed).then(|| format!("{} {}", self.flag, shell_word(&typed)))
    }
}

impl ProposalShown {
    /// The proposal in one sentence.
    #[must_use]
    pub fn says(&self) -> String {
        let changes: Vec<String> = self.changes.iter().map(ChangeShown::says).collect();
        let faults = match self.faults {
            0 => "no fault".to_owned(),
            several => counted(several as u64, "fault"),
        };
        let such = self.first.map_or_else(String::new, |(value, unit)| {
            format!(", such as {} {unit}", shortest(value, FIGURES))
        });
        format!(
            "with {} it gives {} and {faults}{such}",
            changes.join(" and "),
            counted(self.readings as u64, "reading")
        )
    }

    /// The command that makes the change in the register; none for a profile from a file, and where it cannot be typed.
    #[must_use]
    pub fn command(&self, trial: &TrialShown) -> Option<String> {
        let ProfileFrom::Register(book) = &trial.from else { return None };
        let flags = self.changes.iter().map(ChangeShown::flag).collect::<Option<Vec<_>>>()?;
        let book = match book {
            Some(book) if tame(book) == *book => format!(" --book {}", shell_word(book)),
            _ => String::new(),
        };
        Some(format!("ebbline instrument edit {} {}{book}", trial.instrument.id, flags.join(" ")))
    }

    /// The lines of a profile that make the change, those in a table below its head.
    #[must_use]
    pub fn lines(&self) -> Vec<String> {
        let mut lines = Vec::new();
        for wanted in ["", "protocol"] {
            let of_table = self.changes.iter().filter(|change| change.place().0 == wanted);
            let of_table: Vec<String> = of_table.map(ChangeShown::line).collect();
            if !wanted.is_empty() && !of_table.is_empty() {
                lines.push(format!("[{wanted}]"));
            }
            lines.extend(of_table);
        }
        lines
    }
}

pub(super) fn section(trial: &TrialShown) -> String {
    if trial.proposals.is_empty() {
        return String::new();
    }
    let mut text = String::from("\nWhat fits better, each tried on the instrument's own bytes\n");
    for proposal in &trial.proposals {
        text.push_str(&wrapped("  - ", "    ", &format!("{}:", proposal.says())));
        match (proposal.command(trial), &trial.from) {
            // Neither is wrapped: both are there to be copied.
            (Some(command), _) => text.push_str(&format!("      {command}\n")),
            (None, from) => {
                let whereto = match from {
                    ProfileFrom::File(file) => format!("in {}", tame(file)),
                    ProfileFrom::Register(_) => {
                        format!("in a file for ebbline instrument edit {} FILE.toml", trial.instrument.id)
                    }
                };
                text.push_str(&format!("      {whereto}:\n"));
                for line in proposal.lines() {
                    text.push_str(&format!("        {line}\n"));
                }
            }
        }
    }
    text.push_str(&wrapped(
        "  ",
        "  ",
        "What fits need not be right: compare the number and its unit with what the instrument itself shows.",
    ));
    text
}

fn end_of(order: &str) -> &str {
    match order {
        "big" => "high",
        "little" => "low",
        other => other,
    }
}

/// A text as a value of TOML: literal where it has backslashes, else with escapes for what does not show.
fn toml_text(text: &str) -> String {
    let tamed = tame(text) == text;
    if tamed && text.contains('\\') && !text.contains('\'') {
        return format!("'{text}'");
    }
    let mut quoted = String::from("\"");
    for c in text.chars() {
        match c {
            '"' | '\\' => quoted.extend(['\\', c]),
            '\n' => quoted.push_str("\\n"),
            '\r' => quoted.push_str("\\r"),
            '\t' => quoted.push_str("\\t"),
            c if tame(c.encode_utf8(&mut [0; 4])).chars().ne([c]) => {
                quoted.push_str(&format!("\\U{:08X}", u32::from(c)));
            }
            c => quoted.push(c),
        }
    }
    quoted.push('"');
    quoted
}
