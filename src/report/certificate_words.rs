//! What `certificate` says: what was issued, what a check found, the list.

use chrono::{DateTime, FixedOffset};
use serde_json::{Value, json};

use super::json_text;
use super::layout::{counted, shortened, table, wrapped};
use crate::entry::RunNumber;

/// What a check that holds does not say.
pub const NOT_GENUINE: &str = "Holds means consistent with itself, not genuine: who changes a reading and prints everything \
    anew has one that holds. Only the book that gave out the number knows better.";
/// What a certificate of this program is not.
pub const NO_ACCREDITATION: &str = "It claims no accreditation, and is signed by whoever authorises it.";
/// Longest name of an orifice in the table, in columns.
const NAME: usize = 16;

/// A certificate that was issued.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct IssuedCertificate {
    /// Its number.
    pub number: String,
    /// The run it rests on.
    pub run: RunNumber,
    /// The run before the work.
    pub as_found: Option<RunNumber>,
    /// The orifice.
    pub orifice: String,
    /// What the run was judged to be.
    pub verdict: &'static str,
    /// Who authorises it.
    pub signatory: String,
    /// Its paper.
    pub paper: &'static str,
    /// When it was issued.
    pub issued: DateTime<FixedOffset>,
    /// Number of the certificate it amends or replaces, and whether it replaces it.
    pub amends: Option<(String, bool)>,
    /// What an amendment says that changed.
    pub what_changed: Option<String>,
    /// The certificate that amends or replaces this one.
    pub amended_by: Option<(String, bool)>,
    /// Of one that was there before: whether its files had been written.
    pub there: Option<bool>,
    /// Its files, PDF and XML.
    pub files: Vec<IssuedFile>,
}

/// A file that was written.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct IssuedFile {
    /// Where.
    pub path: String,
    /// Its SHA-256, in hexadecimal.
    pub sha256: String,
}

/// What was issued, as text.
#[must_use]
pub fn issued_text(issued: &IssuedCertificate) -> String {
    let IssuedCertificate { number, run, orifice, verdict, .. } = issued;
    let what = match issued.there {
        None => "issued",
        Some(true) => "made again, the same bytes",
        Some(false) => "its number had been given out and its files not written; they are now",
    };
    let found = issued.as_found.map(|found| format!(", as found {found}")).unwrap_or_default();
    let judged = match *verdict {
        "none" => "it states results and no conformity".to_owned(),
        word => format!("verdict {word}"),
    };
    let mut text = wrapped("", "  ", &format!("{number}: {what}; {orifice}, run {run}{found}; {judged}"));
    for file in &issued.files {
        text.push_str(&format!("  {}\n    SHA-256 {}\n", file.path, file.sha256));
    }
    if let Some((before, replaces)) = &issued.amends {
        let what = if *replaces { "replaces" } else { "amends" };
        let changed = issued.what_changed.as_deref().unwrap_or_default();
        text.push_str(&wrapped(
            "  ",
            "    ",
            &format!("{what} {before}, which stays in the book; changed: {changed}"),
        ));
    }
    if let Some((by, replaces)) = &issued.amended_by {
        let what = if *replaces { "replaced" } else { "amended" };
        text.push_str(&wrapped("  ", "    ", &format!("note: this certificate was {what} by {by}")));
    }
    text.push_str(&wrapped(
        "  ",
        "    ",
        &format!("authorised by {}: print the PDF and sign it. {NO_ACCREDITATION}", issued.signatory),
    ));
    text
}

/// What was issued, as JSON.
#[must_use]
pub fn issued_json(issued: &IssuedCertificate) -> String {
    let file = |file: &IssuedFile| json!({ "file": file.path, "sha256": file.sha256 });
    json_text(&json!({
        "format": 1,
        "number": issued.number,
        "run": issued.run.to_string(),
        "as_found": issued.as_found.map(|run| run.to_string()),
        "orifice": issued.orifice,
        "verdict": issued.verdict,
        "signatory": issued.signatory,
        "paper": issued.paper,
        "issued": issued.issued.to_rfc3339(),
        "new": issued.there.is_none(),
        "pdf": issued.files.first().map(file),
        "xml": issued.files.get(1).map(file),
        "files": issued.files.iter().map(|file| &file.path).collect::<Vec<_>>(),
        "amends": issued.amends.as_ref().map(|(number, _)| number),
        "replaces": issued.amends.as_ref().map(|(_, replaces)| replaces),
        "changed": issued.what_changed,
        "amended_by": issued.amended_by.as_ref().map(|(number, _)| number),
    }))
}

