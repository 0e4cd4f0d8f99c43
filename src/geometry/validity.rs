//! What is wrong with an outline: every problem, with loop, vertex, coordinates and remedy.
//!
//! Places are counted from 0 in the fields and from 1 in the messages. Coordinates are metres in the
//! fields and micrometres in the messages. How problems are found: `outline_check`.

use super::outline::{Loop, Outline, Point};
use super::outline_check::check;
use super::wall_edges::order;
use std::cmp::Ordering;
use std::fmt;

/// Most problems that are listed of each of the three groups: vertices and single loops; pairs of
/// edges; containment. Further ones are counted or said to exist.
pub const LISTED_PROBLEMS: usize = 10_000;

/// Whether a problem keeps the outline from being used.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Severity {
    /// There is no section until it is repaired.
    Error,
    /// It changes nothing and can be removed without asking.
    Harmless,
}

/// Which wall a loop is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Role {
    /// The outer wall of a lumen.
    Outer {
        /// Index of the lumen.
        lumen: usize,
    },
    /// An island in a lumen.
    Island {
        /// Index of the lumen.
        lumen: usize,
        /// Index of the island in the lumen.
        island: usize,
    },
}

/// Where on the walls a problem is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Place {
    /// Index of the loop over the outline: outer loop, then its islands, lumen by lumen.
    pub loop_index: usize,
    /// Which wall that is.
    pub role: Role,
    /// Index of the vertex in the loop as given; of the start of the edge for a place on an edge.
    pub vertex: usize,
    /// Where it is, m: the crossing or the begin of a shared stretch for those, else the vertex.
    pub at: Point,
}

/// What is wrong.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[non_exhaustive]
pub enum ProblemKind {
    /// A coordinate is not a finite number.
    NonFiniteVertex,
    /// The loop has fewer than three different vertices in a row.
    TooFewVertices {
        /// How many it has.
        count: usize,
    },
    /// A vertex repeats the one before it.
    DuplicateVertex,
    /// All vertices of the loop lie on one line, within rounding.
    ZeroArea,
    /// The wall doubles back over itself at this vertex, within rounding.
    Spike,
    /// Two edges of one loop cross.
    SelfCrossing,
    /// A vertex of a loop lies on another edge or vertex of the same loop.
    SelfTouch,
    /// Two edges of one loop share a stretch.
    SelfOverlap,
    /// An island crosses the outer wall of its lumen.
    IslandCrossesOuter,
    /// Two islands of one lumen cross.
    IslandsCross,
    /// Walls of two lumens cross.
    LumensOverlap,
    /// A vertex of one loop lies on an edge or vertex of another loop.
    LoopsTouch,
    /// Edges of two loops share a stretch.
    LoopsOverlap,
    /// An island lies outside the outer wall of its lumen.
    IslandOutside,
    /// An island lies inside another island of its lumen.
    IslandInsideIsland,
    /// A lumen lies in the fluid of another lumen.
    NestedLumen,
}

/// One problem of an outline.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Problem {
    /// What is wrong.
    pub kind: ProblemKind,
    /// Where.
    pub place: Place,
    /// The other wall or vertex concerned, when there is one.
    pub other: Option<Place>,
}

/// All problems of an outline, and what could not be looked at.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Problems {
    /// The problems, ordered by loop and vertex.
    pub list: Vec<Problem>,
    /// Problems of single vertices and loops that were found but not listed, above [`LISTED_PROBLEMS`].
    pub vertex_problems_not_listed: usize,
    /// Whether there may be more contacts between edges than listed.
    pub contacts_cut_off: bool,
    /// Whether there may be more misplaced loops than listed.
    pub containment_cut_off: bool,
    /// Loops whose basic problems kept them from the search for contacts and containment.
    pub loops_left_out: usize,
    /// Edge pairs tested and tree candidates visited: a measure of the work done.
    pub work: usize,
}

