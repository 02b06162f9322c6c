//! The run that is being typed.
//!
//! Comes in: a [`Ready`] run or the number of an open one, then points and changes. Goes out: after each the run as the
//! book holds it, and what its points say. Every change is one transaction; the run is read from the book again after
//! it, so that what another program did meanwhile is seen. A point that cannot be (below vacuum, in conditions no bench
//! has) is refused before it is written.

use super::EnterError;
use super::start::{Ready, condition, leak_of, merge, zero_of};
use crate::bench::advice::{LowPoints, low_points};
use crate::bench::{Analysis, BenchError, FEWEST_POINTS, Questions, analyse};
use crate::book::{Book, BookError, Origin, RunState};
use crate::entry::{Indication, LeftOut, PointReading, Readings, Run, RunNumber};
use crate::quantity::text::expanded_only;
use crate::quantity::{AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, Temperature};
use crate::record::MOST_POINTS;
use crate::report::bench_fit::Fitted;
use crate::report::enter_questions::Question;
use crate::report::enter_words::{TypedUnits, flow_words, pressure_words};
use crate::report::number::figures;
use crate::work::WorkError;
use crate::work::runs::{load, number_of, said};
use crate::work::shelf::{Shelf, stamped};

/// A reading without a unit is doubted when its flow for each bar is this many times that of the others, or this many
/// times less: units that are mistaken for one another differ by more, and low points that are not choked by less.
const DOUBTED: f64 = 5.0;
/// A reading without a unit is doubted beyond this many times the top of the instrument's range.
const FAR_BEYOND: f64 = 2.0;

/// A run that is being typed.
#[derive(Debug)]
pub struct Desk {
    shelf: Shelf,
    book: Option<Book>,
    number: Option<RunNumber>,
    /// As the book holds it; before the first point, as it will begin.
    header: Run,
    /// The same with what the registers add.
    run: Run,
    open: bool,
    analysed: Option<Result<Analysis, WorkError>>,
    /// The line that was shown last.
    said: Option<Analysis>,
}

/// What a point did.
#[derive(Debug, Clone, PartialEq)]
pub struct Added {
    /// The run it is in.
    pub run: RunNumber,
    /// Its number.
    pub point: usize,
    /// Whether the run began with it.
    pub begun: bool,
    /// Whether the orifice was unknown and was created with its name only.
    pub orifice_created: bool,
    /// What was said when the book was opened for it.
    pub notes: Vec<String>,
}

