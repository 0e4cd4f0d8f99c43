//! `etchwise route`: a channel along its length.

use std::path::{Path, PathBuf};

use clap::ArgMatches;

use crate::flow::{Drive, Fluid, Goal, SolveOptions, TemperatureLaw};
use crate::intake::{FileBranch, FileSection, MAX_SPREAD, MAX_STATIONS, RouteFile, read_route};
use crate::report::{
    self, PictureFormat, RouteCardError, RouteDocument, RouteSectionRecord, SourceRecord,
    check_targets,
};
use crate::study::{
    BranchDesign, Interpolation, Route, RouteDesign, RouteOperation, RouteOptions, RouteSection,
    SegmentDesign, StationDesign, route_spread, solve_route,
};
use crate::units;
use crate::warning::{Code, Warning};

use super::accuracy_options::solve_options;
use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input::{self, refuse_problems};
use super::output::{self, Format, Inputs};
use super::quantities::{fluid, positive, quantity, temperature_range};

/// Nodes of the field that is kept of every section for files.
const FIELD_NODES: usize = 120_000;

/// What was asked for, units applied, no file opened yet.
struct Request {
    file: PathBuf,
    most_stations: usize,
    spread: Option<f64>,
    least_between: usize,
    solve: SolveOptions,
    fluid: Option<Fluid>,
    drives: Vec<Drive>,
    format: Format,
    output: Option<PathBuf>,
    card: Option<PathBuf>,
    temperature_law: Option<TemperatureLaw>,
    vtk: Option<PathBuf>,
    pictures: Vec<(PathBuf, PictureFormat)>,
    quiet: bool,
    deny_warnings: bool,
}

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    super::set_threads(matches)?;
    let request = Request::new(matches)?;
    let file = read_route(&request.file, request.most_stations)?;
    request.check_targets(&file)?;
    let (design, warnings) = request.design(&file)?;
    let options = RouteOptions {
        solve: request.solve,
        field_nodes: request.vtk.as_ref().map(|_| FIELD_NODES),
        least_between: request.least_between,
        ..RouteOptions::default()
    };
    let route = solve_route(&design, &options)?;
    request.answer(&file, &design, &route, &warnings)
}

/// What drives the flow, in the order given.
fn drives(matches: &ArgMatches) -> Result<Vec<Drive>, Failure> {
    let drop = quantity(matches, "pressure-drop", units::parse_pressure)?;
    positive(matches, "pressure-drop", drop, "30kPa")?;
    if let Some(drop) = drop {
        return Ok(vec![Drive::PressureDrop(drop)]);
    }
    let mut found = Vec::new();
    for typed in matches
        .get_many::<String>("flow-rate")
        .into_iter()
        .flatten()
    {
        let rate = units::parse_flow_rate(typed).map_err(|e| Failure::option("flow-rate", &e))?;
        if !(rate.is_finite() && rate > 0.0) {
            return Err(Failure::usage(
                format!("--flow-rate: `{typed}` is not above zero"),
                "give a positive value, for example --flow-rate 5uL/min",
            ));
        }
        found.push(Drive::FlowRate(rate));
    }
    Ok(found)
}

impl Request {
    fn new(matches: &ArgMatches) -> Result<Self, Failure> {
        let fluid = fluid(matches)?;
        let drives = drives(matches)?;
        let card = matches.get_one::<PathBuf>("card").cloned();
        let vtk = output::vtk_prefix(matches)?;
        if fluid.is_none() && (!drives.is_empty() || card.is_some()) {
            return Err(Failure::usage(
                "a resistance needs a fluid",
                "add --fluid water --temperature 25C, or --viscosity (and --density)",
            ));
        }
        if vtk.is_some() && drives.is_empty() {
            return Err(Failure::usage(
                "--vtk shows a route at a flow, and none is given",
                "add a fluid and --flow-rate 5uL/min or --pressure-drop 30kPa",
            ));
        }
        let spread = quantity(matches, "spread", units::parse_fraction)?;
        if let Some(share) = spread.filter(|s| !(0.0..=MAX_SPREAD).contains(s)) {
            return Err(Failure::usage(
                format!("--spread: {share} is outside 0 to {MAX_SPREAD}"),
                "give a relative standard uncertainty, for example --spread 5%",
            ));
        }
        let temperature_law = match &fluid {
            Some(fluid) => {
                let range = temperature_range(matches, fluid)?;
                TemperatureLaw::of(fluid, range).ok()
            }
            None if matches.contains_id("temperature-range") => {
                return Err(Failure::usage(
                    "--temperature-range is for the card, and a card needs a fluid",
                    "add --fluid water --temperature 25C, or leave it out",
                ));
            }
            None => None,
        };
        Ok(Self {
            temperature_law,
            file: input::file(matches),
            most_stations: matches
                .get_one::<u32>("max-stations")
                .map_or(MAX_STATIONS, |&n| n as usize),
            spread,
            least_between: matches
                .get_one::<u8>("sections-between")
                .map_or(1, |&n| usize::from(n)),
            solve: solve_options(matches)?,
            fluid,
            drives,
            format: Format::of(matches),
            output: output::target(matches),
            card,
            vtk,
            pictures: output::pictures(matches, "picture")?,
            quiet: matches.get_flag("quiet"),
            deny_warnings: matches.get_flag("deny-warnings"),
        })
    }

