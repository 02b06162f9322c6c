//! Invented documents, one like a certificate and several at the edges.

use chrono::{DateTime, FixedOffset};
use ebbline::certificate::paper::*;

/// When every sample was made.
pub(crate) fn moment() -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339("2026-11-28T16:40:00+01:00").unwrap()
}

/// A document with nothing in it.
pub(crate) fn bare(blocks: Vec<Block>) -> Document {
    Document {
        paper: Paper::A4,
        language: "en".to_owned(),
        title: "A document".to_owned(),
        author: Some("Sump & Sons".to_owned()),
        producer: "ebbline 0.1.0".to_owned(),
        date: moment(),
        running_head: "EB-2026-0017".to_owned(),
        end: "end of certificate EB-2026-0017".to_owned(),
        accent: None,
        letterhead: None,
        blocks,
        attachments: Vec::new(),
    }
}

/// A golden drawing of the room `plot`.
pub(crate) fn plot(name: &str) -> String {
    std::fs::read_to_string(format!("{}/fixtures/golden/{name}.svg", env!("CARGO_MANIFEST_DIR"))).unwrap()
}

pub(crate) fn pair(key: &str, value: &str) -> Pair {
    Pair { key: key.to_owned(), value: value.into() }
}

pub(crate) const LOGO_SVG: &str = "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 340 90\"><rect width=\"90\" \
    height=\"90\" rx=\"8\" fill=\"#0B6E7A\"/><path d=\"M14 40h62M14 52h40\" stroke=\"#fff\" stroke-width=\"6\"/><text x=\"104\" \
    y=\"58\" font-family=\"DejaVu Sans\" font-size=\"34\" fill=\"#1D2A33\">Sump&amp;Sons</text></svg>";

pub(crate) fn letterhead() -> Letterhead {
    Letterhead {
        name: "Sump & Sons, Diving Workshop".to_owned(),
        address: vec![
            "Hafenstraße 12, 18439 Stralsund, Germany".to_owned(),
            "workshop@sump.example · +49 3831 555 0142".to_owned(),
        ],
        logo: Some(Logo { bytes: LOGO_SVG.as_bytes().to_vec(), alt: "Sign of Sump & Sons".to_owned() }),
    }
}

/// Points of a run.
pub(crate) fn points(count: usize) -> Table {
    let mut rows = Vec::new();
    for i in 0..count {
        let pressure = 6.0 + 0.5 * i as f64;
        let row = Row::new([
            (i + 1).to_string(),
            if i % 7 < 4 { "rising" } else { "falling" }.to_owned(),
            format!("{pressure:.2}"),
            format!("{:.4} ± 0.0021", 0.04831 * pressure),
            format!("{:+.1}", (i % 9) as f64 * 0.5 - 2.0).replace('-', "−"),
            if i == 4 { "left out: the meter was still warming up when it was read" } else { "" }.to_owned(),
        ]);
        rows.push(match i {
            4 => row.with(Emphasis::Quiet),
            8 => row.with(Emphasis::Strong),
            _ => row,
        });
    }
    Table {
        caption: Some(Text::plain(
            "Points as corrected, in the order they were taken. Points left out stay in the table.",
        )),
        columns: vec![
            Column::new("no.", Align::Right),
            Column::new("sweep", Align::Left),
            Column::numbers("IP", "bar gauge"),
            Column::numbers("flow", "L/min STPD, k = 2"),
            Column::numbers("residual", "mL/min"),
            Column::new("remark", Align::Left),
        ],
        rows,
        row_heads: true,
    }
}

