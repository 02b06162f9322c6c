//! Lines of text: readings, every fault, and finding the way back after noise.

use ebbline::entry::{Instrument, Measures, Protocol};
use ebbline::instrument::FaultKind::{
    CutNumber, Empty, Garbage, HalfLine, Impossible, NoMatch, NoUnit, NotANumber, NotFinite, OtherUnit,
    OutOfRange, Silence, TooLong, UnknownUnit, UnstatedReference,
};
use ebbline::instrument::text_line::LineReader;
use ebbline::instrument::{Found, KEPT_BYTES, alone, buses};
use ebbline::quantity::Span;
use proptest::prelude::*;

use super::support::{NUMBER, Talk, asked, lines, to_16_bar};

/// A pattern that takes anything as the number.
const WORD: &str = r"(?P<value>\S+)";
const WITH_UNIT: &str = r"(?P<value>[-+]?[\d.]+)\s*(?P<unit>\S+)?";

fn reader(instrument: &Instrument) -> LineReader {
    let Some(Protocol::Lines { pattern, .. }) = &instrument.protocol else { panic!("no lines") };
    LineReader::new(instrument, pattern).unwrap()
}

/// What was found, in short: the number shown, or the name of the fault.
fn short(found: &[Found]) -> Vec<String> {
    let one = |found: &Found| match &found.what {
        Ok(reading) => format!("{}:{}", found.member, reading.shown),
        Err(fault) => format!("{}:{:?}", found.member, fault.kind),
    };
    found.iter().map(one).collect()
}

#[test]
fn numbers_come_out_in_si_and_as_they_were_shown() {
    // Conversions: SI Brochure, 9th edition; psi: 6894.757 293 168 Pa (NIST SP 811, B.8).
    for (measures, unit, line, si) in [
        (Measures::Flow, "L/min", "0.512", 0.512 / 60_000.0),
        (Measures::Flow, "mL/min", "512", 0.512 / 60_000.0),
        (Measures::Pressure, "bar", "+10.5", 1.05e6),
        (Measures::Pressure, "psi", "100", 689_475.729_316_8),
        (Measures::Temperature, "°C", "-0.5", 272.65),
        (Measures::Barometer, "hPa", "1009.2", 100_920.0),
        (Measures::Cell, "mV", "48.0", 0.048),
        (Measures::Cell, "bar", "1.28", 128_000.0),
        (Measures::Depth, "m", "-0.1", -0.1),
    ] {
        let reading = reader(&lines("I", measures, NUMBER, Some(unit))).read(line.as_bytes()).unwrap();
        let relative = (reading.si - si).abs() / si.abs();
        assert!(relative < 1e-12, "{line} {unit}: got {}, want {si}, differs by {relative:e}", reading.si);
        assert_eq!(reading.shown.to_bits(), line.parse::<f64>().unwrap().to_bits());
    }
    let flow = reader(&lines("I", Measures::Flow, NUMBER, Some("L/min"))).read(b"0.3337").unwrap();
    assert_eq!(flow.indicated_flow().as_l_min().to_bits(), 0.3337_f64.to_bits());
}

