//! What the compiler does not check about the house: who knows whom, what stays out of the pure rooms, and a few
//! habits of the tree.
//!
//! The arrows between rooms stand in `tidy/rooms.rs`; how a source is read, in `tidy/source.rs`. Each rule is a
//! function from text to complaints, and is shown to complain before it is used on the tree.

#![allow(clippy::unwrap_used, reason = "a test that cannot read the tree fails")]

#[path = "tidy/rooms.rs"]
mod rooms;
#[path = "tidy/source.rs"]
mod source;

use std::fs;
use std::path::{Path, PathBuf};

use rooms::{Kind, ROOMS};
use source::{Named, Source};

/// Lines a source file may have; one subject seldom needs them.
const MOST_LINES: usize = 700;
/// Lines DEVELOPERS.md may have.
const MOST_LINES_FOR_DEVELOPERS: usize = 200;
/// Longer sources, each with the lines it may have and its reason.
const LONGER: &[(&str, usize, &str)] =
    &[("tests/published/published_stats.rs", 750, "a table of published examples, one check after another")];

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Every file below a folder of the tree, as paths from the root with `/`, in order. Folders that are made by running
/// things are passed over.
fn files_below(folder: &str) -> Vec<String> {
    const MADE: &[&str] = &["target", ".git", "ebbline-demo", ".venv", "__pycache__"];
    let mut found = Vec::new();
    let mut open: Vec<PathBuf> = vec![root().join(folder)];
    while let Some(folder) = open.pop() {
        for entry in fs::read_dir(&folder).unwrap_or_else(|e| panic!("{}: {e}", folder.display())) {
            let path = entry.unwrap().path();
            if MADE.iter().any(|made| path.file_name().is_some_and(|name| name == *made)) {
                continue;
            }
            if path.is_dir() {
                open.push(path);
            } else {
                let below = path.strip_prefix(root()).unwrap();
                let parts: Vec<_> = below.iter().map(|part| part.to_string_lossy().into_owned()).collect();
                found.push(parts.join("/"));
            }
        }
    }
    found.sort();
    found
}

fn text_of(path: &str) -> String {
    fs::read_to_string(root().join(path)).unwrap_or_else(|e| panic!("{path}: {e}"))
}

/// The text of every file of the tree that is text.
fn all_texts() -> Vec<(String, String)> {
    let texts: Vec<(String, String)> = files_below("")
        .into_iter()
        .filter_map(|path| fs::read_to_string(root().join(&path)).ok().map(|text| (path, text)))
        .collect();
    assert!(texts.len() > 50, "only {} files: is this the tree?", texts.len());
    texts
}

/// A file of a room, read.
struct RoomFile {
    path: String,
    room: &'static str,
    /// How many modules lie between the room and this file: 0 for its `mod.rs`.
    depth: usize,
    /// Whether the whole file is tests.
    tests: bool,
    source: Source,
}

impl RoomFile {
    /// A file of `src/` by its path, or none when it stands outside every room.
    fn of(path: &str, text: &str, tests: bool) -> Option<Self> {
        let parts: Vec<&str> = path.strip_prefix("src/")?.split('/').collect();
        let (room, inner) = parts.split_first()?;
        let file = inner.last()?;
        let depth = if *file == "mod.rs" { inner.len() - 1 } else { inner.len() };
        let room = rooms::find(room).unwrap_or_else(|| panic!("{path}: the house has no room {room}")).name;
        Some(Self { path: path.to_owned(), room, depth, tests, source: Source::of(text) })
    }

    fn at(&self, named: &Named) -> String {
        format!("{}:{}", self.path, named.line)
    }

    /// Rooms named, each with the item behind it.
    fn rooms_named(&self) -> impl Iterator<Item = (&Named, &str, &str)> {
        self.source.paths.iter().filter_map(|named| {
            let segments = &named.segments;
            let ups = segments.iter().take_while(|s| *s == "super").count();
            let first = match segments[0].as_str() {
                "crate" => 1,
                // As many steps up as there are modules around reach the room itself; one more leaves it.
                _ if ups > self.depth + named.inline_modules => ups,
                _ => return None,
            };
            let room = segments.get(first)?;
            Some((named, room.as_str(), segments.get(first + 1).map_or("", String::as_str)))
        })
    }

