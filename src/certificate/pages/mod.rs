//! A content set in pages: which section, table and sentence stands where. Nothing is computed here.
//!
//! Comes in: a [`Content`], its XML, and the paper. Goes out: a [`Document`] that [`super::paper`] sets, or writes as plain
//! text for a look before issuing. The first page holds letterhead, number, customer, item, the headline with its verdict and
//! the drawing; the rest follows in the order in which one asks for it.

mod sections;

use super::content::{Calibration, Content, File, PROGRAM, StatementKind};
use super::paper::{
    Attachment, Block, Document, Figure, Letterhead, Level, Logo, Notice, Pair, Paper, Relationship,
    Sentence, Signature, Standing, Text, Verdict as PaperVerdict,
};
use crate::bench::Verdict;

/// Longest stem of a file's name made of a number.
const LONGEST_STEM: usize = 80;

/// The document of a content, with everything attached. `xml` are the bytes of its XML.
#[must_use]
pub fn document(content: &Content, paper: Paper, xml: &[u8]) -> Document {
    let issue = &content.issue;
    let mut blocks = first_page(content);
    blocks.extend(sections::calibration(&content.results, Level::Two));
    if let Some(found) = &content.as_found {
        blocks.push(Block::Heading(Level::Two, found.title.to_owned()));
        blocks.push(headline(found));
        blocks.push(drawing(found));
        blocks.extend(sections::calibration(found, Level::Three));
    }
    blocks.extend(content.changed_by_work.iter().flat_map(|work| {
        [
            Block::Heading(Level::Two, "Change by the work on the item".to_owned()),
            Block::Paragraph(work.says.as_str().into()),
            sections::comparison(work),
        ]
    }));
    blocks.extend(end(content));
    Document {
        paper,
        language: "en".to_owned(),
        title: format!("{} {}", content.title, issue.number),
        author: Some(issue.shop.name.clone()),
        producer: format!("{PROGRAM} {}", issue.program),
        date: issue.issued,
        running_head: format!("{} {}", content.title, issue.number),
        end: format!("End of certificate {}", issue.number),
        accent: issue.shop.accent.clone(),
        letterhead: Some(Letterhead {
            name: issue.shop.name.clone(),
            address: lines(&issue.shop.address)
                .chain(issue.shop.contact.as_deref())
                .map(str::to_owned)
                .collect(),
            logo: issue
                .shop
                .logo
                .as_ref()
                .map(|logo| Logo { bytes: logo.bytes.clone(), alt: format!("Logo of {}", issue.shop.name) }),
        }),
        blocks,
        attachments: attachments(content, xml),
    }
}

/// The content as plain text, for a look before issuing.
#[must_use]
pub fn text(content: &Content, width: usize) -> String {
    super::paper::text(&document(content, Paper::A4, &[]), width)
}

/// The number of a certificate as the stem of a file's name.
#[must_use]
pub fn file_stem(number: &str) -> String {
    let plain = |c: char| if c.is_ascii_alphanumeric() || matches!(c, '-' | '_' | '.') { c } else { '-' };
    let stem: String = number.chars().take(LONGEST_STEM).map(plain).collect();
    let stem = stem.trim_start_matches(['.', '-']);
    if stem.is_empty() { "certificate".to_owned() } else { stem.to_owned() }
}

fn lines(text: &str) -> impl Iterator<Item = &str> {
    text.lines().map(str::trim).filter(|line| !line.is_empty())
}

fn pair(key: &str, value: impl Into<Text>) -> Pair {
    Pair { key: key.to_owned(), value: value.into() }
}

fn first_page(content: &Content) -> Vec<Block> {
    let (issue, of) = (&content.issue, &content.results);
    let item = &issue.item;
    let mut pairs = vec![
        pair("Certificate", Text::bold(&issue.number)),
        pair("Date of issue", issue.issued.date_naive().to_string()),
    ];
    pairs.extend(issue.amends.as_ref().map(|amends| {
        let head = if amends.instead { "Replaces" } else { "Amends" };
        pair(head, Text::bold(&amends.replaces))
    }));
    pairs.push(pair("Calibrated", days(content)));
    pairs.extend(issue.received.map(|day| pair("Received", day.to_string())));
    pairs.push(pair("Place of the work", content.place.as_str()));
    let customer = lines(&issue.customer.address).chain(issue.customer.contact.as_deref());
    let customer: Vec<&str> = std::iter::once(issue.customer.name.trim()).chain(customer).collect();
    pairs.push(pair("Customer", customer.join(", ")));
    pairs.push(pair("Item", item.description.as_deref().unwrap_or("orifice")));
    pairs.push(pair("Serial number", item.serial.as_deref().unwrap_or("the item bears none")));
    pairs.extend(item.maker.as_ref().map(|maker| pair("Maker", maker.as_str())));
    pairs.push(pair("Name in the register", item.id.to_string()));
    pairs.push(pair("Build", item.build.name()));
    pairs.extend(issue.condition.as_ref().map(|text| pair("Condition on receipt", text.as_str())));
    pairs.push(pair("Gas", of.gas.as_str()));
    let mut blocks =
        vec![Block::Heading(Level::One, content.title.to_owned()), Block::Pairs { pairs, two_columns: true }];
    // What changed against an earlier certificate is not to be found on a later page.
    blocks.extend(
        content
            .statements
            .iter()
            .filter(|said| said.kind == StatementKind::Amendment)
            .map(|said| Block::Paragraph(said.text.as_str().into())),
    );
    blocks.push(headline(of));
    if let Some(found) = &content.as_found {
        let verdict = found.conformity.as_ref().map(|c| format!(" Verdict: {}.", c.word)).unwrap_or_default();
        let work = content.changed_by_work.as_ref().map(|work| format!(" {}", work.says)).unwrap_or_default();
        let text = Text::bold(format!("{}: ", found.title));
        blocks.push(Block::Paragraph(text.and(format!("{}{verdict}{work}", found.headline))));
    }
    blocks.push(drawing(of));
    let always = content.statements.iter();
    let always = always.filter(|said| matches!(said.kind, StatementKind::Scope | StatementKind::Copying));
    let always: Vec<&str> = always.map(|said| said.text.as_str()).collect();
    blocks.push(Block::FinePrint(always.join(" ").into()));
    blocks
}

