//! The cautions, in one place; each stands where its number is read.

use crate::entry::Place;

/// Beside a line, at the bench.
pub const BENCH: [&str; 4] = [
    "The line holds for this orifice as it was tested: a filter, dirt, IP creep and gas temperature change it. \
     Check before every dive that gas flows, and prove the setting by flow on the assembled unit.",
    "The flow is constant only while the hole is choked: past the depth limit of the setting it falls, and further down \
     gas can flow back.",
    "Oxygen with oil, grease or dirt burns: oxygen-clean parts and tools, open slowly, no flame in a room that gathers \
     oxygen. A bench that has seen air is not oxygen-clean.",
    "An aid to trained people, no life-support monitor. Training, the unit's manual, the regulator maker's limits, local \
     rules and a qualified service technician come first.",
];

/// Beside a line measured with anything but oxygen.
pub const BENCH_GAS: &str = "the bench gas is not oxygen: the figures marked \"as oxygen\" are converted, and the \
    orifice is not oxygen-clean after this run; clean it before it sees oxygen";

/// Beside a setting, whatever the first stage.
pub const SETTING: [&str; 7] = [
    "Uptake at rest is the lowest there is: work asks for several times as much, and rest on another day differs. No \
     setting replaces watching PO2, on every cell, all the time.",
    "Raise PO2 before going up: it falls with the ambient pressure, and every time given here is then shorter.",
    "The flow is constant only while the hole is choked: the depths belong to the setting as much as the IP does.",
    "The line is that of the orifice on the bench: dirt, a blockage, creep of the IP and another temperature change it. \
     Before every dive, see that gas flows.",
    "An IP gauge proves nothing by itself: prove the setting by flow on the assembled unit.",
    "Oxygen with oil, grease or dirt burns: oxygen-clean parts and tools, open slowly, no flame where oxygen gathers.",
    "An aid to trained people, no life-support monitor, no dive computer. Training, the unit's manual, the regulator \
     maker's limits, local rules and a qualified service technician come first.",
];

/// Beside a setting for a first stage that does not follow depth.
pub const SETTING_UNCOMPENSATED: [&str; 2] = [
    "Below the depth where the flow stops, loop gas can flow back, and oxygen added by hand from the same first stage \
     weakens at the same depth.",
    "At each service, prove that the first stage does not follow depth: with its blank failed or fitted wrongly the IP at \
     the surface is the same, and under water it overfeeds.",
];

/// Beside a setting for a first stage that follows depth.
pub const SETTING_COMPENSATED: &str = "This first stage follows depth, so the injection grows with every metre: the \
    setting holds down to its maximum depth and no deeper, and is leanest at the surface.";

/// Beside a couch or pool session: before the next one is begun.
pub const SESSION: [&str; 6] = [
    "Oxygen in the loop sinks while one rests on it, and one faints from that unwarned: never alone. A second person \
     watches the PO2 display all the time and gives fresh gas, which lies at hand, before a floor is reached.",
    "Couch: between PO2 0.40 bar and 1.0 bar; add oxygen, or come off the loop, before either is passed.",
    "Pool: between PO2 0.60 bar and 1.3 bar, no deeper than 3 m, the second person in the water within reach.",
    "Breathe as usual, before and meanwhile: no hyperventilation, which takes away the last sign of too little oxygen.",
    "A fresh scrubber, well within its life. Headache or breathlessness may be carbon dioxide: stop, and breathe fresh \
     gas.",
    "Epilepsy, a pregnancy, an illness of heart or lungs: a physician's word first.",
];

/// While a session is logged, always in sight: short, so that it stands in one line.
pub const SESSION_LIVE: &str =
    "No life-support alarm. Never alone: the second person watches the PO2 display.";

/// With every alarm of a session that is raised.
pub const SESSION_ALARM: &str =
    "no life-support alarm: look at the diver, and at the diver's own PO2 display";

/// Beside an uptake.
pub const UPTAKE: [&str; 4] = [
    "This is the least a diver burns: any effort asks for several times as much, and rest is not the same every day. A \
     setting goes by the figure for another day, and by that alone.",
    "An injection chosen by it leaves nobody free to look away: the PO2 display is read as often as without it.",
    "PO2 drops with every metre of an ascent: bring it up before going up.",
    "An aid to trained people, neither life-support monitor nor dive computer. Training, the unit's manual, the regulator \
     maker's limits, local rules and a qualified service technician come first.",
];

/// Floor and ceiling of PO2 in a session, bar: they act while one is logged, and a record that passed them says so.
#[must_use]
pub const fn po2_limits_bar(place: Place) -> (f64, f64) {
    match place {
        Place::Couch => (0.40, 1.0),
        Place::Pool => (0.60, 1.3),
    }
}

/// No pool session deeper than this, metres.
pub const POOL_DEEPEST_M: f64 = 3.0;
