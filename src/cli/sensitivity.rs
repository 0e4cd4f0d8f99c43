//! `etchwise sensitivity`: what small changes of the wall do.

use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use clap::ArgMatches;

use crate::flow::{SolveOptions, SolvedSection, WallReport};
use crate::intake::ReadOptions;
use crate::report::{
    self, PictureFormat, SensitivityDocument, SolveDocument, check_targets, vtk_paths,
};
use crate::study::{SensitivityOptions, sensitivity_study, solve_for_sensitivity};
use crate::warning::Code;

use super::accuracy_options::solve_options;
use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input::{self, CheckedSection, checked_section, read_options};
use super::instrument_options::say_settings;
use super::output::{self, Format, Inputs};

/// What was asked for, no file opened yet.
struct Request {
    file: PathBuf,
    read: ReadOptions,
    solve: SolveOptions,
    study: SensitivityOptions,
    format: Format,
    output: Option<PathBuf>,
    wall: Option<PathBuf>,
    pictures: Vec<(PathBuf, PictureFormat)>,
    quiet: bool,
    deny_warnings: bool,
}

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    super::set_threads(matches)?;
    let request = Request::new(matches)?;
    request.check_targets()?;
    let checked = checked_section(&request.file, &request.read)?;
    say_settings(matches);
    let until = request.until(Instant::now());
    let solved = solve_for_sensitivity(&checked.outline, &request.solve)?;
    request.answer(&checked, &solved, until)
}

impl Request {
    fn new(matches: &ArgMatches) -> Result<Self, Failure> {
        Ok(Self {
            file: input::file(matches),
            read: read_options(matches)?,
            solve: solve_options(matches)?,
            study: SensitivityOptions {
                check: !matches.get_flag("no-check"),
                until: None,
            },
            format: Format::of(matches),
            output: output::target(matches),
            wall: output::vtk_prefix(matches)?.map(|prefix| {
                let [_, wall] = vtk_paths(&prefix);
                wall
            }),
            pictures: output::pictures(matches, "picture")?,
            quiet: matches.get_flag("quiet"),
            deny_warnings: matches.get_flag("deny-warnings"),
        })
    }

    /// Outputs that cannot be written are found before the solve.
    fn check_targets(&self) -> Result<(), Failure> {
        let pictures = self.pictures.iter().map(|(path, _)| path.as_path());
        let targets: Vec<&Path> = self
            .output
            .as_deref()
            .into_iter()
            .chain(self.wall.as_deref())
            .chain(pictures)
            .collect();
        Ok(check_targets(
            &targets,
            &input::files_read(&self.file, &self.read),
        )?)
    }

    /// When the time allowed ends; `None` for no limit, as for one beyond what clocks count.
    fn until(&self, start: Instant) -> Option<Instant> {
        let allowed = Duration::try_from_secs_f64(self.solve.time_limit?).ok()?;
        start.checked_add(allowed)
    }

    fn answer(
        &self,
        checked: &CheckedSection,
        solved: &SolvedSection,
        until: Option<Instant>,
    ) -> Result<ExitStatus, Failure> {
        let options = SensitivityOptions {
            until,
            ..self.study
        };
        let study = sensitivity_study(solved, &checked.section.walls, options);
        let name = input::section_name(&checked.section, &self.file);
        let document = SensitivityDocument {
            source: Some(input::source_record(&checked.section.provenance)),
            section_name: &name,
            flow: &solved.flow,
            study: &study,
            warnings: &checked.warnings,
        };
        let mut files = Vec::new();
        if let Some(path) = &self.wall {
            let curve = &solved.flow.wall_shear.curve;
            let walls = WallReport::new(solved.outline(), curve, &checked.section.walls);
            let solve = SolveDocument {
                walls: Some(&walls),
                ..SolveDocument::new(&name, &solved.flow)
            };
            files.push((path.clone(), report::wall_vtp(&solve)?.into_bytes()));
        }
        for (path, format) in &self.pictures {
            let bytes = report::sensitivity_picture(&document, solved.outline(), *format)?;
            files.push((path.clone(), bytes));
        }
        let text = match &self.format {
            Format::Text(options) => report::sensitivity_text(&document, *options),
            Format::Json => report::sensitivity_json(&document).map_err(Failure::not_printed)?,
            Format::Csv(locale) => output::in_locale(report::sensitivity_csv(&document), *locale)?,
        };
        let inputs = Inputs {
            files: &input::files_read(&self.file, &self.read),
            quiet: self.quiet,
        };
        output::deliver(files, text, self.output.as_deref(), &inputs)?;
        let is_warned = document
            .all_warnings()
            .iter()
            .any(|warning| warning.code != Code::Caution);
        let flow = &solved.flow;
        Ok(if !(flow.solver.converged && flow.accuracy.is_met) {
            ExitStatus::NotSolved
        } else if self.deny_warnings && is_warned {
            ExitStatus::OutsideLimit
        } else {
            ExitStatus::Done
        })
    }
}
