//! Runs and issues, invented, and the contents made of them.

use chrono::{DateTime, NaiveDate};
use ebbline::bench::history::Accepted;
use ebbline::bench::{Analysis, Questions, analyse};
use ebbline::certificate::content::{self, Amendment, Content, Customer, Issue, Measured};
use ebbline::entry::{Build, Id, Orifice, Run, Shop, Signatory};

use crate::runs;

/// A run file that passes its acceptance.
pub(crate) const RUN: &str = r#"record = "bench run"
orifice = "CMF-0417"
gas = "oxygen"
purpose = "acceptance"
taken = "2026-11-12T09:40:00+11:00"
technician = "A. Invented"
readings = "run.csv"

[columns]
pressure = { column = "ip", unit = "bar" }
flow = { column = "flow", unit = "L/min" }
sweep = { column = "sweep" }

[conditions]
temperature = "21.0 °C ± 1.0 °C"
barometer = "1009.2 hPa ± 1.0 hPa"

[meter]
id = "FM-01"
kind = "mass"
reads_at = "20 °C, 101.325 kPa"
made_for = "oxygen"
gain = "0.8 %"
zero = "0.0006 L/min"
noise = "0.2 %"
resolution = "0.0001 L/min"
range = "0.02 L/min to 2 L/min"
certificate = "FM-2026-118"
due = "2027-03-01"

[transducer]
gain = "0.2 %"
zero = "0.010 bar"
noise = "0.004 bar"
resolution = "0.001 bar"
range = "0 bar to 16 bar"
certificate = "PT-2026-031"
due = "2027-03-01"

[acceptance]
ip = "10 bar"
flow = "0.48 L/min"
tolerance = "5 %"
rule = "guarded"
"#;

/// Readings of a straight line through nearly nought, `share` of the flow that passes.
pub(crate) fn readings(share: f64) -> String {
    let mut csv = String::from("ip,flow,sweep\n");
    for (i, step) in [4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 12, 11, 10, 9, 8, 7, 6, 5, 4].iter().enumerate() {
        let pressure = f64::from(*step) + 0.003 * f64::from(i32::try_from(i % 5).unwrap() - 2);
        let wobble = 1.0 + 0.0004 * f64::from(i32::try_from(i % 3).unwrap() - 1);
        let flow = share * 0.0466 * (pressure + 0.95) * wobble;
        let sweep = if i < 10 { "rising" } else { "falling" };
        csv.push_str(&format!("{pressure:.3},{flow:.4},{sweep}\n"));
    }
    csv
}

/// A run with its analysis.
pub(crate) struct Taken {
    pub name: String,
    pub run: Run,
    pub analysis: Analysis,
    pub before: Option<Accepted>,
}

impl Taken {
    pub(crate) fn new(name: &str, toml: &str, csv: &str) -> Self {
        Self::after(name, toml, csv, None)
    }

    pub(crate) fn after(name: &str, toml: &str, csv: &str, before: Option<Accepted>) -> Self {
        let run = runs::run(toml, csv);
        let questions = Questions { before: before.as_ref(), ..Questions::default() };
        let analysis = analyse(&run, runs::points(&run), &questions).unwrap();
        Self { name: name.to_owned(), run, analysis, before }
    }

    /// As the next run is compared with it.
    pub(crate) fn accepted(&self) -> Accepted {
        Accepted {
            name: self.name.clone(),
            gas: self.run.gas,
            flow: self.analysis.nominal.flow.clone(),
            meter_certificate: self.run.meter.papers.certificate.clone(),
            transducer_certificate: self.run.transducer.papers.certificate.clone(),
        }
    }

    pub(crate) fn measured(&self) -> Measured<'_> {
        Measured {
            name: &self.name,
            run: &self.run,
            analysis: &self.analysis,
            before: self.before.as_ref(),
            files: None,
        }
    }
}

/// A run that passes.
pub(crate) fn good() -> Taken {
    Taken::new("R0012", RUN, &readings(1.0))
}

