//! The plots of a setting, looked at from outside: as text, as XML, as measured texts.

#![allow(clippy::unwrap_used, reason = "a picture that does not parse is a failure")]

use std::sync::OnceLock;

use crate::plot_checks::{
    holds_only_shapes_and_texts, is_golden, middle, numbers_are_finite_and_inside, of_class, paths, places,
    texts_stand_apart, tick_labels, told, units,
};
use crate::setting_support::*;
use ebbline::plot::{SettingPlot, depth_plot, ip_plot, setting_plot};
use ebbline::quantity::Length;
use ebbline::setting::{FirstStageKind, OrificeInput, Setting, SettingOptions, Standing, setting};
use proptest::prelude::*;

/// Golden pictures: setting, panels, width, height.
const GOLDEN: [(&str, &str, u32, u32); 11] = [
    ("fresh-water", "depth", 960, 560),
    ("uncompensated", "both", 960, 800),
    ("uncompensated", "both", 480, 800),
    ("uncompensated", "depth", 960, 560),
    ("uncompensated", "ip", 480, 480),
    ("compensated", "both", 1600, 1200),
    ("compensated-too-deep", "depth", 960, 560),
    ("no-setting", "both", 960, 800),
    ("two-orifices", "both", 960, 800),
    ("five-orifices", "ip", 960, 560),
    ("hostile-texts", "both", 960, 800),
];

/// Sizes every setting is measured at.
const SIZES: [(u32, u32); 6] = [(400, 320), (480, 640), (600, 900), (960, 800), (1600, 1200), (2000, 700)];

const NAMES: [&str; 11] = [
    "uncompensated",
    "fresh-water",
    "compensated",
    "compensated-too-deep",
    "judged",
    "no-setting",
    "no-uptake",
    "two-orifices",
    "five-orifices",
    "fine-division",
    "hostile-texts",
];

/// A setting to draw.
#[derive(Clone)]
struct Drawn {
    setting: Setting,
    options: SettingPlot,
}

impl Drawn {
    fn sized(&self, width: u32, height: u32) -> SettingPlot {
        SettingPlot { width, height, ..self.options.clone() }
    }

    fn of(&self, panels: &str, width: u32, height: u32) -> String {
        let options = self.sized(width, height);
        match panels {
            "both" => setting_plot(&self.setting, &options),
            "depth" => depth_plot(&self.setting, &options),
            _ => ip_plot(&self.setting, &options),
        }
    }
}

fn named(name: &str) -> Drawn {
    let usual = SettingOptions::default();
    let one = [orifice("CMF-0417", bench_line(0.028))];
    let m = diver(0.32, 0.022, 9.0);
    let drawn = |orifices: &[OrificeInput], options: &SettingOptions, why_not: Option<&str>| Drawn {
        setting: setting(orifices, Some(&m), options).unwrap(),
        options: SettingPlot { why_not: why_not.map(str::to_owned), ..SettingPlot::default() },
    };
    let compensated = |max_m: f64| SettingOptions {
        first_stage: FirstStageKind::Compensated,
        max_depth: Some(Length::from_m(max_m)),
        ..known()
    };
    match name {
        "uncompensated" => {
            drawn(&one, &SettingOptions { max_depth: Some(Length::from_m(40.0)), ..known() }, None)
        }
        "fresh-water" => {
            let water = Some(ebbline::gas::Water::Fresh);
            // The run says little of the choke ratio: the two curves part.
            let mut one = one;
            one[0].choke.interval_95 = (0.18, 0.52);
            drawn(&one, &SettingOptions { water, dive_at: barometer(0.82, 0.002), ..known() }, None)
        }
        "compensated" => drawn(&one, &compensated(12.0), None),
        // Judged for the surface's IP, it overfeeds at depth.
        "compensated-too-deep" => {
            let options = SettingOptions { judge: Some(gauge(8.6)), ..compensated(30.0) };
            drawn(
                &one,
                &options,
                Some("too lean at the surface when it is held to 30 m: an orifice that fits is none"),
            )
        }
        "judged" => drawn(&one, &SettingOptions { judge: Some(gauge(10.4)), ..known() }, None),
        "no-setting" => {
            let large = [orifice("CMF-0900", bench_line(0.060))];
            let options = SettingOptions { ip_range: Some((gauge(5.0), gauge(12.0))), ..known() };
            let why = "even 5 bar, the lowest IP of the range, injects too much: the hole is too large";
            drawn(&large, &options, Some(why))
        }
        "no-uptake" => Drawn {
            setting: setting(&one, None, &usual).unwrap(),
            options: SettingPlot {
                why_not: Some("there is no uptake to set by: measure it first".to_owned()),
                ..SettingPlot::default()
            },
        },
        "two-orifices" => {
            let failed = OrificeInput { standing: Standing::Failed, ..orifice("CMF-0500", bench_line(0.03)) };
            let other = orifice("CMF-0333", bench_line(0.0245));
            drawn(&[one[0].clone(), other, failed], &known(), None)
        }
        "five-orifices" => {
            let orifices: Vec<OrificeInput> = [0.020, 0.024, 0.028, 0.032, 0.040]
                .into_iter()
                .enumerate()
                .map(|(i, slope)| orifice(&format!("CMF-{i}"), bench_line(slope)))
                .collect();
            drawn(&orifices, &known(), None)
        }
        "fine-division" => drawn(&one, &SettingOptions { gauge_division: bar(0.01), ..usual }, None),
        "hostile-texts" => {
            let mut failed = orifice("Отверстие_ЖЩШЮжщшюЫы-Ünïté-12", bench_line(0.05));
            failed.standing = Standing::Failed;
            let other = orifice("Отверстие_ЖЩШЮжщшюЫы-Ünïté-13", bench_line(0.060));
            let options = SettingOptions { ip_range: Some((gauge(5.0), gauge(12.0))), ..known() };
            drawn(
                &[other, failed],
                &options,
                Some(&"</text><g onload=\"x\">шланг\u{202e} отошёл\u{0} <&\"> ".repeat(6)),
            )
        }
        _ => panic!("no setting {name}"),
    }
}

