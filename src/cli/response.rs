//! `etchwise card ... --vary`: a response table with its formula.

use std::path::{Path, PathBuf};

use clap::ArgMatches;

use crate::flow::Fluid;
use crate::geometry::{NominalError, SpecValue};
use crate::intake::ReadOptions;
use crate::report::{self, PictureFormat, ResponseDocument, SourceRecord, check_targets};
use crate::study::{
    DEFAULT_FIT_ERROR, FIT_ERRORS, PointError, RangeText, ResponseError, ResponseFamily,
    ResponseOptions, ResponseTable, fixed_values, kind_name, response_table,
};
use crate::units::parse_fraction;
use crate::units::spelling::nearest;
use crate::warning::Code;

use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input::{self, CheckedSection, checked_section, read_options};
use super::instrument_options::say_settings;
use super::output::{self, Format, Inputs};
use super::quantities::{fluid, quantity};

/// What was asked for, no file opened yet.
struct Request {
    /// Name of a nominal kind, or a file.
    subject: PathBuf,
    read: ReadOptions,
    ranges: Vec<RangeText>,
    fixed: Vec<String>,
    options: ResponseOptions,
    fluid: Option<Fluid>,
    format: Format,
    output: Option<PathBuf>,
    pictures: Vec<(PathBuf, PictureFormat)>,
    quiet: bool,
    deny_warnings: bool,
}

/// What is varied.
struct Subject {
    name: String,
    family: ResponseFamily,
    fixed: Vec<(String, String)>,
    /// The section whose walls move; `None` for a nominal kind.
    section: Option<CheckedSection>,
}

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    super::set_threads(matches)?;
    let request = Request::new(matches)?;
    request.check_targets()?;
    let subject = request.subject()?;
    say_settings(matches);
    let table = response_table(&subject.family, request.options)?;
    request.answer(&subject, &table)
}

impl Request {
    fn new(matches: &ArgMatches) -> Result<Self, Failure> {
        let texts = |name| {
            let given = matches.get_many::<String>(name);
            given.into_iter().flatten().cloned().collect::<Vec<_>>()
        };
        let mut ranges = Vec::new();
        for text in texts("vary") {
            ranges.push(RangeText::read(&text)?);
        }
        let asked = quantity(matches, "fit-error", parse_fraction)?;
        let fit_error = asked.unwrap_or(DEFAULT_FIT_ERROR);
        let [least, most] = FIT_ERRORS;
        if !(least..=most).contains(&fit_error) {
            return Err(Failure::usage(
                format!("--fit-error {fit_error} is outside {least:e} to {most}"),
                "give a share such as 0.1%, 200ppm or 1e-3",
            ));
        }
        let defaults = ResponseOptions::default();
        let fresh = matches.get_one::<u32>("fresh-points");
        Ok(Self {
            subject: one_subject(matches)?,
            read: read_options(matches)?,
            ranges,
            fixed: texts("with"),
            options: ResponseOptions {
                fit_error,
                fresh_points: fresh.map_or(defaults.fresh_points, |&n| n as usize),
            },
            fluid: fluid(matches)?,
            format: Format::of(matches),
            output: output::target(matches),
            pictures: output::pictures(matches, "picture")?,
            quiet: matches.get_flag("quiet"),
            deny_warnings: matches.get_flag("deny-warnings"),
        })
    }

