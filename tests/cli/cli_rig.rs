//! The simulated bench and the trying of instruments as a user meets them: the program as a child, its list, its answers,
//! its ports listened to by the program itself.
#![cfg(unix)]
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::fs;
use std::io::{BufRead as _, BufReader, Read as _, Write as _};
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::thread;
use std::time::Duration;

use crate::desk::{Desk, Said};
use rustix::fs::{Mode, OFlags};
use rustix::pty::OpenptFlags;
use serde_json::Value;

/// A rig in the folder `rig` of a desk.
struct Rig {
    child: Child,
    stdin: Option<ChildStdin>,
    stdout: BufReader<ChildStdout>,
}

impl Rig {
    fn start(desk: &Desk, arguments: &[&str]) -> Self {
        let mut child = Command::new(env!("CARGO_BIN_EXE_ebbline"))
            .current_dir(&desk.folder)
            .args(["rig", "--into", "rig"])
            .args(arguments)
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        let (stdin, stdout) = (child.stdin.take(), BufReader::new(child.stdout.take().unwrap()));
        Self { child, stdin, stdout }
    }

    /// With `--json`, and the list it prints.
    fn listed(desk: &Desk, arguments: &[&str]) -> (Self, Value) {
        let mut rig = Self::start(desk, &[arguments, &["--json"]].concat());
        let document = rig.lines_to("}");
        (rig, serde_json::from_str(&document).unwrap())
    }

    /// What comes up to a line that begins so.
    fn lines_to(&mut self, begins: &str) -> String {
        let mut text = String::new();
        loop {
            let mut line = String::new();
            assert!(self.stdout.read_line(&mut line).unwrap() > 0, "the rig ended after {text:?}");
            text.push_str(&line);
            if line.starts_with(begins) {
                return text;
            }
        }
    }

    fn type_in(&mut self, line: &str) {
        self.stdin.as_mut().unwrap().write_all(format!("{line}\n").as_bytes()).unwrap();
    }

    /// Types a line, and the answer to it.
    fn answer(&mut self, line: &str) -> String {
        self.type_in(line);
        let mut answer = String::new();
        self.stdout.read_line(&mut answer).unwrap();
        answer
    }

    fn signal(&self, name: &str) {
        let id = self.child.id().to_string();
        assert!(Command::new("kill").args([name, &id]).status().unwrap().success());
    }

    /// Waits for its end; the rest of what it said.
    fn ended(mut self) -> Said {
        drop(self.stdin.take());
        let mut said = Said { stdout: String::new(), stderr: String::new(), status: -1 };
        self.stdout.read_to_string(&mut said.stdout).unwrap();
        self.child.stderr.take().unwrap().read_to_string(&mut said.stderr).unwrap();
        said.status = self.child.wait().unwrap().code().unwrap_or(-1);
        said
    }
}

