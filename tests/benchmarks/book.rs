//! The book with many runs, beside the folder of run files it stands in the place of.
//!
//! A book of 100 000 runs of 20 points (1 000 orifices, 100 runs each) is made in a temporary folder, and whole
//! processes of the program are timed on it: the newest runs, one run, one orifice's history. The alternative does the
//! same on a folder that holds one run file for each run: it reads them all, since nothing else says which are the newest
//! or of that orifice. Then 1 000 run files are imported by one call. Aims: under 100 ms each, the import under 20 s.

#![allow(
    clippy::disallowed_methods,
    clippy::print_stdout,
    reason = "a stopwatch asks for the time and tells it"
)]
#![allow(clippy::unwrap_used, reason = "a benchmark that cannot go on has nothing to clean up")]

use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::Instant;

use ebbline::book::{SourceFiles, ToImport};
use ebbline::entry::{Id, Run};
use ebbline::record::read_run;
use ebbline::work::shelf::{Shelf, stamped};

const ORIFICES: usize = 1_000;
const REPETITIONS: usize = 15;

fn main() {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let given = |flag: &str| arguments.iter().any(|a| a == flag);
    // Full size only in earnest; started by `cargo test --benches`, or with --quick, it shows that it works.
    let (runs, imported) = match (given("--bench"), given("--quick")) {
        (true, false) => (100_000, 1_000),
        (true, true) => (10_000, 200),
        (false, _) => (1_000, 10),
    };
    let folder = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("book-benchmark");
    let _ = std::fs::remove_dir_all(&folder);
    std::fs::create_dir_all(&folder).unwrap();
    let book = folder.join("book.db");
    let template = Template::read();
    let before = Instant::now();
    fill(&book, &template, runs);
    let bytes = std::fs::metadata(&book).unwrap().len();
    println!(
        "book of {runs} runs: made in {:.1} s, {:.0} bytes a run",
        before.elapsed().as_secs_f64(),
        bytes as f64 / runs as f64
    );

    let newest = format!("R{runs:04}");
    for (what, call) in [
        ("bench list", vec!["bench", "list"]),
        ("bench show", vec!["bench", "show", &newest]),
        ("orifice show", vec!["orifice", "show", "bench-0007"]),
    ] {
        let seconds = median(|| ebbline(&book, &call));
        println!(
            "{what}: whole process, median {:.1} ms of {REPETITIONS} (aim: under 100 ms)",
            seconds * 1e3
        );
    }
    let files = folder.join("files");
    template.write_files(&files, runs);
    let seconds = median_of(3, || newest_of(&files));
    println!("the alternative, a folder of run files read whole: {:.0} ms", seconds * 1e3);

    let new = folder.join("new");
    let names = template.write_files(&new, imported);
    let before = Instant::now();
    let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
    command.arg("--book").arg(folder.join("imported.db")).args(["bench", "import"]).args(&names);
    assert!(command.stdout(Stdio::null()).stderr(Stdio::null()).status().unwrap().success());
    println!(
        "import of {imported} run files: {:.2} s (aim: under 20 s for 1000)",
        before.elapsed().as_secs_f64()
    );
    std::fs::remove_dir_all(&folder).unwrap();
}

/// The run that all are copies of, under other names.
struct Template {
    run: Run,
    toml: String,
    csv: Vec<u8>,
}

impl Template {
    fn read() -> Self {
        let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/benchmarks/twenty_points.toml");
        let run = read_run(&path).unwrap_or_else(|e| panic!("{e}")).value;
        let toml = std::fs::read_to_string(&path).unwrap();
        Self { run, toml, csv: std::fs::read(path.with_extension("csv")).unwrap() }
    }

    fn orifice(number: usize) -> String {
        format!("bench-{:04}", number % ORIFICES)
    }

    /// The run file of a number: its bytes differ from every other.
    fn toml(&self, number: usize) -> String {
        format!("# {number}\n{}", self.toml.replace("benchmark-twenty-points", &Self::orifice(number)))
    }

    /// One run file for each number, all beside the same readings; their names.
    fn write_files(&self, folder: &Path, count: usize) -> Vec<PathBuf> {
        std::fs::create_dir_all(folder).unwrap();
        std::fs::write(folder.join("twenty_points.csv"), &self.csv).unwrap();
        (0..count)
            .map(|number| {
                let path = folder.join(format!("{number:06}.toml"));
                std::fs::write(&path, self.toml(number)).unwrap();
                path
            })
            .collect()
    }
}

fn fill(path: &Path, template: &Template, runs: usize) {
    let mut book = Shelf::at(path).to_write(&mut Vec::new()).unwrap();
    let numbers: Vec<usize> = (0..runs).collect();
    for batch in numbers.chunks(1_000) {
        let made: Vec<(Run, SourceFiles)> = batch
            .iter()
            .map(|number| {
                let orifice = Id::new(&Template::orifice(*number)).unwrap();
                let files = SourceFiles {
                    run_file_name: format!("{number:06}.toml"),
                    run_file: template.toml(*number).into_bytes(),
                    readings_name: "twenty_points.csv".into(),
                    readings: template.csv.clone(),
                };
                (Run { orifice, ..template.run.clone() }, files)
            })
            .collect();
        let items: Vec<ToImport<'_>> = made.iter().map(|(run, files)| ToImport { run, files }).collect();
        stamped(|stamp| book.import_many(&items, stamp)).unwrap().unwrap();
    }
}

fn ebbline(book: &Path, call: &[&str]) {
    let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
    let status = command.arg("--book").arg(book).args(call).stdout(Stdio::null()).status().unwrap();
    assert!(status.success(), "{call:?}");
}

/// The newest fifty run files of a folder by what they say of themselves.
fn newest_of(folder: &Path) {
    let mut found: Vec<(String, PathBuf)> = std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "toml"))
        .map(|path| {
            let text = std::fs::read_to_string(&path).unwrap();
            let taken = text.lines().find(|line| line.starts_with("taken")).unwrap_or_default().to_owned();
            (taken, path)
        })
        .collect();
    found.sort();
    found.truncate(50);
    std::hint::black_box(found);
}

fn median(work: impl FnMut()) -> f64 {
    median_of(REPETITIONS, work)
}

fn median_of(repetitions: usize, mut work: impl FnMut()) -> f64 {
    work();
    let mut seconds: Vec<f64> = (0..repetitions)
        .map(|_| {
            let before = Instant::now();
            work();
            before.elapsed().as_secs_f64()
        })
        .collect();
    seconds.sort_by(f64::total_cmp);
    seconds[repetitions / 2]
}
