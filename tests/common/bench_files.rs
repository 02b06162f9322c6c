//! A run file and its readings, invented, for tests that call the program.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// A folder of its own for one test, empty at the start.
pub(crate) fn folder(name: &str) -> PathBuf {
    let path = Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
    let _ = std::fs::remove_dir_all(&path);
    std::fs::create_dir_all(&path).expect("a folder for the test");
    path
}

/// Calls the program in `folder`.
pub(crate) fn ebbline(folder: &Path, arguments: &[&str]) -> Output {
    let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
    command.current_dir(folder).args(arguments);
    command.output().expect("the program starts")
}

/// Standard output and error as text, and the exit status.
pub(crate) fn said(output: &Output) -> (String, String, i32) {
    (
        String::from_utf8(output.stdout.clone()).expect("UTF-8"),
        String::from_utf8(output.stderr.clone()).expect("UTF-8"),
        output.status.code().unwrap_or(-1),
    )
}

/// A run file that passes its acceptance.
pub(crate) const RUN: &str = r#"record = "bench run"
orifice = "CMF-0417"
gas = "oxygen"
purpose = "acceptance"
taken = "2026-11-12T09:40:00+11:00"
technician = "A. Invented"
readings = "run.csv"

[columns]
pressure = { column = "ip", unit = "bar" }
flow = { column = "flow", unit = "L/min" }
sweep = { column = "sweep" }

[conditions]
temperature = "21.0 °C ± 1.0 °C"
barometer = "1009.2 hPa ± 1.0 hPa"

[meter]
kind = "mass"
reads_at = "20 °C, 101.325 kPa"
made_for = "oxygen"
gain = "0.8 %"
zero = "0.0006 L/min"
noise = "0.2 %"
resolution = "0.0001 L/min"
range = "0.02 L/min to 2 L/min"
certificate = "FM-2026-118"
due = "2027-03-01"

[transducer]
gain = "0.2 %"
zero = "0.010 bar"
noise = "0.004 bar"
resolution = "0.001 bar"
range = "0 bar to 16 bar"
certificate = "PT-2026-031"
due = "2027-03-01"

[acceptance]
ip = "10 bar"
flow = "0.48 L/min"
tolerance = "5 %"
rule = "guarded"
"#;

/// Readings of a straight line through nearly nought: 0.0476 L/min at 20 °C for each bar over −0.9 bar gauge.
pub(crate) fn readings() -> String {
    let mut csv = String::from("ip,flow,sweep\n");
    for (i, step) in [4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 12, 11, 10, 9, 8, 7, 6, 5, 4].iter().enumerate() {
        let pressure = f64::from(*step) + 0.003 * f64::from(i32::try_from(i % 5).unwrap() - 2);
        let flow = 0.0466 * (pressure + 0.95) * (1.0 + 0.0004 * f64::from(i32::try_from(i % 3).unwrap() - 1));
        let sweep = if i < 10 { "rising" } else { "falling" };
        csv.push_str(&format!("{pressure:.3},{flow:.4},{sweep}\n"));
    }
    csv
}

/// Writes both into `folder`.
pub(crate) fn write(folder: &Path, toml: &str, csv: &[u8]) {
    std::fs::write(folder.join("run.toml"), toml).expect("run.toml");
    std::fs::write(folder.join("run.csv"), csv).expect("run.csv");
}
