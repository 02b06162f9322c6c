//! What an uptake warns of, why there is none, and what would help, as sentences that say what to do.
//!
//! Comes in: the typed findings of `uptake`. Goes out: one sentence each, without a stop at its end. Oxygen partial
//! pressures stay in bar, as cells show them; other quantities follow the units a person asked for.

use super::Units;
use super::layout::counted;
use super::number::{figures, fixed, limit_percent, percent, shortest, u_alone};
use super::typed::{clock, span, tame};
use crate::entry::Place;
use crate::quantity::unit::Kind;
use crate::uptake::{
    CellLeftOut, CellTrouble, Help, HelpWith, Jump, PerKilogram, Plausible, Proposal, RestDoubt, RestItem,
    StretchLeftOut, StretchWhy, Warning, WhyNot,
};

/// One warning as one sentence.
#[must_use]
pub fn warning(warning: &Warning, units: &Units) -> String {
    match warning {
        Warning::OneCellOnly => {
            "only one oxygen cell is used, and nothing contradicts it if it is wrong: bring at \
            least two cells that agree"
                .into()
        }
        Warning::CellGainAssumed { expanded } => format!(
            "nothing is said about the gain of the oxygen cells; ±{} (k = 2) was taken: state gain in [cells]",
            limit_percent(*expanded)
        ),
        Warning::AboveCalibration { po2_bar, calibrated_bar } => format!(
            "PO2 went up to {} bar, above the {} bar the cells are calibrated to: an ageing cell reads low there, so \
             begin the next session lower",
            fixed(*po2_bar, 3),
            fixed(*calibrated_bar, 3)
        ),
        Warning::RowsWithoutTime(rows) => format!(
            "{} {} no time and {} passed over",
            counted(*rows as u64, "row"),
            if *rows == 1 { "has" } else { "have" },
            was(*rows)
        ),
        Warning::RowsUnordered(rows) => format!(
            "{} {} out of order in time and {} sorted: look whether two recordings were mixed",
            counted(*rows as u64, "row"),
            was(*rows),
            was(*rows)
        ),
        Warning::TimesRepeated(times) => format!(
            "{} {} in the readings more than once; the readings of each were averaged",
            counted(*times as u64, "time"),
            if *times == 1 { "stands" } else { "stand" }
        ),
        Warning::Gap { from_s, to_s } => format!(
            "nothing was read {}: the stretch is split there, as nobody knows what happened",
            from_to(*from_s, *to_s)
        ),
        Warning::BarometerUnknown | Warning::BarometerAssumed => barometer(warning),
        Warning::LoopTemperatureUnknown => {
            "no loop temperature is given; 33 ± 4 °C (k = 2) was taken: state \
            loop_temperature in [conditions]"
                .into()
        }
        Warning::LoopTemperatureAssumed => {
            "no ± is given for the loop temperature; ±1 °C (k = 2) was taken: state \
            it in [conditions]"
                .into()
        }
        Warning::DepthUnknown => format!(
            "no depth is given in the pool; the surface ± {} (k = 2) was taken: state the depth of the counterlung \
             in [conditions]",
            length(1.0, units)
        ),
        Warning::DepthAssumed => format!(
            "no ± is given for the depth of the counterlung; ±{} (k = 2) was taken: state it in [conditions]",
            length(0.2, units)
        ),
        Warning::TimeOnLoopUnknown => {
            "nothing says how long the diver was on the loop before the first reading; no \
            time was taken, with all the nitrogen still to come: state time_on_loop in [conditions]"
                .into()
        }
        Warning::WarmUpLeftOut { seconds } => format!(
            "the scrubber may have been cold, and rising vapour looks like uptake: the first {} were left out. Breathe \
             it warm beforehand and write scrubber_warm = true, or log the loop temperature",
            span(*seconds)
        ),
        Warning::LeakNotTested => {
            "the loop is not known to be tight (a passed leak test, and a nose clip): a wide \
            allowance for a leak was taken, which reads as uptake. Test it and write leak_test = \"passed\""
                .into()
        }
        Warning::LoopVolumeAssumed { expanded } => format!(
            "the loop volume states no ±; ±{} (k = 2) was taken: measure it and state how well",
            limit_percent(*expanded)
        ),
        Warning::LoopVolumeDisagrees { stated_l, found_l, apart } => format!(
            "the stated loop volume of {} and the {} found from two injections lie {} standard uncertainties apart: \
             one of the volume, the flows and the times is wrong",
            litres(*stated_l, units),
            litres(*found_l, units),
            figures(*apart, 2)
        ),
        Warning::FlowAssumed { expanded } => format!(
            "a stated injection has no ±; ±{} (k = 2) was taken: state the flow meter's, as flow = \"0.31 L/min ± \
             0.01 L/min\"",
            limit_percent(*expanded)
        ),
        Warning::IpGaugeAssumed { expanded_bar } => format!(
            "an intermediate pressure has no ±; ±{} (k = 2) was taken for the diver's own gauge: compare it with a \
             calibrated one and state what is left",
            units.pressure_text(*expanded_bar)
        ),
        Warning::MeteredAssumed { expanded } => format!(
            "an added or vented amount has no ±; ±{} (k = 2) was taken: state it with the volume",
            limit_percent(*expanded)
        ),
        Warning::SealedNitrogen { fraction, on_loop_s } => format!(
            "the sealed loop reached an oxygen fraction of {} and its readings begin {} after going on the loop: \
             nitrogen from the body reads as uptake there, high, the dangerous side, and a wide allowance was taken. \
             Stay below 0.65, and ten minutes on the loop first",
            fixed(*fraction, 2),
            span(*on_loop_s)
        ),
        Warning::HeldButVents { from_s, to_s } => format!(
            "the loop is said to be held, but {} more went in than the diver used: taken as venting, for as held it \
             would read high. Inject less than the uptake",
            from_to(*from_s, *to_s)
        ),
        Warning::HeldOrVenting { from_s, to_s } => format!(
            "{} the injection was so near the uptake that nobody can say whether the loop was held or venting; the two \
             differ little there",
            from_to(*from_s, *to_s)
        ),
        Warning::UnmarkedJump(proposal) => unmarked_jump(proposal),
        Warning::StretchLeftOut(stretch) => stretch_left_out(stretch),
        Warning::WanderRaised(wander) => format!(
            "the segments scatter more than stated: the wander of the uptake was raised to {} (one standard \
             deviation). Lie still, and rest for longer before the first reading",
            percent(*wander)
        ),
        Warning::WanderLowered(wander) => format!(
            "six or more segments scatter less than stated: the wander of the uptake was lowered to {} (one standard \
             deviation)",
            percent(*wander)
        ),
        Warning::CylinderDisagrees { difference_l_min, apart } => format!(
            "by the cylinder's drop {} {} (STPD) {} went in than by the metered oxygen, {} standard uncertainties: \
             look for a leak before the loop, or for a wrong reading of pressure or temperature",
            figures(units.flow(difference_l_min.abs()), 2),
            units.flow_symbol(),
            if *difference_l_min < 0.0 { "less" } else { "more" },
            figures(*apart, 2)
        ),
        Warning::CylinderUsed => {
            "the cylinder's drop and the metered oxygen were both known; the drop was used, \
            because it is the better known"
                .into()
        }
        Warning::Rest(doubt) => rest(doubt, units),
    }
}

