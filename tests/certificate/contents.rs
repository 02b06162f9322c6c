//! What a content holds, and what it is refused for.

use ebbline::bench::Verdict;
use ebbline::certificate::complete::{Fault, is_dsi, problems};
use ebbline::certificate::content::{self, Printed, Unit, printed};
use ebbline::certificate::rounding;
use ebbline::report::number::fixed;
use proptest::prelude::*;

use crate::support::{RUN, Taken, every_content, good, good_content, issue, readings};

fn value_at(all: &[Printed], path: &str) -> Printed {
    all.iter().find(|p| p.path == path).unwrap_or_else(|| panic!("no figure at {path}")).clone()
}

#[test]
fn every_kind_of_certificate_is_whole_and_says_its_verdict() {
    let verdict = |name: &str| match name {
        "failed" => Some(Verdict::Fail),
        "undecided" => Some(Verdict::Undecided),
        "without-limits" => None,
        _ => Some(Verdict::Pass),
    };
    for (name, content) in every_content() {
        assert_eq!(problems(&content), [], "{name}");
        assert_eq!(content.results.conformity.as_ref().map(|c| c.verdict), verdict(name), "{name}");
        assert_eq!(content.as_found.is_some(), name == "cleaned");
        // No interval unless asked for, and nothing that sounds like accreditation.
        let text = format!("{:?}", content.statements);
        assert_eq!(text.contains("Interval"), name == "amended", "{name}");
        assert!(!text.to_lowercase().contains("accredit"), "{name}");
    }
}

#[test]
fn figures_stand_at_stable_paths_with_their_uncertainty() {
    let taken = good();
    let all = printed(&good_content());
    let nominal = value_at(&all, "results/nominal/flow");
    let flow = &taken.analysis.nominal.flow;
    assert!((nominal.value.parse::<f64>().unwrap() - flow.flow_l_min).abs() <= 0.5e-4);
    assert!((nominal.expanded.unwrap().parse::<f64>().unwrap() - flow.expanded()).abs() <= 0.5e-4);
    assert_eq!(nominal.k.unwrap(), fixed(flow.coverage_factor, 2));
    assert_eq!(nominal.p.as_deref(), Some("0.95"));
    // 5 to 13 bar in half bars (the points at 4 bar are not choked enough); the one of 10 bar is the nominal flow.
    assert_eq!(all.iter().filter(|p| p.path.starts_with("results/flow_at/ip/")).count(), 17);
    assert_eq!(value_at(&all, "results/flow_at/ip/11").value, "10.0");
    assert_eq!(value_at(&all, "results/flow_at/flow/11").value, nominal.value);
    // The points carry their random part, k = 2.
    assert_eq!(value_at(&all, "results/points/flow/19").k.as_deref(), Some("2.00"));
    assert_eq!(value_at(&all, "results/points/flow/19").p.as_deref(), Some("0.9545"));
    assert_eq!(value_at(&all, "results/conditions/barometer").value, "1009.2");
    assert_eq!(value_at(&all, "results/conformity/lower").value, "0.45600");
    assert_eq!(value_at(&all, "results/line/intercept").p.as_deref(), Some("0.95"));
}

#[test]
fn value_and_uncertainty_of_every_figure_end_at_one_place() {
    let decimals = |text: &str| text.split_once('.').map_or(0, |(_, d)| d.len());
    let mut seen = 0;
    for (name, content) in every_content() {
        for figure in printed(&content) {
            if let Some(u) = &figure.expanded {
                seen += 1;
                assert_eq!(decimals(&figure.value), decimals(u), "{name} {}", figure.path);
            }
        }
    }
    assert!(seen > 500, "{seen}");
}

#[test]
fn the_comparison_and_the_work_are_certified() {
    let contents = every_content();
    let (_, cleaned) = contents.iter().find(|(name, _)| *name == "cleaned").unwrap();
    let before = cleaned.results.before.as_ref().unwrap();
    assert_eq!(before.with, "R0017");
    let work = cleaned.changed_by_work.as_ref().unwrap();
    // 0.999 against 0.8 of the flow.
    assert!((work.change.value - (0.999 / 0.8 - 1.0) * 100.0).abs() < 0.1, "{}", work.change.value);
    assert!(work.says.starts_with("As left, the flow is 25 % more than as found"), "{}", work.says);
    assert!(work.en.value > 10.0);
}

