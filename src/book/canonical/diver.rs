//! A diver of the register.

use super::{canonical_choice, canonical_struct};
use crate::entry::{Diluent, Diver};

canonical_choice!(Diluent, "diluent" { Air = 1, Oxygen(share) = 2 });
canonical_struct!(Diver { id, name, mass, loop_volume, diluent });