impl Outline {
    /// Every problem of the outline, in any orientation of its loops.
    ///
    /// A lumen inside an island of another lumen is no problem (a channel inside a core). Crossing,
    /// touching and containment are decided exactly, without tolerance; spikes and zero area within 8
    /// rounding steps of the coordinates. Costs O(n log n) for a sound outline and about as much again for every
    /// [`LISTED_PROBLEMS`] problems; hostile outlines are cut short and say so.
    ///
    /// # Examples
    /// ```
    /// use etchwise::geometry::{Outline, ProblemKind};
    /// let bow_tie = Outline::single(vec![[0.0, 0.0], [2e-6, 2e-6], [2e-6, 0.0], [0.0, 2e-6]]);
    /// let problems = bow_tie.problems();
    /// assert_eq!(problems.list[0].kind, ProblemKind::SelfCrossing);
    /// assert_eq!(problems.list[0].place.at, [1e-6, 1e-6]);
    /// ```
    pub fn problems(&self) -> Problems {
        check(self)
    }

    /// Whether nothing keeps the outline from being used; harmless problems are allowed.
    pub fn is_valid(&self) -> bool {
        !self.problems().has_errors()
    }

    /// The outline without vertices that repeat the one before them, and how many were dropped.
    pub fn without_duplicate_vertices(mut self) -> (Self, usize) {
        let mut dropped = 0;
        for lumen in &mut self.lumens {
            for wall in std::iter::once(&mut lumen.outer).chain(&mut lumen.islands) {
                let before = wall.points.len();
                let mut points = std::mem::take(&mut wall.points);
                points.dedup_by(|later, earlier| coincide(*later, *earlier));
                *wall = Loop::new(points);
                dropped += before - wall.points.len();
            }
        }
        (self, dropped)
    }
}

impl Problems {
    /// The problems that keep the outline from being used.
    pub fn errors(&self) -> impl Iterator<Item = &Problem> {
        self.list
            .iter()
            .filter(|problem| problem.severity() == Severity::Error)
    }

    /// Whether anything keeps the outline from being used.
    pub fn has_errors(&self) -> bool {
        self.contacts_cut_off
            || self.containment_cut_off
            || self.loops_left_out > 0
            || self.errors().next().is_some()
    }

    /// Whether there is no problem at all, not even a harmless one.
    pub fn is_empty(&self) -> bool {
        self.list.is_empty() && !self.has_errors()
    }

    /// One sentence for each thing the list does not hold: problems cut off, checks not made.
    pub fn notes(&self) -> Vec<String> {
        let mut notes = Vec::new();
        if self.vertex_problems_not_listed > 0 {
            notes.push(format!(
                "{} more problems of single vertices are not listed",
                self.vertex_problems_not_listed
            ));
        }
        if self.contacts_cut_off {
            notes.push(format!(
                "the list of crossing and touching edges was cut off (limit {LISTED_PROBLEMS}); \
                 there may be more"
            ));
        }
        if self.containment_cut_off {
            notes.push(
                "not every loop could be judged for lying in the right place; \
                 repair the problems listed and check again"
                    .to_owned(),
            );
        }
        if self.loops_left_out > 0 {
            notes.push(format!(
                "loops left out of the search for crossings and misplaced loops because of the \
                 problems listed: {}; repair them and check again",
                self.loops_left_out
            ));
        }
        notes
    }
}

impl Problem {
    /// Whether the problem keeps the outline from being used.
    pub fn severity(&self) -> Severity {
        match self.kind {
            ProblemKind::DuplicateVertex => Severity::Harmless,
            _ => Severity::Error,
        }
    }