    /// Paths and macros that are not in tests.
    fn working_names(&self) -> impl Iterator<Item = &Named> {
        let all = self.source.paths.iter().chain(&self.source.macros);
        all.filter(|named| !named.in_tests && !self.tests)
    }
}

fn room_files() -> Vec<RoomFile> {
    let paths: Vec<String> =
        files_below("src").into_iter().filter(|p| p.ends_with(".rs") && p.matches('/').count() > 1).collect();
    // A file declared under #[cfg(test)] is tests as a whole.
    let mut tests = Vec::new();
    for path in &paths {
        let folder = path.trim_end_matches("/mod.rs").trim_end_matches(".rs");
        for module in Source::of(&text_of(path)).test_modules {
            tests.push(format!("{folder}/{module}.rs"));
        }
    }
    let files: Vec<_> =
        paths.iter().filter_map(|p| RoomFile::of(p, &text_of(p), tests.contains(p))).collect();
    assert!(files.len() > 40, "only {} files in rooms", files.len());
    files
}

/// Fails with every complaint.
#[track_caller]
fn none(complaints: &[String]) {
    assert!(complaints.is_empty(), "\n{}\n", complaints.join("\n"));
}

// ---- rooms ----

fn forbidden_arrows(file: &RoomFile) -> Vec<String> {
    file.rooms_named()
        .filter(|(_, room, item)| !rooms::allowed(file.room, room, item))
        .map(|(named, room, item)| format!("{}: {} may not know {room}::{item}", file.at(named), file.room))
        .collect()
}

/// What a pure room may not name.
fn impurities(file: &RoomFile) -> Vec<String> {
    if rooms::find(file.room).is_some_and(|room| room.kind == Kind::World) {
        return Vec::new();
    }
    let impure = |named: &&Named| {
        let segments: Vec<&str> = named.segments.iter().map(String::as_str).collect();
        match segments.as_slice() {
            ["std", "fs" | "net" | "env" | "process" | "io" | "os" | "path", ..] => true,
            ["std", "time", item, ..] => *item != "Duration",
            ["rand", ..]
            | ["getrandom", ..]
            | [.., "from_os_rng" | "from_entropy" | "thread_rng" | "OsRng"] => true,
            _ => false,
        }
    };
    let names = file.working_names().filter(impure);
    names
        .map(|n| format!("{}: {} in the pure room {}", file.at(n), n.segments.join("::"), file.room))
        .collect()
}

/// Only `cli` speaks to the terminal; only `clock` asks for the time.
fn out_of_place(file: &RoomFile) -> Vec<String> {
    let wrong = |named: &&Named| match named.segments.last().map(String::as_str) {
        Some("println" | "print" | "eprintln" | "eprint" | "stdout" | "stderr" | "stdin") => {
            file.room != "cli"
        }
        // `clock::now` is how every other room that may know the time is told it.
        Some("now") => {
            file.room != "clock" && named.segments.iter().rev().nth(1).map(String::as_str) != Some("clock")
        }
        _ => false,
    };
    let names = file.working_names().filter(wrong);
    names
        .map(|n| format!("{}: {} does not belong into {}", file.at(n), n.segments.join("::"), file.room))
        .collect()
}

#[test]
fn rooms_know_only_the_rooms_they_may() {
    let files = room_files();
    none(&files.iter().flat_map(forbidden_arrows).collect::<Vec<_>>());
    let arrows = files.iter().flat_map(RoomFile::rooms_named).count();
    assert!(arrows > 50, "only {arrows} arrows were found");
}

#[test]
fn pure_rooms_touch_nothing_outside() {
    none(&room_files().iter().flat_map(impurities).collect::<Vec<_>>());
}

#[test]
fn only_cli_speaks_to_the_terminal_and_only_clock_asks_for_the_time() {
    none(&room_files().iter().flat_map(out_of_place).collect::<Vec<_>>());
}

