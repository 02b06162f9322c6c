//! The invented diver: three sessions on two days, the uptake, the setting, the sheet.
//!
//! The session files are written into the folder and stand alone; the book takes the same files, so that a diver's name
//! works there. Files and figures are the same on every machine.

use std::path::{Path, PathBuf};

use chrono::{DateTime, Duration, FixedOffset, NaiveDate};

use super::breath::{Act, Truth, breathe};
use super::model::{self, Around, Bench, Day, Hole};
use super::{
    ERRORS, GOOD, INVENTED, METER_CERTIFICATE, METER_DUE, SEED, TRANSDUCER_CERTIFICATE, TRANSDUCER_DUE, id,
};
use crate::entry::{
    Assumptions, Build, CellPapers, Diluent, Event, Influence, Injection, LeakTest, LineReference, LoopKept,
    Place, Purity, Purpose, Rest, Session, SessionConditions, What,
};
use crate::gas::{self, Species, Water};
use crate::quantity::{
    AbsolutePressure, GaugePressure, Length, Mass, PressureDifference, Span, Temperature,
    TemperatureDifference, Uncertain, Volume,
};
use crate::record::{write_run, write_session};
use crate::report::Units;
use crate::stats::monte_carlo::Random;
use crate::work::output::write_whole;
use crate::work::setting::{Asked, FirstStageAsked, SettingOutcome, SettingRequest, make_setting};
use crate::work::shelf::Shelf;
use crate::work::uptake::{UptakeOutcome, UptakeRequest, session_uptake};
use crate::work::{WorkError, runs, sessions};

/// The diver of the shop's register, and the orifice that suits.
const DIVER: &str = "demo-diver";
const ORIFICE: &str = "demo-small";
/// A hole that passes about 0.27 L/min of oxygen at 10 bar.
const SMALL: Hole = Hole { diameter_um: 55.4, ..GOOD };
/// Streams of the generator from here on belong to the diver.
const FIRST_STREAM: u64 = 10_000;
/// What is true of the diver and the loop.
const LOOP_C: f64 = 33.0;
const VOLUME_L: f64 = 7.2;
const PURITY: f64 = 0.996;
/// Oxygen in air.
const AIR: f64 = 0.209_5;
/// What the diver's own gauge is off by, bar.
const GAUGE_BAR: f64 = 0.12;

/// What the demonstration leaves of the diver.
#[derive(Debug, Clone, PartialEq)]
pub struct DemoDiver {
    /// The run file of the diver's orifice.
    pub orifice: PathBuf,
    /// The session files.
    pub sessions: Vec<PathBuf>,
    /// Their plots.
    pub plots: Vec<PathBuf>,
    /// The plot of the setting.
    pub setting_plot: PathBuf,
    /// The sheet the diver keeps.
    pub sheet: PathBuf,
    /// The uptake.
    pub uptake: UptakeOutcome,
    /// The setting.
    pub setting: SettingOutcome,
    /// The day the setting is for.
    pub on: NaiveDate,
}

