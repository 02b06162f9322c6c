//! The pattern of a shop's certificate numbers: `{year}-{n:4}` makes `2026-0001`.
//!
//! Comes in: the pattern. Goes out: numbers. Left out: which `n` comes next, which a book knows.

use crate::entry::{Id, IdError};

/// Largest width of the running number.
const WIDEST: usize = 9;

/// A pattern that makes certificate numbers.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct NumberPattern(Vec<Piece>);

/// Why a pattern makes no certificate numbers.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum NumberPatternFault {
    /// A brace without its partner.
    #[error("a brace in {0:?} has no partner; write the parts as {{year}} and {{n:4}}")]
    Brace(String),
    /// Something in braces that means nothing.
    #[error("{{{0}}} means nothing in a number; use {{year}}, {{n}}, or {{n:4}} for four digits (at most 9)")]
    Part(String),
    /// No running number.
    #[error("all certificates would have the number {0:?}; write {{n}} or {{n:4}} into it")]
    NoCounter(String),
    /// Two running numbers.
    #[error("{0:?} has the running number twice; keep one {{n}}")]
    CounterTwice(String),
    /// A number that could not be asked for by its name.
    #[error("a certificate would be asked for as {number:?}: {error}")]
    NoName {
        /// A number the pattern would make.
        number: String,
        /// Why it is no name.
        error: IdError,
    },
}

#[derive(Debug, Clone, PartialEq, Eq)]
enum Piece {
    Text(String),
    Year,
    Counter { width: usize },
}

impl NumberPattern {
    /// Checks a pattern.
    ///
    /// # Errors
    /// A brace without partner; anything in braces but `year`, `n` and `n:` with 1 to 9; no `n`, or two; a pattern
    /// whose numbers are no [`Id`], since a certificate is asked for by its number as by a name.
    pub fn parse(text: &str) -> Result<Self, NumberPatternFault> {
        let mut pieces = Vec::new();
        let mut rest = text;
        while let Some(at) = rest.find(['{', '}']) {
            let (before, from) = rest.split_at(at);
            let part = from.strip_prefix('{').and_then(|inner| inner.split_once('}'));
            let Some((part, after)) = part.filter(|(part, _)| !part.contains('{')) else {
                return Err(NumberPatternFault::Brace(text.to_owned()));
            };
            pieces.push(Piece::Text(before.to_owned()));
            pieces.push(Piece::of(part).ok_or_else(|| NumberPatternFault::Part(part.to_owned()))?);
            rest = after;
        }
        pieces.push(Piece::Text(rest.to_owned()));
        let pattern = Self(pieces);
        match pattern.0.iter().filter(|piece| matches!(piece, Piece::Counter { .. })).count() {
            0 => return Err(NumberPatternFault::NoCounter(pattern.number(2026, 1))),
            1 => {}
            _ => return Err(NumberPatternFault::CounterTwice(text.to_owned())),
        }
        // The first number, and one as long as they become.
        for n in [1, 999_999] {
            let number = pattern.number(2026, n);
            if let Err(error) = Id::new(&number) {
                return Err(NumberPatternFault::NoName { number, error });
            }
        }
        Ok(pattern)
    }

    /// The pattern of a shop that named none: `{year}-{n:4}`.
    #[must_use]
    pub fn usual() -> Self {
        let dash = Piece::Text("-".to_owned());
        Self(vec![Piece::Year, dash, Piece::Counter { width: 4 }])
    }

    /// Whether the running number begins anew each year, which it does where the number shows the year.
    #[must_use]
    pub fn counts_by_year(&self) -> bool {
        self.0.contains(&Piece::Year)
    }

    /// The number of the `n`-th certificate in a year.
    #[must_use]
    pub fn number(&self, year: i32, n: u32) -> String {
        let show = |piece: &Piece| match piece {
            Piece::Text(text) => text.clone(),
            Piece::Year => format!("{year:04}"),
            Piece::Counter { width } => format!("{n:0width$}"),
        };
        self.0.iter().map(show).collect()
    }
}

impl Piece {
    fn of(part: &str) -> Option<Self> {
        match part {
            "year" => Some(Self::Year),
            "n" => Some(Self::Counter { width: 1 }),
            _ => {
                let digit = part.strip_prefix("n:").filter(|width| width.len() == 1)?;
                let width = digit.parse().ok().filter(|width| (1..=WIDEST).contains(width))?;
                Some(Self::Counter { width })
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_made_as_the_pattern_says() {
        let number = |pattern: &str, n| NumberPattern::parse(pattern).unwrap().number(2026, n);
        assert_eq!(number("{year}-{n:4}", 1), "2026-0001");
        assert_eq!(number("{year}-{n:4}", 12_345), "2026-12345");
        assert_eq!(number("HOW.{n}", 7), "HOW.7");
        assert_eq!(number("{n:6}_{year}_{year}", 7), "000007_2026_2026");
    }

    #[test]
    fn patterns_that_make_no_names_are_refused() {
        let fault = |pattern: &str| NumberPattern::parse(pattern).unwrap_err();
        for bad in ["{year-{n}", "{n", "n}", "{n}}", "{{n}}"] {
            assert_eq!(fault(bad), NumberPatternFault::Brace(bad.to_owned()), "{bad}");
        }
        for bad in ["month", "n:0", "n:10", "n:", "n:-1", "N", " n", ""] {
            assert_eq!(fault(&format!("{{{bad}}}-{{n}}")), NumberPatternFault::Part(bad.to_owned()), "{bad}");
        }
        assert_eq!(fault("{year}-A"), NumberPatternFault::NoCounter("2026-A".to_owned()));
        assert_eq!(fault("{n}-{n:3}"), NumberPatternFault::CounterTwice("{n}-{n:3}".to_owned()));
        for bad in ["{year}/{n}", "No {n}", "R{n:4}", "certificate-number-{year}-{n:9}", "{n}.pdf"] {
            assert!(matches!(fault(bad), NumberPatternFault::NoName { .. }), "{bad}");
        }
    }
}
