//! Which grey level parts fluid and wall, which tone the fluid has, and which region is the section.
//!
//! Nothing is chosen where two choices are about as good: reading stops and names them.

use super::data_bar::check_inside;
use super::grey::Grey;
use super::levels::{Classes, Histogram};
use super::micrograph_problem::MicrographProblem;
use super::micrograph_section::RegionFound;
use super::options::{MicrographOptions, PixelBox, Region, Threshold, Tone};
use super::regions::{Blob, Level, Regions};
use crate::intake::step::Step;
use crate::warning::{Code, Warning};

/// Smallest distance of two classes over their deviation: even greys reach 3.46.
const LEAST_SEPARATION: f64 = 4.0;
/// Fewest grey steps between fluid and wall.
const LEAST_STEPS: f64 = 8.0;
/// Fewest pixels of a region that can be the section: 10 x 10.
const LEAST_PIXELS: u64 = 100;
/// Regions down to this share of the largest are of its size.
const SIMILAR_SHARE: f64 = 0.25;
/// The tone is clear if its largest region is this many times that of the other.
const CLEAR_RATIO: f64 = 10.0;
/// Regions listed at most.
const MOST_LISTED: usize = 20;

/// The part of the picture that is used, and its place in the whole.
#[derive(Debug, Clone, Copy)]
pub(super) struct Part<'a> {
    pub(super) grey: &'a Grey,
    pub(super) crop: PixelBox,
    /// Columns and rows of the whole picture.
    pub(super) size: [u32; 2],
    /// Area of a pixel, m^2.
    pub(super) pixel_area: f64,
}

/// Level, tone and region as chosen.
#[derive(Debug)]
pub(super) struct Chosen {
    pub(super) level: Level,
    pub(super) classes: Classes,
    pub(super) histogram: Histogram,
    pub(super) regions: Regions,
    pub(super) label: u32,
    /// Levels of fluid and wall where they were stated, in counts.
    pub(super) stated: Option<[f64; 2]>,
    /// The list of regions, the largest first.
    pub(super) list: Vec<RegionFound>,
    /// Number of the section in it.
    pub(super) number: usize,
    pub(super) steps: Vec<Step>,
    pub(super) warnings: Vec<Warning>,
}

/// A level with what is known of its classes.
struct FirstLevel {
    classes: Classes,
    stated: Option<[f64; 2]>,
    tone: Option<Tone>,
    seed: Option<(u32, u32)>,
}

impl Part<'_> {
    fn described(&self, number: usize, blob: &Blob, tone: Tone) -> RegionFound {
        let offset = [f64::from(self.crop.x), f64::from(self.crop.y)];
        let centre = blob.centre();
        RegionFound {
            number,
            tone,
            pixels: blob.pixels,
            area: blob.pixels as f64 * self.pixel_area,
            bounds: PixelBox {
                x: self.crop.x + blob.low[0],
                y: self.crop.y + blob.low[1],
                width: blob.high[0] - blob.low[0] + 1,
                height: blob.high[1] - blob.low[1] + 1,
            },
            centre: [centre[0] + offset[0], centre[1] + offset[1]],
            touches_border: blob.touches_border,
        }
    }

    fn list(&self, regions: &Regions, tone: Tone) -> Vec<RegionFound> {
        (1..)
            .zip(&regions.blobs)
            .take(MOST_LISTED)
            .map(|(number, blob)| self.described(number, blob, tone))
            .collect()
    }

    /// A pixel of the whole picture in the part that is used.
    fn inside(
        &self,
        option: &'static str,
        x: u32,
        y: u32,
    ) -> Result<(usize, usize), MicrographProblem> {
        let column = x.checked_sub(self.crop.x).filter(|c| *c < self.crop.width);
        let row = y.checked_sub(self.crop.y).filter(|r| *r < self.crop.height);
        match (column, row) {
            (Some(column), Some(row)) => Ok((column as usize, row as usize)),
            _ => Err(MicrographProblem::OutsidePicture {
                option,
                x: u64::from(x),
                y: u64::from(y),
                width: self.crop.x + self.crop.width,
                height: self.crop.y + self.crop.height,
            }),
        }
    }

    /// Median of a patch of the whole picture, in counts.
    fn median(&self, patch: PixelBox) -> Result<f64, MicrographProblem> {
        let (x, y) = self.inside("--threshold", patch.x, patch.y)?;
        let [width, height] = self.size;
        // A square about a point may reach over the edge by its radius.
        let clipped = PixelBox {
            width: patch.width.min(width.saturating_sub(patch.x)),
            height: patch.height.min(height.saturating_sub(patch.y)),
            ..patch
        };
        check_inside(clipped, "--threshold", self.size)?;
        let rows = y..y
            .saturating_add(clipped.height as usize)
            .min(self.grey.height);
        let columns = x..x
            .saturating_add(clipped.width as usize)
            .min(self.grey.width);
        let values = rows.flat_map(|y| {
            self.grey
                .row(y)
                .get(columns.clone())
                .unwrap_or_default()
                .iter()
                .copied()
        });
        Ok(Histogram::of(values).quantile(0.5).unwrap_or(0.0))
    }
}

