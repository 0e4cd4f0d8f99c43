//! A conformal film on the walls: the section that remains, and what became of its lumens and islands.
//!
//! A film of thickness `t` on all walls leaves the fluid points at least `t` from every wall. Fluid corners
//! below 180 degrees stay sharp; about re-entrant ones the new wall is an arc of radius `t`. A film on the
//! floor (or the lid) lies on the walls whose normal out of the fluid points down (up) within 45
//! degrees, and ends square; see `pieces` for its ends. It is measured straight from the coated walls,
//! whatever lies between.
//!
//! Method: every edge moved by `t` and every arc is trimmed by the regions of film near it, in closed
//! form (`curve`, `trim`), and what is left is joined to loops (`joined`). Each result is checked: loops
//! closed and in order, no vertex nearer to the walls than `t`, all inside the section, no more area gone
//! than length times `t` and the sectors about re-entrant vertices. Where that fails, because a neck closes or a loop
//! vanishes within rounding of just this `t`, a thickness off by 1e-9 and more of itself is tried, and reported.
//! Costs O(n log n) as long as each place has few walls at about the distance `t`.

mod curve;
mod joined;
mod pieces;
mod trim;
mod walls;

use super::curves::{CHORD_TOLERANCE, CurveError};
use super::inscribed_circle::largest_inscribed_circle;
use super::outline::{Loop, Lumen, Outline, Point};
use super::sweep::sweep;
use super::wall_edges::WallEdges;
use curve::distance;
use joined::{Chain, area, chains, polygon};
use pieces::{Surface, on_all, on_some};
use trim::{Part, Trimmer};
use walls::{ROUNDING, Walls};

/// Thinnest film, as a share of the largest coordinate: below it, rounding is part of the film.
const THINNEST: f64 = 1e-12;
/// Other thicknesses tried where one fails its checks, relative to what was asked less 1.
const NUDGES: [f64; 7] = [0.0, 1e-9, -1e-9, 1e-8, -1e-8, 1e-7, 1e-6];
/// Ends of parts nearer than this belong together, in scaled units, and at most 1/1000 of the film.
const JOINT: f64 = 1e-9;
/// Chord error for a first look at the area and perimeter of what remains, relative to its smaller side.
const FIRST_LOOK: f64 = 1e-4;
/// Loops with a smaller share of the area of the section are rounding, not fluid.
const SLIVER: f64 = 1e-12;
/// Share of the conductance that lumens left out may have at most, unless another is asked for.
pub const NEGLIGIBLE_LUMENS: f64 = 1e-6;

/// Which walls carry the film.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum FilmOn {
    /// All walls.
    #[default]
    All,
    /// Walls whose normal out of the fluid points down within 45 degrees.
    Floor,
    /// Walls whose normal out of the fluid points up within 45 degrees.
    Lid,
}

impl FilmOn {
    /// All choices.
    pub const ALL: [Self; 3] = [Self::All, Self::Floor, Self::Lid];

    /// The word for it, in options and outputs.
    pub fn word(self) -> &'static str {
        match self {
            Self::All => "all",
            Self::Floor => "floor",
            Self::Lid => "lid",
        }
    }
}

/// A film of uniform thickness.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Film {
    /// Thickness, m.
    pub thickness: f64,
    /// The walls that carry it.
    pub on: FilmOn,
}

/// What a film leaves.
#[derive(Debug, Clone, PartialEq)]
pub struct Filmed {
    /// The remaining section, m; outer loops anticlockwise, islands clockwise.
    pub outline: Outline,
    /// What became of the section.
    pub report: FilmReport,
}

/// What became of a section under a film.
#[derive(Debug, Clone, PartialEq)]
pub struct FilmReport {
    /// The film asked for.
    pub film: Film,
    /// The thickness that was used, m: as asked, or off by the least that passed the checks.
    pub thickness_used: f64,
    /// Flow area before and after, m^2.
    pub area: [f64; 2],
    /// Wetted perimeter before and after, m.
    pub perimeter: [f64; 2],
    /// Lumens before and after.
    pub lumens: [usize; 2],
    /// Islands before and after.
    pub islands: [usize; 2],
    /// Lumens that closed altogether.
    pub lumens_vanished: usize,
    /// Lumens of which more than one is left.
    pub lumens_split: usize,
    /// Lumens so small that they were left out.
    pub lumens_left_out: usize,
    /// Their area, m^2.
    pub area_left_out: f64,
    /// The conductance they have at most, m^4: the sum of `A^2 / (8 pi)` (Saint-Venant; G. Polya 1948,
    /// Quart. Appl. Math. 6, 267, cited from memory).
    pub conductance_left_out: f64,
    /// Vertices of the remaining outline.
    pub vertices: usize,
}

