//! What was made of a time series, in sentences: how many points, and what was passed over and why.

use super::layout::numbers;
use super::number::{figures, fixed, percent};
use crate::entry::SeriesReadings;
use crate::series::{Channel, Rejected, Rejection, Remark, SteadyPoints};

/// Most remarks of one kind that are told one by one.
const TOLD: usize = 3;

/// One sentence for the points, one for what nearly was steady, and one for each thing passed over.
#[must_use]
pub fn notes(series: &SeriesReadings, steady: &SteadyPoints) -> Vec<String> {
    let mut notes = vec![format!(
        "{} steady spans of {} rows became the points of the line, each the mean of its span",
        steady.points.len(),
        series.time_s.len()
    )];
    let passed = rejected(steady);
    if !passed.is_empty() {
        notes.push(passed);
    }
    notes.extend(steady.remarks.iter().take(TOLD).map(remark));
    if steady.remarks.len() > TOLD {
        notes.push(format!(
            "{} more gaps, frozen stretches or spikes were passed over",
            steady.remarks.len() - TOLD
        ));
    }
    notes
}

/// The stretches that nearly were steady, with their reasons; empty when there are none.
#[must_use]
pub fn rejected(steady: &SteadyPoints) -> String {
    if steady.rejected.is_empty() {
        return String::new();
    }
    let told: Vec<String> = steady.rejected.iter().take(TOLD).map(one_rejected).collect();
    let more = match steady.rejected.len().saturating_sub(TOLD) {
        0 => String::new(),
        n => format!("; and {n} more"),
    };
    format!("not taken as steady: {}{more}", told.join("; "))
}

fn one_rejected(rejected: &Rejected) -> String {
    let place = format!(
        "{} to {} s at {} bar, ",
        fixed(rejected.from_s, 0),
        fixed(rejected.to_s, 0),
        figures(rejected.pressure_pa / 1e5, 3)
    );
    let why = match rejected.why {
        Rejection::KeptMoving => "the pressure kept moving".to_owned(),
        Rejection::TooShort { lasts_s, least_s } => {
            format!(
                "only {} s were left after settling, {} s are needed",
                fixed(lasts_s, 1),
                fixed(least_s, 0)
            )
        }
        Rejection::TooFewReadings { readings, least } => {
            format!("{readings} readings where {least} are needed")
        }
        Rejection::PressureDrifts { drift_pa, most_pa } => format!(
            "the pressure drifted {} mbar, at most {} is allowed",
            figures(drift_pa / 100.0, 2),
            figures(most_pa / 100.0, 2)
        ),
        Rejection::FlowSettlesLate { lasts_s, least_s } => {
            format!(
                "the flow settled late: {} s were left, {} s are needed",
                fixed(lasts_s, 1),
                fixed(least_s, 0)
            )
        }
        Rejection::FlowDrifts { drift, most } => {
            format!("the flow drifted {}, at most {} is allowed", percent(drift), percent(most))
        }
    };
    place + &why
}

fn remark(remark: &Remark) -> String {
    let channel = |c: &Channel| match c {
        Channel::Pressure => "pressure",
        Channel::Flow => "flow",
    };
    let span = |from: f64, to: f64| format!("from {} to {} s", fixed(from, 0), fixed(to, 0));
    match remark {
        Remark::Gap(gap) => format!("nothing was logged {}", span(gap.from_s, gap.to_s)),
        Remark::TimeRunsBack(back) => {
            format!("the time runs back {} at row {}", span(back.from_s, back.to_s), back.row + 1)
        }
        Remark::NoTime { rows } => format!("{rows} rows have no time and were passed over"),
        Remark::Missing(stretch) => {
            format!("the {} is missing {}", channel(&stretch.channel), span(stretch.from_s, stretch.to_s))
        }
        Remark::Frozen(stretch) => format!(
            "the {} stood frozen {} and was passed over: look at the instrument and its cable",
            channel(&stretch.channel),
            span(stretch.from_s, stretch.to_s)
        ),
        Remark::Spikes { channel: which, rows } => {
            let some: Vec<usize> = rows.iter().take(5).map(|r| r + 1).collect();
            let more = if rows.len() > 5 { format!(" and {} more", rows.len() - 5) } else { String::new() };
            format!(
                "the {} has spikes that were passed over, at row {}{more}",
                channel(which),
                numbers(&some)
            )
        }
    }
}
