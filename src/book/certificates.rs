//! Certificates: numbers given out, and which files were written under them.
//!
//! A number is given out in the transaction that records what makes the certificate, so that no two processes have the same
//! one and none is given twice, whatever happens afterwards. Its files are written next and noted after that: a certificate
//! without that note may have none, and issuing it again makes the same.

use rusqlite::{Connection, OptionalExtension, params};

use super::body::Body;
use super::chain::{Stamp, record_at};
use super::error::{BookError, Inside};
use super::lists::time;
use super::open::Book;
use super::registers::{Kept, Registered, key_of};
use crate::entry::{Certificate, CertificateDraft, Id, RunNumber, Shop};
use crate::record::NumberPattern;
use chrono::{DateTime, Datelike as _, FixedOffset};

/// The files of a certificate by their digests.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct CertificateFiles {
    /// SHA-256 of the PDF.
    pub pdf: [u8; 32],
    /// SHA-256 of the XML.
    pub xml: [u8; 32],
}

/// A certificate as it stands in the book.
#[derive(Debug, Clone, PartialEq)]
pub struct GivenCertificate {
    /// What was recorded.
    pub certificate: Certificate,
    /// Its files; none where they may not have been written.
    pub files: Option<CertificateFiles>,
    /// The certificate that amends or replaces it, and whether it replaces it.
    pub amended_by: Option<(String, bool)>,
}

/// A certificate in a list.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CertificateRow {
    /// Its place in the chain.
    pub seq: u64,
    /// Its number.
    pub number: String,
    /// The run it rests on.
    pub run: RunNumber,
    /// The run before the work.
    pub as_found: Option<RunNumber>,
    /// The orifice.
    pub orifice: String,
    /// When it was issued.
    pub issued: DateTime<FixedOffset>,
    /// Number of the certificate it amends or replaces, and whether it replaces it.
    pub amends: Option<(String, bool)>,
    /// The certificate that amends or replaces it, and whether it replaces it.
    pub amended_by: Option<(String, bool)>,
    /// Its files; none where they may not have been written.
    pub files: Option<CertificateFiles>,
}

/// Which certificates a list shows.
#[derive(Debug, Clone, Copy, Default)]
pub struct CertificateQuery {
    /// At most so many, the newest first.
    pub limit: Option<u32>,
    /// Only those that rest on this run.
    pub run: Option<RunNumber>,
}

const COLUMNS: &str = "SELECT c.seq, c.number, c.run, c.as_found, c.orifice, c.issued, \
    (SELECT o.number FROM certificate AS o WHERE o.key = c.amends), c.replaces, \
    n.number, n.replaces, f.pdf, f.xml \
    FROM certificate AS c \
    LEFT JOIN certificate AS n ON n.amends = c.key \
    LEFT JOIN certificate_files AS f ON f.certificate = c.seq";

impl Book {
    /// Gives the next number of the shop's pattern to a certificate and records it. Where the run has a certificate already
    /// that is not an amendment in the making, that one is handed back and nothing is recorded, so that two processes that
    /// issue one run at once issue one certificate.
    ///
    /// # Errors
    /// [`BookError::NoNumbers`]; [`BookError::NoSuchCertificate`] and [`BookError::AmendedAlready`] of an amendment; those of every
    /// write.
    pub fn give_number(
        &mut self,
        draft: CertificateDraft,
        stamp: &mut Stamp<'_>,
    ) -> Result<Certificate, BookError> {
        let path = self.path().to_owned();
        self.write(stamp, |writing| {
            let connection = &writing.transaction;
            match &draft.amends {
                None => {
                    if let Some(row) = newest_of_run(connection, draft.results.run)? {
                        return Ok(given_at(connection, row)?.certificate);
                    }
                }
                Some(amends) => {
                    let there = find(connection, &amends.number)?.ok_or_else(|| {
                        BookError::NoSuchCertificate { path, number: amends.number.clone() }
                    })?;
                    if let Some((by, _)) = given_at(connection, there)?.amended_by {
                        return Err(BookError::AmendedAlready { number: amends.number.clone(), by }.into());
                    }
                }
            }
            let (number, year, counter) = next_number(connection, &draft)?;
            let head = writing.head();
            let certificate = Certificate { number, counter, year, head: (head.seq, head.link), draft };
            writing.append(Body::Certificate(Box::new(certificate.clone())))?;
            Ok(certificate)
        })
    }

    /// The certificate as it would be recorded now, with nothing recorded: another process may take its number first.
    ///
    /// # Errors
    /// [`BookError::NoNumbers`]; those of every read.
    pub fn number_in_sight(&self, draft: CertificateDraft) -> Result<Certificate, BookError> {
        self.read(|connection| {
            let head = super::chain::last_link(connection)?;
            let (number, year, counter) = next_number(connection, &draft)?;
            Ok(Certificate { number, counter, year, head: (head.seq, head.link), draft })
        })
    }

    /// Notes that the files of a certificate were written. Noted before, nothing is added.
    ///
    /// # Errors
    /// [`BookError::NoSuchCertificate`]; those of every write.
    pub fn note_files(
        &mut self,
        number: &str,
        files: CertificateFiles,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        let path = self.path().to_owned();
        self.write(stamp, |writing| {
            let seq = find(&writing.transaction, number)?
                .ok_or_else(|| BookError::NoSuchCertificate { path, number: number.to_owned() })?;
            if given_at(&writing.transaction, seq)?.files.is_none() {
                writing.append(Body::CertificateFiles { certificate: seq, files })?;
            }
            Ok(())
        })
    }

