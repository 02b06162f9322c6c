//! One orifice: whether it may feed a setting, the IP, and all that follows from it.

use super::depth::left_at;
use super::fitting_diameter::{allowed, shortfall_of_leanest};
use super::injection::Feed;
use super::search::{Divisions, SPAN_TOLERANCE_BAR, outside_span, range_of_span};
use super::{
    Against, AtIp, DepthLimits, Described, Drift, ExpectedReading, FirstStageKind, FittingDiameter, Judged,
    LARGEST_SHORTFALL, OrificeInput, OrificeSetting, Patency, RestingUptake, SettingError, SettingOptions,
    Standing, Used, Warning, WhyNot,
};
use crate::bench::choke::Origin;

/// Most rows of the table over IP.
const MOST_ROWS: i64 = 40;

/// One orifice with all that is asked of it.
pub(super) struct Case<'a> {
    pub(super) orifice: &'a OrificeInput,
    pub(super) options: &'a SettingOptions,
    pub(super) used: &'a Used,
    pub(super) despite: Option<&'a str>,
}

impl Case<'_> {
    pub(super) fn work(&self, uptake: &RestingUptake) -> Result<OrificeSetting, SettingError> {
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

    pub(super) fn refused(&self, why: WhyNot, warnings: Vec<Warning>) -> OrificeSetting {
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
                    left: left_at(feed, at.ip_bar_gauge, max_depth),
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
