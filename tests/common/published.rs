//! Published figures from `fixtures/reference/`: reads a file and compares a result with a figure as printed.
//!
//! A path such as `printed.slope` or `printed.beta.0` names a value in the file. Figures are kept as text, because the
//! digits printed say how far a result may be off.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::path::Path;
use toml::{Table, Value};

/// One file of published figures.
pub(crate) struct Published {
    name: String,
    table: Table,
}

impl Published {
    /// Reads `fixtures/reference/{folder}/{name}.toml`. A missing file, or one without a source, fails the test.
    pub(crate) fn read(folder: &str, name: &str) -> Self {
        let path = Path::new(env!("CARGO_MANIFEST_DIR"))
            .join("fixtures/reference")
            .join(folder)
            .join(format!("{name}.toml"));
        let text = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
        let table: Table = text.parse().unwrap_or_else(|e| panic!("{}: {e}", path.display()));
        for key in ["document", "edition", "place", "digits", "remark"] {
            let said = table.get("source").and_then(|s| s.get(key)).and_then(Value::as_str);
            assert!(said.is_some_and(|s| !s.is_empty()), "{name}: [source] lacks {key}");
        }
        Self { name: name.to_string(), table }
    }

    /// The value at `path`.
    pub(crate) fn value(&self, path: &str) -> &Value {
        let mut steps = path.split('.');
        let first = steps.next().unwrap();
        let start = self.table.get(first);
        steps
            .fold(start, |at, step| {
                at.and_then(|v| match step.parse::<usize>() {
                    Ok(index) => v.get(index),
                    Err(_) => v.get(step),
                })
            })
            .unwrap_or_else(|| panic!("{}: nothing at {path}", self.name))
    }

    /// The number at `path`, written as a number or as text.
    pub(crate) fn number(&self, path: &str) -> f64 {
        number(self.value(path))
    }

    /// The list of numbers at `path`.
    pub(crate) fn numbers(&self, path: &str) -> Vec<f64> {
        self.value(path)
            .as_array()
            .unwrap_or_else(|| panic!("{path} is no list"))
            .iter()
            .map(number)
            .collect()
    }

    /// Checks `got` against the figure printed at `path`, to half a unit of its last digit.
    pub(crate) fn check(&self, path: &str, got: f64) {
        self.check_within(path, got, half_unit(self.text(path)));
    }

    /// Checks `got` against the figure at `path` to a relative tolerance, where the remark in the file says why.
    pub(crate) fn check_relative(&self, path: &str, got: f64, relative: f64) {
        self.check_within(path, got, relative * self.number(path).abs());
    }

    /// Checks `got` against the figure at `path` to a stated tolerance, where the remark in the file says why.
    pub(crate) fn check_within(&self, path: &str, got: f64, tolerance: f64) {
        let want = self.number(path);
        let difference = (got - want).abs();
        // A hair of rounding, so that a figure that lies on the half unit exactly is not lost to its binary form.
        assert!(
            difference <= tolerance * (1.0 + 1e-9),
            "{path}: got {got}, want {}, difference {difference:e}, tolerance {tolerance:e}\nsource: {}",
            self.value(path),
            self.source()
        );
    }

    /// Whether `got` would be printed as the figure at `path`; for figures that must *not* be met.
    pub(crate) fn meets(&self, path: &str, got: f64) -> bool {
        (got - self.number(path)).abs() <= half_unit(self.text(path))
    }

    /// Document, edition and place.
    pub(crate) fn source(&self) -> String {
        let part = |key: &str| self.value(&format!("source.{key}")).as_str().unwrap().to_string();
        format!("{} ({}), {}", part("document"), part("edition"), part("place"))
    }

    fn text(&self, path: &str) -> &str {
        self.value(path)
            .as_str()
            .unwrap_or_else(|| panic!("{}: {path} must be text, for its digits", self.name))
    }
}

fn number(value: &Value) -> f64 {
    match value {
        Value::Float(v) => *v,
        Value::Integer(v) => *v as f64,
        Value::String(s) => s.parse().unwrap_or_else(|_| panic!("{s} is no number")),
        other => panic!("{other} is no number"),
    }
}

/// Half a unit of the last digit of a printed number, with or without an exponent.
fn half_unit(printed: &str) -> f64 {
    let (digits, exponent) = match printed.split_once(['e', 'E']) {
        Some((digits, exponent)) => (digits, exponent.parse::<i32>().unwrap()),
        None => (printed, 0),
    };
    let decimals = digits.split_once('.').map_or(0, |(_, after)| after.len() as i32);
    0.5 * 10f64.powi(exponent - decimals)
}

#[test]
fn half_a_unit_follows_the_printed_digits() {
    for (printed, want) in
        [("0.4764", 5e-5), ("-12", 0.5), ("0.1653E-01", 5e-6), ("2.0", 0.05), ("1e-3", 5e-4)]
    {
        assert!((half_unit(printed) / want - 1.0).abs() < 1e-12, "{printed}: {}", half_unit(printed));
    }
}
