//! Outline problems through the public interface: each kind with its place, sound outlines without any,
//! and hostile ones that must end quickly.

use etchwise::geometry::{
    LISTED_PROBLEMS, Loop, Lumen, Outline, Point, Problem, ProblemKind, Role, SegmentTree,
    Severity, largest_inscribed_circle,
};
use proptest::prelude::*;
use std::f64::consts::TAU;

fn wall(points: &[[i32; 2]]) -> Loop {
    let metres = |p: &[i32; 2]| [f64::from(p[0]) * 1e-6, f64::from(p[1]) * 1e-6];
    Loop {
        points: points.iter().map(metres).collect(),
    }
}

fn square(x: i32, y: i32, r: i32) -> Loop {
    wall(&[
        [x - r, y - r],
        [x + r, y - r],
        [x + r, y + r],
        [x - r, y + r],
    ])
}

fn lumen(outer: Loop, islands: &[Loop]) -> Lumen {
    Lumen {
        outer,
        islands: islands.to_vec(),
    }
}

fn one(outer: Loop, islands: &[Loop]) -> Outline {
    Outline {
        lumens: vec![lumen(outer, islands)],
    }
}

/// The only problem of the outline, which must be the same for both directions of every loop.
#[track_caller]
fn only_problem(outline: &Outline) -> Problem {
    let problems = outline.problems();
    assert_eq!(problems.list.len(), 1, "{problems}");
    let kinds: Vec<ProblemKind> = reversed(outline)
        .problems()
        .list
        .iter()
        .map(|p| p.kind)
        .collect();
    assert_eq!(kinds, [problems.list[0].kind]);
    problems.list[0]
}

fn reversed(outline: &Outline) -> Outline {
    let mut outline = outline.clone();
    for lumen in &mut outline.lumens {
        lumen.outer.points.reverse();
        lumen.islands.iter_mut().for_each(|i| i.points.reverse());
    }
    outline
}

#[track_caller]
fn assert_place(problem: &Problem, loop_index: usize, vertex: usize, at_um: [f64; 2]) {
    assert_eq!(
        (problem.place.loop_index, problem.place.vertex),
        (loop_index, vertex),
        "{problem}"
    );
    let at = problem.place.at;
    let distance = (at[0] * 1e6 - at_um[0]).hypot(at[1] * 1e6 - at_um[1]);
    assert!(distance < 1e-9, "{problem}");
}

fn wavy_circle(n: u32, radius: f64, waves: f64) -> Vec<Point> {
    (0..n)
        .map(|i| {
            let angle = TAU * f64::from(i) / f64::from(n);
            let r = radius * (1.0 + 0.01 * (waves * angle).cos());
            [r * angle.cos(), r * angle.sin()]
        })
        .collect()
}

#[test]
fn sound_outlines_have_no_problem() {
    let post = |x| square(x, 0, 2);
    let cases = [
        one(square(0, 0, 10), &[]),
        one(square(0, 0, 10), &[post(-5), post(0), post(5)]),
        Outline {
            lumens: vec![
                lumen(square(40, 0, 10), &[post(38), post(43)]),
                lumen(square(0, 0, 10), &[post(0)]),
            ],
        },
        // A channel in a core in a channel, listed inside first.
        Outline {
            lumens: vec![
                lumen(square(0, 0, 3), &[square(0, 0, 1)]),
                lumen(square(0, 0, 10), &[square(0, 0, 5)]),
            ],
        },
        // Vertices in the middle of straight walls, and a comb.
        one(
            wall(&[[0, 0], [5, 0], [10, 0], [10, 7], [10, 10], [0, 10]]),
            &[],
        ),
        one(
            wall(&[
                [0, 0],
                [9, 0],
                [9, 9],
                [8, 9],
                [8, 1],
                [6, 1],
                [6, 9],
                [5, 9],
                [5, 1],
                [0, 1],
            ]),
            &[],
        ),
        Outline::single(wavy_circle(1000, 1e-4, 30.0)),
    ];
    for outline in cases {
        for turned in [
            outline.clone(),
            reversed(&outline),
            outline.clone().oriented(),
        ] {
            let problems = turned.problems();
            assert!(problems.is_empty() && turned.is_valid(), "{problems}");
        }
        let moved = outline
            .rotated(0.7, [1e-5, 3e-6])
            .shifted([0.1, -2.0])
            .mirrored_left_right(0.3);
        assert!(moved.is_valid(), "{}", moved.problems());
    }
}

