//! What was measured: `dcc:measurementResults`.

use super::administrative::{DECISION_RULE, ITEM, software};
use super::element::{Element, Leaf};
use super::quantity::{column, intercept_and_slope, quantity, quantity_with};
use crate::bench::Verdict;
use crate::certificate::content::{
    Calibration, Comparison, Conformity, Content, Equipment, Figure, File, NoUncertainty, PointRow, Row, Unit,
};

pub(super) fn measurement_results(content: &Content) -> Element {
    let results = content.calibrations().map(|calibration| measurement_result(content, calibration));
    Element::of("dcc:measurementResults", results.collect())
}

fn measurement_result(content: &Content, of: &Calibration) -> Element {
    let mut says = vec![
        format!("Run {} of {}.", of.run, of.taken.to_rfc3339()),
        format!("Purpose: {}.", of.purpose.name()),
        format!("Gas: {}.", of.gas),
    ];
    says.extend(of.technician.as_ref().map(|name| format!("Measured by {name}.")));
    let mut description = Element::facts("dcc:description", says);
    // The files stand with the results they gave, which are those of the first.
    if of.path == content.results.path
        && let super::element::Body::Elements(children) = &mut description.body
    {
        children.extend(content.files.iter().enumerate().map(|(i, one)| file(i + 1, one)));
    }
    let mut children = vec![
        Element::name(of.title),
        description,
        Element::of("dcc:usedMethods", vec![method(content, of)]),
        Element::of("dcc:usedSoftware", vec![software(content)]),
        Element::of("dcc:measuringEquipments", of.equipment.iter().map(equipment).collect()),
        Element::of(
            "dcc:influenceConditions",
            of.conditions
                .iter()
                .map(|condition| {
                    Element::of(
                        "dcc:influenceCondition",
                        vec![
                            Element::name(condition.name),
                            Element::facts("dcc:description", [condition.says]),
                            Element::of("dcc:data", vec![quantity(&condition.figure)]),
                        ],
                    )
                })
                .collect(),
        ),
        Element::of("dcc:results", results(content, of)),
    ];
    children.extend(of.conformity.as_ref().map(|conformity| {
        Element::of("dcc:measurementMetaData", vec![verdict("Conformity of the item", conformity)])
    }));
    Element::of("dcc:measurementResult", children).at(of.path).with("refId", ITEM)
}

fn file(number: usize, file: &File) -> Element {
    Element::of(
        "dcc:file",
        vec![
            Element::name(file.says),
            Element::facts("dcc:description", [format!("SHA-256 {}", file.sha256)]),
            Element::fact("dcc:fileName", &file.name),
            Element::fact("dcc:mimeType", file.mime),
            Element::leaf("dcc:dataBase64", Leaf::Bytes(file.bytes.clone())),
        ],
    )
    .at(&format!("file/{number}"))
}

fn method(content: &Content, of: &Calibration) -> Element {
    let method = &content.method;
    let mut children = vec![Element::name(method.name), Element::sentences("dcc:description", [method.says])];
    children.extend(method.norms.iter().map(|norm| Element::fact("dcc:norm", norm)));
    let stated = |key: &str, name: &str, value: f64, unit, decimals| {
        let path = format!("{}/method/{key}", of.path);
        let figure = Figure::plain(path, name, value, unit, decimals, NoUncertainty::Stated);
        let mut one = quantity(&figure);
        one.name = "dcc:usedMethodQuantity";
        one
    };
    children.push(Element::of(
        "dcc:usedMethodQuantities",
        vec![
            stated("revision", "revision of the method", f64::from(method.revision), Unit::One, 0),
            stated(
                "reference_temperature",
                "reference temperature of a volume flow (STPD)",
                0.0,
                Unit::DegreeCelsius,
                2,
            ),
            stated(
                "reference_pressure",
                "reference pressure of a volume flow (STPD)",
                101.325,
                Unit::KiloPascal,
                3,
            ),
            stated(
                "gas_temperature",
                "gas temperature at the orifice that flows are stated for",
                20.0,
                Unit::DegreeCelsius,
                0,
            ),
            stated("ambient", "ambient pressure of a stated gauge pressure", 101.325, Unit::KiloPascal, 3),
        ],
    ));
    Element::of("dcc:usedMethod", children).of_type("basic_calibrationMethod")
}