/// What a careful shop knows: a gauge compared, a spread read off, the place.
fn known() -> SettingOptions {
    SettingOptions {
        gauge_error: bar(0.1),
        ip_spread: bar(0.2),
        ip_repeat: bar(0.05),
        set_at: barometer(1.013, 0.002),
        dive_at: barometer(1.013, 0.02),
        ..SettingOptions::default()
    }
}

fn all() -> &'static [(&'static str, Drawn)] {
    static ALL: OnceLock<Vec<(&str, Drawn)>> = OnceLock::new();
    ALL.get_or_init(|| NAMES.into_iter().map(|name| (name, named(name))).collect())
}

fn drawn(name: &str) -> &'static Drawn {
    &all().iter().find(|(n, _)| *n == name).unwrap().1
}

const PANELS: [&str; 3] = ["both", "depth", "ip"];

#[test]
fn pictures_are_those_that_were_looked_at() {
    for (name, panels, width, height) in GOLDEN {
        is_golden(&format!("setting-{name}-{panels}-{width}.svg"), &drawn(name).of(panels, width, height));
    }
}

#[test]
fn a_picture_holds_only_shapes_texts_and_their_attributes() {
    for (name, made) in all() {
        for panels in PANELS {
            let mut made = made.clone();
            made.options.id_prefix = "shop-7".to_owned();
            let svg = made.of(panels, 960, 800);
            holds_only_shapes_and_texts(name, &svg, "shop-7-");
            numbers_are_finite_and_inside(&svg);
            assert_eq!(svg, made.of(panels, 960, 800), "{name}: two pictures");
        }
    }
    let mut made = drawn("judged").clone();
    made.options.id_prefix = "\" onload=\"x".to_owned();
    holds_only_shapes_and_texts("a hostile prefix", &made.of("both", 960, 800), "onloadx-");
}

#[test]
fn every_text_lies_inside_and_no_two_touch() {
    for (name, made) in all() {
        for (width, height) in SIZES {
            for panels in PANELS {
                texts_stand_apart(&format!("{name}, {panels}"), &made.of(panels, width, height));
            }
        }
    }
}

/// x of a number on the lower axis of the lowest panel, by its ticks.
fn x_of(svg: &str) -> impl Fn(f64) -> f64 {
    let labels = tick_labels(svg);
    let lowest = labels.iter().map(|l| l.2).fold(0.0, f64::max);
    let on_axis: Vec<(f64, f64)> =
        labels.iter().filter(|l| (l.2 - lowest).abs() < 1e-9).map(|l| (l.0.parse().unwrap(), l.1)).collect();
    let (first, last) = (on_axis[0], on_axis[on_axis.len() - 1]);
    move |value| first.1 + (value - first.0) / (last.0 - first.0) * (last.1 - first.1)
}

