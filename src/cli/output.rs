//! The two streams: results on standard output, talk on standard error.

use std::io::{ErrorKind, Write};
use std::path::{Path, PathBuf};

use clap::ArgMatches;

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

/// The file named by `-o`; `None` for standard output, which `-` also means.
pub(super) fn target(matches: &ArgMatches) -> Option<PathBuf> {
    matches
        .get_one::<PathBuf>("output")
        .filter(|path| path.as_path() != Path::new("-"))
        .cloned()
}

/// Longest line said, characters: what a file holds may be quoted in it.
const LONGEST_LINE: usize = 1000;

/// Says something to the person; nobody listening is no error.
///
/// Control characters in what is quoted become blanks, and very long lines are cut.
pub(super) fn talk(text: &str) {
    let mut err = std::io::stderr().lock();
    for line in text.trim_end().lines() {
        let mut plain: String = line
            .chars()
            .take(LONGEST_LINE)
            .map(|c| if c.is_control() { ' ' } else { c })
            .collect();
        if line.chars().nth(LONGEST_LINE).is_some() {
            plain.push_str(" ... (cut)");
        }
        let _ = writeln!(err, "{plain}");
    }
}
