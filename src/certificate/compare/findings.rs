//! What a comparison found, and each finding as a sentence.

use std::fmt;

use super::MOST_DIFFERENCES;

/// What was found.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Findings {
    /// Number of the certificate, as printed.
    pub number: String,
    /// Whether it holds.
    pub outcome: Outcome,
    /// What differs, the first [`MOST_DIFFERENCES`] of it.
    pub differences: Vec<Difference>,
    /// Differences beyond those.
    pub more: usize,
    /// Numbers that were compared.
    pub numbers: usize,
    /// Texts that were compared.
    pub texts: usize,
    /// Files that were compared.
    pub files: usize,
    /// Sentences that another version of the program worded otherwise, which were not judged.
    pub wordings: usize,
    /// Whether the pages of a PDF were compared.
    pub pages: Pages,
}

/// Whether a certificate holds.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Outcome {
    /// Everything printed is what comes of the files inside. Consistent with itself, not genuine.
    Holds,
    /// Something is not.
    DoesNotHold,
    /// The method it was computed by is not available here.
    NotChecked {
        /// The revision of the method.
        method: u32,
        /// The version of the program that has it.
        program: String,
    },
}

/// Whether pages were compared.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Pages {
    /// There are none: it is an XML.
    None,
    /// They are those of the same content.
    Same,
    /// They are not.
    Differ,
    /// Another version of the program set them.
    OtherProgram,
}

/// One thing that differs.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Difference {
    /// Path of the leaf; empty for the certificate as a whole.
    pub path: String,
    /// The same in words.
    pub words: String,
    /// What differs.
    pub what: What,
}

/// What differs.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum What {
    /// A number.
    Number {
        /// As printed.
        printed: String,
        /// As it comes out.
        recomputed: String,
    },
    /// A text.
    Text {
        /// As printed.
        printed: String,
        /// As it comes out.
        recomputed: String,
    },
    /// Something is not printed.
    Missing {
        /// What should stand there.
        recomputed: String,
    },
    /// Something is printed that should not be.
    NotExpected {
        /// As printed.
        printed: String,
    },
    /// An attached file is another.
    File,
    /// The files inside cannot be turned into a certificate.
    NotMade(String),
    /// A file of the PDF is not the one in its XML.
    AttachmentDiffers,
    /// A file of the XML is not attached to the PDF.
    AttachmentMissing,
    /// A file is attached to the PDF that its XML does not hold.
    AttachmentUnknown,
    /// The PDF was written on to after it was made.
    WrittenOn,
    /// The pages are not those of this content.
    Pages,
}

impl Findings {
    pub(super) const fn new(number: String) -> Self {
        Self {
            number,
            outcome: Outcome::Holds,
            differences: Vec::new(),
            more: 0,
            numbers: 0,
            texts: 0,
            files: 0,
            wordings: 0,
            pages: Pages::None,
        }
    }

    /// What was found in sentences, the outcome first, without the differences one by one.
    #[must_use]
    pub fn says(&self) -> Vec<String> {
        let number = tame(&self.number);
        let mut all = vec![match &self.outcome {
            Outcome::Holds => format!(
                "certificate {number} holds: {} numbers, {} texts and {} files are what comes of the readings inside. It is \
                 consistent with itself, which does not make it genuine: only the book that gave out its number can say so",
                self.numbers, self.texts, self.files
            ),
            Outcome::DoesNotHold => {
                let count = self.differences.len() + self.more;
                let what = if count == 1 { "one thing is" } else { "things are" };
                let count = if count == 1 { String::new() } else { format!("{count} ") };
                format!(
                    "certificate {number} does not hold: {count}{what} not what comes of the readings inside"
                )
            }
            Outcome::NotChecked { method, program } => format!(
                "certificate {number} was not checked: it was made by method {method} of version {}, which is not available here",
                tame(program)
            ),
        }];
        if self.wordings > 0 {
            all.push(format!(
                "{} sentences are worded otherwise by another version of the program; their numbers are the same",
                self.wordings
            ));
        }
        match self.pages {
            Pages::None => {}
            Pages::Same => all.push("the pages are those of the same content, to the byte".to_owned()),
            Pages::Differ => all.push("the pages are not those of the same content".to_owned()),
            Pages::OtherProgram => all.push(
                "the pages were set by another version of the program and not compared: go by the numbers in the XML"
                    .to_owned(),
            ),
        }
        all
    }

    /// Takes a difference; the certificate does not hold then.
    pub fn differ(&mut self, difference: Difference) {
        self.outcome = Outcome::DoesNotHold;
        if self.differences.len() < MOST_DIFFERENCES {
            self.differences.push(difference);
        } else {
            self.more += 1;
        }
    }
}

impl Difference {
    /// One of the certificate as a whole.
    #[must_use]
    pub const fn whole(what: What) -> Self {
        Self { path: String::new(), words: String::new(), what }
    }

    /// One of a named file.
    #[must_use]
    pub fn of_file(name: &str, what: What) -> Self {
        Self { path: String::new(), words: tame(name), what }
    }
}

impl fmt::Display for Difference {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let words = &self.words;
        match &self.what {
            What::Number { printed, recomputed } => {
                write!(f, "{words}: {} is printed, {recomputed} comes out", tame(printed))
            }
            What::Text { printed, recomputed } => {
                write!(f, "{words}: \"{}\" is printed, \"{}\" comes out", tame(printed), tame(recomputed))
            }
            What::Missing { recomputed } => {
                write!(f, "{words}: nothing is printed, \"{}\" comes out", tame(recomputed))
            }
            What::NotExpected { printed } => {
                write!(f, "{words}: \"{}\" is printed, and nothing of the kind comes out", tame(printed))
            }
            What::File => write!(f, "{words}: the attached file is not the one that comes out"),
            What::NotMade(why) => write!(f, "the files inside give no certificate: {}", tame(why)),
            What::AttachmentDiffers => {
                write!(f, "{words}: the file attached to the PDF is not the one inside its XML")
            }
            What::AttachmentMissing => write!(f, "{words}: is inside the XML and not attached to the PDF"),
            What::AttachmentUnknown => write!(f, "{words}: is attached to the PDF and not inside its XML"),
            What::WrittenOn => write!(f, "the PDF was written on to after it was issued"),
            What::Pages => write!(f, "the pages are not those that come of this content"),
        }
    }
}

/// Longest text that a sentence takes over.
const LONGEST: usize = 160;

/// A text of somebody else's, short and without characters that hide.
fn tame(text: &str) -> String {
    let hidden = |c: char| crate::record::hidden_character(c.encode_utf8(&mut [0; 4])).is_some();
    let mut tame: String =
        text.chars().take(LONGEST).map(|c| if hidden(c) { '\u{FFFD}' } else { c }).collect();
    if text.chars().nth(LONGEST).is_some() {
        tame.push('…');
    }
    tame
}
