//! Whether a content is whole: everything that forbids issuing it, all at once.
//!
//! Comes in: a [`Content`]. Goes out: a [`Problem`] for each thing that is missing, impossible or hidden, naming the field
//! and what to do; nothing is printed while there is one. A run that failed or is undecided is no problem: a certificate says
//! so. Left out: whether the files inside give the same results, which [`super::issue`](mod@super::issue) tries.

use chrono::NaiveDate;

use super::content::{Calibration, Content, Equipment, Figure, Unit, is_country};
use super::paper;
use crate::record::hidden_character;

/// One thing that forbids issuing.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{field}: {fault}")]
pub struct Problem {
    /// Where, in words.
    pub field: String,
    /// What is wrong and what to do.
    pub fault: Fault,
}

/// What is wrong with a field.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum Fault {
    /// Nothing stands there.
    #[error("is missing; {0}")]
    Missing(&'static str),
    /// A character that is not seen.
    #[error("holds the hidden character U+{code:04X}: type the text again without it", code = u32::from(*.0))]
    Hidden(char),
    /// A character that cannot be printed.
    #[error("{0}")]
    Character(paper::Fault),
    /// White space at an end, or a break where one line is wanted.
    #[error("begins or ends with white space: take it away")]
    Untidy,
    /// Not two capital letters.
    #[error("{0:?} is no country code: give two capital letters of ISO 3166-1, as NO")]
    Country(String),
    /// The calibration of an instrument was not in date.
    #[error("ran out on {due}, before the run of {taken}: measure again with an instrument that is in date")]
    Overdue {
        /// Last day in date.
        due: NaiveDate,
        /// Day of the run.
        taken: NaiveDate,
    },
    /// Two days in the wrong order.
    #[error("{first} does not come before {second}, as it should: correct one of them")]
    Order {
        /// The one that should be earlier.
        first: NaiveDate,
        /// The one that should be later.
        second: NaiveDate,
    },
    /// A run of another orifice.
    #[error("is of orifice {found} and the certificate of {item}: choose a run of that orifice")]
    OtherOrifice {
        /// The orifice of the run.
        found: String,
        /// The item.
        item: String,
    },
    /// A certificate that replaces itself.
    #[error("is the number of this certificate itself: an amendment has a number of its own")]
    AmendsItself,
    /// A number that is none.
    #[error("is no finite number, so the run gives no result to certify")]
    NotFinite,
    /// Columns of a table that differ in length.
    #[error("has {found} entries where the table has {rows} rows: this is a defect of the program")]
    Unequal {
        /// Entries.
        found: usize,
        /// Rows.
        rows: usize,
    },
    /// A unit the D-SI does not know.
    #[error("has the unit {0:?}, which is none of the D-SI: this is a defect of the program")]
    Unit(&'static str),
    /// Two figures at one path.
    #[error("stands twice: this is a defect of the program")]
    Twice,
    /// A file name that may not travel.
    #[error("{0:?} is no name for a file inside: use letters, digits, '-', '_' and '.'")]
    FileName(String),
    /// The files inside do not give the results.
    #[error("do not give the results of this certificate: {0}")]
    NotReproduced(String),
    /// Of the pages.
    #[error("{0}")]
    Page(String),
}

/// Everything that forbids issuing a content, in its order; empty where nothing does.
#[must_use]
pub fn problems(content: &Content) -> Vec<Problem> {
    let mut found = Found(Vec::new());
    stated(content, &mut found);
    for calibration in content.calibrations() {
        of_run(content, calibration, &mut found);
    }
    figures(content, &mut found);
    for statement in &content.statements {
        found.paragraph(&format!("statement \"{}\"", statement.kind.name()), &statement.text);
    }
    let mut names: Vec<&str> = Vec::new();
    for file in &content.files {
        let plain = |c: char| c.is_ascii_alphanumeric() || matches!(c, '-' | '_' | '.');
        let travels = !file.name.is_empty()
            && file.name.len() <= 100
            && !file.name.starts_with('.')
            && file.name.chars().all(plain);
        if !travels {
            found.push("attached file", Fault::FileName(file.name.chars().take(60).collect()));
        }
        if names.contains(&file.name.as_str()) {
            found.push(&format!("attached file {}", file.name), Fault::Twice);
        }
        names.push(&file.name);
    }
    found.0
}

/// What was found so far.
struct Found(Vec<Problem>);

impl Found {
    fn push(&mut self, field: &str, fault: Fault) {
        self.0.push(Problem { field: field.to_owned(), fault });
    }

    /// A text that must be there, on one line.
    fn required(&mut self, field: &str, text: &str, advice: &'static str) {
        if text.trim().is_empty() { self.push(field, Fault::Missing(advice)) } else { self.line(field, text) }
    }

    /// A text on one line.
    fn line(&mut self, field: &str, text: &str) {
        if self.printable(field, text) && text.trim() != text {
            self.push(field, Fault::Untidy);
        }
    }

    /// A text that is there, with whatever space around it.
    fn paragraph(&mut self, field: &str, text: &str) {
        self.printable(field, text);
    }

    /// Names the first character that cannot stand in both forms; whether there was none.
    fn printable(&mut self, field: &str, text: &str) -> bool {
        let fault = match unprintable(text) {
            Some(hidden) => Some(Fault::Hidden(hidden)),
            // The bundled font has all of ASCII.
            None if text.is_ascii() => None,
            None => paper::faults(text).into_iter().next().map(Fault::Character),
        };
        let none = fault.is_none();
        self.0.extend(fault.map(|fault| Problem { field: field.to_owned(), fault }));
        none
    }

    fn optional(&mut self, field: &str, text: Option<&String>) {
        if let Some(text) = text {
            self.required(field, text, "take the empty text away or say something");
        }
    }

    /// A text of several lines.
    fn lines(&mut self, field: &str, text: &str, advice: &'static str) {
        if text.trim().is_empty() {
            self.push(field, Fault::Missing(advice));
        }
        for line in text.lines() {
            self.paragraph(field, line);
        }
    }
}

/// The first character that nobody sees, or that no XML document may hold (XML 1.0, production 2).
fn unprintable(text: &str) -> Option<char> {
    hidden_character(text).or_else(|| text.chars().find(|c| matches!(c, '\u{FFFE}' | '\u{FFFF}')))
}

fn stated(content: &Content, found: &mut Found) {
    let issue = &content.issue;
    found.required("certificate number", &issue.number, "let the book give one");
    found.required("name of the shop", &issue.shop.name, "add it with `shop edit`");
    found.lines("address of the shop", &issue.shop.address, "add it with `shop edit`");
    found.optional("contact of the shop", issue.shop.contact.as_ref());
    for (i, statement) in issue.shop.statements.iter().enumerate() {
        found.required(&format!("statement {} of the shop", i + 1), statement, "take it away or write it");
    }
    if issue.country.is_empty() {
        let advice =
            "let the last line of the shop's address be its two capital letters of ISO 3166-1, as NO";
        found.push("country of the shop", Fault::Missing(advice));
    } else if !is_country(&issue.country) {
        found.push("country of the shop", Fault::Country(issue.country.chars().take(20).collect()));
    }
    let advice = "name one of the shop's signatories with --by";
    found.required("signatory", &issue.signatory.name, advice);
    found.optional("function of the signatory", issue.signatory.role.as_ref());
    found.required("customer", &issue.customer.name, "name the customer in the orifice's entry");
    found.lines("address of the customer", &issue.customer.address, "give the customer's address");
    found.optional("contact of the customer", issue.customer.contact.as_ref());
    found.optional("description of the item", issue.item.description.as_ref());
    if issue.item.description.is_none() {
        found.push("description of the item", Fault::Missing("say in the orifice's entry what it is"));
    }
    found.optional("maker of the item", issue.item.maker.as_ref());
    match (&issue.item.serial, issue.without_serial) {
        (Some(serial), _) => {
            found.required("serial number of the item", serial, "write it or say it has none")
        }
        (None, true) => {}
        (None, false) => {
            let advice = "write it into the orifice's entry, or state that the item bears none";
            found.push("serial number of the item", Fault::Missing(advice));
        }
    }
    found.optional("condition of the item", issue.condition.as_ref());
    found.optional("work on the item", issue.work_done.as_ref());
    if content.as_found.is_some() && issue.work_done.is_none() {
        let advice = "say what was done between the run as found and the one as left";
        found.push("work on the item", Fault::Missing(advice));
    }
    found.optional("place of the work", issue.place.as_ref());
    found.optional("next calibration", issue.interval.as_ref());
    found.optional("head of the chain", issue.chain_head.as_ref());
    for (name, texts) in [("supplied by the customer", &issue.supplied), ("remark", &issue.remarks)] {
        for (i, text) in texts.iter().enumerate() {
            found.required(&format!("{name}, {}", i + 1), text, "take the empty text away");
        }
    }
    if let Some(amends) = &issue.amends {
        found.required("replaced certificate", &amends.replaces, "name the certificate that is replaced");
        found.required("what changed", &amends.what, "say what changed against the replaced certificate");
        found.required("reason of the amendment", &amends.why, "say why, with --why");
        if amends.replaces == issue.number {
            found.push("replaced certificate", Fault::AmendsItself);
        }
    }
    if let Some(found_at) =
        content.as_found.as_ref().map(|c| c.taken).filter(|at| *at >= content.results.taken)
    {
        let (first, second) = (found_at.date_naive(), content.results.taken.date_naive());
        found.push("run as found", Fault::Order { first, second });
    }
    let (first, last) = content.performed;
    let issued = issue.issued.date_naive();
    if last > issued {
        found.push("date of issue", Fault::Order { first: last, second: issued });
    }
    if let Some(received) = issue.received.filter(|received| *received > first) {
        found.push("date of receipt", Fault::Order { first: received, second: first });
    }
}

fn of_run(content: &Content, of: &Calibration, found: &mut Found) {
    let item = content.issue.item.id.to_string();
    if of.orifice != item {
        let fault = Fault::OtherOrifice { found: of.orifice.clone(), item };
        found.push(&format!("run {}", of.run), fault);
    }
    found.required(&format!("name of the run ({})", of.title), &of.run, "give the run a name");
    found.optional(&format!("technician of run {}", of.run), of.technician.as_ref());
    let taken = of.taken.date_naive();
    for instrument in &of.equipment {
        equipment(of, instrument, taken, found);
    }
    let sentences = of.checks.iter().map(|c| &c.says).chain(&of.warnings).chain([&of.headline]);
    let sentences = sentences.chain(of.points.iter().filter_map(|p| p.why_not.as_ref()));
    for sentence in sentences {
        found.paragraph(&format!("a sentence of run {}", of.run), sentence);
    }
    for (name, entries) in [
        (
            "flows as oxygen in the table of flows",
            of.table.iter().filter(|row| row.as_oxygen.is_some()).count(),
        ),
        ("residuals of the points", of.points.iter().filter(|p| p.residual.is_some()).count()),
    ] {
        let rows = if name.starts_with("flows") { of.table.len() } else { of.points.len() };
        if entries != 0 && entries != rows {
            found.push(&format!("{name} ({})", of.title), Fault::Unequal { found: entries, rows });
        }
    }
}

fn equipment(of: &Calibration, instrument: &Equipment, taken: NaiveDate, found: &mut Found) {
    let field = |what: &str| format!("{what} of the {} in run {}", instrument.name, of.run);
    match &instrument.certificate {
        None => {
            let advice = "write certificate = \"…\" into its papers: without it nothing is traceable";
            found.push(&field("certificate number"), Fault::Missing(advice));
        }
        Some(number) => found.required(&field("certificate number"), number, "write it into its papers"),
    }
    match instrument.due {
        None => {
            let advice = "write due = \"…\" into its papers";
            found.push(&field("due date"), Fault::Missing(advice));
        }
        Some(due) if due < taken => found.push(&field("calibration"), Fault::Overdue { due, taken }),
        Some(_) => {}
    }
}

fn figures(content: &Content, found: &mut Found) {
    let all = content.figures();
    let mut paths: Vec<&str> = all.iter().map(|figure| figure.path.as_str()).collect();
    paths.sort_unstable();
    for pair in paths.windows(2) {
        if let [a, b] = pair
            && a == b
        {
            found.push(a, Fault::Twice);
        }
    }
    for Figure { path, name, .. } in all.iter().filter(|figure| !figure.is_finite()) {
        found.push(&format!("{name} ({path})"), Fault::NotFinite);
    }
    for unit in Unit::ALL {
        for form in unit.dsi().iter().filter(|form| !is_dsi(form.unit)) {
            found.push(unit.symbol(), Fault::Unit(form.unit));
        }
    }
}

/// Whether a text is a unit of the D-SI made of the parts used here (D-SI 2.2: prefix, unit, exponent, each with its
/// backslash).
#[must_use]
pub fn is_dsi(unit: &str) -> bool {
    const PREFIXES: [&str; 6] = ["kilo", "hecto", "milli", "micro", "deci", "centi"];
    const UNITS: [&str; 11] = [
        "one",
        "percent",
        "litre",
        "minute",
        "second",
        "bar",
        "pascal",
        "metre",
        "kelvin",
        "degreecelsius",
        "kilogram",
    ];
    let Some(rest) = unit.strip_prefix('\\') else { return false };
    // What may stand next: after a prefix only a unit.
    let (mut after_prefix, mut after_unit) = (false, false);
    for word in rest.split('\\') {
        let exponent = word.strip_prefix("tothe{").and_then(|e| e.strip_suffix('}'));
        if let Some(exponent) = exponent {
            if !after_unit || exponent.parse::<f64>().is_err() {
                return false;
            }
            after_unit = false;
        } else if PREFIXES.contains(&word) && !after_prefix {
            (after_prefix, after_unit) = (true, false);
        } else if UNITS.contains(&word) {
            (after_prefix, after_unit) = (false, true);
        } else {
            return false;
        }
    }
    !after_prefix
}
