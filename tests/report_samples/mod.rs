//! Results with known values for the tests of the output formats, made without the solver.
//!
//! Rectangle: exact series, White, F. M. (2006), Viscous Fluid Flow, 3rd edition, McGraw-Hill, equation
//! 3-48 (from memory). Annulus: exact logarithmic solution, same book, equation 3-51 (from memory).
//! Error estimates, solver figures and the operating point are invented.
#![allow(dead_code, reason = "each test binary uses its own part")]
#![allow(clippy::unwrap_used, reason = "helpers of tests stop the test")]

use std::f64::consts::PI;

use etchwise::flow::{
    DenseField, Fluid, GridReport, Identity, LevelReport, OperatingPoint, Peak, SectionFlow,
    SectionGeometry, ShortcutRow, SolverReport, WallCurve, WallReport, WallSample, WallShear,
};
use etchwise::geometry::{Corner, Loop, Lumen, Outline, Point, corners};
use etchwise::measured::Estimate;
use etchwise::proof::Bracket;
use etchwise::report::{SolveDocument, SourceRecord};
use etchwise::warning::{Code, Warning};

/// A result with everything a document can borrow.
pub(crate) struct Sample {
    pub(crate) name: String,
    pub(crate) outline: Outline,
    pub(crate) flow: SectionFlow,
    pub(crate) field: DenseField,
    pub(crate) fluid: Fluid,
    pub(crate) point: OperatingPoint,
    pub(crate) shortcuts: Vec<ShortcutRow>,
    pub(crate) walls: WallReport,
}

impl Sample {
    /// Section alone.
    pub(crate) fn bare(&self) -> SolveDocument<'_> {
        SolveDocument::new(&self.name, &self.flow)
    }

    /// With everything.
    pub(crate) fn full(&self) -> SolveDocument<'_> {
        SolveDocument {
            source: Some(SourceRecord {
                path: "sections/sample.toml",
                sha256: "0f343b0931126a20f133d67c2b018a3b1fc2a9d1a1ab6ba4f44f4f9b8d5f0a11",
                kind: "section file",
                notes: &[],
            }),
            fluid: Some(&self.fluid),
            length: Some(self.point.length),
            operating_point: Some(&self.point),
            shortcuts: Some(&self.shortcuts),
            walls: Some(&self.walls),
            ..self.bare()
        }
    }
}

/// A rectangle with its lower left corner at `corner`, exact series on `cells` cells across the height.
pub(crate) fn rectangle(corner: Point, width: f64, height: f64, cells: usize) -> Sample {
    let (a, b) = (width / 2.0, height / 2.0);
    let h = height / cells as f64;
    let centre = [corner[0] + a, corner[1] + b];
    let outline = Outline::single(vec![
        corner,
        [corner[0] + width, corner[1]],
        [corner[0] + width, corner[1] + height],
        [corner[0], corner[1] + height],
    ]);
    let terms =
        || (0..200_i32).map(|k| (f64::from(2 * k + 1), if k % 2 == 0 { 1.0 } else { -1.0 }));
    // cosh(n pi x / 2b) / cosh(n pi a / 2b) without overflow.
    let decay = move |n: f64, x: f64| {
        let s = n * PI / (2.0 * b);
        ((-s * (a - x.abs())).exp() + (-s * (a + x.abs())).exp()) / (1.0 + (-2.0 * s * a).exp())
    };
    let phi = move |p: Point| {
        let (x, y) = (p[0] - centre[0], p[1] - centre[1]);
        if x.abs() >= a || y.abs() >= b {
            return 0.0;
        }
        let sum: f64 = terms()
            .map(|(n, sign)| sign / n.powi(3) * decay(n, x) * (n * PI * y / (2.0 * b)).cos())
            .sum();
        0.5 * (b * b - y * y) - 16.0 * b * b / PI.powi(3) * sum
    };
    let shear = move |p: Point| {
        let (x, y) = (p[0] - centre[0], p[1] - centre[1]);
        if (y.abs() - b).abs() < 1e-9 * b {
            let sum: f64 = terms().map(|(n, _)| decay(n, x) / (n * n)).sum();
            (b - 8.0 * b / (PI * PI) * sum).max(0.0)
        } else {
            terms()
                .map(|(n, sign)| {
                    let tanh = (n * PI * a / (2.0 * b)).tanh();
                    8.0 * b / (PI * PI) * sign / (n * n) * tanh * (n * PI * y / (2.0 * b)).cos()
                })
                .sum()
        }
    };
    let odd: f64 = terms()
        .map(|(n, _)| (n * PI * a / (2.0 * b)).tanh() / n.powi(5))
        .sum();
    let k = 4.0 / 3.0 * a * b.powi(3) * (1.0 - 192.0 / PI.powi(5) * b / a * odd);
    let field = lattice(&outline, h, &phi, &|p| {
        (p[0] - centre[0]).abs() < a && (p[1] - centre[1]).abs() < b
    });
    let exact = Exact {
        k,
        peak: phi(centre),
        at: centre,
    };
    sample("rectangle", outline, field, &exact, &shear)
}

