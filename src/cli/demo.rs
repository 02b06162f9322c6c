//! `demo` on the terminal: runs it and names what it left.

use serde::Serialize;

use super::arguments::{Demo, Global};
use super::{Ended, note, say, units};
use crate::report::bench_fit;
use crate::report::json_text;
use crate::report::layout::wrapped;
use crate::work::ExitStatus;
use crate::work::demo::{DemoRun, DemoShop, demo as run_demo};

pub(super) fn demo(arguments: &Demo, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    note(&format!("an invented shop is measured into {} …", arguments.into.display()));
    let demonstration = run_demo(&arguments.into, units)?;
    let (runs, shop) = (&demonstration.runs, &demonstration.shop);
    if global.json {
        let runs = runs.iter().map(Named::of).collect();
        return say(&json_text(&Left { runs, shop: NamedShop::of(shop) }), ExitStatus::Done);
    }
    let mut text =
        String::from("The demonstration: every orifice, instrument and person in it is invented.\n");
    for run in runs {
        text.push('\n');
        text.push_str(&wrapped("", "  ", &format!("{}: {}", run.outcome.run.orifice, run.about)));
        text.push_str(&wrapped("  ", "    ", &bench_fit::verdict_line(&run.outcome.fitted(), &units)));
        for (what, path) in [("run file", &run.file), ("readings", &run.readings), ("plot", &run.plot)] {
            text.push_str(&format!("  {what:<9} {}\n", path.display()));
        }
    }
    text.push('\n');
    let about = format!(
        "{} orifices over two years, {} runs, every one judged; {} is slowly clogging:",
        shop.orifices, shop.runs, shop.clogging
    );
    text.push_str(&wrapped("The book of the shop: ", "  ", &about));
    for warning in &shop.warnings {
        text.push_str(&wrapped("  ", "    ", warning));
    }
    for (what, path) in [("book", &shop.book), ("files", &shop.files), ("plot", &shop.plot)] {
        text.push_str(&format!("  {what:<9} {}\n", path.display()));
    }
    text.push_str(&wrapped(
        "  ",
        "  ",
        "The files are the same on every machine. The book is not to the byte: when something was recorded, and the salts \
         of its chain, are its own.",
    ));
    text.push_str("\nTry one yourself (where ebbline is not installed: cargo run --release -- …):\n");
    if let Some(first) = runs.first() {
        text.push_str(&format!("  ebbline bench fit {}\n", first.file.display()));
    }
    let book = shop.book.display();
    text.push_str(&format!("  ebbline --book {book} orifice list\n"));
    text.push_str(&format!("  ebbline --book {book} orifice show {}\n", shop.clogging));
    say(&text, ExitStatus::Done)
}

/// What `--json` says.
#[derive(Serialize)]
struct Left {
    runs: Vec<Named>,
    shop: NamedShop,
}

/// What it says of the book.
#[derive(Serialize)]
struct NamedShop {
    book: String,
    files: String,
    orifices: usize,
    runs: usize,
    clogging: &'static str,
    plot: String,
    warnings: Vec<String>,
}

impl NamedShop {
    fn of(shop: &DemoShop) -> Self {
        Self {
            book: shop.book.display().to_string(),
            files: shop.files.display().to_string(),
            orifices: shop.orifices,
            runs: shop.runs,
            clogging: shop.clogging,
            plot: shop.plot.display().to_string(),
            warnings: shop.warnings.clone(),
        }
    }
}

/// What it says of one orifice.
#[derive(Serialize)]
struct Named {
    orifice: String,
    about: &'static str,
    verdict: &'static str,
    says: String,
    run_file: String,
    readings: String,
    plot: String,
}

impl Named {
    fn of(run: &DemoRun) -> Self {
        let line = bench_fit::verdict_line(&run.outcome.fitted(), &crate::report::Units::default());
        Self {
            orifice: run.outcome.run.orifice.to_string(),
            about: run.about,
            verdict: bench_fit::verdict_name(&run.outcome.analysis),
            says: line,
            run_file: run.file.display().to_string(),
            readings: run.readings.display().to_string(),
            plot: run.plot.display().to_string(),
        }
    }
}