/// What the points say so far.
#[derive(Debug, Clone, Copy)]
pub enum Standing<'a> {
    /// A line.
    Line(Fitted<'a>),
    /// So many usable points are missing for a line; so many of those there are not choked.
    More {
        /// Points missing.
        missing: usize,
        /// Points that do not count because they are not choked.
        not_choked: usize,
    },
    /// Something else keeps it from a line.
    No(&'a WorkError),
}

impl Desk {
    /// A run that begins with its first point.
    #[must_use]
    pub fn new(ready: Ready) -> Self {
        Self {
            shelf: ready.shelf,
            book: None,
            number: None,
            run: ready.run.clone(),
            header: ready.run,
            open: true,
            analysed: None,
            said: None,
        }
    }

    /// An open run of the book.
    ///
    /// # Errors
    /// A text that is no run's number; a run that is not there, is complete, or was not typed; a book that cannot be
    /// opened.
    pub fn resume(shelf: Shelf, run: &str) -> Result<Self, WorkError> {
        let number = number_of(run)?;
        let book = shelf.to_change()?;
        let record = book.run(number)?;
        if record.state == RunState::Complete {
            return Err(BookError::Complete { run: number }.into());
        }
        if record.origin != Origin::Entered {
            return Err(EnterError::NotTyped(number).into());
        }
        let mut desk = Self {
            shelf,
            book: Some(book),
            number: Some(number),
            run: record.run.clone(),
            header: record.run,
            open: true,
            analysed: None,
            said: None,
        };
        desk.read_again()?;
        Ok(desk)
    }

    /// A run of the book that is being logged, however far it is.
    ///
    /// # Errors
    /// A run that is not there, a book that cannot be read.
    pub fn of_logged(shelf: Shelf, number: RunNumber) -> Result<Self, WorkError> {
        let book = shelf.to_change()?;
        let record = book.run(number)?;
        let mut desk = Self {
            shelf,
            book: Some(book),
            number: Some(number),
            run: record.run.clone(),
            header: record.run,
            open: true,
            analysed: None,
            said: None,
        };
        desk.read_again()?;
        Ok(desk)
    }

    /// Its number; none before the first point.
    #[must_use]
    pub const fn number(&self) -> Option<RunNumber> {
        self.number
    }

    /// Whether points may still come.
    #[must_use]
    pub const fn is_open(&self) -> bool {
        self.open
    }

    /// The run as it stands.
    #[must_use]
    pub const fn run(&self) -> &Run {
        &self.run
    }

    /// The points as they stand, struck ones too.
    #[must_use]
    pub fn points(&self) -> &[PointReading] {
        match &self.run.readings {
            Readings::Points(points) => points,
            Readings::Series(_) => &[],
        }
    }

    /// The points that are struck or left out.
    #[must_use]
    pub fn left_out(&self) -> &[LeftOut] {
        &self.run.left_out
    }

    /// What the points say so far.
    #[must_use]
    pub fn standing(&self) -> Standing<'_> {
        match &self.analysed {
            Some(Ok(analysis)) => Standing::Line(self.fitted(analysis, None)),
            Some(Err(WorkError::Bench {
                error: BenchError::TooFewPoints { usable, not_choked, .. },
                ..
            })) => {
                let missing = FEWEST_POINTS.saturating_sub(*usable);
                Standing::More { missing, not_choked: *not_choked }
            }
            Some(Err(error)) => Standing::No(error),
            None => Standing::More { missing: FEWEST_POINTS, not_choked: 0 },
        }
    }

    /// The analysis, and what would settle the choke ratio; none without a line.
    #[must_use]
    pub fn line(&self) -> Option<(&Analysis, Option<LowPoints>)> {
        let analysis = self.analysed.as_ref()?.as_ref().ok()?;
        Some((analysis, low_points(&self.run, analysis)))
    }

    /// The line that was shown last, so that only what changed since needs saying.
    #[must_use]
    pub const fn said(&self) -> Option<&Analysis> {
        self.said.as_ref()
    }

    /// The line as it is now was shown.
    pub fn remember(&mut self) {
        self.said = self.analysed.as_ref().and_then(|analysed| analysed.as_ref().ok()).cloned();
    }

    /// A line with what would settle the choke ratio, for `report`.
    #[must_use]
    pub const fn fitted<'a>(
        &'a self,
        analysis: &'a Analysis,
        low_points: Option<&'a LowPoints>,
    ) -> Fitted<'a> {
        Fitted { run: &self.run, analysis, monte_carlo: None, low_points, notes: &[] }
    }

    /// Doubts a reading that was written without units and does not go with the rest.
    ///
    /// # Errors
    /// [`EnterError::FarBeyond`], [`EnterError::UnitDoubt`].
    pub fn doubt(
        &self,
        reading: &PointReading,
        except: Option<usize>,
        units: &TypedUnits,
    ) -> Result<(), EnterError> {
        let papers = &self.run.transducer.papers;
        if let Some((_, top)) = papers.range
            && reading.pressure.shown_pa() > FAR_BEYOND * top.as_pa()
        {
            return Err(EnterError::FarBeyond {
                reading: pressure_words(reading.pressure, units),
                instrument: "transducer",
                top: pressure_words(Indication::Gauge(top), units),
            });
        }
        if let Some((_, top)) = self.run.meter.papers.range
            && reading.flow.as_l_min() > FAR_BEYOND * top.as_l_min()
        {
            return Err(EnterError::FarBeyond {
                reading: flow_words(reading.flow, units),
                instrument: "flow meter",
                top: flow_words(top, units),
            });
        }
        let others = self.points().iter().enumerate();
        let mut of_others: Vec<f64> = others
            .filter(|(i, _)| Some(i + 1) != except && !self.left_out().iter().any(|out| out.point == i + 1))
            .map(|(_, point)| self.flow_for_each_bar(point))
            .collect();
        of_others.sort_by(f64::total_cmp);
        let Some(middle) = of_others.get(of_others.len() / 2).filter(|middle| **middle > 0.0) else {
            return Ok(());
        };
        let times = self.flow_for_each_bar(reading) / middle;
        if (1.0 / DOUBTED..=DOUBTED).contains(&times) {
            return Ok(());
        }
        let reading =
            format!("{} {}", pressure_words(reading.pressure, units), flow_words(reading.flow, units));
        Err(EnterError::UnitDoubt { reading, times: figures(times, 2) })
    }

    /// Adds a point; it is in the book when this returns.
    ///
    /// # Errors
    /// A point that cannot be; a book that cannot be written.
    pub fn add(&mut self, reading: PointReading) -> Result<Added, WorkError> {
        if self.points().len() >= MOST_POINTS {
            return Err(EnterError::TooManyPoints.into());
        }
        refused(&self.run, &reading)?;
        if let (Some(run), Some(book)) = (self.number, &mut self.book) {
            let point = stamped(|stamp| book.add_points(run, vec![reading], stamp))??;
            self.read_again()?;
            return Ok(Added { run, point, begun: false, orifice_created: false, notes: Vec::new() });
        }
        let mut notes = Vec::new();
        let mut book = self.shelf.to_write(&mut notes)?;
        self.header.readings = Readings::Points(vec![reading]);
        let begun = stamped(|stamp| book.begin_run(&self.header, stamp))??;
        self.number = Some(begun.number);
        self.book = Some(book);
        self.read_again()?;
        let orifice_created = begun.orifice_created;
        Ok(Added { run: begun.number, point: 1, begun: true, orifice_created, notes })
    }

    /// Replaces a reading that was typed wrong; what had stood there.
    ///
    /// # Errors
    /// A point that is not there or is struck, a reading that cannot be; a book that cannot be written.
    pub fn correct(&mut self, point: usize, reading: PointReading) -> Result<PointReading, WorkError> {
        refused(&self.run, &reading)?;
        let before = point.checked_sub(1).and_then(|i| self.points().get(i)).copied();
        let (run, book) = self.begun()?;
        stamped(|stamp| book.correct_point(run, point, reading, stamp))??;
        self.read_again()?;
        before.ok_or_else(|| EnterError::NoPoints.into())
    }

    /// Strikes a point.
    ///
    /// # Errors
    /// A point that is not there or is struck already, a reason that says nothing; a book that cannot be written.
    pub fn strike(&mut self, point: usize, why: &str) -> Result<(), WorkError> {
        let why = said("the reason", why)?.to_owned();
        let (run, book) = self.begun()?;
        stamped(|stamp| book.strike_point(run, point, &why, stamp))??;
        self.read_again()
    }

    /// Restates a condition, or a reading of zero or leak. An empty text leaves it as it is.
    ///
    /// # Errors
    /// A text that is no answer; a book that cannot be written.
    pub fn restate(&mut self, question: Question, text: &str) -> Result<(), WorkError> {
        let text = text.trim();
        if text.is_empty() {
            return Ok(());
        }
        let mut header = self.header.clone();
        match question {
            Question::Barometer if only_uncertainty(text) => {
                let expanded = expanded_only::<AbsolutePressure>(text).map_err(EnterError::from)?;
                header.conditions.barometer.expanded = Some(expanded);
            }
            Question::Temperature if only_uncertainty(text) => {
                let expanded = expanded_only::<Temperature>(text).map_err(EnterError::from)?;
                header.conditions.temperature.expanded = Some(expanded);
            }
            Question::Barometer => {
                let given = condition::<AbsolutePressure>(question, text, header.conditions.barometer)?;
                merge(&mut header.conditions.barometer, given);
            }
            Question::Temperature => {
                let given = condition::<Temperature>(question, text, header.conditions.temperature)?;
                merge(&mut header.conditions.temperature, given);
            }
            Question::ZeroBefore => header.before.zero = Some(zero_of(text)?),
            Question::ZeroAfter => header.after.zero = Some(zero_of(text)?),
            Question::LeakBefore => header.before.leak_pa_s = Some(leak_of(text)?),
            Question::LeakAfter => header.after.leak_pa_s = Some(leak_of(text)?),
            // Orifice, gas, purpose, time and technician name a run, and instruments are not changed on the way.
            _ => return Ok(()),
        }
        refused_conditions(&header)?;
        let (Some(run), Some(book)) = (self.number, &mut self.book) else {
            self.run = header.clone();
            self.header = header;
            return Ok(());
        };
        stamped(|stamp| book.restate_run(run, &header, stamp))??;
        self.read_again()
    }

    /// Says that all points are in. Without a line a run ends only `anyway`.
    ///
    /// # Errors
    /// No line; a book that cannot be written.
    pub fn finish(&mut self, anyway: bool) -> Result<(), WorkError> {
        self.may_finish(anyway)?;
        let (run, book) = self.begun()?;
        stamped(|stamp| book.finish_run(run, stamp))??;
        self.read_again()
    }

    /// Whether the run can end.
    ///
    /// # Errors
    /// No point, or unless `anyway` no line.
    pub fn may_finish(&self, anyway: bool) -> Result<(), EnterError> {
        match &self.analysed {
            None => Err(EnterError::NoPoints),
            Some(Err(WorkError::Bench { error, .. })) if !anyway => {
                Err(EnterError::NoLine(error.to_string()))
            }
            Some(_) => Ok(()),
        }
    }

    fn begun(&mut self) -> Result<(RunNumber, &mut Book), EnterError> {
        self.number.zip(self.book.as_mut()).ok_or(EnterError::NoPoints)
    }

    /// Reads the run from the book and analyses it again.
    ///
    /// # Errors
    /// A book that cannot be read.
    pub fn read_again(&mut self) -> Result<(), WorkError> {
        let (Some(number), Some(book)) = (self.number, &self.book) else { return Ok(()) };
        let record = book.run(number)?;
        self.open = record.state == RunState::Open;
        self.header = record.run;
        let loaded = load(book, number)?;
        let analysed = loaded.analyse(&Questions::default());
        self.run = loaded.run;
        self.analysed = Some(analysed);
        Ok(())
    }

    /// Flow shown over absolute pressure, in litres per minute and bar.
    fn flow_for_each_bar(&self, point: &PointReading) -> f64 {
        let ambient = self.run.conditions.barometer.value.unwrap_or(AbsolutePressure::STANDARD_ATMOSPHERE);
        let absolute = match point.pressure {
            Indication::Gauge(gauge) => gauge.above(ambient),
            Indication::Absolute(absolute) => absolute,
        };
        point.flow.as_l_min() / absolute.as_bar()
    }
}

