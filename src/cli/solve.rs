//! `etchwise solve`: the main job.

use std::path::{Path, PathBuf};

use clap::ArgMatches;

use crate::flow::{
    Drive, Fluid, OperatingPoint, ShortcutRow, SolveOptions, SolvedSection, WallReport,
    outside_validity, shortcuts, validity_warnings,
};
use crate::geometry::Film;
use crate::intake::ReadOptions;
use crate::report::{
    self, AlternativeRecord, CsvLocale, PictureFormat, ReachRecord, SolveDocument, SourceRecord,
    check_targets, legacy_vtk_path, vtk_paths,
};
use crate::study::Reach;
use crate::units;
use crate::warning::Code;

use super::accuracy_options::solve_options;
use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input::{self, CheckedSection, checked_section, read_options};
use super::instrument_options::say_settings;
use super::output::{self, Format, Inputs};
use super::quantities::{fluid, positive, quantity};
use super::reading::step_record;
use super::sections::{Sections, alternatives, film};

/// Nodes of an exported field, about: above that the field is thinned and a warning says so.
const FIELD_NODES: usize = 16_000_000;
/// Nodes of the field behind a picture.
const PICTURE_NODES: usize = 1_500_000;
/// What was asked for, units applied, no file opened yet.
struct Request {
    file: PathBuf,
    read: ReadOptions,
    film: Option<Film>,
    solve: SolveOptions,
    fluid: Option<Fluid>,
    length: Option<f64>,
    drive: Option<Drive>,
    shortcuts: bool,
    format: Format,
    output: Option<PathBuf>,
    vtk: Option<VtkRequest>,
    pictures: Vec<(PathBuf, PictureFormat)>,
    wall_csv: Option<PathBuf>,
    csv_locale: CsvLocale,
    wall_pictures: Vec<(PathBuf, PictureFormat)>,
    quiet: bool,
    deny_warnings: bool,
}

/// Field and wall files.
struct VtkRequest {
    prefix: PathBuf,
    /// Also the old format.
    is_legacy: bool,
}

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    super::set_threads(matches)?;
    let request = Request::new(matches)?;
    request.check_targets()?;
    let checked = checked_section(&request.file, &request.read)?;
    let tolerance = request.solve.goal.asked();
    let sections = Sections::new(&checked, request.film.as_ref(), tolerance)?;
    let solved = sections.solve(&request.solve)?;
    if matches.get_flag("trace") {
        output::talk(&report::cost_text(solved.cost()));
    }
    let reach = sections.reach(&solved.flow, &request.solve)?;
    say_settings(matches);
    let film = request.film.as_ref();
    let others = alternatives(&checked.section, film, &solved.flow, &request.solve);
    request.answer(&checked, &sections, &solved, reach.as_ref(), &others)
}

/// Field and wall files, if they are asked for.
fn vtk(matches: &ArgMatches) -> Result<Option<VtkRequest>, Failure> {
    Ok(output::vtk_prefix(matches)?.map(|prefix| VtkRequest {
        prefix,
        is_legacy: matches.get_flag("legacy-vtk"),
    }))
}

impl VtkRequest {
    /// Where the field in the old format goes, when it is asked for.
    fn legacy_path(&self) -> Option<PathBuf> {
        self.is_legacy.then(|| legacy_vtk_path(&self.prefix))
    }

    /// All files.
    fn paths(&self) -> impl Iterator<Item = PathBuf> {
        vtk_paths(&self.prefix)
            .into_iter()
            .chain(self.legacy_path())
    }
}

impl Request {
    fn new(matches: &ArgMatches) -> Result<Self, Failure> {
        let length = quantity(matches, "length", units::parse_length)?;
        let drop = quantity(matches, "pressure-drop", units::parse_pressure)?;
        let flow_rate = quantity(matches, "flow-rate", units::parse_flow_rate)?;
        let drive = drop
            .map(Drive::PressureDrop)
            .or(flow_rate.map(Drive::FlowRate));
        let fluid = fluid(matches)?;
        positive(matches, "length", length, "20mm")?;
        positive(matches, "pressure-drop", drop, "30kPa")?;
        positive(matches, "flow-rate", flow_rate, "5uL/min")?;
        if drive.is_some() && length.is_none() {
            return Err(Failure::usage(
                "an operating point needs the length of the channel",
                "add --length, for example --length 20mm",
            ));
        }
        if (drive.is_some() || length.is_some()) && fluid.is_none() {
            return Err(Failure::usage(
                "a resistance needs a fluid",
                "add --fluid water --temperature 25C, or --viscosity (and --density)",
            ));
        }
        Ok(Self {
            file: input::file(matches),
            read: read_options(matches)?,
            solve: solve_options(matches)?,
            film: film(matches)?,
            fluid,
            length,
            drive,
            shortcuts: matches.get_flag("shortcuts"),
            format: Format::of(matches),
            output: output::target(matches),
            vtk: vtk(matches)?,
            pictures: output::pictures(matches, "picture")?,
            wall_csv: matches.get_one::<PathBuf>("wall-csv").cloned(),
            csv_locale: output::csv_locale(matches),
            wall_pictures: output::pictures(matches, "wall-picture")?,
            quiet: matches.get_flag("quiet"),
            deny_warnings: matches.get_flag("deny-warnings"),
        })
    }

    /// Outputs that cannot be written are found before the solve.
    fn check_targets(&self) -> Result<(), Failure> {
        let vtk = self.vtk.iter().flat_map(VtkRequest::paths);
        let pictures = self.pictures.iter().chain(&self.wall_pictures);
        let pictures = pictures
            .map(|(path, _)| path.clone())
            .chain(self.wall_csv.clone());
        let targets: Vec<PathBuf> = self
            .output
            .clone()
            .into_iter()
            .chain(vtk)
            .chain(pictures)
            .collect();
        let targets: Vec<&Path> = targets.iter().map(PathBuf::as_path).collect();
        Ok(check_targets(
            &targets,
            &input::files_read(&self.file, &self.read),
        )?)
    }

