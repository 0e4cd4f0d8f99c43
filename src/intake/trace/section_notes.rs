//! What is said about a section: steps, warnings, and why its wall is not known better.

use super::flanks::Flank;
use super::half::Grounds;
use super::section_options::LidChoice;
use super::sections::{Drawing, SLIVER};
use super::shape_fits::KOH_ANGLE;
use super::trench_numbers::TrenchNumbers;
use crate::geometry::Outline;
use crate::intake::step::Step;
use crate::units::{format_length, format_percent};
use crate::warning::{Code, Warning};

/// Walls within this of [`KOH_ANGLE`] may be (111) planes, rad.
const KOH_MARGIN: f64 = 2.0 * std::f64::consts::PI / 180.0;

fn degrees(angle: f64) -> String {
    format!("{:.1} deg", angle.to_degrees())
}

/// What was done, in order.
pub(super) fn steps(
    drawing: &Drawing<'_>,
    numbers: &TrenchNumbers,
    outline: &Outline,
    slivers: usize,
) -> Vec<Step> {
    let mut steps = vec![groove_step(drawing, numbers)];
    steps.extend(tip_step(drawing));
    steps.extend(walls_step(drawing));
    steps.push(lid_step(drawing));
    steps.push(polygon_step(drawing, outline, slivers));
    steps
}

fn groove_step(drawing: &Drawing<'_>, numbers: &TrenchNumbers) -> Step {
    let edges = &drawing.walls.edges;
    let text = format!(
        "groove {} of {}: from {} to {}, {} deep below the line through its edges, which are where the \
         surface comes up to the median height of the nearby land, or levels off below it",
        drawing.groove.number,
        drawing.ground.grooves.len(),
        format_length(edges.left.x),
        format_length(edges.right.x),
        format_length(numbers.depth),
    );
    Step::new("groove", text).with(&[
        ("from_m", edges.left.x),
        ("to_m", edges.right.x),
        ("left_land_m", edges.left.z),
        ("right_land_m", edges.right.z),
        ("depth_m", numbers.depth),
    ])
}

fn tip_step(drawing: &Drawing<'_>) -> Option<Step> {
    let tip = drawing.options.tip?;
    let text = format!(
        "the tip (radius {}, cone {}) was taken back by erosion, which moves the surface by up to {}; no \
         wall lies {} it, and flanks from {} on are the shape of the tip",
        format_length(tip.radius),
        degrees(tip.cone_angle),
        format_length(drawing.ground.moved),
        if drawing.ground.is_inverted {
            "below"
        } else {
            "above"
        },
        degrees(tip.steepest_flank()),
    );
    Some(Step::new("tip", text).with(&[
        ("tip_radius_m", tip.radius),
        ("tip_angle_deg", tip.cone_angle.to_degrees()),
        ("moved_by_at_most_m", drawing.ground.moved),
        ("steepest_flank_deg", tip.steepest_flank().to_degrees()),
    ]))
}

fn walls_step(drawing: &Drawing<'_>) -> Option<Step> {
    let angle = drawing.options.walls?;
    let changed = drawing
        .halves()
        .any(|w| w.curves.stated != w.curves.as_read);
    let text = if changed {
        format!(
            "flanks that show the tip were replaced by walls at {} from {}",
            degrees(angle),
            if drawing.ground.is_inverted {
                "the ends of the floor, which the tip touched on the ridge, up to the lands"
            } else {
                "their upper ends down to the floor beside them"
            }
        )
    } else if drawing.is_bottomless() {
        format!(
            "walls at {} were not drawn: nothing level was touched that they could begin or end on",
            degrees(angle)
        )
    } else if drawing.has_tip_flanks() {
        format!(
            "walls at {} change nothing: they are no steeper than the flanks as read",
            degrees(angle)
        )
    } else {
        format!(
            "walls at {} were not needed: no flank shows the tip",
            degrees(angle)
        )
    };
    Some(Step::new("walls", text).with(&[("walls_deg", angle.to_degrees())]))
}

