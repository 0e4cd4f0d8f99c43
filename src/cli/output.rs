//! The two streams: results on standard output, talk on standard error.

use std::io::{ErrorKind, Write};
use std::path::{Path, PathBuf};

use clap::ArgMatches;

use crate::report::{CsvError, CsvLocale, OutputFile, PictureFormat, TextOptions, write_files};

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

/// Form of the main result.
pub(super) enum Format {
    Text(TextOptions),
    Json,
    Csv(CsvLocale),
}

impl Format {
    pub(super) fn of(matches: &ArgMatches) -> Self {
        if matches.get_flag("json") {
            Self::Json
        } else if matches.get_flag("csv") {
            Self::Csv(csv_locale(matches))
        } else {
            Self::Text(TextOptions {
                ascii: matches.get_flag("ascii"),
                verbose: matches.get_flag("verbose"),
            })
        }
    }
}

/// Dialect of the tables.
pub(super) fn csv_locale(matches: &ArgMatches) -> CsvLocale {
    match matches.get_one::<String>("csv-locale") {
        Some(word) if word == "eu" => CsvLocale::Eu,
        _ => CsvLocale::Plain,
    }
}

/// A table in the dialect asked for.
pub(super) fn in_locale(
    table: Result<String, CsvError>,
    locale: CsvLocale,
) -> Result<String, Failure> {
    table
        .and_then(|table| locale.apply(&table))
        .map_err(Failure::not_printed)
}

/// The pictures that an option asks for, each with its kind.
pub(super) fn pictures(
    matches: &ArgMatches,
    name: &str,
) -> Result<Vec<(PathBuf, PictureFormat)>, Failure> {
    matches
        .get_many::<PathBuf>(name)
        .into_iter()
        .flatten()
        .map(|path| Ok((path.clone(), PictureFormat::of_path(path)?)))
        .collect()
}

/// The begin of the names of files for viewers, if they are asked for; an extension of one of them is left out.
pub(super) fn vtk_prefix(matches: &ArgMatches) -> Result<Option<PathBuf>, Failure> {
    let Some(prefix) = matches.get_one::<PathBuf>("vtk").cloned() else {
        return Ok(None);
    };
    let ends_in_folder = prefix.to_string_lossy().ends_with(std::path::is_separator);
    if ends_in_folder || prefix.file_name().is_none() || prefix == Path::new("-") {
        return Err(Failure::usage(
            format!("--vtk: `{}` does not end in a name", prefix.display()),
            "give the begin of the file names, for example --vtk out/wafer",
        ));
    }
    let is_file = prefix.extension().is_some_and(|extension| {
        let viewers = ["vti", "vtp", "vtk", "vtu", "pvd"];
        viewers
            .iter()
            .any(|known| extension.eq_ignore_ascii_case(known))
    });
    Ok(Some(if is_file {
        prefix.with_extension("")
    } else {
        prefix
    }))
}

/// What must not be overwritten, and whether files are told of.
pub(super) struct Inputs<'a> {
    pub(super) files: &'a [&'a Path],
    pub(super) quiet: bool,
}

/// Writes the files, and the main result to its file or to standard output.
pub(super) fn deliver(
    mut files: Vec<(PathBuf, Vec<u8>)>,
    text: String,
    target: Option<&Path>,
    inputs: &Inputs<'_>,
) -> Result<(), Failure> {
    let printed = match target {
        Some(path) => {
            files.push((path.to_owned(), text.into_bytes()));
            None
        }
        None => Some(text),
    };
    let list: Vec<OutputFile<'_>> = files
        .iter()
        .map(|(path, bytes)| OutputFile { path, bytes })
        .collect();
    write_files(&list, inputs.files)?;
    if !inputs.quiet {
        for (path, _) in &files {
            talk(&format!("wrote {}", path.display()));
        }
    }
    printed.map_or(Ok(()), |text| print(&text))
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