#[test]
fn a_vertex_that_is_not_finite_is_named_and_hides_nothing() {
    let mut outline = one(square(0, 0, 10), &[square(0, 0, 2), square(50, 0, 1)]);
    let um = 1e-6;
    outline.lumens[0].islands[0] = Loop::new(vec![
        [-um, -um],
        [um, um],
        [f64::NAN, 0.0],
        [um, -um],
        [-um, um],
    ]);
    let problems = outline.problems();
    let kinds: Vec<ProblemKind> = problems.list.iter().map(|p| p.kind).collect();
    assert_eq!(
        kinds,
        [
            ProblemKind::NonFiniteVertex,
            ProblemKind::SelfCrossing,
            ProblemKind::IslandOutside
        ]
    );
    let role = Role::Island {
        lumen: 0,
        island: 0,
    };
    // Numbers are those of the loop as given.
    assert_eq!(
        (problems.list[0].place.role, problems.list[0].place.vertex),
        (role, 2)
    );
    assert_eq!(problems.list[1].place.vertex, 3);
    let text = "island 1 of lumen 1: vertex 3 at (NaN, 0) um is not finite";
    assert_eq!(problems.list[0].to_string(), text);
    assert_eq!(problems.loops_left_out, 0);
}

#[test]
fn loops_that_enclose_nothing_are_named() {
    let problem = only_problem(&one(wall(&[[0, 0], [5, 1]]), &[]));
    assert_eq!(problem.kind, ProblemKind::TooFewVertices { count: 2 });
    assert_eq!(
        only_problem(&one(wall(&[]), &[])).kind,
        ProblemKind::TooFewVertices { count: 0 }
    );
    let problem = only_problem(&one(
        square(0, 0, 9),
        &[wall(&[[1, 1], [3, 2], [7, 4], [5, 3]])],
    ));
    assert_eq!(problem.kind, ProblemKind::ZeroArea);
    assert_place(&problem, 1, 0, [1.0, 1.0]);
}

#[test]
fn a_repeated_vertex_is_harmless_and_can_be_dropped() {
    let outline = one(
        square(0, 0, 9),
        &[wall(&[[1, 1], [3, 1], [3, 1], [3, 1], [3, 4]])],
    );
    let problems = outline.problems();
    let vertices: Vec<usize> = problems.list.iter().map(|p| p.place.vertex).collect();
    assert_eq!(vertices, [2, 3]);
    assert!(
        problems
            .list
            .iter()
            .all(|p| p.severity() == Severity::Harmless)
    );
    assert!(outline.is_valid() && !problems.is_empty());
    let text = "island 1 of lumen 1: vertex 3 at (3, 1) um repeats vertex 2";
    assert_eq!(problems.list[0].to_string(), text);
    let (clean, dropped) = outline.without_duplicate_vertices();
    assert_eq!((clean.lumens[0].islands[0].points.len(), dropped), (3, 2));
    assert!(clean.problems().is_empty());
    let closed = one(wall(&[[0, 0], [9, 0], [9, 9], [0, 0]]), &[]);
    assert_eq!(closed.problems().list[0].kind, ProblemKind::DuplicateVertex);
    assert_eq!(closed.without_duplicate_vertices().1, 1);
}

#[test]
fn a_spike_is_named_at_its_tip_only() {
    let inwards = [[0, 0], [9, 0], [9, 9], [4, 9], [4, 5], [4, 9], [0, 9]];
    let longer = [[0, 0], [9, 0], [9, 9], [-5, 9], [0, 9]];
    let shorter = [[0, 0], [9, 0], [9, 4], [9, 1], [9, 9], [0, 9]];
    for (points, vertex, at) in [(&inwards[..], 4, [4.0, 5.0]), (&longer, 3, [-5.0, 9.0])] {
        let problem = only_problem(&one(wall(points), &[]));
        assert_eq!(problem.kind, ProblemKind::Spike);
        assert_place(&problem, 0, vertex, at);
        let slanted = one(wall(points), &[])
            .rotated(0.3, [0.0; 2])
            .shifted([1e-5, 0.0])
            .problems();
        let spikes = slanted.list.iter().filter(|p| p.kind == ProblemKind::Spike);
        assert_eq!(
            spikes.map(|p| p.place.vertex).collect::<Vec<_>>(),
            [vertex],
            "{slanted}"
        );
    }
    let problems = one(wall(&shorter), &[]).problems();
    let spikes = problems
        .list
        .iter()
        .filter(|p| p.kind == ProblemKind::Spike);
    assert_eq!(
        spikes.map(|p| p.place.vertex).collect::<Vec<_>>(),
        [2, 3],
        "{problems}"
    );
}

