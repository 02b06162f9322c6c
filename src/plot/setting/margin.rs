//! The margin of a setting: the IP to set or that there is none, what follows from it, legend and notes.
//!
//! Comes in: the words, what is drawn. Goes out: a column of lines and signs. Only what is present is explained. Where
//! there is too little room the notes are shortened first, then the other texts; the IP, the IP never to exceed and the
//! reason why there is no setting always stay.

use super::Panels;
use super::seen::Seen;
use super::signs::Sign;
use super::words::Words;

use super::super::column::{Column, Style};
use super::super::ink::{BRICK, INK};
use super::super::letters::Weight;

/// How much is said.
#[derive(Debug, Clone, Copy)]
struct Fullness {
    /// Notes in full, the short ones, or none.
    notes: Option<usize>,
    lines: usize,
    facts: bool,
}

/// From all that there is to say to the least.
const FULLNESS: [Fullness; 5] = [
    Fullness { notes: Some(0), lines: 5, facts: true },
    Fullness { notes: Some(1), lines: 5, facts: true },
    Fullness { notes: Some(1), lines: 3, facts: true },
    Fullness { notes: None, lines: 2, facts: true },
    Fullness { notes: None, lines: 1, facts: false },
];
/// Names of orifices without a setting that are listed.
const MOST_REFUSED: usize = 12;

/// The margin of this width; `room` is its height beside the panels, or the most it should take below them.
pub(super) fn margin(
    words: &Words,
    seen: &Seen,
    panels: Panels,
    (body, width): (f64, f64),
    (beside, room): (bool, f64),
) -> Column<Sign> {
    let legend = legend(words, seen, panels);
    let written = |fullness: &Fullness| {
        if beside {
            column(words, &legend, (body, width), room, *fullness)
        } else {
            rows(words, &legend, (body, width), *fullness)
        }
    };
    let mut tried = FULLNESS.iter().map(written);
    tried.find(|column| column.y <= room).unwrap_or_else(|| written(&FULLNESS[FULLNESS.len() - 1]))
}

fn answer_style(words: &Words, column: &Column<Sign>, size: f64) -> Style {
    let class = if words.is_setting { "plot-set" } else { "plot-no-setting" };
    Style { size, weight: Weight::Bold, fill: INK, ..column.plain(class) }
}

/// Orifices without a setting, in one text.
fn refused(words: &Words) -> String {
    let more = words.refused.len().saturating_sub(MOST_REFUSED);
    let named: Vec<&str> = words.refused.iter().take(MOST_REFUSED).map(String::as_str).collect();
    let more = if more > 0 { format!("; and {more} more") } else { String::new() };
    format!("{}{more}", named.join("; "))
}

/// A column beside the panels.
fn column(
    words: &Words,
    legend: &[(Sign, String)],
    (body, width): (f64, f64),
    room: f64,
    fullness: Fullness,
) -> Column<Sign> {
    let mut c = Column::new(body, width);
    let brick = Style { fill: BRICK, weight: Weight::Bold, ..c.plain("plot-never-above") };
    if words.is_setting {
        c.paragraph("Set the IP to", c.muted("plot-set-head"), 1);
    }
    c.paragraph(&words.answer, answer_style(words, &c, 1.55 * body), 1);
    if !words.is_setting {
        c.paragraph(&words.why_not, c.plain("plot-why"), 3 * fullness.lines);
    }
    c.space(0.3);
    for fact in words.facts.iter().filter(|_| fullness.facts) {
        c.paragraph(fact, c.plain("plot-fact"), fullness.lines);
    }
    if let Some(never) = &words.never {
        c.space(0.4);
        c.paragraph(never, brick, fullness.lines);
    }
    if let Some(judged) = &words.judged {
        c.space(0.4);
        c.paragraph(judged, c.plain("plot-judgement"), fullness.lines);
    }
    if !words.refused.is_empty() {
        c.space(0.4);
        c.paragraph(&refused(words), c.plain("plot-refused"), 2 * fullness.lines);
    }
    c.space(0.9);
    for (sign, text) in legend {
        c.entry(*sign, text, fullness.lines);
    }
    let first = c.count();
    if let Some(which) = fullness.notes {
        c.space(0.8);
        let size = (0.85 * body).max(8.0);
        c.paragraph(&words.notes[which], Style { size, ..c.muted("plot-notes") }, 20);
    }
    if c.y <= room {
        c.move_to_foot(first, room);
    }
    c
}

/// Rows below the panels.
fn rows(
    words: &Words,
    legend: &[(Sign, String)],
    (body, width): (f64, f64),
    fullness: Fullness,
) -> Column<Sign> {
    let mut c = Column::new(body, width);
    let mut detail: Vec<&str> = Vec::new();
    if words.is_setting {
        detail.push("is the IP to set");
    } else if !words.why_not.is_empty() {
        detail.push(&words.why_not);
    }
    if fullness.facts {
        detail.extend(words.facts.iter().map(String::as_str));
    }
    let style = answer_style(words, &c, 1.15 * body);
    c.led(&words.answer, style, &detail.join(". "), c.plain("plot-why"), fullness.lines);
    if let Some(never) = &words.never {
        c.paragraph(never, Style { fill: BRICK, weight: Weight::Bold, ..c.plain("plot-never-above") }, 1);
    }
    if let Some(judged) = &words.judged {
        c.paragraph(judged, c.plain("plot-judgement"), 2);
    }
    if !words.refused.is_empty() {
        c.paragraph(&refused(words), c.plain("plot-refused"), 2);
    }
    c.space(0.35);
    c.rows(legend);
    if let Some(which) = fullness.notes {
        c.space(0.3);
        let size = (0.85 * body).max(8.0);
        c.paragraph(&words.notes[which], Style { size, ..c.muted("plot-notes") }, 3);
    }
    c
}

/// What is there, and nothing else.
fn legend(words: &Words, seen: &Seen, panels: Panels) -> Vec<(Sign, String)> {
    let mut entries: Vec<(Sign, String)> = Vec::new();
    let mut add = |sign, text: &str| entries.push((sign, text.to_owned()));
    if let Some(band) = &words.band {
        add(Sign::Band, band);
    }
    if panels.has_depth() && !seen.places.is_empty() {
        add(Sign::Best, "injection at depth, best estimate");
        if seen.places.iter().any(|p| p.beyond_span) {
            add(Sign::BestBeyond, "beyond what the bench measured");
        }
        add(Sign::Lowest, &words.lowest);
        for (mark, told) in seen.marks.iter().zip(&words.marks) {
            add(Sign::Mark(mark.marked), &told[2]);
        }
        if seen.stops.is_some() {
            add(Sign::NoFlow, "no flow, or back");
        }
    }
    if panels.has_depth() && seen.max_depth.is_some() {
        add(Sign::MaxDepth, &words.max_depth_label);
    }
    if panels.has_ip() {
        if let Some(line) = seen.lines.iter().find(|l| l.shown) {
            add(Sign::Edges, &format!("{} at the surface, richest to leanest", line.name));
        }
        for (i, line) in seen.lines.iter().filter(|l| !l.shown).enumerate() {
            add(Sign::Other(i), &line.name);
        }
        if seen.chosen.is_some() {
            add(Sign::Chosen, &words.chosen_label);
        }
        if seen.judged.is_some() {
            add(Sign::Judged, &words.judged_label);
        }
        if seen.never.is_some() {
            add(Sign::Never, &words.never_label);
        }
        add(Sign::Division, &words.division);
    }
    entries
}
