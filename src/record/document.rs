//! A TOML document, walked by hand so that every refusal knows its line.
//!
//! Comes in: the text of a file. Goes out: tables and fields that convert themselves into numbers, words and
//! quantities, or refuse by name. What any key means is said by the modules that ask for it.
//!
//! A table may lie over another one, that of an entry as it stands: keys it lacks are then those of the other, and an
//! empty text takes a key away.

use std::cell::RefCell;

use chrono::NaiveDate;
use toml::de::{DeTable, DeValue};

use super::error::{Place, RecordError, Refusal};
use super::note::Note;
use crate::entry::Id;
use crate::quantity::text::remarks;
use crate::quantity::{QuantityError, Uncertain, text};

/// The text of a file, its name, and the notes taken while it is read.
pub(super) struct Source<'d> {
    file: &'d str,
    text: &'d str,
    origin: Origin,
    notes: RefCell<Vec<Note>>,
}

/// Where a text came from, which decides how its places are named.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Origin {
    /// A file: its name and the line.
    File,
    /// The flags of a command, written as a file would have them: the flag.
    Flags,
    /// An entry as it stands, written as a file would have it: its name, and no line, since nobody sees that text.
    Entry,
}

/// A table of a document: the whole file, `[meter]`, or the braces behind a key.
pub(super) struct Table<'d> {
    source: &'d Source<'d>,
    /// Empty for the whole file.
    name: String,
    entries: &'d DeTable<'d>,
    start: Option<usize>,
    below: Option<Below<'d>>,
}

/// The table that another one lies over.
#[derive(Clone, Copy)]
struct Below<'d> {
    source: &'d Source<'d>,
    entries: &'d DeTable<'d>,
}

/// A key with its value.
pub(super) struct Field<'d> {
    source: &'d Source<'d>,
    name: String,
    start: usize,
    value: &'d DeValue<'d>,
    below: Option<Below<'d>>,
}

impl<'d> Source<'d> {
    pub(super) fn new(file: &'d str, text: &'d str) -> Self {
        Self::from(Origin::File, file, text)
    }

    /// A text that is no file; `name` stands where a place has no name of its own.
    pub(super) fn from(origin: Origin, name: &'d str, text: &'d str) -> Self {
        Self { file: name, text, origin, notes: RefCell::new(Vec::new()) }
    }

    /// Parses the text; the caller keeps what is parsed, the source only knows where it stands.
    pub(super) fn parse(&self) -> Result<toml::Spanned<DeTable<'d>>, RecordError> {
        DeTable::parse(self.text).map_err(|error| {
            let reason = error.message().lines().collect::<Vec<_>>().join(", ");
            Refusal::NotToml(reason).at(self.place(error.span().map(|span| span.start), None))
        })
    }

    pub(super) fn whole(&'d self, parsed: &'d toml::Spanned<DeTable<'d>>) -> Table<'d> {
        Table { source: self, name: String::new(), entries: parsed.get_ref(), start: None, below: None }
    }

    pub(super) fn note(&self, note: Note) {
        let mut notes = self.notes.borrow_mut();
        let said = |old: &Note| match (old, &note) {
            (Note::Remark { says: old, .. }, Note::Remark { says, .. }) => old == says,
            _ => false,
        };
        if !notes.iter().any(said) {
            notes.push(note);
        }
    }

    pub(super) fn into_notes(self) -> Vec<Note> {
        self.notes.into_inner()
    }

    fn place(&self, offset: Option<usize>, field: Option<String>) -> Place {
        let line = offset.filter(|_| self.origin == Origin::File).map(|offset| self.line(offset));
        match (self.origin, field) {
            (Origin::Flags, Some(field)) => Place { file: flag_of(&field), line: None, field: None },
            (_, field) => Place { file: self.file.to_owned(), line, field },
        }
    }

    fn line(&self, offset: usize) -> u64 {
        let before = self.text.as_bytes().iter().take(offset);
        1 + before.filter(|byte| **byte == b'\n').count() as u64
    }
}

