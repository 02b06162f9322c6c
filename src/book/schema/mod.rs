//! The tables of a book, version by version.
//!
//! Each migration is one file with its number, runs in one transaction, and sets `user_version` to that number. A
//! migration adds tables and columns and fills them from the records; it never rewrites bytes that the chain runs
//! over. `fixtures/book` keeps the schema of each version as it was, and a test brings each of them here.

mod version_1;

use rusqlite::{Connection, TransactionBehavior};

use super::error::Inside;
use super::header::APPLICATION_ID;

/// One step of the schema.
pub(super) struct Migration {
    /// The version it leads to; the first is 1, and each is one more than the one before.
    pub(super) version: u32,
    /// What it does.
    pub(super) sql: &'static str,
}

/// Every migration, in order.
pub(super) const MIGRATIONS: [Migration; 1] = [version_1::MIGRATION];

/// The version of a book made by this program.
pub(super) const VERSION: u32 = MIGRATIONS[MIGRATIONS.len() - 1].version;

/// One thing of a schema: its kind, its name and the text that makes it.
pub(super) type Thing = (String, String, Option<String>);

/// Runs the migrations that the book lacks, each in its own transaction.
pub(super) fn migrate(connection: &mut Connection, migrations: &[Migration]) -> Result<(), Inside> {
    for migration in migrations {
        let step = connection.transaction_with_behavior(TransactionBehavior::Immediate)?;
        // Asked again within the transaction: another program may have taken this step meanwhile.
        if version_of(&step)? < migration.version {
            step.execute_batch(migration.sql)?;
            step.pragma_update(None, "application_id", APPLICATION_ID)?;
            step.pragma_update(None, "user_version", migration.version)?;
            step.commit()?;
        }
    }
    Ok(())
}

/// The version a connection sees.
pub(super) fn version_of(connection: &Connection) -> Result<u32, rusqlite::Error> {
    connection.pragma_query_value(None, "user_version", |row| row.get(0))
}

/// What the schema of a connection holds, in order of kind and name.
pub(super) fn things(connection: &Connection) -> Result<Vec<Thing>, rusqlite::Error> {
    let mut all = connection.prepare("SELECT type, name, sql FROM sqlite_schema ORDER BY type, name")?;
    let rows = all.query_map([], |row| Ok((row.get(0)?, row.get(1)?, row.get(2)?)))?;
    rows.collect()
}

/// What the schema of a new book holds.
pub(super) fn expected() -> Result<Vec<Thing>, Inside> {
    let mut fresh = Connection::open_in_memory()?;
    migrate(&mut fresh, &MIGRATIONS)?;
    Ok(things(&fresh)?)
}

#[cfg(test)]
mod tests {
    use super::*;

    const STEPS: [Migration; 2] = [
        Migration { version: 1, sql: "CREATE TABLE a (x INTEGER) STRICT; INSERT INTO a VALUES (7);" },
        Migration {
            version: 2,
            sql: "CREATE TABLE b (y INTEGER) STRICT; INSERT INTO b SELECT x + 1 FROM a;",
        },
    ];

    #[test]
    fn the_steps_are_numbered_from_one_without_a_gap() {
        for (index, migration) in MIGRATIONS.iter().enumerate() {
            assert_eq!(migration.version as usize, index + 1);
        }
    }

    #[test]
    fn only_the_steps_that_lack_are_taken() {
        let mut book = Connection::open_in_memory().unwrap();
        migrate(&mut book, &STEPS[..1]).unwrap();
        assert_eq!(version_of(&book).unwrap(), 1);
        migrate(&mut book, &STEPS).unwrap();
        migrate(&mut book, &STEPS).unwrap();
        assert_eq!(version_of(&book).unwrap(), 2);
        assert_eq!(book.query_row("SELECT sum(y) FROM b", [], |row| row.get::<_, i64>(0)).unwrap(), 8);
        let mut fresh = Connection::open_in_memory().unwrap();
        migrate(&mut fresh, &STEPS).unwrap();
        assert_eq!(things(&book).unwrap(), things(&fresh).unwrap());
    }

    #[test]
    fn a_step_that_fails_leaves_the_version_before_it() {
        let mut book = Connection::open_in_memory().unwrap();
        let broken = [
            Migration { version: 1, sql: STEPS[0].sql },
            Migration {
                version: 2,
                sql: "CREATE TABLE b (y INTEGER) STRICT; INSERT INTO nowhere VALUES (1);",
            },
        ];
        assert!(migrate(&mut book, &broken).is_err());
        assert_eq!(version_of(&book).unwrap(), 1);
        assert_eq!(things(&book).unwrap().len(), 1);
    }
}
