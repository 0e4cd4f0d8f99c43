//! The part of a picture that is used, with its scale: decoded, checked for tilt, cut and, where asked, denoised.

use super::data_bar;
use super::decode::{Decoded, decode};
use super::denoise::denoised;
use super::grey::Grey;
use super::micrograph_problem::MicrographProblem;
use super::micrograph_section::{Preview, ScaleCandidate};
use super::options::{Denoise, MicrographOptions, PixelBox, Threshold, Tilt};
use super::scale;
use super::vendor_text::{self, Vendor};
use crate::intake::step::Step;
use crate::units::{format_length, format_significant};
use crate::warning::{Code, Warning};

/// Smallest sine or cosine of a tilt.
const LEAST_FORESHORTENING: f64 = 0.05;
/// Tilts below this are none, rad: half a degree shortens heights by 4e-5.
const LEAST_TILT: f64 = 0.5 * std::f64::consts::PI / 180.0;
/// Difference of a stated tilt from the file's that is worth a warning, rad.
const TILT_DIFFERENCE: f64 = 1.0 * std::f64::consts::PI / 180.0;

/// A picture ready for the search of its wall.
#[derive(Debug)]
pub(super) struct Prepared {
    /// The part used.
    pub(super) grey: Grey,
    pub(super) crop: PixelBox,
    /// Columns and rows of the whole picture.
    pub(super) size: [u32; 2],
    pub(super) preview: Preview,
    /// With the correction of the tilt.
    pub(super) metres_per_pixel: [f64; 2],
    pub(super) candidates: Vec<ScaleCandidate>,
    pub(super) metadata: Vec<(String, String)>,
    pub(super) steps: Vec<Step>,
    pub(super) warnings: Vec<Warning>,
}

/// Reads and prepares a picture.
pub(super) fn prepared(
    bytes: &[u8],
    options: &MicrographOptions,
) -> Result<Prepared, MicrographProblem> {
    check_options(options)?;
    let Decoded {
        grey: whole,
        texts,
        mut steps,
        mut warnings,
    } = decode(bytes, options)?;
    let size = [whole.width as u32, whole.height as u32];
    let vendor = vendor_text::read(&texts, size);
    let scale = scale::decide(options, &texts, &vendor, size)?;
    warnings.extend(scale.warnings);
    steps.push(scale_step(scale.metres_per_pixel, &scale.candidates));
    let metres_per_pixel = tilted(
        scale.metres_per_pixel,
        options.tilt,
        &vendor,
        &mut steps,
        &mut warnings,
    )?;
    let part = data_bar::part(&whole, options.crop, vendor.scan)?;
    let crop = part.crop;
    steps.push(part.step);
    warnings.extend(part.warning);
    let preview = whole.preview();
    let grey = if [crop.width, crop.height] == size {
        whole
    } else {
        whole.part(crop)
    };
    let (grey, step) = denoised(grey, options.denoise);
    steps.extend(step);
    Ok(Prepared {
        grey,
        crop,
        size,
        preview,
        metres_per_pixel,
        candidates: scale.candidates,
        metadata: vendor.metadata,
        steps,
        warnings,
    })
}

/// Refuses numbers out of range before the picture is read.
fn check_options(options: &MicrographOptions) -> Result<(), MicrographProblem> {
    let range = |option, value: String, range| {
        Err(MicrographProblem::OptionRange {
            option,
            value,
            range,
        })
    };
    let [outer, inner] = options.reach_levels;
    if !(outer > 0.0 && outer < 0.5 && inner > 0.5 && inner < 1.0) {
        let value = format!(
            "{} %,{} %",
            format_significant(outer * 100.0, 3),
            format_significant(inner * 100.0, 3)
        );
        return range(
            "--reach-levels",
            value,
            "a level above 0 % and below 50 %, then one above 50 % and below 100 %",
        );
    }
    if !options.denoise.is_in_range() {
        let value = match options.denoise {
            Denoise::Median(radius) => format!("median:{radius}"),
            Denoise::Gaussian(sigma) => format!("gauss:{sigma}"),
            Denoise::None => "none".to_owned(),
        };
        return range(
            "--denoise",
            value,
            "median:1 to 10 or gauss: up to 20 pixels",
        );
    }
    if let Threshold::Value(value) = options.threshold
        && !value.is_finite()
    {
        return range("--threshold", value.to_string(), "a finite grey value");
    }
    if let Threshold::Share(share) = options.threshold
        && !(0.0..=1.0).contains(&share)
    {
        return range(
            "--threshold",
            format!("{} %", share * 100.0),
            "0 % to 100 %",
        );
    }
    let lengths = [
        ("--islands-above", options.smallest_island, "m^2"),
        ("--simplify", options.simplify, "m"),
    ];
    for (option, value, unit) in lengths {
        if let Some(value) = value.filter(|v| !(v.is_finite() && *v >= 0.0)) {
            return range(option, format!("{value} {unit}"), "zero or above");
        }
    }
    Ok(())
}

