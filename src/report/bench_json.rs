//! `bench fit --json`: the document of the interface. Keys may be added, never renamed.

use serde::Serialize;

use super::bench_fit::{Fitted, source_name};
use super::check_sentences::{name_key_unit, sentence};
use super::number::Plain;
use super::{Units, bench_fit, warning_sentences};
use crate::bench::advice::LowPoints;
use crate::bench::checks::CheckVerdict;
use crate::bench::choke::Origin;
use crate::bench::line::FlowAt;
use crate::bench::{FlowAtIp, METHOD_REVISION, Point};

/// Revision of the document.
const FORMAT: u32 = 1;

/// The document, indented, with a newline at its end.
#[must_use]
pub fn document(fitted: &Fitted<'_>) -> String {
    super::json_text(&Document::of(fitted))
}

/// The document.
#[derive(Serialize)]
pub(super) struct Document {
    format: u32,
    method: u32,
    orifice: String,
    gas: &'static str,
    line: Line,
    points: Vec<JsonPoint>,
    choke_ratio: ChokeRatio,
    sonic_conductance_dm3_s_bar: ValueU,
    effective_diameter_um: ValueU,
    flow_at: Vec<JsonFlow>,
    ip_for: Vec<JsonIp>,
    budget: Vec<BudgetRow>,
    checks: Vec<JsonCheck>,
    verdict: &'static str,
    conformity_probability: Option<Plain>,
    #[serde(skip_serializing_if = "Option::is_none")]
    acceptance: Option<JsonAcceptance>,
    #[serde(skip_serializing_if = "Option::is_none")]
    monte_carlo: Option<JsonMonteCarlo>,
    warnings: Vec<String>,
    notes: Vec<String>,
}

#[derive(Serialize)]
struct Line {
    slope_l_min_bar: Plain,
    intercept_l_min: Plain,
    slope_u: Plain,
    intercept_u: Plain,
    covariance: Plain,
    reduced_chi_square: Plain,
    points_used: usize,
    reference_temperature_c: Plain,
    random_slope_u: Plain,
    random_intercept_u: Plain,
    random_covariance: Plain,
    random_widened_by: Plain,
    random_degrees_of_freedom: Option<Plain>,
    standard_errors: &'static str,
}

#[derive(Serialize)]
struct JsonPoint {
    index: usize,
    pressure_bar_abs: Plain,
    pressure_u: Plain,
    flow_l_min: Plain,
    flow_u: Plain,
    residual_l_min: Plain,
    used: bool,
    why_not: Option<String>,
    downstream_bar_abs: Plain,
    expected_loss: Plain,
}

#[derive(Serialize)]
struct ChokeRatio {
    value: Plain,
    u: Plain,
    interval_95: [Plain; 2],
    origin: &'static str,
    model_fits: bool,
    #[serde(skip_serializing_if = "Option::is_none")]
    would_settle_at_ip_bar_gauge: Option<Vec<Plain>>,
}

#[derive(Serialize)]
struct ValueU {
    value: Plain,
    u: Plain,
}

#[derive(Serialize)]
struct JsonFlow {
    ip_bar_gauge: Plain,
    barometer_bar: Plain,
    temperature_c: Plain,
    flow_l_min: Plain,
    u: Plain,
    expanded: Plain,
    coverage_factor: Plain,
    degrees_of_freedom: Option<Plain>,
    #[serde(skip_serializing_if = "Option::is_none")]
    as_oxygen: Option<JsonConverted>,
}

#[derive(Serialize)]
struct JsonConverted {
    flow_l_min: Plain,
    u: Plain,
    expanded: Plain,
}

#[derive(Serialize)]
struct JsonIp {
    flow_l_min: Plain,
    ip_bar_gauge: Plain,
    interval_95: [Plain; 2],
}

#[derive(Serialize)]
struct BudgetRow {
    source: &'static str,
    u_l_min: Plain,
    at_ip_bar_gauge: Plain,
    degrees_of_freedom: Option<Plain>,
}

