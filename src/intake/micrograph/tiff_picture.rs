//! Pixels of a TIFF file: one page, grey, coloured or with a palette, as grey values.

use std::borrow::Cow;
use std::io::Cursor;

use tiff::ColorType;
use tiff::decoder::{Decoder, DecodingResult, Limits};

use super::decode::{
    Decoded, PictureTexts, Resolution, channel_step, check_pixels, count_size, one_channel,
};
use super::grey::Grey;
use super::micrograph_problem::MicrographProblem;
use super::options::{Channel, MicrographOptions};
use super::tiff_tags::{Directory, directories};
use crate::intake::step::Step;
use crate::warning::{Code, Warning};

/// Most bytes a pixel may take in memory.
const MOST_BYTES: u64 = 8;
/// Largest value of one tag, bytes.
const LARGEST_TAG: usize = 32 << 20;
/// Tag numbers of the TIFF 6.0 specification.
const SUBFILE: u16 = 254;
const WIDTH: u16 = 256;
const HEIGHT: u16 = 257;
const BITS: u16 = 258;
const PHOTOMETRIC: u16 = 262;
const DESCRIPTION: u16 = 270;
const ORIENTATION: u16 = 274;
const SAMPLES: u16 = 277;
const RESOLUTION: [u16; 2] = [282, 283];
const RESOLUTION_UNIT: u16 = 296;
const COLOUR_MAP: u16 = 320;
/// Values of the photometric tag.
const WHITE_IS_ZERO: u64 = 0;
const BLACK_IS_ZERO: u16 = 1;
const PALETTE: u64 = 3;

fn undecodable<T: std::fmt::Display>(reason: T) -> MicrographProblem {
    MicrographProblem::Undecodable {
        format: "TIFF",
        reason: format!("{reason}"),
    }
}

fn unsupported(what: String) -> MicrographProblem {
    MicrographProblem::UnsupportedPixels {
        format: "TIFF",
        what,
    }
}

/// Decodes the page asked for.
pub(super) fn decode(
    bytes: &[u8],
    options: &MicrographOptions,
) -> Result<Decoded, MicrographProblem> {
    let found = directories(bytes).filter(|found| !found.pages.is_empty());
    let found = found.ok_or_else(|| undecodable("it has no readable page"))?;
    let mut warnings = Vec::new();
    if found.is_broken {
        warnings.push(Warning {
            code: Code::FileDefect,
            message: format!(
                "the chain of pages is broken or turns back on itself after page {}",
                found.pages.len()
            ),
            advice: "export the picture again if pages are missing".to_owned(),
            numbers: vec![("pages", found.pages.len() as f64)],
        });
    }
    let (number, page) = chosen_page(&found.pages, options.page)?;
    let (width, height) = (
        page.whole(WIDTH).unwrap_or(0),
        page.whole(HEIGHT).unwrap_or(0),
    );
    check_pixels(width, height, options.largest_pixels)?;
    let is_palette = page.whole(PHOTOMETRIC) == Some(PALETTE);
    let change = is_palette.then_some((PHOTOMETRIC, BLACK_IS_ZERO));
    let file = if number > 1 || is_palette {
        Cow::Owned(page.as_first_page(bytes, change))
    } else {
        Cow::Borrowed(bytes)
    };
    let mut steps = Vec::new();
    if found.pages.len() > 1 {
        steps.push(Step::new(
            "page",
            format!("page {number} of {} is used", found.pages.len()),
        ));
    }
    let mut raw = read_pixels(&file, width, height)?;
    drop(file);
    let palette = is_palette
        .then(|| Palette::new(page, options.channel))
        .transpose()?;
    let grey = raw.grey(options.channel, palette.as_ref(), &mut steps)?;
    note_page(page, &grey, raw.samples, options.channel, &mut steps);
    Ok(Decoded {
        grey,
        texts: texts(page),
        steps,
        warnings,
    })
}

/// Page number, from 1, and the page.
fn chosen_page<'a, 'b>(
    pages: &'a [Directory<'b>],
    asked: Option<usize>,
) -> Result<(usize, &'a Directory<'b>), MicrographProblem> {
    let number = asked.map_or_else(|| only_page(pages), Ok)?;
    let page = number.checked_sub(1).and_then(|index| pages.get(index));
    let page = page.ok_or(MicrographProblem::NoPage {
        page: number,
        count: pages.len(),
    })?;
    Ok((number, page))
}

