//! A document laid out as leaves, each at a path; the same paths for one that was written and one that was read.
//!
//! An element with a term of our name space begins a path of its own (`results.nominal.flow`); below and elsewhere a path is made of element
//! names, the second and later ones of a name with their number, `@` before an attribute, and a number behind the entry of a
//! list. So an element that was taken out or put in moves few other paths.

use std::collections::BTreeMap;

use super::element::{Body, Element, Leaf};
use super::read::{DccError, Parsed, decoded};
use crate::certificate::content::sha256;

/// A leaf of a document that was made here.
#[derive(Debug, Clone, PartialEq)]
pub struct Expected {
    /// Its path.
    pub path: String,
    /// The same in words.
    pub words: String,
    /// What should stand there.
    pub leaf: Leaf,
}

/// A leaf of a document that was read: what stands there, and its place in words.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PrintedLeaf {
    /// What stands there; for a file its SHA-256.
    pub text: String,
    /// Its place in words.
    pub words: String,
}

/// The leaves of a document that was made here.
#[must_use]
pub fn expected(document: &Element) -> Vec<Expected> {
    let mut all = Vec::new();
    walk(document, document.name.to_owned(), &[], &mut |path, words, leaf| {
        all.push(Expected { path, words, leaf });
        true
    });
    all
}

/// The leaves of a document that was read.
///
/// # Errors
/// Two leaves at one path, which only two elements of one place can make; more leaves than a certificate has.
pub fn printed(document: &Parsed) -> Result<BTreeMap<String, PrintedLeaf>, DccError> {
    let mut all = BTreeMap::new();
    let (mut twice, mut bytes) = (None, 0);
    let whole = walk(document, document.name.clone(), &[], &mut |path, words, text| {
        bytes += path.len() + words.len();
        let held = all.len() < MOST_LEAVES && bytes < MOST_BYTES;
        if all.insert(path.clone(), PrintedLeaf { text, words }).is_some() {
            twice.get_or_insert(path);
        }
        held && twice.is_none()
    });
    match twice {
        Some(path) => Err(DccError::Twice(path.chars().take(100).collect())),
        None if !whole => Err(DccError::TooManyLeaves),
        None => Ok(all),
    }
}

/// Leaves of a document that was read: a run of 5 000 points has some 80 000, and a certificate two runs.
const MOST_LEAVES: usize = 300_000;
/// Bytes of all their places and names.
const MOST_BYTES: usize = 128 << 20;

/// What both kinds of document are to a walk.
trait Node: Sized {
    type Leaf;
    fn name(&self) -> &str;
    fn attributes(&self) -> Vec<(&str, Self::Leaf)>;
    fn attribute(&self, name: &str) -> Option<&str>;
    fn children(&self) -> &[Self];
    /// Leaves right inside, and whether they are entries of a list.
    fn leaves(&self) -> (Vec<Self::Leaf>, bool);
    /// The text of the only leaf, if there is one.
    fn text(&self) -> Option<&str>;
}

/// Longest name that is taken over into words.
const LONGEST_NAME: usize = 80;

/// Names that a place in words is made of at most; ours have four.
const MOST_NAMES: usize = 6;

/// Hands out every leaf below a node, as long as `out` asks for more; whether it did to the end.
fn walk<N: Node>(
    node: &N,
    path: String,
    words: &[String],
    out: &mut impl FnMut(String, String, N::Leaf) -> bool,
) -> bool {
    let mut words = words.to_vec();
    if words.len() < MOST_NAMES {
        words.extend(named(node));
    }
    for (name, leaf) in node.attributes() {
        if !out(format!("{path}@{name}"), said(&words, &format!("attribute {name}"), None), leaf) {
            return false;
        }
    }
    let (leaves, is_list) = node.leaves();
    for (i, leaf) in leaves.into_iter().enumerate() {
        let (path, entry) =
            if is_list { (format!("{path}/{}", i + 1), Some(i + 1)) } else { (path.clone(), None) };
        if !out(path, said(&words, node.name(), entry), leaf) {
            return false;
        }
    }
    let mut seen: BTreeMap<&str, usize> = BTreeMap::new();
    for child in node.children() {
        let nth = seen.entry(child.name()).or_default();
        *nth += 1;
        let below = match place(child) {
            Some(place) => place.to_owned(),
            None if *nth == 1 => format!("{path}/{}", child.name()),
            None => format!("{path}/{}[{nth}]", child.name()),
        };
        if !walk(child, below, &words, out) {
            return false;
        }
    }
    true
}