/// Middle of each path of a class.
fn marks(svg: &str, class: &str) -> Vec<(f64, f64)> {
    paths(svg, class)
        .iter()
        .map(|d| {
            // A circle begins at its left and its arcs name their right and left end.
            let ends: Vec<&str> = d.split('A').collect();
            if ends.len() < 2 {
                return middle(d);
            }
            let start = places(ends[0])[0];
            let right: Vec<f64> = ends[1].split(' ').filter_map(|s| s.parse().ok()).collect();
            (0.5 * (start.0 + right[right.len() - 2]), start.1)
        })
        .collect()
}

#[test]
fn depths_are_marked_at_the_x_of_their_numbers() {
    for name in ["uncompensated", "fresh-water", "compensated", "compensated-too-deep"] {
        let made = drawn(name);
        let svg = made.of("depth", 1600, 900);
        let x = x_of(&svg);
        let described = match made.setting.recommended() {
            Some((_, described)) => described,
            None => &made.setting.orifices[0].judged.as_ref().unwrap().described,
        };
        let depth = &described.depth;
        let deepest = depth.rows.last().unwrap().depth_m;
        let wanted: Vec<f64> = [
            depth.one_percent.map(|p| p.depth_m),
            depth.nine_tenths.map(|p| p.depth_m),
            depth.stops.map(|p| p.depth_m),
            depth.overtakes_at_m,
            depth.overtakes_at_best_estimate_m,
        ]
        .into_iter()
        .flatten()
        .filter(|m| *m <= deepest)
        .collect();
        let drawn = marks(&svg, "plot-mark");
        assert_eq!(drawn.len(), wanted.len(), "{name}: {wanted:?}");
        assert!(!drawn.is_empty(), "{name}");
        for (mark, wanted) in drawn.iter().zip(&wanted) {
            // Two decimals in ticks and marks; a triangle's and a diamond's middle is that of its outline.
            assert!((mark.0 - x(*wanted)).abs() < 0.1, "{name}: {mark:?} for {wanted} m at {}", x(*wanted));
        }
        let legend = of_class(&svg, "plot-legend").join(" ").replace('\u{a0}', " ");
        for wanted in wanted {
            // Rounded down, so that no depth is given too deep.
            let text = format!("{:.1} m, ", (wanted * 10.0 + 1e-6).floor() / 10.0);
            assert!(legend.contains(&text), "{name}: {text} in {legend}");
        }
    }
}

#[test]
fn curves_are_those_of_the_rows() {
    let made = drawn("uncompensated");
    let svg = made.of("depth", 1600, 900);
    let (x, rows) = (x_of(&svg), &made.setting.recommended().unwrap().1.depth.rows);
    for class in ["plot-best", "plot-lowest"] {
        let curve = places(&paths(&svg, class)[0]);
        assert_eq!(curve.len(), rows.len(), "{class}");
        assert!(curve.iter().zip(rows).all(|(p, row)| (p.0 - x(row.depth_m)).abs() < 0.1), "{class}");
    }
    // The lowest likely choke ratio never lies above the best estimate.
    let (best, lowest) = (places(&paths(&svg, "plot-best")[0]), places(&paths(&svg, "plot-lowest")[0]));
    assert!(best.iter().zip(&lowest).all(|(b, l)| b.1 <= l.1 + 0.02));
    // Of a compensated first stage the rows beyond the bench span are dashed.
    let deep = drawn("compensated-too-deep").of("depth", 1600, 900);
    assert_eq!(paths(&deep, "plot-best-beyond").len(), 1);
    assert!(of_class(&deep, "plot-legend").join(" ").contains("beyond what the bench measured"));
}

#[test]
fn the_ip_to_set_stands_under_the_band_at_its_number() {
    for (name, made) in all() {
        let Some((_, described)) = made.setting.recommended() else { continue };
        for (width, height) in [(480, 480), (960, 560), (1600, 900)] {
            let svg = made.of("ip", width, height);
            let chosen = marks(&svg, "plot-chosen")[0];
            let band = places(&paths(&svg, "plot-band-edge")[0]);
            let lowest = band.iter().map(|p| p.1).fold(0.0, f64::max);
            assert!(chosen.1 > lowest, "{name}: {chosen:?} and the band down to {lowest}");
            let x = x_of(&svg)(described.at.ip_bar_gauge);
            assert!((chosen.0 - x).abs() < 0.1, "{name}: {chosen:?} for {x}");
        }
    }
}

