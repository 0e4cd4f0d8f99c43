//! Wall shear per pressure gradient as a curve along every loop of the wall.
//!
//! Every loop is cut at its corners into stretches (module `wall_stretch`). The curve is smooth on a
//! stretch, zero at a convex corner, and without bound at a re-entrant one, where it follows the law of
//! the corner (module `corner_law`) rather than the grid. A factor that changes slowly along the loop then makes
//! it carry the fluxes into the wall that the cells next to it balance (modules `wall_flux`, `wall_balance`).

use crate::geometry::{Corner, Outline, Point};

use super::corner_law::CornerLaw;
use super::section_flow::WallSample;
use super::wall_balance::BalanceFactor;
use super::wall_flux::WallFlux;
use super::wall_path::{WallPath, taken_round, way_forward};
use super::wall_quadrature::GAUSS_2;
use super::wall_statistics::WallReport;
use super::wall_stretch::{Samples, Stretch};

/// Length beside a singular corner over which the mean stands for the shear, in hydraulic diameters.
pub const SINGULAR_LENGTH: f64 = 0.05;

/// The curve of all loops.
#[derive(Debug, Clone, PartialEq)]
pub struct WallCurve {
    /// One per loop, in the order of [`Outline::loops`].
    pub loops: Vec<LoopCurve>,
    /// Length beside a singular corner over which the mean stands for the shear, m.
    pub singular_length: f64,
}

/// The curve of one loop.
#[derive(Debug, Clone, PartialEq)]
pub struct LoopCurve {
    /// Points in order of arc length, from the first vertex. A corner is entered twice, once with the
    /// normal of either side.
    pub points: Vec<CurvePoint>,
    pub(crate) path: WallPath,
    pub(crate) stretches: Vec<Stretch>,
    /// Spacing of the lattice, m.
    pub(crate) spacing: f64,
    /// What the curve of the stretches is multiplied by.
    pub(crate) factor: BalanceFactor,
    /// Integral of the curve once round, m^2, as it was balanced.
    pub(crate) received: f64,
}

/// One point of the curve.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CurvePoint {
    /// Arc length from the first vertex of the loop, m.
    pub arc_length: f64,
    /// Position, m.
    pub at: Point,
    /// Unit normal of the outline, out of the fluid.
    pub normal: Point,
    /// `abs(dphi/dn)`, m; at a singular corner its mean over [`WallCurve::singular_length`] on that side,
    /// or over half the stretch where that is shorter.
    pub shear_per_gradient: f64,
    /// What kind of point.
    pub kind: PointKind,
}

/// Kind of a point of the curve.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PointKind {
    /// On a smooth stretch.
    Regular,
    /// A corner with a fluid angle below 180 degrees: no shear.
    ConvexCorner,
    /// A corner with a fluid angle above 180 degrees: shear without bound.
    SingularCorner,
}

/// A place on the wall, as the weight of an integral sees it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WallPlace {
    /// Index of the loop, in the order of [`Outline::loops`].
    pub loop_index: usize,
    /// Arc length from the first vertex of the loop, m.
    pub arc_length: f64,
    /// Position on the outline, m.
    pub at: Point,
    /// Unit normal of the outline's own edge, out of the fluid.
    pub normal: Point,
}

/// What is known of the shear along the wall.
pub(crate) struct ShearSources<'a> {
    /// Slopes along lattice lines, sorted by loop and arc length.
    pub(crate) samples: &'a [WallSample],
    /// Of every loop, arc lengths and shear beside corners that are free of the grid's error, sorted, m.
    pub(crate) layer: &'a [Vec<(f64, f64)>],
    /// Of every loop and corner, the laws of the sides after and before it where they are known.
    pub(crate) laws: &'a [Vec<Option<[CornerLaw; 2]>>],
}

/// The same of one loop, slopes as arc length and shear.
struct LoopSources<'a> {
    slopes: Vec<(f64, f64)>,
    layer: &'a [(f64, f64)],
    laws: &'a [Option<[CornerLaw; 2]>],
}

impl ShearSources<'_> {
    fn of_loop(&self, index: usize) -> LoopSources<'_> {
        let first = self.samples.partition_point(|s| s.loop_index < index);
        let end = self.samples.partition_point(|s| s.loop_index <= index);
        let own = self.samples[first..end].iter();
        LoopSources {
            slopes: own.map(|s| (s.arc_length, s.shear_per_gradient)).collect(),
            layer: self.layer.get(index).map_or(&[], Vec::as_slice),
            laws: self.laws.get(index).map_or(&[], Vec::as_slice),
        }
    }
}

