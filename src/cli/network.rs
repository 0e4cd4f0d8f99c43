//! `etchwise network`: pressures and flows of a net of cards.

use std::path::{Path, PathBuf};

use clap::ArgMatches;

use crate::flow::TemperatureLaw;
use crate::intake::{
    CardContent, CardKind, NetworkFile, NetworkFileCard, NetworkFileCondition, read_network,
};
use crate::report::{
    self, NETWORK_JSON_SCHEMA, NetworkCardRecord, NetworkDocument, SourceRecord, check_targets,
};
use crate::study::{
    CardExtent, FEWEST_SAMPLES, NetCard, NetCardLimits, NetChannel, NetNode, Network, NetworkError,
    NodeCondition, SampleOptions,
};
use crate::warning::Code;

use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input;
use super::output::{self, Format, Inputs};

/// Seed where none is typed.
const SEED: u64 = 1;

/// What was asked for, no file opened yet.
struct Request {
    file: PathBuf,
    samples: SampleOptions,
    format: Format,
    output: Option<PathBuf>,
    nodes_csv: Option<PathBuf>,
    locale: report::CsvLocale,
    quiet: bool,
    deny_warnings: bool,
}

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    if matches.get_flag("print-schema") {
        output::print(NETWORK_JSON_SCHEMA)?;
        return Ok(ExitStatus::Done);
    }
    super::set_threads(matches)?;
    let request = Request::new(matches)?;
    request.check_targets(&[&request.file])?;
    let file = read_network(&request.file)?;
    let mut inputs: Vec<&Path> = vec![&request.file];
    inputs.extend(file.cards.iter().map(|card| card.path.as_path()));
    request.check_targets(&inputs)?;
    request.solve(&file, &inputs)
}

impl Request {
    fn new(matches: &ArgMatches) -> Result<Self, Failure> {
        let count = matches.get_one::<u32>("samples").map(|&n| n as usize);
        if let Some(count) = count.filter(|&n| n > 0 && n < FEWEST_SAMPLES) {
            return Err(Failure::usage(
                format!("--samples {count}: fewer than {FEWEST_SAMPLES} samples say nothing"),
                "use --samples 0 for none, or 10 and more",
            ));
        }
        Ok(Self {
            file: input::file(matches),
            samples: SampleOptions {
                count,
                seed: matches.get_one::<u64>("seed").copied().unwrap_or(SEED),
            },
            format: Format::of(matches),
            output: output::target(matches),
            nodes_csv: matches.get_one::<PathBuf>("nodes-csv").cloned(),
            locale: output::csv_locale(matches),
            quiet: matches.get_flag("quiet"),
            deny_warnings: matches.get_flag("deny-warnings"),
        })
    }

    /// Outputs that cannot be written, or would overwrite an input, are found before the solve.
    fn check_targets(&self, inputs: &[&Path]) -> Result<(), Failure> {
        let targets: Vec<&Path> = self
            .output
            .as_deref()
            .into_iter()
            .chain(self.nodes_csv.as_deref())
            .collect();
        Ok(check_targets(&targets, inputs)?)
    }

    fn solve(&self, file: &NetworkFile, inputs: &[&Path]) -> Result<ExitStatus, Failure> {
        let network = network(file, &self.file);
        let solution = network.solve().map_err(|error| not_solved(&error, file))?;
        let uncertainty = network.uncertainty(&solution, self.samples);
        let paths: Vec<String> = file
            .cards
            .iter()
            .map(|card| card.path.display().to_string())
            .collect();
        let cards: Vec<NetworkCardRecord<'_>> = file
            .cards
            .iter()
            .zip(&paths)
            .map(|(card, path)| NetworkCardRecord {
                path,
                sha256: &card.sha256,
                card_name: &card.content.name,
                warnings: &card.content.warnings,
            })
            .collect();
        let document = NetworkDocument {
            network: &network,
            solution: &solution,
            uncertainty: uncertainty.as_ref(),
            source: SourceRecord {
                path: &file.path,
                sha256: &file.sha256,
                kind: "net",
                notes: &[],
            },
            cards: &cards,
        };
        self.deliver(&document, inputs)?;
        Ok(self.status(&document))
    }

    fn deliver(&self, document: &NetworkDocument<'_>, inputs: &[&Path]) -> Result<(), Failure> {
        let mut files = Vec::new();
        if let Some(path) = &self.nodes_csv {
            let table = output::in_locale(report::network_nodes_csv(document), self.locale)?;
            files.push((path.clone(), table.into_bytes()));
        }
        let text = match &self.format {
            Format::Text(options) => report::network_text(document, *options),
            Format::Json => report::network_json(document).map_err(Failure::not_printed)?,
            Format::Csv(locale) => output::in_locale(report::network_csv(document), *locale)?,
        };
        let inputs = Inputs {
            files: inputs,
            quiet: self.quiet,
        };
        output::deliver(files, text, self.output.as_deref(), &inputs)
    }

