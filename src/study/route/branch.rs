//! A solved route: its branches, its segments, and the whole.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::between::{Between, Stretch};
use super::design::{
    BranchDesign, RouteDesign, RouteError, RouteOptions, RouteSection, SegmentDesign,
};
use super::interpolation::{Interpolation, LawOfK};
use crate::flow::{DenseField, FlowError, SectionFlow, solve_outline};
use crate::geometry::Outline;
use crate::measured::Estimate;

/// A solved section of a route.
#[derive(Debug, Clone)]
pub struct RouteFlow {
    /// The answers.
    pub flow: SectionFlow,
    /// The solved outline, oriented.
    pub outline: Outline,
    /// The field, where it was asked for.
    pub field: Option<DenseField>,
}

/// A place along a branch with a solved section.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RoutePoint {
    /// Distance from the begin of the branch, m.
    pub position: f64,
    /// Index into [`Route::flows`].
    pub flow: usize,
    /// Number of the station, from 0; `None` for a section that was put in between.
    pub station: Option<usize>,
    /// Integral of `dx / K` from the begin of the branch, 1/m^3.
    pub integral: f64,
}

/// A branch.
#[derive(Debug, Clone, PartialEq)]
pub struct RouteBranch {
    /// Name; empty for the only one of its segment.
    pub name: String,
    /// How many equal ones there are.
    pub count: usize,
    /// Position of its first station as given, m.
    pub begin: f64,
    /// Length, m.
    pub length: f64,
    /// Relative standard uncertainty of `K` of each, where one is given.
    pub spread: Option<f64>,
    /// The ways from station to station, each with its length, m.
    pub ways: Vec<(Between, f64)>,
    /// Solved sections along it, positions rising.
    pub points: Vec<RoutePoint>,
    /// Integral of `dx / K` of one, 1/m^3.
    pub integral: Estimate,
    /// Proven low and high value of it, or why there is none.
    pub bounds: Result<(f64, f64), String>,
    /// Volume of one, m^3.
    pub volume: f64,
    /// Wall area of one, m^2.
    pub wall_area: f64,
    /// Integral of momentum factor over area of one, 1/m.
    pub inertance: f64,
    /// Flow of one over that of the segment.
    pub share: f64,
}

/// Branches beside each other.
#[derive(Debug, Clone, PartialEq)]
pub struct RouteSegment {
    /// Name.
    pub name: String,
    /// Its branches.
    pub branches: Vec<RouteBranch>,
    /// What `dx / K` of one channel would be that takes their place, 1/m^3: `R / mu`.
    pub integral: Estimate,
    /// Proven low and high value of it, or why there is none.
    pub bounds: Result<(f64, f64), String>,
}

/// A solved route.
#[derive(Debug, Clone)]
pub struct Route {
    /// In the direction of flow.
    pub segments: Vec<RouteSegment>,
    /// Every solved section: those of the design in their order, then those in between.
    pub flows: Vec<RouteFlow>,
    /// `R / mu`, 1/m^3.
    pub integral: Estimate,
    /// Proven low and high value of it, or why there is none.
    pub bounds: Result<(f64, f64), String>,
}

impl RouteFlow {
    /// Solves a section and keeps what a route needs of it.
    pub(super) fn solve(outline: &Outline, options: &RouteOptions) -> Result<Self, FlowError> {
        let solved = solve_outline(outline, &options.solve)?;
        Ok(Self {
            outline: solved.outline().clone(),
            field: options.field_nodes.map(|nodes| solved.dense_field(nodes)),
            flow: solved.flow,
        })
    }
}

/// Solves every section once, and those in between where dimensions are interpolated.
///
/// # Errors
/// [`RouteError`] when the design is incomplete, a section is not solved, or dimensions that were asked for
/// cannot be interpolated.
///
/// # Examples
/// ```
/// use etchwise::study::*;
/// let spec: etchwise::geometry::NominalSpec = "circle diameter=100um".parse()?;
/// let section = RouteSection {
///     label: "circle".to_owned(),
///     outline: spec.outline()?,
///     nominal: Some(spec),
/// };
/// let station = |position| StationDesign { position, section: 0 };
/// let branch = BranchDesign {
///     name: String::new(),
///     count: 4,
///     interpolation: Interpolation::Automatic,
///     spread: None,
///     stations: vec![station(0.0), station(0.01)],
/// };
/// let segment = SegmentDesign { name: "fork".to_owned(), branches: vec![branch] };
/// let design = RouteDesign { segments: vec![segment], sections: vec![section] };
/// let route = solve_route(&design, &RouteOptions::default()).unwrap();
/// // K = pi d^4 / 128; four beside each other.
/// let exact = 0.01 / (std::f64::consts::PI * 1e-16 / 128.0) / 4.0;
/// assert!((route.integral.value / exact - 1.0).abs() < 1e-5);
/// # Ok::<(), etchwise::geometry::NominalError>(())
/// ```
pub fn solve_route(design: &RouteDesign, options: &RouteOptions) -> Result<Route, RouteError> {
    check(design)?;
    let solved: Vec<Result<RouteFlow, FlowError>> = design
        .sections
        .par_iter()
        .map(|section| RouteFlow::solve(&section.outline, options))
        .collect();
    let named = |index: usize, error: FlowError| RouteError::Flow {
        section: design.sections[index].label.clone(),
        error,
    };
    let flows = solved
        .into_iter()
        .enumerate()
        .map(|(index, flow)| flow.map_err(|error| named(index, error)))
        .collect::<Result<Vec<_>, _>>()?;
    let mut builder = Builder {
        sections: &design.sections,
        options,
        flows,
        ways: BTreeMap::new(),
    };
    let segments = design
        .segments
        .iter()
        .map(|segment| builder.segment(segment))
        .collect::<Result<Vec<_>, _>>()?;
    let sum = |f: fn(&RouteSegment) -> f64| segments.iter().map(f).sum();
    Ok(Route {
        integral: Estimate {
            value: sum(|s| s.integral.value),
            error: sum(|s| s.integral.error),
        },
        bounds: added(segments.iter().map(|s| (s.name.as_str(), &s.bounds, 1.0))),
        segments,
        flows: builder.flows,
    })
}

