//! Results to words: rounding, display units, every sentence and caution, the JSON of the interface.
//!
//! Comes in: results of the rooms above. Goes out: text. Nothing is computed here but rounding. Left out: drawing
//! (`plot`), and the decision where a text goes (`cli`).

pub mod bench_fit;
pub mod bench_json;
pub mod bench_live;
pub mod book;
pub mod cautions;
pub mod certificate_words;
pub mod check_sentences;
pub mod enter_questions;
pub mod enter_words;
pub mod export;
pub mod instrument_trial;
pub mod layout;
pub mod live_parts;
pub mod number;
pub mod orifice_history;
pub mod port_list;
pub mod registers;
pub mod rig_words;
pub mod run_list;
pub mod run_shown;
pub mod series_notes;
pub mod setting;
mod setting_assumed;
pub mod setting_json;
mod setting_parts;
pub mod setting_sentences;
mod setting_words;
pub mod sheet;
pub mod sheet_card;
pub mod session_changes;
pub mod session_enter_questions;
pub mod session_enter_words;
pub mod session_limits;
pub mod session_list;
pub mod session_live;
pub mod session_shown;
pub mod session_uptake;
pub mod typed;
pub mod units;
pub mod uptake_json;
pub mod uptake_sentences;
pub mod warning_sentences;

pub use units::Units;

/// A document as indented JSON with a newline at its end.
#[must_use]
pub fn json_text(document: &impl serde::Serialize) -> String {
    let mut text = serde_json::to_string_pretty(document).unwrap_or_default();
    text.push('\n');
    text
}
