//! Room `stats` against published data, and against itself by a second road.
//!
//! Each figure lies in `fixtures/reference/stats/` with its document, edition and place, and is compared to half a unit of
//! the last printed digit unless the file's remark says otherwise. Not covered, because no free print was at hand: ISO/TS
//! 28037 clauses 8 and 9 (which the room does not hold), JCGM 101 clause 9.4 and 9.5.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(clippy::float_cmp, reason = "counts and labels read from a file are whole numbers")]

use crate::published::Published;
use ebbline::stats::autocorrelation::{lag_1_autocorrelation, runs_about_median};
use ebbline::stats::budget::{Budget, BudgetRow};
use ebbline::stats::conformity::{Knowledge, Limits, conformity_probability, global_risk};
use ebbline::stats::correlated::{CorrelatedPoints, fit_correlated};
use ebbline::stats::coverage::{coverage_factor, welch_satterthwaite};
use ebbline::stats::distribution::{chi_squared_quantile, normal_quantile, student_t_quantile};
use ebbline::stats::inverse::{Fieller, fieller, line_inverse};
use ebbline::stats::lack_of_fit::lack_of_fit;
use ebbline::stats::line::{CalibrationPoints, Line, fit, fit_from};
use ebbline::stats::monte_carlo::{Plan, Summary, propagate};
use ebbline::stats::ordinary::{self, Intercept, polynomial};
use ebbline::stats::outlier::{Sides, generalised_esd, grubbs, grubbs_critical};
use nalgebra::{DMatrix, DVector};
use proptest::prelude::*;

fn read(name: &str) -> Published {
    Published::read("stats", name)
}

fn line_through(x: &[f64], ux: &[f64], y: &[f64], uy: &[f64]) -> Line {
    fit(&CalibrationPoints::new(x, ux, y, uy).unwrap()).unwrap()
}

/// Straight line by ordinary least squares: unit uncertainties, scaled by the residual variance.
fn ordinary_line(x: &[f64], y: &[f64]) -> Line {
    let line = line_through(x, &vec![0.0; x.len()], y, &vec![1.0; y.len()]);
    line.scaled(line.reduced_chi_square().unwrap())
}

/// Everything ISO/TS 28037 prints of a line, and the same recomputed with more digits.
fn check_ts28037(file: &Published, line: &Line) {
    let results = [
        ("intercept", line.intercept),
        ("slope", line.slope),
        ("intercept_u", line.intercept_u),
        ("slope_u", line.slope_u),
        ("covariance", line.covariance),
        ("chi_square", line.chi_square),
    ];
    for (what, got) in results {
        file.check(&format!("printed.{what}"), got);
        file.check_relative(&format!("recomputed.{what}"), got, 1e-9);
    }
    file.check("printed.chi_square_95", chi_squared_quantile(0.95, line.dof as f64));
}

fn check_forward(file: &Published, line: &Line) {
    for i in 0..2 {
        let at = |what: &str| format!("printed.forward.{i}.{what}");
        let (y, uy) = line.forward(file.number(&at("x")), file.number(&at("ux")));
        file.check(&at("y"), y);
        file.check(&at("uy"), uy);
    }
}

mod line_with_uncertainties {
    use super::*;

    #[test]
    fn equal_weights_reproduce_ts28037_clause_6_forward_and_inverse() {
        let file = read("ts28037_weighted");
        let (x, y, uy) = (file.numbers("input.x"), file.numbers("input.y"), file.numbers("input.uy"));
        let line = line_through(&x, &vec![0.0; x.len()], &y, &uy);
        check_ts28037(&file, &line);
        check_forward(&file, &line);
        let (y0, u0) = (file.number("printed.inverse.y"), file.number("printed.inverse.uy"));
        let (x0, ux0) = line.inverse(y0, u0).unwrap();
        file.check("printed.inverse.x", x0);
        file.check("printed.inverse.ux", ux0);
    }

    #[test]
    fn distance_regression_reproduces_ts28037_clause_7_forward() {
        let file = read("ts28037_distance");
        let numbers = |what: &str| file.numbers(&format!("input.{what}"));
        let line = line_through(&numbers("x"), &numbers("ux"), &numbers("y"), &numbers("uy"));
        check_ts28037(&file, &line);
        check_forward(&file, &line);
    }

