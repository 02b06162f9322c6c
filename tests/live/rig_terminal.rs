//! The rig on pseudo-terminals, read and written as any program would.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![cfg(unix)]

use std::fs::File;
use std::io::{Read, Write};
use std::os::unix::fs::OpenOptionsExt;
use std::path::Path;
use std::sync::Arc;
use std::time::Duration;

use ebbline::entry::{Id, Socket};
use ebbline::rig::modbus::frame;
use ebbline::rig::{Command, Delivery, RealTime, Rig, Served, Settings};
use rustix::fs::OFlags;

fn open(path: &str) -> std::io::Result<File> {
    let flags = OFlags::NOCTTY | OFlags::NONBLOCK;
    std::fs::OpenOptions::new().read(true).write(true).custom_flags(flags.bits().cast_signed()).open(path)
}

/// Reads until `enough`, or until the line ends; gives up after some ten seconds of nothing.
fn read_until(file: &mut File, enough: impl Fn(&[u8]) -> bool) -> Result<Vec<u8>, Vec<u8>> {
    let mut heard = Vec::new();
    let mut buffer = [0; 512];
    for _ in 0..2_000 {
        match file.read(&mut buffer) {
            Ok(0) => return Err(heard),
            Ok(count) => heard.extend_from_slice(&buffer[..count]),
            Err(error) if error.kind() == std::io::ErrorKind::WouldBlock => {
                std::thread::sleep(Duration::from_millis(5));
            }
            Err(_) => return Err(heard),
        }
        if enough(&heard) {
            return Ok(heard);
        }
    }
    panic!("only {heard:?} came");
}

fn serve(folder: Option<&Path>) -> Served {
    Rig::new(Settings::standard(1).unwrap()).unwrap().serve(Arc::new(RealTime::new()), folder).unwrap()
}

fn found(served: &Served, name: &str) -> Option<String> {
    let id = Id::new(name).unwrap();
    served.ports().into_iter().find(|(instrument, _)| *instrument == id).unwrap().1
}

#[test]
fn lines_and_frames_go_there_and_back() {
    let served = serve(None);
    let profiles = served.profiles();
    let flow = found(&served, "rig-flow").unwrap();
    assert_eq!(profiles[0].socket, Some(Socket::Port(flow.clone())));
    assert_eq!(found(&served, "rig-ip"), found(&served, "rig-gas"));

    let mut lines = open(&flow).unwrap();
    let heard = read_until(&mut lines, |heard| heard.iter().filter(|b| **b == b'\n').count() >= 3).unwrap();
    assert!(String::from_utf8(heard).unwrap().ends_with(" L/min\r\n"));

    let mut bus = open(&found(&served, "rig-ip").unwrap()).unwrap();
    // Bytes that a terminal in its common state would change: carriage return, control-C, control-D, control-S.
    let request = frame(3, &[4, 0, 4, 0, 1]);
    bus.write_all(&request).unwrap();
    let reply = read_until(&mut bus, |heard| heard.len() >= 7).unwrap();
    assert_eq!(reply, frame(3, &reply[1..5]));
    let tenths = i16::from_be_bytes([reply[3], reply[4]]);
    assert!((190..230).contains(&tenths), "{tenths}");

    let mut cells = open(&found(&served, "rig-cell-1").unwrap()).unwrap();
    cells.write_all(b"C?\n").unwrap();
    let line = read_until(&mut cells, |heard| heard.ends_with(b"\n")).unwrap();
    assert_eq!(line.iter().filter(|byte| **byte == b';').count(), 2, "{line:?}");

    drop((lines, bus));
    let rig = served.stop().unwrap();
    let rig = rig.lock().unwrap();
    let sent: Vec<_> = rig.log().sent().filter(|s| s.port == "bus").collect();
    assert_eq!((sent.len(), sent[0].delivery, &sent[0].message.bytes), (1, Delivery::Whole, &reply));
    // Its end of the line is gone.
    assert!(read_until(&mut cells, |_| false).is_err());
}

#[test]
fn a_plug_that_is_pulled_ends_the_line_and_the_link_leads_to_the_new_one() {
    let folder = std::env::temp_dir().join(format!("ebbline-rig-ports-{}", std::process::id()));
    std::fs::create_dir_all(&folder).unwrap();
    let served = serve(Some(&folder));
    let path = folder.join("flow").display().to_string();
    assert_eq!(found(&served, "rig-flow"), Some(path.clone()));
    let mut line = open(&path).unwrap();
    read_until(&mut line, |heard| heard.ends_with(b"\r\n")).unwrap();
    served.command(Command::parse("fault rig-flow unplugged always").unwrap()).unwrap();
    assert!(read_until(&mut line, |_| false).is_err());
    assert_eq!(found(&served, "rig-flow"), None);
    assert!(open(&path).is_err());
    served.command(Command::parse("clear rig-flow").unwrap()).unwrap();
    let mut anew = (0..2_000)
        .find_map(|_| {
            std::thread::sleep(Duration::from_millis(5));
            open(&path).ok()
        })
        .expect("plugged in again");
    read_until(&mut anew, |heard| heard.ends_with(b"\r\n")).unwrap();
    assert!(served.take_trouble().is_none());
    served.stop().unwrap();
    assert!(!Path::new(&path).is_symlink());
    std::fs::remove_dir_all(&folder).unwrap();
}

#[test]
fn what_the_last_reader_left_is_not_for_the_next() {
    let served = serve(None);
    let flow = found(&served, "rig-flow").unwrap();
    let line = open(&flow).unwrap();
    let whole = |served: &Served| {
        served.rig().log().sent().filter(|s| s.port == "flow" && s.delivery == Delivery::Whole).count()
    };
    let wait = |until: &dyn Fn() -> bool| {
        assert!((0..2_000).any(|_| {
            std::thread::sleep(Duration::from_millis(5));
            until()
        }));
    };
    wait(&|| whole(&served) >= 3);
    drop(line);
    let lost = || {
        let rig = served.rig();
        rig.log().sent().rfind(|s| s.port == "flow").is_some_and(|s| s.delivery == Delivery::Lost)
    };
    wait(&lost);
    let before = whole(&served);
    let mut line = open(&flow).unwrap();
    let heard = read_until(&mut line, |heard| heard.ends_with(b"\r\n")).unwrap();
    let rig = served.rig();
    let sent = rig.log().sent().filter(|s| s.port == "flow" && s.delivery == Delivery::Whole);
    let bytes: Vec<u8> = sent.skip(before).flat_map(|s| s.message.bytes.clone()).collect();
    assert!(bytes.starts_with(&heard), "{heard:?} {bytes:?}");
}
