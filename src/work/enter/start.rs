//! What has to be known before the first point.
//!
//! Comes in: answers as text, from options, prompts or a run file. Goes out: a [`Ready`] run without points. A default
//! is what the last typed run had where a person is asked, else the common one; barometer and temperature have one
//! only on the same day. The purity of oxygen is that of the file or of the last run, else the common one, and said.

use std::path::Path;

use chrono::{DateTime, FixedOffset, TimeDelta, Timelike as _};

use super::EnterError;
use super::desk::refused_conditions;
use super::named::{name, suits, there};
use crate::book::{Book, Origin, RunQuery, RunState};
use crate::clock;
use crate::entry::{
    Acceptance, Build, Conditions, Id, Influence, Meter, Orifice, Purity, Purpose, Readings, Run, RunNumber,
    Transducer, ZeroAndLeak,
};
use crate::gas::Species;
use crate::quantity::text::{uncertain, value, zero_reading};
use crate::quantity::unit::Unit;
use crate::quantity::{
    AbsolutePressure, IndicatedFlow, PressureDifference, PressureRate, Quantity, Share, Temperature,
};
use crate::record::{DEFAULT_PURITY, Note, Setup, meter_suits, read_setup};
use crate::report::enter_questions::{Question, asked_for, bench_words};
use crate::report::enter_words::stands;
use crate::work::WorkError;
use crate::work::runs::said;
use crate::work::shelf::{Shelf, ShelfRegisters};

/// How long a bench counts as the same, and its barometer and temperature as worth offering: one working day.
const SAME_DAY: TimeDelta = TimeDelta::hours(12);
/// Runs looked through for the last typed one.
const LOOKED_THROUGH: u32 = 20;

/// The purposes, in the order they are listed.
const PURPOSES: [Purpose; 4] = [Purpose::Acceptance, Purpose::AsFound, Purpose::AsLeft, Purpose::Check];

/// What is known of a run before it begins.
#[derive(Debug)]
pub struct Start {
    pub(super) shelf: Shelf,
    orifice: Id,
    /// As it stands in the register; none when it is new.
    registered: Option<Orifice>,
    /// A run of this orifice that is still open.
    open: Option<RunNumber>,
    pub(super) last: Option<Last>,
    pub(super) gas: Option<Species>,
    purity: Option<Purity>,
    build: Option<Build>,
    purpose: Option<Purpose>,
    pub(super) meter: Option<Meter>,
    pub(super) transducer: Option<Transducer>,
    pub(super) acceptance: Answer<Acceptance>,
    technician: Answer<String>,
    conditions: Conditions,
    taken: Option<DateTime<FixedOffset>>,
    /// Conditions that an instrument reads with each point.
    read_along: Vec<Question>,
    before: ZeroAndLeak,
    zero_skipped: bool,
    leak_skipped: bool,
    pressure_unit: Option<Unit>,
    absolute: bool,
    flow_unit: Option<Unit>,
    pub(super) notes: Vec<String>,
}

/// An answer that may be "none".
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Answer<T> {
    Open,
    Given(Option<T>),
}

impl<T> Answer<T> {
    fn given(self) -> Option<T> {
        match self {
            Self::Given(given) => given,
            Self::Open => None,
        }
    }
}

/// The last run that was typed.
#[derive(Debug)]
pub(super) struct Last {
    number: RunNumber,
    pub(super) run: Run,
    same_day: bool,
}

/// A run that can begin with its first point.
#[derive(Debug)]
pub struct Ready {
    pub(super) shelf: Shelf,
    /// The run, without points.
    pub run: Run,
    /// What was said on the way.
    pub notes: Vec<String>,
    /// Unit of the pressure column of the run file, if one was taken.
    pub pressure_unit: Option<Unit>,
    /// Whether that column is over vacuum.
    pub absolute: bool,
    /// Unit of its flow column.
    pub flow_unit: Option<Unit>,
}

