//! What is said when a file is taken: defaults that were filled in, words that were read in a certain way.

use std::fmt;

use super::error::Place;

/// What came out of a file, and what the reader of it should know.
#[derive(Debug, Clone, PartialEq)]
pub struct Loaded<T> {
    /// What the file says.
    pub value: T,
    /// What was taken for granted, in the order it was met.
    pub notes: Vec<Note>,
}

/// Something taken for granted while a file was read.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Note {
    /// A unit that could be understood otherwise was met; said once, at the first place.
    Remark {
        /// Where it stands.
        place: Place,
        /// How it is read.
        says: &'static str,
    },
    /// No purpose was stated.
    PurposeTaken,
    /// No purity of the oxygen was stated.
    PurityTaken,
    /// The purity of the oxygen was stated without its uncertainty.
    PurityUncertaintyTaken(Place),
    /// Words that stand where a cell's reading should.
    WordsForMissing {
        /// The first of them.
        place: Place,
        /// Its word.
        word: String,
        /// How many there are in that column.
        readings: usize,
    },
    /// A value that nothing uses, and why.
    NotUsed {
        /// Where it stands.
        place: Place,
        /// Why it is not used.
        why: &'static str,
    },
}

impl fmt::Display for Note {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Remark { place, says } => write!(f, "{place}: {says}"),
            Self::PurposeTaken => write!(f, "no purpose is stated: taken as \"check\""),
            Self::PurityTaken => write!(f, "no purity of the oxygen is stated: taken as 99.5 % ± 0.3 %"),
            Self::PurityUncertaintyTaken(place) => write!(f, "{place}: no ± is stated, taken as ± 0.3 %"),
            Self::WordsForMissing { place, word, readings } => {
                let others = match readings {
                    0 | 1 => String::new(),
                    2 => ", and so is one more word in this column".to_owned(),
                    more => format!(", and so are {} more words in this column", more - 1),
                };
                write!(f, "{place}: {word:?} is no number and taken as a missing reading{others}")
            }
            Self::NotUsed { place, why } => write!(f, "{place}: not used, {why}"),
        }
    }
}
