//! Repeated traces of one line: laid on each other, averaged, and what they say about repeatability.
//!
//! The first trace gives the positions. Each repeat is turned where it was traced backwards, shifted onto
//! it channel by channel, and lifted at each land to the height of the first there, so that different drift
//! does not count. Spikes are found in each trace by itself; a sample that is bad in one is the mean of the
//! others.

use super::correction_options::CorrectionOptions;
use super::lands::{Ground, find_lands, piecewise};
use super::profile::{Profile, RawTrace, Zone};
use super::repeat_alignment::{Alignment, LEAST_CORRELATION, align, heights_at, reversed};
use super::robust_line::robust_line;
use super::scan::Scan;
use super::step_height::{indices, step_height};
use super::trace_problem::TraceProblem;
use crate::intake::order_statistics::{median, scatter_about};

/// Where one repeat was found.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RepeatPlace {
    /// Whether it was traced backwards.
    pub is_reversed: bool,
    /// What its positions lack to those of the first trace, m, typical value; positions count from its
    /// end where it is reversed.
    pub shift: f64,
    /// Largest difference of that shift between two channels, m: the stage does not move evenly.
    pub uneven: f64,
    /// Correlation coefficient of the levelled heights.
    pub correlation: f64,
}

/// How well repeated traces agree.
#[derive(Debug, Clone, PartialEq)]
pub struct Repeatability {
    /// Number of traces.
    pub traces: usize,
    /// Standard deviation of one reading of one trace about the mean, m; walls included.
    pub reading_sd: f64,
    /// The same, robust, m: most of the trace, walls and defects left out.
    pub reading_robust_sd: f64,
    /// Robust standard deviation of the depth of one channel in one trace, m, from three channels on.
    pub depth_sd: Option<f64>,
    /// Where the repeats lie.
    pub places: Vec<RepeatPlace>,
}

/// Heights without their drift, as far as it shows: for finding the place only.
fn without_drift(good: &Profile, ground: Option<&Ground>) -> Profile {
    let knots: Vec<(f64, f64)> = ground
        .map(|ground| land_heights(good, &good.z, &ground.zones()))
        .unwrap_or_default();
    let reference = if knots.len() > 1 {
        piecewise(&knots, &good.x)
    } else {
        match robust_line(&good.x, &good.z, 300) {
            Some(line) => good.x.iter().map(|x| line.at(*x)).collect(),
            None => vec![0.0; good.x.len()],
        }
    };
    let z = good.z.iter().zip(reference).map(|(z, r)| z - r);
    Profile {
        x: good.x.clone(),
        z: z.collect(),
    }
}

/// Middle and median of heights over each zone where there are any.
fn land_heights(profile: &Profile, z: &[f64], zones: &[Zone]) -> Vec<(f64, f64)> {
    let over = |zone: &Zone| {
        let (first, last) = indices(profile, *zone);
        let mut heights: Vec<f64> = z[first..last]
            .iter()
            .copied()
            .filter(|z| z.is_finite())
            .collect();
        let height = median(&mut heights);
        height
            .is_finite()
            .then_some((0.5 * (zone.from + zone.to), height))
    };
    zones.iter().filter_map(over).collect()
}

/// A repeat on the positions of the first trace, NaN where it has no good sample.
fn laid_on(
    first: &Profile,
    repeat: &Scan,
    alignment: &Alignment,
    ground: Option<&Ground>,
) -> Vec<f64> {
    let marked = repeat.profile.z.iter().zip(&repeat.is_spike);
    let mut profile = Profile {
        x: repeat.profile.x.clone(),
        z: marked
            .map(|(z, spike)| if *spike { f64::NAN } else { *z })
            .collect(),
    };
    if alignment.is_reversed {
        // Positions count from the last good sample, as they did for the alignment.
        profile = reversed(&profile);
    }
    let heights = heights_at(&profile, alignment.places(&first.x).into_iter());
    let lower: Vec<f64> = first.z.iter().zip(&heights).map(|(a, b)| a - b).collect();
    let zones = ground.map(Ground::zones).unwrap_or_default();
    let knots = land_heights(first, &lower, &zones);
    let lift = if knots.len() > 1 {
        piecewise(&knots, &first.x)
    } else {
        let known = first.x.iter().zip(&lower).filter(|(_, d)| d.is_finite());
        let (x, d): (Vec<f64>, Vec<f64>) = known.unzip();
        match robust_line(&x, &d, 300) {
            Some(line) => first.x.iter().map(|x| line.at(*x)).collect(),
            None => vec![0.0; first.x.len()],
        }
    };
    heights.iter().zip(lift).map(|(z, l)| z + l).collect()
}

