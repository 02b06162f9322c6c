//! The binary: hands its arguments to the library and sets the exit status.

use std::process::ExitCode;

fn main() -> ExitCode {
    ExitCode::from(ebbline::cli::run(std::env::args_os()))
}