fn days(content: &Content) -> String {
    let (first, last) = content.performed;
    if first == last { first.to_string() } else { format!("{first} to {last}") }
}

fn headline(of: &Calibration) -> Block {
    Block::Sentence(Sentence {
        // A number stays with its uncertainty and its unit.
        statement: of.headline.replace(" ± ", "\u{A0}±\u{A0}").replace(" L/min", "\u{A0}L/min").into(),
        verdict: of.conformity.as_ref().map(|conformity| PaperVerdict {
            standing: match conformity.verdict {
                Verdict::Pass => Standing::Holds,
                Verdict::Fail => Standing::DoesNotHold,
                Verdict::Undecided | Verdict::None => Standing::Undecided,
            },
            words: Text::bold(conformity.word.to_uppercase())
                .and(format!(" by the {} rule: {}", conformity.rule, conformity.says)),
        }),
    })
}

fn drawing(of: &Calibration) -> Block {
    Block::Figure(Figure { svg: of.plot.clone(), alt: of.plot_says.clone(), caption: None, width: 1.0 })
}

/// What stands behind the results: how, with what warnings, what is inside, who signs.
fn end(content: &Content) -> Vec<Block> {
    let method = &content.method;
    let mut blocks = vec![
        Block::Heading(Level::Two, "Method".to_owned()),
        Block::Paragraph(method.name.into()),
        Block::Paragraph(method.says.into()),
        Block::Paragraph(
            format!(
                "{}. Computed by {PROGRAM} {}, revision {} of its method.",
                method.norms.join("; "),
                method.program,
                method.revision
            )
            .into(),
        ),
    ];
    for said in &content.statements {
        // Those stand on the first page.
        if matches!(said.kind, StatementKind::Scope | StatementKind::Copying | StatementKind::Amendment) {
            continue;
        }
        blocks.push(Block::Paragraph(Text::bold(format!("{}. ", said.kind.name())).and(&said.text)));
    }
    blocks.push(Block::Notice(Notice {
        label: "Caution".to_owned(),
        paragraphs: content.cautions.iter().map(|caution| Text::plain(sentence_case(caution))).collect(),
    }));
    blocks.push(sections::files(&content.files));
    let signatory = &content.issue.signatory;
    let mut signatures: Vec<Signature> = Vec::new();
    for of in content.calibrations() {
        let role = format!("Measured run {}", of.run);
        if let Some(name) = &of.technician {
            signatures.push(Signature {
                role,
                name: Some(name.clone()),
                details: vec![of.taken.date_naive().to_string()],
            });
        }
    }
    signatures.push(Signature {
        role: "Authorised by".to_owned(),
        name: Some(signatory.name.clone()),
        details: signatory
            .role
            .iter()
            .cloned()
            .chain([content.issue.issued.date_naive().to_string()])
            .collect(),
    });
    blocks.push(Block::Signatures(signatures));
    blocks
}

/// A sentence that may begin small because it stood behind a dash.
fn sentence_case(text: &str) -> String {
    let mut all = text.chars();
    all.next().map_or_else(String::new, |first| first.to_uppercase().chain(all).collect())
}

fn attachments(content: &Content, xml: &[u8]) -> Vec<Attachment> {
    let modified = content.issue.issued;
    let mut all = Vec::new();
    if !xml.is_empty() {
        all.push(Attachment {
            name: format!("{}.xml", file_stem(&content.issue.number)),
            mime_type: "application/xml".to_owned(),
            relationship: Relationship::Alternative,
            description: "this certificate as a digital calibration certificate".to_owned(),
            bytes: xml.to_vec(),
            modified,
        });
    }
    all.extend(content.files.iter().map(|file: &File| Attachment {
        name: file.name.clone(),
        mime_type: file.mime.to_owned(),
        relationship: if file.mime == "text/csv" { Relationship::Data } else { Relationship::Source },
        description: file.says.to_owned(),
        bytes: file.bytes.clone(),
        modified,
    }));
    all
}
