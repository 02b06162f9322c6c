//! `demo` on the terminal: runs it and names what it left.

use serde::Serialize;

use super::arguments::{Demo, Global};
use super::{Ended, note, say, units};
use crate::report::layout::wrapped;
use crate::report::{Units, bench_fit, json_text, session_uptake, setting};
use crate::work::ExitStatus;
use crate::work::demo::{DemoCertificate, DemoDiver, DemoLogged, DemoRun, DemoShop, demo as run_demo};

pub(super) fn demo(arguments: &Demo, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    note(&format!("an invented shop is measured into {} …", arguments.into.display()));
    let demonstration = run_demo(&arguments.into, units)?;
    let (runs, shop, diver) = (&demonstration.runs, &demonstration.shop, &demonstration.diver);
    if global.json {
        let runs = runs.iter().map(Named::of).collect();
        let logged = demonstration.logged.as_ref().map(NamedLogged::of);
        let left = Left {
            runs,
            shop: NamedShop::of(shop),
            certificate: demonstration.certificate.as_ref().map(NamedCertificate::of),
            diver: NamedDiver::of(diver),
            logged,
        };
        return say(&json_text(&left), ExitStatus::Done);
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
    text.push_str(&certificate_text(demonstration.certificate.as_ref()));
    text.push_str(&logged_text(demonstration.logged.as_ref()));
    text.push_str(&diver_text(diver, &units));
    text.push_str("\nTry one yourself (where ebbline is not installed: cargo run --release -- …):\n");
    if let Some(first) = runs.first() {
        text.push_str(&format!("  ebbline bench fit {}\n", first.file.display()));
    }
    let book = shop.book.display();
    text.push_str(&format!("  ebbline --book {book} orifice list\n"));
    text.push_str(&format!("  ebbline --book {book} orifice show {}\n", shop.clogging));
    if let Some((file, _)) = demonstration.certificate.as_ref().and_then(|issued| issued.files.first()) {
        text.push_str(&format!("  ebbline --book {book} certificate check {}\n", file.display()));
    }
    text.push_str(&format!("  ebbline --book {book} session uptake {}\n", DemoDiver::DIVER));
    text.push_str(&format!(
        "  ebbline --book {book} setting --orifice {} --diver {} --first-stage {} \\\n    {} --on {}\n",
        DemoDiver::ORIFICES[0],
        DemoDiver::DIVER,
        DemoDiver::FIRST_STAGE,
        DemoDiver::ASKED,
        diver.on
    ));
    say(&text, ExitStatus::Done)
}

/// The certificate and its amendment.
fn certificate_text(issued: Option<&DemoCertificate>) -> String {
    let Some(issued) = issued else { return String::new() };
    let about = format!(
        "came in dirty, was cleaned and measured again: certificate {}, its amendment {} (an address was wrong), all files \
         checked:",
        issued.number, issued.amendment
    );
    let mut text = String::from("\n");
    text.push_str(&wrapped(&format!("{}: ", issued.orifice), "  ", &about));
    for (path, says) in &issued.files {
        text.push_str(&format!("  {:<9} {}\n", "file", path.display()));
        text.push_str(&wrapped("            ", "              ", says));
    }
    text
}

/// What was logged, if the system has what it takes.
fn logged_text(logged: Option<&DemoLogged>) -> String {
    let Some(logged) = logged else {
        return wrapped(
            "\n",
            "  ",
            "No run was logged: this system has no pseudo-terminals for a simulated bench.",
        );
    };
    let run = logged.run.map_or_else(|| "no run".to_owned(), |run| run.to_string());
    let about = format!(
        "{run}, logged from a simulated bench over its serial ports by a clock that was hastened, {} points; it is another \
         each time:",
        logged.points
    );
    let mut text = String::from("\n");
    text.push_str(&wrapped(&format!("{}: ", logged.orifice), "  ", &about));
    text.push_str(&wrapped("  ", "    ", &logged.says));
    text
}

/// What was made of the diver, and the files it stands in.
fn diver_text(diver: &DemoDiver, units: &Units) -> String {
    let mut text = String::from("\n");
    let about = format!(
        "{} couch sessions on two days, the uptake from them, and the IP to set:",
        diver.sessions.len()
    );
    text.push_str(&wrapped(&format!("{}: ", DemoDiver::DIVER), "  ", &about));
    let named = diver.uptake.named();
    text.push_str(&wrapped(
        "  ",
        "    ",
        &session_uptake::summary_line(&diver.uptake.reported(&named), units),
    ));
    let orifices = diver.setting.named();
    text.push_str(&wrapped("  ", "    ", &setting::summary_line(&diver.setting.reported(&orifices), units)));
    for (what, path) in std::iter::once(("run file", &diver.orifice))
        .chain(diver.sessions.iter().map(|path| ("session", path)))
        .chain(diver.plots.iter().map(|path| ("plot", path)))
        .chain([("plot", &diver.setting_plot), ("sheet", &diver.sheet)])
    {
        text.push_str(&format!("  {what:<9} {}\n", path.display()));
    }
    text
}

/// What `--json` says.
#[derive(Serialize)]
struct Left {
    runs: Vec<Named>,
    shop: NamedShop,
    certificate: Option<NamedCertificate>,
    diver: NamedDiver,
    logged: Option<NamedLogged>,
}

/// What it says of the certificate.
#[derive(Serialize)]
struct NamedCertificate {
    orifice: &'static str,
    number: String,
    amendment: String,
    files: Vec<String>,
    hold: bool,
}

impl NamedCertificate {
    fn of(issued: &DemoCertificate) -> Self {
        Self {
            orifice: issued.orifice,
            number: issued.number.clone(),
            amendment: issued.amendment.clone(),
            files: issued.files.iter().map(|(path, _)| path.display().to_string()).collect(),
            hold: issued.hold,
        }
    }
}

/// What it says of the logged run.
#[derive(Serialize)]
struct NamedLogged {
    run: Option<String>,
    orifice: &'static str,
    points: usize,
    says: String,
}

impl NamedLogged {
    fn of(logged: &DemoLogged) -> Self {
        Self {
            run: logged.run.map(|run| run.to_string()),
            orifice: logged.orifice,
            points: logged.points,
            says: logged.says.clone(),
        }
    }
}

/// What it says of the diver.
#[derive(Serialize)]
struct NamedDiver {
    diver: &'static str,
    orifice: String,
    sessions: Vec<String>,
    plots: Vec<String>,
    setting_plot: String,
    sheet: String,
    uptake: String,
    setting: String,
    on: String,
}

impl NamedDiver {
    fn of(diver: &DemoDiver) -> Self {
        let shown =
            |paths: &[std::path::PathBuf]| paths.iter().map(|path| path.display().to_string()).collect();
        let (named, orifices) = (diver.uptake.named(), diver.setting.named());
        let units = Units::default();
        Self {
            diver: DemoDiver::DIVER,
            orifice: diver.orifice.display().to_string(),
            sessions: shown(&diver.sessions),
            plots: shown(&diver.plots),
            setting_plot: diver.setting_plot.display().to_string(),
            sheet: diver.sheet.display().to_string(),
            uptake: session_uptake::summary_line(&diver.uptake.reported(&named), &units),
            setting: setting::summary_line(&diver.setting.reported(&orifices), &units),
            on: diver.on.to_string(),
        }
    }
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
        let line = bench_fit::verdict_line(&run.outcome.fitted(), &Units::default());
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