    /// The nominal kind that the subject names, if it does.
    fn kind(&self) -> Option<&'static str> {
        self.subject.to_str().and_then(kind_name)
    }

    fn files_read(&self) -> Vec<&Path> {
        if self.kind().is_some() {
            return Vec::new();
        }
        input::files_read(&self.subject, &self.read)
    }

    /// Outputs that cannot be written are found before the solve.
    fn check_targets(&self) -> Result<(), Failure> {
        let pictures = self.pictures.iter().map(|(path, _)| path.as_path());
        let targets: Vec<&Path> = self.output.as_deref().into_iter().chain(pictures).collect();
        Ok(check_targets(&targets, &self.files_read())?)
    }

    fn subject(&self) -> Result<Subject, Failure> {
        match self.kind() {
            Some(kind) => self.nominal(kind),
            None => self.made(),
        }
    }

    fn nominal(&self, kind: &'static str) -> Result<Subject, Failure> {
        let texts = self.fixed.iter().map(String::as_str);
        let spec = fixed_values(kind, texts).map_err(fixed_failure)?;
        let fixed = spec.values.iter().map(|(name, value)| {
            let text = match value {
                SpecValue::Text(text) => text.clone(),
                _ => self.typed(name),
            };
            (name.clone(), text)
        });
        Ok(Subject {
            name: kind.to_owned(),
            fixed: fixed.collect(),
            family: ResponseFamily::nominal(spec, &self.ranges)?,
            section: None,
        })
    }

    /// A fixed value as it was typed.
    fn typed(&self, name: &str) -> String {
        let mut texts = self.fixed.iter().filter_map(|text| text.split_once('='));
        texts
            .find(|(n, _)| n.trim().replace('-', "_") == name)
            .map_or(String::new(), |(_, value)| value.trim().to_owned())
    }

    fn made(&self) -> Result<Subject, Failure> {
        if !self.fixed.is_empty() {
            return Err(Failure::usage(
                format!(
                    "--with fixes parameters of a nominal kind, and {} is none",
                    self.subject.display()
                ),
                "leave it out: a file has its section as it is",
            ));
        }
        let section = checked_section(&self.subject, &self.read).map_err(|f| self.or_kind(f))?;
        let family = ResponseFamily::moved(&section.outline, &section.section.walls, &self.ranges)?;
        Ok(Subject {
            name: input::section_name(&section.section, &self.subject),
            family,
            fixed: Vec::new(),
            section: Some(section),
        })
    }

    /// A file that cannot be read may be a kind with a spelling mistake.
    fn or_kind(&self, failure: Failure) -> Failure {
        let kinds: Vec<&str> = crate::geometry::kinds().iter().map(|k| k.name).collect();
        let near = self.subject.to_str().and_then(|word| nearest(word, &kinds));
        match near {
            Some(kind) => Failure {
                text: format!(
                    "{}\nhelp: did you mean the nominal kind `{kind}`?",
                    failure.text.trim_end()
                ),
                ..failure
            },
            None => failure,
        }
    }

    fn answer(&self, subject: &Subject, table: &ResponseTable) -> Result<ExitStatus, Failure> {
        let section = subject.section.as_ref();
        let source: Option<SourceRecord<'_>> =
            section.map(|s| input::source_record(&s.section.provenance));
        let document = ResponseDocument {
            name: &subject.name,
            source,
            fixed: &subject.fixed,
            table,
            options: self.options,
            fluid: self.fluid.as_ref(),
            warnings: section.map_or(&[][..], |s| &s.warnings),
        };
        let mut files = Vec::new();
        for (path, format) in &self.pictures {
            files.push((path.clone(), report::response_picture(&document, *format)?));
        }
        let text = match &self.format {
            Format::Text(options) => report::response_text(&document, *options),
            Format::Json => report::response_json(&document).map_err(Failure::not_printed)?,
            Format::Csv(locale) => output::in_locale(report::response_csv(&document), *locale)?,
        };
        let inputs = Inputs {
            files: &self.files_read(),
            quiet: self.quiet,
        };
        output::deliver(files, text, self.output.as_deref(), &inputs)?;
        let warnings = document.all_warnings();
        let is_warned = warnings.iter().any(|w| w.code != Code::Caution);
        Ok(if !table.errors.is_met() {
            ExitStatus::NotSolved
        } else if self.deny_warnings && is_warned {
            ExitStatus::OutsideLimit
        } else {
            ExitStatus::Done
        })
    }
}

/// The one kind or file.
fn one_subject(matches: &ArgMatches) -> Result<PathBuf, Failure> {
    let mut given = matches.get_many::<PathBuf>("file").into_iter().flatten();
    match (given.next(), given.next()) {
        (Some(subject), None) => Ok(subject.clone()),
        _ => Err(Failure::usage(
            "a response table is of one nominal kind or one file",
            "name just one, for example etchwise card koh_groove --vary depth=20..40um --with opening=100um",
        )),
    }
}

/// An error in a fixed value.
fn fixed_failure(error: NominalError) -> Failure {
    match &error {
        NominalError::Syntax { .. } => Failure::usage(
            format!("--with: {error}"),
            "write NAME=VALUE with a unit, each name once, for example --with height=40um",
        ),
        _ => error.into(),
    }
}

impl From<ResponseError> for Failure {
    fn from(error: ResponseError) -> Self {
        let status = match &error {
            ResponseError::Point { source, .. } => match source.as_ref() {
                PointError::Film(_) | PointError::Crossed => ExitStatus::OutsideValidity,
                PointError::Flow(inner) => Self::from(inner.clone()).status,
                PointError::Unfinished => ExitStatus::NotSolved,
                _ => ExitStatus::Usage,
            },
            ResponseError::Fit { .. } => ExitStatus::NotSolved,
            _ => ExitStatus::Usage,
        };
        Self::new(status, &error, &error.hint())
    }
}