impl<'d> Table<'d> {
    /// Refuses the first key, in the order of the file, that is not among `known`.
    pub(super) fn only(&self, known: &[&'static str]) -> Result<(), RecordError> {
        let stranger = self
            .entries
            .iter()
            .filter(|(key, _)| !known.contains(&key.get_ref().as_ref()))
            .min_by_key(|(key, _)| key.span().start);
        let Some((key, _)) = stranger else { return Ok(()) };
        let written = key.get_ref().as_ref();
        let nearest = nearest(written, known.iter().copied()).unwrap_or_default();
        let field = match self.source.origin {
            Origin::Flags => Some(self.field_name(written)),
            Origin::File | Origin::Entry => (!self.name.is_empty()).then(|| format!("[{}]", self.name)),
        };
        let place = self.source.place(Some(key.span().start), field);
        Err(Refusal::UnknownKey { key: written.to_owned(), nearest }.at(place))
    }

    /// This table with that of an entry as it stands below it.
    pub(super) fn over(self, source: &'d Source<'d>, parsed: &'d toml::Spanned<DeTable<'d>>) -> Self {
        Self { below: Some(Below { source, entries: parsed.get_ref() }), ..self }
    }

    pub(super) fn field(&self, key: &str) -> Option<Field<'d>> {
        let own = self.entries.get_key_value(key);
        let under = self.below.and_then(|below| Some((below.source, below.entries.get_key_value(key)?)));
        let (source, (written, value)) = own.map(|own| (self.source, own)).or(under)?;
        let value = value.get_ref();
        // Only spaces make a text empty here: the end of a line is a value.
        let empty = |text: &str| text.bytes().all(|byte| byte == b' ');
        let taken_away = self.below.is_some() && value.as_str().is_some_and(empty);
        let below = match (own, under) {
            (Some(_), Some((source, (_, value)))) => match value.get_ref() {
                DeValue::Table(entries) => Some(Below { source, entries }),
                _ => None,
            },
            _ => None,
        };
        let (name, start) = (self.field_name(written.get_ref()), written.span().start);
        (!taken_away).then_some(Field { source, name, start, value, below })
    }

    /// The field, or a refusal that shows how it is written.
    pub(super) fn required(&self, key: &str, example: &'static str) -> Result<Field<'d>, RecordError> {
        self.field(key).ok_or_else(|| self.refuse(key, Refusal::MissingKey(example)))
    }

    /// The table behind a key, if it is there.
    pub(super) fn table(&self, key: &str) -> Result<Option<Table<'d>>, RecordError> {
        self.field(key).map(|field| field.table(&self.child(key))).transpose()
    }

    /// The tables of an array of tables; none when the key is missing.
    pub(super) fn tables(&self, key: &str) -> Result<Vec<Table<'d>>, RecordError> {
        let Some(field) = self.field(key) else { return Ok(Vec::new()) };
        let DeValue::Array(array) = field.value else { return Err(field.wrong("an array of tables")) };
        let name = format!("[{}]", self.child(key));
        let each = |item: &'d toml::Spanned<DeValue<'d>>| match item.get_ref() {
            DeValue::Table(entries) => {
                let (source, start) = (field.source, Some(item.span().start));
                Ok(Table { source, name: name.clone(), entries, start, below: None })
            }
            _ => Err(field.wrong("an array of tables")),
        };
        array.iter().map(each).collect()
    }

    /// A refusal of something this table lacks.
    pub(super) fn refuse(&self, key: &str, refusal: Refusal) -> RecordError {
        refusal.at(self.source.place(self.start, Some(self.field_name(key))))
    }

    pub(super) fn note(&self, note: Note) {
        self.source.note(note);
    }

    fn field_name(&self, key: &str) -> String {
        if self.name.is_empty() { key.to_owned() } else { format!("[{}] {key}", self.name) }
    }

    fn child(&self, key: &str) -> String {
        if self.name.is_empty() { key.to_owned() } else { format!("{}.{key}", self.name) }
    }
}

impl<'d> Field<'d> {
    pub(super) fn place(&self) -> Place {
        self.source.place(Some(self.start), Some(self.name.clone()))
    }

    pub(super) fn refuse(&self, refusal: Refusal) -> RecordError {
        refusal.at(self.place())
    }

    pub(super) fn note(&self, note: Note) {
        self.source.note(note);
    }

    pub(super) fn origin(&self) -> Origin {
        self.source.origin
    }

