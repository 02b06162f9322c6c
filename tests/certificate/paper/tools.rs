//! Other programs that read PDF: poppler's tools and qpdf. Where they are not installed the checks that need them are
//! left out, and say so; with EBBLINE_PDF_TOOLS set that is a failure.

use std::io::Write as _;
use std::path::Path;
use std::process::Command;

/// What a program prints about a file, or nothing where it is not installed. A status other than 0 is a failure.
pub(crate) fn ask(program: &str, before: &[&str], file: &Path, after: &[&str]) -> Option<String> {
    let output = match Command::new(program).args(before).arg(file).args(after).output() {
        Ok(output) => output,
        Err(e) if e.kind() == std::io::ErrorKind::NotFound => {
            assert!(std::env::var_os("EBBLINE_PDF_TOOLS").is_none(), "{program} is not installed");
            // Past the capture of the test harness, which would swallow it.
            let said = format!("NOT RUN: {program} is not installed (packages poppler-utils and qpdf)\n");
            std::io::stderr().write_all(said.as_bytes()).unwrap();
            return None;
        }
        Err(e) => panic!("{program}: {e}"),
    };
    let words = String::from_utf8_lossy(&output.stderr).into_owned();
    assert!(output.status.success(), "{program} on {}: {words}", file.display());
    // Older poppler takes a switch of tagged PDF for another type.
    let odd: Vec<&str> =
        words.lines().filter(|line| !line.contains("Suspects object is wrong type")).collect();
    assert!(odd.is_empty(), "{program} on {}: {odd:?}", file.display());
    Some(String::from_utf8_lossy(&output.stdout).into_owned())
}

/// A text without white space of any kind.
pub(crate) fn letters(text: &str) -> String {
    text.chars().filter(|c| !c.is_whitespace() && *c != '\u{A0}').collect()
}
