//! The search for a fit that is as good as asked: which degrees, and how many points.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::error::{PointError, ResponseError};
use super::family::{FamilyMember, ResponseFamily};
use super::fit::{ChebyshevFit, Tensor, indices};
use super::points::{chebyshev_points, fresh_points};
use super::{NUMERICAL_SHARE, ResponseErrors, ResponseOptions, ResponsePoint};
use crate::flow::{Goal, NearbySections, SolveOptions, solve_outline};

/// Points along each parameter of the first table.
const FIRST_NODES: usize = 5;
/// Most points along a parameter, by the number of parameters.
const MOST_NODES: [usize; 3] = [33, 17, 9];
/// Share of the fit error that terms left out of the formula may have together.
const LEFT_OUT: f64 = 0.05;

/// A family with what is asked of its table.
pub(super) struct Search<'a> {
    family: &'a ResponseFamily,
    options: ResponseOptions,
    /// Aim for the relative numerical error of each `K`.
    tolerance: f64,
    /// Scaled places of the fresh points.
    fresh_scaled: Vec<Vec<f64>>,
}

/// The best fit with what it rests on.
pub(super) struct Found {
    pub(super) nodes: Vec<usize>,
    pub(super) points: Vec<ResponsePoint>,
    pub(super) fresh: Vec<ResponsePoint>,
    pub(super) fit: ChebyshevFit,
    pub(super) errors: ResponseErrors,
}

/// A table with its scaled axes.
struct Table {
    nodes: Vec<usize>,
    axes: Vec<Vec<f64>>,
    points: Vec<ResponsePoint>,
    logarithms: Vec<f64>,
}

impl<'a> Search<'a> {
    /// Refuses ranges that hold a section which cannot be made, before anything is solved.
    pub(super) fn new(
        family: &'a ResponseFamily,
        options: ResponseOptions,
    ) -> Result<Self, ResponseError> {
        let axes = family.parameters.len();
        let search = Self {
            family,
            options,
            tolerance: NUMERICAL_SHARE * options.fit_error,
            fresh_scaled: fresh_points(options.fresh_points, axes),
        };
        let corners = indices(&vec![2; axes]);
        let scaled = corners.map(|index| index.iter().map(|&k| 2.0 * k as f64 - 1.0).collect());
        for place in scaled.collect::<Vec<Vec<f64>>>() {
            search.member(&search.values(&place))?;
        }
        Ok(search)
    }

    /// Adds degrees and points until the fit is as good as asked, or there are no more.
    pub(super) fn run(&self) -> Result<Found, ResponseError> {
        let axes = self.family.parameters.len();
        let most = MOST_NODES[axes.clamp(1, 3) - 1];
        let mut nodes = vec![FIRST_NODES; axes];
        let mut solved = BTreeMap::new();
        let mut fresh: Option<Vec<ResponsePoint>> = None;
        let mut best: Option<Found> = None;
        loop {
            let table = self.table(&nodes, most, &mut solved)?;
            let fresh = match &mut fresh {
                Some(fresh) => fresh,
                none => none.insert(self.solve_fresh()?),
            };
            let (found, full) = self.best_degrees(&table, fresh)?;
            let is_met = found.errors.is_met();
            let is_better = best
                .as_ref()
                .is_none_or(|b| found.errors.fit() < b.errors.fit());
            if is_better {
                best = Some(found);
            }
            let finer = (0..axes)
                .filter(|&axis| nodes[axis] < most)
                .max_by(|&a, &b| full.tail(a).total_cmp(&full.tail(b)));
            match (is_met, finer, best.take()) {
                (false, Some(axis), kept) => {
                    best = kept;
                    nodes[axis] = 2 * nodes[axis] - 1;
                }
                (_, _, Some(found)) => return Ok(found),
                (_, _, None) => {
                    return Err(ResponseError::Fit {
                        reason: "no fit was found",
                    });
                }
            }
        }
    }

    fn values(&self, scaled: &[f64]) -> Vec<f64> {
        let pairs = self.family.parameters.iter().zip(scaled);
        pairs.map(|(parameter, &t)| parameter.value_at(t)).collect()
    }

    fn error_at(&self, values: &[f64], source: PointError) -> ResponseError {
        ResponseError::Point {
            place: self.family.place(values),
            source: Box::new(source),
        }
    }

