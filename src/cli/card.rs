//! `etchwise card`: coefficients of sections for a network model.

use std::path::{Path, PathBuf};

use clap::ArgMatches;

use crate::flow::{Fluid, SectionFlow, SolveOptions, WallReport, validity_warnings};
use crate::geometry::Film;
use crate::intake::ReadOptions;
use crate::report::{
    self, CARD_JSON_SCHEMA, CardDocument, CardRecord, FailedCard, ReachRecord, check_targets,
};
use crate::study::{
    CardRequest, Reach, SectionCard, SensitivityOptions, Stated, StatedUncertainty,
    sensitivity_study,
};
use crate::units;
use crate::warning::{Code, Warning};

use super::accuracy_options::solve_options;
use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input::{self, CheckedSection, checked_section, read_options};
use super::instrument_options::{say_settings, typed};
use super::output::{self, Format, Inputs};
use super::quantities::{fluid, temperature_range};
use super::response;
use super::sections::{Sections, film};

/// Options that mean nothing without `--vary`.
const ONLY_WITH_VARY: [&str; 4] = ["with", "fit-error", "fresh-points", "picture"];

/// What was asked for, no file opened yet.
struct Request {
    files: Vec<PathBuf>,
    read: ReadOptions,
    solve: SolveOptions,
    film: Option<Film>,
    fluid: Fluid,
    temperatures: [f64; 2],
    uncertainties: Vec<StatedUncertainty>,
    settings: Vec<(String, String)>,
    format: Format,
    output: Option<PathBuf>,
    modelica: Option<PathBuf>,
    quiet: bool,
    deny_warnings: bool,
}

/// A card with all that its outputs borrow.
struct Made {
    name: String,
    checked: CheckedSection,
    flow: SectionFlow,
    reach: Option<Reach>,
    card: SectionCard,
    warnings: Vec<Warning>,
    notes: Vec<String>,
}

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    if matches.get_flag("print-schema") {
        output::print(CARD_JSON_SCHEMA)?;
        return Ok(ExitStatus::Done);
    }
    if matches.contains_id("vary") {
        return response::run(matches);
    }
    if let Some(name) = ONLY_WITH_VARY
        .into_iter()
        .find(|name| typed(matches, name).is_some())
    {
        return Err(Failure::usage(
            format!("--{name} is for response tables"),
            "add --vary NAME=LOW..HIGH, or leave it out",
        ));
    }
    super::set_threads(matches)?;
    let request = Request::new(matches)?;
    request.check_targets()?;
    say_settings(matches);
    let mut made = Vec::new();
    let mut failed = Vec::new();
    for file in &request.files {
        match request.made(file) {
            Ok(card) => made.push(card),
            // One file alone: its error is the answer.
            Err(failure) if request.files.len() == 1 => return Err(failure),
            Err(failure) => {
                failure.print();
                failed.push((file.display().to_string(), failure));
            }
        }
    }
    match failed.first() {
        // Nothing to hand over, so nothing is written.
        Some((_, failure)) if made.is_empty() => Ok(failure.status),
        _ => request.answer(&made, &failed),
    }
}

impl Request {
    fn new(matches: &ArgMatches) -> Result<Self, Failure> {
        let Some(fluid) = fluid(matches)? else {
            return Err(Failure::usage(
                "a card needs a fluid: a network model wants resistances",
                "add --fluid water --temperature 25C, or --viscosity (and --density)",
            ));
        };
        let files: Vec<PathBuf> = matches
            .get_many::<PathBuf>("file")
            .into_iter()
            .flatten()
            .cloned()
            .collect();
        let standard_inputs = files.iter().filter(|f| f.as_path() == Path::new("-"));
        if standard_inputs.count() > 1 {
            return Err(Failure::usage(
                "standard input (-) is named more than once",
                "name it once; each section needs a file of its own",
            ));
        }
        Ok(Self {
            read: read_options(matches)?,
            solve: solve_options(matches)?,
            film: film(matches)?,
            temperatures: temperature_range(matches, &fluid)?,
            uncertainties: uncertainties(matches)?,
            settings: settings(matches),
            format: Format::of(matches),
            output: output::target(matches),
            modelica: matches.get_one::<PathBuf>("modelica").cloned(),
            quiet: matches.get_flag("quiet"),
            deny_warnings: matches.get_flag("deny-warnings"),
            files,
            fluid,
        })
    }

    /// Every file that is read.
    fn files_read(&self) -> Vec<&Path> {
        let files = self.files.iter();
        files
            .flat_map(|file| input::files_read(file, &self.read))
            .collect()
    }

    /// Outputs that cannot be written are found before the solves.
    fn check_targets(&self) -> Result<(), Failure> {
        let targets: Vec<&Path> = self
            .output
            .as_deref()
            .into_iter()
            .chain(self.modelica.as_deref())
            .collect();
        Ok(check_targets(&targets, &self.files_read())?)
    }