    #[test]
    fn correlated_points_reproduce_ts28037_clause_10() {
        let file = read("ts28037_correlated");
        let (x, y) = (file.numbers("input.x"), file.numbers("input.y"));
        let matrix = |what: &str| {
            let rows: Vec<f64> =
                (0..x.len()).flat_map(|i| file.numbers(&format!("input.{what}.{i}"))).collect();
            DMatrix::from_row_slice(x.len(), x.len(), &rows)
        };
        let points = CorrelatedPoints::new(&x, matrix("x_covariance"), &y, matrix("y_covariance")).unwrap();
        let line = fit_correlated(&points).unwrap();
        check_ts28037(&file, &line);
        // Clause 11 forwards and then backwards comes back, with the uncertainty of the line counted twice.
        let (y0, uy0) = line.forward(150.0, 0.5);
        let (x0, ux0) = line.inverse(y0, uy0).unwrap();
        let want = (2.0 * line.u_at(150.0).powi(2) / line.slope.powi(2) + 0.25).sqrt();
        assert!((x0 - 150.0).abs() < 1e-11 && (ux0 / want - 1.0).abs() < 1e-12, "{x0} {ux0} {want}");
    }

    #[test]
    fn pearsons_data_with_yorks_weights_give_the_accepted_line() {
        let file = read("pearson_york");
        let (x, y) = (file.numbers("input.x"), file.numbers("input.y"));
        let sigma = |what: &str| file.numbers(what).iter().map(|w| (1.0 / w).sqrt()).collect::<Vec<f64>>();
        let line = line_through(&x, &sigma("input.weight_x"), &y, &sigma("input.weight_y"));
        file.check("printed.intercept", line.intercept);
        file.check("printed.slope", line.slope);
        file.check("printed.intercept_se", line.intercept_u);
        file.check("printed.slope_se", line.slope_u);
        file.check("printed.reduced_chi_square", line.reduced_chi_square().unwrap());
        file.check_relative("recomputed.intercept", line.intercept, 1e-12);
        file.check_relative("recomputed.slope", line.slope, 1e-12);
        file.check_relative("recomputed.covariance", line.covariance, 1e-11);
        let birge = line.scaled(line.reduced_chi_square().unwrap());
        file.check_relative("printed.intercept_se_scaled", birge.intercept_u, 1e-11);
        file.check_relative("printed.slope_se_scaled", birge.slope_u, 1e-11);
        // The other two definitions of the standard error are different numbers, not a looser tolerance.
        for (path, got) in [
            ("kalantar_intercept_se", line.intercept_u),
            ("kalantar_slope_se", line.slope_u),
            ("hessian_intercept_se", line.intercept_u),
            ("hessian_slope_se", line.slope_u),
        ] {
            let path = format!("other_definitions.{path}");
            assert!(!file.meets(&path, got), "{path}: {got} must not be this one");
            assert!((got / file.number(&path) - 1.0).abs() > 5e-3, "{path}: {got}");
        }
    }

    #[test]
    fn norris_comes_out_of_the_line_with_equal_weights() {
        let file = read("nist_norris");
        let (x, y) = (file.numbers("input.x"), file.numbers("input.y"));
        let plain = line_through(&x, &vec![0.0; x.len()], &y, &vec![1.0; y.len()]);
        let line = ordinary_line(&x, &y);
        file.check_relative("printed.beta.0", line.intercept, 1e-12);
        file.check_relative("printed.beta.1", line.slope, 1e-12);
        file.check_relative("printed.se.0", line.intercept_u, 1e-12);
        file.check_relative("printed.se.1", line.slope_u, 1e-12);
        file.check_relative("exact.covariance.0.1", line.covariance, 1e-12);
        file.check_relative("printed.residual_square_sum", plain.chi_square, 1e-12);
    }

    #[test]
    fn thermometer_of_the_gum_at_both_reference_temperatures() {
        let file = read("gum_h3");
        let y = file.numbers("input.y");
        let fitted_about = |reference: f64| {
            let x: Vec<f64> = file.numbers("input.x").iter().map(|x| x - reference).collect();
            ordinary_line(&x, &y)
        };
        let line = fitted_about(file.number("input.reference"));
        let correlation = |l: &Line| l.covariance / (l.intercept_u * l.slope_u);
        file.check("printed.intercept", line.intercept);
        file.check("printed.intercept_u", line.intercept_u);
        file.check("printed.slope", line.slope);
        file.check("printed.slope_u", line.slope_u);
        file.check("printed.correlation", correlation(&line));
        file.check_relative("recomputed.covariance", line.covariance, 1e-10);
        let ends = polynomial(&file.numbers("input.x"), &y, 1).unwrap();
        file.check("printed.residual_sd", ends.residual_sd);
        file.check("printed.at_30", line.at(10.0));
        file.check("printed.u_at_30", line.u_at(10.0));
        file.check_relative("recomputed.at_30", line.at(10.0), 1e-10);
        file.check_relative("recomputed.u_at_30", line.u_at(10.0), 1e-10);

        let reference = file.number("input.other_reference");
        let other = fitted_about(reference);
        file.check("printed.intercept_at_other", other.intercept);
        file.check("printed.intercept_u_at_other", other.intercept_u);
        file.check("printed.correlation_at_other", correlation(&other));
        file.check("printed.slope", other.slope);
        file.check("printed.slope_u", other.slope_u);
        file.check("printed.at_30", other.at(30.0 - reference));
        file.check("printed.u_at_30", other.u_at(30.0 - reference));
    }

