//! A folder with a book in it, and the program called on that book.

#![allow(dead_code, clippy::unwrap_used, reason = "a test may panic, and not every test calls every helper")]

use std::path::{Path, PathBuf};
use std::process::Command;

use serde_json::Value;

/// A folder of its own for one test, empty at the start, with a book `book.db` once something is written.
pub(crate) struct Desk {
    pub(crate) folder: PathBuf,
}

/// What a call came to.
#[derive(Debug)]
pub(crate) struct Said {
    pub(crate) stdout: String,
    pub(crate) stderr: String,
    pub(crate) status: i32,
}

impl Desk {
    pub(crate) fn new(name: &str) -> Self {
        let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("desk").join(name);
        let _ = std::fs::remove_dir_all(&folder);
        std::fs::create_dir_all(&folder).unwrap();
        Self { folder }
    }

    pub(crate) fn book(&self) -> PathBuf {
        self.folder.join("book.db")
    }

    pub(crate) fn write(&self, name: &str, bytes: impl AsRef<[u8]>) {
        let path = self.folder.join(name);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(path, bytes).unwrap();
    }

    pub(crate) fn read(&self, name: &str) -> String {
        std::fs::read_to_string(self.folder.join(name)).unwrap_or_else(|e| panic!("{name}: {e}"))
    }

    /// Calls the program on `book.db`.
    pub(crate) fn call(&self, arguments: &[&str]) -> Said {
        self.call_on("book.db", arguments)
    }

    /// Calls the program on another book of the folder.
    pub(crate) fn call_on(&self, book: &str, arguments: &[&str]) -> Said {
        let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
        command.current_dir(&self.folder).args(["--book", book]).args(arguments);
        let output = command.output().unwrap();
        let text = |bytes: Vec<u8>| String::from_utf8(bytes).unwrap();
        let status = output.status.code().unwrap_or(-1);
        Said { stdout: text(output.stdout), stderr: text(output.stderr), status }
    }

    /// Calls it and expects success; its stdout.
    #[track_caller]
    pub(crate) fn done(&self, arguments: &[&str]) -> String {
        let said = self.call(arguments);
        assert_eq!(said.status, 0, "{arguments:?}: {said:?}");
        said.stdout
    }

    /// Calls it with `--json` and expects success; what it says.
    #[track_caller]
    pub(crate) fn json(&self, arguments: &[&str]) -> Value {
        let text = self.done(&[&["--json"], arguments].concat());
        serde_json::from_str(&text).unwrap_or_else(|e| panic!("{e}: {text}"))
    }

    /// Calls it and expects to be refused with one sentence that holds `says`, nothing on stdout.
    #[track_caller]
    pub(crate) fn refused(&self, arguments: &[&str], status: i32, says: &str) {
        let said = self.call(arguments);
        assert_eq!(said.status, status, "{arguments:?}: {said:?}");
        assert!(said.stdout.is_empty(), "{arguments:?}: {said:?}");
        assert!(said.stderr.contains(says), "{arguments:?}: {:?} does not say {says:?}", said.stderr);
    }
}

/// A file of the invented entries.
pub(crate) fn fixture(name: &str) -> String {
    format!("{}/fixtures/registers/{name}.toml", env!("CARGO_MANIFEST_DIR"))
}