impl Drop for Rig {
    fn drop(&mut self) {
        // A test that failed leaves none behind; one that has ended is not there to be killed.
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

/// A profile of the rig with one of its lines written otherwise.
fn changed(desk: &Desk, name: &str, key: &str, line: &str) -> String {
    let text = desk.read(&format!("rig/{name}.toml"));
    assert!(text.lines().any(|l| l.starts_with(&format!("{key} = "))), "{name} has no {key}");
    let lines: Vec<&str> =
        text.lines().map(|l| if l.starts_with(&format!("{key} = ")) { line } else { l }).collect();
    let file = format!("{name}-{key}.toml");
    desk.write(&file, lines.join("\n") + "\n");
    file
}

/// A trial as JSON, and its status.
fn tried(desk: &Desk, what: &str, lasts: &str) -> (Value, i32) {
    let said = desk.call(&["--json", "instrument", "try", what, "--for", lasts]);
    let document = serde_json::from_str(&said.stdout).unwrap_or_else(|e| panic!("{what}: {e}: {said:?}"));
    (document, said.status)
}

/// Lines of the first proposal, and whether some proposal has just these.
#[track_caller]
fn proposes(trial: &Value, lines: &[&str]) {
    let all: Vec<Vec<&str>> = trial["proposals"]
        .as_array()
        .unwrap()
        .iter()
        .map(|one| one["lines"].as_array().unwrap().iter().map(|line| line.as_str().unwrap()).collect())
        .collect();
    assert_eq!(all.first().map(Vec::as_slice), Some(lines), "{trial:#}");
}

#[test]
fn every_profile_of_the_rig_reads_well() {
    let desk = Desk::new("rig-reads");
    let (mut rig, list) = Rig::listed(&desk, &["--seed", "7"]);
    assert_eq!((&list["simulated"], &list["seed"]), (&true.into(), &7.into()));
    let instruments = list["instruments"].as_array().unwrap();
    assert_eq!(instruments.len(), 8);
    // One after the other on a port, the ports beside one another. The slowest say something every second.
    let ports: Vec<&str> = ["flow", "bus", "cells", "depth"].into();
    thread::scope(|scope| {
        for port in ports {
            let on = instruments.iter().filter(move |one| one["port"].as_str().unwrap().ends_with(port));
            let desk = &desk;
            scope.spawn(move || {
                let mut seen = 0;
                for one in on {
                    let profile = one["profile"].as_str().unwrap();
                    assert!(desk.read(profile).starts_with("# Simulated"), "{profile}");
                    let lasts = match port {
                        "depth" => "4s",
                        "cells" => "2 s",
                        _ => "1 s",
                    };
                    let (trial, status) = tried(desk, profile, lasts);
                    assert_eq!(status, 0, "{trial:#}");
                    assert!(trial["rate_per_s"].as_f64().unwrap() > 0.0, "{trial:#}");
                    assert!(
                        trial["readings"].as_u64().unwrap() >= 2 && trial["outside_range"] == 0,
                        "{trial:#}"
                    );
                    assert_eq!(trial["values"][0]["unit"], one["unit"], "{trial:#}");
                    seen += 1;
                }
                assert!(seen > 0, "nothing is on {port}");
            });
        }
    });
    rig.type_in("quit");
    assert_eq!(rig.ended().status, 0);
}

#[test]
fn what_is_wrong_in_a_profile_of_lines_is_found() {
    let desk = Desk::new("rig-lines");
    let (rig, _) = Rig::listed(&desk, &[]);
    let ends = changed(&desk, "rig-flow", "ends", "ends = \";\"");
    let (trial, status) = tried(&desk, &ends, "1.5 s");
    assert_eq!((status, &trial["readings"]), (1, &0.into()));
    proposes(&trial, &["[protocol]", r#"ends = "\r\n""#]);

    let pattern = changed(&desk, "rig-flow", "pattern", r"pattern = 'FLOW (?P<value>\d+)'");
    let (trial, status) = tried(&desk, &pattern, "1.5 s");
    assert_eq!((status, &trial["faults"][0]["fault"]), (1, &"no-match".into()));
    assert!(trial["faults"][0]["bytes"].as_str().unwrap().ends_with(" L/min"), "{trial:#}");
    let found = trial["proposals"][0]["changes"][0].clone();
    assert_eq!(found["key"], "protocol.pattern");
    let found =
        changed(&desk, "rig-flow", "pattern", &format!("pattern = '{}'", found["to"].as_str().unwrap()));
    assert_eq!(tried(&desk, &found, "1.5 s").1, 0);

    // The line says L/min, and the pattern does not read it: every reading would be a thousandth of what it is.
    let unit = changed(&desk, "rig-flow", "unit", "unit = \"mL/min\"");
    let text = desk.read(&unit);
    let lines: Vec<&str> = text
        .lines()
        .map(|l| if l.starts_with("pattern") { r"pattern = '^\s*(?P<value>\d+\.\d+)'" } else { l })
        .filter(|l| !l.starts_with("range") && !l.starts_with("[meter]"))
        .take_while(|l| !l.starts_with("kind = \"mass\""))
        .collect();
    desk.write(&unit, lines.join("\n") + "\n");
    let said = desk.call(&["instrument", "try", &unit, "--for", "1.5 s"]);
    assert_eq!(said.status, 1, "{said:?}");
    for words in ["something else than the profile", "unit = \"L/min\"", "instead of mL/min"] {
        assert!(said.stdout.contains(words), "{words}: {said:?}");
    }
    assert!(rig.ended().stderr.contains("ended"));
}

#[test]
fn the_command_that_is_proposed_mends_the_register() {
    let desk = Desk::new("rig-mends");
    let (rig, _) = Rig::listed(&desk, &[]);
    assert_eq!(desk.done(&["instrument", "add", "rig/rig-flow.toml", "rig/rig-ip.toml"]).lines().count(), 2);
    desk.done(&["instrument", "edit", "rig-flow", "--protocol-ends", ";"]);
    desk.done(&["instrument", "edit", "rig-ip", "--protocol-table", "holding"]);
    for (id, flag) in [("rig-flow", r"--protocol-ends '\r\n'"), ("rig-ip", "--protocol-table input")] {
        let (trial, status) = tried(&desk, id, "1.2 s");
        assert_eq!(status, 1, "{trial:#}");
        let command = trial["proposals"][0]["command"].as_str().unwrap();
        assert_eq!(command, format!("ebbline instrument edit {id} {flag} --book book.db"));
        let shell = command.replacen("ebbline", env!("CARGO_BIN_EXE_ebbline"), 1);
        let output = Command::new("sh").args(["-c", &shell]).current_dir(&desk.folder).output().unwrap();
        assert!(output.status.success(), "{output:?}");
        let (trial, status) = tried(&desk, id, "1.2 s");
        assert_eq!(status, 0, "{trial:#}");
    }
    // Its port is none of the machine's, and is there all the same.
    let ports = desk.json(&["instrument", "ports"]);
    let absent = ports["absent"].as_array().unwrap();
    assert_eq!(absent.len(), 2, "{ports:#}");
    assert!(absent.iter().all(|one| one["there"] == true), "{ports:#}");
    drop(rig);
}

#[test]
fn words_of_a_bus_in_the_wrong_order_are_found() {
    let desk = Desk::new("rig-words");
    let (rig, _) = Rig::listed(&desk, &[]);
    let big = changed(&desk, "rig-barometer", "word_order", "word_order = \"big\"");
    let (trial, status) = tried(&desk, &big, "1 s");
    assert_eq!(status, 1);
    assert_eq!(trial["faults"][0]["fault"], "out-of-range", "{trial:#}");
    proposes(&trial, &["[protocol]", "word_order = \"little\""]);
    drop(rig);
}

/// A flow meter of 19200 baud: read at another speed its bytes are others, as on a serial line. The rig has no speed.
#[test]
fn a_wrong_baud_rate_is_found() {
    let desk = Desk::new("rig-baud");
    let meter = rustix::pty::openpt(OpenptFlags::RDWR | OpenptFlags::NOCTTY).unwrap();
    rustix::pty::grantpt(&meter).unwrap();
    rustix::pty::unlockpt(&meter).unwrap();
    let name = rustix::pty::ptsname(&meter, Vec::new()).unwrap().into_string().unwrap();
    // Held open, so that its speed stays what the reader set.
    let held = rustix::fs::open(&name, OFlags::RDWR | OFlags::NOCTTY, Mode::empty()).unwrap();
    rustix::fs::fcntl_setfl(&meter, OFlags::NONBLOCK).unwrap();
    let stop = Arc::new(AtomicBool::new(false));
    let told = Arc::clone(&stop);
    let speaking = thread::spawn(move || {
        while !told.load(Ordering::Relaxed) {
            let speed = rustix::termios::tcgetattr(&held).unwrap().output_speed();
            let line = b"0.4812 L/min\r\n";
            let heard: Vec<u8> = line
                .iter()
                .map(|byte| if speed == 19_200 { *byte } else { byte.rotate_left(3) | 0x80 })
                .collect();
            // A terminal nobody reads is full.
            let _ = rustix::io::write(&meter, &heard);
            thread::sleep(Duration::from_millis(50));
        }
    });
    let profile = format!(
        "record = \"instrument\"\nid = \"FM-9\"\nmeasures = \"flow\"\nport = \"{name}\"\nbaud = 9600\n\n[protocol]\n\
         kind = \"lines\"\nends = \"\\r\\n\"\npattern = '(?P<value>\\d+\\.\\d+) (?P<unit>L/min)'\n"
    );
    desk.write("FM-9.toml", profile);
    let said = desk.call(&["instrument", "try", "FM-9.toml", "--for", "1 s"]);
    assert_eq!(said.status, 1, "{said:?}");
    for words in [
        "with the baud rate 19200 instead of 9600 it gives ",
        "such as 0.4812 L/min:",
        "        baud = 19200\n",
    ] {
        assert!(said.stdout.contains(words), "{words}: {said:?}");
    }
    // Bytes that no text has reach no terminal.
    assert!(said.stdout.contains("\\x") && !said.stdout.contains('\u{fffd}'), "{said:?}");
    desk.done(&["instrument", "add", "FM-9.toml"]);
    let (trial, _) = tried(&desk, "FM-9", "1 s");
    let command = trial["proposals"][0]["command"].as_str().unwrap();
    assert_eq!(command, "ebbline instrument edit FM-9 --baud 19200 --book book.db");
    stop.store(true, Ordering::Relaxed);
    speaking.join().unwrap();
}

#[test]
fn faults_come_when_they_are_asked_for() {
    let desk = Desk::new("rig-faults");
    let mut rig =
        Rig::start(&desk, &["--fault", "rig-ip bad-crc once", "--fault", "rig-depth unplugged always"]);
    let begun = rig.lines_to("Commands");
    assert!(begun.starts_with("SIMULATED") && begun.contains("instrument add rig/*.toml"), "{begun}");
    // The rest of the commands there are.
    rig.lines_to("  they are now");
    let (trial, status) = tried(&desk, "rig/rig-ip.toml", "1.5 s");
    assert_eq!((status, &trial["faults"][0]["fault"]), (1, &"check-sum".into()), "{trial:#}");
    assert!(trial["faults"][0]["times"] == 1 && trial["readings"].as_u64() > Some(1), "{trial:#}");
    let said = desk.call(&["instrument", "try", "rig/rig-depth.toml"]);
    assert_eq!((said.status, said.stdout.as_str()), (3, ""), "{said:?}");
    assert!(said.stderr.contains("is not there: check the cable"), "{said:?}");

    assert_eq!(rig.answer("fault rig-barometer nan once"), "done: fault rig-barometer nan once\n");
    let (trial, status) = tried(&desk, "rig/rig-barometer.toml", "1.5 s");
    assert_eq!((status, &trial["faults"][0]["fault"]), (1, &"not-finite".into()), "{trial:#}");
    assert!(trial["faults"][0]["times"] == 1 && trial["proposals"] == serde_json::json!([]), "{trial:#}");
    assert_eq!(rig.answer("fault rig-ip late 0.01 always"), "done: fault rig-ip late 0.01 always\n");
    assert_eq!(rig.answer("clear"), "done: clear\n");
    assert_eq!(tried(&desk, "rig/rig-flow.toml", "1 s").1, 0);
    assert_eq!(tried(&desk, "rig/rig-ip.toml", "1 s").1, 0);

    // What is none is answered, and the rig goes on; what was typed steers no terminal.
    for (line, words) in [
        ("fault rig-flow \u{1b}[2J", "not done: \"\\u{1b}[2J\" is no fault"),
        ("fault nobody silence", "not done: the rig has no instrument nobody"),
        ("set ip 10", "not done: "),
        ("fault rig-flow clock-jump 5", "not done: rig-flow cannot have the fault clock-jump 5"),
        ("fault rig-flow bad-crc", "not done: rig-flow cannot have the fault bad-crc"),
    ] {
        let answer = rig.answer(line);
        assert!(answer.starts_with(words) && !answer.contains('\u{1b}'), "{line:?}: {answer:?}");
    }
    rig.type_in("# a remark\n\nlist");
    assert!(rig.lines_to("  rig-depth").contains("rig-flow"));
    let sent = desk.read("rig/sent.jsonl");
    assert!(sent.lines().any(|l| l.contains("\"faults\":[\"nan\"]")), "{sent}");
    assert!(sent.lines().all(|l| serde_json::from_str::<Value>(l).is_ok()));
    rig.type_in("quit");
    let said = rig.ended();
    assert_eq!((said.status, said.stdout.as_str()), (0, ""), "{said:?}");
}

#[test]
fn the_regulator_follows_the_script_and_the_hand() {
    let desk = Desk::new("rig-script");
    let (mut rig, _) = Rig::listed(&desk, &["--script", "6 bar 60 s"]);
    let ip = |desk: &Desk| {
        let (trial, status) = tried(desk, "rig/rig-ip.toml", "0.8 s");
        assert_eq!(status, 0, "{trial:#}");
        trial["values"].as_array().unwrap().last().unwrap()["value"].as_f64().unwrap()
    };
    // A hand finds its pressure to 0.02 bar (standard deviation), and the transducer's papers allow 0.02 bar.
    assert!((ip(&desk) - 6.0).abs() < 0.2);
    // Answers stand beside the document, which is alone on stdout.
    rig.type_in("set ip 6.6 bar");
    // Its lag is 1.5 s: after two of them 0.6 exp(-2) = 0.08 bar are left.
    thread::sleep(Duration::from_secs(3));
    let reached = ip(&desk);
    assert!((reached - 6.6).abs() < 0.2, "{reached}");
    rig.type_in("quit");
    let said = rig.ended();
    assert!(said.stdout.is_empty() && said.stderr.starts_with("done: set ip 6.6 bar\n"), "{said:?}");
}

#[test]
fn it_ends_cleanly_however_it_ends() {
    type Ending = (&'static str, &'static [&'static str], fn(&mut Rig), &'static str);
    let endings: [Ending; 5] = [
        ("quit", &[], |rig| rig.type_in("quit"), "quit: "),
        ("input", &[], |_| {}, "no more commands can come: "),
        ("interrupt", &["--for", "1 h"], |rig| rig.signal("-INT"), "interrupted: "),
        ("terminate", &["--for", "1 h"], |rig| rig.signal("-TERM"), "interrupted: "),
        ("time", &["--for", "0.3 s"], |_| {}, "its time is up: "),
    ];
    for (name, arguments, end, words) in endings {
        let desk = Desk::new(&format!("rig-ends-{name}"));
        let (mut rig, _) = Rig::listed(&desk, arguments);
        assert!(fs::symlink_metadata(desk.folder.join("rig/flow")).unwrap().is_symlink());
        end(&mut rig);
        let said = rig.ended();
        assert_eq!(said.status, 0, "{name}: {said:?}");
        assert!(said.stderr.starts_with(words), "{name}: {said:?}");
        for port in ["flow", "bus", "cells", "depth"] {
            assert!(
                fs::symlink_metadata(desk.folder.join("rig").join(port)).is_err(),
                "{name}: {port} is left"
            );
        }
        assert!(
            desk.folder.join("rig/rig-flow.toml").exists() && desk.folder.join("rig/sent.jsonl").exists()
        );
        // The same folder serves again.
        let (mut again, _) = Rig::listed(&desk, &[]);
        again.type_in("exit");
        assert_eq!(again.ended().status, 0);
    }
}

#[test]
fn with_the_null_device_as_input_it_runs_on() {
    let desk = Desk::new("rig-null");
    let mut child = Command::new(env!("CARGO_BIN_EXE_ebbline"))
        .current_dir(&desk.folder)
        .args(["rig", "--into", "rig", "--json"])
        .stdin(Stdio::null())
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .unwrap();
    let mut first = String::new();
    let mut stdout = BufReader::new(child.stdout.take().unwrap());
    while !first.ends_with("\n}\n") {
        assert!(stdout.read_line(&mut first).unwrap() > 0, "{first}");
    }
    let status = tried(&desk, "rig/rig-flow.toml", "1 s").1;
    let running = child.try_wait().unwrap().is_none();
    Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
    assert_eq!(child.wait().unwrap().code(), Some(0));
    assert_eq!((status, running), (0, true));
}

#[test]
fn what_cannot_be_is_refused_and_nothing_is_written() {
    let desk = Desk::new("rig-refused");
    for (arguments, words) in [
        (vec!["rig", "--fault", "rig-flow hiccup"], "is no fault of the rig"),
        (vec!["rig", "--fault", "rig-flow clock-jump 5"], "cannot have the fault clock-jump 5"),
        (vec!["rig", "--fault", "FM-01 silence"], "the rig has no instrument FM-01"),
        (vec!["rig", "--script", "4 45"], "is no step of a script"),
        (vec!["rig", "--script", "\u{1b}[2J"], "\\u{1b}[2J"),
        (vec!["rig", "--for", "10"], "without a unit"),
        (vec!["rig", "--seed", "-1"], "--seed"),
        (vec!["instrument", "try", "rig-flow"], "book"),
        (vec!["instrument", "try", "not-there.toml"], "not-there.toml"),
        (vec!["instrument", "try", "./FM.toml", "--for", "5"], "without a unit"),
    ] {
        desk.refused(&arguments, 2, words);
    }
    assert!(!desk.folder.join("ebbline-rig").exists() && !desk.book().exists());

    let profile = |port: &str| {
        format!(
            "record = \"instrument\"\nid = \"FM-1\"\nmeasures = \"flow\"\n{port}\nunit = \"L/min\"\n\n[protocol]\n\
             kind = \"lines\"\nends = \"\\n\"\npattern = '(?P<value>\\d+)'\n"
        )
    };
    desk.write("gone.toml", profile("port = \"/dev/ebbline-no-such-port\"\nbaud = 9600"));
    desk.refused(&["instrument", "try", "gone.toml"], 3, "is not there: check the cable");
    desk.refused(&["instrument", "try", "gone.toml", "--for", "0 s"], 2, "--for takes 0.5 s to 1 h");
    desk.write("no-baud.toml", profile("port = \"COM3\""));
    desk.refused(&["instrument", "try", "no-baud.toml"], 2, "baud");
    desk.write(
        "eye.toml",
        "record = \"instrument\"\nid = \"G-1\"\nmeasures = \"pressure\"\nunit = \"bar\"\n",
    );
    desk.refused(&["instrument", "try", "eye.toml"], 2, "G-1 has no port");
    desk.write("orifice.toml", "record = \"orifice\"\nid = \"A\"\n");
    desk.refused(&["instrument", "try", "orifice.toml"], 2, "orifice");

    // Files of somebody else's stay as they are.
    desk.write("mine/rig-flow.toml", "mine\n");
    desk.refused(&["rig", "--into", "mine"], 2, "no rig wrote");
    assert_eq!(desk.read("mine/rig-flow.toml"), "mine\n");
    desk.write("log/sent.jsonl", "mine\n");
    desk.refused(&["rig", "--into", "log"], 2, "no rig wrote");
    desk.write("port/flow", "mine\n");
    desk.refused(&["rig", "--into", "port"], 2, "flow is there");
    desk.refused(&["rig", "--into", "gone.toml/rig"], 3, "cannot be written");
    let (rig, _) = Rig::listed(&desk, &[]);
    desk.refused(&["rig", "--into", "rig"], 2, "is there, of another rig");
    drop(rig);
}

#[test]
fn ports_are_listed_without_a_book() {
    let desk = Desk::new("rig-ports");
    let list = desk.json(&["instrument", "ports"]);
    assert_eq!((&list["book"], &list["absent"]), (&false.into(), &serde_json::json!([])));
    assert!(desk.done(&["instrument", "ports"]).contains("There is no book yet"));
    assert!(!desk.book().exists());
}
