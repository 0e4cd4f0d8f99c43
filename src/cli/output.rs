//! The two streams: results on standard output, talk on standard error.

use std::io::{ErrorKind, Write};

use super::exit_status::ExitStatus;
use super::failure::Failure;

/// Prints a result. A reader that has gone away is no error.
pub(super) fn print(text: &str) -> Result<(), Failure> {
    let mut out = std::io::stdout().lock();
    let written = out.write_all(text.as_bytes()).and_then(|()| out.flush());
    match written {
        Err(error) if error.kind() != ErrorKind::BrokenPipe => Err(Failure::new(
            ExitStatus::Unreadable,
            format!("standard output cannot be written: {error}"),
            "write to a file with -o",
        )),
        _ => Ok(()),
    }
}

/// Says something to the person; nobody listening is no error.
pub(super) fn talk(text: &str) {
    let mut err = std::io::stderr().lock();
    let _ = writeln!(err, "{text}");
}
