//! Documents set in pages, looked at from outside: as bytes, as text read back by other programs, as faults.

#![allow(clippy::unwrap_used)] // a sample that cannot be set is a failure

#[path = "paper/faults.rs"]
mod faults;
#[path = "paper/hostile.rs"]
mod hostile;
#[path = "paper/inside.rs"]
mod inside;
#[path = "paper/looks.rs"]
mod looks;
#[path = "paper/samples.rs"]
mod samples;
#[path = "paper/tools.rs"]
mod tools;

use std::fs;
use std::path::PathBuf;

use ebbline::certificate::paper::{Document, render};

/// The bytes of a document that can be set.
fn set(document: &Document) -> Vec<u8> {
    render(document).unwrap_or_else(|problems| {
        let words: Vec<String> = problems.iter().map(ToString::to_string).collect();
        panic!("{}", words.join("\n"))
    })
}

/// Written to where one may look at it: `target/tmp/paper`.
fn written(name: &str, document: &Document) -> PathBuf {
    let folder = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("paper");
    fs::create_dir_all(&folder).unwrap();
    let path = folder.join(format!("{name}.pdf"));
    // Tests run side by side: another one may be reading the file of that name.
    let whole = folder.join(format!("{name}-{:?}", std::thread::current().id()));
    fs::write(&whole, set(document)).unwrap();
    fs::rename(&whole, &path).unwrap();
    path
}
