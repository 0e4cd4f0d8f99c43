//! One operating point of a channel of constant section: from a pressure drop or a flow rate and a length
//! to velocities, shear and times.
//!
//! Fully developed laminar flow in a rigid section of one length: `Q = G K / mu`, `G = dp / L`. Whether the
//! flow is that, is for [`super::validity_warnings`] to say. SI throughout.

use super::entrance::{EntranceModel, entrance_length};
use super::fluid::{Fluid, FluidError};
use super::section_flow::SectionFlow;

/// Flow through a channel of given length.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OperatingPoint {
    /// What was given.
    pub drive: Drive,
    /// Channel length, m.
    pub length: f64,
    /// Flow rate, m^3/s.
    pub flow_rate: f64,
    /// Pressure drop over the length, Pa.
    pub pressure_drop: f64,
    /// Pressure gradient `G = -dp/dx`, Pa/m.
    pub pressure_gradient: f64,
    /// Mean velocity, m/s.
    pub mean_velocity: f64,
    /// Peak velocity, m/s.
    pub peak_velocity: f64,
    /// Reynolds number on hydraulic diameter and mean velocity; `None` without a density.
    pub reynolds_dh: Option<f64>,
    /// Mean wall shear, Pa.
    pub wall_shear_mean: f64,
    /// Largest wall shear, Pa; grid dependent when the section has singular corners.
    pub wall_shear_max: f64,
    /// Volume over flow rate, s.
    pub residence_time: f64,
    /// Entrance length, m, [`EntranceModel::Durst2005`] on the hydraulic diameter; `None` without a density.
    pub entrance_length: Option<f64>,
}

/// What drives the flow; both count as positive in the direction of flow.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Drive {
    /// Pressure drop over the length, Pa.
    PressureDrop(f64),
    /// Flow rate, m^3/s.
    FlowRate(f64),
}

/// Why there is no operating point.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum OperatingPointError {
    /// Length, pressure drop or flow rate is zero, negative or not a number.
    #[error("the {quantity} is {value} {unit}; it must be above zero and finite")]
    NotPositive {
        /// Which quantity.
        quantity: &'static str,
        /// The value as given.
        value: f64,
        /// Its unit.
        unit: &'static str,
    },
    /// The fluid has an impossible property.
    #[error(transparent)]
    Fluid(#[from] FluidError),
    /// The section has no conductance to work with.
    #[error("the conductance of the section is {value} m^4; there is no flow to compute")]
    NoConductance {
        /// The conductance, m^4.
        value: f64,
    },
    /// Inputs so extreme that a result leaves the range of numbers.
    #[error("the {quantity} comes out as {value} {unit}, outside the range of numbers")]
    OutOfNumbers {
        /// Which result.
        quantity: &'static str,
        /// The value.
        value: f64,
        /// Its unit.
        unit: &'static str,
    },
}

impl OperatingPointError {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::NotPositive { quantity, .. } => format!(
                "give a {quantity} above zero, with its unit; the direction of flow does not matter"
            ),
            Self::Fluid(error) => error.hint(),
            Self::NoConductance { .. } => "check the outline and its unit".to_owned(),
            Self::OutOfNumbers { .. } => {
                "check the units of length, pressure, flow rate and viscosity".to_owned()
            }
        }
    }
}

/// Accepts a positive finite input.
fn positive(
    quantity: &'static str,
    value: f64,
    unit: &'static str,
) -> Result<f64, OperatingPointError> {
    if value.is_finite() && value > 0.0 {
        Ok(value)
    } else {
        Err(OperatingPointError::NotPositive {
            quantity,
            value,
            unit,
        })
    }
}

impl OperatingPoint {
    /// The operating point of a solved section.
    ///
    /// `Q = G K / mu`, `ubar = Q / A`, `tau = G abs(dphi/dn)`, `Re = rho ubar Dh / mu`, `t = A L / Q`.
    ///
    /// - `flow`: the solved section
    /// - `fluid`: Newtonian, at one temperature
    /// - `length`: of the channel, m, above zero
    /// - `drive`: pressure drop or flow rate, above zero
    ///
    /// # Errors
    /// [`OperatingPointError`] when an input is zero, negative or not finite, or a result is.
    pub fn new(
        flow: &SectionFlow,
        fluid: &Fluid,
        length: f64,
        drive: Drive,
    ) -> Result<Self, OperatingPointError> {
        fluid.validate()?;
        let length = positive("length", length, "m")?;
        let conductance = flow.conductance.value;
        if !(conductance.is_finite() && conductance > 0.0) {
            return Err(OperatingPointError::NoConductance { value: conductance });
        }
        let resistance = fluid.viscosity * length / conductance;
        let (pressure_drop, flow_rate) = match drive {
            Drive::PressureDrop(drop) => {
                let drop = positive("pressure drop", drop, "Pa")?;
                (drop, drop / resistance)
            }
            Drive::FlowRate(rate) => {
                let rate = positive("flow rate", rate, "m^3/s")?;
                (rate * resistance, rate)
            }
        };
        let driven = (drive, pressure_drop, flow_rate);
        Self::assemble(flow, fluid, length, driven).checked()
    }