/// A concentric annulus around `centre` with 360 vertices a loop; one island.
pub(crate) fn annulus(centre: Point, outer: f64, inner: f64, cells: usize) -> Sample {
    let circle = |r: f64| {
        let points = (0..360).map(|i| {
            let t = f64::from(i) * PI / 180.0;
            [centre[0] + r * t.cos(), centre[1] + r * t.sin()]
        });
        Loop::new(points.collect())
    };
    let outline = Outline {
        lumens: vec![Lumen {
            outer: circle(outer),
            islands: vec![circle(inner)],
        }],
    }
    .oriented();
    let log = (outer / inner).ln();
    let c = (outer * outer - inner * inner) / log;
    let radius = move |p: Point| (p[0] - centre[0]).hypot(p[1] - centre[1]);
    let phi = move |p: Point| {
        let r = radius(p);
        if r <= inner || r >= outer {
            return 0.0;
        }
        0.25 * (outer * outer - r * r + c * (r / outer).ln())
    };
    let shear = move |p: Point| {
        let r = radius(p);
        (0.25 * (-2.0 * r + c / r)).abs()
    };
    let k =
        PI / 8.0 * (outer.powi(4) - inner.powi(4) - (outer * outer - inner * inner).powi(2) / log);
    let fastest = (0.5 * c).sqrt();
    let at = [centre[0] + fastest, centre[1]];
    let field = lattice(&outline, (outer - inner) / cells as f64, &phi, &|p| {
        (inner..outer).contains(&radius(p))
    });
    let exact = Exact {
        k,
        peak: phi(at),
        at,
    };
    sample("annulus", outline, field, &exact, &shear)
}

/// What is known exactly.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Exact {
    pub(crate) k: f64,
    pub(crate) peak: f64,
    pub(crate) at: Point,
}

/// The field of `phi` on a lattice one cell larger than the outline; cells by 4 x 4 samples.
pub(crate) fn lattice(
    outline: &Outline,
    h: f64,
    phi: &dyn Fn(Point) -> f64,
    inside: &dyn Fn(Point) -> bool,
) -> DenseField {
    let (low, high) = outline.bounds().unwrap();
    let origin = [low[0] - h, low[1] - h];
    let nodes = |i: usize| ((high[i] - low[i]) / h).round() as usize + 3;
    let (nodes_x, nodes_y) = (nodes(0), nodes(1));
    let at = |i: f64, j: f64| [origin[0] + i * h, origin[1] + j * h];
    let values = (0..nodes_x * nodes_y)
        .map(|n| phi(at((n % nodes_x) as f64, (n / nodes_x) as f64)).max(0.0))
        .collect();
    let cells = (nodes_x - 1) * (nodes_y - 1);
    let share = |cell: usize| {
        let (i, j) = ((cell % (nodes_x - 1)) as f64, (cell / (nodes_x - 1)) as f64);
        let count = (0..16)
            .filter(|s| {
                inside(at(
                    i + (f64::from(s % 4) + 0.5) / 4.0,
                    j + (f64::from(s / 4) + 0.5) / 4.0,
                ))
            })
            .count();
        count as f64 / 16.0
    };
    DenseField {
        origin,
        spacing: h,
        nodes_x,
        nodes_y,
        phi: values,
        fluid_fraction: (0..cells).map(share).collect(),
        stride: 1,
    }
}

