//! Each fault of the rig does what it says, to the device it was planned for and no other, and the log says so.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::io::{ErrorKind, Read, Write};
use std::sync::{Arc, Mutex};
use std::time::Duration;

use ebbline::entry::Id;
use ebbline::rig::modbus::frame;
use ebbline::rig::{
    Command, Fault, JumpingTime, Lasts, Overflow, Planned, Rig, RigError, Sent, Settings, SharedRig, Time,
    Transport, VirtualTime,
};

fn id(name: &str) -> Id {
    Id::new(name).unwrap()
}

struct Scene {
    rig: SharedRig,
    time: Arc<VirtualTime>,
}

impl Scene {
    fn new(faults: &[(&str, f64, Lasts, Fault)]) -> Self {
        let mut settings = Settings::standard(11).unwrap();
        settings.faults = faults
            .iter()
            .map(|(device, from_s, lasts, fault)| {
                (id(device), Planned { from_s: *from_s, lasts: *lasts, fault: fault.clone() })
            })
            .collect();
        let time = Arc::new(VirtualTime::new());
        let mut rig = Rig::new(settings).unwrap();
        rig.advance(0.0);
        Self { rig: Arc::new(Mutex::new(rig)), time }
    }

    fn open(&self, instrument: &str) -> Result<Transport, RigError> {
        let clock: Arc<dyn Time> = Arc::<VirtualTime>::clone(&self.time);
        Transport::open(&self.rig, &id(instrument), clock, Duration::from_millis(500))
    }

    /// What comes within so many seconds, to a reader that looks every fiftieth.
    fn listen(&self, line: &mut Transport, for_s: f64) -> Vec<(f64, Vec<u8>)> {
        let until = self.time.now_s() + for_s;
        line.set_timeout(Duration::ZERO);
        let mut heard = Vec::new();
        while self.time.now_s() < until - 1e-9 {
            self.time.advance(0.02);
            let mut buffer = [0; 4096];
            if let Ok(count) = line.read(&mut buffer) {
                heard.push((self.time.now_s(), buffer[..count].to_vec()));
            }
        }
        line.set_timeout(Duration::from_millis(500));
        heard
    }

    /// The lines of the log that had this fault.
    fn with(&self, fault: &Fault) -> Vec<Sent> {
        let rig = self.rig.lock().unwrap();
        rig.log().sent().filter(|sent| sent.message.faults.contains(fault)).cloned().collect()
    }
}

fn text(heard: &[(f64, Vec<u8>)]) -> String {
    let bytes: Vec<u8> = heard.iter().flat_map(|(_, bytes)| bytes.clone()).collect();
    String::from_utf8(bytes).unwrap()
}

/// Lines come every 0.2 s from 0.2 s on; a fault from 1 s to below 2 s befalls those at 1.0, 1.2, 1.4, 1.6 and 1.8 s.
fn between_one_and_two(fault: &Fault) -> (Scene, Vec<(f64, Vec<u8>)>) {
    let scene = Scene::new(&[("rig-flow", 1.0, Lasts::For(1.0), fault.clone())]);
    let mut line = scene.open("rig-flow").unwrap();
    let heard = scene.listen(&mut line, 3.0);
    let had = scene.with(fault);
    assert_eq!(had.len(), 5, "{fault}: {had:?}");
    assert!(
        had.iter().all(|sent| (1.0 - 1e-9..2.0).contains(&sent.message.time_s) || *fault == Fault::Burst)
    );
    assert!(had.iter().all(|sent| sent.message.device == id("rig-flow")));
    // What was heard is what the log has, in its order.
    let logged: Vec<u8> = {
        let rig = scene.rig.lock().unwrap();
        rig.log().sent().filter(|s| s.port == "flow").flat_map(|s| s.message.bytes.clone()).collect()
    };
    assert_eq!(heard.iter().flat_map(|(_, bytes)| bytes.clone()).collect::<Vec<u8>>(), logged, "{fault}");
    drop(line);
    (scene, heard)
}

#[test]
fn a_silence_leaves_out_what_was_meant() {
    let (scene, heard) = between_one_and_two(&Fault::Silence);
    assert_eq!(heard.len(), 10);
    let had = scene.with(&Fault::Silence);
    assert!(had.iter().all(|sent| sent.message.bytes.is_empty() && sent.message.meant.len() == 1));
}