    #[test]
    fn independent_points_are_a_case_of_correlated_ones() {
        let file = read("pearson_york");
        let (x, y) = (file.numbers("input.x"), file.numbers("input.y"));
        let variance = |what: &str| DVector::from_vec(file.numbers(what)).map(|w| 1.0 / w);
        let (ux, uy) = (variance("input.weight_x"), variance("input.weight_y"));
        let points =
            CorrelatedPoints::new(&x, DMatrix::from_diagonal(&ux), &y, DMatrix::from_diagonal(&uy)).unwrap();
        let second = fit_correlated(&points).unwrap();
        let root = |u: &DVector<f64>| u.map(f64::sqrt).as_slice().to_vec();
        let first = line_through(&x, &root(&ux), &y, &root(&uy));
        assert_lines_agree(&first, &second, 1e-10);
    }

    /// A set of points with uncertainties that a bench could have produced, and some it could not.
    fn points() -> impl Strategy<Value = Vec<[f64; 4]>> {
        let noise = -1.0..1.0f64;
        let u = 0.01..0.3f64;
        (3..25usize, -3.0..3.0f64, -5.0..5.0f64).prop_flat_map(move |(n, a, b)| {
            prop::collection::vec((noise.clone(), noise.clone(), u.clone(), u.clone()), n).prop_map(
                move |rows| {
                    rows.iter()
                        .enumerate()
                        .map(|(i, (ex, ey, ux, uy))| {
                            let x = i as f64;
                            [x + ex * ux, *ux, a + b * x + ey * (uy * uy + b * b * ux * ux).sqrt(), *uy]
                        })
                        .collect()
                },
            )
        })
    }

    fn fitted(points: &[[f64; 4]]) -> Line {
        let column = |k: usize| points.iter().map(|p| p[k]).collect::<Vec<f64>>();
        line_through(&column(0), &column(1), &column(2), &column(3))
    }

