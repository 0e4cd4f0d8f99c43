//! `etchwise trace`, `map` and `image`: from the file of an instrument to section files.

use std::path::{Path, PathBuf};

use clap::ArgMatches;

use crate::flow::SolveOptions;
use crate::intake::{
    InstrumentReading, ReadOptions, SectionKind, Step, heights_csv, read_instrument, to_toml,
};
use crate::report::{
    self, AlternativeRecord, ConductanceRecord, MeasureRecord, PictureFormat, ReadingDocument,
    SectionRecord, StepRecord, TextOptions, check_targets,
};
use crate::warning::{Code, Warning};

use super::check_panels::check_picture;
use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input::{self, CheckedSection, checked, read_options};
use super::instrument_arguments::Kind;
use super::instrument_options::{say_settings, settings};
use super::measures::measures;
use super::output;
use super::sections::{Sections, alternatives};

/// What was asked for, no file opened yet.
struct Request {
    kind: Kind,
    file: PathBuf,
    read: ReadOptions,
    settings: Vec<(String, String)>,
    /// Where the section file goes, as typed.
    output: Option<PathBuf>,
    pictures: Vec<(PathBuf, PictureFormat)>,
    heights: Option<PathBuf>,
    solves: bool,
    /// `None` for one JSON object.
    text: Option<TextOptions>,
    quiet: bool,
    deny_warnings: bool,
}

/// A section with what was worked out for it.
struct Solved {
    checked: CheckedSection,
    number: usize,
    name: String,
    measures: Vec<MeasureRecord>,
    conductance: Option<ConductanceRecord>,
    alternatives: Vec<AlternativeRecord>,
}

pub(super) fn run(kind: Kind, matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    super::set_threads(matches)?;
    let request = Request::new(kind, matches)?;
    request.check_targets()?;
    let mut heights = None;
    let reading = read_instrument(&request.file, &request.read, &mut |map| {
        heights = request.heights.as_ref().map(|_| heights_csv(map));
    });
    request.write_heights(heights)?;
    let reading = reading?;
    input::refuse_foreign_options(&request.read, &reading.provenance)?;
    request.check_kind(&reading)?;
    say_settings(matches);
    let solved = request.solve(&reading)?;
    request.answer(&reading, &solved)
}

impl Request {
    fn new(kind: Kind, matches: &ArgMatches) -> Result<Self, Failure> {
        let mut read = read_options(matches)?;
        if read.as_kind.is_none() {
            read.as_kind = SectionKind::from_word(kind.word());
        }
        Ok(Self {
            kind,
            file: input::file(matches),
            read,
            settings: settings(matches),
            output: matches.get_one::<PathBuf>("output").cloned(),
            pictures: output::pictures(matches, "picture")?,
            heights: matches.get_one::<PathBuf>("heights").cloned(),
            solves: !matches.get_flag("no-solve"),
            text: (!matches.get_flag("json")).then_some(TextOptions {
                ascii: matches.get_flag("ascii"),
                verbose: false,
            }),
            quiet: matches.get_flag("quiet"),
            deny_warnings: matches.get_flag("deny-warnings"),
        })
    }

    /// Outputs that cannot be written are found before the work.
    fn check_targets(&self) -> Result<(), Failure> {
        let pictures = self.pictures.iter().map(|(path, _)| path.as_path());
        let targets: Vec<&Path> = self
            .section_target()
            .into_iter()
            .chain(self.heights.as_deref())
            .chain(pictures)
            .collect();
        Ok(check_targets(
            &targets,
            &input::files_read(&self.file, &self.read),
        )?)
    }

    /// The section file, where it is a file.
    fn section_target(&self) -> Option<&Path> {
        let path = self.output.as_deref();
        path.filter(|path| *path != Path::new("-"))
    }

    /// The heights of a map as read; they are of use even where no groove is found in them.
    fn write_heights(&self, table: Option<String>) -> Result<(), Failure> {
        let (Some(path), Some(table)) = (&self.heights, table) else {
            return Ok(());
        };
        let inputs = output::Inputs {
            files: &input::files_read(&self.file, &self.read),
            quiet: self.quiet,
        };
        let files = vec![(path.clone(), table.into_bytes())];
        output::deliver(files, String::new(), None, &inputs)
    }

    /// A map given to `trace`, say, has a command of its own.
    fn check_kind(&self, reading: &InstrumentReading) -> Result<(), Failure> {
        let found = reading.provenance.kind.word();
        if found == self.kind.word() {
            return Ok(());
        }
        Err(Failure::usage(
            format!(
                "{}: this was read as `{found}`, not as `{}`",
                reading.provenance.path,
                self.kind.word()
            ),
            &format!("type `etchwise {found}` with the same file"),
        ))
    }

    /// Checks every section and, unless that was not wanted, solves it.
    fn solve(&self, reading: &InstrumentReading) -> Result<Vec<Solved>, Failure> {
        let sections = reading.sections();
        let several = sections.len() > 1;
        let path = &reading.provenance.path;
        let mut grooves = reading
            .traces()
            .iter()
            .flat_map(|trace| trace.grooves.iter().map(move |groove| (trace, groove)));
        sections
            .into_iter()
            .enumerate()
            .map(|(index, section)| {
                let groove = grooves.next();
                let number = groove.map_or(index + 1, |(_, groove)| groove.number);
                let of = if several {
                    format!("{path}: channel {number}")
                } else {
                    path.clone()
                };
                let name = input::section_name(&section, &self.file);
                let checked = checked(section, &of, "; the check picture shows it")?;
                let mut solved = Solved {
                    measures: groove
                        .map(|(trace, groove)| measures(&trace.corrected, groove))
                        .unwrap_or_default(),
                    checked,
                    number,
                    name,
                    conductance: None,
                    alternatives: Vec::new(),
                };
                if self.solves {
                    solved.add_conductance()?;
                }
                Ok(solved)
            })
            .collect()
    }

