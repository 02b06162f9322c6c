//! A run and its analysis to the tables of a certificate.
//!
//! Symbols as in `bench`: the line is `q = α + β·p1`, q in L/min STPD for gas of 20 °C, p1 in bar absolute.

use super::calibration::{
    Budget, BudgetRow, Calibration, CheckRow, Choke, Comparison, Conformity, Hole, LineFigures, PointRow, Row,
};
use super::figure::{Figure, NoUncertainty, Reference, Uncertainty, Unit, decimals_of_figures};
use super::issue::Measured;
use super::{surroundings, words};
use crate::bench::checks::{Check, CheckKind, CheckVerdict, Finding};
use crate::bench::choke::Origin;
use crate::bench::history::{Accepted, compare};
use crate::bench::line::{COVERAGE_PROBABILITY, FlowAt};
use crate::bench::{FlowAtIp, Point, Verdict, of_gas};
use crate::entry::{Limits, Rule, Sweep};
use crate::gas::Species;
use crate::plot::{RunPlot, run_plot};
use crate::quantity::AbsolutePressure;
use crate::report::Units;
use crate::report::bench_fit::{Fitted, rule_name, source_name, verdict_line, verdict_name, why_not};
use crate::report::check_sentences::{name_key_unit, sentence};
use crate::report::number::{figures, probability};
use crate::report::warning_sentences;
use crate::stats::coverage::{coverage_factor, welch_satterthwaite};

/// Step of the table of flows, bar gauge; twice that over a span of more than [`WIDE_SPAN_BAR`].
const STEP_BAR: f64 = 0.5;
const WIDE_SPAN_BAR: f64 = 12.0;
/// Most rows of the table, for a bench of absurd reach.
const MOST_ROWS: u32 = 200;
/// Height of the drawing, so that it stays on the first page of either paper.
const PLOT_HEIGHT: u32 = 600;
/// Significant figures of a covariance: enough to propagate it without loss.
const COVARIANCE_FIGURES: i32 = 6;

/// Everything of one run; `path` and `title` say which of the two of a certificate it is.
pub(super) fn calibration(path: &'static str, title: &'static str, measured: &Measured<'_>) -> Calibration {
    let (run, analysis) = (measured.run, measured.analysis);
    let nominal = row(&format!("{path}/nominal"), run.gas, &analysis.nominal);
    let fitted = Fitted { run, analysis, monte_carlo: None, low_points: None, notes: &[] };
    let units = Units::default();
    let conformity = conformity(path, measured, &fitted);
    let used = analysis.points.iter().filter(|p| p.used()).count();
    Calibration {
        path,
        title,
        run: measured.name.to_owned(),
        orifice: run.orifice.to_string(),
        purpose: run.purpose,
        taken: run.taken,
        technician: run.technician.clone(),
        gas: words::gas(run),
        gas_of_result: run.gas.name(),
        headline: words::headline(run, &nominal),
        line: line(path, measured),
        hole: hole(path, measured),
        points: analysis.points.iter().map(|point| point_row(path, point)).collect(),
        table: table(path, measured),
        budget: budget(path, &analysis.nominal.flow),
        checks: checks(path, measured, &units),
        before: before(path, measured, &units),
        equipment: surroundings::equipment(path, run),
        conditions: surroundings::conditions(path, run, analysis),
        warnings: analysis.warnings.iter().map(|w| warning_sentences::sentence(w, &units)).collect(),
        plot: run_plot(
            run,
            analysis,
            &RunPlot { transparent: true, height: PLOT_HEIGHT, ..RunPlot::default() },
        ),
        plot_says: format!(
            "Flow of {} against absolute pressure: {used} of {} points, the fitted line with its 95 % band, and the \
             residuals; flow at {} bar IP {}.",
            run.gas.name(),
            analysis.points.len(),
            nominal.ip.printed(),
            nominal.flow.text()
        ),
        nominal,
        conformity,
    }
}

fn flow_figure(path: String, name: impl Into<String>, flow: &FlowAt) -> Figure {
    Figure::measured(
        path,
        name,
        (flow.flow_l_min, flow.expanded(), flow.coverage_factor),
        Unit::LitrePerMinute,
    )
    .at(Reference::StpdAtStandardAmbient)
}