fn scale_step(metres_per_pixel: [f64; 2], candidates: &[ScaleCandidate]) -> Step {
    let [x, y] = metres_per_pixel;
    let sources: Vec<&str> = candidates
        .iter()
        .filter(|c| c.used)
        .map(|c| c.source.as_str())
        .collect();
    let agreeing = candidates
        .iter()
        .filter(|c| c.is_trusted && !c.used)
        .count();
    let size = if (y / x - 1.0).abs() > 1e-9 {
        format!("{} wide and {} high", format_length(x), format_length(y))
    } else {
        format!("{} wide and high", format_length(x))
    };
    let text = format!(
        "a pixel is {size}, from {}; {agreeing} other statements that count, {} in all",
        sources.join(" and "),
        candidates.len()
    );
    Step::new("scale", text).with(&[("pixel_width_m", x), ("pixel_height_m", y)])
}

/// Corrects heights for the tilt.
fn tilted(
    [x, y]: [f64; 2],
    tilt: Option<Tilt>,
    vendor: &Vendor,
    steps: &mut Vec<Step>,
    warnings: &mut Vec<Warning>,
) -> Result<[f64; 2], MicrographProblem> {
    let stated = vendor
        .tilt
        .as_ref()
        .filter(|(angle, _)| angle.abs() >= LEAST_TILT);
    let (angle, share, rule) = match (tilt, stated) {
        (None, None) => return Ok([x, y]),
        (None, Some((angle, source))) => {
            return Err(MicrographProblem::Tilted {
                degrees: (angle.to_degrees() * 1000.0).round() / 1000.0,
                source_tag: source.clone(),
                says_corrected: vendor.is_tilt_corrected,
            });
        }
        (Some(Tilt::Corrected), _) => {
            let text = "heights are taken as they are: --tilt-corrected";
            steps.push(Step::new("tilt", text));
            return Ok([x, y]);
        }
        (Some(Tilt::Stage(angle)), _) => (angle, angle.sin(), "sine"),
        (Some(Tilt::Face(angle)), _) => (angle, angle.cos(), "cosine"),
    };
    if !(LEAST_FORESHORTENING..=1.0).contains(&share.abs()) {
        return Err(MicrographProblem::OptionRange {
            option: "--tilt",
            value: format!("{} degrees", format_significant(angle.to_degrees(), 4)),
            range: "an angle at which the face is seen: its sine (face:ANGLE: cosine) must be 0.05 or more",
        });
    }
    let text = format!(
        "heights are divided by {}, the {rule} of the stated {} degrees",
        format_significant(share.abs(), 5),
        format_significant(angle.to_degrees(), 4)
    );
    steps.push(Step::new("tilt", text).with(&[("divisor", share.abs())]));
    if vendor.is_tilt_corrected {
        warnings.push(Warning {
            code: Code::ScaleUnsure,
            message:
                "the file says that the instrument corrected the tilt, and --tilt corrects it again"
                    .to_owned(),
            advice: "give --tilt-corrected instead if heights are right as they are".to_owned(),
            numbers: Vec::new(),
        });
    }
    if let (Some(Tilt::Stage(_)), Some((file, source))) = (tilt, &vendor.tilt)
        && (angle.abs() - file.abs()).abs() > TILT_DIFFERENCE
    {
        warnings.push(Warning {
            code: Code::ScaleUnsure,
            message: format!(
                "--tilt states {} degrees, the file {} ({source})",
                format_significant(angle.to_degrees(), 4),
                format_significant(file.to_degrees(), 4)
            ),
            advice: "check the angle: heights go with its sine".to_owned(),
            numbers: vec![("file_tilt_rad", *file), ("stated_tilt_rad", angle)],
        });
    }
    Ok([x, y / share.abs()])
}
