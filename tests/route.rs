//! Channels along their length: closed integrals, proven values, branches, spread, operation.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use std::f64::consts::PI;

use etchwise::flow::{Drive, Fluid, SolveOptions};
use etchwise::geometry::NominalSpec;
use etchwise::study::{
    BranchDesign, Interpolation, LawOfK, Route, RouteDesign, RouteError, RouteOperation,
    RouteOptions, RouteSection, SegmentDesign, StationDesign, UsedRule, nested, route_spread,
    solve_route,
};

fn section(text: &str) -> RouteSection {
    let spec: NominalSpec = text.parse().unwrap();
    RouteSection {
        label: text.to_owned(),
        outline: spec.outline().unwrap(),
        nominal: Some(spec),
    }
}

fn branch(name: &str, stations: &[(f64, usize)]) -> BranchDesign {
    let stations = stations
        .iter()
        .map(|&(position, section)| StationDesign { position, section });
    BranchDesign {
        name: name.to_owned(),
        count: 1,
        interpolation: Interpolation::Automatic,
        spread: None,
        stations: stations.collect(),
    }
}

fn segment(name: &str, branches: Vec<BranchDesign>) -> SegmentDesign {
    SegmentDesign {
        name: name.to_owned(),
        branches,
    }
}

fn options(cells: f64) -> RouteOptions {
    RouteOptions {
        solve: SolveOptions {
            cells_across: Some(cells),
            ..SolveOptions::default()
        },
        ..RouteOptions::default()
    }
}

fn solved(segments: Vec<SegmentDesign>, sections: Vec<RouteSection>) -> Route {
    solve_route(&RouteDesign { segments, sections }, &options(32.0)).unwrap()
}

/// Integral of `dx / K` of a rectangle of width `w` whose height goes evenly from `h0` to `h1` over the length 1.
///
/// From the Fourier series of the rectangle (Boussinesq 1868) with `tanh = 1`, which holds to 1e-12 from 10 to 1:
/// `K = w h^3 / 12 (1 - c h / w)`, `c = 192 / pi^5 * sum of 1/n^5, odd n`; by partial fractions.
fn taper(w: f64, h0: f64, h1: f64) -> f64 {
    let sum: f64 = (0..400).map(|k| f64::from(2 * k + 1).powi(-5)).sum();
    let c = 192.0 / PI.powi(5) * sum / w;
    let primitive = |h: f64| 12.0 / w * (-0.5 / (h * h) - c / h + c * c * (h / (1.0 - c * h)).ln());
    (primitive(h1) - primitive(h0)) / (h1 - h0)
}

#[test]
fn a_plate_like_taper_meets_its_closed_integral() {
    for (from, to) in [(50, 25), (30, 60), (40, 39)] {
        let sections = vec![
            section(&format!("rectangle width=1mm height={from}um")),
            section(&format!("rectangle width=1mm height={to}um")),
        ];
        let ends = branch("", &[(2e-3, 0), (10e-3, 1)]);
        let route = solved(vec![segment("taper", vec![ends])], sections);
        let exact = 8e-3 * taper(1e-3, f64::from(from) * 1e-6, f64::from(to) * 1e-6);
        let off = route.integral.value / exact - 1.0;
        assert!(off.abs() < 1e-5, "{from} to {to}: {off:e}");
        assert!(
            off.abs() < 2.0 * route.integral.relative(),
            "{from} to {to}"
        );
        let (low, high) = *route.bounds.as_ref().unwrap();
        assert!(low < exact && exact < high);
        assert_eq!(
            route.segments[0].branches[0].ways[0].0.used,
            UsedRule::Dimensions
        );
        assert!(route.is_converged());
        // Volume: the mean of the depths.
        let volume = 8e-3 * 1e-3 * 0.5 * f64::from(from + to) * 1e-6;
        assert!((route.volume() / volume - 1.0).abs() < 1e-9);
    }
}

#[test]
fn more_sections_between_narrow_the_proven_range() {
    let sections = vec![
        section("rectangle width=400um height=40um"),
        section("rectangle width=400um height=20um"),
    ];
    let ends = branch("", &[(0.0, 0), (1e-3, 1)]);
    let design = RouteDesign {
        segments: vec![segment("taper", vec![ends])],
        sections,
    };
    let width = |least_between: usize| {
        let options = RouteOptions {
            least_between,
            ..options(24.0)
        };
        let (low, high) = solve_route(&design, &options).unwrap().bounds.unwrap();
        let exact = 1e-3 * taper(400e-6, 40e-6, 20e-6);
        assert!(low < exact && exact < high);
        (high - low) / exact
    };
    let (few, many) = (width(1), width(15));
    assert!(many < 0.45 * few, "{few} {many}");
}

