//! What the options for instruments mean: units applied, no file opened yet.

use std::path::PathBuf;
use std::str::FromStr;

use clap::ArgMatches;
use clap::parser::ValueSource;

use crate::intake::{
    CorrectionOptions, CutOptions, Decimal, InstrumentOptions, Levelling, LidChoice, LineFit,
    MicrographOptions, MicrographProblem, ReadOptions, SectionOptions, TableOptions, Tilt, Tip,
    Tone, Zone,
};
use crate::report::settings_text;
use crate::units;

use super::failure::Failure;
use super::instrument_arguments::{default_of, option_names};
use super::output;
use super::quantities::{positive, quantity};

/// Full angle of a stylus cone where only its radius is stated, rad (60 deg; common practice, no source).
const USUAL_CONE: f64 = std::f64::consts::FRAC_PI_3;

/// The options for instruments; `read` holds the unit, the scale and the bounds of size.
pub(super) fn instrument(
    matches: &ArgMatches,
    read: &ReadOptions,
) -> Result<InstrumentOptions, Failure> {
    let (corrections, sections) = (corrections(matches)?, sections(matches)?);
    // What makes no sense for any file is wrong usage, not the file's fault.
    corrections
        .check()
        .map_err(|problem| Failure::usage(&problem, &problem.hint()))?;
    sections
        .check()
        .map_err(|problem| Failure::usage(&problem, &problem.hint()))?;
    Ok(InstrumentOptions {
        table: table(matches, read)?,
        corrections,
        sections,
        cuts: cuts(matches)?,
        micrograph: micrograph(matches, read)?,
        repeats: paths(matches, "repeat"),
        lid_trace: matches.get_one::<PathBuf>("lid-trace").cloned(),
        name: word(matches, "name").map(str::to_owned),
        settings: typed_options(matches)
            .map(|(name, value)| (format!("--{name}"), value))
            .collect(),
    })
}

/// The options for instruments that were typed, with their values; a switch has none.
pub(super) fn typed_options(
    matches: &ArgMatches,
) -> impl Iterator<Item = (&'static str, String)> + use<'_> {
    option_names().filter_map(|name| Some((name, typed(matches, name)?)))
}

/// Every option for instruments with its value, or with what holds without it.
pub(super) fn settings(matches: &ArgMatches) -> Vec<(String, String)> {
    let value = |name: &'static str| match typed(matches, name) {
        Some(value) if value.is_empty() => "given".to_owned(),
        Some(value) => value,
        None => format!("not given: {}", default_of(name)),
    };
    option_names()
        .map(|name| (format!("--{name}"), value(name)))
        .collect()
}

/// Says on standard error which settings hold, where that was asked for.
pub(super) fn say_settings(matches: &ArgMatches) {
    if matches.get_flag("show-settings") {
        output::talk(&settings_text(&settings(matches)));
    }
}

/// What was typed for an option; empty for a switch.
pub(super) fn typed(matches: &ArgMatches, name: &str) -> Option<String> {
    if matches.value_source(name) != Some(ValueSource::CommandLine) {
        return None;
    }
    let raw = matches.get_raw(name).into_iter().flatten();
    let words: Vec<String> = raw.map(|w| w.to_string_lossy().into_owned()).collect();
    Some(words.join(", "))
}

/// Refuses what is neither a unit of length nor the length of one unit.
pub(super) fn check_unit(option: &str, unit: &str) -> Result<(), Failure> {
    if units::length_unit(unit).is_some() {
        return Ok(());
    }
    // Text without a number in front is meant as a unit.
    let is_length = unit
        .trim_start()
        .starts_with(|c: char| c.is_ascii_digit() || c == '.');
    let length = if is_length {
        unit.to_owned()
    } else {
        format!("1 {unit}")
    };
    units::parse_length(&length)
        .map(|_| ())
        .map_err(|error| Failure::option(option, &error))
}

fn word<'a>(matches: &'a ArgMatches, name: &str) -> Option<&'a str> {
    matches.get_one::<String>(name).map(String::as_str)
}

fn paths(matches: &ArgMatches, name: &str) -> Vec<PathBuf> {
    let values = matches.get_many::<PathBuf>(name);
    values.into_iter().flatten().cloned().collect()
}

/// A length that must be above zero.
fn above_zero(matches: &ArgMatches, name: &str, example: &str) -> Result<Option<f64>, Failure> {
    let value = quantity(matches, name, units::parse_length)?;
    positive(matches, name, value, example)?;
    Ok(value)
}