#[test]
fn all_problems_are_named_at_once() {
    let mut bad = issue();
    bad.shop.address = " \n".into();
    bad.customer.name = String::new();
    bad.item.serial = None;
    bad.signatory.name = "B\u{202E}. Invented".into();
    bad.country = "Norway".into();
    bad.condition = Some("clean\u{7}".into());
    bad.number = "N 1 ".into();
    let toml = RUN.replace("certificate = \"FM-2026-118\"\n", "").replace("2027-03-01", "2026-11-11");
    let taken = Taken::new("R0020", &toml, &readings(1.0));
    let said: Vec<String> =
        problems(&content::of(&bad, &taken.measured(), None)).iter().map(ToString::to_string).collect();
    assert_eq!(
        said,
        [
            "certificate number: begins or ends with white space: take it away",
            "address of the shop: is missing; add it with `shop edit`",
            "country of the shop: \"Norway\" is no country code: give two capital letters of ISO 3166-1, as NO",
            "signatory: holds the hidden character U+202E: type the text again without it",
            "customer: is missing; name the customer in the orifice's entry",
            "serial number of the item: is missing; write it into the orifice's entry, or state that the item bears none",
            "condition of the item: holds the hidden character U+0007: type the text again without it",
            "certificate number of the flow meter in run R0020: is missing; write certificate = \"…\" into its papers: \
             without it nothing is traceable",
            "calibration of the flow meter in run R0020: ran out on 2026-11-11, before the run of 2026-11-12: measure \
             again with an instrument that is in date",
            "calibration of the pressure transducer in run R0020: ran out on 2026-11-11, before the run of 2026-11-12: \
             measure again with an instrument that is in date",
        ]
    );
}

#[test]
fn a_run_of_another_orifice_and_days_out_of_order_are_problems() {
    let mut bad = issue();
    bad.item.id = ebbline::entry::Id::new("CMF-0418").unwrap();
    bad.received = chrono::NaiveDate::from_ymd_opt(2026, 11, 20);
    bad.issued = chrono::DateTime::parse_from_rfc3339("2026-11-11T10:00:00+11:00").unwrap();
    let found = problems(&content::of(&bad, &good().measured(), None));
    assert_eq!(found.len(), 3, "{found:?}");
    assert!(matches!(&found[2].fault, Fault::OtherOrifice { found, .. } if found == "CMF-0417"));
    assert!(matches!(found[0].fault, Fault::Order { .. }) && matches!(found[1].fault, Fault::Order { .. }));
}

#[test]
fn a_run_as_found_comes_before_the_one_as_left() {
    let (early, late) = (good(), Taken::new("R0099", &RUN.replace("T09:40", "T15:40"), &readings(0.9)));
    let mut cleaned = issue();
    cleaned.work_done = Some("cleaned".into());
    assert_eq!(problems(&content::of(&cleaned, &late.measured(), Some(&early.measured()))), []);
    let found = problems(&content::of(&cleaned, &early.measured(), Some(&late.measured())));
    assert!(matches!(found[..], [ref one] if one.field == "run as found"), "{found:?}");
}

#[test]
fn an_item_may_be_stated_to_bear_no_serial_number() {
    let mut without = issue();
    without.item.serial = None;
    without.without_serial = true;
    assert_eq!(problems(&content::of(&without, &good().measured(), None)), []);
}

#[test]
fn a_unit_that_the_dsi_does_not_know_is_found() {
    for unit in Unit::ALL {
        assert!(unit.dsi().iter().all(|form| is_dsi(form.unit)), "{}", unit.symbol());
    }
    for nonsense in [
        "bar",
        r"\psi",
        r"\kilo",
        r"\kilo\kilo\pascal",
        r"\litre\tothe{x}",
        r"\tothe{2}",
        "",
        r"\litre\per\minute",
    ] {
        assert!(!is_dsi(nonsense), "{nonsense}");
    }
}

proptest! {
    #[test]
    fn printed_uncertainty_loses_at_most_five_per_cent_and_has_two_figures(
        mantissa in 1.0_f64..10.0, exponent in -9_i32..5, value in -1e4_f64..1e4,
    ) {
        let u = mantissa * 10_f64.powi(exponent);
        let (text, decimals) = (rounding::expanded(u).unwrap(), rounding::decimals(u).unwrap());
        let back: f64 = text.parse().unwrap();
        // Half a unit of the last place up, and 5 % down.
        prop_assert!(back >= 0.95 * u * (1.0 - 1e-12), "{u} {text}");
        prop_assert!(back <= u + 0.501 * 10_f64.powi(-decimals), "{u} {text}");
        let figures = text.replace('.', "");
        let figures = figures.trim_start_matches('0');
        prop_assert!(decimals < 0 || figures.len() == 2, "{u} {text}");
        let places = |text: &str| text.split_once('.').map_or(0, |(_, d)| d.len());
        prop_assert_eq!(places(&rounding::value(value, decimals)), places(&text));
    }
}
