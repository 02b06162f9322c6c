//! The numbers of a setting as texts, rounded to the side that is safe, and texts of others as data.
//!
//! Comes in: numbers in the unit of their name. Goes out: texts with their units. Pressures to set are rounded down,
//! depths to the shallower metre, times to the shorter, chances up. Left out: anything that needs an uncertainty to be
//! rounded by (`number`).

use super::Units;
use super::number::{figures, fixed, limit_percent, shortest, value_and_u};
use crate::quantity::unit::{self, Kind};
use crate::setting::{DepthPoint, FirstStageKind, RestingUptake};
use crate::stats::coverage::coverage_factor;

/// Coverage factor of what stands after a ± of an injection: about 95 %.
pub(super) const INJECTION_COVERAGE: f64 = 2.0;
/// A share of the last place within which a number counts as on it.
const ON_PLACE: f64 = 1e-6;
/// Longest word of somebody else's text, columns; a longer one is broken so that lines keep their width.
const LONGEST_WORD: usize = 50;

/// Pounds per square inch in a pressure given in bar.
pub(super) fn psi(bar: f64) -> f64 {
    unit::lookup(Kind::Pressure, "psi").map_or(f64::NAN, |psi| psi.from_si(bar * 1e5))
}

/// A number rounded down to a number of decimals.
pub(super) fn down(value: f64, decimals: i32) -> String {
    rounded(value, decimals, |places| (places + ON_PLACE).floor())
}

/// A number rounded up to a number of decimals.
pub(super) fn up(value: f64, decimals: i32) -> String {
    rounded(value, decimals, |places| (places - ON_PLACE).ceil())
}

fn rounded(value: f64, decimals: i32, to: impl Fn(f64) -> f64) -> String {
    if !value.is_finite() {
        return "no number".to_owned();
    }
    let place = libm::pow(10.0, f64::from(-decimals));
    fixed(to(value / place) * place, decimals)
}

/// Decimals that stand after the point of a number.
pub(super) fn decimals_of(text: &str) -> i32 {
    text.split_once('.').map_or(0, |(_, decimals)| i32::try_from(decimals.len()).unwrap_or(0))
}

/// The bar of a pressure on a gauge of that division, rounded down.
pub(super) fn bar_on_gauge(bar: f64, division_bar: f64) -> String {
    const MOST_DECIMALS: i32 = 3;
    down(bar, decimals_of(&shortest(division_bar, 4)).min(MOST_DECIMALS))
}

/// The psi of a pressure given in bar, rounded down to whole ones but where it lies on a tenth.
pub(super) fn psi_on_gauge(bar: f64) -> String {
    const ON_TENTH: f64 = 1e-4;
    let psi = psi(bar);
    let tenths = psi * 10.0;
    let whole = (psi - psi.round()).abs() < ON_TENTH;
    if !whole && (tenths - tenths.round()).abs() < ON_TENTH {
        fixed(psi, 1)
    } else if whole {
        fixed(psi, 0)
    } else {
        down(psi, 0)
    }
}

/// A pressure to set by a gauge of that division: bar and psi, rounded down.
pub(super) fn ip_on_gauge(bar: f64, division_bar: f64, units: &Units) -> String {
    both(&bar_on_gauge(bar, division_bar), &psi_on_gauge(bar), bar, units)
}

/// A pressure as somebody gave it: bar and psi.
pub(super) fn ip_given(bar: f64, units: &Units) -> String {
    both(&shortest(bar, 5), &fixed(psi(bar), 1), bar, units)
}

/// Bar and psi always, the one asked for first; another unit is added.
fn both(bar_text: &str, psi_text: &str, bar: f64, units: &Units) -> String {
    match units.pressure_symbol() {
        "bar" => format!("{bar_text} bar ({psi_text} psi)"),
        "psi" => format!("{psi_text} psi ({bar_text} bar)"),
        _ => format!("{bar_text} bar ({psi_text} psi, {})", units.pressure_text(bar)),
    }
}