#[test]
fn a_cone_goes_with_the_fourth_root_of_k() {
    let sections = vec![
        section("circle diameter=100um"),
        section("circle diameter=60um"),
    ];
    let ends = branch("", &[(0.0, 0), (1e-3, 1)]);
    let route = solved(vec![segment("cone", vec![ends])], sections);
    // Integral of 128 / (pi d^4): closed form of a cone.
    let exact = 128.0 / PI * 1e-3 / (3.0 * 40e-6) * (60e-6_f64.powi(-3) - 100e-6_f64.powi(-3));
    assert!((route.integral.value / exact - 1.0).abs() < 3e-5);
    let by_root = route.integral_by(LawOfK::FourthRoot);
    assert!((by_root / exact - 1.0).abs() < 3e-5);
    assert!(route.integral_by(LawOfK::Resistance) > 1.2 * exact);
}

#[test]
fn outlines_go_with_the_cube_root_and_say_why() {
    let mut sections = vec![
        section("koh_groove opening=100um depth=40um"),
        section("koh_groove opening=100um depth=30um"),
        section("circle diameter=60um"),
    ];
    sections[0].nominal = None;
    let ends = branch("", &[(0.0, 0), (1e-3, 1), (2e-3, 2)]);
    let route = solved(vec![segment("s", vec![ends])], sections);
    let ways = &route.segments[0].branches[0].ways;
    assert_eq!(ways[0].0.used, UsedRule::Law(LawOfK::CubeRoot));
    assert!(ways[0].0.why.as_ref().unwrap().contains("nominal"));
    assert!(ways[1].0.why.as_ref().unwrap().contains("circle"));
    // The walls of the grooves are nested, those of groove and circle are not.
    let (low, high) = *ways[0].0.bounds.as_ref().unwrap();
    assert!(low < ways[0].0.mean_inverse.value && ways[0].0.mean_inverse.value < high);
    assert!(route.bounds.unwrap_err().contains("stations 2 and 3"));
}

#[test]
fn the_proven_range_follows_from_the_smaller_and_the_larger_section() {
    let (small, large) = (
        section("koh_groove opening=100um depth=30um"),
        section("koh_groove opening=100um depth=40um"),
    );
    assert!(nested(&small.outline, &large.outline).is_ok());
    assert!(nested(&large.outline, &small.outline).is_err());
    let ends = branch("", &[(0.0, 0), (1.0, 1)]);
    let mut ends = ends;
    ends.interpolation = Interpolation::Law(LawOfK::Conductance);
    let route = solved(vec![segment("s", vec![ends])], vec![small, large]);
    let (low, high) = *route.bounds.as_ref().unwrap();
    let brackets = [0, 1].map(|i: usize| route.flows[i].flow.bracket.unwrap());
    assert!((low * brackets[1].high - 1.0).abs() < 1e-9);
    assert!((high * brackets[0].low - 1.0).abs() < 1e-5);
}

#[test]
fn branches_beside_each_other_share_the_flow_by_their_conductances() {
    let sections = vec![
        section("rectangle width=100um height=40um"),
        section("rectangle width=80um height=40um"),
    ];
    let [a, b] = [
        branch("a", &[(0.0, 0), (4e-3, 0)]),
        branch("b", &[(0.0, 1), (9e-3, 1)]),
    ];
    let several = BranchDesign { count: 3, ..b };
    let route = solved(vec![segment("fork", vec![a, several])], sections);
    let k = [0, 1].map(|i: usize| route.flows[i].flow.conductance.value);
    let g = [k[0] / 4e-3, k[1] / 9e-3];
    let total = g[0] + 3.0 * g[1];
    assert!((route.integral.value * total - 1.0).abs() < 1e-12);
    let shares: Vec<f64> = route.branches().map(|b| b.share).collect();
    assert!((shares[0] - g[0] / total).abs() < 1e-12);
    assert!((shares[0] + 3.0 * shares[1] - 1.0).abs() < 1e-12);
    let volume = 100e-6 * 40e-6 * 4e-3 + 3.0 * 80e-6 * 40e-6 * 9e-3;
    assert!((route.volume() / volume - 1.0).abs() < 1e-9);
    let (low, high) = *route.bounds.as_ref().unwrap();
    assert!(low < route.integral.value && route.integral.value < high);
}

