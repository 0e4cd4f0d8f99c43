//! The reference line that is taken off a trace.
//!
//! A line `p(x)` is fitted to the reference zones and subtracted: `z - p(x)`. That is what drift needs; a
//! specimen that really lies at an angle `t` is read too deep by `1 / cos t` and too narrow by `cos t`
//! (0.004 % at half a degree, 0.4 % at five degrees), which the step says.

use nalgebra::{DMatrix, DVector};

use super::correction_options::{CorrectionOptions, LineFit};
use super::lands::piecewise;
use super::profile::{Profile, Zone};
use super::robust_line::{Line, bisquare, least_squares_line, robust_line, spread};
use super::step_height::indices;
use super::trace_problem::{FEWEST_IN_ZONE, TraceProblem};

/// Samples of one reference zone.
struct ZoneSamples {
    x: Vec<f64>,
    z: Vec<f64>,
    /// Weight of each sample against the zone's own line.
    weights: Vec<f64>,
    /// The zone's own line.
    line: Line,
}

/// A polynomial in Legendre functions of `(x - middle) / half`.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Polynomial {
    middle: f64,
    half: f64,
    coefficients: Vec<f64>,
}

impl Polynomial {
    /// Its height at `x`.
    pub(super) fn at(&self, x: f64) -> f64 {
        let basis = legendre((x - self.middle) / self.half);
        let terms = self.coefficients.iter().zip(basis);
        terms.map(|(factor, term)| factor * term).sum()
    }
}

/// The Legendre polynomials of degree 0 to 5 at `u`.
fn legendre(u: f64) -> [f64; 6] {
    let mut values = [1.0, u, 0.0, 0.0, 0.0, 0.0];
    for n in 1..5 {
        let degree = n as f64;
        values[n + 1] =
            ((2.0 * degree + 1.0) * u * values[n] - degree * values[n - 1]) / (degree + 1.0);
    }
    values
}

/// What was taken off.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Curve {
    /// One polynomial.
    Polynomial(Polynomial),
    /// Straight from knot to knot.
    Pieces(Vec<(f64, f64)>),
}

/// A fitted reference.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Reference {
    /// The line.
    pub(super) curve: Curve,
    /// Root mean square distance of all zone samples from it, m.
    pub(super) rms: f64,
    /// Distance of each zone as a whole from it, m.
    pub(super) offsets: Vec<f64>,
    /// How far the reference may bend between two knots beyond a straight line, m: an eighth of the
    /// largest second difference of neighbouring knots; zero for one polynomial.
    pub(super) bend: f64,
    /// Where there are exactly two zones: how far the second lies above the line that prolongs the slope
    /// which both zones show, and the uncertainty of that, m.
    pub(super) second_above_first: Option<(f64, f64)>,
}

impl Reference {
    /// Heights at positions.
    pub(super) fn heights(&self, x: &[f64]) -> Vec<f64> {
        match &self.curve {
            Curve::Polynomial(polynomial) => x.iter().map(|x| polynomial.at(*x)).collect(),
            Curve::Pieces(knots) => piecewise(knots, x),
        }
    }

    /// Largest difference of two neighbouring zones in their distance from the line, m.
    pub(super) fn largest_step(&self) -> f64 {
        let steps = self.offsets.windows(2).map(|pair| pair[1] - pair[0]);
        steps.fold(0.0, |largest, step| largest.max(step.abs()))
    }

    /// Largest distance of a zone from the line, m.
    pub(super) fn worst(&self) -> f64 {
        self.offsets.iter().fold(0.0, |worst, o| worst.max(o.abs()))
    }
}

