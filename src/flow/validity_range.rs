//! Where the answer stops holding: laminar limit, entrance, gas laws, fluid range, and the short cautions.
//!
//! The model is fully developed, laminar, isothermal flow of a Newtonian fluid in a rigid section. Each
//! limit is a named constant with its source; a result past a limit keeps its numbers and gets a
//! [`Warning`]. [`outside_validity`] says when the numbers no longer describe the flow at all.

use crate::warning::{Code, Warning};

use super::entrance::excess_pressure_factor;
use super::fluid::{Fluid, GasState, WATER_BOILS, WATER_FREEZES};
use super::operating_point::OperatingPoint;
use super::section_flow::SectionFlow;

/// Reynolds number on the hydraulic diameter above which friction starts to leave the laminar law: the
/// measured rise of Cornish (1928), Proc. R. Soc. Lond. A 120, 691, begins near 1800 (his figures read).
const NEARLY_TURBULENT: f64 = 1800.0;
/// Reynolds number on the hydraulic diameter above which flow is not taken as laminar (textbook; from memory).
pub const NOT_LAMINAR: f64 = 2000.0;
/// Share of the length that the entrance may take.
pub const ENTRANCE_SHARE: f64 = 0.1;
/// Share of the absolute pressure that a gas may lose before its density change counts.
const GAS_DROP_SHARE: f64 = 0.1;
/// Mach number above which density changes with velocity count (about 0.5 %; textbook).
const MACH_WARNING: f64 = 0.1;
/// Mach number above which flow is not taken as incompressible (textbook).
const MACH_LIMIT: f64 = 0.3;
/// Knudsen number on the hydraulic diameter above which slip counts (textbook; from memory).
const SLIP: f64 = 1e-3;
/// Knudsen number above which slip flow ends (textbook; from memory).
const TRANSITION: f64 = 0.1;
/// Relative gain of conductance per slip length over hydraulic diameter: 8 for every section that has an
/// inscribed circle touching all sides, 12 for parallel plates (exact).
const SLIP_GAIN: f64 = 12.0;
/// Pressure drop beyond which water properties at 1e5 Pa are off by about half a per cent, Pa (from memory).
const WATER_PRESSURE: f64 = 1e7;
/// Heat capacity of liquid water per mass, J/(kg K), near room temperature (textbook).
const WATER_HEAT_CAPACITY: f64 = 4180.0;
/// Temperature rise by friction that counts, K: 2 % in the viscosity of water.
const FRICTION_HEATING: f64 = 1.0;
/// Temperature from which a fluid can scald, K (60 C).
const HOT: f64 = 333.15;

/// Largest pressure drop for which the properties of a fluid hold, Pa; `None` where it is not known.
///
/// Water: where its properties at 1e5 Pa are off by about half a per cent. A gas of known state: a tenth of
/// its absolute pressure, beyond which its density changes along the channel.
pub fn pressure_limit(fluid: &Fluid) -> Option<f64> {
    if fluid.is_water() {
        return Some(WATER_PRESSURE);
    }
    fluid
        .gas_state()
        .map(|state| GAS_DROP_SHARE * state.pressure)
}

/// Warnings about the use of a solved section with a fluid and, when there is one, at an operating point.
///
/// Without an operating point only the fluid itself is judged. The order is fixed: laminar, entrance, gas,
/// fluid, cautions.
///
/// # Examples
/// ```
/// use etchwise::{flow::{Fluid, validity_warnings}, warning::Code};
/// # fn demo(flow: &etchwise::flow::SectionFlow) -> Result<(), etchwise::flow::FluidError> {
/// let supercooled = Fluid::water(260.0)?;
/// let warnings = validity_warnings(flow, &supercooled, None);
/// assert_eq!(warnings[0].code, Code::FluidRange);
/// # Ok(())
/// # }
/// ```
pub fn validity_warnings(
    flow: &SectionFlow,
    fluid: &Fluid,
    point: Option<&OperatingPoint>,
) -> Vec<Warning> {
    let mut warnings = Vec::new();
    if let Some(point) = point {
        warnings.extend(laminar(point));
        warnings.extend(entrance(flow, fluid, point));
    }
    warnings.extend(rarefaction(flow, fluid));
    if let Some(point) = point {
        warnings.extend(compressibility(fluid, point));
    }
    warnings.extend(water_temperature(fluid));
    if let Some(point) = point {
        warnings.extend(water_pressure(fluid, point));
    }
    warnings.extend(cautions(fluid, point));
    warnings
}

