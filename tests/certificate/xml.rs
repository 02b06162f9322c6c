//! The XML: written, read back, and refused when it is not what it should be.

use std::path::PathBuf;

use ebbline::certificate::compare::compare;
use ebbline::certificate::content::printed;
use ebbline::certificate::dcc::{self, DccError, Leaf};

use proptest::prelude::*;

use crate::support::{every_content, good_content};

/// Where the XML of every kind of certificate is put, for `scripts/validate_dcc.py`.
fn folder() -> PathBuf {
    let path = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("certificates");
    std::fs::create_dir_all(&path).unwrap();
    path
}

#[test]
fn every_leaf_that_is_written_is_read() {
    for (name, content) in every_content() {
        let bytes = dcc::write(&content);
        std::fs::write(folder().join(format!("{name}.xml")), &bytes).unwrap();
        assert_eq!(bytes, dcc::write(&content), "{name}: the same content gives the same bytes");
        let received = dcc::read(&bytes).unwrap();
        let expected = dcc::expected(&dcc::document(&content));
        assert_eq!(expected.len(), received.leaves.len(), "{name}");
        for leaf in expected {
            let read =
                &received.leaves.get(&leaf.path).unwrap_or_else(|| panic!("{name}: {}", leaf.path)).text;
            match &leaf.leaf {
                Leaf::Fact(text) | Leaf::Prose(text) => assert_eq!(text, read, "{name}: {}", leaf.path),
                Leaf::Number { printed, .. } | Leaf::Expanded { printed, .. } => {
                    assert_eq!(printed, read, "{name}: {}", leaf.path);
                    assert!(read.parse::<f64>().unwrap().is_finite(), "{name}: {}", leaf.path);
                }
                Leaf::Bytes(_) => assert_eq!(read.len(), 64, "{name}: {}", leaf.path),
            }
        }
        let files: Vec<&str> = received.files.iter().map(|file| file.name.as_str()).collect();
        assert_eq!(files.len(), if name == "cleaned" { 5 } else { 3 }, "{name}: {files:?}");
        for (sent, got) in content.files.iter().zip(&received.files) {
            assert_eq!((&sent.name, &sent.bytes), (&got.name, &got.bytes));
        }
    }
}

#[test]
fn every_printed_figure_stands_in_the_xml() {
    for (name, content) in every_content() {
        let received = dcc::read(&dcc::write(&content)).unwrap();
        for figure in printed(&content) {
            let id = figure.path.replace('/', ".");
            let (column, entry) = id.rsplit_once('.').unwrap();
            let stands = received.leaves.iter().any(|(path, leaf)| {
                let alone = path.starts_with(&format!("{id}/"));
                let listed = path.starts_with(&format!("{column}/")) && path.ends_with(&format!("/{entry}"));
                let line = path.starts_with("results.line/") || path.starts_with("as_found.line/");
                (alone || listed || line) && leaf.text == figure.value
            });
            assert!(stands, "{name}: {} = {}", figure.path, figure.value);
        }
    }
}