    /// Files for viewers: fluid and wall of each flow rate, and the collection.
    fn vtk_files(&self, prefix: &Path) -> (Vec<[PathBuf; 2]>, PathBuf) {
        let with = |ending: &str| {
            let mut name = prefix.as_os_str().to_owned();
            name.push(ending);
            PathBuf::from(name)
        };
        let steps = (1..=self.drives.len()).map(|number| {
            let middle = if self.drives.len() > 1 {
                format!("-{number}")
            } else {
                String::new()
            };
            [
                with(&format!("{middle}.vtu")),
                with(&format!("{middle}.vtp")),
            ]
        });
        (steps.collect(), with(".pvd"))
    }

    /// Outputs that cannot be written, or would replace an input, are found before the solve.
    fn check_targets(&self, file: &RouteFile) -> Result<(), Failure> {
        let mut targets: Vec<PathBuf> = self.output.iter().chain(&self.card).cloned().collect();
        targets.extend(self.pictures.iter().map(|(path, _)| path.clone()));
        if let Some(prefix) = &self.vtk {
            let (steps, collection) = self.vtk_files(prefix);
            targets.extend(steps.into_iter().flatten());
            targets.push(collection);
        }
        let targets: Vec<&Path> = targets.iter().map(PathBuf::as_path).collect();
        Ok(check_targets(&targets, &self.inputs(file))?)
    }

    fn inputs<'a>(&'a self, file: &'a RouteFile) -> Vec<&'a Path> {
        std::iter::once(self.file.as_path())
            .chain(file.section_paths())
            .collect()
    }

    /// The route to solve; outlines with problems are refused.
    fn design(&self, file: &RouteFile) -> Result<(RouteDesign, Vec<Warning>), Failure> {
        let mut warnings = Vec::new();
        let mut sections = Vec::with_capacity(file.sections.len());
        for section in &file.sections {
            let label = section.label().to_owned();
            let name = format!("{}: section {label}", file.path);
            let advice = match section {
                FileSection::File { path, .. } => {
                    format!("; `etchwise check {}` lists all problems", path.display())
                }
                FileSection::Nominal { .. } => String::new(),
            };
            refuse_problems(section.outline(), &name, &advice)?;
            let (outline, dropped) = section.outline().clone().without_duplicate_vertices();
            if dropped > 0 {
                warnings.push(Warning {
                    code: Code::DuplicateVerticesRemoved,
                    message: format!(
                        "Section {label}: {dropped} vertices that repeat the one before were dropped"
                    ),
                    advice: "nothing to do: the outline is the same without them".to_owned(),
                    numbers: vec![("vertices", dropped as f64)],
                });
            }
            if let FileSection::File { section, .. } = section {
                warnings.extend(section.warnings.iter().map(|w| Warning {
                    message: format!("Section {label}: {}", w.message),
                    ..w.clone()
                }));
            }
            sections.push(RouteSection {
                label,
                outline,
                nominal: section.nominal().cloned(),
            });
        }
        let segments = file.segments.iter().map(|segment| SegmentDesign {
            name: segment.name.clone(),
            branches: segment.branches.iter().map(|b| self.branch(b)).collect(),
        });
        let design = RouteDesign {
            segments: segments.collect(),
            sections,
        };
        Ok((design, warnings))
    }

    fn branch(&self, branch: &FileBranch) -> BranchDesign {
        let word = branch.interpolation.as_deref();
        let stations = branch.stations.iter().map(|station| StationDesign {
            position: station.at,
            section: station.section,
        });
        BranchDesign {
            name: branch.name.clone(),
            count: branch.count,
            // The reader lets known words pass only; a test below holds the two lists together.
            interpolation: word.and_then(Interpolation::from_word).unwrap_or_default(),
            spread: branch.spread.or(self.spread),
            stations: stations.collect(),
        }
    }

