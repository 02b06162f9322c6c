//! The folder of an export: written under another name beside it, and put in place when it is whole.

use std::collections::BTreeSet;
use std::fs;
use std::io::ErrorKind;
use std::path::{Path, PathBuf};

use super::super::WorkError;
use super::super::output::make_folder;

/// The list by which an export is known again.
const CONTENTS: &str = "contents.txt";
/// Its first line.
const MARK: &str = "Files of an export of an Ebbline book, form 1";

/// An export while it is written.
pub(super) struct Folder {
    scratch: PathBuf,
    names: Vec<String>,
    folders: BTreeSet<PathBuf>,
}

impl Folder {
    /// Begins beside `to`.
    ///
    /// # Errors
    /// When the folder cannot be made.
    pub(super) fn begin(to: &Path) -> Result<Self, WorkError> {
        let scratch = beside(to, "part")?;
        make_folder(&scratch)?;
        Ok(Self { scratch, names: Vec::new(), folders: BTreeSet::new() })
    }

    /// Writes a file; `name` has `/` between folders.
    ///
    /// # Errors
    /// When it cannot be written.
    pub(super) fn write(&mut self, name: &str, bytes: &[u8]) -> Result<(), WorkError> {
        let path = self.scratch.join(name);
        if let Some(folder) = path.parent()
            && self.folders.insert(folder.to_owned())
        {
            make_folder(folder)?;
        }
        fs::write(&path, bytes).map_err(|source| WorkError::Write { path, source })?;
        self.names.push(name.to_owned());
        Ok(())
    }

    /// Takes away what was written.
    pub(super) fn give_up(self) {
        // What cannot be removed is told apart by its name; there is nothing more to do.
        let _ = fs::remove_dir_all(&self.scratch);
    }

    /// Puts the folder in place of nothing, of an empty folder, or of an earlier export.
    ///
    /// # Errors
    /// When it cannot be moved; or a file that is no part of an export has appeared.
    pub(super) fn put_in_place(mut self, to: &Path) -> Result<(), WorkError> {
        let mut list = format!("{MARK}\n");
        for name in self.names.iter().map(String::as_str).chain([CONTENTS]) {
            list.push_str(name);
            list.push('\n');
        }
        let moved = self.write(CONTENTS, list.as_bytes()).and_then(|()| {
            may_be_written(to)?;
            let old = beside(to, "old")?;
            let failed = |source| WorkError::Write { path: to.to_owned(), source };
            let there = to.exists();
            if there {
                fs::rename(whole(to)?, &old).map_err(failed)?;
            }
            fs::rename(&self.scratch, to).map_err(|source| {
                // The earlier one goes back to where it was.
                let _ = fs::rename(&old, to);
                failed(source)
            })?;
            if there {
                fs::remove_dir_all(&old).map_err(|source| WorkError::Write { path: old, source })?;
            }
            Ok(())
        });
        if moved.is_err() {
            self.give_up();
        }
        moved
    }
}

/// Refuses a folder that holds anything but an earlier export, so that nobody's file is lost.
///
/// # Errors
/// A file of that name; a folder with files in it that no export wrote; one that cannot be read.
pub(super) fn may_be_written(to: &Path) -> Result<(), WorkError> {
    let refuse = |why: String| WorkError::NotReplaced { path: to.to_owned(), why };
    let unreadable = |source| WorkError::Write { path: to.to_owned(), source };
    match fs::symlink_metadata(to) {
        Err(error) if error.kind() == ErrorKind::NotFound => return Ok(()),
        Err(error) => return Err(unreadable(error)),
        Ok(about) if !about.is_dir() => return Err(refuse("is there and is no folder".to_owned())),
        Ok(_) => {}
    }
    let mut files = Vec::new();
    let mut open = vec![to.to_owned()];
    while let Some(folder) = open.pop() {
        for entry in fs::read_dir(&folder).map_err(unreadable)? {
            let entry = entry.map_err(unreadable)?;
            if entry.file_type().map_err(unreadable)?.is_dir() {
                open.push(entry.path());
            } else {
                files.push(entry.path());
            }
        }
    }
    if files.is_empty() {
        return Ok(());
    }
    let contents = fs::read_to_string(to.join(CONTENTS)).unwrap_or_default();
    let mut lines = contents.lines();
    if lines.next() != Some(MARK) {
        return Err(refuse("is not empty and holds no earlier export".to_owned()));
    }
    let known: BTreeSet<PathBuf> = lines.map(|name| to.join(name)).collect();
    files.sort();
    match files.iter().find(|file| !known.contains(*file)) {
        Some(other) => {
            let name = other.strip_prefix(to).unwrap_or(other).display();
            Err(refuse(format!("holds an earlier export and {name}, which is no part of it")))
        }
        None => Ok(()),
    }
}

/// A name beside a folder that only this process takes.
fn beside(to: &Path, what: &str) -> Result<PathBuf, WorkError> {
    let whole = whole(to)?;
    let failed = || WorkError::Write { path: to.to_owned(), source: ErrorKind::InvalidInput.into() };
    let mut name = std::ffi::OsString::from(".");
    name.push(whole.file_name().ok_or_else(failed)?);
    name.push(format!(".{}.{what}", std::process::id()));
    Ok(whole.with_file_name(name))
}

/// The path of a folder with its own name at the end, also of one called `.` or `..`.
fn whole(to: &Path) -> Result<PathBuf, WorkError> {
    let path = if to.exists() { fs::canonicalize(to) } else { std::path::absolute(to) };
    path.map_err(|source| WorkError::Write { path: to.to_owned(), source })
}
