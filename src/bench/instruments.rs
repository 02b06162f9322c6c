//! Whether the instruments were fit to measure: in date, in range, with a zero that holds and nothing leaking.

use chrono::NaiveDate;

use super::checks::{Check, CheckKind, CheckVerdict, Finding};
use super::points::Point;
use crate::entry::{Limits, Papers, Run, ZeroAndLeak};

/// Below this share of the top of its range an instrument's papers say little (common practice, no source).
const LOW_SHARE_OF_RANGE: f64 = 0.1;

/// Which instrument.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Instrument {
    /// The flow meter.
    Meter,
    /// The pressure transducer.
    Transducer,
}

/// When a check of zero or leak was made.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum When {
    /// Before the first point.
    Before,
    /// After the last point.
    After,
}

/// One thing to say of an instrument.
#[derive(Debug, Clone, PartialEq)]
pub enum InstrumentFinding {
    /// The calibration was out of date on the day of the run.
    Overdue(Instrument, NaiveDate),
    /// No due date is stated.
    NoDueDate(Instrument),
    /// No range is stated.
    NoRange(Instrument),
    /// Points of the line outside the range of the papers, by number.
    OutsideRange(Instrument, Vec<usize>),
    /// Points of the line under a tenth of the top of the range, by number.
    LowInRange(Instrument, Vec<usize>),
    /// The zero reading is off by more than the papers allow; both in L/min of the meter's scale.
    ZeroOff(When, f64, f64),
    /// The pressure falls too fast with the outlet blanked; in Pa/s.
    Leaks(When, f64),
    /// Neither zero nor leak was recorded.
    ZeroAndLeakNotRecorded,
}

impl InstrumentFinding {
    /// Whether it makes the check fail.
    #[must_use]
    pub const fn fails(&self) -> bool {
        matches!(self, Self::Overdue(..) | Self::OutsideRange(..) | Self::ZeroOff(..) | Self::Leaks(..))
    }
}

/// Checks both instruments on the points of the line.
pub(super) fn check_instruments(run: &Run, used: &[&Point], limits: &Limits) -> Check {
    let mut findings = Vec::new();
    let day = run.taken.date_naive();
    papers(
        &mut findings,
        Instrument::Meter,
        &run.meter.papers,
        day,
        used,
        |p| p.raw.shown_l_min,
        |f| f.as_l_min(),
    );
    papers(
        &mut findings,
        Instrument::Transducer,
        &run.transducer.papers,
        day,
        used,
        |p| p.raw.shown_pa,
        |p| p.as_pa(),
    );
    let meter = &run.meter.papers;
    let allowed = meter.zero.map_or(0.0, |z| z.as_l_min()) + meter.resolution.map_or(0.0, |r| r.as_l_min());
    for (when, checked) in [(When::Before, &run.before), (When::After, &run.after)] {
        zero_and_leak(&mut findings, when, checked, allowed, limits);
    }
    if [&run.before, &run.after].iter().all(|c| c.zero.is_none() && c.leak_pa_s.is_none()) {
        findings.push(InstrumentFinding::ZeroAndLeakNotRecorded);
    }
    let verdict = if findings.iter().any(InstrumentFinding::fails) {
        CheckVerdict::Fail
    } else if findings.is_empty() {
        CheckVerdict::Pass
    } else {
        CheckVerdict::Note
    };
    Check {
        kind: CheckKind::Instruments,
        value: None,
        limit: None,
        p_value: None,
        verdict,
        finding: if findings.is_empty() { Finding::Plain } else { Finding::Instruments(findings) },
    }
}

fn papers<D, R: Copy>(
    findings: &mut Vec<InstrumentFinding>,
    which: Instrument,
    papers: &Papers<D, R>,
    day: NaiveDate,
    used: &[&Point],
    shown: impl Fn(&Point) -> f64,
    number: impl Fn(R) -> f64,
) {
    match papers.due {
        Some(due) if day > due => findings.push(InstrumentFinding::Overdue(which, due)),
        Some(_) => {}
        None => findings.push(InstrumentFinding::NoDueDate(which)),
    }
    let Some((low, high)) = papers.range.map(|(low, high)| (number(low), number(high))) else {
        findings.push(InstrumentFinding::NoRange(which));
        return;
    };
    let numbers = |of: &dyn Fn(f64) -> bool| -> Vec<usize> {
        used.iter().filter(|p| of(shown(p))).map(|p| p.index).collect()
    };
    let outside = numbers(&|v| v < low || v > high);
    let faint = numbers(&|v| (low..=high).contains(&v) && v < LOW_SHARE_OF_RANGE * high);
    if !outside.is_empty() {
        findings.push(InstrumentFinding::OutsideRange(which, outside));
    }
    if !faint.is_empty() {
        findings.push(InstrumentFinding::LowInRange(which, faint));
    }
}

fn zero_and_leak(
    findings: &mut Vec<InstrumentFinding>,
    when: When,
    checked: &ZeroAndLeak,
    allowed_l_min: f64,
    limits: &Limits,
) {
    if let Some(zero) = checked.zero.map(|z| z.as_l_min()).filter(|z| z.abs() > allowed_l_min) {
        findings.push(InstrumentFinding::ZeroOff(when, zero, allowed_l_min));
    }
    if let Some(leak) = checked.leak_pa_s.filter(|l| *l > limits.leak_pa_s) {
        findings.push(InstrumentFinding::Leaks(when, leak));
    }
}
