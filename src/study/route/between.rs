//! What lies between two stations: the mean of `1/K`, proven values around it, area and wall.

use rayon::prelude::*;

use super::branch::RouteFlow;
use super::design::{NoDimensions, RouteOptions, RouteSection};
use super::interpolation::{Interpolation, LawOfK};
use super::nesting::nested;
use super::sampled::{chebyshev_points, integral};
use crate::flow::FlowError;
use crate::geometry::Outline;
use crate::measured::Estimate;

/// Orders tried, each with the points of the one before.
const ORDERS: [usize; 6] = [2, 4, 8, 16, 32, 64];
/// Order after which a mean that has not settled is given up.
const LAST_ORDER: usize = 16;

/// The rule that was used.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum UsedRule {
    /// Both stations have the same section.
    Constant,
    /// Dimensions in proportion, sections in between solved.
    Dimensions,
    /// A law for `K`.
    Law(LawOfK),
}

impl UsedRule {
    /// The word for it in outputs.
    pub fn word(self) -> &'static str {
        match self {
            Self::Constant => "constant",
            Self::Dimensions => "dimensions",
            Self::Law(law) => law.word(),
        }
    }
}

/// The way from one section to another, over a length of 1.
#[derive(Debug, Clone, PartialEq)]
pub struct Between {
    /// How `K` goes.
    pub used: UsedRule,
    /// Why dimensions were not interpolated, where they were not.
    pub why: Option<String>,
    /// Solved sections, ends included: share of the way and index into the flows of the route.
    pub nodes: Vec<(f64, usize)>,
    /// Integral of `1/K` up to each of them, 1/m^4.
    pub inverse_to: Vec<f64>,
    /// Mean of `1/K`, 1/m^4.
    pub mean_inverse: Estimate,
    /// Proven low and high value of it, or why there is none.
    pub bounds: Result<(f64, f64), String>,
    /// Mean flow area, m^2.
    pub mean_area: f64,
    /// Mean wetted perimeter, m.
    pub mean_perimeter: f64,
    /// Mean of momentum factor over area, 1/m^2.
    pub mean_inertance: f64,
    /// Whether the integral reached its tolerance.
    pub is_converged: bool,
}

/// The two ends and all flows solved so far; sections in between are added.
pub(super) struct Stretch<'a> {
    /// Indices of the sections, which are those of their flows.
    pub(super) ends: [usize; 2],
    pub(super) sections: &'a [RouteSection],
    pub(super) flows: &'a mut Vec<RouteFlow>,
    pub(super) options: &'a RouteOptions,
}

