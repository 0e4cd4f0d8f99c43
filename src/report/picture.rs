//! The velocity picture: map, contour lines at round values, wall, scale bar, colour bar with unit.
//!
//! The map is viridis over bilinear velocity, clipped to the outline itself, so that the wall is drawn
//! as exactly as it is known. Colour never stands alone: contour lines repeat it, and the colour bar is
//! marked at the same values.

use std::path::{Path, PathBuf};

use super::colour_map::viridis;
use super::contour::{Lattice, contour};
use super::document::SolveDocument;
use super::drawing::{Anchor, Drawing, INK, Item, PAPER, Raster, SOLID, TextSize};
use super::numbers::{self, significant, with_unit};
use super::picture_furniture::{peak_mark, shear_mark};
use super::picture_layout::{Exaggeration, Layout, straightened, thinned};
use super::png::{PngError, to_png};
use super::svg::to_svg;
use super::table::wrapped;
use super::ticks;
use crate::flow::DenseField;
use crate::geometry::{Outline, Point};

/// White border of the page, px.
pub(super) const MARGIN: f64 = 40.0;
/// Least width between the borders, px.
const LEAST_WIDTH: f64 = 760.0;
/// Most contour lines.
pub(super) const MOST_LEVELS: usize = 12;
/// Below this share of the peak the map is dark and contour lines are white.
pub(super) const DARK_SHARE: f64 = 0.6;

/// Kind of picture file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PictureFormat {
    /// Pixels.
    Png,
    /// Vectors, with the map as an embedded image.
    Svg,
}

impl PictureFormat {
    /// The format that the extension of a path names.
    ///
    /// # Errors
    /// [`PictureError::Extension`] for anything but `.png` and `.svg`.
    ///
    /// # Examples
    /// ```
    /// use etchwise::report::PictureFormat;
    /// assert_eq!(PictureFormat::of_path("flow.SVG".as_ref()).unwrap(), PictureFormat::Svg);
    /// assert!(PictureFormat::of_path("flow.gif".as_ref()).is_err());
    /// ```
    pub fn of_path(path: &Path) -> Result<Self, PictureError> {
        let extension = path
            .extension()
            .map(|e| e.to_string_lossy().to_ascii_lowercase());
        match extension.as_deref() {
            Some("png") => Ok(Self::Png),
            Some("svg") => Ok(Self::Svg),
            _ => Err(PictureError::Extension {
                path: path.to_owned(),
            }),
        }
    }
}

/// Why a picture could not be made.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum PictureError {
    /// The extension names no picture format.
    #[error("`{}` does not end in .png or .svg, so the kind of picture is not known", path.display())]
    Extension {
        /// The path.
        path: PathBuf,
    },
    /// The outline has no extent.
    #[error("the outline has no width or no height, so there is nothing to draw")]
    NoExtent,
    /// The field is not a lattice of at least two by two finite nodes.
    #[error(
        "the field ({nodes_x} x {nodes_y} nodes, {found} values) is not a lattice that can be drawn"
    )]
    Field {
        /// Nodes along x.
        nodes_x: usize,
        /// Nodes along y.
        nodes_y: usize,
        /// Values found.
        found: usize,
    },
    /// The result holds no wall.
    #[error("the result holds no wall shear, so there is no wall to colour")]
    NoWall,
    /// A check picture without anything to draw.
    #[error("the check picture has nothing to draw: {reason}")]
    EmptyCheck {
        /// Why, panel by panel.
        reason: String,
    },
    /// The pixels could not be made.
    #[error(transparent)]
    Png(#[from] PngError),
}

/// The velocity picture as the bytes of a file.
///
/// # Errors
/// [`PictureError`] when there is nothing to draw or the encoder refuses.
pub fn picture_bytes(
    document: &SolveDocument<'_>,
    outline: &Outline,
    field: &DenseField,
    format: PictureFormat,
) -> Result<Vec<u8>, PictureError> {
    let drawing = draw_velocity(document, outline, field)?;
    Ok(match format {
        PictureFormat::Png => to_png(&drawing)?,
        PictureFormat::Svg => to_svg(&drawing)?.into_bytes(),
    })
}