/// The text of a document before it is issued, as JSON.
#[must_use]
pub fn look_json(text: &str) -> String {
    json_text(&json!({ "format": 1, "text": text }))
}

/// Whether a certificate holds.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Outcome {
    /// Everything printed comes out of what is inside, and nothing here contradicts it.
    Holds,
    /// Something does not.
    DoesNotHold,
    /// Its method is not available here.
    NotChecked {
        /// Revision of the method.
        method: u32,
        /// The version of the program that has it.
        program: String,
    },
}

/// Whether the pages of a PDF were compared.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PagesCompared {
    /// There are none.
    None,
    /// They are those of the same content.
    Same,
    /// They are not.
    Differ,
    /// Another version of the program set them.
    OtherProgram,
}

/// What the book says of a certificate.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Here {
    /// There is no book.
    NoBook,
    /// The book gave out no such number.
    Unknown {
        /// Although the certificate bears the name of the shop whose book it is.
        our_name: bool,
    },
    /// The book gave it out, and may not have written its files.
    Unfinished,
    /// It is the file that was issued.
    Unchanged {
        /// The certificate that amends or replaces it, and whether it replaces it.
        amended_by: Option<(String, bool)>,
    },
    /// It is another file than the one that was issued.
    Differs,
}

/// One thing that differs.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Finding {
    /// What.
    pub what: String,
    /// As printed.
    pub printed: Option<String>,
    /// As it comes out.
    pub recomputed: Option<String>,
    /// In a sentence.
    pub says: String,
}

/// A certificate that was checked.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CheckedCertificate {
    /// The file.
    pub file: String,
    /// The number printed on it.
    pub number: String,
    /// Whether it holds.
    pub outcome: Outcome,
    /// What differs.
    pub findings: Vec<Finding>,
    /// How much more differs.
    pub more: usize,
    /// Numbers compared.
    pub numbers: usize,
    /// Texts compared.
    pub texts: usize,
    /// Files compared.
    pub files: usize,
    /// Sentences that another version worded otherwise.
    pub wordings: usize,
    /// Whether its pages were compared.
    pub pages: PagesCompared,
    /// What the book says.
    pub here: Here,
}

/// The first line of a check, which says how it came out.
#[must_use]
pub fn check_line(checked: &CheckedCertificate) -> String {
    let number = if checked.number.is_empty() { "a certificate without a number" } else { &checked.number };
    match &checked.outcome {
        Outcome::Holds => format!("HOLDS — {number}: everything printed comes out of the readings inside"),
        Outcome::DoesNotHold => {
            let count = (checked.findings.len() + checked.more) as u64;
            format!("DOES NOT HOLD — {number}: {}", counted(count, "difference"))
        }
        Outcome::NotChecked { method, program } => format!(
            "NOT CHECKED — {number}: made by method {method} of version {program}, which is not available here"
        ),
    }
}

/// A check as text.
#[must_use]
pub fn check_text(checked: &CheckedCertificate) -> String {
    let mut text = wrapped("", "  ", &check_line(checked));
    for finding in &checked.findings {
        text.push_str(&wrapped("  - ", "    ", &finding.says));
    }
    if checked.more > 0 {
        text.push_str(&format!("  - and {} more\n", checked.more));
    }
    let mut row = |says: &str| text.push_str(&wrapped("  ", "    ", says));
    if !matches!(checked.outcome, Outcome::NotChecked { .. }) {
        row(&format!(
            "compared: {}, {} and {}",
            counted(checked.numbers as u64, "number"),
            counted(checked.texts as u64, "text"),
            counted(checked.files as u64, "file")
        ));
        match checked.pages {
            PagesCompared::None | PagesCompared::Differ => {}
            PagesCompared::Same => row("its pages are those of the same content, to the byte"),
            PagesCompared::OtherProgram => {
                row("its pages were set by another version of the program and were not compared");
            }
        }
        if checked.wordings > 0 {
            row(&format!(
                "{} worded otherwise by another version of the program, not judged",
                counted(checked.wordings as u64, "sentence")
            ));
        }
    }
    row(&here_says(&checked.here));
    if checked.outcome == Outcome::Holds {
        row(NOT_GENUINE);
    }
    text
}