fn equipment(of: &Equipment) -> Element {
    let mut says: Vec<String> = of.papers.iter().map(|(name, text)| format!("{name}: {text}")).collect();
    says.push(of.due.map_or_else(
        || "no due date is stated".to_owned(),
        |due| format!("calibration in date until {due}"),
    ));
    says.extend((of.in_date == Some(false)).then(|| "out of date when the run was taken".to_owned()));
    let mut identifications = Vec::new();
    let mut identified = |issuer: &str, value: &Option<String>, name: &str| {
        identifications.extend(value.as_ref().map(|value| {
            Element::of(
                "dcc:identification",
                vec![
                    Element::fact("dcc:issuer", issuer),
                    Element::fact("dcc:value", value),
                    Element::name(name),
                ],
            )
        }));
    };
    identified("other", &of.certificate, "number of its calibration certificate");
    identified("calibrationLaboratory", &of.id, "name in the register");
    let mut children = vec![Element::name(of.name), Element::facts("dcc:description", says)];
    if !identifications.is_empty() {
        children.push(Element::of("dcc:identifications", identifications));
    }
    Element::of("dcc:measuringEquipment", children).at(&of.path).of_type("basic_measurementStandard")
}

fn results(content: &Content, of: &Calibration) -> Vec<Element> {
    let mut all = vec![
        result("Flow at the nominal intermediate pressure", &[&of.headline], nominal(of)),
        result("Line", &[&of.line.says], line(of)),
        result("Hole", &[of.hole.choke.says], hole(of)),
        result("Points", &[] as &[&str], points(of)),
        result("Flow against intermediate pressure", &[] as &[&str], table(&of.table)),
        result("Budget of the flow at the nominal intermediate pressure", &[] as &[&str], budget(of)),
        result("Checks", &[] as &[&str], checks(of)),
    ];
    all.extend(of.before.as_ref().map(|before| compared("Against the calibration before", before)));
    if of.path == content.results.path {
        all.extend(
            content.changed_by_work.as_ref().map(|work| compared("Change by the work on the item", work)),
        );
    }
    if !of.warnings.is_empty() {
        let text = Element::sentences("dcc:text", &of.warnings);
        all.push(result("To know", &[] as &[&str], vec![text]));
    }
    all
}

fn result(name: &str, says: &[impl AsRef<str>], data: Vec<Element>) -> Element {
    let mut children = vec![Element::name(name)];
    if !says.is_empty() {
        children.push(Element::sentences("dcc:description", says));
    }
    children.push(Element::of("dcc:data", data));
    Element::of("dcc:result", children)
}

fn nominal(of: &Calibration) -> Vec<Element> {
    let mut all = vec![quantity(&of.nominal.ip), quantity(&of.nominal.flow)];
    all.extend(of.nominal.as_oxygen.as_ref().map(quantity));
    if let Some(conformity) = &of.conformity {
        let mut meta = verdict("Conformity of the flow", conformity);
        if let super::element::Body::Elements(children) = &mut meta.body {
            let mut limits = vec![quantity(&conformity.nominal)];
            let words = ["basic_toleranceLimitLower", "basic_toleranceLimitUpper"];
            limits.extend(conformity.limits.iter().zip(words).map(|(f, word)| limit(f, word)));
            if let Some(guarded) = &conformity.guarded {
                let words = ["basic_acceptanceLimitLower", "basic_acceptanceLimitUpper"];
                limits.extend(guarded.iter().zip(words).map(|(f, word)| limit(f, word)));
            }
            children.push(Element::of("dcc:data", limits));
        }
        all.push(quantity_with(&conformity.judged, vec![meta]));
    }
    all
}

fn limit(figure: &Figure, term: &'static str) -> Element {
    quantity(figure).of_type(term)
}

/// A verdict with its rule, its probability and its reason.
fn verdict(name: &str, of: &Conformity) -> Element {
    Element::of(
        "dcc:metaData",
        vec![
            Element::name(name),
            Element::facts_and_sentences(
                "dcc:description",
                [
                    format!("Verdict: {}.", of.word),
                    format!("Rule: {}.", of.rule),
                    format!("Probability of conformity: {}.", of.probability),
                ],
                [&of.says],
            ),
            Element::fact(
                "dcc:conformity",
                match of.verdict {
                    Verdict::Pass => "pass",
                    Verdict::Fail => "fail",
                    // Neither found to conform nor found not to.
                    Verdict::Undecided | Verdict::None => "noPass",
                },
            ),
        ],
    )
    .of_type("basic_conformity")
    .with("refId", DECISION_RULE)
}