/// Wall samples about every `step`, always at edge middles.
fn wall_samples(outline: &Outline, step: f64, shear: &dyn Fn(Point) -> f64) -> Vec<WallSample> {
    let mut samples = Vec::new();
    for (loop_index, wall) in outline.loops().enumerate() {
        let mut arc = 0.0;
        for (a, b) in wall.edges() {
            let length = (b[0] - a[0]).hypot(b[1] - a[1]);
            let count = (length / step).ceil().max(1.0) as usize;
            for i in 0..count {
                let t = (i as f64 + 0.5) / count as f64;
                let at = [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])];
                samples.push(WallSample {
                    loop_index,
                    arc_length: arc + t * length,
                    at,
                    normal: [(b[1] - a[1]) / length, -(b[0] - a[0]) / length],
                    shear_per_gradient: shear(at),
                });
            }
            arc += length;
        }
    }
    samples
}

/// The whole sample.
pub(crate) fn sample(
    name: &str,
    outline: Outline,
    field: DenseField,
    exact: &Exact,
    shear: &dyn Fn(Point) -> f64,
) -> Sample {
    let flow = section_flow(&outline, &field, exact, shear);
    let walls = WallReport::new(&outline, &flow.wall_shear.curve, &[]);
    Sample {
        walls,
        name: name.to_owned(),
        outline,
        field,
        fluid: water(),
        point: operating_point(&flow),
        shortcuts: shortcuts(exact.k),
        flow,
    }
}

/// The result of the section; powers of the velocity by the sum over nodes.
fn section_flow(
    outline: &Outline,
    field: &DenseField,
    exact: &Exact,
    shear: &dyn Fn(Point) -> f64,
) -> SectionFlow {
    let k = exact.k;
    let geometry = geometry(outline);
    let (area, dh) = (geometry.area, geometry.hydraulic_diameter);
    let power = |n: i32| {
        let sum: f64 = field.phi.iter().map(|p| (p * area / k).powi(n)).sum();
        Estimate {
            value: sum * field.spacing.powi(2) / area,
            error: 2e-5,
        }
    };
    let fanning = dh * dh * area / (2.0 * k);
    let fluid_nodes = field.phi.iter().filter(|p| **p > 0.0).count();
    let across = geometry.width.min(geometry.height);
    let mean_shear = area / geometry.wetted_perimeter;
    SectionFlow {
        conductance: Estimate {
            value: k,
            error: 2.1e-6 * k,
        },
        bracket: Ok(Bracket {
            low: k * (1.0 - 2e-4),
            high: k * (1.0 + 1e-4),
        }),
        conductance_finest_grid: k * (1.0 - 3e-5),
        fanning_dh: fanning,
        darcy_dh: 4.0 * fanning,
        fanning_sqrt_area: 2.0 * area.powf(2.5) / (geometry.wetted_perimeter * k),
        peak: Peak {
            phi: exact.peak,
            to_mean: Estimate {
                value: exact.peak * area / k,
                error: 1e-5,
            },
            at: exact.at,
        },
        momentum_factor: power(2),
        kinetic_energy_factor: power(3),
        wall_shear: wall_shear(outline, field.spacing, mean_shear, shear),
        grid: GridReport {
            spacing: field.spacing,
            fluid_nodes,
            cells_across: across / field.spacing,
            inscribed_diameter: across,
        },
        solver: solver(field.spacing, fluid_nodes, k),
        identities: vec![
            identity(
                "mean_wall_shear",
                "mean of abs(dphi/dn) = A / P",
                mean_shear,
                3e-6,
            ),
            identity(
                "rellich",
                "closed integral of (r.n)(dphi/dn)^2 ds = 4 K",
                4.0 * k,
                -2e-5,
            ),
        ],
        accuracy: etchwise::flow::Accuracy::default(),
        warnings: Vec::new(),
        geometry,
    }
}

fn geometry(outline: &Outline) -> SectionGeometry {
    let (area, wetted_perimeter) = (outline.area(), outline.wetted_perimeter());
    let (low, high) = outline.bounds().unwrap();
    SectionGeometry {
        area,
        wetted_perimeter,
        hydraulic_diameter: 4.0 * area / wetted_perimeter,
        width: high[0] - low[0],
        height: high[1] - low[1],
        lumens: outline.lumens.len(),
        islands: outline.lumens.iter().map(|l| l.islands.len()).sum(),
        vertices: outline.loops().map(|l| l.points.len()).sum(),
    }
}

