//! How the problems of an outline are found, in three steps.
//!
//! 1. Each loop alone: finite, enough vertices, not all on one line, no spikes. Loops that fail here
//!    have no edges to compare and are left out of what follows.
//! 2. Contacts between edges: a sweep finds a set of edges that every contact involves; the contacts of
//!    those edges are then listed through the box tree.
//! 3. Containment: without contacts the sweep has already placed every loop in the one around it; with
//!    contacts each loop is placed by even-odd counting along a ray through the box tree.

use super::outline::{Loop, Outline, Point};
use super::segment_tree::{Bounds, SegmentTree};
use super::sweep::{SweepOutcome, sweep};
use super::validity::{
    LISTED_PROBLEMS, Place, Problem, ProblemKind, Problems, Role, Severity, coincide, is_finite,
};
use super::wall_edges::{Contact, WallEdges, rounding, unit_scale};
use std::collections::HashSet;
use std::ops::{ControlFlow, Range};

/// Most tree candidates visited for contacts and again for containment, so that hostile outlines end.
const WORK_LIMIT: usize = 50_000_000;
/// Most vertices of a loop tried for one that lies on no other wall.
const VERTICES_TRIED: usize = 64;

struct Check<'a> {
    loops: Vec<(&'a Loop, Role)>,
    /// Index of the outer loop of each lumen.
    outer_of: Vec<usize>,
    edges: WallEdges,
    /// Power of two between the coordinates of the outline and those of `edges`.
    scale: f64,
    found: Problems,
    errors_listed: usize,
    harmless_listed: usize,
    misplaced_listed: usize,
    /// Pairs of loops that cross or share a stretch, lower index first.
    entangled: HashSet<(usize, usize)>,
}

/// All problems of the outline.
pub(super) fn check(outline: &Outline) -> Problems {
    let mut loops = Vec::new();
    let mut outer_of = Vec::new();
    for (lumen, walls) in outline.lumens.iter().enumerate() {
        outer_of.push(loops.len());
        loops.push((&walls.outer, Role::Outer { lumen }));
        let islands = walls.islands.iter().enumerate();
        loops.extend(islands.map(|(island, wall)| (wall, Role::Island { lumen, island })));
    }
    let mut check = Check {
        loops,
        outer_of,
        edges: WallEdges::default(),
        scale: 1.0,
        found: Problems::default(),
        errors_listed: 0,
        harmless_listed: 0,
        misplaced_listed: 0,
        entangled: HashSet::new(),
    };
    check.single_loops();
    let spikes = check.spikes();
    let swept = sweep(&check.edges, &spikes);
    check.found.work += swept.pairs_tested;
    if swept.set_aside.is_empty() {
        check.place_by_sweep(&swept);
    } else {
        check.contacts(&swept, &spikes);
        check.place_by_rays();
    }
    let key = |p: &Problem| (p.place.loop_index, p.place.vertex, p.kind);
    check.found.list.sort_by_key(key);
    check.found
}

/// The vertices that have a place.
fn finite(points: &[Point]) -> std::borrow::Cow<'_, [Point]> {
    if points.iter().all(|&p| is_finite(p)) {
        points.into()
    } else {
        points.iter().copied().filter(|&p| is_finite(p)).collect()
    }
}