/// A chance against its limit, rounded up: two figures, more where two would put it on the wrong side.
pub(super) fn chance(p: f64, limit: f64) -> String {
    let percent = 100.0 * p;
    if !percent.is_finite() {
        return "an unknown chance".to_owned();
    }
    if percent > 99.0 {
        return "over 99 %".to_owned();
    }
    if percent < 0.1 {
        return "under 0.1 %".to_owned();
    }
    let text = up(percent, if percent >= 10.0 { 0 } else { 1 });
    let shown: f64 = text.parse().unwrap_or(percent);
    if p <= limit && shown > 100.0 * limit * (1.0 + ON_PLACE) {
        return format!("{} %", up(percent, 3));
    }
    format!("{text} %")
}

/// A share that is worse the smaller it is, in percent.
pub(super) fn share_down(share: f64) -> String {
    format!("{} %", down(100.0 * share, 1))
}

/// A share that is worse the larger it is, in percent.
pub(super) fn share_up(share: f64) -> String {
    format!("{} %", up(100.0 * share, 1))
}

/// Minutes, rounded down; without the unit.
pub(super) fn minutes(minutes: f64) -> String {
    const LONGEST: f64 = 600.0;
    if minutes > LONGEST {
        return format!("over {}", fixed(LONGEST, 0));
    }
    down(minutes, if minutes >= 10.0 { 0 } else { 1 })
}

/// A rate of PO2 without its unit; negative = sinking.
pub(super) fn rate(bar_min: f64) -> String {
    figures(bar_min, 2)
}

/// Whether lengths are shown in feet or inches.
pub(super) fn imperial(units: &Units) -> bool {
    matches!(units.unit(Kind::Length).symbol, "ft" | "in")
}

/// Unit of depths.
pub(super) fn depth_symbol(units: &Units) -> &'static str {
    if imperial(units) { "ft" } else { "m" }
}

/// A depth given in metres, as the number shown.
pub(super) fn depth_shown(m: f64, units: &Units) -> f64 {
    let shown = unit::lookup(Kind::Length, depth_symbol(units)).map(|unit| unit.from_si(m));
    shown.unwrap_or(m)
}

/// A depth, rounded to the shallower whole unit.
pub(super) fn depth(m: f64, units: &Units) -> String {
    format!("{} {}", down(depth_shown(m, units), 0), depth_symbol(units))
}

/// A depth with the pressure around there, both rounded to the shallower side.
pub(super) fn depth_point(point: &DepthPoint, units: &Units) -> String {
    format!("{} ({} bar absolute)", depth(point.depth_m, units), down(point.ambient_bar_abs, 1))
}

/// A diameter, in thousandths of an inch as well where lengths are shown so.
pub(super) fn diameter(um: f64, units: &Units) -> String {
    const UM_PER_MIL: f64 = 25.4;
    if imperial(units) {
        format!("{} µm ({} thousandths of an inch)", fixed(um, 1), fixed(um / UM_PER_MIL, 2))
    } else {
        format!("{} µm", fixed(um, 1))
    }
}

/// A temperature given in kelvins.
pub(super) fn temperature(k: f64, units: &Units) -> String {
    let shown = units.temperature(k - crate::quantity::ZERO_CELSIUS_K);
    let symbol = units.temperature_symbol();
    format!("{} {symbol}", shortest(crate::report::number::significant(shown, 9), 4))
}

/// An injection with its expanded uncertainty, ending at the same place, and its decimals.
pub(super) fn injection(l_min: f64, u_l_min: f64, units: &Units) -> (String, i32) {
    let (value, expanded) = value_and_u(units.flow(l_min), units.flow(INJECTION_COVERAGE * u_l_min));
    let decimals = decimals_of(&value);
    let symbol = units.flow_symbol();
    if expanded.is_empty() {
        (format!("{value} {symbol} (no uncertainty known)"), decimals)
    } else {
        (format!("{value} ± {expanded} {symbol}"), decimals)
    }
}