    /// Compares value, slope, uncertainties and chi-squared; differences in units of the standard uncertainties.
    fn assert_lines_agree(a: &Line, b: &Line, tolerance: f64) {
        let pairs = [
            ("intercept", (a.intercept - b.intercept) / a.intercept_u),
            ("slope", (a.slope - b.slope) / a.slope_u),
            ("u of the intercept", a.intercept_u / b.intercept_u - 1.0),
            ("u of the slope", a.slope_u / b.slope_u - 1.0),
            ("covariance", (a.covariance - b.covariance) / (a.intercept_u * a.slope_u)),
            ("chi-squared", (a.chi_square - b.chi_square) / (1.0 + a.chi_square)),
        ];
        for (what, difference) in pairs {
            assert!(difference.abs() < tolerance, "{what} differ by {difference:e}\n{a:?}\n{b:?}");
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, cases: 200, ..ProptestConfig::default() })]

        #[test]
        fn the_order_of_the_points_does_not_matter(points in points(), seed in any::<u64>()) {
            let mut shuffled = points.clone();
            // Any permutation will do: sorted by a scrambled key.
            shuffled.sort_by_key(|p| p[0].to_bits().wrapping_mul(seed | 1));
            assert_lines_agree(&fitted(&points), &fitted(&shuffled), 1e-9);
        }

        #[test]
        fn other_units_give_the_same_line_in_other_units(points in points(), kx in 1e-9..1e9f64, ky in 1e-9..1e9f64) {
            let scaled: Vec<[f64; 4]> = points.iter().map(|p| [kx * p[0], kx * p[1], ky * p[2], ky * p[3]]).collect();
            let (line, other) = (fitted(&points), fitted(&scaled));
            let back = Line::from_parts(
                (other.intercept / ky, other.slope * kx / ky),
                ((other.intercept_u / ky).powi(2), (other.slope_u * kx / ky).powi(2), other.covariance * kx / ky / ky),
                other.chi_square,
                other.n,
            );
            assert_lines_agree(&line, &back, 1e-9);
        }

        #[test]
        fn swapped_axes_give_the_inverse_line(points in points()) {
            let line = fitted(&points);
            // A slope that may be zero has no inverse line.
            prop_assume!(line.slope.abs() > 10.0 * line.slope_u);
            let swapped = fitted(&points.iter().map(|p| [p[2], p[3], p[0], p[1]]).collect::<Vec<_>>());
            prop_assert!((line.slope * swapped.slope - 1.0).abs() < 1e-9, "{} {}", line.slope, swapped.slope);
            prop_assert!((line.chi_square - swapped.chi_square).abs() < 1e-9 * (1.0 + line.chi_square));
            for y in [-3.0, 0.0, 40.0] {
                let (x, u) = line.inverse(y, 0.0).unwrap();
                prop_assert!((swapped.at(y) - x).abs() < 1e-8 * u.max(1e-3), "at {y}: {} {x}", swapped.at(y));
                // Standard uncertainties of clause 7 are those of the adjusted points, the same from both sides.
                prop_assert!((swapped.u_at(y) / u - 1.0).abs() < 1e-7, "at {y}: {} {u}", swapped.u_at(y));
            }
        }

        #[test]
        fn a_huge_offset_costs_no_more_than_its_own_rounding(points in points(), offset in -1e6..1e6f64) {
            let moved: Vec<[f64; 4]> = points.iter().map(|p| [p[0] + offset, p[1], p[2], p[3]]).collect();
            // The numbers really fitted: what is left of x after adding and subtracting.
            let rounded: Vec<[f64; 4]> = moved.iter().map(|p| [p[0] - offset, p[1], p[2], p[3]]).collect();
            let (line, far) = (fitted(&rounded), fitted(&moved));
            for x in [0.0, 3.5, 20.0] {
                prop_assert!((line.at(x) - far.at(x + offset)).abs() < 1e-7 * line.u_at(x), "at {x}");
                prop_assert!((line.u_at(x) / far.u_at(x + offset) - 1.0).abs() < 1e-7, "at {x}");
            }
        }

        #[test]
        fn the_fast_form_agrees_from_a_start_nearby(points in points()) {
            let line = fitted(&points);
            let column = |k: usize| points.iter().map(|p| p[k]).collect::<Vec<f64>>();
            let square = |k: usize| points.iter().map(|p| p[k] * p[k]).collect::<Vec<f64>>();
            let start = (line.intercept + line.intercept_u, line.slope - line.slope_u);
            let quick = fit_from(&column(0), &square(1), &column(2), &square(3), start).unwrap();
            prop_assert!((quick.slope - line.slope).abs() < 1e-9 * line.slope_u);
            prop_assert!((quick.intercept - line.intercept).abs() < 1e-9 * line.intercept_u);
            prop_assert!((quick.covariance - line.covariance).abs() < 1e-9 * line.intercept_u * line.slope_u);
            prop_assert!((quick.chi_square - line.chi_square).abs() < 1e-9 * (1.0 + line.chi_square));
        }
    }

    #[test]
    fn standard_errors_are_those_found_by_monte_carlo_when_points_are_precise() {
        // Second road to the covariance: with small uncertainties the definitions of the standard error meet.
        let x: Vec<f64> = (0..12).map(f64::from).collect();
        let y: Vec<f64> = x.iter().map(|x| 0.7 + 1.3 * x).collect();
        let u = 0.02;
        let line = line_through(&x, &[u; 12], &y, &[u; 12]);
        let variances = [u * u; 12];
        let plan = Plan { trials: 100_000, seed: 7, threads: 2 };
        let draws = propagate(
            &plan,
            || (x.clone(), y.clone()),
            |random, (xs, ys)| {
                for i in 0..12 {
                    xs[i] = x[i] + u * random.normal();
                    ys[i] = y[i] + u * random.normal();
                }
                let e = fit_from(xs, &variances, ys, &variances, (0.7, 1.3))?;
                Some([e.intercept, e.slope, e.chi_square])
            },
        );
        assert_eq!(draws.failed, 0);
        // A standard deviation from 1e5 trials scatters by 0.22 %; a covariance by about 0.4 %.
        let sd = |k: usize| draws.summary(k, 0.95).unwrap().sd;
        assert!((sd(0) / line.intercept_u - 1.0).abs() < 0.01, "{} {}", sd(0), line.intercept_u);
        assert!((sd(1) / line.slope_u - 1.0).abs() < 0.01, "{} {}", sd(1), line.slope_u);
        let covariance = draws.covariance(0, 1).unwrap();
        assert!((covariance / line.covariance - 1.0).abs() < 0.02, "{covariance} {}", line.covariance);
        let mean_chi = draws.summary(2, 0.95).unwrap().mean;
        assert!((mean_chi / 10.0 - 1.0).abs() < 0.01, "chi-squared {mean_chi}, 10 degrees of freedom");
    }
}

mod ordinary_least_squares {
    use super::*;

