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

use fitting_diameter::{allowed, shortfall_of_leanest};
use injection::Feed;
use search::{Divisions, SPAN_TOLERANCE_BAR, outside_span, range_of_span};

use crate::bench::choke::Origin;
use crate::entry::Id;
use crate::uptake::Plausible;

/// Revision of the method: rises when any printed figure could change.
pub const METHOD_REVISION: u32 = 1;
/// Most rows of the table over IP.
const MOST_ROWS: i64 = 40;

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

/// One orifice with all that is asked of it.
struct Case<'a> {
    orifice: &'a OrificeInput,
    options: &'a SettingOptions,
    used: &'a Used,
    despite: Option<&'a str>,
}

impl Case<'_> {
    fn work(&self, uptake: &RestingUptake) -> Result<OrificeSetting, SettingError> {
        let (orifice, used) = (self.orifice, self.used);
        let mut warnings = Vec::new();
        if let Err(why) = self.standing(&mut warnings) {
            return Ok(self.refused(why, warnings));
        }
        if orifice.line.slope <= 0.0 || orifice.line.slope.is_nan() {
            return Ok(self.refused(WhyNot::LineDoesNotRise, warnings));
        }
        let feed = Feed::new(used, &orifice.line, &orifice.choke, uptake);
        let judged = self.options.judge.map(|ip| self.judge(&feed, ip.as_bar())).transpose()?;
        let answer = self.find(&feed, &mut warnings).map(|ip| self.describe(&feed, ip));
        let shown = answer.as_ref().ok().or(judged.as_ref().map(|j| &j.described));
        if let Some(described) = shown {
            self.warn(&feed, described, &mut warnings);
        }
        Ok(OrificeSetting {
            orifice: orifice.id.clone(),
            effective_diameter_um: orifice.effective_diameter_um,
            never_exceed_ip_bar_gauge: self.never_exceed(&feed),
            table: self.table(&feed, answer.as_ref().ok().map(|d| d.at.ip_bar_gauge)),
            answer,
            judged,
            warnings,
        })
    }

    fn refused(&self, why: WhyNot, warnings: Vec<Warning>) -> OrificeSetting {
        OrificeSetting {
            orifice: self.orifice.id.clone(),
            effective_diameter_um: self.orifice.effective_diameter_um,
            answer: Err(why),
            judged: None,
            never_exceed_ip_bar_gauge: None,
            table: Vec::new(),
            warnings,
        }
    }

    /// Whether the orifice may feed a setting at all.
    fn standing(&self, warnings: &mut Vec<Warning>) -> Result<(), WhyNot> {
        let why = self.despite.map(str::to_owned);
        match (self.orifice.standing, why.clone()) {
            (Standing::Accepted, _) => {}
            (Standing::NeverJudged, _) => warnings.push(Warning::NeverJudged),
            (Standing::Failed, Some(why)) => warnings.push(Warning::DespiteFailed { why }),
            (Standing::Failed, None) => return Err(WhyNot::Failed),
            (Standing::Undecided, Some(why)) => warnings.push(Warning::DespiteUndecided { why }),
            (Standing::Undecided, None) => return Err(WhyNot::Undecided),
        }
        match (self.orifice.overdue_since, why) {
            (None, _) => {}
            (Some(since), Some(why)) => warnings.push(Warning::DespiteOverdue { since, why }),
            (Some(since), None) => return Err(WhyNot::Overdue { since }),
        }
        Ok(())
    }

    /// Lowest and highest IP that can be set, bar gauge.
    fn range(&self) -> (f64, f64) {
        let (low, high) = self
            .used
            .ip_range_bar_gauge
            .unwrap_or_else(|| range_of_span(self.used, self.orifice.span_bar_abs));
        (low, self.used.max_ip_bar_gauge.map_or(high, |max| high.min(max)))
    }

    /// The IP to set, bar gauge.
    fn find(&self, feed: &Feed<'_>, warnings: &mut Vec<Warning>) -> Result<f64, WhyNot> {
        let (used, range) = (self.used, self.range());
        let divisions = Divisions(used.gauge_division_bar);
        let Some((first, last)) = divisions.within(range) else {
            return Err(WhyNot::NoDivisionInRange {
                range_bar_gauge: range,
                division_bar: used.gauge_division_bar,
            });
        };
        let fitting = || FittingDiameter::of(feed, self.orifice.effective_diameter_um, range);
        let Some(index) = divisions.largest((first, last), |ip| allowed(feed, ip)) else {
            let lowest = divisions.bar(first);
            return Err(WhyNot::NothingLowEnough {
                lowest_ip_bar_gauge: lowest,
                richest_l_min: feed.injected(lowest, used.held_at_m()).richest_l_min,
                chance: feed.chance(lowest, used.held_at_m()),
                fitting: fitting(),
            });
        };
        let ip = divisions.bar(index);
        let shortfall = shortfall_of_leanest(feed, ip);
        if shortfall > LARGEST_SHORTFALL {
            let found = fitting();
            // Where the range ends before the chance does, it is the hole that is too small.
            return Err(if index == last && found.is_some() {
                WhyNot::NothingHighEnough { highest_ip_bar_gauge: ip, shortfall, fitting: found }
            } else {
                WhyNot::ShortfallTooLarge { ip_bar_gauge: ip, shortfall, fitting: found }
            });
        }
        if let Some(needs_bar_abs) = outside_span(feed, ip, self.orifice.span_bar_abs) {
            return Err(WhyNot::OutsideSpan {
                ip_bar_gauge: ip,
                needs_bar_abs,
                span_bar_abs: self.orifice.span_bar_abs,
                fitting: fitting(),
            });
        }
        if index == last && allowed(feed, divisions.bar(index + 1)) {
            warnings.push(Warning::RangeLimits { highest_ip_bar_gauge: ip });
        }
        Ok(ip)
    }

    fn never_exceed(&self, feed: &Feed<'_>) -> Option<f64> {
        let used = self.used;
        let (low, high) = range_of_span(used, self.orifice.span_bar_abs);
        let top = (high + SPAN_TOLERANCE_BAR).min(used.max_ip_bar_gauge.unwrap_or(f64::INFINITY));
        let divisions = Divisions(used.gauge_division_bar);
        let within = divisions.within(((low - SPAN_TOLERANCE_BAR).max(0.0), top))?;
        divisions
            .largest(within, |ip| feed.chance(ip, used.held_at_m()) <= used.chance)
            .map(|index| divisions.bar(index))
    }

    fn judge(&self, feed: &Feed<'_>, ip: f64) -> Result<Judged, SettingError> {
        let used = self.used;
        if let Some(needs_bar_abs) = outside_span(feed, ip, self.orifice.span_bar_abs) {
            return Err(SettingError::IpOutsideSpan {
                orifice: self.orifice.id.as_str().to_owned(),
                ip_bar_gauge: ip,
                needs_bar_abs,
                span_bar_abs: self.orifice.span_bar_abs,
            });
        }
        let described = self.describe(feed, ip);
        let at = &described.at;
        let within = |(low, high): (f64, f64)| (low..=high).contains(&ip);
        let against = [
            (at.overfeed_chance > used.chance).then_some(Against::Overfeeds { chance: at.overfeed_chance }),
            (at.least_shortfall < used.shortfall)
                .then_some(Against::ShortfallTooSmall { shortfall: at.least_shortfall }),
            (at.largest_shortfall > LARGEST_SHORTFALL)
                .then_some(Against::ShortfallTooLarge { shortfall: at.largest_shortfall }),
            used.ip_range_bar_gauge
                .filter(|range| !within(*range))
                .map(|range_bar_gauge| Against::OutsideRange { range_bar_gauge }),
            used.max_ip_bar_gauge
                .filter(|max| ip > *max)
                .map(|max_ip_bar_gauge| Against::AboveMaximum { max_ip_bar_gauge }),
        ]
        .into_iter()
        .flatten()
        .collect();
        Ok(Judged { described, against })
    }

    fn at(&self, feed: &Feed<'_>, ip: f64) -> AtIp {
        let (held_m, uptake) = (self.used.held_at_m(), feed.uptake.uptake_l_min);
        let surface = feed.injected(ip, 0.0);
        let held = feed.injected(ip, held_m);
        AtIp {
            ip_bar_gauge: ip,
            p1_bar_abs: feed.p1_bar(ip, 0.0),
            surface,
            held,
            shortfall_l_min: uptake - surface.nominal_l_min,
            least_shortfall: 1.0 - held.richest_l_min / uptake,
            largest_shortfall: 1.0 - held.leanest_l_min / uptake,
            overfeed_chance: feed.chance(ip, held_m),
            drift: Drift::of(self.used, surface.nominal_l_min, uptake),
        }
    }

    fn describe(&self, feed: &Feed<'_>, ip: f64) -> Described {
        let at = self.at(feed, ip);
        let whole = at.surface.nominal_l_min / self.used.purity;
        let relative_u = at.surface.u_l_min / at.surface.nominal_l_min;
        Described {
            at,
            budget: feed.budget(ip, 0.0),
            depth: DepthLimits::of(feed, ip, self.orifice.choke.origin, self.orifice.span_bar_abs.1),
            patency: self
                .options
                .trapped
                .and_then(|t| Patency::of(t, self.used.contents_bar_gauge, whole, relative_u)),
            expected_reading: self
                .options
                .meter
                .as_ref()
                .and_then(|meter| ExpectedReading::of(feed, ip, meter, &self.orifice.id)),
        }
    }

    /// Rows on the divisions of the gauge, not too many, and the setting itself.
    fn table(&self, feed: &Feed<'_>, chosen: Option<f64>) -> Vec<AtIp> {
        let divisions = Divisions(self.used.gauge_division_bar);
        let Some((first, last)) = divisions.within(self.range()) else { return Vec::new() };
        let step = ((last - first) / MOST_ROWS + 1).max(1);
        let mut ips: Vec<f64> = (first..=last)
            .step_by(usize::try_from(step).unwrap_or(1))
            .map(|index| divisions.bar(index))
            .chain(chosen)
            .filter(|ip| outside_span(feed, *ip, self.orifice.span_bar_abs).is_none())
            .collect();
        ips.sort_by(f64::total_cmp);
        ips.dedup_by(|a, b| a.total_cmp(b).is_eq());
        ips.into_iter().map(|ip| self.at(feed, ip)).collect()
    }

    fn warn(&self, feed: &Feed<'_>, described: &Described, warnings: &mut Vec<Warning>) {
        let (used, at, depth) = (self.used, &described.at, &described.depth);
        if self.orifice.choke.origin == Origin::Bounded {
            warnings.push(Warning::ChokeRatioBounded);
        }
        if !self.orifice.choke.model_fits {
            warnings.push(Warning::ChokeModelFails);
        }
        let surface_bar = used.ambient_at(0.0);
        if depth.one_percent.is_some_and(|p| p.ambient_bar_abs < surface_bar) {
            warnings.push(Warning::NotChokedAtSurface);
        }
        if let Some(max_depth) = used.max_depth_m {
            match (depth.stops, depth.one_percent) {
                (Some(stops), _) if stops.depth_m <= max_depth => {
                    warnings.push(Warning::StopsAboveMaxDepth { stops_at_m: stops.depth_m });
                }
                (_, Some(one)) if one.depth_m < max_depth => warnings.push(Warning::DeeperThanConstant {
                    one_percent_at_m: one.depth_m,
                    left: depth::left_at(feed, at.ip_bar_gauge, max_depth),
                }),
                _ => {}
            }
        }
        if used.first_stage == FirstStageKind::Compensated {
            let needs_bar_abs = feed.p1_bar(at.ip_bar_gauge, used.held_at_m());
            let highest_bar_abs = self.orifice.span_bar_abs.1;
            if needs_bar_abs > highest_bar_abs + SPAN_TOLERANCE_BAR {
                warnings.push(Warning::BeyondSpanAtDepth { needs_bar_abs, highest_bar_abs });
            }
            let shortfall = 1.0 - at.surface.leanest_l_min / feed.uptake.uptake_l_min;
            if shortfall > LARGEST_SHORTFALL {
                warnings.push(Warning::LeanAtSurface { shortfall });
            }
        }
        match (&self.options.meter, &described.expected_reading) {
            (Some(_), None) => warnings.push(Warning::MeterWithoutGasFactor),
            (_, Some(reading)) if reading.out_of_range => warnings.push(Warning::MeterOutOfRange),
            _ => {}
        }
    }
}
