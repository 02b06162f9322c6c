//! Canonical bytes: one encoding of each value of `entry`, the bytes the chain's digests run over.
//!
//! Comes in: a value. Goes out: its bytes, and from those bytes the same value to the last bit. A value has exactly one
//! encoding, and bytes that are no value's encoding are refused, so that a record can be read and written again
//! unchanged years later.
//!
//! The form: fields in the order of the struct, without names. Whole numbers little-endian in a fixed width; a float as
//! the eight bytes of its bits; a text, list or file as its length in four bytes and then its content, text in UTF-8; a
//! choice, an option and a yes or no as one byte, then what belongs to it; a time as its seconds and nanoseconds since
//! 1970 and its offset in seconds; a day as its number in the proleptic Gregorian calendar. What each type writes
//! stands in its own file. Left out: compression, and any meaning.
//!
//! A change to a type of `entry` does not compile here until somebody says what its bytes are: the bytes written
//! before must go on being read (see [`super::body::FORMAT`]).

mod primitives;
mod quantities;
mod papers;
mod acceptance;
mod run;
mod session;
mod live;
mod certificate;
mod judgement;
mod orifice;
mod instrument;
mod first_stage;
mod diver;
mod shop;

#[cfg(test)]
pub(super) mod strategy;
#[cfg(test)]
pub(super) mod session_strategy;
#[cfg(test)]
mod tests;

pub(super) use primitives::Bytes;
pub(super) use run::header;
pub(super) use session::session_header;

use crate::entry::IdError;

/// A value with canonical bytes.
pub(super) trait Canonical: Sized {
    /// Appends the bytes of the value.
    fn write(&self, out: &mut Writer);

    /// Takes the value off the front of the bytes.
    ///
    /// # Errors
    /// Bytes that are no value's encoding.
    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable>;
}

/// Why bytes are no encoding of what was expected.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub(super) enum Unreadable {
    /// They end too early.
    #[error("the bytes end too early")]
    Ends,
    /// Something follows the value.
    #[error("{0} bytes follow the value")]
    Follows(usize),
    /// A choice that is none of those known.
    #[error("{0} is no known choice of {1}")]
    Choice(u32, &'static str),
    /// A text that is not UTF-8.
    #[error("a text is not UTF-8")]
    Utf8,
    /// A time or a day that does not exist.
    #[error("a time does not exist")]
    Time,
    /// A name that is none.
    #[error("a name cannot be one")]
    Id(#[from] IdError),
}

/// Bytes being written.
#[derive(Debug, Default)]
pub(super) struct Writer(Vec<u8>);

impl Writer {
    /// Appends bytes as they are.
    pub(super) fn raw(&mut self, bytes: &[u8]) {
        self.0.extend_from_slice(bytes);
    }

    /// Appends a length. A list of over 4 · 10⁹ would not fit, and neither would it into the book: SQLite keeps at
    /// most 10⁹ bytes in a row and refuses it.
    pub(super) fn length(&mut self, length: usize) {
        self.raw(&u32::try_from(length).unwrap_or(u32::MAX).to_le_bytes());
    }

    /// What was written.
    pub(super) fn into_bytes(self) -> Vec<u8> {
        self.0
    }
}

/// Bytes being read.
#[derive(Debug)]
pub(super) struct Reader<'b>(&'b [u8]);

impl<'b> Reader<'b> {
    /// Begins at the front of `bytes`.
    pub(super) const fn new(bytes: &'b [u8]) -> Self {
        Self(bytes)
    }

    /// The next `n` bytes.
    pub(super) fn take(&mut self, n: usize) -> Result<&'b [u8], Unreadable> {
        let (taken, rest) = self.0.split_at_checked(n).ok_or(Unreadable::Ends)?;
        self.0 = rest;
        Ok(taken)
    }

    /// The next `N` bytes.
    pub(super) fn array<const N: usize>(&mut self) -> Result<[u8; N], Unreadable> {
        let (taken, rest) = self.0.split_first_chunk::<N>().ok_or(Unreadable::Ends)?;
        self.0 = rest;
        Ok(*taken)
    }

    /// A length, never more than what is left: every item has at least one byte.
    pub(super) fn length(&mut self) -> Result<usize, Unreadable> {
        let length = usize::try_from(u32::from_le_bytes(self.array()?)).map_err(|_| Unreadable::Ends)?;
        if length > self.0.len() { Err(Unreadable::Ends) } else { Ok(length) }
    }

    /// Whether everything was read.
    pub(super) fn finish(self) -> Result<(), Unreadable> {
        if self.0.is_empty() { Ok(()) } else { Err(Unreadable::Follows(self.0.len())) }
    }
}

/// The bytes of one value.
#[cfg(test)]
pub(super) fn to_bytes(value: &impl Canonical) -> Vec<u8> {
    let mut out = Writer::default();
    value.write(&mut out);
    out.into_bytes()
}

/// The value of bytes that hold nothing else.
#[cfg(test)]
pub(super) fn from_bytes<T: Canonical>(bytes: &[u8]) -> Result<T, Unreadable> {
    let mut from = Reader::new(bytes);
    let value = T::read(&mut from)?;
    from.finish()?;
    Ok(value)
}

/// Writes `impl Canonical` for a struct: its fields in the order given, each of them.
macro_rules! canonical_struct {
    ($type:ty { $($field:ident),+ $(,)? }) => {
        impl $crate::book::canonical::Canonical for $type {
            fn write(&self, out: &mut $crate::book::canonical::Writer) {
                // Taken apart by name, so that a new field does not compile until it has its bytes.
                let Self { $($field),+ } = self;
                $($crate::book::canonical::Canonical::write($field, out);)+
            }

            fn read(
                from: &mut $crate::book::canonical::Reader<'_>,
            ) -> Result<Self, $crate::book::canonical::Unreadable> {
                $(let $field = $crate::book::canonical::Canonical::read(from)?;)+
                Ok(Self { $($field),+ })
            }
        }
    };
}

/// Writes `impl Canonical` for a choice among names or tuples or structs: the byte given, then the fields.
macro_rules! canonical_choice {
    ($type:ty, $word:literal { $($variant:ident $({ $($field:ident),+ })? $(( $($item:ident),+ ))? = $tag:literal),+ $(,)? }) => {
        impl $crate::book::canonical::Canonical for $type {
            fn write(&self, out: &mut $crate::book::canonical::Writer) {
                match self {
                    $(Self::$variant $({ $($field),+ })? $(( $($item),+ ))? => {
                        out.raw(&[$tag]);
                        $($($crate::book::canonical::Canonical::write($field, out);)+)?
                        $($($crate::book::canonical::Canonical::write($item, out);)+)?
                    })+
                }
            }

            fn read(
                from: &mut $crate::book::canonical::Reader<'_>,
            ) -> Result<Self, $crate::book::canonical::Unreadable> {
                let [tag] = from.array()?;
                match tag {
                    $($tag => {
                        $($(let $field = $crate::book::canonical::Canonical::read(from)?;)+)?
                        $($(let $item = $crate::book::canonical::Canonical::read(from)?;)+)?
                        Ok(Self::$variant $({ $($field),+ })? $(( $($item),+ ))?)
                    })+
                    other => Err($crate::book::canonical::Unreadable::Choice(u32::from(other), $word)),
                }
            }
        }
    };
}

pub(super) use {canonical_choice as choice, canonical_struct as fields};
use {canonical_choice, canonical_struct};