fn row(path: &str, gas: Species, at: &FlowAtIp) -> Row {
    let ip = Figure::stated(format!("{path}/ip"), "intermediate pressure", at.ip.as_bar(), Unit::Bar);
    Row {
        // To a tenth at least, as in the table of flows.
        ip: Figure { decimals: ip.decimals.max(1), ..ip }.at(Reference::GaugeAtStandardAmbient),
        flow: flow_figure(format!("{path}/flow"), format!("flow of {}", gas.name()), &at.flow),
        as_oxygen: at
            .as_oxygen
            .as_ref()
            .map(|flow| flow_figure(format!("{path}/as_oxygen"), "flow as oxygen", flow)),
    }
}

/// The flow over the pressures that the points reach.
fn table(path: &str, measured: &Measured<'_>) -> Vec<Row> {
    let (run, analysis) = (measured.run, measured.analysis);
    let standard = AbsolutePressure::STANDARD_ATMOSPHERE.as_bar();
    let (low, high) = span(&analysis.points);
    let (low, high) = (low - standard, high - standard);
    if !(low.is_finite() && high.is_finite()) {
        return Vec::new();
    }
    let step = if high - low > WIDE_SPAN_BAR { 2.0 * STEP_BAR } else { STEP_BAR };
    // A point set to 4 bar reads 3.997: the row at 4 belongs to the range.
    let within = 0.1 * step;
    let first = ((low - within) / step).ceil();
    (0..MOST_ROWS)
        .map(|i| (first + f64::from(i)) * step)
        .take_while(|ip| *ip <= high + within)
        .enumerate()
        .map(|(i, ip_bar)| {
            let path = |key: &str| format!("{path}/flow_at/{key}/{}", i + 1);
            let flow = analysis.line.flow_at(ip_bar + standard);
            let name = format!("flow of {} at {} bar IP", run.gas.name(), figures_of(ip_bar));
            Row {
                ip: Figure::plain(
                    path("ip"),
                    "intermediate pressure",
                    ip_bar,
                    Unit::Bar,
                    1,
                    NoUncertainty::Stated,
                )
                .at(Reference::GaugeAtStandardAmbient),
                as_oxygen: (run.gas != Species::Oxygen).then(|| {
                    let oxygen = of_gas(&flow, run.gas, Species::Oxygen);
                    flow_figure(path("as_oxygen"), format!("{name}, as oxygen"), &oxygen)
                }),
                flow: flow_figure(path("flow"), name, &flow),
            }
        })
        .collect()
}

fn figures_of(bar: f64) -> String {
    crate::report::number::fixed(bar, 1)
}

/// Lowest and highest pressure of the points in use, bar absolute.
fn span(points: &[Point]) -> (f64, f64) {
    let used = points.iter().filter(|p| p.used()).map(|p| p.pressure_bar_abs);
    used.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), p| (low.min(p), high.max(p)))
}

fn line(path: &str, measured: &Measured<'_>) -> LineFigures {
    let analysis = measured.analysis;
    let (line, total) = (&analysis.line, analysis.line.total());
    let path = |key: &str| format!("{path}/line/{key}");
    // The intercept is the flow the line has at no pressure.
    let intercept = line.flow_at(0.0);
    let slope_k = slope_coverage_factor(measured);
    let (low, high) = span(&analysis.points);
    let covariance = |key: &str, name: &str, value: f64, unit| {
        let decimals = decimals_of_figures(value, COVARIANCE_FIGURES);
        Figure::plain(path(key), name, value, unit, decimals, NoUncertainty::OfAnUncertainty)
            .at(Reference::Stpd)
    };
    let end = |key: &str, name: &str, value: f64| {
        Figure::plain(path(key), name, value, Unit::Bar, 2, NoUncertainty::Descriptive)
            .at(Reference::Absolute)
    };
    LineFigures {
        intercept: Figure::measured(
            path("intercept"),
            "intercept α",
            (total.intercept, intercept.expanded(), intercept.coverage_factor),
            Unit::LitrePerMinute,
        )
        .at(Reference::Stpd),
        slope: Figure::measured(
            path("slope"),
            "slope β",
            (total.slope, slope_k * total.slope_u, slope_k),
            Unit::LitrePerMinuteBar,
        )
        .at(Reference::Stpd),
        covariance: [
            covariance(
                "intercept_variance",
                "variance of α",
                total.intercept_u * total.intercept_u,
                Unit::FlowSquared,
            ),
            covariance("covariance", "covariance of α and β", total.covariance, Unit::FlowSquaredPerBar),
            covariance(
                "slope_variance",
                "variance of β",
                total.slope_u * total.slope_u,
                Unit::FlowSquaredPerBarSquared,
            ),
        ],
        span: [end("from", "lowest point of the line", low), end("to", "highest point of the line", high)],
        reduced_chi_square: total.reduced_chi_square().map(|value| {
            Figure::descriptive(path("reduced_chi_square"), "reduced chi-squared", value, Unit::One, 3)
        }),
        used_of: (analysis.points.iter().filter(|p| p.used()).count(), analysis.points.len()),
        says: words::line(&analysis.line),
    }
}

