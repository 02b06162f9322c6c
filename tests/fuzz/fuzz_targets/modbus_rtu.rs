//! Modbus RTU: noise, pieces and pauses before a good answer.
//!
//! The first byte chooses the number, the second the pieces in which the rest is heard.

#![no_main]

use ebbline::entry::{Id, Instrument, Measures, ModbusNumber, ModbusTable, Protocol, Socket, WordOrder};
use ebbline::instrument::modbus_frame::{is_sealed, sealed};
use ebbline::instrument::{FaultKind, Found, KEPT_BYTES, alone};
use libfuzzer_sys::fuzz_target;

const NUMBERS: [ModbusNumber; 5] =
    [ModbusNumber::F32, ModbusNumber::I16, ModbusNumber::U16, ModbusNumber::I32, ModbusNumber::U32];

fuzz_target!(|data: &[u8]| {
    let [choice, pieces, bytes @ ..] = data else { return };
    let number = NUMBERS[usize::from(*choice) % NUMBERS.len()];
    let two = !matches!(number, ModbusNumber::I16 | ModbusNumber::U16);
    let Ok(id) = Id::new("I-1") else { return };
    let instrument = Instrument {
        id,
        measures: Measures::Pressure,
        socket: Some(Socket::Port("p".to_owned())),
        baud: Some(19_200),
        frame: None,
        unit: Some("bar".to_owned()),
        protocol: Some(Protocol::ModbusRtu {
            device: 1,
            table: ModbusTable::Input,
            register: 0x0402,
            number,
            word_order: WordOrder::Big,
            scale: 0.001,
            every: None,
            stale_after: None,
        }),
        papers: None,
    };
    let Ok(mut bus) = alone(&instrument) else { return };
    let talk = bus.conversation.as_mut();
    let mut found: Vec<Found> = Vec::new();
    let mut now_s = 0.0;
    talk.opened(now_s);
    now_s += 0.2;
    for piece in bytes.chunks(usize::from(pieces % 32) + 1) {
        talk.turn(now_s, &mut found);
        talk.heard(now_s, piece, &mut found);
        now_s += if piece[0] > 127 { f64::from(piece[0]) / 100.0 } else { 0.001 };
    }
    let length = if two { 9 } else { 7 };
    let any_sealed = bytes.windows(length).any(is_sealed);
    for one in &found {
        match &one.what {
            // A full vacuum to 400 bar.
            Ok(reading) => assert!(any_sealed && (-101_325.0..=4e7).contains(&reading.si), "{reading:?}"),
            Err(fault) => {
                assert!(fault.bytes.len() <= KEPT_BYTES);
                if let FaultKind::Refused(_) = fault.kind {
                    assert!(bytes.windows(5).any(is_sealed));
                }
            }
        }
    }
    let from_s = now_s;
    let mut asked = false;
    while !asked && now_s < from_s + 20.0 {
        now_s += 0.01;
        asked = talk.turn(now_s, &mut found).is_some();
    }
    assert!(asked, "not asked again");
    found.clear();
    let answer = if two { vec![1, 4, 4, 0, 0, 0x29, 0x04] } else { vec![1, 4, 2, 0x29, 0x04] };
    talk.heard(now_s, &sealed(answer), &mut found);
    assert!(matches!(found.as_slice(), [Found { what: Ok(_), .. }]), "{found:?}");
});