    /// All quantities from pressure drop and flow rate.
    fn assemble(
        flow: &SectionFlow,
        fluid: &Fluid,
        length: f64,
        (drive, pressure_drop, flow_rate): (Drive, f64, f64),
    ) -> Self {
        let section = &flow.geometry;
        let pressure_gradient = pressure_drop / length;
        let mean_velocity = flow_rate / section.area;
        let reynolds_dh = fluid
            .density
            .map(|density| density * mean_velocity * section.hydraulic_diameter / fluid.viscosity);
        Self {
            drive,
            length,
            flow_rate,
            pressure_drop,
            pressure_gradient,
            mean_velocity,
            peak_velocity: mean_velocity * flow.peak.to_mean.value,
            reynolds_dh,
            wall_shear_mean: pressure_gradient * flow.wall_shear.mean_per_gradient,
            wall_shear_max: pressure_gradient * flow.wall_shear.max_per_gradient,
            residence_time: length * section.area / flow_rate,
            entrance_length: reynolds_dh.map(|reynolds| {
                entrance_length(
                    EntranceModel::default(),
                    section.hydraulic_diameter,
                    reynolds,
                )
            }),
        }
    }

    /// Proven lower and upper value of a quantity that goes with the flow rate.
    ///
    /// With the pressure drop given it goes with `K`, and so do its bounds; with the flow rate given it is
    /// given too. `None` without a proven range.
    pub fn flow_bounds(&self, flow: &SectionFlow, value: f64) -> Option<(f64, f64)> {
        let k = flow.conductance.value;
        match (self.drive, flow.bracket) {
            (Drive::PressureDrop(_), Ok(proven)) => {
                Some((value * proven.low / k, value * proven.high / k))
            }
            _ => None,
        }
    }

    /// Proven lower and upper value of a quantity that goes with the pressure drop, such as the mean wall
    /// shear.
    ///
    /// With the flow rate given it goes with `1/K`; with the pressure drop given it is given too. `None`
    /// without a proven range.
    pub fn pressure_bounds(&self, flow: &SectionFlow, value: f64) -> Option<(f64, f64)> {
        let k = flow.conductance.value;
        match (self.drive, flow.bracket) {
            (Drive::FlowRate(_), Ok(proven)) => {
                Some((value * k / proven.high, value * k / proven.low))
            }
            _ => None,
        }
    }

    /// The same point when every number is finite and no flow or gradient has vanished.
    fn checked(self) -> Result<Self, OperatingPointError> {
        let results = [
            ("flow rate", self.flow_rate, "m^3/s"),
            ("pressure drop", self.pressure_drop, "Pa"),
            ("pressure gradient", self.pressure_gradient, "Pa/m"),
            ("mean velocity", self.mean_velocity, "m/s"),
            ("peak velocity", self.peak_velocity, "m/s"),
            ("mean wall shear", self.wall_shear_mean, "Pa"),
            ("largest wall shear", self.wall_shear_max, "Pa"),
            ("residence time", self.residence_time, "s"),
            ("Reynolds number", self.reynolds_dh.unwrap_or(1.0), ""),
            ("entrance length", self.entrance_length.unwrap_or(1.0), "m"),
        ];
        for (quantity, value, unit) in results {
            if !(value.is_finite() && value > 0.0) {
                return Err(OperatingPointError::OutOfNumbers {
                    quantity,
                    value,
                    unit,
                });
            }
        }
        Ok(self)
    }
}

#[cfg(test)]
pub(crate) mod tests {
    use super::*;
    use crate::flow::closed_form;
    use crate::flow::{GridReport, Peak, SectionGeometry, SolverReport, WallCurve, WallShear};
    use crate::measured::Estimate;

    /// The exact result of a circular section, as a solver would hand it over.
    pub(crate) fn tube(radius: f64) -> SectionFlow {
        let form = closed_form::circle(radius).unwrap();
        let exact = |value| Estimate { value, error: 0.0 };
        SectionFlow {
            geometry: SectionGeometry {
                area: form.area,
                wetted_perimeter: form.wetted_perimeter,
                hydraulic_diameter: form.hydraulic_diameter(),
                width: 2.0 * radius,
                height: 2.0 * radius,
                lumens: 1,
                islands: 0,
                vertices: 0,
            },
            conductance: exact(form.conductance),
            bracket: Err(crate::proof::ProofError::Cutting { relative: 1.0 }),
            conductance_finest_grid: form.conductance,
            fanning_dh: 16.0,
            darcy_dh: 64.0,
            fanning_sqrt_area: form.fanning_sqrt_area(),
            peak: Peak {
                phi: radius * radius / 4.0,
                to_mean: exact(2.0),
                at: [0.0, 0.0],
            },
            momentum_factor: exact(4.0 / 3.0),
            kinetic_energy_factor: exact(2.0),
            wall_shear: WallShear {
                mean_per_gradient: radius / 2.0,
                max_per_gradient: radius / 2.0,
                max_at: [radius, 0.0],
                singular_corners: Vec::new(),
                samples: Vec::new(),
                curve: WallCurve {
                    loops: Vec::new(),
                    singular_length: 0.0,
                },
            },
            grid: GridReport {
                spacing: radius / 64.0,
                fluid_nodes: 12_868,
                cells_across: 128.0,
                inscribed_diameter: 2.0 * radius,
            },
            solver: SolverReport {
                cycles: 0,
                residual: 0.0,
                converged: true,
                convergence_factor: 0.0,
                accelerated: false,
                seconds: 0.0,
                levels: Vec::new(),
            },
            identities: Vec::new(),
            accuracy: crate::flow::Accuracy::default(),
            warnings: Vec::new(),
        }
    }

