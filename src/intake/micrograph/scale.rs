//! The size of a pixel: every statement of the file and the command line, and which one counts.
//!
//! In this order: the option; a private tag 34682 or 34118; OME-XML; the description text of tag 270 with
//! `unit=`; a resolution per inch or centimetre, PNG pHYs or the like. A resolution counts only if it is
//! none of those that programs write for screens and printers, and if its pixels are finer than 50 um.
//! Statements that count must agree to 1 %.

use super::decode::PictureTexts;
use super::micrograph_problem::MicrographProblem;
use super::micrograph_section::ScaleCandidate;
use super::options::MicrographOptions;
use super::vendor_text::Vendor;
use crate::units::{format_length, format_percent, length_unit};
use crate::warning::{Code, Warning};

/// Largest relative difference of statements that count.
const LARGEST_DIFFERENCE: f64 = 0.01;
/// Pixels per inch that programs write for screens and printers.
const SCREEN_DPI: [f64; 19] = [
    72.0, 75.0, 90.0, 96.0, 100.0, 120.0, 144.0, 150.0, 180.0, 200.0, 220.0, 240.0, 254.0, 300.0,
    360.0, 400.0, 600.0, 1200.0, 2400.0,
];
/// Rounding of a resolution in whole pixels per metre or centimetre, relative.
const DPI_ROUNDING: f64 = 3e-3;
/// Largest pixel that a resolution can stand for, m.
const LARGEST_PIXEL: f64 = 50e-6;
/// Inch, m.
const INCH: f64 = 0.0254;

/// The scale as decided.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Scale {
    pub(super) metres_per_pixel: [f64; 2],
    pub(super) candidates: Vec<ScaleCandidate>,
    pub(super) warnings: Vec<Warning>,
}

fn candidate(source: &str, metres_per_pixel: [f64; 2], note: &str) -> ScaleCandidate {
    let is_size = |v: f64| v.is_finite() && v > 0.0;
    ScaleCandidate {
        source: source.to_owned(),
        metres_per_pixel,
        used: false,
        is_trusted: note.is_empty() && metres_per_pixel.into_iter().all(is_size),
        note: note.to_owned(),
    }
}

/// Decides on the scale.
pub(super) fn decide(
    options: &MicrographOptions,
    texts: &PictureTexts,
    vendor: &Vendor,
    size: [u32; 2],
) -> Result<Scale, MicrographProblem> {
    for (option, value) in [("--scale", options.scale), ("--scale-y", options.scale_y)] {
        if let Some(value) = value.filter(|v| !(v.is_finite() && *v > 0.0)) {
            return Err(MicrographProblem::OptionRange {
                option,
                value: format!("{value} m"),
                range: "a length above zero",
            });
        }
    }
    let mut candidates = stated(texts, vendor, size);
    let trusted: Vec<[f64; 2]> = candidates
        .iter()
        .filter(|c| c.is_trusted)
        .map(|c| c.metres_per_pixel)
        .collect();
    if let Some(x) = options.scale {
        return typed(x, options.scale_y, candidates, trusted.first().copied());
    }
    let Some(&[x, y]) = trusted.first() else {
        return Err(MicrographProblem::NoScale {
            candidates: candidates.iter().map(described).collect(),
        });
    };
    let difference = largest_difference(&trusted);
    if difference > LARGEST_DIFFERENCE {
        return Err(MicrographProblem::ScaleConflict {
            difference,
            candidates: candidates.iter().map(described).collect(),
        });
    }
    let mut used = String::new();
    if let Some(first) = candidates.iter_mut().find(|c| c.is_trusted) {
        first.used = true;
        used.clone_from(&first.source);
    }
    let warnings = if trusted.len() == 1 {
        vec![Warning {
            code: Code::ScaleUnsure,
            message: format!(
                "the scale, {} per pixel, rests on one statement of the file: {used}",
                format_length(x)
            ),
            advice: "measure the scale bar of the picture; --scale takes its word over the file's"
                .to_owned(),
            numbers: vec![("metres_per_pixel_m", x)],
        }]
    } else {
        Vec::new()
    };
    if let Some(y) = options.scale_y {
        candidates.insert(0, used_option("--scale-y", [x, y]));
    }
    Ok(Scale {
        metres_per_pixel: [x, options.scale_y.unwrap_or(y)],
        candidates,
        warnings,
    })
}

fn used_option(source: &str, metres_per_pixel: [f64; 2]) -> ScaleCandidate {
    ScaleCandidate {
        used: true,
        ..candidate(source, metres_per_pixel, "")
    }
}

/// The scale of the option.
fn typed(
    x: f64,
    y: Option<f64>,
    mut candidates: Vec<ScaleCandidate>,
    stated: Option<[f64; 2]>,
) -> Result<Scale, MicrographProblem> {
    let mut warnings = Vec::new();
    if let Some(pixel) = stated {
        if y.is_none() && (pixel[1] / pixel[0] - 1.0).abs() > LARGEST_DIFFERENCE {
            return Err(MicrographProblem::NotSquare { pixel });
        }
        let ours = [x, y.unwrap_or(x)];
        let difference = largest_difference(&[ours, pixel]);
        if difference > LARGEST_DIFFERENCE {
            warnings.push(Warning {
                code: Code::ScaleUnsure,
                message: format!(
                    "--scale, {} per pixel, differs from the file's {} by {}",
                    format_length(x),
                    format_length(pixel[0]),
                    format_percent(difference, 2)
                ),
                advice: "check the scale bar of the picture: conductance goes with the fourth power of it"
                    .to_owned(),
                numbers: vec![("difference", difference)],
            });
        }
    }
    let ours = [x, y.unwrap_or(x)];
    candidates.insert(0, used_option("--scale", ours));
    Ok(Scale {
        metres_per_pixel: ours,
        candidates,
        warnings,
    })
}

