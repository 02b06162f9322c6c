//! Arguments of `book`.

use std::path::PathBuf;

use clap::{Args, Subcommand};

/// Verbs of the record file.
#[derive(Debug, Subcommand)]
pub enum Book {
    /// Says what the book holds and where it is
    Info,
    /// Checks the book from its first record to its last: 0 it holds, 1 it does not, 3 it cannot be read
    Check(Check),
    /// Copies the book into a file, and checks the copy
    Backup(Backup),
    /// Writes everything into a folder, as TOML and CSV that add and import take back
    Export(Export),
}

/// Options of `book check`.
#[derive(Debug, Args)]
pub struct Check {
    /// A head of the chain that was kept elsewhere, as `book info` and certificates print it; repeat
    #[arg(long, value_name = "HEAD", num_args = 1..)]
    pub head: Vec<String>,
}

/// Options of `book backup`.
#[derive(Debug, Args)]
pub struct Backup {
    /// The copy
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
    /// Replace a file of that name
    #[arg(long)]
    pub replace: bool,
}

/// Options of `book export`.
#[derive(Debug, Args)]
pub struct Export {
    /// The folder: a new or empty one, or one that holds an earlier export, which it replaces
    #[arg(value_name = "DIR")]
    pub folder: PathBuf,
    /// Divers too; the book notes that there is a copy of their details
    #[arg(long)]
    pub with_divers: bool,
}
