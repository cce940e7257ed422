//! bandproof: parse, dispatch, exit status.

/// Keeps freed pages: recordings in a row need the same buffers again, and fresh pages
/// from the system took a fifth of a run.
#[global_allocator]
static ALLOCATOR: mimalloc::MiMalloc = mimalloc::MiMalloc;

mod cli;

use std::process::ExitCode;

fn main() -> ExitCode {
    cli::run(std::env::args_os()).into()
}
