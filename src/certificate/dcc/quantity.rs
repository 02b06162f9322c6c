//! Figures as quantities of the D-SI: alone, in lists, with the covariance of the line.

use super::element::{Element, Leaf};
use crate::certificate::content::{
    Dsi, Figure, K_DECIMALS, LineFigures, NoUncertainty, Uncertainty, probability,
};

/// Coverage factor of a region of two dimensions that holds 95 % of a normal distribution: √(−2·ln 0.05), exact to
/// two decimals (JCGM 102:2011, 6.5.2.3).
const K_OF_TWO: f64 = 2.447_747;
/// What that covers.
const P_OF_TWO: f64 = 0.95;

/// One figure as a quantity with its id, its name, and what it refers to.
pub(super) fn quantity(figure: &Figure) -> Element {
    let mut children = vec![Element::name(&figure.name)];
    children.extend(description(figure));
    children.push(forms(figure.unit.dsi(), "si:hybrid", |form| real(figure, form)));
    element(figure, children)
}

/// As [`quantity`], with meta data behind it.
pub(super) fn quantity_with(figure: &Figure, meta: Vec<Element>) -> Element {
    let mut quantity = quantity(figure);
    if let super::element::Body::Elements(children) = &mut quantity.body
        && !meta.is_empty()
    {
        children.push(Element::of("dcc:measurementMetaData", meta));
    }
    quantity
}

/// Figures of one column: one list where they are known in the same way, else one by one. `name` is that of the column.
pub(super) fn column(name: &str, figures: &[&Figure]) -> Vec<Element> {
    let Some(first) = figures.first() else { return Vec::new() };
    let kind = std::mem::discriminant(&first.uncertainty);
    let alike = figures.iter().all(|f| {
        std::mem::discriminant(&f.uncertainty) == kind
            && f.unit == first.unit
            && f.reference == first.reference
    });
    if !alike || matches!(first.uncertainty, Uncertainty::Interval { .. }) {
        return figures.iter().map(|figure| quantity(figure)).collect();
    }
    let mut children = vec![Element::name(name)];
    children.extend(description(first));
    children.push(forms(first.unit.dsi(), "si:hybrid", |form| list(figures, form)));
    let path = first.path.rsplit_once('/').map_or(first.path.as_str(), |(column, _)| column);
    let refers = first_reference(first);
    vec![Element::of("dcc:quantity", children).at(path).of_type(refers)]
}

/// Intercept and slope with their covariance.
pub(super) fn intercept_and_slope(line: &LineFigures, path: &str) -> Element {
    let (a, b) = (&line.intercept, &line.slope);
    let [va, cov, vb] = &line.covariance;
    // The forms of α and of β stand side by side: those of β with kilopascal, then those with bar.
    let forms_of = |i: usize| {
        let of = |f: &Figure| {
            let all = f.unit.dsi();
            all.get(i).or(all.first()).copied().unwrap_or(Dsi { unit: r"\one", power: 0 })
        };
        let (fa, fb, fva, fcov, fvb) = (of(a), of(b), of(va), of(cov), of(vb));
        let pair = |x: (&Figure, Dsi), y: (&Figure, Dsi)| {
            let number = |(f, d): (&Figure, Dsi)| Leaf::number(f.value, f.decimals, d.power);
            Element::of(
                "si:columnXMLList",
                vec![Element::of(
                    "si:covarianceXMLList",
                    vec![
                        Element::list("si:valueXMLList", vec![number(x), number(y)]),
                        units("si:unitXMLList", [x.1.unit, y.1.unit]),
                    ],
                )],
            )
        };
        let k_of = |f: &Figure| match f.uncertainty {
            Uncertainty::Expanded { k, .. } => Leaf::number(k, K_DECIMALS, 0),
            _ => Leaf::Fact("NaN".to_owned()),
        };
        let u_of = |f: &Figure, d: Dsi| match f.uncertainty {
            Uncertainty::Expanded { expanded, .. } => Leaf::expanded(expanded, d.power),
            _ => Leaf::Fact("NaN".to_owned()),
        };
        Element::of(
            "si:realListXMLList",
            vec![
                Element::list(
                    "si:labelXMLList",
                    vec![Leaf::Fact("intercept".to_owned()), Leaf::Fact("slope".to_owned())],
                ),
                Element::list("si:valueXMLList", vec![value_of(a, fa), value_of(b, fb)]),
                units("si:unitXMLList", [fa.unit, fb.unit]),
                Element::of(
                    "si:measurementUncertaintyUnivariateXMLList",
                    vec![Element::of(
                        "si:expandedMUXMLList",
                        vec![
                            Element::list("si:valueExpandedMUXMLList", vec![u_of(a, fa), u_of(b, fb)]),
                            Element::list("si:coverageFactorXMLList", vec![k_of(a), k_of(b)]),
                            Element::list(
                                "si:coverageProbabilityXMLList",
                                vec![Leaf::Fact(a.printed_p().unwrap_or_default())],
                            ),
                        ],
                    )],
                ),
                Element::of(
                    "si:measurementUncertaintyMultivariateXMLList",
                    vec![Element::of(
                        "si:ellipsoidalRegionMUXMLList",
                        vec![
                            Element::of(
                                "si:covarianceMatrixXMLList",
                                vec![pair((va, fva), (cov, fcov)), pair((cov, fcov), (vb, fvb))],
                            ),
                            Element::list(
                                "si:coverageFactorXMLList",
                                vec![Leaf::number(K_OF_TWO, K_DECIMALS, 0)],
                            ),
                            Element::list(
                                "si:coverageProbabilityXMLList",
                                vec![Leaf::Fact(probability(P_OF_TWO))],
                            ),
                            Element::list("si:distributionXMLList", vec![Leaf::Fact("normal".to_owned())]),
                        ],
                    )],
                ),
            ],
        )
    };
    let mut children = vec![Element::name("intercept α and slope β with their covariance")];
    children.extend(description(a));
    children.push(Element::of("si:hybrid", vec![forms_of(0), forms_of(1)]));
    Element::of("dcc:quantity", children).at(path).of_type("basic_formulaParameter")
}