/// The only page that is no reduction of another.
fn only_page(pages: &[Directory<'_>]) -> Result<usize, MicrographProblem> {
    let full: Vec<usize> = (1..)
        .zip(pages)
        .filter(|(_, page)| page.whole(SUBFILE).unwrap_or(0) & 1 == 0)
        .map(|(number, _)| number)
        .collect();
    match *full.as_slice() {
        [] => Ok(1),
        [only] => Ok(only),
        _ => Err(MicrographProblem::SeveralPages {
            pages: (1..).zip(pages).take(20).map(page_text).collect(),
        }),
    }
}

fn page_text((number, page): (usize, &Directory<'_>)) -> String {
    format!(
        "page {number}: {} x {} pixels, {} bits, {} samples",
        page.whole(WIDTH).unwrap_or(0),
        page.whole(HEIGHT).unwrap_or(0),
        page.whole(BITS).unwrap_or(1),
        page.whole(SAMPLES).unwrap_or(1)
    )
}

/// Pixels as the decoder gave them.
struct Raw {
    width: usize,
    height: usize,
    samples: usize,
    bits: u8,
    values: DecodingResult,
}

fn read_pixels(file: &[u8], width: u64, height: u64) -> Result<Raw, MicrographProblem> {
    let pixels = usize::try_from(width.saturating_mul(height)).unwrap_or(usize::MAX);
    let mut limits = Limits::default();
    limits.decoding_buffer_size = pixels.saturating_mul(MOST_BYTES as usize);
    limits.intermediate_buffer_size = limits.decoding_buffer_size.max(LARGEST_TAG);
    limits.ifd_value_size = LARGEST_TAG;
    let mut decoder = Decoder::new(Cursor::new(file))
        .map_err(undecodable)?
        .with_limits(limits);
    if decoder.dimensions().map_err(undecodable)? != (width as u32, height as u32) {
        return Err(undecodable("its dimensions contradict each other"));
    }
    let colour = decoder.colortype().map_err(undecodable)?;
    let (bits, samples) = match colour {
        ColorType::Gray(bits) => (bits, 1),
        ColorType::GrayA(bits) => (bits, 2),
        ColorType::RGB(bits) => (bits, 3),
        ColorType::RGBA(bits) => (bits, 4),
        ColorType::Multiband {
            bit_depth,
            num_samples,
        } => (bit_depth, usize::from(num_samples)),
        other => return Err(unsupported(format!("pixels of the kind {other:?}"))),
    };
    let is_whole = matches!(bits, 8 | 16 | 32 | 64);
    if !(is_whole || samples == 1 && matches!(bits, 1 | 2 | 4)) {
        return Err(unsupported(format!("{bits} bits per sample")));
    }
    let mut values = DecodingResult::U8(Vec::new());
    let layout = decoder
        .read_image_to_buffer(&mut values)
        .map_err(undecodable)?;
    if layout.planes > 1 {
        if values.as_buffer(0).as_bytes().len() < layout.complete_len {
            return Err(undecodable("its planes are too large together"));
        }
        values = interleaved(values, layout.planes)?;
    }
    Ok(Raw {
        width: width as usize,
        height: height as usize,
        samples,
        bits,
        values,
    })
}

/// Planes after each other as samples beside each other.
fn interleaved(values: DecodingResult, planes: usize) -> Result<DecodingResult, MicrographProblem> {
    fn mixed<T: Copy>(raw: &[T], planes: usize) -> Vec<T> {
        let pixels = raw.len() / planes.max(1);
        (0..pixels)
            .flat_map(|i| (0..planes).filter_map(move |plane| raw.get(plane * pixels + i).copied()))
            .collect()
    }
    match values {
        DecodingResult::U8(raw) => Ok(DecodingResult::U8(mixed(&raw, planes))),
        DecodingResult::U16(raw) => Ok(DecodingResult::U16(mixed(&raw, planes))),
        _ => Err(unsupported(
            "planes of another kind than 8 or 16 bits".to_owned(),
        )),
    }
}

/// Bits of a row packed into bytes, one count each.
fn unpacked(raw: &[u8], width: usize, bits: u8) -> Vec<u16> {
    let stride = (width * usize::from(bits)).div_ceil(8);
    let per_byte = usize::from(8 / bits.max(1));
    let mask = (1_u16 << bits) - 1;
    raw.chunks(stride.max(1))
        .flat_map(|row| {
            (0..width).map(move |x| {
                let byte = row.get(x / per_byte).copied().unwrap_or(0);
                let shift = 8 - usize::from(bits) * (x % per_byte + 1);
                (u16::from(byte) >> shift) & mask
            })
        })
        .collect()
}

impl Raw {
    /// As counts.
    fn grey(
        &mut self,
        channel: Channel,
        palette: Option<&Palette>,
        steps: &mut Vec<Step>,
    ) -> Result<Grey, MicrographProblem> {
        let (samples, bits) = (self.samples, self.bits);
        let full = if bits < 16 {
            f64::from((1_u32 << bits) - 1)
        } else {
            65535.0
        };
        let mut grey = Grey {
            width: self.width,
            height: self.height,
            values: Vec::new(),
            offset: 0.0,
            unit: 1.0,
            full_scale: [0.0, full],
            step: 1.0,
        };
        match std::mem::replace(&mut self.values, DecodingResult::U8(Vec::new())) {
            DecodingResult::U8(raw) if bits < 8 => grey.values = unpacked(&raw, self.width, bits),
            DecodingResult::U8(raw) => {
                grey.values = one_channel(&raw, samples, channel);
                grey.unit = count_size(samples, channel, false);
            }
            DecodingResult::U16(raw) if samples == 1 => grey.values = raw,
            DecodingResult::U16(raw) => grey.values = one_channel(&raw, samples, channel),
            _ if palette.is_some() || samples >= 3 => {
                return Err(unsupported(format!("colours of {bits} bits per sample")));
            }
            DecodingResult::I8(raw) => {
                grey.offset = f64::from(i8::MIN);
                grey.values = raw.chunks(samples).filter_map(shifted_8).collect();
                grey.full_scale = [-128.0, 127.0];
            }
            DecodingResult::I16(raw) => {
                grey.offset = f64::from(i16::MIN);
                grey.values = raw.chunks(samples).filter_map(shifted_16).collect();
                grey.full_scale = [-32768.0, 32767.0];
            }
            DecodingResult::U32(raw) => stretch(&raw, samples, f64::from, &mut grey)?,
            DecodingResult::I32(raw) => stretch(&raw, samples, f64::from, &mut grey)?,
            DecodingResult::U64(raw) => stretch(&raw, samples, |v| v as f64, &mut grey)?,
            DecodingResult::I64(raw) => stretch(&raw, samples, |v| v as f64, &mut grey)?,
            DecodingResult::F16(raw) => {
                stretch(&raw, samples, |v| f64::from(v.to_f32()), &mut grey)?;
            }
            DecodingResult::F32(raw) => stretch(&raw, samples, f64::from, &mut grey)?,
            DecodingResult::F64(raw) => stretch(&raw, samples, |v| v, &mut grey)?,
        }
        if grey.values.len() != self.width * self.height {
            return Err(undecodable("it has fewer pixels than it states"));
        }
        if let Some(palette) = palette {
            palette.apply(&mut grey, steps);
        }
        Ok(grey)
    }
}

fn shifted_8(pixel: &[i8]) -> Option<u16> {
    pixel
        .first()
        .map(|&v| (i16::from(v) - i16::from(i8::MIN)) as u16)
}

fn shifted_16(pixel: &[i16]) -> Option<u16> {
    pixel
        .first()
        .map(|&v| (i32::from(v) - i32::from(i16::MIN)) as u16)
}

/// Values of a wider kind as counts from the smallest to the largest.
fn stretch<T: Copy>(
    raw: &[T],
    samples: usize,
    value: impl Fn(T) -> f64,
    grey: &mut Grey,
) -> Result<(), MicrographProblem> {
    let pixels = || {
        raw.chunks(samples.max(1))
            .filter_map(|p| p.first().map(|&v| value(v)))
    };
    let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
    for v in pixels() {
        if !v.is_finite() {
            return Err(unsupported(
                "pixels that are not numbers or infinite".to_owned(),
            ));
        }
        low = low.min(v);
        high = high.max(v);
    }
    let unit = (high - low) / 65535.0;
    grey.offset = low;
    grey.unit = if unit > 0.0 && unit.is_finite() {
        unit
    } else {
        1.0
    };
    grey.full_scale = [low, high];
    grey.step = 0.0;
    let (offset, unit) = (grey.offset, grey.unit);
    grey.values = pixels()
        .map(|v| ((v - offset) / unit).round() as u16)
        .collect();
    Ok(())
}

/// The greys of a palette, and which of its colours are not grey.
struct Palette {
    greys: Vec<u16>,
    is_coloured: Vec<bool>,
    /// Value of the file for one count of `greys`.
    unit: f64,
    full: f64,
}

impl Palette {
    fn new(page: &Directory<'_>, channel: Channel) -> Result<Self, MicrographProblem> {
        let map = page.wholes(COLOUR_MAP);
        let size = map.len() / 3;
        if size == 0 || !map.len().is_multiple_of(3) {
            return Err(undecodable("its palette is missing or broken"));
        }
        let mixed: Vec<u16> = (0..size)
            .flat_map(|i| [0, 1, 2].map(|plane| map.get(plane * size + i).copied().unwrap_or(0)))
            .map(|v| v as u16)
            .collect();
        // Palettes have 16 bits; most hold 8-bit greys, times 257 or, against the specification, as they are.
        let largest = mixed.iter().copied().max().unwrap_or(0);
        let (unit, full) = if largest < 256 {
            (1.0, 255.0)
        } else if mixed.iter().all(|v| v % 257 == 0) {
            (1.0 / 257.0, 255.0)
        } else {
            (1.0, 65535.0)
        };
        Ok(Self {
            greys: one_channel(&mixed, 3, channel),
            is_coloured: mixed
                .chunks_exact(3)
                .map(|c| c.iter().any(|v| v != &c[0]))
                .collect(),
            unit,
            full,
        })
    }

    fn apply(&self, grey: &mut Grey, steps: &mut Vec<Step>) {
        let mut coloured = 0_u64;
        for value in &mut grey.values {
            let index = usize::from(*value);
            coloured += u64::from(self.is_coloured.get(index).copied().unwrap_or(false));
            *value = self.greys.get(index).copied().unwrap_or(0);
        }
        grey.unit = self.unit;
        grey.full_scale = [0.0, self.full];
        let text = format!(
            "pixels are numbers in a palette of {} colours; {coloured} pixels have one that is not grey",
            self.greys.len()
        );
        steps.push(Step::new("palette", text).with(&[("coloured_pixels", coloured as f64)]));
    }
}

/// Says what the page is.
fn note_page(
    page: &Directory<'_>,
    grey: &Grey,
    samples: usize,
    channel: Channel,
    steps: &mut Vec<Step>,
) {
    let [low, high] = grey.full_scale;
    let text = format!(
        "TIFF picture of {} x {} pixels, {} bits, full scale {low} to {high}",
        grey.width,
        grey.height,
        page.whole(BITS).unwrap_or(1)
    );
    steps.insert(0, Step::new("picture", text));
    if samples >= 3 {
        steps.push(channel_step(channel));
    } else if samples > 1 {
        steps.push(Step::new(
            "channel",
            "the first of the samples of a pixel is used",
        ));
    }
    if page.whole(PHOTOMETRIC) == Some(WHITE_IS_ZERO) {
        steps.push(Step::new(
            "inverted",
            "the file stores white as 0: values are turned round",
        ));
    }
    if let Some(orientation) = page.whole(ORIENTATION).filter(|o| (2..=8).contains(o)) {
        let text = format!(
            "the picture is taken as stored; the file asks to show it turned or mirrored (orientation {orientation})"
        );
        steps.push(Step::new("orientation", text));
    }
}

/// Texts and resolution of a page.
fn texts(page: &Directory<'_>) -> PictureTexts {
    let per_unit = RESOLUTION.map(|tag| page.fraction(tag));
    let per_unit = match per_unit {
        [Some(x), Some(y)] => Some([x, y]),
        [Some(x), None] => Some([x, x]),
        _ => None,
    };
    // Without the tag the unit is the inch, by the specification.
    let unit = match page.whole(RESOLUTION_UNIT) {
        None | Some(2) => Some(("TIFF resolution per inch", 0.0254)),
        Some(3) => Some(("TIFF resolution per cm", 0.01)),
        _ => None,
    };
    let resolution = per_unit
        .zip(unit)
        .map(|(per_unit, (source, metres))| Resolution {
            source,
            per_metre: per_unit.map(|v| v / metres),
        });
    PictureTexts {
        tag_34682: page.text(34682),
        tag_34118: page.text(34118),
        description: page.text(DESCRIPTION),
        per_unit,
        resolution,
    }
}