    #[test]
    fn norris_to_the_certified_digits() {
        let file = read("nist_norris");
        let (x, y) = (file.numbers("input.x"), file.numbers("input.y"));
        for model in [ordinary::fit(&[&x], &y, Intercept::Free).unwrap(), polynomial(&x, &y, 1).unwrap()] {
            for j in 0..2 {
                file.check_relative(&format!("printed.beta.{j}"), model.parameters[j], 1e-13);
                file.check_relative(&format!("printed.se.{j}"), model.standard_errors[j], 1e-12);
                for k in 0..2 {
                    file.check_relative(&format!("exact.covariance.{j}.{k}"), model.covariance[j][k], 1e-12);
                }
            }
            file.check_relative("printed.residual_sd", model.residual_sd, 1e-12);
            file.check_relative("printed.r_squared", model.r_squared.unwrap(), 1e-13);
            file.check_relative("printed.residual_square_sum", model.residual_square_sum, 1e-12);
            assert_eq!(model.dof as f64, file.number("printed.dof"));
        }
    }

    #[test]
    fn a_line_through_the_origin_to_the_certified_digits() {
        let file = read("nist_noint1");
        let (x, y) = (file.numbers("input.x"), file.numbers("input.y"));
        let model = ordinary::fit(&[&x], &y, Intercept::Zero).unwrap();
        file.check_relative("printed.beta.0", model.parameters[0], 1e-13);
        file.check_relative("printed.se.0", model.standard_errors[0], 1e-12);
        file.check_relative("exact.covariance.0.0", model.covariance[0][0], 1e-12);
        file.check_relative("printed.residual_sd", model.residual_sd, 1e-12);
        file.check_relative("printed.r_squared", model.r_squared.unwrap(), 1e-13);
        assert_eq!(model.dof as f64, file.number("printed.dof"));
    }

    #[test]
    fn wampler_1_comes_back_exactly_and_is_called_perfect() {
        let file = read("nist_wampler1");
        let model = polynomial(&file.numbers("input.x"), &file.numbers("input.y"), 5).unwrap();
        for j in 0..6 {
            file.check_within(&format!("printed.beta.{j}"), model.parameters[j], 1e-13);
            file.check_within(&format!("printed.se.{j}"), model.standard_errors[j], 1e-9);
        }
        file.check_within("printed.residual_sd", model.residual_sd, 1e-9);
        file.check_within("printed.r_squared", model.r_squared.unwrap(), 1e-15);
        assert!(model.perfect && (0..model.parameters.len()).all(|j| model.p_value(j).is_none()));
    }

    #[test]
    fn lack_of_fit_of_the_bank_data() {
        let file = read("lack_of_fit_bank");
        let (x, y) = (file.numbers("input.x"), file.numbers("input.y"));
        let line = polynomial(&x, &y, 1).unwrap();
        file.check("printed.residual", line.residual_square_sum);
        let fitted: Vec<f64> = y.iter().zip(&line.residuals).map(|(y, r)| y - r).collect();
        let groups: Vec<usize> = x.iter().map(|x| *x as usize).collect();
        let test = lack_of_fit(&groups, &y, &fitted, 2).unwrap();
        file.check("printed.pure_error", test.pure_error);
        file.check("printed.lack_of_fit", test.lack_of_fit);
        file.check("printed.f", test.f);
        file.check("recomputed.p", test.p);
        assert_eq!(test.lack_of_fit_dof as f64, file.number("printed.lack_of_fit_dof"));
        assert_eq!(test.pure_error_dof as f64, file.number("printed.pure_error_dof"));
    }
}

mod outliers_and_runs {
    use super::*;

    #[test]
    fn grubbs_finds_the_uranium_reading() {
        let file = read("grubbs_uranium");
        let values = file.numbers("input.values");
        let extreme = grubbs(&values).unwrap();
        assert_eq!(extreme.index, 7);
        // The first print cut the digits after 2.4687.
        file.check_within("printed.statistic", extreme.statistic, 1e-4);
        file.check("printed.statistic_long", extreme.statistic);
        let critical = grubbs_critical(values.len(), file.number("input.significance"), Sides::One).unwrap();
        file.check("printed.critical_one_sided", critical);
        file.check("printed.critical_one_sided_long", critical);
    }

    #[test]
    fn rosners_data_hold_three_outliers() {
        let file = read("rosner_esd");
        let values = file.numbers("input.values");
        let esd = generalised_esd(&values, 10, file.number("input.significance")).unwrap();
        for (i, step) in esd.steps.iter().enumerate() {
            file.check_within(&format!("printed.statistic.{i}"), step.statistic, 1e-3);
            file.check_within(&format!("printed.critical.{i}"), step.critical, 1e-3);
        }
        let flagged: Vec<f64> = esd.flagged.iter().map(|&i| values[i]).collect();
        assert_eq!(flagged, [6.01, 5.42, 5.34]);
        assert_eq!(flagged.len() as f64, file.number("printed.outliers"));
    }