    fn answer(
        &self,
        file: &RouteFile,
        design: &RouteDesign,
        route: &Route,
        warnings: &[Warning],
    ) -> Result<ExitStatus, Failure> {
        let mut operations = Vec::new();
        if let Some(fluid) = &self.fluid {
            for &drive in &self.drives {
                operations.push(RouteOperation::new(route, fluid, drive)?);
            }
        }
        let spread = route_spread(route);
        let stem = self
            .file
            .file_stem()
            .map(|s| s.to_string_lossy().into_owned());
        let name = file.name.clone().or(stem).unwrap_or_default();
        let sections: Vec<RouteSectionRecord> = file.sections.iter().map(record).collect();
        let settings = self.settings();
        let document = RouteDocument {
            source: Some(SourceRecord {
                path: &file.path,
                sha256: &file.sha256,
                kind: "route",
                notes: &[],
            }),
            name: &name,
            design,
            sections: &sections,
            route,
            fluid: self.fluid.as_ref(),
            temperature_law: self.temperature_law.as_ref(),
            operations: &operations,
            spread: spread.as_ref(),
            settings: &settings,
            warnings,
        };
        let files = self.files(&document)?;
        let text = match &self.format {
            Format::Text(options) => report::route_text(&document, *options),
            Format::Json => report::route_json(&document).map_err(Failure::not_printed)?,
            Format::Csv(locale) => output::in_locale(report::route_csv(&document), *locale)?,
        };
        let inputs = Inputs {
            files: &self.inputs(file),
            quiet: self.quiet,
        };
        output::deliver(files, text, self.output.as_deref(), &inputs)?;
        Ok(self.status(&document))
    }

    fn status(&self, document: &RouteDocument<'_>) -> ExitStatus {
        let all = document.all_warnings();
        let is_warned = all.iter().any(|warning| warning.code != Code::Caution);
        let is_invalid = self.fluid.as_ref().is_some_and(|fluid| {
            let mut operations = document.operations.iter();
            operations.any(|o| o.is_outside_validity(document.route, fluid))
        });
        if !document.route.is_converged() {
            ExitStatus::NotSolved
        } else if is_invalid {
            ExitStatus::OutsideValidity
        } else if self.deny_warnings && is_warned {
            ExitStatus::OutsideLimit
        } else {
            ExitStatus::Done
        }
    }

    /// Settings that hold, for whoever repeats the run.
    fn settings(&self) -> Vec<(&'static str, String)> {
        let grid = match (self.solve.cells_across, self.solve.goal) {
            (Some(cells), _) => format!("{cells} cells across"),
            (None, Goal::Estimated(tolerance)) => format!("estimated error of K {tolerance:e}"),
            (None, Goal::Proven(tolerance)) => format!("proven relative width of K {tolerance:e}"),
        };
        let spread = self.spread.map_or("none".to_owned(), |s| s.to_string());
        vec![("accuracy", grid), ("spread", spread)]
    }

    fn files(&self, document: &RouteDocument<'_>) -> Result<Vec<(PathBuf, Vec<u8>)>, Failure> {
        let mut files = Vec::new();
        if let Some(path) = &self.card {
            let card = report::route_card_json(document).map_err(|error| match error {
                RouteCardError::NoFluid => Failure::usage(&error, "add --fluid or --viscosity"),
                _ => Failure::not_printed(error),
            })?;
            files.push((path.clone(), card.into_bytes()));
        }
        for (path, format) in &self.pictures {
            files.push((path.clone(), report::route_picture(document, *format)?));
        }
        let Some(prefix) = &self.vtk else {
            return Ok(files);
        };
        let (steps, collection) = self.vtk_files(prefix);
        let mut listed = Vec::new();
        let name = |path: &Path| {
            path.file_name()
                .map_or_else(String::new, |n| n.to_string_lossy().into_owned())
        };
        for (operation, [fluid, wall]) in document.operations.iter().zip(steps) {
            listed.push((operation.flow_rate, name(&fluid), name(&wall)));
            files.push((fluid, report::route_vtu(document, operation)?.into_bytes()));
            files.push((
                wall,
                report::route_wall_vtp(document, operation)?.into_bytes(),
            ));
        }
        files.push((collection, report::route_pvd(&listed).into_bytes()));
        Ok(files)
    }
}

/// Where a section came from.
fn record(section: &FileSection) -> RouteSectionRecord {
    RouteSectionRecord {
        label: section.label().to_owned(),
        sha256: match section {
            FileSection::File { section, .. } => Some(section.provenance.sha256.clone()),
            FileSection::Nominal { .. } => None,
        },
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_reader_and_the_study_know_the_same_words() {
        let words = Interpolation::ALL.map(Interpolation::word);
        assert_eq!(words, crate::intake::INTERPOLATION_WORDS);
    }
}
