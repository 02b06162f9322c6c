//! An orifice of the register.

use super::canonical_struct;
use crate::entry::Orifice;

canonical_struct!(Orifice {
    id,
    description,
    serial,
    maker,
    customer,
    build,
    length,
    nominal_diameter,
    acceptance,
});