/// Fits the reference to zones of the samples that have a height and are no spike.
///
/// - `local`: from zone to zone instead of one polynomial of degree `options.bow`
/// - `option`: name of the option that stated the zones, for messages
pub(super) fn fit_reference(
    good: &Profile,
    zones: &[Zone],
    options: &CorrectionOptions,
    local: bool,
    option: &'static str,
) -> Result<Reference, TraceProblem> {
    let blocks = (4000 / zones.len().max(1)).clamp(25, 150);
    let samples: Vec<ZoneSamples> = zones
        .iter()
        .map(|zone| zone_samples(good, *zone, options.fit, blocks, option))
        .collect::<Result<_, _>>()?;
    let curve = if local && samples.len() > 1 {
        Curve::Pieces(
            samples
                .iter()
                .map(|s| (s.line.middle, s.line.level))
                .collect(),
        )
    } else {
        let degree = usize::from(options.bow);
        let found = polynomial(&samples, degree, options.fit);
        Curve::Polynomial(found.ok_or_else(|| TraceProblem::BowUndetermined {
            degree: options.bow,
            zones: samples.len(),
            samples: samples.iter().map(|s| s.x.len()).sum(),
        })?)
    };
    let mut reference = Reference {
        curve,
        rms: 0.0,
        offsets: Vec::new(),
        bend: 0.0,
        second_above_first: second_above_first(&samples),
    };
    let (mut squares, mut count) = (0.0, 0.0);
    for zone in &samples {
        let (mut sum, mut weight) = (0.0, 0.0);
        let heights = reference.heights(&zone.x);
        for ((z, r), w) in zone.z.iter().zip(&heights).zip(&zone.weights) {
            squares += (z - r) * (z - r);
            sum += w * (z - r);
            weight += w;
        }
        count += zone.z.len() as f64;
        reference.offsets.push(sum / weight);
    }
    reference.rms = (squares / count).sqrt();
    if let Curve::Pieces(knots) = &reference.curve {
        reference.bend = largest_bend(knots);
    }
    Ok(reference)
}

/// An eighth of the largest second difference: the height of an arc over the chord between two knots.
fn largest_bend(knots: &[(f64, f64)]) -> f64 {
    let bends = knots.windows(3).map(|three| {
        let [(x0, z0), (x1, z1), (x2, z2)] = [three[0], three[1], three[2]];
        let (before, after) = ((z1 - z0) / (x1 - x0), (z2 - z1) / (x2 - x1));
        (after - before).abs() * 0.5 * (x2 - x0) / 8.0
    });
    bends.fold(0.0, f64::max)
}

/// Samples and own line of a zone.
fn zone_samples(
    good: &Profile,
    zone: Zone,
    fit: LineFit,
    blocks: usize,
    option: &'static str,
) -> Result<ZoneSamples, TraceProblem> {
    let (first, last) = indices(good, zone);
    let (x, z) = (&good.x[first..last], &good.z[first..last]);
    let line = match fit {
        LineFit::Robust => robust_line(x, z, blocks),
        LineFit::LeastSquares => least_squares_line(x, z),
    };
    let line = line.filter(|_| x.len() >= FEWEST_IN_ZONE);
    let line = line.ok_or(TraceProblem::ZoneEmpty {
        option,
        from: zone.from,
        to: zone.to,
        samples: x.len(),
    })?;
    let weights: Vec<f64> = match fit {
        LineFit::LeastSquares => vec![1.0; x.len()],
        LineFit::Robust => {
            // Rounding of exact data is no reason to leave a sample out.
            let least = 1e-12
                * line
                    .level
                    .abs()
                    .max(line.slope.abs() * (zone.to - zone.from));
            let scatter = line.scatter.max(least).max(f64::MIN_POSITIVE);
            let rests = x.iter().zip(z).map(|(x, z)| z - line.at(*x));
            rests.map(|rest| bisquare(rest, scatter)).collect()
        }
    };
    if weights.iter().sum::<f64>() <= 0.0 {
        return Ok(ZoneSamples {
            weights: vec![1.0; x.len()],
            x: x.to_vec(),
            z: z.to_vec(),
            line,
        });
    }
    Ok(ZoneSamples {
        x: x.to_vec(),
        z: z.to_vec(),
        weights,
        line,
    })
}

/// Weighted normal equations of one zone.
struct NormalEquations {
    matrix: DMatrix<f64>,
    right: DVector<f64>,
}

