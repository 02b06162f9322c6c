//! Files that are damaged, or made to do harm.

use std::io::Write as _;

use ebbline::certificate::paper::read::{MOST_BYTES, MOST_STREAM_BYTES, ReadError, read};
use flate2::Compression;
use flate2::write::ZlibEncoder;
use proptest::prelude::*;

use super::samples::certificate;
use super::set;

/// A file of objects, numbered from 1, with a table that fits them.
fn pdf(objects: &[Vec<u8>], trailer: &str) -> Vec<u8> {
    let mut bytes = b"%PDF-1.7\n".to_vec();
    let mut table = format!("xref\n0 {}\n0000000000 65535 f \n", objects.len() + 1);
    for (i, object) in objects.iter().enumerate() {
        table.push_str(&format!("{:010} 00000 n \n", bytes.len()));
        bytes.extend(format!("{} 0 obj\n", i + 1).into_bytes());
        bytes.extend(object);
        bytes.extend(b"\nendobj\n");
    }
    let at = bytes.len();
    bytes.extend(table.into_bytes());
    bytes.extend(
        format!("trailer\n<</Size {} {trailer}>>\nstartxref\n{at}\n%%EOF\n", objects.len() + 1).into_bytes(),
    );
    bytes
}

fn simple(objects: &[&str]) -> Vec<u8> {
    pdf(&objects.iter().map(|object| object.as_bytes().to_vec()).collect::<Vec<_>>(), "/Root 1 0 R")
}

fn stream(dictionary: &str, data: &[u8]) -> Vec<u8> {
    let mut object = format!("<<{dictionary} /Length {}>>\nstream\n", data.len()).into_bytes();
    object.extend(data);
    object.extend(b"\nendstream");
    object
}

fn deflated(bytes: impl Iterator<Item = Vec<u8>>) -> Vec<u8> {
    let mut encoder = ZlibEncoder::new(Vec::new(), Compression::fast());
    bytes.for_each(|bytes| encoder.write_all(&bytes).unwrap());
    encoder.finish().unwrap()
}

const CATALOGUE: &str = "<</Type/Catalog/Pages 2 0 R>>";
const PAGES: &str = "<</Type/Pages/Kids[3 0 R]/Count 1>>";

#[test]
fn a_plain_small_file_is_read() {
    let page = "<</Type/Page/Contents[4 0 R 5 0 R]/Annots[6 0 R]>>";
    let mut objects: Vec<Vec<u8>> = [CATALOGUE, PAGES, page].iter().map(|o| o.as_bytes().to_vec()).collect();
    objects.push(stream("/Filter/FlateDecode", &deflated(std::iter::once(b"q Q".to_vec()))));
    objects.push(stream(
        "/Filter[/FlateDecode/FlateDecode]",
        &deflated(std::iter::once(deflated(std::iter::once(b"BT ET".to_vec())))),
    ));
    let contents = read(&pdf(&objects, "/Root 1 0 R")).unwrap();
    assert_eq!(contents.pages, [b"q Q\nBT ET\n".to_vec()]);
    assert_eq!((contents.annotated_pages, contents.revisions), (1, 1));
}

#[test]
fn what_is_no_pdf_or_cut_off_is_told() {
    let whole = set(&certificate());
    assert_eq!(read(b""), Err(ReadError::NotPdf));
    assert_eq!(read(b"<xml/>"), Err(ReadError::NotPdf));
    assert_eq!(read(b"%PDF-1.7\n"), Err(ReadError::Truncated));
    assert_eq!(read(&vec![b' '; MOST_BYTES + 1]), Err(ReadError::TooLarge(MOST_BYTES + 1)));
    for end in (5..whole.len() - 20).step_by(1_009) {
        assert_eq!(read(&whole[..end]), Err(ReadError::Truncated), "{end}");
    }
}

#[test]
fn encrypted_and_foreign_files_are_told() {
    let objects = [CATALOGUE, PAGES, "<</Type/Page>>"].map(|o| o.as_bytes().to_vec());
    assert_eq!(read(&pdf(&objects, "/Root 1 0 R /Encrypt 9 0 R")), Err(ReadError::Encrypted));
    assert!(matches!(read(&pdf(&objects, "/Root 1 0 R /XRefStm 9")), Err(ReadError::Foreign(_))));
    let packed = b"%PDF-1.7\n1 0 obj <</Type/XRef>> stream\nendstream endobj\nstartxref\n9\n%%EOF";
    assert!(matches!(read(packed), Err(ReadError::Foreign(_))));
    for filter in
        ["/LZWDecode", "[/ASCIIHexDecode]", "[/FlateDecode/FlateDecode/FlateDecode/FlateDecode]", "/Crypt"]
    {
        let page = "<</Type/Page/Contents 4 0 R>>";
        let mut objects: Vec<Vec<u8>> =
            [CATALOGUE, PAGES, page].iter().map(|o| o.as_bytes().to_vec()).collect();
        objects.push(stream(&format!("/Filter {filter}"), b"x"));
        assert!(matches!(read(&pdf(&objects, "/Root 1 0 R")), Err(ReadError::Foreign(_))), "{filter}");
    }
}

