//! All corrections of a trace, in order, each with its record.
//!
//! Turn over; mark spikes; join repeats; find lands; take the reference line off; bridge what is marked or
//! missing; filter where asked; scale for shrinkage last, so that everything typed in is as measured.

use super::bridging::{bridge, bridge_warning};
use super::corrected::{Change, CorrectedTrace};
use super::correction_options::{CorrectionOptions, Levelling};
use super::correction_records as records;
use super::lands::{Ground, find_lands, find_lands_roughly};
use super::levelling::{Curve, Reference, fit_reference};
use super::profile::{Profile, RawTrace, Zone};
use super::profile_filter::gaussian;
use super::repeats;
use super::scan::{Scan, relief, spacings};
use super::step_height::{StepHeight, indices, step_height};
use super::trace_problem::{FEWEST_IN_ZONE, TraceProblem};
use crate::intake::order_statistics::{median, thinned};

/// Largest distance of a land from one straight line, in depths, before the line is taken land by land.
pub(super) const WORST_LAND: f64 = 0.01;

/// Step from one land to the next, in depths off one straight line, from which lands that were found are
/// taken for ledges on the walls of larger channels. Drift of instruments stays far below it.
const UNEVEN_LANDS: f64 = 2.0;

/// Most scatter of one reading, in depths, of traces that repeat each other: their mean is no trace of a
/// channel beyond that.
const MOST_SCATTER: f64 = 0.2;

/// Corrects a trace: spikes and missing points bridged, levelled, repeats averaged, every step recorded.
///
/// - `raw`: positions and heights as the instrument wrote them, m; heights that are not finite are missing
/// - `repeats`: further traces of the same line, in either direction; may be empty
/// - `options`: what is asked
///
/// Heights come out over the reference line, so that lands lie at zero and channels below. Nothing is
/// smoothed unless a cut-off is given. Time is linear in the number of samples but for sorting.
///
/// # Accuracy
/// With noise of 0.2 % of the depth, the depth of a rectangular channel comes out within 0.3 % under tilt up
/// to 5 degrees, bow, drift, spikes and missing points: tests of this module.
///
/// # Errors
/// [`TraceProblem`] where options are out of range, positions do not increase, too few samples have a
/// height, no channel lies between two lands, a stated zone holds no samples, or a repeat does not fit.
///
/// # Examples
/// ```
/// use etchwise::intake::{CorrectionOptions, Profile, RawTrace, correct};
/// let x: Vec<f64> = (0..=400).map(|k| 1e-6 * f64::from(k)).collect();
/// let z = x.iter().map(|x| 0.02 * x - if (150e-6..250e-6).contains(x) { 30e-6 } else { 0.0 });
/// let profile = Profile { z: z.collect(), x };
/// let raw = RawTrace { profile, ..RawTrace::default() };
/// let trace = correct(&raw, &[], &CorrectionOptions::default())?;
/// assert_eq!(trace.lands.len(), 2);
/// assert!((trace.step_heights[0].depth - 30e-6).abs() < 1e-9);
/// # Ok::<(), etchwise::intake::TraceProblem>(())
/// ```
pub fn correct(
    raw: &RawTrace,
    repeats: &[RawTrace],
    options: &CorrectionOptions,
) -> Result<CorrectedTrace, TraceProblem> {
    options.check()?;
    let mut trace = CorrectedTrace {
        inverted: options.invert,
        shrinkage: options.shrinkage,
        ..CorrectedTrace::default()
    };
    let mut scan = Scan::new(&raw.profile, options)?;
    records::orientation(&mut trace, &scan, options);
    scan.refuse_straight()?;
    scan.mark_narrow_spikes(options);
    if !repeats.is_empty() {
        let agreement = repeats::join(&mut scan, repeats, options)?;
        trace.repeatability = Some(agreement);
    }
    let ground = found_ground(&mut scan, options)?;
    let depth = ground
        .as_ref()
        .map_or_else(|| relief(&scan.good()), |g| g.depth);
    if let (Some(agreement), Some(ground)) = (&trace.repeatability, &ground)
        && agreement.reading_robust_sd > MOST_SCATTER * ground.depth
    {
        return Err(TraceProblem::RepeatsScatter {
            scatter: agreement.reading_robust_sd,
            depth: ground.depth,
        });
    }
    trace.lands = lands(&scan, ground.as_ref(), options)?;
    records::repeats(&mut trace, ground.as_ref());
    records::lands(&mut trace, ground.as_ref(), options);
    let crests = ground.as_ref().and_then(records::crests_warning);
    trace.warnings.extend(crests);
    let grooves = channels(&trace.lands, ground.as_ref(), options);
    take_reference(&mut trace, &scan, options, depth)?;
    trace.noise_sd = ground.as_ref().map_or(0.0, |ground| ground.noise);
    trace.changes = bridge(&mut trace.profile, &scan.is_spike);
    records::bridges(&mut trace, &scan, options);
    let warning = bridge_warning(&trace.changes, &trace.profile, &grooves, depth);
    trace.warnings.extend(warning);
    filter(&mut trace, options)?;
    trace.step_heights = step_heights(&trace.profile, &grooves, &trace.lands);
    records::depths(&mut trace);
    shrink(&mut trace, options.shrinkage);
    Ok(trace)
}