#[test]
fn what_is_no_certificate_is_refused_in_a_sentence() {
    let good = String::from_utf8(dcc::write(&good_content())).unwrap();
    let root = "<dcc:digitalCalibrationCertificate";
    let with = |what: &str, by: &str| {
        assert!(good.contains(what));
        good.replacen(what, by, 1)
    };
    let read = |text: &str| dcc::read(text.as_bytes()).unwrap_err();
    let lol = "<!DOCTYPE x [<!ENTITY a \"aaaa\"><!ENTITY b \"&a;&a;\">]>";
    assert_eq!(read(&with(root, &format!("{lol}{root}"))), DccError::DocumentType);
    let outside = "<!DOCTYPE x SYSTEM \"file:///etc/passwd\">";
    assert_eq!(read(&with(root, &format!("{outside}{root}"))), DccError::DocumentType);
    assert_eq!(read(&with("Tern Club", "&b;")), DccError::Entity("b".into()));
    assert_eq!(read(&with(root, &format!("<?xml-stylesheet href=\"x\"?>{root}"))), DccError::Instruction);
    assert_eq!(read(&with("UTF-8", "ISO-8859-1")), DccError::Encoding("ISO-8859-1".into()));
    assert!(matches!(read(&with(root, "<svg")), DccError::OtherRoot(_)));
    assert_eq!(read("<svg/>"), DccError::OtherRoot("svg".into()));
    assert_eq!(read(&format!("{good}<a/>")), DccError::Outside);
    assert_eq!(read(&format!("{good}more")), DccError::Outside);
    assert_eq!(read(""), DccError::CutOff);
    assert!(matches!(read(&with("</dcc:customer>", "</dcc:costumer>")), DccError::Broken { .. }));
    assert_eq!(dcc::read(b"\xff\xfe<").unwrap_err(), DccError::NotUtf8);
    let deep = format!("{root} xmlns:dcc=\"x\">{}", "<a>".repeat(100));
    assert_eq!(read(&deep), DccError::TooDeep);
    let many = format!("{root} xmlns:dcc=\"x\">{}", "<a/>".repeat(50_001));
    assert_eq!(read(&many), DccError::TooMany);
    let entries = format!(
        "{root} xmlns:dcc=\"x\"><si:valueXMLList>{}</si:valueXMLList></dcc:digitalCalibrationCertificate>",
        "1 ".repeat(400_000)
    );
    assert_eq!(read(&entries), DccError::TooManyLeaves);
    // Each leaf below a long name would be given it: a short document must not become a long one.
    let name = "n".repeat(100_000);
    let long = format!("{root} xmlns:dcc=\"x\"><{name}>{}</{name}>", "<a/>".repeat(100));
    assert!(matches!(read(&long), DccError::Broken { .. }));
    let nested = format!(
        "{root} xmlns:dcc=\"x\">{}{}",
        format!("<{}>", "n".repeat(80)).repeat(23),
        "<a/>".repeat(49_000)
    );
    assert_eq!(read(&nested), DccError::TooDeep);
    let files =
        "<dcc:file><dcc:fileName>a</dcc:fileName><dcc:dataBase64></dcc:dataBase64></dcc:file>".repeat(40);
    let files = format!("{root} xmlns:dcc=\"x\">{files}</dcc:digitalCalibrationCertificate>");
    assert_eq!(read(&files), DccError::TooManyFiles);
    assert_eq!(dcc::read(&vec![b' '; dcc::LONGEST_XML + 1]).unwrap_err(), DccError::TooLong);
    let twice = with("ebbline_results.budget.1.share", "ebbline_results.budget.1.u");
    assert!(matches!(read(&twice), DccError::Twice(_)));
    for cut in [10, 1000, good.len() / 2, good.len() - 10] {
        let cut = (cut..).find(|at| good.is_char_boundary(*at)).unwrap();
        assert!(dcc::read(&good.as_bytes()[..cut]).is_err(), "{cut}");
    }
}

#[test]
fn cdata_and_character_references_are_read_as_what_they_stand_for() {
    let good = String::from_utf8(dcc::write(&good_content())).unwrap();
    let same = good.replacen("Tern Club (invented)", "<![CDATA[Tern Club]]> &#40;invented&#x29;", 1);
    assert_ne!(good, same);
    assert_eq!(dcc::read(good.as_bytes()).unwrap(), dcc::read(same.as_bytes()).unwrap());
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(100))]
    #[test]
    fn damaged_bytes_are_refused_or_found_out_and_never_more(
        at in 0.0_f64..1.0, byte in any::<u8>(), cut in 0.0_f64..1.0, doubled in any::<bool>(),
    ) {
        let mut bytes = dcc::write(&good_content());
        let place = |share: f64| (share * (bytes.len() - 1) as f64) as usize;
        let (at, cut) = (place(at), place(cut));
        let same = bytes[at] == byte;
        bytes[at] = byte;
        if doubled {
            let more = bytes[cut.min(at)..cut.max(at)].to_vec();
            bytes.splice(at..at, more);
        }
        // Whether it holds is another test's; this one is that there is an answer.
        let answer = compare(&bytes);
        prop_assert!(!same || doubled || answer.is_ok());
    }
}
