//! Options with a unit, and the fluid they describe.

use clap::ArgMatches;

use crate::flow::Fluid;
use crate::units::{self, UnitError};

use super::failure::Failure;

/// Standard atmosphere, Pa (ISO 2533:1975; from memory).
const ATMOSPHERE: f64 = 101_325.0;

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
