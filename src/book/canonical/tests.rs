//! A value comes back from its bytes to the last bit, and no other bytes are its encoding.

use proptest::prelude::*;

use super::{
    Canonical, Reader, Unreadable, Writer, from_bytes, header, session_header, session_strategy, strategy,
    to_bytes,
};
use crate::book::body::{self, Body, Record};
use crate::entry::{Assumptions, Readings, Run, Session};

/// Same bytes again, and the same to the eye: the first catches a lost bit, the second a field that has no bytes.
fn comes_back<T: Canonical + std::fmt::Debug>(value: &T) {
    let bytes = to_bytes(value);
    let back: T = from_bytes(&bytes).unwrap();
    assert_eq!(to_bytes(&back), bytes);
    assert_eq!(format!("{back:?}"), format!("{value:?}"));
    for cut in [0, bytes.len() / 2, bytes.len().saturating_sub(1)] {
        assert!(from_bytes::<T>(&bytes[..cut]).is_err(), "cut at {cut} of {}", bytes.len());
    }
    let longer = [bytes.as_slice(), &[0]].concat();
    assert_eq!(from_bytes::<T>(&longer).err(), Some(Unreadable::Follows(1)));
}

fn header_bytes(run: &Run) -> Vec<u8> {
    let mut out = Writer::default();
    header::write(run, &mut out);
    out.into_bytes()
}

fn session_header_bytes(session: &Session) -> Vec<u8> {
    let mut out = Writer::default();
    session_header::write(session, &mut out);
    out.into_bytes()
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 300, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn a_run_comes_back_to_the_last_bit(run in strategy::run()) {
        comes_back(&run.readings);
        let bytes = header_bytes(&run);
        let mut from = Reader::new(&bytes);
        let back = header::read(&mut from).unwrap();
        prop_assert!(from.finish().is_ok());
        prop_assert_eq!(header_bytes(&back), bytes);
        let without_readings = Run { readings: Readings::Points(Vec::new()), ..run };
        prop_assert_eq!(format!("{back:?}"), format!("{without_readings:?}"));
    }

    #[test]
    fn a_session_comes_back_to_the_last_bit(session in session_strategy::session()) {
        let bytes = session_header_bytes(&session);
        let mut from = Reader::new(&bytes);
        let back = session_header::read(&mut from).unwrap();
        prop_assert!(from.finish().is_ok());
        prop_assert_eq!(session_header_bytes(&back), bytes);
        let shape = Session { readings: session_strategy::emptied(&session.readings), ..session };
        prop_assert_eq!(format!("{back:?}"), format!("{shape:?}"));
    }

    #[test]
    fn what_was_left_out_of_a_session_comes_back_to_the_last_bit(out in session_strategy::left_out()) {
        comes_back(&out);
    }

    #[test]
    fn every_register_entry_comes_back_to_the_last_bit(
        orifice in strategy::orifice(),
        instrument in strategy::instrument(),
        stage in strategy::first_stage(),
        acceptance in strategy::acceptance(proptest::option::of(strategy::id()).boxed()),
        shop in strategy::shop(),
        diver in strategy::diver(),
    ) {
        comes_back(&orifice);
        comes_back(&instrument);
        comes_back(&stage);
        comes_back(&acceptance);
        comes_back(&shop);
        comes_back(&diver);
    }

    #[test]
    fn a_decision_comes_back_to_the_last_bit(decision in strategy::decision()) {
        comes_back(&decision);
    }

    #[test]
    fn any_bytes_are_either_refused_or_written_again_as_they_were(
        kind in prop_oneof![1..24_u16, 1000..1014_u16],
        bytes in proptest::collection::vec(any::<u8>(), 0..200),
        form in any::<bool>(),
    ) {
        let bytes = if form { [&[body::FORMAT], bytes.as_slice()].concat() } else { bytes };
        if let Ok(record) = body::read(kind, &bytes) {
            prop_assert_eq!(body::write(&record), bytes);
        }
    }

    #[test]
    fn a_flipped_bit_of_a_record_is_refused_or_another_value(
        run in strategy::run(),
        at in any::<prop::sample::Index>(),
        bit in 0..8_u8,
    ) {
        let record = Record { at: run.taken, body: Body::Readings {
            run: crate::entry::RunNumber::new(7).unwrap(),
            readings: std::borrow::Cow::Owned(run.readings),
        } };
        let bytes = body::write(&record);
        let mut flipped = bytes;
        let at = at.index(flipped.len());
        flipped[at] ^= 1_u8 << bit;
        if let Ok(other) = body::read(record.body.kind().number(), &flipped) {
            prop_assert_eq!(body::write(&other), flipped);
        }
    }
}

#[test]
fn the_defaults_a_session_assumed_are_written_out() {
    // 27 spans, shares and amounts of eight bytes, three of them pairs, less the leak that is not stated (one byte for that):
    // a later change of a default does not reach a session recorded before.
    assert_eq!(to_bytes(&Assumptions::DEFAULT).len(), (27 + 2 - 1) * 8 + 1);
}

#[test]
fn a_length_that_lies_is_refused_before_memory_is_taken() {
    let lies = u32::MAX.to_le_bytes();
    assert_eq!(from_bytes::<Vec<f64>>(&lies), Err(Unreadable::Ends));
    assert_eq!(from_bytes::<String>(&lies), Err(Unreadable::Ends));
}