    fn member(&self, values: &[f64]) -> Result<FamilyMember, ResponseError> {
        let made = self.family.member(values);
        made.map_err(|source| self.error_at(values, source))
    }

    /// The table with these numbers of points; what was solved before is taken over.
    fn table(
        &self,
        nodes: &[usize],
        most: usize,
        solved: &mut BTreeMap<Vec<usize>, ResponsePoint>,
    ) -> Result<Table, ResponseError> {
        let axes: Vec<Vec<f64>> = nodes.iter().map(|&n| chebyshev_points(n)).collect();
        // Numbers in the finest table, in which all others are.
        let key = |index: &[usize]| -> Vec<usize> {
            let pairs = index.iter().zip(nodes);
            pairs.map(|(&k, &n)| k * (most - 1) / (n - 1)).collect()
        };
        let missing: Vec<(Vec<usize>, Vec<f64>)> = indices(nodes)
            .filter(|index| !solved.contains_key(&key(index)))
            .map(|index| {
                let place: Vec<f64> = index.iter().zip(&axes).map(|(&k, a)| a[k]).collect();
                (key(&index), self.values(&place))
            })
            .collect();
        let members: Vec<FamilyMember> = missing
            .par_iter()
            .map(|(_, values)| self.member(values))
            .collect::<Result<_, _>>()?;
        let new: Vec<Result<ResponsePoint, ResponseError>> = missing
            .par_iter()
            .zip(&members)
            .map(|((_, values), member)| self.solve(values, member))
            .collect();
        for ((key, _), point) in missing.into_iter().zip(new) {
            solved.insert(key, point?);
        }
        let points: Vec<ResponsePoint> = indices(nodes)
            .filter_map(|index| solved.get(&key(&index)).cloned())
            .collect();
        Ok(Table {
            nodes: nodes.to_vec(),
            logarithms: points.iter().map(|p| p.conductance.value.ln()).collect(),
            axes,
            points,
        })
    }

    /// Solves a section of the table, with its proven range.
    fn solve(&self, values: &[f64], member: &FamilyMember) -> Result<ResponsePoint, ResponseError> {
        let options = SolveOptions {
            goal: Goal::Estimated(self.tolerance),
            conductance_left_out: member.conductance_left_out,
            ..SolveOptions::default()
        };
        let mut flow = match solve_outline(&member.outline, &options) {
            Ok(solved) => solved.flow,
            Err(error) => return Err(self.error_at(values, error.into())),
        };
        let k = flow.conductance.value;
        if !(flow.solver.converged && k.is_finite() && k > 0.0) {
            return Err(self.error_at(values, PointError::Unfinished));
        }
        flow.conductance.error += member.conductance_left_out;
        Ok(ResponsePoint::new(values.to_vec(), &flow))
    }

    /// Solves the fresh points: `K` alone, without its proven range, where a grid for neighbours is good enough.
    fn solve_fresh(&self) -> Result<Vec<ResponsePoint>, ResponseError> {
        let places = &self.fresh_scaled;
        let made: Vec<(Vec<f64>, FamilyMember)> = places
            .par_iter()
            .map(|scaled| {
                let values = self.values(scaled);
                let member = self.member(&values)?;
                Ok((values, member))
            })
            .collect::<Result<_, _>>()?;
        let middle = self.values(&vec![0.0; self.family.parameters.len()]);
        let reference = self.member(&middle)?.outline;
        let nearby = NearbySections::new(&reference, self.tolerance)
            .map_err(|error| self.error_at(&middle, error.into()))?;
        let solved: Vec<Result<ResponsePoint, ResponseError>> = made
            .par_iter()
            .map(|(values, member)| {
                let FamilyMember {
                    outline,
                    conductance_left_out,
                } = member;
                let found = nearby.conductance(outline);
                let good = found.ok().filter(|k| k.relative() <= self.tolerance);
                let Some(mut conductance) = good else {
                    return self.solve(values, member);
                };
                conductance.error += conductance_left_out;
                let islands = outline.lumens.iter().map(|l| l.islands.len()).sum();
                Ok(ResponsePoint {
                    values: values.clone(),
                    conductance,
                    proven: Err("fresh points are solved without proof".to_owned()),
                    fitted: f64::NAN,
                    loops: [outline.lumens.len(), islands],
                })
            })
            .collect();
        solved.into_iter().collect()
    }

