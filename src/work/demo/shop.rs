//! The book of an invented shop: a dozen orifices over two years, one of them slowly clogging.
//!
//! Register entries and runs are drawn with a fixed seed, written as files, and taken in by the same code as anybody's:
//! added, imported, judged. Files and figures are the same on every machine. In the book the time of recording and the
//! salts are not: they are the clock's and chance's, as in every book.

use std::fs;
use std::path::{Path, PathBuf};

use chrono::{DateTime, Duration, FixedOffset, NaiveDate};

use super::certificate::{self, DemoCertificate};
use super::diver::{self, DemoDiver};
use super::live::{self, DemoLogged};
use super::model::{self, Around, Bench, Day, Errors, Hole};
use super::{
    ERRORS, GOOD, INVENTED, METER_CERTIFICATE, METER_DUE, SEED, TRANSDUCER_CERTIFICATE, TRANSDUCER_DUE, id,
};
use crate::book::{Book, BookError, CertificateQuery, Options, RunQuery, SessionQuery};
use crate::entry::{
    Build, Diluent, Diver, FirstStage, Instrument, InstrumentPapers, Measures, Orifice, Purpose, Shop,
    Signatory,
};
use crate::quantity::{GaugePressure, Length, Mass, PressureDifference, Uncertain, Volume};
use crate::record::{RegisterEntry, RegisterKind, write_register, write_run};
use crate::report::Units;
use crate::stats::monte_carlo::Random;
use crate::work::history::{self, HistoryRequest};
use crate::work::output::{make_folder, write_whole};
use crate::work::registers::{self, Given};
use crate::work::shelf::Shelf;
use crate::work::{WorkError, runs};

/// Name of the shop, by which a book of an earlier demonstration is known again.
const SHOP: &str = "Invented Orifice Works";
/// The orifice that clogs, and how much of its flow it loses in a year.
const CLOGGING: &str = "demo-07";
const LOST_IN_A_YEAR: f64 = 0.0068;
/// Names of everything begin so.
const PREFIX: &str = "demo-";
/// Days from one run of an orifice to the next, and from one orifice to the next.
const QUARTER: i64 = 91;
const APART: i64 = 3;
/// Runs of an orifice that was there from the beginning.
const QUARTERS: i64 = 9;
/// Streams of the generator from here on belong to the shop.
const FIRST_STREAM: u64 = 100;

/// What stands in the folder of the shop.
#[derive(Debug, Clone, PartialEq)]
pub struct DemoShop {
    /// The book.
    pub book: PathBuf,
    /// The files it was made from.
    pub files: PathBuf,
    /// How many orifices it has.
    pub orifices: usize,
    /// How many runs.
    pub runs: usize,
    /// The orifice that clogs.
    pub clogging: &'static str,
    /// The drawing of its history.
    pub plot: PathBuf,
    /// What its history warns of.
    pub warnings: Vec<String>,
}

fn book_in(folder: &Path) -> PathBuf {
    folder.join("book.db")
}

/// Refuses a folder whose book an earlier demonstration did not make, or that somebody has recorded in since.
///
/// # Errors
/// That, and a book that cannot be read.
pub(super) fn may_be_written(folder: &Path) -> Result<(), WorkError> {
    let path = book_in(folder);
    let refuse = |why: String| Err(WorkError::NotReplaced { path: path.clone(), why });
    let book = match Book::open_to_read(&path, &Options::default()) {
        Ok(book) => book,
        Err(BookError::NoBook { .. }) => return Ok(()),
        Err(error) => return Err(error.into()),
    };
    if book.shop()?.is_none_or(|found| found.entry.name != SHOP) {
        return refuse("is a book that no demonstration made, and stays as it is".to_owned());
    }
    let of_others = |orifice: &str| !orifice.starts_with(PREFIX);
    if let Some(other) = book.sessions(&SessionQuery::default())?.iter().find(|s| of_others(&s.diver)) {
        return refuse(format!(
            "is the book of a demonstration, but somebody recorded session {} of {} in it, so it stays",
            other.number, other.diver
        ));
    }
    let issued = book.certificates(&CertificateQuery::default())?;
    if let Some(other) = issued.first().filter(|_| issued.len() > certificate::ISSUED) {
        return refuse(format!(
            "is the book of a demonstration, but somebody issued certificate {} from it, so it stays",
            other.number
        ));
    }
    if let Some(other) = book.runs(&RunQuery::default())?.iter().find(|run| of_others(&run.orifice)) {
        return refuse(format!(
            "is the book of a demonstration, but somebody recorded run {} of {} in it, so it stays",
            other.number, other.orifice
        ));
    }
    Ok(())
}

