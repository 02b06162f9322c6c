//! Why nothing came of a verb of certificates.

use std::path::PathBuf;

use crate::certificate::CheckError;
use crate::entry::RunNumber;
use crate::work::ExitStatus;

/// Why nothing came of it.
#[derive(Debug, thiserror::Error)]
pub enum CertificateError {
    /// What keeps a certificate from being issued, all of it.
    #[error(
        "nothing was issued and no number was used: {} to be put right first\n{}",
        if .0.len() == 1 { "1 thing is".to_owned() } else { format!("{} things are", .0.len()) },
        .0.iter().map(|problem| format!("  {problem}")).collect::<Vec<_>>().join("\n")
    )]
    Incomplete(Vec<String>),
    /// A run without a judgement.
    #[error("{0} is not judged yet, and a certificate states a judged run: bench accept {0} first")]
    NotJudged(RunNumber),
    /// A run that was changed after its judgement.
    #[error("{0} comes out otherwise than it was judged on: bench accept {0} again, then issue")]
    JudgeAgain(RunNumber),
    /// A run as found that cannot be one.
    #[error("{found} cannot be the run as found of {run}: {why}")]
    AsFound {
        /// The run named.
        found: RunNumber,
        /// The run of the results.
        run: RunNumber,
        /// Why not.
        why: String,
    },
    /// An amendment from a run of another orifice.
    #[error("{found} cannot take the place of {run}: {why}")]
    OtherOrifice {
        /// The run named.
        found: RunNumber,
        /// The run of the certificate before.
        run: RunNumber,
        /// Why not.
        why: String,
    },
    /// Somebody who may not sign.
    #[error("{} is not among those who may sign for the shop ({those}): name one of them with --by, or add them with shop edit", .name.escape_debug())]
    NotSigning {
        /// Who was named.
        name: String,
        /// Who may.
        those: String,
    },
    /// An option that is another than the certificate was issued with.
    #[error(
        "{run} has certificate {number} already, issued with another {what}: leave {what} out to have the same one again, or \
         amend it (certificate amend {number} --why TEXT)"
    )]
    IssuedOtherwise {
        /// The run.
        run: RunNumber,
        /// Its certificate.
        number: String,
        /// The option.
        what: &'static str,
    },
    /// A certificate of another method.
    #[error(
        "certificate {number} was made by method {method} of version {program}, which is not available here: use that version, or \
         amend it"
    )]
    OtherMethod {
        /// The certificate.
        number: String,
        /// The revision of its method.
        method: u32,
        /// The version of the program that has it.
        program: String,
    },
    /// A certificate that would come out otherwise than it was issued.
    #[error(
        "certificate {number} was issued by version {program} and comes out with other bytes here: nothing was written, use \
         that version or the copy there is"
    )]
    OtherBytes {
        /// The certificate.
        number: String,
        /// The version that issued it.
        program: String,
    },
    /// Neither a run nor a certificate.
    #[error(
        "\"{}\" is neither a run (named like R0001) nor a certificate of the book: certificate list shows those there are",
        .0.escape_debug()
    )]
    NoSuch(String),
    /// A day that is none.
    #[error("--received takes a day as 2026-11-10, not \"{}\"", .0.escape_debug())]
    Day(String),
    /// A file that is not there or cannot be read.
    #[error("{} cannot be read: {says}", .path.display())]
    Unreadable {
        /// The file.
        path: PathBuf,
        /// What the system says.
        says: String,
    },
    /// A file beyond what is read.
    #[error("{} has {} MB, and at most {limit} MB are read: no certificate is as large", .path.display(), .bytes / 1_000_000)]
    TooLarge {
        /// The file.
        path: PathBuf,
        /// Its size.
        bytes: u64,
        /// The most that is read, in megabytes.
        limit: u64,
    },
    /// A file that nothing can be said of.
    #[error("{0}")]
    Check(#[from] CheckError),
}

impl CertificateError {
    /// The exit status that goes with it: in each case the call or the input is wrong.
    #[must_use]
    pub const fn status(&self) -> ExitStatus {
        ExitStatus::Wrong
    }
}
