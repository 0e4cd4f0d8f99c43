//! The numbers of a channel for the outputs: keys, names and units of what a trace gave.

use crate::intake::{CorrectedTrace, GrooveSection, StepHeight, TrenchNumbers};
use crate::report::MeasureRecord;

fn number(key: &'static str, label: &'static str, value: f64, unit: &'static str) -> MeasureRecord {
    MeasureRecord {
        key,
        label,
        value: value.is_finite().then_some(value),
        unit,
        absent_because: "it could not be worked out",
    }
}

fn maybe(
    key: &'static str,
    label: &'static str,
    value: Option<f64>,
    reason: &'static str,
) -> MeasureRecord {
    MeasureRecord {
        key,
        label,
        value,
        unit: "m",
        absent_because: reason,
    }
}

/// The numbers of a channel, its depth by the groove rule among them where the trace gives it.
pub(super) fn measures(trace: &CorrectedTrace, groove: &GrooveSection) -> Vec<MeasureRecord> {
    let mut rows = trench(&groove.numbers);
    let zone = groove.zone;
    let middle = 0.5 * (zone.from + zone.to);
    let step = |step: &&StepHeight| step.groove.from < middle && middle < step.groove.to;
    rows.push(maybe(
        "step_height",
        "depth by the groove rule of ISO 5436-1",
        trace.step_heights.iter().find(step).map(|step| step.depth),
        "it needs a land on both sides and three samples in each of its zones",
    ));
    rows
}

fn trench(n: &TrenchNumbers) -> Vec<MeasureRecord> {
    let (koh, round) = (n.koh.as_ref(), n.isotropic.as_ref());
    let (no_koh, no_round) = (
        "no trapezoid with walls at 54.7356 deg fits",
        "no flat floor between quarter circles fits",
    );
    vec![
        number("top_width", "top width", n.top_width, "m"),
        number("middle_width", "width at half depth", n.middle_width, "m"),
        number("bottom_width", "bottom width", n.bottom_width, "m"),
        number("depth", "largest depth", n.depth, "m"),
        number(
            "floor_depth",
            "mean depth of the middle third",
            n.floor_depth,
            "m",
        ),
        number(
            "left_wall_angle",
            "left wall, 10 to 90 % of depth",
            n.left_wall.angle,
            "rad",
        ),
        number(
            "right_wall_angle",
            "right wall, 10 to 90 % of depth",
            n.right_wall.angle,
            "rad",
        ),
        number("bow", "bow: middle less mean of top and bottom", n.bow, "m"),
        number("aspect_ratio", "depth over top width", n.aspect_ratio, "1"),
        number("area_below_edges", "area below the edges", n.area, "m^2"),
        maybe(
            "koh_top_width",
            "fit of 54.7356 deg walls: top width",
            koh.map(|f| f.top_width),
            no_koh,
        ),
        maybe(
            "koh_depth",
            "fit of 54.7356 deg walls: depth",
            koh.map(|f| f.depth),
            no_koh,
        ),
        maybe(
            "koh_rms",
            "fit of 54.7356 deg walls: rms",
            koh.map(|f| f.rms),
            no_koh,
        ),
        maybe(
            "isotropic_mask_opening",
            "fit of quarter circles: mask opening",
            round.map(|f| f.mask_opening),
            no_round,
        ),
        maybe(
            "isotropic_depth",
            "fit of quarter circles: depth, undercut",
            round.map(|f| f.depth),
            no_round,
        ),
        maybe(
            "isotropic_rms",
            "fit of quarter circles: rms",
            round.map(|f| f.rms),
            no_round,
        ),
    ]
}
