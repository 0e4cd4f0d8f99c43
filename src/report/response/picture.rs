//! The picture of a response table: a map for two parameters, a curve for one, three maps for three.
//!
//! Everything is drawn from the formula; squares mark the sections that were solved for the table. Colour never stands
//! alone: lines at round values repeat it, with their numbers on them.

use std::fmt::Write as _;

use super::document::{ResponseDocument, ShownUnit};
use super::map::Shown;
use super::plot::{AxisOf, MAP_NODES, Panel, solved_mark};
use crate::report::check_axes::draw_border;
use crate::report::colour_map::viridis;
use crate::report::drawing::{Anchor, Drawing, INK, Item, Raster, TextSize};
use crate::report::numbers::{self, one_line, per_cent, significant};
use crate::report::picture::{MARGIN, PictureError, PictureFormat, broken};
use crate::report::png::to_png;
use crate::report::svg::to_svg;

/// Room for numbers and heading left of the first panel, px.
const LEFT: f64 = 64.0;
/// Size of a single panel, px.
const SINGLE: [f64; 2] = [760.0, 560.0];
/// Size of one of three panels, px.
const TRIPLE: [f64; 2] = [330.0, 330.0];
/// Gap between panels, px.
const GAP: f64 = 26.0;
/// Room for the numbers and the heading below a panel, px.
const BELOW: f64 = 54.0;
/// Places on a curve.
const CURVE_PLACES: usize = 401;
/// Height of the colour bar, px.
const BAR: f64 = 20.0;

/// The picture as the bytes of a file.
///
/// # Errors
/// [`PictureError`] when there is nothing to draw or the encoder refuses.
pub fn response_picture(
    document: &ResponseDocument<'_>,
    format: PictureFormat,
) -> Result<Vec<u8>, PictureError> {
    let drawing = draw_response(document)?;
    Ok(match format {
        PictureFormat::Png => to_png(&drawing)?,
        PictureFormat::Svg => to_svg(&drawing)?.into_bytes(),
    })
}

/// The picture as a drawing.
///
/// # Errors
/// [`PictureError::NoExtent`] when the formula gives the same conductance everywhere.
pub fn draw_response(document: &ResponseDocument<'_>) -> Result<Drawing, PictureError> {
    let grids = grids(document);
    let table = document.table.points.iter().map(|p| p.conductance.value);
    let all = grids.iter().flat_map(|g| g.conductances.iter().copied());
    let shown = Shown::new(document, all.chain(table)).ok_or(PictureError::NoExtent)?;
    let mut page = Page::new(document, &shown);
    page.heading();
    page.panels(&grids);
    page.notes();
    Ok(page.finish())
}

/// The formula evaluated for one panel.
struct Grid {
    /// Value of the third parameter, where there is one.
    third: Option<f64>,
    /// Conductances, m^4: along the first parameter, then the second.
    conductances: Vec<f64>,
}

fn spread(low: f64, high: f64, count: usize) -> Vec<f64> {
    let last = count.saturating_sub(1).max(1) as f64;
    (0..count)
        .map(|k| {
            let share = k as f64 / last;
            low * (1.0 - share) + high * share
        })
        .collect()
}

fn grids(document: &ResponseDocument<'_>) -> Vec<Grid> {
    let table = document.table;
    let at = |values: &[f64]| table.conductance(values).unwrap_or(f64::NAN);
    let axis = |k: usize, count| {
        let parameter = table.parameters.get(k);
        parameter.map_or(Vec::new(), |p| spread(p.low, p.high, count))
    };
    if table.parameters.len() == 1 {
        let places = axis(0, CURVE_PLACES);
        return vec![Grid {
            third: None,
            conductances: places.iter().map(|&v| at(&[v])).collect(),
        }];
    }
    let (xs, ys) = (axis(0, MAP_NODES), axis(1, MAP_NODES));
    let thirds: Vec<Option<f64>> = match table.parameters.get(2) {
        None => vec![None],
        Some(p) => [p.low, p.value_at(0.0), p.high].map(Some).to_vec(),
    };
    thirds
        .into_iter()
        .map(|third| {
            let pairs = ys.iter().flat_map(|&y| xs.iter().map(move |&x| [x, y]));
            let conductances = pairs
                .map(|[x, y]| match third {
                    None => at(&[x, y]),
                    Some(z) => at(&[x, y, z]),
                })
                .collect();
            Grid {
                third,
                conductances,
            }
        })
        .collect()
}