impl WallCurve {
    /// The curve from samples.
    ///
    /// - `corners`: of every loop; `samples`: sorted by loop and arc length; `spacing`: of the lattice, m
    pub fn new(
        outline: &Outline,
        corners: &[Vec<Corner>],
        samples: &[WallSample],
        spacing: f64,
    ) -> Self {
        let sources = ShearSources {
            samples,
            layer: &[],
            laws: &[],
        };
        Self::from_sources(outline, corners, &sources, spacing).with_points()
    }

    /// The curve from all that is known of the shear, still without its points.
    pub(crate) fn from_sources(
        outline: &Outline,
        corners: &[Vec<Corner>],
        sources: &ShearSources<'_>,
        spacing: f64,
    ) -> Self {
        let singular_length = SINGULAR_LENGTH * 4.0 * outline.area() / outline.wetted_perimeter();
        let loops: Vec<LoopCurve> = outline
            .loops()
            .enumerate()
            .map(|(index, wall)| {
                let path = WallPath::new(wall);
                let length = path.length();
                let corners = corners.get(index).map_or(&[][..], Vec::as_slice);
                let stretches = stretches(&path, corners, &sources.of_loop(index), spacing);
                LoopCurve {
                    points: Vec::new(),
                    path,
                    stretches,
                    spacing,
                    factor: BalanceFactor::with_marks(length, f64::INFINITY, &[]),
                    received: f64::NAN,
                }
            })
            .collect();
        Self {
            loops,
            singular_length,
        }
    }
}

impl WallCurve {
    /// Gives every loop the factor that makes it carry the fluxes into the wall; returns also the integral over the
    /// wall before, m^2.
    pub(super) fn balanced(mut self, fluxes: &[WallFlux]) -> (Self, f64) {
        let mut by_loop: Vec<Vec<WallFlux>> = vec![Vec::new(); self.loops.len()];
        for flux in fluxes {
            if let Some(own) = by_loop.get_mut(flux.loop_index) {
                own.push(*flux);
            }
        }
        let mut plain = 0.0;
        for (along, own) in self.loops.iter_mut().zip(by_loop) {
            plain += along.balance(&own);
        }
        (self, plain)
    }

    /// Puts the points on the finished curve.
    pub(super) fn with_points(mut self) -> Self {
        for along in &mut self.loops {
            along.points = along.collect_points(self.singular_length);
        }
        self
    }

    /// The point with the largest shear; nearer to a singular corner than
    /// [`WallCurve::singular_length`], the corner's own entry stands for the curve.
    pub fn largest(&self) -> Option<CurvePoint> {
        let compare = |a: &&CurvePoint, b: &&CurvePoint| {
            a.shear_per_gradient.total_cmp(&b.shear_per_gradient)
        };
        let per_loop = self.loops.iter().filter_map(|along| {
            let point = along.bounded(self.singular_length).max_by(compare)?;
            Some(match point.kind {
                PointKind::Regular => along.summit(point),
                _ => *point,
            })
        });
        // Of equal ones the first.
        per_loop.reduce(|best, point| {
            if point.shear_per_gradient > best.shear_per_gradient {
                point
            } else {
                best
            }
        })
    }
}

/// The stretches of a loop in order of their starts; the first may start after the last ends past the
/// first vertex.
fn stretches(
    path: &WallPath,
    corners: &[Corner],
    sources: &LoopSources<'_>,
    spacing: f64,
) -> Vec<Stretch> {
    let samples = &sources.slopes;
    let total = path.length();
    if corners.is_empty() {
        return vec![Stretch::closed(total, samples, spacing)];
    }
    let nearest = |s: f64| {
        let apart = |a: f64| {
            let d = taken_round(a - s, total);
            d.min(total - d)
        };
        samples
            .iter()
            .min_by(|a, b| apart(a.0).total_cmp(&apart(b.0)))
            .map_or(0.0, |sample| sample.1)
    };
    (0..corners.len())
        .map(|k| {
            let (from, to) = (&corners[k], &corners[(k + 1) % corners.len()]);
            let start = from.arc_length;
            let length = way_forward(start, to.arc_length, total);
            let within = |all: &[(f64, f64)]| -> Vec<(f64, f64)> {
                [0.0, total]
                    .into_iter()
                    .flat_map(|turn| {
                        let low = all.partition_point(|s| s.0 + turn - start <= 0.0);
                        let high = all.partition_point(|s| s.0 + turn - start < length);
                        let here = all.get(low..high).unwrap_or(&[]);
                        here.iter().map(move |&(s, v)| (s + turn - start, v))
                    })
                    .collect()
            };
            let own = Samples {
                slopes: within(samples),
                layer: within(sources.layer),
            };
            let fallback = if own.slopes.is_empty() {
                nearest(start + 0.5 * length)
            } else {
                0.0
            };
            let angles = [from.fluid_angle(), to.fluid_angle()];
            let side = |corner: usize, side: usize| {
                let both = sources
                    .laws
                    .get(corner % corners.len())
                    .and_then(Option::as_ref);
                both.and_then(|pair| pair.get(side)).cloned()
            };
            let given = [side(k, 0), side(k + 1, 1)];
            Stretch::between(start, length, angles, &own, given, (spacing, fallback))
        })
        .collect()
}