/// Lands and channels, with the wider spikes marked; `None` where none is found and none is needed.
fn found_ground(
    scan: &mut Scan,
    options: &CorrectionOptions,
) -> Result<Option<Ground>, TraceProblem> {
    let needed = options.lands.is_none()
        && matches!(
            options.level,
            Levelling::Lands | Levelling::Line | Levelling::Local
        );
    if let Ok(ground) = find_lands_roughly(&scan.good()) {
        scan.mark_wider_spikes(options, &ground);
    }
    match find_lands(&scan.good()) {
        Ok(ground) => Ok(Some(ground)),
        Err(problem) if needed => Err(problem),
        Err(_) => Ok(None),
    }
}

/// Zones in order, each checked to lie on the trace with enough samples; overlapping ones joined.
fn checked_zones(
    scan: &Scan,
    zones: &[Zone],
    option: &'static str,
) -> Result<Vec<Zone>, TraceProblem> {
    let x = &scan.profile.x;
    let (start, end) = (x[0], x[x.len() - 1]);
    let good = scan.good();
    let mut sorted: Vec<Zone> = zones.to_vec();
    sorted.sort_by(|a, b| a.from.total_cmp(&b.from));
    let mut kept: Vec<Zone> = Vec::new();
    for zone in sorted {
        let Zone { from, to } = zone;
        if !(from < to && from < end && to > start) {
            return Err(TraceProblem::ZoneOutside {
                option,
                from,
                to,
                start,
                end,
            });
        }
        let zone = Zone {
            from: from.max(start),
            to: to.min(end),
        };
        let (first, last) = indices(&good, zone);
        if last < first + FEWEST_IN_ZONE {
            return Err(TraceProblem::ZoneEmpty {
                option,
                from,
                to,
                samples: last - first,
            });
        }
        match kept.last_mut() {
            Some(before) if zone.from <= before.to => before.to = before.to.max(zone.to),
            _ => kept.push(zone),
        }
    }
    if kept.is_empty() {
        return Err(TraceProblem::NoZone { option });
    }
    Ok(kept)
}

/// The lands: stated, found, or none.
fn lands(
    scan: &Scan,
    ground: Option<&Ground>,
    options: &CorrectionOptions,
) -> Result<Vec<Zone>, TraceProblem> {
    match &options.lands {
        Some(zones) => checked_zones(scan, zones, "--land-zones"),
        None => Ok(ground.map(Ground::zones).unwrap_or_default()),
    }
}

/// Channels between neighbouring lands, from edge to edge as far as edges are known.
fn channels(lands: &[Zone], ground: Option<&Ground>, options: &CorrectionOptions) -> Vec<Zone> {
    match ground {
        Some(ground) if options.lands.is_none() => ground.grooves.clone(),
        _ => lands
            .windows(2)
            .map(|pair| Zone {
                from: pair[0].to,
                to: pair[1].from,
            })
            .collect(),
    }
}

/// Takes the reference line off; fills raw, profile and reference.
fn take_reference(
    trace: &mut CorrectedTrace,
    scan: &Scan,
    options: &CorrectionOptions,
    depth: f64,
) -> Result<(), TraceProblem> {
    let good = scan.good();
    let x = &scan.profile.x;
    let (zones, option) = match &options.level {
        Levelling::Lands | Levelling::Line | Levelling::Local => {
            let is_stated = options.lands.is_some();
            let option = if is_stated {
                "--land-zones"
            } else {
                "the lands found"
            };
            (trace.lands.clone(), option)
        }
        Levelling::Zones(zones) => (checked_zones(scan, zones, "--level-on")?, "--level-on"),
        Levelling::Ends => (end_zones(x), "--level ends"),
        Levelling::None => (Vec::new(), "--level none"),
    };
    trace.raw = scan.profile.clone();
    trace.reference = vec![0.0; x.len()];
    if zones.is_empty() {
        records::not_levelled(trace);
    } else {
        let is_local = options.level == Levelling::Local;
        let mut fitted = fit_reference(&good, &zones, options, is_local, option)?;
        let mut off_one_line = None;
        let may_switch = options.level == Levelling::Lands && options.bow == 1 && zones.len() > 2;
        if may_switch && fitted.worst() > WORST_LAND * depth {
            let step = fitted.largest_step();
            if step > UNEVEN_LANDS * depth && options.lands.is_none() {
                return Err(TraceProblem::UnevenLands { step, depth });
            }
            off_one_line = Some(fitted.worst());
            fitted = fit_reference(&good, &zones, options, true, option)?;
        }
        trace.reference = fitted.heights(x);
        trace.reference_zones = zones;
        trace.reference_rms = fitted.rms;
        trace.reference_worst = fitted.worst();
        trace.polynomial = polynomial_heights(&fitted, options, x);
        records::levelled(trace, &fitted, off_one_line, options, depth);
    }
    let z = scan.profile.z.iter().zip(&trace.reference);
    trace.profile = Profile {
        z: z.map(|(z, reference)| z - reference).collect(),
        x: x.clone(),
    };
    Ok(())
}

