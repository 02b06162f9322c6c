//! Instruments that say much, and whether all of it is heard, in time, at what cost.
//!
//! Another process writes to pseudo-terminals, as instruments would: eight of them with a hundred readings a second each, in
//! every protocol, and two that stream without pause at 921 600 baud. This process listens as the program does
//! ([`ebbline::instrument::listen`]), logs ([`BenchLogger`], [`SessionLogger`]), hands over to a ledger and keeps a live
//! state that a screen could look at. Each number says in its last digits when it was written, so that its way can be
//! timed. A pseudo-terminal has no speed of its own: the writer keeps it, and what found no room is said.
//!
//! A machine that is busy with other things lets both processes wait; how long, the writer says.
//!
//! Aims: none lost; under 20 % of one core; memory that does not grow; 99 of 100 readings in the live state within 50 ms.
//! With `--strict` a missed aim ends in status 1, with `--quick` it lasts ten seconds and not a minute.

#![allow(
    clippy::disallowed_methods,
    clippy::print_stdout,
    reason = "a stopwatch asks for the time and tells it"
)]
#![allow(clippy::unwrap_used, reason = "a benchmark that cannot go on has nothing to clean up")]

#[cfg(target_os = "linux")]
#[path = "live/chain.rs"]
mod chain;
#[cfg(target_os = "linux")]
#[path = "live/ledgers.rs"]
mod ledgers;
#[cfg(target_os = "linux")]
#[path = "live/ports.rs"]
mod ports;
#[cfg(target_os = "linux")]
#[path = "live/writer.rs"]
mod writer;

#[cfg(not(target_os = "linux"))]
fn main() {
    println!("left out: it counts its own time and memory in /proc, which this system has not");
}

#[cfg(target_os = "linux")]
fn main() {
    use chain::Figures;
    use ledgers::Counted;
    use ports::Load;

    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let given = |flag: &str| arguments.iter().any(|a| a == flag);
    if given("--writer") {
        let load = Load::named(arguments.last().unwrap()).unwrap();
        return writer::write(load);
    }
    let seconds = match (given("--bench"), given("--quick")) {
        (true, false) => 60,
        (true, true) => 10,
        // Started by `cargo test --benches` it shows that it works.
        (false, _) => 1,
    };
    let mut missed = 0;
    for load in [Load::Eight, Load::Fast] {
        println!("{}, {seconds} s", load.says());
        let figures =
            chain::listen_for(load, f64::from(seconds), &mut Counted::default(), &mut Counted::default());
        missed += told(&figures);
    }
    if missed > 0 && given("--strict") {
        std::process::exit(1);
    }

    fn told(figures: &Figures) -> usize {
        let mut missed = 0;
        let mut aim = |what: String, met: bool| {
            println!("  {what}: {}", if met { "MET" } else { "MISSED" });
            missed += usize::from(!met);
        };
        aim(
            format!(
                "{} readings sent, {} heard, {} faults (aim: none lost)",
                figures.sent, figures.heard, figures.faults
            ),
            figures.sent == figures.heard && figures.kept == figures.heard && figures.faults == 0,
        );
        aim(
            format!(
                "{:.1} % of one core, the writer {:.1} % (aim: under 20 %)",
                100.0 * figures.cpu_s / figures.lasted_s,
                100.0 * figures.writer_cpu_s / figures.lasted_s
            ),
            figures.cpu_s < 0.2 * figures.lasted_s,
        );
        let [first, last] = figures.memory_mb;
        aim(
            format!("memory {first:.1} MB after a quarter, {last:.1} MB at the end (aim: flat, within 1 MB)"),
            last < first + 1.0,
        );
        let [half, most, all] = figures.arrival_ms;
        aim(
            format!(
                "arrival {half:.1} ms median, {most:.1} ms at the 99th percentile, {all:.1} ms longest (aim: 99 % within 50 ms)"
            ),
            most < 50.0,
        );
        println!(
            "  {} points and {} rows taken; longest look at what came {:.1} ms; at most {} bytes waited for room on a port",
            figures.points, figures.rows, figures.longest_turn_ms, figures.held_back
        );
        println!(
            "  the machine kept the writer waiting for {:.0} ms at the longest: where that is much, arrival is the machine's",
            figures.longest_round_ms
        );
        missed
    }
}
