//! Invented traces, maps and pictures for check pictures: no measurement stands behind any number.

use etchwise::report::{
    Band, BandKind, CheckPicture, Curve, CurveKind, CurvePanel, Cut, Dimension, ImagePanel,
    MapPanel, Mark, MarkKind, Panel, Region, RegionKind,
};

type Point = [f64; 2];

const UM: f64 = 1e-6;
const MM: f64 = 1e-3;

/// Noise between -1 and 1 that is the same every time (a multiplicative hash of the index).
pub(crate) fn noise(index: usize) -> f64 {
    let mixed = (index as u64).wrapping_mul(0x9E37_79B9_7F4A_7C15);
    let mixed = (mixed ^ (mixed >> 29)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    (mixed >> 40) as f64 / f64::from(1_u32 << 23) - 1.0
}

/// Depth of two grooves 23 um deep with slanted flanks, at 0.9 mm and 2.1 mm.
fn grooves(x: f64) -> f64 {
    [0.9 * MM, 2.1 * MM]
        .iter()
        .map(|middle| {
            let edge = (x - middle).abs() - 150.0 * UM;
            -(23.0 * UM) * (-edge / (35.0 * UM)).clamp(0.0, 1.0)
        })
        .sum()
}

fn tilt(x: f64) -> f64 {
    4.0 * UM + 6e-3 * x + 1.0 * x * x
}

fn band(from: f64, to: f64, kind: BandKind, label: &str) -> Band {
    Band {
        from,
        to,
        kind,
        label: label.to_owned(),
    }
}

fn curve(points: Vec<Point>, kind: CurveKind, label: &str) -> Curve {
    Curve {
        points,
        kind,
        label: label.to_owned(),
    }
}

fn region(points: Vec<Point>, kind: RegionKind, label: &str) -> Region {
    Region {
        loops: vec![points],
        kind,
        label: label.to_owned(),
    }
}

fn dimension(from: Point, to: Point, text: &str) -> Dimension {
    Dimension {
        from,
        to,
        text: text.to_owned(),
    }
}

fn bands() -> Vec<Band> {
    let mut bands = vec![
        band(0.75 * MM, 1.05 * MM, BandKind::Groove, "groove 1"),
        band(1.95 * MM, 2.25 * MM, BandKind::Groove, "groove 2"),
        band(0.0, 0.74 * MM, BandKind::Land, "land 1"),
        band(1.06 * MM, 1.94 * MM, BandKind::Land, "land 2"),
        band(2.26 * MM, 3.0 * MM, BandKind::Land, "land 3"),
        band(0.1 * MM, 0.6 * MM, BandKind::Reference, "zone 1"),
        band(2.4 * MM, 2.9 * MM, BandKind::Reference, "zone 2"),
    ];
    for edge in [0.75, 1.05, 1.95, 2.25] {
        let inner = if (edge * 100.0) as i32 % 30 == 15 {
            0.012
        } else {
            -0.012
        };
        bands.push(band(edge * MM, (edge + inner) * MM, BandKind::TipShape, ""));
    }
    for spike in SPIKES {
        bands.push(band(
            spike[0] - 4.0 * UM,
            spike[0] + 4.0 * UM,
            BandKind::Bridged,
            "",
        ));
    }
    bands.push(band(1.6 * MM, 1.64 * MM, BandKind::Bridged, ""));
    bands
}

/// Places and heights of spikes.
const SPIKES: [Point; 3] = [
    [0.42 * MM, 19.0 * UM],
    [1.31 * MM, 9.0 * UM],
    [2.62 * MM, -8.0 * UM],
];

/// A tilted noisy trace with a reference line, spikes and missing points.
pub(crate) fn trace_panel(samples: usize) -> CurvePanel {
    let step = 3.0 * MM / (samples - 1) as f64;
    let raw = (0..samples)
        .map(|i| {
            let x = step * i as f64;
            let spike: f64 = SPIKES
                .iter()
                .filter(|s| (s[0] - x).abs() <= 0.51 * step)
                .map(|s| s[1])
                .sum();
            let missing = (1.6 * MM..1.64 * MM).contains(&x);
            let z = tilt(x) + grooves(x) + 0.15 * UM * noise(i) + spike;
            [x, if missing { f64::NAN } else { z }]
        })
        .collect();
    let reference = (0..=60)
        .map(|i| f64::from(i) * 3.0 * MM / 60.0)
        .map(|x| [x, tilt(x)])
        .collect();
    let bridge = vec![[1.6 * MM, tilt(1.6 * MM)], [1.64 * MM, tilt(1.64 * MM)]];
    let marks = SPIKES
        .iter()
        .map(|s| Mark {
            at: [s[0], tilt(s[0]) + s[1]],
            kind: MarkKind::Spike,
            label: format!("{:.1} \u{b5}m", s[1] / UM),
        })
        .collect();
    CurvePanel {
        title: "Trace as in the file, before levelling".to_owned(),
        x_label: "position".to_owned(),
        z_label: "height".to_owned(),
        curves: vec![
            curve(raw, CurveKind::Measured, "as measured"),
            curve(bridge, CurveKind::Bridge, "bridge over missing points"),
            curve(
                reference,
                CurveKind::Reference,
                "reference: parabola through zones 1 and 2",
            ),
        ],
        bands: bands(),
        marks,
        ..CurvePanel::default()
    }
}

/// The same trace levelled, whole.
pub(crate) fn levelled_panel(samples: usize) -> CurvePanel {
    let step = 3.0 * MM / (samples - 1) as f64;
    let level = (0..samples)
        .map(|i| {
            [
                step * i as f64,
                grooves(step * i as f64) + 0.15 * UM * noise(i),
            ]
        })
        .collect();
    let edges = [0.75, 1.05, 1.95, 2.25].map(|edge| Mark {
        at: [edge * MM, 0.0],
        kind: MarkKind::Edge,
        label: String::new(),
    });
    CurvePanel {
        title: "Trace after levelling and bridging".to_owned(),
        x_label: "position".to_owned(),
        z_label: "height above the lands".to_owned(),
        curves: vec![curve(
            level,
            CurveKind::Corrected,
            "levelled, spikes bridged",
        )],
        bands: bands(),
        marks: edges.to_vec(),
        dimensions: vec![
            dimension(
                [0.9 * MM, 0.0],
                [0.9 * MM, -23.0 * UM],
                "depth 23.04 \u{b5}m",
            ),
            dimension(
                [2.1 * MM, 0.0],
                [2.1 * MM, -23.0 * UM],
                "depth 22.97 \u{b5}m",
            ),
            dimension(
                [0.75 * MM, -2.0 * UM],
                [1.05 * MM, -2.0 * UM],
                "width 300.2 \u{b5}m",
            ),
        ],
        ..CurvePanel::default()
    }
}

/// A trapezium as wide as groove 1 and its flat part, grown by `by`.
fn trapezium(by: f64) -> Vec<Point> {
    let (top, foot) = (150.0 * UM + by, 115.0 * UM + by);
    let depth = -23.0 * UM - by;
    let mut points = vec![[-top, 0.0]];
    points.extend((0..=40).map(|i| {
        let share = f64::from(i) / 40.0;
        [
            -foot + 2.0 * foot * share,
            depth + 0.1 * UM * noise(i as usize),
        ]
    }));
    points.push([top, 0.0]);
    points
}

/// A section with lid, reach and dimensions.
pub(crate) fn section_panel(half_width: bool) -> CurvePanel {
    let lid = vec![
        [-190.0 * UM, 0.0],
        [190.0 * UM, 0.0],
        [190.0 * UM, 7.0 * UM],
        [-190.0 * UM, 7.0 * UM],
    ];
    CurvePanel {
        title: "Groove 1 as a section".to_owned(),
        x_label: "position".to_owned(),
        z_label: "height".to_owned(),
        equal_scale: true,
        half_width,
        curves: vec![curve(
            vec![[-190.0 * UM, 0.0], [190.0 * UM, 0.0]],
            CurveKind::Lid,
            "lower face of the lid",
        )],
        regions: vec![
            region(lid, RegionKind::Lid, "lid, resting on both lands"),
            region(
                trapezium(2.5 * UM),
                RegionKind::OuterReach,
                "largest section",
            ),
            region(trapezium(0.0), RegionKind::Section, "section"),
            region(
                trapezium(-2.5 * UM),
                RegionKind::InnerReach,
                "smallest section",
            ),
        ],
        dimensions: vec![
            dimension([0.0, 0.0], [0.0, -23.0 * UM], "depth 23.04 \u{b5}m"),
            dimension(
                [-150.0 * UM, -3.0 * UM],
                [150.0 * UM, -3.0 * UM],
                "top width 300.2 \u{b5}m",
            ),
            dimension(
                [-115.0 * UM, -19.0 * UM],
                [115.0 * UM, -19.0 * UM],
                "foot width 230.1 \u{b5}m",
            ),
        ],
        ..CurvePanel::default()
    }
}

/// A map of two slanted grooves with a missing patch and an outlier.
pub(crate) fn map_panel() -> MapPanel {
    let size = [640, 360];
    let spacing = [2.0 * UM, 2.0 * UM];
    let angle = 84_f64.to_radians();
    let heights = (0..size[0] * size[1])
        .map(|i| {
            let (column, row) = (i % size[0], i / size[0]);
            let (x, y) = (column as f64 * spacing[0], row as f64 * spacing[1]);
            let across = x * angle.sin() - y * angle.cos();
            let missing = (x - 1.0 * MM).hypot(y - 0.5 * MM) < 40.0 * UM || noise(i) > 0.998;
            let z = 0.6 * grooves(2.2 * across) + 1e-3 * x + 0.2 * UM * noise(i);
            let z = if i == 1234 { 90.0 * UM } else { z };
            if missing { f32::NAN } else { z as f32 }
        })
        .collect();
    MapPanel {
        title: "Height map with the lines of its traces".to_owned(),
        size,
        spacing,
        heights,
        cuts: vec![
            Cut {
                from: [0.05 * MM, 0.17 * MM],
                to: [1.2 * MM, 0.29 * MM],
                width: 30.0 * UM,
                label: "trace 1".to_owned(),
            },
            Cut {
                from: [0.05 * MM, 0.55 * MM],
                to: [1.2 * MM, 0.67 * MM],
                width: 0.0,
                label: "trace 2".to_owned(),
            },
        ],
        groove_direction: Some(angle),
    }
}

/// A picture of a half round channel with noise and a bright scratch.
pub(crate) fn image_panel() -> ImagePanel {
    let size = [900, 520];
    let pixel = 0.25 * UM;
    let radius = 45.0 * UM;
    let centre = [112.0 * UM, 92.0 * UM];
    let place = |i: usize| {
        let (column, row) = (i % size[0], i / size[0]);
        [
            (column as f64 + 0.5) * pixel,
            (size[1] as f64 - row as f64 - 0.5) * pixel,
        ]
    };
    let grey = (0..size[0] * size[1])
        .map(|i| {
            let [x, y] = place(i);
            let inside = (x - centre[0]).hypot(y - centre[1]) < radius && y < centre[1];
            let bright = if inside { 45.0 } else { 165.0 };
            let scratch = if (x - y - 40.0 * UM).abs() < 0.6 * UM {
                60.0
            } else {
                0.0
            };
            (bright + scratch + 22.0 * noise(i)).clamp(0.0, 255.0) as u8
        })
        .collect();
    let half_round = |by: f64| -> Vec<Point> {
        (0..=180)
            .map(|i| (180.0 + f64::from(i)).to_radians())
            .map(|t| {
                [
                    centre[0] + (radius + by) * t.cos(),
                    centre[1] + (radius + by) * t.sin(),
                ]
            })
            .collect()
    };
    ImagePanel {
        title: "Micrograph with the outline found in it".to_owned(),
        size,
        grey,
        pixel_size: [pixel; 2],
        origin: [0.0, 0.0],
        outlines: vec![
            region(
                half_round(0.0),
                RegionKind::Section,
                "section, at the middle of grey",
            ),
            region(
                half_round(2.0 * UM),
                RegionKind::OuterReach,
                "largest section, at 75 % of grey",
            ),
            region(
                half_round(-2.0 * UM),
                RegionKind::InnerReach,
                "smallest section, at 25 % of grey",
            ),
        ],
        crop: Some([[50.0 * UM, 30.0 * UM], [175.0 * UM, 110.0 * UM]]),
        seeds: vec![[112.0 * UM, 75.0 * UM]],
        dimensions: vec![
            dimension(
                [67.0 * UM, 92.0 * UM],
                [157.0 * UM, 92.0 * UM],
                "width 90.1 \u{b5}m",
            ),
            dimension(
                [112.0 * UM, 92.0 * UM],
                [112.0 * UM, 47.0 * UM],
                "depth 45.0 \u{b5}m",
            ),
        ],
    }
}

/// Everything on one page.
pub(crate) fn whole() -> CheckPicture {
    CheckPicture {
        title: "invented trace of two grooves (demonstration)".to_owned(),
        panels: vec![
            Panel::Map(map_panel()),
            Panel::Curves(trace_panel(6_000)),
            Panel::Curves(levelled_panel(6_000)),
            Panel::Curves(section_panel(true)),
            Panel::Curves(section_panel(true)),
            Panel::Curves(section_panel(false)),
            Panel::Image(image_panel()),
        ],
        notes: vec![
            "6000 samples in columns 1 and 2, in mm and \u{b5}m as the head of the file says.".to_owned(),
            "3 spikes were taken out and bridged; the largest stood 19.0 \u{b5}m above its \
             neighbours. A spike is a sample farther than 6 times the scatter from the median of 21 samples about it."
                .to_owned(),
            "80 missing samples from 1.600 mm to 1.640 mm were bridged by a straight line.".to_owned(),
            "A parabola through zones 1 and 2 was taken off; the zones scatter 0.087 \u{b5}m about it.".to_owned(),
        ],
        warnings: vec![
            "The flanks of 4 edges have the shape of a tip of 5 \u{b5}m; the true flanks may be steeper. \
             Smallest and largest sections are drawn for that."
                .to_owned(),
        ],
    }
}