impl DemoDiver {
    /// The diver's code.
    pub const DIVER: &'static str = DIVER;
    /// The orifices that are compared.
    pub const ORIFICES: [&'static str; 2] = [ORIFICE, "demo-01"];
    /// The first stage of the register.
    pub const FIRST_STAGE: &'static str = "demo-FS";
    /// What else is asked, as it is typed.
    pub const ASKED: &'static str = "--max-depth '30 m' --water-temperature '16 °C ± 4 °C'";
    /// The flow meter of the register.
    pub const METER: &'static str = "demo-FM";
}

/// Writes the diver's files, takes them into the book of the shop, and works out uptake and setting.
///
/// # Errors
/// When the folder cannot be written; another error would be a defect of the program.
pub(super) fn rest(folder: &Path, shelf: &Shelf, units: Units) -> Result<DemoDiver, WorkError> {
    let orifice = write_orifice(folder)?;
    let mut files = Vec::new();
    for (stream, outing) in outings().iter().enumerate() {
        let mut random = Random::new(SEED, FIRST_STREAM + 1 + stream as u64);
        let session = outing.session(&mut random);
        let name = format!("demo-{}", outing.name);
        let (toml, csv) = write_session(&session, &format!("{name}.csv"));
        let file = folder.join(format!("{name}.toml"));
        write_whole(&folder.join(format!("{name}.csv")), csv.as_bytes())?;
        write_whole(&file, format!("{INVENTED}{toml}").as_bytes())?;
        files.push(file);
    }
    let mut notes = Vec::new();
    let runs = runs::import(shelf, std::slice::from_ref(&orifice), &mut notes, |_| {})?;
    for run in &runs {
        runs::judge(
            &mut shelf.to_change()?,
            run.run,
            Some("B. Invented"),
            None,
            bench_day() + Duration::hours(1),
        )?;
    }
    sessions::import(shelf, &files, &mut notes)?;

    // From the book, as anybody would ask it; the files say the same.
    let book = Some(shelf.path().to_owned());
    let plot = folder.join("demo-session.svg");
    let uptake = session_uptake(&UptakeRequest {
        of: vec![DIVER.to_owned()],
        monte_carlo: None,
        book: book.clone(),
        plot: Some(plot),
        units,
    })?;
    let on = on();
    let (setting_plot, sheet) = (folder.join("demo-setting.svg"), folder.join("demo-sheet.pdf"));
    let setting = make_setting(&SettingRequest {
        orifices: DemoDiver::ORIFICES.map(str::to_owned).to_vec(),
        diver: Some(DIVER.to_owned()),
        first_stage: FirstStageAsked::Registered(DemoDiver::FIRST_STAGE.to_owned()),
        asked: Asked {
            max_depth: Some(Length::from_m(30.0)),
            water_temperature: Some(Uncertain {
                value: Temperature::from_c(16.0),
                expanded: Some(TemperatureDifference::from_k(4.0)),
            }),
            ..Asked::default()
        },
        meter: Some(DemoDiver::METER.to_owned()),
        on: Some(on),
        book,
        plot: Some(setting_plot.clone()),
        sheet: Some(sheet.clone()),
        units,
        ..SettingRequest::default()
    })?;
    let plots = uptake.plots.clone();
    Ok(DemoDiver { orifice, sessions: files, plots, setting_plot, sheet, uptake, setting, on })
}

fn write_orifice(folder: &Path) -> Result<PathBuf, WorkError> {
    let day = Day { barometer_pa: 101_200.0, gas_c: 20.0 };
    let bench =
        Bench { hole: SMALL, errors: ERRORS, day, steps: super::UP_AND_DOWN, gauge_as_absolute: false };
    let readings = bench.typed(&mut Random::new(SEED, FIRST_STREAM));
    let run = model::run_of(
        Around {
            orifice: id(ORIFICE),
            build: Build::ShortTube,
            purpose: Purpose::Acceptance,
            taken: bench_day(),
            technician: "A. Invented",
            day,
            meter: model::meter(None, METER_CERTIFICATE, METER_DUE),
            transducer: model::transducer(None, TRANSDUCER_CERTIFICATE, TRANSDUCER_DUE),
            acceptance: model::limits(None, 0.27),
            left_out: None,
        },
        readings,
    );
    let file = folder.join(format!("{ORIFICE}.toml"));
    let (toml, csv) = write_run(&run, &format!("{ORIFICE}.csv"));
    write_whole(&folder.join(format!("{ORIFICE}.csv")), csv.as_bytes())?;
    write_whole(&file, format!("{INVENTED}{toml}").as_bytes())?;
    Ok(file)
}

/// One time on the couch.
struct Outing {
    name: &'static str,
    taken: &'static str,
    kept: LoopKept,
    /// Uptake of that day.
    uptake_l_min: f64,
    barometer_bar: f64,
    on_loop_min: f64,
    po2_bar: f64,
    minutes: f64,
    /// What the diver does; an injection is an intermediate pressure as the gauge shows it, or nothing.
    steps: &'static [(f64, Step)],
    volume_known: bool,
}

#[derive(Clone, Copy)]
enum Step {
    Off,
    Ip(f64),
    OxygenTo(f64),
}

/// Two on the first day, one on the second; the first finds the loop volume from two injections, the others have it
/// measured.
fn outings() -> [Outing; 3] {
    const TWO_INJECTIONS: &[(f64, Step)] =
        &[(0.0, Step::Off), (10.0, Step::Ip(9.5)), (10.0, Step::OxygenTo(0.92))];
    const SEALED: &[(f64, Step)] = &[(0.0, Step::Ip(6.5))];
    const OTHER_DAY: &[(f64, Step)] =
        &[(0.0, Step::Ip(9.5)), (14.0, Step::Off), (14.0, Step::OxygenTo(0.90))];
    [
        Outing {
            name: "couch-1",
            taken: "2026-11-20T18:05:00+00:00",
            kept: LoopKept::Held,
            uptake_l_min: 0.293,
            barometer_bar: 1.016,
            on_loop_min: 12.0,
            po2_bar: 0.92,
            minutes: 26.0,
            steps: TWO_INJECTIONS,
            volume_known: false,
        },
        Outing {
            name: "couch-2",
            taken: "2026-11-20T19:10:00+00:00",
            kept: LoopKept::Sealed,
            uptake_l_min: 0.293,
            barometer_bar: 1.016,
            on_loop_min: 15.0,
            po2_bar: 0.60,
            minutes: 16.0,
            steps: SEALED,
            volume_known: true,
        },
        Outing {
            name: "couch-3",
            taken: "2026-11-24T18:30:00+00:00",
            kept: LoopKept::Held,
            uptake_l_min: 0.281,
            barometer_bar: 1.004,
            on_loop_min: 12.0,
            po2_bar: 0.90,
            minutes: 26.0,
            steps: OTHER_DAY,
            volume_known: true,
        },
    ]
}

impl Outing {
    fn session(&self, random: &mut Random) -> Session {
        let truth = Truth {
            uptake_l_min: self.uptake_l_min,
            volume_l: VOLUME_L,
            loop_c: LOOP_C,
            barometer_bar: self.barometer_bar,
            on_loop_min: self.on_loop_min,
            diluent: AIR,
            purity: PURITY,
        };
        let acts: Vec<(f64, Act)> = self
            .steps
            .iter()
            .map(|(at, step)| {
                let act = match step {
                    Step::Off => Act::Inject(0.0),
                    Step::Ip(bar) => Act::Inject(self.true_flow(*bar)),
                    Step::OxygenTo(po2) => Act::OxygenTo(*po2),
                };
                (*at, act)
            })
            .collect();
        let held = self.kept == LoopKept::Held;
        let readings = breathe(&truth, self.po2_bar, self.minutes, held, &acts, random);
        let events = self
            .steps
            .iter()
            .map(|(at, step)| {
                let what = match step {
                    Step::Off => What::Injection(Injection::Off),
                    Step::Ip(bar) => What::Injection(Injection::Ip(Uncertain {
                        value: GaugePressure::from_bar(*bar),
                        expanded: Some(PressureDifference::from_bar(0.3)),
                    })),
                    Step::OxygenTo(_) => What::OxygenAdd(None),
                };
                Event { at_s: at * 60.0, what }
            })
            .collect();
        self.around(readings, events)
    }