/// Refuses a reading that cannot be, with the sentence of the analysis.
fn refused(run: &Run, reading: &PointReading) -> Result<(), WorkError> {
    match analyse(run, std::slice::from_ref(reading), &Questions::default()) {
        Err(
            error @ (BenchError::BelowVacuum(..)
            | BenchError::ImplausibleBarometer(..)
            | BenchError::ImplausibleTemperature(..)
            | BenchError::MissingCondition(_)),
        ) => {
            // Alone it is point 1 of its run, which is not the number it would get.
            let says = error.to_string();
            let says = says.replacen("point 1 has", "that would be", 1);
            Err(EnterError::Refused(says).into())
        }
        _ => Ok(()),
    }
}

/// Refuses conditions that no bench has: they are those of any reading.
pub(super) fn refused_conditions(run: &Run) -> Result<(), WorkError> {
    let one_bar = PointReading {
        pressure: Indication::Gauge(GaugePressure::from_bar(1.0)),
        flow: IndicatedFlow::from_l_min(0.1),
        timed: None,
        pressure_scatter: None::<PressureDifference>,
        flow_scatter: None,
        averaged: 1.0,
        temperature: None,
        barometer: None,
        meter_temperature: None,
        meter_pressure: None,
        sweep: None,
        time_s: None,
    };
    refused(run, &one_bar)
}

fn only_uncertainty(text: &str) -> bool {
    text.starts_with('±') || text.starts_with("+/-")
}