/// An issue with everything that is needed.
pub(crate) fn issue() -> Issue {
    Issue {
        number: "IOW-2026-0007".into(),
        program: content::VERSION.into(),
        issued: DateTime::parse_from_rfc3339("2026-11-13T10:00:00+11:00").unwrap(),
        signatory: Signatory { name: "B. Invented".into(), role: Some("bench lead".into()) },
        shop: Shop {
            name: "Invented Orifice Works".into(),
            address: "1 Slip Road\n7000 Nowhere".into(),
            contact: Some("bench@invented.example".into()),
            logo: None,
            accent: Some("#0B6E7A".into()),
            number_pattern: None,
            signatories: Vec::new(),
            statements: vec!["Our bench stands in a heated room.".into()],
        },
        country: "AU".into(),
        customer: Customer {
            name: "Tern Club (invented)".into(),
            address: "Pier 3\n7001 Elsewhere".into(),
            contact: None,
        },
        item: Orifice {
            description: Some("restrictor of a left-hand block".into()),
            serial: Some("QX-0412".into()),
            maker: Some("Invented Valves".into()),
            build: Build::ShortTube,
            ..Orifice::bare(Id::new("CMF-0417").unwrap())
        },
        without_serial: false,
        condition: Some("clean, filter in place".into()),
        work_done: None,
        received: NaiveDate::from_ymd_opt(2026, 11, 10),
        place: None,
        supplied: vec!["serial number".into()],
        interval: None,
        chain_head: Some("9f2c".repeat(16)),
        amends: None,
        remarks: Vec::new(),
    }
}

/// The content of a run that passes.
pub(crate) fn good_content() -> Content {
    content::of(&issue(), &good().measured(), None)
}

/// A content for each kind of certificate there is, by name.
pub(crate) fn every_content() -> Vec<(&'static str, Content)> {
    let good = good();
    let one = |issue: &Issue, taken: &Taken| content::of(issue, &taken.measured(), None);
    let failed = Taken::new("R0013", RUN, &readings(0.8));
    let undecided = Taken::new("R0014", RUN, &readings(0.955));
    let simple = Taken::new("R0015", &RUN.replace("guarded", "simple"), &readings(1.0));
    let (without, _) = RUN.split_once("[acceptance]").unwrap();
    let without = Taken::new("R0016", without, &readings(1.0));
    let found = Taken::new("R0017", &RUN.replace("\"acceptance\"", "\"as-found\""), &readings(0.8));
    let left = Taken::after(
        "R0018",
        &RUN.replace("\"acceptance\"", "\"as-left\"").replace("T09:40", "T13:40"),
        &readings(0.999),
        Some(found.accepted()),
    );
    let cleaned = Issue { work_done: Some("cleaned in an ultrasonic bath".into()), ..issue() };
    let air = RUN
        .replace("gas = \"oxygen\"", "gas = \"air\"")
        .replace("made_for = \"oxygen\"", "made_for = \"oxygen\"\ngas_factor = \"1.00 ± 0.01\"")
        .replace("flow = \"0.48 L/min\"", "flow = \"0.48 L/min\"\ngas = \"oxygen\"");
    let air = Taken::new("R0019", &air, &readings(1.05));
    let amended = Issue {
        number: "IOW-2026-0008".into(),
        amends: Some(Amendment {
            instead: true,
            replaces: "IOW-2026-0007".into(),
            what: "address of the customer".into(),
            why: "it was that of a branch".into(),
            digest: Some("ab".repeat(32)),
        }),
        place: Some("aboard, at the customer's pier".into()),
        interval: Some("calibrate again after a year.".into()),
        ..issue()
    };
    let mut hostile = issue();
    hostile.customer.name = "<script>alert(1)</script> ]]> & &amp; \"q\" 'a' =1+1".into();
    hostile.customer.address = "=1+1\n@cmd\n<!-- no comment -->".into();
    hostile.signatory.name = "Ελένη Παπαδοπούλου".into();
    hostile.shop.name = "Отверстие и клапан; Ñandú & Søn".into();
    hostile.shop.address = "x".repeat(10_000);
    hostile.item.description = Some("y".repeat(10_000));
    hostile.item.serial = Some("%n%s\\".into());
    hostile.remarks = vec!["]]>".into(), "<![CDATA[x]]>".into()];
    vec![
        ("accepted", one(&issue(), &good)),
        ("failed", one(&issue(), &failed)),
        ("undecided", one(&issue(), &undecided)),
        ("simple", one(&issue(), &simple)),
        ("without-limits", one(&issue(), &without)),
        ("cleaned", content::of(&cleaned, &left.measured(), Some(&found.measured()))),
        ("air", one(&issue(), &air)),
        ("amended", one(&amended, &good)),
        ("hostile", one(&hostile, &good)),
    ]
}