    /// Whole gas through the orifice at what the diver's gauge shows, L/min STPD.
    fn true_flow(&self, shown_bar: f64) -> f64 {
        let p1 = AbsolutePressure::from_bar(shown_bar - GAUGE_BAR + self.barometer_bar);
        let d = SMALL.diameter_um * 1e-6;
        let area = std::f64::consts::PI / 4.0 * d * d;
        let full = gas::choked_mass_flow(Species::Oxygen, area, p1, Temperature::from_c(21.0));
        let reynolds = 4.0 * full / (std::f64::consts::PI * d * Species::Oxygen.viscosity());
        full * (1.0 - SMALL.k / reynolds.sqrt()) / gas::stpd_density(Species::Oxygen) * 6e4
    }

    fn around(&self, readings: crate::entry::SessionReadings, events: Vec<Event>) -> Session {
        let minutes = |m: f64| Some(Span::from_s(60.0 * m));
        let hours = |h: f64| Some(Span::from_s(3600.0 * h));
        Session {
            diver: id(DIVER),
            mass: Some(Mass::from_kg(82.0)),
            place: Place::Couch,
            kept: self.kept,
            diluent: Diluent::Air,
            loop_volume: self
                .volume_known
                .then(|| Uncertain { value: Volume::from_l(7.4), expanded: Some(Volume::from_l(0.8)) }),
            leak_test: LeakTest::Passed,
            nose_clip: Some(true),
            oxygen: Some(Purity { fraction: 0.995, expanded: 0.003 }),
            taken: time(self.taken),
            readings,
            line: Some(LineReference::RunFile(format!("{ORIFICE}.toml"))),
            conditions: SessionConditions {
                barometer: Influence {
                    value: Some(AbsolutePressure::from_bar(self.barometer_bar)),
                    expanded: Some(PressureDifference::from_pa(200.0)),
                },
                depth: Influence { value: Some(Length::from_m(0.0)), expanded: None },
                water: Water::Fresh,
                loop_temperature: Influence {
                    value: Some(Temperature::from_c(LOOP_C)),
                    expanded: Some(TemperatureDifference::from_k(4.0)),
                },
                time_on_loop: minutes(self.on_loop_min),
                scrubber_warm: Some(true),
            },
            cells: CellPapers { gain: Some(0.02), calibrated_at: None },
            rest: Rest {
                posture: Some("lying".to_owned()),
                rested_for: minutes(30.0),
                last_meal: hours(4.5),
                last_exercise: hours(20.0),
                last_dive: hours(48.0),
                caffeine_or_nicotine: Some(false),
                water_temperature: None,
                suit: None,
            },
            assumptions: Assumptions::DEFAULT,
            events,
            cylinder: None,
        }
    }
}

fn time(text: &str) -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339(text).unwrap_or_default()
}

fn bench_day() -> DateTime<FixedOffset> {
    time("2026-11-13T10:00:00+00:00")
}

/// The day of the setting, within the dates of the invented instruments.
fn on() -> NaiveDate {
    NaiveDate::from_ymd_opt(2026, 11, 28).unwrap_or_default()
}