/// The velocity picture as a drawing.
///
/// # Errors
/// [`PictureError`] when there is nothing to draw.
pub fn draw_velocity(
    document: &SolveDocument<'_>,
    outline: &Outline,
    field: &DenseField,
) -> Result<Drawing, PictureError> {
    let (nodes_x, nodes_y, found) = (field.nodes_x, field.nodes_y, field.phi.len());
    let finite = field.phi.iter().all(|p| p.is_finite())
        && field.spacing > 0.0
        && document.flow.peak.phi > 0.0;
    if nodes_x < 2 || nodes_y < 2 || found != nodes_x * nodes_y || !finite {
        return Err(PictureError::Field {
            nodes_x,
            nodes_y,
            found,
        });
    }
    let (layout, exaggeration) = Layout::of(outline).ok_or(PictureError::NoExtent)?;
    let mut page = Page::new(document, layout, exaggeration, Shown::new(document));
    page.heading();
    page.section(outline, field);
    page.scale_bars();
    page.colour_bar();
    page.legend();
    Ok(page.finish())
}

/// Velocity as it is shown: a factor on `phi`, its unit and its range.
pub(super) struct Shown {
    pub(super) factor: f64,
    pub(super) unit: String,
    pub(super) quantity: &'static str,
    pub(super) top: f64,
    pub(super) levels: Vec<f64>,
    pub(super) step: f64,
    /// What the levels are on the page.
    pub(super) marks: &'static str,
}

impl Shown {
    fn new(document: &SolveDocument<'_>) -> Self {
        let peak = document.flow.peak.phi;
        let (factor, unit, quantity) = if document.operating_point.is_some() {
            let scale = document.velocity_scale().factor;
            let (name, size) = numbers::fitting_unit(peak * scale, numbers::VELOCITIES);
            (scale / size, name.to_owned(), "axial velocity")
        } else {
            (
                1.0 / document.mean_phi(),
                String::new(),
                "axial velocity / mean velocity",
            )
        };
        let top = peak * factor;
        let (levels, step) = ticks::levels(top, MOST_LEVELS);
        Self {
            factor,
            unit,
            quantity,
            top,
            levels,
            step,
            marks: "contour lines",
        }
    }

    /// A value with its unit, if it has one.
    pub(super) fn with_unit(&self, value: &str) -> String {
        format!("{value} {}", self.unit).trim_end().to_owned()
    }
}

/// A page being filled from the top; `y` is how far it is filled.
pub(super) struct Page<'a> {
    pub(super) document: &'a SolveDocument<'a>,
    pub(super) layout: Layout,
    pub(super) exaggeration: Exaggeration,
    pub(super) shown: Shown,
    pub(super) inner: f64,
    pub(super) y: f64,
    pub(super) drawing: Drawing,
}

impl<'a> Page<'a> {
    pub(super) fn new(
        document: &'a SolveDocument<'a>,
        layout: Layout,
        exaggeration: Exaggeration,
        shown: Shown,
    ) -> Self {
        let inner = layout.size[0].max(LEAST_WIDTH).ceil();
        Self {
            document,
            layout,
            exaggeration,
            shown,
            inner,
            y: MARGIN,
            drawing: Drawing {
                width: (inner + 2.0 * MARGIN) as u32,
                height: 0,
                title: String::new(),
                description: String::new(),
                items: Vec::new(),
            },
        }
    }

    /// A paragraph at the left border, broken to the width of the page.
    pub(super) fn paragraph(&mut self, text: &str, size: TextSize, left: f64) {
        let room = ((MARGIN + self.inner - left) / size.advance()).floor() as usize;
        for line in broken(text, room) {
            self.y += size.line_height();
            self.drawing
                .text([left, self.y - 5.0], Anchor::Start, size, line);
        }
    }

    fn heading(&mut self) {
        let flow = self.document.flow;
        let length = |v: f64| with_unit(v, numbers::LENGTHS, 4);
        let name = numbers::title(self.document.section_name);
        let size = format!(
            "width {}, height {}, area {}, K = {} m^4 (estimated error {})",
            length(flow.geometry.width),
            length(flow.geometry.height),
            with_unit(flow.geometry.area, numbers::AREAS, 4),
            significant(flow.conductance.value, 5),
            numbers::per_cent(flow.conductance.relative()),
        );
        let drive = match (self.document.operating_point, self.document.fluid) {
            (Some(point), Some(fluid)) => format!(
                "{}, {} over {}: flow rate {}",
                numbers::one_line(&fluid.name),
                with_unit(point.pressure_drop, numbers::PRESSURES, 4),
                length(point.length),
                with_unit(point.flow_rate, numbers::FLOW_RATES, 4),
            ),
            _ => "fully developed laminar flow, any fluid and pressure gradient".to_owned(),
        };
        self.drawing.title = format!("{} in section {name}", self.shown.quantity);
        self.drawing.description = format!("{name}: {size}. {drive}.");
        self.paragraph(&name, TextSize::Large, MARGIN);
        self.y += 6.0;
        self.paragraph(&size, TextSize::Medium, MARGIN);
        self.paragraph(&drive, TextSize::Medium, MARGIN);
        self.y += 24.0;
    }