fn element(figure: &Figure, children: Vec<Element>) -> Element {
    Element::of("dcc:quantity", children).at(&figure.path).of_type(first_reference(figure))
}

const fn first_reference(figure: &Figure) -> &'static str {
    match figure.uncertainty {
        Uncertainty::Expanded { .. } | Uncertainty::Interval { .. } => "basic_measuredValue",
        Uncertainty::None(NoUncertainty::Stated) => "basic_nominalValue",
        Uncertainty::None(_) => "basic_otherValue",
    }
}

/// What a figure refers to, and why it has no uncertainty where it has none.
fn description(figure: &Figure) -> Option<Element> {
    let reference = figure.reference.map(|reference| reference.says());
    let none = match figure.uncertainty {
        Uncertainty::None(why) => Some(why.says()),
        _ => None,
    };
    let says: Vec<&str> = reference.into_iter().chain(none).collect();
    (!says.is_empty()).then(|| Element::sentences("dcc:description", [says.join("; ")]))
}

/// One form stands alone, several in a hybrid.
fn forms(all: &'static [Dsi], hybrid: &'static str, form: impl Fn(Dsi) -> Element) -> Element {
    match all {
        [one] => form(*one),
        _ => Element::of(hybrid, all.iter().map(|one| form(*one)).collect()),
    }
}

/// The value, to the place of its uncertainty where it has one.
fn value_of(figure: &Figure, form: Dsi) -> Leaf {
    match figure.uncertainty {
        Uncertainty::Expanded { .. } => Leaf::measured(figure.value, figure.decimals, form.power),
        _ => Leaf::number(figure.value, figure.decimals, form.power),
    }
}

fn units(name: &'static str, units: impl IntoIterator<Item = &'static str>) -> Element {
    Element::list(name, units.into_iter().map(|unit| Leaf::Fact(unit.to_owned())).collect())
}

fn real(figure: &Figure, form: Dsi) -> Element {
    let number = |x: f64| Leaf::number(x, figure.decimals, form.power);
    let mut children =
        vec![Element::leaf("si:value", value_of(figure, form)), Element::fact("si:unit", form.unit)];
    let uncertainty = match figure.uncertainty {
        Uncertainty::Expanded { expanded, k, p } => Some(Element::of(
            "si:expandedMU",
            vec![
                Element::leaf("si:valueExpandedMU", Leaf::expanded(expanded, form.power)),
                Element::leaf("si:coverageFactor", Leaf::number(k, K_DECIMALS, 0)),
                Element::fact("si:coverageProbability", probability(p)),
            ],
        )),
        Uncertainty::Interval { standard, low, high, p } => Some(Element::of(
            "si:coverageIntervalMU",
            vec![
                Element::leaf("si:valueStandardMU", Leaf::expanded(standard, form.power)),
                Element::leaf("si:intervalMin", number(low)),
                Element::leaf("si:intervalMax", number(high)),
                Element::fact("si:coverageProbability", probability(p)),
            ],
        )),
        Uncertainty::None(_) => None,
    };
    children.extend(uncertainty.map(|u| Element::of("si:measurementUncertaintyUnivariate", vec![u])));
    Element::of("si:real", children)
}

fn list(figures: &[&Figure], form: Dsi) -> Element {
    let mut children = vec![
        Element::list("si:valueXMLList", figures.iter().map(|f| value_of(f, form)).collect()),
        units("si:unitXMLList", [form.unit]),
    ];
    let mut expanded_of = Vec::new();
    let mut factors = Vec::new();
    let mut probabilities = Vec::new();
    for figure in figures {
        if let Uncertainty::Expanded { expanded, k, p } = figure.uncertainty {
            expanded_of.push(Leaf::expanded(expanded, form.power));
            factors.push(Leaf::number(k, K_DECIMALS, 0));
            probabilities.push(Leaf::Fact(probability(p)));
        }
    }
    if !expanded_of.is_empty() {
        children.push(Element::of(
            "si:measurementUncertaintyUnivariateXMLList",
            vec![Element::of(
                "si:expandedMUXMLList",
                vec![
                    Element::list("si:valueExpandedMUXMLList", expanded_of),
                    Element::list("si:coverageFactorXMLList", factors),
                    Element::list("si:coverageProbabilityXMLList", probabilities),
                ],
            )],
        ));
    }
    Element::of("si:realListXMLList", children)
}