fn check(design: &RouteDesign) -> Result<(), RouteError> {
    let branches = design.segments.iter().flat_map(|s| &s.branches);
    let too_short = |b: &BranchDesign| b.stations.len() < 2 || b.count == 0;
    if design.segments.is_empty()
        || design.segments.iter().any(|s| s.branches.is_empty())
        || branches.clone().any(too_short)
    {
        return Err(RouteError::Empty);
    }
    for segment in &design.segments {
        for branch in &segment.branches {
            let mut before = f64::NEG_INFINITY;
            for (index, station) in branch.stations.iter().enumerate() {
                let rises = station.position.is_finite() && station.position > before;
                if !rises || station.section >= design.sections.len() {
                    return Err(RouteError::Station {
                        segment: segment.name.clone(),
                        station: index + 1,
                    });
                }
                before = station.position;
            }
        }
    }
    Ok(())
}

/// Bounds in series, each times its length; the first that is missing says why there is none.
fn added<'a>(
    parts: impl Iterator<Item = (&'a str, &'a Result<(f64, f64), String>, f64)>,
) -> Result<(f64, f64), String> {
    let mut sum = (0.0, 0.0);
    for (name, bounds, length) in parts {
        match bounds {
            Ok((low, high)) => sum = (sum.0 + low * length, sum.1 + high * length),
            Err(why) if name.is_empty() => return Err(why.clone()),
            Err(why) => return Err(format!("{name}: {why}")),
        }
    }
    Ok(sum)
}

struct Builder<'a> {
    sections: &'a [RouteSection],
    options: &'a RouteOptions,
    flows: Vec<RouteFlow>,
    /// Ways worked out already, by their ends and rule.
    ways: BTreeMap<(usize, usize, Interpolation), Between>,
}

impl Builder<'_> {
    fn segment(&mut self, design: &SegmentDesign) -> Result<RouteSegment, RouteError> {
        let mut branches = design
            .branches
            .iter()
            .map(|branch| self.branch(branch, &design.name))
            .collect::<Result<Vec<_>, _>>()?;
        let conductance: f64 = branches
            .iter()
            .map(|b| b.count as f64 / b.integral.value)
            .sum();
        for branch in &mut branches {
            branch.share = 1.0 / branch.integral.value / conductance;
        }
        // d(1/G) = sum of count share^2 dI.
        let error = |b: &RouteBranch| b.count as f64 * b.share * b.share * b.integral.error;
        Ok(RouteSegment {
            name: design.name.clone(),
            integral: Estimate {
                value: 1.0 / conductance,
                error: branches.iter().map(error).sum(),
            },
            bounds: beside(&branches),
            branches,
        })
    }

    fn branch(&mut self, design: &BranchDesign, segment: &str) -> Result<RouteBranch, RouteError> {
        let begin = design.stations.first().map_or(0.0, |s| s.position);
        let mut ways = Vec::new();
        let mut points: Vec<RoutePoint> = Vec::new();
        let (mut position, mut integral) = (0.0, 0.0);
        for (index, pair) in design.stations.windows(2).enumerate() {
            let length = pair[1].position - pair[0].position;
            let ends = [pair[0].section, pair[1].section];
            let way = self
                .way(ends, design.interpolation)
                .map_err(|error| match error {
                    Ok(reason) => RouteError::NotBetween {
                        segment: segment.to_owned(),
                        station: index + 1,
                        reason,
                    },
                    Err((section, error)) => RouteError::Flow {
                        section: self.sections[section].label.clone(),
                        error,
                    },
                })?;
            let last = way.nodes.len() - 1;
            let skipped = usize::from(index > 0);
            for (j, (&(share, flow), to)) in way
                .nodes
                .iter()
                .zip(&way.inverse_to)
                .enumerate()
                .skip(skipped)
            {
                let station = match j {
                    0 => Some(index),
                    j if j == last => Some(index + 1),
                    _ => None,
                };
                points.push(RoutePoint {
                    position: position + share * length,
                    flow,
                    station,
                    integral: integral + to * length,
                });
            }
            position += length;
            integral += way.mean_inverse.value * length;
            ways.push((way, length));
        }
        let sum = |f: fn(&Between) -> f64| ways.iter().map(|(way, l)| f(way) * l).sum::<f64>();
        Ok(RouteBranch {
            name: design.name.clone(),
            count: design.count,
            begin,
            length: position,
            spread: design.spread,
            integral: Estimate {
                value: integral,
                error: sum(|way| way.mean_inverse.error),
            },
            bounds: way_bounds(&ways),
            volume: sum(|way| way.mean_area),
            wall_area: sum(|way| way.mean_perimeter),
            inertance: sum(|way| way.mean_inertance),
            share: 1.0,
            points,
            ways,
        })
    }

    fn way(
        &mut self,
        ends: [usize; 2],
        rule: Interpolation,
    ) -> Result<Between, Result<String, (usize, FlowError)>> {
        let key = (ends[0], ends[1], rule);
        if let Some(way) = self.ways.get(&key) {
            return Ok(way.clone());
        }
        let way = Stretch {
            ends,
            sections: self.sections,
            flows: &mut self.flows,
            options: self.options,
        }
        .between(rule)?;
        self.ways.insert(key, way.clone());
        Ok(way)
    }
}

