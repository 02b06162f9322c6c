//! What can be typed. Quantities carry their unit in the value; clap's words stop at this file's structs.

mod bench;
mod book;
mod certificate;
mod keys;
mod registers;
mod rig;
mod session;
mod setting;

use std::path::PathBuf;

pub use bench::{
    Accept, Bench, BenchLog, Enter, Fit, Import, LeaveOut, List, LogLength, Resume, Show, Typed,
};
pub use book::{Backup, Book, Check, Export};
pub use certificate::{
    AmendCertificate, Certificates, CheckCertificate, IssueCertificate, ListCertificates, Paper,
    ShowCertificate, Stated, Written,
};
use clap::{Args, Parser, Subcommand};
pub use registers::{
    Acceptances, Add, Divers, Edit, EditShop, Entries, FirstStages, Forget, Instruments, One, Orifices,
    ShopVerbs, ShowOrifice, ShowShop, Try,
};
pub use rig::Rig;

pub use session::{
    EnterSession, ImportSessions, LeaveOutSession, ListSessions, ResumeSession, SessionLog, Sessions,
    ShowSession, UptakeOf,
};
pub use setting::{Setting, SheetPaper, Water};

use crate::quantity::Shown;

/// Bench calibration of constant-mass-flow orifices for manual closed-circuit rebreathers, resting oxygen uptake of
/// divers, and the intermediate pressure that injects slightly less than that.
#[derive(Debug, Parser)]
#[command(
    name = "ebbline",
    version,
    disable_help_subcommand = true,
    max_term_width = 80,
    after_help = "Exit status: 0 done and favourable; 1 done, and the verdict is fail, undecided, no uptake or no setting, or a certificate or a book does not hold; 2 the input or the call \
                  is wrong; 3 a port, a disk or an output file failed.\n\nAn aid to trained people, no life-support monitor. \
                  Training, the unit's manual, the regulator maker's limits and local rules come first."
)]
pub struct Arguments {
    /// Options of every verb.
    #[command(flatten)]
    pub global: Global,
    /// The verb.
    #[command(subcommand)]
    pub command: Command,
}

/// Options of every verb, before or after it.
#[derive(Debug, Args)]
pub struct Global {
    /// The record file (else EBBLINE_BOOK, else the platform's data folder)
    #[arg(long, global = true, value_name = "FILE")]
    pub book: Option<PathBuf>,
    /// Write the result as JSON
    #[arg(long, global = true)]
    pub json: bool,
    /// Units shown, as in psi,mL/min,ft,F; what is typed carries its own
    #[arg(long, global = true, value_name = "UNITS", default_value = "", hide_default_value = true, value_parser = Shown::parse)]
    pub show: Shown,
    /// No colour; NO_COLOR is honoured too
    #[arg(long, global = true)]
    pub no_color: bool,
}

/// The verbs.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Runs the whole job on an invented shop's orifices and leaves files and plots
    Demo(Demo),
    /// Bench runs of orifices
    #[command(subcommand)]
    Bench(Bench),
    /// Couch and pool sessions of a diver, and the resting oxygen uptake from them
    #[command(subcommand)]
    Session(Sessions),
    /// The intermediate pressure to set: through which orifice, how PO2 then sinks, and to which depth it holds
    Setting(Box<Setting>),
    /// Calibration certificates: issued from judged runs, amended, checked whoever issued them
    #[command(subcommand)]
    Certificate(Box<Certificates>),
    /// Orifices: their register, and their history
    #[command(subcommand)]
    Orifice(Orifices),
    /// Instruments: flow meters, transducers and the rest, with their papers
    #[command(subcommand)]
    Instrument(Instruments),
    /// First stages and the gauges they are set by
    #[command(subcommand)]
    FirstStage(FirstStages),
    /// Divers
    #[command(subcommand)]
    Diver(Divers),
    /// Limits orifices are accepted by
    #[command(subcommand)]
    Acceptance(Acceptances),
    /// The shop, as it stands on certificates
    #[command(subcommand)]
    Shop(ShopVerbs),
    /// A simulated bench on pseudo-terminals, speaking as real meters do, with faults on demand
    Rig(Rig),
    /// The record file: health, chain, copies
    #[command(subcommand)]
    Book(Book),
    /// Prints a completion script for a shell
    Completions {
        /// The shell
        shell: clap_complete::Shell,
    },
    /// Prints the manual page
    Man,
}

/// Options of `demo`.
#[derive(Debug, Args)]
pub struct Demo {
    /// The folder that is filled
    #[arg(long, value_name = "DIR", default_value = "ebbline-demo")]
    pub into: PathBuf,
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory as _;

    #[test]
    fn the_definitions_are_sound() {
        Arguments::command().debug_assert();
    }

    #[test]
    fn every_quantity_flag_refuses_a_bare_number() {
        let mut seen = 0;
        for flag in ["--at", "--for-flow", "--barometer"] {
            let error =
                Arguments::try_parse_from(["ebbline", "bench", "fit", "x.toml", flag, "9.4"]).unwrap_err();
            assert_eq!(error.exit_code(), 2);
            assert!(error.to_string().contains("9.4"), "{error}");
            seen += 1;
        }
        // A new quantity flag has to be listed above: all others take no quantity.
        let command = Arguments::command();
        let fit = command.find_subcommand("bench").and_then(|b| b.find_subcommand("fit")).unwrap();
        let plain = ["run", "plot", "monte_carlo"];
        let quantities = fit.get_arguments().filter(|a| !plain.contains(&a.get_id().as_str())).count();
        assert_eq!(quantities, seen);
    }

    #[test]
    fn quantity_flags_take_negative_values_and_lists() {
        let parsed = Arguments::try_parse_from([
            "ebbline",
            "bench",
            "fit",
            "x.toml",
            "--at",
            "-0.5 bar,9 bar",
            "--at",
            "10bar",
        ]);
        let Command::Bench(Bench::Fit(fit)) = parsed.unwrap().command else { panic!("not fit") };
        let bars: Vec<f64> = fit.at.iter().map(|p| p.as_bar()).collect();
        assert_eq!(bars, [-0.5, 9.0, 10.0]);
    }

    #[test]
    fn global_options_stand_before_or_after_the_verb() {
        for line in
            [["ebbline", "--json", "bench", "fit", "x.toml"], ["ebbline", "bench", "fit", "x.toml", "--json"]]
        {
            assert!(Arguments::try_parse_from(line).unwrap().global.json);
        }
    }
}
