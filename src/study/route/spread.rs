//! What a spread of `K` between branches does to the resistance and to the flow split.
//!
//! `K` of every single branch is taken as independent of the others, with the relative standard uncertainty
//! that the branch is given. To first order (GUM 5.1.2), with `G_i = 1/R_i` and shares `q_i = G_i / G`:
//! `u(R)/R = sqrt(sum of (q_i u_i)^2)` for a segment, `u(q_i)/q_i = sqrt(((1 - q_i) u_i)^2 + sum over j other
//! than i of (q_j u_j)^2)`; segments add `u(R)^2`. Checked by drawing every branch from a log-normal law with
//! that relative standard deviation, a fixed seed, [`DRAWS`] times.

use super::branch::{Route, RouteSegment};

/// Draws of the check where branches are few.
pub const DRAWS: usize = 20_000;
/// Branches times draws at most.
const MOST_WORK: usize = 20_000_000;
/// Seed of the check.
const SEED: u64 = 0x5eed_0f5b_2a9c_4d31;

/// Spread of a whole route.
#[derive(Debug, Clone, PartialEq)]
pub struct RouteSpread {
    /// Relative standard uncertainty of the resistance, linear.
    pub linear: f64,
    /// The same from draws.
    pub drawn: f64,
    /// Number of draws.
    pub draws: usize,
    /// One for each segment.
    pub segments: Vec<SegmentSpread>,
}

/// Spread of a segment.
#[derive(Debug, Clone, PartialEq)]
pub struct SegmentSpread {
    /// Relative standard uncertainty of its resistance, linear.
    pub linear: f64,
    /// One for each branch.
    pub shares: Vec<ShareSpread>,
}

/// Spread of the share of one branch.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ShareSpread {
    /// Relative standard uncertainty of the share of one, linear.
    pub linear: f64,
    /// The same from draws.
    pub drawn: f64,
}

/// The spread; `None` where no branch has one.
pub fn route_spread(route: &Route) -> Option<RouteSpread> {
    if route.branches().all(|b| b.spread.is_none_or(|u| u <= 0.0)) {
        return None;
    }
    let mut segments: Vec<SegmentSpread> = route.segments.iter().map(linear).collect();
    let branches: usize = route.branches().map(|b| b.count).sum();
    let draws = (MOST_WORK / branches.max(1)).clamp(200, DRAWS);
    let mut random = Random(SEED);
    let mut total = Moments::default();
    let mut shares: Vec<Vec<Moments>> = segments
        .iter()
        .map(|s| vec![Moments::default(); s.shares.len()])
        .collect();
    for _ in 0..draws {
        let mut resistance = 0.0;
        for (segment, shares) in route.segments.iter().zip(&mut shares) {
            resistance += draw(segment, &mut random, shares);
        }
        total.add(resistance);
    }
    for (segment, moments) in segments.iter_mut().zip(&shares) {
        for (share, moments) in segment.shares.iter_mut().zip(moments) {
            share.drawn = moments.relative_deviation();
        }
    }
    let parts = route.segments.iter().zip(&segments);
    let square: f64 = parts
        .map(|(s, spread)| (s.integral.value * spread.linear).powi(2))
        .sum();
    Some(RouteSpread {
        linear: square.sqrt() / route.integral.value,
        drawn: total.relative_deviation(),
        draws,
        segments,
    })
}

fn linear(segment: &RouteSegment) -> SegmentSpread {
    let of_one = |b: &super::RouteBranch| (b.share * b.spread.unwrap_or(0.0)).powi(2);
    let square: f64 = segment
        .branches
        .iter()
        .map(|b| b.count as f64 * of_one(b))
        .sum();
    let shares = segment.branches.iter().map(|b| {
        let own = ((1.0 - b.share) * b.spread.unwrap_or(0.0)).powi(2);
        ShareSpread {
            linear: (own + (square - of_one(b)).max(0.0)).sqrt(),
            drawn: 0.0,
        }
    });
    SegmentSpread {
        linear: square.sqrt(),
        shares: shares.collect(),
    }
}

/// One draw of a segment: its `R / mu`, and the share of the first of each branch.
fn draw(segment: &RouteSegment, random: &mut Random, shares: &mut [Moments]) -> f64 {
    let mut sum = 0.0;
    let mut firsts = Vec::with_capacity(segment.branches.len());
    for branch in &segment.branches {
        // A log-normal law with mean 1 and this relative standard deviation.
        let width = branch.spread.unwrap_or(0.0).powi(2).ln_1p().sqrt();
        let middle = -0.5 * width * width;
        for index in 0..branch.count {
            let factor = if width > 0.0 {
                (middle + width * random.normal()).exp()
            } else {
                1.0
            };
            let conductance = factor / branch.integral.value;
            if index == 0 {
                firsts.push(conductance);
            }
            sum += conductance;
        }
    }
    for (moments, first) in shares.iter_mut().zip(firsts) {
        moments.add(first / sum);
    }
    1.0 / sum
}

/// Running mean and sum of squares (Welford 1962, from memory).
#[derive(Debug, Clone, Copy, Default)]
struct Moments {
    count: f64,
    mean: f64,
    squares: f64,
}

impl Moments {
    fn add(&mut self, value: f64) {
        self.count += 1.0;
        let before = value - self.mean;
        self.mean += before / self.count;
        self.squares += before * (value - self.mean);
    }

    fn relative_deviation(&self) -> f64 {
        (self.squares / (self.count - 1.0)).sqrt() / self.mean
    }
}

/// Random numbers: a 64-bit counter mixed (Steele, Lea and Flood 2014, from memory).
struct Random(u64);

impl Random {
    fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^= z >> 31;
        ((z >> 11) as f64 + 0.5) / (1_u64 << 53) as f64
    }

    /// Box and Muller (1958), from memory.
    fn normal(&mut self) -> f64 {
        let radius = (-2.0 * self.uniform().ln()).sqrt();
        radius * (2.0 * std::f64::consts::PI * self.uniform()).cos()
    }
}