fn way_bounds(ways: &[(Between, f64)]) -> Result<(f64, f64), String> {
    let mut sum = (0.0, 0.0);
    for (index, (way, length)) in ways.iter().enumerate() {
        match &way.bounds {
            Ok((low, high)) => sum = (sum.0 + low * length, sum.1 + high * length),
            Err(why) => {
                return Err(format!(
                    "between stations {} and {}: {why}",
                    index + 1,
                    index + 2
                ));
            }
        }
    }
    Ok(sum)
}

/// Bounds of branches beside each other: `1/R` grows with each of theirs.
fn beside(branches: &[RouteBranch]) -> Result<(f64, f64), String> {
    let mut sum = (0.0, 0.0);
    for branch in branches {
        match &branch.bounds {
            Ok((low, high)) => {
                let count = branch.count as f64;
                sum = (sum.0 + count / low, sum.1 + count / high);
            }
            Err(why) if branch.name.is_empty() => return Err(why.clone()),
            Err(why) => return Err(format!("branch {}, {why}", branch.name)),
        }
    }
    Ok((1.0 / sum.0, 1.0 / sum.1))
}

impl Route {
    /// Volume of all branches, m^3.
    pub fn volume(&self) -> f64 {
        self.sum(|branch| branch.count as f64 * branch.volume)
    }

    /// Wall area of all branches, m^2; end faces are not counted.
    pub fn wall_area(&self) -> f64 {
        self.sum(|branch| branch.count as f64 * branch.wall_area)
    }

    /// Inertance over density, 1/m, with the flow split as the resistances split it.
    pub fn inertance(&self) -> f64 {
        self.sum(|branch| branch.count as f64 * branch.share.powi(2) * branch.inertance)
    }

    /// Length along the longest branch of every segment, m.
    pub fn length(&self) -> f64 {
        let longest = |s: &RouteSegment| s.branches.iter().map(|b| b.length).fold(0.0, f64::max);
        self.segments.iter().map(longest).sum()
    }

    /// `R / mu` with one law of `K` between all stations that differ, 1/m^3.
    pub fn integral_by(&self, law: LawOfK) -> f64 {
        let way = |(way, length): &(Between, f64)| {
            let ends = [way.nodes.first(), way.nodes.last()];
            let [k0, k1] = ends.map(|node| {
                let index = node.map_or(0, |&(_, index)| index);
                self.flows[index].flow.conductance.value
            });
            law.inverse(k0, k1, 1.0) * length
        };
        let branch = |b: &RouteBranch| b.count as f64 / b.ways.iter().map(way).sum::<f64>();
        self.segments
            .iter()
            .map(|s| 1.0 / s.branches.iter().map(branch).sum::<f64>())
            .sum()
    }

    /// Whether every section was solved as asked and every integral reached its tolerance.
    pub fn is_converged(&self) -> bool {
        let mut ways = self.branches().flat_map(|b| &b.ways);
        let solved = |f: &RouteFlow| f.flow.solver.converged && f.flow.accuracy.is_met;
        self.flows.iter().all(solved) && ways.all(|(way, _)| way.is_converged)
    }

    /// All branches in order.
    pub fn branches(&self) -> impl Iterator<Item = &RouteBranch> {
        self.segments.iter().flat_map(|s| &s.branches)
    }

    fn sum(&self, f: impl Fn(&RouteBranch) -> f64) -> f64 {
        self.branches().map(f).sum()
    }
}
