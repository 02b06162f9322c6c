//! The chain of digests, and how a record is put at its end.
//!
//! For record `n` of kind `k` with canonical bytes `b` and salt `s`:
//!
//! - `digest_n = SHA-256("ebbline payload 1\0" ‖ s ‖ b)`
//! - `link_n = SHA-256("ebbline link 1\0" ‖ link_(n−1) ‖ n ‖ k ‖ digest_n)`, with 32 noughts for `link_0`, `n` in
//!   eight and `k` in two bytes, little-endian.
//!
//! A link needs the digest and not the payload, so the chain verifies after an erasure; the salt of 16 random bytes is
//! erased with the payload, so the digest does not betray even a payload of a few guessable words. Who rewrites the
//! whole chain from some record on can hide it from the book itself: that is why certificates print the head.

use chrono::{DateTime, FixedOffset};
use rusqlite::{Connection, OptionalExtension, Transaction, params, params_from_iter};
use sha2::{Digest, Sha256};

use super::body::{self, Body, Record};
use super::body_rows::{self, Row};
use super::error::Inside;

/// When something is written, and where the salts come from.
pub struct Stamp<'a> {
    /// The time of writing.
    pub at: DateTime<FixedOffset>,
    /// Gives 16 random bytes that nobody can guess, new ones each time.
    pub salt: &'a mut dyn FnMut() -> [u8; 16],
}

/// The end of the chain: how many records there are and the link of the last.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Head {
    /// Place of the last record; 0 before the first.
    pub seq: u64,
    /// Its link.
    pub link: [u8; 32],
}

impl Head {
    /// The end of a chain without records.
    pub(super) const NONE: Self = Self { seq: 0, link: [0; 32] };

    /// The next head, after a record of `kind` with `digest`.
    pub(super) fn followed_by(&self, kind: u16, digest: &[u8; 32]) -> Self {
        let seq = self.seq + 1;
        let mut hash = Sha256::new();
        hash.update(b"ebbline link 1\0");
        hash.update(self.link);
        hash.update(seq.to_le_bytes());
        hash.update(kind.to_le_bytes());
        hash.update(digest);
        Self { seq, link: hash.finalize().into() }
    }
}

/// As certificates print it: the place, a dash, and the link in hexadecimal.
impl std::fmt::Display for Head {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{}-", self.seq)?;
        self.link.iter().try_for_each(|byte| write!(f, "{byte:02x}"))
    }
}

/// A text that is no head.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("\"{0}\" is no head of a book's chain: it has a number, a dash and 64 hexadecimal digits")]
pub struct NoHead(String);

impl std::str::FromStr for Head {
    type Err = NoHead;

    fn from_str(text: &str) -> Result<Self, NoHead> {
        let refused = || NoHead(text.to_owned());
        let (seq, link) = text.split_once('-').ok_or_else(refused)?;
        let plain = link.len() == 64 && link.bytes().all(|byte| byte.is_ascii_hexdigit());
        if !plain || !seq.bytes().all(|byte| byte.is_ascii_digit()) {
            return Err(refused());
        }
        let mut head = Self { seq: seq.parse().map_err(|_| refused())?, link: [0; 32] };
        for (index, byte) in head.link.iter_mut().enumerate() {
            *byte = u8::from_str_radix(&link[2 * index..2 * index + 2], 16).map_err(|_| refused())?;
        }
        Ok(head)
    }
}

/// The digest of a payload with its salt.
pub(super) fn payload_digest(salt: &[u8], bytes: &[u8]) -> [u8; 32] {
    let mut hash = Sha256::new();
    hash.update(b"ebbline payload 1\0");
    hash.update(salt);
    hash.update(bytes);
    hash.finalize().into()
}

/// The digest of the files a run or a session was imported from; each with its length, so that no two lists share one.
pub(super) fn source_digest<'f>(files: impl IntoIterator<Item = &'f [u8]>) -> [u8; 32] {
    let mut hash = Sha256::new();
    hash.update(b"ebbline source 1\0");
    for file in files {
        hash.update((file.len() as u64).to_le_bytes());
        hash.update(file);
    }
    hash.finalize().into()
}

/// A transaction that puts records at the end of the chain.
pub(super) struct Writing<'t, 's, 'f> {
    pub(super) transaction: Transaction<'t>,
    head: Head,
    stamp: &'s mut Stamp<'f>,
}

impl<'t, 's, 'f> Writing<'t, 's, 'f> {
    /// Begins at the end of the chain as it stands.
    ///
    /// # Errors
    /// A chain that does not end where the last transaction left it: nothing is built upon a cut tail.
    pub(super) fn new(transaction: Transaction<'t>, stamp: &'s mut Stamp<'f>) -> Result<Self, Inside> {
        let head = last_link(&transaction)?;
        if stored_head(&transaction)? != Some(head) && head != Head::NONE {
            return Err(Inside::Damaged("its chain does not end where its last transaction left it".into()));
        }
        Ok(Self { transaction, head, stamp })
    }

    /// The end of the chain as it stands within this transaction.
    pub(super) const fn head(&self) -> Head {
        self.head
    }

