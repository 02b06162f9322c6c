//! `orifice show`: an orifice's entry, its runs with the figures they were judged on, and the trend through them.
//!
//! Accepted here are runs that were judged, whatever the verdict: a clogging orifice fails in the end, and its flow then
//! is as good a figure as those before. Figures are those stored with the judgement that holds; the trend is worked out
//! anew from them.

use std::path::PathBuf;

use super::fit::{plot_kind, write_plot};
use super::registers::{self, RegisterKind, id_of};
use super::shelf::Shelf;
use super::{WorkError, runs};
use crate::bench::Verdict;
use crate::bench::trend::{Leaving, Trend, TrendRun, trend};
use crate::book::HistoryRow as BookRow;
use crate::entry::{RunNumber, StoredFigures, StoredVerdict};
use crate::plot as drawn;
use crate::report::Units;
use crate::report::orifice_history::{HistoryRow, OrificeHistory};
use crate::report::registers::ShownEntry;

/// Most runs that are shown unless all are asked for.
const SHOWN: usize = 50;
/// Most runs a trend is looked for in unless all are asked for: enough for a run a week over four years.
const READ: u32 = 200;
/// Places of the trend's line in the drawing, so that the edge of its band is drawn as the curve it is.
const PLACES: i32 = 24;
/// How far beyond its runs the trend is drawn, as a share of their span.
const AHEAD: f64 = 0.3;

/// What is asked of an orifice.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct HistoryRequest {
    /// Its name.
    pub orifice: String,
    /// Every run and every revision of its entry.
    pub all: bool,
    /// Where to draw the history, `.svg` or `.png`.
    pub plot: Option<PathBuf>,
    /// The units of the drawing.
    pub units: Units,
}

/// Reads and draws an orifice's history.
///
/// # Errors
/// When there is no book, it cannot be read, or it has no such orifice; a plot that cannot be written.
pub fn show(shelf: &Shelf, request: &HistoryRequest) -> Result<(ShownEntry, OrificeHistory), WorkError> {
    let kind = request.plot.as_deref().map(plot_kind).transpose()?;
    let id = id_of(&request.orifice)?;
    let book = shelf.to_read()?;
    let entry = registers::shown(&book, RegisterKind::Orifice, &request.orifice, request.all)?;
    let limit = (!request.all).then_some(READ + 1);
    let mut rows = book.history(&id, limit)?;
    let unread = !request.all && rows.len() > READ as usize;
    if unread {
        rows.truncate(READ as usize);
    }
    let accepted = Accepted::of(&rows);
    let trend = accepted.trend();
    let leaves = trend.as_ref().zip(accepted.limits()).and_then(|(trend, limits)| trend.leaves(limits));
    if let (Some(kind), Some(path)) = (kind, &request.plot) {
        let Some(figures) = accepted.latest() else { return Err(WorkError::NothingToDraw(id)) };
        let svg = drawn::history_plot(
            &drawn::History {
                orifice: entry.now.entry.name(),
                gas: figures.gas,
                ip_bar: figures.ip.as_bar(),
                runs: &accepted.drawn(),
                left_out: accepted.others,
                trend: trend.as_ref().map(|trend| drawn_trend(trend, leaves)),
            },
            &drawn::HistoryPlot { units: request.units, ..drawn::HistoryPlot::default() },
        );
        write_plot(&svg, kind, path)?;
    }
    let (of, limits_l_min, others) =
        (accepted.latest().map(|f| (f.gas, f.ip.as_bar())), accepted.limits(), accepted.others);
    let more = !request.all && rows.len() > SHOWN;
    let shown = if request.all { rows.len() } else { SHOWN };
    let runs = rows.into_iter().take(shown).map(row).collect();
    let history = OrificeHistory { runs, more, of, trend, limits_l_min, leaves, others, unread };
    Ok((entry, history))
}

fn row(row: BookRow) -> HistoryRow {
    let against = row.decision.as_ref().and_then(|decision| decision.figures.against);
    HistoryRow { listed: runs::listed(row.run), against }
}

/// The accepted runs of the gas and the pressure of the newest, in the order of their dates.
struct Accepted<'r> {
    rows: Vec<(&'r BookRow, &'r StoredFigures, StoredVerdict)>,
    /// Accepted runs of another gas or at another pressure.
    others: usize,
}

impl<'r> Accepted<'r> {
    /// `rows` are those taken last first.
    fn of(rows: &'r [BookRow]) -> Self {
        let judged: Vec<_> = rows
            .iter()
            .filter_map(|row| {
                row.decision.as_ref().map(|decision| (row, &decision.figures, decision.verdict))
            })
            .filter(|(_, figures, _)| figures.flow_l_min.is_finite())
            .collect();
        let of: Vec<_> = match judged.first() {
            None => Vec::new(),
            Some((_, newest, _)) => judged
                .iter()
                .rev()
                .copied()
                .filter(|(_, figures, _)| runs::comparable(newest, figures))
                .collect(),
        };
        Self { others: judged.len() - of.len(), rows: of }
    }

    fn latest(&self) -> Option<&'r StoredFigures> {
        self.rows.last().map(|(_, figures, _)| *figures)
    }

    fn limits(&self) -> Option<(f64, f64)> {
        self.latest().and_then(|figures| figures.limits_l_min)
    }

    fn trend(&self) -> Option<Trend> {
        let runs: Vec<TrendRun> = self
            .rows
            .iter()
            .map(|(row, figures, _)| {
                let accepted = runs::accepted(row.run.number, figures);
                TrendRun {
                    taken: row.run.taken,
                    purpose: row.run.purpose,
                    flow: accepted.flow,
                    meter_certificate: accepted.meter_certificate,
                    transducer_certificate: accepted.transducer_certificate,
                }
            })
            .collect();
        trend(&runs)
    }

    fn drawn(&self) -> Vec<drawn::HistoryRun> {
        let shown = |run: RunNumber| self.rows.iter().any(|(row, ..)| row.run.number == run);
        self.rows
            .iter()
            .map(|(row, figures, verdict)| drawn::HistoryRun {
                name: row.run.number.to_string(),
                taken: row.run.taken,
                flow_l_min: figures.flow_l_min,
                expanded_l_min: figures.expanded_l_min(),
                limits_l_min: figures.limits_l_min,
                verdict: match verdict {
                    StoredVerdict::Pass => Verdict::Pass,
                    StoredVerdict::Fail => Verdict::Fail,
                    StoredVerdict::Undecided => Verdict::Undecided,
                    StoredVerdict::None => Verdict::None,
                },
                en: figures.against.filter(|(before, _)| shown(*before)).map(|(_, en)| en),
                purpose: row.run.purpose,
            })
            .collect()
    }
}

fn drawn_trend(trend: &Trend, leaves: Option<Leaving>) -> drawn::Trend {
    let span = trend.to - trend.from;
    let end = trend.to + span * (AHEAD * 100.0) as i32 / 100;
    let places = (0..=PLACES).map(|place| {
        let at = trend.from + (end - trend.from) * place / PLACES;
        let (flow_l_min, expanded_l_min) = trend.at(at);
        drawn::TrendPlace { at, flow_l_min, expanded_l_min }
    });
    drawn::Trend {
        runs: trend.runs,
        from: trend.from,
        to: trend.to,
        per_year_share: trend.per_year(),
        per_year_expanded: trend.per_year_expanded(),
        line: places.collect(),
        leaves: match leaves {
            Some(Leaving::At { about, not_before }) => {
                Some(drawn::Leaving { about, not_before: Some(not_before) })
            }
            _ => None,
        },
    }
}
