//! Rendering a [`Drawing`] as PNG, with its title in the file's text chunk.

use image::codecs::png::{CompressionType, FilterType, PngEncoder};
use image::{ExtendedColorType, ImageEncoder};
use noto_sans_mono_bitmap::{FontWeight, RasterHeight, get_raster};
use tiny_skia::{
    FillRule, IntSize, LineCap, LineJoin, Mask, Paint, Path, PathBuilder, Pixmap, PixmapPaint,
    Rect, Stroke, Transform,
};

use super::drawing::{Anchor, Colour, Drawing, Item, PAPER, Raster, TextSize};
use super::numbers::one_line;
use crate::geometry::Point;

/// Share of a line's height that is above the base line in the built-in font.
const ASCENT_SHARE: f64 = 0.785;

/// Why a PNG could not be made.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum PngError {
    /// The size is zero or too large.
    #[error("a picture of {width} x {height} pixels cannot be made")]
    Size {
        /// Pixels across.
        width: u32,
        /// Pixels down.
        height: u32,
    },
    /// The encoder refused.
    #[error("the picture could not be encoded: {source}")]
    Encoder {
        /// What the encoder says.
        #[from]
        source: image::ImageError,
    },
}

/// The drawing as the bytes of a PNG file.
///
/// # Errors
/// [`PngError`] for an impossible size or when the encoder refuses.
pub fn to_png(drawing: &Drawing) -> Result<Vec<u8>, PngError> {
    let (width, height) = (drawing.width, drawing.height);
    let mut canvas = Pixmap::new(width, height).ok_or(PngError::Size { width, height })?;
    canvas.fill(skia_colour(PAPER, 1.0));
    for item in &drawing.items {
        draw(&mut canvas, item)?;
    }
    let raster = Raster {
        columns: width as usize,
        rows: height as usize,
        rgb: canvas
            .data()
            .chunks_exact(4)
            .flat_map(|p| p.iter().take(3))
            .copied()
            .collect(),
    };
    let texts = [
        ("Title", drawing.title.as_str()),
        ("Description", drawing.description.as_str()),
        ("Software", concat!("etchwise ", env!("CARGO_PKG_VERSION"))),
    ];
    Ok(with_text(encode_rgb(&raster)?, &texts))
}

/// A raster as a PNG file of three bytes a pixel, or of one where all are grey.
pub(crate) fn encode_rgb(raster: &Raster) -> Result<Vec<u8>, PngError> {
    let (width, height) = (raster.columns as u32, raster.rows as u32);
    if width == 0 || height == 0 || raster.rgb.len() != 3 * raster.columns * raster.rows {
        return Err(PngError::Size { width, height });
    }
    let mut bytes = Vec::new();
    let encoder =
        PngEncoder::new_with_quality(&mut bytes, CompressionType::Default, FilterType::Adaptive);
    let is_grey = |p: &[u8]| p.iter().all(|v| p.first() == Some(v));
    if raster.rgb.chunks_exact(3).all(is_grey) {
        let grey: Vec<u8> = raster.rgb.iter().copied().step_by(3).collect();
        encoder.write_image(&grey, width, height, ExtendedColorType::L8)?;
    } else {
        encoder.write_image(&raster.rgb, width, height, ExtendedColorType::Rgb8)?;
    }
    Ok(bytes)
}

fn draw(canvas: &mut Pixmap, item: &Item) -> Result<(), PngError> {
    match item {
        Item::Lines {
            lines,
            closed,
            colour,
            width,
            opacity,
        } => {
            if let Some(path) = path(lines, *closed) {
                let stroke = Stroke {
                    width: *width as f32,
                    line_cap: LineCap::Round,
                    line_join: LineJoin::Round,
                    ..Stroke::default()
                };
                canvas.stroke_path(
                    &path,
                    &paint(*colour, *opacity),
                    &stroke,
                    Transform::identity(),
                    None,
                );
            }
        }
        Item::Area { loops, fill } => {
            if let Some(path) = path(loops, true) {
                canvas.fill_path(
                    &path,
                    &paint(*fill, 1.0),
                    FillRule::EvenOdd,
                    Transform::identity(),
                    None,
                );
            }
        }
        Item::Image { raster, at, clip } => draw_image(canvas, raster, *at, clip)?,
        Item::Text {
            at,
            anchor,
            size,
            colour,
            text,
        } => draw_text(
            canvas,
            &one_line(text),
            start_of(*at, *anchor, *size, text),
            (*size, *colour),
        ),
    }
    Ok(())
}

