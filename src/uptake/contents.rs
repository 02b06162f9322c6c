//! What is in the loop: dry gas and inert share, followed from stage to stage.
//!
//! Comes in: a model, a shift and the current β. Goes out: dry gas at the beginning of a stage over that at the first
//! reading (`g`), and for a sealed stage its inert gas, fixed once and carried through: oxygen adds leave it as it is,
//! nitrogen, impurity and leak change it by their integrals. At a mark the volume is that of the first reading again.
//! Left out: stages whose contents do not follow; the plan makes no segments of them.

use std::ops::Range;

use super::model::Model;
use super::segment::{Anchor, Segment, Shift};
use crate::entry::LoopKept;

/// Dry gas at the beginning of each stage, followed from stage to stage.
pub(super) struct Contents<'a> {
    model: &'a Model,
    shift: &'a Shift,
    inverse_n: f64,
    stage: usize,
    /// Dry gas at the beginning of the stage over that at the first reading.
    pub(super) ratio: f64,
    /// Inert share at the beginning of the stage; none when it has to be read back from the first segment after a mark.
    inert: Option<f64>,
}

impl<'a> Contents<'a> {
    pub(super) fn new(model: &'a Model, shift: &'a Shift, inverse_n: f64) -> Self {
        let inert = model.stages.first().and_then(|s| Self::inert_share(model, shift, &s.window));
        Self { model, shift, inverse_n, stage: 0, ratio: 1.0, inert }
    }

    fn inert_share(model: &Model, shift: &Shift, bins: &Range<usize>) -> Option<f64> {
        if bins.is_empty() {
            return None;
        }
        let sum: f64 = bins.clone().map(|bin| 1.0 - model.fraction(bin, shift)).sum();
        Some(sum / bins.len() as f64)
    }

    /// Follows the stages up to one; an unknown stage leaves ratio and inert share that nobody reads.
    pub(super) fn go_to(&mut self, stage: usize) {
        while self.stage < stage {
            let before = &self.model.stages[self.stage];
            self.stage += 1;
            let now = &self.model.stages[self.stage];
            let none = Shift::default();
            let last = self.model.time_s.len() - 1;
            let kappa = |bin: usize| self.model.kappa_at(bin.min(last), &none);
            let varying = |from: usize, to: usize| {
                if self.model.varies { kappa(to) / kappa(from) } else { 1.0 }
            };
            match now.anchor {
                Anchor::Mark => {
                    self.ratio = varying(0, now.window.start);
                    self.inert = None;
                }
                Anchor::Carried => {
                    let end = Self::inert_share(self.model, self.shift, &before.last_window);
                    if before.kept == LoopKept::Sealed {
                        let (washed, leaked) = self.model.integrals(before.from_s, before.to_s);
                        let injected = self.model.injected(before, before.to_s);
                        let begin = self.inert.unwrap_or(f64::NAN);
                        let grown = self.grown(begin, washed, leaked, injected);
                        self.ratio *= grown * begin / end.unwrap_or(f64::NAN);
                    } else {
                        self.ratio *= varying(before.window.start, now.window.start);
                    }
                    self.inert = end;
                }
                Anchor::Start | Anchor::Unknown => self.inert = None,
            }
        }
    }

    /// Inert gas over that at the beginning of the stage.
    fn grown(&self, inert: f64, washed: f64, leaked: f64, injected: f64) -> f64 {
        let given = &self.model.given;
        let washout = given.washout + self.shift.washout;
        let leak = given.leak + self.shift.leak;
        let impurity = 1.0 - (given.purity + self.shift.purity).min(1.0);
        let gained = washout * washed - leak * leaked + impurity * injected;
        1.0 + self.inverse_n / self.ratio * gained / inert
    }

    /// Inert gas at a segment's middle over the dry gas at the first reading; `mean` and `slope` are of `1/(1 − f)`.
    pub(super) fn inert_at(&mut self, segment: &Segment, mean: f64, slope: f64) -> f64 {
        let stage = &self.model.stages[segment.stage];
        let back = (stage.from_s - self.model.first_s) / 60.0 - segment.middle;
        // After a mark the first segment says, read back to the mark, what share was inert once all had mixed.
        let inert = *self.inert.get_or_insert(1.0 / (mean + slope * back));
        let grown = self.grown(inert, segment.washed, segment.leaked, segment.injected);
        self.ratio * inert * grown
    }
}