    #[test]
    fn beam_deflections_alternate() {
        let file = read("runs_lew");
        let values = file.numbers("input.values");
        let runs = runs_about_median(&values).unwrap();
        file.check("printed.z", runs.z);
        assert_eq!(
            [runs.runs, runs.above, runs.below].map(|n| n as f64),
            ["runs", "above", "below"].map(|n| file.number(&format!("printed.{n}")))
        );
        file.check("printed.lag_1", lag_1_autocorrelation(&values).unwrap());
        let mean = ebbline::stats::autocorrelation::series_mean(&values).unwrap();
        file.check("printed.mean", mean.mean);
        file.check_relative("printed.sd", mean.sd, 1e-13);
        // Readings that alternate are not credited with a better mean than independent ones.
        assert!(mean.u >= mean.sd / (values.len() as f64).sqrt() * (1.0 - 1e-12));
    }
}

mod inverse_prediction {
    use super::*;

    fn interval(limits: Fieller) -> (f64, f64) {
        match limits {
            Fieller::Interval { lower, upper } => (lower, upper),
            other => panic!("no interval: {other:?}"),
        }
    }

    #[test]
    fn arsenic_one_reading_a_mean_response_and_three_readings() {
        let file = read("inverse_arsenic");
        let (x, y) = (file.numbers("input.x"), file.numbers("input.y"));
        let (y0, level) = (file.number("input.y0"), file.number("input.level"));
        let unscaled = line_through(&x, &vec![0.0; x.len()], &y, &vec![1.0; y.len()]);
        let variance = unscaled.reduced_chi_square().unwrap();
        let line = unscaled.scaled(variance);
        let t = coverage_factor(level, line.dof as f64);

        let single = line_inverse(&line, y0, variance, t).unwrap();
        let (lower, upper) = interval(single.limits);
        for (what, got) in [("x", single.x), ("lower", lower), ("upper", upper)] {
            file.check(&format!("printed.{what}"), got);
            file.check_relative(&format!("recomputed.{what}"), got, 1e-8);
        }
        file.check("printed.first_order_u", single.u);
        file.check("printed.first_order_lower", single.x - t * single.u);
        file.check("printed.first_order_upper", single.x + t * single.u);

        let (lower, upper) = interval(line_inverse(&line, y0, 0.0, t).unwrap().limits);
        file.check("printed.mean_response_lower", lower);
        file.check("printed.mean_response_upper", upper);

        // Three new readings pool their own scatter with that of the line.
        let readings = file.numbers("input.readings");
        let m = readings.len() as f64;
        let mean = readings.iter().sum::<f64>() / m;
        let within: f64 = readings.iter().map(|r| (r - mean).powi(2)).sum();
        let dof = line.dof as f64 + m - 1.0;
        let pooled = (unscaled.chi_square + within) / dof;
        let several =
            line_inverse(&unscaled.scaled(pooled), mean, pooled / m, coverage_factor(level, dof)).unwrap();
        let (lower, upper) = interval(several.limits);
        file.check_relative("recomputed.readings_x", several.x, 1e-8);
        file.check_relative("recomputed.readings_lower", lower, 1e-8);
        file.check_relative("recomputed.readings_upper", upper, 1e-8);
    }

    #[test]
    fn thermostat_both_settings() {
        let file = read("inverse_thermostat");
        let unscaled_variance =
            polynomial(&file.numbers("input.x"), &file.numbers("input.y"), 1).unwrap().residual_sd.powi(2);
        let line = ordinary_line(&file.numbers("input.x"), &file.numbers("input.y"));
        for case in ["first", "second"] {
            let at = |what: &str| format!("{case}.{what}");
            let t = coverage_factor(file.number(&at("level")), line.dof as f64);
            let found = line_inverse(&line, file.number(&at("y0")), unscaled_variance, t).unwrap();
            let (lower, upper) = interval(found.limits);
            file.check(&at("x"), found.x);
            file.check(&at("lower"), lower);
            file.check(&at("upper"), upper);
            file.check_relative(&at("exact_lower"), lower, 1e-8);
            file.check_relative(&at("exact_upper"), upper, 1e-8);
        }
    }

    #[test]
    fn fiellers_theorem_bounded_and_not() {
        let file = read("fieller");
        let cases = file.value("cases.list").as_array().unwrap().len();
        assert_eq!(cases, 3);
        for i in 0..cases {
            let at = |what: &str| format!("cases.list.{i}.{what}");
            let n = |what: &str| file.number(&at(what));
            let (kind, lower, upper) = match fieller(n("a"), n("b"), n("vaa"), n("vbb"), n("vab"), n("t")) {
                Fieller::Interval { lower, upper } => ("interval", lower, upper),
                Fieller::Outside { lower, upper } => ("outside", lower, upper),
                Fieller::Unbounded => panic!("case {i} is bounded"),
            };
            assert_eq!(Some(kind), file.value(&at("kind")).as_str());
            file.check_relative(&at("lower"), lower, 1e-10);
            file.check_relative(&at("upper"), upper, 1e-10);
        }
    }
}