impl Start {
    /// Begins with an orifice; `asking` looks up the last typed run for its defaults.
    ///
    /// # Errors
    /// A text that is no name; a book that is there and cannot be read.
    pub fn new(shelf: Shelf, orifice: &str, asking: bool) -> Result<Self, WorkError> {
        let orifice = name(orifice)?;
        let (mut registered, mut open, mut last) = (None, None, None);
        if let Some(book) = there(&shelf)? {
            registered = book.entry::<Orifice>(&orifice)?.map(|found| found.entry);
            let history = book.history(&orifice, Some(1))?;
            open = history.first().filter(|h| h.run.state == RunState::Open).map(|h| h.run.number);
            if asking {
                last = last_typed(&book)?;
            }
        }
        // An orifice that has limits of its own is judged by them.
        let own = registered.as_ref().is_some_and(|orifice| orifice.acceptance.is_some());
        Ok(Self {
            shelf,
            orifice,
            open,
            last,
            gas: None,
            purity: None,
            build: None,
            purpose: None,
            meter: None,
            transducer: None,
            acceptance: if own { Answer::Given(None) } else { Answer::Open },
            registered,
            technician: Answer::Open,
            conditions: Conditions::default(),
            taken: None,
            read_along: Vec::new(),
            before: ZeroAndLeak::default(),
            zero_skipped: false,
            leak_skipped: false,
            pressure_unit: None,
            absolute: false,
            flow_unit: None,
            notes: Vec::new(),
        })
    }

    /// Takes gas, instruments, conditions, limits, technician and units from a run file, where they are not given yet.
    /// Limits that the orifice has in the register stay: those of a file may be of another orifice.
    ///
    /// # Errors
    /// A file that is refused.
    pub fn take_from(&mut self, file: &Path) -> Result<(), WorkError> {
        let setup = self.setup(file)?;
        if let (Some(own), Some(_)) = (self.own_limits(), &setup.acceptance) {
            self.notes.push(format!("judged by the limits {own} of the orifice, not by those of the file"));
        }
        self.gas = self.gas.or(setup.gas);
        self.purity = self.purity.or(setup.purity);
        self.build = setup.build;
        self.purpose = self.purpose.or(setup.purpose);
        self.meter = self.meter.take().or(setup.meter);
        self.transducer = self.transducer.take().or(setup.transducer);
        if let (Answer::Open, Some(acceptance)) = (&self.acceptance, setup.acceptance) {
            self.acceptance = Answer::Given(Some(acceptance));
        }
        if let (Answer::Open, Some(technician)) = (&self.technician, setup.technician) {
            self.technician = Answer::Given(Some(technician));
        }
        let (barometer, temperature) = (self.conditions.barometer, self.conditions.temperature);
        self.conditions = setup.conditions;
        merge(&mut self.conditions.barometer, barometer);
        merge(&mut self.conditions.temperature, temperature);
        self.pressure_unit = setup.pressure_unit;
        self.absolute = setup.absolute;
        self.flow_unit = setup.flow_unit;
        Ok(())
    }

    pub(super) fn setup(&mut self, file: &Path) -> Result<Setup, WorkError> {
        let registers = ShelfRegisters::new(&self.shelf);
        let loaded = match read_setup(file, self.gas, &registers) {
            Ok(loaded) => loaded,
            Err(refused) => return Err(registers.failure().unwrap_or_else(|| refused.into())),
        };
        // The purity taken is said of every run that begins, wherever its gas comes from.
        let (taken, said): (Vec<_>, Vec<_>) =
            loaded.notes.iter().partition(|note| **note == Note::PurityTaken);
        self.notes.extend(said.iter().map(ToString::to_string));
        Ok(Setup { purity: loaded.value.purity.filter(|_| taken.is_empty()), ..loaded.value })
    }

    /// Takes the share of oxygen in the oxygen, as in "99.5 % ± 0.3 %".
    ///
    /// # Errors
    /// A text that is no share, or one that is nought or over 100 %.
    pub fn take_purity(&mut self, text: &str) -> Result<(), WorkError> {
        let given = uncertain::<Share>(text).map_err(EnterError::from)?;
        let fraction = given.value.as_ratio();
        if fraction <= 0.0 || fraction > 1.0 {
            let says = format!(
                "\"{}\" cannot be: oxygen has above 0 % and at most 100 % of it",
                text.escape_debug()
            );
            return Err(EnterError::Refused(says).into());
        }
        let expanded = given.expanded.map_or(DEFAULT_PURITY.expanded, Share::as_ratio);
        self.purity = Some(Purity { fraction, expanded });
        Ok(())
    }

    /// Barometer or temperature is read with each point, by an instrument; no value holds for the whole run. `expanded` is
    /// the barometer's uncertainty by its papers (k = 2), if they say any.
    pub fn is_read_along(&mut self, question: Question, expanded: Option<PressureDifference>) {
        self.read_along.push(question);
        if question == Question::Barometer {
            self.conditions.barometer.expanded = expanded;
        }
    }

    /// The orifice.
    #[must_use]
    pub const fn orifice(&self) -> &Id {
        &self.orifice
    }