    /// Puts a record at the end, with the rows by which it is found; its place.
    pub(super) fn append(&mut self, body: Body<'_>) -> Result<u64, Inside> {
        let record = Record { at: self.stamp.at, body };
        let bytes = body::write(&record);
        let kind = record.body.kind().number();
        let salt = (self.stamp.salt)();
        let digest = payload_digest(&salt, &bytes);
        let head = self.head.followed_by(kind, &digest);
        let place = body_rows::place(head.seq);
        let mut chain = self
            .transaction
            .prepare_cached("INSERT INTO record (seq, kind, digest, link) VALUES (?, ?, ?, ?)")?;
        chain.execute(params![place, kind, digest, head.link])?;
        let mut payload =
            self.transaction.prepare_cached("INSERT INTO payload (seq, salt, bytes) VALUES (?, ?, ?)")?;
        payload.execute(params![place, salt, bytes])?;
        for row in body_rows::rows(head.seq, &record) {
            insert(&self.transaction, &row)?;
        }
        self.head = head;
        Ok(head.seq)
    }

    /// Makes everything appended permanent; only then may it be acknowledged.
    pub(super) fn commit(self) -> Result<(), Inside> {
        {
            let mut head = self
                .transaction
                .prepare_cached("INSERT OR REPLACE INTO head (one, seq, link) VALUES (1, ?, ?)")?;
            head.execute(params![body_rows::place(self.head.seq), self.head.link])?;
        }
        Ok(self.transaction.commit()?)
    }
}

fn insert(connection: &Connection, row: &Row) -> Result<(), Inside> {
    let names: Vec<&str> = row.columns.iter().map(|(name, _)| *name).collect();
    let marks = vec!["?"; names.len()].join(", ");
    let sql = format!("INSERT INTO {} ({}) VALUES ({marks})", row.table, names.join(", "));
    let mut statement = connection.prepare_cached(&sql)?;
    statement.execute(params_from_iter(row.columns.iter().map(|(_, value)| value)))?;
    Ok(())
}

/// The last link of the chain.
pub(super) fn last_link(connection: &Connection) -> Result<Head, Inside> {
    let mut last = connection.prepare_cached("SELECT seq, link FROM record ORDER BY seq DESC LIMIT 1")?;
    Ok(last
        .query_row([], |row| Ok(Head { seq: row.get(0)?, link: row.get(1)? }))
        .optional()?
        .unwrap_or(Head::NONE))
}

/// The head that the last transaction left.
pub(super) fn stored_head(connection: &Connection) -> Result<Option<Head>, Inside> {
    let mut stored = connection.prepare_cached("SELECT seq, link FROM head")?;
    Ok(stored.query_row([], |row| Ok(Head { seq: row.get(0)?, link: row.get(1)? })).optional()?)
}

/// The record at a place; none when its payload was erased.
pub(super) fn record_at(connection: &Connection, seq: u64) -> Result<Option<Record<'static>>, Inside> {
    let sql = "SELECT kind, bytes FROM record JOIN payload USING (seq) WHERE seq = ?";
    let mut statement = connection.prepare_cached(sql)?;
    let found = statement
        .query_row([body_rows::place(seq)], |row| Ok((row.get::<_, u16>(0)?, row.get::<_, Vec<u8>>(1)?)))
        .optional()?;
    found
        .map(|(kind, bytes)| body::read(kind, &bytes).map_err(|why| Inside::Unreadable(seq, why)))
        .transpose()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digests_are_those_of_the_formulas() {
        // Computed apart from this program with Python's hashlib from the formulas at the head of this file.
        let hex = |digest: [u8; 32]| digest.iter().map(|b| format!("{b:02x}")).collect::<String>();
        let digest = payload_digest(&[7; 16], b"payload");
        assert_eq!(hex(digest), "232e7bd449f390ea24edc01fbe89d2c8eea08febb444337e8d5124cf174bb061");
        let head = Head::NONE.followed_by(2, &digest).followed_by(1000, &digest);
        assert_eq!(head.to_string(), "2-a4cbf274438856030959709e75613f6918ea8df0bc3d94a8dcc140c2e4ce7061");
        assert_eq!(
            hex(source_digest([b"toml".as_slice(), b"csv"])),
            "4e1916c264b80299c42a0e31ca5b17deb482c82566092ddb818cdd8e156821cc"
        );
    }

    #[test]
    fn a_printed_head_is_read_back_and_anything_else_refused() {
        let head = Head { seq: 1234, link: [0xA5; 32] };
        assert_eq!(head.to_string().parse(), Ok(head));
        for bad in [
            "",
            "12",
            "-",
            "x-00",
            "1-é",
            &format!("+1-{}", "0".repeat(64)),
            &format!("1-{}", "é".repeat(32)),
        ] {
            assert!(bad.parse::<Head>().is_err(), "{bad}");
        }
    }

    #[test]
    fn two_pairs_of_files_with_the_same_bytes_in_a_row_are_told_apart() {
        assert_ne!(source_digest([b"ab".as_slice(), b"c"]), source_digest([b"a".as_slice(), b"bc"]));
    }
}
