//! What instruments said while a run or a session was logged.

use super::{Bytes, Canonical, Reader, Unreadable, Writer, canonical_choice, canonical_struct};
use crate::entry::{LiveNote, LiveNoteKind, LivePoint, LiveReadings, LoggingBegun};

canonical_choice!(LiveNoteKind, "note" {
    Fault = 1,
    Connected = 2,
    Lost = 3,
    Stale = 4,
    Fresh = 5,
    Frozen = 6,
    Thawed = 7,
    ClockBack = 8,
    AlarmRaised = 9,
    AlarmCleared = 10,
});
canonical_struct!(LiveReadings { instrument, unit, at_s, shown });
canonical_struct!(LivePoint { reading, span_s, by_itself });
canonical_struct!(LoggingBegun { at_s, instruments });

impl Canonical for LiveNote {
    fn write(&self, out: &mut Writer) {
        let Self { instrument, at_s, kind, says, bytes } = self;
        instrument.write(out);
        at_s.write(out);
        kind.write(out);
        says.write(out);
        out.length(bytes.len());
        out.raw(bytes);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(Self {
            instrument: Canonical::read(from)?,
            at_s: Canonical::read(from)?,
            kind: Canonical::read(from)?,
            says: Canonical::read(from)?,
            bytes: Bytes::read(from)?.0,
        })
    }
}
