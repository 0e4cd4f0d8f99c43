//! What instruments write into private tags of a TIFF file: pixel size, field width, tilt, scan size.
//!
//! Tag 34682 holds sections `[Scan]` with lines `PixelWidth=3.3724e-06` in SI units. Tag 34118 holds a line
//! with a key such as `AP_IMAGE_PIXEL_SIZE`, then a line such as `Image Pixel Size = 2.615 um`. Both state the
//! width of the field besides, which is a check: of a picture stored at half its size the pixel size may
//! be that of the full one.

use super::decode::PictureTexts;
use crate::units::{length_unit, parse_angle};

/// A pixel size as stated.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Statement {
    pub(super) source: String,
    pub(super) metres_per_pixel: [f64; 2],
}

/// What the private tags say.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Vendor {
    /// Pixel sizes, the one to be used first.
    pub(super) sizes: Vec<Statement>,
    /// Tilt of the stage, rad, and where it is stated.
    pub(super) tilt: Option<(f64, String)>,
    /// Whether the file says that the instrument corrected the tilt.
    pub(super) is_tilt_corrected: bool,
    /// Columns and rows of the scan, without a data bar.
    pub(super) scan: Option<[u32; 2]>,
    /// All keys and values.
    pub(super) metadata: Vec<(String, String)>,
}

/// Most keys that are kept.
const MOST_KEYS: usize = 5000;

/// Reads the private tags of a picture.
pub(super) fn read(texts: &PictureTexts, size: [u32; 2]) -> Vendor {
    let mut vendor = Vendor::default();
    if let Some(text) = &texts.tag_34682 {
        read_34682(text, size, &mut vendor);
    }
    if let Some(text) = &texts.tag_34118 {
        read_34118(text, size, &mut vendor);
    }
    vendor
}

fn positive(text: &str) -> Option<f64> {
    text.trim()
        .parse()
        .ok()
        .filter(|v: &f64| v.is_finite() && *v > 0.0)
}

fn read_34682(text: &str, size: [u32; 2], vendor: &mut Vendor) {
    let mut section = "";
    let mut pairs: Vec<(String, &str)> = Vec::new();
    for line in text.lines().take(MOST_KEYS) {
        let line = line.trim();
        if let Some(name) = line.strip_prefix('[').and_then(|l| l.strip_suffix(']')) {
            section = name;
        } else if let Some((key, value)) = line.split_once('=') {
            pairs.push((format!("[{section}] {}", key.trim()), value.trim()));
        }
    }
    let find = |key: &str| pairs.iter().find(|(k, _)| k == key).map(|(_, v)| *v);
    let number = |key: &str| find(key).and_then(positive);
    let whole = |key: &str| find(key).and_then(|v| v.parse::<u32>().ok());
    if let (Some(width), Some(height)) =
        (whole("[Image] ResolutionX"), whole("[Image] ResolutionY"))
    {
        vendor.scan = Some([width, height]);
    }
    let tag = |name: &str| format!("tag 34682 {name}");
    if let Some(x) = number("[Scan] PixelWidth") {
        vendor.sizes.push(Statement {
            source: tag("[Scan] PixelWidth"),
            metres_per_pixel: [x, number("[Scan] PixelHeight").unwrap_or(x)],
        });
    }
    if let Some(field) = number("[Scan] HorFieldsize") {
        let [columns, rows] = vendor.scan.unwrap_or(size).map(f64::from);
        let x = field / columns;
        let y = number("[Scan] VerFieldsize").map_or(x, |field| field / rows);
        vendor.sizes.push(Statement {
            source: tag("[Scan] HorFieldsize over columns"),
            metres_per_pixel: [x, y],
        });
    }
    let angle = |key: &str| find(key).and_then(|v| v.parse().ok().filter(|a: &f64| a.is_finite()));
    if let Some(tilt) = angle("[Stage] StageT") {
        vendor.tilt = Some((tilt, tag("[Stage] StageT")));
    }
    vendor.is_tilt_corrected = pairs
        .iter()
        .any(|(k, v)| k.ends_with("] TiltCorrectionIsOn") && v.eq_ignore_ascii_case("yes"));
    let kept = pairs.into_iter().map(|(k, v)| (k, v.to_owned()));
    vendor.metadata.extend(kept);
}

/// A length such as `2.615 um`.
fn length(text: &str) -> Option<f64> {
    let text = text.trim();
    let (number, unit) = text.split_once(char::is_whitespace)?;
    Some(positive(number)? * length_unit(unit.trim())?)
}

/// Whether a line is a key of tag 34118: two capitals, `_`, capitals.
fn is_key(line: &str) -> bool {
    let mut parts = line.splitn(2, '_');
    let capitals = |c: char| c.is_ascii_uppercase() || c.is_ascii_digit() || c == '_';
    parts
        .next()
        .is_some_and(|p| p.len() == 2 && p.chars().all(capitals))
        && parts
            .next()
            .is_some_and(|p| !p.is_empty() && p.chars().all(capitals))
}

