//! A route at a flow rate or a pressure drop: pressure, velocity, shear along it.

use super::branch::{Route, RouteBranch};
use crate::flow::{
    Drive, Fluid, OperatingPoint, OperatingPointError, SectionFlow, excess_pressure_factor,
    outside_validity, validity_warnings,
};
use crate::warning::Warning;

/// A solved section at its place in the flow.
#[derive(Debug, Clone, PartialEq)]
pub struct PointOperation {
    /// Pressure above that at the end of the route, Pa.
    pub pressure: f64,
    /// Flow in this section as if the branch had it throughout.
    pub local: OperatingPoint,
}

/// A branch at its flow rate.
#[derive(Debug, Clone, PartialEq)]
pub struct BranchOperation {
    /// Flow rate of one, m^3/s.
    pub flow_rate: f64,
    /// Volume over flow rate, s.
    pub residence_time: f64,
    /// Entrance length at its first section over its length; `None` without a density.
    pub entrance_share: Option<f64>,
    /// Pressure that its entrance costs once developed, from a uniform inlet, Pa; `None` without a density.
    pub entrance_pressure: Option<f64>,
    /// One for each point of the branch.
    pub points: Vec<PointOperation>,
}

/// A segment at its flow rate.
#[derive(Debug, Clone, PartialEq)]
pub struct SegmentOperation {
    /// Pressure at its begin and its end, above that at the end of the route, Pa.
    pub pressures: [f64; 2],
    /// One for each branch.
    pub branches: Vec<BranchOperation>,
}

/// Which point of a route.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct PointPlace {
    /// Index of the segment.
    pub segment: usize,
    /// Index of the branch in it.
    pub branch: usize,
    /// Index of the point in it.
    pub point: usize,
}

/// A route at its flow rate.
#[derive(Debug, Clone, PartialEq)]
pub struct RouteOperation {
    /// What was given.
    pub drive: Drive,
    /// Flow rate through the route, m^3/s.
    pub flow_rate: f64,
    /// Pressure drop over the route, Pa.
    pub pressure_drop: f64,
    /// Volume over flow rate, s.
    pub residence_time: f64,
    /// One for each segment.
    pub segments: Vec<SegmentOperation>,
    /// Where the wall is sheared most.
    pub shear_at: PointPlace,
    /// Largest wall shear, Pa, at the solved sections.
    pub shear_max: f64,
    /// Largest Reynolds number on the hydraulic diameter; `None` without a density.
    pub reynolds_max: Option<f64>,
    /// Largest entrance share of a branch; `None` without a density.
    pub entrance_share: Option<f64>,
    /// What all entrances cost, Pa: of each segment the branch where it is most.
    pub entrance_pressure: Option<f64>,
}

impl RouteOperation {
    /// The route with a fluid at a flow rate or a pressure drop.
    ///
    /// # Errors
    /// [`OperatingPointError`] when the drive or the fluid is impossible, or a result leaves the range of
    /// numbers.
    pub fn new(route: &Route, fluid: &Fluid, drive: Drive) -> Result<Self, OperatingPointError> {
        fluid.validate()?;
        let resistance = fluid.viscosity * route.integral.value;
        let (quantity, unit, value) = match drive {
            Drive::PressureDrop(drop) => ("pressure drop", "Pa", drop),
            Drive::FlowRate(rate) => ("flow rate", "m^3/s", rate),
        };
        if !(value.is_finite() && value > 0.0) {
            return Err(OperatingPointError::NotPositive {
                quantity,
                value,
                unit,
            });
        }
        let flow_rate = match drive {
            Drive::PressureDrop(drop) => drop / resistance,
            Drive::FlowRate(rate) => rate,
        };
        let mut pressure = flow_rate * resistance;
        let pressure_drop = pressure;
        let mut segments = Vec::with_capacity(route.segments.len());
        for segment in &route.segments {
            let drop = flow_rate * fluid.viscosity * segment.integral.value;
            let branches = segment
                .branches
                .iter()
                .map(|branch| branch_operation(route, branch, fluid, (flow_rate, pressure)))
                .collect::<Result<Vec<_>, _>>()?;
            segments.push(SegmentOperation {
                pressures: [pressure, pressure - drop],
                branches,
            });
            pressure -= drop;
        }
        if let Some(last) = segments.last_mut() {
            // What rounding leaves.
            last.pressures[1] = 0.0;
        }
        let mut operation = Self {
            drive,
            flow_rate,
            pressure_drop,
            residence_time: route.volume() / flow_rate,
            segments,
            shear_at: PointPlace {
                segment: 0,
                branch: 0,
                point: 0,
            },
            shear_max: 0.0,
            reynolds_max: None,
            entrance_share: None,
            entrance_pressure: None,
        };
        operation.find_extremes();
        Ok(operation)
    }

