//! What was put in is read out again.

use ebbline::certificate::paper::read::read;
use ebbline::certificate::paper::*;

use super::samples::{bare, certificate};
use super::set;

#[test]
fn attachments_come_out_as_they_went_in() {
    let document = certificate();
    let contents = read(&set(&document)).unwrap();
    assert_eq!(contents.title.as_deref(), Some(document.title.as_str()));
    assert_eq!(contents.author, document.author);
    assert_eq!(contents.producer.as_deref(), Some(document.producer.as_str()));
    assert_eq!((contents.revisions, contents.annotated_pages), (1, 0));
    let mut there: Vec<_> =
        contents.attachments.iter().map(|a| (a.name.as_str(), a.relationship, a.bytes.as_slice())).collect();
    there.sort_unstable_by_key(|a| a.0);
    let wanted: Vec<_> = document
        .attachments
        .iter()
        .map(|a| (a.name.as_str(), Some(a.relationship), a.bytes.as_slice()))
        .collect();
    assert_eq!(there, wanted);
}

#[test]
fn every_relationship_and_many_files_come_out() {
    let kinds = [
        Relationship::Source,
        Relationship::Data,
        Relationship::Alternative,
        Relationship::Supplement,
        Relationship::Unspecified,
    ];
    let mut document = bare(Vec::new());
    for i in 0..150_u8 {
        document.attachments.push(Attachment {
            name: format!("file-{i:03}.bin"),
            mime_type: "application/octet-stream".to_owned(),
            relationship: kinds[usize::from(i) % kinds.len()],
            description: "bytes".to_owned(),
            bytes: vec![i; usize::from(i)],
            modified: document.date,
        });
    }
    document.author = Some("Γεώργιος (\\Юрій)".to_owned());
    let contents = read(&set(&document)).unwrap();
    assert_eq!(contents.author, document.author);
    assert_eq!(contents.attachments.len(), 150);
    for (found, put) in contents.attachments.iter().zip(&document.attachments) {
        assert_eq!(
            (&found.name, found.relationship, &found.bytes),
            (&put.name, Some(put.relationship), &put.bytes)
        );
    }
}

#[test]
fn a_changed_page_is_told_from_the_others() {
    let before = read(&set(&certificate())).unwrap();
    let again = read(&set(&certificate())).unwrap();
    assert_eq!(before, again);
    let mut changed = certificate();
    let Some(Block::Table(table)) =
        changed.blocks.iter_mut().filter(|block| matches!(block, Block::Table(_))).nth(1)
    else {
        panic!("no second table")
    };
    table.rows[20].cells[2] = "16.05".into();
    let after = read(&set(&changed)).unwrap();
    let differ: Vec<usize> =
        (0..before.pages.len()).filter(|i| before.pages[*i] != after.pages[*i]).collect();
    assert_eq!(differ, [2], "of {} pages", before.pages.len());
    assert!(before.pages.iter().all(|page| page.len() > 500));
}

#[test]
fn the_file_says_which_part_and_level_of_pdf_a_it_claims() {
    let bytes = set(&certificate());
    let has = |what: &str| bytes.windows(what.len()).any(|window| window == what.as_bytes());
    // ISO 19005-3 (clauses from memory): 6.6.4; output intent, 6.2.3; marked content, 6.7.2; language, 6.7.4. Dates as given.
    for what in [
        "<pdfaid:part>3</pdfaid:part>",
        "<pdfaid:conformance>A</pdfaid:conformance>",
        "/GTS_PDFA1",
        "/Marked true",
        "/Lang(en)",
        "/AFRelationship/Source",
        "/CreationDate(D:20261128164000+01'00)",
        "<xmp:CreateDate>2026-11-28T16:40:00+01:00</xmp:CreateDate>",
    ] {
        assert!(has(what), "{what}");
    }
}

#[test]
fn a_page_without_text_has_its_frame() {
    let contents = read(&set(&bare(Vec::new()))).unwrap();
    assert_eq!(contents.pages.len(), 1);
    assert_eq!(contents.attachments, []);
}