fn read_34118(text: &str, size: [u32; 2], vendor: &mut Vendor) {
    let mut pairs: Vec<(&str, &str)> = Vec::new();
    let mut key = None;
    for line in text.lines().map(str::trim) {
        if is_key(line) {
            key = Some(line);
        } else if let Some(known) = key.take().filter(|_| pairs.len() < MOST_KEYS) {
            let value = line.split_once('=').map_or(line, |(_, value)| value);
            pairs.push((known, value.trim()));
        }
    }
    let find = |key: &str| pairs.iter().find(|(k, _)| *k == key).map(|(_, v)| *v);
    let tag = |name: &str| format!("tag 34118 {name}");
    for key in ["AP_IMAGE_PIXEL_SIZE", "AP_PIXEL_SIZE"] {
        // In a file with both, the size of the stored picture is the first one.
        let is_overruled = vendor
            .sizes
            .iter()
            .any(|s| s.source == tag("AP_IMAGE_PIXEL_SIZE"));
        if let Some(x) = find(key).and_then(length).filter(|_| !is_overruled) {
            vendor.sizes.push(Statement {
                source: tag(key),
                metres_per_pixel: [x, x],
            });
        }
    }
    let [columns, rows] = size.map(f64::from);
    if let Some(field) = find("AP_WIDTH").and_then(length) {
        let x = field / columns;
        let y = find("AP_HEIGHT")
            .and_then(length)
            .map_or(x, |field| field / rows);
        vendor.sizes.push(Statement {
            source: tag("AP_WIDTH over columns"),
            metres_per_pixel: [x, y],
        });
    }
    if let Some(tilt) = find("AP_TILT_ANGLE").and_then(degrees) {
        vendor.tilt = Some((tilt, tag("AP_TILT_ANGLE")));
    }
    vendor.is_tilt_corrected |=
        find("DP_TILT_CORRECTION").is_some_and(|v| v.eq_ignore_ascii_case("on"));
    let kept = pairs.iter().map(|&(k, v)| (k.to_owned(), v.to_owned()));
    vendor.metadata.extend(kept);
}

/// An angle in degrees, with whatever sign for degrees the file has.
fn degrees(text: &str) -> Option<f64> {
    let number = text.trim().split(char::is_whitespace).next()?;
    parse_angle(&format!("{number} deg")).ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read_text(tag_34682: Option<&str>, tag_34118: Option<&str>) -> Vendor {
        let texts = PictureTexts {
            tag_34682: tag_34682.map(str::to_owned),
            tag_34118: tag_34118.map(str::to_owned),
            ..PictureTexts::default()
        };
        read(&texts, [100, 80])
    }

    #[test]
    fn sections_and_keys_give_pixel_size_tilt_and_scan() {
        let text = "[Beam]\r\nPixelWidth=9\r\n[Scan]\r\nPixelWidth=2e-7\r\nPixelHeight=4e-7\r\n\
                    HorFieldsize=2e-5\r\nVerFieldsize=2.8e-5\r\n[EBeam]\r\nTiltCorrectionIsOn=yes\r\n\
                    [Stage]\r\nStageT=-0.9\r\n[Image]\r\nResolutionX=100\r\nResolutionY=70\r\n";
        let vendor = read_text(Some(text), None);
        let [x, y] = vendor.sizes[0].metres_per_pixel;
        assert!((x - 2e-7).abs() < 1e-15 && (y - 4e-7).abs() < 1e-15);
        let [x, y] = vendor.sizes[1].metres_per_pixel;
        assert!((x - 2e-7).abs() < 1e-15 && (y - 4e-7).abs() < 1e-15);
        assert_eq!(vendor.scan, Some([100, 70]));
        assert!((vendor.tilt.unwrap().0 + 0.9).abs() < 1e-12);
        assert!(vendor.is_tilt_corrected);
        assert_eq!(vendor.metadata.len(), 9);
    }

    #[test]
    fn lines_after_a_key_give_pixel_size_and_tilt() {
        let text = "0\r\n2.6e-6\r\nDP_TILT_CORRECTION\r\nTilt Corrn. = Off\r\nAP_PIXEL_SIZE\r\n\
                    Pixel Size = 24.65 nm\r\nAP_IMAGE_PIXEL_SIZE\r\nImage Pixel Size = 12.33 nm\r\n\
                    AP_TILT_ANGLE\r\nTilt Angle =  70.0 \u{b0}\r\nAP_WIDTH\r\nWidth = 1.233 \u{b5}m\r\n";
        let vendor = read_text(None, Some(text));
        assert_eq!(vendor.sizes.len(), 2);
        assert!((vendor.sizes[0].metres_per_pixel[0] - 12.33e-9).abs() < 1e-18);
        assert!((vendor.sizes[1].metres_per_pixel[0] - 12.33e-9).abs() < 1e-18);
        let (tilt, source) = vendor.tilt.unwrap();
        assert!((tilt.to_degrees() - 70.0).abs() < 1e-9);
        assert_eq!(source, "tag 34118 AP_TILT_ANGLE");
        assert!(!vendor.is_tilt_corrected);
    }

    #[test]
    fn a_unit_that_was_destroyed_is_no_statement() {
        let text = "AP_PIXEL_SIZE\nPixel Size = 2.6 \u{fffd}m\nAP_TILT_ANGLE\nTilt Angle = x\n";
        let vendor = read_text(Some("[Scan]\nPixelWidth=-1\n=\n[\n"), Some(text));
        assert!(vendor.sizes.is_empty() && vendor.tilt.is_none());
    }
}
