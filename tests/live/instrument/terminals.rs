//! Real serial code on pseudo-terminals: both protocols, and a pair that goes away and is made again.

use std::fs;
use std::io::{Read, Write};
use std::os::unix::fs::symlink;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::thread::{self, JoinHandle};
use std::time::Duration;

use ebbline::clock::{Monotonic, Ticks};
use ebbline::entry::{Instrument, Measures, ModbusNumber, Socket};
use ebbline::instrument::modbus_frame::sealed;
use ebbline::instrument::{
    LineSettings, OpenError, Opener, Streams, SystemPorts, What, listen, ports, try_out,
};
use serialport::{SerialPort, TTYPort};

use super::support::{NUMBER, asked, lines, modbus};

/// A folder for a port's name, which outlives the pseudo-terminals behind it.
fn port_name(test: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("instrument").join(test);
    let _ = fs::remove_dir_all(&folder);
    fs::create_dir_all(&folder).unwrap();
    folder.join("port")
}

fn on(instrument: Instrument, name: &Path) -> Instrument {
    Instrument { socket: Some(Socket::Port(name.to_string_lossy().into_owned())), ..instrument }
}

/// An instrument behind a pseudo-terminal that carries this name as long as it lives.
struct Device {
    stop: Arc<AtomicBool>,
    thread: Option<JoinHandle<()>>,
    name: PathBuf,
}

impl Device {
    /// It says `by_itself` some fifty times a second, and answers what it is sent.
    fn at(name: &Path, by_itself: &'static [u8], answer: fn(&[u8]) -> Vec<u8>) -> Self {
        let (mut near, far) = TTYPort::pair().unwrap();
        let _ = fs::remove_file(name);
        symlink(far.name().unwrap(), name).unwrap();
        near.set_timeout(Duration::from_millis(20)).unwrap();
        let stop = Arc::new(AtomicBool::new(false));
        let told = Arc::clone(&stop);
        let thread = thread::spawn(move || {
            // Held open, so that the near end does not fail while nobody else has opened the far one.
            let _far = far;
            let mut buffer = [0; 256];
            while !told.load(Ordering::Relaxed) {
                // A terminal nobody reads fills up; that is nobody's loss.
                let reply = near.read(&mut buffer).map(|read| answer(&buffer[..read])).unwrap_or_default();
                let _ = near.write_all(&reply);
                let _ = near.write_all(by_itself);
            }
        });
        Self { stop, thread: Some(thread), name: name.to_path_buf() }
    }
}

impl Drop for Device {
    fn drop(&mut self) {
        let _ = fs::remove_file(&self.name);
        self.stop.store(true, Ordering::Relaxed);
        if let Some(thread) = self.thread.take() {
            thread.join().unwrap();
        }
    }
}

fn heard_from(instruments: &[Instrument]) -> Streams {
    let opener: Arc<dyn Opener> = Arc::new(SystemPorts);
    let ticks: Arc<dyn Ticks> = Arc::new(Monotonic::start());
    listen(instruments, &opener, &ticks).unwrap()
}

/// Waits for so many readings that show this; a minute without one fails.
#[track_caller]
fn readings(streams: &Streams, times: usize, shown: f64) {
    let mut seen = 0;
    while seen < times {
        let heard = streams.wait(60.0).expect("something is heard");
        if let What::Reading(reading) = heard.what {
            assert_eq!(reading.shown.to_bits(), shown.to_bits());
            seen += 1;
        }
    }
}

fn nothing(_: &[u8]) -> Vec<u8> {
    Vec::new()
}

fn a_transducer(asked: &[u8]) -> Vec<u8> {
    let answers = asked == sealed(vec![1, 4, 0, 0, 0, 2]);
    if answers { sealed(vec![1, 4, 4, 0, 0, 0x29, 0x04]) } else { Vec::new() }
}

#[test]
fn a_stream_of_lines_over_a_terminal() {
    let name = port_name("stream");
    let _device = Device::at(&name, b"0.512 L/min\r\n", nothing);
    let streams = heard_from(&[on(lines("FM-1", Measures::Flow, NUMBER, Some("L/min")), &name)]);
    readings(&streams, 20, 0.512);
    assert!(streams.counters()[0].bytes > 200);
}

#[test]
fn questions_and_answers_over_a_terminal() {
    let name = port_name("asked");
    let _device =
        Device::at(&name, b"", |asked| if asked == b"READ?\n" { b"0.512\r\n".to_vec() } else { Vec::new() });
    let streams = heard_from(&[on(asked("FM-1", Measures::Flow, "READ?\n", NUMBER, "L/min"), &name)]);
    readings(&streams, 5, 0.512);
}

#[test]
fn modbus_over_a_terminal() {
    let name = port_name("modbus");
    let _device = Device::at(&name, b"", a_transducer);
    let streams = heard_from(&[on(modbus("PT-1", 1, 0, ModbusNumber::I32), &name)]);
    readings(&streams, 5, 10.5);
}

#[test]
fn a_terminal_that_goes_away_is_found_again_under_its_name() {
    let name = port_name("again");
    let mut device = Device::at(&name, b"0.512\r\n", nothing);
    let streams = heard_from(&[on(lines("FM-1", Measures::Flow, NUMBER, Some("L/min")), &name)]);
    for shown in [0.512, 0.513, 0.514] {
        readings(&streams, 3, shown);
        drop(device);
        loop {
            let heard = streams.wait(60.0).expect("the loss is said");
            if matches!(heard.what, What::Lost(_)) {
                break;
            }
        }
        let next: &'static [u8] = if shown < 0.5125 { b"0.513\r\n" } else { b"0.514\r\n" };
        device = Device::at(&name, next, nothing);
    }
    assert_eq!(streams.counters()[0].losses, 3);
}

#[test]
fn a_trial_over_a_terminal() {
    let name = port_name("trial");
    let _device = Device::at(&name, b"0.512\r", nothing);
    let flow = on(lines("FM-1", Measures::Flow, NUMBER, Some("L/min")), &name);
    let trial = try_out(&flow, &SystemPorts, &Monotonic::start(), 1.0).unwrap();
    assert!(!trial.does_well() && trial.bytes > 30, "{trial:?}");
    assert_eq!(trial.proposals.len(), 1);
}

#[test]
fn a_port_that_is_not_there_says_so() {
    let settings = LineSettings::parse(9_600, "8N1").unwrap();
    let open = |socket: Socket| SystemPorts.open(&socket, settings).map(|_| ()).unwrap_err();
    let name = port_name("none").to_string_lossy().into_owned();
    assert_eq!(open(Socket::Port(name.clone())), OpenError::NotThere { port: name });
    let identity = "0000:0000:none".to_owned();
    assert_eq!(open(Socket::Usb(identity.clone())), OpenError::NotPlugged { identity });
    assert!(ports().unwrap().windows(2).all(|two| two[0].name <= two[1].name));
}
