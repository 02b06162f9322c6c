//! Who, what, for whom, when: `dcc:administrativeData`.

use super::element::Element;
use crate::certificate::content::{Content, PROGRAM, StatementKind};

/// Id of the decision rule, which conformity refers to.
pub(super) const DECISION_RULE: &str = "decision_rule";
/// Id of the item, which the results refer to.
pub(super) const ITEM: &str = "item";
/// Where the terms of `basic_` are explained.
const BASIC_TERMS: &str = "https://digilab.ptb.de/dkd/refType/vocab/";

/// Our own are explained by the certificate itself: each is the place of a figure in what is stated and computed.
const OWN_TERMS: &str = "#places";

pub(super) fn administrative_data(content: &Content) -> Element {
    Element::of(
        "dcc:administrativeData",
        vec![
            Element::of("dcc:dccSoftware", vec![software(content)]),
            Element::of(
                "dcc:refTypeDefinitions",
                vec![
                    terms("basic", "terms that hold for every kind of calibration", BASIC_TERMS),
                    terms(super::TERMS, "places of this document, the same in every certificate", OWN_TERMS),
                ],
            ),
            core_data(content),
            items(content),
            laboratory(content),
            persons(content),
            customer(content),
            statements(content),
        ],
    )
}

fn terms(namespace: &str, name: &str, link: &str) -> Element {
    Element::of(
        "dcc:refTypeDefinition",
        vec![Element::name(name), Element::fact("dcc:namespace", namespace), Element::fact("dcc:link", link)],
    )
}

/// The program.
pub(super) fn software(content: &Content) -> Element {
    Element::of(
        "dcc:software",
        vec![
            Element::name(PROGRAM),
            Element::fact("dcc:release", format!("v{}", content.method.program)),
            Element::fact("dcc:type", "application"),
        ],
    )
}

fn core_data(content: &Content) -> Element {
    let issue = &content.issue;
    let mut children = vec![
        Element::fact("dcc:countryCodeISO3166_1", &issue.country),
        Element::fact("dcc:usedLangCodeISO639_1", "en"),
        Element::fact("dcc:mandatoryLangCodeISO639_1", "en"),
        Element::fact("dcc:uniqueIdentifier", &issue.number),
    ];
    children.extend(issue.received.map(|day| Element::fact("dcc:receiptDate", day.to_string())));
    children.push(Element::fact("dcc:beginPerformanceDate", content.performed.0.to_string()));
    children.push(Element::fact("dcc:endPerformanceDate", content.performed.1.to_string()));
    let place = if issue.place.is_some() { "other" } else { "laboratory" };
    children.push(Element::fact("dcc:performanceLocation", place));
    children.push(Element::fact("dcc:issueDate", issue.issued.date_naive().to_string()));
    if let Some(amends) = &issue.amends {
        children.push(Element::of(
            "dcc:reportAmendedSubstituted",
            vec![
                Element::fact("dcc:typeOfChange", if amends.instead { "substituted" } else { "amended" }),
                Element::fact("dcc:replacedUniqueIdentifier", &amends.replaces),
            ],
        ));
        children.extend(amends.digest.as_ref().map(|digest| {
            Element::of(
                "dcc:previousReport",
                vec![
                    Element::facts(
                        "dcc:referral",
                        ["the certificate that this one amends or replaces, as XML"],
                    ),
                    Element::fact("dcc:referralID", &amends.replaces),
                    Element::fact("dcc:procedure", "SHA-256"),
                    Element::fact("dcc:value", digest),
                ],
            )
        }));
    }
    Element::of("dcc:coreData", children)
}

