//! A decision about a run and the figures it rests on.

use super::{canonical_choice, canonical_struct};
use crate::entry::{Decision, StoredFigures, StoredPart, StoredVerdict};

canonical_choice!(StoredVerdict, "verdict" { Pass = 1, Fail = 2, Undecided = 3, None = 4 });
canonical_struct!(StoredPart { source, u_l_min, dof });
canonical_struct!(StoredFigures {
    method_revision,
    gas,
    ip,
    p1_bar,
    flow_l_min,
    standard_uncertainty_l_min,
    dof,
    coverage_factor,
    parts,
    limits_l_min,
    conformity_probability,
    failed_checks,
    points_used,
    meter_certificate,
    transducer_certificate,
    against,
});
canonical_struct!(Decision { verdict, figures, at, by, remark });