/// A page being filled from the top.
struct Page<'a> {
    document: &'a ResponseDocument<'a>,
    shown: &'a Shown,
    units: Vec<ShownUnit>,
    inner: f64,
    y: f64,
    drawing: Drawing,
}

impl<'a> Page<'a> {
    fn new(document: &'a ResponseDocument<'a>, shown: &'a Shown) -> Self {
        let inner = if document.table.parameters.len() > 2 {
            LEFT + 3.0 * TRIPLE[0] + 2.0 * GAP
        } else {
            LEFT + SINGLE[0]
        };
        Self {
            document,
            shown,
            units: document.units(),
            inner,
            y: MARGIN,
            drawing: Drawing {
                // Numbers at the right end of an axis stand out a little.
                width: (inner + 2.0 * MARGIN) as u32,
                height: 0,
                title: String::new(),
                description: String::new(),
                items: Vec::new(),
            },
        }
    }

    fn paragraph(&mut self, text: &str, size: TextSize, left: f64) {
        let room = ((MARGIN + self.inner - left) / size.advance()).floor() as usize;
        for line in broken(text, room) {
            self.y += size.line_height();
            let at = [left, self.y - 5.0];
            self.drawing.text(at, Anchor::Start, size, line);
        }
    }

    fn heading(&mut self) {
        let document = self.document;
        let name = numbers::title(document.name);
        let fixed: Vec<String> = document
            .fixed
            .iter()
            .map(|(n, v)| one_line(&format!("{n} = {v}")))
            .collect();
        let mut what = self.shown.heading.clone();
        if let Some(fluid) = document.fluid {
            let _ = write!(
                what,
                ", {} with mu = {} Pa s",
                one_line(&fluid.name),
                significant(fluid.viscosity, 5)
            );
        }
        if !fixed.is_empty() {
            let _ = write!(what, "; {}", fixed.join(", "));
        }
        let errors = &document.table.errors;
        let error = format!(
            "from the formula, stated error {} (fit {}, numerical {})",
            per_cent(errors.stated()),
            per_cent(errors.fit()),
            per_cent(errors.numerical)
        );
        self.drawing.title = format!("{} of {name}", self.shown.name);
        self.drawing.description = format!("{name}: {what}; {error}.");
        self.paragraph(&name, TextSize::Large, MARGIN);
        self.y += 4.0;
        self.paragraph(&what, TextSize::Medium, MARGIN);
        self.paragraph(&error, TextSize::Medium, MARGIN);
        self.y += 14.0;
    }