/// Averages repeats into the first trace.
pub(super) fn join(
    first: &mut Scan,
    repeats: &[RawTrace],
    options: &CorrectionOptions,
) -> Result<Repeatability, TraceProblem> {
    let good = first.good();
    let ground = find_lands(&good).ok();
    let level = without_drift(&good, ground.as_ref());
    let base = Profile {
        x: first.profile.x.clone(),
        z: first
            .profile
            .z
            .iter()
            .zip(&first.is_spike)
            .map(|(z, spike)| if *spike { f64::NAN } else { *z })
            .collect(),
    };
    let mut places = Vec::new();
    let mut heights = Vec::new();
    for (k, repeat) in repeats.iter().enumerate() {
        let number = k + 1;
        let (alignment, laid) = place_repeat(&base, &level, ground.as_ref(), repeat, options)
            .map_err(|source| match source {
                TraceProblem::RepeatDiffers { correlation, .. } => TraceProblem::RepeatDiffers {
                    number,
                    correlation,
                },
                other => TraceProblem::Repeat {
                    number,
                    source: Box::new(other),
                },
            })?;
        places.push(described(&alignment));
        heights.push(laid);
    }
    let (reading_sd, reading_robust_sd) = reading_scatter(&base, &heights);
    let depth_sd = ground
        .as_ref()
        .and_then(|ground| depth_scatter(&base, &heights, ground));
    average(first, &base, &heights);
    Ok(Repeatability {
        traces: repeats.len() + 1,
        reading_sd,
        reading_robust_sd,
        depth_sd,
        places,
    })
}

/// Where a repeat was found, in short.
fn described(alignment: &Alignment) -> RepeatPlace {
    let mut shifts: Vec<f64> = alignment.shifts.iter().map(|(_, shift)| *shift).collect();
    let lowest = shifts.iter().copied().fold(f64::INFINITY, f64::min);
    let highest = shifts.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    RepeatPlace {
        is_reversed: alignment.is_reversed,
        shift: median(&mut shifts),
        uneven: highest - lowest,
        correlation: alignment.correlation,
    }
}

/// Aligns one repeat.
fn place_repeat(
    base: &Profile,
    level: &Profile,
    ground: Option<&Ground>,
    repeat: &RawTrace,
    options: &CorrectionOptions,
) -> Result<(Alignment, Vec<f64>), TraceProblem> {
    let mut scan = Scan::new(&repeat.profile, options)?;
    scan.mark_narrow_spikes(options);
    let good = scan.good();
    let own = find_lands(&good).ok();
    let grooves = ground.map_or(&[][..], |ground| &ground.grooves);
    let alignment = align(level, &without_drift(&good, own.as_ref()), grooves);
    if alignment.correlation.is_nan() || alignment.correlation < LEAST_CORRELATION {
        return Err(TraceProblem::RepeatDiffers {
            number: 0,
            correlation: alignment.correlation,
        });
    }
    let laid = laid_on(base, &scan, &alignment, ground);
    Ok((alignment, laid))
}

/// Standard deviation of one reading, plain and robust.
fn reading_scatter(base: &Profile, heights: &[Vec<f64>]) -> (f64, f64) {
    let (mut squares, mut freedom) = (0.0, 0.0);
    let mut differences = Vec::new();
    for (k, &z) in base.z.iter().enumerate() {
        let all = std::iter::once(z).chain(heights.iter().map(|h| h[k]));
        let known: Vec<f64> = all.filter(|z| z.is_finite()).collect();
        let mean = known.iter().sum::<f64>() / known.len() as f64;
        if known.len() > 1 {
            squares += known.iter().map(|z| (z - mean) * (z - mean)).sum::<f64>();
            freedom += known.len() as f64 - 1.0;
        }
        let rests = heights.iter().map(|h| h[k] - z);
        differences.extend(rests.filter(|rest| rest.is_finite()));
    }
    let centre = median(&mut differences);
    let robust = scatter_about(&mut differences, centre) / 2.0_f64.sqrt();
    ((squares / freedom).sqrt(), robust)
}

/// Robust standard deviation of the depth of a channel in one trace.
fn depth_scatter(base: &Profile, heights: &[Vec<f64>], ground: &Ground) -> Option<f64> {
    let lands = ground.zones();
    let mut differences = Vec::new();
    for laid in heights {
        let repeat = Profile {
            x: base.x.clone(),
            z: laid.clone(),
        };
        for groove in &ground.grooves {
            let first = step_height(base, *groove, &lands);
            let second = step_height(&repeat, *groove, &lands);
            if let (Some(first), Some(second)) = (first, second) {
                differences.push(second.depth - first.depth);
            }
        }
    }
    if differences.len() < 3 {
        return None;
    }
    let centre = median(&mut differences);
    Some(scatter_about(&mut differences, centre) / 2.0_f64.sqrt())
}

/// Puts the mean of all good heights in place of the first trace's.
fn average(first: &mut Scan, base: &Profile, heights: &[Vec<f64>]) {
    for (k, &z) in base.z.iter().enumerate() {
        let all = std::iter::once(z).chain(heights.iter().map(|h| h[k]));
        let (sum, count) = all
            .filter(|z| z.is_finite())
            .fold((0.0, 0.0), |(sum, count), z| (sum + z, count + 1.0));
        if count > 0.0 {
            first.profile.z[k] = sum / count;
            first.is_spike[k] = false;
        }
    }
}