    /// Reads and solves one section.
    fn made(&self, file: &Path) -> Result<Made, Failure> {
        let checked = checked_section(file, &self.read)?;
        let sections = Sections::new(&checked, self.film.as_ref(), self.solve.goal.asked())?;
        let solved = sections.solve_for_walls(&self.solve)?;
        let reach = sections.reach(&solved.flow, &self.solve)?;
        // Named stretches are places on the wall without the film.
        let named = match &sections.film {
            Some(_) => &[][..],
            None => &checked.section.walls[..],
        };
        let walls = WallReport::new(solved.outline(), &solved.flow.wall_shear.curve, named);
        let study = sensitivity_study(&solved, named, SensitivityOptions::default());
        let asked = CardRequest {
            fluid: &self.fluid,
            temperatures: self.temperatures,
            uncertainties: &self.uncertainties,
        };
        let card = SectionCard::new(&solved.flow, &walls.whole, &study, &asked)
            .map_err(|error| Failure::usage(&error, &error.hint()))?;
        let mut warnings = checked.warnings.clone();
        warnings.extend(study.warnings);
        warnings.extend(validity_warnings(&solved.flow, &self.fluid, None));
        let mut notes = checked.section.provenance.notes.clone();
        if let Some(film) = &sections.film {
            notes.push(format!(
                "with a film of {} m on {}",
                film.film.thickness,
                film.film.on.word()
            ));
        }
        Ok(Made {
            name: input::section_name(&checked.section, file),
            flow: solved.flow,
            checked,
            reach,
            card,
            warnings,
            notes,
        })
    }

    fn answer(&self, made: &[Made], failed: &[(String, Failure)]) -> Result<ExitStatus, Failure> {
        let cards: Vec<CardRecord<'_>> = made.iter().map(|one| self.record(one)).collect();
        let failures: Vec<FailedCard<'_>> = failed
            .iter()
            .map(|(path, failure)| FailedCard {
                path,
                reason: &failure.text,
            })
            .collect();
        let document = CardDocument {
            cards: &cards,
            failed: &failures,
            settings: &self.settings,
        };
        let mut files = Vec::new();
        if let Some(path) = &self.modelica {
            files.push((path.clone(), report::card_modelica(&document).into_bytes()));
        }
        let text = match &self.format {
            Format::Text(options) => report::card_text(&document, *options),
            Format::Json => report::card_json(&document).map_err(Failure::not_printed)?,
            Format::Csv(locale) => output::in_locale(report::card_csv(&document), *locale)?,
        };
        let inputs = Inputs {
            files: &self.files_read(),
            quiet: self.quiet,
        };
        output::deliver(files, text, self.output.as_deref(), &inputs)?;
        Ok(self.status(&cards, failed))
    }

    fn record<'a>(&'a self, made: &'a Made) -> CardRecord<'a> {
        let section = &made.checked.section;
        let mut source = input::source_record(&section.provenance);
        source.notes = &made.notes;
        let reason = section.extras.reach.as_ref();
        CardRecord {
            name: &made.name,
            source: Some(source),
            fluid: &self.fluid,
            flow: &made.flow,
            reach: made.reach.as_ref().map(|reach| ReachRecord {
                reach,
                reason: reason.and_then(|r| r.reason.as_deref()),
            }),
            card: &made.card,
            warnings: &made.warnings,
        }
    }

    fn status(&self, cards: &[CardRecord<'_>], failed: &[(String, Failure)]) -> ExitStatus {
        if let Some((_, failure)) = failed.first() {
            return failure.status;
        }
        let is_short = |card: &CardRecord<'_>| {
            let has_reach = card.reach.is_none_or(|record| record.reach.is_converged());
            !(card.flow.solver.converged && card.flow.accuracy.is_met && has_reach)
        };
        if cards.iter().any(is_short) {
            return ExitStatus::NotSolved;
        }
        let mut warned = cards.iter().flat_map(CardRecord::all_warnings);
        if self.deny_warnings && warned.any(|warning| warning.code != Code::Caution) {
            return ExitStatus::OutsideLimit;
        }
        ExitStatus::Done
    }
}

/// The uncertainties as typed, each input once.
fn uncertainties(matches: &ArgMatches) -> Result<Vec<StatedUncertainty>, Failure> {
    let mut found: Vec<StatedUncertainty> = Vec::new();
    for text in matches
        .get_many::<String>("uncertainty")
        .into_iter()
        .flatten()
    {
        let refuse = |why: &str| {
            Failure::usage(
                format!("--uncertainty: `{text}` {why}"),
                "write for example --uncertainty depth=0.3um, or scale=0.5%",
            )
        };
        let Some((input, value)) = text.rsplit_once('=') else {
            return Err(refuse("has no `=`"));
        };
        let (input, value) = (input.trim(), value.trim());
        let stated = stated(value).ok_or_else(|| {
            refuse("is neither a length, nor a share in %, nor an angle, with its unit")
        })?;
        let (Stated::Relative(size) | Stated::Length(size) | Stated::Angle(size)) = stated;
        if !(size.is_finite() && size > 0.0) {
            return Err(refuse("is not above zero"));
        }
        if found.iter().any(|other| other.input == input) {
            return Err(refuse("comes a second time"));
        }
        found.push(StatedUncertainty {
            input: input.to_owned(),
            value: stated,
        });
    }
    Ok(found)
}

/// A value by its unit; a bare number has none.
fn stated(text: &str) -> Option<Stated> {
    let has_unit = text
        .chars()
        .last()
        .is_some_and(|c| !c.is_ascii_digit() && c != '.');
    if !has_unit {
        return None;
    }
    let length = units::parse_length(text).ok().map(Stated::Length);
    length
        .or_else(|| units::parse_angle(text).ok().map(Stated::Angle))
        .or_else(|| units::parse_fraction(text).ok().map(Stated::Relative))
}

/// What was typed, as the card keeps it; where outputs go is no setting.
fn settings(matches: &ArgMatches) -> Vec<(String, String)> {
    let of_output = [
        "file",
        "output",
        "modelica",
        "json",
        "csv",
        "csv-locale",
        "threads",
        "quiet",
        "verbose",
        "ascii",
    ];
    let names = matches.ids().map(clap::Id::as_str);
    names
        .filter(|name| !of_output.contains(name))
        .filter_map(|name| Some((format!("--{name}"), typed(matches, name)?)))
        .collect()
}