    fn axis(&self, k: usize) -> Option<AxisOf<'a>> {
        let parameter = self.document.table.parameters.get(k)?;
        Some((parameter, self.units.get(k).copied()?))
    }

    fn panels(&mut self, grids: &[Grid]) {
        let Some(x) = self.axis(0) else { return };
        let second = self.axis(1);
        let size = if grids.len() > 1 { TRIPLE } else { SINGLE };
        // What the upright axis shows stands above it: text does not turn.
        let above = match second {
            Some((parameter, unit)) => unit.head(&parameter.name),
            None => self.shown.heading.clone(),
        };
        self.paragraph(&above, TextSize::Medium, MARGIN);
        let third = self.axis(2);
        if third.is_some() {
            self.y += TextSize::Medium.line_height();
        }
        self.y += 6.0;
        for (index, grid) in grids.iter().enumerate() {
            let left = MARGIN + LEFT + index as f64 * (size[0] + GAP);
            let panel = Panel {
                at: [left, self.y.round()],
                size,
                x,
                shown: self.shown,
            };
            if let (Some(z), Some((parameter, unit))) = (grid.third, third) {
                let text = format!("{} = {}", parameter.name, unit.with(z, 4));
                let at = [left + 0.5 * size[0], self.y - 8.0];
                self.drawing
                    .text(at, Anchor::Middle, TextSize::Medium, text);
            }
            let values: Vec<f64> = grid
                .conductances
                .iter()
                .map(|&k| self.shown.value(k))
                .collect();
            if let Some(y) = second {
                let marks = self.marks(grid.third);
                panel.map(&mut self.drawing, y, &values, &marks, index == 0);
            } else {
                let places = spread(x.0.low, x.0.high, CURVE_PLACES);
                let curve: Vec<[f64; 2]> = places
                    .into_iter()
                    .zip(values)
                    .map(|(p, v)| [p, v])
                    .collect();
                let solved = self.document.table.points.iter();
                let marks: Vec<[f64; 2]> = solved
                    .map(|p| [p.values[0], self.shown.value(p.conductance.value)])
                    .collect();
                panel.curve(&mut self.drawing, &curve, &marks);
            }
        }
        self.y += size[1] + BELOW;
        if second.is_some() {
            self.colour_bar();
        }
    }

    /// Solved sections of the table in a panel.
    fn marks(&self, third: Option<f64>) -> Vec<[f64; 2]> {
        let points = self.document.table.points.iter();
        points
            .filter(|p| match (third, p.values.get(2)) {
                (Some(z), Some(v)) => (z - v).abs() <= 1e-9 * z.abs().max(v.abs()),
                _ => true,
            })
            .map(|p| [p.values[0], p.values[1]])
            .collect()
    }

    /// The colours with the round values, on the logarithmic scale of the map.
    fn colour_bar(&mut self) {
        let left = MARGIN + LEFT;
        let width = self.inner - LEFT;
        self.y += 8.0;
        let heading = format!("{}, logarithmic", self.shown.heading);
        self.paragraph(&heading, TextSize::Medium, left);
        self.y += 6.0;
        let (columns, rows) = (width as usize, BAR as usize);
        let row: Vec<u8> = (0..columns)
            .flat_map(|c| viridis((c as f64 + 0.5) / columns as f64))
            .collect();
        let top = self.y.round();
        self.drawing.items.push(Item::Image {
            raster: Raster {
                columns,
                rows,
                rgb: row.repeat(rows),
            },
            at: [left as i32, top as i32],
            clip: Vec::new(),
        });
        draw_border(&mut self.drawing, [left, top], [width, BAR]);
        let base = top + BAR;
        let size = TextSize::Small;
        let mut free_from = f64::NEG_INFINITY;
        for (value, label) in &self.shown.levels {
            let x = left + self.shown.share(*value) * width;
            let mark = vec![vec![[x, top], [x, base + 5.0]]];
            self.drawing.lines(mark.clone(), [255, 255, 255], 3.0);
            self.drawing.lines(mark, INK, 1.2);
            let half = 0.5 * size.width(label);
            if x - half > free_from {
                let at = [x, base + 18.0];
                self.drawing.text(at, Anchor::Middle, size, label.as_str());
                free_from = x + half + 6.0;
            }
        }
        self.y = base + 8.0 + size.line_height();
    }

    fn notes(&mut self) {
        self.y += 8.0;
        solved_mark(&mut self.drawing, [MARGIN + LEFT + 6.0, self.y + 10.0]);
        let third = self.axis(2).is_some();
        let where_solved = if third {
            "sections solved for the table at this value of the third parameter"
        } else {
            "sections solved for the table"
        };
        let note = format!("{where_solved}; the formula holds inside the ranges only");
        self.paragraph(&note, TextSize::Medium, MARGIN + LEFT + 22.0);
        let errors = &self.document.table.errors;
        if !errors.is_met() {
            let note = format!(
                "The fit error {} is above the {} that was asked for.",
                per_cent(errors.fit()),
                per_cent(errors.asked)
            );
            self.paragraph(&note, TextSize::Medium, MARGIN + LEFT);
        }
    }

    fn finish(mut self) -> Drawing {
        self.drawing.height = (self.y + MARGIN).ceil() as u32;
        self.drawing
    }
}
