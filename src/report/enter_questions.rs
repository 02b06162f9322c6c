//! The questions before the first point of a typed run, and after its last.
//!
//! Comes in: which question, and what an empty answer means. Goes out: the prompt, its explanation, and the words for
//! what is asked in a refusal.

use super::layout::wrapped;
use super::number::shortest;
use crate::entry::{Acceptance, Id, Run, RunNumber};

/// What is asked before the first point and after the last.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Question {
    /// The gas upstream.
    Gas,
    /// Why the run is made.
    Purpose,
    /// The flow meter.
    Meter,
    /// The transducer.
    Transducer,
    /// What it is judged by.
    Acceptance,
    /// Who takes it.
    Technician,
    /// Barometer.
    Barometer,
    /// Gas temperature.
    Temperature,
    /// When.
    Taken,
    /// What the meter shows at no flow, before.
    ZeroBefore,
    /// How fast the pressure falls with the outlet blanked, before.
    LeakBefore,
    /// The same, after.
    ZeroAfter,
    /// The same, after.
    LeakAfter,
}

impl Question {
    /// Those before the first point, in the order they are asked.
    pub const ALL: [Self; 11] = [
        Self::Gas,
        Self::Purpose,
        Self::Meter,
        Self::Transducer,
        Self::Acceptance,
        Self::Technician,
        Self::Barometer,
        Self::Temperature,
        Self::Taken,
        Self::ZeroBefore,
        Self::LeakBefore,
    ];

    /// Those that have no common default: without them there is no run.
    pub const NEEDED: [Self; 4] = [Self::Meter, Self::Transducer, Self::Barometer, Self::Temperature];

    /// Whether the answer stays the same while one bench is used.
    #[must_use]
    pub const fn of_the_bench(self) -> bool {
        matches!(
            self,
            Self::Gas | Self::Purpose | Self::Meter | Self::Transducer | Self::Acceptance | Self::Technician
        )
    }

    /// The word that may stand before an answer, which is also that of the option.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Self::Gas => "gas",
            Self::Purpose => "purpose",
            Self::Meter => "meter",
            Self::Transducer => "transducer",
            Self::Acceptance => "acceptance",
            Self::Technician => "technician",
            Self::Barometer => "barometer",
            Self::Temperature => "temperature",
            Self::Taken => "taken",
            Self::ZeroBefore | Self::ZeroAfter => "zero",
            Self::LeakBefore | Self::LeakAfter => "leak",
        }
    }
}

/// A question as it is asked, with what an empty answer means; the answer is typed behind it.
#[must_use]
pub fn question(question: Question, default: Option<&str>) -> String {
    let default = default.map(|default| format!(" [{default}]")).unwrap_or_default();
    let asked = match question {
        Question::Gas => "Gas (oxygen, air, nitrogen, helium)",
        Question::Purpose => "Purpose (acceptance, as-found, as-left, check)",
        Question::Meter => "Flow meter (name in the register, or a run file with its papers)",
        Question::Transducer => "Transducer (name in the register, or such a file)",
        Question::Acceptance => "Limits it is judged by (name, such a file, or none)",
        Question::Technician => "Technician",
        Question::Barometer => "Barometer with its ±, as in 1009.2 hPa ± 1.0 hPa",
        Question::Temperature => "Gas temperature with its ±, as in 21.0 °C ± 1.0 °C",
        Question::Taken => "Taken at",
        Question::ZeroBefore => "Meter at no flow, as in 0.0002 L/min",
        Question::LeakBefore => "Leak with the outlet blanked, as in 0.002 bar/min",
        Question::ZeroAfter => "Meter at no flow after the run, as in 0.0002 L/min",
        Question::LeakAfter => "Leak after the run, as in 0.002 bar/min",
    };
    prompt(&format!("{asked}{default}:"))
}

/// Whether the bench is that of an earlier run.
#[must_use]
pub fn same_bench_question(run: RunNumber, bench: &str) -> String {
    prompt(&format!("The same bench as in {run} ({bench})? (yes, no) [yes]:"))
}

