//! Documents set in pages, looked at from outside: as bytes, as text read back by other programs, as faults.

#![allow(clippy::unwrap_used)] // a sample that cannot be set is a failure

#[path = "paper/samples.rs"]
mod samples;

use std::fs;
use std::path::PathBuf;

use ebbline::certificate::paper::*;

/// Where samples are written for looking.
fn written(name: &str, document: &Document) -> PathBuf {
    let folder = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("paper");
    fs::create_dir_all(&folder).unwrap();
    let path = folder.join(format!("{name}.pdf"));
    let bytes = render(document).unwrap_or_else(|problems| {
        let words: Vec<String> = problems.iter().map(ToString::to_string).collect();
        panic!("{name}: {}", words.join("\n"))
    });
    fs::write(&path, bytes).unwrap();
    path
}

#[test]
fn samples_are_written_for_looking() {
    written("certificate", &samples::certificate());
    written("letter", &samples::on(Paper::Letter));
    written("a5", &samples::on(Paper::A5));
}