/// A length of either sign.
fn length(matches: &ArgMatches, name: &str) -> Result<Option<f64>, Failure> {
    quantity(matches, name, units::parse_length)
}

fn table(matches: &ArgMatches, read: &ReadOptions) -> Result<TableOptions, Failure> {
    for name in ["x-unit", "z-unit"] {
        if let Some(unit) = word(matches, name) {
            check_unit(name, unit)?;
        }
    }
    let text = |name| word(matches, name).map(str::to_owned);
    Ok(TableOptions {
        unit: read.unit.clone(),
        x_unit: text("x-unit"),
        z_unit: text("z-unit"),
        x_column: text("x-column"),
        z_column: text("z-column"),
        x_step: above_zero(matches, "x-step", "0.5um")?,
        y_step: above_zero(matches, "y-step", "2um")?,
        decimal: word(matches, "decimal").and_then(Decimal::from_word),
        allow_any_size: read.allow_any_size,
    })
}

fn corrections(matches: &ArgMatches) -> Result<CorrectionOptions, Failure> {
    let share = |name| quantity(matches, name, units::parse_fraction);
    let level = match (word(matches, "level-on"), word(matches, "level")) {
        (Some(text), _) => Levelling::Zones(zones("level-on", text)?),
        (None, Some("line")) => Levelling::Line,
        (None, Some("local")) => Levelling::Local,
        (None, Some("ends")) => Levelling::Ends,
        (None, Some("none")) => Levelling::None,
        (None, _) => Levelling::Lands,
    };
    let lands = word(matches, "land-zones").map(|text| zones("land-zones", text));
    Ok(CorrectionOptions {
        invert: matches.get_flag("invert"),
        shrinkage: [
            share("shrink-x")?.unwrap_or(0.0),
            share("shrink-z")?.unwrap_or(0.0),
        ],
        level,
        fit: match word(matches, "level-fit") {
            Some("least-squares") => LineFit::LeastSquares,
            _ => LineFit::Robust,
        },
        bow: matches.get_one::<u8>("bow").copied().unwrap_or(1),
        keep_spikes: matches.get_flag("keep-spikes"),
        spike_size: above_zero(matches, "spike-size", "0.5um")?,
        cutoff: above_zero(matches, "cutoff", "8um")?,
        lands: lands.transpose()?,
    })
}

/// Stretches such as `0um..40um,160um..200um`.
fn zones(option: &'static str, text: &str) -> Result<Vec<Zone>, Failure> {
    let example = format!("write from..to, for example --{option} 0um..40um,160um..200um");
    let zone = |part: &str| {
        let (from, to) = part.split_once("..").ok_or_else(|| {
            Failure::usage(format!("--{option}: `{part}` is not a stretch"), &example)
        })?;
        let end = |text: &str| {
            units::parse_length(text.trim()).map_err(|error| Failure::option(option, &error))
        };
        let zone = Zone {
            from: end(from)?,
            to: end(to)?,
        };
        if zone.from < zone.to {
            return Ok(zone);
        }
        Err(Failure::usage(
            format!("--{option}: `{part}` does not rise from its begin to its end"),
            &example,
        ))
    };
    text.split(',').map(zone).collect()
}

fn sections(matches: &ArgMatches) -> Result<SectionOptions, Failure> {
    let radius = quantity(matches, "tip-radius", units::parse_length)?;
    let cone = quantity(matches, "tip-angle", units::parse_angle)?;
    let tip = (radius.is_some() || cone.is_some()).then(|| Tip {
        radius: radius.unwrap_or(0.0),
        cone_angle: cone.unwrap_or(USUAL_CONE),
    });
    let lid = word(matches, "lid");
    let lid = LidChoice::ALL
        .into_iter()
        .find(|choice| lid == Some(choice.as_str()));
    Ok(SectionOptions {
        tip,
        walls: quantity(matches, "walls", units::parse_angle)?,
        lid: lid.unwrap_or_default(),
        lid_gap: length(matches, "lid-gap")?.unwrap_or(0.0),
        lid_sag: length(matches, "lid-sag")?.unwrap_or(0.0),
        lid_trace: None,
        lid_offset: length(matches, "lid-offset")?.unwrap_or(0.0),
        groove: matches.get_one::<u32>("groove").map(|&n| n as usize),
        simplify: above_zero(matches, "simplify", "10nm")?,
    })
}