#[test]
fn every_fault_of_a_line_holds_its_bytes_and_is_no_reading() {
    let flow = |pattern| lines("FM-1", Measures::Flow, pattern, Some("L/min"));
    let bare = |pattern| lines("FM-1", Measures::Flow, pattern, None);
    let ip = |unit| lines("PT-1", Measures::Pressure, NUMBER, Some(unit));
    let ranged = Instrument { papers: Some(to_16_bar()), ..ip("bar") };
    for (instrument, line, kind) in [
        (flow(NUMBER), b"".as_slice(), Empty),
        (flow(NUMBER), b"  \t", Empty),
        (flow(NUMBER), b"0.5\xfe2", Garbage),
        (flow(NUMBER), b"0.5\x002", Garbage),
        (flow(NUMBER), b"\x1b[2J0.512", Garbage),
        (flow(NUMBER), b"-.-", NoMatch),
        (flow(NUMBER), b"ERROR", NoMatch),
        (flow(NUMBER), b"1e999", CutNumber),
        (flow(NUMBER), b"1.2.3", CutNumber),
        (flow(NUMBER), b"0,512", CutNumber),
        (flow(r"(?P<value>\d+\.\d+)"), b"-0.5", CutNumber),
        (flow(r"(?P<value>\d\.\d\d)"), b"0.512", CutNumber),
        (flow(r"(?P<value>\d\.\d\d)"), b"10.51", CutNumber),
        (flow(r"(?P<value>\d+)$"), b"0,512", CutNumber),
        (flow(r"(?P<value>[\d.]+)$"), b"1,013.2", CutNumber),
        (flow(WORD), b"-.-", NotANumber),
        (flow(WORD), b"----", NotANumber),
        (flow(WORD), b"+-5", NotANumber),
        (flow(WORD), b"0,512", NotANumber),
        (flow(WORD), b"0x1F", NotANumber),
        (flow(WORD), b"NaN", NotFinite),
        (flow(WORD), b"-inf", NotFinite),
        (flow(WORD), b"1e999", NotFinite),
        (bare(WITH_UNIT), b"0.512", NoUnit),
        (bare(WITH_UNIT), b"0.512 L/mni", UnknownUnit),
        (bare(WITH_UNIT), b"0.512 slpm", UnstatedReference),
        (bare(WITH_UNIT), b"0.512 bar", OtherUnit),
        (lines("PT-1", Measures::Pressure, WITH_UNIT, None), b"152 psia", OtherUnit),
        (lines("B-1", Measures::Barometer, WITH_UNIT, None), b"1 barg", OtherUnit),
        (ip("bar"), b"-1.1", Impossible),
        (lines("T-1", Measures::Temperature, NUMBER, Some("°C")), b"-300", Impossible),
        (lines("B-1", Measures::Barometer, NUMBER, Some("hPa")), b"-1", Impossible),
        (lines("B-1", Measures::Barometer, NUMBER, Some("hPa")), b"101.3", OutOfRange),
        (flow(NUMBER), b"512", OutOfRange),
        (ranged, b"32.1", OutOfRange),
    ] {
        let shown = String::from_utf8_lossy(line);
        let fault = reader(&instrument).read(line).expect_err(&shown);
        assert_eq!((fault.kind, fault.bytes.as_slice()), (kind, line), "{shown}");
    }
    let long = vec![b'#'; 400];
    assert_eq!(reader(&flow(NUMBER)).read(&long).unwrap_err().bytes.len(), KEPT_BYTES);
}

#[test]
fn what_only_looks_doubtful_is_a_reading() {
    let flow = |pattern| lines("FM-1", Measures::Flow, pattern, Some("L/min"));
    let unit = |measures, line: &str| {
        reader(&lines("I", measures, WITH_UNIT, None))
            .read(line.as_bytes())
            .map(|reading| reading.unit.symbol)
    };
    for (pattern, line, shown) in [
        (NUMBER, b"0.512,21.3,1009".as_slice(), 0.512),
        (r"(?P<value>[\d.]+)$", b"21.3,0.512", 0.512),
        (NUMBER, b"\n0.512\r", 0.512),
        (NUMBER, b"\x020.512\x03", 0.512),
        (NUMBER, b"0.512 \xb0", 0.512),
        (NUMBER, "0.512 m³/h".as_bytes(), 0.512),
        (r"CH-(?P<value>\d+\.\d+)", b"CH-0.512", 0.512),
        (r"(?P<value>[-+]?\s*[\d.]+)", b"S S  -    0.512 L", -0.512),
        (r"(?P<value>[-+]?\d\.\d+E[-+]\d+)", b"+5.12E-01", 0.512),
        (r"^(?:[^,]*,){2}(?P<value>[-\d.]+)", b"1,2,3.5,4", 3.5),
        (NUMBER, b"3 elements", 3.0),
    ] {
        let reading = reader(&flow(pattern)).read(line).unwrap();
        assert_eq!(reading.shown.to_bits(), f64::to_bits(shown), "{}", String::from_utf8_lossy(line));
    }
    assert_eq!(unit(Measures::Flow, "12 mL/min"), Ok("mL/min"));
    assert_eq!(unit(Measures::Pressure, "152 psig"), Ok("psi"));
    assert_eq!(unit(Measures::Barometer, "1009 mbar(abs)"), Ok("mbar"));
    assert_eq!(unit(Measures::Temperature, "21 degC"), Ok("°C"));
    assert_eq!(unit(Measures::Cell, "48 mV"), Ok("mV"));
    assert_eq!(unit(Measures::Cell, "0.98 bar"), Ok("bar"));
    // The unit in the line is believed, not that of the profile: somebody turned the meter's display.
    let turned = reader(&lines("FM-1", Measures::Flow, WITH_UNIT, Some("L/min")));
    assert!((turned.read(b"512 mL/min").unwrap().si - turned.read(b"0.512").unwrap().si).abs() < 1e-18);
}