fn barometer(warning: &Warning) -> String {
    match warning {
        Warning::BarometerAssumed => {
            "no ± is given for the barometer; ±2 hPa (k = 2) was taken: state it in [conditions]".into()
        }
        _ => "no barometer is given; 1013.25 ± 30 hPa (k = 2) was taken: state it in [conditions]".into(),
    }
}

/// Why there is no number, and what to do next time; never what came out instead.
#[must_use]
pub fn why_not(why: &WhyNot) -> String {
    match why {
        WhyNot::TooShort { usable_s, needed_s } => format!(
            "only {} of the readings can be used and at least {} are needed: rest for longer next time, a quarter of an \
             hour at one injection, and mark fewer stretches to be left out",
            span(*usable_s),
            span(*needed_s)
        ),
        WhyNot::NoUsableCell { left_out } => format!(
            "no oxygen cell is left that reads ({}): see to cells and cables, calibrate them, and rest again",
            cells(left_out)
        ),
        WhyNot::CellsDisagree { left_out } => format!(
            "fewer than two oxygen cells agree, and nobody can say which is right ({}): calibrate them all together, \
             replace the one that strays, and rest again",
            cells(left_out)
        ),
        WhyNot::RisingWithInjectionOff { from_s, to_s, slope_per_min } => format!(
            "{} PO2 rose with the injection off (the oxygen fraction by {} a minute), so oxygen came from somewhere \
             nobody wrote down: look for a leaking add valve and an orifice that was not shut, and write down every \
             add next time",
            from_to(*from_s, *to_s),
            figures(*slope_per_min, 2)
        ),
        WhyNot::NearlyPureOxygen { fraction } => format!(
            "the sealed loop was nearly pure oxygen (a fraction of {}), and the inert gas it is measured by is not \
             known: begin below 0.65 next time, or keep the loop held with diluent",
            fixed(*fraction, 2)
        ),
        WhyNot::NoVolumeOneInjection => "neither the loop volume nor a second injection is there, and slopes alone are \
            no flow: measure the volume, lungs included, and write loop_volume = \"7.5 L ± 0.5 L\", or rest ten \
            minutes more at another injection"
            .into(),
        WhyNot::LoopVolumeContradicts { stated_l, found_l, apart } => format!(
            "the loop volume is stated as {} L, and the injections say {} L, {} standard uncertainties apart: one of \
             them is wrong, or an injection is. Measure the volume again, lungs included, or leave it out of the file; \
             look at the flow or IP of every injection",
            fixed(*stated_l, 1),
            fixed(*found_l, 1),
            fixed(*apart, 0)
        ),
        WhyNot::UnmarkedJump { at_s } => format!(
            "what could be used holds a jump of PO2 that no event explains, at {}: write down what was done there as \
             an event, or exclude that stretch",
            clock(*at_s)
        ),
        WhyNot::ContentsUnknown => "after a vent or a diluent add nobody knows what the sealed loop holds: bring it \
            back to its first volume and write a make-up event with mark = true, or keep it held"
            .into(),
        WhyNot::NotAccounted { at_s } => format!(
            "gas went into or out of the topped loop at {} without an amount, and all oxygen must be accounted for: \
             meter every add and vent, or read the cylinder at both ends",
            clock(*at_s)
        ),
        WhyNot::InjectionUnknown => "nothing says what was injected in the stretches that are left: write an injection \
            event at the beginning, and at every change"
            .into(),
        WhyNot::Unbounded => "the readings rule out no uptake, however large or small: rest for longer, at two \
            injections further apart (off, and just below the uptake), or measure the loop volume"
            .into(),
        // What came out is no uptake, and is not said.
        WhyNot::NotPositive { .. } => "the readings, flows and volume together do not say that any oxygen was used, \
            so one of them must be wrong: check the injection's flow and its reference conditions, the loop volume, \
            and the times of the events"
            .into(),
    }
}