#[test]
fn a_file_that_was_written_on_to_is_read_as_it_was_last_and_says_so() {
    let mut bytes = simple(&[CATALOGUE, PAGES, "<</Type/Page>>"]);
    let before = bytes.windows(4).rposition(|w| w == b"xref").map(|at| at - 5).unwrap();
    let start: usize =
        String::from_utf8_lossy(&bytes[before + 10..]).lines().next().unwrap().parse().unwrap();
    let page = bytes.len();
    bytes.extend(b"3 0 obj <</Type/Page /Annots [<<>>]>> endobj\n");
    let at = bytes.len();
    bytes.extend(
        format!(
            "xref\n3 1\n{page:010} 00000 n \ntrailer <</Root 1 0 R /Prev {start}>>\nstartxref\n{at}\n%%EOF"
        )
        .into_bytes(),
    );
    let contents = read(&bytes).unwrap();
    assert_eq!((contents.revisions, contents.annotated_pages), (2, 1));
}

#[test]
fn circles_end() {
    let leaf = "<</Type/Page>>";
    for (objects, what) in [
        (vec![CATALOGUE, "<</Kids[2 0 R]>>"], "the tree of pages"),
        (vec![CATALOGUE, "<</Kids[3 0 R 3 0 R]>>", leaf], "the tree of pages"),
        (vec![CATALOGUE, "<</Kids[3 0 R]>>", "<</Kids[2 0 R]>>"], "the tree of pages"),
        (vec![CATALOGUE, "3 0 R", "2 0 R"], "references"),
        (
            vec![
                "<</Pages 2 0 R/Names<</EmbeddedFiles 4 0 R>>>>",
                PAGES,
                leaf,
                "<</Kids[5 0 R]>>",
                "<</Kids[4 0 R]>>",
            ],
            "the tree of attached files",
        ),
        (
            vec![
                "<</Pages 2 0 R/Names<</EmbeddedFiles<</Names[(a)4 0 R(b)4 0 R]>>>>>>",
                PAGES,
                leaf,
                "<</F(a)/EF<</F 5 0 R>>>>",
                "<</Length 0>>\nstream\n\nendstream",
            ],
            "two names for one attached file",
        ),
    ] {
        assert_eq!(read(&simple(&objects)), Err(ReadError::Circle(what)));
    }
    // A tree that is only deep.
    let mut deep: Vec<String> = vec![CATALOGUE.to_owned()];
    deep.extend((2..500).map(|i| format!("<</Kids[{} 0 R]>>", i + 1)));
    let deep: Vec<&str> = deep.iter().map(String::as_str).collect();
    assert_eq!(read(&simple(&deep)), Err(ReadError::Circle("the tree of pages")));
    // A table that names itself as the one before.
    let bytes = simple(&[CATALOGUE, PAGES, leaf]);
    let at = bytes
        .windows(5)
        .rposition(|w| w == b"xref\n")
        .and_then(|end| bytes[..end].windows(5).rposition(|w| w == b"xref\n"))
        .unwrap();
    let circle =
        pdf(&[CATALOGUE, PAGES, leaf].map(|o| o.as_bytes().to_vec()), &format!("/Root 1 0 R /Prev {at}"));
    assert_eq!(read(&circle), Err(ReadError::Circle("the tables of contents")));
}

