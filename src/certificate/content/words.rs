//! The sentences of a certificate that are not those of a sheet.

use super::calibration::Row;
use super::issue::Issue;
use crate::bench::line::OrificeLine;
use crate::bench::{METHOD_REVISION, Verdict};
use crate::entry::{Purpose, Rule, Run};
use crate::gas::Species;
use crate::report::number::{figures, fixed};

/// Name of the program, as it stands on a certificate.
pub const PROGRAM: &str = "Ebbline";
/// Version of the program.
pub const VERSION: &str = env!("CARGO_PKG_VERSION");

pub(super) const TITLE: &str = "Calibration certificate";

pub(super) const METHOD: &str = "Flow of a choked orifice against upstream pressure, by comparison with a flow meter and a \
    pressure transducer";

pub(super) const METHOD_SAYS: &str = "The pressure before the orifice is stepped; at each steady point pressure and flow are \
    read and brought to absolute pressure and to flow at STPD for gas of 20 °C. A straight line with uncertainties in both \
    variables goes through the choked points; errors common to all points are carried beside the fit.";

/// What the method follows.
pub(super) const NORMS: &[&str] =
    &["ISO/TS 28037:2010, clause 7", "ISO 6358-1:2013", "JCGM 100:2008", "JCGM 106:2012"];

/// What a sentence of a certificate is about.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StatementKind {
    /// What the results relate to.
    Scope,
    /// How it may be copied.
    Copying,
    /// How the results are traceable.
    Traceability,
    /// What stands behind a stated uncertainty.
    Uncertainty,
    /// The decision rule.
    DecisionRule,
    /// What was done to the item between two runs.
    Work,
    /// What the customer supplied.
    Supplied,
    /// The certificate this one replaces, what changed and why.
    Amendment,
    /// When to calibrate again, as the customer asked.
    Interval,
    /// The state of the book when it was issued.
    Book,
    /// Of the shop, on every certificate.
    Shop,
    /// For this certificate alone.
    Remark,
}

impl StatementKind {
    /// Heading.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Scope => "Scope",
            Self::Copying => "Copying",
            Self::Traceability => "Traceability",
            Self::Uncertainty => "Uncertainty",
            Self::DecisionRule => "Decision rule",
            Self::Work => "Work on the item",
            Self::Supplied => "Supplied by the customer",
            Self::Amendment => "Amendment",
            Self::Interval => "Next calibration",
            Self::Book => "Record",
            Self::Shop => "Statement of the shop",
            Self::Remark => "Remark",
        }
    }
}

/// A sentence with what it is about.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Statement {
    /// What it is about.
    pub kind: StatementKind,
    /// The sentence.
    pub text: String,
}

fn statement(kind: StatementKind, text: impl Into<String>) -> Statement {
    Statement { kind, text: text.into() }
}

/// Everything a reader has to be told, in order. `rule` is that of the results, `verdict` what they were judged to be.
pub(super) fn statements(issue: &Issue, run: &Run, judged: Option<(Rule, Verdict)>) -> Vec<Statement> {
    use StatementKind as Kind;
    let mut all = vec![
        statement(
            Kind::Scope,
            "The results relate only to the item named here, as it was when it was tested.",
        ),
        statement(
            Kind::Copying,
            "This certificate may be copied only in full, unless whoever issued it agrees in writing.",
        ),
        statement(Kind::Traceability, traceability(run)),
        statement(
            Kind::Uncertainty,
            "U is the expanded uncertainty: the standard uncertainty times the coverage factor k stated with it, for a \
             coverage probability of 95 %. k is that of Student's t at the effective degrees of freedom (JCGM 100:2008, \
             annex G). Points carry the uncertainty of their random part alone, k = 2; what is common to all points is in \
             that of the line and of the flows.",
        ),
    ];
    match judged {
        Some((rule_of, verdict)) => {
            let more = match verdict {
                Verdict::Undecided => " The item is neither found to conform nor found not to conform.",
                Verdict::Fail => " The item is found not to conform.",
                Verdict::Pass | Verdict::None => "",
            };
            all.push(statement(Kind::DecisionRule, format!("{}{more}", rule(rule_of))));
        }
        None => all.push(statement(
            Kind::DecisionRule,
            "No limits were agreed: the certificate states results and no conformity.",
        )),
    }
    all.extend(issue.work_done.as_ref().map(|work| statement(Kind::Work, work.clone())));
    let supplied = &issue.supplied;
    all.extend((!supplied.is_empty()).then(|| {
        let list = supplied.join("; ");
        statement(Kind::Supplied, format!("Stated by the customer and not verified here: {list}."))
    }));
    all.extend(issue.amends.as_ref().map(|amends| {
        let text = format!(
            "This certificate {} certificate {}. Changed: {}. Reason: {}.",
            if amends.instead { "replaces" } else { "amends" },
            amends.replaces,
            amends.what.trim_end_matches('.'),
            amends.why.trim_end_matches('.')
        );
        statement(Kind::Amendment, text)
    }));
    all.extend(
        issue
            .interval
            .as_ref()
            .map(|interval| statement(Kind::Interval, format!("At the customer's request: {interval}"))),
    );
    all.extend(issue.chain_head.as_ref().map(|head| {
        let text = format!("Head of the chain of digests of the record book before this certificate: {head}");
        statement(Kind::Book, text)
    }));
    all.extend(issue.shop.statements.iter().map(|text| statement(Kind::Shop, text.clone())));
    all.extend(issue.remarks.iter().map(|text| statement(Kind::Remark, text.clone())));
    all
}