/// Largest relative difference of any two, along either axis.
fn largest_difference(sizes: &[[f64; 2]]) -> f64 {
    [0, 1]
        .map(|axis| {
            let values = sizes.iter().map(|size| size[axis]);
            let low = values.clone().fold(f64::INFINITY, f64::min);
            values.fold(0.0, f64::max) / low - 1.0
        })
        .into_iter()
        .fold(0.0, f64::max)
}

/// A candidate in words.
fn described(candidate: &ScaleCandidate) -> String {
    let [x, y] = candidate.metres_per_pixel;
    let height = if (y / x - 1.0).abs() > 1e-6 {
        format!(" by {}", format_length(y))
    } else {
        String::new()
    };
    let note = if candidate.note.is_empty() {
        String::new()
    } else {
        format!(" ({})", candidate.note)
    };
    format!("{}: {}{height}{note}", candidate.source, format_length(x))
}

/// All statements of the file, those that count most first.
fn stated(texts: &PictureTexts, vendor: &Vendor, size: [u32; 2]) -> Vec<ScaleCandidate> {
    let mut candidates: Vec<ScaleCandidate> = vendor
        .sizes
        .iter()
        .map(|s| candidate(&s.source, s.metres_per_pixel, ""))
        .collect();
    if let Some(description) = &texts.description {
        candidates.extend(ome(description, size));
        candidates.extend(description_unit(description, texts.per_unit));
    }
    if let Some(resolution) = &texts.resolution {
        let pixel = resolution.per_metre.map(|v| 1.0 / v);
        candidates.push(candidate(
            resolution.source,
            pixel,
            &resolution_note(resolution.per_metre, pixel),
        ));
    }
    candidates
}

/// Why a resolution is no scale; empty if it may be one.
fn resolution_note(per_metre: [f64; 2], pixel: [f64; 2]) -> String {
    let dpi = per_metre.map(|v| v * INCH);
    let is_screen = |v: f64| {
        SCREEN_DPI
            .iter()
            .any(|s| (v / s - 1.0).abs() < DPI_ROUNDING)
    };
    if dpi.iter().all(|v| is_screen(*v)) {
        return format!("{:.0} dpi is for screens or printing", dpi[0]);
    }
    if pixel.iter().any(|v| *v > LARGEST_PIXEL) {
        return format!("{:.0} dpi makes pixels too large for a micrograph", dpi[0]);
    }
    String::new()
}

/// `PhysicalSizeX` of OME-XML.
fn ome(description: &str, size: [u32; 2]) -> Option<ScaleCandidate> {
    let text = description.trim_start_matches('\u{feff}').trim();
    if !(text.starts_with("<?xml") || text.starts_with("<OME")) {
        return None;
    }
    let document = roxmltree::Document::parse(text).ok()?;
    let pixels = document
        .descendants()
        .find(|node| node.tag_name().name() == "Pixels" && node.has_attribute("PhysicalSizeX"))?;
    let number = |name: &str| -> Option<f64> { pixels.attribute(name)?.trim().parse().ok() };
    let x = number("PhysicalSizeX")?;
    let y = number("PhysicalSizeY").unwrap_or(x);
    let unit_x = pixels.attribute("PhysicalSizeXUnit");
    let unit_y = pixels.attribute("PhysicalSizeYUnit").or(unit_x);
    let factor = |unit: Option<&str>| unit.and_then(length_unit);
    let source = "OME-XML PhysicalSizeX";
    let [Some(factor_x), Some(factor_y)] = [factor(unit_x), factor(unit_y)] else {
        let note = format!("its unit {:?} is no length", unit_x.unwrap_or(""));
        return Some(candidate(source, [x, y], &note));
    };
    let stated = number("SizeX").filter(|columns| (*columns - f64::from(size[0])).abs() > 0.5);
    let note = stated.map_or_else(String::new, |columns| {
        format!("it is for {columns} columns, the picture has {}", size[0])
    });
    Some(candidate(source, [x * factor_x, y * factor_y], &note))
}

/// `unit=micron` of a description text, with the resolution in pixels per that unit.
fn description_unit(description: &str, per_unit: Option<[f64; 2]>) -> Option<ScaleCandidate> {
    let word = description
        .lines()
        .find_map(|line| line.trim().strip_prefix("unit="))?
        .trim();
    let word = word
        .replace("\\u00B5", "\u{b5}")
        .replace("\\u00b5", "\u{b5}");
    let per_unit = per_unit?;
    let source = format!("description text unit={word}");
    let Some(metres) = length_unit(&word) else {
        return Some(candidate(
            &source,
            per_unit.map(|v| 1.0 / v),
            "the unit is no length",
        ));
    };
    if per_unit.iter().all(|v| (*v - 1.0).abs() < 1e-9) {
        return Some(candidate(
            &source,
            [metres; 2],
            "a resolution of 1 pixel per unit is what programs write without a scale",
        ));
    }
    Some(candidate(&source, per_unit.map(|v| metres / v), ""))
}
