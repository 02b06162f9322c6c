//! What the history says in words and numbers.
//!
//! Comes in: a history, and what is drawn. Goes out: [`Words`], each already cleaned of what cannot be drawn. Values
//! are rounded as the report does it. Left out: tick labels and legend.

use super::History;
use super::dates::{date, month};
use super::seen::{Mark, Seen};
use crate::bench::Verdict;
use crate::report::number::{figures, fixed, value_and_u};

use super::super::letters::clean;
use super::super::number::short;

/// So many changed runs are named in the description; of more, the number is said.
const MOST_NAMED: usize = 12;

/// All texts but tick labels and legend.
pub(super) struct Words {
    /// Of the picture, for readers who do not see it.
    pub title: String,
    pub description: String,
    pub orifice: String,
    pub about: String,
    /// Title of the flow axis, from the fullest to the shortest.
    pub flow_axis: [String; 3],
    /// The latest verdict, as a word.
    pub verdict: String,
    /// Whether it is one to be afraid of.
    pub bad: bool,
    /// The latest run: name, purpose, date.
    pub latest: String,
    pub flow_head: String,
    pub flow: String,
    pub flow_detail: String,
    pub limits: Option<String>,
    pub change: Option<Change>,
    pub trend: Option<TrendWords>,
    /// What is not drawn, and why.
    pub not_drawn: Vec<String>,
    /// How to read bars and band: in full, and for where there is little room.
    pub notes: [String; 2],
}

/// The latest run against the one before.
pub(super) struct Change {
    pub head: String,
    pub text: String,
    /// Whether it is more than the uncertainties explain.
    pub over: bool,
}

/// The trend.
pub(super) struct TrendWords {
    pub head: String,
    pub text: String,
    pub leaves: Option<String>,
    pub not_before: Option<String>,
}

impl Words {
    pub(super) fn new(history: &History<'_>, seen: &Seen) -> Self {
        let units = &seen.units;
        let (gas, flow_unit) = (history.gas.name(), units.flow_symbol());
        let ip = ip(history, seen);
        let latest = seen.marks.last();
        let mut words = Self {
            title: format!("Orifice {}: flow of {gas} at {ip}, run by run", clean(history.orifice).trim()),
            description: String::new(),
            orifice: clean(history.orifice).trim().to_owned(),
            about: about(history, seen, &ip),
            flow_axis: [
                format!("flow of {gas} at {ip}, {flow_unit} STPD"),
                format!("flow at {ip}, {flow_unit} STPD"),
                format!("{flow_unit} STPD"),
            ],
            verdict: latest.map_or("No run", |m| verdict(m.verdict)).to_owned(),
            bad: latest.is_some_and(|m| m.verdict == Verdict::Fail),
            latest: latest.map_or_else(
                || format!("no accepted run of {gas} at {ip}"),
                |m| format!("{}, {}, {}", name(m), m.purpose.name(), together(&date(m.day))),
            ),
            flow_head: format!("Flow at {ip}"),
            flow: latest.map(|m| with_uncertainty(m, seen)).unwrap_or_default(),
            flow_detail: together(&format!("{gas} STPD, 95 %")),
            limits: seen.latest_limits().map(|(low, high)| {
                together(&format!("limits\u{a0}{}\u{a0}to\u{a0}{} {flow_unit}", short(low), short(high)))
            }),
            change: change(seen),
            trend: trend(history, seen),
            not_drawn: not_drawn(history, seen),
            notes: if seen.marks.is_empty() { Default::default() } else { notes(history) },
        };
        words.description = describe(history, seen, &words, &ip);
        words
    }
}

/// The word of a verdict.
const fn verdict(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Pass => "Pass",
        Verdict::Fail => "Fail",
        Verdict::Undecided => "Undecided",
        Verdict::None => "No verdict",
    }
}

