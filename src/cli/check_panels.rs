//! What the check picture shows of each kind of reading.

use crate::geometry::{Outline, Point};
use crate::intake::{
    ChangeKind, GrooveSection, InstrumentData, InstrumentReading, MapReading, MicrographSection,
    Profile, TraceReading, Zone,
};
use crate::report::{
    Band, BandKind, CheckPicture, Curve, CurveKind, CurvePanel, Cut, Dimension, ImagePanel,
    MapPanel, Mark, MarkKind, Panel, ReadingDocument, Region, RegionKind,
};
use crate::units::format_length;

/// Channels drawn one by one; of more, the first ones.
const GROOVES_SHOWN: usize = 4;
/// Cuts of a map whose traces are drawn.
const CUTS_SHOWN: usize = 2;
/// Spikes that are marked one by one.
const MARKS_SHOWN: usize = 60;
/// Height of the lid in the picture over the depth of the channel.
const LID_THICKNESS: f64 = 0.12;

/// The picture of a reading.
pub(super) fn check_picture(
    reading: &InstrumentReading,
    document: &ReadingDocument<'_>,
) -> CheckPicture {
    let mut panels = Vec::new();
    match &reading.data {
        InstrumentData::Trace(trace) => trace_panels(trace, &mut panels),
        InstrumentData::Map(map) => {
            panels.push(Panel::Map(map_panel(map)));
            for trace in map.traces.iter().take(CUTS_SHOWN) {
                trace_panels(trace, &mut panels);
            }
        }
        InstrumentData::Micrograph(picture) => {
            panels.push(Panel::Image(image_panel(picture)));
            panels.push(Panel::Curves(picture_section_panel(picture)));
        }
    }
    let single = document.sections.len() == 1;
    let mut notes: Vec<String> = document.steps.iter().map(|s| s.text.to_owned()).collect();
    let mut warnings: Vec<String> = document
        .warnings
        .iter()
        .map(|w| w.message.clone())
        .collect();
    for section in &document.sections {
        let of = |text: &str| {
            if single {
                text.to_owned()
            } else {
                format!("channel {}: {text}", section.number)
            }
        };
        notes.extend(section.steps.iter().map(|s| of(s.text)));
        warnings.extend(section.warnings.iter().map(|w| of(&w.message)));
    }
    CheckPicture {
        title: format!("{}, read as {}", document.source.path, document.source.kind),
        panels,
        notes,
        warnings,
    }
}

/// Points of a profile; missing heights break the line.
fn points(profile: &Profile) -> Vec<Point> {
    let pairs = profile.x.iter().zip(&profile.z);
    pairs.map(|(&x, &z)| [x, z]).collect()
}

fn curve(points: Vec<Point>, kind: CurveKind, label: &str) -> Curve {
    Curve {
        points,
        kind,
        label: label.to_owned(),
    }
}

fn band(zone: Zone, kind: BandKind, label: impl Into<String>) -> Band {
    Band {
        from: zone.from,
        to: zone.to,
        kind,
        label: label.into(),
    }
}

fn trace_panels(trace: &TraceReading, panels: &mut Vec<Panel>) {
    let cut = trace.cut.as_ref().map(|cut| format!(", {cut}"));
    let cut = cut.unwrap_or_default();
    panels.push(Panel::Curves(raw_panel(trace, &cut)));
    panels.push(Panel::Curves(levelled_panel(trace, &cut)));
    let half = trace.grooves.len() > 1;
    for groove in trace.grooves.iter().take(GROOVES_SHOWN) {
        panels.push(Panel::Curves(groove_panel(groove, &cut, half)));
    }
}

/// The data as read, with the reference line and what was taken out.
fn raw_panel(trace: &TraceReading, cut: &str) -> CurvePanel {
    let corrected = &trace.corrected;
    let reference = corrected.profile.x.iter().zip(&corrected.reference);
    let reference = reference.map(|(&x, &z)| [x, z]).collect();
    let height_at = |x: f64| {
        let index = corrected.raw.x.partition_point(|&at| at < x);
        corrected.raw.z.get(index).copied().unwrap_or(f64::NAN)
    };
    let spikes = corrected
        .changes
        .iter()
        .filter(|c| c.kind == ChangeKind::Spike);
    let marks = spikes
        .take(MARKS_SHOWN)
        .map(|change| {
            let middle = 0.5 * (change.zone.from + change.zone.to);
            Mark {
                at: [middle, height_at(middle)],
                kind: MarkKind::Spike,
                label: String::new(),
            }
        })
        .collect();
    let zones = corrected.reference_zones.iter();
    let bridged = corrected.changes.iter().map(|change| change.zone);
    CurvePanel {
        title: format!("As read{cut}, with the reference line that is taken off"),
        x_label: "position".to_owned(),
        z_label: "height".to_owned(),
        curves: vec![
            curve(points(&corrected.raw), CurveKind::Measured, "as read"),
            curve(reference, CurveKind::Reference, "reference line"),
        ],
        bands: zones
            .map(|&zone| band(zone, BandKind::Reference, ""))
            .chain(bridged.map(|zone| band(zone, BandKind::Bridged, "")))
            .collect(),
        marks,
        ..CurvePanel::default()
    }
}