impl LoopCurve {
    /// Length of the loop, m.
    pub fn length(&self) -> f64 {
        self.path.length()
    }

    fn balance(&mut self, fluxes: &[WallFlux]) -> f64 {
        self.factor = {
            let is_singular = |s: &&Stretch| s.leading.is_some_and(|leading| leading[0] < 0.0);
            let corners = self.stretches.iter().filter(is_singular).map(|s| s.start);
            let corners: Vec<f64> = corners.collect();
            BalanceFactor::with_marks(self.length(), self.spacing, &corners)
        };
        let mut curve = Vec::new();
        self.visit((0.0, self.length()), 1, false, &mut |abscissa| {
            curve.push((abscissa.arc_length, abscissa.weighted));
        });
        let mut wanted = Vec::new();
        let mut places: Vec<(f64, f64)> = Vec::new();
        for flux in fluxes {
            // Within a cell the flux is spread as the curve says; no part crosses a mark.
            places.clear();
            let mut low = flux.from;
            for high in self.factor.marks(flux.from, flux.to).chain([flux.to]) {
                let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
                places.extend(GAUSS_2.map(|(x, _)| {
                    let place = middle + half * x;
                    (place, half * self.shear_at(place))
                }));
                low = high;
            }
            let sum: f64 = places.iter().map(|place| place.1).sum();
            if sum > 0.0 && sum.is_finite() {
                wanted.extend(
                    places
                        .iter()
                        .map(|&(s, shear)| (s, shear / sum * flux.flux)),
                );
            } else {
                wanted.push((0.5 * (flux.from + flux.to), flux.flux));
            }
        }
        if !wanted.is_empty() {
            self.factor.fit(&curve, &wanted);
        }
        let factor = &self.factor;
        self.received = curve.iter().map(|&(s, part)| part * factor.at(s)).sum();
        curve.iter().map(|part| part.1).sum()
    }

    /// Shear per gradient at an arc length, m; without bound at a singular corner.
    pub fn shear_at(&self, arc_length: f64) -> f64 {
        let total = self.length();
        let s = taken_round(arc_length, total);
        let after = self.stretches.partition_point(|stretch| stretch.start <= s);
        // Before the first corner the last stretch runs on.
        let (stretch, s) = match after.checked_sub(1) {
            Some(index) => (self.stretches.get(index), s),
            None => (self.stretches.last(), s + total),
        };
        stretch.map_or(0.0, |stretch| {
            stretch.value(s - stretch.start) * self.factor.at(s)
        })
    }

    /// The top of the parabola through the curve around a point, if the curve is higher there.
    fn summit(&self, point: &CurvePoint) -> CurvePoint {
        let [before, here, after] =
            [-1.0, 0.0, 1.0].map(|k| self.shear_at(point.arc_length + k * self.spacing));
        let bend = before - 2.0 * here + after;
        let shift = 0.5 * (before - after) / bend;
        if !(bend < 0.0 && shift.abs() <= 1.0) {
            return *point;
        }
        let arc_length = taken_round(point.arc_length + shift * self.spacing, self.length());
        let value = self.shear_at(arc_length);
        if value <= here {
            return *point;
        }
        CurvePoint {
            arc_length,
            at: self.path.position(arc_length),
            normal: self.path.edge_normal(self.path.edge_at(arc_length)),
            shear_per_gradient: value,
            ..*point
        }
    }

    /// Position at an arc length, m.
    pub fn position(&self, arc_length: f64) -> Point {
        self.path.position(arc_length)
    }

    /// Index into the walls of a report for every point. The first of the two entries of a corner belongs
    /// to the wall before it.
    ///
    /// - `loop_index`: of this loop
    pub fn walls_of_points(&self, report: &WallReport, loop_index: usize) -> Vec<usize> {
        let points = &self.points;
        points
            .iter()
            .enumerate()
            .map(|(k, point)| {
                let ends_stretch = point.kind != PointKind::Regular
                    && points
                        .get(k + 1)
                        .is_none_or(|next| next.arc_length <= point.arc_length);
                let place = if ends_stretch {
                    point.arc_length - 1e-9 * self.length()
                } else {
                    point.arc_length
                };
                report.wall_at(loop_index, place).unwrap_or(0)
            })
            .collect()
    }