    /// The certificate of a number, in whatever case; none when it was never given out.
    ///
    /// # Errors
    /// Those of every read.
    pub fn certificate(&self, number: &str) -> Result<Option<GivenCertificate>, BookError> {
        self.read(|connection| find(connection, number)?.map(|seq| given_at(connection, seq)).transpose())
    }

    /// The newest certificate that rests on a run; none when it has none.
    ///
    /// # Errors
    /// Those of every read.
    pub fn certificate_of_run(&self, run: RunNumber) -> Result<Option<GivenCertificate>, BookError> {
        self.read(|connection| {
            newest_of_run(connection, run)?.map(|seq| given_at(connection, seq)).transpose()
        })
    }

    /// Certificates, the one whose number was given out last first.
    ///
    /// # Errors
    /// Those of every read.
    pub fn certificates(&self, query: &CertificateQuery) -> Result<Vec<CertificateRow>, BookError> {
        self.read(|connection| {
            let sql = format!("{COLUMNS} WHERE (?1 IS NULL OR c.run = ?1) ORDER BY c.seq DESC LIMIT ?2");
            let mut statement = connection.prepare_cached(&sql)?;
            let limit = query.limit.map_or(-1, i64::from);
            let mut rows = statement.query(params![query.run.map(RunNumber::get), limit])?;
            let mut all = Vec::new();
            while let Some(row) = rows.next()? {
                all.push(listed(row)?);
            }
            Ok(all)
        })
    }

    /// A stated revision of an entry of a register; none when there is none of that number.
    ///
    /// # Errors
    /// Those of every read.
    pub fn revision<T: Kept>(&self, id: &Id, revision: u32) -> Result<Option<Registered<T>>, BookError> {
        Ok(self.revisions::<T>(id)?.into_iter().find(|found| found.revision == revision))
    }

    /// A stated revision of the shop.
    ///
    /// # Errors
    /// Those of every read.
    pub fn shop_revision(&self, revision: u32) -> Result<Option<Registered<Shop>>, BookError> {
        Ok(self.shop_revisions()?.into_iter().find(|found| found.revision == revision))
    }
}

/// The next number that no certificate has, its year and its running part.
fn next_number(connection: &Connection, draft: &CertificateDraft) -> Result<(String, i32, u32), Inside> {
    let shop = super::registers::shop_in(connection)?;
    let pattern = match shop.and_then(|found| found.entry.number_pattern) {
        None => NumberPattern::usual(),
        Some(pattern) => {
            NumberPattern::parse(&pattern).map_err(|_| BookError::NoNumbers { pattern: pattern.clone() })?
        }
    };
    let year = draft.issued.year();
    let within = pattern.counts_by_year().then_some(year);
    let sql = "SELECT coalesce(max(counter), 0) FROM certificate WHERE ?1 IS NULL OR year = ?1";
    let mut counter: u32 = connection.prepare_cached(sql)?.query_row([within], |row| row.get(0))?;
    loop {
        let next = counter.checked_add(1);
        counter =
            next.ok_or_else(|| Inside::Damaged("its certificates are numbered beyond all counting".into()))?;
        let number = pattern.number(year, counter);
        // One of an earlier pattern may be called so.
        if find(connection, &number)?.is_none() {
            return Ok((number, year, counter));
        }
    }
}

fn find(connection: &Connection, number: &str) -> Result<Option<u64>, Inside> {
    let mut statement = connection.prepare_cached("SELECT seq FROM certificate WHERE key = ?")?;
    Ok(statement.query_row([key_of(number)], |row| row.get(0)).optional()?)
}

fn newest_of_run(connection: &Connection, run: RunNumber) -> Result<Option<u64>, Inside> {
    let sql = "SELECT seq FROM certificate WHERE run = ? ORDER BY seq DESC LIMIT 1";
    let mut statement = connection.prepare_cached(sql)?;
    Ok(statement.query_row([run.get()], |row| row.get(0)).optional()?)
}

fn given_at(connection: &Connection, seq: u64) -> Result<GivenCertificate, Inside> {
    let sql = format!("{COLUMNS} WHERE c.seq = ?");
    let mut statement = connection.prepare_cached(&sql)?;
    let mut rows = statement.query([super::body_rows::place(seq)])?;
    let wrong = || Inside::Damaged(format!("record {seq} holds no certificate"));
    let row = listed(rows.next()?.ok_or_else(wrong)?)?;
    match record_at(connection, seq)?.map(|record| record.body) {
        Some(Body::Certificate(certificate)) => {
            Ok(GivenCertificate { certificate: *certificate, files: row.files, amended_by: row.amended_by })
        }
        _ => Err(wrong()),
    }
}

fn listed(row: &rusqlite::Row<'_>) -> Result<CertificateRow, Inside> {
    let seq: u64 = row.get(0)?;
    let wrong = || Inside::Damaged(format!("the list of certificates cannot be read at record {seq}"));
    let run = |number: u32| RunNumber::new(number).ok_or_else(wrong);
    let other = |at: usize| -> Result<Option<(String, bool)>, Inside> {
        let (number, replaces): (Option<String>, Option<bool>) = (row.get(at)?, row.get(at + 1)?);
        Ok(number.zip(replaces))
    };
    let (pdf, xml): (Option<[u8; 32]>, Option<[u8; 32]>) = (row.get(10)?, row.get(11)?);
    Ok(CertificateRow {
        seq,
        number: row.get(1)?,
        run: run(row.get(2)?)?,
        as_found: row.get::<_, Option<u32>>(3)?.map(run).transpose()?,
        orifice: row.get(4)?,
        issued: time(&row.get::<_, String>(5)?).ok_or_else(wrong)?,
        amends: other(6)?,
        amended_by: other(8)?,
        files: pdf.zip(xml).map(|(pdf, xml)| CertificateFiles { pdf, xml }),
    })
}
