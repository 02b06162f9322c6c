//! `certificate` on the terminal.

use super::arguments::{Certificates, Global, Paper, Stated, Written};
use super::{Ended, note, say, shelf};
use crate::entry::Sheet;
use crate::report::certificate_words as words;
use crate::work::ExitStatus;
use crate::work::certificate::{self, AmendRequest, GivenTexts, IssueRequest};
use crate::work::shelf::Shelf;

pub(super) fn certificate(verb: &Certificates, global: &Global) -> Result<ExitStatus, Ended> {
    match verb {
        Certificates::Issue(issue) => {
            let Written { into, paper, as_found, by, stated } = &issue.written;
            let request = IssueRequest {
                run: issue.run.clone(),
                into: into.clone(),
                paper: paper.map(sheet),
                as_found: as_found.clone(),
                by: by.clone(),
                texts: texts(stated),
            };
            if issue.look {
                let text = certificate::look(&shelf(global)?, &request)?;
                let text = if global.json { words::look_json(&text) } else { text };
                return say(&text, ExitStatus::Done);
            }
            issued(&certificate::issue(&shelf(global)?, &request)?, global)
        }
        Certificates::Amend(amend) => {
            let Written { into, paper, as_found, by, stated } = &amend.written;
            let request = AmendRequest {
                number: amend.number.clone(),
                why: amend.why.clone(),
                changed: amend.changed.clone(),
                run: amend.run.clone(),
                replace: amend.replace,
                into: into.clone(),
                paper: paper.map(sheet),
                as_found: as_found.clone(),
                by: by.clone(),
                texts: texts(stated),
            };
            issued(&certificate::amend(&shelf(global)?, &request)?, global)
        }
        Certificates::Check(check) => {
            // A system without a data folder still checks files.
            let shelf = Shelf::find(global.book.as_deref()).ok();
            let checked = certificate::check(shelf.as_ref(), &check.file)?;
            let status = match checked.outcome {
                words::Outcome::Holds => ExitStatus::Done,
                words::Outcome::DoesNotHold | words::Outcome::NotChecked { .. } => ExitStatus::Unfavourable,
            };
            if status != ExitStatus::Done {
                note(&format!("ebbline: {}: {}", checked.file, words::check_line(&checked)));
            }
            say(&if global.json { words::check_json(&checked) } else { words::check_text(&checked) }, status)
        }
        Certificates::List(list) => {
            let (listed, more) = certificate::list(&shelf(global)?, list.all)?;
            let text = if global.json { words::list_json(&listed) } else { words::list_text(&listed, more) };
            say(&text, ExitStatus::Done)
        }
        Certificates::Show(show) => {
            let shown = certificate::show(&shelf(global)?, &show.number)?;
            let text = if global.json { words::shown_json(&shown) } else { words::shown_text(&shown) };
            say(&text, ExitStatus::Done)
        }
    }
}

fn issued(issued: &words::IssuedCertificate, global: &Global) -> Result<ExitStatus, Ended> {
    let text = if global.json { words::issued_json(issued) } else { words::issued_text(issued) };
    say(&text, ExitStatus::Done)
}

const fn sheet(paper: Paper) -> Sheet {
    match paper {
        Paper::A4 => Sheet::A4,
        Paper::Letter => Sheet::Letter,
    }
}

fn texts(stated: &Stated) -> GivenTexts {
    GivenTexts {
        customer: stated.customer.clone(),
        without_serial: stated.without_serial,
        condition: stated.condition.clone(),
        work: stated.work.clone(),
        received: stated.received.clone(),
        place: stated.place.clone(),
        supplied: stated.supplied.clone(),
        interval: stated.interval.clone(),
        remarks: stated.remark.clone(),
    }
}
