//! A drawing as a list of primitives, rendered alike to SVG ([`super::to_svg`]) and PNG
//! ([`super::to_png`]).
//!
//! Coordinates are pixels, `x` to the right, `y` downwards, origin at the upper left corner.

use crate::geometry::Point;

/// Red, green and blue, 0 to 255.
pub type Colour = [u8; 3];

/// Which end of a text sits at its position.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Anchor {
    /// The text starts there.
    Start,
    /// The text is centred there.
    Middle,
    /// The text ends there.
    End,
}

/// Size of a text in a font of constant width.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TextSize {
    /// For ticks.
    Small,
    /// For labels.
    Medium,
    /// For titles.
    Large,
}

impl TextSize {
    /// Height of a line, px.
    pub fn line_height(self) -> f64 {
        match self {
            Self::Small => 16.0,
            Self::Medium => 20.0,
            Self::Large => 24.0,
        }
    }

    /// Width of one character, px.
    pub fn advance(self) -> f64 {
        match self {
            Self::Small => 7.0,
            Self::Medium => 9.0,
            Self::Large => 11.0,
        }
    }

    /// Width of a text, px.
    pub fn width(self, text: &str) -> f64 {
        self.advance() * text.chars().count() as f64
    }
}

/// An image of pixels, row by row from the top, three bytes each.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Raster {
    /// Pixels across.
    pub columns: usize,
    /// Pixels down.
    pub rows: usize,
    /// `3 * columns * rows` bytes.
    pub rgb: Vec<u8>,
}

/// One primitive.
#[derive(Debug, Clone)]
pub enum Item {
    /// Lines of one look, with round joins and ends.
    Lines {
        /// Each line as its points.
        lines: Vec<Vec<Point>>,
        /// Whether the last point is joined to the first.
        closed: bool,
        /// Colour.
        colour: Colour,
        /// Width, px.
        width: f64,
        /// 0 (invisible) to 1.
        opacity: f64,
    },
    /// A filled area; a point is inside when loops around it are odd in number.
    Area {
        /// Border loops.
        loops: Vec<Vec<Point>>,
        /// Colour.
        fill: Colour,
    },
    /// An image at its own resolution, optionally clipped to loops (odd number is inside).
    Image {
        /// The pixels.
        raster: Raster,
        /// Upper left corner, whole px.
        at: [i32; 2],
        /// Loops to clip to; no clipping without any.
        clip: Vec<Vec<Point>>,
    },
    /// A line of text.
    Text {
        /// Position of the base line.
        at: Point,
        /// Which end is there.
        anchor: Anchor,
        /// Size.
        size: TextSize,
        /// Colour.
        colour: Colour,
        /// The text.
        text: String,
    },
}

/// A drawing with its description.
#[derive(Debug, Clone)]
pub struct Drawing {
    /// Width, px.
    pub width: u32,
    /// Height, px.
    pub height: u32,
    /// Short title for people who cannot see it.
    pub title: String,
    /// What it shows, with the numbers.
    pub description: String,
    /// Primitives, the later above the earlier.
    pub items: Vec<Item>,
}

impl Drawing {
    /// Adds text starting at a base line position.
    pub(crate) fn text(
        &mut self,
        at: Point,
        anchor: Anchor,
        size: TextSize,
        text: impl Into<String>,
    ) {
        self.items.push(Item::Text {
            at,
            anchor,
            size,
            colour: INK,
            text: text.into(),
        });
    }

    /// Adds opaque open lines.
    pub(crate) fn lines(&mut self, lines: Vec<Vec<Point>>, colour: Colour, width: f64) {
        self.items.push(Item::Lines {
            lines,
            closed: false,
            colour,
            width,
            opacity: 1.0,
        });
    }
}

/// Text and walls.
pub(crate) const INK: Colour = [26, 26, 26];
/// Background and halos.
pub(crate) const PAPER: Colour = [255, 255, 255];
/// Solid islands.
pub(crate) const SOLID: Colour = [221, 221, 221];