#[test]
fn the_library_declares_its_rooms_in_reading_order() {
    let declared = Source::of(&text_of("src/lib.rs")).modules;
    let built: Vec<&str> =
        ROOMS.iter().map(|room| room.name).filter(|r| declared.iter().any(|d| d == r)).collect();
    assert_eq!(declared, built);
}

#[test]
fn the_binary_knows_only_cli() {
    let main = Source::of(&text_of("src/main.rs"));
    for named in main.paths.iter().filter(|named| named.segments[0] == "ebbline") {
        assert_eq!(named.segments.get(1).map(String::as_str), Some("cli"), "src/main.rs:{}", named.line);
    }
}

/// The complaints of a rule about a made-up file.
fn about(rule: fn(&RoomFile) -> Vec<String>, path: &str, text: &str) -> usize {
    rule(&RoomFile::of(path, text, false).expect("a room's file")).len()
}

#[test]
fn a_forbidden_arrow_is_found_however_it_is_written() {
    for (path, text) in [
        ("src/gas/orifice.rs", "use crate::stats::line;"),
        ("src/gas/orifice.rs", "use crate::{quantity::Length, bench};"),
        ("src/gas/orifice.rs", "use crate::{\n    quantity::{Length, Volume as V},\n    bench::{Point},\n};"),
        ("src/gas/orifice.rs", "fn f() -> f64 { crate::bench::Point::default().flow_u }"),
        ("src/gas/orifice.rs", "use super::super::bench;"),
        ("src/gas/mod.rs", "use super::bench;"),
        ("src/gas/mod.rs", "mod tests { use super::super::bench::Point; }"),
        ("src/stats/line.rs", "use crate::quantity::Length;"),
        ("src/entry/run.rs", "use crate::gas::saturation_pressure;"),
        ("src/book/rows.rs", "use crate::bench::Analysis;"),
        ("src/book/rows.rs", "use crate::gas::{Species, at_depth};"),
        ("src/page/mod.rs", "use crate::bench::Analysis;"),
        ("src/cli/mod.rs", "use crate::record::read_run;"),
        ("src/report/mod.rs", "use crate::cli;"),
        ("src/report/mod.rs", "use crate::attic::Thing;"),
    ] {
        assert_eq!(about(forbidden_arrows, path, text), 1, "{path}: {text}");
    }
}

#[test]
fn an_allowed_arrow_and_a_mere_mention_are_not() {
    for (path, text) in [
        ("src/gas/orifice.rs", "use crate::quantity::{Length, text};"),
        (
            "src/gas/orifice.rs",
            "use super::{Species, water};\nmod tests { use super::*; use super::super::Species; }",
        ),
        ("src/gas/orifice.rs", "//! See [`crate::bench`].\n/* use crate::bench; /* crate::cli */ */"),
        ("src/gas/orifice.rs", "const A: &str = \"crate::bench\"; const B: &str = r#\"\"crate::bench\"#;"),
        ("src/gas/orifice.rs", "fn f<'a>(x: &'a str) -> (char, char) { ('\"', '\\'') } // crate::bench"),
        ("src/entry/run.rs", "use crate::gas::Species;"),
        ("src/book/rows.rs", "use crate::gas::Species; use crate::entry::Run;"),
        ("src/cli/mod.rs", "use crate::{page, plot, report, work}; pub(crate) fn f() {}"),
    ] {
        assert_eq!(about(forbidden_arrows, path, text), 0, "{path}: {text}");
    }
}

#[test]
fn an_impure_line_is_found_outside_tests_alone() {
    for text in [
        "use std::fs::File;",
        "use std::{fmt, io};",
        "fn f() { let _ = std::env::var(\"HOME\"); }",
        "use std::time::{Duration, Instant};",
        "fn f() { let _ = rand_chacha::ChaCha8Rng::from_os_rng(); }",
        "#[cfg(test)]\nmod tests { fn t() {} }\nuse std::net::TcpStream;",
    ] {
        assert_eq!(about(impurities, "src/bench/mod.rs", text), 1, "{text}");
        assert_eq!(about(impurities, "src/work/mod.rs", text), 0, "{text}");
    }
    for text in
        ["use std::time::Duration;", "#[cfg(test)]\nmod tests { use std::fs; }", "use std::fmt::Write as _;"]
    {
        assert_eq!(about(impurities, "src/bench/mod.rs", text), 0, "{text}");
    }
}

