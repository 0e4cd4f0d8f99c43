//! The sentences, numbers and warnings that go with each correction.

use super::bridging::bridge_list;
use super::corrected::{ChangeKind, CorrectedTrace};
use super::correction_options::{CorrectionOptions, Levelling, LineFit};
use super::corrections::WORST_LAND;
use super::lands::{CREST, Ground};
use super::levelling::{Curve, Reference};
use super::scan::Scan;
use crate::intake::order_statistics::median;
use crate::intake::step::Step;
use crate::units::{format_length, format_percent, format_significant};
use crate::warning::{Code, Warning};

/// Slope from which the difference between taking a line off and turning the trace is told, 1.
const STEEP: f64 = 0.03;

/// Turning over, and the ends without heights.
pub(super) fn orientation(trace: &mut CorrectedTrace, scan: &Scan, options: &CorrectionOptions) {
    if options.invert {
        let text = "heights turned over: ridges of the measured mould or cast are channels";
        trace.steps.push(Step::new("invert", text));
    }
    if scan.trimmed > 0 {
        let text = format!(
            "{} sample(s) without a height left out at the ends",
            scan.trimmed
        );
        let numbers = [("samples", scan.trimmed as f64)];
        trace.steps.push(Step::new("ends", text).with(&numbers));
    }
}

/// What repeats say.
pub(super) fn repeats(trace: &mut CorrectedTrace, ground: Option<&Ground>) {
    let Some(agreement) = &trace.repeatability else {
        return;
    };
    let depth = agreement.depth_sd.map(|sd| {
        let sd = format_length(sd);
        format!(", the depth of a channel by {sd}")
    });
    let mut parts = vec![format!(
        "mean of {} traces on the positions of the first; one reading scatters by {} (robust), {} with \
         walls and defects{}",
        agreement.traces,
        format_length(agreement.reading_robust_sd),
        format_length(agreement.reading_sd),
        depth.unwrap_or_default()
    )];
    parts.extend(agreement.places.iter().map(|place| {
        format!(
            "shifted by {}, by {} more or less from channel to channel{}",
            format_length(place.shift),
            format_length(0.5 * place.uneven),
            if place.is_reversed {
                ", traced backwards"
            } else {
                ""
            }
        )
    }));
    let mut numbers = vec![
        ("traces", agreement.traces as f64),
        ("reading_sd_m", agreement.reading_sd),
        ("reading_robust_sd_m", agreement.reading_robust_sd),
    ];
    numbers.extend(agreement.depth_sd.map(|sd| ("depth_sd_m", sd)));
    let warning = ground.and_then(|ground| {
        let depth_sd = agreement.depth_sd.unwrap_or(0.0);
        let sd = agreement.reading_robust_sd;
        let off = sd > (1.5 * ground.noise).max(0.005 * ground.depth) || depth_sd > 0.005 * ground.depth;
        off.then(|| Warning {
            code: Code::RepeatScatter,
            message: format!(
                "repeated traces differ: one reading scatters by {} ({} of the depth), while samples \
                 scatter by {} within a land",
                format_length(sd),
                format_percent(sd / ground.depth, 2),
                format_length(ground.noise)
            ),
            advice: "check that all traces cross the same place, and that the instrument has settled"
                .to_owned(),
            numbers: vec![
                ("reading_robust_sd_m", sd),
                ("depth_sd_m", depth_sd),
                ("noise_sd_m", ground.noise),
                ("depth_m", ground.depth),
            ],
        })
    });
    let step = Step::new("repeats", parts.join("; ")).with(&numbers);
    trace.steps.push(step);
    trace.warnings.extend(warning);
}

/// Lands found or stated.
pub(super) fn lands(
    trace: &mut CorrectedTrace,
    ground: Option<&Ground>,
    options: &CorrectionOptions,
) {
    if options.lands.is_some() {
        let text = format!("{} land(s) as stated", trace.lands.len());
        trace.steps.push(Step::new("lands", text));
        return;
    }
    let Some(ground) = ground else {
        let text = "no lands found; none were needed for levelling";
        trace.steps.push(Step::new("lands", text));
        return;
    };
    let text = format!(
        "{} lands found on the upper level, {} channels of about {} in depth and {} in width at half \
         height between them; samples scatter by {} about the line of a land",
        ground.lands.len(),
        ground.grooves.len(),
        format_length(ground.depth),
        format_length(ground.groove_width),
        format_length(ground.noise)
    );
    trace.steps.push(Step::new("lands", text).with(&[
        ("lands", ground.lands.len() as f64),
        ("channels", ground.grooves.len() as f64),
        ("depth_m", ground.depth),
        ("width_m", ground.groove_width),
        ("noise_sd_m", ground.noise),
    ]));
    trace.warnings.extend(ridges_or_gaps(ground, options));
}