/// What a certificate is like, five pages on A4.
pub(crate) fn certificate() -> Document {
    let flow_at_ip = Table {
        caption: Some(Text::plain("Flow by the line, oxygen, STPD.")),
        columns: vec![
            Column::numbers("IP", "bar"),
            Column::numbers("IP", "psi"),
            Column::numbers("flow", "L/min"),
            Column::numbers("U", "L/min"),
            Column::numbers("U", "%"),
        ],
        rows: (0..14)
            .map(|i| {
                let ip = 7.0 + 0.5 * f64::from(i);
                let row = Row::new([
                    format!("{ip:.1}"),
                    format!("{:.1}", ip * 14.5038),
                    format!("{:.4}", 0.0483 * ip),
                    format!("{:.4}", 0.0052 + 0.0003 * f64::from(i)),
                    format!("{:.1}", 1.1 + 0.07 * f64::from(i)),
                ]);
                if i == 5 { row.with(Emphasis::Strong) } else { row }
            })
            .collect(),
        row_heads: true,
    };
    let budget = Table {
        caption: Some(Text::plain("Budget of the flow at 9.5 bar.")),
        columns: vec![
            Column::new("source", Align::Left),
            Column::new("how it is known", Align::Left),
            Column::numbers("u", "mL/min"),
            Column::numbers("share", "%"),
        ],
        rows: vec![
            Row::new([
                "flow meter, gain",
                "certificate FM-2026-118, k = 2, with the drift since then added",
                "2.41",
                "71",
            ]),
            Row::new(["flow meter, zero", "read before and after the run", "0.32", "1.3"]),
            Row::new(["transducer, gain", "certificate PT-0093", "1.02", "13"]),
            Row::new(["gas temperature", "thermometer beside the meter, ± 0.5 °C", "0.41", "2.1"]),
            Row::new(["fit", "scatter of the points about the line (χ²/ν = 1.31, widened)", "0.98", "12"]),
            Row::new(["combined", "ν_eff = 43, k = 2.02", "2.86", "100"]).with(Emphasis::Strong),
        ],
        row_heads: true,
    };
    let mut document = bare(vec![
        Block::Heading(Level::One, "Calibration certificate".to_owned()),
        Block::Pairs {
            pairs: vec![
                pair("Number", "EB-2026-0017"),
                pair("Customer", "Ødegård Dykk AS, Storgata 7, 8006 Bodø, Norway"),
                pair("Contact", "Łucja Ødegård"),
                pair("Calibrated on", "28 November 2026"),
                pair("Issued on", "28 November 2026"),
                pair("Item", "CMF orifice, short tube, 90 µm nominal"),
                pair("Serial number", "CMF-0417"),
                pair("Condition", "clean, filter renewed before the run (as left)"),
                pair("Received on", "26 November 2026"),
                pair("Place", "workshop, Stralsund"),
            ],
            two_columns: true,
        },
        Block::Sentence(Sentence {
            statement: Text::plain("At 9.5 bar the orifice passes ")
                .and_bold("0.4589\u{A0}±\u{A0}0.0058\u{A0}L/min")
                .and(" of oxygen (STPD, k\u{A0}=\u{A0}2.02, 95\u{A0}%)."),
            verdict: Some(Verdict {
                standing: Standing::Holds,
                words: Text::bold("Within limits")
                    .and(", 0.440 to 0.480 L/min, by the guarded rule; probability of conformity 97.3\u{A0}%."),
            }),
        }),
        Block::Figure(Figure {
            svg: plot("run-good-960"),
            alt: "Flow against pressure: twelve points on a straight line with its band".to_owned(),
            caption: Some(Text::plain("Corrected points, the line and its band (95 %). Hatched: outside the useful range.")),
            width: 1.0,
        }),
        Block::Notice(Notice {
            label: "Caution".to_owned(),
            paragraphs: vec![
                Text::plain(
                    "The line holds between the lowest and the highest point, for the orifice as tested, while the hole is choked. \
                     It does not replace watching PO2.",
                ),
                Text::plain("The oxygen compatibility of the item was not examined."),
            ],
        }),
        Block::Heading(Level::Two, "The line".to_owned()),
        Block::Paragraph(
            Text::plain("The line ").and_bold("q = α + β·p₁").and(
                " was fitted with uncertainties in both variables (ISO/TS 28037:2010, clause 7). What moves all points together \
                 never enters the fit; it is carried through it source by source. Results relate only to the item calibrated.",
            ),
        ),
        Block::Pairs {
            pairs: vec![
                pair("Intercept α", "−0.0012 ± 0.0031 L/min"),
                pair("Slope β", "0.04412 ± 0.00035 L/(min·bar)"),
                pair("Covariance", "−1.02 × 10⁻⁹ (L/min)²/bar"),
                pair("Choke ratio", "0.52 (supported by the run)"),
                pair("Effective diameter", "91.4 µm ± 0.6 µm"),
            ],
            two_columns: false,
        },
        Block::Table(flow_at_ip),
        Block::Heading(Level::Two, "Points".to_owned()),
        Block::Table(points(24)),
        Block::Heading(Level::Two, "Budget".to_owned()),
        Block::Table(budget),
        Block::Heading(Level::Two, "Checks".to_owned()),
        Block::List(vec![
            Text::bold("Choked: ").and("holds. The lowest point stands at 4.1 times the critical ratio."),
            Text::bold("Straight: ").and("holds. A curved line fits no better (p = 0.41)."),
            Text::bold("Repeatable: ").and("undecided. Only two points were repeated; take each pressure twice to let it decide."),
        ]),
        Block::Heading(Level::Three, "Equipment".to_owned()),
        Block::Table(Table {
            caption: None,
            columns: vec![
                Column::new("instrument", Align::Left),
                Column::new("serial number", Align::Left),
                Column::new("certificate", Align::Left),
                Column::new("due", Align::Left),
            ],
            rows: vec![
                Row::new(["thermal flow meter, 1 L/min", "M-2210-88", "FM-2026-118", "2027-03-01"]),
                Row::new(["pressure transducer, 16 bar", "T-0093", "PT-0093", "2027-05-14"]),
                Row::new(["thermometer", "TH-5", "Θ-2026/5", "2027-01-31"]),
            ],
            row_heads: false,
        }),
        Block::Together(vec![
            Block::Heading(Level::Two, "Authorised".to_owned()),
            Block::Signatures(vec![
                Signature {
                    role: "Measured by".to_owned(),
                    name: Some("Ilona Varga".to_owned()),
                    details: vec!["Stralsund, 28 November 2026".to_owned()],
                },
                Signature {
                    role: "Authorised by".to_owned(),
                    name: Some("Γεώργιος Παπαδόπουλος".to_owned()),
                    details: vec!["head of the workshop".to_owned()],
                },
            ]),
            Block::FinePrint(Text::plain(
                "This certificate may be copied only in full. It is consistent with the readings attached to it; no accreditation is \
                 claimed. Customer and item are as the customer stated them.",
            )),
        ]),
    ]);
    document.title = "Calibration certificate EB-2026-0017".to_owned();
    document.letterhead = Some(letterhead());
    document.running_head = "Certificate EB-2026-0017".to_owned();
    document.attachments = vec![
        Attachment {
            name: "certificate.xml".to_owned(),
            mime_type: "application/xml".to_owned(),
            relationship: Relationship::Alternative,
            description: "The certificate for programs".to_owned(),
            bytes: b"<certificate number=\"EB-2026-0017\"/>\n".to_vec(),
            modified: moment(),
        },
        Attachment {
            name: "readings.csv".to_owned(),
            mime_type: "text/csv".to_owned(),
            relationship: Relationship::Source,
            description: "Raw readings".to_owned(),
            bytes: (0..2000).flat_map(|i| format!("{i},9.{i:03},0.45{i:02}\n").into_bytes()).collect(),
            modified: moment(),
        },
    ];
    document
}