    fn status(&self, document: &NetworkDocument<'_>) -> ExitStatus {
        if document.solution.is_outside_validity() {
            return ExitStatus::OutsideValidity;
        }
        if !document.solution.balance.is_kept() {
            return ExitStatus::NotSolved;
        }
        let warnings = document.all_warnings();
        let mut warned = warnings.iter();
        if self.deny_warnings && warned.any(|warning| warning.code != Code::Caution) {
            return ExitStatus::OutsideLimit;
        }
        ExitStatus::Done
    }
}

/// Why a net has no solution, with the line of the node.
fn not_solved(error: &NetworkError, file: &NetworkFile) -> Failure {
    let status = match error {
        NetworkError::NoLaw { .. } | NetworkError::OutsideLaw { .. } => ExitStatus::OutsideValidity,
        NetworkError::OutOfRange | NetworkError::TooLarge { .. } => ExitStatus::NotSolved,
        _ => ExitStatus::Unreadable,
    };
    let line = match error {
        NetworkError::Floating { index, .. } | NetworkError::NoPressure { index, .. } => {
            file.node_line(*index)
        }
        _ => None,
    };
    let place = match line {
        Some(line) => format!("{}:{line}", file.path),
        None => file.path.clone(),
    };
    Failure::new(status, format!("{place}: {error}"), error.hint())
}

/// The net of a file.
fn network(file: &NetworkFile, path: &Path) -> Network {
    let stem = || {
        path.file_stem()
            .map_or_else(|| "net".to_owned(), |s| s.to_string_lossy().into_owned())
    };
    let fluid = file
        .cards
        .first()
        .map(|card| card.content.fluid.name.clone());
    Network {
        name: file.name.clone().unwrap_or_else(stem),
        fluid: fluid.unwrap_or_default(),
        temperature: file.temperature,
        cards: file
            .cards
            .iter()
            .map(|one| card(one, origin(&file.cards, one)))
            .collect(),
        nodes: file
            .nodes
            .iter()
            .map(|node| NetNode {
                name: node.name.clone(),
                condition: match node.condition {
                    NetworkFileCondition::Pressure(p) => NodeCondition::Pressure(p),
                    NetworkFileCondition::Inflow(q) => NodeCondition::Inflow(q),
                    NetworkFileCondition::Free => NodeCondition::Inflow(0.0),
                },
            })
            .collect(),
        channels: file
            .channels
            .iter()
            .map(|channel| NetChannel {
                name: channel.name.clone(),
                from: channel.from,
                to: channel.to,
                card: channel.card,
                length: channel.length,
                parallel: channel.parallel,
                spread: channel.spread,
            })
            .collect(),
    }
}

/// Place of the first entry that is the same card of the same file.
fn origin(cards: &[NetworkFileCard], card: &NetworkFileCard) -> usize {
    let same = |other: &NetworkFileCard| {
        other.sha256 == card.sha256 && other.content.name == card.content.name
    };
    cards.iter().position(same).unwrap_or(0)
}

fn card(card: &NetworkFileCard, origin: usize) -> NetCard {
    let content: &CardContent = &card.content;
    let fluid = &content.fluid;
    NetCard {
        name: card.name.clone(),
        extent: match content.kind {
            CardKind::Section => CardExtent::PerLength,
            CardKind::Route => CardExtent::Whole,
        },
        resistance: content.resistance,
        proven: content.proven,
        inertance: content.inertance,
        volume: content.volume,
        wall_area: content.wall_area,
        length: content.length,
        shear_mean: content.shear_mean,
        shear_max: content.shear_max,
        own_uncertainty: content.relative_uncertainty,
        origin,
        common_uncertainty: card.common,
        limits: NetCardLimits {
            reynolds: content.reynolds_high,
            entrance_share: content.entrance_share,
            pressure_drop: content.pressure_drop_high,
        },
        temperature: fluid.temperature,
        viscosity: fluid.viscosity,
        density: fluid.density,
        law: content.law.as_ref().map(|law| TemperatureLaw {
            reference: law.reference,
            low: law.low,
            high: law.high,
            coefficients: law.coefficients.clone(),
            largest_relative_error: law.largest_relative_error,
        }),
    }
}
