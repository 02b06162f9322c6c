//! The Modbus devices of the rig, against the examples of the specification and worked frames.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::io::{Read, Write};
use std::sync::{Arc, Mutex};
use std::time::Duration;

use ebbline::entry::{Id, ModbusNumber, ModbusTable, WordOrder};
use ebbline::rig::modbus::{answer, frame, words};
use ebbline::rig::{OffBy, Rig, Settings, Time, Transport, VirtualTime};

/// MODBUS Application Protocol V1.1b3, 6.3: registers 108 to 110 (from nought 107 to 109) hold 555, 0 and 100.
#[test]
fn the_example_of_function_3() {
    let word = |table, register: u16| {
        assert_eq!(table, ModbusTable::Holding);
        [555, 0, 100].get(usize::from(register.checked_sub(107)?)).copied()
    };
    let reply = answer(&[0x03, 0x00, 0x6B, 0x00, 0x03], word);
    assert_eq!(reply, [0x03, 0x06, 0x02, 0x2B, 0x00, 0x00, 0x00, 0x64]);
}

/// The same, 6.4: input register 9 (from nought 8) holds 10.
#[test]
fn the_example_of_function_4() {
    let word = |table, register| (table == ModbusTable::Input && register == 8).then_some(10);
    assert_eq!(answer(&[0x04, 0x00, 0x08, 0x00, 0x01], word), [0x04, 0x02, 0x00, 0x0A]);
}

/// The same, 7 and the state diagrams of 6.3 and 6.4: function with its high bit set; code 1 for a function that is not
/// there, 3 for a number of registers outside 1 to 125, 2 for an address that is not there.
#[test]
fn exceptions_as_the_specification_has_them() {
    let word = |_, register: u16| (register < 200).then_some(7);
    assert_eq!(answer(&[0x01, 0x04, 0xA1, 0x00, 0x01], word), [0x81, 0x01]);
    assert_eq!(answer(&[0x10, 0, 1, 0, 1, 2, 0, 0], word), [0x90, 0x01]);
    assert_eq!(answer(&[0x04, 0, 0, 0, 0], word), [0x84, 0x03]);
    assert_eq!(answer(&[0x03, 0, 0, 0, 126], word), [0x83, 0x03]);
    assert_eq!(answer(&[0x03, 0, 0, 0, 125], word).len(), 252);
    assert_eq!(answer(&[0x03, 0, 199, 0, 1], word), [0x03, 0x02, 0, 7]);
    assert_eq!(answer(&[0x03, 0, 199, 0, 2], word), [0x83, 0x02]);
    assert_eq!(answer(&[0x04, 0xFF, 0xFF, 0, 2], |_, _| Some(0)), [0x84, 0x02]);
}

/// IEEE 754: 1009.25 is 1.970…·2⁹, sign 0, exponent 127 + 9 = 136, mantissa 0x7C5000: 0x447C5000.
#[test]
fn every_type_in_both_orders() {
    use ModbusNumber::{F32, I16, I32, U16, U32};
    use WordOrder::{Big, Little};
    for (number, order, raw, want) in [
        (F32, Big, 1009.25, vec![0x447C, 0x5000]),
        (F32, Little, 1009.25, vec![0x5000, 0x447C]),
        (I32, Big, 10_002.0, vec![0x0000, 0x2712]),
        (I32, Big, -2.0, vec![0xFFFF, 0xFFFE]),
        (I32, Little, -65_537.0, vec![0xFFFF, 0xFFFE]),
        (U32, Big, 70_000.4, vec![0x0001, 0x1170]),
        (U32, Little, 70_000.4, vec![0x1170, 0x0001]),
        (I16, Big, -1.5, vec![0xFFFE]),
        (I16, Little, 211.0, vec![0x00D3]),
        (U16, Big, 65_535.0, vec![0xFFFF]),
        // Beyond the ends, and no number.
        (I16, Big, 40_000.0, vec![0x7FFF]),
        (U16, Big, -3.0, vec![0x0000]),
        (I32, Big, 9.9e37, vec![0x7FFF, 0xFFFF]),
        (I16, Big, f64::NAN, vec![0x8000]),
        (U16, Big, f64::NAN, vec![0xFFFF]),
        (I32, Big, f64::NAN, vec![0x8000, 0x0000]),
        (U32, Big, f64::NAN, vec![0xFFFF, 0xFFFF]),
    ] {
        assert_eq!(words(number, order, raw), want, "{number:?} {order:?} {raw}");
    }
    let nan = words(F32, Big, f64::NAN);
    assert!(f32::from_bits(u32::from(nan[0]) << 16 | u32::from(nan[1])).is_nan());
}