/// Names of many peoples, one of them without end.
pub(crate) fn names() -> Document {
    let names = [
        "Ødegård, Þórunn & Łęcka-Ñandú",
        "Γεώργιος Παπαδόπουλος τοῦ Ἀθανασίου",
        "Юрій Ґалаґан, Ђорђе Њњ",
        "Nguye\u{302}\u{303}n Thi\u{323} Hoa\u{300}",
        "Nguyễn Thị Hoà",
        "Ǻrsěnëč «Šđž»",
        "µm, Ω, ≤ 10⁻⁹ · 25 °C ± 0.3 K → ∞",
        "fi ffl difficult AVAV To. Ta",
    ];
    let long = "Ab\u{308}c\u{327}".repeat(2_500);
    let mut blocks = vec![
        Block::Heading(Level::One, names[1].to_owned()),
        Block::Heading(Level::Two, format!("Heading {}", "long and longer ".repeat(20).trim_end())),
        Block::Pairs { pairs: names.iter().map(|name| pair(name, name)).collect(), two_columns: true },
        Block::Pairs { pairs: vec![pair("Name", &long), pair(&long[..210], "x")], two_columns: false },
        Block::Table(Table {
            caption: Some(Text::plain("A cell longer than a page beside short ones.")),
            columns: vec![
                Column::new("name", Align::Left),
                Column::numbers("n", "1"),
                Column::new("says", Align::Right),
            ],
            rows: vec![
                Row::new([long.as_str(), "1.5", "short"]).with(Emphasis::Strong),
                Row::new([
                    names[2],
                    "12.25",
                    "not one but several words that wrap in their column and go on and on",
                ]),
            ],
            row_heads: true,
        }),
        Block::Notice(Notice {
            label: "Caution".to_owned(),
            paragraphs: vec![names[0].into(), long[..4_200].into()],
        }),
        Block::Signatures(
            names
                .iter()
                .map(|n| Signature { role: "By".to_owned(), name: Some((*n).to_owned()), details: vec![] })
                .collect(),
        ),
    ];
    blocks.extend(names.iter().map(|name| Block::Paragraph(Text::plain(*name).and(" and ").and_bold(*name))));
    Document {
        letterhead: Some(Letterhead {
            name: format!("{} {}", names[0], "and Partners".repeat(30)),
            address: names.iter().map(|n| (*n).to_owned()).collect(),
            logo: Some(Logo { bytes: LOGO_SVG.as_bytes().to_vec(), alt: "sign".to_owned() }),
        }),
        author: Some(names[2].to_owned()),
        ..bare(blocks)
    }
}

/// The same on other paper.
pub(crate) fn on(paper: Paper) -> Document {
    Document { paper, ..certificate() }
}