mod coverage_and_conformity {
    use super::*;

    #[test]
    fn student_t_table() {
        let file = read("student_t");
        let probabilities = file.numbers("input.probability");
        let rows = file.value("printed.rows").as_array().unwrap().len();
        assert!(rows > 30);
        for i in 0..rows {
            let dof = file.number(&format!("printed.rows.{i}.dof"));
            for (j, p) in probabilities.iter().enumerate() {
                file.check(&format!("printed.rows.{i}.t.{j}"), student_t_quantile(*p, dof));
            }
        }
    }

    #[test]
    fn coverage_factors_between_whole_degrees_of_freedom_lie_between_their_neighbours() {
        for dof in 1..60 {
            let factor = |dof: f64| coverage_factor(0.95, dof);
            let (low, high) = (f64::from(dof), f64::from(dof + 1));
            assert!(factor(low) > factor(low + 0.3) && factor(low + 0.3) > factor(high), "{dof}");
        }
    }

    #[test]
    fn effective_degrees_of_freedom_of_gum_g_4_1() {
        let file = read("gum_g41");
        let (u, n) = (file.numbers("input.relative_u_percent"), file.numbers("input.n"));
        let rows = (0..3).map(|i| BudgetRow::new(format!("x{}", i + 1), 1.0, u[i], n[i] - 1.0)).collect();
        let budget = Budget::new(rows);
        file.check("printed.combined_percent", budget.combined_u());
        file.check("printed.effective_dof", budget.effective_dof());
        file.check("printed.t_95", budget.coverage_factor(0.95));
        file.check("printed.expanded_percent", budget.expanded(0.95));
        let direct = welch_satterthwaite((0..3).map(|i| (u[i], n[i] - 1.0)));
        assert!((direct - budget.effective_dof()).abs() < 1e-12);
    }

    #[test]
    fn weight_of_ea_4_02_s2() {
        let file = read("ea402_s2");
        let n = |what: &str| file.number(&format!("input.{what}"));
        let rectangular = |what: &str| n(what) / 3f64.sqrt();
        let rows = vec![
            BudgetRow::new("standard", 1.0, n("U_mS_mg") / n("k"), f64::INFINITY),
            BudgetRow::new("drift", 1.0, rectangular("drift_halfwidth_mg"), f64::INFINITY),
            BudgetRow::new("comparison", 1.0, n("pooled_s_mg") / n("n").sqrt(), f64::INFINITY),
            BudgetRow::new("eccentricity", 1.0, rectangular("eccentricity_halfwidth_mg"), f64::INFINITY),
            BudgetRow::new("buoyancy", 1.0, rectangular("buoyancy_halfwidth_mg"), f64::INFINITY),
        ];
        let budget = Budget::new(rows);
        file.check("printed.u_mg", budget.combined_u());
        file.check("printed.expanded_mg", n("k") * budget.combined_u());
    }

    #[test]
    fn conformity_probabilities_of_jcgm_106() {
        let file = read("conformity");
        for (i, p) in file.numbers("one_sided.probability").iter().enumerate() {
            file.check(&format!("one_sided.z.{i}"), normal_quantile(*p));
        }
        let n = |path: &str| file.number(path);
        let zener = Knowledge { value: n("zener.value"), u: n("zener.u"), dof: f64::INFINITY };
        let limits = Limits::new(None, Some(n("zener.upper"))).unwrap();
        let probability = conformity_probability(&zener, &limits);
        file.check("zener.probability", probability);
        file.check_within("zener.recomputed", probability, 1e-6);
        // Speed: the guard band in units of the reading. The reading that proves the limit broken with that probability.
        let (limit, relative) = (n("speed.limit"), n("speed.relative_u"));
        let indicated = limit / (1.0 - relative * normal_quantile(n("speed.probability")));
        file.check("speed.indicated", indicated);
        let driver = Knowledge { value: indicated, u: relative * indicated, dof: f64::INFINITY };
        let innocent = conformity_probability(&driver, &Limits::new(None, Some(limit)).unwrap());
        assert!((innocent - (1.0 - n("speed.probability"))).abs() < 1e-9, "{innocent}");
    }

