//! A first stage of the register.

use super::canonical_struct;
use crate::entry::FirstStage;

canonical_struct!(FirstStage {
    id,
    compensated,
    ip_range,
    division,
    gauge_scale,
    gauge_error,
    ip_spread,
    ip_repeat,
    max_ip,
    trapped_volume,
    fall_observed,
    maker,
    serial,
});
