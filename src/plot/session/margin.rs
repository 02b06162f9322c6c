//! The margin of a session: the uptake or why there is none, loop volume, keys, legend and notes.
//!
//! Comes in: the words, what is drawn, how lanes are told. Goes out: a column of lines and signs. Only what is present
//! is explained. Where there is too little room the notes are shortened first, then the other texts, then the keys.

use super::lanes::{Events, Segments, Told};
use super::seen::{Happened, Seen};
use super::signs::Sign;
use super::stretches::Reason;
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
    keys: usize,
}

/// From all that there is to say to the least.
const FULLNESS: [Fullness; 6] = [
    Fullness { notes: Some(0), lines: 4, keys: 26 },
    Fullness { notes: Some(1), lines: 4, keys: 26 },
    Fullness { notes: Some(1), lines: 2, keys: 26 },
    Fullness { notes: None, lines: 2, keys: 16 },
    Fullness { notes: None, lines: 1, keys: 6 },
    Fullness { notes: None, lines: 1, keys: 3 },
];

/// The margin of this width; `room` is its height beside the panels, or the most it should take below them.
pub(super) fn margin(
    words: &Words,
    seen: &Seen<'_>,
    (segments, events): (Segments, &Events),
    (body, width): (f64, f64),
    (beside, room): (bool, f64),
) -> Column<Sign> {
    let written = |fullness: &Fullness| {
        let legend = legend(words, seen, segments, events, fullness.keys);
        if beside {
            column(words, &legend, body, width, room, *fullness)
        } else {
            rows(words, &legend, body, width, *fullness)
        }
    };
    let mut tried = FULLNESS.iter().map(written);
    tried.find(|column| column.y <= room).unwrap_or_else(|| written(&FULLNESS[FULLNESS.len() - 1]))
}

fn answer_style(words: &Words, column: &Column<Sign>, size: f64) -> Style {
    let class = if words.is_number { "plot-uptake" } else { "plot-no-number" };
    Style { size, weight: Weight::Bold, fill: INK, ..column.plain(class) }
}