/// MODBUS over Serial Line V1.02, 6.2.2: the frame 02 07 is followed by 41 12.
#[test]
fn a_frame_ends_in_the_low_byte_of_its_sum_and_then_the_high_one() {
    assert_eq!(frame(2, &[7]), [0x02, 0x07, 0x41, 0x12]);
}

fn bus() -> (Arc<VirtualTime>, Transport) {
    let mut settings = Settings::standard(1).unwrap();
    settings.bench.regulator.scatter_bar = 0.0;
    settings.bench.regulator.creep_bar = 0.0;
    settings.bench.temperature_drift.by = 0.0;
    settings.bench.barometer_drift.by = 0.0;
    for gauge in &mut settings.gauges {
        gauge.off_by = Some(OffBy::default());
        gauge.allowed.noise = 0.0;
    }
    let rig = Arc::new(Mutex::new(Rig::new(settings).unwrap()));
    let time = Arc::new(VirtualTime::new());
    let clock: Arc<dyn Time> = Arc::<VirtualTime>::clone(&time);
    let line = Transport::open(&rig, &Id::new("rig-ip").unwrap(), clock, Duration::from_millis(300));
    (time, line.unwrap())
}

fn ask(line: &mut Transport, request: &[u8]) -> Vec<u8> {
    line.write_all(request).unwrap();
    let mut buffer = [0; 300];
    let count = line.read(&mut buffer).unwrap_or(0);
    buffer[..count].to_vec()
}

#[test]
fn three_devices_answer_on_one_bus_each_for_itself() {
    let (_, mut line) = bus();
    // IP 4.000 bar in thousandths; barometer 1009.2 hPa, low word first (0x447C4CCD); gas 21.0 °C in tenths.
    assert_eq!(ask(&mut line, &frame(1, &[4, 0, 0, 0, 2])), frame(1, &[4, 4, 0x00, 0x00, 0x0F, 0xA0]));
    assert_eq!(ask(&mut line, &frame(2, &[3, 0, 10, 0, 2])), frame(2, &[3, 4, 0x4C, 0xCD, 0x44, 0x7C]));
    assert_eq!(ask(&mut line, &frame(3, &[4, 0, 4, 0, 1])), frame(3, &[4, 2, 0x00, 0xD2]));
    // A register that is in the other table, one that is nowhere, a function that writes.
    assert_eq!(ask(&mut line, &frame(1, &[3, 0, 0, 0, 2])), frame(1, &[0x83, 2]));
    assert_eq!(ask(&mut line, &frame(1, &[4, 0, 1, 0, 2])), frame(1, &[0x84, 2]));
    assert_eq!(ask(&mut line, &frame(1, &[6, 0, 1, 0, 2])), frame(1, &[0x86, 1]));
    assert_eq!(ask(&mut line, &frame(1, &[0x2B, 0x0E, 1, 0])), frame(1, &[0xAB, 1]));
    // Nobody has address 9, nobody answers a broadcast, and a bad sum is not heard.
    assert_eq!(ask(&mut line, &frame(9, &[4, 0, 0, 0, 2])), Vec::<u8>::new());
    assert_eq!(ask(&mut line, &frame(0, &[4, 0, 0, 0, 2])), Vec::<u8>::new());
    let mut bad = frame(1, &[4, 0, 0, 0, 2]);
    bad[7] ^= 1;
    assert_eq!(ask(&mut line, &bad), Vec::<u8>::new());
}

#[test]
fn a_request_in_pieces_is_one_and_two_in_one_piece_are_two() {
    let (time, mut line) = bus();
    let (request, reply) = (frame(3, &[4, 0, 4, 0, 1]), frame(3, &[4, 2, 0x00, 0xD2]));
    assert_eq!(ask(&mut line, &request[..3]), Vec::<u8>::new());
    // That was a silence: the rest begins no request.
    assert_eq!(ask(&mut line, &request[3..]), Vec::<u8>::new());
    time.advance(1.0);
    line.write_all(&request[..3]).unwrap();
    time.advance(0.01);
    assert_eq!(ask(&mut line, &request[3..]), reply);
    time.advance(1.0);
    assert_eq!(
        ask(&mut line, &[request.clone(), request.clone()].concat()),
        [reply.clone(), reply.clone()].concat()
    );
    // After bytes of somebody else.
    time.advance(1.0);
    assert_eq!(ask(&mut line, &[vec![0xFF, 0x03, 0x55], request].concat()), reply);
}