/// Why there is no filmed section.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum FilmError {
    /// The thickness is zero, negative or not finite.
    #[error("a film of {thickness:e} m is not above zero")]
    NotPositive {
        /// The thickness, m.
        thickness: f64,
    },
    /// The thickness is lost in the rounding of the coordinates.
    #[error("a film of {thickness:e} m is below the rounding of the coordinates ({limit:e} m)")]
    TooThin {
        /// The thickness, m.
        thickness: f64,
        /// Thinnest film, m.
        limit: f64,
    },
    /// No wall carries the film.
    #[error("no wall of the section faces {} within 45 degrees, so none carries the film", if *on == FilmOn::Lid { "down" } else { "up" })]
    NoWall {
        /// The walls asked for.
        on: FilmOn,
    },
    /// Nothing remains.
    #[error(
        "the film closes the section: the largest circle that fits has radius {} um, the film is {} um thick",
        micrometres(*radius), micrometres(*thickness)
    )]
    Closed {
        /// The thickness, m.
        thickness: f64,
        /// Radius of the largest circle that fits into the section, m.
        radius: f64,
    },
    /// An arc needs too many segments.
    #[error(transparent)]
    Curve(#[from] CurveError),
    /// No thickness near the one asked for passed the checks.
    #[error("the section under a film of {thickness:e} m could not be worked out: {what}")]
    Failed {
        /// The thickness, m.
        thickness: f64,
        /// The check that failed.
        what: &'static str,
    },
}

impl FilmError {
    /// What the user can do.
    pub fn hint(&self) -> &'static str {
        match self {
            Self::NotPositive { .. } => "give a thickness above zero, for example 0.5um",
            Self::TooThin { .. } => "leave the film out, or give the thickness with its unit",
            Self::NoWall { .. } => {
                "check that y points up in the outline, or put the film on all walls"
            }
            Self::Closed { .. } => "give a thinner film; no fluid is left with this one",
            Self::Curve(_) => "give a thinner film",
            Self::Failed { .. } => {
                "change the thickness by a thousandth, or simplify the outline where it is rough"
            }
        }
    }
}

impl Film {
    /// The section that the film leaves of `outline`, which must be valid (see [`Outline::problems`]).
    ///
    /// Lumens so small that together they have at most 1e-6 of the conductance are left out and
    /// reported with a bound of what they would have.
    ///
    /// # Accuracy
    /// Straight new walls to rounding; arcs with their vertices at `t` and a chord error of 1e-7 of the
    /// smaller overall dimension or mean width of what remains.
    ///
    /// # Errors
    /// [`FilmError`] for a thickness that is not above zero or below rounding, and where nothing remains.
    ///
    /// # Examples
    /// ```
    /// use etchwise::geometry::{Film, FilmOn, Outline};
    /// let wide = Outline::single(vec![[0.0, 0.0], [9.0, 0.0], [9.0, 4.0], [0.0, 4.0]]);
    /// let film = Film { thickness: 0.5, on: FilmOn::All };
    /// assert!((film.applied_to(&wide)?.outline.area() - 8.0 * 3.0).abs() < 1e-12);
    /// let floor = Film { on: FilmOn::Floor, ..film };
    /// assert!((floor.applied_to(&wide)?.outline.area() - 9.0 * 3.5).abs() < 1e-12);
    /// # Ok::<(), etchwise::geometry::FilmError>(())
    /// ```
    pub fn applied_to(&self, outline: &Outline) -> Result<Filmed, FilmError> {
        self.applied_within(outline, NEGLIGIBLE_LUMENS)
    }

