//! `book` on the terminal.

use super::arguments::{Book, Global};
use super::{Ended, note, say, shelf, tell_notes};
use crate::report::{book as words, export as export_words};
use crate::work::{ExitStatus, book, export};

pub(super) fn book(verb: &Book, global: &Global) -> Result<ExitStatus, Ended> {
    match verb {
        Book::Info => {
            let info = book::info(&shelf(global)?)?;
            let text = if global.json { words::info_json(&info) } else { words::info_text(&info) };
            say(&text, ExitStatus::Done)
        }
        Book::Check(check) => {
            let found = book::check(&shelf(global)?, &check.head)?;
            let status = book::status_of(&found);
            if status != ExitStatus::Done {
                note(&format!("ebbline: {} {}", found.path, words::check_line(&found)));
            }
            let text = if global.json { words::check_json(&found) } else { words::check_text(&found) };
            say(&text, status)
        }
        Book::Backup(backup) => {
            let made = book::backup(&shelf(global)?, &backup.file, backup.replace)?;
            let text = if global.json { words::backup_json(&made) } else { words::backup_text(&made) };
            say(&text, ExitStatus::Done)
        }
        Book::Export(export) => {
            let exported = export::export(&shelf(global)?, &export.folder, export.with_divers)?;
            tell_notes(&exported.notes);
            let text =
                if global.json { export_words::json(&exported) } else { export_words::text(&exported) };
            say(&text, ExitStatus::Done)
        }
    }
}