/// A cell that is not used, by name, with the reason.
#[must_use]
pub fn cell(cell: &CellLeftOut) -> String {
    let name = tame(&cell.name);
    match cell.why {
        CellTrouble::Faults(share) => format!(
            "{name} has {} of its readings missing, not above zero, or over ambient pressure",
            percent(share)
        ),
        CellTrouble::Frozen { from_s, to_s } => {
            format!("{name} stood still {} while the others moved", from_to(from_s, to_s))
        }
        CellTrouble::Off(bar) => format!(
            "{name} reads {} bar {} the middle of the cells",
            fixed(bar.abs(), 3),
            if bar < 0.0 { "below" } else { "above" }
        ),
        CellTrouble::Calibration => {
            format!(
                "{name} shows no more in oxygen than in air by its calibration: no line goes through the two"
            )
        }
    }
}

fn cells(left_out: &[CellLeftOut]) -> String {
    if left_out.is_empty() {
        return "none was recorded".to_owned();
    }
    left_out.iter().map(cell).collect::<Vec<_>>().join("; ")
}

/// Why a stretch is not used, in a few words.
#[must_use]
pub fn stretch_why(why: &StretchWhy) -> String {
    match why {
        StretchWhy::DeadTime => "mixing and cells following after an event".into(),
        StretchWhy::WarmUp => "scrubber warming up".into(),
        StretchWhy::Excluded => "marked to be left out".into(),
        StretchWhy::Short => "too short for a slope".into(),
        StretchWhy::UnmarkedJump(at_s) => format!("a jump that no event explains, at {}", clock(*at_s)),
        StretchWhy::ContentsUnknown => {
            "contents of the sealed loop unknown since a vent or a diluent add".into()
        }
        StretchWhy::InjectionUnknown => "injection unknown before its first event".into(),
        StretchWhy::NearlyPureOxygen(fraction) => {
            format!("sealed and nearly pure oxygen (a fraction of {})", fixed(*fraction, 2))
        }
        StretchWhy::NotAccounted(at_s) => {
            format!("topped, and gas went in or out without an amount, at {}", clock(*at_s))
        }
    }
}