    #[test]
    fn global_risks_of_jcgm_106_with_and_without_a_guard_band() {
        let file = read("conformity");
        let n = |path: &str| file.number(path);
        let risk = |case: &str, w: f64| {
            let at = |what: &str| n(&format!("{case}.{what}"));
            let limits = Limits::new(Some(at("lower")), Some(at("upper"))).unwrap();
            global_risk(at("process_mean"), at("process_sd"), at("u"), &limits, w)
        };
        let guarded = risk("resistor", n("resistor.w"));
        file.check("resistor.consumer_percent", 100.0 * guarded.consumer);
        file.check("resistor.producer_percent", 100.0 * guarded.producer);
        for i in 0..3 {
            let at = |what: &str| format!("resistor.recomputed.{i}.{what}");
            let got = risk("resistor", n(&at("w")));
            file.check_within(&at("consumer"), got.consumer, 1e-6);
            file.check_within(&at("producer"), got.producer, 1e-6);
        }
        let centred = risk("centred", 0.0);
        file.check("centred.consumer_percent", 100.0 * centred.consumer);
        file.check("centred.producer_percent", 100.0 * centred.producer);
        file.check_within("centred.recomputed.0", centred.consumer, 1e-6);
        file.check_within("centred.recomputed.1", centred.producer, 1e-6);
    }
}

mod monte_carlo {
    use super::*;

    fn half_width(interval: (f64, f64)) -> f64 {
        0.5 * (interval.1 - interval.0)
    }

    fn check_additive(file: &Published, what: &str, summary: &Summary) {
        file.check("printed.u", summary.sd);
        // Half a printed unit is 0.005; the half-width of two million trials scatters by 0.0017.
        for interval in [summary.symmetric, summary.shortest] {
            file.check(&format!("printed.{what}_half_width"), half_width(interval));
            file.check_within(&format!("exact.{what}_half_width"), half_width(interval), 0.005);
        }
    }

    #[test]
    fn additive_model_of_jcgm_101_with_normal_and_rectangular_inputs() {
        let file = read("jcgm101_additive");
        let plan = Plan { trials: 2_000_000, seed: 101, threads: 2 };
        let half = 3f64.sqrt();
        let draws = propagate(
            &plan,
            || (),
            |random, ()| {
                let normal: f64 = (0..4).map(|_| random.normal()).sum();
                let rectangular: f64 = (0..4).map(|_| random.rectangular(-half, half)).sum();
                Some([normal, rectangular])
            },
        );
        check_additive(&file, "normal", &draws.summary(0, 0.95).unwrap());
        check_additive(&file, "rectangular", &draws.summary(1, 0.95).unwrap());
    }

    #[test]
    fn weight_calibration_of_jcgm_101() {
        let file = read("jcgm101_mass");
        let pair = |what: &str| {
            let v = file.numbers(&format!("input.{what}"));
            (v[0], v[1])
        };
        let (reference, added) = (pair("reference"), pair("added"));
        let (air, weight, density) = (pair("air_density"), pair("weight_density"), pair("reference_density"));
        let (nominal, air_0) = (file.number("input.nominal"), file.number("input.reference_air_density"));
        let plan = Plan { trials: 4_000_000, seed: 93, threads: 2 };
        let draws = propagate(
            &plan,
            || (),
            |random, ()| {
                let mass = reference.0 + reference.1 * random.normal() + added.0 + added.1 * random.normal();
                let buoyancy = (random.rectangular(air.0, air.1) - air_0)
                    * (1.0 / random.rectangular(weight.0, weight.1)
                        - 1.0 / random.rectangular(density.0, density.1));
                Some([mass * (1.0 + buoyancy) - nominal])
            },
        );
        let summary = draws.summary(0, 0.95).unwrap();
        for from in ["printed", "exact"] {
            file.check_within(&format!("{from}.mean"), summary.mean, 0.0002);
            file.check_within(&format!("{from}.u"), summary.sd, 0.0002);
        }
        // The shortest interval of a flat-topped distribution slides along; its ends are compared with print only.
        file.check_within("printed.lower", summary.shortest.0, 0.0015);
        file.check_within("printed.upper", summary.shortest.1, 0.0015);
        file.check_within("exact.lower", summary.symmetric.0, 0.0003);
        file.check_within("exact.upper", summary.symmetric.1, 0.0003);
        // First order sees no buoyancy, whose sensitivity is zero at the best estimates.
        let first = Budget::new(vec![
            BudgetRow::new("reference", 1.0, reference.1, f64::INFINITY),
            BudgetRow::new("added", 1.0, added.1, f64::INFINITY),
        ]);
        file.check("printed.first_order_u", first.combined_u());
        let middle = reference.0 + added.0 - nominal;
        file.check("printed.first_order_lower", middle - first.expanded(0.95));
        file.check("printed.first_order_upper", middle + first.expanded(0.95));
    }
}