    /// As [`Film::applied_to`], with another limit for what is left out.
    ///
    /// - `negligible`: share of the conductance that lumens left out may have at most together
    ///
    /// # Errors
    /// As [`Film::applied_to`].
    pub fn applied_within(&self, outline: &Outline, negligible: f64) -> Result<Filmed, FilmError> {
        let thickness = self.thickness;
        if !(thickness.is_finite() && thickness > 0.0) {
            return Err(FilmError::NotPositive { thickness });
        }
        let outline = outline.clone().oriented();
        let walls = Walls::new(&outline, self.on);
        if !walls.coated.contains(&true) {
            return Err(FilmError::NoWall { on: self.on });
        }
        // The largest scaled coordinate is below 4.
        let limit = 4.0 * THINNEST / walls.scale;
        if thickness < limit {
            return Err(FilmError::TooThin { thickness, limit });
        }
        // Thicker than the section is wide: nothing to work out, and nothing that could overflow.
        let across = walls.tree.bounds().map_or(0.0, |b| distance(b.low, b.high));
        if thickness > across / walls.scale {
            let radius = largest_radius(&outline);
            return Err(FilmError::Closed { thickness, radius });
        }
        let mut failed = "no attempt";
        for (attempt, nudge) in NUDGES.into_iter().enumerate() {
            let mut used = *self;
            used.thickness *= 1.0 + nudge;
            match used.attempt(&outline, &walls, negligible, attempt == 0) {
                Ok(mut filmed) => {
                    filmed.report.film = *self;
                    return Ok(filmed);
                }
                Err(Trouble::Error(error)) => return Err(error),
                Err(Trouble::Check(what)) => failed = what,
            }
        }
        Err(FilmError::Failed {
            thickness,
            what: failed,
        })
    }

    fn attempt(
        &self,
        outline: &Outline,
        walls: &Walls,
        negligible: f64,
        blends: bool,
    ) -> Result<Filmed, Trouble> {
        let is_everywhere = self.on == FilmOn::All;
        let reach = self.thickness * walls.scale;
        let surface = if is_everywhere {
            on_all(walls, reach)
        } else {
            on_some(walls, reach)
        };
        let parts = Trimmer::new(walls, &surface, reach, is_everywhere).parts();
        let joint = JOINT.min(1e-3 * reach);
        let chains = chains(&parts, joint).map_err(|_| Trouble::Check("its walls do not close"))?;
        let polygons = polygons(&parts, &chains, blends, joint)?;
        let most = outline.area() * walls.scale * walls.scale;
        let (loops, slivers): (Vec<_>, Vec<_>) = polygons
            .into_iter()
            .partition(|points| points.len() >= 3 && area(points).abs() > SLIVER * most);
        if loops.is_empty() {
            return Err(self.nothing_left(outline));
        }
        self.check_vertices(walls, &surface, &loops)?;
        let nested = nested(loops, walls)?.without_negligible(negligible);
        let mut filmed = self.reported(outline, walls, nested)?;
        filmed.report.add_slivers(&slivers, walls.scale);
        check_area(outline, &filmed, &surface, walls)?;
        Ok(filmed)
    }

    /// The section closed, or something went wrong.
    fn nothing_left(&self, outline: &Outline) -> Trouble {
        let radius = largest_radius(outline);
        if self.on == FilmOn::All && radius > self.thickness * (1.0 + 1e-6) {
            return Trouble::Check("nothing is left, though a larger circle fits");
        }
        Trouble::Error(FilmError::Closed {
            thickness: self.thickness,
            radius,
        })
    }

    /// Every vertex lies in the fluid and not under film.
    fn check_vertices(
        &self,
        walls: &Walls,
        surface: &Surface,
        loops: &[Vec<Point>],
    ) -> Result<(), Trouble> {
        let reach = self.thickness * walls.scale;
        let slack = 1e-9 * reach + 8.0 * ROUNDING;
        let boxes = (self.on != FilmOn::All).then(|| trim::boxes_of(&surface.covers));
        for &p in loops.iter().flatten() {
            let near = walls.tree.nearest(p).map_or(0.0, |wall| wall.distance);
            let is_clear = match &boxes {
                None => near >= reach - slack,
                Some(boxes) => !trim::is_under(boxes, &surface.covers, p, slack),
            };
            if !is_clear {
                return Err(Trouble::Check("a vertex lies under film"));
            }
            if near > 8.0 * ROUNDING && !walls.is_fluid(p) {
                return Err(Trouble::Check("a vertex lies in the solid"));
            }
        }
        Ok(())
    }