#[test]
fn a_loop_that_meets_itself_is_named_with_both_edges() {
    let problem = only_problem(&one(wall(&[[0, 0], [4, 4], [4, 0], [0, 4]]), &[]));
    assert_eq!(problem.kind, ProblemKind::SelfCrossing);
    assert_place(&problem, 0, problem.place.vertex, [2.0, 2.0]);
    let mut edges = [problem.place.vertex, problem.other.unwrap().vertex];
    edges.sort_unstable();
    assert_eq!(edges, [0, 2]);

    let on_edge = only_problem(&one(wall(&[[0, 0], [9, 0], [9, 9], [5, 0], [0, 9]]), &[]));
    assert_eq!(on_edge.kind, ProblemKind::SelfTouch);
    assert_place(&on_edge, 0, 3, [5.0, 0.0]);
    assert_eq!(on_edge.other.unwrap().vertex, 0);
    let text = "outer loop of lumen 1: vertex 4 at (5, 0) um lies on the edge from vertex 1";
    assert_eq!(on_edge.to_string(), text);

    let figure = [[0, 0], [4, 0], [5, 3], [9, 0], [9, 9], [5, 3], [0, 9]];
    let pinched = only_problem(&one(wall(&figure), &[]));
    assert_eq!(pinched.kind, ProblemKind::SelfTouch);
    let vertices = (pinched.place.vertex, pinched.other.unwrap().vertex);
    assert!(vertices == (2, 5) || vertices == (5, 2), "{pinched}");
    assert!(pinched.to_string().contains("is the same point as vertex"));

    let slit = [
        [0, 0],
        [9, 0],
        [9, 9],
        [5, 9],
        [5, 5],
        [3, 5],
        [6, 5],
        [6, 8],
        [2, 8],
        [2, 2],
        [0, 2],
    ];
    let problems = one(wall(&slit), &[]).problems();
    assert!(
        problems
            .list
            .iter()
            .any(|p| p.kind == ProblemKind::SelfCrossing),
        "{problems}"
    );
    let folded = [
        [0, 0],
        [9, 0],
        [9, 9],
        [7, 9],
        [7, 0],
        [5, 0],
        [5, 9],
        [0, 9],
    ];
    let folded = only_problem(&one(wall(&folded), &[]));
    assert_eq!(folded.kind, ProblemKind::SelfOverlap);
    assert_place(&folded, 0, folded.place.vertex, [5.0, 0.0]);
}

#[test]
fn walls_of_different_loops_that_meet_are_named() {
    let kinds = |outline: &Outline| -> Vec<ProblemKind> {
        outline.problems().list.iter().map(|p| p.kind).collect()
    };
    let touching = only_problem(&one(square(0, 0, 9), &[wall(&[[9, 0], [5, 2], [5, -2]])]));
    assert_eq!(touching.kind, ProblemKind::LoopsTouch);
    assert_place(&touching, 1, 0, [9.0, 0.0]);
    assert_eq!(
        (
            touching.other.unwrap().loop_index,
            touching.other.unwrap().vertex
        ),
        (0, 1)
    );

    let corner = only_problem(&one(square(0, 0, 9), &[wall(&[[9, 9], [5, 7], [7, 5]])]));
    assert_eq!(corner.kind, ProblemKind::LoopsTouch);
    let flush = only_problem(&one(square(0, 0, 9), &[square(7, 0, 2)]));
    assert_eq!(flush.kind, ProblemKind::LoopsOverlap);
    assert_place(
        &flush,
        flush.place.loop_index,
        flush.place.vertex,
        [9.0, -2.0],
    );

    let crossing = one(square(0, 0, 9), &[square(8, 0, 3)]);
    assert_eq!(kinds(&crossing), [ProblemKind::IslandCrossesOuter; 2]);
    let islands = one(square(0, 0, 9), &[square(0, 0, 2), square(3, 1, 2)]);
    assert_eq!(kinds(&islands), [ProblemKind::IslandsCross; 2]);
    let lumens = Outline {
        lumens: vec![lumen(square(0, 0, 9), &[]), lumen(square(10, 3, 9), &[])],
    };
    assert_eq!(kinds(&lumens), [ProblemKind::LumensOverlap; 2]);
    let text = lumens.problems().list[0].to_string();
    assert!(text.contains("of the outer loop of lumen"), "{text}");
    let twice = Outline {
        lumens: vec![lumen(square(0, 0, 9), &[]), lumen(square(0, 0, 9), &[])],
    };
    assert_eq!(kinds(&twice), [ProblemKind::LoopsOverlap; 4]);
}