#[test]
fn a_value_is_far_out_of_range_only_a_whole_span_outside_it() {
    let ranged =
        Instrument { papers: Some(to_16_bar()), ..lines("PT-1", Measures::Pressure, NUMBER, Some("bar")) };
    let reader = reader(&ranged);
    assert!(reader.read(b"16.4").is_ok() && reader.read(b"31.9").is_ok() && reader.read(b"-0.3").is_ok());
    let above = reader.read(b"16.4").unwrap();
    assert_eq!(reader.scale().within_range(&above), Some(false));
    assert_eq!(reader.read(b"32.01").unwrap_err().kind, OutOfRange);
}

#[test]
fn a_stream_is_joined_at_its_first_ending() {
    let mut bus = alone(&lines("FM-1", Measures::Flow, NUMBER, Some("L/min"))).unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    talk.hear(b"2.5\r\n0.512\r\n0.5");
    assert_eq!(short(&talk.take()), ["0:0.512"]);
    talk.hear(b"13\r\n");
    assert_eq!(short(&talk.take()), ["0:0.513"]);
}

#[test]
fn half_a_line_is_said_and_its_late_rest_is_no_reading() {
    let mut bus = alone(&lines("FM-1", Measures::Flow, NUMBER, Some("L/min"))).unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    talk.hear(b"\r\n1");
    talk.pass(0.4);
    assert!(talk.found.is_empty());
    talk.pass(0.2);
    talk.hear(b"2.5\r\n0.512\r\n");
    let found = talk.take();
    assert_eq!(short(&found), ["0:HalfLine", "0:0.512"]);
    assert_eq!(found[0].what.as_ref().unwrap_err().bytes, b"1");
}

#[test]
fn a_stream_that_falls_silent_or_has_no_endings_says_so() {
    let mut bus = alone(&lines("FM-1", Measures::Flow, NUMBER, Some("L/min"))).unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    talk.pass(4.1);
    assert_eq!(short(&talk.take()), ["0:Silence", "0:Silence"]);
    talk.hear(&b"0.512;".repeat(200));
    assert_eq!(short(&talk.take()), [format!("0:{TooLong:?}")]);
    talk.hear(b"\r\n0.513\r\n");
    assert_eq!(short(&talk.take()), ["0:0.513"]);
}