    /// The section and what became of it.
    ///
    /// - `nested`, `left_out`: lumens that remain, and those too small to matter
    fn reported(
        &self,
        before: &Outline,
        walls: &Walls,
        (nested, left_out): (Nested, Nested),
    ) -> Result<Filmed, Trouble> {
        let count = before.lumens.len();
        let mut remaining = vec![0_usize; count];
        for &lumen in nested.from.iter().chain(&left_out.from) {
            remaining[lumen] += 1;
        }
        let unscaled = |points: &[Point]| {
            Loop::new(points.iter().map(|p| p.map(|c| c / walls.scale)).collect())
        };
        let lumens = nested.lumens.iter().map(|(outer, islands)| Lumen {
            outer: unscaled(outer),
            islands: islands.iter().map(|island| unscaled(island)).collect(),
        });
        let outline = Outline {
            lumens: lumens.collect(),
        };
        if outline.problems().has_errors() {
            return Err(Trouble::Check("its walls touch or cross"));
        }
        let islands = |o: &Outline| o.lumens.iter().map(|l| l.islands.len()).sum();
        let left_areas: Vec<f64> = left_out
            .areas()
            .iter()
            .map(|a| a / walls.scale.powi(2))
            .collect();
        let report = FilmReport {
            film: *self,
            thickness_used: self.thickness,
            area: [before.area(), outline.area()],
            perimeter: [before.wetted_perimeter(), outline.wetted_perimeter()],
            lumens: [count, outline.lumens.len()],
            islands: [islands(before), islands(&outline)],
            lumens_vanished: remaining.iter().filter(|&&n| n == 0).count(),
            lumens_split: remaining.iter().filter(|&&n| n > 1).count(),
            lumens_left_out: left_areas.len(),
            // The sum of nothing would be minus zero.
            area_left_out: left_areas.iter().fold(0.0, |sum, a| sum + a),
            conductance_left_out: left_areas.iter().fold(0.0, |sum, &a| sum + saint_venant(a)),
            vertices: outline.loops().map(|l| l.points.len()).sum(),
        };
        Ok(Filmed { outline, report })
    }
}

impl FilmReport {
    /// Counts lumens that are hardly more than rounding; what they conduct at most counts all the same.
    fn add_slivers(&mut self, slivers: &[Vec<Point>], scale: f64) {
        let areas = slivers.iter().map(|points| area(points) / (scale * scale));
        for lumen in areas.filter(|a| *a > 0.0) {
            self.lumens_left_out += 1;
            self.area_left_out += lumen;
            self.conductance_left_out += saint_venant(lumen);
        }
    }
}

/// Radius of the largest circle that fits into any lumen, m.
fn largest_radius(outline: &Outline) -> f64 {
    let circles = outline.lumens.iter().filter_map(largest_inscribed_circle);
    circles.map(|c| c.radius).fold(0.0, f64::max)
}

/// In micrometres, six digits, with a power of ten where it would be long.
fn micrometres(metres: f64) -> String {
    let micro = metres * 1e6;
    let written = format!("{micro:.5e}");
    let rounded = written.parse().unwrap_or(micro);
    if (1e-4..1e9).contains(&rounded) {
        format!("{rounded}")
    } else {
        format!("{rounded:e}")
    }
}