/// Whether the operating point lies outside the model: exit status 4.
///
/// True when the Reynolds number on the hydraulic diameter is above 2000; for a gas with known state also
/// when the Mach number is above 0.3, the Knudsen number above 0.1, or the pressure drop reaches the
/// absolute pressure.
pub fn outside_validity(flow: &SectionFlow, fluid: &Fluid, point: &OperatingPoint) -> bool {
    let turbulent = point.reynolds_dh.is_some_and(|re| re > NOT_LAMINAR);
    let gas = fluid.gas_state().is_some_and(|state| {
        knudsen(flow, &state) > TRANSITION
            || point.peak_velocity / state.sound_speed > MACH_LIMIT
            || point.pressure_drop >= state.pressure
    });
    turbulent || gas
}

/// Mean free path over hydraulic diameter.
fn knudsen(flow: &SectionFlow, state: &GasState) -> f64 {
    state.mean_free_path / flow.geometry.hydraulic_diameter
}

/// Reynolds number above or near the limit, or not known.
fn laminar(point: &OperatingPoint) -> Option<Warning> {
    let Some(reynolds) = point.reynolds_dh else {
        return Some(Warning {
            code: Code::Caution,
            message:
                "The density is not known, so the Reynolds number and the entrance length are not \
                      checked."
                    .to_owned(),
            advice: "Give the density of the fluid.".to_owned(),
            numbers: Vec::new(),
        });
    };
    if reynolds <= NEARLY_TURBULENT {
        return None;
    }
    let message = if reynolds > NOT_LAMINAR {
        format!(
            "The Reynolds number on the hydraulic diameter is {reynolds:.0}, above {NOT_LAMINAR:.0}: the \
             flow is not laminar and the numbers do not describe it."
        )
    } else {
        format!(
            "The Reynolds number on the hydraulic diameter is {reynolds:.0}, close to the limit of laminar \
             flow at {NOT_LAMINAR:.0}; measured friction starts to rise from about {NEARLY_TURBULENT:.0}."
        )
    };
    Some(Warning {
        code: Code::NotLaminar,
        message,
        advice:
            "Lower the pressure drop or the flow rate, or use a friction law for turbulent flow."
                .to_owned(),
        numbers: vec![("reynolds_dh", reynolds), ("limit", NOT_LAMINAR)],
    })
}

/// Entrance longer than its share of the length, with the excess pressure it costs.
fn entrance(flow: &SectionFlow, fluid: &Fluid, point: &OperatingPoint) -> Option<Warning> {
    let entrance = point.entrance_length?;
    let share = entrance / point.length;
    if share <= ENTRANCE_SHARE {
        return None;
    }
    let factor =
        excess_pressure_factor(flow.momentum_factor.value, flow.kinetic_energy_factor.value);
    let excess = factor * 0.5 * fluid.density? * point.mean_velocity.powi(2);
    Some(Warning {
        code: Code::EntranceLength,
        message: format!(
            "The entrance takes {:.0} % of the length ({entrance:.3e} m of {:.3e} m, from a uniform inlet; \
             a square section can need 1.6 times that): the true pressure drop is higher, by up to about \
             {excess:.3e} Pa once developed.",
            100.0 * share,
            point.length
        ),
        advice:
            "Add the entrance pressure to the drop, or use a longer channel or a lower flow rate."
                .to_owned(),
        numbers: vec![
            ("entrance_length_m", entrance),
            ("length_m", point.length),
            ("excess_pressure_pa", excess),
        ],
    })
}

/// Knudsen number of a gas with known state.
fn rarefaction(flow: &SectionFlow, fluid: &Fluid) -> Option<Warning> {
    let state = fluid.gas_state()?;
    let knudsen = knudsen(flow, &state);
    if knudsen <= SLIP {
        return None;
    }
    let consequence = if knudsen > TRANSITION {
        "the gas is no continuum there and the numbers do not hold".to_owned()
    } else {
        format!(
            "the gas slips on the wall and the true conductance is higher, by about {:.1} % with full \
             accommodation",
            100.0 * SLIP_GAIN * knudsen
        )
    };
    Some(Warning {
        code: Code::GasLimits,
        message: format!(
            "The Knudsen number (mean free path {:.3e} m over hydraulic diameter) is {knudsen:.2e}, above \
             {SLIP}: {consequence}.",
            state.mean_free_path
        ),
        advice: "Use a slip law, a higher pressure or a larger section.".to_owned(),
        numbers: vec![
            ("knudsen_dh", knudsen),
            ("mean_free_path_m", state.mean_free_path),
        ],
    })
}

