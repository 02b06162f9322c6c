//! A certificate made: both forms, and nothing at all while there is a problem.

use super::compare::{Outcome, compare};
use super::complete::{Fault, Problem, problems};
use super::content::Content;
use super::paper::{self, Paper};
use super::{dcc, pages};

/// A certificate in both forms.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Issued {
    /// The number as the stem of file names.
    pub file_stem: String,
    /// The PDF.
    pub pdf: Vec<u8>,
    /// The XML, which is inside the PDF too.
    pub xml: Vec<u8>,
}

/// Makes both forms of a content; the same content gives the same bytes.
///
/// Before anything is handed out the XML is checked as a stranger would check it: what cannot be computed again from the files
/// inside is not issued.
///
/// # Errors
/// Every problem at once; of those the pages have, only when there is no other.
pub fn issue(content: &Content, sheet: Paper) -> Result<Issued, Vec<Problem>> {
    let found = problems(content);
    if !found.is_empty() {
        return Err(found);
    }
    let xml = dcc::write(content);
    let not_reproduced = |why: String| {
        vec![Problem { field: "the files inside".to_owned(), fault: Fault::NotReproduced(why) }]
    };
    let findings = compare(&xml).map_err(|error| not_reproduced(error.to_string()))?.findings;
    if findings.outcome != Outcome::Holds {
        let first = findings.differences.first().map(ToString::to_string).unwrap_or_default();
        return Err(not_reproduced(first));
    }
    let document = pages::document(content, sheet, &xml);
    let pdf = paper::render(&document).map_err(|all| all.into_iter().map(of_page).collect::<Vec<_>>())?;
    Ok(Issued { file_stem: pages::file_stem(&content.issue.number), pdf, xml })
}

fn of_page(problem: paper::Problem) -> Problem {
    Problem { field: "the pages".to_owned(), fault: Fault::Page(problem.to_string()) }
}