#[test]
fn loops_in_the_wrong_place_are_named() {
    let outside = only_problem(&one(square(0, 0, 9), &[square(0, 0, 1), square(30, 0, 1)]));
    assert_eq!(outside.kind, ProblemKind::IslandOutside);
    assert_place(&outside, 2, 0, [29.0, -1.0]);
    assert_eq!(
        outside.place.role,
        Role::Island {
            lumen: 0,
            island: 1
        }
    );
    let around = only_problem(&one(square(0, 0, 9), &[square(0, 0, 20)]));
    assert_eq!(around.kind, ProblemKind::IslandOutside);

    let inner = only_problem(&one(square(0, 0, 9), &[square(0, 0, 1), square(0, 0, 4)]));
    assert_eq!(inner.kind, ProblemKind::IslandInsideIsland);
    assert_place(&inner, 1, 0, [-1.0, -1.0]);
    assert_eq!(
        inner.other.unwrap().role,
        Role::Island {
            lumen: 0,
            island: 1
        }
    );

    let nested = Outline {
        lumens: vec![
            lumen(square(0, 0, 9), &[square(-5, 0, 1)]),
            lumen(square(3, 0, 2), &[]),
        ],
    };
    let nested = only_problem(&nested);
    assert_eq!(nested.kind, ProblemKind::NestedLumen);
    assert_place(&nested, 2, 0, [1.0, -2.0]);
    assert!(
        nested.to_string().ends_with("lies in the fluid of lumen 1"),
        "{nested}"
    );

    let swapped = Outline {
        lumens: vec![
            lumen(square(0, 0, 9), &[square(40, 0, 2)]),
            lumen(square(40, 0, 9), &[]),
        ],
    };
    assert_eq!(only_problem(&swapped).kind, ProblemKind::IslandOutside);
}

#[test]
fn a_crossing_elsewhere_does_not_hide_a_misplaced_island() {
    let bow_tie = wall(&[[100, 0], [104, 4], [104, 0], [100, 4]]);
    let outline = Outline {
        lumens: vec![
            lumen(bow_tie, &[]),
            lumen(
                square(0, 0, 9),
                &[square(0, 0, 1), square(30, 0, 1), square(0, 0, 3)],
            ),
        ],
    };
    let kinds: Vec<ProblemKind> = outline.problems().list.iter().map(|p| p.kind).collect();
    let expected = [
        ProblemKind::SelfCrossing,
        ProblemKind::IslandInsideIsland,
        ProblemKind::IslandOutside,
    ];
    assert_eq!(kinds, expected);
    assert!(outline.problems().notes().is_empty());
}

#[test]
fn problems_do_not_depend_on_size_or_place() {
    let outline = one(square(0, 0, 9), &[square(8, 0, 3)]);
    for factor in [1e-250, 1e-9, 1.0, 1e12, 1e250] {
        let problems = outline.clone().scaled(factor).problems();
        let kinds: Vec<ProblemKind> = problems.list.iter().map(|p| p.kind).collect();
        assert_eq!(kinds, [ProblemKind::IslandCrossesOuter; 2], "{factor}");
    }
}

