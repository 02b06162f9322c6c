//! Writing a file so that it is either whole or not there.

use std::fs::{self, File};
use std::io::Write as _;
use std::path::Path;

use super::WorkError;

/// Writes `bytes` to `path`: under a temporary name beside it, synced, then renamed over it.
///
/// # Errors
/// When the folder cannot be written; the temporary file is taken away again and `path` stays as it was.
pub fn write_whole(path: &Path, bytes: &[u8]) -> Result<(), WorkError> {
    let failed = |source| WorkError::Write { path: path.to_owned(), source };
    let name = path.file_name().ok_or_else(|| failed(std::io::ErrorKind::InvalidInput.into()))?;
    let mut temporary_name = std::ffi::OsString::from(".");
    temporary_name.push(name);
    temporary_name.push(format!(".{}.part", std::process::id()));
    let temporary = path.with_file_name(temporary_name);
    let written = File::create(&temporary)
        .and_then(|mut file| file.write_all(bytes).and_then(|()| file.sync_all()))
        .and_then(|()| fs::rename(&temporary, path));
    written.map_err(|source| {
        // What could not be made whole is not left behind; if even that fails there is nothing more to do.
        let _ = fs::remove_file(&temporary);
        failed(source)
    })
}

/// Makes a folder and those above it.
///
/// # Errors
/// When it cannot be made.
pub fn make_folder(path: &Path) -> Result<(), WorkError> {
    fs::create_dir_all(path).map_err(|source| WorkError::Write { path: path.to_owned(), source })
}
