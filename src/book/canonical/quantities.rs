//! Quantities: the number each keeps inside, so that no conversion rounds.

use super::{Canonical, Reader, Unreadable, Writer, canonical_choice, canonical_struct};
use crate::gas::{Species, Water};
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, Length, Mass, PressureDifference, PressureRate,
    ReferenceConditions, Share, Span, StpdFlow, Temperature, TemperatureDifference, Uncertain, Volume,
};

macro_rules! canonical_quantity {
    ($($type:ident: $from:ident, $as:ident);+ $(;)?) => {
        $(impl Canonical for $type {
            fn write(&self, out: &mut Writer) {
                self.$as().write(out);
            }

            fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
                f64::read(from).map(Self::$from)
            }
        })+
    };
}

canonical_quantity! {
    AbsolutePressure: from_pa, as_pa;
    GaugePressure: from_pa, as_pa;
    PressureDifference: from_pa, as_pa;
    PressureRate: from_pa_s, as_pa_s;
    IndicatedFlow: from_l_min, as_l_min;
    StpdFlow: from_m3_s, as_m3_s;
    Temperature: from_k, as_k;
    TemperatureDifference: from_k, as_k;
    Length: from_m, as_m;
    Mass: from_kg, as_kg;
    Volume: from_m3, as_m3;
    Share: from_ratio, as_ratio;
    Span: from_s, as_s;
}

canonical_struct!(ReferenceConditions { temperature, pressure });
canonical_choice!(Water, "water" { Sea = 1, Fresh = 2 });
canonical_choice!(Species, "gas" { Oxygen = 1, Air = 2, Nitrogen = 3, Helium = 4 });

impl<T: Canonical, D: Canonical> Canonical for Uncertain<T, D> {
    fn write(&self, out: &mut Writer) {
        let Self { value, expanded } = self;
        value.write(out);
        expanded.write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(Self { value: T::read(from)?, expanded: Option::read(from)? })
    }
}