    pub(super) fn is_text(&self) -> bool {
        self.value.is_str()
    }

    pub(super) fn text(&self) -> Result<&'d str, RecordError> {
        self.value.as_str().ok_or_else(|| self.wrong("a text in quotes"))
    }

    pub(super) fn flag(&self) -> Result<bool, RecordError> {
        self.value.as_bool().ok_or_else(|| self.wrong("true or false"))
    }

    /// A plain number within bounds that `want` says in words.
    pub(super) fn number(&self, want: &'static str, within: fn(f64) -> bool) -> Result<f64, RecordError> {
        let (shown, value) = match self.value {
            DeValue::Integer(whole) => {
                (whole.to_string(), i64::from_str_radix(whole.as_str(), whole.radix()).ok().map(|n| n as f64))
            }
            DeValue::Float(float) => (float.to_string(), float.as_str().parse().ok()),
            _ => return Err(self.wrong("a number without quotes")),
        };
        match value {
            Some(value) if value.is_finite() && within(value) => Ok(value),
            _ => Err(self.refuse(Refusal::OutOfBounds { shown, want })),
        }
    }

    pub(super) fn integer(&self) -> Result<i64, RecordError> {
        let DeValue::Integer(whole) = self.value else {
            return Err(self.wrong("a whole number without quotes"));
        };
        i64::from_str_radix(whole.as_str(), whole.radix()).map_err(|_| {
            self.refuse(Refusal::OutOfBounds { shown: whole.to_string(), want: "a whole number of 63 bits" })
        })
    }

    /// One of the words known.
    pub(super) fn word<T: Copy>(&self, known: &[(&'static str, T)]) -> Result<T, RecordError> {
        let word = self.text()?;
        known.iter().find(|(name, _)| *name == word).map(|(_, meaning)| *meaning).ok_or_else(|| {
            let known = known.iter().map(|(name, _)| *name).collect::<Vec<_>>().join(", ");
            self.refuse(Refusal::UnknownWord { word: word.to_owned(), known })
        })
    }

    pub(super) fn id(&self) -> Result<Id, RecordError> {
        Id::new(self.text()?).map_err(|error| self.refuse(Refusal::Id(error)))
    }

    /// Words a person typed; none when there is nothing but spaces.
    pub(super) fn free_text(&self) -> Result<Option<String>, RecordError> {
        let text = self.text()?.trim();
        self.no_hidden(text)?;
        Ok((!text.is_empty()).then(|| text.to_owned()))
    }

    /// As [`Field::free_text`], on several lines, each without spaces at its ends.
    pub(super) fn free_lines(&self) -> Result<Option<String>, RecordError> {
        let lines: Vec<&str> = self.text()?.trim().lines().map(str::trim).collect();
        lines.iter().try_for_each(|line| self.no_hidden(line))?;
        Ok(Some(lines.join("\n")).filter(|text| !text.is_empty()))
    }

    /// The text as it stands, which a person would see as it is.
    pub(super) fn seen_text(&self) -> Result<&'d str, RecordError> {
        let text = self.text()?;
        self.no_hidden(text)?;
        Ok(text)
    }

    /// The values of a list, each with its own line.
    pub(super) fn items(&self) -> Result<Vec<Self>, RecordError> {
        let DeValue::Array(array) = self.value else { return Err(self.wrong("a list")) };
        let each = |item: &'d toml::Spanned<DeValue<'d>>| Self {
            source: self.source,
            name: self.name.clone(),
            start: item.span().start,
            value: item.get_ref(),
            below: None,
        };
        Ok(array.iter().map(each).collect())
    }

    fn no_hidden(&self, text: &str) -> Result<(), RecordError> {
        match hidden_character(text) {
            Some(hidden) => Err(self.refuse(Refusal::HiddenCharacter(hidden.into()))),
            None => Ok(()),
        }
    }

    /// A quantity read by one of the functions of [`crate::quantity::text`].
    pub(super) fn quantity<T>(
        &self,
        read: impl FnOnce(&str) -> Result<T, QuantityError>,
    ) -> Result<T, RecordError> {
        let text = self.quantity_text()?;
        read(text).map_err(|error| self.refuse(Refusal::Quantity(error)))
    }

    /// The text of a quantity; a bare number is refused for its missing unit.
    pub(super) fn quantity_text(&self) -> Result<&'d str, RecordError> {
        match self.value {
            DeValue::Integer(n) => Err(self.refuse(Refusal::BareNumber(n.to_string()))),
            DeValue::Float(n) => Err(self.refuse(Refusal::BareNumber(n.to_string()))),
            _ => {
                let text = self.text()?;
                for says in remarks(text) {
                    self.note(Note::Remark { place: self.place(), says });
                }
                Ok(text)
            }
        }
    }

    /// A calendar day, as a date or as a text.
    pub(super) fn date(&self) -> Result<NaiveDate, RecordError> {
        let text = self.date_or_text()?;
        let day = if text.len() == 10 { NaiveDate::parse_from_str(&text, "%Y-%m-%d").ok() } else { None };
        day.ok_or_else(|| self.refuse(Refusal::NotADate(text)))
    }

    /// A time with its offset, as a date-time or as a text.
    pub(super) fn time(&self) -> Result<chrono::DateTime<chrono::FixedOffset>, RecordError> {
        let text = self.date_or_text()?;
        chrono::DateTime::parse_from_rfc3339(&text).map_err(|_| self.refuse(Refusal::NotATime(text)))
    }

    /// A text, or one of TOML's own dates and times as the text it is.
    pub(super) fn date_or_text(&self) -> Result<String, RecordError> {
        match self.value {
            DeValue::Datetime(time) => Ok(time.to_string()),
            _ => self.text().map(str::to_owned),
        }
    }

    /// A number above zero, or a text with such a number and its `±`.
    pub(super) fn uncertain_number(&self) -> Result<Uncertain<f64>, RecordError> {
        let want = "a number above zero";
        if !self.is_text() {
            return Ok(Uncertain { value: self.number(want, |value| value > 0.0)?, expanded: None });
        }
        let given = text::plain(self.text()?).map_err(|error| self.refuse(Refusal::Quantity(error)))?;
        if given.value > 0.0 {
            Ok(given)
        } else {
            Err(self.refuse(Refusal::OutOfBounds { shown: self.text()?.to_owned(), want }))
        }
    }

    pub(super) fn table(&self, name: &str) -> Result<Table<'d>, RecordError> {
        match self.value {
            DeValue::Table(entries) => {
                let (source, start, below) = (self.source, Some(self.start), self.below);
                Ok(Table { source, name: name.to_owned(), entries, start, below })
            }
            _ => Err(self.wrong("a table")),
        }
    }

    fn wrong(&self, want: &'static str) -> RecordError {
        let got = match self.value {
            DeValue::String(_) => "a text",
            DeValue::Integer(_) | DeValue::Float(_) => "a number",
            DeValue::Boolean(_) => "true or false",
            DeValue::Datetime(_) => "a date or time",
            DeValue::Array(_) => "a list",
            DeValue::Table(_) => "a table",
        };
        self.refuse(Refusal::WrongType { want, got })
    }
}

/// The flag that says what a field of a file says: `--meter-made-for` for `[meter] made_for`.
pub(super) fn flag_of(field: &str) -> String {
    let words: String = field.chars().filter(|c| !matches!(c, '[' | ']')).collect();
    format!("--{}", words.replace([' ', '.', '_'], "-"))
}

/// The known word nearest to a written one, ignoring case; the first of equally near ones.
pub(super) fn nearest<'w>(written: &str, known: impl Iterator<Item = &'w str>) -> Option<&'w str> {
    let written = written.to_lowercase();
    known.min_by_key(|word| strsim::damerau_levenshtein(&written, &word.to_lowercase()))
}

/// The first character of a text that does not show or changes how others show, if there is one.
#[must_use]
pub fn hidden_character(text: &str) -> Option<char> {
    text.chars().find(|c| is_hidden(*c))
}

/// Control characters, and those that turn the direction of text (Unicode bidirectional overrides, isolates, marks).
fn is_hidden(c: char) -> bool {
    c.is_control() || matches!(c, '\u{202A}'..='\u{202E}' | '\u{2066}'..='\u{2069}' | '\u{200E}' | '\u{200F}')
}