/// Everything that comes of keeping the book.
pub(super) struct KeptShop {
    pub(super) shop: DemoShop,
    pub(super) certificate: Option<DemoCertificate>,
    pub(super) diver: DemoDiver,
    pub(super) logged: Option<DemoLogged>,
}

/// Writes the files of the shop and of its diver, takes them into a book, judges every run, issues a certificate, draws the history of the one
/// that clogs, and works out the diver's setting.
///
/// # Errors
/// When the folder cannot be written; another error would be a defect of the program.
pub(super) fn keep(folder: &Path, units: Units) -> Result<KeptShop, WorkError> {
    let (book, files) = (book_in(folder), folder.join("shop"));
    let scratch = folder.join(format!(".book.db.{}.part", std::process::id()));
    remove(&scratch);
    let kept = take_in(&Shelf::at(&scratch), &files).and_then(|(orifices, runs)| {
        let plot = folder.join(format!("{CLOGGING}-history.svg"));
        let request =
            HistoryRequest { orifice: CLOGGING.to_owned(), all: true, plot: Some(plot.clone()), units };
        let (_, history) = history::show(&Shelf::at(&scratch), &request)?;
        let warnings = history.warnings(&units);
        let certificate = certificate::certify(folder, &Shelf::at(&scratch))?;
        let diver = diver::rest(folder, &Shelf::at(&scratch), units)?;
        let logged = live::logged(folder, &Shelf::at(&scratch), units)?;
        let more = usize::from(logged.as_ref().is_some_and(|logged| logged.run.is_some()));
        let failed = |source| WorkError::Write { path: book.clone(), source };
        remove(&book);
        fs::rename(&scratch, &book).map_err(failed)?;
        let shop = DemoShop {
            book: book.clone(),
            files: files.clone(),
            orifices: orifices + 1 + more,
            runs: runs + 1 + more,
            clogging: CLOGGING,
            plot,
            warnings,
        };
        Ok(KeptShop { shop, certificate, diver, logged })
    });
    remove(&scratch);
    kept
}

/// Removes a book with its log; nothing there is as good.
fn remove(book: &Path) {
    for suffix in ["-wal", "-shm", ""] {
        let mut name = book.as_os_str().to_owned();
        name.push(suffix);
        let _ = fs::remove_file(PathBuf::from(name));
    }
}

