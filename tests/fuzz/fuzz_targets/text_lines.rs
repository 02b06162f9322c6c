//! Lines of text, streamed and asked for, with any ending and any pattern that compiles.
//!
//! The first byte chooses the profile, the second the pieces in which the rest is heard.

#![no_main]

use std::collections::BTreeMap;
use std::sync::{Mutex, OnceLock};

use ebbline::entry::{Id, Instrument, Measures, Protocol, Socket};
use ebbline::instrument::text_line::LineReader;
use ebbline::instrument::{
    Asked, Conversation, Found, KEPT_BYTES, Question, Reading, Streamed, alone, fitting_text,
};
use libfuzzer_sys::fuzz_target;

const PATTERNS: [&str; 4] = [
    r"(?P<value>[-+]?\d+(\.\d+)?)",
    r"(?P<value>\S+)",
    r"(?P<value>[-+]?[\d.]+)\s*(?P<unit>\S+)?",
    r"^(?:[^,]*,){2}(?P<value>[^,]*)",
];
const ASK: &str = "READ?\n";
const ENDS: [&str; 4] = ["\r\n", "\r", ";", "\r\r\n"];

/// What any instrument of the trade may show: 100 L/min either way, a full vacuum to 400 bar.
fn is_believable(reading: &Reading, measures: Measures) -> bool {
    reading.shown.is_finite()
        && match measures {
            Measures::Flow => (-1e-1 / 60.0..=1e-1 / 60.0).contains(&reading.si),
            _ => (-101_325.0..=4e7).contains(&reading.si),
        }
}

fn check(found: &[Found], measures: Measures) {
    for one in found {
        assert_eq!(one.member, 0);
        match &one.what {
            Ok(reading) => assert!(is_believable(reading, measures), "{reading:?}"),
            Err(fault) => assert!(fault.bytes.len() <= KEPT_BYTES),
        }
    }
}

fn proposals(bytes: &[u8], instrument: &Instrument) {
    for proposal in fitting_text(bytes, instrument) {
        assert!(!proposal.changes.is_empty() && proposal.readings.len() >= 2);
        assert!(alone(&proposal.instrument).is_ok());
    }
}

fn instrument(choice: u8) -> Option<Instrument> {
    let at = |shift: u8| usize::from((choice >> shift) & 3);
    let measures = if choice & 32 != 0 { Measures::Pressure } else { Measures::Flow };
    Some(Instrument {
        id: Id::new("I-1").ok()?,
        measures,
        socket: Some(Socket::Port("p".to_owned())),
        baud: Some(9_600),
        frame: None,
        unit: (choice & 64 != 0).then(|| if choice & 32 != 0 { "bar" } else { "L/min" }.to_owned()),
        protocol: Some(Protocol::Lines {
            ask: (choice & 16 != 0).then(|| ASK.to_owned()),
            every: None,
            ends: ENDS[at(2)].to_owned(),
            pattern: PATTERNS[at(0)].to_owned(),
            stale_after: None,
        }),
        papers: None,
    })
}

/// Patterns take longer to compile than anything else here: each choice keeps its own.
fn reader(choice: u8, instrument: &Instrument) -> Option<LineReader> {
    static READERS: OnceLock<Mutex<BTreeMap<u8, LineReader>>> = OnceLock::new();
    let mut readers = READERS.get_or_init(Mutex::default).lock().ok()?;
    if !readers.contains_key(&choice) {
        let reader = LineReader::new(instrument, PATTERNS[usize::from(choice & 3)]).ok()?;
        readers.insert(choice, reader);
    }
    readers.get(&choice).cloned()
}

fuzz_target!(|data: &[u8]| {
    let [choice, pieces, bytes @ ..] = data else { return };
    let Some(instrument) = instrument(*choice) else { return };
    let measures = instrument.measures;
    let (pattern, ends) = (PATTERNS[usize::from(choice & 3)], ENDS[usize::from((choice >> 2) & 3)]);
    let asks = choice & 16 != 0;
    // What would read these bytes better is looked for in a few of them only: it tries dozens of patterns.
    if choice & 128 != 0 && *pieces == 255 {
        proposals(bytes, &instrument);
    }
    let Some(reader) = reader(choice & 127, &instrument) else { return };
    for line in bytes.split(|byte| *byte == b'\n') {
        check(&[Found { member: 0, what: reader.read(line) }], measures);
    }
    let mut talk: Box<dyn Conversation> = if asks {
        let question = Question {
            ask: ASK.as_bytes().to_vec(),
            ends: ends.as_bytes().to_vec(),
            every_s: None,
            readers: vec![(0, reader)],
        };
        Box::new(Asked::new(vec![question], 9_600))
    } else {
        Box::new(Streamed::new(ends.as_bytes(), vec![(reader, None)]))
    };
    let mut found = Vec::new();
    let mut now_s = 0.0;
    talk.opened(now_s);
    for piece in bytes.chunks(usize::from(pieces % 32) + 1) {
        talk.turn(now_s, &mut found);
        talk.heard(now_s, piece, &mut found);
        // A piece that begins with a byte above 127 comes after a pause.
        now_s += if piece[0] > 127 { f64::from(piece[0]) / 100.0 } else { 0.001 };
        assert!(talk.wake_s() > now_s - 10.0);
    }
    check(&found, measures);
    // Whatever came: a line behind an ending is found, an answer to the next question too.
    found.clear();
    let good = match (pattern.contains("{2}"), choice & 64 != 0 || !pattern.contains("unit")) {
        (true, _) => "a,b,0.5",
        (false, true) => "0.5",
        (false, false) => return,
    };
    let line = format!("{good}{ends}");
    if asks {
        let from_s = now_s;
        let mut asked = false;
        while !asked && now_s < from_s + 20.0 {
            now_s += 0.01;
            asked = talk.turn(now_s, &mut found).is_some();
        }
        assert!(asked, "not asked again");
        found.clear();
        // A line that never fell silent is joined at its first ending.
        talk.heard(now_s, format!("{ends}{line}").as_bytes(), &mut found);
    } else {
        talk.heard(now_s, format!("{ends}{line}").as_bytes(), &mut found);
    }
    check(&found, measures);
    if choice & 64 == 0 {
        return;
    }
    let is_good =
        |one: &Found| matches!(&one.what, Ok(reading) if reading.shown.to_bits() == 0.5_f64.to_bits());
    assert!(found.iter().any(is_good), "{found:?}");
});
