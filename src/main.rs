//! The binary: parses arguments, calls the library, prints the error chain, sets the exit status.

fn main() {}