#[test]
fn the_ip_never_to_exceed_is_an_upright_at_its_number() {
    for (name, made) in all() {
        let svg = made.of("ip", 960, 560);
        let uprights = paths(&svg, "plot-never");
        let own = made.setting.recommended.and_then(|i| made.setting.orifices.get(i));
        let Some(never) = own.or(made.setting.orifices.first()).unwrap().never_exceed_ip_bar_gauge else {
            assert!(uprights.is_empty(), "{name}");
            continue;
        };
        let x = x_of(&svg)(never);
        let upright = places(&uprights[0]);
        assert!(
            (upright[0].0 - x).abs() < 0.1 && (upright[1].0 - x).abs() < 0.1,
            "{name}: {upright:?} for {x}"
        );
        assert!(of_class(&svg, "plot-never-above").concat().contains("Never above"), "{name}");
    }
}

#[test]
fn the_margin_says_what_is_set_or_that_nothing_is() {
    let svg = drawn("uncompensated").of("both", 960, 800);
    let at = &drawn("uncompensated").setting.recommended().unwrap().1.at;
    assert_eq!(
        of_class(&svg, "plot-set").concat().replace('\u{a0}', " "),
        format!("{} bar gauge", at.ip_bar_gauge)
    );
    let facts = of_class(&svg, "plot-fact").join(" ").replace('\u{a0}', " ");
    for part in [
        format!("Injects {:.3}", at.surface.nominal_l_min),
        "Chance of overfeed".to_owned(),
        "2.5 %".to_owned(),
    ] {
        assert!(facts.contains(&part), "{part} in {facts}");
    }
    let legend = of_class(&svg, "plot-legend").join(" ").replace('\u{a0}', " ");
    for part in [
        "another day's uptake 0.32",
        "choke limit, one per cent",
        "a tenth lost",
        "flow stops",
        "divisions of the gauge, 0.1 bar",
        "max. depth 40 m",
    ] {
        assert!(legend.contains(part), "{part} in {legend}");
    }
    for name in ["no-setting", "no-uptake", "hostile-texts"] {
        let svg = drawn(name).of("both", 960, 800);
        assert_eq!(of_class(&svg, "plot-no-setting"), ["No setting"], "{name}");
        assert!(marks(&svg, "plot-chosen").is_empty() && of_class(&svg, "plot-set").is_empty(), "{name}");
        assert!(!of_class(&svg, "plot-no-curve").is_empty(), "{name}");
        assert!(told(&svg).1.contains("No setting: "), "{name}");
    }
    // Lines and band are there all the same.
    let svg = drawn("no-setting").of("ip", 960, 560);
    assert!(!paths(&svg, "plot-other").is_empty() && !paths(&svg, "plot-band-edge").is_empty());
    assert!(of_class(&svg, "plot-why").join(" ").contains("the hole is too large"));
}

#[test]
fn several_orifices_have_a_line_and_a_name_each() {
    let svg = drawn("five-orifices").of("ip", 1600, 900);
    let names = of_class(&svg, "plot-line-name");
    assert_eq!(names.len(), 5, "{names:?}");
    let svg = drawn("two-orifices").of("ip", 960, 560);
    assert_eq!(of_class(&svg, "plot-line-name").len(), 2);
    assert_eq!(of_class(&svg, "plot-refused").concat(), "CMF-0500: no setting");
    let document = resvg::usvg::roxmltree::Document::parse(&svg).unwrap();
    let dashes = |class: &str| {
        let node = document.descendants().find(|n| n.attribute("class") == Some(class)).unwrap();
        node.attribute("stroke-dasharray").map(str::to_owned)
    };
    assert!(dashes("plot-best").is_none() && dashes("plot-other").is_some());
    assert_ne!(dashes("plot-never"), dashes("plot-other"));
}

#[test]
fn a_judged_ip_has_a_mark_of_its_own() {
    let svg = drawn("judged").of("ip", 1600, 900);
    let x = x_of(&svg)(10.4);
    assert!((marks(&svg, "plot-judged")[0].0 - x).abs() < 0.1);
    let said = of_class(&svg, "plot-judgement").join(" ").replace('\u{a0}', " ");
    assert!(said.contains("10.4 bar gauge injects 0.") && said.contains("against it"), "{said}");
    assert!(marks(&drawn("uncompensated").of("ip", 960, 560), "plot-judged").is_empty());
}

#[test]
fn hostile_texts_are_shown_as_they_are_and_do_nothing() {
    let svg = drawn("hostile-texts").of("both", 960, 800);
    assert!(of_class(&svg, "plot-why").join(" ").contains("</text><g onload=\"x\">шланг отошёл <&\">"));
    assert!(of_class(&svg, "plot-refused").join(" ").contains("Отверстие_ЖЩШЮжщшюЫы-Ünïté-12: no setting"));
    for gone in ['\u{202e}', '\u{0}'] {
        assert!(!svg.contains(gone), "{gone:?}");
    }
}