fn skia_colour([r, g, b]: Colour, opacity: f64) -> tiny_skia::Color {
    let alpha = (255.0 * opacity.clamp(0.0, 1.0)).round() as u8;
    tiny_skia::Color::from_rgba8(r, g, b, alpha)
}

fn paint(colour: Colour, opacity: f64) -> Paint<'static> {
    let mut paint = Paint {
        anti_alias: true,
        ..Paint::default()
    };
    paint.set_color(skia_colour(colour, opacity));
    paint
}

fn path(lines: &[Vec<Point>], closed: bool) -> Option<Path> {
    let mut builder = PathBuilder::new();
    for line in lines {
        for (i, p) in line.iter().enumerate() {
            let (x, y) = (p[0] as f32, p[1] as f32);
            if i == 0 {
                builder.move_to(x, y);
            } else {
                builder.line_to(x, y);
            }
        }
        if closed && !line.is_empty() {
            builder.close();
        }
    }
    builder.finish()
}

fn draw_image(
    canvas: &mut Pixmap,
    raster: &Raster,
    at: [i32; 2],
    clip: &[Vec<Point>],
) -> Result<(), PngError> {
    let (width, height) = (raster.columns as u32, raster.rows as u32);
    let rgba = raster
        .rgb
        .chunks_exact(3)
        .flat_map(|p| p.iter().copied().chain(std::iter::once(255)))
        .collect();
    let image = IntSize::from_wh(width, height)
        .and_then(|size| Pixmap::from_vec(rgba, size))
        .ok_or(PngError::Size { width, height })?;
    let mask = path(clip, true).and_then(|path| {
        let mut mask = Mask::new(canvas.width(), canvas.height())?;
        mask.fill_path(&path, FillRule::EvenOdd, true, Transform::identity());
        Some(mask)
    });
    let [x, y] = at;
    canvas.draw_pixmap(
        x,
        y,
        image.as_ref(),
        &PixmapPaint::default(),
        Transform::identity(),
        mask.as_ref(),
    );
    Ok(())
}

/// Left end of a text, whole pixels, and its upper edge.
fn start_of(at: Point, anchor: Anchor, size: TextSize, text: &str) -> [i32; 2] {
    let shift = match anchor {
        Anchor::Start => 0.0,
        Anchor::Middle => 0.5 * size.width(text),
        Anchor::End => size.width(text),
    };
    let above = (ASCENT_SHARE * size.line_height()).round();
    [
        (at[0] - shift).round() as i32,
        (at[1] - above).round() as i32,
    ]
}

fn draw_text(
    canvas: &mut Pixmap,
    text: &str,
    [x, y]: [i32; 2],
    (size, colour): (TextSize, Colour),
) {
    let height = match size {
        TextSize::Small => RasterHeight::Size16,
        TextSize::Medium => RasterHeight::Size20,
        TextSize::Large => RasterHeight::Size24,
    };
    let mut left = x;
    for c in text.chars() {
        let glyph = get_raster(drawable(c), FontWeight::Regular, height)
            .or_else(|| get_raster('?', FontWeight::Regular, height));
        let Some(glyph) = glyph else { continue };
        for (row, line) in (0_i32..).zip(glyph.rows()) {
            for (column, &cover) in (0_i32..).zip(line) {
                if cover > 0 {
                    blend(canvas, [left + column, y + row], colour, cover);
                }
            }
        }
        left += size.advance() as i32;
    }
}