#[test]
fn a_million_vertices_cost_a_few_tests_each() {
    let n = 1_000_000;
    let outline = Outline::single(wavy_circle(n, 1e-4, 30.0));
    let problems = outline.problems();
    assert!(problems.is_empty());
    assert!(problems.work < 3 * n as usize, "{}", problems.work);
    let circle = largest_inscribed_circle(&outline.lumens[0]).unwrap();
    assert!((circle.radius / 0.99e-4 - 1.0).abs() < 2e-6, "{circle:?}");
}

#[test]
fn many_islands_in_a_row_are_placed_without_comparing_all_with_all() {
    let n = 50_000;
    let islands: Vec<Loop> = (0..n).map(|i| square(10 * (i - n / 2), 0, 2)).collect();
    let outer = wall(&[[-6 * n, -9], [6 * n, -9], [6 * n, 9], [-6 * n, 9]]);
    let mut outline = one(outer, &islands);
    let problems = outline.problems();
    assert!(problems.is_empty(), "{problems}");
    assert!(problems.work < 20 * n as usize, "{}", problems.work);
    outline.lumens[0].islands[777] = square(0, 500, 1);
    let moved = outline.problems();
    assert_eq!(moved.list.len(), 1);
    assert_eq!(moved.list[0].place.loop_index, 778);
}

#[test]
fn one_touch_in_a_slanted_comb_is_found_without_comparing_all_with_all() {
    let teeth = 20_000;
    let mut points: Vec<Point> = vec![[0.0, 0.0]];
    for i in 0..teeth {
        let x = f64::from(i);
        points.extend([
            [x, 9000.0],
            [x + 0.4, 9000.0],
            [x + 0.4, 1.0],
            [x + 1.0, 1.0],
        ]);
    }
    points.push([f64::from(teeth), 0.0]);
    // One tooth reaches over its neighbour.
    points[40_002][0] += 0.8;
    let comb = Outline::single(points).rotated(0.5, [0.0; 2]).scaled(1e-6);
    let problems = comb.problems();
    assert!(
        !problems.list.is_empty() && problems.list.len() < 5,
        "{problems}"
    );
    assert!(
        problems
            .list
            .iter()
            .all(|p| p.kind == ProblemKind::SelfCrossing),
        "{problems}"
    );
    assert!(problems.notes().is_empty());
    assert!(problems.work < 20 * 4 * teeth as usize, "{}", problems.work);
}

#[test]
fn a_star_of_long_chords_is_cut_off_early() {
    let n = 20_001_u32;
    let points = (0..n).map(|i| {
        let angle = TAU * f64::from(i) * f64::from(n / 2) / f64::from(n);
        [1e-4 * angle.cos(), 1e-4 * angle.sin()]
    });
    let problems = Outline::single(points.collect()).problems();
    assert!(problems.contacts_cut_off);
    assert_eq!(problems.list.len(), LISTED_PROBLEMS);
    assert!(problems.work < 10 * n as usize, "{}", problems.work);
    assert!(problems.notes()[0].contains("cut off (limit 10000)"));
}

#[test]
fn every_problem_has_a_remedy_and_a_message_that_ends_well() {
    let outline = one(
        square(0, 0, 9),
        &[square(8, 0, 3), square(30, 0, 1), wall(&[[0, 0], [1, 1]])],
    );
    for problem in outline.problems().list {
        assert!(!problem.remedy().is_empty() && !problem.code().is_empty());
        assert!(problem.to_string().contains("of lumen 1"));
    }
}

/// Whether two closed segments with small whole coordinates meet, by exact integer arithmetic.
fn meet(s: [[i64; 2]; 2], t: [[i64; 2]; 2]) -> bool {
    let side = |a: [i64; 2], b: [i64; 2], c: [i64; 2]| {
        ((b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])).signum()
    };
    let boxes_meet = (0..2).all(|k| {
        s[0][k].min(s[1][k]) <= t[0][k].max(t[1][k]) && t[0][k].min(t[1][k]) <= s[0][k].max(s[1][k])
    });
    boxes_meet
        && side(s[0], s[1], t[0]) * side(s[0], s[1], t[1]) <= 0
        && side(t[0], t[1], s[0]) * side(t[0], t[1], s[1]) <= 0
}

type WholeLoop = Vec<[i64; 2]>;