/// Coverage factor of the slope, from the degrees of freedom of its parts.
fn slope_coverage_factor(measured: &Measured<'_>) -> f64 {
    let line = &measured.analysis.line;
    let random = (line.random.slope_u, line.random_dof);
    let common = line.common.iter().map(|c| (c.slope.abs(), f64::INFINITY));
    coverage_factor(COVERAGE_PROBABILITY, welch_satterthwaite(std::iter::once(random).chain(common)))
}

fn hole(path: &str, measured: &Measured<'_>) -> Hole {
    let analysis = measured.analysis;
    // Both go with the slope alone, so they are known to as many degrees of freedom.
    let k = slope_coverage_factor(measured);
    let choke = &analysis.choke;
    let (says, decimals) = match choke.origin {
        Origin::Measured => ("measured by the points of this run", 3),
        Origin::Bounded => ("not measured: the points of this run only bound it", 2),
    };
    Hole {
        choke: Choke {
            figure: Figure {
                path: format!("{path}/hole/choke_ratio"),
                name: "choke ratio b".to_owned(),
                value: choke.value,
                unit: Unit::One,
                reference: None,
                uncertainty: Uncertainty::Interval {
                    standard: choke.standard_uncertainty,
                    low: choke.interval_95.0,
                    high: choke.interval_95.1,
                    p: COVERAGE_PROBABILITY,
                },
                decimals,
            },
            says,
        },
        conductance: analysis.sonic_conductance.map(|(value, u)| {
            let name = "sonic conductance C";
            Figure::measured(
                format!("{path}/hole/conductance"),
                name,
                (value, k * u, k),
                Unit::LitrePerSecondBar,
            )
            .at(Reference::Anr)
        }),
        diameter: analysis.effective_diameter_um.map(|(value, u)| {
            let name = "effective diameter, discharge coefficient 1";
            Figure::measured(format!("{path}/hole/diameter"), name, (value, k * u, k), Unit::MicroMetre)
        }),
    }
}

fn point_row(path: &str, point: &Point) -> PointRow {
    let n = point.index;
    let (k, p) = surroundings::k_and_p_of_points();
    let figure = |key: &str, name: &str, value: f64, u: f64, unit, reference| {
        let path = format!("{path}/points/{key}/{n}");
        let mut figure =
            Figure::measured(path, format!("{name} of point {n}"), (value, k * u, k), unit).at(reference);
        if let Uncertainty::Expanded { expanded, .. } = figure.uncertainty {
            figure.uncertainty = Uncertainty::Expanded { expanded, k, p };
        }
        figure
    };
    let residual = point.residual_l_min / (point.flow_l_min - point.residual_l_min) * 100.0;
    PointRow {
        number: n,
        pressure: figure(
            "pressure",
            "pressure",
            point.pressure_bar_abs,
            point.pressure_u,
            Unit::Bar,
            Reference::Absolute,
        ),
        flow: figure("flow", "flow", point.flow_l_min, point.flow_u, Unit::LitrePerMinute, Reference::Stpd),
        residual: residual.is_finite().then(|| {
            Figure::plain(
                format!("{path}/points/residual/{n}"),
                format!("residual of point {n}"),
                residual,
                Unit::Percent,
                2,
                NoUncertainty::Descriptive,
            )
        }),
        sweep: point.sweep.map(|sweep| match sweep {
            Sweep::Rising => "rising",
            Sweep::Falling => "falling",
        }),
        why_not: why_not(point),
    }
}