#[test]
fn a_word_to_the_terminal_or_to_the_clock_is_found() {
    for text in
        ["fn f() { println!(\"x\"); }", "fn f() { std::io::stderr(); }", "fn f() { io::stdout().lock(); }"]
    {
        assert_eq!(about(out_of_place, "src/work/mod.rs", text), 1, "{text}");
        assert_eq!(about(out_of_place, "src/cli/mod.rs", text), 0, "{text}");
    }
    for text in ["fn f() { let t = std::time::Instant::now(); }", "fn f() { Utc::now(); }"] {
        assert_eq!(about(out_of_place, "src/cli/mod.rs", text), 1, "{text}");
        assert_eq!(about(out_of_place, "src/clock/mod.rs", text), 0, "{text}");
    }
    assert_eq!(
        about(out_of_place, "src/work/mod.rs", "#[cfg(test)] mod tests { fn t() { print!(\"x\"); } }"),
        0
    );
}

// ---- habits of the tree ----

/// What a file of text may not hold. The words are put together here, so that this file does not hold them.
fn unfinished_or_local(text: &str) -> Vec<String> {
    let words = [
        concat!("TO", "DO"),
        concat!("FIX", "ME"),
        concat!("XX", "X"),
        concat!("to", "do!"),
        concat!("unimple", "mented!"),
        concat!("#[", "ignore"),
    ];
    let folders = ["home", "root", "work", "tmp", "Users", "mnt"];
    let mut complaints = Vec::new();
    for (number, line) in text.lines().enumerate() {
        let mut bad: Vec<String> =
            words.iter().filter(|word| line.contains(*word)).map(ToString::to_string).collect();
        for folder in folders {
            let path = format!("/{folder}");
            // The folder of a machine starts a path; `src/work` does not.
            bad.extend(
                line.match_indices(&path)
                    .filter(|(i, _)| {
                        let before = line[..*i].chars().next_back();
                        let after = line[i + path.len()..].chars().next();
                        !before.is_some_and(|c| c.is_alphanumeric() || "._-~/}{)$".contains(c))
                            && after.is_none_or(|c| c == '/' || !(c.is_alphanumeric() || "_-.".contains(c)))
                    })
                    .map(|(_, found)| found.to_owned()),
            );
        }
        complaints.extend(bad.into_iter().map(|what| format!("line {}: {what}", number + 1)));
    }
    complaints
}

#[test]
fn nothing_is_unfinished_and_no_path_of_a_machine_is_named() {
    let mut complaints = Vec::new();
    for (path, text) in all_texts() {
        if path != "Cargo.lock" {
            complaints.extend(unfinished_or_local(&text).into_iter().map(|c| format!("{path}, {c}")));
        }
    }
    none(&complaints);
    let slash = "/";
    for line in [
        format!("cd {slash}work && ls"),
        format!("\"{slash}home/ada/x\""),
        format!("// {}: later", concat!("TO", "DO")),
    ] {
        assert_eq!(unfinished_or_local(&line).len(), 1, "{line}");
    }
    assert!(unfinished_or_local("src/work/fit.rs, /working, https://example.org/home, bar/home").is_empty());
}

#[test]
fn no_source_is_longer_than_one_subject_needs() {
    let mut complaints = Vec::new();
    for path in files_below("src").into_iter().chain(files_below("tests")).filter(|p| p.ends_with(".rs")) {
        let lines = text_of(&path).lines().count();
        let most =
            LONGER.iter().find(|(longer, _, _)| *longer == path).map_or(MOST_LINES, |(_, most, _)| *most);
        if lines > most {
            complaints.push(format!("{path}: {lines} lines, at most {most}"));
        }
    }
    for (path, _, why) in LONGER {
        if text_of(path).lines().count() <= MOST_LINES {
            complaints.push(format!("{path} is short enough by now: strike it from the list ({why})"));
        }
    }
    let lines = text_of("DEVELOPERS.md").lines().count();
    if lines > MOST_LINES_FOR_DEVELOPERS {
        complaints.push(format!("DEVELOPERS.md: {lines} lines, at most {MOST_LINES_FOR_DEVELOPERS}"));
    }
    none(&complaints);
}

