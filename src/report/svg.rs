//! Rendering a [`Drawing`] as SVG text: one self-contained file, text as text, images embedded.

use std::fmt::Write as _;

use super::drawing::{Anchor, Drawing, Item, Raster, TextSize};
use super::numbers::one_line;
use super::png::{PngError, encode_rgb};
use crate::geometry::Point;

/// Fonts of constant width, tried in this order.
const FONTS: &str = "'Noto Sans Mono','DejaVu Sans Mono','Liberation Mono',monospace";

/// Width of a character of these fonts, in units of the font size.
const ADVANCE_PER_SIZE: f64 = 0.6;

/// The drawing as SVG, with title and description for readers of text.
///
/// # Errors
/// [`PngError`] when an embedded image cannot be encoded.
pub fn to_svg(drawing: &Drawing) -> Result<String, PngError> {
    let (w, h) = (drawing.width, drawing.height);
    let mut out = format!(
        "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<svg xmlns=\"http://www.w3.org/2000/svg\" \
         xmlns:xlink=\"http://www.w3.org/1999/xlink\" width=\"{w}\" height=\"{h}\" viewBox=\"0 0 {w} {h}\" \
         role=\"img\" aria-labelledby=\"title desc\">\n<title id=\"title\">{}</title>\n<desc id=\"desc\">{}</desc>\n\
         <rect width=\"{w}\" height=\"{h}\" fill=\"#ffffff\"/>\n",
        escaped(&drawing.title),
        escaped(&drawing.description),
    );
    for (index, item) in drawing.items.iter().enumerate() {
        push_item(&mut out, index, item)?;
    }
    out.push_str("</svg>\n");
    Ok(out)
}

fn push_item(out: &mut String, index: usize, item: &Item) -> Result<(), PngError> {
    match item {
        Item::Lines {
            lines,
            closed,
            colour,
            width,
            opacity,
        } => {
            let _ = writeln!(
                out,
                "<path d=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"{width}\" stroke-opacity=\"{opacity}\" \
                 stroke-linejoin=\"round\" stroke-linecap=\"round\"/>",
                path(lines, *closed),
                hex(*colour),
            );
        }
        Item::Area { loops, fill } => {
            let _ = writeln!(
                out,
                "<path d=\"{}\" fill=\"{}\" fill-rule=\"evenodd\"/>",
                path(loops, true),
                hex(*fill),
            );
        }
        Item::Image { raster, at, clip } => push_image(out, index, raster, (*at, clip))?,
        Item::Text {
            at,
            anchor,
            size,
            colour,
            text,
        } => {
            let _ = writeln!(
                out,
                "<text x=\"{}\" y=\"{}\" font-family=\"{FONTS}\" font-size=\"{:.2}\" text-anchor=\"{}\" fill=\"{}\" \
                 xml:space=\"preserve\">{}</text>",
                coordinate(at[0]),
                coordinate(at[1]),
                font_size(*size),
                anchor_name(*anchor),
                hex(*colour),
                escaped(text),
            );
        }
    }
    Ok(())
}

/// An embedded image; position and clip come together since both belong to the place.
fn push_image(
    out: &mut String,
    index: usize,
    raster: &Raster,
    (at, clip): ([i32; 2], &[Vec<Point>]),
) -> Result<(), PngError> {
    let (columns, rows) = (raster.columns, raster.rows);
    let data = base64(&encode_rgb(raster)?);
    let mut reference = String::new();
    if !clip.is_empty() {
        let _ = writeln!(
            out,
            "<clipPath id=\"clip{index}\"><path d=\"{}\" clip-rule=\"evenodd\"/></clipPath>",
            path(clip, true)
        );
        reference = format!(" clip-path=\"url(#clip{index})\"");
    }
    let _ = writeln!(
        out,
        "<g{reference}><image x=\"{}\" y=\"{}\" width=\"{columns}\" height=\"{rows}\" preserveAspectRatio=\"none\" \
         xlink:href=\"data:image/png;base64,{data}\"/></g>",
        at[0], at[1],
    );
    Ok(())
}

fn font_size(size: TextSize) -> f64 {
    size.advance() / ADVANCE_PER_SIZE
}

fn anchor_name(anchor: Anchor) -> &'static str {
    match anchor {
        Anchor::Start => "start",
        Anchor::Middle => "middle",
        Anchor::End => "end",
    }
}

fn hex([r, g, b]: [u8; 3]) -> String {
    format!("#{r:02x}{g:02x}{b:02x}")
}

/// A coordinate with two decimals, without needless zeros.
fn coordinate(value: f64) -> String {
    let text = format!("{value:.2}");
    match text.strip_suffix(".00") {
        Some(whole) => whole.to_owned(),
        None => text,
    }
}

fn path(lines: &[Vec<Point>], closed: bool) -> String {
    let mut out = String::new();
    for line in lines {
        for (i, p) in line.iter().enumerate() {
            let _ = write!(
                out,
                "{}{} {}",
                if i == 0 { "M" } else { "L" },
                coordinate(p[0]),
                coordinate(p[1])
            );
        }
        if closed {
            out.push('Z');
        }
    }
    out
}

/// Text fit for XML 1.0: markup escaped, characters it cannot hold replaced by blanks.
fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in one_line(text).chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\u{fffe}' | '\u{ffff}' => out.push(' '),
            c => out.push(c),
        }
    }
    out
}

/// Base 64 of RFC 4648 with padding.
fn base64(bytes: &[u8]) -> String {
    let digit = |v: u32| match v & 63 {
        d @ 0..=25 => char::from(b'A' + d as u8),
        d @ 26..=51 => char::from(b'a' + (d - 26) as u8),
        d @ 52..=61 => char::from(b'0' + (d - 52) as u8),
        62 => '+',
        _ => '/',
    };
    let mut out = String::with_capacity(bytes.len().div_ceil(3) * 4);
    for chunk in bytes.chunks(3) {
        let byte = |i: usize| u32::from(chunk.get(i).copied().unwrap_or(0));
        let word = byte(0) << 16 | byte(1) << 8 | byte(2);
        for i in 0..4_usize {
            out.push(if i <= chunk.len() {
                digit(word >> (18 - 6 * i))
            } else {
                '='
            });
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn base64_matches_the_vectors_of_rfc_4648_section_10() {
        for (plain, coded) in [
            ("", ""),
            ("f", "Zg=="),
            ("fo", "Zm8="),
            ("foo", "Zm9v"),
            ("foob", "Zm9vYg=="),
            ("fooba", "Zm9vYmE="),
            ("foobar", "Zm9vYmFy"),
        ] {
            assert_eq!(base64(plain.as_bytes()), coded);
        }
        assert_eq!(base64(&[0xfb, 0xff, 0xbf]), "+/+/");
    }

    #[test]
    fn markup_in_a_name_stays_text() {
        assert_eq!(
            escaped("<b a=\"1\">&\u{1}"),
            "&lt;b a=&quot;1&quot;&gt;&amp; "
        );
        assert_eq!(coordinate(12.0), "12");
        assert_eq!(coordinate(-0.125), "-0.12");
    }
}
