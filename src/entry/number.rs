//! Numbers the book gives to runs and sessions.

/// A number the book gives: a letter and at least four digits, counted from 1 and never given twice.
macro_rules! number {
    ($(#[$about:meta])* $name:ident, $letter:literal, $lower:literal) => {
        $(#[$about])*
        #[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub struct $name(u32);

        impl $name {
            /// The number counted from 1; none for nought.
            #[must_use]
            pub const fn new(number: u32) -> Option<Self> {
                if number == 0 { None } else { Some(Self(number)) }
            }

            /// From its text: the letter in either case and at least four digits; none for anything else.
            #[must_use]
            pub fn parse(text: &str) -> Option<Self> {
                let digits = text.strip_prefix([$letter, $lower])?;
                let plain = digits.bytes().all(|byte| byte.is_ascii_digit());
                let padded_once = digits.len() == 4 || (digits.len() > 4 && !digits.starts_with('0'));
                if plain && padded_once { digits.parse().ok().and_then(Self::new) } else { None }
            }

            /// The number counted from 1.
            #[must_use]
            pub const fn get(self) -> u32 {
                self.0
            }
        }

        impl std::fmt::Display for $name {
            fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
                write!(f, "{}{:04}", $letter, self.0)
            }
        }
    };
}

number!(
    /// The number of a run in the book, shown as `R0001`.
    RunNumber,
    'R',
    'r'
);
number!(
    /// The number of a session in the book, shown as `S0001`.
    SessionNumber,
    'S',
    's'
);

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_run_number_is_read_as_it_is_shown() {
        for number in [1, 42, 9_999, 10_000, 100_000, u32::MAX] {
            let shown = RunNumber::new(number).unwrap();
            assert_eq!(RunNumber::parse(&shown.to_string()), Some(shown));
        }
        assert_eq!(RunNumber::parse("r0007"), RunNumber::new(7));
        for other in ["R0000", "R007", "R00007", "S0001", "R", "R-001", "R0001x", "R99999999999", ""] {
            assert_eq!(RunNumber::parse(other), None, "{other}");
        }
    }

    #[test]
    fn a_session_number_has_a_letter_of_its_own() {
        assert_eq!(SessionNumber::new(12).unwrap().to_string(), "S0012");
        assert_eq!(SessionNumber::parse("s0012"), SessionNumber::new(12));
        assert_eq!(SessionNumber::parse("R0012"), None);
    }
}
