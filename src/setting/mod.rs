//! From an orifice's line and a diver's uptake to the intermediate pressure (IP) to dial in.
//!
//! Comes in: orifices ([`OrificeInput`]), another day's resting uptake ([`RestingUptake`]), what else is known of first
//! stage, gauge, place and loop ([`SettingOptions`]). Goes out: a [`Setting`]: for each orifice the IP and what follows from
//! it, or, typed, why there is none; and which orifice is recommended.
//!
//! The IP is the largest division of the gauge, inside the first stage's range, at which
//!
//! - `P(J > M) ≤ chance`, with `J` the richest injection (`injection`) and `M` another day's uptake, its Student distribution
//!   and the normal parts of `J` convolved (`chance`); for a compensated first stage at the maximum depth;
//! - the richest injection falls short of the uptake by the least shortfall;
//! - and the *leanest* injection, at the same depth, by at most 25 %: else there is no setting.
//!
//! The steps, each of its own file: `options` (what is taken where nothing is said), `orifice`, `injection`, `chance`,
//! `search` (rounding down), `fitting_diameter`, `depth`, `drift`, `patency`, `reading`.
//!
//! Reasons to doubt it: uptake at rest is predicted for a day like the ones measured; the gas at the orifice is taken to have
//! the water's temperature; the upward spread is a bound someone read off a gauge; the line is that of the orifice as
//! tested, and its choke ratio obeys one law. It never replaces watching PO2.

mod options;
mod resting;
mod orifice;
mod chance;
mod injection;
mod search;
mod fitting_diameter;
mod depth;
mod drift;
mod patency;
mod reading;
mod case;
mod why_not;
mod warning;

pub use depth::{DepthLimits, DepthPoint, DepthRow};
pub use drift::{Drift, HYPOXIA_BAR};
pub use fitting_diameter::FittingDiameter;
pub use injection::{Injected, InjectionSource};
pub use options::{
    BAROMETER_EXPANDED_BAR, COLDEST_C, DEFAULT_BAROMETER_BAR, DEFAULT_CHANCE, DEFAULT_CONTENTS_BAR,
    DEFAULT_GAUGE_DIVISION_BAR, DEFAULT_GAUGE_ERROR_OF_SCALE, DEFAULT_GAUGE_SCALE_BAR, DEFAULT_IP_REPEAT_BAR,
    DEFAULT_IP_SPREAD_BAR, DEFAULT_PO2_HIGH_BAR, DEFAULT_PO2_LOW_BAR, DEFAULT_PURITY, DEFAULT_SHORTFALL,
    DEFAULT_WORK_L_MIN, Defaulted, FirstStageKind, LARGEST_SHORTFALL, LOOP_C, NOMINAL_C, PlaceGiven,
    SettingOptions, Trapped, Used, WARMEST_C, WEATHER_EXPANDED_BAR,
};
pub use orifice::{OrificeInput, Standing, oxygen_line};
pub use patency::Patency;
pub use reading::{ExpectedReading, ReadingWindow};
pub use resting::RestingUptake;
pub use search::BEYOND_SPAN;
pub use warning::Warning;
pub use why_not::{SettingError, WhyNot};

use case::Case;

use crate::entry::Id;
use crate::uptake::Plausible;

/// Revision of the method: rises when any printed figure could change.
pub const METHOD_REVISION: u32 = 1;

/// A setting.
#[derive(Debug, Clone, PartialEq)]
pub struct Setting {
    /// Which of `orifices` is recommended; none when none fits.
    pub recommended: Option<usize>,
    /// Why none fits: the reason of the first orifice, or what holds for all.
    pub why_not: Option<WhyNot>,
    /// Every orifice, in the order handed in.
    pub orifices: Vec<OrificeSetting>,
    /// The uptake that was set by.
    pub uptake: Option<RestingUptake>,
    /// Every other number that was used.
    pub used: Used,
    /// What to know, whatever the orifice.
    pub warnings: Vec<Warning>,
}

impl Setting {
    /// The recommended orifice and its setting.
    #[must_use]
    pub fn recommended(&self) -> Option<(&OrificeSetting, &Described)> {
        let orifice = self.orifices.get(self.recommended?)?;
        orifice.answer.as_ref().ok().map(|described| (orifice, described))
    }
}