/// Whether published data say where they are from.
fn says_its_source(path: &str, text: &str) -> bool {
    if path.ends_with(".toml") {
        let table: toml::Table = text.parse().unwrap_or_else(|e| panic!("{path}: {e}"));
        let source = table.get("source").and_then(toml::Value::as_table);
        let document = source.and_then(|s| s.get("document")).and_then(toml::Value::as_str);
        return document.is_some_and(|d| !d.is_empty());
    }
    text.lines()
        .take_while(|l| l.starts_with('#'))
        .any(|l| l.strip_prefix("# source: ").is_some_and(|s| s.len() > 10))
}

#[test]
fn every_published_figure_says_its_source() {
    let mut seen = 0;
    let mut complaints = Vec::new();
    for path in files_below("fixtures/reference") {
        if path.ends_with(".md") {
            continue;
        }
        seen += 1;
        if !says_its_source(&path, &text_of(&path)) {
            complaints.push(format!("{path} does not say its source"));
        }
    }
    none(&complaints);
    assert!(seen > 20, "only {seen} files of published data");
    assert!(!says_its_source("a.csv", "x,y\n1,2\n") && !says_its_source("a.toml", "x = 1"));
    assert!(says_its_source("a.csv", "# source: somebody, somewhere 2010\nx,y\n1,2\n"));
}

#[test]
fn continuous_integration_runs_the_command_of_the_readme() {
    let readme = text_of("README.md");
    assert!(readme.contains("\ncargo test\n") && readme.contains("\ncargo run --release -- demo\n"));
    assert!(text_of(".ci/run").lines().any(|line| line.trim() == "cargo test"));
}

/// The verbs that do something, with the ones they stand under: `bench fit`.
fn verbs(command: &clap::Command, before: &str) -> Vec<String> {
    let mut found = Vec::new();
    for verb in command.get_subcommands().filter(|verb| verb.get_name() != "help") {
        let name = format!("{before}{}", verb.get_name());
        if verb.has_subcommands() {
            found.extend(verbs(verb, &format!("{name} ")));
        } else {
            found.push(name);
        }
    }
    found
}

/// The verbs in the table under "Commands": in the first cell, the words before an argument or an option. Single words
/// that follow, each in its own backticks, stand in the place of the last word: "`a b`, `c`" is `a b` and `a c`.
fn verbs_of_readme(readme: &str) -> Vec<String> {
    let rows =
        readme.lines().skip_while(|l| *l != "## Commands").skip(1).take_while(|l| !l.starts_with("## "));
    let is_word = |w: &&str| w.chars().all(|c| c.is_lowercase() || c == '-') && !w.starts_with('-');
    let mut verbs = Vec::new();
    for cell in rows.filter_map(|row| row.strip_prefix("| `")?.split(" | ").next()) {
        let mut quoted = cell.split('`').step_by(2);
        let first: Vec<&str> = quoted.next().unwrap_or_default().split(' ').take_while(is_word).collect();
        // The table of options beside it has no word before its dash.
        let Some((_, before)) = first.split_last() else { continue };
        verbs.push(first.join(" "));
        verbs.extend(quoted.filter(|w| is_word(w)).map(|word| [before, &[word]].concat().join(" ")));
    }
    verbs
}

#[test]
fn the_readme_lists_the_verbs_there_are() {
    use clap::CommandFactory as _;
    let mut there = verbs(&ebbline::cli::arguments::Arguments::command(), "");
    let mut listed = verbs_of_readme(&text_of("README.md"));
    there.sort();
    listed.sort();
    assert_eq!(listed, there);
    assert_eq!(
        verbs_of_readme(
            "## Commands\n| `a b FILE [--x]` | y |\n| `a c`, `d` or `F` | `e` |\n| `man` | z |\n| `--y` | w |\n## Next\n| `no` |"
        ),
        ["a b", "a c", "a d", "man"]
    );
}
