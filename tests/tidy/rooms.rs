//! The rooms of `src/`, in reading order, and which rooms each may name.
//!
//! This is the one place where the arrows are written down. A room may use the rooms above it and none below; some
//! rooms are held to less than that, each with its reason.

/// Whether a room may touch the world.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Kind {
    /// Values in, values out: no file, network, environment, clock, terminal, or chance of its own.
    Pure,
    /// Input and output live here.
    World,
}

/// What a room may name of the rooms above it.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Uses {
    /// All of them.
    AllAbove,
    /// These only; `room::Item` allows that item alone.
    Only(&'static [&'static str]),
}

/// A room.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Room {
    pub name: &'static str,
    pub kind: Kind,
    pub uses: Uses,
}

const fn room(name: &'static str, kind: Kind, uses: Uses) -> Room {
    Room { name, kind, uses }
}

/// Reading order; rooms that are not built yet keep their place.
pub(crate) const ROOMS: &[Room] = &[
    room("quantity", Kind::Pure, Uses::AllAbove),
    room("gas", Kind::Pure, Uses::AllAbove),
    // Knows no gas, no orifice and no unit: plain numbers in and out.
    room("stats", Kind::Pure, Uses::Only(&[])),
    // Plain data without formulas; which gas and which water it was is data, their laws are not.
    room("entry", Kind::Pure, Uses::Only(&["quantity", "gas::Species", "gas::Water"])),
    room("series", Kind::Pure, Uses::AllAbove),
    room("bench", Kind::Pure, Uses::AllAbove),
    room("uptake", Kind::Pure, Uses::AllAbove),
    room("setting", Kind::Pure, Uses::AllAbove),
    room("report", Kind::Pure, Uses::AllAbove),
    room("plot", Kind::Pure, Uses::AllAbove),
    room("clock", Kind::World, Uses::AllAbove),
    // Files to entries and back: reading a file computes nothing. `Species` and `Water` as in `entry`.
    room("record", Kind::World, Uses::Only(&["quantity", "gas::Species", "gas::Water", "entry", "clock"])),
    // Rows to entries and back; `Species` and `Water` as in `entry`.
    room(
        "book",
        Kind::World,
        Uses::Only(&["quantity", "gas::Species", "gas::Water", "entry", "series", "clock", "record"]),
    ),
    room("instrument", Kind::World, Uses::AllAbove),
    room("rig", Kind::World, Uses::AllAbove),
    room("logger", Kind::World, Uses::AllAbove),
    room("certificate", Kind::World, Uses::AllAbove),
    room("work", Kind::World, Uses::AllAbove),
    // The two faces compute nothing: they ask `work`, and show what `report` and `plot` made of the answer.
    room("page", Kind::World, Uses::Only(&["work", "report", "plot", "quantity", "entry"])),
    room("cli", Kind::World, Uses::Only(&["work", "report", "plot", "quantity", "entry", "page"])),
];

/// The room of that name.
pub(crate) fn find(name: &str) -> Option<&'static Room> {
    ROOMS.iter().find(|room| room.name == name)
}

/// Whether code in `from` may name `item` of the room `to`; an item is empty when the room itself is brought in.
pub(crate) fn allowed(from: &str, to: &str, item: &str) -> bool {
    let place = |name: &str| ROOMS.iter().position(|room| room.name == name);
    let (Some(here), Some(there)) = (place(from), place(to)) else { return false };
    if here == there {
        return true;
    }
    there < here
        && match ROOMS[here].uses {
            Uses::AllAbove => true,
            Uses::Only(these) => these.iter().any(|rule| match rule.split_once("::") {
                None => *rule == to,
                Some((room, only)) => room == to && only == item,
            }),
        }
}