/// A column beside the panels.
fn column(
    words: &Words,
    legend: &[(Sign, String)],
    body: f64,
    width: f64,
    room: f64,
    fullness: Fullness,
) -> Column<Sign> {
    let mut c = Column::new(body, width);
    let brick = Style { fill: BRICK, ..c.plain("plot-passed") };
    if words.is_number {
        c.paragraph("Resting oxygen uptake", c.muted("plot-uptake-head"), 1);
    }
    c.paragraph(&words.answer, answer_style(words, &c, 1.55 * body), 1);
    c.paragraph(&words.answer_detail, c.plain("plot-why"), 2 * fullness.lines);
    if let Some(volume) = &words.volume {
        c.space(0.5);
        c.paragraph(volume, c.plain("plot-volume"), fullness.lines);
    }
    c.space(0.5);
    c.paragraph(&words.who, c.muted("plot-who"), fullness.lines);
    for passed in &words.passed {
        c.space(0.4);
        c.led("Caution:", Style { weight: Weight::Bold, ..brick }, passed, brick, fullness.lines);
    }
    c.space(0.9);
    for (sign, text) in legend {
        c.entry(*sign, text, fullness.lines);
    }
    if let Some(text) = &words.cells_not_drawn {
        c.paragraph(text, c.plain("plot-not-drawn"), fullness.lines);
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
fn rows(words: &Words, legend: &[(Sign, String)], body: f64, width: f64, fullness: Fullness) -> Column<Sign> {
    let mut c = Column::new(body, width);
    let brick = Style { fill: BRICK, ..c.plain("plot-passed") };
    let mut detail = words.answer_detail.clone();
    if words.is_number {
        detail = format!("resting oxygen uptake; {detail}");
    }
    if let Some(volume) = &words.volume {
        detail = format!("{detail}. {volume}.");
    }
    let style = answer_style(words, &c, 1.15 * body);
    c.led(&words.answer, style, &detail, c.plain("plot-why"), fullness.lines);
    for passed in &words.passed {
        c.led("Caution:", Style { weight: Weight::Bold, ..brick }, passed, brick, 1);
    }
    c.space(0.35);
    c.rows(legend);
    if let Some(text) = &words.cells_not_drawn {
        c.paragraph(text, c.plain("plot-not-drawn"), 1);
    }
    if let Some(which) = fullness.notes {
        c.space(0.3);
        let size = (0.85 * body).max(8.0);
        c.paragraph(&words.notes[which], Style { size, ..c.muted("plot-notes") }, 3);
    }
    c
}

/// Keys first, then the legend; of keys at most so many.
fn legend(
    words: &Words,
    seen: &Seen<'_>,
    segments: Segments,
    events: &Events,
    most: usize,
) -> Vec<(Sign, String)> {
    let mut entries: Vec<(Sign, String)> = Vec::new();
    if segments == Segments::Lettered {
        keyed(&mut entries, words.segments.iter().map(|s| s.key.clone()).collect(), most, Sign::Segment);
    }
    match events.told {
        Told::Numbered => {
            let texts = seen
                .marks
                .iter()
                .zip(&words.events)
                .map(|(m, w)| format!("{} {}", super::clock::elapsed(m.at_s), w[0]));
            keyed(&mut entries, texts.collect(), most, Sign::Number);
        }
        Told::Brief | Told::Silent => entries.extend(counted(seen)),
        Told::Full => {}
    }
    for (i, jump) in words.jumps.iter().take(most.min(4)).enumerate() {
        let more = words.jumps.len().saturating_sub(4);
        let more = if i == 3 && more > 0 { format!("; and {more} more") } else { String::new() };
        entries.push((Sign::Jump, format!("unmarked jump {}{more}", jump[1])));
    }
    if seen.series.iter().any(|(_, p)| p.is_finite()) {
        let used = seen.cells.iter().filter(|c| c.left_out.is_none()).count();
        let text = if used > 1 { "mean of the agreeing cells" } else { "the cell that is used" };
        entries.push((Sign::Series, text.to_owned()));
    }
    for (cell, text) in seen.cells.iter().zip(&words.cells) {
        entries.push((Sign::Cell(cell.index), text.clone()));
    }
    if !seen.fits.is_empty() {
        let topped = |fit: &super::seen::Fit| fit.segment.kind == crate::uptake::Kind::Topped;
        let text = if seen.fits.iter().all(topped) {
            "segment, from its first level to its last"
        } else {
            "segment with its fitted slope"
        };
        entries.push((Sign::Fit, text.to_owned()));
    }
    for reason in Reason::ALL {
        if seen.stretches.iter().any(|s| s.reason == reason) {
            entries.push((Sign::Stretch(reason), reason.words().0.to_owned()));
        }
    }
    entries
}

fn keyed(entries: &mut Vec<(Sign, String)>, texts: Vec<String>, most: usize, sign: impl Fn(usize) -> Sign) {
    let shown = if texts.len() > most { most.saturating_sub(1).max(1) } else { texts.len() };
    let more = texts.len() - shown.min(texts.len());
    for (i, text) in texts.into_iter().take(shown).enumerate() {
        let last = i + 1 == shown && more > 0;
        let text = if last { format!("{text}; and {more} more, not listed") } else { text };
        entries.push((sign(i + 1), text));
    }
}

/// The signs of events with what they stand for and how many there are.
fn counted(seen: &Seen<'_>) -> Vec<(Sign, String)> {
    use Happened::{DiluentAdd, Injection, MakeUp, OxygenAdd, Stop, Vent};
    [
        (Injection, "injection changed"),
        (OxygenAdd, "oxygen added"),
        (DiluentAdd, "diluent added"),
        (Vent, "loop vented"),
        (MakeUp, "loop made up"),
        (Stop, "stop"),
    ]
    .into_iter()
    .filter_map(|(happened, text)| {
        let count = seen.marks.iter().filter(|m| m.happened == happened).count();
        let count = match count {
            0 => return None,
            1 => String::new(),
            n => format!(" ({n})"),
        };
        Some((Sign::Event(happened), format!("{text}{count}")))
    })
    .collect()
}
