//! What was heard and is no reading.

/// Bytes of what was heard that are kept with a fault.
pub const KEPT_BYTES: usize = 256;

/// Why something heard is no reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum FaultKind {
    /// A line with nothing in it.
    Empty,
    /// A line with bytes that no text has: noise, a wrong baud rate, a bit that was lost.
    Garbage,
    /// More bytes than a line has, and none of its endings.
    TooLong,
    /// The beginning of a line, and then nothing.
    HalfLine,
    /// A line the pattern does not match.
    NoMatch,
    /// The pattern takes a part of a number that goes on in the line.
    CutNumber,
    /// The group `value` holds no number.
    NotANumber,
    /// The number is NaN, infinite, or larger than a double.
    NotFinite,
    /// The line says no unit and the profile names none.
    NoUnit,
    /// The unit in the line is none that is known.
    UnknownUnit,
    /// The unit in the line hides reference conditions (sccm, slpm).
    UnstatedReference,
    /// The unit in the line is one of another kind of quantity, or marked absolute where gauge is read or the reverse.
    OtherUnit,
    /// Nothing was heard in time.
    Silence,
    /// A frame whose check sum is not that of its bytes.
    CheckSum,
    /// A whole frame of another device.
    OtherDevice,
    /// A whole frame of another function.
    OtherFunction,
    /// A frame that is longer or shorter than what was asked for.
    WrongLength,
    /// The device answered with this exception code.
    Refused(u8),
    /// A value that cannot be: a gauge pressure below a full vacuum, a temperature at or below absolute zero.
    Impossible,
    /// A value further outside the range of the papers than that range is wide, or beyond anything an instrument of
    /// this trade shows.
    OutOfRange,
}

/// Something heard that is no reading.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fault {
    /// Why it is none.
    pub kind: FaultKind,
    /// What was heard, at most [`KEPT_BYTES`] of it.
    pub bytes: Vec<u8>,
}

impl Fault {
    /// A fault with what was heard, cut.
    #[must_use]
    pub fn new(kind: FaultKind, heard: &[u8]) -> Self {
        Self { kind, bytes: heard.iter().copied().take(KEPT_BYTES).collect() }
    }
}