/// Whether the upper stretches look like the ridges of a master.
fn ridges_or_gaps(ground: &Ground, options: &CorrectionOptions) -> Option<Warning> {
    let ridge = ground.ridge_width?;
    let gap = ground.groove_width;
    if options.invert || !(ground.ends_low || ridge < gap) {
        return None;
    }
    let reason = if ground.ends_low {
        "the trace starts and ends on the lower level"
    } else {
        "the stretches on the upper level are narrower than the gaps between them"
    };
    Some(Warning {
        code: Code::ChoiceMade,
        message: format!(
            "{reason} (upper {}, lower {} wide): the gaps were taken for the channels",
            format_length(ridge),
            format_length(gap)
        ),
        advice: "if the channels are the ridges (mould master, cast): --invert".to_owned(),
        numbers: vec![
            ("upper_width_m", ridge),
            ("lower_width_m", gap),
            ("starts_and_ends_low", f64::from(u8::from(ground.ends_low))),
        ],
    })
}

/// No reference line.
pub(super) fn not_levelled(trace: &mut CorrectedTrace) {
    let text = "not levelled: heights are those of the file";
    trace.steps.push(Step::new("levelling", text));
}

/// The reference line and what is left of the zones.
pub(super) fn levelled(
    trace: &mut CorrectedTrace,
    fitted: &Reference,
    off_one_line: Option<f64>,
    options: &CorrectionOptions,
    depth: f64,
) {
    let zones = trace.reference_zones.len();
    let (what, how) = (curve_name(fitted, options), fit_name(options.fit));
    let mut text = vec![format!(
        "{what} through {zones} zone(s), {how}; it runs from {} to {}; the zones lie off it by {} (root mean \
         square), the worst by {}",
        format_length(trace.reference.first().copied().unwrap_or(0.0)),
        format_length(trace.reference.last().copied().unwrap_or(0.0)),
        format_length(fitted.rms),
        format_length(fitted.worst())
    )];
    if let Some(worst) = off_one_line {
        text.push(format!(
            "one straight line would leave the worst land {} off, more than {} of the depth",
            format_length(worst),
            format_percent(WORST_LAND, 1)
        ));
    }
    if fitted.bend > 0.0 {
        text.push(format!(
            "between two lands it may bend by {} more, which no land shows",
            format_length(fitted.bend)
        ));
    }
    let slope = end_slope(trace);
    if slope.abs() > STEEP {
        text.push(format!("heights stay vertical: if the slope of {} is a tilt of the specimen, depths are {} too \
             large and widths as much too small",
            format_percent(slope, 2),
            format_percent((1.0_f64).hypot(slope) - 1.0, 1)
        ));
    }
    let mut numbers = vec![
        ("zones", zones as f64),
        ("rms_m", fitted.rms),
        ("worst_m", fitted.worst()),
        ("slope", slope),
        ("bend_m", fitted.bend),
    ];
    numbers.extend(off_one_line.map(|worst| ("worst_on_one_line_m", worst)));
    trace
        .steps
        .push(Step::new("levelling", text.join("; ")).with(&numbers));
    let warning = residual_warning(fitted, off_one_line, options, depth);
    trace.warnings.extend(warning);
    trace
        .warnings
        .extend(shoulders_warning(fitted, options, depth));
    if matches!(fitted.curve, Curve::Polynomial(_)) && usize::from(options.bow) > zones {
        trace.warnings.push(few_zones_warning(zones, options.bow));
    }
}

fn curve_name(fitted: &Reference, options: &CorrectionOptions) -> String {
    match (&fitted.curve, options.bow) {
        (Curve::Pieces(_), _) => {
            "reference straight from the middle of each land to the next".to_owned()
        }
        (_, 1) => "one straight reference line".to_owned(),
        (_, degree) => format!("one reference polynomial of degree {degree}"),
    }
}