/// Mach number and pressure drop of a gas.
fn compressibility(fluid: &Fluid, point: &OperatingPoint) -> Vec<Warning> {
    if !fluid.is_gas() {
        return Vec::new();
    }
    let Some(state) = fluid.gas_state() else {
        return vec![Warning {
            code: Code::GasLimits,
            message: "The density is that of a gas, but its absolute pressure is not known: \
                      compressibility and slip are not checked."
                .to_owned(),
            advice: "Keep the pressure drop below a tenth of the absolute pressure and check the Mach and \
                     Knudsen numbers yourself."
                .to_owned(),
            numbers: vec![("pressure_drop_pa", point.pressure_drop)],
        }];
    };
    let mut warnings = Vec::new();
    let share = point.pressure_drop / state.pressure;
    if share > GAS_DROP_SHARE {
        warnings.push(Warning {
            code: Code::GasLimits,
            message: format!(
                "The pressure drop is {:.0} % of the absolute pressure {:.4e} Pa of the gas, above 10 %: its \
                 density changes along the channel.",
                100.0 * share,
                state.pressure
            ),
            advice: "Lower the pressure drop, give the mean pressure of the channel as that of the gas, or \
                     use a compressible model."
                .to_owned(),
            numbers: vec![
                ("pressure_drop_pa", point.pressure_drop),
                ("absolute_pressure_pa", state.pressure),
            ],
        });
    }
    let mach = point.peak_velocity / state.sound_speed;
    if mach > MACH_WARNING {
        warnings.push(Warning {
            code: Code::GasLimits,
            message: format!(
                "The peak velocity {:.3e} m/s is Mach {mach:.2}, above {MACH_WARNING}: the gas does not \
                 flow as if incompressible.",
                point.peak_velocity
            ),
            advice: "Lower the pressure drop or use a compressible model.".to_owned(),
            numbers: vec![("mach_peak", mach), ("sound_speed_m_per_s", state.sound_speed)],
        });
    }
    warnings
}

/// Metastable water.
fn water_temperature(fluid: &Fluid) -> Option<Warning> {
    let temperature = fluid.temperature.filter(|_| fluid.is_water())?;
    let (state, limit, word) = if temperature < WATER_FREEZES {
        (
            "supercooled: it can freeze at any moment",
            WATER_FREEZES,
            "below",
        )
    } else if temperature > WATER_BOILS {
        (
            "superheated at 0.1 MPa: it can boil at any moment",
            WATER_BOILS,
            "above",
        )
    } else {
        return None;
    };
    Some(Warning {
        code: Code::FluidRange,
        message: format!(
            "Liquid water at {:.2} C is {word} {:.2} C and {state}.",
            temperature - 273.15,
            limit - 273.15
        ),
        advice:
            "Check the temperature and its unit; above the boiling point the channel must be under \
                 pressure."
                .to_owned(),
        numbers: vec![("temperature_k", temperature), ("limit_k", limit)],
    })
}

/// Water far from 1e5 Pa, or heated by its own friction.
fn water_pressure(fluid: &Fluid, point: &OperatingPoint) -> Vec<Warning> {
    let Some(density) = fluid.density.filter(|_| fluid.is_water()) else {
        return Vec::new();
    };
    let mut warnings = Vec::new();
    if point.pressure_drop > WATER_PRESSURE {
        warnings.push(Warning {
            code: Code::FluidRange,
            message: format!(
                "The water properties are those at 0.1 MPa; a pressure drop of {:.3e} Pa changes density and \
                 viscosity by half a per cent and more.",
                point.pressure_drop
            ),
            advice: "Give viscosity and density at the mean pressure.".to_owned(),
            numbers: vec![("pressure_drop_pa", point.pressure_drop)],
        });
    }
    let rise = point.pressure_drop / (density * WATER_HEAT_CAPACITY);
    if rise > FRICTION_HEATING {
        warnings.push(Warning {
            code: Code::FluidRange,
            message: format!(
                "Friction warms the water by up to {rise:.2} K along the channel, about {:.0} % in \
                 viscosity.",
                2.0 * rise
            ),
            advice: "Give the viscosity at the mean temperature.".to_owned(),
            numbers: vec![("temperature_rise_k", rise)],
        });
    }
    warnings
}

