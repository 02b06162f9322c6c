//! The pattern by which a line of text is read: a regular expression with the named group `value`.
//!
//! Comes in: the pattern. Goes out: the named groups it has, or what is certainly wrong with it: a bracket without
//! partner, no group `value`, a group named twice, and what a search without backtracking cannot do. Left out: whether
//! every other part of it means something, which the compiler of the expression says; [`Groups::of`] is the one place
//! to ask it.

/// Which of the named groups a pattern has.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(super) struct Groups {
    /// The number itself.
    pub(super) value: bool,
    /// The unit behind it.
    pub(super) unit: bool,
}

/// Why a pattern reads no line.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum PatternFault {
    /// A bracket without its partner.
    #[error(
        "{0:?} has no partner in the pattern; close it, or write \\{0} where the character itself is meant"
    )]
    Bracket(char),
    /// A backslash at the end.
    #[error("the pattern ends in a backslash; write \\\\ where the character itself is meant")]
    Backslash,
    /// No named group `value`.
    #[error("the pattern does not say where the number is; put it into a group, as in (?P<value>[-+]?\\d+)")]
    NoValue,
    /// A group named twice.
    #[error("the pattern has two groups named {0:?}; keep one")]
    GroupTwice(String),
    /// A group with a name that cannot be one.
    #[error("{0:?} is not the name of a group; use letters, digits and _, as in (?P<value>...)")]
    GroupName(String),
    /// Looking around, and references to groups.
    #[error("the pattern has {0:?}, which is not understood here; write it without looking around or back")]
    Backtracking(String),
}

impl Groups {
    /// The groups of a pattern.
    ///
    /// # Errors
    /// Every [`PatternFault`].
    pub(super) fn of(pattern: &str) -> Result<Self, PatternFault> {
        let mut names: Vec<&str> = Vec::new();
        let mut open = 0_usize;
        let mut rest = pattern;
        while let Some(c) = rest.chars().next() {
            let after = &rest[c.len_utf8()..];
            rest = match c {
                '\\' => escaped(after)?,
                '[' => class(after)?,
                '(' => {
                    open += 1;
                    group(after, &mut names)?
                }
                ')' if open == 0 => return Err(PatternFault::Bracket(')')),
                ')' => {
                    open -= 1;
                    after
                }
                _ => after,
            };
        }
        if open > 0 {
            return Err(PatternFault::Bracket('('));
        }
        let groups = Self { value: names.contains(&"value"), unit: names.contains(&"unit") };
        if groups.value { Ok(groups) } else { Err(PatternFault::NoValue) }
    }
}

/// What comes behind the character that a backslash escapes.
fn escaped(after: &str) -> Result<&str, PatternFault> {
    match after.chars().next() {
        None => Err(PatternFault::Backslash),
        Some(digit @ '1'..='9') => Err(PatternFault::Backtracking(format!("\\{digit}"))),
        Some(c) => Ok(&after[c.len_utf8()..]),
    }
}

/// What comes behind a class of characters, whose opening bracket came before; classes stand in classes.
fn class(after: &str) -> Result<&str, PatternFault> {
    // A closing bracket that comes first is a member.
    let after = after.strip_prefix('^').unwrap_or(after);
    let mut rest = after.strip_prefix(']').unwrap_or(after);
    while let Some(c) = rest.chars().next() {
        let after = &rest[c.len_utf8()..];
        rest = match c {
            '\\' => escaped(after)?,
            '[' => class(after)?,
            ']' => return Ok(after),
            _ => after,
        };
    }
    Err(PatternFault::Bracket('['))
}

/// What comes behind the head of a group, whose opening bracket came before.
fn group<'p>(after: &'p str, names: &mut Vec<&'p str>) -> Result<&'p str, PatternFault> {
    for around in ["?=", "?!", "?<=", "?<!", "?>", "?P=", "?P>"] {
        if after.starts_with(around) {
            return Err(PatternFault::Backtracking(format!("({around}")));
        }
    }
    let Some(named) = after.strip_prefix("?P<").or_else(|| after.strip_prefix("?<")) else {
        return Ok(after);
    };
    let Some((name, rest)) = named.split_once('>') else { return Err(PatternFault::Bracket('<')) };
    let word = |c: char| c.is_ascii_alphanumeric() || c == '_';
    if name.is_empty() || !name.chars().all(word) || name.starts_with(|c: char| c.is_ascii_digit()) {
        return Err(PatternFault::GroupName(name.to_owned()));
    }
    if names.contains(&name) {
        return Err(PatternFault::GroupTwice(name.to_owned()));
    }
    names.push(name);
    Ok(rest)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn groups_are_found_wherever_they_stand() {
        for (pattern, unit) in [
            (r"(?P<value>[-+]?\d+(\.\d+)?)", false),
            (r"(?<value>\d+)\s*(?<unit>[a-z/]+)", true),
            (r"^\((?P<value>\d+)\)$", false),
            (r"[(]*[^)]*[])(]+[[:alpha:]]*[a-z&&[^(]]*(?:x(?P<value>-?\d))?", false),
            (r"\\(?P<value>\d)\[", false),
            (r"é(?P<value>\d)µ(?i)(?P<unit>.)", true),
        ] {
            assert_eq!(Groups::of(pattern), Ok(Groups { value: true, unit }), "{pattern}");
        }
    }

    #[test]
    fn what_is_certainly_wrong_is_refused() {
        for (pattern, fault) in [
            ("", PatternFault::NoValue),
            (r"\d+", PatternFault::NoValue),
            (r"\(?P<value>\d\)", PatternFault::NoValue),
            (r"[(?P<value>)]", PatternFault::NoValue),
            (r"(?P<Value>\d)", PatternFault::NoValue),
            (r"(?P<value>\d", PatternFault::Bracket('(')),
            (r"(?P<value>\d))", PatternFault::Bracket(')')),
            (r"(?P<value>[\d)", PatternFault::Bracket('[')),
            (r"(?P<value>[]\d)", PatternFault::Bracket('[')),
            (r"(?P<value\d)", PatternFault::Bracket('<')),
            (r"(?P<value>\d)\", PatternFault::Backslash),
            (r"(?P<value>\d)(?P<value>\d)", PatternFault::GroupTwice("value".to_owned())),
            (r"(?P<>\d)", PatternFault::GroupName(String::new())),
            (r"(?P<1>\d)", PatternFault::GroupName("1".to_owned())),
            (r"(?P<value>\d)\1", PatternFault::Backtracking(r"\1".to_owned())),
            (r"(?<=F)(?P<value>\d)", PatternFault::Backtracking("(?<=".to_owned())),
            (r"(?P<value>\d)(?!x)", PatternFault::Backtracking("(?!".to_owned())),
        ] {
            assert_eq!(Groups::of(pattern), Err(fault), "{pattern}");
        }
    }
}
