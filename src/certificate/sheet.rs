//! The sheet a diver keeps, on paper: one page of A5 or A4, meant to be laminated.
//!
//! Comes in: a setting as reported, and the size of the paper. Goes out: a [`Document`] that [`super::paper`] sets. Everything
//! stands in drawings of the width of the text (`plot::card`), the way one lays out a card: what is set in running blocks needs two pages of A5.
//! Each drawing carries all of its words for those who do not see it, and its letters are text.
//!
//! Where not everything fits on one page the plots become smaller; then they go overleaf, with the warnings, at last with the
//! cautions too, and the first page says so in a plain sentence. No warning and no caution is ever left out. A4 has the proportions of
//! A5, so the same card is set larger.
//!
//! Left out: an attachment, a shop's letterhead, a signature: the sheet certifies nothing.

use chrono::{FixedOffset, NaiveTime, TimeZone as _};

use super::paper::{Block, Document, Figure, Paper, faults};
use crate::plot::{
    BEFORE_PLOTS, CARD_WIDTH, CardDrawing, SettingPlot, card_front, card_paragraphs, small_setting_plot,
};
use crate::report::Units;
use crate::report::setting::Reported;
use crate::report::sheet_card::{Card, card};

/// Width and height of the text of a page in points, with the room that the marked end needs; as `paper` lays it, and held to it
/// by the test that counts pages.
const fn text(paper: Paper) -> (f64, f64) {
    match paper {
        Paper::A5 => (335.5, 499.2 - END),
        Paper::A4 | Paper::Letter => (463.2, 713.8 - END),
    }
}

/// The marked end with the space above it.
const END: f64 = 29.0;
/// Between two figures.
const BETWEEN: f64 = 12.0;
/// A figure takes at most this share of the height of a page's text (`paper`), whole.
const TALLEST: f64 = 0.81;
/// Heights of the plots at the width of the card, points: the most and the least that is legible.
const PLOTS: (f64, f64) = (112.0, 60.0);
/// Height of the plots where they have a page to themselves.
const OVERLEAF: f64 = 190.0;

/// Titles of the warnings and of the cautions.
const TO_KNOW: &str = "To know";
const CAUTIONS: &str = "Cautions";
/// What the first page says when the plots alone stand on the second, and when more does.
const PLOTS_OVERLEAF: &str = "Continued overleaf: the plots.";
const WARNINGS_OVERLEAF: &str =
    "Continued overleaf: warnings that belong to this setting. Read them before setting anything.";
const ALL_OVERLEAF: &str = "Continued overleaf: warnings and cautions that belong to this setting. Read them before setting anything.";

/// The sheet of a setting on a size of paper.
#[must_use]
pub fn document(reported: &Reported<'_>, units: &Units, why_not: Option<String>, paper: Paper) -> Document {
    let card = printable(card(reported, units));
    let (width, height) = text(paper);
    // In points of the card, which is set at the width of the text.
    let page = Page { height: height * CARD_WIDTH / width, between: BETWEEN * CARD_WIDTH / width };
    let options = SettingPlot {
        units: *units,
        why_not,
        transparent: false,
        id_prefix: "card".to_owned(),
        ..SettingPlot::default()
    };
    let plots = |height: f64| {
        CardDrawing {
        svg: small_setting_plot(reported.setting, &options, height),
        height,
        alt: "Two plots. Left: oxygen injected against depth, with the depths of the table marked. Right: oxygen injected at \
              the surface against IP, under the band of another day's uptake. Their numbers stand in the tables and sentences."
            .to_owned(),
    }
    };
    let pages = page.laid(&card, plots);
    let mut blocks = Vec::new();
    for (i, drawings) in pages.into_iter().enumerate() {
        if i > 0 {
            blocks.push(Block::PageBreak);
        }
        blocks.extend(drawings.into_iter().map(figure));
    }
    let date = reported.on.and_time(NaiveTime::MIN);
    let utc = FixedOffset::east_opt(0).map(|offset| offset.from_utc_datetime(&date));
    Document {
        paper,
        language: "en".to_owned(),
        title: card.title.clone(),
        author: None,
        producer: format!("Ebbline {}", env!("CARGO_PKG_VERSION")),
        date: utc.unwrap_or_else(|| date.and_utc().fixed_offset()),
        running_head: format!("Setting of the IP, {}", reported.on),
        end: "End of the sheet".to_owned(),
        accent: None,
        letterhead: None,
        blocks,
        attachments: Vec::new(),
    }
}

struct Page {
    height: f64,
    between: f64,
}

impl Page {
    /// Drawings page by page.
    fn laid(&self, card: &Card, plots: impl Fn(f64) -> CardDrawing) -> Vec<Vec<CardDrawing>> {
        let highest = TALLEST * self.height;
        let (know, warn): (&[String], &[String]) = (&card.to_know, &card.cautions);
        let words = |sections: &[(&str, &[String])]| card_paragraphs(sections, highest);
        let both = words(&[(TO_KNOW, know), (CAUTIONS, warn)]);
        let page = |front: CardDrawing, more: &[CardDrawing]| -> Vec<CardDrawing> {
            std::iter::once(front).chain(more.iter().cloned()).collect()
        };
        let left = self.height - self.needed(&page(card_front(card, None, None), &both)) - BEFORE_PLOTS;
        if left >= PLOTS.1 {
            return vec![page(card_front(card, Some(&plots(left.min(PLOTS.0))), None), &both)];
        }
        let fits = |says, more: &[CardDrawing]| {
            let page = page(card_front(card, None, Some(says)), more);
            (self.needed(&page) <= self.height).then_some(page)
        };
        let (first, mut overleaf) = if let Some(first) = fits(PLOTS_OVERLEAF, &both) {
            (first, Vec::new())
        } else if let Some(first) = fits(WARNINGS_OVERLEAF, &words(&[(CAUTIONS, warn)])) {
            (first, words(&[(TO_KNOW, know)]))
        } else {
            (page(card_front(card, None, Some(ALL_OVERLEAF)), &[]), both)
        };
        overleaf.push(plots(OVERLEAF));
        vec![first, overleaf]
    }

    fn needed(&self, drawings: &[CardDrawing]) -> f64 {
        let heights: f64 = drawings.iter().map(|drawing| drawing.height).sum();
        heights + self.between * (drawings.len().max(1) as f64 - 1.0)
    }
}

fn figure(drawing: CardDrawing) -> Block {
    Block::Figure(Figure { svg: drawing.svg, alt: drawing.alt, caption: None, width: 1.0 })
}

/// The same with every character that cannot be printed written as its number, so that no name keeps a sheet from being made.
fn printable(card: Card) -> Card {
    let text = |text: String| -> String {
        let bad: Vec<char> = faults(&text).into_iter().map(super::paper::Fault::character).collect();
        let mut out = String::with_capacity(text.len());
        for c in text.chars() {
            if bad.contains(&c) {
                out.push_str(&format!("<U+{:04X}>", u32::from(c)));
            } else {
                out.push(c);
            }
        }
        out
    };
    let texts = |all: Vec<String>| all.into_iter().map(text).collect();
    let mut card = card;
    card.title = text(card.title);
    card.about = texts(card.about);
    card.none = card.none.map(text);
    card.to_know = texts(card.to_know);
    card.cautions = texts(card.cautions);
    for fact in card.parts.iter_mut().flat_map(|part| &mut part.facts) {
        fact.1 = text(std::mem::take(&mut fact.1));
    }
    for note in card.tables.iter_mut().flat_map(|table| &mut table.notes) {
        *note = text(std::mem::take(note));
    }
    card
}
