//! The part of the picture that is used: as asked, without the data bar that the file states, or without one that
//! is found at the bottom.
//!
//! A bar is found where the bottom rows, between 1.5 % and 25 % of the height, hold one grey value in at least half
//! of their pixels each, and the rows above hold none so often: a scan has noise, a bar is drawn.

use super::grey::Grey;
use super::micrograph_problem::MicrographProblem;
use super::options::PixelBox;
use crate::intake::step::Step;
use crate::warning::{Code, Warning};

/// Smallest and largest height of a bar over that of the picture.
const BAR_SHARE: [f64; 2] = [0.015, 0.25];
/// Least share of a row that holds the commonest value: in a bar, and at most in the rows above it.
const DRAWN_SHARE: f64 = 0.5;
const SCANNED_SHARE: f64 = 0.3;
/// Rows in and below a bar that may be otherwise: a strip of the picture below a framed bar, large letters.
const MOST_MISSED: usize = 4;
/// Rows above the bar that are looked at.
const ROWS_ABOVE: usize = 16;
/// Fewest rows and columns that are used.
pub(super) const LEAST_SIZE: u32 = 8;

/// The part that is used.
#[derive(Debug)]
pub(super) struct Part {
    pub(super) crop: PixelBox,
    pub(super) step: Step,
    pub(super) warning: Option<Warning>,
}

/// Decides which part is used.
///
/// - `scan`: columns and rows of the scan by the file
pub(super) fn part(
    grey: &Grey,
    asked: Option<[u32; 4]>,
    scan: Option<[u32; 2]>,
) -> Result<Part, MicrographProblem> {
    let [width, height] = [grey.width as u32, grey.height as u32];
    let whole = PixelBox {
        x: 0,
        y: 0,
        width,
        height,
    };
    let without = |rows: u32| PixelBox {
        height: height - rows,
        ..whole
    };
    let part = if let Some([x, y, w, h]) = asked {
        let crop = PixelBox {
            x,
            y,
            width: w,
            height: h,
        };
        check_inside(crop, "--crop", [width, height])?;
        let text = format!("{w} x {h} pixels from {x},{y} are used, as asked");
        Part {
            crop,
            step: Step::new("crop", text),
            warning: None,
        }
    } else if let Some([_, rows]) = scan.filter(|s| s[0] == width && s[1] < height && s[1] > 0) {
        let bar = height - rows;
        let text =
            format!("the last {bar} rows are a data bar: the file states {rows} rows of scan");
        Part {
            crop: without(bar),
            step: Step::new("crop", text).with(&[("bar_px", f64::from(bar))]),
            warning: None,
        }
    } else if let Some(bar) = bar_rows(grey) {
        let text = format!("the last {bar} rows look like a data bar and are left out");
        Part {
            crop: without(bar),
            step: Step::new("crop", text.clone()).with(&[("bar_px", f64::from(bar))]),
            warning: Some(Warning {
                code: Code::ChoiceMade,
                message: text,
                advice: format!("if they are part of the picture give --crop 0,0,{width},{height}"),
                numbers: vec![("bar_px", f64::from(bar))],
            }),
        }
    } else {
        Part {
            crop: whole,
            step: Step::new("crop", "the whole picture is used; no data bar was found"),
            warning: None,
        }
    };
    if part.crop.width < LEAST_SIZE || part.crop.height < LEAST_SIZE {
        return Err(MicrographProblem::TooSmall {
            width: part.crop.width,
            height: part.crop.height,
            least: LEAST_SIZE,
        });
    }
    Ok(part)
}

/// Refuses a box that leaves the picture.
pub(super) fn check_inside(
    part: PixelBox,
    option: &'static str,
    [width, height]: [u32; 2],
) -> Result<(), MicrographProblem> {
    let right = u64::from(part.x) + u64::from(part.width);
    let bottom = u64::from(part.y) + u64::from(part.height);
    if right > u64::from(width) || bottom > u64::from(height) {
        return Err(MicrographProblem::OutsidePicture {
            option,
            x: right,
            y: bottom,
            width,
            height,
        });
    }
    Ok(())
}