    fn answer(
        &self,
        checked: &CheckedSection,
        sections: &Sections,
        solved: &SolvedSection,
        reach: Option<&Reach>,
        alternatives: &[AlternativeRecord],
    ) -> Result<ExitStatus, Failure> {
        let flow = &solved.flow;
        let fluid = self.fluid.as_ref();
        let point = match (fluid, self.length, self.drive) {
            (Some(fluid), Some(length), Some(drive)) => {
                Some(OperatingPoint::new(flow, fluid, length, drive)?)
            }
            _ => None,
        };
        let rows: Option<Vec<ShortcutRow>> = self
            .shortcuts
            .then(|| shortcuts(&sections.outline, flow.conductance.value));
        // Named stretches are places on the wall without the film.
        let named = match &sections.film {
            Some(_) => &[][..],
            None => &checked.section.walls[..],
        };
        let walls = WallReport::new(solved.outline(), &flow.wall_shear.curve, named);
        let mut warnings = checked.warnings.clone();
        if let Some(fluid) = fluid {
            warnings.extend(validity_warnings(flow, fluid, point.as_ref()));
        }
        let provenance = &checked.section.provenance;
        let mut notes = provenance.notes.clone();
        if sections.film.is_some() && !checked.section.walls.is_empty() {
            notes.push(
                "the named walls belong to the section without the film; walls go by direction"
                    .to_owned(),
            );
        }
        let name = input::section_name(&checked.section, &self.file);
        let given = checked.section.extras.reach.as_ref();
        let reason = given.and_then(|reach| reach.reason.as_deref());
        let steps: Vec<_> = checked
            .section
            .intake
            .steps
            .iter()
            .map(step_record)
            .collect();
        let document = SolveDocument {
            source: Some(SourceRecord {
                notes: &notes,
                ..input::source_record(provenance)
            }),
            section_name: &name,
            film: sections.film.as_ref(),
            flow,
            reach: reach.map(|reach| ReachRecord { reach, reason }),
            fluid,
            length: self.length,
            operating_point: point.as_ref(),
            walls: Some(&walls),
            shortcuts: rows.as_deref(),
            warnings: &warnings,
            steps: &steps,
            alternatives,
        };
        self.deliver(&document, solved)?;
        let denied = self.deny_warnings
            && document
                .all_warnings()
                .iter()
                .any(|warning| warning.code != Code::Caution);
        let invalid = fluid
            .zip(point.as_ref())
            .is_some_and(|(fluid, point)| outside_validity(flow, fluid, point));
        let is_solved =
            flow.solver.converged && flow.accuracy.is_met && reach.is_none_or(Reach::is_converged);
        Ok(if !is_solved {
            ExitStatus::NotSolved
        } else if invalid {
            ExitStatus::OutsideValidity
        } else if denied {
            ExitStatus::OutsideLimit
        } else {
            ExitStatus::Done
        })
    }

    fn deliver(&self, document: &SolveDocument, solved: &SolvedSection) -> Result<(), Failure> {
        let mut files: Vec<(PathBuf, Vec<u8>)> = Vec::new();
        if let Some(request) = &self.vtk {
            let field = solved.dense_field(FIELD_NODES);
            if field.stride > 1 {
                output::talk(&format!(
                    "warning: the field is thinned to every {}th grid line to keep the file in bounds",
                    field.stride
                ));
            }
            let [vti, vtp] = vtk_paths(&request.prefix);
            files.push((vti, report::field_vti(document, &field)?.into_bytes()));
            files.push((vtp, report::wall_vtp(document)?.into_bytes()));
            if let Some(path) = request.legacy_path() {
                let text = report::field_legacy_vtk(document, &field)?;
                files.push((path, text.into_bytes()));
            }
        }
        if !self.pictures.is_empty() {
            let field = solved.dense_field(PICTURE_NODES);
            let outline = solved.outline();
            for (path, format) in &self.pictures {
                let bytes = report::picture_bytes(document, outline, &field, *format)?;
                files.push((path.clone(), bytes));
            }
        }
        self.add_wall_files(document, &mut files)?;
        let text = self.main_output(document)?;
        let inputs = Inputs {
            files: &input::files_read(&self.file, &self.read),
            quiet: self.quiet,
        };
        output::deliver(files, text, self.output.as_deref(), &inputs)
    }

    /// The wall shear as a table and as pictures.
    fn add_wall_files(
        &self,
        document: &SolveDocument,
        files: &mut Vec<(PathBuf, Vec<u8>)>,
    ) -> Result<(), Failure> {
        if let Some(path) = &self.wall_csv {
            let text = output::in_locale(report::wall_csv(document), self.csv_locale)?;
            files.push((path.clone(), text.into_bytes()));
        }
        for (path, format) in &self.wall_pictures {
            if let Some(walls) = document.walls {
                let bytes = report::wall_picture_bytes(document, walls, *format)?;
                files.push((path.clone(), bytes));
            }
        }
        Ok(())
    }

    fn main_output(&self, document: &SolveDocument) -> Result<String, Failure> {
        match &self.format {
            Format::Text(options) => Ok(report::to_text(document, *options)),
            Format::Json => report::to_json(document).map_err(Failure::not_printed),
            Format::Csv(locale) => output::in_locale(report::to_csv(&[*document]), *locale),
        }
    }
}