fn stretch_left_out(stretch: &StretchLeftOut) -> String {
    format!(
        "the {} stretch {} is left out: {}",
        stretch.kept.name(),
        from_to(stretch.from_s, stretch.to_s),
        stretch_why(&stretch.why)
    )
}

/// What an unmarked jump looks like, as the event a session file calls it.
#[must_use]
pub const fn jump_event(jump: Jump) -> &'static str {
    match jump {
        Jump::OxygenAdd => "oxygen add",
        Jump::DiluentAdd => "diluent add",
    }
}

/// What was seen, and that the stretch is left out, without the event.
#[must_use]
pub fn jump_seen(proposal: &Proposal) -> String {
    let (way, what) = match proposal.looks_like {
        Jump::OxygenAdd => ("up", "oxygen"),
        Jump::DiluentAdd => ("down", "diluent"),
    };
    format!(
        "PO2 jumped {way} by {} bar at {} and no event says why, so the stretch is left out. If {what} was added then, \
         write",
        fixed(proposal.change_bar.abs(), 3),
        clock(proposal.at_s)
    )
}

/// A proposed event as lines of a session file.
#[must_use]
pub fn jump_lines(proposal: &Proposal) -> [String; 3] {
    [
        "[[events]]".to_owned(),
        format!("at = \"{}\"", clock(proposal.at_s)),
        format!("what = \"{}\"", jump_event(proposal.looks_like)),
    ]
}

fn unmarked_jump(proposal: &Proposal) -> String {
    format!("{}: {}", jump_seen(proposal), jump_lines(proposal).join(" "))
}