/// The commonest value of a row and its share.
fn commonest(row: &[u16], sorted: &mut Vec<u16>) -> (u16, f64) {
    sorted.clear();
    sorted.extend_from_slice(row);
    sorted.sort_unstable();
    let longest = sorted.chunk_by(|a, b| a == b).max_by_key(|same| same.len());
    longest.map_or((0, 0.0), |same| {
        let value = same.first().copied().unwrap_or(0);
        (value, same.len() as f64 / row.len().max(1) as f64)
    })
}

/// Rows of a bar at the bottom.
fn bar_rows(grey: &Grey) -> Option<u32> {
    let height = grey.height;
    let most = (BAR_SHARE[1] * height as f64) as usize;
    let mut sorted = Vec::new();
    let (mut bar, mut missed) = (0, 0);
    for (count, y) in (height.saturating_sub(most + 1)..height).rev().enumerate() {
        let (_, share) = commonest(grey.row(y), &mut sorted);
        if share >= DRAWN_SHARE {
            (bar, missed) = (count + 1, 0);
        } else {
            missed += 1;
        }
        if missed > MOST_MISSED {
            break;
        }
    }
    if (bar as f64) < BAR_SHARE[0] * height as f64 || bar > most || bar <= MOST_MISSED {
        return None;
    }
    let top = height - bar;
    let above: Vec<f64> = (top.saturating_sub(ROWS_ABOVE)..top)
        .map(|y| commonest(grey.row(y), &mut sorted).1)
        .collect();
    let mean = above.iter().sum::<f64>() / above.len().max(1) as f64;
    (mean <= SCANNED_SHARE).then_some(bar as u32)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A noisy picture with a drawn bar below.
    fn scan_with_bar(bar: usize) -> Grey {
        let (width, height) = (100, 120);
        let values = (0..width * height)
            .map(|i| {
                let (x, y) = (i % width, i / width);
                if y < height - bar {
                    (i * 7919 % 181) as u16
                } else if y % 5 == 2 && x > 60 {
                    255
                } else {
                    0
                }
            })
            .collect();
        Grey {
            width,
            height,
            values,
            offset: 0.0,
            unit: 1.0,
            full_scale: [0.0, 255.0],
            step: 1.0,
        }
    }

    #[test]
    fn a_drawn_bar_below_a_scan_is_found() {
        let found = part(&scan_with_bar(12), None, None).unwrap();
        assert_eq!(found.crop.height, 108);
        assert_eq!(found.warning.map(|w| w.code), Some(Code::ChoiceMade));
        let found = part(&scan_with_bar(0), None, None).unwrap();
        assert_eq!(found.crop.height, 120);
        assert!(found.warning.is_none());
    }

    #[test]
    fn a_framed_bar_with_a_strip_of_the_picture_below_is_found() {
        let mut grey = scan_with_bar(16);
        let scan = scan_with_bar(0);
        let strip = 100 * (120 - 2);
        grey.values[strip..].copy_from_slice(&scan.values[strip..]);
        let found = part(&grey, None, None).unwrap();
        assert_eq!(found.crop.height, 104);
        assert!(
            found.step.text.contains("last 16 rows"),
            "{}",
            found.step.text
        );
    }

    #[test]
    fn a_clean_drawing_has_no_bar() {
        let mut grey = scan_with_bar(0);
        for (i, value) in grey.values.iter_mut().enumerate() {
            let (x, y) = (i % 100, i / 100);
            *value = if (20..80).contains(&x) && (20..90).contains(&y) {
                30
            } else {
                200
            };
        }
        assert!(part(&grey, None, None).unwrap().warning.is_none());
    }

    #[test]
    fn the_file_and_the_option_come_first() {
        let grey = scan_with_bar(12);
        let found = part(&grey, None, Some([100, 100])).unwrap();
        assert_eq!(found.crop.height, 100);
        assert!(found.warning.is_none());
        let found = part(&grey, Some([1, 2, 30, 40]), Some([100, 100])).unwrap();
        assert_eq!((found.crop.x, found.crop.height), (1, 40));
        for wrong in [[90, 0, 20, 20], [0, u32::MAX, 20, u32::MAX], [0, 0, 3, 50]] {
            assert!(part(&grey, Some(wrong), None).is_err());
        }
    }
}
