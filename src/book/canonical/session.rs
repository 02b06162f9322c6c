//! A session: its header (all but the numbers of its columns), a block of those columns, and what was left out of it.

use std::borrow::Cow;

use super::{Canonical, Reader, Unreadable, Writer, canonical_choice, canonical_struct};
use crate::entry::{
    Assumptions, CalibratedAt, CellPapers, CellReadings, CellSignal, Cylinder, Event, Feeds, Injection,
    LeakTest, LineReference, LoopKept, Metered, Place, Rest, Session, SessionConditions, SessionLeftOut,
    SessionNumber, SessionReadings, What,
};

canonical_choice!(Place, "place" { Couch = 1, Pool = 2 });
canonical_choice!(LoopKept, "loop" { Sealed = 1, Held = 2, Topped = 3 });
canonical_choice!(LeakTest, "leak test" { Passed = 1, Measured(leak) = 2, NotDone = 3 });
canonical_choice!(LineReference, "line" { RunFile(name) = 1, Orifice(id) = 2 });
canonical_struct!(SessionConditions {
    barometer,
    depth,
    water,
    loop_temperature,
    time_on_loop,
    scrubber_warm,
});
canonical_struct!(CalibratedAt { barometer, temperature, humidity, oxygen });
canonical_struct!(CellPapers { gain, calibrated_at });
canonical_struct!(Rest {
    posture,
    rested_for,
    last_meal,
    last_exercise,
    last_dive,
    caffeine_or_nicotine,
    water_temperature,
    suit,
});
canonical_struct!(Metered { volume, reads_at });
canonical_choice!(Injection, "injection" { Off = 1, Flow(flow) = 2, Ip(ip) = 3 });
canonical_choice!(What, "event" {
    Injection(injection) = 1,
    OxygenAdd(metered) = 2,
    DiluentAdd(metered) = 3,
    Vent(metered) = 4,
    MakeUp { kept, mark } = 5,
    Exclude { until_s } = 6,
    Stop = 7,
});
canonical_struct!(Event { at_s, what });
canonical_choice!(Feeds, "what a cylinder feeds" { All = 1, Adds = 2 });
canonical_struct!(Cylinder { volume, from, from_temperature, to, to_temperature, feeds });
canonical_struct!(Assumptions {
    dead_time,
    warm_up,
    lung_share,
    lung_carbon_dioxide,
    washout,
    washout_time,
    sealed_fraction,
    sealed_wait,
    wander,
    least_wander,
    wander_time,
    leak,
    day_spread,
    day_spread_weight,
    cell_limit,
    cell_faults,
    cell_gain,
    flush,
    depth_drift,
    ip_gauge,
    flow,
    metered,
    gas_temperature,
    loop_volume,
    mark,
    average_over,
    least_usable,
});
canonical_struct!(SessionLeftOut { stretch_s, why, by, at });

impl Canonical for SessionNumber {
    fn write(&self, out: &mut Writer) {
        self.get().write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Self::new(u32::read(from)?).ok_or(Unreadable::Choice(0, "a session's number"))
    }
}

/// A piece of a column: as a list of floats, but taken in one step, for there may be millions.
impl Canonical for Cow<'_, [f64]> {
    fn write(&self, out: &mut Writer) {
        out.length(self.len());
        for value in self.iter() {
            value.write(out);
        }
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        let bytes = from.length()?.checked_mul(size_of::<f64>()).ok_or(Unreadable::Ends)?;
        let (values, _) = from.take(bytes)?.as_chunks();
        Ok(Cow::Owned(values.iter().map(|bits| f64::from_bits(u64::from_le_bytes(*bits))).collect()))
    }
}

/// A piece of a file.
impl Canonical for Cow<'_, [u8]> {
    fn write(&self, out: &mut Writer) {
        out.length(self.len());
        out.raw(self);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        let length = from.length()?;
        Ok(Cow::Owned(from.take(length)?.to_vec()))
    }
}

/// What columns there are; the numbers in them are in blocks of their own.
mod shape {
    use super::{Canonical, CellReadings, CellSignal, Reader, SessionReadings, Unreadable, Writer};

    pub(super) fn write(readings: &SessionReadings, out: &mut Writer) {
        let SessionReadings { time_s: _, cells, depth_m, loop_temperature_k } = readings;
        out.length(cells.len());
        for CellReadings { name, signal } in cells {
            name.write(out);
            match signal {
                CellSignal::Bar(_) => out.raw(&[1]),
                CellSignal::Volts { readings: _, in_air, in_oxygen } => {
                    out.raw(&[2]);
                    in_air.write(out);
                    in_oxygen.write(out);
                }
            }
        }
        depth_m.is_some().write(out);
        loop_temperature_k.is_some().write(out);
    }

    pub(super) fn read(from: &mut Reader<'_>) -> Result<SessionReadings, Unreadable> {
        let mut cells = Vec::new();
        for _ in 0..from.length()? {
            let name = Canonical::read(from)?;
            let signal = match u8::read(from)? {
                1 => CellSignal::Bar(Vec::new()),
                2 => CellSignal::Volts {
                    readings: Vec::new(),
                    in_air: Canonical::read(from)?,
                    in_oxygen: Canonical::read(from)?,
                },
                other => return Err(Unreadable::Choice(u32::from(other), "signal of a cell")),
            };
            cells.push(CellReadings { name, signal });
        }
        let depth_m = bool::read(from)?.then(Vec::new);
        let loop_temperature_k = bool::read(from)?.then(Vec::new);
        Ok(SessionReadings { time_s: Vec::new(), cells, depth_m, loop_temperature_k })
    }
}

/// The header of a session: everything but the numbers of its columns.
pub(in crate::book) mod session_header {
    use super::{Canonical, Reader, Session, Unreadable, Writer, shape};

    /// Appends everything but the numbers of the columns.
    pub(in crate::book) fn write(session: &Session, out: &mut Writer) {
        let Session {
            diver,
            mass,
            place,
            kept,
            diluent,
            loop_volume,
            leak_test,
            nose_clip,
            oxygen,
            taken,
            readings,
            line,
            conditions,
            cells,
            rest,
            assumptions,
            events,
            cylinder,
        } = session;
        diver.write(out);
        mass.write(out);
        place.write(out);
        kept.write(out);
        diluent.write(out);
        loop_volume.write(out);
        leak_test.write(out);
        nose_clip.write(out);
        oxygen.write(out);
        taken.write(out);
        shape::write(readings, out);
        line.write(out);
        conditions.write(out);
        cells.write(out);
        rest.write(out);
        assumptions.write(out);
        events.write(out);
        cylinder.write(out);
    }

    /// A session whose columns are empty.
    pub(in crate::book) fn read(from: &mut Reader<'_>) -> Result<Session, Unreadable> {
        Ok(Session {
            diver: Canonical::read(from)?,
            mass: Canonical::read(from)?,
            place: Canonical::read(from)?,
            kept: Canonical::read(from)?,
            diluent: Canonical::read(from)?,
            loop_volume: Canonical::read(from)?,
            leak_test: Canonical::read(from)?,
            nose_clip: Canonical::read(from)?,
            oxygen: Canonical::read(from)?,
            taken: Canonical::read(from)?,
            readings: shape::read(from)?,
            line: Canonical::read(from)?,
            conditions: Canonical::read(from)?,
            cells: Canonical::read(from)?,
            rest: Canonical::read(from)?,
            assumptions: Canonical::read(from)?,
            events: Canonical::read(from)?,
            cylinder: Canonical::read(from)?,
        })
    }
}