#[test]
fn a_frozen_value_stays_while_the_truth_moves() {
    let (scene, _) = between_one_and_two(&Fault::Frozen);
    let had = scene.with(&Fault::Frozen);
    assert!(had.iter().all(|sent| sent.message.bytes == had[0].message.bytes), "{had:?}");
    let truths: Vec<f64> = had.iter().map(|sent| sent.message.meant[0].truth).collect();
    assert!(truths.windows(2).any(|pair| (pair[0] - pair[1]).abs() > 1e-12), "{truths:?}");
    // Noise of 0.1 % on 0.0001 L/min: five equal lines in a row do not come by chance.
    let rig = scene.rig.lock().unwrap();
    let healthy: Vec<&Sent> =
        rig.log().sent().filter(|s| s.port == "flow" && s.message.faults.is_empty()).collect();
    assert!(healthy.windows(5).all(|five| five.iter().any(|s| s.message.bytes != five[0].message.bytes)));
}

#[test]
fn no_number_and_overflow_are_texts_in_its_place() {
    for (fault, want) in [
        (Fault::NotANumber, "NaN L/min\r\n"),
        (Fault::Overflow(Overflow::Ol), "OL L/min\r\n"),
        (Fault::Overflow(Overflow::Dashes), "---- L/min\r\n"),
        (Fault::Overflow(Overflow::Huge), "9.9E37 L/min\r\n"),
    ] {
        let (_, heard) = between_one_and_two(&fault);
        assert_eq!(text(&heard).matches(want).count(), 5, "{fault}");
        assert_eq!(text(&heard).lines().count(), 15, "{fault}");
    }
}

#[test]
fn a_wrong_unit_is_the_same_reading_in_another() {
    let fault = Fault::WrongUnit("mL/min".to_owned());
    let (scene, _) = between_one_and_two(&fault);
    for sent in scene.with(&fault) {
        let meant = &sent.message.meant[0];
        assert_eq!(meant.unit, "L/min");
        // Four decimals of a litre are one of a millilitre.
        assert_eq!(sent.message.bytes, format!("{:.1} mL/min\r\n", meant.value * 1e3).as_bytes());
    }
}

#[test]
fn half_a_line_is_its_beginning() {
    let (scene, _) = between_one_and_two(&Fault::HalfLine);
    for sent in scene.with(&Fault::HalfLine) {
        let whole = format!("{:.4} L/min\r\n", sent.message.meant[0].value);
        let bytes = &sent.message.bytes;
        assert!(!bytes.is_empty() && bytes.len() < whole.len(), "{bytes:?}");
        assert!(whole.as_bytes().starts_with(bytes), "{bytes:?}");
    }
}

#[test]
fn garbage_stands_before_the_line() {
    let (scene, _) = between_one_and_two(&Fault::Garbage);
    let mut all = Vec::new();
    for sent in scene.with(&Fault::Garbage) {
        let whole = format!("{:.4} L/min\r\n", sent.message.meant[0].value);
        let garbage = sent.message.bytes.strip_suffix(whole.as_bytes()).unwrap().to_vec();
        assert!((1..=16).contains(&garbage.len()));
        all.extend(garbage);
    }
    // Of any value, so that not all is text.
    assert!(all.iter().any(|byte| !byte.is_ascii()), "{all:?}");
}

#[test]
fn an_echo_comes_before_the_answer_or_doubles_the_line() {
    let (scene, _) = between_one_and_two(&Fault::Echo);
    for sent in scene.with(&Fault::Echo) {
        let line = format!("{:.4} L/min\r\n", sent.message.meant[0].value);
        assert_eq!(sent.message.bytes, format!("{line}{line}").as_bytes());
    }
    let scene = Scene::new(&[
        ("rig-cell-1", 0.0, Lasts::Once, Fault::Echo),
        ("rig-gas", 0.0, Lasts::Once, Fault::Echo),
    ]);
    let mut cells = scene.open("rig-cell-1").unwrap();
    let (first, second) = (ask(&mut cells, b"C?\n"), ask(&mut cells, b"C?\n"));
    assert!(first.starts_with(b"C?\n3") && second.starts_with(b"3"), "{first:?} {second:?}");
    let mut bus = scene.open("rig-gas").unwrap();
    let request = frame(3, &[4, 0, 4, 0, 1]);
    let reply = ask(&mut bus, &request);
    assert!(reply.starts_with(&request) && reply.len() == 8 + 7, "{reply:?}");
    assert_eq!(ask(&mut bus, &request).len(), 7);
}