impl Check<'_> {
    fn place(&self, loop_index: usize, vertex: usize) -> Place {
        let (wall, role) = self.loops[loop_index];
        Place {
            loop_index,
            role,
            vertex,
            at: wall.points.get(vertex).copied().unwrap_or([f64::NAN; 2]),
        }
    }

    fn edge_place(&self, edge: usize) -> Place {
        let loop_index = self.edges.loop_of[edge] as usize;
        self.place(loop_index, self.edges.vertex[edge] as usize)
    }

    /// Lists a problem of one vertex or loop, or counts it when there are too many.
    fn note(&mut self, problem: Problem) {
        let listed = match problem.severity() {
            Severity::Error => &mut self.errors_listed,
            Severity::Harmless => &mut self.harmless_listed,
        };
        if *listed < LISTED_PROBLEMS {
            *listed += 1;
            self.found.list.push(problem);
        } else {
            self.found.vertex_problems_not_listed += 1;
        }
    }

    fn note_at(&mut self, kind: ProblemKind, place: Place) {
        self.note(Problem {
            kind,
            place,
            other: None,
        });
    }

    /// Step 1, and the flat list of edges of the loops that pass.
    fn single_loops(&mut self) {
        let coordinates = self
            .loops
            .iter()
            .flat_map(|(wall, _)| &wall.points)
            .flatten();
        let largest = coordinates
            .filter(|c| c.is_finite())
            .fold(0.0_f64, |m, c| m.max(c.abs()));
        self.scale = unit_scale(largest);
        for index in 0..self.loops.len() {
            let wall = self.loops[index].0;
            if self.is_loop(index, wall) {
                self.edges.push_loop(wall, self.scale);
            } else {
                self.found.loops_left_out += 1;
                self.edges.push_left_out();
            }
        }
    }

    /// Whether the loop alone encloses something; notes what is wrong with it.
    fn is_loop(&mut self, index: usize, wall: &Loop) -> bool {
        let points = &wall.points;
        let mut count = 0;
        for (vertex, &p) in points.iter().enumerate() {
            let before = vertex.checked_sub(1).unwrap_or(points.len() - 1);
            if !is_finite(p) {
                self.note_at(ProblemKind::NonFiniteVertex, self.place(index, vertex));
            } else if before != vertex && coincide(p, points[before]) {
                self.note(Problem {
                    kind: ProblemKind::DuplicateVertex,
                    place: self.place(index, vertex),
                    other: Some(self.place(index, before)),
                });
            } else {
                count += 1;
            }
        }
        // What else is wrong is looked for as if the vertices without a place were not there.
        let kind = if count < 3 {
            let count = count.max(points.len().min(1));
            ProblemKind::TooFewVertices { count }
        } else if lie_on_one_line(&finite(points), self.scale) {
            ProblemKind::ZeroArea
        } else {
            return true;
        };
        self.note_at(kind, self.place(index, 0));
        false
    }

    /// Edges whose start is the tip of a spike; notes them.
    fn spikes(&mut self) -> Vec<usize> {
        let edges = &self.edges;
        let tips: Vec<usize> = (0..edges.len()).filter(|&i| edges.is_spike(i)).collect();
        for &tip in &tips {
            let place = self.edge_place(tip);
            self.note_at(ProblemKind::Spike, place);
        }
        tips
    }

    /// Step 2: the contacts of the edges set aside with all edges.
    fn contacts(&mut self, swept: &SweepOutcome, spikes: &[usize]) {
        let tree = SegmentTree::from_segments(self.edges.segments());
        let mut rank = vec![usize::MAX; self.edges.len()];
        for (position, &edge) in swept.set_aside.iter().enumerate() {
            rank[edge] = position;
        }
        let mut is_tip = vec![false; self.edges.len()];
        for &tip in spikes {
            is_tip[tip] = true;
        }
        let (mut listed, mut visited) = (Vec::new(), 0_usize);
        for (position, &edge) in swept.set_aside.iter().enumerate() {
            let [a, b] = self.edges.ends(edge);
            let flow = tree.visit_box(&Bounds::of(a, b), &mut |other| {
                visited += 1;
                if rank[other] >= position {
                    self.contact(edge, other, &is_tip, &mut listed);
                }
                if visited > WORK_LIMIT || listed.len() > LISTED_PROBLEMS {
                    return ControlFlow::Break(());
                }
                ControlFlow::Continue(())
            });
            if flow.is_break() {
                self.found.contacts_cut_off = true;
                listed.truncate(LISTED_PROBLEMS);
                break;
            }
        }
        self.found.work += visited;
        self.found.list.append(&mut listed);
    }

    /// Lists the contact of two edges, if they have one that belongs to this pair.
    fn contact(&mut self, e: usize, f: usize, is_tip: &[bool], listed: &mut Vec<Problem>) {
        let (kind, first, second, at) = match self.edges.contact(e, f) {
            Contact::None => return,
            Contact::Crossing(at) => (self.crossing_kind(e, f), e, f, Some(at)),
            Contact::Overlap(at) => {
                let kind = self.by_loop(e, f, ProblemKind::SelfOverlap, ProblemKind::LoopsOverlap);
                (kind, e, f, Some(at))
            }
            touch => {
                let (first, second) = match touch {
                    Contact::SecondOnFirst => (f, e),
                    _ => (e, f),
                };
                let shared = touch == Contact::SharedStart;
                if self.is_told_otherwise(first, second, shared, is_tip) {
                    return;
                }
                let kind = self.by_loop(e, f, ProblemKind::SelfTouch, ProblemKind::LoopsTouch);
                (kind, first, second, None)
            }
        };
        let (mut place, mut other) = (self.edge_place(first), self.edge_place(second));
        if let Some(at) = at {
            place.at = at.map(|c| c / self.scale);
            other.at = place.at;
            self.entangled
                .insert(ordered(place.loop_index, other.loop_index));
        }
        listed.push(Problem {
            kind,
            place,
            other: Some(other),
        });
    }

    fn by_loop(&self, e: usize, f: usize, one: ProblemKind, two: ProblemKind) -> ProblemKind {
        if self.edges.loop_of[e] == self.edges.loop_of[f] {
            one
        } else {
            two
        }
    }

    fn crossing_kind(&self, e: usize, f: usize) -> ProblemKind {
        let (first, second) = (
            self.edges.loop_of[e] as usize,
            self.edges.loop_of[f] as usize,
        );
        let (a, b) = (self.loops[first].1, self.loops[second].1);
        if first == second {
            ProblemKind::SelfCrossing
        } else if a.lumen() != b.lumen() {
            ProblemKind::LumensOverlap
        } else if a.is_island() && b.is_island() {
            ProblemKind::IslandsCross
        } else {
            ProblemKind::IslandCrossesOuter
        }
    }

    /// Whether the touch of the start of `e` with edge `f` (with its start, if `shared`) is only the
    /// end of a shared stretch or the foot of a spike, which are listed themselves.
    fn is_told_otherwise(&self, e: usize, f: usize, shared: bool, is_tip: &[bool]) -> bool {
        let edges = &self.edges;
        let (e_before, f_before) = (edges.previous(e), edges.previous(f));
        let spike_before = |edge: usize, far: usize| {
            let tip = edges.previous(edge);
            is_tip[tip] && edges.previous(tip) == far
        };
        if spike_before(e, f) || (shared && spike_before(f, e)) {
            return true;
        }
        let shares = |a: usize, b: usize| a != b && edges.overlap(a, b);
        shares(e_before, f) || (shared && (shares(e, f_before) || shares(e_before, f_before)))
    }

    /// Step 3 without contacts: the sweep knows the smallest loop around each loop.
    fn place_by_sweep(&mut self, swept: &SweepOutcome) {
        let mut visited = 0;
        for index in 0..self.loops.len() {
            let parent = swept.parents[index];
            let is_right = match self.loops[index].1 {
                Role::Island { lumen, .. } => parent == Some(self.outer_of[lumen]),
                Role::Outer { lumen } => parent.is_none_or(|p| {
                    self.loops[p].1.is_island() && self.loops[p].1.lumen() != lumen
                }),
            };
            if is_right || self.edges.ranges[index].is_empty() {
                continue;
            }
            let chain: Vec<usize> = std::iter::successors(parent, |&p| swept.parents[p]).collect();
            visited += chain.len();
            self.judge(index, 0, &chain);
            if visited > WORK_LIMIT || self.misplaced_listed >= LISTED_PROBLEMS {
                self.found.containment_cut_off = true;
                break;
            }
        }
        self.found.work += visited;
    }

    /// Step 3 with contacts: even-odd counting from a vertex of each loop that lies on no other wall.
    fn place_by_rays(&mut self) {
        if self.found.contacts_cut_off {
            self.found.containment_cut_off = true;
            return;
        }
        let mut rays = Rays::new(&self.edges);
        for index in 0..self.loops.len() {
            let range = self.edges.ranges[index].clone();
            let step = (range.len() / VERTICES_TRIED).max(1);
            let mut placed = range.is_empty();
            for edge in range.step_by(step) {
                if let Some(around) = self.loops_around(&mut rays, edge) {
                    let vertex = self.edges.vertex[edge] as usize;
                    self.judge(index, vertex, &around);
                    placed = true;
                    break;
                }
            }
            self.found.containment_cut_off |= !placed;
            if rays.visited > WORK_LIMIT || self.misplaced_listed >= LISTED_PROBLEMS {
                self.found.containment_cut_off = true;
                break;
            }
        }
        self.found.work += rays.visited;
    }

    /// The loops around the start of an edge, leaving out its own loop and those entangled with it;
    /// `None` when it lies on one of them or the work limit is reached.
    fn loops_around(&self, rays: &mut Rays, edge: usize) -> Option<Vec<usize>> {
        let (p, own) = (self.edges.start[edge], self.edges.loop_of[edge] as usize);
        let mut around = Vec::new();
        for wall in rays.candidates(p) {
            if wall == own || self.are_entangled(wall, own) {
                continue;
            }
            if rays.visited > WORK_LIMIT {
                return None;
            }
            if rays.is_inside(&self.edges, wall, p)? {
                around.push(wall);
            }
        }
        Some(around)
    }

    fn are_entangled(&self, a: usize, b: usize) -> bool {
        self.entangled.contains(&ordered(a, b))
    }

    /// Whether a loop with these loops around it is in the right place; lists what is wrong.
    fn judge(&mut self, index: usize, vertex: usize, around: &[usize]) {
        let role = self.loops[index].1;
        let lumen = role.lumen();
        let island_of = |&&wall: &&usize| self.loops[wall].1.is_island();
        let mut wrong: Vec<(ProblemKind, usize)> = Vec::new();
        if role.is_island() {
            let outer = self.outer_of[lumen];
            if !around.contains(&outer)
                && !self.edges.ranges[outer].is_empty()
                && !self.are_entangled(index, outer)
            {
                wrong.push((ProblemKind::IslandOutside, outer));
            }
            let mut islands = around.iter().filter(island_of);
            if let Some(&wall) = islands.find(|&&wall| self.loops[wall].1.lumen() == lumen) {
                wrong.push((ProblemKind::IslandInsideIsland, wall));
            }
        } else {
            let cores: HashSet<usize> = around
                .iter()
                .filter(island_of)
                .map(|&wall| self.loops[wall].1.lumen())
                .collect();
            let nested = around.iter().find(|&&wall| {
                let other = self.loops[wall].1;
                !other.is_island() && other.lumen() != lumen && !cores.contains(&other.lumen())
            });
            wrong.extend(nested.map(|&wall| (ProblemKind::NestedLumen, wall)));
        }
        for (kind, wall) in wrong {
            self.misplaced_listed += 1;
            self.found.list.push(Problem {
                kind,
                place: self.place(index, vertex),
                other: Some(self.place(wall, 0)),
            });
        }
    }
}