    /// Map, contour lines, wall and markers.
    fn section(&mut self, outline: &Outline, field: &DenseField) {
        let left = MARGIN + 0.5 * (self.inner - self.layout.size[0]);
        self.layout.at = [left.round() as i32, self.y.round() as i32];
        let layout = self.layout;
        let walls: Vec<Vec<Point>> = outline.loops().map(|l| layout.page_loop(l)).collect();
        let lattice = Lattice {
            values: &field.phi,
            columns: field.nodes_x,
            rows: field.nodes_y,
        };
        let outer = outline
            .lumens
            .iter()
            .map(|l| layout.page_loop(&l.outer))
            .collect();
        self.drawing.items.push(Item::Area {
            loops: outer,
            fill: SOLID,
        });
        self.drawing.items.push(Item::Image {
            raster: self.map(&lattice, field),
            at: layout.at,
            clip: walls.clone(),
        });
        for &level in &self.shown.levels {
            let lines = contour(&lattice, level / self.shown.factor)
                .into_iter()
                .map(|line| {
                    straightened(&thinned(
                        line.into_iter().map(|p| layout.page(on_lattice(field, p))),
                    ))
                })
                .collect();
            let dark = level < DARK_SHARE * self.shown.top;
            self.drawing.items.push(Item::Lines {
                lines,
                closed: false,
                colour: if dark { PAPER } else { INK },
                width: 1.2,
                opacity: if dark { 0.8 } else { 0.65 },
            });
        }
        self.drawing.items.push(Item::Lines {
            lines: walls,
            closed: true,
            colour: INK,
            width: 2.5,
            opacity: 1.0,
        });
        peak_mark(&mut self.drawing, layout.page(self.document.flow.peak.at));
        shear_mark(
            &mut self.drawing,
            layout.page(self.document.flow.wall_shear.max_at),
        );
        self.y += layout.size[1].ceil() + 28.0;
    }

    /// The colour of every pixel of the section's bounding box.
    fn map(&self, lattice: &Lattice<'_>, field: &DenseField) -> Raster {
        let [columns, rows] = self.layout.size.map(|s| s.ceil().max(1.0) as usize);
        let peak = self.document.flow.peak.phi;
        let [left, top] = self.layout.at.map(f64::from);
        let mut rgb = Vec::with_capacity(3 * columns * rows);
        for row in 0..rows {
            for column in 0..columns {
                let centre = [left + column as f64 + 0.5, top + row as f64 + 0.5];
                let p = self.layout.section(centre);
                let x = (p[0] - field.origin[0]) / field.spacing;
                let y = (p[1] - field.origin[1]) / field.spacing;
                rgb.extend(viridis(lattice.bilinear(x, y) / peak));
            }
        }
        Raster { columns, rows, rgb }
    }

    pub(super) fn finish(mut self) -> Drawing {
        self.drawing.height = (self.y + MARGIN).ceil() as u32;
        self.drawing
    }
}

/// A text in lines of at most `room` characters, broken at blanks and within words longer than a line.
pub(super) fn broken(text: &str, room: usize) -> Vec<String> {
    let room = room.max(1);
    wrapped(text, room)
        .iter()
        .flat_map(|l| pieces(l, room))
        .collect()
}

/// A line cut into pieces of at most `room` characters, for words longer than a line.
fn pieces(line: &str, room: usize) -> Vec<String> {
    let characters: Vec<char> = line.chars().collect();
    characters
        .chunks(room)
        .map(|c| c.iter().collect())
        .collect()
}

/// Lattice units to metres.
fn on_lattice(field: &DenseField, p: Point) -> Point {
    [
        field.origin[0] + p[0] * field.spacing,
        field.origin[1] + p[1] * field.spacing,
    ]
}
