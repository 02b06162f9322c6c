//! Results → SVG text; the only drawing code.
//!
//! Comes in: results of `bench`, `uptake` and `setting` and what was recorded, as plain data. Goes out: the text of one
//! SVG 1.1 picture that stands alone: classes and presentation attributes only, no style, no script, no reference to
//! anything outside, a title and a description for readers who do not see it, ids under one prefix so that several
//! pictures share a page. The same input gives the same bytes. Shape, dash and hatch carry the meaning, colour only
//! helps, so that a black and white print says the same.
//!
//! Text is measured with the advance widths of DejaVu Sans (`letters`), the font that goes with the program, so that
//! nothing runs out of the frame or over its neighbour; another font on the reader's machine may be wider.
//!
//! Left out: turning the picture into pixels, which is work for `work::png`.

mod ink;
mod number;
mod letters;
mod svg;
mod frame;
mod places;
mod axis;
mod axes;
mod range;
mod column;
mod run;
mod history;
mod session;
mod setting;
mod card;

pub use card::{BEFORE_PLOTS, CARD_WIDTH, CardDrawing, card_front, card_paragraphs};
pub use history::{History, HistoryPlot, HistoryRun, Leaving, Trend, TrendPlace, history_plot};
pub use run::{RunPlot, run_plot};
pub use session::{SessionPlot, session_plot};
pub use setting::{SettingPlot, depth_plot, ip_plot, setting_plot, small_setting_plot};
