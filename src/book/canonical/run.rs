//! A bench run: its header (all but the readings) and its readings.

use super::{Canonical, Reader, Unreadable, Writer, canonical_choice, canonical_struct};
use crate::entry::{
    Build, Conditions, Indication, Influence, LeftOut, PointReading, Purity, Purpose, Readings, Run,
    SeriesReadings, Sweep, TimedVolume, ZeroAndLeak,
};

canonical_choice!(Build, "build" { ThinPlate = 1, ShortTube = 2, Nozzle = 3, Unknown = 4 });
canonical_choice!(Purpose, "purpose" { Acceptance = 1, AsFound = 2, AsLeft = 3, Check = 4 });
canonical_choice!(Sweep, "sweep" { Rising = 1, Falling = 2 });
canonical_choice!(Indication, "indication" { Gauge(pressure) = 1, Absolute(pressure) = 2 });
canonical_struct!(Purity { fraction, expanded });
canonical_struct!(TimedVolume { volume, duration });
canonical_struct!(ZeroAndLeak { zero, leak_pa_s });
canonical_struct!(LeftOut { point, why });
canonical_struct!(Conditions {
    temperature,
    barometer,
    back_pressure,
    humidity,
    meter_temperature,
    meter_pressure,
    water_temperature,
});
canonical_struct!(PointReading {
    pressure,
    flow,
    timed,
    pressure_scatter,
    flow_scatter,
    averaged,
    temperature,
    barometer,
    meter_temperature,
    meter_pressure,
    sweep,
    time_s,
});
canonical_struct!(SeriesReadings {
    time_s,
    pressure_pa,
    pressure_is_absolute,
    flow_l_min,
    temperature_k,
    barometer_pa,
    meter_temperature_k,
    meter_pressure_pa,
});
canonical_choice!(Readings, "readings" { Points(points) = 1, Series(series) = 2 });

impl<T: Canonical, D: Canonical> Canonical for Influence<T, D> {
    fn write(&self, out: &mut Writer) {
        let Self { value, expanded } = self;
        value.write(out);
        expanded.write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(Self { value: Option::read(from)?, expanded: Option::read(from)? })
    }
}

/// The header of a run: its readings are in blocks of their own, and stand here as an empty list of points.
pub(in crate::book) mod header {
    use super::{Canonical, Reader, Readings, Run, Unreadable, Writer};

    /// Appends everything but the readings.
    pub(in crate::book) fn write(run: &Run, out: &mut Writer) {
        let Run {
            orifice,
            build,
            gas,
            purity,
            purpose,
            taken,
            technician,
            readings: _,
            conditions,
            before,
            after,
            meter,
            transducer,
            acceptance,
            left_out,
        } = run;
        orifice.write(out);
        build.write(out);
        gas.write(out);
        purity.write(out);
        purpose.write(out);
        taken.write(out);
        technician.write(out);
        conditions.write(out);
        before.write(out);
        after.write(out);
        meter.write(out);
        transducer.write(out);
        acceptance.write(out);
        left_out.write(out);
    }

    /// A run without readings.
    pub(in crate::book) fn read(from: &mut Reader<'_>) -> Result<Run, Unreadable> {
        Ok(Run {
            orifice: Canonical::read(from)?,
            build: Canonical::read(from)?,
            gas: Canonical::read(from)?,
            purity: Canonical::read(from)?,
            purpose: Canonical::read(from)?,
            taken: Canonical::read(from)?,
            technician: Canonical::read(from)?,
            readings: Readings::Points(Vec::new()),
            conditions: Canonical::read(from)?,
            before: Canonical::read(from)?,
            after: Canonical::read(from)?,
            meter: Canonical::read(from)?,
            transducer: Canonical::read(from)?,
            acceptance: Canonical::read(from)?,
            left_out: Canonical::read(from)?,
        })
    }
}