/// The levelled trace with lands, channels and lids.
fn levelled_panel(trace: &TraceReading, cut: &str) -> CurvePanel {
    let corrected = &trace.corrected;
    let mut curves = vec![curve(
        points(&corrected.profile),
        CurveKind::Corrected,
        "levelled",
    )];
    let lids = trace.grooves.iter().map(|g| &g.lid);
    curves.extend(lids.map(|lid| curve(points(lid), CurveKind::Lid, "lid")));
    let lands = corrected.lands.iter();
    let grooves = trace.grooves.iter();
    let flanks = trace.grooves.iter().flat_map(|groove| &groove.flanks);
    CurvePanel {
        title: format!("Levelled{cut}: lands, channels and lid"),
        x_label: "position".to_owned(),
        z_label: "height above the lands".to_owned(),
        curves,
        bands: lands
            .map(|&zone| band(zone, BandKind::Land, ""))
            .chain(grooves.map(|g| band(g.zone, BandKind::Groove, g.number.to_string())))
            .chain(flanks.map(|flank| band(flank.zone, BandKind::TipShape, "")))
            .collect(),
        ..CurvePanel::default()
    }
}

/// The loops of an outline.
fn loops(outline: &Outline) -> Vec<Vec<Point>> {
    outline.loops().map(|wall| wall.points.clone()).collect()
}

/// The section with its reach, its lid and its main dimensions.
fn groove_panel(groove: &GrooveSection, cut: &str, half_width: bool) -> CurvePanel {
    let region = |outline: &Outline, kind, label: &str| Region {
        loops: loops(outline),
        kind,
        label: label.to_owned(),
    };
    let mut regions = Vec::new();
    let reach = groove.reach.as_ref();
    if let Some(outer) = reach.and_then(|reach| reach.outer.as_ref()) {
        regions.push(region(
            &outer.outline,
            RegionKind::OuterReach,
            "largest it could be",
        ));
    }
    regions.push(region(&groove.outline, RegionKind::Section, "section"));
    if let Some(inner) = reach.and_then(|reach| reach.inner.as_ref()) {
        regions.push(region(
            &inner.outline,
            RegionKind::InnerReach,
            "smallest it could be",
        ));
    }
    let numbers = &groove.numbers;
    regions.push(Region {
        loops: vec![lid_body(&groove.lid, LID_THICKNESS * numbers.depth)],
        kind: RegionKind::Lid,
        label: "lid".to_owned(),
    });
    let alternatives = groove.lid_alternatives.iter().filter_map(|other| {
        let outline = other.outline.as_ref()?;
        let wall = &outline.lumens.first()?.outer;
        let closed = wall.points.iter().chain(wall.points.first()).copied();
        let label = format!("with --lid {}", other.lid);
        Some(curve(closed.collect(), CurveKind::Alternative, &label))
    });
    let mut curves = vec![curve(
        points(&groove.surface),
        CurveKind::Corrected,
        "levelled trace",
    )];
    curves.extend(alternatives);
    CurvePanel {
        title: format!("Section of channel {}{cut}", groove.number),
        x_label: "position".to_owned(),
        z_label: "height above the lands".to_owned(),
        equal_scale: true,
        half_width,
        curves,
        regions,
        dimensions: dimensions(groove),
        ..CurvePanel::default()
    }
}

/// The lid as a body above its lower face.
fn lid_body(face: &Profile, thickness: f64) -> Vec<Point> {
    let lower = points(face);
    let top = lower.iter().fold(f64::NEG_INFINITY, |top, p| top.max(p[1])) + thickness;
    let ends = lower
        .first()
        .zip(lower.last())
        .map(|(a, b)| [[b[0], top], [a[0], top]]);
    lower
        .iter()
        .copied()
        .chain(ends.into_iter().flatten())
        .collect()
}

