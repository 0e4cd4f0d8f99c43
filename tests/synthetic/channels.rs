//! Invented channels whose shape is known, and what a profilometer would have written of them.

use std::f64::consts::TAU;
use std::fmt::Write as _;

/// Numbers that look random and are the same on every run (`SplitMix64`; Steele, Lea, Flood 2014, from memory).
pub(crate) struct Dice(u64);

impl Dice {
    pub(crate) fn new(seed: u64) -> Self {
        Self(seed)
    }

    pub(crate) fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    pub(crate) fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * (self.next() >> 11) as f64 / (1_u64 << 53) as f64
    }

    pub(crate) fn below(&mut self, n: usize) -> usize {
        (self.next() % n as u64) as usize
    }

    /// Of the normal distribution with standard deviation 1 (G. E. P. Box and M. E. Muller 1958).
    pub(crate) fn normal(&mut self) -> f64 {
        let (a, b) = (self.between(1e-300, 1.0), self.between(0.0, 1.0));
        (-2.0 * a.ln()).sqrt() * (TAU * b).cos()
    }
}

/// Shapes that a trace can hold: one depth for each place.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Kind {
    Rectangle,
    Trapezoid,
    Koh,
    KohV,
    Isotropic,
    Gaussian,
    Parabola,
    Segment,
    HalfEllipse,
    Triangle,
}

pub(crate) const KINDS: [Kind; 10] = [
    Kind::Rectangle,
    Kind::Trapezoid,
    Kind::Koh,
    Kind::KohV,
    Kind::Isotropic,
    Kind::Gaussian,
    Kind::Parabola,
    Kind::Segment,
    Kind::HalfEllipse,
    Kind::Triangle,
];

/// A channel, micrometres.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Channel {
    pub(crate) kind: Kind,
    pub(crate) width: f64,
    pub(crate) depth: f64,
}

impl Channel {
    pub(crate) fn random(kind: Kind, dice: &mut Dice) -> Self {
        let width = dice.between(40.0, 400.0);
        let aspect = dice.between(0.1, 0.5);
        let depth = match kind {
            Kind::KohV => 0.5 * width * 2.0_f64.sqrt(),
            Kind::Koh => 0.6 * aspect * width,
            // Flat floor left between the two quarter circles.
            Kind::Isotropic => 0.8 * aspect * width,
            _ => aspect * width,
        };
        Self { kind, width, depth }
    }

    /// Depth at a distance from the middle of the lid; 0 outside.
    pub(crate) fn depth_at(&self, x: f64) -> f64 {
        let (half, d) = (0.5 * self.width, self.depth);
        let from_edge = half - x.abs();
        if from_edge <= 0.0 {
            return 0.0;
        }
        let u = x.abs() / half;
        match self.kind {
            Kind::Isotropic if from_edge < d => (d * d - (d - from_edge).powi(2)).sqrt(),
            Kind::Rectangle | Kind::Isotropic => d,
            Kind::Trapezoid => d.min(from_edge * 75_f64.to_radians().tan()),
            Kind::Koh | Kind::KohV => d.min(from_edge * 2.0_f64.sqrt()),
            Kind::Gaussian => d * (-4.0 * u * u).exp() - d * (-4.0_f64).exp() * u * u,
            Kind::Parabola => d * (1.0 - u * u),
            Kind::Segment => {
                let r = (half * half + d * d) / (2.0 * d);
                (r * r - x * x).sqrt() - (r - d)
            }
            Kind::HalfEllipse => d * (1.0 - u * u).sqrt(),
            Kind::Triangle => d * (1.0 - u),
        }
    }

    /// The true outline, micrometres: lid at zero, a point for every step of angle or place.
    pub(crate) fn outline(&self) -> Vec<[f64; 2]> {
        let half = 0.5 * self.width;
        let n = 1500;
        let mut points = vec![[-half, 0.0]];
        for k in 0..=n {
            // Dense where curved walls end upright.
            let x = -half * (TAU / 2.0 * f64::from(k) / f64::from(n)).cos();
            let inside = x.clamp(-half * (1.0 - 1e-9), half * (1.0 - 1e-9));
            points.push([inside, -self.depth_at(inside)]);
        }
        points.push([half, 0.0]);
        points
    }
}

/// What stands between a channel and its trace.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Trouble {
    /// Slope of the part under the instrument.
    pub(crate) tilt: f64,
    /// Height of an arch over the whole trace, micrometres.
    pub(crate) bow: f64,
    /// Standard deviation of the noise, micrometres.
    pub(crate) noise: f64,
    pub(crate) spikes: usize,
    pub(crate) missing: usize,
}