#[test]
fn two_instruments_read_one_line_and_none_is_blamed_for_the_other_s() {
    let flow = lines("FM-1", Measures::Flow, r"F (?P<value>[-\d.]+)", Some("L/min"));
    let gas = lines("T-1", Measures::Temperature, r"T (?P<value>[-\d.]+) (?P<unit>\S+)", None);
    let mut bus = buses(&[flow, gas]).unwrap().pop().unwrap();
    assert_eq!(bus.members, [0, 1]);
    let mut talk = Talk::open(bus.conversation.as_mut());
    talk.hear(b"\r\nF 0.512 T 21.3 C\r\nF 0.513\r\nT 21.4 C\r\nhello\r\nF 0.514 T -.- C\r\n\xff\r\n");
    assert_eq!(
        short(&talk.take()),
        [
            "0:0.512",
            "1:21.3",
            "0:0.513",
            "1:21.4",
            "0:NoMatch",
            "1:NoMatch",
            "0:0.514",
            "1:NotANumber",
            "0:Garbage",
            "1:Garbage"
        ]
    );
}

#[test]
fn an_asked_instrument_is_asked_in_time_and_its_echo_is_no_answer() {
    let mut bus = alone(&asked("FM-1", Measures::Flow, "READ?\n", NUMBER, "L/min")).unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    for answer in [
        b"0.512\r\n".as_slice(),
        b"READ?\r\n0.512\r\n",
        b"READ?\n0.512\r\n",
        b"READ?\n\r\n0.512\r\n",
        b"\r\n0.512\r\n",
        b"ready\r\n0.512\r\n",
    ] {
        assert_eq!(talk.until_sent(), b"READ?\n");
        talk.hear(answer);
        let found = short(&talk.take());
        assert_eq!(found.last().map(String::as_str), Some("0:0.512"), "{found:?}");
        let strange = answer.starts_with(b"ready");
        assert_eq!(found.len(), 1 + usize::from(strange), "{found:?}");
    }
    // Five questions a second, each answered at once.
    let before_s = talk.now_s;
    for _ in 0..5 {
        talk.until_sent();
        talk.hear(b"0.5\r\n");
    }
    assert!((talk.now_s - before_s - 1.0).abs() < 0.01, "{}", talk.now_s - before_s);
}

#[test]
fn an_instrument_asked_a_hundred_times_a_second_is_not_made_to_wait_for_silence() {
    let mut flow = asked("FM-1", Measures::Flow, "READ?\n", NUMBER, "L/min");
    if let Some(Protocol::Lines { every, .. }) = &mut flow.protocol {
        *every = Some(Span::from_s(0.01));
    }
    let mut bus = alone(&flow).unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    talk.until_sent();
    let from_s = talk.now_s;
    for _ in 0..100 {
        // Two milliseconds to the answer.
        talk.now_s += 0.002;
        talk.hear(b"0.512\r\n");
        talk.until_sent();
    }
    let lasted_s = talk.now_s - from_s;
    assert!((0.99..1.2).contains(&lasted_s), "{lasted_s} s");
    assert_eq!(short(&talk.take()), vec!["0:0.512"; 100]);
}

#[test]
fn a_question_does_not_eat_the_beginning_of_its_answer() {
    let mut bus = alone(&asked("FM-1", Measures::Flow, "0", NUMBER, "L/min")).unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    talk.until_sent();
    talk.hear(b"0.512\r\n");
    assert_eq!(short(&talk.take()), ["0:0.512"]);
}

#[test]
fn no_answer_and_half_an_answer_are_faults_and_the_next_question_begins_anew() {
    let mut bus = alone(&asked("FM-1", Measures::Flow, "READ?\n", NUMBER, "L/min")).unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    talk.until_sent();
    talk.until_sent();
    assert_eq!(short(&talk.take()), [format!("0:{Silence:?}")]);
    talk.hear(b"1");
    talk.until_sent();
    let found = talk.take();
    assert_eq!(short(&found), [format!("0:{HalfLine:?}")]);
    talk.hear(b"0.512\r\n");
    assert_eq!(short(&talk.take()), ["0:0.512"]);
    talk.until_sent();
    talk.hear(&[b'x'; 600]);
    assert_eq!(short(&talk.take()), [format!("0:{TooLong:?}")]);
    talk.until_sent();
    talk.hear(b"0.513\r\n");
    assert_eq!(short(&talk.take()), ["0:0.513"]);
}