    fn answer(
        &self,
        reading: &InstrumentReading,
        solved: &[Solved],
    ) -> Result<ExitStatus, Failure> {
        let document = self.document(reading, solved);
        let mut files = self.section_files(solved);
        if !self.pictures.is_empty() {
            let picture = check_picture(reading, &document);
            for (path, format) in &self.pictures {
                files.push((
                    path.clone(),
                    report::check_picture_bytes(&picture, *format)?,
                ));
            }
        }
        let text = match self.text {
            None => report::reading_json(&document).map_err(Failure::not_printed)?,
            Some(options) => report::reading_text(&document, options),
        };
        let text = if self.output.as_deref() == Some(Path::new("-")) {
            if !self.quiet {
                output::talk(&text);
            }
            Self::section_text(solved)?
        } else {
            text
        };
        let inputs = output::Inputs {
            files: &input::files_read(&self.file, &self.read),
            quiet: self.quiet,
        };
        output::deliver(files, text, None, &inputs)?;
        let warned = |warning: &Warning| warning.code != Code::Caution;
        let denied = self.deny_warnings
            && (document.warnings.iter().any(|w| warned(w))
                || solved.iter().any(|s| s.checked.warnings.iter().any(warned)));
        Ok(if denied {
            ExitStatus::OutsideLimit
        } else {
            ExitStatus::Done
        })
    }

    /// The section file for standard output.
    fn section_text(solved: &[Solved]) -> Result<String, Failure> {
        match solved {
            [one] => Ok(one.section_file()),
            several => Err(Failure::usage(
                format!(
                    "standard output takes one section file, and there are {} sections",
                    several.len()
                ),
                "choose one by --groove (and --station), or write to files with -o",
            )),
        }
    }

    /// Section files, numbered where there are several.
    fn section_files(&self, solved: &[Solved]) -> Vec<(PathBuf, Vec<u8>)> {
        let Some(path) = self.section_target() else {
            return Vec::new();
        };
        let file = |(index, one): (usize, &Solved)| {
            let path = match solved.len() {
                1 => path.to_owned(),
                _ => numbered(path, index + 1),
            };
            (path, one.section_file().into_bytes())
        };
        solved.iter().enumerate().map(file).collect()
    }

    fn document<'a>(
        &'a self,
        reading: &'a InstrumentReading,
        solved: &'a [Solved],
    ) -> ReadingDocument<'a> {
        let shared = reading.shared_steps();
        let warnings = reading.shared_warnings();
        let (steps_before, warnings_before) = (shared.len(), warnings.len());
        ReadingDocument {
            schema: match self.kind {
                Kind::Trace => "etchwise-trace/1",
                Kind::Map => "etchwise-map/1",
                Kind::Image => "etchwise-image/1",
            },
            source: input::source_record(&reading.provenance),
            metadata: reading.metadata(),
            settings: &self.settings,
            steps: shared.into_iter().map(step_record).collect(),
            sections: solved
                .iter()
                .map(|one| one.record(steps_before, warnings_before))
                .collect(),
            warnings,
        }
    }
}

impl Solved {
    fn record(&self, steps_before: usize, warnings_before: usize) -> SectionRecord<'_> {
        let (section, warnings) = (&self.checked.section, &self.checked.warnings);
        let steps = section.intake.steps.iter().skip(steps_before);
        let reach = section.extras.reach.as_ref();
        SectionRecord {
            number: self.number,
            name: &self.name,
            outline: &self.checked.outline,
            measures: self.measures.clone(),
            conductance: self.conductance.clone(),
            reach_reason: reach.and_then(|reach| reach.reason.as_deref()),
            alternatives: self.alternatives.clone(),
            steps: steps.map(step_record).collect(),
            warnings: warnings.get(warnings_before..).unwrap_or_default(),
        }
    }

    /// The section as the text of a section file.
    fn section_file(&self) -> String {
        let section = &self.checked.section;
        to_toml(Some(&self.name), &section.outline, None, &section.extras)
    }

    /// Solves the section, the two of its reach, and the other assumptions.
    fn add_conductance(&mut self) -> Result<(), Failure> {
        let options = SolveOptions::default();
        let sections = Sections::new(&self.checked, None, options.goal.asked())?;
        let flow = sections.solve(&options)?.flow;
        let reach = sections.reach(&flow, &options)?;
        let within = reach.and_then(|reach| Some([reach.low()?, reach.high()?]));
        self.alternatives = alternatives(&self.checked.section, None, &flow, &options);
        self.conductance = Some(ConductanceRecord {
            value: flow.conductance,
            proven: flow
                .bracket
                .as_ref()
                .ok()
                .map(|proven| [proven.low, proven.high]),
            within_reach: within,
        });
        Ok(())
    }
}

/// A step for the outputs.
pub(super) fn step_record(step: &Step) -> StepRecord<'_> {
    StepRecord {
        what: step.what,
        text: &step.text,
        numbers: &step.numbers,
    }
}

/// The path with a number before its ending.
fn numbered(path: &Path, number: usize) -> PathBuf {
    let stem = path.file_stem().unwrap_or_default().to_string_lossy();
    let name = match path.extension() {
        Some(ending) => format!("{stem}-{number}.{}", ending.to_string_lossy()),
        None => format!("{stem}-{number}"),
    };
    path.with_file_name(name)
}
