//! From the bytes of a picture to grey values, and the numbers about its scale that stand beside them.

use std::io::Cursor;

use image::{ColorType, DynamicImage, ImageDecoder, ImageFormat, ImageReader, Limits};

use super::grey::Grey;
use super::micrograph_problem::MicrographProblem;
use super::options::{Channel, MicrographOptions};
use super::tiff_picture;
use crate::intake::step::Step;
use crate::warning::Warning;

/// Bytes a decoder may take besides the picture itself.
const SPARE_BYTES: u64 = 64 << 20;

/// A resolution as stored, pixels per metre along x and y.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Resolution {
    pub(super) source: &'static str,
    pub(super) per_metre: [f64; 2],
}

/// Texts of a picture from which scale, tilt and data bar are read.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct PictureTexts {
    /// Tag 34682.
    pub(super) tag_34682: Option<String>,
    /// Tag 34118.
    pub(super) tag_34118: Option<String>,
    /// Tag 270, or the description of a PNG.
    pub(super) description: Option<String>,
    /// Pixels per unit of the description, along x and y.
    pub(super) per_unit: Option<[f64; 2]>,
    /// Resolution with a unit.
    pub(super) resolution: Option<Resolution>,
}

/// A picture as decoded.
#[derive(Debug)]
pub(super) struct Decoded {
    pub(super) grey: Grey,
    pub(super) texts: PictureTexts,
    pub(super) steps: Vec<Step>,
    pub(super) warnings: Vec<Warning>,
}

/// Format by the first bytes.
pub(super) fn format_of(bytes: &[u8]) -> Option<ImageFormat> {
    let begins = |magic: &[u8]| bytes.starts_with(magic);
    if begins(b"\x89PNG\r\n\x1a\n") {
        Some(ImageFormat::Png)
    } else if begins(b"II*\0") || begins(b"MM\0*") || begins(b"II+\0") || begins(b"MM\0+") {
        Some(ImageFormat::Tiff)
    } else if begins(b"\xff\xd8\xff") {
        Some(ImageFormat::Jpeg)
    } else if begins(b"BM") && bytes.get(6..10) == Some(&[0; 4]) {
        Some(ImageFormat::Bmp)
    } else {
        None
    }
}

/// Whether the bytes begin like a PNG, TIFF, JPEG or BMP picture.
///
/// # Examples
/// ```
/// use etchwise::intake::is_picture;
/// assert!(is_picture(b"\x89PNG\r\n\x1a\n..."));
/// assert!(!is_picture(b"x_um,y_um\n"));
/// ```
pub fn is_picture(bytes: &[u8]) -> bool {
    format_of(bytes).is_some()
}

/// The name of a format.
fn name_of(format: ImageFormat) -> &'static str {
    match format {
        ImageFormat::Png => "PNG",
        ImageFormat::Jpeg => "JPEG",
        ImageFormat::Bmp => "BMP",
        _ => "TIFF",
    }
}

/// Decodes a picture.
pub(super) fn decode(
    bytes: &[u8],
    options: &MicrographOptions,
) -> Result<Decoded, MicrographProblem> {
    let format = format_of(bytes).ok_or(MicrographProblem::NotAPicture)?;
    if format == ImageFormat::Tiff {
        return tiff_picture::decode(bytes, options);
    }
    if let Some(page) = options.page.filter(|page| *page != 1) {
        return Err(MicrographProblem::NoPage { page, count: 1 });
    }
    let (image, what) = decode_plain(bytes, format, options.largest_pixels)?;
    let mut steps = vec![Step::new("picture", what)];
    if format == ImageFormat::Jpeg {
        steps.push(Step::new(
            "compression",
            "JPEG is lossy: its blocks of 8 x 8 pixels leave ripples beside the wall",
        ));
    }
    let grey = grey_of(image, options.channel, format, &mut steps)?;
    let texts = match format {
        ImageFormat::Png => png_texts(bytes),
        ImageFormat::Jpeg => jpeg_texts(bytes),
        _ => bmp_texts(bytes),
    };
    Ok(Decoded {
        grey,
        texts,
        steps,
        warnings: Vec::new(),
    })
}