/// The 95 % interval of another day's uptake, L/min.
pub(super) fn uptake_interval(uptake: &RestingUptake) -> (f64, f64) {
    let half = if uptake.u_l_min > 0.0 { coverage_factor(0.95, uptake.dof) * uptake.u_l_min } else { 0.0 };
    ((uptake.uptake_l_min - half).max(0.0), uptake.uptake_l_min + half)
}

/// An uptake and its interval: "0.315 L/min, 95 % from 0.271 to 0.359 L/min".
pub(super) fn uptake(uptake: &RestingUptake, units: &Units) -> String {
    let (low, high) = uptake_interval(uptake);
    let half = 0.5 * (high - low);
    let (value, _) = value_and_u(units.flow(uptake.uptake_l_min), units.flow(half));
    let decimals = decimals_of(&value);
    let symbol = units.flow_symbol();
    if half > 0.0 {
        format!(
            "{value} {symbol}, 95 % from {} to {} {symbol}",
            fixed(units.flow(low), decimals),
            fixed(units.flow(high), decimals)
        )
    } else {
        format!("{value} {symbol} (no uncertainty known)")
    }
}

/// A kind of first stage in words.
pub(super) const fn first_stage(kind: FirstStageKind) -> &'static str {
    match kind {
        FirstStageKind::Uncompensated => "not depth-compensated",
        FirstStageKind::Compensated => "depth-compensated",
    }
}

/// A limit of shares.
pub(super) fn limit(share: f64) -> String {
    limit_percent(share)
}

/// Somebody else's text as data: what does not show is written out, and a word longer than a line is broken.
pub(super) fn data(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    let mut word = 0;
    let mut push = |c: char| {
        word = if c == ' ' { 0 } else { word + 1 };
        if word > LONGEST_WORD {
            out.push(' ');
            word = 1;
        }
        out.push(c);
    };
    for c in text.trim().chars() {
        if is_hidden(c) {
            c.escape_default().for_each(&mut push);
        } else {
            push(if c.is_whitespace() { ' ' } else { c });
        }
    }
    out
}

/// Characters that do not show, or that turn the direction of others.
fn is_hidden(c: char) -> bool {
    c.is_control()
        || matches!(c, '\u{ad}' | '\u{61c}' | '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}'
            | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{fff9}'..='\u{fffb}')
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_ip_is_rounded_down_in_both_units() {
        let units = Units::default();
        // 9.1 bar = 910 000/6894.757 = 131.984 psi.
        assert_eq!(ip_on_gauge(9.1, 0.1, &units), "9.1 bar (131 psi)");
        assert_eq!(ip_on_gauge(10.0, 0.25, &units), "10.00 bar (145 psi)");
        // 27 divisions of 5 psi: 135 psi = 9.307 922 bar.
        assert_eq!(ip_on_gauge(27.0 * 0.344_737_864_658, 0.344_737_864_658, &units), "9.307 bar (135 psi)");
        // 132.5 psi lies on a division of 2.5 psi.
        assert_eq!(psi_on_gauge(132.5 * 0.068_947_572_931_68), "132.5");
        assert_eq!(ip_given(9.65, &units), "9.65 bar (140.0 psi)");
    }

    #[test]
    fn chances_are_rounded_up_and_never_to_the_wrong_side_of_their_limit() {
        assert_eq!(chance(0.0242, 0.025), "2.5 %");
        assert_eq!(chance(0.0251, 0.025), "2.6 %");
        assert_eq!(chance(0.0246, 0.0247), "2.460 %");
        assert_eq!(chance(0.000_4, 0.025), "under 0.1 %");
        assert_eq!(chance(0.9999, 0.025), "over 99 %");
        assert_eq!(chance(0.31, 0.025), "31 %");
    }

    #[test]
    fn texts_of_others_show_all_they_hold() {
        assert_eq!(data("a\u{1b}[31mred\nnext\u{202e}"), "a\\u{1b}[31mred\\nnext\\u{202e}");
        assert!(data(&"x".repeat(200)).split(' ').all(|word| word.len() <= LONGEST_WORD));
        assert_eq!(data(" <script> =cmd "), "<script> =cmd");
    }
}
