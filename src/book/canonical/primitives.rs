//! Numbers, texts, lists, times and names.

use chrono::{DateTime, Datelike, FixedOffset, NaiveDate};

use super::{Canonical, Reader, Unreadable, Writer};
use crate::entry::{Id, RunNumber};

macro_rules! canonical_number {
    ($($type:ty),+) => {
        $(impl Canonical for $type {
            fn write(&self, out: &mut Writer) {
                out.raw(&self.to_le_bytes());
            }

            fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
                Ok(Self::from_le_bytes(from.array()?))
            }
        })+
    };
}

canonical_number!(u8, u16, u32, u64, i32, i64);

/// A float is its bits: a negative nought and every NaN come back as they were.
impl Canonical for f64 {
    fn write(&self, out: &mut Writer) {
        out.raw(&self.to_bits().to_le_bytes());
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(Self::from_bits(u64::from_le_bytes(from.array()?)))
    }
}

impl Canonical for bool {
    fn write(&self, out: &mut Writer) {
        out.raw(&[u8::from(*self)]);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        match u8::read(from)? {
            0 => Ok(false),
            1 => Ok(true),
            other => Err(Unreadable::Choice(u32::from(other), "yes or no")),
        }
    }
}

impl Canonical for usize {
    fn write(&self, out: &mut Writer) {
        (*self as u64).write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Self::try_from(u64::read(from)?).map_err(|_| Unreadable::Ends)
    }
}

impl Canonical for String {
    fn write(&self, out: &mut Writer) {
        out.length(self.len());
        out.raw(self.as_bytes());
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        let length = from.length()?;
        let bytes = from.take(length)?;
        std::str::from_utf8(bytes).map(str::to_owned).map_err(|_| Unreadable::Utf8)
    }
}

/// The content of a file, or a digest.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(in crate::book) struct Bytes(pub(in crate::book) Vec<u8>);

impl Canonical for Bytes {
    fn write(&self, out: &mut Writer) {
        out.length(self.0.len());
        out.raw(&self.0);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        let length = from.length()?;
        Ok(Self(from.take(length)?.to_vec()))
    }
}

impl<const N: usize> Canonical for [u8; N] {
    fn write(&self, out: &mut Writer) {
        out.raw(self);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        from.array()
    }
}

impl<T: Canonical> Canonical for Vec<T> {
    fn write(&self, out: &mut Writer) {
        out.length(self.len());
        for item in self {
            item.write(out);
        }
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        let length = from.length()?;
        // Grown as it is read: a length that lies takes no memory.
        let mut items = Self::new();
        for _ in 0..length {
            items.push(T::read(from)?);
        }
        Ok(items)
    }
}

impl<T: Canonical> Canonical for Option<T> {
    fn write(&self, out: &mut Writer) {
        match self {
            None => out.raw(&[0]),
            Some(value) => {
                out.raw(&[1]);
                value.write(out);
            }
        }
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(if bool::read(from)? { Some(T::read(from)?) } else { None })
    }
}

impl<A: Canonical, B: Canonical> Canonical for (A, B) {
    fn write(&self, out: &mut Writer) {
        self.0.write(out);
        self.1.write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok((A::read(from)?, B::read(from)?))
    }
}

impl Canonical for DateTime<FixedOffset> {
    fn write(&self, out: &mut Writer) {
        self.timestamp().write(out);
        self.timestamp_subsec_nanos().write(out);
        self.offset().local_minus_utc().write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        let (seconds, nanoseconds) = (i64::read(from)?, u32::read(from)?);
        let offset = FixedOffset::east_opt(i32::read(from)?).ok_or(Unreadable::Time)?;
        let utc = DateTime::from_timestamp(seconds, nanoseconds).ok_or(Unreadable::Time)?;
        // A time within a day of the calendar's ends may have no local form, and asking for it would panic.
        utc.naive_utc().checked_add_offset(offset).ok_or(Unreadable::Time)?;
        Ok(utc.with_timezone(&offset))
    }
}

impl Canonical for NaiveDate {
    fn write(&self, out: &mut Writer) {
        self.num_days_from_ce().write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Self::from_num_days_from_ce_opt(i32::read(from)?).ok_or(Unreadable::Time)
    }
}

impl Canonical for Id {
    fn write(&self, out: &mut Writer) {
        out.length(self.as_str().len());
        out.raw(self.as_str().as_bytes());
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(Self::new(&String::read(from)?)?)
    }
}

impl Canonical for RunNumber {
    fn write(&self, out: &mut Writer) {
        self.get().write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Self::new(u32::read(from)?).ok_or(Unreadable::Choice(0, "a run's number"))
    }
}
