//! Lines of text, streamed and asked for, with any ending and any pattern that compiles.
//!
//! The first byte chooses the profile, the second the pieces in which the rest is heard.

#![no_main]

use ebbline::entry::{Id, Instrument, Measures, Protocol, Socket};
use ebbline::instrument::{Found, KEPT_BYTES, Reading, alone, fitting_text};
use libfuzzer_sys::fuzz_target;

const PATTERNS: [&str; 4] = [
    r"(?P<value>[-+]?\d+(\.\d+)?)",
    r"(?P<value>\S+)",
    r"(?P<value>[-+]?[\d.]+)\s*(?P<unit>\S+)?",
    r"^(?:[^,]*,){2}(?P<value>[^,]*)",
];
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

fuzz_target!(|data: &[u8]| {
    let [choice, pieces, bytes @ ..] = data else { return };
    let at = |shift: u8| usize::from((choice >> shift) & 3);
    let (pattern, ends) = (PATTERNS[at(0)], ENDS[at(2)]);
    let ask = (choice & 16 != 0).then(|| "READ?\n".to_owned());
    let measures = if choice & 32 != 0 { Measures::Pressure } else { Measures::Flow };
    let Ok(id) = Id::new("I-1") else { return };
    let instrument = Instrument {
        id,
        measures,
        socket: Some(Socket::Port("p".to_owned())),
        baud: Some(9_600),
        frame: None,
        unit: (choice & 64 != 0).then(|| if choice & 32 != 0 { "bar" } else { "L/min" }.to_owned()),
        protocol: Some(Protocol::Lines {
            ask: ask.clone(),
            every: None,
            ends: ends.to_owned(),
            pattern: pattern.to_owned(),
            stale_after: None,
        }),
        papers: None,
    };
    for proposal in fitting_text(bytes, &instrument) {
        assert!(!proposal.changes.is_empty() && proposal.readings.len() >= 2);
        assert!(alone(&proposal.instrument).is_ok());
    }
    let Ok(mut bus) = alone(&instrument) else { return };
    let talk = bus.conversation.as_mut();
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
    if ask.is_some() {
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