fn fit_name(fit: LineFit) -> &'static str {
    match fit {
        LineFit::LeastSquares => "least squares",
        LineFit::Robust => "robust (repeated median in each zone, bisquare weights)",
    }
}

/// Slope of the reference from end to end.
fn end_slope(trace: &CorrectedTrace) -> f64 {
    let x = &trace.raw.x;
    let z = &trace.reference;
    match (x.first(), x.last(), z.first(), z.last()) {
        (Some(x0), Some(x1), Some(z0), Some(z1)) if x1 > x0 => (z1 - z0) / (x1 - x0),
        _ => 0.0,
    }
}

/// Drift or bow that the line does not follow.
fn residual_warning(
    fitted: &Reference,
    off_one_line: Option<f64>,
    options: &CorrectionOptions,
    depth: f64,
) -> Option<Warning> {
    let is_local = matches!(fitted.curve, Curve::Pieces(_));
    let worst = off_one_line.unwrap_or(fitted.worst());
    if worst.is_nan() || worst <= WORST_LAND * depth {
        return None;
    }
    let (message, advice) = if is_local {
        (
            format!(
                "the lands lie up to {} ({} of the depth) off one straight line: drift, bow or lands of \
                 different height; the reference was taken from land to land",
                format_length(worst),
                format_percent(worst / depth, 2)
            ),
            "each channel is measured against its own two lands; --level line, --bow 2 or --level-on \
             ZONES choose otherwise",
        )
    } else {
        (
            format!(
                "a reference zone lies {} ({} of the depth) off the reference line",
                format_length(worst),
                format_percent(worst / depth, 2)
            ),
            "--level local follows drift from land to land, --bow 2 takes a bow off, --level-on ZONES \
             leaves a bad zone out",
        )
    };
    let asked_local = options.level == Levelling::Local && off_one_line.is_none();
    (!asked_local || fitted.worst() > WORST_LAND * depth).then(|| Warning {
        code: Code::ReferenceResidual,
        message,
        advice: advice.to_owned(),
        numbers: vec![
            ("worst_m", worst),
            ("rms_m", fitted.rms),
            ("depth_m", depth),
        ],
    })
}

/// Two zones whose own slopes do not lead from one to the other.
fn shoulders_warning(
    fitted: &Reference,
    options: &CorrectionOptions,
    depth: f64,
) -> Option<Warning> {
    let (above, uncertainty) = fitted.second_above_first?;
    let differs = above.abs() > (3.0 * uncertainty).max(2.0 * WORST_LAND * depth);
    (options.bow == 1 && differs).then(|| Warning {
        code: Code::LandsDiffer,
        message: format!(
            "levelled through both zones; but the slope of the zones themselves puts the second {} {} the \
             first ({} of the depth)",
            format_length(above.abs()),
            if above > 0.0 { "above" } else { "below" },
            format_percent(above.abs() / depth, 2)
        ),
        advice: "if the lands really differ in height, level on one of them: --level-on from..to"
            .to_owned(),
        numbers: vec![
            ("difference_m", above),
            ("uncertainty_m", uncertainty),
            ("depth_m", depth),
        ],
    })
}

/// A polynomial that can swing between its zones.
fn few_zones_warning(zones: usize, degree: u8) -> Warning {
    Warning {
        code: Code::ReferenceResidual,
        message: format!(
            "a polynomial of degree {degree} through {zones} zone(s) is not held between them"
        ),
        advice: "lower --bow, or state more zones: --level-on".to_owned(),
        numbers: vec![("degree", f64::from(degree)), ("zones", zones as f64)],
    }
}

/// Shoulders without a level part.
pub(super) fn crests_warning(ground: &Ground) -> Option<Warning> {
    let problem = ground.not_level.as_ref()?;
    Some(Warning {
        code: Code::ReferenceResidual,
        message: format!(
            "{problem}; the lid is taken to lie on the crests of the {} shoulders, what lies within {} of the \
             depth of their highest samples, and the trace is levelled on them",
            ground.zones().len(),
            format_percent(CREST, 2)
        ),
        advice: "state where the lid lies: --land-zones, --lid left or right; measure farther beyond the channel"
            .to_owned(),
        numbers: vec![("depth_m", ground.depth)],
    })
}