fn lid_step(drawing: &Drawing<'_>) -> Step {
    let options = drawing.options;
    let place = match options.lid {
        LidChoice::Both => "on the line through both edges",
        LidChoice::Left => "level at the height of the left land",
        LidChoice::Right => "level at the height of the right land",
        LidChoice::Fit => "on the line of least squares through both lands",
    };
    let mut text = vec![match &drawing.opposite {
        None => format!("flat lid {place}"),
        Some(_) => format!(
            "the other half is turned over and mirrored, with its lands {place} and its middle {} to the \
             right of the middle of this one",
            format_length(options.lid_offset)
        ),
    }];
    if options.lid_gap.abs() > 0.0 {
        let side = if options.lid_gap > 0.0 {
            "above"
        } else {
            "below"
        };
        text.push(format!(
            "{} {side} it; the gap ends at the edges",
            format_length(options.lid_gap.abs())
        ));
    }
    if options.lid_sag.abs() > 0.0 && drawing.opposite.is_none() {
        let way = if options.lid_sag > 0.0 {
            "hangs down"
        } else {
            "bulges up"
        };
        text.push(format!(
            "its middle {way} by {} in an arc of a circle",
            format_length(options.lid_sag.abs())
        ));
    }
    Step::new("lid", text.join("; ")).with(&[
        ("lid_gap_m", options.lid_gap),
        ("lid_sag_m", options.lid_sag),
        ("lid_offset_m", options.lid_offset),
    ])
}

fn polygon_step(drawing: &Drawing<'_>, outline: &Outline, slivers: usize) -> Step {
    let vertices: usize = outline.loops().map(|l| l.points.len()).sum();
    let (samples, tolerance) = (drawing.walls.curves.samples, drawing.walls.tolerance);
    let mut text = vec![format!(
        "{samples} samples between the edges became a polygon of {vertices} vertices; samples left out lie \
         within {} of it",
        format_length(tolerance)
    )];
    if outline.lumens.len() > 1 {
        text.push(format!(
            "the lid touches the floor and leaves {} lumens",
            outline.lumens.len()
        ));
    }
    if slivers > 0 {
        text.push(format!(
            "{slivers} lumens below {} of the area were left out",
            format_percent(SLIVER, 2)
        ));
    }
    Step::new("polygon", text.join("; ")).with(&[
        ("samples", samples as f64),
        ("vertices", vertices as f64),
        ("tolerance_m", tolerance),
        ("slivers", slivers as f64),
    ])
}

/// What a reader must know.
pub(super) fn warnings(drawing: &Drawing<'_>, numbers: &TrenchNumbers) -> Vec<Warning> {
    let mut warnings = Vec::new();
    warnings.extend(flank_warning(drawing));
    warnings.extend(lands_warning(drawing, numbers));
    warnings.extend(left_out_warning(drawing));
    warnings
}

/// `from 12.00 um to 41.00 um at 60.0 deg` for each flank.
fn places(drawing: &Drawing<'_>, flanks: &[Flank]) -> String {
    let x = drawing.ground.heights().x;
    let place = |f: &Flank| {
        format!(
            "from {} to {} at {}",
            format_length(x[f.from]),
            format_length(x[f.to]),
            degrees(f.angle)
        )
    };
    flanks.iter().map(place).collect::<Vec<_>>().join(", ")
}

