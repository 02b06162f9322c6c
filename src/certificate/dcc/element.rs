//! An XML element with what its leaves mean: the exact number behind a printed one, so that a document can be compared.

use base64::Engine;
use base64::engine::general_purpose::STANDARD;

use crate::certificate::rounding;
use crate::report::number::fixed;

/// An element as it is written.
#[derive(Debug, Clone, PartialEq)]
pub struct Element {
    /// Name with its prefix.
    pub name: &'static str,
    /// Attributes, in the order they are written.
    pub attributes: Vec<(&'static str, String)>,
    /// What is inside.
    pub body: Body,
}

/// What is inside an element.
#[derive(Debug, Clone, PartialEq)]
pub enum Body {
    /// Elements.
    Elements(Vec<Element>),
    /// One leaf.
    Leaf(Leaf),
    /// Leaves with a space between them.
    List(Vec<Leaf>),
}

/// A leaf.
#[derive(Debug, Clone, PartialEq)]
pub enum Leaf {
    /// A word, a name, a date, a unit: the same or not.
    Fact(String),
    /// A sentence, whose wording may differ from one version of the program to another.
    Prose(String),
    /// A number.
    Number {
        /// Not rounded, in the unit that is written.
        exact: f64,
        /// As it is written.
        printed: String,
        /// Decimals it is written with; fewer than none before the point.
        decimals: i32,
        /// Whether the decimals are its own, and not those of an uncertainty that could be rounded otherwise.
        own_decimals: bool,
    },
    /// An expanded or standard uncertainty.
    Expanded {
        /// Not rounded, in the unit that is written.
        exact: f64,
        /// As it is written.
        printed: String,
    },
    /// A file.
    Bytes(Vec<u8>),
}

impl Leaf {
    /// What stands in the document.
    pub(super) fn text(&self) -> String {
        match self {
            Self::Fact(text) | Self::Prose(text) => text.clone(),
            Self::Number { printed, .. } | Self::Expanded { printed, .. } => printed.clone(),
            Self::Bytes(bytes) => STANDARD.encode(bytes),
        }
    }

    /// A number times a power of ten. Its digits are those of the number itself, so that two forms never round apart.
    pub(super) fn number(exact: f64, decimals: i32, power: i32) -> Self {
        Self::Number {
            exact: exact * libm::pow(10.0, f64::from(power)),
            printed: shifted(&rounding::value(exact, decimals), power),
            decimals: decimals - power,
            own_decimals: true,
        }
    }

    /// A number that ends where its uncertainty does.
    pub(super) fn measured(exact: f64, decimals: i32, power: i32) -> Self {
        match Self::number(exact, decimals, power) {
            Self::Number { exact, printed, decimals, .. } => {
                Self::Number { exact, printed, decimals, own_decimals: false }
            }
            other => other,
        }
    }

    /// An uncertainty times a power of ten.
    pub(super) fn expanded(exact: f64, power: i32) -> Self {
        let printed = rounding::expanded(exact).unwrap_or_else(|| fixed(0.0, 0));
        Self::Expanded { exact: exact * libm::pow(10.0, f64::from(power)), printed: shifted(&printed, power) }
    }
}

/// A decimal text times a power of ten, by moving its point.
#[must_use]
pub fn shifted(text: &str, power: i32) -> String {
    let (sign, digits) = text.strip_prefix('-').map_or(("", text), |rest| ("-", rest));
    let (whole, part) = digits.split_once('.').unwrap_or((digits, ""));
    if power == 0 || !digits.bytes().all(|b| b.is_ascii_digit() || b == b'.') {
        return text.to_owned();
    }
    let all = format!("{whole}{part}");
    let point = i64::try_from(whole.len()).unwrap_or(0) + i64::from(power);
    let length = i64::try_from(all.len()).unwrap_or(0);
    let zeros = |n: i64| "0".repeat(usize::try_from(n.max(0)).unwrap_or(0));
    let (whole, part) = if point <= 0 {
        (String::new(), format!("{}{all}", zeros(-point)))
    } else if point >= length {
        (format!("{all}{}", zeros(point - length)), String::new())
    } else {
        let (a, b) = all.split_at(usize::try_from(point).unwrap_or(0));
        (a.to_owned(), b.to_owned())
    };
    let whole = whole.trim_start_matches('0');
    let whole = if whole.is_empty() { "0" } else { whole };
    if part.is_empty() { format!("{sign}{whole}") } else { format!("{sign}{whole}.{part}") }
}

impl Element {
    pub(super) fn of(name: &'static str, children: Vec<Self>) -> Self {
        Self { name, attributes: Vec::new(), body: Body::Elements(children) }
    }