    /// Points without the regular ones nearer than a length to a singular corner.
    pub(crate) fn bounded(&self, length: f64) -> impl Iterator<Item = &CurvePoint> {
        let total = self.length();
        let singular = self.singular_places();
        self.points.iter().filter(move |point| {
            let far = |corner: &f64| {
                let apart = taken_round(corner - point.arc_length, total);
                apart.min(total - apart) >= length
            };
            let after = singular.partition_point(|&s| s < point.arc_length);
            let near = [
                after.checked_sub(1),
                Some(after),
                Some(0),
                singular.len().checked_sub(1),
            ];
            point.kind != PointKind::Regular
                || near
                    .iter()
                    .flatten()
                    .filter_map(|&k| singular.get(k))
                    .all(far)
        })
    }

    /// Points of the curve: the pieces' ends, closer together beside corners.
    fn collect_points(&self, singular_length: f64) -> Vec<CurvePoint> {
        let total = self.length();
        // With zero for the end of a stretch and one for the start of the next.
        let mut points: Vec<(u8, CurvePoint)> = Vec::new();
        for (index, stretch) in self.stretches.iter().enumerate() {
            let count = stretch.pieces(self.spacing);
            let step = stretch.length / count as f64;
            let mut distances: Vec<f64> = (1..count).map(|k| step * k as f64).collect();
            if stretch.leading.is_some() {
                for part in [0.5, 0.25, 0.125] {
                    distances.extend([part * step, stretch.length - part * step]);
                }
                distances.sort_by(f64::total_cmp);
                points.extend([false, true].map(|at_end| {
                    let point = self.corner_point(index, at_end, singular_length);
                    (u8::from(!at_end), point)
                }));
            } else {
                distances.insert(0, 0.0);
            }
            points.extend(distances.into_iter().map(|distance| {
                let arc_length = taken_round(stretch.start + distance, total);
                let point = CurvePoint {
                    arc_length,
                    at: self.path.position(arc_length),
                    normal: self.path.edge_normal(self.path.edge_at(arc_length)),
                    shear_per_gradient: stretch.value(distance) * self.factor.at(arc_length),
                    kind: PointKind::Regular,
                };
                (1, point)
            }));
        }
        points.sort_by(|a, b| {
            let along = a.1.arc_length.total_cmp(&b.1.arc_length);
            along.then(a.0.cmp(&b.0))
        });
        points.into_iter().map(|(_, point)| point).collect()
    }

    /// An end of a stretch.
    fn corner_point(&self, index: usize, at_end: bool, singular_length: f64) -> CurvePoint {
        let total = self.length();
        let stretch = &self.stretches[index];
        let leading = stretch.leading.map_or(0.0, |l| l[usize::from(at_end)]);
        let length = singular_length.min(0.5 * stretch.length);
        let (arc_length, beside) = if at_end {
            let next = self.stretches[(index + 1) % self.stretches.len()].start;
            // The end of the loop is not its beginning: it closes the last stretch.
            let arc_length = if next > 0.0 { next } else { total };
            (arc_length, -length)
        } else {
            (stretch.start, length)
        };
        let inside = taken_round(arc_length + 1e-6 * beside, total);
        let singular = leading < 0.0;
        let (from, to) = (
            arc_length.min(arc_length + beside),
            arc_length.max(arc_length + beside),
        );
        CurvePoint {
            arc_length,
            at: self.path.position(arc_length),
            normal: self.path.edge_normal(self.path.edge_at(inside)),
            shear_per_gradient: if singular {
                self.integral(from, to) / length
            } else {
                0.0
            },
            kind: if singular {
                PointKind::SingularCorner
            } else {
                PointKind::ConvexCorner
            },
        }
    }

    /// Whether there is a convex corner at an arc length.
    pub(crate) fn is_convex_corner(&self, arc_length: f64) -> bool {
        let near = 1e-9 * self.length();
        let first = self
            .points
            .partition_point(|p| p.arc_length < arc_length - near);
        self.points[first..]
            .iter()
            .take_while(|p| p.arc_length <= arc_length + near)
            .any(|p| p.kind == PointKind::ConvexCorner)
    }

    /// Arc lengths of the singular corners, sorted; each is there once for either side.
    pub(crate) fn singular_places(&self) -> Vec<f64> {
        self.points
            .iter()
            .filter(|point| point.kind == PointKind::SingularCorner)
            .map(|point| point.arc_length)
            .collect()
    }
}