/// Refuses a picture above the limit of pixels.
pub(super) fn check_pixels(width: u64, height: u64, limit: u64) -> Result<(), MicrographProblem> {
    let pixels = width.checked_mul(height);
    if pixels.is_none_or(|pixels| pixels > limit) {
        return Err(MicrographProblem::TooLarge {
            width,
            height,
            limit,
        });
    }
    Ok(())
}

fn decode_plain(
    bytes: &[u8],
    format: ImageFormat,
    largest_pixels: u64,
) -> Result<(DynamicImage, String), MicrographProblem> {
    let wrong = |reason: String| MicrographProblem::Undecodable {
        format: name_of(format),
        reason,
    };
    // A JPEG that breaks off is filled up with grey by its decoder, so its end is looked for.
    let tail = bytes.get(2..).unwrap_or_default();
    if format == ImageFormat::Jpeg && !tail.windows(2).rev().any(|w| w == [0xff, 0xd9]) {
        return Err(wrong("it breaks off before its end".to_owned()));
    }
    let mut reader = ImageReader::with_format(Cursor::new(bytes), format);
    let mut limits = Limits::default();
    limits.max_alloc = Some(largest_pixels.saturating_mul(8).saturating_add(SPARE_BYTES));
    reader.limits(limits);
    let decoder = reader.into_decoder().map_err(|e| wrong(e.to_string()))?;
    let (width, height) = decoder.dimensions();
    check_pixels(u64::from(width), u64::from(height), largest_pixels)?;
    let colour = decoder.color_type();
    let image = DynamicImage::from_decoder(decoder).map_err(|e| wrong(e.to_string()))?;
    let bits = u16::from(colour.bytes_per_pixel()) * 8 / u16::from(colour.channel_count().max(1));
    let what = format!(
        "{} picture of {width} x {height} pixels, {bits} bits, {}",
        name_of(format),
        if colour.has_color() {
            "coloured"
        } else {
            "grey"
        }
    );
    Ok((image, what))
}

fn grey_of(
    image: DynamicImage,
    channel: Channel,
    format: ImageFormat,
    steps: &mut Vec<Step>,
) -> Result<Grey, MicrographProblem> {
    let (width, height) = (image.width() as usize, image.height() as usize);
    let samples = usize::from(image.color().channel_count());
    if image.color().has_alpha() {
        steps.push(Step::new(
            "alpha",
            "the transparency of the picture is left out",
        ));
    }
    let is_wide = matches!(
        image.color(),
        ColorType::L16 | ColorType::La16 | ColorType::Rgb16 | ColorType::Rgba16
    );
    let values = match image {
        DynamicImage::ImageLuma16(buffer) => buffer.into_raw(),
        DynamicImage::ImageLumaA16(buffer) => one_channel(buffer.as_raw(), samples, channel),
        DynamicImage::ImageRgb16(buffer) => one_channel(buffer.as_raw(), samples, channel),
        DynamicImage::ImageRgba16(buffer) => one_channel(buffer.as_raw(), samples, channel),
        DynamicImage::ImageLuma8(buffer) => one_channel(buffer.as_raw(), samples, channel),
        DynamicImage::ImageLumaA8(buffer) => one_channel(buffer.as_raw(), samples, channel),
        DynamicImage::ImageRgb8(buffer) => one_channel(buffer.as_raw(), samples, channel),
        DynamicImage::ImageRgba8(buffer) => one_channel(buffer.as_raw(), samples, channel),
        other => {
            return Err(MicrographProblem::UnsupportedPixels {
                format: name_of(format),
                what: format!("pixels of the kind {:?}", other.color()),
            });
        }
    };
    if samples >= 3 {
        steps.push(channel_step(channel));
    }
    Ok(Grey {
        width,
        height,
        values,
        offset: 0.0,
        unit: count_size(samples, channel, is_wide),
        full_scale: [0.0, if is_wide { 65535.0 } else { 255.0 }],
        step: 1.0,
    })
}

/// What was taken of a coloured picture.
pub(super) fn channel_step(channel: Channel) -> Step {
    let text = match channel {
        Channel::Grey => "grey is the mean of red, green and blue",
        Channel::Red => "the red channel is used",
        Channel::Green => "the green channel is used",
        Channel::Blue => "the blue channel is used",
    };
    Step::new("channel", text)
}

/// Value of the file for one count: sums of three 8-bit channels count in thirds.
pub(super) fn count_size(samples: usize, channel: Channel, is_wide: bool) -> f64 {
    if samples >= 3 && channel == Channel::Grey && !is_wide {
        1.0 / 3.0
    } else {
        1.0
    }
}

