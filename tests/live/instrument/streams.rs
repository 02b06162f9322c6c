//! Listening: ports that come and go, counts, and profiles that do not go together. The clock is virtual.

use std::sync::Arc;

use ebbline::clock::Ticks as _;
use ebbline::entry::{Instrument, Measures, ModbusNumber, Socket};
use ebbline::instrument::modbus_frame::sealed;
use ebbline::instrument::{
    Differ, FaultKind, Heard, Lost, OpenError, PortSeen, ProfileError, Streams, UsbIdentity, What, Worker,
    buses, by_hand, listen, port_of,
};

use super::support::{NUMBER, Port, asked, lines, modbus};

fn start(instruments: &[Instrument], port: &Port) -> (Worker, Streams) {
    let (mut workers, streams) = by_hand(instruments, &port.opener(), &port.clock()).unwrap();
    assert_eq!(workers.len(), 1);
    (workers.pop().unwrap(), streams)
}

/// Turns the worker until the clock shows so many seconds, and returns what was heard.
fn until(worker: &mut Worker, streams: &Streams, port: &Port, s: f64) -> Vec<Heard> {
    while port.ticks.now_s() < s {
        worker.turn();
    }
    streams.waiting().collect()
}

fn short(heard: &[Heard]) -> Vec<String> {
    let one = |heard: &Heard| match &heard.what {
        What::Reading(reading) => format!("{}:{}", heard.instrument, reading.shown),
        What::Fault(fault) => format!("{}:{:?}", heard.instrument, fault.kind),
        What::Connected => format!("{}:connected", heard.instrument),
        What::Lost(why) => format!("{}:lost, {why}", heard.instrument),
    };
    heard.iter().map(one).collect()
}

#[test]
fn readings_are_stamped_when_they_arrive_and_counted() {
    let flow = lines("FM-1", Measures::Flow, NUMBER, Some("L/min"));
    let port = Port::new("8N1", 9_600)
        .says(0.0, 0.25, 40, |n| format!("0.5{}{}\r\n", n / 10, if n < 30 { n % 10 } else { 0 }));
    let (mut worker, streams) = start(&[flow], &port);
    let heard = until(&mut worker, &streams, &port, 10.0);
    let readings: Vec<f64> =
        heard.iter().filter(|one| matches!(one.what, What::Reading(_))).map(|one| one.at_s).collect();
    // The first line is dropped: whether it was heard from its beginning, nobody knows.
    let want: Vec<f64> = (1..40).map(|n| 0.25 * f64::from(n)).collect();
    assert_eq!(readings, want);
    let counts = &streams.counters()[0];
    assert_eq!((counts.readings, counts.bytes, counts.faults_in_all()), (39, 40 * 7, 0));
    assert!((counts.rate_per_s().unwrap() - 4.0).abs() < 1e-9);
    assert!((counts.age_s(10.0).unwrap() - 0.25).abs() < 1e-9);
    // The last ten, from second 7.5 on, show the same number.
    assert_eq!(
        counts.unchanged.map(|(times, since_s)| (times, since_s.to_bits())),
        Some((10, 7.5_f64.to_bits()))
    );
    assert!(counts.connected && counts.losses == 0);
}

#[test]
fn a_port_that_goes_away_is_said_and_found_again() {
    let flow = lines("FM-1", Measures::Flow, NUMBER, Some("L/min"));
    let port = Port::new("8N1", 9_600).says(0.0, 0.1, 400, |_| "0.512\r\n".to_owned());
    let (mut worker, streams) = start(&[flow], &port);
    until(&mut worker, &streams, &port, 1.0);
    port.world.lock().unwrap().plugged = false;
    let heard = short(&until(&mut worker, &streams, &port, 20.0));
    assert_eq!(heard, ["0:lost, the port was closed by its other end: check the cable"]);
    // Tried again after 0.1, 0.2, 0.4 … 3.2 and then every 5 s.
    let tried_s = port.world.lock().unwrap().tried_s.clone();
    let waits: Vec<f64> = tried_s.windows(2).skip(1).map(|two| two[1] - two[0]).collect();
    assert_eq!(waits.len(), 7, "{waits:?}");
    for (got, want) in waits.iter().zip([0.2, 0.4, 0.8, 1.6, 3.2, 5.0, 5.0]) {
        assert!((got - want).abs() < 1e-6, "{waits:?}");
    }
    port.world.lock().unwrap().plugged = true;
    let heard = short(&until(&mut worker, &streams, &port, 26.0));
    assert_eq!(heard[..2], ["0:connected", "0:0.512"]);
    assert_eq!(streams.counters()[0].losses, 1);
}

