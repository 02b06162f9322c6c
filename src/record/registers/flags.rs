//! Flags to the text of a file that says the same, so that both are read in one way.

use super::super::document;
use super::super::error::{Place, RecordError, Refusal};
use super::super::write::{number, quoted};
use super::RegisterRefusal;

/// Keys whose value is a plain number in a file.
const NUMBERS: [&str; 8] = [
    "baud",
    "protocol.device",
    "protocol.register",
    "protocol.scale",
    "meter.coverage",
    "transducer.coverage",
    "significance",
    "en",
];

/// Keys whose value is true or false in a file.
const SWITCHES: [&str; 2] = ["compensated", "meter.wet"];

/// Keys whose value is a list in a file; such a flag may come several times.
const LISTS: [&str; 2] = ["signatories", "statements"];

/// Keys whose text has escapes for what a shell cannot type.
const ESCAPED: [&str; 2] = ["protocol.ask", "protocol.ends"];

/// The flag for a key of a file: `--meter-made-for` for `meter.made_for`.
#[must_use]
pub fn flag_of(key: &str) -> String {
    document::flag_of(key)
}

/// The text of a file with these keys, first those of no table.
pub(super) fn as_toml(flags: &[(String, String)]) -> Result<String, RecordError> {
    let mut tables: Vec<(&str, String)> = vec![("", String::new())];
    for (at, (key, text)) in flags.iter().enumerate() {
        let (table, bare) = split(key);
        let earlier = || flags.iter().take(at).map(|(other, _)| other);
        // A key that is also the table of another cannot be written beside it.
        let same = |other: &String| {
            let (other_table, other_bare) = split(other);
            (other_table, other_bare) == (table, bare)
                || (table.is_empty() && bare == other_table)
                || (other_table.is_empty() && other_bare == table)
        };
        let is_list = LISTS.contains(&key.as_str());
        if is_list && earlier().any(|other| other == key) {
            continue;
        }
        if earlier().any(same) {
            return Err(refuse(key, RegisterRefusal::FlagTwice.into()));
        }
        let value = if is_list { list(flags, key) } else { value(key, text)? };
        let line = format!("{} = {value}\n", quoted(bare));
        match tables.iter_mut().find(|(name, _)| *name == table) {
            Some((_, lines)) => lines.push_str(&line),
            None => tables.push((table, line)),
        }
    }
    let written = |(name, lines): &(&str, String)| match *name {
        "" => lines.clone(),
        name => format!("[{}]\n{lines}", quoted(name)),
    };
    Ok(tables.iter().map(written).collect())
}

/// The table of a key, empty for none, and the key in it.
fn split(key: &str) -> (&str, &str) {
    key.split_once('.').unwrap_or(("", key))
}

/// All texts of a flag, or the empty text that takes the list away.
fn list(flags: &[(String, String)], key: &str) -> String {
    let texts: Vec<&str> =
        flags.iter().filter(|(other, _)| other == key).map(|(_, text)| text.as_str()).collect();
    match texts.as_slice() {
        [only] if only.trim().is_empty() => quoted(only),
        _ => format!("[{}]", texts.iter().map(|text| quoted(text)).collect::<Vec<_>>().join(", ")),
    }
}

fn value(key: &str, text: &str) -> Result<String, RecordError> {
    let trimmed = text.trim();
    if trimmed.is_empty() {
        return Ok(quoted(trimmed));
    }
    if NUMBERS.contains(&key) {
        let parsed = trimmed.parse::<i64>().map(|whole| whole.to_string());
        let parsed = parsed.or_else(|_| match trimmed.parse::<f64>() {
            Ok(float) if float.is_finite() => Ok(number(float)),
            _ => Err(refuse(key, Refusal::NotANumber(text.to_owned()))),
        });
        return parsed;
    }
    if SWITCHES.contains(&key) {
        let known = "true, false".to_owned();
        return match trimmed {
            "true" | "false" => Ok(trimmed.to_owned()),
            _ => Err(refuse(key, Refusal::UnknownWord { word: text.to_owned(), known })),
        };
    }
    if ESCAPED.contains(&key) {
        let unescaped =
            unescaped(text).ok_or_else(|| refuse(key, RegisterRefusal::Escape(text.to_owned()).into()))?;
        return Ok(quoted(&unescaped));
    }
    Ok(quoted(text))
}

fn unescaped(text: &str) -> Option<String> {
    let mut plain = String::new();
    let mut rest = text.chars();
    while let Some(c) = rest.next() {
        plain.push(match c {
            '\\' => match rest.next()? {
                'r' => '\r',
                'n' => '\n',
                't' => '\t',
                '\\' => '\\',
                _ => return None,
            },
            _ => c,
        });
    }
    Some(plain)
}

fn refuse(key: &str, refusal: Refusal) -> RecordError {
    refusal.at(Place { file: flag_of(key), line: None, field: None })
}