fn cuts(matches: &ArgMatches) -> Result<CutOptions, Failure> {
    let stations = matches.get_many::<String>("station").into_iter().flatten();
    let stations = stations
        .map(|text| units::parse_length(text).map_err(|e| Failure::option("station", &e)))
        .collect::<Result<_, _>>()?;
    Ok(CutOptions {
        stations,
        average: above_zero(matches, "average", "20um")?,
        direction: direction(matches)?,
        level: !matches.get_flag("no-plane"),
    })
}

/// The direction of a groove, not more than a full turn: beyond that the number was hardly meant so, and
/// its last digits decide.
fn direction(matches: &ArgMatches) -> Result<Option<f64>, Failure> {
    let angle = quantity(matches, "groove-direction", units::parse_angle)?;
    if angle.is_some_and(|angle| angle.abs() > std::f64::consts::TAU) {
        return Err(Failure::usage(
            "--groove-direction: the angle is more than a full turn",
            "count it anticlockwise from the x axis, for example --groove-direction 26deg",
        ));
    }
    Ok(angle)
}

/// A value that is read by its own rules.
fn parsed<T: FromStr<Err = MicrographProblem>>(
    matches: &ArgMatches,
    name: &str,
) -> Result<Option<T>, Failure> {
    let text = word(matches, name);
    let parse = |text: &str| {
        text.parse::<T>()
            .map_err(|problem| Failure::usage(&problem, &problem.hint()))
    };
    text.map(parse).transpose()
}

fn micrograph(matches: &ArgMatches, read: &ReadOptions) -> Result<MicrographOptions, Failure> {
    let default = MicrographOptions::default();
    let tilt = if matches.get_flag("tilt-corrected") {
        Some(Tilt::Corrected)
    } else {
        parsed(matches, "tilt")?
    };
    Ok(MicrographOptions {
        scale: read.svg_scale,
        scale_y: above_zero(matches, "scale-y", "0.2um")?,
        tilt,
        crop: word(matches, "crop").map(crop).transpose()?,
        page: matches.get_one::<u32>("page").map(|&n| n as usize),
        channel: parsed(matches, "channel")?.unwrap_or(default.channel),
        fluid: parsed::<Tone>(matches, "fluid-is")?,
        threshold: parsed(matches, "threshold")?.unwrap_or(default.threshold),
        denoise: parsed(matches, "denoise")?.unwrap_or(default.denoise),
        region: parsed(matches, "region")?.unwrap_or(default.region),
        smallest_island: word(matches, "islands-above").map(area).transpose()?,
        simplify: above_zero(matches, "simplify", "10nm")?,
        reach_levels: match word(matches, "reach-levels") {
            Some(text) => levels(text)?,
            None => default.reach_levels,
        },
        allow_any_size: read.allow_any_size,
        largest_pixels: if matches.get_flag("allow-large") {
            u64::MAX
        } else {
            default.largest_pixels
        },
    })
}

/// `X,Y,WIDTH,HEIGHT`.
fn crop(text: &str) -> Result<[u32; 4], Failure> {
    let numbers: Option<Vec<u32>> = text.split(',').map(|n| n.trim().parse().ok()).collect();
    match numbers.as_deref() {
        Some(&[x, y, width, height]) if width > 0 && height > 0 => Ok([x, y, width, height]),
        _ => Err(Failure::usage(
            format!("--crop: `{text}` is not X,Y,WIDTH,HEIGHT in whole pixels"),
            "count from the upper left corner, for example --crop 0,0,1024,680",
        )),
    }
}

/// An area, as the side of the square that has it.
fn area(text: &str) -> Result<f64, Failure> {
    let side = units::parse_length(text).map_err(|e| Failure::option("islands-above", &e))?;
    if side >= 0.0 && side.is_finite() {
        return Ok(side * side);
    }
    Err(Failure::usage(
        format!("--islands-above: `{text}` is below zero"),
        "give the side of a square of that area, for example --islands-above 2um",
    ))
}

/// `LOW,HIGH`, shares.
fn levels(text: &str) -> Result<[f64; 2], Failure> {
    let share = |text: &str| {
        units::parse_fraction(text.trim()).map_err(|e| Failure::option("reach-levels", &e))
    };
    let wrong = || {
        Failure::usage(
            format!("--reach-levels: `{text}` is not two shares, the lower one first"),
            "write for example --reach-levels 20%,80%",
        )
    };
    let (low, high) = text.split_once(',').ok_or_else(wrong)?;
    let (low, high) = (share(low)?, share(high)?);
    if 0.0 < low && low < high && high < 1.0 {
        return Ok([low, high]);
    }
    Err(wrong())
}