    /// Whether the orifice is in the register.
    #[must_use]
    pub const fn is_registered(&self) -> bool {
        self.registered.is_some()
    }

    /// The limits the orifice is judged by in the register.
    #[must_use]
    pub fn own_limits(&self) -> Option<&Id> {
        self.registered.as_ref()?.acceptance.as_ref()
    }

    /// What is to be said since this was asked last.
    pub fn take_notes(&mut self) -> Vec<String> {
        std::mem::take(&mut self.notes)
    }

    /// The newest run of this orifice, when it is still open.
    #[must_use]
    pub const fn open_run(&self) -> Option<RunNumber> {
        self.open
    }

    /// Whether a question has its answer.
    #[must_use]
    pub fn is_answered(&self, question: Question) -> bool {
        match question {
            Question::Gas => self.gas.is_some(),
            Question::Purpose => self.purpose.is_some(),
            Question::Meter => self.meter.is_some(),
            Question::Transducer => self.transducer.is_some(),
            Question::Acceptance => self.acceptance != Answer::Open,
            Question::Technician => self.technician != Answer::Open,
            Question::Barometer => {
                self.conditions.barometer.value.is_some() || self.read_along.contains(&question)
            }
            Question::Temperature => {
                self.conditions.temperature.value.is_some() || self.read_along.contains(&question)
            }
            Question::Taken => self.taken.is_some(),
            Question::ZeroBefore => self.before.zero.is_some() || self.zero_skipped,
            Question::LeakBefore => self.before.leak_pa_s.is_some() || self.leak_skipped,
            Question::ZeroAfter | Question::LeakAfter => true,
        }
    }

    /// What an empty answer means, in words; none where an answer is needed.
    #[must_use]
    pub fn default_words(&self, question: Question) -> Option<String> {
        let last = self.last.as_ref();
        let recent = last.filter(|last| last.same_day);
        match question {
            Question::Gas => Some(last.map_or(Species::Oxygen, |last| last.run.gas).name().to_owned()),
            Question::Purpose => Some(last.map_or(Purpose::Check, |last| last.run.purpose).name().to_owned()),
            Question::Meter => {
                let meter = &last.filter(|last| self.fits(&last.run.meter))?.run.meter;
                Some(named(&meter.id, &meter.papers.certificate, last?.number))
            }
            Question::Transducer => {
                let transducer = &last?.run.transducer;
                Some(named(&transducer.id, &transducer.papers.certificate, last?.number))
            }
            Question::Acceptance => Some(match last.and_then(|last| last.run.acceptance.as_ref()) {
                Some(acceptance) => named(&acceptance.id, &None, last?.number),
                None => "none".to_owned(),
            }),
            Question::Technician => {
                let technician = last.and_then(|last| last.run.technician.clone());
                Some(technician.unwrap_or_else(|| "not named".to_owned()))
            }
            Question::Barometer | Question::Temperature => Some(stands(question, &recent?.run)),
            Question::Taken => Some(this_second().to_rfc3339()),
            Question::ZeroBefore | Question::LeakBefore | Question::ZeroAfter | Question::LeakAfter => {
                Some("not read".to_owned())
            }
        }
    }

    /// The last typed run of the same day with its bench in words, when its bench could be this one's.
    #[must_use]
    pub fn same_bench(&self) -> Option<(RunNumber, String)> {
        let last = self.last.as_ref().filter(|last| last.same_day && self.fits(&last.run.meter))?;
        let open = Question::ALL.iter().filter(|q| q.of_the_bench() && !self.is_answered(**q)).count();
        (open > 1).then(|| (last.number, bench_words(&last.run)))
    }

    /// Takes everything that is not given yet and belongs to the bench from the last typed run.
    ///
    /// # Errors
    /// A book that cannot be read; an instrument that is no longer in the register.
    pub fn take_same_bench(&mut self) -> Result<(), WorkError> {
        for question in Question::ALL {
            if question.of_the_bench() && !self.is_answered(question) {
                self.answer(question, "")?;
            }
        }
        if let Some(last) = &self.last {
            self.purity = self.purity.or(last.run.purity);
            let there = last.run.conditions.clone();
            let (barometer, temperature) = (self.conditions.barometer, self.conditions.temperature);
            self.conditions = Conditions {
                barometer: Influence { value: None, ..there.barometer },
                temperature: Influence { value: None, ..there.temperature },
                ..there
            };
            merge(&mut self.conditions.barometer, barometer);
            merge(&mut self.conditions.temperature, temperature);
        }
        Ok(())
    }