/// The short cautions where pressure, a gas or heat appears.
fn cautions(fluid: &Fluid, point: Option<&OperatingPoint>) -> Vec<Warning> {
    let mut warnings = Vec::new();
    let mut push = |message: &str, advice: &str, numbers| {
        warnings.push(Warning {
            code: Code::Caution,
            message: message.to_owned(),
            advice: advice.to_owned(),
            numbers,
        });
    };
    if let Some(point) = point {
        push(
            "A resistance is not a pressure rating: bonded chips and fittings can burst. The numbers are for \
             fully developed laminar flow in a rigid section.",
            "They do not replace proof testing, local codes, the device maker's limits or the judgement of a \
             licensed or qualified person, least of all in medical use.",
            vec![("pressure_drop_pa", point.pressure_drop)],
        );
    }
    if fluid.is_gas() {
        push(
            "Compressed gas stores energy: a chip or fitting that fails under gas throws its pieces.",
            "Proof test with liquid, limit the pressure, and shield the set-up.",
            Vec::new(),
        );
    }
    if let Some(temperature) = fluid.temperature.filter(|&t| t >= HOT) {
        push(
            "Hot fluid scalds, and heat weakens bonds, polymers and fittings.",
            "Check the temperature limits of chip and fittings.",
            vec![("temperature_k", temperature)],
        );
    }
    warnings
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::flow::operating_point::Drive;
    use crate::flow::operating_point::tests::tube;

    fn codes(warnings: &[Warning]) -> Vec<Code> {
        warnings.iter().map(|warning| warning.code).collect()
    }

    /// A point of water at 20 C in a tube at a Reynolds number.
    fn water_at(reynolds: f64, radius: f64, length: f64) -> (SectionFlow, Fluid, OperatingPoint) {
        let (flow, water) = (tube(radius), Fluid::water(293.15).unwrap());
        let velocity = reynolds * water.viscosity / (water.density.unwrap() * 2.0 * radius);
        let rate = Drive::FlowRate(velocity * flow.geometry.area);
        let point = OperatingPoint::new(&flow, &water, length, rate).unwrap();
        (flow, water, point)
    }

    fn air_at(radius: f64, length: f64, drop: f64) -> (SectionFlow, Fluid, OperatingPoint) {
        let (flow, air) = (tube(radius), Fluid::dry_air(293.15, 101_325.0).unwrap());
        let point = OperatingPoint::new(&flow, &air, length, Drive::PressureDrop(drop)).unwrap();
        (flow, air, point)
    }

    #[test]
    fn an_ordinary_point_gets_the_pressure_caution_and_nothing_else() {
        let (flow, water, point) = water_at(10.0, 1e-4, 0.1);
        let warnings = validity_warnings(&flow, &water, Some(&point));
        assert_eq!(codes(&warnings), [Code::Caution]);
        assert!(warnings[0].message.contains("not a pressure rating"));
        assert!(!outside_validity(&flow, &water, &point));
        assert!(validity_warnings(&flow, &water, None).is_empty());
    }

    #[test]
    fn the_laminar_limit_warns_before_it_refuses() {
        for (reynolds, warned, outside) in [
            (1790.0, false, false),
            (1900.0, true, false),
            (2001.0, true, true),
        ] {
            let (flow, water, point) = water_at(reynolds, 1e-3, 100.0);
            let warnings = validity_warnings(&flow, &water, Some(&point));
            assert_eq!(
                codes(&warnings).contains(&Code::NotLaminar),
                warned,
                "{reynolds}"
            );
            assert_eq!(
                outside_validity(&flow, &water, &point),
                outside,
                "{reynolds}"
            );
        }
    }

    #[test]
    fn a_short_channel_is_told_its_entrance_and_its_excess_pressure() {
        let (flow, water, point) = water_at(500.0, 1e-4, 0.02);
        let warnings = validity_warnings(&flow, &water, Some(&point));
        let entrance = warnings
            .iter()
            .find(|w| w.code == Code::EntranceLength)
            .unwrap();
        // Tube: 4/3 of rho ubar^2 / 2.
        let expected = 4.0 / 3.0 * 0.5 * water.density.unwrap() * point.mean_velocity.powi(2);
        assert!((entrance.numbers[2].1 / expected - 1.0).abs() < 1e-12);
        let (flow, water, point) = water_at(500.0, 1e-4, 0.2);
        let warnings = validity_warnings(&flow, &water, Some(&point));
        assert!(!codes(&warnings).contains(&Code::EntranceLength));
    }

    #[test]
    fn a_fluid_without_density_says_that_it_is_not_checked() {
        let flow = tube(1e-4);
        let fluid = Fluid::custom(1e-3, None).unwrap();
        let point = OperatingPoint::new(&flow, &fluid, 0.1, Drive::FlowRate(1.0)).unwrap();
        let warnings = validity_warnings(&flow, &fluid, Some(&point));
        assert!(warnings[0].message.contains("density is not known"));
        assert!(!outside_validity(&flow, &fluid, &point));
    }

    #[test]
    fn gas_is_judged_by_pressure_mach_and_knudsen_numbers() {
        let messages = |radius, length, drop| {
            let (flow, air, point) = air_at(radius, length, drop);
            let text: Vec<String> = validity_warnings(&flow, &air, Some(&point))
                .into_iter()
                .filter(|w| w.code == Code::GasLimits)
                .map(|w| w.message)
                .collect();
            (text.join(" "), outside_validity(&flow, &air, &point))
        };
        // Wide, long, little pressure: nothing (mean free path 65 nm over 200 um is 3e-4).
        assert_eq!(messages(1e-4, 1.0, 5e3), (String::new(), false));
        let (text, outside) = messages(1e-4, 1.0, 2e4);
        assert!(
            text.contains("20 % of the absolute pressure") && !outside,
            "{text}"
        );
        let (text, outside) = messages(1e-4, 1.0, 101_330.0);
        assert!(
            text.contains("100 % of the absolute pressure") && outside,
            "{text}"
        );
        let (text, outside) = messages(1e-5, 0.1, 1e3);
        assert!(text.contains("slips on the wall") && !outside, "{text}");
        let (text, outside) = messages(1e-7, 0.1, 1e3);
        assert!(text.contains("no continuum") && outside, "{text}");
        let (text, outside) = messages(1e-4, 0.02, 8e3);
        assert!(text.contains("Mach 0.16") && !outside, "{text}");
        let (text, outside) = messages(1e-4, 0.01, 8e3);
        assert!(text.contains("Mach 0.3") && outside, "{text}");
    }

    #[test]
    fn a_gas_of_unknown_pressure_is_named_as_unchecked() {
        let flow = tube(1e-4);
        let helium = Fluid::custom(1.96e-5, Some(0.166)).unwrap();
        let point = OperatingPoint::new(&flow, &helium, 0.1, Drive::PressureDrop(100.0)).unwrap();
        let warnings = validity_warnings(&flow, &helium, Some(&point));
        assert!(
            warnings
                .iter()
                .any(|w| w.message.contains("absolute pressure is not known"))
        );
        assert!(
            warnings
                .iter()
                .any(|w| w.message.contains("Compressed gas"))
        );
    }

    #[test]
    fn metastable_hot_and_squeezed_water_is_reported() {
        let flow = tube(1e-5);
        let messages = |temperature: f64| -> Vec<(Code, String)> {
            validity_warnings(&flow, &Fluid::water(temperature).unwrap(), None)
                .into_iter()
                .map(|w| (w.code, w.message))
                .collect()
        };
        assert!(messages(260.0)[0].1.contains("supercooled"));
        assert!(messages(375.0)[0].1.contains("superheated"));
        assert!(messages(375.0)[1].1.contains("scalds"));
        assert!(messages(300.0).is_empty());
        let water = Fluid::water(293.15).unwrap();
        let point = OperatingPoint::new(&flow, &water, 1.0, Drive::PressureDrop(2e7)).unwrap();
        let warnings = validity_warnings(&flow, &water, Some(&point));
        let range: Vec<_> = warnings
            .iter()
            .filter(|w| w.code == Code::FluidRange)
            .collect();
        assert_eq!(range.len(), 2);
        assert!(range[1].message.contains("4.79 K"), "{}", range[1].message);
    }
}
