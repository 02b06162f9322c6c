//! What only an entry of a register is refused for; the rest is in [`super::super::error`].

use super::number_pattern::NumberPatternFault;
use super::pattern::PatternFault;

/// What is refused in an entry of a register.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum RegisterRefusal {
    /// A file of a run or a session.
    #[error(
        "this is a {0:?} file and no entry of a register; import it, or give it where a run or session is wanted"
    )]
    NoEntry(String),
    /// A file of another register.
    #[error("this is an entry of the register {found:?}, and one of {wanted:?} is wanted; add it there")]
    OtherRegister {
        /// The register the file is for.
        found: &'static str,
        /// The register it was given to.
        wanted: &'static str,
    },
    /// Another name in an edit.
    #[error(
        "the entry is {stands:?} and keeps its name; take {given:?} out, or add it as an entry of its own"
    )]
    OtherId {
        /// The name given.
        given: String,
        /// The name that stands.
        stands: String,
    },
    /// A flag given twice, or beside one of those that say its parts.
    #[error("this flag says again what another one says; keep one of them")]
    FlagTwice,
    /// A backslash before a character that makes no escape.
    #[error("{0:?} has a backslash that makes no escape; use \\r, \\n, \\t, or \\\\ for a backslash")]
    Escape(String),

    /// Both ways to find an instrument.
    #[error("the instrument has a port and a usb; keep the one it is found by")]
    PortAndUsb,
    /// Something about a line, and no line.
    #[error(
        "an instrument with {0} is read over a line; say which with port = \"/dev/ttyUSB0\" or usb = \"0403:6001:SERIAL\""
    )]
    NoSocket(&'static str),
    /// No USB device.
    #[error("{0:?} is not a USB device; write vendor, product and serial number, as in \"0403:6001:SERIAL\"")]
    NotUsb(String),
    /// No frame of a serial line.
    #[error(
        "{0:?} is not a frame; write data bits (5 to 8), parity (N, E, O) and stop bits (1, 2), as in \"8N1\""
    )]
    NotAFrame(String),
    /// A frame that Modbus RTU has no room in.
    #[error("Modbus RTU sends eight data bits; write \"8E1\", \"8N1\" or \"8N2\" as the device is set")]
    ModbusFrame,
    /// A unit that no cell is read in.
    #[error("{0:?} is no unit of a cell; write \"mV\" for its voltage, or \"bar\" where the PO2 is sent")]
    CellUnit(String),
    /// A device whose numbers have no unit.
    #[error("the unit of the numbers it sends is missing; write for example unit = {0:?}")]
    NoUnit(&'static str),
    /// Lines whose numbers have no unit.
    #[error(
        "the unit of the numbers it sends is missing; write unit = {0:?}, or a group (?P<unit>...) in pattern"
    )]
    NoUnitInLines(&'static str),
    /// A key that belongs to another protocol.
    #[error("a {protocol} instrument has no {key}; take it out, or correct kind")]
    NotOfThisProtocol {
        /// The protocol.
        protocol: &'static str,
        /// The key.
        key: &'static str,
    },
    /// A reading that is stale before the next one is asked for.
    #[error("a reading would be stale before the next is asked for; make stale_after longer than every")]
    StaleAtOnce,
    /// A character that instruments are not asked in.
    #[error("the text holds the character U+{0:04X}; lines to and from instruments are ASCII")]
    NotAscii(u32),
    /// Nothing to send, or to end a line with.
    #[error("this is empty; write the characters that go over the line, as in \"READ?\\n\" or \"\\r\\n\"")]
    NothingToSend,
    /// A pattern that cannot be.
    #[error("{0}")]
    Pattern(#[from] PatternFault),
    /// Papers for something the instrument does not measure.
    #[error(
        "a table [{table}] goes with an instrument for {goes_with}, and this one measures {measures}; take it out"
    )]
    PapersOfOther {
        /// The table.
        table: &'static str,
        /// What it goes with.
        goes_with: &'static str,
        /// What the instrument measures.
        measures: &'static str,
    },
    /// Papers that name another instrument.
    #[error("these are the papers of {stands:?}, and id says {given:?}; take it out")]
    PapersId {
        /// The name in the papers.
        given: String,
        /// The name of the instrument.
        stands: String,
    },

    /// No colour.
    #[error("{0:?} is not a colour; write it as \"#0B6E7A\"")]
    NotAColour(String),
    /// A number pattern that makes no numbers.
    #[error("{0}")]
    Number(#[from] NumberPatternFault),
    /// A logo outside the folder.
    #[error("{0:?} is not beside this file; put the picture there and write its name alone")]
    LogoElsewhere(String),
    /// A logo of another kind.
    #[error("{0:?} ends neither in .png nor in .svg; save the logo as one of them")]
    LogoKind(String),
    /// A logo whose bytes are not what its name says.
    #[error("the file holds no {0} picture as its name says; save it again")]
    LogoBytes(&'static str),
    /// A logo that is far too large.
    #[error("the logo has more than 1 MiB; save it smaller")]
    LogoTooLarge,
    /// A signatory named twice.
    #[error("{0:?} is named twice; keep one")]
    SignatoryTwice(String),
}
