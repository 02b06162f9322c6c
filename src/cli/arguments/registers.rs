//! Arguments of the registers.

use std::path::PathBuf;

use clap::{Args, Subcommand};

use super::keys::{
    AcceptanceKeys, DiverKeys, FirstStageKeys, Flags, InstrumentKeys, Keys, OrificeKeys, ShopKeys,
};
use crate::quantity::{Span, text};

/// Verbs of orifices.
#[derive(Debug, Subcommand)]
pub enum Orifices {
    /// Adds orifices to the register
    Add(Add<OrificeKeys>),
    /// Changes what is said of an orifice; earlier revisions are kept
    Edit(Edit<OrificeKeys>),
    /// Lists the orifices, each with its newest run
    List(Entries),
    /// Shows an orifice with its history: runs, trend, and when it would leave its limits
    Show(ShowOrifice),
}

/// Verbs of instruments.
#[derive(Debug, Subcommand)]
pub enum Instruments {
    /// Adds instruments to the register
    Add(Add<InstrumentKeys>),
    /// Changes what is said of an instrument, as after a calibration; earlier revisions are kept
    Edit(Edit<InstrumentKeys>),
    /// Lists the instruments, and when their calibrations are due
    List(Entries),
    /// Shows an instrument
    Show(One),
    /// Lists the serial ports there are, and which instrument is set to which
    Ports,
    /// Listens to an instrument for a few seconds: what comes, what it means, and which settings would do better
    Try(Try),
}

/// Verbs of first stages.
#[derive(Debug, Subcommand)]
pub enum FirstStages {
    /// Adds first stages to the register
    Add(Add<FirstStageKeys>),
    /// Changes what is said of a first stage; earlier revisions are kept
    Edit(Edit<FirstStageKeys>),
    /// Lists the first stages
    List(Entries),
    /// Shows a first stage
    Show(One),
}

/// Verbs of divers.
#[derive(Debug, Subcommand)]
pub enum Divers {
    /// Adds divers to the register
    Add(Add<DiverKeys>),
    /// Changes what is said of a diver
    Edit(Edit<DiverKeys>),
    /// Lists the divers
    List(Entries),
    /// Shows a diver
    Show(One),
    /// Erases everything personal of a diver, for good
    Forget(Forget),
}

/// Verbs of acceptances.
#[derive(Debug, Subcommand)]
pub enum Acceptances {
    /// Adds limits to the register
    Add(Add<AcceptanceKeys>),
    /// Changes limits; runs judged by the earlier ones keep their judgement
    Edit(Edit<AcceptanceKeys>),
    /// Lists the limits
    List(Entries),
    /// Shows limits
    Show(One),
}

/// Verbs of the shop.
#[derive(Debug, Subcommand)]
pub enum ShopVerbs {
    /// Shows what is said of the shop
    Show(ShowShop),
    /// Says what the shop is, or changes it; earlier revisions are kept
    Edit(EditShop),
}

/// Options of `add`: files, or a name with flags.
#[derive(Debug, Args)]
pub struct Add<K: Keys> {
    /// Files of entries (a name with a slash, or ending in .toml), or the name of one whose keys are given as flags
    #[arg(value_name = "FILE.toml|ID")]
    pub what: Vec<String>,
    /// What the entry says.
    #[command(flatten)]
    pub flags: Flags<K>,
}

/// Options of `edit`: a file or flags; what is not given stays.
#[derive(Debug, Args)]
pub struct Edit<K: Keys> {
    /// The entry
    #[arg(value_name = "ID")]
    pub id: String,
    /// A file with what changes
    #[arg(value_name = "FILE.toml")]
    pub file: Option<PathBuf>,
    /// What changes; an empty text takes a key away.
    #[command(flatten)]
    pub flags: Flags<K>,
}

/// Options of `shop edit`.
#[derive(Debug, Args)]
pub struct EditShop {
    /// A file with what changes
    #[arg(value_name = "FILE.toml")]
    pub file: Option<PathBuf>,
    /// What changes; an empty text takes a key away.
    #[command(flatten)]
    pub flags: Flags<ShopKeys>,
}

/// Options of `list`.
#[derive(Debug, Args)]
pub struct Entries {
    /// Every entry, not only the first 50
    #[arg(long)]
    pub all: bool,
}

/// Options of `show`.
#[derive(Debug, Args)]
pub struct One {
    /// The entry
    #[arg(value_name = "ID")]
    pub id: String,
    /// Earlier revisions too
    #[arg(long)]
    pub all: bool,
}

/// Options of `instrument try`.
#[derive(Debug, Args)]
pub struct Try {
    /// An instrument of the register, or the file of its profile (a name with a slash, or ending in .toml)
    #[arg(value_name = "ID|FILE.toml")]
    pub what: String,
    /// How long to listen; other settings are tried after that where it does not do well
    #[arg(long = "for", value_name = "DURATION", default_value = "5 s", allow_hyphen_values = true, value_parser = text::value::<Span>)]
    pub lasts: Span,
}

/// Options of `orifice show`.
#[derive(Debug, Args)]
pub struct ShowOrifice {
    /// The orifice
    #[arg(value_name = "ID")]
    pub id: String,
    /// Every run, not only the newest 50, and earlier revisions of the entry
    #[arg(long)]
    pub all: bool,
    /// Draw its flow over time; the ending says how
    #[arg(long, value_name = "FILE.svg|.png")]
    pub plot: Option<PathBuf>,
}

/// Options of `shop show`.
#[derive(Debug, Args)]
pub struct ShowShop {
    /// Earlier revisions too
    #[arg(long)]
    pub all: bool,
}

/// Options of `diver forget`.
#[derive(Debug, Args)]
pub struct Forget {
    /// The diver
    #[arg(value_name = "D")]
    pub id: String,
    /// The reason, which stays in the book for good: it must not name the diver
    #[arg(long, value_name = "TEXT")]
    pub why: String,
}