fn here_says(here: &Here) -> String {
    match here {
        Here::NoBook => "no book is here to say whether it was issued".to_owned(),
        Here::Unknown { our_name: false } => "the book here gave out no such number".to_owned(),
        Here::Unknown { our_name: true } => "the book here gave out no such number, although the certificate bears the name of \
            its shop: if the shop has no other book, it was not issued by it"
            .to_owned(),
        Here::Unfinished => {
            "the book here gave out this number, but its files were not noted as written: issue it again first".to_owned()
        }
        Here::Unchanged { amended_by: None } => "issued here, unchanged".to_owned(),
        Here::Unchanged { amended_by: Some((by, replaces)) } => {
            format!("issued here, unchanged, and since {} by {by}", if *replaces { "replaced" } else { "amended" })
        }
        Here::Differs => "the book here gave out this number for another file".to_owned(),
    }
}

/// A check as JSON.
#[must_use]
pub fn check_json(checked: &CheckedCertificate) -> String {
    let (holds, why_not) = match &checked.outcome {
        Outcome::Holds => (Value::Bool(true), None),
        Outcome::DoesNotHold => (Value::Bool(false), Some(check_line(checked))),
        Outcome::NotChecked { .. } => (Value::Null, Some(check_line(checked))),
    };
    let issued_here = match checked.here {
        Here::NoBook | Here::Unknown { .. } | Here::Unfinished => Value::Null,
        Here::Unchanged { .. } => Value::Bool(true),
        Here::Differs => Value::Bool(false),
    };
    let findings: Vec<Value> = checked
        .findings
        .iter()
        .map(|f| json!({ "what": f.what, "printed": f.printed, "recomputed": f.recomputed, "says": f.says }))
        .collect();
    let (number, amended_by) = match &checked.here {
        Here::Unchanged { amended_by: Some((by, _)) } => (&checked.number, Some(by)),
        _ => (&checked.number, None),
    };
    json_text(&json!({
        "format": 1,
        "file": checked.file,
        "number": number,
        "holds": holds,
        "why_not": why_not,
        "findings": findings,
        "more_findings": checked.more,
        "numbers_compared": checked.numbers,
        "texts_compared": checked.texts,
        "files_compared": checked.files,
        "wordings_not_judged": checked.wordings,
        "pages": match checked.pages {
            PagesCompared::None => Value::Null,
            PagesCompared::Same => "same".into(),
            PagesCompared::Differ => "differ".into(),
            PagesCompared::OtherProgram => "not compared".into(),
        },
        "issued_here": issued_here,
        "book_says": here_says(&checked.here),
        "amended_by": amended_by,
        "genuine": NOT_GENUINE,
    }))
}

/// A certificate in a list.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ListedCertificate {
    /// Its number.
    pub number: String,
    /// The run it rests on.
    pub run: RunNumber,
    /// The run before the work.
    pub as_found: Option<RunNumber>,
    /// The orifice.
    pub orifice: String,
    /// When it was issued.
    pub issued: DateTime<FixedOffset>,
    /// Number of the certificate it amends or replaces, and whether it replaces it.
    pub amends: Option<(String, bool)>,
    /// The certificate that amends or replaces it, and whether it replaces it.
    pub amended_by: Option<(String, bool)>,
    /// SHA-256 of PDF and XML; none where they may not have been written.
    pub sha256: Option<(String, String)>,
}

impl ListedCertificate {
    /// How it stands, in words.
    #[must_use]
    pub fn state(&self) -> String {
        let said = |word: &str, other: &(String, bool)| format!("{word} {}", other.0);
        match (&self.sha256, &self.amended_by, &self.amends) {
            (None, ..) => format!("files not written: certificate issue {}", self.number),
            (Some(_), Some(by), _) => said(if by.1 { "replaced by" } else { "amended by" }, by),
            (Some(_), None, Some(of)) => said(if of.1 { "replaces" } else { "amends" }, of),
            (Some(_), None, None) => "issued".to_owned(),
        }
    }

    /// As JSON.
    #[must_use]
    pub fn json(&self) -> Value {
        json!({
            "number": self.number,
            "run": self.run.to_string(),
            "as_found": self.as_found.map(|run| run.to_string()),
            "orifice": self.orifice,
            "issued": self.issued.to_rfc3339(),
            "state": self.state(),
            "files_written": self.sha256.is_some(),
            "pdf_sha256": self.sha256.as_ref().map(|(pdf, _)| pdf),
            "xml_sha256": self.sha256.as_ref().map(|(_, xml)| xml),
            "amends": self.amends.as_ref().map(|(number, _)| number),
            "amended_by": self.amended_by.as_ref().map(|(number, _)| number),
        })
    }
}