fn flank_warning(drawing: &Drawing<'_>) -> Option<Warning> {
    let flanks = &drawing.walls.flanks;
    if !drawing.has_tip_flanks() {
        return None;
    }
    let mut message = match drawing.grounds() {
        _ if flanks.is_empty() => "flanks of the lid trace may be the shape of the tip".to_owned(),
        Grounds::Stated => format!(
            "flanks are the shape of the tip, not of the wall: {}",
            places(drawing, flanks)
        ),
        Grounds::Suspected => format!(
            "both flanks are straight and alike ({}): the cone of a stylus reads so whatever the \
             wall",
            places(drawing, flanks)
        ),
    };
    let is_koh = |f: &Flank| (f.angle - KOH_ANGLE).abs() <= KOH_MARGIN;
    if drawing.grounds() == Grounds::Suspected && !flanks.is_empty() && flanks.iter().all(is_koh) {
        message += ", and so do KOH walls (54.74 deg)";
    }
    if drawing.is_bottomless() {
        message += if drawing.ground.is_inverted {
            "; the ridge has no level top that was touched, so no smallest section is known"
        } else {
            "; no floor was touched between them, so the section may be deeper than any bound"
        };
    }
    let advice = match (drawing.grounds(), drawing.is_bottomless()) {
        (_, true) if drawing.ground.is_inverted => {
            "K is an upper bound only: read the ridge in another way (a sharper tip, a cut)"
        }
        (_, true) => {
            "K is a lower bound only: read the depth in another way (a wider test groove, a cut)"
        }
        (Grounds::Stated, false) => {
            "give the wall angle with --walls, and report K with the range of the smallest and the largest \
             section"
        }
        (Grounds::Suspected, false) => {
            "give --tip-radius and --tip-angle of the stylus, or --walls; without a stylus the section is as \
             read and the range of the reach does not apply"
        }
    };
    let x = drawing.ground.heights().x;
    let keys = [
        ("left_from_m", "left_to_m", "left_angle_deg"),
        ("right_from_m", "right_to_m", "right_angle_deg"),
    ];
    let ends = [flanks.first(), flanks.last().filter(|_| flanks.len() > 1)];
    let mut numbers = Vec::new();
    for (flank, keys) in ends.into_iter().zip(keys) {
        if let Some(f) = flank {
            numbers.extend([
                (keys.0, x[f.from]),
                (keys.1, x[f.to]),
                (keys.2, f.angle.to_degrees()),
            ]);
        }
    }
    Some(Warning {
        code: Code::FlankIsTip,
        message,
        advice: advice.to_owned(),
        numbers,
    })
}

fn lands_warning(drawing: &Drawing<'_>, numbers: &TrenchNumbers) -> Option<Warning> {
    if !drawing.lands_differ() {
        return None;
    }
    let step = drawing.step_of_lands();
    let (side, share) = (
        if step > 0.0 { "higher" } else { "lower" },
        step.abs() / numbers.depth,
    );
    Some(Warning {
        code: Code::LandsDiffer,
        message: format!(
            "the right land of groove {} lies {} {side} than the left one, {} of the depth: K depends on \
             where the lid lies",
            drawing.groove.number,
            format_length(step.abs()),
            format_percent(share, 2)
        ),
        advice: "compare the other lids, and state the one that was bonded with --lid".to_owned(),
        numbers: vec![
            ("left_land_m", drawing.walls.edges.left.z),
            ("right_land_m", drawing.walls.edges.right.z),
            ("share_of_depth", share),
        ],
    })
}

fn left_out_warning(drawing: &Drawing<'_>) -> Option<Warning> {
    let why: Vec<&str> = drawing
        .ground
        .grooves
        .iter()
        .filter_map(|g| g.edges.as_ref().err().map(String::as_str))
        .collect();
    let first = why.first()?;
    let more = match why.len() {
        1 => String::new(),
        n => format!(", and {} more", n - 1),
    };
    Some(Warning {
        code: Code::GrooveLeftOut,
        message: format!("{first}{more}: it is counted, but has no section"),
        advice: "measure past both edges, or leave the groove out with --groove".to_owned(),
        numbers: vec![("left_out", why.len() as f64)],
    })
}

/// Why the wall is not known better.
pub(super) fn reach_reason(drawing: &Drawing<'_>) -> String {
    let read = match drawing.options.tip {
        Some(_) => "the surface with the tip taken back",
        None => "the surface as read",
    };
    let grounds = match drawing.grounds() {
        Grounds::Stated => "flanks show the tip",
        Grounds::Suspected => "flanks may show a tip that was not stated",
    };
    if drawing.ground.is_inverted {
        format!(
            "{grounds}: largest section over {read}, smallest with upright walls from the ends of the floor, \
             which the tip touched on the ridge"
        )
    } else {
        format!(
            "{grounds}: smallest section over {read}, largest with upright walls from the outermost touched \
             samples to the floor beside them (no undercut, no deeper floor under the flank)"
        )
    }
}
