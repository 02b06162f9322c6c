//! Both forms issued, and both checked: the PDF with its attachments, its pages, and what is done to it afterwards.

use std::path::PathBuf;

use ebbline::certificate::compare::{Outcome, Pages, What};
use ebbline::certificate::content::{self, Content};
use ebbline::certificate::paper::{self, Paper};
use ebbline::certificate::{CheckError, Issued, check, dcc, issue, pages};

use crate::support::{every_content, good, good_content, issue as an_issue};

fn issued(content: &Content) -> Issued {
    issue(content, Paper::A4).unwrap_or_else(|all| panic!("{all:?}"))
}

#[test]
fn every_kind_of_certificate_is_issued_and_holds_in_both_forms() {
    let folder = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("certificates");
    std::fs::create_dir_all(&folder).unwrap();
    for (name, content) in every_content() {
        let made = issued(&content);
        assert_eq!(made, issued(&content), "{name}: the same content gives the same bytes");
        std::fs::write(folder.join(format!("{name}.pdf")), &made.pdf).unwrap();
        let xml = check(&made.xml, "x.xml").unwrap();
        assert_eq!((xml.findings.outcome, xml.findings.pages), (Outcome::Holds, Pages::None), "{name}");
        let pdf = check(&made.pdf, "x.pdf").unwrap();
        assert_eq!(pdf.findings.differences, [], "{name}");
        assert_eq!((pdf.findings.outcome, pdf.findings.pages), (Outcome::Holds, Pages::Same), "{name}");
        assert_eq!(pdf.xml, made.xml, "{name}");
        let inside = paper::read::read(&made.pdf).unwrap();
        assert_eq!(inside.attachments.len(), 1 + content.files.len(), "{name}");
    }
}

#[test]
fn letter_paper_holds_too() {
    let made = issue(&good_content(), Paper::Letter).unwrap();
    let folder = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("certificates");
    std::fs::create_dir_all(&folder).unwrap();
    std::fs::write(folder.join("letter.pdf"), &made.pdf).unwrap();
    assert_eq!(check(&made.pdf, "x.pdf").unwrap().findings.pages, Pages::Same);
    assert_ne!(made.pdf, issued(&good_content()).pdf);
}

/// A PDF of one content with the attachments of `of` changed.
fn with_attachments(content: &Content, change: impl FnOnce(&mut Vec<paper::Attachment>)) -> Vec<u8> {
    let xml = dcc::write(content);
    let mut document = pages::document(content, Paper::A4, &xml);
    change(&mut document.attachments);
    paper::render(&document).unwrap()
}

fn whats(pdf: &[u8]) -> Vec<What> {
    let found = check(pdf, "x.pdf").unwrap().findings;
    assert_eq!(found.outcome, Outcome::DoesNotHold);
    found.differences.into_iter().map(|difference| difference.what).collect()
}

#[test]
fn attachments_that_are_missing_changed_or_too_many_do_not_hold() {
    let content = good_content();
    let missing = with_attachments(&content, |all| all.retain(|file| file.name != "R0012.csv"));
    assert_eq!(whats(&missing), [What::AttachmentMissing, What::Pages]);
    let changed = with_attachments(&content, |all| all[3].bytes.push(b'\n'));
    assert_eq!(whats(&changed), [What::AttachmentDiffers, What::Pages]);
    let more = with_attachments(&content, |all| {
        let mut more = all[3].clone();
        more.name = "more.csv".into();
        all.push(more);
    });
    assert_eq!(whats(&more), [What::AttachmentUnknown, What::Pages]);
    let none = with_attachments(&content, Vec::clear);
    assert_eq!(check(&none, "c.pdf").unwrap_err(), CheckError::NoXml("c.pdf".into()));
    let two = with_attachments(&content, |all| {
        let mut two = all[0].clone();
        two.name = "two.xml".into();
        all.push(two);
    });
    assert_eq!(check(&two, "c.pdf").unwrap_err(), CheckError::SeveralXml("c.pdf".into()));
}

#[test]
fn another_certificates_xml_does_not_hold_on_these_pages() {
    let (_, other) = every_content().into_iter().find(|(name, _)| *name == "amended").unwrap();
    let xml = dcc::write(&other);
    let pdf = with_attachments(&good_content(), |all| all[0].bytes = xml);
    assert!(whats(&pdf).contains(&What::Pages));
}

#[test]
fn pages_with_another_number_do_not_hold() {
    let content = good_content();
    let mut printed = content.clone();
    printed.results.headline = printed.results.headline.replace("10.0 bar", "11.0 bar");
    assert_ne!(printed.results.headline, content.results.headline);
    let document = pages::document(&printed, Paper::A4, &dcc::write(&content));
    assert_eq!(whats(&paper::render(&document).unwrap()), [What::Pages]);
}

#[test]
fn pages_of_another_version_are_said_not_to_be_compared() {
    let mut older = an_issue();
    older.program = "0.0.9".into();
    let content = content::of(&older, &good().measured(), None);
    let found = check(&issued(&content).pdf, "x.pdf").unwrap().findings;
    assert_eq!((found.outcome, found.pages), (Outcome::Holds, Pages::OtherProgram));
}

#[test]
fn a_file_of_neither_form_is_said_so() {
    assert_eq!(check(b"GIF89a", "a.gif").unwrap_err(), CheckError::Neither("a.gif".into()));
    assert_eq!(check(b"", "empty").unwrap_err(), CheckError::Neither("empty".into()));
    let pdf = issued(&good_content()).pdf;
    assert!(matches!(check(&pdf[..pdf.len() / 2], "cut.pdf").unwrap_err(), CheckError::Pdf { .. }));
}

#[test]
fn what_the_readings_do_not_give_is_not_issued() {
    let mut content = good_content();
    content.results.nominal.flow.value *= 1.02;
    let all = issue(&content, Paper::A4).unwrap_err();
    assert_eq!(all.len(), 1);
    assert!(
        all[0].to_string().starts_with("the files inside: do not give the results of this certificate"),
        "{}",
        all[0]
    );
}

#[test]
fn a_letter_the_font_lacks_names_its_field() {
    let mut with = an_issue();
    with.customer.name = "潜水".into();
    let all = issue(&content::of(&with, &good().measured(), None), Paper::A4).unwrap_err();
    assert_eq!(all.len(), 1, "{all:?}");
    assert!(all[0].to_string().starts_with("customer: the font has no “潜”"), "{}", all[0]);
}

#[test]
fn the_plain_text_says_number_verdict_and_end() {
    let text = pages::text(&good_content(), 80);
    for said in [
        "IOW-2026-0007",
        "PASS by the guarded rule",
        "End of certificate IOW-2026-0007",
        "Tern Club (invented)",
    ] {
        assert!(text.contains(said), "{said}\n{text}");
    }
}

#[test]
fn a_number_becomes_the_name_of_a_file_that_travels() {
    assert_eq!(pages::file_stem("IOW-2026-0007"), "IOW-2026-0007");
    assert_eq!(pages::file_stem("../IOW 2026/7"), "IOW-2026-7");
    assert_eq!(pages::file_stem("№"), "certificate");
}