    /// Takes an answer; an empty one means what [`Start::default_words`] says.
    ///
    /// # Errors
    /// A text that is no answer, each in one sentence; a book that cannot be read.
    pub fn answer(&mut self, question: Question, text: &str) -> Result<(), WorkError> {
        let text = text.trim();
        let empty = text.is_empty();
        match question {
            Question::Gas => {
                let gas = if empty {
                    self.last.as_ref().map_or(Species::Oxygen, |last| last.run.gas)
                } else {
                    Species::ALL.into_iter().find(|gas| gas.name().eq_ignore_ascii_case(text)).ok_or_else(
                        || EnterError::Word {
                            text: text.to_owned(),
                            known: Species::ALL.map(Species::name).join(", "),
                        },
                    )?
                };
                if let Some(meter) = &self.meter {
                    suits(meter, gas)?;
                }
                self.gas = Some(gas);
            }
            Question::Purpose => {
                let word = PURPOSES
                    .into_iter()
                    .find(|purpose| purpose.name() == text.to_lowercase().replace(' ', "-"));
                self.purpose = Some(if empty {
                    self.last.as_ref().map_or(Purpose::Check, |last| last.run.purpose)
                } else {
                    word.ok_or_else(|| EnterError::Word {
                        text: text.to_owned(),
                        known: PURPOSES.map(Purpose::name).join(", "),
                    })?
                });
            }
            Question::Meter => self.answer_meter(text)?,
            Question::Transducer => self.answer_transducer(text)?,
            Question::Acceptance => self.answer_acceptance(text)?,
            Question::Technician => {
                let last = self.last.as_ref().and_then(|last| last.run.technician.clone());
                self.technician = Answer::Given(match text {
                    "" => last,
                    "none" => None,
                    name => Some(said("technician", name)?.to_owned()),
                });
            }
            Question::Barometer => {
                let last =
                    self.last.as_ref().filter(|last| last.same_day).map(|l| l.run.conditions.barometer);
                let given = condition::<AbsolutePressure>(question, text, last.unwrap_or_default())?;
                let mut conditions = self.conditions.clone();
                merge(&mut conditions.barometer, given);
                self.check(&conditions)?;
                self.conditions = conditions;
            }
            Question::Temperature => {
                let last = self.last.as_ref().filter(|l| l.same_day).map(|l| l.run.conditions.temperature);
                let given = condition::<Temperature>(question, text, last.unwrap_or_default())?;
                let mut conditions = self.conditions.clone();
                merge(&mut conditions.temperature, given);
                self.check(&conditions)?;
                self.conditions = conditions;
            }
            Question::Taken => {
                self.taken = Some(if empty {
                    this_second()
                } else {
                    DateTime::parse_from_rfc3339(text).map_err(|_| EnterError::Time(text.to_owned()))?
                });
            }
            Question::ZeroBefore | Question::ZeroAfter => {
                self.zero_skipped = empty;
                self.before.zero = if empty { None } else { Some(zero_of(text)?) };
            }
            Question::LeakBefore | Question::LeakAfter => {
                self.leak_skipped = empty;
                self.before.leak_pa_s = if empty { None } else { Some(leak_of(text)?) };
            }
        }
        Ok(())
    }

    /// The run, when everything needed is known; what is not answered takes its common default.
    ///
    /// # Errors
    /// Something that is needed and missing; conditions that no bench has.
    pub fn ready(mut self) -> Result<Ready, WorkError> {
        // Only what a person said may come from the last run; the rest is the common default.
        self.last = None;
        for question in Question::ALL {
            if !self.is_answered(question) {
                self.answer(question, "")?;
            }
        }
        let gas = self.gas.unwrap_or(Species::Oxygen);
        let needed = |question| EnterError::Needed(asked_for(question));
        let meter = self.meter.ok_or_else(|| needed(Question::Meter))?;
        suits(&meter, gas)?;
        if let (Some(_), true) = (self.purity, gas != Species::Oxygen) {
            self.notes.push(format!("the gas is {}: the purity of oxygen is not used", gas.name()));
        }
        let mut purity = self.purity.filter(|_| gas == Species::Oxygen);
        if gas == Species::Oxygen && purity.is_none() {
            self.notes.push(Note::PurityTaken.to_string());
            purity = Some(DEFAULT_PURITY);
        }
        let run = Run {
            orifice: self.registered.map_or(self.orifice, |orifice| orifice.id),
            build: self.build.unwrap_or_default(),
            gas,
            purity,
            purpose: self.purpose.unwrap_or(Purpose::Check),
            taken: self.taken.unwrap_or_else(this_second),
            technician: self.technician.given(),
            readings: Readings::Points(Vec::new()),
            conditions: self.conditions,
            before: self.before,
            after: ZeroAndLeak::default(),
            meter,
            transducer: self.transducer.ok_or_else(|| needed(Question::Transducer))?,
            acceptance: self.acceptance.given(),
            left_out: Vec::new(),
        };
        refused_conditions(&with_usual_conditions(run.clone()))?;
        Ok(Ready {
            shelf: self.shelf,
            run,
            notes: self.notes,
            pressure_unit: self.pressure_unit,
            absolute: self.absolute,
            flow_unit: self.flow_unit,
        })
    }