    fn close(value: f64, reference: f64) {
        assert!(
            (value / reference - 1.0).abs() < 1e-12,
            "{value} against {reference}"
        );
    }

    #[test]
    fn a_tube_follows_hagen_and_poiseuille() {
        let (radius, length, drop) = (50e-6, 0.02, 1e4);
        let fluid = Fluid::custom(1e-3, Some(1000.0)).unwrap();
        let point =
            OperatingPoint::new(&tube(radius), &fluid, length, Drive::PressureDrop(drop)).unwrap();
        let flow_rate = std::f64::consts::PI * radius.powi(4) * drop / (8.0 * 1e-3 * length);
        close(point.flow_rate, flow_rate);
        close(
            point.mean_velocity,
            radius * radius * drop / (8.0 * 1e-3 * length),
        );
        close(point.peak_velocity, 2.0 * point.mean_velocity);
        close(point.pressure_gradient, drop / length);
        close(point.wall_shear_mean, drop * radius / (2.0 * length));
        // Wall shear of a tube is also 4 mu ubar / R.
        close(point.wall_shear_max, 4e-3 * point.mean_velocity / radius);
        let reynolds = point.reynolds_dh.unwrap();
        close(reynolds, 1000.0 * point.mean_velocity * 2.0 * radius / 1e-3);
        // Fanning friction factor tau / (rho ubar^2 / 2) times Re is 16.
        let friction = point.wall_shear_mean / (500.0 * point.mean_velocity.powi(2));
        close(friction * reynolds, 16.0);
        close(point.residence_time, length / point.mean_velocity);
        let entrance = point.entrance_length.unwrap();
        assert!(entrance > 0.619 * 2.0 * radius && entrance < 0.1 * length);
    }

    #[test]
    fn pressure_and_flow_are_two_ways_to_the_same_point() {
        let water = Fluid::water(293.15).unwrap();
        let by_pressure =
            OperatingPoint::new(&tube(1e-4), &water, 0.05, Drive::PressureDrop(3e3)).unwrap();
        let by_flow = OperatingPoint::new(
            &tube(1e-4),
            &water,
            0.05,
            Drive::FlowRate(by_pressure.flow_rate),
        )
        .unwrap();
        close(by_flow.pressure_drop, 3e3);
        close(
            by_flow.reynolds_dh.unwrap(),
            by_pressure.reynolds_dh.unwrap(),
        );
    }

    #[test]
    fn without_a_density_there_is_no_reynolds_number() {
        let fluid = Fluid::custom(1e-3, None).unwrap();
        let point = OperatingPoint::new(&tube(1e-4), &fluid, 0.05, Drive::FlowRate(1e-9)).unwrap();
        assert_eq!((point.reynolds_dh, point.entrance_length), (None, None));
    }

    #[test]
    fn inputs_that_are_not_positive_are_refused_by_name() {
        let water = Fluid::water(293.15).unwrap();
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            for (length, drive, word) in [
                (bad, Drive::FlowRate(1e-9), "length"),
                (0.1, Drive::FlowRate(bad), "flow rate"),
                (0.1, Drive::PressureDrop(bad), "pressure drop"),
            ] {
                let error = OperatingPoint::new(&tube(1e-4), &water, length, drive).unwrap_err();
                assert!(error.to_string().contains(word), "{error}");
                assert!(error.hint().contains(word));
            }
            let mut fluid = water.clone();
            fluid.viscosity = bad;
            let error =
                OperatingPoint::new(&tube(1e-4), &fluid, 0.1, Drive::FlowRate(1e-9)).unwrap_err();
            assert!(matches!(error, OperatingPointError::Fluid(_)));
            let mut flow = tube(1e-4);
            flow.conductance.value = bad;
            let error = OperatingPoint::new(&flow, &water, 0.1, Drive::FlowRate(1e-9)).unwrap_err();
            assert!(matches!(error, OperatingPointError::NoConductance { .. }));
        }
    }

    #[test]
    fn results_beyond_all_numbers_are_refused() {
        let water = Fluid::water(293.15).unwrap();
        let error = OperatingPoint::new(&tube(1e-4), &water, 1e-320, Drive::PressureDrop(1e300))
            .unwrap_err();
        assert!(
            matches!(error, OperatingPointError::OutOfNumbers { .. }),
            "{error}"
        );
    }
}
