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
