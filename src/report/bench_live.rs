//! A bench run while it is logged, as people see it.
//!
//! Comes in: [`BenchView`], filled by whoever logs the run. Goes out: the words of its parts, and one line for a pipe.
//! Drawing them on a terminal is `cli`'s, on the page the page's.

use super::Units;
use super::layout::counted;
use super::live_parts::{Dial, DialKind, Hold, Saved};
use super::number::fixed;
use super::typed::{clock, span, tame};
use crate::entry::{Purpose, RunNumber, Sweep};

/// A run while it is logged.
#[derive(Debug, Clone, PartialEq)]
pub struct BenchView {
    /// The units asked for.
    pub units: Units,
    /// The run; none before the book has it.
    pub run: Option<RunNumber>,
    /// The orifice.
    pub orifice: String,
    /// The gas, in a word.
    pub gas: String,
    /// Why the run is made.
    pub purpose: Purpose,
    /// Who makes it.
    pub technician: Option<String>,
    /// Intermediate pressure.
    pub pressure: Dial,
    /// Flow.
    pub flow: Dial,
    /// Gas temperature and barometer, where an instrument reads them.
    pub around: Vec<Dial>,
    /// Steady, or why not.
    pub sign: Sign,
    /// Whether points are taken by themselves.
    pub by_itself: bool,
    /// Whether there is a point at this level already.
    pub taken_here: bool,
    /// How far the run has come.
    pub sweep: SweepSoFar,
    /// The points, in the order of their numbers.
    pub points: Vec<PointSeen>,
    /// The line so far; none without one.
    pub line: Option<LineSeen>,
    /// Limits of the acceptance at its nominal IP: bar gauge, lowest and highest L/min of this run's gas as the points have
    /// it; none without an acceptance.
    pub limits: Option<(f64, f64, f64)>,
    /// The running line, its verdict so far and what the last point says of it, a sentence each; without a line, why there
    /// is none.
    pub says: Vec<String>,
    /// The checks, in their order.
    pub checks: Vec<CheckSeen>,
    /// What is safely in the book.
    pub saved: Saved,
    /// Who logs.
    pub hold: Hold,
    /// Seconds since the run began.
    pub elapsed_s: f64,
    /// Seconds until it ends by itself; none when it does not.
    pub left_s: Option<f64>,
}

/// The steady sign.
#[derive(Debug, Clone, PartialEq)]
pub struct Sign {
    /// Whether a point can be taken.
    pub steady: bool,
    /// Steady, or why not, without a full stop: "pressure still falling 0.04 bar/min".
    pub says: String,
    /// For how many seconds it has been steady.
    pub held_s: f64,
    /// For how many it must be.
    pub least_s: f64,
}

/// How far a run has come.
#[derive(Debug, Clone, PartialEq)]
pub struct SweepSoFar {
    /// The direction in which the pressure was stepped last; none before the first step.
    pub direction: Option<Sweep>,
    /// Points that are wanted in all; none when nobody said.
    pub wanted: Option<usize>,
    /// Lowest and highest IP that the run is to cover, bar gauge; none when nothing says.
    pub span_bar: Option<(f64, f64)>,
    /// What to do next, in a few words, as "next: 11 bar, rising"; none when nothing is known.
    pub next: Option<String>,
}

/// A point of the run.
#[derive(Debug, Clone, PartialEq)]
pub struct PointSeen {
    /// Its number.
    pub number: usize,
    /// Pressure as shown, bar.
    pub pressure_bar: f64,
    /// Flow as shown, L/min.
    pub flow_l_min: f64,
    /// The direction it was reached in.
    pub sweep: Option<Sweep>,
    /// How far it lies off the line, as a share of it; none without a line.
    pub off_line: Option<f64>,
    /// Why it does not count: struck or left out, or not choked; none when it does. What a person typed is tamed when
    /// shown.
    pub left_out: Option<String>,
    /// Whether a check says that it lies apart from the rest.
    pub apart: bool,
}

/// The line so far in the same figures as the points: pressure as shown in bar, flow as shown in L/min.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LineSeen {
    /// Flow at no pressure shown.
    pub intercept_l_min: f64,
    /// Rise of the flow with the pressure.
    pub slope_l_min_bar: f64,
}

/// What a check says.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Holds {
    /// It holds.
    Yes,
    /// It does not hold.
    No,
    /// It could not be decided, or there is something to know.
    Open,
}