/// Even-odd counting along horizontal rays, one tree a loop, made when it is first asked.
struct Rays {
    /// The box of each loop, as the segment from its lower left to its upper right corner.
    boxes: SegmentTree,
    trees: Vec<Option<SegmentTree>>,
    visited: usize,
}

impl Rays {
    fn new(edges: &WallEdges) -> Self {
        let diagonal = |range: &Range<usize>| {
            let points = &edges.start[range.clone()];
            let first = points.first().copied().unwrap_or([f64::NAN; 2]);
            let bounds = points
                .iter()
                .fold(Bounds::of(first, first), |b, &p| b.union(Bounds::of(p, p)));
            [bounds.low, bounds.high]
        };
        Self {
            boxes: SegmentTree::from_segments(edges.ranges.iter().map(diagonal).collect()),
            trees: vec![None; edges.ranges.len()],
            visited: 0,
        }
    }

    /// Loops whose box holds the point.
    fn candidates(&mut self, p: Point) -> Vec<usize> {
        let mut found = Vec::new();
        let flow = self.boxes.visit_box(&Bounds::of(p, p), &mut |wall| {
            found.push(wall);
            ControlFlow::Continue(())
        });
        debug_assert!(flow.is_continue());
        self.visited += found.len();
        found
    }

    /// Whether the point lies inside the loop; `None` when it lies on its wall.
    fn is_inside(&mut self, edges: &WallEdges, wall: usize, p: Point) -> Option<bool> {
        let range = edges.ranges[wall].clone();
        let tree = self.trees[wall].get_or_insert_with(|| {
            SegmentTree::from_segments(range.map(|i| edges.ends(i)).collect())
        });
        let (inside, visited) = tree.is_inside(p);
        self.visited += visited;
        inside
    }
}

/// Whether all points lie on one line, within [`rounding`].
fn lie_on_one_line(points: &[Point], scale: f64) -> bool {
    let scaled: Vec<Point> = points.iter().map(|p| p.map(|c| c * scale)).collect();
    let Some(&origin) = scaled.first() else {
        return true;
    };
    let distance = |p: &Point| (p[0] - origin[0]).hypot(p[1] - origin[1]);
    let farthest = scaled
        .iter()
        .copied()
        .max_by(|a, b| distance(a).total_cmp(&distance(b)));
    let end = farthest.unwrap_or(origin);
    let (x, y) = (end[0] - origin[0], end[1] - origin[1]);
    let limit = rounding(&scaled) * x.hypot(y);
    scaled
        .iter()
        .all(|p| (x * (p[1] - origin[1]) - y * (p[0] - origin[0])).abs() <= limit)
}

fn ordered(a: usize, b: usize) -> (usize, usize) {
    (a.min(b), a.max(b))
}