/// The nearest character of the built-in font for dashes, quotes and the Greek mu.
fn drawable(c: char) -> char {
    match c {
        '\u{2010}'..='\u{2015}' | '\u{2212}' => '-',
        '\u{2018}' | '\u{2019}' => '\'',
        '\u{201c}' | '\u{201d}' => '"',
        '\u{3bc}' => '\u{b5}',
        other => other,
    }
}

/// Covers one pixel in part; outside the canvas nothing happens.
fn blend(canvas: &mut Pixmap, [x, y]: [i32; 2], colour: Colour, cover: u8) {
    if let Some(rect) = Rect::from_xywh(x as f32, y as f32, 1.0, 1.0) {
        let mut paint = paint(colour, f64::from(cover) / 255.0);
        paint.anti_alias = false;
        canvas.fill_rect(rect, &paint, Transform::identity(), None);
    }
}

/// The file with international text chunks (UTF-8) put behind its header chunk.
fn with_text(png: Vec<u8>, texts: &[(&str, &str)]) -> Vec<u8> {
    // Signature 8 bytes, header chunk 4 + 4 + 13 + 4 bytes: PNG specification, second edition, clauses 5.2 and 11.2.2.
    let header_end = 33;
    let Some((header, rest)) = png.split_at_checked(header_end) else {
        return png;
    };
    let mut out = header.to_vec();
    for (key, text) in texts {
        let mut body = b"iTXt".to_vec();
        body.extend(key.as_bytes());
        // End of keyword, not compressed, no language, no translated keyword.
        body.extend([0, 0, 0, 0, 0]);
        body.extend(one_line(text).as_bytes());
        out.extend((body.len() as u32 - 4).to_be_bytes());
        out.extend(&body);
        out.extend(crc32(&body).to_be_bytes());
    }
    out.extend(rest);
    out
}

/// The cyclic redundancy code of PNG chunks (ISO 3309, polynomial 0xEDB88320).
fn crc32(bytes: &[u8]) -> u32 {
    let mut crc = u32::MAX;
    for &byte in bytes {
        crc ^= u32::from(byte);
        for _ in 0..8 {
            let low = crc & 1;
            crc >>= 1;
            if low == 1 {
                crc ^= 0xEDB8_8320;
            }
        }
    }
    !crc
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn crc32_gives_the_catalogued_check_value() {
        // CRC-32/ISO-HDLC of the text 123456789, check value 0xCBF43926, from memory.
        assert_eq!(crc32(b"123456789"), 0xCBF4_3926);
    }

    #[test]
    fn text_and_area_land_where_they_are_put() {
        let drawing = Drawing {
            width: 60,
            height: 40,
            title: "t".to_owned(),
            description: "d".to_owned(),
            items: vec![
                Item::Area {
                    loops: vec![vec![[10.0, 10.0], [20.0, 10.0], [20.0, 20.0], [10.0, 20.0]]],
                    fill: [255, 0, 0],
                },
                Item::Text {
                    at: [58.0, 35.0],
                    anchor: Anchor::End,
                    size: TextSize::Small,
                    colour: [0, 0, 0],
                    text: "\u{b5}m".to_owned(),
                },
            ],
        };
        let bytes = to_png(&drawing).unwrap();
        let image = image::load_from_memory(&bytes).unwrap().to_rgb8();
        assert_eq!(image.get_pixel(15, 15).0, [255, 0, 0]);
        assert_eq!(image.get_pixel(25, 15).0, [255, 255, 255]);
        let dark: Vec<(u32, u32)> = image
            .enumerate_pixels()
            .filter(|(_, _, p)| p.0.iter().all(|&v| v < 100))
            .map(|(x, y, _)| (x, y))
            .collect();
        assert!(dark.len() > 10);
        assert!(
            dark.iter()
                .all(|&(x, y)| (44..58).contains(&x) && (22..39).contains(&y)),
            "{dark:?}"
        );
    }
}