/// A check so far.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CheckSeen {
    /// Its finding.
    pub holds: Holds,
    /// Its sentence.
    pub says: String,
}

/// What the run is: orifice, gas, purpose, technician.
#[must_use]
pub fn title(view: &BenchView) -> String {
    let mut parts = vec![tame(&view.orifice), tame(&view.gas), view.purpose.name().to_owned()];
    parts.extend(view.technician.as_deref().map(tame));
    parts.join(" · ")
}

/// Its number and how long it lasts.
#[must_use]
pub fn whereabouts(view: &BenchView) -> String {
    let run = view.run.map_or_else(|| "a new run".to_owned(), |run| format!("run {run}"));
    let left = view.left_s.map(|left| format!(", {} left", span(left))).unwrap_or_default();
    format!("{run} · {}{left}", clock(view.elapsed_s))
}

fn points_words(points: usize) -> String {
    counted(u64::try_from(points).unwrap_or(u64::MAX), "point")
}

/// The steady sign in one sentence, with what can be done now.
#[must_use]
pub fn sign_words(view: &BenchView) -> String {
    let sign = &view.sign;
    if !sign.steady {
        return tame(&sign.says);
    }
    let held = format!("STEADY for {} s", fixed(sign.held_s, 0));
    match (view.taken_here, view.by_itself) {
        (true, _) => format!("{held}; this level has its point: step the pressure"),
        (false, true) => format!("{held}: the point is taken"),
        (false, false) => format!("{held}: take the point"),
    }
}

/// How far it is to a point: "12 s of 30 s".
#[must_use]
pub fn held_words(sign: &Sign) -> String {
    format!("{} s of {} s", fixed(sign.held_s.min(sign.least_s), 0), fixed(sign.least_s, 0))
}

/// The same where it says something that the sign does not.
#[must_use]
pub fn held_besides(sign: &Sign) -> Option<String> {
    Some(held_words(sign))
        .filter(|held| !sign.steady && sign.held_s > 0.0 && !sign.says.contains(held.as_str()))
}

/// How far the run has come: points rising and falling, how many are wanted, what comes next.
#[must_use]
pub fn progress_words(view: &BenchView) -> String {
    let of = |sweep| view.points.iter().filter(|point| point.sweep == Some(sweep)).count();
    let (rising, falling) = (of(Sweep::Rising), of(Sweep::Falling));
    let mut text = match view.sweep.wanted {
        Some(wanted) => format!("{} of {wanted} points", view.points.len()),
        None => points_words(view.points.len()),
    };
    if rising + falling > 0 {
        text.push_str(&format!(": {rising} rising, {falling} falling"));
    }
    let struck = view.points.iter().filter(|point| point.left_out.is_some()).count();
    if struck > 0 {
        text.push_str(&format!(", {struck} left out"));
    }
    text
}

/// What comes next; the direction of the sweep where nothing else is known.
#[must_use]
pub fn next_words(view: &BenchView) -> String {
    match (&view.sweep.next, view.sweep.direction) {
        (Some(next), _) => tame(next),
        (None, Some(Sweep::Rising)) => "sweep: rising".to_owned(),
        (None, Some(Sweep::Falling)) => "sweep: falling".to_owned(),
        (None, None) => "set the first pressure".to_owned(),
    }
}

/// Whether points are taken by themselves.
#[must_use]
pub const fn by_itself_words(view: &BenchView) -> &'static str {
    if view.by_itself { "points by themselves" } else { "points at the space key" }
}

/// Pressure and flow of a point in the units shown, as the dials have them.
#[must_use]
pub fn point_numbers(view: &BenchView, point: &PointSeen) -> (String, String) {
    (
        DialKind::Pressure.number(point.pressure_bar, view.pressure.resolution, &view.units),
        DialKind::Flow.number(point.flow_l_min, view.flow.resolution, &view.units),
    )
}

/// What is remarkable at a point: why it does not count, that it lies apart, else how far off the line.
#[must_use]
pub fn point_remark(point: &PointSeen) -> String {
    let off = point.off_line.map(|share| {
        let percent = fixed(share * 100.0, 2);
        let sign = if share * 100.0 >= 0.005 { "+" } else { "" };
        format!("{sign}{percent} %")
    });
    match (&point.left_out, point.apart) {
        (Some(why), _) => format!("left out: {}", tame(why)),
        (None, true) => format!("{} lies apart", off.unwrap_or_default()).trim_start().to_owned(),
        (None, false) => off.unwrap_or_default(),
    }
}

