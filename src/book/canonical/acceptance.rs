//! The limits an orifice is accepted by.

use super::{canonical_choice, canonical_struct};
use crate::entry::{Acceptance, Limits, Rule, Tolerance};

canonical_choice!(Tolerance, "tolerance" { Relative(share) = 1, Flow(flow) = 2 });
canonical_choice!(Rule, "rule" { Simple = 1, Guarded = 2 });
canonical_struct!(Limits { straight, hysteresis, repeat, steady, significance, crossing_pa, en, leak_pa_s });
canonical_struct!(Acceptance { id, ip, flow, gas, tolerance, rule, limits });