#[test]
fn a_burst_holds_back_and_then_all_comes_at_once() {
    let (_, heard) = between_one_and_two(&Fault::Burst);
    let at: Vec<(i64, usize)> = heard
        .iter()
        .map(|(s, bytes)| ((s * 100.0).round() as i64, bytes.iter().filter(|b| **b == b'\n').count()))
        .collect();
    assert_eq!(
        at,
        [(20, 1), (40, 1), (60, 1), (80, 1), (200, 6), (220, 1), (240, 1), (260, 1), (280, 1), (300, 1)]
    );
}

#[test]
fn a_late_line_is_late_by_as_much() {
    let scene = Scene::new(&[("rig-flow", 1.0, Lasts::Once, Fault::Late(0.5))]);
    let mut line = scene.open("rig-flow").unwrap();
    let heard = scene.listen(&mut line, 2.0);
    assert_eq!(text(&heard).lines().count(), 10);
    let late = scene.with(&Fault::Late(0.5));
    assert_eq!(late.len(), 1);
    assert!((late[0].message.time_s - 1.5).abs() < 1e-9, "{late:?}");
}

#[test]
fn an_unplugged_line_ends_and_has_to_be_opened_anew() {
    let scene = Scene::new(&[("rig-flow", 1.0, Lasts::For(2.0), Fault::Unplugged)]);
    let mut line = scene.open("rig-flow").unwrap();
    assert!(matches!(scene.open("rig-flow"), Err(RigError::InUse(_))));
    scene.time.advance(0.9);
    assert!(line.read(&mut [0; 4096]).unwrap() > 0);
    scene.time.advance(0.5);
    assert_eq!(line.read(&mut [0; 16]).unwrap(), 0);
    assert_eq!(line.write(b"x").unwrap_err().kind(), ErrorKind::BrokenPipe);
    assert!(matches!(scene.open("rig-flow"), Err(RigError::Unplugged(_))));
    scene.time.advance(2.0);
    // Plugged in again, but this end is dead.
    assert_eq!(line.read(&mut [0; 16]).unwrap(), 0);
    let mut anew = scene.open("rig-flow").unwrap();
    drop(line);
    assert!(matches!(scene.open("rig-flow"), Err(RigError::InUse(_))));
    assert!(anew.read(&mut [0; 4096]).unwrap() > 0);
    assert_eq!(scene.with(&Fault::Unplugged).len(), 1);
    // Nothing was sent in between.
    let rig = scene.rig.lock().unwrap();
    let of_flow = rig.log().sent().filter(|s| s.port == "flow" && !s.message.bytes.is_empty());
    let times: Vec<f64> = of_flow.map(|s| s.message.time_s).collect();
    assert!(times.len() > 4, "{times:?}");
    assert!(times.iter().all(|s| !(1.0 - 1e-9..3.0 - 1e-9).contains(s)), "{times:?}");
}

#[test]
fn a_jump_sets_the_clock_of_who_reads_and_not_the_rig() {
    let scene = Scene::new(&[("rig-flow", 1.0, Lasts::Once, Fault::ClockJump(-3_600.0))]);
    let clock = Arc::new(JumpingTime::new(Arc::clone(&scene.time)));
    scene.rig.lock().unwrap().may_set(Arc::<JumpingTime<Arc<VirtualTime>>>::clone(&clock));
    let mut line = scene.open("rig-flow").unwrap();
    assert_eq!(scene.listen(&mut line, 2.0).len(), 10);
    assert!((clock.now_s() - (2.0 - 3_600.0)).abs() < 1e-9, "{}", clock.now_s());
    assert_eq!(scene.with(&Fault::ClockJump(-3_600.0)).len(), 1);
}

fn ask(line: &mut Transport, request: &[u8]) -> Vec<u8> {
    line.write_all(request).unwrap();
    let mut buffer = [0; 300];
    let count = line.read(&mut buffer).unwrap_or(0);
    buffer[..count].to_vec()
}

