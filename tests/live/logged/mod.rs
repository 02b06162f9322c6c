//! The program as a technician has it: a simulated bench on pseudo-terminals in one process, the logger in another.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(dead_code, reason = "each test file uses its own part")]

use std::path::{Path, PathBuf};
use std::process::{Child, Command, Output, Stdio};
use std::time::Duration;

use ebbline::book::{Book, Options};
use ebbline::entry::RunNumber;

/// A folder with a rig at work and a book whose register knows the rig's instruments.
pub(crate) struct Bench {
    pub(crate) folder: PathBuf,
    rig: Child,
}

impl Drop for Bench {
    fn drop(&mut self) {
        let _ = self.rig.kill();
        let _ = self.rig.wait();
    }
}

impl Bench {
    /// Begins a rig with what its command line says beside the folder, and registers its instruments.
    pub(crate) fn new(name: &str, rig: &[&str]) -> Self {
        let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(format!("logged-{name}"));
        let _ = std::fs::remove_dir_all(&folder);
        std::fs::create_dir_all(&folder).unwrap();
        let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
        command.args(["rig", "--into", "rig"]).args(rig).current_dir(&folder);
        let rig = command.stdin(Stdio::null()).stdout(Stdio::null()).stderr(Stdio::null()).spawn().unwrap();
        let bench = Self { folder, rig };
        bench.wait_for("the rig's ports", || bench.folder.join("rig/rig-flow.toml").exists());
        bench.wait_for("the rig's log", || !bench.sent_text().is_empty());
        let mut profiles: Vec<String> = std::fs::read_dir(bench.folder.join("rig"))
            .unwrap()
            .map(|entry| entry.unwrap().path())
            .filter(|path| path.extension().is_some_and(|ending| ending == "toml"))
            .map(|path| path.to_str().unwrap().to_owned())
            .collect();
        profiles.sort();
        for profile in &profiles {
            let added = bench.program(&["instrument", "add", profile]);
            assert!(added.status.success(), "{}", String::from_utf8_lossy(&added.stderr));
        }
        bench
    }

    pub(crate) fn wait_for(&self, what: &str, is_there: impl Fn() -> bool) {
        let began_s = now_s();
        while !is_there() {
            assert!(now_s() - began_s < 20.0, "{what} did not come within 20 s");
            std::thread::sleep(Duration::from_millis(20));
        }
    }

    pub(crate) fn book(&self) -> PathBuf {
        self.folder.join("book.db")
    }

    fn command(&self, arguments: &[&str]) -> Command {
        let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
        command.args(arguments).current_dir(&self.folder).env("EBBLINE_BOOK", self.book()).env_remove("TERM");
        command
    }

    /// Runs the program to its end.
    pub(crate) fn program(&self, arguments: &[&str]) -> Output {
        self.command(arguments).stdin(Stdio::null()).output().unwrap()
    }

    /// Begins the program; stdout is piped.
    pub(crate) fn child(&self, arguments: &[&str]) -> Child {
        let mut command = self.command(arguments);
        command.stdin(Stdio::null()).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap()
    }

    /// The book, opened for reading.
    pub(crate) fn open(&self) -> Book {
        Book::open_to_read(&self.book(), &Options::default()).unwrap()
    }

    /// Checks the book from outside.
    pub(crate) fn holds(&self) {
        let checked = self.program(&["book", "check"]);
        let says = String::from_utf8_lossy(&checked.stderr);
        assert!(checked.status.success(), "{}{says}", String::from_utf8_lossy(&checked.stdout));
    }

    fn sent_text(&self) -> String {
        std::fs::read_to_string(self.folder.join("rig/sent.jsonl")).unwrap_or_default()
    }

    /// What the rig sent of an instrument and was not lost before anybody read it: seconds since 1970, and the value.
    /// A last line that is still being written is left away.
    pub(crate) fn sent(&self, instrument: &str) -> Vec<(f64, f64)> {
        let text = self.sent_text();
        let whole = text.rfind('\n').map_or("", |end| &text[..end]);
        let mut sent = Vec::new();
        for line in whole.lines() {
            let line: serde_json::Value = serde_json::from_str(line).unwrap();
            if line["lost"].as_bool() == Some(true) || !line["faults"].as_array().unwrap().is_empty() {
                continue;
            }
            for meant in line["meant"].as_array().unwrap() {
                if meant["instrument"] == instrument {
                    sent.push((line["time_s"].as_f64().unwrap(), meant["value"].as_f64().unwrap()));
                }
            }
        }
        sent
    }

    /// All readings of an instrument that the book has of a run: seconds since 1970, and the number shown.
    pub(crate) fn kept(&self, run: RunNumber, instrument: &str) -> Vec<(f64, f64)> {
        let book = self.open();
        let taken = book.run(run).unwrap().run.taken;
        let began_s = taken.timestamp_millis() as f64 / 1e3;
        let of = |readings: &ebbline::entry::LiveReadings| readings.instrument.as_str() == instrument;
        let all = book.live_readings(run).unwrap();
        let all = all.iter().filter(|readings| of(readings));
        all.flat_map(|readings| readings.at_s.iter().map(|at_s| began_s + at_s).zip(readings.shown.clone()))
            .collect()
    }
}

/// Seconds since 1970, as the rig writes them.
pub(crate) fn now_s() -> f64 {
    ebbline::clock::now().timestamp_millis() as f64 / 1e3
}