#[test]
fn an_asked_instrument_that_streams_all_the_same_is_never_read_from_the_middle_of_a_line() {
    let mut bus = alone(&asked("FM-1", Measures::Flow, "READ?\n", NUMBER, "L/min")).unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    // A byte every ten milliseconds, without a pause, for half a minute.
    for byte in b"12.5\r\n".iter().cycle().take(3_000) {
        talk.hear(&[*byte]);
        talk.pass(0.01);
    }
    let found = short(&talk.take());
    assert!(found.iter().filter(|one| *one == "0:12.5").count() > 10, "{found:?}");
    assert!(found.iter().all(|one| one == "0:12.5"), "{found:?}");
}

#[test]
fn one_answer_is_read_by_two_and_two_questions_take_turns() {
    let flow = asked("FM-1", Measures::Flow, "D?\r", r"^(?P<value>[\d.]+),", "L/min");
    let gas = asked("T-1", Measures::Temperature, "D?\r", r",(?P<value>[\d.]+)$", "°C");
    let ip = asked("PT-1", Measures::Pressure, "P?\r", NUMBER, "bar");
    let mut bus = buses(&[flow, gas, ip]).unwrap().pop().unwrap();
    let mut talk = Talk::open(bus.conversation.as_mut());
    assert_eq!(talk.until_sent(), b"D?\r");
    talk.hear(b"0.512,21.3\r\n");
    assert_eq!(talk.until_sent(), b"P?\r");
    talk.hear(b"10.5\r\n");
    assert_eq!(short(&talk.take()), ["0:0.512", "1:21.3", "2:10.5"]);
    // The answer to the first comes after its time; it is not taken for the pressure.
    assert_eq!(talk.until_sent(), b"D?\r");
    talk.pass(0.7);
    talk.hear(b"0.6,21.3\r\n");
    assert_eq!(talk.until_sent(), b"P?\r");
    talk.hear(b"10.6\r\n");
    assert_eq!(short(&talk.take()), ["0:Silence", "1:Silence", "2:10.6"]);
}

proptest! {
    #[test]
    fn every_good_line_behind_an_ending_is_found_whatever_stands_between(
        noise in prop::collection::vec(prop::collection::vec(any::<u8>(), 0..700), 1..8),
        ends in prop::sample::select(vec!["\r\n", "\n", "\r", ";", "\r\r\n"]),
        cut in 1_usize..40,
    ) {
        let mut instrument = lines("FM-1", Measures::Flow, r"^(?P<value>\d\.\d{3})$", Some("L/min"));
        if let Some(Protocol::Lines { ends: of_line, .. }) = &mut instrument.protocol {
            ends.clone_into(of_line);
        }
        let mut bytes = Vec::new();
        let mut good = Vec::new();
        for (n, noise) in noise.iter().enumerate() {
            let shown = format!("1.{:03}", n + 100);
            bytes.extend(noise);
            bytes.extend(format!("{ends}{shown}{ends}").bytes());
            good.push(shown);
        }
        let mut bus = alone(&instrument).unwrap();
        let mut talk = Talk::open(bus.conversation.as_mut());
        for piece in bytes.chunks(cut) {
            talk.hear(piece);
        }
        let found: Vec<String> = talk.take().into_iter().filter_map(|one| one.what.ok())
            .map(|reading| format!("{:.3}", reading.shown))
            .filter(|shown| good.contains(shown))
            .collect();
        prop_assert_eq!(found, good);
    }

    #[test]
    fn no_bytes_make_a_reading_that_is_not_finite(bytes in prop::collection::vec(any::<u8>(), 0..60)) {
        for pattern in [NUMBER, WORD, WITH_UNIT] {
            let reader = reader(&lines("FM-1", Measures::Flow, pattern, Some("L/min")));
            match reader.read(&bytes) {
                Ok(reading) => prop_assert!(reading.si.is_finite() && reading.shown.is_finite()),
                Err(fault) => prop_assert_eq!(fault.bytes, bytes.clone()),
            }
        }
    }
}
