//! Stretches of readings that are not used, so that each moment has one reason.
//!
//! Comes in: what the uptake left out and what a person left out, overlapping as they may. Goes out: stretches in order
//! that do not overlap; where several reasons meet, a person's comes first, then what was marked, then what was seen,
//! then what is usual.

use crate::entry::LoopKept;
use crate::uptake::{StretchLeftOut, StretchWhy};

use super::super::frame::Hatch;

/// Why a stretch is not used; the first that holds is shown.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Reason {
    Person,
    Excluded,
    Jump,
    NotAccounted,
    ContentsUnknown,
    NearlyPureOxygen,
    InjectionUnknown,
    WarmUp,
    Short,
    DeadTime,
}

impl Reason {
    /// All of them, in the order of the legend.
    pub(super) const ALL: [Self; 10] = [
        Self::Person,
        Self::Excluded,
        Self::Jump,
        Self::NotAccounted,
        Self::ContentsUnknown,
        Self::NearlyPureOxygen,
        Self::InjectionUnknown,
        Self::WarmUp,
        Self::Short,
        Self::DeadTime,
    ];

    /// In words: in full, and beside the stretch.
    pub(super) const fn words(self) -> (&'static str, &'static str) {
        match self {
            Self::Person => ("left out by a person", "left out"),
            Self::Excluded => ("excluded by an event", "excluded"),
            Self::Jump => ("not used: a jump no event explains", "unmarked jump"),
            Self::NotAccounted => ("not used: gas without an amount", "not accounted"),
            Self::ContentsUnknown => ("not used: loop contents unknown", "contents unknown"),
            Self::NearlyPureOxygen => ("not used: nearly pure oxygen", "nearly pure O2"),
            Self::InjectionUnknown => ("not used: injection unknown", "injection unknown"),
            Self::WarmUp => ("left out: scrubber warming up", "warm-up"),
            Self::Short => ("not used: too short for a slope", "too short"),
            Self::DeadTime => ("left out: dead time after an event", "dead time"),
        }
    }

    /// Its hatch, and how far apart its strokes stand, in sizes of body text.
    pub(super) const fn hatch(self) -> (Hatch, f64) {
        match self {
            Self::Person => (Hatch::Crossed, 0.6),
            Self::Excluded => (Hatch::Falling, 0.6),
            Self::Jump => (Hatch::Falling, 1.4),
            Self::WarmUp => (Hatch::Level, 0.9),
            Self::DeadTime => (Hatch::Rising, 0.6),
            Self::Short => (Hatch::Rising, 1.3),
            _ => (Hatch::Crossed, 1.5),
        }
    }
}

impl From<StretchWhy> for Reason {
    fn from(why: StretchWhy) -> Self {
        match why {
            StretchWhy::DeadTime => Self::DeadTime,
            StretchWhy::WarmUp => Self::WarmUp,
            StretchWhy::Excluded => Self::Excluded,
            StretchWhy::Short => Self::Short,
            StretchWhy::UnmarkedJump(_) => Self::Jump,
            StretchWhy::ContentsUnknown => Self::ContentsUnknown,
            StretchWhy::InjectionUnknown => Self::InjectionUnknown,
            StretchWhy::NearlyPureOxygen(_) => Self::NearlyPureOxygen,
            StretchWhy::NotAccounted(_) => Self::NotAccounted,
        }
    }
}

/// A stretch, in seconds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Stretch {
    pub from_s: f64,
    pub to_s: f64,
    pub reason: Reason,
}

/// The stretches between two times, none of which overlap.
pub(super) fn stretches(
    left_out: &[StretchLeftOut],
    by_a_person: &[(f64, f64)],
    (first_s, last_s): (f64, f64),
) -> Vec<Stretch> {
    // A topped loop is read at its two ends: the dead times between are no stretches it does without.
    let counts = |s: &&StretchLeftOut| s.why != StretchWhy::DeadTime || s.kept != LoopKept::Topped;
    let said = left_out.iter().filter(counts).map(|s| (s.from_s, s.to_s, Reason::from(s.why)));
    let person = by_a_person.iter().map(|(from, to)| (*from, *to, Reason::Person));
    let mut ends: Vec<(f64, bool, Reason)> = said
        .chain(person)
        .filter(|(from, to, _)| from.is_finite() && to.is_finite())
        .map(|(from, to, reason)| (from.max(first_s), to.min(last_s), reason))
        .filter(|(from, to, _)| from < to)
        .flat_map(|(from, to, reason)| [(from, true, reason), (to, false, reason)])
        .collect();
    ends.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut open = [0_usize; Reason::ALL.len()];
    let mut found: Vec<Stretch> = Vec::new();
    let mut since = first_s;
    for (at, begins, reason) in ends {
        let shown = Reason::ALL.into_iter().zip(&open).find(|(_, open)| **open > 0).map(|(reason, _)| reason);
        if let (Some(reason), true) = (shown, at > since) {
            match found.last_mut() {
                Some(last) if last.reason == reason && last.to_s >= since => last.to_s = at,
                _ => found.push(Stretch { from_s: since, to_s: at, reason }),
            }
        }
        since = at;
        let index = reason as usize;
        if let Some(count) = open.get_mut(index) {
            *count = if begins { *count + 1 } else { count.saturating_sub(1) };
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    fn out(from_s: f64, to_s: f64, why: StretchWhy) -> StretchLeftOut {
        StretchLeftOut { from_s, to_s, kept: LoopKept::Held, why }
    }

    #[test]
    fn each_moment_has_one_reason() {
        let said = [
            out(0.0, 90.0, StretchWhy::DeadTime),
            out(60.0, 150.0, StretchWhy::DeadTime),
            out(0.0, 100.0, StretchWhy::WarmUp),
            out(300.0, 400.0, StretchWhy::UnmarkedJump(350.0)),
        ];
        let got = stretches(&said, &[(350.0, 1e9), (f64::NAN, 5.0)], (0.0, 500.0));
        let want = [
            (0.0, 100.0, Reason::WarmUp),
            (100.0, 150.0, Reason::DeadTime),
            (300.0, 350.0, Reason::Jump),
            (350.0, 500.0, Reason::Person),
        ];
        assert_eq!(got.iter().map(|s| (s.from_s, s.to_s, s.reason)).collect::<Vec<_>>(), want);
    }

    #[test]
    fn the_order_of_reasons_is_that_of_the_list() {
        for (i, reason) in Reason::ALL.into_iter().enumerate() {
            assert_eq!(reason as usize, i);
        }
    }
}