/// The list as a table; `more` says that older ones are not shown.
#[must_use]
pub fn list_text(listed: &[ListedCertificate], more: bool) -> String {
    if listed.is_empty() {
        return "No certificates in the book yet: certificate issue RUN, from a judged run.\n".to_owned();
    }
    let rows: Vec<Vec<String>> = listed
        .iter()
        .map(|one| {
            vec![
                one.number.clone(),
                one.issued.format("%Y-%m-%d").to_string(),
                one.run.to_string(),
                shortened(&one.orifice, NAME),
                one.state(),
            ]
        })
        .collect();
    let mut text = table(&["certificate", "issued", "run", "orifice", "state"], &[""; 5], &rows, true);
    if more {
        text.push_str("  Older certificates are not shown: --all shows every one.\n");
    }
    text
}

/// The list as JSON.
#[must_use]
pub fn list_json(listed: &[ListedCertificate]) -> String {
    json_text(&listed.iter().map(ListedCertificate::json).collect::<Vec<_>>())
}

/// A certificate that is shown.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ShownCertificate {
    /// What stands in the list.
    pub listed: ListedCertificate,
    /// The text of its document.
    pub text: String,
}

/// It as text.
#[must_use]
pub fn shown_text(shown: &ShownCertificate) -> String {
    let mut text = shown.text.clone();
    if !text.ends_with('\n') {
        text.push('\n');
    }
    text.push_str(&wrapped("", "  ", &format!("{}: {}", shown.listed.number, shown.listed.state())));
    text
}

/// It as JSON.
#[must_use]
pub fn shown_json(shown: &ShownCertificate) -> String {
    let mut document = shown.listed.json();
    if let Value::Object(map) = &mut document {
        map.insert("text".to_owned(), shown.text.clone().into());
    }
    json_text(&document)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn listed() -> ListedCertificate {
        ListedCertificate {
            number: "2026-0001".to_owned(),
            run: RunNumber::new(1).unwrap(),
            as_found: None,
            orifice: "CMF-0417".to_owned(),
            issued: DateTime::parse_from_rfc3339("2026-11-13T09:00:00+11:00").unwrap(),
            amends: None,
            amended_by: None,
            sha256: Some(("a".to_owned(), "b".to_owned())),
        }
    }

    #[test]
    fn a_certificate_in_a_list_says_how_it_stands() {
        let other = |replaces| Some(("2026-0002".to_owned(), replaces));
        assert_eq!(listed().state(), "issued");
        assert_eq!(ListedCertificate { amends: other(false), ..listed() }.state(), "amends 2026-0002");
        assert_eq!(
            ListedCertificate { amended_by: other(true), ..listed() }.state(),
            "replaced by 2026-0002"
        );
        // That its files are missing comes first: something has to be done.
        let missing = ListedCertificate { sha256: None, amended_by: other(true), ..listed() };
        assert_eq!(missing.state(), "files not written: certificate issue 2026-0001");
        assert!(list_text(&[listed()], true).contains("--all"));
    }

    fn checked(outcome: Outcome, here: Here) -> CheckedCertificate {
        CheckedCertificate {
            file: "x.xml".to_owned(),
            number: "2026-0001".to_owned(),
            outcome,
            findings: Vec::new(),
            more: 0,
            numbers: 1,
            texts: 2,
            files: 3,
            wordings: 0,
            pages: PagesCompared::None,
            here,
        }
    }

    #[test]
    fn only_a_check_that_holds_says_what_that_does_not_mean() {
        let text = check_text(&checked(Outcome::Holds, Here::NoBook));
        assert!(
            text.contains("HOLDS") && text.contains("not genuine") && text.contains("1 number, 2 texts"),
            "{text}"
        );
        let text = check_text(&checked(Outcome::DoesNotHold, Here::Differs));
        assert!(text.contains("DOES NOT HOLD") && !text.contains("genuine"), "{text}");
        let other = Outcome::NotChecked { method: 9, program: "7.0".to_owned() };
        let text = check_text(&checked(other.clone(), Here::NoBook));
        assert!(text.contains("method 9 of version 7.0") && !text.contains("compared:"), "{text}");
        let json: Value =
            serde_json::from_str(&check_json(&checked(other, Here::Unknown { our_name: true }))).unwrap();
        assert_eq!((&json["holds"], &json["issued_here"]), (&Value::Null, &Value::Null));
        assert!(json["why_not"].as_str().unwrap().starts_with("NOT CHECKED"), "{json}");
    }
}