/// Orifices and runs taken in.
fn take_in(shelf: &Shelf, files: &Path) -> Result<(usize, usize), WorkError> {
    let mut notes = Vec::new();
    let orifices = orifices();
    let entries: Vec<RegisterEntry> = entries(&orifices);
    for kind in RegisterKind::ALL {
        // The limits come before the orifices that name them.
        let kind = match kind {
            RegisterKind::Orifice => RegisterKind::Acceptance,
            RegisterKind::Acceptance => RegisterKind::Orifice,
            other => other,
        };
        let folder = files.join(registers::command(kind));
        make_folder(&folder)?;
        let mut given = Vec::new();
        for entry in entries.iter().filter(|entry| entry.kind() == kind) {
            let name = entry.id().map_or("shop", |id| id.as_str());
            let file = folder.join(format!("{name}.toml"));
            write_whole(&file, format!("{INVENTED}{}", write_register(entry)).as_bytes())?;
            given.push(Given::File(file));
        }
        match (kind, given.as_slice()) {
            (RegisterKind::Shop, [given]) => {
                registers::edit(shelf, kind, "shop", given, &mut notes)?;
            }
            (_, given) => {
                registers::add(shelf, kind, given, &mut notes)?;
            }
        }
    }
    let folder = files.join("runs");
    make_folder(&folder)?;
    let mut taken: Vec<(DateTime<FixedOffset>, PathBuf)> = Vec::new();
    for (place, orifice) in orifices.iter().enumerate() {
        for visit in orifice.visits(place) {
            let name = format!("{}-{}-{}", orifice.id, visit.taken.format("%Y-%m-%d"), visit.purpose.name());
            let mut random = Random::new(SEED, FIRST_STREAM + 100 * place as u64 + visit.stream);
            let run = orifice.run(&visit, &mut random);
            let (toml, csv) = write_run(&run, &format!("{name}.csv"));
            let file = folder.join(format!("{name}.toml"));
            write_whole(&folder.join(format!("{name}.csv")), csv.as_bytes())?;
            write_whole(&file, format!("{INVENTED}{toml}").as_bytes())?;
            taken.push((visit.taken, file));
        }
    }
    taken.sort();
    let paths: Vec<PathBuf> = taken.iter().map(|(_, path)| path.clone()).collect();
    let imported = runs::import(shelf, &paths, &mut notes, |_| {})?;
    let mut book = shelf.to_change()?;
    for (run, (at, _)) in imported.iter().zip(&taken) {
        runs::judge(&mut book, run.run, Some("B. Invented"), None, *at + Duration::hours(1))?;
    }
    Ok((orifices.len(), imported.len()))
}

/// An orifice of the shop and what happens to it.
struct Kept {
    id: String,
    description: &'static str,
    customer: &'static str,
    /// Nominal flow at 10 bar, L/min.
    nominal: f64,
    /// What it passes when it is new, as a share of that.
    share: f64,
    story: Story,
}

enum Story {
    /// It stays what it was.
    Stays,
    /// It loses this share of its flow in a year.
    Clogs(f64),
    /// It comes in dirty in this quarter, with this share of its flow, and is cleaned.
    Cleaned(i64, f64),
    /// It is bought in this quarter.
    New(i64),
    /// It is rejected when it is new.
    Rejected,
}

/// One time on the bench.
struct Visit {
    taken: DateTime<FixedOffset>,
    purpose: Purpose,
    /// Flow as a share of what it was when new.
    left: f64,
    stream: u64,
}

fn orifices() -> Vec<Kept> {
    use Story::{Cleaned, Clogs, New, Rejected, Stays};
    let (block, valve) = ("restrictor of a left-hand block", "leaky valve, whole");
    let (club, school, none) = (
        "Tern Club (invented), 2 Quay Street, Nowhere",
        "Reef School (invented), 12 Bay Road, Nowhere",
        "the shop's own",
    );
    [
        (block, club, 0.48, 1.004, Stays),
        (valve, school, 0.70, 0.988, Stays),
        (block, club, 0.48, 1.011, Stays),
        (block, club, 0.48, 0.997, Cleaned(6, 0.80)),
        (block, school, 0.48, 1.008, Stays),
        (valve, club, 0.70, 1.013, Stays),
        (block, school, 0.48, 0.984, Clogs(LOST_IN_A_YEAR)),
        (valve, none, 0.70, 1.002, New(6)),
        (block, none, 0.48, 1.078, Rejected),
        (valve, school, 0.70, 0.995, Stays),
        (block, club, 0.48, 0.992, Stays),
        (block, school, 0.48, 1.001, Stays),
    ]
    .into_iter()
    .enumerate()
    .map(|(i, (description, customer, nominal, share, story))| Kept {
        id: format!("{PREFIX}{:02}", i + 1),
        description,
        customer,
        nominal,
        share,
        story,
    })
    .collect()
}