/// A doubt about rest as one sentence.
#[must_use]
pub fn rest(doubt: &RestDoubt, units: &Units) -> String {
    let high = "which reads high, the dangerous side";
    match doubt {
        RestDoubt::NotSaid(item) => {
            let (what, key) = rest_item(*item);
            format!("[rest] does not say {what} ({key}), so nobody can tell whether it was rest")
        }
        RestDoubt::RestedTooShort(s) => {
            format!("the diver had rested for only {}, {high}: 20 min before the first reading", span(*s))
        }
        RestDoubt::Fed(s) => {
            format!("the last meal was {} before, {high}: leave 3 h after a meal", span(*s))
        }
        RestDoubt::Exercised(s) => {
            format!("the last exercise was {} before, {high}: leave 4 h after exercise", span(*s))
        }
        RestDoubt::Dived(s) => {
            format!("the last dive was {} before, {high}: leave 12 h after a dive", span(*s))
        }
        RestDoubt::Stimulated => format!("caffeine or nicotine was taken that day, {high}: do without it"),
        RestDoubt::ColdWater(c) => format!(
            "the water was {} {} without a suit, colder than {} {}: cold makes the body burn more, {high}",
            fixed(units.temperature(*c), 1),
            units.temperature_symbol(),
            fixed(units.temperature(32.0), 0),
            units.temperature_symbol()
        ),
    }
}

/// What is not said about rest, in one sentence; none when all is.
#[must_use]
pub fn rest_not_said(items: &[RestItem], units: &Units) -> Option<String> {
    match items {
        [] => None,
        [only] => Some(rest(&RestDoubt::NotSaid(*only), units)),
        several => {
            let keys: Vec<&str> = several.iter().map(|item| rest_item(*item).1).collect();
            Some(format!(
                "[rest] does not say {}, so nobody can tell whether it was rest; what disturbs it reads high, the \
                 dangerous side",
                keys.join(", ")
            ))
        }
    }
}

const fn rest_item(item: RestItem) -> (&'static str, &'static str) {
    match item {
        RestItem::Posture => ("in which posture the diver was", "posture"),
        RestItem::RestedFor => ("for how long the diver had rested", "rested_for"),
        RestItem::LastMeal => ("when the last meal was", "last_meal"),
        RestItem::LastExercise => ("when the last exercise was", "last_exercise"),
        RestItem::LastDive => ("when the last dive was", "last_dive"),
        RestItem::CaffeineOrNicotine => ("whether caffeine or nicotine was taken", "caffeine_or_nicotine"),
        RestItem::WaterTemperature => ("how warm the water was", "water_temperature"),
        RestItem::Suit => ("what suit was worn", "suit"),
    }
}

/// Resting uptakes that most grown people have, L/min STPD: 2.0 to 4.5 mL/(kg·min) of 60 to 110 kg.
const USUAL_L_MIN: (f64, f64) = (0.12, 0.50);

/// What stands in the place of the uptake per kilogram where the mass is not known.
#[must_use]
pub fn mass_unknown(l_min: f64, units: &Units) -> String {
    let without = "no mass of the diver was given, so whether the uptake is plausible was not checked: add mass = \"82 kg\"";
    if (USUAL_L_MIN.0..=USUAL_L_MIN.1).contains(&l_min) {
        return without.to_owned();
    }
    format!(
        "{without}. {} STPD is outside what most grown people use at rest: look at flows, loop volume and reference \
         conditions before anything is set by it",
        units.flow_text(l_min)
    )
}

/// What an uptake per kilogram says.
#[must_use]
pub fn plausible(per: &PerKilogram) -> String {
    let question = "is the flow, its reference conditions, the loop volume or the mass wrong?";
    match per.plausible {
        Plausible::Usual => "usual for a resting person (2.0 to 4.5)".to_owned(),
        Plausible::Unusual => format!("unusual, where resting people use 2.0 to 4.5: {question}"),
        Plausible::Hardly => format!(
            "hardly possible at rest, where people use 2.0 to 4.5 and 1.5 to 6 at the utmost: {question} No setting \
             takes it unless somebody says on record why it is right"
        ),
    }
}

/// The same as a warning; none for a usual one.
#[must_use]
pub fn per_kilogram_warning(per: &PerKilogram) -> Option<String> {
    let doubtful = per.plausible != Plausible::Usual;
    doubtful.then(|| format!("the uptake is {} mL/(kg·min), {}", fixed(per.ml_kg_min, 1), plausible(per)))
}