#[derive(Serialize)]
struct JsonCheck {
    check: &'static str,
    value: Option<Plain>,
    limit: Option<Plain>,
    verdict: &'static str,
    says: String,
    p_value: Option<Plain>,
    limit_key: Option<&'static str>,
    unit: Option<&'static str>,
}

#[derive(Serialize)]
struct JsonAcceptance {
    ip_bar_gauge: Plain,
    lower_l_min: Plain,
    upper_l_min: Plain,
    rule: &'static str,
    gas: &'static str,
    flow_l_min: Plain,
    u: Plain,
    expanded: Plain,
}

#[derive(Serialize)]
struct JsonMonteCarlo {
    at_ip_bar_gauge: Plain,
    trials: usize,
    failed: usize,
    seed: u64,
    generator: &'static str,
    flow_l_min: Plain,
    u: Plain,
    interval_95: [Plain; 2],
    budget_interval_95: [Plain; 2],
    agrees: bool,
}

impl Document {
    /// The document of a fitted run.
    pub(super) fn of(fitted: &Fitted<'_>) -> Self {
        let analysis = fitted.analysis;
        let units = Units::default();
        let (total, random) = (analysis.line.total(), &analysis.line.random);
        let nominal_ip = Plain(analysis.nominal.ip.as_bar());
        Self {
            format: FORMAT,
            method: METHOD_REVISION,
            orifice: fitted.run.orifice.to_string(),
            gas: fitted.run.gas.name(),
            line: Line {
                slope_l_min_bar: Plain(total.slope),
                intercept_l_min: Plain(total.intercept),
                slope_u: Plain(total.slope_u),
                intercept_u: Plain(total.intercept_u),
                covariance: Plain(total.covariance),
                reduced_chi_square: Plain(total.reduced_chi_square().unwrap_or(f64::NAN)),
                points_used: analysis.points.iter().filter(|p| p.used()).count(),
                reference_temperature_c: Plain(20.0),
                random_slope_u: Plain(random.slope_u),
                random_intercept_u: Plain(random.intercept_u),
                random_covariance: Plain(random.covariance),
                random_widened_by: Plain(analysis.line.widened.sqrt()),
                random_degrees_of_freedom: finite(analysis.line.random_dof),
                standard_errors: "ISO/TS 28037:2010, clause 7",
            },
            points: analysis.points.iter().map(JsonPoint::of).collect(),
            choke_ratio: ChokeRatio {
                value: Plain(analysis.choke.value),
                u: Plain(analysis.choke.standard_uncertainty),
                interval_95: pair(analysis.choke.interval_95),
                origin: match analysis.choke.origin {
                    Origin::Measured => "measured",
                    Origin::Bounded => "bounded",
                },
                model_fits: analysis.choke.model_fits,
                would_settle_at_ip_bar_gauge: match fitted.low_points {
                    Some(LowPoints::At(gauge)) => Some(gauge.iter().map(|g| Plain(*g)).collect()),
                    _ => None,
                },
            },
            sonic_conductance_dm3_s_bar: ValueU::of(
                analysis.sonic_conductance.unwrap_or((f64::NAN, f64::NAN)),
            ),
            effective_diameter_um: ValueU::of(analysis.effective_diameter_um.unwrap_or((f64::NAN, f64::NAN))),
            flow_at: analysis.flow_at.iter().map(JsonFlow::of).collect(),
            ip_for: analysis
                .ip_for
                .iter()
                .map(|ip| JsonIp {
                    flow_l_min: Plain(ip.flow.as_l_min()),
                    ip_bar_gauge: Plain(ip.ip_bar_gauge),
                    interval_95: pair(ip.interval_bar_gauge),
                })
                .collect(),
            budget: analysis
                .nominal
                .flow
                .parts
                .iter()
                .map(|(part, u, dof)| BudgetRow {
                    source: source_name(*part),
                    u_l_min: Plain(u.abs()),
                    at_ip_bar_gauge: nominal_ip,
                    degrees_of_freedom: finite(*dof),
                })
                .collect(),
            checks: analysis
                .checks
                .iter()
                .map(|check| {
                    let (name, limit_key, unit) = name_key_unit(check.kind);
                    JsonCheck {
                        check: name,
                        value: check.value.map(Plain),
                        limit: check.limit.map(Plain),
                        verdict: match check.verdict {
                            CheckVerdict::Pass => "pass",
                            CheckVerdict::Fail => "fail",
                            CheckVerdict::Note => "note",
                        },
                        says: sentence(check, &units),
                        p_value: check.p_value.map(Plain),
                        limit_key,
                        unit,
                    }
                })
                .collect(),
            verdict: bench_fit::verdict_name(analysis),
            conformity_probability: analysis.judgement.as_ref().map(|j| Plain(j.probability)),
            acceptance: analysis.judgement.as_ref().zip(fitted.run.acceptance.as_ref()).map(
                |(judgement, acceptance)| JsonAcceptance {
                    ip_bar_gauge: Plain(acceptance.ip.as_bar()),
                    lower_l_min: Plain(judgement.limits_l_min.0),
                    upper_l_min: Plain(judgement.limits_l_min.1),
                    rule: bench_fit::rule_name(acceptance.rule),
                    gas: judgement.gas.name(),
                    flow_l_min: Plain(judgement.flow.flow_l_min),
                    u: Plain(judgement.flow.standard_uncertainty),
                    expanded: Plain(judgement.flow.expanded()),
                },
            ),
            monte_carlo: fitted.monte_carlo.map(|m| JsonMonteCarlo {
                at_ip_bar_gauge: nominal_ip,
                trials: m.trials,
                failed: m.failed,
                seed: m.seed,
                generator: "ChaCha8",
                flow_l_min: Plain(m.mean),
                u: Plain(m.standard_uncertainty),
                interval_95: pair(m.interval_95),
                budget_interval_95: pair(m.budget_interval_95),
                agrees: m.agrees,
            }),
            warnings: analysis.warnings.iter().map(|w| warning_sentences::sentence(w, &units)).collect(),
            notes: fitted.notes.to_vec(),
        }
    }
}