/// Spikes and gaps.
pub(super) fn bridges(trace: &mut CorrectedTrace, scan: &Scan, options: &CorrectionOptions) {
    let of_kind = |kind| trace.changes.iter().filter(move |c| c.kind == kind);
    let spikes = of_kind(ChangeKind::Spike).count();
    let gaps = of_kind(ChangeKind::Missing).count();
    let largest = of_kind(ChangeKind::Spike)
        .map(|c| c.size)
        .fold(0.0_f64, |a, b| if b.abs() > a.abs() { b } else { a });
    let text = if options.keep_spikes {
        "spikes were not looked for (--keep-spikes)".to_owned()
    } else if spikes == 0 {
        format!(
            "no spike found; excursions wider than {} and overshoot at edges are no spikes",
            format_length(scan.widest_spike)
        )
    } else {
        format!(
            "{spikes} spike(s) bridged, the largest of {}; excursions wider than {} and overshoot at edges \
             are left as they are",
            format_length(largest),
            format_length(scan.widest_spike)
        )
    };
    let numbers = [
        ("spikes", spikes as f64),
        ("largest_m", largest),
        ("widest_m", scan.widest_spike),
    ];
    let spike_step = Step::new("spikes", text).with(&numbers);
    let samples: usize = of_kind(ChangeKind::Missing).map(|c| c.samples).sum();
    trace.steps.push(spike_step);
    if gaps > 0 {
        let text =
            format!("{gaps} gap(s) with {samples} missing sample(s) bridged by straight lines");
        let numbers = [("gaps", gaps as f64), ("samples", samples as f64)];
        trace.steps.push(Step::new("missing", text).with(&numbers));
    }
    trace.steps.extend(bridge_list(&trace.changes));
}

/// What the filter changed.
pub(super) fn filtered(trace: &mut CorrectedTrace, filtered: &[f64], cutoff: f64) {
    let changes = filtered.iter().zip(&trace.profile.z).map(|(f, z)| f - z);
    let (squares, worst) = changes.fold((0.0, 0.0_f64), |(squares, worst), change| {
        (squares + change * change, worst.max(change.abs()))
    });
    let rms = (squares / filtered.len().max(1) as f64).sqrt();
    let text = format!(
        "Gaussian filter (ISO 16610-21), cut-off {}: heights changed by {} (root mean square), at most {}; \
         within {} of the ends the mean is over one side",
        format_length(cutoff),
        format_length(rms),
        format_length(worst),
        format_length(0.5 * cutoff)
    );
    trace.steps.push(Step::new("filter", text).with(&[
        ("cutoff_m", cutoff),
        ("rms_m", rms),
        ("worst_m", worst),
    ]));
}

/// Depths between lands.
pub(super) fn depths(trace: &mut CorrectedTrace) {
    let mut depths: Vec<f64> = trace.step_heights.iter().map(|s| s.depth).collect();
    let (lowest, highest) = depths
        .iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), d| {
            (a.min(*d), b.max(*d))
        });
    let count = depths.len();
    let typical = median(&mut depths);
    if count == 0 {
        return;
    }
    let range = if count > 1 {
        format!(
            "{} channels {} to {} deep, median {}",
            count,
            format_length(lowest),
            format_length(highest),
            format_length(typical)
        )
    } else {
        format!("channel {} deep", format_length(typical))
    };
    let text =
        format!("{range} (middle third under the line through both lands, ISO 5436-1 type A1)");
    trace.steps.push(Step::new("depth", text).with(&[
        ("channels", count as f64),
        ("median_m", typical),
        ("smallest_m", lowest),
        ("largest_m", highest),
    ]));
}

/// Scaling for shrinkage.
pub(super) fn shrunk(trace: &mut CorrectedTrace, shrinkage: [f64; 2]) {
    if shrinkage.iter().all(|share| share.abs() <= 0.0) {
        return;
    }
    let [along, up] = shrinkage;
    let factor = |share: f64| format_significant(1.0 - share, 6);
    let text = format!(
        "lengths along the trace made {} of what was measured, heights {}; numbers of the steps before \
         are as measured",
        factor(along),
        factor(up)
    );
    let numbers = [("share_along", along), ("share_up", up)];
    trace
        .steps
        .push(Step::new("shrinkage", text).with(&numbers));
}