impl Stretch<'_> {
    /// The way by a rule; `Err(Ok)` is why dimensions that were asked for cannot be interpolated.
    pub(super) fn between(
        &mut self,
        rule: Interpolation,
    ) -> Result<Between, Result<String, (usize, FlowError)>> {
        let [first, last] = self.ends;
        if first == last {
            return Ok(self.constant());
        }
        let law = match rule {
            Interpolation::Law(law) => return Ok(self.by_law(law, None)),
            Interpolation::Automatic => Some(LawOfK::CubeRoot),
            Interpolation::Dimensions => None,
        };
        match (self.outlines(&chebyshev_points(self.highest())), law) {
            (Ok(outlines), _) => self
                .by_dimensions(&outlines)
                .map_err(|error| Err((first, error))),
            (Err(reason), Some(law)) => Ok(self.by_law(law, Some(reason.to_string()))),
            (Err(reason), None) => Err(Ok(reason.to_string())),
        }
    }

    /// Order that may be needed: to settle, or for as many sections as were asked for.
    fn highest(&self) -> usize {
        let asked = self.options.least_between;
        let enough = ORDERS.into_iter().find(|order| *order > asked);
        enough.unwrap_or(ORDERS[5]).max(LAST_ORDER)
    }

    fn flow(&self, index: usize) -> &RouteFlow {
        &self.flows[index]
    }

    fn constant(&self) -> Between {
        let [index, _] = self.ends;
        let flow = &self.flow(index).flow;
        let k = flow.conductance;
        let inverse = 1.0 / k.value;
        let bounds = flow.bracket.as_ref().map_err(ToString::to_string);
        Between {
            used: UsedRule::Constant,
            why: None,
            nodes: vec![(0.0, index), (1.0, index)],
            inverse_to: vec![0.0, inverse],
            mean_inverse: Estimate {
                value: inverse,
                error: inverse * k.relative(),
            },
            bounds: bounds.map(|b| (1.0 / b.high, 1.0 / b.low)),
            mean_area: flow.geometry.area,
            mean_perimeter: flow.geometry.wetted_perimeter,
            mean_inertance: flow.momentum_factor.value / flow.geometry.area,
            is_converged: true,
        }
    }

    fn by_law(&self, law: LawOfK, why: Option<String>) -> Between {
        let [first, last] = self.ends;
        let nodes = vec![(0.0, first), (1.0, last)];
        let [a, b] = [first, last].map(|index| &self.flow(index).flow);
        let (k0, k1) = (a.conductance, b.conductance);
        let mean = law.inverse(k0.value, k1.value, 1.0);
        // Area and perimeter change evenly, beta as well.
        let half = |f: fn(&crate::flow::SectionFlow) -> f64| 0.5 * (f(a) + f(b));
        let middle = half(|f| f.momentum_factor.value) / half(|f| f.geometry.area);
        let ends = half(|f| f.momentum_factor.value / f.geometry.area);
        Between {
            used: UsedRule::Law(law),
            why,
            inverse_to: vec![0.0, mean],
            mean_inverse: Estimate {
                value: mean,
                error: mean * k0.relative().max(k1.relative()),
            },
            bounds: self.bounds(&nodes),
            nodes,
            mean_area: half(|f| f.geometry.area),
            mean_perimeter: half(|f| f.geometry.wetted_perimeter),
            // Simpson's rule.
            mean_inertance: (ends + 2.0 * middle) / 3.0,
            is_converged: true,
        }
    }

    /// Outlines at shares of the way.
    fn outlines(&self, shares: &[f64]) -> Result<Vec<Outline>, NoDimensions> {
        let [first, last] = self.ends.map(|index| self.sections[index].nominal.as_ref());
        let (Some(first), Some(last)) = (first, last) else {
            return Err(NoDimensions::Outline);
        };
        shares
            .iter()
            .map(|&share| {
                let spec = first.between(last, share);
                let outline = spec.map_err(NoDimensions::NotBetween)?.outline();
                let outline = outline.map_err(NoDimensions::Drawing)?;
                Ok(outline.without_duplicate_vertices().0)
            })
            .collect()
    }

    /// Solves sections in between until the integral rests.
    ///
    /// - `outlines`: at the Chebyshev points of the highest order
    fn by_dimensions(&mut self, outlines: &[Outline]) -> Result<Between, FlowError> {
        let highest = outlines.len() - 1;
        let mut at: Vec<Option<usize>> = vec![None; outlines.len()];
        at[0] = Some(self.ends[0]);
        at[highest] = Some(self.ends[1]);
        let mut before: Option<f64> = None;
        let mut found = None;
        for order in ORDERS.into_iter().filter(|order| *order <= highest) {
            let step = highest / order;
            let missing: Vec<usize> = (0..=order)
                .map(|j| j * step)
                .filter(|&j| at[j].is_none())
                .collect();
            let options = self.options;
            let solved: Vec<Result<RouteFlow, FlowError>> = missing
                .par_iter()
                .map(|&j| RouteFlow::solve(&outlines[j], options))
                .collect();
            for (j, flow) in missing.into_iter().zip(solved) {
                at[j] = Some(self.flows.len());
                self.flows.push(flow?);
            }
            let indices = at.iter().step_by(step).flatten().copied();
            let nodes: Vec<(f64, usize)> =
                chebyshev_points(order).into_iter().zip(indices).collect();
            let way = self.sampled(nodes, before);
            before = Some(way.mean_inverse.value);
            let is_done = way.is_converged && order > self.options.least_between;
            found = Some(way);
            if is_done {
                break;
            }
        }
        // ORDERS is not empty.
        Ok(found.unwrap_or_else(|| self.by_law(LawOfK::CubeRoot, None)))
    }

    /// The way through solved sections; `before` is the mean of `1/K` with fewer of them.
    fn sampled(&self, nodes: Vec<(f64, usize)>, before: Option<f64>) -> Between {
        let flows = || nodes.iter().map(|&(_, index)| &self.flow(index).flow);
        let roots: Vec<f64> = flows().map(|f| f.conductance.value.cbrt()).collect();
        let areas: Vec<f64> = flows().map(|f| f.geometry.area).collect();
        let walls: Vec<f64> = flows().map(|f| f.geometry.wetted_perimeter).collect();
        let inertances: Vec<f64> = flows()
            .map(|f| f.momentum_factor.value / f.geometry.area)
            .collect();
        let numerical = flows()
            .map(|f| f.conductance.relative())
            .fold(0.0, f64::max);
        let low = roots.iter().copied().fold(f64::INFINITY, f64::min);
        // A polynomial that swings far below all its values is not believed.
        let inverse = |share: f64| integral(&roots, share, |c| c.max(0.5 * low).powi(-3));
        let mean = inverse(1.0);
        let change = before.map_or(f64::INFINITY, |b| (mean / b - 1.0).abs());
        let settled = if change.is_finite() { change } else { 1.0 };
        Between {
            used: UsedRule::Dimensions,
            why: None,
            inverse_to: nodes.iter().map(|&(share, _)| inverse(share)).collect(),
            mean_inverse: Estimate {
                value: mean,
                error: mean * (settled + numerical),
            },
            bounds: self.bounds(&nodes),
            nodes,
            mean_area: integral(&areas, 1.0, |a| a),
            mean_perimeter: integral(&walls, 1.0, |p| p),
            mean_inertance: integral(&inertances, 1.0, |i| i),
            // More sections cannot settle what the grids leave open.
            is_converged: change <= self.options.integral_tolerance.max(numerical),
        }
    }

    /// Proven values of the mean of `1/K` from the sections, each inside the next or around it.
    fn bounds(&self, nodes: &[(f64, usize)]) -> Result<(f64, f64), String> {
        let (mut low, mut high) = (0.0, 0.0);
        for pair in nodes.windows(2) {
            let [(from, a), (to, b)] = [pair[0], pair[1]];
            let [a, b] = [a, b].map(|index| self.flow(index));
            let is_rising = a.flow.geometry.area <= b.flow.geometry.area;
            let (small, large) = if is_rising { (a, b) } else { (b, a) };
            let inside = nested(&small.outline, &large.outline).map_err(|why| {
                format!("the smaller section is not inside the larger one: {why}")
            })?;
            let small = small.flow.bracket.as_ref().map_err(ToString::to_string)?;
            let large = large.flow.bracket.as_ref().map_err(ToString::to_string)?;
            low += (to - from) / large.high;
            high += (to - from) / (small.low * inside.factor);
        }
        Ok((low, high))
    }
}