/// Positions and heights, micrometres; NaN where there is none.
pub(crate) fn measured(
    channel: &Channel,
    trouble: &Trouble,
    step: f64,
    dice: &mut Dice,
) -> Vec<[f64; 2]> {
    let land = 0.6 * channel.width;
    let length = channel.width + 2.0 * land;
    let start = dice.between(-3.0, 3.0) * channel.width;
    let shift = dice.between(0.0, step);
    let mut rows: Vec<[f64; 2]> = (0..(length / step) as usize)
        .map(|k| {
            let s = shift + step * k as f64;
            let u = 2.0 * s / length - 1.0;
            let z = -channel.depth_at(s - 0.5 * length)
                + trouble.tilt * s
                + trouble.bow * (1.0 - u * u)
                + trouble.noise * dice.normal();
            [start + s, z]
        })
        .collect();
    let n = rows.len();
    for _ in 0..trouble.spikes {
        let at = dice.below(n);
        let size = channel.depth * dice.between(0.1, 0.5) * [1.0, -1.0][dice.below(2)];
        for row in rows.iter_mut().skip(at).take(1 + dice.below(2)) {
            row[1] += size;
        }
    }
    for _ in 0..trouble.missing {
        let at = dice.below(n);
        for row in rows.iter_mut().skip(at).take(1 + dice.below(3)) {
            row[1] = f64::NAN;
        }
    }
    rows
}

/// The rows as the bytes of a file, in one of eight dialects.
pub(crate) fn written(rows: &[[f64; 2]], dialect: usize) -> Vec<u8> {
    let mut text = String::new();
    let heights = |z: f64, missing: &str, factor: f64, decimals: usize| {
        if z.is_nan() {
            missing.to_owned()
        } else {
            format!("{:.decimals$}", z * factor)
        }
    };
    let mut line = |content: String, end: &str| {
        text.push_str(&content);
        text.push_str(end);
    };
    match dialect {
        0 => {
            line("x_um,z_um".to_owned(), "\n");
            for [x, z] in rows {
                line(format!("{x:.4},{}", heights(*z, "", 1.0, 5)), "\n");
            }
        }
        1 => {
            line("Weg [mm];Tiefe [\u{b5}m]".to_owned(), "\r\n");
            for [x, z] in rows {
                let row = format!("{:.7};{}", x * 1e-3, heights(*z, "", 1.0, 5));
                line(row.replace('.', ","), "\r\n");
            }
        }
        2 => {
            for head in [
                "Scan Settings",
                "",
                "Operator,nobody",
                "Speed,40 um/s",
                "",
                "Lateral um,Raw Nanometer,",
            ] {
                line(head.to_owned(), "\r\n");
            }
            for [x, z] in rows {
                line(format!("{x:.4},{},,", heights(*z, "BAD", 1e3, 2)), "\r\n");
            }
        }
        3 | 4 => {
            line("index,x in \u{b5}m,z in \u{b5}m".to_owned(), "\n");
            for (k, [x, z]) in rows.iter().enumerate() {
                line(format!("{k},{x:.6},{}", heights(*z, "NaN", 1.0, 6)), "\n");
            }
        }
        5 => {
            line("x (micron)\tz (nm)".to_owned(), "\n");
            for [x, z] in rows {
                line(format!("{x:.4}\t{}", heights(*z, "***", 1e3, 2)), "\n");
            }
        }
        6 => {
            line("\u{b5}m \u{b5}m".to_owned(), "\n");
            for [x, z] in rows.iter().filter(|row| !row[1].is_nan()) {
                line(format!("  {x:.6e}   {z:.6e}"), "\n");
            }
        }
        _ => {
            line("Position (m), Height (m)".to_owned(), "\n");
            for [x, z] in rows.iter().rev() {
                let z = heights(*z, "nan", 1e-6, 12);
                line(format!("{:.11}, {z}", x * 1e-6), "\n");
            }
        }
    }
    match dialect {
        // Little-endian UTF-16 with a byte order mark.
        3 => [0xff, 0xfe]
            .into_iter()
            .chain(text.encode_utf16().flat_map(u16::to_le_bytes))
            .collect(),
        // Latin-1.
        1 | 4 => text.chars().map(|c| c as u8).collect(),
        _ => text.into_bytes(),
    }
}

/// A line of what was put into a case, for messages.
pub(crate) fn told(channel: &Channel, trouble: &Trouble, dialect: usize) -> String {
    let mut text = String::new();
    // Writing to a String cannot fail.
    let _ = write!(text, "{channel:?} {trouble:?} dialect {dialect}");
    text
}