/// The place a node says it has.
fn place<N: Node>(node: &N) -> Option<&str> {
    let mut terms = node.attribute("refType")?.split(' ');
    terms.find_map(|term| term.strip_prefix(super::PLACE)).filter(|place| place.len() <= LONGEST_NAME)
}

/// The name a node gives itself: the content of its `dcc:name`.
fn named<N: Node>(node: &N) -> Option<String> {
    let name = node.children().iter().find(|child| child.name() == "dcc:name")?;
    let text = name.children().first()?.text()?;
    let plain: String = text.chars().filter(|c| !c.is_control()).take(LONGEST_NAME).collect();
    Some(plain)
}

/// A place in words.
fn said(names: &[String], element: &str, entry: Option<usize>) -> String {
    let local = element.rsplit(':').next().unwrap_or(element);
    let what = match local.trim_end_matches("XMLList") {
        "value" => "value",
        "unit" => "unit",
        "valueExpandedMU" => "expanded uncertainty U",
        "valueStandardMU" => "standard uncertainty",
        "coverageFactor" => "coverage factor k",
        "coverageProbability" => "coverage probability p",
        "intervalMin" => "lower end of the interval",
        "intervalMax" => "upper end of the interval",
        "conformity" => "verdict",
        "dataBase64" => "attached file",
        "content" => "text",
        "uniqueIdentifier" => "certificate number",
        other => other,
    };
    let entry = entry.map(|n| format!(" {n}")).unwrap_or_default();
    if names.is_empty() { format!("{what}{entry}") } else { format!("{}: {what}{entry}", names.join(", ")) }
}

impl Node for Element {
    type Leaf = Leaf;

    fn name(&self) -> &str {
        self.name
    }

    fn attributes(&self) -> Vec<(&str, Leaf)> {
        self.attributes.iter().map(|(name, value)| (*name, Leaf::Fact(value.clone()))).collect()
    }

    fn attribute(&self, name: &str) -> Option<&str> {
        self.attributes.iter().find(|(key, _)| *key == name).map(|(_, value)| value.as_str())
    }

    fn children(&self) -> &[Self] {
        match &self.body {
            Body::Elements(children) => children,
            Body::Leaf(_) | Body::List(_) => &[],
        }
    }

    fn leaves(&self) -> (Vec<Leaf>, bool) {
        match &self.body {
            Body::Elements(children) if children.is_empty() => (vec![Leaf::Fact(String::new())], false),
            Body::Elements(_) => (Vec::new(), false),
            Body::Leaf(leaf) => (vec![leaf.clone()], false),
            Body::List(leaves) => (leaves.clone(), true),
        }
    }

    fn text(&self) -> Option<&str> {
        match &self.body {
            Body::Leaf(Leaf::Fact(text) | Leaf::Prose(text)) => Some(text),
            _ => None,
        }
    }
}

impl Node for Parsed {
    type Leaf = String;

    fn name(&self) -> &str {
        &self.name
    }

    fn attributes(&self) -> Vec<(&str, String)> {
        self.attributes.iter().map(|(name, value)| (name.as_str(), value.clone())).collect()
    }

    fn attribute(&self, name: &str) -> Option<&str> {
        self.attributes.iter().find(|(key, _)| key == name).map(|(_, value)| value.as_str())
    }

    fn children(&self) -> &[Self] {
        &self.children
    }

    fn leaves(&self) -> (Vec<String>, bool) {
        if !self.children.is_empty() && self.text.trim().is_empty() {
            return (Vec::new(), false);
        }
        if self.children.is_empty() && self.name.ends_with("XMLList") {
            return (self.text.split_ascii_whitespace().map(str::to_owned).collect(), true);
        }
        if self.name == "dcc:dataBase64" {
            // Base64 that cannot be read is refused before; nothing equals the empty text.
            return (vec![decoded(&self.text).map_or_else(String::new, |bytes| sha256(&bytes))], false);
        }
        (vec![self.text.clone()], false)
    }

    fn text(&self) -> Option<&str> {
        Some(&self.text)
    }
}