fn budget(path: &str, flow: &FlowAt) -> Budget {
    let total = flow.standard_uncertainty;
    let row = |key: String, source: &'static str, u: f64, dof: f64| {
        // What two steps of the arithmetic leave of nothing is nothing.
        let u = if u.abs() < 1e-9 * total { 0.0 } else { u.abs() };
        let share = u * u / (total * total) * 100.0;
        let path = |what: &str| format!("{path}/budget/{key}/{what}");
        BudgetRow {
            source,
            u: Figure::of_uncertainty(
                path("u"),
                format!("contribution of {source}"),
                u,
                Unit::LitrePerMinute,
            ),
            share: Figure::plain(
                path("share"),
                format!("share of {source}"),
                if share.is_finite() { share } else { 0.0 },
                Unit::Percent,
                1,
                NoUncertainty::OfAnUncertainty,
            ),
            dof: dof.is_finite().then(|| {
                Figure::plain(
                    path("dof"),
                    format!("degrees of freedom of {source}"),
                    dof,
                    Unit::One,
                    0,
                    NoUncertainty::OfAnUncertainty,
                )
            }),
        }
    };
    let mut parts = flow.parts.clone();
    parts.sort_by(|a, b| b.1.abs().total_cmp(&a.1.abs()));
    Budget {
        rows: parts
            .iter()
            .enumerate()
            .map(|(i, (part, u, dof))| row((i + 1).to_string(), source_name(*part), *u, *dof))
            .collect(),
        combined: row("combined".to_owned(), "combined", total, flow.dof),
    }
}

fn checks(path: &str, measured: &Measured<'_>, units: &Units) -> Vec<CheckRow> {
    let limits = measured.run.acceptance.as_ref().map_or(Limits::DEFAULT, |a| a.limits);
    measured.analysis.checks.iter().map(|check| check_row(path, check, &limits, units)).collect()
}

fn check_row(path: &str, check: &Check, limits: &Limits, units: &Units) -> CheckRow {
    let name = name_key_unit(check.kind).0;
    let (key, unit, scale) = match check.kind {
        CheckKind::Choked => ("choked", Unit::Percent, 100.0),
        CheckKind::Straight => ("straight", Unit::Percent, 100.0),
        CheckKind::Hysteresis => ("hysteresis", Unit::Percent, 100.0),
        CheckKind::Repeatable => ("repeatable", Unit::Percent, 100.0),
        CheckKind::Steady => ("steady", Unit::Percent, 100.0),
        CheckKind::ThroughZero => ("through_zero", Unit::KiloPascal, 1.0),
        CheckKind::Outlier => ("outlier", Unit::One, 1.0),
        CheckKind::SameAsBefore => ("same_as_before", Unit::One, 1.0),
        CheckKind::Instruments => ("instruments", Unit::One, 1.0),
    };
    let path = |what: &str| format!("{path}/checks/{key}/{what}");
    let value = check.value.filter(|v| v.is_finite()).map(|value| {
        Figure::descriptive(path("value"), format!("check \"{name}\": value"), value * scale, unit, 3)
    });
    let set = |what: &str, words: &str, value: f64| {
        Figure::stated(path(what), format!("check \"{name}\": {words}"), value, unit)
    };
    let limits = match (check.kind, check.limit.filter(|l| l.is_finite())) {
        (CheckKind::ThroughZero, _) => vec![
            set("lower", "lower limit", limits.crossing_pa.0 / 1e3),
            set("upper", "upper limit", limits.crossing_pa.1 / 1e3),
        ],
        // These limits are computed from the points and not set by anybody.
        (CheckKind::Choked | CheckKind::Outlier, Some(limit)) => vec![Figure::descriptive(
            path("upper"),
            format!("check \"{name}\": limit"),
            limit * scale,
            unit,
            3,
        )],
        (CheckKind::Instruments, _) | (_, None) => Vec::new(),
        (_, Some(limit)) => vec![set("upper", "limit", limit * scale)],
    };
    CheckRow {
        name,
        verdict: check.verdict,
        word: match check.verdict {
            CheckVerdict::Pass => "holds",
            CheckVerdict::Fail => "does not hold",
            CheckVerdict::Note => "note",
        },
        says: sentence(check, units),
        value,
        limits,
    }
}