impl Kept {
    /// Every time it is on the bench, in order.
    fn visits(&self, place: usize) -> Vec<Visit> {
        let visit = |quarter: i64, hours: i64, purpose, left| Visit {
            taken: first_day()
                + Duration::days(QUARTER * quarter + APART * place as i64)
                + Duration::hours(hours),
            purpose,
            left,
            stream: (10 * quarter + hours) as u64,
        };
        let purpose = |quarter, first| if quarter == first { Purpose::Acceptance } else { Purpose::Check };
        let years = |quarter: i64| (QUARTER * quarter) as f64 / 365.25;
        match self.story {
            Story::Rejected => vec![visit(0, 0, Purpose::Acceptance, 1.0)],
            Story::Stays => (0..QUARTERS).map(|q| visit(q, 0, purpose(q, 0), 1.0)).collect(),
            Story::New(first) => (first..QUARTERS).map(|q| visit(q, 0, purpose(q, first), 1.0)).collect(),
            Story::Clogs(lost) => {
                (0..QUARTERS).map(|q| visit(q, 0, purpose(q, 0), 1.0 - lost * years(q))).collect()
            }
            Story::Cleaned(when, left) => (0..QUARTERS)
                .flat_map(|q| match q == when {
                    false => vec![visit(q, 0, purpose(q, 0), 1.0)],
                    true => vec![visit(q, 0, Purpose::AsFound, left), visit(q, 3, Purpose::AsLeft, 0.999)],
                })
                .collect(),
        }
    }

    fn run(&self, visit: &Visit, random: &mut Random) -> crate::entry::Run {
        let day = Day {
            barometer_pa: 100.0 * libm::round(random.rectangular(995.0, 1028.0)),
            gas_c: libm::round(random.rectangular(18.0, 24.0)),
        };
        // `GOOD` passes 0.4808 L/min, and the flow goes with the area of the hole.
        let share = self.nominal * self.share * visit.left / 0.4808;
        let hole = Hole { diameter_um: GOOD.diameter_um * share.sqrt(), ..GOOD };
        let calibration = Calibration::on(visit.taken.date_naive());
        let bench = Bench {
            hole,
            errors: calibration.errors,
            day,
            steps: super::UP_AND_DOWN,
            gauge_as_absolute: false,
        };
        let readings = bench.typed(random);
        let around = Around {
            orifice: id(&self.id),
            build: Build::ShortTube,
            purpose: visit.purpose,
            taken: visit.taken,
            technician: "A. Invented",
            day,
            meter: calibration.meter(),
            transducer: calibration.transducer(),
            acceptance: limits(self.nominal),
            left_out: None,
        };
        model::run_of(around, readings)
    }
}

/// The instruments under one pair of certificates.
struct Calibration {
    errors: Errors,
    meter_certificate: &'static str,
    transducer_certificate: &'static str,
    meter_due: Option<NaiveDate>,
    transducer_due: Option<NaiveDate>,
}

impl Calibration {
    /// Both came back from calibration in March 2025.
    fn on(day: NaiveDate) -> Self {
        let back = NaiveDate::from_ymd_opt(2025, 3, 15).unwrap_or_default();
        if day >= back {
            return Self {
                errors: ERRORS,
                meter_certificate: METER_CERTIFICATE,
                transducer_certificate: TRANSDUCER_CERTIFICATE,
                meter_due: METER_DUE,
                transducer_due: TRANSDUCER_DUE,
            };
        }
        let due = NaiveDate::from_ymd_opt(2025, 3, 31);
        Self {
            errors: Errors {
                meter_gain: 0.0012,
                meter_zero_l_min: 0.000_1,
                transducer_gain: -0.000_2,
                transducer_zero_pa: -150.0,
            },
            meter_certificate: "invented-FM-071",
            transducer_certificate: "invented-PT-014",
            meter_due: due,
            transducer_due: due,
        }
    }

