//! Documents set in pages, looked at from outside: as bytes, as text read back by other programs, as faults.

mod faults;
mod hostile;
mod inside;
mod looks;
mod samples;
mod tools;

use std::fs;
use std::path::PathBuf;

use ebbline::certificate::paper::{Document, render};

/// The bytes of a document that can be set.
pub(crate) fn set(document: &Document) -> Vec<u8> {
    render(document).unwrap_or_else(|problems| {
        let words: Vec<String> = problems.iter().map(ToString::to_string).collect();
        panic!("{}", words.join("\n"))
    })
}

/// Written to where one may look at it: `target/tmp/paper`.
pub(crate) fn written(name: &str, document: &Document) -> PathBuf {
    let folder = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("paper");
    fs::create_dir_all(&folder).unwrap();
    let path = folder.join(format!("{name}.pdf"));
    // Tests run side by side: another one may be reading the file of that name.
    let whole = folder.join(format!("{name}-{:?}", std::thread::current().id()));
    fs::write(&whole, set(document)).unwrap();
    fs::rename(&whole, &path).unwrap();
    path
}