/// What to do, without what it would bring.
#[must_use]
pub fn help_with(what: &HelpWith, place: Place, units: &Units) -> String {
    match what {
        HelpWith::SecondInjection { flow_l_min, minutes, .. } if *flow_l_min <= 0.0 => format!(
            "{} minutes with the injection off in the same session, PO2 brought up first so that it stays above its \
             floor of {} bar",
            fixed(*minutes, 0),
            fixed(super::cautions::po2_limits_bar(place).0, 2)
        ),
        HelpWith::SecondInjection { flow_l_min, ip_bar_gauge, minutes } => {
            let ip = ip_bar_gauge.map_or_else(String::new, |bar| {
                format!(" (IP {} {} gauge)", fixed(units.pressure(bar), 1), units.pressure_symbol())
            });
            format!(
                "{} minutes more at an injection of {} {}{ip} in the same session",
                fixed(*minutes, 0),
                figures(units.flow(*flow_l_min), 2),
                units.flow_symbol()
            )
        }
        HelpWith::MeasuredVolume { expanded_l } => {
            format!("the loop volume measured to ±{} (k = 2)", litres(*expanded_l, units))
        }
        HelpWith::LongerRest { minutes } => {
            format!("{} minutes more at the same injection", fixed(*minutes, 0))
        }
        HelpWith::AnotherDay => "the same session again on another day".into(),
        HelpWith::ComparedGauge { expanded_bar } => format!(
            "the gauge of the intermediate pressure compared with a calibrated one, to ±{} (k = 2)",
            units.pressure_text(*expanded_bar)
        ),
    }
}

/// A proposal with what it would bring; `now` are the half-widths of the uptake's and of another day's interval, L/min.
#[must_use]
pub fn help(help: &Help, now: (f64, f64), place: Place, units: &Units) -> String {
    let q = units.flow_symbol();
    let what = help_with(&help.what, place, units);
    let still = |l_min: f64| format!("±{} {q}", u_alone(units.flow(l_min)));
    let uptake = narrowed(now.0, help.half_width_l_min, units);
    let next_day = narrowed(now.1, help.next_day_half_width_l_min, units);
    match (uptake, next_day) {
        (Some(uptake), Some(next)) => {
            format!("{what} would bring {uptake} {q}, and another day's {next} {q}")
        }
        (Some(uptake), None) => {
            format!("{what} would bring {uptake} {q}, and leave another day's at {}", still(now.1))
        }
        (None, Some(next)) => {
            format!("{what} would bring another day's {next} {q}, and leave {}", still(now.0))
        }
        (None, None) => format!("{what} would leave {} and another day's {}", still(now.0), still(now.1)),
    }
}

/// "±0.018 to ±0.013", to as many figures as show the difference, up to three; none when they do not.
fn narrowed(now: f64, then: f64, units: &Units) -> Option<String> {
    let (now, then) = (units.flow(now), units.flow(then));
    let pairs = [(u_alone(now), u_alone(then)), (figures(now, 3), figures(then, 3))];
    pairs.into_iter().find(|(now, then)| now != then).map(|(now, then)| format!("±{now} to ±{then}"))
}

/// "from 00:01:30 to 00:09:00".
pub(super) fn from_to(from_s: f64, to_s: f64) -> String {
    format!("from {} to {}", clock(from_s), clock(to_s))
}

/// Litres in the unit of volumes, with its symbol.
pub(super) fn litres(litres: f64, units: &Units) -> String {
    let unit = units.unit(Kind::Volume);
    format!("{} {}", shortest(unit.from_si(litres / 1e3), 3), unit.symbol)
}

/// Metres in the unit of lengths, with its symbol.
pub(super) fn length(metres: f64, units: &Units) -> String {
    let unit = units.unit(Kind::Length);
    format!("{} {}", shortest(unit.from_si(metres), 2), unit.symbol)
}

const fn was(count: usize) -> &'static str {
    if count == 1 { "was" } else { "were" }
}