#[test]
fn a_port_that_is_not_there_is_said_once() {
    let flow = lines("FM-1", Measures::Flow, NUMBER, Some("L/min"));
    let port = Port::new("8N1", 9_600);
    port.world.lock().unwrap().plugged = false;
    let (mut worker, streams) = start(&[flow], &port);
    let heard = until(&mut worker, &streams, &port, 60.0);
    assert!(matches!(
        heard.as_slice(),
        [Heard { what: What::Lost(Lost::Open(OpenError::NotThere { .. })), .. }]
    ));
}

#[test]
fn a_silent_port_is_opened_anew_after_five_seconds() {
    let flow = lines("FM-1", Measures::Flow, NUMBER, Some("L/min"));
    let port = Port::new("8N1", 9_600).says(0.0, 0.5, 3, |_| "0.512\r\n".to_owned());
    let (mut worker, streams) = start(&[flow], &port);
    let heard = short(&until(&mut worker, &streams, &port, 6.5));
    assert_eq!(
        heard,
        [
            "0:connected",
            "0:0.512",
            "0:0.512",
            "0:Silence",
            "0:Silence",
            "0:lost, nothing was heard for 5 s",
            "0:connected"
        ]
    );
    assert_eq!(port.world.lock().unwrap().opened, 2);
}

#[test]
fn a_device_that_does_not_answer_is_asked_again_on_a_port_opened_anew() {
    let port = Port::new("8N1", 19_200);
    let (mut worker, streams) = start(&[modbus("PT-1", 1, 0, ModbusNumber::I32)], &port);
    until(&mut worker, &streams, &port, 12.0);
    assert_eq!(port.world.lock().unwrap().opened, 3);
    port.world.lock().unwrap().answer = Box::new(|_| sealed(vec![1, 4, 4, 0, 0, 0x29, 0x04]));
    let heard = short(&until(&mut worker, &streams, &port, 20.0));
    assert!(heard.iter().filter(|one| *one == "0:10.5").count() > 20, "{heard:?}");
}

#[test]
fn faults_are_all_counted_and_handed_out_twenty_a_second() {
    let flow = lines("FM-1", Measures::Flow, NUMBER, Some("L/min"));
    let port = Port::new("8N1", 9_600).says(0.0, 0.01, 300, |_| "\u{7f}\r\n".to_owned());
    let (mut worker, streams) = start(&[flow], &port);
    let heard = until(&mut worker, &streams, &port, 3.0);
    let faults = heard.iter().filter(|one| matches!(one.what, What::Fault(_))).count();
    assert_eq!(streams.counters()[0].faults.get(&FaultKind::Garbage), Some(&299));
    assert!((60..=80).contains(&faults), "{faults}");
}

#[test]
fn threads_read_several_ports_and_stop() {
    let port = Port::new("8N1", 9_600).answers(|_| b"0.512\r\n".to_vec());
    let one = asked("FM-1", Measures::Flow, "F?\r", NUMBER, "L/min");
    let other = Instrument {
        socket: Some(Socket::Usb("0403:6001:A10K".to_owned())),
        ..asked("FM-2", Measures::Flow, "F?\r", NUMBER, "L/min")
    };
    let streams = listen(&[one, other], &port.opener(), &port.clock()).unwrap();
    let mut seen = [0, 0];
    while seen.iter().any(|count| *count < 20) {
        let heard = streams.wait(10.0).expect("the threads say something");
        if matches!(heard.what, What::Reading(_)) {
            seen[heard.instrument] += 1;
        }
    }
    let world = Arc::clone(&port.world);
    let _rest = streams.stop();
    // Both threads are gone, and with them their ends of the port.
    drop(port);
    assert_eq!(Arc::strong_count(&world), 1);
}

