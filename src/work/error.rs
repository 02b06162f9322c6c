//! Why a verb could not be done, and the exit status that says so.

use std::path::PathBuf;

use super::certificate::CertificateError;
use super::enter::EnterError;
use super::enter_session::SessionEnterError;
use super::png::PngError;
use crate::bench::BenchError;
use crate::bench::monte_carlo::{FEWEST_TRIALS, MOST_TRIALS};
use crate::book::{BookError, NoHead};
use crate::entry::{Id, IdError, SessionNumber};
use crate::instrument::{OpenError, ProfileError};
use crate::record::{RecordError, Refusal};
use crate::rig::RigError;
use crate::setting::SettingError;
use crate::uptake::UptakeError;

/// How a call ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ExitStatus {
    /// Done, and favourable.
    Done,
    /// Done, and the verdict is not favourable.
    Unfavourable,
    /// The input or the call is wrong.
    Wrong,
    /// An instrument, port, disk, output file or database failed.
    Failed,
}

impl ExitStatus {
    /// The number for the operating system.
    #[must_use]
    pub const fn code(self) -> u8 {
        match self {
            Self::Done => 0,
            Self::Unfavourable => 1,
            Self::Wrong => 2,
            Self::Failed => 3,
        }
    }
}

/// Why a verb could not be done.
#[derive(Debug, thiserror::Error)]
pub enum WorkError {
    /// A file cannot be read or its content is refused.
    #[error(transparent)]
    Record(#[from] RecordError),
    /// A run cannot be analysed.
    #[error("{file}: {error}", file = file.display())]
    Bench {
        /// The run file.
        file: PathBuf,
        /// What is wrong; its cause, if it has one, comes after it.
        #[source]
        error: BenchError,
    },
    /// A time series holds too few steady spans.
    #[error(
        "{file}: the time series holds {found} steady spans and a line needs {needed}: hold each pressure for at least \
         {hold_s:.0} s{nearly}", file = file.display()
    )]
    TooFewSteady {
        /// The run file.
        file: PathBuf,
        /// Steady spans found.
        found: usize,
        /// Spans needed.
        needed: usize,
        /// Least duration of a span, seconds.
        hold_s: f64,
        /// What nearly was steady and why it is not, ready to be appended.
        nearly: String,
    },
    /// A session cannot be worked out.
    #[error("{session}: {error}")]
    Uptake {
        /// The session's number or file.
        session: String,
        /// What is wrong.
        error: UptakeError,
    },
    /// Two sessions of one diver at one time.
    #[error(
        "{0} and {1} overlap in time, and one diver cannot rest twice at once: correct \"taken\" of one, name only one of \
         them, or leave one out (session leave-out)"
    )]
    Overlap(String, String),
    /// An intermediate pressure that the bench run says nothing about.
    #[error(
        "{session}: an IP of {ip_bar_gauge} bar gauge is beyond what the bench run of {orifice} measured ({:.1} to {:.1} \
         bar gauge): correct it, measure the orifice there, or give the flow", span_bar_gauge.0, span_bar_gauge.1
    )]
    IpOutsideBench {
        /// The session's number or file.
        session: String,
        /// The pressure.
        ip_bar_gauge: f64,
        /// The orifice.
        orifice: Id,
        /// What was measured.
        span_bar_gauge: (f64, f64),
    },
    /// Instruments that cannot log a run.
    #[error(transparent)]
    LogSetup(#[from] crate::logger::SetupError),
    /// Instruments that cannot log a session.
    #[error(transparent)]
    SessionLogSetup(#[from] crate::logger::SessionSetupError),
    /// Several instruments, or none, where one is needed and none is named.
    #[error("name the instrument that measures {measures} (there: {there})")]
    WhichInstrument {
        /// What it measures.
        measures: &'static str,
        /// Those there are.
        there: String,
    },
    /// No register to look an instrument up in.
    #[error(
        "there is no book at {}, and so no instrument in its register: ebbline instrument add FILE.toml registers one, and \
         ebbline rig simulates a bench to try", book.display()
    )]
    NoInstruments {
        /// Where the book would be.
        book: PathBuf,
    },
    /// An instrument that cannot be logged from.
    #[error("{id} {why}: name an instrument that measures {measures} (there: {there})")]
    NoSuchInstrument {
        /// Its name as typed.
        id: String,
        /// Why.
        why: String,
        /// What it should measure.
        measures: &'static str,
        /// Those there are.
        there: String,
    },
    /// Cells that show volts, and no calibration.
    #[error(
        "a cell that shows mV needs its calibration: name a session file whose [cells] has air, oxygen and calibrated_at \
         (--from FILE.toml)"
    )]
    NoCellCalibration,
    /// A text that is no injection.
    #[error("\"{}\" is no injection: write a flow as in \"0.31 L/min\", an IP as in \"9.4 bar\", or off", .0.escape_debug())]
    NoInjection(String),
    /// Nothing was heard of any instrument.
    #[error(
        "no reading came within {for_s:.0} s, so that nothing was recorded: check cables and power, and try each instrument \
         (instrument try ID)"
    )]
    NothingHeard {
        /// For how long it was listened.
        for_s: f64,
    },
    /// The last readings could not be kept.
    #[error("the last {things} readings and notes are not in the book: {why}")]
    NotSaved {
        /// How many.
        things: usize,
        /// Why.
        why: String,
    },
    /// A setting is asked for wrongly.
    #[error(transparent)]
    Setting(SettingError),
    /// A time within a session that is none.
    #[error(transparent)]
    SessionTime(Refusal),
    /// A stretch outside a session's readings, or the wrong way round.
    #[error(
        "{session}: its readings run from {first_s:.0} s to {last_s:.0} s, and no stretch of them begins at {from} and ends \
         at {until}: correct --from or --until", from = from.escape_debug(), until = until.escape_debug()
    )]
    Stretch {
        /// The session.
        session: SessionNumber,
        /// Its beginning as typed.
        from: String,
        /// Its end as typed.
        until: String,
        /// First reading, seconds.
        first_s: f64,
        /// Last reading, seconds.
        last_s: f64,
    },
    /// A text that is no session's number.
    #[error(
        "\"{}\" is no session: a session of the book is named like S0001, and a session file has a slash or ends in .toml",
        .0.escape_debug()
    )]
    NoSessionNumber(String),
    /// A diver without a session that counts.
    #[error("{0} has no session in the book that counts: session import FILE.toml, or session enter {0}")]
    NoSessionOf(Id),
    /// Readings that two sessions hold, of which each says something else.
    #[error(
        "{one} and {other} hold the same readings and say different things about them, so they cannot count as two \
         sessions: name one of them, or leave the other out (session leave-out)"
    )]
    SameReadings {
        /// One session.
        one: String,
        /// The other.
        other: String,
    },
    /// An orifice that is not in the register.
    #[error(
        "there is no orifice {0} in the book: orifice list shows those there are; a run file has a slash or ends in .toml"
    )]
    NoOrifice(Id),
    /// An orifice without a complete run.
    #[error("{0} has no complete run in the book, so no line: bench import FILE.toml, or bench enter {0}")]
    NoRunOf(Id),
    /// One orifice twice in a comparison.
    #[error("{0} was named twice: name each orifice once")]
    OrificeTwice(Id),
    /// Nobody's uptake.
    #[error("nobody to set for: give --diver DIVER, or --session FILE.toml")]
    NobodyToSetFor,
    /// No such first stage.
    #[error(
        "there is no first stage {0} in the register: say uncompensated or compensated, or add it with first-stage add"
    )]
    NoFirstStage(Id),
    /// No such flow meter.
    #[error("there is no flow meter {0} in the register: add it with instrument add")]
    NoMeter(Id),
    /// A sheet's file name has another ending.
    #[error("{0}: the sheet is written as .pdf or .txt, name the file so")]
    SheetKind(PathBuf),
    /// Certificates.
    #[error(transparent)]
    Certificate(#[from] CertificateError),
    /// A size of paper, and no page to print on it.
    #[error("--paper is the paper of a sheet as PDF: give --sheet FILE.pdf with it, or leave it out")]
    PaperWithoutSheet,
    /// A sheet that cannot be set in pages; a fault of this program.
    #[error("the sheet cannot be set as PDF: {0}; write it as .txt instead")]
    SheetNotSet(String),
    /// The book.
    #[error(transparent)]
    Book(#[from] BookError),
    /// An answer or a point that is not taken.
    #[error(transparent)]
    Enter(#[from] EnterError),
    /// An answer or a row of a session that is not taken.
    #[error(transparent)]
    EnterSession(#[from] SessionEnterError),
    /// A text that is no run's number.
    #[error(
        "\"{}\" is no run: a run of the book is named like R0001, and a run file has a slash or ends in .toml",
        .0.escape_debug()
    )]
    NoRunNumber(String),
    /// A text that says nothing, or hides something.
    #[error("{option} takes a text of visible characters, not \"{text}\"", text = text.escape_debug())]
    Text {
        /// The option.
        option: &'static str,
        /// What was given.
        text: String,
    },
    /// A text that is no name of an entry.
    #[error("that names no entry of a register")]
    NoName(#[source] IdError),
    /// An edit that gives nothing.
    #[error("this needs a file, or flags that say the same: --help lists them")]
    NothingGiven,
    /// Files and flags, or several names.
    #[error("give either files of entries, or one name with flags")]
    FilesOrFlags,
    /// Nothing is known of the shop.
    #[error(
        "nothing is said of the shop yet: shop edit FILE.toml, or shop edit --name NAME --address ADDRESS"
    )]
    NoShop,
    /// A reason that stays and names who is to be forgotten.
    #[error("the reason stays in the book for good, so it must not name {0}: give another --why")]
    ReasonNames(String),
    /// Another program keeps the bytes of what was erased.
    #[error(
        "{diver}: {what}, but another program is reading the book, and until it stops the bytes stay in the file or its \
         log: close it, then give the same command again\n{copies}",
        what = if *records == 0 { "the erasure is not finished yet".to_owned() }
               else { format!("{} erased and cannot be read any more", if *records == 1 { "1 record is".into() } else { format!("{records} records are") }) },
        copies = copies.trim_end()
    )]
    StillHeld {
        /// The name in the register.
        diver: String,
        /// Records erased now.
        records: usize,
        /// Copies that cannot be reached, ready to be appended.
        copies: String,
    },
    /// A history without a judged run.
    #[error("{0} has no accepted run to draw yet: bench accept RUN first")]
    NothingToDraw(Id),
    /// A text that is no head of a chain.
    #[error(transparent)]
    NoHead(#[from] NoHead),
    /// A folder that an export or a demonstration may not replace.
    #[error("{path} {why}: name another", path = path.display())]
    NotReplaced {
        /// The folder or file.
        path: PathBuf,
        /// Why it stays as it is.
        why: String,
    },
    /// The platform names no folder for data.
    #[error("this system names no folder for data: say where the book is with --book FILE or EBBLINE_BOOK")]
    NoDataFolder,
    /// The system gives no random numbers, and without them a salt could be guessed.
    #[error("the system gives no random numbers, which the book needs for its salts: try again later")]
    NoRandomNumbers,
    /// A number of trials outside the bounds.
    #[error("--monte-carlo takes {FEWEST_TRIALS} to {MOST_TRIALS} trials, not {0}")]
    Trials(usize),
    /// No interval came out of the trials.
    #[error(
        "too few of the {0} Monte Carlo trials converged for an interval: look at the checks of the run first"
    )]
    NoMonteCarlo(usize),
    /// A profile that cannot be listened to.
    #[error(transparent)]
    Profile(#[from] ProfileError),
    /// A port that does not open, or a system that does not list its ports.
    #[error(transparent)]
    Port(#[from] OpenError),
    /// A time to listen outside the bounds.
    #[error("--for takes 0.5 s to 1 h, not {0} s")]
    ListenFor(f64),
    /// The simulated bench.
    #[error(transparent)]
    Rig(#[from] RigError),
    /// A step of the rig's script that is none.
    #[error(
        "\"{}\" is no step of a script: write pressure and time, with commas between steps, as in \"4 bar 45 s, 5 bar 45 s\"",
        .0.escape_debug()
    )]
    RigScript(String),
    /// No pseudo-terminals on this system.
    #[error(
        "the simulated bench needs pseudo-terminals, which this system does not have: it runs on Linux, macOS and other Unix systems"
    )]
    NoPseudoTerminals,
    /// A plot's file name has another ending.
    #[error("{0}: a plot is written as .svg or .png, name the file so")]
    PlotKind(PathBuf),
    /// A picture cannot be made.
    #[error("the plot cannot be turned into a picture")]
    Png(#[from] PngError),
    /// A file or folder cannot be written.
    #[error("{path} cannot be written: look at the folder, its permissions and the space on the disk", path = path.display())]
    Write {
        /// Where.
        path: PathBuf,
        /// What the system said.
        #[source]
        source: std::io::Error,
    },
}