    /// The fit of lowest degrees that is as good as asked, or the best one; and the one of highest degrees.
    ///
    /// The degree that rises next is the one whose rise brings the fit nearest to the table.
    fn best_degrees(
        &self,
        table: &Table,
        fresh: &[ResponsePoint],
    ) -> Result<(Found, ChebyshevFit), ResponseError> {
        let mut degrees = vec![1; table.nodes.len()];
        let mut best: Option<Found> = None;
        loop {
            let found = self.judged(table, fresh, &degrees)?;
            let is_met = found.errors.is_met();
            if best
                .as_ref()
                .is_none_or(|b| found.errors.fit() < b.errors.fit())
            {
                best = Some(found);
            }
            let mut next: Option<(f64, Vec<usize>)> = None;
            for axis in (0..degrees.len()).filter(|&a| degrees[a] + 1 < table.nodes[a]) {
                let mut higher = degrees.clone();
                higher[axis] += 1;
                let misfit = misfit(table, &higher)?;
                if next.as_ref().is_none_or(|(least, _)| misfit < *least) {
                    next = Some((misfit, higher));
                }
            }
            match (next, best.take()) {
                (Some((_, higher)), kept) if !is_met => {
                    best = kept;
                    degrees = higher;
                }
                (_, Some(found)) => {
                    let highest: Vec<usize> = table.nodes.iter().map(|n| n - 1).collect();
                    return Ok((found, fit(table, &highest, 0.0)?));
                }
                (_, None) => {
                    return Err(ResponseError::Fit {
                        reason: "no degree was tried",
                    });
                }
            }
        }
    }

    /// A fit with all its errors.
    fn judged(
        &self,
        table: &Table,
        fresh: &[ResponsePoint],
        degrees: &[usize],
    ) -> Result<Found, ResponseError> {
        let slack = LEFT_OUT * self.options.fit_error;
        let fit = fit(table, degrees, slack)?;
        let with_fit = |points: &[ResponsePoint]| -> Vec<ResponsePoint> {
            let fitted = |p: &ResponsePoint| {
                let pairs = self.family.parameters.iter().zip(&p.values);
                let scaled: Vec<f64> = pairs.map(|(q, &v)| q.scaled(v)).collect();
                fit.value(&scaled).exp()
            };
            let points = points.iter();
            points
                .map(|p| ResponsePoint {
                    fitted: fitted(p),
                    ..p.clone()
                })
                .collect()
        };
        let (points, fresh) = (with_fit(&table.points), with_fit(fresh));
        let errors = self.errors(&points, &fresh);
        Ok(Found {
            nodes: table.nodes.clone(),
            points,
            fresh,
            fit,
            errors,
        })
    }

    fn errors(&self, points: &[ResponsePoint], fresh: &[ResponsePoint]) -> ResponseErrors {
        let largest = |list: &[ResponsePoint]| {
            let off = list.iter().map(|p| p.relative_difference().abs());
            off.fold(0.0, f64::max)
        };
        let squares: f64 = fresh.iter().map(|p| p.relative_difference().powi(2)).sum();
        let all = points.iter().chain(fresh);
        let widths: Option<Vec<f64>> = points.iter().map(ResponsePoint::proven_width).collect();
        ResponseErrors {
            asked: self.options.fit_error,
            fresh: largest(fresh),
            fresh_mean_square: (squares / fresh.len().max(1) as f64).sqrt(),
            table: largest(points),
            numerical: all.map(|p| p.conductance.relative()).fold(0.0, f64::max),
            proven_width: widths.map(|w| w.into_iter().fold(0.0, f64::max)),
        }
    }
}

/// The least-squares fit of a table.
fn fit(table: &Table, degrees: &[usize], slack: f64) -> Result<ChebyshevFit, ResponseError> {
    let tensor = Tensor {
        axes: &table.axes,
        values: &table.logarithms,
    };
    ChebyshevFit::new(tensor, degrees, slack)
}

/// Largest difference between the logarithms of table and fit.
fn misfit(table: &Table, degrees: &[usize]) -> Result<f64, ResponseError> {
    let fit = fit(table, degrees, 0.0)?;
    let off = indices(&table.nodes)
        .zip(&table.logarithms)
        .map(|(index, ln_k)| {
            let place: Vec<f64> = index.iter().zip(&table.axes).map(|(&k, a)| a[k]).collect();
            (fit.value(&place) - ln_k).abs()
        });
    Ok(off.fold(0.0, f64::max))
}
