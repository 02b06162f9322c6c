//! Ebbline: from bench readings of a constant-mass-flow orifice to a line one can sign.
//!
//! A manual closed-circuit rebreather is fed oxygen through a fixed orifice; what passes at a given intermediate
//! pressure (IP), and how well one knows it, is the subject of this crate. The rooms below stand in reading order: each
//! uses only rooms above it (checked by `tests/tidy.rs`). Everything from [`quantity`] to [`plot`] is pure: no input or
//! output, no clock, no random number it was not handed. So a number can be followed from a raw reading to the sheet
//! through plain functions, and any step can be called alone.
//!
//! # Method
//!
//! 1. What was read is kept as read ([`entry`]); a logged series is first reduced to its steady spans ([`series`]).
//! 2. Each reading is corrected to absolute pressure and to flow at STPD (0 °C, 101.325 kPa, dry), for gas of 20 °C at the
//!    orifice ([`bench::correct`]). A meter without reference conditions is refused: there is no default.
//! 3. What differs from point to point (noise, resolution, scatter) is the *random* part and goes into the fit. What moves
//!    all points together (gains, zeros, barometer, temperatures) is the *common* part and never does.
//! 4. Points that are not choked are found with the choke ratio that the run itself supports ([`bench::choke`]) and left
//!    out of the line.
//! 5. The line `q = α + β·p1` is fitted with uncertainties in both variables (ISO/TS 28037:2010, clause 7:
//!    [`stats::line`]). A reduced chi-squared above 1 widens the random part.
//! 6. Correction and fit are repeated with each common source moved by plus and minus its standard uncertainty; half the
//!    difference is its row in the budget ([`bench::line`]; JCGM 100:2008, 5.1.3). Effective degrees of freedom and the
//!    factor for 95 % follow (G.4).
//! 7. Checks ask whether the run deserves its line: choked, straight, the same up and down, repeatable, steady, through
//!    zero, without outliers, the same as last time, instruments in order ([`bench::checks`]).
//! 8. The flow at the nominal IP is judged against the acceptance by a simple or a guarded rule ([`stats::conformity`]).
//! 9. On demand the whole chain is drawn again by Monte Carlo (JCGM 101:2008: [`bench::monte_carlo`]) as a check on 6.
//!
//! # Limits
//!
//! Left out on purpose, beside what each room's own page names:
//!
//! - A setting ([`setting`]) is for rest on a day like those measured; it never replaces watching PO2.
//! - The line holds between the lowest and the highest point, for the orifice as tested, while the hole is choked.
//! - Correlation between sources is not modelled: two instruments calibrated against one standard would need it.
//! - Litres STPD are ideal-gas litres; the real gas enters in the critical flow function alone.
//! - The transition from choked to subsonic flow has one shape, the ellipse of ISO 6358, and the discharge coefficient one
//!   law, `1 − k/√Re`. Neither was measured on holes of 50 to 120 µm in any source at hand.
//! - Drift of an instrument since its calibration shows only in zero, leak and the next run.
//!
//! # Conformance
//!
//! ISO/TS 28037:2010 clauses 6, 7, 10 and 11 and JCGM 100, 101 and 106 are followed, each held to the standard's own worked
//! examples; the standard errors of a line are those of clause 7, wherever one is printed. Clauses 8 and 9, and the adaptive
//! Monte Carlo procedure, are absent. `DEVELOPERS.md` lists the clauses one by one, and every reason to doubt.

pub mod quantity;
pub mod gas;
pub mod stats;
pub mod entry;
pub mod series;
pub mod bench;
pub mod uptake;
pub mod setting;
pub mod report;
pub mod plot;
pub mod clock;
pub mod record;
pub mod book;
pub mod instrument;
pub mod rig;
pub mod logger;
pub mod certificate;
pub mod work;
pub mod cli;
