//! Options with a unit, and the fluid they describe.

use clap::ArgMatches;

use crate::flow::{Fluid, TemperatureLaw};
use crate::units::{self, UnitError};

use super::failure::Failure;

/// Standard atmosphere, Pa (ISO 2533:1975; from memory).
const ATMOSPHERE: f64 = 101_325.0;

/// Temperatures between which `R(T)` holds where none are given, K.
const TEMPERATURES: [f64; 2] = [278.15, 333.15];

/// Reads an option with a unit.
pub(super) fn quantity(
    matches: &ArgMatches,
    name: &str,
    parse: fn(&str) -> Result<f64, UnitError>,
) -> Result<Option<f64>, Failure> {
    matches
        .get_one::<String>(name)
        .map(|text| parse(text).map_err(|error| Failure::option(name, &error)))
        .transpose()
}

/// Refuses a value that is not above zero, as typed.
pub(super) fn positive(
    matches: &ArgMatches,
    name: &str,
    value: Option<f64>,
    example: &str,
) -> Result<(), Failure> {
    match value {
        Some(v) if !(v.is_finite() && v > 0.0) => {
            let typed = matches.get_one::<String>(name).map_or("", String::as_str);
            Err(Failure::usage(
                format!("--{name}: `{typed}` is not above zero"),
                &format!("give a positive value, for example --{name} {example}"),
            ))
        }
        _ => Ok(()),
    }
}

/// The fluid, if one is named or described.
pub(super) fn fluid(matches: &ArgMatches) -> Result<Option<Fluid>, Failure> {
    let temperature = quantity(matches, "temperature", units::parse_temperature)?;
    let pressure = quantity(matches, "gas-pressure", units::parse_pressure)?;
    let viscosity = quantity(matches, "viscosity", units::parse_viscosity)?;
    let density = quantity(matches, "density", units::parse_density)?;
    positive(matches, "gas-pressure", pressure, "1bar")?;
    positive(matches, "viscosity", viscosity, "1.2mPa.s")?;
    positive(matches, "density", density, "1050kg/m^3")?;
    let name = matches.get_one::<String>("fluid").map(String::as_str);
    if name.is_some() && (viscosity.is_some() || density.is_some()) {
        return Err(Failure::usage(
            "both --fluid and --viscosity or --density are given",
            "name a fluid, or give its viscosity and density, not both",
        ));
    }
    if pressure.is_some() && name != Some("air") {
        return Err(Failure::usage(
            "--gas-pressure is for --fluid air",
            "leave it out; the pressure of a liquid does not matter here",
        ));
    }
    let needed = || {
        temperature.ok_or_else(|| {
            Failure::usage(
                "the viscosity depends on the temperature, and none is given",
                "add --temperature, for example --temperature 25C",
            )
        })
    };
    match (name, viscosity) {
        (Some("air"), _) => {
            let pressure = pressure.unwrap_or(ATMOSPHERE);
            Ok(Some(Fluid::dry_air(needed()?, pressure)?))
        }
        (Some(_), _) => Ok(Some(Fluid::water(needed()?)?)),
        (None, Some(viscosity)) => Ok(Some(Fluid::custom(viscosity, density)?)),
        (None, None) if density.is_some() || temperature.is_some() => Err(Failure::usage(
            "a density or a temperature alone does not make a fluid",
            "add --fluid water, --fluid air or --viscosity",
        )),
        (None, None) => Ok(None),
    }
}

/// The temperatures of the law: as typed, else the usual ones, widened to the fluid's own.
pub(super) fn temperature_range(matches: &ArgMatches, fluid: &Fluid) -> Result<[f64; 2], Failure> {
    let Some(text) = matches.get_one::<String>("temperature-range") else {
        let [low, high] = TEMPERATURES;
        let own = fluid.temperature.unwrap_or(low);
        return Ok([low.min(own), high.max(own)]);
    };
    if !fluid.knows_temperatures() {
        return Err(Failure::usage(
            "--temperature-range is for --fluid water and air: a viscosity as given holds at one temperature",
            "leave it out",
        ));
    }
    let example = "write for example --temperature-range 10C..40C";
    let Some((low, high)) = text.split_once("..") else {
        return Err(Failure::usage(
            format!("--temperature-range: `{text}` is no range"),
            example,
        ));
    };
    let parse = |end: &str| {
        units::parse_temperature(end.trim())
            .map_err(|error| Failure::option("temperature-range", &error))
    };
    let range = [parse(low)?, parse(high)?];
    match TemperatureLaw::of(fluid, range) {
        Ok(_) => Ok(range),
        Err(error) => Err(Failure::usage(
            format!("--temperature-range {text}: {error}"),
            example,
        )),
    }
}