/// One count for each pixel: the grey itself, one channel, the sum of three 8-bit channels, or the mean of three
/// 16-bit ones.
pub(super) fn one_channel<T: Copy + Into<u32>>(
    raw: &[T],
    samples: usize,
    channel: Channel,
) -> Vec<u16> {
    let is_wide = size_of::<T>() > 1;
    let pick = match (samples, channel) {
        (0..=2, _) | (_, Channel::Red) => 0,
        (_, Channel::Green) => 1,
        (_, Channel::Blue) => 2,
        (_, Channel::Grey) => {
            let sum = |pixel: &[T]| pixel.iter().take(3).map(|&v| v.into()).sum::<u32>();
            let divide = if is_wide { 3 } else { 1 };
            return raw
                .chunks_exact(samples)
                .map(|pixel| ((sum(pixel) + divide / 2) / divide) as u16)
                .collect();
        }
    };
    raw.chunks_exact(samples.max(1))
        .map(|pixel| pixel.get(pick).map_or(0, |&v| v.into() as u16))
        .collect()
}

fn big_endian(bytes: Option<&[u8]>) -> Option<u32> {
    Some(u32::from_be_bytes(bytes?.try_into().ok()?))
}

/// Resolution and description of a PNG: chunks pHYs and tEXt, by the PNG specification.
fn png_texts(bytes: &[u8]) -> PictureTexts {
    let mut texts = PictureTexts::default();
    let mut rest = bytes.get(8..).unwrap_or_default();
    while let Some(length) = big_endian(rest.get(..4)) {
        let length = length as usize;
        let (Some(kind), Some(data)) = (rest.get(4..8), rest.get(8..length.saturating_add(8)))
        else {
            break;
        };
        match kind {
            b"pHYs" => {
                let per_metre = [big_endian(data.get(..4)), big_endian(data.get(4..8))];
                if let ([Some(x), Some(y)], Some(1)) = (per_metre, data.get(8))
                    && x > 0
                    && y > 0
                {
                    texts.resolution = Some(Resolution {
                        source: "PNG pHYs",
                        per_metre: [f64::from(x), f64::from(y)],
                    });
                }
            }
            b"tEXt" if data.starts_with(b"Description\0") => {
                let text = data.get(12..).unwrap_or_default();
                texts.description = Some(text.iter().map(|&b| char::from(b)).collect());
            }
            _ => {}
        }
        rest = rest.get(length.saturating_add(12)..).unwrap_or_default();
    }
    texts
}

/// Resolution of a JPEG with an application segment 0 (JFIF).
fn jpeg_texts(bytes: &[u8]) -> PictureTexts {
    let mut texts = PictureTexts::default();
    let head = bytes.get(2..20).unwrap_or_default();
    if head.starts_with(&[0xff, 0xe0]) && head.get(4..9) == Some(b"JFIF\0") {
        let two = |at: usize| {
            let pair: Option<[u8; 2]> = head.get(at..at + 2).and_then(|b| b.try_into().ok());
            pair.map_or(0.0, |pair| f64::from(u16::from_be_bytes(pair)))
        };
        let metre = match head.get(11) {
            Some(1) => 1.0 / 0.0254,
            Some(2) => 100.0,
            _ => return texts,
        };
        let per_metre = [two(12) * metre, two(14) * metre];
        if per_metre.iter().all(|v| *v > 0.0) {
            texts.resolution = Some(Resolution {
                source: "JPEG density",
                per_metre,
            });
        }
    }
    texts
}

/// Resolution of a BMP, pixels per metre in its header.
fn bmp_texts(bytes: &[u8]) -> PictureTexts {
    let four = |at: usize| {
        let four: Option<[u8; 4]> = bytes.get(at..at + 4).and_then(|b| b.try_into().ok());
        four.map_or(0.0, |four| f64::from(i32::from_le_bytes(four)))
    };
    let per_metre = [four(38), four(42)];
    let is_there =
        bytes.get(14).is_some_and(|size| *size >= 40) && per_metre.iter().all(|v| *v > 0.0);
    PictureTexts {
        resolution: is_there.then_some(Resolution {
            source: "BMP pixels per metre",
            per_metre,
        }),
        ..PictureTexts::default()
    }
}