/// "E_n −1.8"; with a second decimal where one would say that it is 1.
pub(super) fn en(value: f64) -> String {
    let text = if value.abs() >= 100.0 {
        figures(value, 2)
    } else if (0.95..1.05).contains(&value.abs()) {
        fixed(value, 2)
    } else {
        fixed(value, 1)
    };
    format!("E_n\u{a0}{}", signed(&text))
}

/// The name of a run; one without gets none made up.
fn name(mark: &Mark) -> &str {
    if mark.name.is_empty() { "a run without a name" } else { &mark.name }
}

/// The nominal pressure, as "10 bar gauge".
fn ip(history: &History<'_>, seen: &Seen) -> String {
    let value = seen.units.pressure(history.ip_bar);
    let value = if value.is_finite() { short(value) } else { "?".to_owned() };
    format!("{value}\u{a0}{}\u{a0}gauge", seen.units.pressure_symbol())
}

/// A text whose numbers are not parted from their units at the end of a line.
fn together(text: &str) -> String {
    const INSEPARABLE: [&str; 12] = [
        " %",
        " ± ",
        " = ",
        " °C",
        " kPa",
        " L/min",
        " mL/min",
        " L/h",
        " bar",
        " psi",
        " ft³/h",
        ": not before ",
    ];
    INSEPARABLE.iter().fold(text.to_owned(), |text, part| text.replace(part, &part.replace(' ', "\u{a0}")))
}

/// A number with its sign, which is the real minus.
fn signed(text: &str) -> String {
    match text.strip_prefix('-') {
        Some(size) => format!("\u{2212}{size}"),
        None if text.bytes().any(|b| (b'1'..=b'9').contains(&b)) => format!("+{text}"),
        None => text.to_owned(),
    }
}

/// "0.4831 ± 0.0049 L/min".
fn with_uncertainty(mark: &Mark, seen: &Seen) -> String {
    let symbol = seen.units.flow_symbol();
    let (value, expanded) = value_and_u(mark.flow, mark.bar);
    let value = value.replace('-', "\u{2212}");
    together(&if expanded.is_empty() {
        format!("{value} {symbol}")
    } else {
        format!("{value} ± {expanded} {symbol}")
    })
}

fn about(history: &History<'_>, seen: &Seen, ip: &str) -> String {
    let mut parts = vec![history.gas.name().to_owned(), ip.to_owned()];
    parts.push(match (seen.marks.first(), seen.marks.last()) {
        (Some(first), Some(last)) => {
            let (from, to) = (date(first.day), date(last.day));
            let count =
                if seen.marks.len() == 1 { "1 run".to_owned() } else { format!("{} runs", seen.marks.len()) };
            if from == to { format!("{count}, {from}") } else { format!("{count}, {from} to {to}") }
        }
        _ => "no run".to_owned(),
    });
    parts.join(" · ")
}

fn change(seen: &Seen) -> Option<Change> {
    let [.., before, latest] = seen.marks.as_slice() else { return None };
    let share = 100.0 * (latest.flow - before.flow) / before.flow;
    let percent = share.is_finite().then(|| together(&format!("{} %", signed(&figures(share, 2)))));
    let text: Vec<String> = percent.into_iter().chain(latest.en.map(en)).collect();
    (!text.is_empty()).then(|| Change {
        head: format!("Against {}, {}", name(before), date(before.day)),
        text: text.join(", "),
        over: latest.changed().is_some(),
    })
}

fn trend(history: &History<'_>, seen: &Seen) -> Option<TrendWords> {
    let trend = history.trend.as_ref()?;
    let line = seen.line.as_ref()?;
    let (value, expanded) = value_and_u(100.0 * trend.per_year_share, 100.0 * trend.per_year_expanded);
    let value = if trend.per_year_share.is_finite() { signed(&value) } else { "?".to_owned() };
    let text = if expanded.is_empty() {
        format!("{value} % a year")
    } else {
        format!("{value} ± {expanded} % a year")
    };
    let last = seen.marks.last().map_or(f64::NEG_INFINITY, |m| m.day);
    let verb = |day: f64| if day < last { "left" } else { "leaves" };
    Some(TrendWords {
        head: format!("Trend since {} ({} runs)", date(line.span.0), trend.runs),
        text: together(&text),
        leaves: line.leaves.map(|(day, _)| format!("{} the limits about\u{a0}{}", verb(day), month(day))),
        not_before: line
            .leaves
            .and_then(|(_, first)| first)
            .map(|day| together(&format!("95 %: not before {}", month(day)))),
    })
}