/// The polynomial of a degree through zones; `None` where they do not fix it.
fn polynomial(samples: &[ZoneSamples], degree: usize, fit: LineFit) -> Option<Polynomial> {
    let start = *samples.first()?.x.first()?;
    let end = *samples.last()?.x.last()?;
    let half = 0.5 * (end - start);
    let middle = start + half;
    let size = degree + 1;
    let equations: Vec<NormalEquations> = samples
        .iter()
        .map(|zone| {
            let mut matrix = DMatrix::zeros(size, size);
            let mut right = DVector::zeros(size);
            for ((x, z), w) in zone.x.iter().zip(&zone.z).zip(&zone.weights) {
                let basis = legendre((x - middle) / half);
                for row in 0..size {
                    right[row] += w * basis[row] * z;
                    for column in 0..=row {
                        matrix[(row, column)] += w * basis[row] * basis[column];
                    }
                }
            }
            matrix.fill_upper_triangle_with_lower_triangle();
            NormalEquations { matrix, right }
        })
        .collect();
    let mut weights = vec![1.0; equations.len()];
    let mut found = solved(&equations, &weights, size)?;
    if fit == LineFit::Robust && equations.len() >= size + 2 {
        let rests = rests_of_zones(
            &equations,
            &start_line(samples, &found, degree, (middle, half)),
        );
        let scatter = spread(&rests, f64::MIN_POSITIVE);
        let typical = samples.iter().map(|s| s.line.scatter).fold(0.0, f64::max);
        // Rounding of exact data is no reason to leave a zone out.
        let highest = samples.iter().map(|s| s.line.level.abs());
        let least = 1e-12 * highest.fold(0.0, f64::max);
        let scatter = scatter.max(typical).max(least);
        weights = rests.iter().map(|rest| bisquare(*rest, scatter)).collect();
        for _ in 0..10 {
            found = solved(&equations, &weights, size)?;
            let rests = rests_of_zones(&equations, &found);
            weights = rests.iter().map(|rest| bisquare(*rest, scatter)).collect();
        }
        found = solved(&equations, &weights, size)?;
    }
    Some(Polynomial {
        middle,
        half,
        coefficients: found.iter().copied().collect(),
    })
}

/// Where the weighing of zones starts: the repeated median of the zones for a line; for a bow, what
/// least squares gave.
fn start_line(
    samples: &[ZoneSamples],
    found: &DVector<f64>,
    degree: usize,
    (middle, half): (f64, f64),
) -> DVector<f64> {
    if degree > 1 {
        return found.clone();
    }
    let x: Vec<f64> = samples.iter().map(|s| s.line.middle).collect();
    let z: Vec<f64> = samples.iter().map(|s| s.line.level).collect();
    match robust_line(&x, &z, 300) {
        Some(line) => DVector::from_vec(vec![line.at(middle), line.slope * half]),
        None => found.clone(),
    }
}

/// Weighted sum of the zones' equations, solved.
fn solved(equations: &[NormalEquations], weights: &[f64], size: usize) -> Option<DVector<f64>> {
    let mut matrix = DMatrix::zeros(size, size);
    let mut right = DVector::zeros(size);
    for (equation, &w) in equations.iter().zip(weights) {
        matrix += &equation.matrix * w;
        right += &equation.right * w;
    }
    if !matrix
        .iter()
        .chain(right.iter())
        .all(|value| value.is_finite())
    {
        return None;
    }
    let decomposition = matrix.svd(true, true);
    let largest = decomposition.singular_values.max();
    let smallest = decomposition.singular_values.min();
    if smallest.is_nan() || smallest <= 1e-11 * largest {
        return None;
    }
    let found = decomposition.solve(&right, 0.0).ok()?;
    found.iter().all(|value| value.is_finite()).then_some(found)
}

/// Mean distance of each zone from a polynomial.
fn rests_of_zones(equations: &[NormalEquations], found: &DVector<f64>) -> Vec<f64> {
    equations
        .iter()
        .map(|e| (e.right[0] - e.matrix.row(0).transpose().dot(found)) / e.matrix[(0, 0)])
        .collect()
}

/// How far the second of two zones lies above the slope that both show by themselves, with its
/// uncertainty from the difference of the two slopes and from their scatter.
fn second_above_first(samples: &[ZoneSamples]) -> Option<(f64, f64)> {
    let [first, second] = samples else {
        return None;
    };
    let strength = |zone: &ZoneSamples| {
        let squares = zone.x.iter().map(|x| (x - zone.line.middle).powi(2));
        squares.sum::<f64>()
    };
    let (a, b) = (strength(first), strength(second));
    let slope = (a * first.line.slope + b * second.line.slope) / (a + b);
    let distance = second.line.middle - first.line.middle;
    let above = second.line.level - first.line.level - slope * distance;
    // Neighbouring samples of a stylus are not independent; ten to one is a cautious ratio.
    let of_scatter = |zone: &ZoneSamples, s: f64| 10.0 * zone.line.scatter.powi(2) / s;
    let from_scatter =
        (a * a * of_scatter(first, a) + b * b * of_scatter(second, b)).sqrt() / (a + b);
    let from_difference = 0.5 * (first.line.slope - second.line.slope).abs();
    let uncertainty = distance * from_scatter.hypot(from_difference);
    (above.is_finite() && uncertainty.is_finite()).then_some((above, uncertainty))
}