fn items(content: &Content) -> Element {
    let (issue, item) = (&content.issue, &content.issue.item);
    let name = item.description.as_deref().unwrap_or("orifice");
    let mut says = vec![format!("Build: {}.", item.build.name())];
    says.extend(issue.condition.as_ref().map(|condition| format!("Condition on receipt: {condition}")));
    says.extend((item.serial.is_none()).then(|| "The item bears no serial number.".to_owned()));
    let identification = |issuer: &str, value: &str, name: &str| {
        Element::of(
            "dcc:identification",
            vec![Element::fact("dcc:issuer", issuer), Element::fact("dcc:value", value), Element::name(name)],
        )
    };
    let mut identifications = Vec::new();
    identifications.extend(
        item.serial.as_ref().map(|serial| {
            identification("manufacturer", serial, "serial number").of_type("basic_serialNumber")
        }),
    );
    identifications.push(identification("calibrationLaboratory", item.id.as_str(), "name in the register"));
    let mut children = vec![Element::name(name), Element::facts("dcc:description", &says)];
    children
        .extend(item.maker.as_ref().map(|maker| Element::of("dcc:manufacturer", vec![Element::name(maker)])));
    children.push(Element::of("dcc:identifications", identifications));
    Element::of("dcc:items", vec![Element::of("dcc:item", children).with("id", ITEM)])
}

fn laboratory(content: &Content) -> Element {
    let issue = &content.issue;
    let shop = &issue.shop;
    let location = location(&shop.address, shop.contact.as_deref(), Some(&issue.country));
    Element::of(
        "dcc:calibrationLaboratory",
        vec![Element::of("dcc:contact", vec![Element::name(&shop.name), location])],
    )
}

fn customer(content: &Content) -> Element {
    let customer = &content.issue.customer;
    let location = location(&customer.address, customer.contact.as_deref(), None);
    Element::of("dcc:customer", vec![Element::name(&customer.name), location])
}

/// An address line by line; nothing is guessed of which line is the street and which the town.
fn location(address: &str, contact: Option<&str>, country: Option<&str>) -> Element {
    let lines: Vec<&str> = address.lines().map(str::trim).filter(|line| !line.is_empty()).collect();
    let mut children: Vec<Element> = Vec::new();
    children.extend((!lines.is_empty()).then(|| Element::facts("dcc:further", &lines)));
    children.extend(country.map(|country| Element::fact("dcc:countryCode", country)));
    children.extend(contact.map(|contact| Element::facts("dcc:further", [contact])));
    Element::of("dcc:location", children)
}

fn persons(content: &Content) -> Element {
    let person = |name: &str, role: Option<&str>, signs: bool| {
        let mut children = vec![Element::of("dcc:person", vec![Element::name(name)])];
        children.extend(role.map(|role| Element::fact("dcc:role", role)));
        children.push(Element::fact("dcc:mainSigner", if signs { "true" } else { "false" }));
        Element::of("dcc:respPerson", children)
    };
    let signatory = &content.issue.signatory;
    let mut persons = vec![person(&signatory.name, signatory.role.as_deref(), true)];
    for calibration in content.calibrations() {
        persons.extend(
            calibration
                .technician
                .as_ref()
                .map(|name| person(name, Some(&format!("measured run {}", calibration.run)), false)),
        );
    }
    Element::of("dcc:respPersons", persons)
}

fn statements(content: &Content) -> Element {
    let statement = |name: &str, text: &str, facts: bool| {
        let declaration = if facts {
            Element::facts("dcc:declaration", [text])
        } else {
            Element::sentences("dcc:declaration", [text])
        };
        Element::of("dcc:statement", vec![Element::name(name), declaration])
    };
    let mut all = vec![statement("Place of the work", &content.place, true)];
    all.extend(content.statements.iter().map(|said| {
        use StatementKind as Kind;
        // What a person or the book said stays as it is; our own sentences may be worded otherwise one day.
        let facts = !matches!(
            said.kind,
            Kind::Scope | Kind::Copying | Kind::Traceability | Kind::Uncertainty | Kind::DecisionRule
        );
        let one = statement(said.kind.name(), &said.text, facts);
        match said.kind {
            // An id that nothing refers to is against the rules.
            Kind::DecisionRule if content.calibrations().any(|c| c.conformity.is_some()) => {
                one.with("id", DECISION_RULE).of_type("basic_decisionRule")
            }
            Kind::Traceability => one.of_type("basic_metrologicallyTraceableToSI"),
            Kind::Uncertainty => one.of_type("basic_methodMeasurementUncertainty"),
            _ => one,
        }
    }));
    all.extend(content.cautions.iter().map(|caution| statement("Caution", caution, false)));
    Element::of("dcc:statements", all)
}