impl JsonPoint {
    fn of(point: &Point) -> Self {
        Self {
            index: point.index,
            pressure_bar_abs: Plain(point.pressure_bar_abs),
            pressure_u: Plain(point.pressure_u),
            flow_l_min: Plain(point.flow_l_min),
            flow_u: Plain(point.flow_u),
            residual_l_min: Plain(point.residual_l_min),
            used: point.used(),
            why_not: bench_fit::why_not(point),
            downstream_bar_abs: Plain(point.downstream_bar_abs),
            expected_loss: Plain(point.expected_loss),
        }
    }
}

impl ValueU {
    const fn of((value, u): (f64, f64)) -> Self {
        Self { value: Plain(value), u: Plain(u) }
    }
}

impl JsonFlow {
    fn of(at: &FlowAtIp) -> Self {
        let flow = &at.flow;
        let converted = |flow: &FlowAt| JsonConverted {
            flow_l_min: Plain(flow.flow_l_min),
            u: Plain(flow.standard_uncertainty),
            expanded: Plain(flow.expanded()),
        };
        Self {
            ip_bar_gauge: Plain(at.ip.as_bar()),
            barometer_bar: Plain(at.ambient.as_bar()),
            temperature_c: Plain(20.0),
            flow_l_min: Plain(flow.flow_l_min),
            u: Plain(flow.standard_uncertainty),
            expanded: Plain(flow.expanded()),
            coverage_factor: Plain(flow.coverage_factor),
            degrees_of_freedom: finite(flow.dof),
            as_oxygen: at.as_oxygen.as_ref().map(converted),
        }
    }
}

fn finite(value: f64) -> Option<Plain> {
    value.is_finite().then_some(Plain(value))
}

const fn pair((low, high): (f64, f64)) -> [Plain; 2] {
    [Plain(low), Plain(high)]
}