    fn find_extremes(&mut self) {
        let mut entrances = None;
        for (segment, of_segment) in self.segments.iter().enumerate() {
            let mut dearest: Option<f64> = None;
            for (branch, of_branch) in of_segment.branches.iter().enumerate() {
                self.entrance_share = larger(self.entrance_share, of_branch.entrance_share);
                dearest = larger(dearest, of_branch.entrance_pressure);
                for (point, at) in of_branch.points.iter().enumerate() {
                    self.reynolds_max = larger(self.reynolds_max, at.local.reynolds_dh);
                    if at.local.wall_shear_max > self.shear_max {
                        self.shear_max = at.local.wall_shear_max;
                        self.shear_at = PointPlace {
                            segment,
                            branch,
                            point,
                        };
                    }
                }
            }
            if let Some(pressure) = dearest {
                entrances = Some(entrances.unwrap_or(0.0) + pressure);
            }
        }
        self.entrance_pressure = entrances;
    }

    /// Warnings about the fluid and the flow, each said once; with the segment where it is about one.
    pub fn warnings(&self, route: &Route, fluid: &Fluid) -> Vec<Warning> {
        let mut found: Vec<Warning> = Vec::new();
        let mut push = |warning: Warning, segment: Option<&str>| {
            if found.iter().any(|w| w.message.ends_with(&warning.message)) {
                return;
            }
            let message = segment.map_or(warning.message.clone(), |name| {
                format!("Segment {name}: {}", warning.message)
            });
            found.push(Warning { message, ..warning });
        };
        for (_, flow, _) in self.worst_points(route) {
            for warning in validity_warnings(flow, fluid, None) {
                push(warning, None);
            }
        }
        for (segment, flow, point) in self.worst_points(route) {
            for warning in validity_warnings(flow, fluid, Some(&point)) {
                let of_all = warning.code == crate::warning::Code::Caution;
                push(warning, (!of_all).then_some(segment));
            }
        }
        found
    }

    /// Whether the flow leaves the model anywhere: exit status 4.
    pub fn is_outside_validity(&self, route: &Route, fluid: &Fluid) -> bool {
        self.worst_points(route)
            .iter()
            .any(|(_, flow, point)| outside_validity(flow, fluid, point))
    }

    /// Of every segment the point with the highest velocity for its size, at the pressure drop of the route.
    fn worst_points<'a>(
        &self,
        route: &'a Route,
    ) -> Vec<(&'a str, &'a SectionFlow, OperatingPoint)> {
        let mut worst = Vec::new();
        for (segment, operation) in route.segments.iter().zip(&self.segments) {
            let all = segment.branches.iter().zip(&operation.branches);
            let points = all.flat_map(|(b, o)| b.points.iter().zip(&o.points));
            let speed = |o: &PointOperation| o.local.reynolds_dh.unwrap_or(o.local.mean_velocity);
            let fastest = points.max_by(|a, b| speed(a.1).total_cmp(&speed(b.1)));
            if let Some((point, at)) = fastest {
                let local = OperatingPoint {
                    pressure_drop: self.pressure_drop,
                    ..at.local
                };
                worst.push((segment.name.as_str(), &route.flows[point.flow].flow, local));
            }
        }
        worst
    }
}

fn larger(a: Option<f64>, b: Option<f64>) -> Option<f64> {
    match (a, b) {
        (Some(a), Some(b)) => Some(a.max(b)),
        (a, b) => a.or(b),
    }
}

fn branch_operation(
    route: &Route,
    branch: &RouteBranch,
    fluid: &Fluid,
    (total, inlet): (f64, f64),
) -> Result<BranchOperation, OperatingPointError> {
    let flow_rate = total * branch.share;
    let points = branch
        .points
        .iter()
        .map(|point| {
            let flow = &route.flows[point.flow].flow;
            let drive = Drive::FlowRate(flow_rate);
            let local = OperatingPoint::new(flow, fluid, branch.length, drive)?;
            Ok(PointOperation {
                pressure: (inlet - fluid.viscosity * flow_rate * point.integral).max(0.0),
                local,
            })
        })
        .collect::<Result<Vec<_>, OperatingPointError>>()?;
    let first = branch.points.first().zip(points.first());
    let entrance_pressure = first.and_then(|(point, at)| {
        let flow = &route.flows[point.flow].flow;
        let factor =
            excess_pressure_factor(flow.momentum_factor.value, flow.kinetic_energy_factor.value);
        Some(factor * 0.5 * fluid.density? * at.local.mean_velocity.powi(2))
    });
    Ok(BranchOperation {
        flow_rate,
        residence_time: branch.volume / flow_rate,
        entrance_share: first.and_then(|(_, at)| Some(at.local.entrance_length? / branch.length)),
        entrance_pressure,
        points,
    })
}