fn not_drawn(history: &History<'_>, seen: &Seen) -> Vec<String> {
    let runs = |n: usize, one: &str, many: &str| match n {
        0 => None,
        1 => Some(format!("1 run {one}")),
        n => Some(format!("{n} runs {many}")),
    };
    let other = "in another gas or at another pressure";
    [
        runs(history.left_out, &format!("{other} is not drawn"), &format!("{other} are not drawn")),
        runs(seen.undrawn, "has no flow that can be drawn", "have no flow that can be drawn"),
        runs(
            seen.marks.iter().filter(|m| m.bar <= 0.0).count(),
            "has no uncertainty to draw",
            "have no uncertainty to draw",
        ),
    ]
    .into_iter()
    .flatten()
    .collect()
}

fn notes(history: &History<'_>) -> [String; 2] {
    let reference = "Gas at 20 °C; litres at 0 °C, 101.325 kPa, dry.";
    let own = if history.trend.is_some() { "E_n and trend leave out" } else { "E_n leaves out" };
    [
        together(&format!(
            "Bars: expanded uncertainty of each run, all parts, 95 %. {own} what runs under the same \
             certificates have in common. {reference}"
        )),
        together(&format!("Bars: all parts, 95 %; {own} what runs under the same certificates share.")),
    ]
}

/// The history in sentences, for readers who do not see the picture.
fn describe(history: &History<'_>, seen: &Seen, words: &Words, ip: &str) -> String {
    let mut text = format!(
        "Orifice {}, {} at {ip}, {} runs drawn over the dates they were taken.",
        words.orifice,
        history.gas.name(),
        seen.marks.len()
    );
    if !seen.marks.is_empty() {
        text.push_str(&format!(
            " Latest: {}: {} STPD (95 %), verdict: {}",
            words.latest,
            words.flow,
            words.verdict.to_lowercase()
        ));
        text.push_str(&words.limits.as_ref().map_or(".".to_owned(), |limits| format!(", {limits}.")));
    }
    if let Some(change) = &words.change {
        text.push_str(&format!(" {}: {}.", change.head, change.text));
    }
    let changed: Vec<String> = seen
        .marks
        .iter()
        .filter_map(|m| m.changed().map(|value| format!("{} on {} ({})", name(m), date(m.day), en(value))))
        .collect();
    if !changed.is_empty() {
        let named = &changed[..changed.len().min(MOST_NAMED)];
        text.push_str(&format!(" |E_n| over 1 to the run before: {}", named.join(", ")));
        match changed.len() - named.len() {
            0 => text.push('.'),
            more => text.push_str(&format!(" and {more} more.")),
        }
    }
    if let Some(trend) = &words.trend {
        text.push_str(&format!(" {}: {}", trend.head, trend.text));
        for part in trend.leaves.iter().chain(&trend.not_before) {
            text.push_str(&format!("; {part}"));
        }
        text.push('.');
    }
    for part in &words.not_drawn {
        text.push_str(&format!(" {part}."));
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_carry_their_sign_and_nought_none() {
        assert_eq!(signed("-1.40"), "\u{2212}1.40");
        assert_eq!(signed("1.40"), "+1.40");
        assert_eq!(signed("0.00"), "0.00");
    }

    #[test]
    fn an_en_just_above_one_is_not_said_to_be_one() {
        assert_eq!(en(-1.83), "E_n\u{a0}\u{2212}1.8");
        assert_eq!(en(1.02), "E_n\u{a0}+1.02");
        assert_eq!(en(-12.34), "E_n\u{a0}\u{2212}12.3");
        assert_eq!(en(1234.0), "E_n\u{a0}+1200");
    }
}