#[test]
fn the_spread_of_equal_branches_is_that_of_a_mean() {
    let sections = vec![section("rectangle width=100um height=40um")];
    let fork = BranchDesign {
        count: 4,
        spread: Some(0.05),
        ..branch("", &[(0.0, 0), (4e-3, 0)])
    };
    let single = branch("", &[(0.0, 0), (1e-3, 0)]);
    let route = solved(
        vec![segment("fork", vec![fork]), segment("single", vec![single])],
        sections,
    );
    let spread = route_spread(&route).unwrap();
    // u / sqrt(4) of the fork; u sqrt(1 - 1/4) of a share; half of R is without spread.
    assert!((spread.segments[0].linear - 0.025).abs() < 1e-12);
    let share = spread.segments[0].shares[0];
    assert!((share.linear - 0.05 * 0.75_f64.sqrt()).abs() < 1e-12);
    assert!((spread.linear - 0.0125).abs() < 1e-9);
    assert!((share.drawn / share.linear - 1.0).abs() < 0.03, "{share:?}");
    assert!(
        (spread.drawn / spread.linear - 1.0).abs() < 0.03,
        "{spread:?}"
    );
    assert_eq!(spread, route_spread(&route).unwrap(), "draws repeat");
}

#[test]
fn pressure_falls_along_the_route_and_flow_and_pressure_are_two_ways_to_one_point() {
    let sections = vec![
        section("rectangle width=100um height=40um"),
        section("rectangle width=100um height=20um"),
    ];
    let taper = branch("", &[(0.0, 0), (5e-3, 1)]);
    let outlet = branch("", &[(0.0, 1), (2e-3, 1)]);
    let route = solved(
        vec![
            segment("taper", vec![taper]),
            segment("outlet", vec![outlet]),
        ],
        sections,
    );
    let water = Fluid::water(298.15).unwrap();
    let rate = 5e-9 / 60.0;
    let by_flow = RouteOperation::new(&route, &water, Drive::FlowRate(rate)).unwrap();
    let drop = rate * water.viscosity * route.integral.value;
    assert!((by_flow.pressure_drop / drop - 1.0).abs() < 1e-12);
    let by_pressure = RouteOperation::new(&route, &water, Drive::PressureDrop(drop)).unwrap();
    assert!((by_pressure.flow_rate / rate - 1.0).abs() < 1e-12);
    let pressures: Vec<f64> = by_flow
        .segments
        .iter()
        .flat_map(|s| &s.branches[0].points)
        .map(|p| p.pressure)
        .collect();
    assert!((pressures[0] / drop - 1.0).abs() < 1e-12);
    assert!(pressures.windows(2).all(|p| p[1] <= p[0]));
    assert!(pressures.last().unwrap().abs() < 1e-9 * drop);
    // The wall is sheared most where the channel is lowest; 6 mu Q / (w h^2) is the value of wide plates.
    assert!(by_flow.shear_at.segment == 1 || by_flow.shear_at.point > 1);
    let plates = 6.0 * water.viscosity * rate / (100e-6 * 20e-6 * 20e-6);
    assert!((1.0..1.3).contains(&(by_flow.shear_max / plates)));
    assert!((by_flow.residence_time * rate / route.volume() - 1.0).abs() < 1e-12);
    assert!(by_flow.entrance_share.unwrap() > 0.0);
    for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        assert!(RouteOperation::new(&route, &water, Drive::FlowRate(bad)).is_err());
        assert!(RouteOperation::new(&route, &water, Drive::PressureDrop(bad)).is_err());
    }
}

#[test]
fn incomplete_designs_are_refused() {
    let sections = vec![
        section("rectangle width=100um height=40um"),
        section("circle diameter=40um"),
    ];
    let refused = |segments: Vec<SegmentDesign>| {
        let design = RouteDesign {
            segments,
            sections: sections.clone(),
        };
        solve_route(&design, &options(16.0)).unwrap_err()
    };
    assert_eq!(refused(Vec::new()), RouteError::Empty);
    assert_eq!(refused(vec![segment("s", Vec::new())]), RouteError::Empty);
    let of = |stations: &[(f64, usize)]| vec![segment("s", vec![branch("", stations)])];
    assert_eq!(refused(of(&[(0.0, 0)])), RouteError::Empty);
    for stations in [
        &[(0.0, 0), (0.0, 0)],
        &[(1.0, 0), (0.0, 0)],
        &[(0.0, 0), (1.0, 7)],
    ] {
        assert!(matches!(
            refused(of(stations)),
            RouteError::Station { station: 2, .. }
        ));
    }
    let mut segments = of(&[(0.0, 0), (1.0, 1)]);
    segments[0].branches[0].interpolation = Interpolation::Dimensions;
    assert!(matches!(refused(segments), RouteError::NotBetween { .. }));
}