impl WorkError {
    /// The exit status that goes with it.
    #[must_use]
    pub const fn status(&self) -> ExitStatus {
        match self {
            Self::Record(_)
            | Self::Bench { .. }
            | Self::TooFewSteady { .. }
            | Self::Enter(_)
            | Self::EnterSession(_)
            | Self::NoRunNumber(_)
            | Self::Uptake { .. }
            | Self::Overlap(..)
            | Self::IpOutsideBench { .. }
            | Self::Setting(_)
            | Self::SessionTime(_)
            | Self::Stretch { .. }
            | Self::NoSessionNumber(_)
            | Self::NoSessionOf(_)
            | Self::SameReadings { .. }
            | Self::NoOrifice(_)
            | Self::NoRunOf(_)
            | Self::OrificeTwice(_)
            | Self::NobodyToSetFor
            | Self::NoFirstStage(_)
            | Self::NoMeter(_)
            | Self::SheetKind(_)
            | Self::PaperWithoutSheet
            | Self::SheetNotSet(_)
            | Self::Text { .. }
            | Self::NoName(_)
            | Self::NothingGiven
            | Self::FilesOrFlags
            | Self::NoShop
            | Self::ReasonNames(_)
            | Self::NothingToDraw(_)
            | Self::NoHead(_)
            | Self::NotReplaced { .. }
            | Self::Profile(_)
            | Self::ListenFor(_)
            | Self::LogSetup(_)
            | Self::NoCellCalibration
            | Self::NoInstruments { .. }
            | Self::NoInjection(_)
            | Self::SessionLogSetup(_)
            | Self::WhichInstrument { .. }
            | Self::NoSuchInstrument { .. }
            | Self::RigScript(_)
            | Self::NoDataFolder
            | Self::Trials(_)
            | Self::NoMonteCarlo(_)
            | Self::PlotKind(_) => ExitStatus::Wrong,
            Self::Certificate(error) => error.status(),
            Self::Book(error) => book_status(error),
            Self::Rig(error) => rig_status(error),
            Self::Port(_)
            | Self::NoPseudoTerminals
            | Self::StillHeld { .. }
            | Self::NothingHeard { .. }
            | Self::NotSaved { .. }
            | Self::NoRandomNumbers
            | Self::Png(_)
            | Self::Write { .. } => ExitStatus::Failed,
        }
    }
}

/// What is asked of the book is wrong, or the book itself failed.
const fn book_status(error: &BookError) -> ExitStatus {
    if error.is_of_the_call() { ExitStatus::Wrong } else { ExitStatus::Failed }
}

/// What is asked of the rig is wrong, or the system failed it.
const fn rig_status(error: &RigError) -> ExitStatus {
    match error {
        RigError::Terminal { .. } | RigError::Link { .. } | RigError::Log { .. } | RigError::Stopped => {
            ExitStatus::Failed
        }
        _ => ExitStatus::Wrong,
    }
}