    pub(super) fn leaf(name: &'static str, leaf: Leaf) -> Self {
        Self { name, attributes: Vec::new(), body: Body::Leaf(leaf) }
    }

    pub(super) fn list(name: &'static str, leaves: Vec<Leaf>) -> Self {
        Self { name, attributes: Vec::new(), body: Body::List(leaves) }
    }

    /// A fact; white space around it is no part of it.
    pub(super) fn fact(name: &'static str, text: impl AsRef<str>) -> Self {
        Self::leaf(name, Leaf::Fact(text.as_ref().trim().to_owned()))
    }

    /// `dcc:content` elements in an element, each a fact.
    pub(super) fn facts(name: &'static str, texts: impl IntoIterator<Item = impl AsRef<str>>) -> Self {
        Self::of(name, texts.into_iter().map(|text| Self::fact("dcc:content", text)).collect())
    }

    /// `dcc:content` elements in an element, each a sentence.
    pub(super) fn sentences(name: &'static str, texts: impl IntoIterator<Item = impl AsRef<str>>) -> Self {
        let prose = |text: &str| Self::leaf("dcc:content", Leaf::Prose(text.trim().to_owned()));
        Self::of(name, texts.into_iter().map(|text| prose(text.as_ref())).collect())
    }

    /// `dcc:content` elements in an element, facts first and then sentences.
    pub(super) fn facts_and_sentences(
        name: &'static str,
        facts: impl IntoIterator<Item = impl AsRef<str>>,
        sentences: impl IntoIterator<Item = impl AsRef<str>>,
    ) -> Self {
        let (mut all, more) = (Self::facts(name, facts), Self::sentences(name, sentences));
        if let (Body::Elements(children), Body::Elements(more)) = (&mut all.body, more.body) {
            children.extend(more);
        }
        all
    }

    /// `dcc:name`.
    pub(super) fn name(text: impl AsRef<str>) -> Self {
        Self::facts("dcc:name", [text])
    }

    pub(super) fn with(mut self, attribute: &'static str, value: impl Into<String>) -> Self {
        self.attributes.push((attribute, value.into()));
        self
    }

    /// With a place of its own, that of a path: a term of our name space. An id would be the plainer way, but every id must
    /// be referred to by somebody.
    pub(super) fn at(self, path: &str) -> Self {
        self.of_type(&format!("{}{}", super::PLACE, path.replace('/', ".")))
    }

    /// With one more term that says what it is.
    pub(super) fn of_type(mut self, term: &str) -> Self {
        match self.attributes.iter_mut().find(|(name, _)| *name == "refType") {
            Some((_, terms)) => {
                terms.push(' ');
                terms.push_str(term);
            }
            None => self.attributes.push(("refType", term.to_owned())),
        }
        self
    }
}

#[cfg(test)]
mod tests {
    use super::shifted;

    #[test]
    fn a_point_moves_and_no_digit_changes() {
        assert_eq!(shifted("11.0133", 2), "1101.33");
        assert_eq!(shifted("0.0466", -2), "0.000466");
        assert_eq!(shifted("-0.9", 2), "-90");
        assert_eq!(shifted("10.0", -1), "1.00");
        assert_eq!(shifted("120", -4), "0.0120");
        assert_eq!(shifted("0.000", 2), "0.0");
        assert_eq!(shifted("7", 0), "7");
    }
}