#[test]
fn profiles_that_cannot_be_listened_to_are_refused_before_a_port_is_opened() {
    let flow = || lines("FM-1", Measures::Flow, NUMBER, Some("L/min"));
    let refused = |instruments: &[Instrument]| match buses(instruments) {
        Ok(_) => panic!("listened to"),
        Err(error) => error,
    };
    assert!(matches!(refused(&[Instrument { socket: None, ..flow() }]), ProfileError::NoSocket { .. }));
    assert!(matches!(refused(&[Instrument { baud: None, ..flow() }]), ProfileError::NoBaud { .. }));
    assert!(matches!(refused(&[Instrument { protocol: None, ..flow() }]), ProfileError::NoProtocol { .. }));
    let frame = Instrument { frame: Some("9X1".to_owned()), ..flow() };
    assert_eq!(
        refused(&[frame]).to_string(),
        "\"9X1\" of FM-1 is not a frame: write data bits, parity and stop bits, as in \"8N1\""
    );
    let unit = Instrument { unit: Some("bar".to_owned()), ..flow() };
    assert!(matches!(refused(&[unit]), ProfileError::Unit { .. }));
    for pattern in [r"(?P<value>\d{2,1})", r"\d+", r"(?P<value>(\w{1000}){1000})"] {
        let error = refused(&[lines("FM-1", Measures::Flow, pattern, Some("L/min"))]);
        assert!(matches!(&error, ProfileError::Pattern { why, .. } if !why.contains('\n')), "{error}");
    }
    let silent = Instrument { unit: None, ..modbus("PT-1", 1, 0, ModbusNumber::I32) };
    assert!(matches!(refused(&[silent]), ProfileError::NoUnit { .. }));
    let shared = |other: Instrument| match refused(&[flow(), other]) {
        ProfileError::Shared { what, .. } => what,
        error => panic!("{error}"),
    };
    assert_eq!(shared(Instrument { baud: Some(1_200), ..flow() }), Differ::Baud);
    assert_eq!(shared(Instrument { frame: Some("7E1".to_owned()), ..flow() }), Differ::Frame);
    let slow = Instrument { baud: Some(9_600), ..modbus("PT-1", 1, 0, ModbusNumber::I32) };
    assert_eq!(shared(slow), Differ::Protocol);
    assert_eq!(shared(asked("FM-2", Measures::Flow, "F?\r", NUMBER, "L/min")), Differ::Asked);
}

#[test]
fn a_usb_port_is_found_by_its_identity_and_by_nothing_less() {
    let seen = |name: &str, serial: Option<&str>| PortSeen {
        name: name.to_owned(),
        usb: Some(UsbIdentity {
            vendor: 0x0403,
            product: 0x6001,
            serial: serial.map(str::to_owned),
            maker: None,
            name: None,
        }),
    };
    let plain = PortSeen { name: "S0".to_owned(), usb: None };
    let ports =
        [plain, seen("U0", Some("A10K")), seen("U1", Some("B:7")), seen("U2", None), seen("U3", None)];
    assert_eq!(port_of(&ports, "0403:6001:A10K"), Ok("U0"));
    assert_eq!(port_of(&ports, "0403:6001:B:7"), Ok("U1"));
    assert_eq!(ports[2].usb.as_ref().unwrap().text().as_deref(), Some("0403:6001:B:7"));
    assert_eq!(ports[3].usb.as_ref().unwrap().text(), None);
    for other in ["0403:6001:a10k", "0403:6002:A10K", "0403:6001:", "0403:6001", "A10K"] {
        assert!(matches!(port_of(&ports, other), Err(OpenError::NotPlugged { .. })), "{other}");
    }
    let twice = [seen("U0", Some("A10K")), seen("U1", Some("A10K"))];
    assert_eq!(
        port_of(&twice, "0403:6001:A10K").unwrap_err().to_string(),
        "several ports belong to 0403:6001:A10K (U0, U1): name one of them as port"
    );
}