#[test]
fn bombs_do_not_go_off() {
    let bomb = |megabytes: usize| deflated((0..megabytes).map(|_| vec![0; 1 << 20]));
    let page = |content: &str| format!("<</Type/Page/Contents {content}>>").into_bytes();
    let file = |content: &str, stream_object: Vec<u8>| {
        pdf(&[CATALOGUE.into(), PAGES.into(), page(content), stream_object], "/Root 1 0 R")
    };
    let small = file("4 0 R", stream("/Filter/FlateDecode", &bomb(16)));
    assert_eq!(read(&small).unwrap().pages[0].len(), MOST_STREAM_BYTES);
    let large = file("4 0 R", stream("/Filter/FlateDecode", &bomb(17)));
    assert_eq!(read(&large), Err(ReadError::Bomb { what: "content of a page", most_mb: 16 }));
    // Packed twice: small by itself, and only the second time it grows.
    let twice = deflated(std::iter::once(bomb(17)));
    let twice = file("4 0 R", stream("/Filter[/FlateDecode/FlateDecode]", &twice));
    assert!(matches!(read(&twice), Err(ReadError::Bomb { .. })));
    // The same stream again and again.
    let often = file(&format!("[{}]", "4 0 R ".repeat(100)), stream("/Filter/FlateDecode", &bomb(16)));
    assert_eq!(read(&often), Err(ReadError::Bomb { what: "all streams together", most_mb: 128 }));
    let plain = file("4 0 R", stream("", &vec![b' '; 17 << 20]));
    assert!(matches!(read(&plain), Err(ReadError::Bomb { .. })));
    // Much to read that unpacks to nothing.
    let empty_blocks =
        [vec![0x78, 0x9C], [0, 0, 0, 0xFF, 0xFF].repeat(400_000), vec![1, 0, 0, 0xFF, 0xFF, 0, 0, 0, 1]]
            .concat();
    let nothing =
        file(&format!("[{}]", "4 0 R ".repeat(1_000)), stream("/Filter/FlateDecode", &empty_blocks));
    assert_eq!(read(&nothing), Err(ReadError::TooMany("references to the same bytes")));
}

#[test]
fn heaps_of_objects_pages_and_files_are_refused() {
    let heap = format!("<</Kids [{}]>>", "1 ".repeat(1_500_000));
    assert_eq!(read(&simple(&[CATALOGUE, &heap])), Err(ReadError::TooMany("objects")));
    let kids: String = (3..6_000).map(|i| format!("{i} 0 R ")).collect();
    let mut objects = vec![CATALOGUE.to_owned(), format!("<</Kids[{kids}]>>")];
    objects.extend((3..6_000).map(|_| "<</Type/Page>>".to_owned()));
    let objects: Vec<&str> = objects.iter().map(String::as_str).collect();
    assert_eq!(read(&simple(&objects)), Err(ReadError::TooMany("pages")));
    let mut table = b"%PDF-1.7\nxref\n0 2000000\n".to_vec();
    table.extend(b"0000000009 00000 n \n".repeat(2_000_000));
    table.extend(b"trailer <<>>\nstartxref\n9\n%%EOF");
    assert_eq!(read(&table), Err(ReadError::TooMany("objects")));
}

#[test]
fn each_message_is_one_sentence() {
    let damaged = simple(&[CATALOGUE, "<</Kids[3 0 R]>>", "<</Type/Page /Contents 4 0 R"]);
    let words = read(&damaged).unwrap_err().to_string();
    assert!(words.starts_with("the file is damaged: "), "{words}");
    let all = [
        ReadError::TooLarge(1 << 27),
        ReadError::NotPdf,
        ReadError::Truncated,
        ReadError::Encrypted,
        ReadError::Foreign("its table of contents is packed"),
        ReadError::Damaged { what: "an object", at: 17 },
        ReadError::Missing("pages"),
        ReadError::Circle("references"),
        ReadError::Bomb { what: "content of a page", most_mb: 16 },
        ReadError::TooMany("pages"),
    ];
    for error in all {
        let words = error.to_string();
        assert!(words.starts_with("the file ") && !words.ends_with('.') && !words.contains('\n'), "{words}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 300, ..ProptestConfig::default() })]

    /// Bytes changed in a real file, some of them where its tables are.
    #[test]
    fn a_damaged_file_is_read_or_refused(changes in prop::collection::vec((any::<prop::sample::Index>(), any::<u8>(), any::<bool>()), 1..12)) {
        use std::sync::OnceLock;
        static WHOLE: OnceLock<Vec<u8>> = OnceLock::new();
        let mut bytes = WHOLE.get_or_init(|| set(&certificate())).clone();
        for (index, byte, late) in changes {
            let from = if late { bytes.len() - bytes.len() / 5 } else { 0 };
            let at = from + index.index(bytes.len() - from);
            bytes[at] = byte;
        }
        let _ = read(&bytes);
    }

    /// Objects put together at random.
    #[test]
    fn a_heap_of_words_is_read_or_refused(words in prop::collection::vec(prop::sample::select(vec![
        "<<", ">>", "[", "]", "/Kids", "/Contents", "/Names", "/EmbeddedFiles", "/EF", "/F", "/UF", "/Length", "/Filter", "/FlateDecode",
        "1 0 R", "2 0 R", "3 0 R", "4 0 R", "(a)", "<61", "17", "-1", "stream\n", "endstream", "null", "true", "%", "99999999999999999999",
    ]), 0..60)) {
        let text = words.join(" ");
        let _ = read(&simple(&["<</Pages 2 0 R/Names 4 0 R/AF[4 0 R]>>", "<</Kids[3 0 R]>>", "<</Contents 4 0 R>>", &text]));
        let _ = read(&simple(&[&text, &text, &text, &text]));
    }
}
