//! The README as a new user meets it: its files are written out, its commands run, its screens compared.
//!
//! A file is a fenced block right below a line that ends with its name in backticks and a colon. A screen is a `text`
//! block: commands behind `$ `, each with what it prints; `[...]` on a line of its own stands for lines left out. The
//! files stay in the folder of Cargo for such things, where `.ci/run` finds them.

#![allow(clippy::unwrap_used, reason = "a test that cannot read or write its own files fails")]

use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

const LEFT_OUT: &str = "[...]";

/// A fenced block of a Markdown text.
struct Block {
    kind: String,
    /// The line of text above it.
    above: String,
    lines: Vec<String>,
}

fn blocks(markdown: &str) -> Vec<Block> {
    let mut blocks = Vec::new();
    let mut open: Option<Block> = None;
    let mut above = String::new();
    for line in markdown.lines() {
        match (line.strip_prefix("```"), open.take()) {
            (Some(kind), None) => {
                open =
                    Some(Block { kind: kind.into(), above: std::mem::take(&mut above), lines: Vec::new() });
            }
            (Some(_), Some(block)) => blocks.push(block),
            (None, Some(mut block)) => {
                block.lines.push(line.into());
                open = Some(block);
            }
            (None, None) if !line.is_empty() => above = line.into(),
            (None, None) => {}
        }
    }
    blocks
}

fn readme() -> Vec<Block> {
    blocks(&fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("README.md")).unwrap())
}

/// Writes the files of the README into a folder of their own and names them.
fn written() -> (PathBuf, Vec<String>) {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("readme");
    fs::create_dir_all(&folder).unwrap();
    let mut names = Vec::new();
    for block in readme() {
        let Some(before) = block.above.strip_suffix("`:") else { continue };
        let name = before.rsplit('`').next().unwrap();
        fs::write(folder.join(name), block.lines.join("\n") + "\n").unwrap();
        names.push(name.to_owned());
    }
    (folder, names)
}

/// The words of a command line; double quotes hold words together.
fn words(line: &str) -> Vec<String> {
    let mut words = vec![String::new()];
    let mut quoted = false;
    for c in line.chars() {
        match c {
            '"' => quoted = !quoted,
            ' ' if !quoted => words.push(String::new()),
            c => words.last_mut().unwrap().push(c),
        }
    }
    words
}

/// Whether a screen shows what was printed, up to what it leaves out.
fn shows(screen: &[String], printed: &str) -> bool {
    let printed: Vec<&str> = printed.lines().collect();
    let mut from = 0;
    let mut free = false;
    for (i, part) in screen.split(|line| line == LEFT_OUT).enumerate() {
        let rest = printed.get(from..).unwrap_or_default();
        let found = match part.len() {
            0 => Some(0),
            n => rest.windows(n).position(|lines| lines == part),
        };
        match found {
            Some(0) => {}
            Some(_) if i > 0 => {}
            _ => return false,
        }
        from += found.unwrap_or(0) + part.len();
        free = part.is_empty() && i > 0;
    }
    free || from == printed.len()
}

#[test]
fn every_screen_is_what_the_program_prints() {
    let (folder, names) = written();
    assert_eq!(names, ["my-orifice.csv", "my-orifice.toml", "fm-01.toml", "couch-1.csv", "couch-1.toml"]);
    let mut shown = 0;
    for block in readme().iter().filter(|block| block.kind == "text") {
        let mut status = None;
        let mut at = 0;
        while at < block.lines.len() {
            let line = block.lines[at].strip_prefix("$ ").expect("a screen starts with a command").to_owned();
            let end = (at + 1..block.lines.len()).find(|i| block.lines[*i].starts_with("$ "));
            let screen = &block.lines[at + 1..end.unwrap_or(block.lines.len())];
            at = end.unwrap_or(block.lines.len());
            let printed = if line == "echo $?" {
                format!("{}\n", status.expect("a command before it"))
            } else {
                let arguments = words(line.strip_prefix("ebbline ").expect("a command of ours"));
                let output = Command::new(env!("CARGO_BIN_EXE_ebbline"))
                    .args(arguments)
                    .current_dir(&folder)
                    .output()
                    .unwrap();
                status = output.status.code();
                String::from_utf8([output.stdout, output.stderr].concat()).unwrap()
            };
            assert!(
                shows(screen, &printed),
                "README shows of `{line}`:\n{}\n\nprinted:\n{printed}",
                screen.join("\n")
            );
            shown += 1;
        }
    }
    assert!(shown >= 3, "only {shown} commands are shown");
}

#[test]
fn the_profile_it_shows_can_be_registered() {
    let (folder, _) = written();
    let book = folder.join("profile.db");
    let _ = fs::remove_file(&book);
    let mut program = Command::new(env!("CARGO_BIN_EXE_ebbline"));
    let added = program.args(["instrument", "add", "fm-01.toml"]).current_dir(&folder);
    let added = added.env("EBBLINE_BOOK", &book).output().unwrap();
    assert!(added.status.success(), "{}", String::from_utf8_lossy(&added.stderr));
}

#[test]
fn a_screen_that_differs_is_noticed() {
    let screen = |text: &str| text.lines().map(str::to_owned).collect::<Vec<_>>();
    for (shown, same) in [
        ("a\nb\nc", true),
        ("a\n[...]\nc", true),
        ("[...]\nc", true),
        ("a\n[...]", true),
        ("a\nb", false),
        ("b\nc", false),
        ("a\nc", false),
        ("a\n[...]\nd", false),
        ("c\n[...]\na", false),
    ] {
        assert_eq!(shows(&screen(shown), "a\nb\nc\n"), same, "{shown:?}");
    }
}