/// Chooses level, tone and region.
pub(super) fn choose(
    part: &Part<'_>,
    options: &MicrographOptions,
) -> Result<Chosen, MicrographProblem> {
    let grey = part.grey;
    let histogram = Histogram::of(grey.values.iter().copied());
    let first = first_level(part, options, &histogram)?;
    let at = |tone| Level {
        tone,
        counts: first.classes.threshold,
    };
    let find = |tone| Regions::find(grey, at(tone)).map_err(|_| MicrographProblem::TooNoisy);
    let mut steps = Vec::new();
    let mut warnings = Vec::new();
    let seed = match options.region {
        Region::Seed(x, y) => Some((x, y)),
        Region::Only => first.seed,
        _ => None,
    };
    let seed_pixel = seed
        .map(|(x, y)| part.inside("--region", x, y))
        .transpose()?;
    let tone_at_seed = seed_pixel.map(|(x, y)| {
        let is_dark = f64::from(grey.at(x, y)) < first.classes.threshold;
        if is_dark { Tone::Dark } else { Tone::Bright }
    });
    let (tone, regions) = if let Some(tone) = options.fluid.or(first.tone).or(tone_at_seed) {
        (tone, find(tone)?)
    } else {
        let found = clear_tone(part, find(Tone::Dark)?, find(Tone::Bright)?)?;
        warnings.push(tone_warning(found.0));
        found
    };
    let list = part.list(&regions, tone);
    let (index, blob) = match (options.region, seed.zip(seed_pixel)) {
        (_, Some(((x, y), (column, row)))) => {
            let label = regions.label_at(column, row);
            let found = label.and_then(|l| regions.blobs.iter().position(|b| b.label == l));
            let index = found.ok_or_else(|| MicrographProblem::SeedInWall {
                x,
                y,
                value: grey.to_file(f64::from(grey.at(column, row))),
            })?;
            indexed(&regions, index)
        }
        (Region::Number(number), _) => indexed(&regions, number.wrapping_sub(1)),
        (region, _) => candidate(part, &regions, tone, region == Region::Largest)?,
    }
    .ok_or_else(|| MicrographProblem::NoSuchRegion {
        number: match options.region {
            Region::Number(number) => number,
            _ => 0,
        },
        regions: list.clone(),
    })?;
    let found = part.described(index + 1, &blob, tone);
    if blob.touches_border {
        return Err(MicrographProblem::RegionCutOff {
            region: Box::new(found),
        });
    }
    steps.push(region_step(&found, &regions));
    Ok(Chosen {
        level: at(tone),
        classes: first.classes,
        histogram,
        label: blob.label,
        regions,
        stated: first.stated,
        list,
        number: index + 1,
        steps,
        warnings,
    })
}

fn indexed(regions: &Regions, index: usize) -> Option<(usize, Blob)> {
    regions.blobs.get(index).map(|blob| (index, *blob))
}

/// The level by which regions are found first.
fn first_level(
    part: &Part<'_>,
    options: &MicrographOptions,
    histogram: &Histogram,
) -> Result<FirstLevel, MicrographProblem> {
    let grey = part.grey;
    let otsu = histogram.otsu().ok_or_else(|| {
        let value = histogram.quantile(0.5).unwrap_or(0.0);
        MicrographProblem::Uniform {
            value: crate::units::format_significant(grey.to_file(value), 6),
        }
    })?;
    let parted = |value: f64| {
        histogram.parted_at(grey.counts_of(value)).ok_or_else(|| {
            MicrographProblem::ThresholdOutside {
                threshold: value,
                low: grey.to_file(histogram.quantile(0.0).unwrap_or(0.0)),
                high: grey.to_file(histogram.quantile(1.0).unwrap_or(0.0)),
            }
        })
    };
    let plain = |classes| FirstLevel {
        classes,
        stated: None,
        tone: None,
        seed: None,
    };
    match options.threshold {
        Threshold::Otsu => {
            let separation = otsu.separation();
            if separation < LEAST_SEPARATION {
                return Err(MicrographProblem::NoEdge {
                    separation,
                    needed: LEAST_SEPARATION,
                });
            }
            let steps = (otsu.means[1] - otsu.means[0]) * grey.unit / grey.step;
            if steps < LEAST_STEPS {
                return Err(MicrographProblem::TooFewSteps {
                    steps: (steps * 10.0).round() / 10.0,
                });
            }
            Ok(plain(otsu))
        }
        Threshold::Value(value) => parted(value).map(plain),
        Threshold::Share(share) => {
            let [low, high] = grey.full_scale;
            parted(low + share * (high - low)).map(plain)
        }
        Threshold::Walls(fluid, wall) => {
            let medians = [part.median(fluid)?, part.median(wall)?];
            let values = medians.map(|v| grey.to_file(v));
            let difference = (medians[0] - medians[1]).abs();
            if difference < 1.0 || difference * grey.unit < LEAST_STEPS * grey.step {
                return Err(MicrographProblem::PatchesAlike {
                    fluid: values[0],
                    wall: values[1],
                });
            }
            let tone = if medians[0] < medians[1] {
                Tone::Dark
            } else {
                Tone::Bright
            };
            if let Some(asked) = options.fluid.filter(|asked| *asked != tone) {
                return Err(MicrographProblem::ToneConflict {
                    fluid: values[0],
                    wall: values[1],
                    tone: asked,
                });
            }
            Ok(FirstLevel {
                classes: parted(grey.to_file(f64::midpoint(medians[0], medians[1])))?,
                stated: Some(medians),
                tone: Some(tone),
                seed: Some((fluid.x + fluid.width / 2, fluid.y + fluid.height / 2)),
            })
        }
    }
}