/// What an answer means, for somebody who typed a question mark.
#[must_use]
pub fn explained(question: Question) -> String {
    let text = match question {
        Question::Gas => {
            "The gas that flows through the orifice now. A bench gas that is not oxygen is converted, and \
            the orifice must be cleaned before it sees oxygen."
        }
        Question::Purpose => {
            "acceptance: new or repaired. as-found: as it came in. as-left: as it goes out. check: a \
            look in between."
        }
        Question::Meter => {
            "The flow meter with what its certificate says: a name you gave it with `ebbline instrument \
            add`, or a run file (with a slash, or ending in .toml) with a [meter] table."
        }
        Question::Transducer => {
            "The pressure transducer with what its certificate says, named like the flow meter."
        }
        Question::Acceptance => {
            "Nominal IP, nominal flow and tolerance the verdict is given by. Without them there is \
            a line and no verdict."
        }
        Question::Technician => "Who reads the instruments; it stands on the sheet.",
        Question::Barometer => {
            "The pressure of the room, read now, not the one reduced to sea level that weather \
            stations give. Behind ± (or +/-) stands its expanded uncertainty, for 95 %; without it ± 2 hPa is taken."
        }
        Question::Temperature => {
            "Of the gas at the orifice. Behind ± (or +/-) stands its expanded uncertainty, for \
            95 %; without it ± 1 °C is taken."
        }
        Question::Taken => {
            "Date and time with offset, as in 2026-11-12T09:40:00+11:00. It decides whether the \
            calibrations are in date and which run was the one before."
        }
        Question::ZeroBefore | Question::ZeroAfter => {
            "Shut the supply, wait, and read the flow meter. Empty when you \
            did not look."
        }
        Question::LeakBefore | Question::LeakAfter => {
            "Blank the outlet, shut the supply, and see how far the pressure \
            falls in a minute. Empty when you did not look."
        }
    };
    wrapped("  ", "  ", text)
}

/// What is asked for, in a refusal.
#[must_use]
pub const fn asked_for(question: Question) -> &'static str {
    match question {
        Question::Gas => "the gas (oxygen, air, nitrogen or helium)",
        Question::Purpose => "the purpose (acceptance, as-found, as-left or check)",
        Question::Meter => "the flow meter (a name in the register, or a run file with its papers)",
        Question::Transducer => "the transducer (a name in the register, or a run file with its papers)",
        Question::Acceptance => "the limits (a name in the register, a run file, or none)",
        Question::Technician => "the technician",
        Question::Barometer => "the barometer (as in 1009.2 hPa ± 1.0 hPa)",
        Question::Temperature => "the gas temperature (as in 21.0 °C ± 1.0 °C)",
        Question::Taken => "the time (as in 2026-11-12T09:40:00+11:00)",
        Question::ZeroBefore | Question::ZeroAfter => "the meter at no flow (as in 0.0002 L/min)",
        Question::LeakBefore | Question::LeakAfter => "the fall of pressure (as in 0.002 bar/min)",
    }
}

/// What belongs to the bench of a run, in a few words.
#[must_use]
pub fn bench_words(run: &Run) -> String {
    let named = |what: &str, id: &Option<Id>, certificate: &Option<String>| match (id, certificate) {
        (Some(id), _) => id.to_string(),
        (None, Some(certificate)) => format!("{what} {certificate}"),
        (None, None) => format!("its {what}"),
    };
    let mut words = vec![
        run.gas.name().to_owned(),
        run.purpose.name().to_owned(),
        named("meter", &run.meter.id, &run.meter.papers.certificate),
        named("transducer", &run.transducer.id, &run.transducer.papers.certificate),
    ];
    words.extend(run.acceptance.as_ref().map(limits_words));
    words.extend(run.technician.clone());
    words.join(", ")
}

fn limits_words(acceptance: &Acceptance) -> String {
    match &acceptance.id {
        Some(id) => format!("limits {id}"),
        None => format!(
            "limits {} L/min at {} bar",
            shortest(acceptance.flow.as_l_min(), 4),
            shortest(acceptance.ip.as_bar(), 4)
        ),
    }
}

/// A text that something is typed behind.
fn prompt(text: &str) -> String {
    wrapped("", "  ", text).trim_end().to_owned() + " "
}