/// One orifice.
#[derive(Debug, Clone, PartialEq)]
pub struct OrificeSetting {
    /// Its name.
    pub orifice: Id,
    /// Its effective diameter, µm.
    pub effective_diameter_um: f64,
    /// The setting, or why there is none.
    pub answer: Result<Described, WhyNot>,
    /// The IP that was to be judged; none when nothing was, or the orifice may not be used.
    pub judged: Option<Judged>,
    /// The IP never to exceed, bar gauge, rounded down: the chance alone, no range and no least shortfall; not above the
    /// maker's maximum nor the bench span. None when even the lowest measured pressure exceeds the chance.
    pub never_exceed_ip_bar_gauge: Option<f64>,
    /// Rows over IP, within the range and the bench span.
    pub table: Vec<AtIp>,
    /// What to know of it.
    pub warnings: Vec<Warning>,
}

/// An IP with all that follows from it.
#[derive(Debug, Clone, PartialEq)]
pub struct Described {
    /// Injection, chance and drift.
    pub at: AtIp,
    /// What the injection may be off by, at the surface: standard uncertainties, L/min.
    pub budget: Vec<(InjectionSource, f64)>,
    /// What depth does.
    pub depth: DepthLimits,
    /// The check with the cylinder valve shut; none when nothing is known of the trapped volume.
    pub patency: Option<Patency>,
    /// What the named meter should show.
    pub expected_reading: Option<ExpectedReading>,
}

/// What an IP does.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AtIp {
    /// The IP as the gauge shows it, bar gauge.
    pub ip_bar_gauge: f64,
    /// Pressure at the orifice at the surface, bar absolute.
    pub p1_bar_abs: f64,
    /// The injection at the surface.
    pub surface: Injected,
    /// The injection where the chance is held: at the maximum depth for a compensated first stage, else at the surface.
    pub held: Injected,
    /// Uptake less nominal injection at the surface, L/min STPD.
    pub shortfall_l_min: f64,
    /// Shortfall of the richest injection where the chance is held, share of the uptake.
    pub least_shortfall: f64,
    /// Shortfall of the leanest injection where the chance is held, share of the uptake.
    pub largest_shortfall: f64,
    /// The chance that the richest injection exceeds another day's uptake where it is held.
    pub overfeed_chance: f64,
    /// Drift of PO2 with the nominal injection at the surface; none when the loop volume is not known.
    pub drift: Option<Drift>,
}

/// An IP judged.
#[derive(Debug, Clone, PartialEq)]
pub struct Judged {
    /// What it does.
    pub described: Described,
    /// All that speaks against it; nothing does when empty.
    pub against: Vec<Against>,
}

/// What speaks against a judged IP.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Against {
    /// The sentence says: it overfeeds with so much chance; lower it.
    Overfeeds {
        /// The chance.
        chance: f64,
    },
    /// The sentence says: it leaves only so much shortfall; lower it.
    ShortfallTooSmall {
        /// Shortfall of the richest injection, share of the uptake.
        shortfall: f64,
    },
    /// The sentence says: it may fall short by so much; too lean also kills.
    ShortfallTooLarge {
        /// Shortfall of the leanest injection, share of the uptake.
        shortfall: f64,
    },
    /// The sentence says: the first stage's range ends here and there.
    OutsideRange {
        /// Bar gauge.
        range_bar_gauge: (f64, f64),
    },
    /// The sentence says: it is above the maximum that the maker states.
    AboveMaximum {
        /// Bar gauge.
        max_ip_bar_gauge: f64,
    },
}