fn wall_shear(outline: &Outline, step: f64, mean: f64, shear: &dyn Fn(Point) -> f64) -> WallShear {
    let samples = wall_samples(outline, step, shear);
    let order =
        |a: &&WallSample, b: &&WallSample| a.shear_per_gradient.total_cmp(&b.shear_per_gradient);
    let largest = *samples.iter().max_by(order).unwrap();
    WallShear {
        mean_per_gradient: mean,
        max_per_gradient: largest.shear_per_gradient,
        max_at: largest.at,
        singular_corners: Vec::new(),
        curve: wall_curve(outline, &samples, step),
        samples,
    }
}

fn wall_curve(outline: &Outline, samples: &[WallSample], step: f64) -> WallCurve {
    let corners: Vec<Vec<Corner>> = outline
        .loops()
        .map(|wall| corners(wall, step, 10_f64.to_radians()))
        .collect();
    WallCurve::new(outline, &corners, samples, step)
}

/// 1 kPa over 20 mm.
fn operating_point(flow: &SectionFlow) -> OperatingPoint {
    let (g, water) = (&flow.geometry, water());
    let gradient = 1000.0 / 0.02;
    let mean = gradient / water.viscosity * flow.conductance.value / g.area;
    OperatingPoint {
        drive: etchwise::flow::Drive::PressureDrop(1000.0),
        length: 0.02,
        flow_rate: mean * g.area,
        pressure_drop: 1000.0,
        pressure_gradient: gradient,
        mean_velocity: mean,
        peak_velocity: mean * flow.peak.to_mean.value,
        reynolds_dh: water
            .density
            .map(|rho| rho * mean * g.hydraulic_diameter / water.viscosity),
        wall_shear_mean: gradient * flow.wall_shear.mean_per_gradient,
        wall_shear_max: gradient * flow.wall_shear.max_per_gradient,
        residence_time: 0.02 / mean,
        entrance_length: Some(0.6 * g.hydraulic_diameter),
    }
}

fn solver(spacing: f64, fluid_nodes: usize, k: f64) -> SolverReport {
    let level = |n: u32| LevelReport {
        spacing: spacing * f64::from(1 << n),
        fluid_nodes: fluid_nodes >> (2 * n),
        wall_nodes: 400 >> n,
        cycles: if n == 2 { 0 } else { 2 },
        conductance: k * (1.0 - 3e-5 * f64::from(1 << (2 * n))),
    };
    SolverReport {
        cycles: 2,
        residual: 3.2e-7,
        converged: true,
        convergence_factor: 0.07,
        accelerated: false,
        seconds: 0.042,
        levels: (0..3).map(level).collect(),
    }
}

fn identity(name: &'static str, formula: &'static str, expected: f64, off: f64) -> Identity {
    Identity {
        name,
        formula,
        computed: expected * (1.0 + off),
        expected,
        relative_difference: off,
        tolerance: 1e-3,
        holds: true,
    }
}

/// Water at 20 degrees Celsius, rounded, from memory.
pub(crate) fn water() -> Fluid {
    Fluid {
        name: "water".to_owned(),
        temperature: Some(293.15),
        viscosity: 1.0016e-3,
        density: Some(998.2),
        source: "given by hand".to_owned(),
    }
}

fn shortcuts(k: f64) -> Vec<ShortcutRow> {
    vec![
        ShortcutRow {
            name: "parallel plates",
            source: "an invented source",
            range: "width much larger than height",
            conductance: Some(1.2 * k),
            resistance_error: Some(1.0 / 1.2 - 1.0),
            remark: String::new(),
        },
        ShortcutRow {
            name: "round pipe of equal Dh",
            source: "an invented source",
            range: "circle",
            conductance: None,
            resistance_error: None,
            remark: "needs one lumen".to_owned(),
        },
    ]
}

/// A warning with numbers, one of them not finite.
pub(crate) fn warning() -> Warning {
    Warning {
        code: Code::ShearSingular,
        message: "The wall shear has no bound at 1 re-entrant corner.".to_owned(),
        advice: "Round the corner with the radius it has as made.".to_owned(),
        numbers: vec![("angle_deg", 270.0), ("shear_pa", f64::INFINITY)],
    }
}