fn line(of: &Calibration) -> Vec<Element> {
    let line = &of.line;
    let used = format!("{} of {} points are used.", line.used_of.0, line.used_of.1);
    let mut all = vec![
        Element::facts("dcc:text", [used]),
        Element::of("dcc:formula", vec![Element::fact("dcc:latex", r"q = \alpha + \beta p_1")]),
        intercept_and_slope(line, &format!("{}/line", of.path)),
    ];
    all.extend(line.span.iter().map(quantity));
    all.extend(line.reduced_chi_square.as_ref().map(quantity));
    all
}

fn hole(of: &Calibration) -> Vec<Element> {
    let mut all = vec![quantity(&of.hole.choke.figure)];
    all.extend(of.hole.conductance.iter().chain(&of.hole.diameter).map(quantity));
    all
}

/// What no number says of the points: sweep, and whether and why one is not used.
fn points_says(of: &Calibration) -> Option<Element> {
    let said = of.points.iter().filter(|point| point.sweep.is_some() || point.why_not.is_some());
    let facts: Vec<String> = said
        .map(|point| {
            let not_used = point.why_not.is_some().then_some("not used");
            let words: Vec<&str> = point.sweep.into_iter().chain(not_used).collect();
            format!("Point {}: {}", point.number, words.join(", "))
        })
        .collect();
    let why = |point: &PointRow| point.why_not.as_ref().map(|why| format!("Point {} is {why}", point.number));
    let sentences = of.points.iter().filter_map(why);
    (!facts.is_empty()).then(|| Element::facts_and_sentences("dcc:text", facts, sentences))
}

fn points(of: &Calibration) -> Vec<Element> {
    let pressures: Vec<&Figure> = of.points.iter().map(|p| &p.pressure).collect();
    let flows: Vec<&Figure> = of.points.iter().map(|p| &p.flow).collect();
    let residuals: Vec<&Figure> = of.points.iter().filter_map(|p| p.residual.as_ref()).collect();
    let mut columns = column("absolute pressure before the orifice", &pressures);
    columns.extend(column("flow", &flows));
    columns.extend(column("residual from the line", &residuals));
    let mut data = vec![Element::of("dcc:list", columns)];
    data.extend(points_says(of));
    data
}

fn table(rows: &[Row]) -> Vec<Element> {
    let ips: Vec<&Figure> = rows.iter().map(|row| &row.ip).collect();
    let flows: Vec<&Figure> = rows.iter().map(|row| &row.flow).collect();
    let oxygen: Vec<&Figure> = rows.iter().filter_map(|row| row.as_oxygen.as_ref()).collect();
    let mut columns = column("intermediate pressure", &ips);
    columns.extend(column("flow", &flows));
    columns.extend(column("flow as oxygen", &oxygen));
    if columns.is_empty() {
        return vec![Element::facts("dcc:text", ["no step of the table lies within the points"])];
    }
    vec![Element::of("dcc:list", columns)]
}

fn budget(of: &Calibration) -> Vec<Element> {
    let rows = of.budget.rows.iter().chain([&of.budget.combined]);
    rows.map(|row| {
        let mut all = vec![quantity(&row.u), quantity(&row.share)];
        all.extend(row.dof.as_ref().map(quantity));
        let mut children = vec![Element::name(row.source)];
        children.extend(all);
        Element::of("dcc:list", children)
    })
    .collect()
}

fn checks(of: &Calibration) -> Vec<Element> {
    let mut all = Vec::new();
    for check in &of.checks {
        let fact = format!("{}: {}", check.name, check.word);
        all.push(Element::facts_and_sentences("dcc:text", [fact], [&check.says]));
        all.extend(check.value.iter().chain(&check.limits).map(quantity));
    }
    all
}

fn compared(name: &str, comparison: &Comparison) -> Element {
    let data = vec![quantity(&comparison.flow), quantity(&comparison.change), quantity(&comparison.en)];
    result(name, &[&comparison.says], data)
}
