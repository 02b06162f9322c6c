//! What the papers of an instrument say.

use super::{Canonical, Reader, Unreadable, Writer, canonical_choice, canonical_struct};
use crate::entry::{Amount, FloatScale, Meter, MeterKind, Papers, Transducer};

impl<D: Canonical> Canonical for Amount<D> {
    fn write(&self, out: &mut Writer) {
        match self {
            Self::OfReading(share) => {
                out.raw(&[1]);
                share.write(out);
            }
            Self::Fixed(amount) => {
                out.raw(&[2]);
                amount.write(out);
            }
        }
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        match u8::read(from)? {
            1 => Ok(Self::OfReading(f64::read(from)?)),
            2 => Ok(Self::Fixed(D::read(from)?)),
            other => Err(Unreadable::Choice(u32::from(other), "amount")),
        }
    }
}

impl<D: Canonical, R: Canonical> Canonical for Papers<D, R> {
    fn write(&self, out: &mut Writer) {
        let Self { gain, zero, noise, resolution, coverage, range, certificate, due } = self;
        gain.write(out);
        zero.write(out);
        noise.write(out);
        resolution.write(out);
        coverage.write(out);
        range.write(out);
        certificate.write(out);
        due.write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(Self {
            gain: Option::read(from)?,
            zero: Option::read(from)?,
            noise: Option::read(from)?,
            resolution: Option::read(from)?,
            coverage: f64::read(from)?,
            range: Option::read(from)?,
            certificate: Option::read(from)?,
            due: Option::read(from)?,
        })
    }
}

canonical_choice!(FloatScale, "scale" { Actual = 1, Reference = 2 });
canonical_choice!(MeterKind, "meter" {
    Mass { reads_at, made_for, gas_factor } = 1,
    Volumetric { wet } = 2,
    Timed { wet } = 3,
    Float { reads_at, made_for, scale, made_at, gas_factor } = 4,
});
canonical_struct!(Meter { id, kind, papers });
canonical_struct!(Transducer { id, papers });