    /// What the person can do about it.
    pub fn remedy(&self) -> &'static str {
        match self.kind {
            ProblemKind::NonFiniteVertex => "give the vertex finite coordinates or remove it",
            ProblemKind::TooFewVertices { .. } => {
                "remove the loop, or give at least three different vertices"
            }
            ProblemKind::DuplicateVertex => "nothing to do: the repeated vertex can be dropped",
            ProblemKind::ZeroArea => {
                "remove the loop, or give vertices that do not all lie on one line"
            }
            ProblemKind::Spike => "remove the vertex at the tip of the spike",
            ProblemKind::SelfCrossing | ProblemKind::SelfOverlap => {
                "put the vertices in order along the wall, or split the loop where it meets itself"
            }
            ProblemKind::SelfTouch => {
                "move the vertex off the wall, or split the loop in two where it touches itself"
            }
            ProblemKind::IslandCrossesOuter => {
                "move the island inside, or make it part of the outer wall"
            }
            ProblemKind::IslandsCross => "move the islands apart, or merge them into one loop",
            ProblemKind::LumensOverlap => {
                "move the lumens apart, or merge them into one outer wall"
            }
            ProblemKind::LoopsTouch | ProblemKind::LoopsOverlap => {
                "leave a gap between the two walls, or merge the loops into one"
            }
            ProblemKind::IslandOutside => "move the island into its lumen, or give it as a lumen",
            ProblemKind::IslandInsideIsland => {
                "remove the inner island, or give it as a lumen of its own if fluid flows there"
            }
            ProblemKind::NestedLumen => {
                "give the inner loop as an island of the outer lumen, or remove it"
            }
        }
    }

    /// The stable name of the kind of problem, for machine output.
    pub fn code(&self) -> &'static str {
        match self.kind {
            ProblemKind::NonFiniteVertex => "non_finite_vertex",
            ProblemKind::TooFewVertices { .. } => "too_few_vertices",
            ProblemKind::DuplicateVertex => "duplicate_vertex",
            ProblemKind::ZeroArea => "zero_area",
            ProblemKind::Spike => "spike",
            ProblemKind::SelfCrossing => "self_crossing",
            ProblemKind::SelfTouch => "self_touch",
            ProblemKind::SelfOverlap => "self_overlap",
            ProblemKind::IslandCrossesOuter => "island_crosses_outer",
            ProblemKind::IslandsCross => "islands_cross",
            ProblemKind::LumensOverlap => "lumens_overlap",
            ProblemKind::LoopsTouch => "loops_touch",
            ProblemKind::LoopsOverlap => "loops_overlap",
            ProblemKind::IslandOutside => "island_outside",
            ProblemKind::IslandInsideIsland => "island_inside_island",
            ProblemKind::NestedLumen => "nested_lumen",
        }
    }
}

impl Role {
    /// Index of the lumen.
    pub fn lumen(self) -> usize {
        match self {
            Self::Outer { lumen } | Self::Island { lumen, .. } => lumen,
        }
    }

    /// Whether it is an island.
    pub fn is_island(self) -> bool {
        matches!(self, Self::Island { .. })
    }
}

impl fmt::Display for Role {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Outer { lumen } => write!(f, "outer loop of lumen {}", lumen + 1),
            Self::Island { lumen, island } => {
                write!(f, "island {} of lumen {}", island + 1, lumen + 1)
            }
        }
    }
}

impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (place, vertex) = (self.place, self.place.vertex + 1);
        let (wall, at) = (place.role, Coordinates(place.at));
        let other = self.other.unwrap_or(place);
        let (other_wall, other_vertex) = (other.role, other.vertex + 1);
        match self.kind {
            ProblemKind::NonFiniteVertex => {
                write!(f, "{wall}: vertex {vertex} at {at} is not finite")
            }
            ProblemKind::TooFewVertices { count } => write!(
                f,
                "{wall}: {count} different vertices in a row, at least 3 are needed"
            ),
            ProblemKind::DuplicateVertex => write!(
                f,
                "{wall}: vertex {vertex} at {at} repeats vertex {other_vertex}"
            ),
            ProblemKind::ZeroArea => {
                write!(
                    f,
                    "{wall}: all vertices lie on one line through {at}, the area is zero"
                )
            }
            ProblemKind::Spike => {
                write!(
                    f,
                    "{wall}: the wall doubles back over itself at vertex {vertex} at {at}"
                )
            }
            ProblemKind::SelfCrossing => write!(
                f,
                "{wall}: the edge from vertex {vertex} crosses the edge from vertex {other_vertex} at {at}"
            ),
            ProblemKind::SelfTouch if coincide(place.at, other.at) => write!(
                f,
                "{wall}: vertex {vertex} at {at} is the same point as vertex {other_vertex}"
            ),
            ProblemKind::SelfTouch => write!(
                f,
                "{wall}: vertex {vertex} at {at} lies on the edge from vertex {other_vertex}"
            ),
            ProblemKind::SelfOverlap => write!(
                f,
                "{wall}: the edges from vertices {vertex} and {other_vertex} share a stretch that begins at {at}"
            ),
            ProblemKind::IslandCrossesOuter
            | ProblemKind::IslandsCross
            | ProblemKind::LumensOverlap => write!(
                f,
                "{wall}: the edge from vertex {vertex} crosses the edge from vertex {other_vertex} of the {other_wall} at {at}"
            ),
            ProblemKind::LoopsTouch if coincide(place.at, other.at) => write!(
                f,
                "{wall}: vertex {vertex} at {at} is the same point as vertex {other_vertex} of the {other_wall}"
            ),
            ProblemKind::LoopsTouch => write!(
                f,
                "{wall}: vertex {vertex} at {at} lies on the edge from vertex {other_vertex} of the {other_wall}"
            ),
            ProblemKind::LoopsOverlap => write!(
                f,
                "{wall}: the edge from vertex {vertex} shares a stretch that begins at {at} with the edge from vertex {other_vertex} of the {other_wall}"
            ),
            ProblemKind::IslandOutside => {
                write!(
                    f,
                    "{wall}: vertex {vertex} at {at} lies outside the {other_wall}"
                )
            }
            ProblemKind::IslandInsideIsland => {
                write!(
                    f,
                    "{wall}: vertex {vertex} at {at} lies inside {other_wall}"
                )
            }
            ProblemKind::NestedLumen => write!(
                f,
                "{wall}: vertex {vertex} at {at} lies in the fluid of lumen {}",
                other_wall.lumen() + 1
            ),
        }
    }
}

impl fmt::Display for Problems {
    /// One line a problem with its remedy, then the notes.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for problem in &self.list {
            writeln!(f, "{problem}: {}", problem.remedy())?;
        }
        for note in self.notes() {
            writeln!(f, "note: {note}")?;
        }
        Ok(())
    }
}

/// A point in micrometres with up to twelve significant digits.
pub(super) struct Coordinates(pub(super) Point);

impl fmt::Display for Coordinates {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let [x, y] = self.0.map(micrometres);
        write!(f, "({x}, {y}) um")
    }
}

fn micrometres(metres: f64) -> String {
    let value = metres * 1e6;
    if !value.is_finite() {
        return value.to_string();
    }
    let magnitude = value.abs().log10().floor().clamp(-30.0, 11.0);
    if magnitude < -6.0 && value.abs() > 0.0 {
        return format!("{value:e}");
    }
    let text = format!("{value:.*}", (11.0 - magnitude.max(-6.0)) as usize);
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

/// Whether two vertices are the same point; never for vertices that are not finite.
pub(super) fn coincide(a: Point, b: Point) -> bool {
    is_finite(a) && is_finite(b) && order(a, b) == Ordering::Equal
}

/// Whether both coordinates are finite.
pub(super) fn is_finite(p: Point) -> bool {
    p[0].is_finite() && p[1].is_finite()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coordinates_are_printed_in_micrometres_without_noise() {
        let cases = [
            (0.3e-6, "0.3"),
            (0.1e-6 + 0.2e-6, "0.3"),
            (-1.234_567_890_12e-4, "-123.456789012"),
            (0.0, "0"),
            (2.0, "2000000"),
            (100e-6, "100"),
            (f64::NAN, "NaN"),
            (1.25e-15, "1.25e-9"),
        ];
        for (metres, text) in cases {
            assert_eq!(micrometres(metres), text);
        }
    }
}
