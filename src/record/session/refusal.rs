//! What only a session is refused for; the rest is in [`super::super::error`].

use super::super::error::Refusal;

/// What is refused in a session.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum SessionRefusal {
    /// Another kind of record.
    #[error("this is a {0:?} file; a session file says record = \"session\"")]
    OtherRecord(String),
    /// Both a run file and an orifice of the book.
    #[error("the line is said twice; keep line, a run file, or orifice, an entry of the book")]
    LineTwice,
    /// An intermediate pressure that nothing turns into a flow.
    #[error(
        "an injection by its intermediate pressure needs the orifice's line; name its run file, as in line = \
         \"cmf-0417.toml\", or the orifice of the book, as in orifice = \"CMF-0417\", or write the flow"
    )]
    NeedsLine,
    /// A cylinder and no loop that is topped.
    #[error(
        "a cylinder is weighed for a topped loop, and this one never is; say loop = \"topped\", here or in a \
         make-up event, or take the cylinder out"
    )]
    CylinderNotTopped,

    /// Litres counted at reference conditions that nobody stated.
    #[error("{text:?} does not say at which temperature and pressure its litres are counted; give {wanted}")]
    UnstatedLitres {
        /// The text as written.
        text: String,
        /// What is wanted in its place.
        wanted: &'static str,
    },

    /// No cell.
    #[error("no cell is named; write for example cells = [ {{ column = \"c1\", unit = \"bar\" }} ]")]
    NoCells,
    /// A unit that is neither of a pressure nor of a voltage.
    #[error("{0:?} is no unit of a cell; write \"mV\" for its voltage, or \"bar\" where the PO2 was logged")]
    CellUnit(String),
    /// Two cells of one name.
    #[error("two cells are named {0:?}; a cell is left out by its name, so give each its own")]
    SameName(String),
    /// Calibration voltages, and no cell read in volts.
    #[error("no cell is read in mV; take this out, or correct the unit of the cells")]
    NoVoltCells,
    /// A list of another length than the cells in volts.
    #[error(
        "the list holds {got} voltages, and {cells} of the cells are read in mV; give one for each, in their order"
    )]
    OnePerCell {
        /// Voltages in the list.
        got: usize,
        /// Cells read in volts.
        cells: usize,
    },
    /// No cell that shows more in oxygen than in air.
    #[error("no cell shows more in oxygen than in air; check whether air and oxygen are exchanged")]
    AirAboveOxygen,
    /// A depth far above the water.
    #[error(
        "{0} is more than a metre above the surface, which no counterlung is; check the unit and the sign"
    )]
    AboveSurface(String),
    /// Not one time in the whole column.
    #[error("no row has a time; name another time column, or fill this one")]
    NoTimes,

    /// Not a time of either form.
    #[error(
        "{0:?} is no time in a session; write what has elapsed, as in \"00:08:30\", or a time with its offset, as in \
         \"2026-11-20T18:13:30+11:00\""
    )]
    NotAMoment(String),
    /// Before the first reading.
    #[error(
        "{at:?} lies before the first reading ({first} on the time column); what was so already is written at the \
         first reading's time"
    )]
    BeforeReadings {
        /// The time as written.
        at: String,
        /// The first reading.
        first: String,
    },
    /// After the last reading.
    #[error(
        "{at:?} lies after the last reading ({last} on the time column); HH:MM:SS is what has elapsed there, and a time \
         of day is written with its date and offset"
    )]
    AfterReadings {
        /// The time as written.
        at: String,
        /// The last reading.
        last: String,
    },
    /// An exclusion that ends before it begins.
    #[error("{until:?} is before {at:?}, where the exclusion begins; exchange the two, or correct one")]
    EndsBeforeItBegins {
        /// The end as written.
        until: String,
        /// The beginning as written.
        at: String,
    },
    /// A key of another event.
    #[error("an event {what:?} has no {key}; take it out, or correct what")]
    NotOfThisEvent {
        /// What happened.
        what: &'static str,
        /// The key.
        key: &'static str,
    },
    /// An injection that says nothing.
    #[error(
        "this does not say what is injected from then on; write flow = \"0.31 L/min\" (STPD), ip = \"9.4 bar\" \
         through the line, or off = true"
    )]
    NothingInjected,
    /// An injection said twice.
    #[error("this says again what is injected; keep one of flow, ip and off")]
    InjectionTwice,
    /// No injection in the whole session.
    #[error(
        "no event says what was injected; write one with what = \"injection\" and flow or ip, and if nothing was, \
         write off = true"
    )]
    NoInjection,
    /// A word that can only be true.
    #[error("off = false says nothing; take it out, or write off = true")]
    OffIsFalse,
    /// Reference conditions of nothing.
    #[error(
        "reads_at says what a volume is meant at, and there is no volume; write it, or take reads_at out"
    )]
    ReadsAtAlone,
    /// A make-up that changes nothing.
    #[error(
        "this does not say what the make-up changed; write loop = \"held\" (sealed, topped) for how the loop is kept \
         from then on, or mark = true when it is back at the volume of the first reading"
    )]
    MakeUpOfNothing,
    /// A list of another length than two.
    #[error("a range has two ends; write them as \"20 mL/min to 60 mL/min\", or as a list of two texts")]
    NotTwoEnds,
}

impl From<SessionRefusal> for Refusal {
    fn from(refusal: SessionRefusal) -> Self {
        Self::Session(refusal)
    }
}