#[test]
fn a_bus_has_bad_sums_wrong_addresses_and_numbers_that_are_none() {
    let once = |fault| ("rig-ip", 0.0, Lasts::Once, fault);
    for (fault, of_device) in [
        (Fault::BadCrc, 1),
        (Fault::WrongDevice, 2),
        (Fault::NotANumber, 1),
        (Fault::Overflow(Overflow::Ol), 1),
        (Fault::Silence, 1),
    ] {
        let scene = Scene::new(&[once(fault.clone())]);
        let mut bus = scene.open("rig-ip").unwrap();
        let request = frame(1, &[4, 0, 0, 0, 2]);
        // Another device on the bus is well.
        assert_eq!(ask(&mut bus, &frame(3, &[4, 0, 4, 0, 1])).len(), 7);
        let (bad, good) = (ask(&mut bus, &request), ask(&mut bus, &request));
        assert_eq!(good, frame(1, &good[1..7]), "{fault}");
        // IP in thousandths of a bar, near 4 bar.
        let shown = i32::from_be_bytes(good[3..7].try_into().unwrap());
        assert!((3_900..4_100).contains(&shown), "{shown}");
        match fault {
            Fault::Silence => assert!(bad.is_empty()),
            Fault::BadCrc => assert!(bad.len() == 9 && bad != frame(1, &bad[1..7])),
            _ => assert_eq!(bad, frame(of_device, &bad[1..7]), "{fault}"),
        }
        match fault {
            Fault::NotANumber => assert_eq!(bad[3..7], [0x80, 0, 0, 0]),
            Fault::Overflow(_) => assert_eq!(bad[3..7], [0x7F, 0xFF, 0xFF, 0xFF]),
            _ => {}
        }
        let had = scene.with(&fault);
        assert_eq!((had.len(), &had[0].message.bytes), (1, &bad), "{fault}");
    }
}

#[test]
fn a_line_of_the_wrong_device_is_its_neighbours() {
    let scene = Scene::new(&[("rig-flow", 0.1, Lasts::Once, Fault::WrongDevice)]);
    let mut line = scene.open("rig-flow").unwrap();
    let heard = text(&scene.listen(&mut line, 0.5));
    let mut lines = heard.lines();
    // IP, near 4 bar, where the flow should be.
    let wrong = lines.next().unwrap().strip_suffix(" bar").unwrap();
    assert!((wrong.parse::<f64>().unwrap() - 4.0).abs() < 0.1, "{heard}");
    assert!(lines.next().unwrap().starts_with("0.2"), "{heard}");
}

#[test]
fn faults_are_commanded_and_cleared_and_those_that_cannot_be_refused() {
    let scene = Scene::new(&[]);
    let mut line = scene.open("rig-flow").unwrap();
    let say = |text: &str| scene.rig.lock().unwrap().command(Command::parse(text)?);
    say("fault RIG-FLOW overflow ---- always").unwrap();
    assert_eq!(text(&scene.listen(&mut line, 1.0)), "---- L/min\r\n".repeat(5));
    say("clear rig-flow").unwrap();
    say("fault rig-flow silence for 400 ms in 1 s").unwrap();
    assert_eq!(scene.listen(&mut line, 2.0).len(), 8);
    assert_eq!(
        Command::parse("fault rig-flow wrong-unit psi once").unwrap(),
        Command::Fault {
            device: "rig-flow".to_owned(),
            fault: Fault::WrongUnit("psi".to_owned()),
            lasts: Lasts::Once,
            in_s: 0.0
        }
    );
    for (command, why) in [
        (
            "fault rig-flow wrong-unit psi",
            "rig-flow cannot have the fault wrong-unit psi: that is no unit of what it measures",
        ),
        ("fault rig-flow bad-crc", "rig-flow cannot have the fault bad-crc: its lines have no check sum"),
        (
            "fault rig-x silence",
            "the rig has no instrument rig-x; it has rig-flow, rig-ip, rig-barometer, rig-gas, rig-cell-1, rig-cell-2, rig-cell-3, rig-depth",
        ),
        ("fault rig-flow late", "the fault late needs a number of seconds behind it"),
        ("fault rig-flow overflow HIGH", "the fault overflow needs OL, ---- or 9.9E37 behind it"),
    ] {
        assert_eq!(say(command).unwrap_err().to_string(), why);
    }
    assert!(
        say("fault rig-flow smoke")
            .unwrap_err()
            .to_string()
            .starts_with("\"smoke\" is no fault of the rig; it knows garbage, ")
    );
    assert!(say("fault rig-flow silence whenever").is_err());
    say("fault rig-flow silence always").unwrap();
    say("clear").unwrap();
    assert_eq!(scene.listen(&mut line, 1.0).len(), 5);
}