fn traceability(run: &Run) -> String {
    let named = |name: &str, certificate: &Option<String>| match certificate {
        Some(number) => format!("the {name} under certificate {number}"),
        None => format!("the {name}, for which no certificate is named"),
    };
    let meter = named("flow meter", &run.meter.papers.certificate);
    let transducer = named("pressure transducer", &run.transducer.papers.certificate);
    let whole = run.meter.papers.certificate.is_some() && run.transducer.papers.certificate.is_some();
    let as_far =
        if whole { "as far as those certificates are" } else { "only as far as those certificates reach" };
    format!("Measured with {meter} and {transducer}; the results are traceable {as_far}.")
}

/// A decision rule in words.
pub(super) const fn rule(rule: Rule) -> &'static str {
    match rule {
        Rule::Guarded => {
            "Guarded acceptance (ILAC-G8:09/2019, JCGM 106:2012): pass where the flow at the nominal pressure lies \
             within the limits by at least its expanded uncertainty (guard band w = U on both sides), fail where it lies \
             outside them by at least as much, else undecided. A check that does not hold, papers without the largest part \
             of an uncertainty, or a pressure beyond the points leave a pass undecided."
        }
        Rule::Simple => {
            "Simple acceptance (ILAC-G8:09/2019, JCGM 106:2012): pass where the flow at the nominal pressure lies within \
             the limits, fail where it lies outside; its uncertainty is not taken into account. A check that does not hold, \
             papers without the largest part of an uncertainty, or a pressure beyond the points leave a pass undecided."
        }
    }
}

/// The gas with its purity.
pub(super) fn gas(run: &Run) -> String {
    match (&run.purity, run.gas) {
        (Some(purity), Species::Oxygen) => {
            let decimals = if purity.expanded > 0.0 { 2 } else { 1 };
            format!(
                "oxygen of {} % ± {} % purity (k = 2)",
                fixed(purity.fraction * 100.0, decimals),
                figures(purity.expanded * 100.0, 2)
            )
        }
        _ => run.gas.name().to_owned(),
    }
}

/// The result in one sentence.
pub(super) fn headline(run: &Run, nominal: &Row) -> String {
    let k = |figure: &super::Figure| figure.printed_k().map_or(String::new(), |k| format!(", k = {k}"));
    let oxygen = nominal
        .as_oxygen
        .as_ref()
        .map_or(String::new(), |flow| format!("; as oxygen {}{}", flow.text(), k(flow)));
    format!(
        "At an intermediate pressure of {} bar the orifice passes {} of {} (95 %{}){oxygen}.",
        nominal.ip.printed(),
        nominal.flow.text(),
        run.gas.name(),
        k(&nominal.flow)
    )
}

/// What the errors of the line are.
pub(super) fn line(line: &OrificeLine) -> String {
    let widened = if line.random_dof.is_finite() && line.widened > 1.0 {
        format!(
            " The random part was widened {} times (Birge), with {} degrees of freedom.",
            figures(line.widened.sqrt(), 3),
            fixed(line.random_dof, 0)
        )
    } else {
        String::new()
    };
    format!(
        "q = α + β·p1, q flow at STPD for gas of 20 °C, p1 absolute pressure before the orifice. Standard errors are those \
         of ISO/TS 28037:2010, clause 7; variances and covariance hold random and common parts together.{widened}"
    )
}

/// The heading of the run before cleaning or adjustment.
pub(super) const AS_FOUND: &str = "As found, before the work";

/// The heading of the run the certificate rests on.
pub(super) const fn title(purpose: Purpose, with_as_found: bool) -> &'static str {
    match (purpose, with_as_found) {
        (Purpose::AsLeft, _) | (_, true) => "Results, as left",
        (Purpose::AsFound, false) => "Results, as found",
        _ => "Results",
    }
}

pub(super) fn method(program: &str) -> super::Method {
    super::Method {
        name: METHOD,
        says: METHOD_SAYS,
        norms: NORMS,
        revision: METHOD_REVISION,
        program: program.to_owned(),
    }
}
