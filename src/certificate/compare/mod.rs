//! Whether a certificate still holds: everything printed, computed again from what is inside.
//!
//! Comes in: bytes of an XML. Goes out: [`Findings`]. The files inside give a run and what was stated; from them a fresh
//! document is made by the same functions as at issue, and compared with what is printed, leaf by leaf, as printed
//! (`numbers.rs`). *Holds* means consistent with itself and not genuine: somebody who changes a reading and prints everything
//! anew has a certificate that holds, and only the book that gave out its number knows better.
//!
//! Left out: a certificate of another method revision, which is not judged; the wording of our own sentences where another
//! version of the program made it (their numbers are compared all the same); and pages, which [`super::check`](mod@super::check) compares.

mod again;
mod findings;
mod numbers;

use std::collections::BTreeMap;

use super::content::{Content, STATED, VERSION, sha256};
use super::dcc::{self, DccError, Expected, Leaf, PrintedLeaf, Received};
use super::stated;
use crate::bench::METHOD_REVISION;
pub use again::{AgainError, made_again};
pub use findings::{Difference, Findings, Outcome, Pages, What};

/// Most differences that are named one by one.
pub const MOST_DIFFERENCES: usize = 200;

/// Why nothing can be said of a certificate.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum CompareError {
    /// It cannot be read.
    #[error(transparent)]
    Xml(#[from] DccError),
    /// It holds no readings.
    #[error(
        "there are no readings inside, so there is nothing to compute again: ask for the certificate with its files"
    )]
    NoReadings,
}

/// What came of a comparison.
#[derive(Debug, Clone, PartialEq)]
pub struct Compared {
    /// What was found.
    pub findings: Findings,
    /// The content made again, where that was possible.
    pub again: Option<Content>,
    /// What was read.
    pub received: Received,
}

/// Checks an XML.
///
/// # Errors
/// One that cannot be read, or that holds no readings.
pub fn compare(xml: &[u8]) -> Result<Compared, CompareError> {
    let received = dcc::read(xml)?;
    if received.files.iter().all(|file| file.name == STATED) {
        return Err(CompareError::NoReadings);
    }
    let number = received.leaves.get(NUMBER).map(|leaf| leaf.text.clone()).unwrap_or_default();
    let mut findings = Findings::new(number);
    let again = match read_and_make(&received, &mut findings) {
        Ok(again) => again,
        Err(error) => {
            findings.differ(Difference::whole(What::NotMade(error.to_string())));
            None
        }
    };
    if let Some(content) = &again {
        let same_program = content.issue.program == VERSION;
        leaves(&received, &dcc::expected(&dcc::document(content)), same_program, &mut findings);
    }
    Ok(Compared { findings, again, received })
}

/// Where the number of the certificate stands.
const NUMBER: &str =
    "dcc:digitalCalibrationCertificate/dcc:administrativeData/dcc:coreData/dcc:uniqueIdentifier";

/// The content made again; none where it is of another method revision, which is noted.
fn read_and_make(received: &Received, findings: &mut Findings) -> Result<Option<Content>, AgainError> {
    let file = received.files.iter().find(|file| file.name == STATED).ok_or(AgainError::NoStated)?;
    let stated = stated::read(&file.bytes)?;
    if stated.method != METHOD_REVISION {
        findings.outcome = Outcome::NotChecked { method: stated.method, program: stated.issue.program };
        return Ok(None);
    }
    made_again(&stated, &received.files).map(Some)
}

/// Compares what is printed with what should be.
fn leaves(received: &Received, expected: &[Expected], same_program: bool, findings: &mut Findings) {
    let mut printed: BTreeMap<&str, &PrintedLeaf> =
        received.leaves.iter().map(|(path, leaf)| (path.as_str(), leaf)).collect();
    for want in expected {
        let Some(got) = printed.remove(want.path.as_str()) else {
            findings.differ(Difference {
                path: want.path.clone(),
                words: want.words.clone(),
                what: What::Missing { recomputed: shown(&want.leaf) },
            });
            continue;
        };
        one(want, &got.text, same_program, findings);
    }
    for (path, leaf) in printed {
        findings.differ(Difference {
            path: path.to_owned(),
            words: leaf.words.clone(),
            what: What::NotExpected { printed: leaf.text.clone() },
        });
    }
}

fn one(want: &Expected, printed: &str, same_program: bool, findings: &mut Findings) {
    let what = match &want.leaf {
        Leaf::Fact(text) => {
            findings.texts += 1;
            (text != printed).then(|| What::Text { printed: printed.to_owned(), recomputed: text.clone() })
        }
        Leaf::Prose(text) => {
            if text == printed {
                findings.texts += 1;
                None
            } else if same_program || numbers::in_text(text) != numbers::in_text(printed) {
                Some(What::Text { printed: printed.to_owned(), recomputed: text.clone() })
            } else {
                findings.wordings += 1;
                None
            }
        }
        Leaf::Number { exact, printed: text, decimals, own_decimals } => {
            findings.numbers += 1;
            let fewest = if *own_decimals { *decimals } else { *decimals - 1 };
            let holds = numbers::value_holds(printed, *exact, fewest);
            (!holds).then(|| What::Number { printed: printed.to_owned(), recomputed: text.clone() })
        }
        Leaf::Expanded { exact, printed: text } => {
            findings.numbers += 1;
            let holds = printed == text || numbers::expanded_holds(printed, *exact);
            (!holds).then(|| What::Number { printed: printed.to_owned(), recomputed: text.clone() })
        }
        Leaf::Bytes(bytes) => {
            findings.files += 1;
            (sha256(bytes) != printed).then_some(What::File)
        }
    };
    if let Some(what) = what {
        findings.differ(Difference { path: want.path.clone(), words: want.words.clone(), what });
    }
}

fn shown(leaf: &Leaf) -> String {
    match leaf {
        Leaf::Fact(text) | Leaf::Prose(text) => text.clone(),
        Leaf::Number { printed, .. } | Leaf::Expanded { printed, .. } => printed.clone(),
        Leaf::Bytes(_) => "an attached file".to_owned(),
    }
}