/// The run in one line, for a pipe.
#[must_use]
pub fn bench_line(view: &BenchView) -> String {
    bench_parts(view).join("; ")
}

/// The parts of that line.
#[must_use]
pub fn bench_parts(view: &BenchView) -> Vec<String> {
    let units = &view.units;
    let run = view.run.map(|run| format!(" {run}")).unwrap_or_default();
    let dial = |dial: &Dial| {
        let meant =
            if dial.kind == DialKind::Pressure { format!(" {}", tame(&dial.meant)) } else { String::new() };
        let state = dial.state_words(units);
        let state = if state.is_empty() { state } else { format!(" ({state})") };
        format!("{}{}{state}", dial.value_words(units), meant.trim_end())
    };
    let sign = &view.sign;
    let waits = held_besides(sign).map(|held| format!(", {held}")).unwrap_or_default();
    let mut parts = vec![
        format!("{}{run}  {}", clock(view.elapsed_s), dial(&view.pressure)),
        dial(&view.flow),
        format!("{}{waits}", sign_words(view)),
        progress_words(view),
    ];
    for dial in [&view.pressure, &view.flow].into_iter().chain(&view.around) {
        if dial.faults > 0 || (!dial.is_alive() && dial.trouble.is_some()) {
            let last =
                dial.trouble.as_deref().map(|why| format!(" (last: {})", tame(why))).unwrap_or_default();
            parts.push(format!("{}: {} faults{last}", tame(&dial.instrument), dial.faults));
        }
    }
    if view.saved != Saved::All {
        parts.push(view.saved.words("reading"));
    }
    parts.extend(view.hold.words());
    parts
}

/// A point that has been taken, in one line for a pipe.
#[must_use]
pub fn point_line(view: &BenchView, point: &PointSeen) -> String {
    let (pressure, flow) = point_numbers(view, point);
    let sweep = match point.sweep {
        Some(Sweep::Rising) => ", rising",
        Some(Sweep::Falling) => ", falling",
        None => "",
    };
    let remark = point_remark(point);
    let remark = if remark.is_empty() { remark } else { format!(", {remark}") };
    let (p, q) = (view.pressure.kind.symbol(&view.units), view.flow.kind.symbol(&view.units));
    format!("point {}: {pressure} {p} {flow} {q}{sweep}{remark}", point.number)
}

#[cfg(test)]
mod tests {
    use super::super::live_parts::DialState;
    use super::*;
    use crate::quantity::Shown;

    fn dial(kind: DialKind, value: f64) -> Dial {
        Dial {
            kind,
            instrument: "X".into(),
            value: Some(value),
            resolution: None,
            meant: "gauge".into(),
            rate_per_min: Some(-0.04),
            state: DialState::Moving,
            per_s: Some(5.0),
            faults: 0,
            trouble: None,
        }
    }

    #[test]
    fn values_keep_their_decimals_in_any_unit() {
        let bar = Units::default();
        let psi = Units::new(Shown::parse("psi,mL/min").unwrap());
        assert_eq!(dial(DialKind::Pressure, 10.0).value_words(&bar), "10.00 bar");
        assert_eq!(dial(DialKind::Pressure, 10.0).value_words(&psi), "145.0 psi");
        assert_eq!(dial(DialKind::Flow, 0.4831).value_words(&bar), "0.4831 L/min");
        assert_eq!(dial(DialKind::Flow, 0.4831).value_words(&psi), "483.1 mL/min");
        assert_eq!(dial(DialKind::Barometer, 1.0092).value_words(&psi), "1009.2 hPa");
    }

    #[test]
    fn a_rate_is_said_in_the_unit_shown_and_not_said_when_it_is_none() {
        let psi = Units::new(Shown::parse("psi").unwrap());
        assert_eq!(dial(DialKind::Pressure, 10.0).state_words(&Units::default()), "falling 0.04 bar/min");
        assert_eq!(dial(DialKind::Pressure, 10.0).state_words(&psi), "falling 0.6 psi/min");
        assert_eq!(DialKind::Pressure.rate_words(0.001, 10.0, &Units::default()), None);
        assert_eq!(DialKind::Flow.rate_words(0.1, 0.0, &Units::default()), None);
    }
}