    /// Whether a meter can say anything about the gas, as far as that is known.
    fn fits(&self, meter: &Meter) -> bool {
        self.gas.is_none_or(|gas| meter_suits(&meter.kind, gas).is_ok())
    }

    /// Whether a bench can have such conditions, as far as the rest is known.
    fn check(&self, conditions: &Conditions) -> Result<(), WorkError> {
        let (Some(meter), Some(transducer)) = (&self.meter, &self.transducer) else { return Ok(()) };
        refused_conditions(&with_usual_conditions(Run {
            orifice: self.orifice.clone(),
            build: Build::Unknown,
            gas: self.gas.unwrap_or(Species::Oxygen),
            purity: None,
            purpose: Purpose::Check,
            taken: DateTime::UNIX_EPOCH.fixed_offset(),
            technician: None,
            readings: Readings::Points(Vec::new()),
            conditions: conditions.clone(),
            before: ZeroAndLeak::default(),
            after: ZeroAndLeak::default(),
            meter: meter.clone(),
            transducer: transducer.clone(),
            acceptance: None,
            left_out: Vec::new(),
        }))
    }
}

/// The run with the usual barometer and temperature where it has no value of its own, so that the rest can be checked.
fn with_usual_conditions(mut run: Run) -> Run {
    run.conditions.barometer.value.get_or_insert(AbsolutePressure::STANDARD_ATMOSPHERE);
    run.conditions.temperature.value.get_or_insert(Temperature::from_c(20.0));
    run
}

/// A meter's zero at no flow.
///
/// # Errors
/// A text that is no flow.
pub(super) fn zero_of(text: &str) -> Result<IndicatedFlow, EnterError> {
    Ok(zero_reading(text)?)
}

/// A fall of pressure with time, in pascals per second.
///
/// # Errors
/// A text that is none.
pub(super) fn leak_of(text: &str) -> Result<f64, EnterError> {
    Ok(value::<PressureRate>(text)?.as_pa_s())
}

/// A condition as typed, or the one before when nothing was typed.
pub(super) fn condition<T: Quantity>(
    question: Question,
    text: &str,
    last: Influence<T, T::Difference>,
) -> Result<Influence<T, T::Difference>, EnterError> {
    if text.trim().is_empty() {
        return if last.value.is_some() { Ok(last) } else { Err(EnterError::Needed(asked_for(question))) };
    }
    Ok(uncertain::<T>(text)?.into())
}

/// Takes what is given over what is there; a ± that is not given stays.
pub(super) fn merge<T, D>(there: &mut Influence<T, D>, given: Influence<T, D>) {
    if given.value.is_some() {
        there.value = given.value;
    }
    if given.expanded.is_some() {
        there.expanded = given.expanded;
    }
}

/// An instrument or limits of the last run, for brackets.
fn named(id: &Option<Id>, certificate: &Option<String>, run: RunNumber) -> String {
    match (id, certificate) {
        (Some(id), _) => id.to_string(),
        (None, Some(certificate)) => format!("as in {run}, certificate {certificate}"),
        (None, None) => format!("as in {run}"),
    }
}

/// The time a person would write down.
fn this_second() -> DateTime<FixedOffset> {
    let now = clock::now();
    now.with_nanosecond(0).unwrap_or(now)
}

fn last_typed(book: &Book) -> Result<Option<Last>, WorkError> {
    let newest = book.runs(&RunQuery { before: None, limit: Some(LOOKED_THROUGH), open_only: false })?;
    let Some(row) = newest.iter().find(|row| row.origin == Origin::Entered) else { return Ok(None) };
    let record = book.run(row.number)?;
    let age = clock::now() - record.recorded;
    Ok(Some(Last {
        number: row.number,
        run: record.run,
        same_day: age < SAME_DAY && age >= TimeDelta::zero(),
    }))
}
