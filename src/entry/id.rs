//! Names of orifices, instruments and the rest.

/// A name in the registers: 1 to 32 letters, digits, `-`, `_` or `.`, and never one that reads as a file.
///
/// Two names that differ only in case are the same name: compare with [`Id::same_as`].
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Id(String);

/// Why a text is no name.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum IdError {
    /// Empty, or longer than 32 characters.
    #[error("a name has 1 to 32 characters, \"{0}\" has {1}")]
    Length(String, usize),
    /// A character that is no letter, digit, `-`, `_` or `.`.
    #[error("a name has only letters, digits, \"-\", \"_\" and \".\", \"{0}\" has {1:?}")]
    Character(String, char),
    /// It would be taken for a file or for a run or session of the book.
    #[error("\"{0}\" reads as a file or a run, choose another name")]
    Reserved(String),
}

impl Id {
    /// Checks a text.
    ///
    /// # Errors
    /// Empty or over 32 characters; a character other than a letter (of any script), a digit, `-`, `_`, `.`; a name
    /// ending in `.toml`, `.pdf` or `.xml`, or of the form of a run or session number (`R0001`, `S0001`).
    pub fn new(text: &str) -> Result<Self, IdError> {
        let length = text.chars().count();
        if length == 0 || length > 32 {
            return Err(IdError::Length(text.to_owned(), length));
        }
        if let Some(other) = text.chars().find(|c| !(c.is_alphanumeric() || matches!(c, '-' | '_' | '.'))) {
            return Err(IdError::Character(text.to_owned(), other));
        }
        let lower = text.to_lowercase();
        let names_a_file = [".toml", ".pdf", ".xml"].iter().any(|ending| lower.ends_with(ending));
        let mut rest = lower.chars();
        let numbered =
            matches!(rest.next(), Some('r' | 's')) && lower.len() >= 5 && rest.all(|c| c.is_ascii_digit());
        if names_a_file || numbered {
            return Err(IdError::Reserved(text.to_owned()));
        }
        Ok(Self(text.to_owned()))
    }

    /// The name as it was given.
    #[must_use]
    pub fn as_str(&self) -> &str {
        &self.0
    }

    /// Whether both name the same entry, ignoring case.
    #[must_use]
    pub fn same_as(&self, other: &Self) -> bool {
        self.0.to_lowercase() == other.0.to_lowercase()
    }
}

impl std::fmt::Display for Id {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&self.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_that_read_as_files_or_runs_are_refused() {
        for bad in ["a.toml", "x.PDF", "c.xml", "R0001", "s12345"] {
            assert_eq!(Id::new(bad), Err(IdError::Reserved(bad.to_owned())));
        }
        for good in ["CMF-0417", "R001", "R-0001", "Ünit_3.b", "a"] {
            assert!(Id::new(good).is_ok(), "{good}");
        }
    }

    #[test]
    fn length_counts_characters_and_spaces_are_refused() {
        assert!(Id::new(&"é".repeat(32)).is_ok());
        assert!(matches!(Id::new(&"é".repeat(33)), Err(IdError::Length(_, 33))));
        assert!(matches!(Id::new(""), Err(IdError::Length(_, 0))));
        assert!(matches!(Id::new("a b"), Err(IdError::Character(_, ' '))));
        assert!(matches!(Id::new("a/b"), Err(IdError::Character(_, '/'))));
    }

    #[test]
    fn case_does_not_make_another_name() {
        assert!(Id::new("cmf-É").unwrap().same_as(&Id::new("CMF-é").unwrap()));
    }
}