#[test]
fn units_change_numbers_and_titles() {
    let mut made = drawn("uncompensated").clone();
    made.options.units = units("psi,mL/min,ft");
    let svg = made.of("both", 960, 800);
    let titles = of_class(&svg, "plot-axis-title").join("; ");
    for part in ["mL/min STPD", "depth, ft", "psi absolute", "psi gauge", "IP, bar gauge"] {
        assert!(titles.contains(part), "{part} in {titles}");
    }
    let titles = of_class(&drawn("uncompensated").of("both", 960, 800), "plot-axis-title").join("; ");
    for part in ["L/min STPD", "depth, m", "bar absolute", "bar gauge", "IP, psi gauge"] {
        assert!(titles.contains(part), "{part} in {titles}");
    }
}

#[test]
fn sizes_beyond_reason_are_brought_back() {
    for (panels, asked, got) in [
        ("both", (0, 0), (400, 480)),
        ("ip", (0, 0), (400, 320)),
        ("depth", (u32::MAX, 1), (8000, 320)),
        ("both", (777, 555), (777, 555)),
    ] {
        let svg = drawn("uncompensated").of(panels, asked.0, asked.1);
        assert!(svg.contains(&format!("viewBox=\"0 0 {}.00 {}.00\"", got.0, got.1)), "{asked:?}");
    }
}

/// A number as a broken setting could hold it.
fn any_number() -> impl Strategy<Value = f64> {
    prop_oneof![
        4 => -2.0..120.0f64,
        2 => 0.0..0.6f64,
        1 => prop_oneof![
            Just(0.0), Just(-0.0), Just(f64::NAN), Just(f64::INFINITY), Just(f64::NEG_INFINITY), Just(f64::MAX),
            Just(f64::MIN_POSITIVE), Just(1e-9), Just(1e11), Just(-1e11)
        ],
    ]
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 128, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn whatever_the_numbers_the_picture_is_well_formed_and_finite(
        which in 0usize..NAMES.len(),
        panels in 0usize..3,
        n in prop::collection::vec(any_number(), 24),
        recommended in prop::option::of(0usize..6),
        why in any::<String>(),
        size in (0u32..2500, 0u32..2500),
    ) {
        let mut made = all()[which].1.clone();
        let set = &mut made.setting;
        set.recommended = recommended;
        set.used.gauge_division_bar = n[0];
        set.used.max_depth_m = Some(n[1]);
        set.used.dive_at_bar_abs = n[2];
        if let Some(uptake) = &mut set.uptake {
            (uptake.uptake_l_min, uptake.u_l_min, uptake.dof) = (n[3], n[4], n[5]);
        }
        for (i, orifice) in set.orifices.iter_mut().enumerate() {
            orifice.never_exceed_ip_bar_gauge = Some(n[6]);
            for (j, row) in orifice.table.iter_mut().enumerate().take(12) {
                row.surface.nominal_l_min = n[(i + j) % 24];
                row.ip_bar_gauge = n[(i + j + 7) % 24];
            }
            let judged = orifice.judged.as_mut().map(|j| &mut j.described);
            for described in orifice.answer.as_mut().ok().into_iter().chain(judged) {
                described.at.ip_bar_gauge = n[7];
                described.at.overfeed_chance = n[8];
                described.at.shortfall_l_min = n[9];
                if let Some(point) = &mut described.depth.one_percent {
                    (point.depth_m, point.ambient_bar_abs) = (n[10], n[11]);
                }
                described.depth.overtakes_at_m = Some(n[12]);
                described.depth.choke_ratio_low = n[13];
                for (j, row) in described.depth.rows.iter_mut().enumerate().take(20) {
                    (row.depth_m, row.injection_l_min, row.lowest_l_min) =
                        (n[j % 24], n[(j + 5) % 24], n[(j + 11) % 24]);
                }
            }
        }
        made.options.why_not = Some(why);
        numbers_are_finite_and_inside(&made.of(PANELS[panels], size.0, size.1));
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn texts_stand_apart_at_any_size_and_in_any_unit(
        which in 0usize..NAMES.len(),
        panels in 0usize..3,
        width in 400u32..2000,
        height in 320u32..1400,
        shown in prop_oneof![Just(""), Just("psi,ft"), Just("kPa,mL/min"), Just("hPa,ft³/h"), Just("psi,L/h")],
    ) {
        let (name, made) = &all()[which];
        let mut made = made.clone();
        made.options.units = units(shown);
        texts_stand_apart(&format!("{name}, {}, \"{shown}\"", PANELS[panels]), &made.of(PANELS[panels], width, height));
    }
}