/// An attempt that led to no result.
enum Trouble {
    /// There is none for any thickness near.
    Error(FilmError),
    /// A check failed.
    Check(&'static str),
}

impl From<CurveError> for Trouble {
    fn from(error: CurveError) -> Self {
        Self::Error(error.into())
    }
}

/// The conductance that a section of this area has at most, m^4.
fn saint_venant(area: f64) -> f64 {
    area * area / (8.0 * std::f64::consts::PI)
}

/// The loops as polygons with chords fine enough for what remains.
fn polygons(
    parts: &[Part],
    chains: &[Chain],
    blends: bool,
    joint: f64,
) -> Result<Vec<Vec<Point>>, Trouble> {
    let all = |chord_error: f64, blends: bool| {
        let made = chains
            .iter()
            .map(|chain| polygon(parts, chain, chord_error, blends, joint));
        made.collect::<Result<Vec<_>, _>>()
    };
    let mut low = [f64::INFINITY; 2];
    let mut high = [f64::NEG_INFINITY; 2];
    for p in parts.iter().flat_map(|part| [part.start(), part.end()]) {
        for k in 0..2 {
            low[k] = low[k].min(p[k]);
            high[k] = high[k].max(p[k]);
        }
    }
    let side = (high[0] - low[0]).min(high[1] - low[1]);
    if side.is_nan() || side <= 0.0 {
        return Ok(Vec::new());
    }
    let rough = all(FIRST_LOOK * side, false)?;
    let size: f64 = rough.iter().map(|points| area(points)).sum();
    let around: f64 = rough
        .into_iter()
        .map(|points| Loop::new(points).length())
        .sum();
    // Twice the area over the perimeter: the gap of a ring, half the side of a square.
    let width = 2.0 * size.abs() / around;
    let smallest = side.min(width).max(1e-3 * side);
    Ok(all(CHORD_TOLERANCE * smallest, blends)?)
}

/// Lumens of the remaining section, scaled.
struct Nested {
    lumens: Vec<(Vec<Point>, Vec<Vec<Point>>)>,
    /// The lumen of the section that each came from.
    from: Vec<usize>,
}

/// Puts islands into their lumens.
fn nested(loops: Vec<Vec<Point>>, walls: &Walls) -> Result<Nested, Trouble> {
    let mut edges = WallEdges::default();
    for points in &loops {
        edges.push_loop(&Loop::new(points.clone()), 1.0);
    }
    let swept = sweep(&edges, &[]);
    if !swept.set_aside.is_empty() {
        return Err(Trouble::Check("its walls touch or cross"));
    }
    let is_outer: Vec<bool> = loops.iter().map(|points| area(points) > 0.0).collect();
    let mut place = vec![usize::MAX; loops.len()];
    let mut nested = Nested {
        lumens: Vec::new(),
        from: Vec::new(),
    };
    let mut islands = Vec::new();
    for (index, points) in loops.into_iter().enumerate() {
        let parent = swept.parents[index];
        if is_outer[index] {
            if parent.is_some_and(|p| is_outer[p]) {
                return Err(Trouble::Check("a lumen lies in another"));
            }
            place[index] = nested.lumens.len();
            let nearest = points.first().and_then(|&p| walls.tree.nearest(p));
            let wall = nearest.map_or(0, |n| walls.edges.loop_of[n.edge] as usize);
            nested.from.push(walls.lumen_of[wall]);
            nested.lumens.push((points, Vec::new()));
        } else {
            islands.push((parent, points));
        }
    }
    for (parent, points) in islands {
        let lumen = parent.map_or(usize::MAX, |p| place[p]);
        let Some((_, islands)) = nested.lumens.get_mut(lumen) else {
            return Err(Trouble::Check("an island lies in no lumen"));
        };
        islands.push(points);
    }
    Ok(nested)
}

impl Nested {
    fn areas(&self) -> Vec<f64> {
        let of = |(outer, islands): &(Vec<Point>, Vec<Vec<Point>>)| {
            area(outer) + islands.iter().map(|i| area(i)).sum::<f64>()
        };
        self.lumens.iter().map(of).collect()
    }

    /// Splits off the smallest lumens that together cannot matter.
    fn without_negligible(self, negligible: f64) -> (Self, Self) {
        let areas = self.areas();
        let mut order: Vec<usize> = (0..areas.len()).collect();
        order.sort_by(|&a, &b| areas[a].total_cmp(&areas[b]));
        let mut is_left_out = vec![false; areas.len()];
        if let Some((&largest, smaller)) = order.split_last() {
            let (outer, islands) = &self.lumens[largest];
            let lumen = Lumen {
                outer: Loop::new(outer.clone()),
                islands: islands.iter().map(|i| Loop::new(i.clone())).collect(),
            };
            let radius = if smaller.is_empty() {
                0.0
            } else {
                largest_inscribed_circle(&lumen).map_or(0.0, |circle| circle.radius)
            };
            // A circle inside has no more conductance than the lumen: pi r^4 / 8.
            let allowed = negligible * std::f64::consts::PI * radius.powi(4) / 8.0;
            let mut sum = 0.0;
            for &index in smaller {
                sum += saint_venant(areas[index]);
                is_left_out[index] = sum <= allowed;
            }
        }
        let empty = || Self {
            lumens: Vec::new(),
            from: Vec::new(),
        };
        let (mut kept, mut left_out) = (empty(), empty());
        for (index, (lumen, from)) in self.lumens.into_iter().zip(self.from).enumerate() {
            let side = if is_left_out[index] {
                &mut left_out
            } else {
                &mut kept
            };
            side.lumens.push(lumen);
            side.from.push(from);
        }
        (kept, left_out)
    }
}

/// No more area is gone than the film can hold.
fn check_area(
    before: &Outline,
    filmed: &Filmed,
    surface: &Surface,
    walls: &Walls,
) -> Result<(), Trouble> {
    let most = surface.largest_area / walls.scale.powi(2);
    let report = &filmed.report;
    let gone = before.area() - report.area[1] - report.area_left_out;
    let slack = 1e-9 * before.area();
    if gone < -slack || gone > most + slack {
        return Err(Trouble::Check("the area is not that of the film"));
    }
    Ok(())
}
