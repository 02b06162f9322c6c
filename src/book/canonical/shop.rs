//! The shop.

use super::{Bytes, Canonical, Reader, Unreadable, Writer, canonical_struct};
use crate::entry::{Logo, Shop, Signatory};

impl Canonical for Logo {
    fn write(&self, out: &mut Writer) {
        let Self { file_name, bytes } = self;
        file_name.write(out);
        out.length(bytes.len());
        out.raw(bytes);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(Self { file_name: String::read(from)?, bytes: Bytes::read(from)?.0 })
    }
}

canonical_struct!(Signatory { name, role });
canonical_struct!(Shop { name, address, contact, logo, accent, number_pattern, signatories, statements });