fn whole_loops() -> impl Strategy<Value = Vec<WholeLoop>> {
    let point = prop::array::uniform2(0..12_i64);
    prop::collection::vec(prop::collection::vec(point, 3..7), 1..4)
}

/// Whether any two edges meet other than neighbours in their common vertex, by comparing all with all.
fn has_contact(loops: &[WholeLoop]) -> bool {
    let mut edges = Vec::new();
    for (index, points) in loops.iter().enumerate() {
        let n = points.len();
        edges.extend((0..n).map(|i| (index, i, n, [points[i], points[(i + 1) % n]])));
    }
    edges.iter().enumerate().any(|(k, e)| {
        edges[k + 1..].iter().any(|f| {
            let follows = |a: usize, b: usize| e.0 == f.0 && (a + 1) % e.2 == b;
            let folds = |a: [[i64; 2]; 2], b: [[i64; 2]; 2]| {
                let (u, v, w) = (a[0], a[1], b[1]);
                let cross = (v[0] - u[0]) * (w[1] - v[1]) - (v[1] - u[1]) * (w[0] - v[0]);
                let dot = (v[0] - u[0]) * (w[0] - v[0]) + (v[1] - u[1]) * (w[1] - v[1]);
                cross == 0 && dot < 0
            };
            if follows(e.1, f.1) {
                folds(e.3, f.3)
            } else if follows(f.1, e.1) {
                folds(f.3, e.3)
            } else {
                meet(e.3, f.3)
            }
        })
    })
}

fn has_repeats(points: &WholeLoop) -> bool {
    (0..points.len()).any(|i| points[i] == points[(i + 1) % points.len()])
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(3000))]

    #[test]
    fn contacts_are_reported_exactly_when_there_are_some(loops in whole_loops()) {
        prop_assume!(!loops.iter().any(has_repeats));
        let exact = |points: &WholeLoop| Loop {
            points: points.iter().map(|p| [p[0] as f64, p[1] as f64]).collect(),
        };
        let lumens: Vec<Lumen> = loops.iter().map(|l| lumen(exact(l), &[])).collect();
        let problems = Outline { lumens }.problems();
        let is_contact = |p: &Problem| {
            !matches!(p.kind, ProblemKind::NestedLumen | ProblemKind::TooFewVertices { .. })
        };
        prop_assert_eq!(problems.list.iter().any(is_contact), has_contact(&loops), "{}", problems);
    }

    #[test]
    fn misplaced_islands_are_the_same_with_and_without_a_crossing_elsewhere(
        places in prop::collection::vec((-20..20_i32, -20..20_i32, 1..6_i32), 1..8)
    ) {
        let islands: Vec<Loop> = places.iter().map(|&(x, y, r)| square(4 * x, 4 * y, 4 * r + 1)).collect();
        let alone = one(square(0, 0, 50), &islands);
        let mut with = alone.clone();
        with.lumens.push(lumen(wall(&[[500, 0], [504, 4], [504, 0], [500, 4]]), &[]));
        let list = |outline: &Outline| -> Vec<(ProblemKind, usize)> {
            let problems = outline.problems().list.into_iter();
            let of_first = problems.filter(|p| p.place.role.lumen() == 0);
            of_first.map(|p| (p.kind, p.place.loop_index)).collect()
        };
        prop_assert_eq!(list(&alone), list(&with));
    }

    #[test]
    fn random_stars_are_sound_whatever_their_place(
        radii in prop::collection::vec(0.1..1.0_f64, 3..60),
        angle in 0.0..TAU, x in -1e3..1e3_f64, size in 1e-8..1e2_f64,
    ) {
        let n = radii.len() as f64;
        let star = radii.iter().enumerate().map(|(i, r)| {
            let angle = TAU * (i as f64 + 0.1) / n;
            [size * r * angle.cos(), size * r * angle.sin()]
        });
        let star = Outline::single(star.collect()).rotated(angle, [0.0; 2]);
        prop_assert!(star.is_valid());
        let tree = SegmentTree::of_outline(&star);
        let v = star.lumens[0].outer.points[0];
        prop_assert!(tree.nearest(v).unwrap().distance <= 0.0);
        prop_assert!(star.shifted([x * size, -x * size]).is_valid());
    }
}
