//! The `etchwise` program; all it does is in [`etchwise::cli`].

use std::process::ExitCode;

fn main() -> ExitCode {
    etchwise::cli::run(std::env::args_os())
}