/// The first and the last twentieth of the trace.
fn end_zones(x: &[f64]) -> Vec<Zone> {
    let (start, end) = (x[0], x[x.len() - 1]);
    let part = 0.05 * (end - start);
    vec![
        Zone {
            from: start,
            to: start + part,
        },
        Zone {
            from: end - part,
            to: end,
        },
    ]
}

/// A polynomial as heights at even places from end to end.
fn polynomial_heights(fitted: &Reference, options: &CorrectionOptions, x: &[f64]) -> Vec<f64> {
    let Curve::Polynomial(polynomial) = &fitted.curve else {
        return Vec::new();
    };
    let (start, end) = (x[0], x[x.len() - 1]);
    (0..=options.bow)
        .map(|k| f64::from(k) / f64::from(options.bow))
        .map(|share| polynomial.at(start + share * (end - start)))
        .collect()
}

/// The Gaussian filter, where asked.
fn filter(trace: &mut CorrectedTrace, options: &CorrectionOptions) -> Result<(), TraceProblem> {
    let Some(cutoff) = options.cutoff else {
        return Ok(());
    };
    let x = &trace.profile.x;
    let shortest = 3.0 * median(&mut thinned(&spacings(x), 100_000));
    let longest = 0.5 * (x[x.len() - 1] - x[0]);
    if !(cutoff >= shortest && cutoff <= longest) {
        return Err(TraceProblem::Cutoff {
            cutoff,
            shortest,
            longest,
        });
    }
    let filtered = gaussian(&trace.profile, cutoff);
    records::filtered(trace, &filtered, cutoff);
    trace.profile.z = filtered;
    Ok(())
}

/// Depths of the channels that have enough samples.
fn step_heights(profile: &Profile, grooves: &[Zone], lands: &[Zone]) -> Vec<StepHeight> {
    grooves
        .iter()
        .filter_map(|groove| {
            let middle = 0.5 * (groove.from + groove.to);
            let after = lands.partition_point(|land| land.from < middle);
            let near = &lands[after.saturating_sub(1)..lands.len().min(after + 1)];
            step_height(profile, *groove, near)
        })
        .collect()
}

/// Makes everything smaller by its share.
fn shrink(trace: &mut CorrectedTrace, shrinkage: [f64; 2]) {
    let [along, up] = shrinkage.map(|share| 1.0 - share);
    let zone = |zone: &mut Zone| {
        zone.from *= along;
        zone.to *= along;
    };
    for profile in [&mut trace.raw, &mut trace.profile] {
        profile.x.iter_mut().for_each(|x| *x *= along);
        profile.z.iter_mut().for_each(|z| *z *= up);
    }
    let heights = trace.reference.iter_mut().chain(&mut trace.polynomial);
    heights.for_each(|z| *z *= up);
    trace.reference_zones.iter_mut().for_each(zone);
    trace.lands.iter_mut().for_each(zone);
    trace.reference_rms *= up;
    trace.reference_worst *= up;
    trace.noise_sd *= up;
    for change in &mut trace.changes {
        let Change {
            zone: place, size, ..
        } = change;
        zone(place);
        *size *= up;
    }
    for step in &mut trace.step_heights {
        zone(&mut step.groove);
        step.zones.iter_mut().for_each(zone);
        step.depth *= up;
        step.scatter *= up;
    }
    if let Some(agreement) = &mut trace.repeatability {
        agreement.reading_sd *= up;
        agreement.reading_robust_sd *= up;
        agreement.depth_sd = agreement.depth_sd.map(|sd| sd * up);
        for place in &mut agreement.places {
            place.shift *= along;
            place.uneven *= along;
        }
    }
    records::shrunk(trace, shrinkage);
}