    fn meter(&self) -> crate::entry::Meter {
        model::meter(Some(id("demo-FM")), self.meter_certificate, self.meter_due)
    }

    fn transducer(&self) -> crate::entry::Transducer {
        model::transducer(Some(id("demo-PT")), self.transducer_certificate, self.transducer_due)
    }
}

/// What stands in the registers.
fn entries(orifices: &[Kept]) -> Vec<RegisterEntry> {
    let now = Calibration::on(NaiveDate::from_ymd_opt(2026, 11, 12).unwrap_or_default());
    let instrument = |measures, papers: InstrumentPapers| {
        let name = match &papers {
            InstrumentPapers::Meter(meter) => meter.id.clone(),
            InstrumentPapers::Transducer(transducer) => transducer.id.clone(),
        };
        RegisterEntry::Instrument(Instrument {
            id: name.unwrap_or_else(|| id("demo-instrument")),
            measures,
            socket: None,
            baud: None,
            frame: None,
            unit: None,
            protocol: None,
            papers: Some(papers),
        })
    };
    let mut entries = vec![
        RegisterEntry::Acceptance(limits(0.48)),
        RegisterEntry::Acceptance(limits(0.70)),
        instrument(Measures::Flow, InstrumentPapers::Meter(now.meter())),
        instrument(Measures::Pressure, InstrumentPapers::Transducer(now.transducer())),
        RegisterEntry::FirstStage(FirstStage {
            id: id("demo-FS"),
            compensated: false,
            ip_range: (GaugePressure::from_bar(7.0), GaugePressure::from_bar(13.0)),
            division: PressureDifference::from_bar(0.1),
            gauge_scale: Some(GaugePressure::from_bar(20.0)),
            gauge_error: Some(PressureDifference::from_bar(0.3)),
            ip_spread: Some(PressureDifference::from_bar(0.2)),
            ip_repeat: Some(PressureDifference::from_bar(0.1)),
            max_ip: Some(GaugePressure::from_bar(13.5)),
            trapped_volume: Some(Uncertain {
                value: Volume::from_l(0.015),
                expanded: Some(Volume::from_l(0.003)),
            }),
            fall_observed: None,
            maker: Some("invented".to_owned()),
            serial: None,
        }),
        RegisterEntry::Diver(Diver {
            id: id("demo-diver"),
            name: Some("C. Invented".to_owned()),
            mass: Some(Mass::from_kg(82.0)),
            loop_volume: Some(Uncertain { value: Volume::from_l(7.5), expanded: Some(Volume::from_l(1.0)) }),
            diluent: Some(Diluent::Air),
        }),
        RegisterEntry::Shop(Shop {
            name: SHOP.to_owned(),
            address: "1 Slip Road\nNowhere\nAQ".to_owned(),
            contact: None,
            logo: None,
            accent: None,
            number_pattern: Some(certificate::PATTERN.to_owned()),
            signatories: vec![Signatory { name: "B. Invented".to_owned(), role: None }],
            statements: Vec::new(),
        }),
    ];
    entries.extend(orifices.iter().map(|orifice| {
        RegisterEntry::Orifice(Orifice {
            description: Some(orifice.description.to_owned()),
            serial: Some(format!("invented-{}", orifice.id.trim_start_matches(PREFIX))),
            maker: Some("invented".to_owned()),
            customer: Some(orifice.customer.to_owned()),
            build: Build::ShortTube,
            nominal_diameter: Some(Length::from_um(if orifice.nominal > 0.6 { 89.0 } else { 74.0 })),
            acceptance: limits(orifice.nominal).id,
            ..Orifice::bare(id(&orifice.id))
        })
    }));
    entries
}

fn limits(nominal: f64) -> crate::entry::Acceptance {
    model::limits(Some(id(if nominal > 0.6 { "demo-0.70" } else { "demo-0.48" })), nominal)
}

/// The first morning of two years.
fn first_day() -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339("2024-10-07T09:30:00+00:00").unwrap_or_default()
}