fn before(path: &str, measured: &Measured<'_>, units: &Units) -> Option<Comparison> {
    let check = measured.analysis.checks.iter().find(|c| c.kind == CheckKind::SameAsBefore)?;
    let (Finding::Change { change, before }, Some(en)) = (&check.finding, check.value) else { return None };
    let earlier = measured.before?;
    Some(comparison(&format!("{path}/before"), before, earlier, (*change, en), sentence(check, units)))
}

fn comparison(
    path: &str,
    with: &str,
    before: &Accepted,
    (change, en): (f64, f64),
    says: String,
) -> Comparison {
    Comparison {
        with: with.to_owned(),
        flow: flow_figure(format!("{path}/flow"), format!("flow in {with}"), &before.flow),
        change: Figure::descriptive(
            format!("{path}/change"),
            format!("change since {with}"),
            change * 100.0,
            Unit::Percent,
            2,
        ),
        en: Figure::plain(
            format!("{path}/en"),
            format!("E_n against {with}"),
            en,
            Unit::One,
            2,
            NoUncertainty::Descriptive,
        ),
        says,
    }
}

/// How far the work between two runs changed the flow; none where they are not of the same gas at the same pressure.
pub(super) fn changed_by_work(as_found: &Measured<'_>, as_left: &Measured<'_>) -> Option<Comparison> {
    let (found, left) = (&as_found.analysis.nominal.flow, &as_left.analysis.nominal.flow);
    let same = as_found.run.gas == as_left.run.gas && (found.p1_bar - left.p1_bar).abs() < 1e-6;
    if !same {
        return None;
    }
    let accepted = Accepted {
        name: as_found.name.to_owned(),
        gas: as_found.run.gas,
        flow: found.clone(),
        meter_certificate: as_found.run.meter.papers.certificate.clone(),
        transducer_certificate: as_found.run.transducer.papers.certificate.clone(),
    };
    let now = as_left.run;
    let compared = compare(
        left,
        now.meter.papers.certificate.as_deref(),
        now.transducer.papers.certificate.as_deref(),
        &accepted,
    );
    let direction = if compared.change < 0.0 { "less" } else { "more" };
    let says = format!(
        "As left, the flow is {} % {direction} than as found (E_n = {}).",
        figures(compared.change.abs() * 100.0, 2),
        crate::report::number::fixed(compared.en, 2)
    );
    Some(comparison("changed_by_work", as_found.name, &accepted, (compared.change, compared.en), says))
}

fn conformity(path: &str, measured: &Measured<'_>, fitted: &Fitted<'_>) -> Option<Conformity> {
    let (run, analysis) = (measured.run, measured.analysis);
    let (judgement, acceptance) = (analysis.judgement.as_ref()?, run.acceptance.as_ref()?);
    let path = |key: &str| format!("{path}/conformity/{key}");
    let judged =
        flow_figure(path("judged"), format!("judged flow of {}", judgement.gas.name()), &judgement.flow);
    // One place more than the flow, so that no limit is moved by its rounding.
    let decimals = judged.decimals + 1;
    let limit = |key: &str, name: &str, value: f64| {
        Figure::plain(path(key), name, value, Unit::LitrePerMinute, decimals, NoUncertainty::Stated)
            .at(Reference::StpdAtStandardAmbient)
    };
    let (low, high) = judgement.limits_l_min;
    let u = judgement.flow.expanded();
    let says = verdict_line(fitted, &Units::default());
    Some(Conformity {
        verdict: judgement.verdict,
        word: match judgement.verdict {
            Verdict::None => "no verdict",
            _ => verdict_name(analysis),
        },
        says: says.split_once(": ").map_or(says.clone(), |(_, reason)| reason.to_owned()),
        judged,
        nominal: Figure::stated(
            path("nominal"),
            "nominal flow",
            acceptance.flow.as_l_min(),
            Unit::LitrePerMinute,
        )
        .at(Reference::StpdAtStandardAmbient),
        limits: [limit("lower", "lower limit", low), limit("upper", "upper limit", high)],
        guarded: (acceptance.rule == Rule::Guarded).then(|| {
            [
                limit("guarded_lower", "lower acceptance limit", low + u),
                limit("guarded_upper", "upper acceptance limit", high - u),
            ]
        }),
        rule: rule_name(acceptance.rule),
        rule_says: words::rule(acceptance.rule),
        probability: probability(judgement.probability),
    })
}
