//! Whole runs logged over real pseudo-terminals into a real book, by a clock that is hastened: the orifice that was simulated
//! comes out within its stated uncertainty, and the book has what an analysis, an export and a certificate need.
#![cfg(unix)]
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::path::{Path, PathBuf};
use std::sync::Arc;

use ebbline::bench::Questions;
use ebbline::book::{Book, Entry, Options, Origin, RunState, Stamp};
use ebbline::clock::{Hastened, Ticks};
use ebbline::entry::{Measures, Readings};
use ebbline::gas::Species;
use ebbline::instrument::{Hurried, SystemPorts};
use ebbline::quantity::{AbsolutePressure, GaugePressure, Span, Temperature};
use ebbline::report::Units;
use ebbline::report::bench_live::BenchView;
use ebbline::rig::{OfTicks, Rig, Script, Settings};
use ebbline::series::mean_of_span;
use ebbline::work::log::{BenchFace, BenchLogRequest, BenchWish, HowLong, Why, Wires, log};
use ebbline::work::runs::load;
use ebbline::work::shelf::Shelf;

/// How many times as fast as the machine's the clock goes.
const TIMES: f64 = 10.0;

fn folder(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(format!("real-{name}"));
    let _ = std::fs::remove_dir_all(&folder);
    std::fs::create_dir_all(&folder).unwrap();
    folder
}

/// Nobody; what was said is kept.
#[derive(Default)]
struct Nobody {
    said: Vec<String>,
    shown: usize,
}

impl BenchFace for Nobody {
    fn show(&mut self, _: &BenchView) {
        self.shown += 1;
    }

    fn wishes(&mut self) -> Vec<BenchWish> {
        Vec::new()
    }

    fn say(&mut self, sentence: &str) {
        self.said.push(sentence.to_owned());
    }
}

/// What was logged, and the flow at 10 bar with its 95 % half-width; the true one.
fn logged(seed: u64) -> (f64, f64, f64) {
    let folder = folder(&seed.to_string());
    let mut settings = Settings::standard(seed).unwrap();
    settings.bench.script = Script::of_bar(&[5.0, 7.0, 9.0, 11.0, 13.0, 10.0, 8.0, 6.0], 30.0);
    let hole = settings.bench.hole;
    let ticks: Arc<dyn Ticks> = Arc::new(Hastened::start(TIMES));
    let rig = Rig::new(settings).unwrap();
    let served = rig.serve(Arc::new(OfTicks(Arc::clone(&ticks))), Some(&folder)).unwrap();
    let shelf = Shelf::at(&folder.join("book.db"));
    let instruments = served.profiles();
    let mut salts = 0_u8;
    let mut salt = || {
        salts = salts.wrapping_add(1);
        [salts; 16]
    };
    let at = chrono::DateTime::parse_from_rfc3339("2026-11-12T09:40:00+11:00").unwrap();
    let mut stamp = Stamp { at, salt: &mut salt };
    let mut book = Book::open_or_begin(shelf.path(), &Options::default(), &mut stamp).unwrap();
    for instrument in &instruments {
        book.add(Entry::Instrument(instrument.clone()), &mut stamp).unwrap();
    }
    drop(book);
    let request = BenchLogRequest {
        orifice: "REAL".to_owned(),
        how: HowLong {
            by_itself: true,
            // A machine that does much else may miss a level: the script's last one is held until eight are taken.
            lasts: Some(Span::from_s(400.0)),
            points: Some(7),
            units: Units::default(),
        },
        ..BenchLogRequest::default()
    };
    let opener = Hurried { opener: Arc::new(SystemPorts), times: TIMES };
    let wires = Wires { opener: Arc::new(opener), ticks };
    let mut face = Nobody::default();
    let ended = log(&shelf, &request, &wires, &mut face, &|| false).unwrap();
    assert_eq!(ended.why, Why::Finished, "{:?}", face.said);
    assert!(face.shown > 20, "the face was shown {} times", face.shown);
    drop(served);

    let book = Book::open_to_read(shelf.path(), &Options::default()).unwrap();
    assert!(book.check(&[]).unwrap().wrong.is_none());
    let number = ended.desk.unwrap().number().unwrap();
    let record = book.run(number).unwrap();
    assert_eq!((record.origin, record.state), (Origin::Logged, RunState::Complete));
    let Readings::Points(points) = &record.run.readings else { panic!("points") };
    let taken = book.live_points(number).unwrap();
    assert_eq!(points.len(), taken.len());
    // Each point is the mean of the raw readings that the book has of its span.
    let raw = book.live_readings(number).unwrap();
    let of = |measures| {
        let id = instruments.iter().find(|one| one.measures == measures).map(|one| one.id.clone()).unwrap();
        raw.iter().find(|readings| readings.instrument == id).unwrap()
    };
    let flow = of(Measures::Flow);
    for point in &taken {
        let inside = flow
            .at_s
            .iter()
            .zip(&flow.shown)
            .filter(|(at_s, _)| (point.span_s.0 - 1e-6..=point.span_s.1 + 1e-6).contains(*at_s));
        let values: Vec<f64> = inside.map(|(_, shown)| *shown).collect();
        let mean = mean_of_span(&values).unwrap().mean;
        let shown = point.reading.flow.as_l_min();
        assert!((mean - shown).abs() < 2e-4 * shown, "{shown} L/min, and its span has {mean}");
    }
    let loaded = load(&book, number).unwrap();
    let questions = Questions { at: vec![GaugePressure::from_bar(10.0)], ..Questions::default() };
    let analysis = loaded.analyse(&questions).unwrap();
    let at = &analysis.flow_at.last().unwrap().flow;
    let room = AbsolutePressure::STANDARD_ATMOSPHERE;
    let ip = GaugePressure::from_bar(10.0).above(room);
    let truth = hole.flow(Species::Oxygen, ip, room, Temperature::from_c(20.0)).as_l_min();
    (at.flow_l_min, at.expanded(), truth)
}

#[test]
fn three_runs_over_pseudo_terminals_hold_the_orifice_that_was_simulated() {
    let runs: Vec<_> =
        [61, 62, 63].into_iter().map(|seed| std::thread::spawn(move || logged(seed))).collect();
    let mut within = 0;
    for run in runs {
        let (flow, expanded, truth) = run.join().unwrap();
        assert!(expanded < 0.03 * truth, "U = {expanded} of {truth} L/min says too little");
        // Far outside is a mistake; a little outside may happen once in twenty.
        assert!((flow - truth).abs() < 2.0 * expanded, "{flow} ± {expanded}, and it is {truth}");
        within += usize::from((flow - truth).abs() <= expanded);
    }
    assert!(within >= 2, "only {within} of 3 hold the truth");
}