/// Regions that could be the section, the largest first.
fn candidates(regions: &Regions) -> impl Iterator<Item = (usize, &Blob)> {
    let blobs = regions.blobs.iter().enumerate();
    blobs.filter(|(_, blob)| !blob.touches_border && blob.pixels >= LEAST_PIXELS)
}

/// The tone of the fluid where it is clear, with its regions.
fn clear_tone(
    part: &Part<'_>,
    dark: Regions,
    bright: Regions,
) -> Result<(Tone, Regions), MicrographProblem> {
    let best = |regions: &Regions| candidates(regions).next().map(|(i, blob)| (i, *blob));
    match (best(&dark), best(&bright)) {
        (Some(_), None) => Ok((Tone::Dark, dark)),
        (None, Some(_)) => Ok((Tone::Bright, bright)),
        (Some((i, a)), Some((j, b))) => {
            let ratio = a.pixels as f64 / b.pixels as f64;
            if ratio >= CLEAR_RATIO {
                Ok((Tone::Dark, dark))
            } else if ratio <= 1.0 / CLEAR_RATIO {
                Ok((Tone::Bright, bright))
            } else {
                Err(MicrographProblem::ToneUnclear {
                    dark: Box::new(part.described(i + 1, &a, Tone::Dark)),
                    bright: Box::new(part.described(j + 1, &b, Tone::Bright)),
                })
            }
        }
        (None, None) => {
            let cut_off = |regions: &Regions, tone| {
                let blob = regions.blobs.first().filter(|b| b.pixels >= LEAST_PIXELS)?;
                Some(part.described(1, blob, tone))
            };
            let found = [cut_off(&dark, Tone::Dark), cut_off(&bright, Tone::Bright)];
            let largest = found.into_iter().flatten().min_by_key(|r| r.pixels);
            Err(MicrographProblem::NoRegion {
                tone: None,
                least: LEAST_PIXELS,
                cut_off: largest.map(Box::new),
            })
        }
    }
}

/// The only candidate, or the largest.
fn candidate(
    part: &Part<'_>,
    regions: &Regions,
    tone: Tone,
    takes_largest: bool,
) -> Result<Option<(usize, Blob)>, MicrographProblem> {
    let Some((index, &blob)) = candidates(regions).next() else {
        let cut_off = regions.blobs.first().filter(|b| b.pixels >= LEAST_PIXELS);
        return Err(MicrographProblem::NoRegion {
            tone: Some(tone),
            least: LEAST_PIXELS,
            cut_off: cut_off.map(|blob| Box::new(part.described(1, blob, tone))),
        });
    };
    let similar: Vec<RegionFound> = candidates(regions)
        .take_while(|(_, other)| other.pixels as f64 >= SIMILAR_SHARE * blob.pixels as f64)
        .take(MOST_LISTED)
        .map(|(i, other)| part.described(i + 1, other, tone))
        .collect();
    if similar.len() > 1 && !takes_largest {
        return Err(MicrographProblem::SeveralRegions { regions: similar });
    }
    Ok(Some((index, blob)))
}

fn tone_warning(tone: Tone) -> Warning {
    Warning {
        code: Code::ChoiceMade,
        message: format!(
            "the {} part of the picture is taken for the fluid: only there a closed region is large enough",
            tone.word()
        ),
        advice: format!("say so with --fluid-is {}", tone.word()),
        numbers: Vec::new(),
    }
}

fn region_step(found: &RegionFound, regions: &Regions) -> Step {
    let b = found.bounds;
    let touching = regions
        .blobs
        .iter()
        .filter(|blob| blob.touches_border)
        .count();
    let text = format!(
        "region {} is the section: {} pixels, {} wide and {} high, centre at {:.1},{:.1}; of {} {} regions {} \
         touch the border",
        found.number,
        found.pixels,
        b.width,
        b.height,
        found.centre[0],
        found.centre[1],
        regions.blobs.len(),
        found.tone.word(),
        touching
    );
    Step::new("region", text).with(&[
        ("region", found.number as f64),
        ("pixels", found.pixels as f64),
        ("regions", regions.blobs.len() as f64),
    ])
}