/// Top width and depth.
fn dimensions(groove: &GrooveSection) -> Vec<Dimension> {
    let numbers = &groove.numbers;
    let edge = |x: f64| {
        let index = groove.surface.x.partition_point(|&at| at < x);
        groove.surface.z.get(index).copied().unwrap_or(0.0)
    };
    let (from, to) = (groove.zone.from, groove.zone.to);
    let base = |x: f64| {
        let t = ((x - from) / (to - from)).clamp(0.0, 1.0);
        (1.0 - t) * edge(from) + t * edge(to)
    };
    let inside = groove.surface.x.iter().zip(&groove.surface.z);
    let deepest = inside
        .filter(|&(&x, _)| from <= x && x <= to)
        .min_by(|a, b| (a.1 - base(*a.0)).total_cmp(&(b.1 - base(*b.0))));
    let top = base(from).max(base(to));
    let mut found = vec![Dimension {
        from: [from, top],
        to: [to, top],
        text: format!("width {}", format_length(numbers.top_width)),
    }];
    if let Some((&x, &z)) = deepest {
        found.push(Dimension {
            from: [x, base(x)],
            to: [x, z],
            text: format!("depth {}", format_length(numbers.depth)),
        });
    }
    found
}

/// The height map with its cuts.
fn map_panel(reading: &MapReading) -> MapPanel {
    let (map, cuts) = (&reading.map, &reading.cuts);
    let several = cuts.cuts.len() > 1;
    MapPanel {
        title: "Height map as read, with the cuts".to_owned(),
        size: map.size,
        spacing: map.spacing,
        heights: map.heights.iter().map(|&z| z as f32).collect(),
        cuts: cuts
            .cuts
            .iter()
            .map(|cut| Cut {
                from: cut.from,
                to: cut.to,
                width: cut.average,
                label: if several {
                    format_length(cut.station)
                } else {
                    String::new()
                },
            })
            .collect(),
        groove_direction: Some(cuts.direction),
    }
}

/// The picture with its contour, metres with the origin of the outline.
fn image_panel(picture: &MicrographSection) -> ImagePanel {
    let region = |outline: &Outline, kind, label: &str| Region {
        loops: loops(outline),
        kind,
        label: label.to_owned(),
    };
    let mut outlines = Vec::new();
    let reach = picture.reach.as_ref();
    if let Some(outer) = reach.and_then(|reach| reach.outer.as_ref()) {
        outlines.push(region(
            &outer.outline,
            RegionKind::OuterReach,
            "largest it could be",
        ));
    }
    outlines.push(region(&picture.outline, RegionKind::Section, "section"));
    if let Some(inner) = reach.and_then(|reach| reach.inner.as_ref()) {
        outlines.push(region(
            &inner.outline,
            RegionKind::InnerReach,
            "smallest it could be",
        ));
    }
    let preview = &picture.preview;
    let scale = picture.metres_per_pixel;
    let part = picture.crop;
    // The outline's origin is the lower left corner of the part used; the picture begins beside and below it.
    let below = f64::from(picture.size[1].saturating_sub(part.y + part.height));
    let size = [
        f64::from(part.width) * scale[0],
        f64::from(part.height) * scale[1],
    ];
    ImagePanel {
        title: "The picture with the contour that was taken".to_owned(),
        size: [preview.width as usize, preview.height as usize],
        grey: preview.grey.clone(),
        pixel_size: scale.map(|s| s * f64::from(preview.factor)),
        origin: [-f64::from(part.x) * scale[0], -below * scale[1]],
        outlines,
        crop: Some([[0.0, 0.0], size]),
        seeds: Vec::new(),
        dimensions: Vec::new(),
    }
}

/// The section of a picture alone.
fn picture_section_panel(picture: &MicrographSection) -> CurvePanel {
    let (low, high) = picture.outline.bounds().unwrap_or_default();
    let size = |value: f64, word: &str| format!("{word} {}", format_length(value));
    let below = low[1] - 0.05 * (high[1] - low[1]);
    let beside = high[0] + 0.05 * (high[0] - low[0]);
    CurvePanel {
        title: "The section".to_owned(),
        x_label: "position".to_owned(),
        z_label: "height".to_owned(),
        equal_scale: true,
        regions: image_panel(picture).outlines,
        dimensions: vec![
            Dimension {
                from: [low[0], below],
                to: [high[0], below],
                text: size(high[0] - low[0], "width"),
            },
            Dimension {
                from: [beside, low[1]],
                to: [beside, high[1]],
                text: size(high[1] - low[1], "height"),
            },
        ],
        ..CurvePanel::default()
    }
}