/// Works out the setting for one or more orifices. Without an `uptake` the answer is [`WhyNot::NoUptake`].
///
/// # Errors
/// A call that is wrong, as [`SettingError`] lists; an orifice that merely does not fit is none.
pub fn setting(
    orifices: &[OrificeInput],
    uptake: Option<&RestingUptake>,
    options: &SettingOptions,
) -> Result<Setting, SettingError> {
    let used = Used::of(options)?;
    if orifices.is_empty() {
        return Err(SettingError::NoOrifice);
    }
    let despite = options.despite.as_deref().map(str::trim).filter(|text| !text.is_empty());
    let mut warnings = warnings_for_all(&used, options);
    let usable = usable_uptake(uptake, despite, &mut warnings);
    let mut settings = Vec::with_capacity(orifices.len());
    for orifice in orifices {
        let case = Case { orifice, options, used: &used, despite };
        settings.push(match &usable {
            Ok(uptake) => case.work(uptake)?,
            Err(why) => case.refused(why.clone(), Vec::new()),
        });
    }
    let recommended = best(orifices, &settings, &used);
    let first_reason = || settings.iter().find_map(|s| s.answer.as_ref().err().cloned());
    let why_not = if recommended.is_none() { first_reason() } else { None };
    Ok(Setting { recommended, why_not, orifices: settings, uptake: uptake.cloned(), used, warnings })
}

fn warnings_for_all(used: &Used, options: &SettingOptions) -> Vec<Warning> {
    let took = |which| used.defaulted.contains(&which);
    [
        took(Defaulted::GaugeError)
            .then_some(Warning::GaugeErrorAssumed { expanded_bar: used.gauge_error_expanded_bar }),
        took(Defaulted::IpSpread).then_some(Warning::IpSpreadAssumed { bar: used.ip_spread_bar }),
        took(Defaulted::IpRepeat)
            .then_some(Warning::IpRepeatAssumed { expanded_bar: used.ip_repeat_expanded_bar }),
        took(Defaulted::WaterTemperature).then_some(Warning::WaterTemperatureUnknown),
        used.loop_volume_l.is_none().then_some(Warning::LoopVolumeUnknown),
        options.trapped.is_none().then_some(Warning::TrappedVolumeUnknown),
    ]
    .into_iter()
    .flatten()
    .collect()
}

/// The uptake, if there is one and it may be used.
fn usable_uptake<'a>(
    uptake: Option<&'a RestingUptake>,
    despite: Option<&str>,
    warnings: &mut Vec<Warning>,
) -> Result<&'a RestingUptake, WhyNot> {
    let uptake = uptake.ok_or(WhyNot::NoUptake)?;
    if !(uptake.uptake_l_min > 0.0
        && uptake.uptake_l_min.is_finite()
        && uptake.u_l_min >= 0.0
        && uptake.dof > 0.0)
    {
        return Err(WhyNot::NoUptake);
    }
    if let Some(per) = uptake.per_kilogram {
        let ml_kg_min = per.ml_kg_min;
        match (per.plausible, despite) {
            (Plausible::Usual, _) => {}
            (Plausible::Unusual, _) => warnings.push(Warning::UnusualPerKilogram { ml_kg_min }),
            (Plausible::Hardly, Some(why)) => {
                warnings.push(Warning::DespitePerKilogram { ml_kg_min, why: why.to_owned() });
            }
            (Plausible::Hardly, None) => return Err(WhyNot::ImplausiblePerKilogram { ml_kg_min }),
        }
    }
    Ok(uptake)
}

/// The orifice to recommend: one whose calibration needs no excuse before one that does, one that stays constant to the
/// maximum depth before one that does not, then the one that wastes least of the uptake, then the first.
fn best(orifices: &[OrificeInput], settings: &[OrificeSetting], used: &Used) -> Option<usize> {
    let rank = |index: usize, described: &Described| {
        let input = &orifices[index];
        let excused =
            matches!(input.standing, Standing::Failed | Standing::Undecided) || input.overdue_since.is_some();
        let max_depth = used.max_depth_m.unwrap_or(0.0);
        let shallow = described.depth.one_percent.is_some_and(|p| p.depth_m < max_depth);
        (excused, shallow, described.at.largest_shortfall)
    };
    settings
        .iter()
        .enumerate()
        .filter_map(|(index, s)| s.answer.as_ref().ok().map(|described| (index, rank(index, described))))
        .min_by(|(_, a), (_, b)| (a.0, a.1).cmp(&(b.0, b.1)).then(a.2.total_cmp(&b.2)))
        .map(|(index, _)| index)
}
