//! One run of the demonstration that is logged: from the simulated bench over pseudo-terminals, as from real meters.
//!
//! Rig and logger go by one clock that is faster than the machine's, so that a run of three minutes takes a quarter of a
//! minute; everything else is what `bench log` does. What is logged depends on when bytes arrive, so this run is not the same
//! twice, and says so. Left out where the system has no pseudo-terminals.

use std::path::Path;
use std::sync::Arc;

use crate::book::Entry;
use crate::clock::{self, Hastened, Ticks};
use crate::entry::{Instrument, Measures, RunNumber};
use crate::instrument::{Hurried, SystemPorts};
use crate::quantity::{Length, Span};
use crate::report::Units;
use crate::report::bench_live::BenchView;
use crate::report::enter_words::running;
use crate::rig::{Hole, OfTicks, Rig, Script, Settings};
use crate::work::WorkError;
use crate::work::log::{BenchFace, BenchLogRequest, BenchWish, HowLong, Wires, log};
use crate::work::runs::judge;
use crate::work::shelf::{Shelf, stamped};

/// How many times as fast as the machine's the clock goes.
const TIMES: f64 = 8.0;
/// Levels that are set, bar gauge, and for how long each is held.
const LEVELS_BAR: [f64; 6] = [5.0, 8.0, 11.0, 12.5, 9.5, 6.5];
const HELD_S: f64 = 28.0;
/// When it is given up, seconds of the hastened clock: a machine that does much else can miss a level.
const LONGEST_S: f64 = 400.0;
/// Seed of the rig.
const SEED: u64 = 2_026;

/// The logged run.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct DemoLogged {
    /// The run; none when not one reading came.
    pub run: Option<RunNumber>,
    /// The orifice.
    pub orifice: &'static str,
    /// Points taken.
    pub points: usize,
    /// What came of it, in a sentence.
    pub says: String,
}

/// Logs a run into the book at `shelf`; none where the system has no pseudo-terminals.
pub(super) fn logged(folder: &Path, shelf: &Shelf, units: Units) -> Result<Option<DemoLogged>, WorkError> {
    if cfg!(not(unix)) {
        return Ok(None);
    }
    let clock = Arc::new(Hastened::start(TIMES));
    let ports = folder.join(format!(".rig.{}", std::process::id()));
    let at = std::path::absolute(&ports).unwrap_or_else(|_| ports.clone());
    crate::work::output::make_folder(&at)?;
    let done = over(&at, &clock, shelf, units);
    // Nothing is in it but the names of ports that are gone.
    let _ = std::fs::remove_dir_all(&at);
    done.map(Some)
}

/// The name of the orifice, and of the limits it is judged by.
const ORIFICE: &str = "demo-live";
const LIMITS: &str = "demo-0.48";

#[cfg(unix)]
fn over(ports: &Path, clock: &Arc<Hastened>, shelf: &Shelf, units: Units) -> Result<DemoLogged, WorkError> {
    let mut settings = Settings::standard(SEED)?;
    settings.bench.hole = Hole { diameter: Length::from_um(73.6), choke_ratio: 0.50, k: 2.0 };
    settings.bench.script = Script::of_bar(&LEVELS_BAR, HELD_S);
    let ticks: Arc<dyn Ticks> = Arc::<Hastened>::clone(clock);
    let served = Rig::new(settings)?.serve(Arc::new(OfTicks(Arc::clone(&ticks))), Some(ports))?;
    let instruments: Vec<Instrument> = served.profiles();
    let ids = |measures| {
        let one = instruments.iter().find(|one| one.measures == measures);
        one.map(|one| one.id.to_string())
    };
    let request = BenchLogRequest {
        orifice: ORIFICE.to_owned(),
        meter: ids(Measures::Flow),
        transducer: ids(Measures::Pressure),
        technician: Some("nobody: a simulated bench".to_owned()),
        acceptance: Some(LIMITS.to_owned()),
        how: HowLong {
            by_itself: true,
            lasts: Some(Span::from_s(LONGEST_S)),
            points: Some(LEVELS_BAR.len()),
            units,
        },
        ..BenchLogRequest::default()
    };
    let mut book = shelf.to_change()?;
    for instrument in instruments {
        // Those of the bench alone: cells and a depth gauge have no part in it.
        if !matches!(instrument.measures, Measures::Cell | Measures::Depth) {
            stamped(|stamp| book.add(Entry::Instrument(instrument), stamp))??;
        }
    }
    drop(book);
    let opener = Hurried { opener: Arc::new(SystemPorts), times: clock.times() };
    let wires = Wires { opener: Arc::new(opener), ticks };
    let ended = log(shelf, &request, &wires, &mut Nobody, &|| false)?;
    drop(served);
    let Some(desk) = ended.desk else {
        let says = "no reading came, so that nothing was recorded".to_owned();
        return Ok(DemoLogged { run: None, orifice: ORIFICE, points: 0, says });
    };
    let says = match desk.line() {
        Some((analysis, low)) => {
            let said = running(&desk.fitted(analysis, low.as_ref()), None, None, &units);
            let said = said.split_whitespace().collect::<Vec<_>>().join(" ");
            said.split("; crossing").next().unwrap_or_default().to_owned()
        }
        None => "too few levels were held on this machine for a line; the run stays open".to_owned(),
    };
    if let (Some(number), false) = (desk.number(), desk.is_open()) {
        let mut book = shelf.to_change()?;
        judge(&mut book, number, Some("B. Invented"), None, clock::now())?;
    }
    Ok(DemoLogged { run: desk.number(), orifice: ORIFICE, points: desk.points().len(), says })
}

#[cfg(not(unix))]
fn over(_: &Path, _: &Arc<Hastened>, _: &Shelf, _: Units) -> Result<DemoLogged, WorkError> {
    Err(WorkError::NoPseudoTerminals)
}

/// Nobody sits before it.
struct Nobody;

impl BenchFace for Nobody {
    fn show(&mut self, _: &BenchView) {}

    fn wishes(&mut self) -> Vec<BenchWish> {
        Vec::new()
    }

    fn say(&mut self, _: &str) {}
}
