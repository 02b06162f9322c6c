//! The cautions, in one place; each stands where its number is read.

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
