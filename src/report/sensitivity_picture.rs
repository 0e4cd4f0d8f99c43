//! The picture of the sensitivity study: the wall coloured by what a small motion of it does to `K`.
//!
//! The local sensitivity is `(dphi/dn)^2 / K` (1/m^2): the relative change of `K` per length of outward motion
//! and length of wall that moves. Colour never stands alone: numbers are put to a few places of the wall, the
//! colour bar is marked, and the largest value is named below.

use std::fmt::Write as _;

use super::colour_map::viridis;
use super::document::SolveDocument;
use super::drawing::{Anchor, INK, Item, SOLID, TextSize};
use super::numbers::{self, significant, with_unit};
use super::picture::{MARGIN, MOST_LEVELS, Page, PictureError, PictureFormat, Shown};
use super::picture_furniture::shear_mark;
use super::picture_layout::Layout;
use super::png::to_png;
use super::sensitivity_document::SensitivityDocument;
use super::sensitivity_labels::{Label, labels};
use super::svg::to_svg;
use super::ticks;
use crate::flow::{CurvePoint, PointKind};
use crate::geometry::{Outline, Point};

/// Width of the coloured line, px.
const LINE: f64 = 9.0;
/// Steps of colour along the wall.
const COLOURS: usize = 64;

/// The picture as the bytes of a file.
///
/// # Errors
/// [`PictureError`] when there is nothing to draw or the encoder refuses.
pub fn sensitivity_picture(
    document: &SensitivityDocument<'_>,
    outline: &Outline,
    format: PictureFormat,
) -> Result<Vec<u8>, PictureError> {
    let (layout, exaggeration) = Layout::of(outline).ok_or(PictureError::NoExtent)?;
    let local = Local::new(document).ok_or(PictureError::NoWall)?;
    let solve = SolveDocument::new(document.section_name, document.flow);
    let mut page = Page::new(&solve, layout, exaggeration, local.shown());
    heading(&mut page, document);
    wall(&mut page, outline, &local, document);
    page.scale_bars();
    page.colour_bar();
    legend(&mut page, &local, document);
    let drawing = page.finish();
    Ok(match format {
        PictureFormat::Png => to_png(&drawing)?,
        PictureFormat::Svg => to_svg(&drawing)?.into_bytes(),
    })
}

/// The local sensitivity with the unit it is shown in.
struct Local {
    /// Shear squared (m^2) to the shown value.
    factor: f64,
    unit: &'static str,
    /// Largest value shown, with its place.
    top: f64,
    top_at: Point,
    /// Mean over the wall.
    mean: f64,
}

impl Local {
    fn new(document: &SensitivityDocument<'_>) -> Option<Self> {
        let curve = &document.flow.wall_shear.curve;
        let singular = &document.flow.wall_shear.singular_corners;
        // Beside a singular corner the curve has no bound; the brightest colour stands for all that is above.
        let is_bounded = |p: &&CurvePoint| {
            p.kind != PointKind::SingularCorner
                && singular.iter().all(|corner| {
                    (p.at[0] - corner[0]).hypot(p.at[1] - corner[1]) > curve.singular_length
                })
        };
        let largest = curve
            .loops
            .iter()
            .flat_map(|l| &l.points)
            .filter(is_bounded)
            .max_by(|a, b| a.shear_per_gradient.total_cmp(&b.shear_per_gradient))?;
        let si = largest.shear_per_gradient.powi(2) / document.flow.conductance.value;
        let (unit, wall) = if si * 1e-10 >= 0.01 {
            ("% per \u{b5}m\u{b2}", 1e-6)
        } else {
            ("% per \u{b5}m mm", 1e-3)
        };
        let factor = 100.0 * 1e-6 * wall / document.flow.conductance.value;
        let top = si * 100.0 * 1e-6 * wall;
        (top.is_finite() && top > 0.0).then(|| Self {
            factor,
            unit,
            top,
            top_at: largest.at,
            mean: factor * curve.integrate(2, |_| 1.0) / document.flow.geometry.wetted_perimeter,
        })
    }

    fn value(&self, shear: f64) -> f64 {
        self.factor * shear * shear
    }

    fn shown(&self) -> Shown {
        let (levels, step) = ticks::levels(self.top, MOST_LEVELS);
        Shown {
            factor: self.factor,
            unit: self.unit.to_owned(),
            quantity: "change of K",
            top: self.top,
            levels,
            step,
            marks: "marks",
        }
    }
}

fn heading(page: &mut Page<'_>, document: &SensitivityDocument<'_>) {
    let flow = document.flow;
    let length = |v: f64| with_unit(v, numbers::LENGTHS, 4);
    let name = numbers::title(document.section_name);
    let size = format!(
        "width {}, depth {}, K = {} m^4 (estimated error {})",
        length(flow.geometry.width),
        length(flow.geometry.height),
        significant(flow.conductance.value, 5),
        numbers::per_cent(flow.conductance.relative()),
    );
    let what = "wall coloured by the change of K when it recedes from the fluid: per \u{b5}m of motion, per length";
    page.drawing.title = format!("sensitivity of the conductance of section {name}");
    page.drawing.description = format!("{name}: {size}; {what}.");
    page.paragraph(&name, TextSize::Large, MARGIN);
    page.y += 6.0;
    page.paragraph(&size, TextSize::Medium, MARGIN);
    page.paragraph(what, TextSize::Medium, MARGIN);
    page.y += 40.0;
}

/// The coloured wall with its numbers.
fn wall(page: &mut Page<'_>, outline: &Outline, local: &Local, document: &SensitivityDocument<'_>) {
    let left = MARGIN + 0.5 * (page.inner - page.layout.size[0]);
    page.layout.at = [left.round() as i32, page.y.round() as i32];
    let layout = page.layout;
    for lumen in &outline.lumens {
        for island in &lumen.islands {
            page.drawing.items.push(Item::Area {
                loops: vec![layout.page_loop(island)],
                fill: SOLID,
            });
        }
    }
    page.drawing.items.push(Item::Lines {
        lines: outline.loops().map(|l| layout.page_loop(l)).collect(),
        closed: true,
        colour: INK,
        width: LINE + 2.5,
        opacity: 1.0,
    });
    let mut runs: Vec<Vec<Vec<Point>>> = vec![Vec::new(); COLOURS];
    for curve in &document.flow.wall_shear.curve.loops {
        let next = curve.points.iter().cycle().skip(1);
        for (a, b) in curve.points.iter().zip(next) {
            let mean =
                0.5 * (local.value(a.shear_per_gradient) + local.value(b.shear_per_gradient));
            let share = (mean / local.top).clamp(0.0, 1.0);
            let index = (share * (COLOURS - 1) as f64).round() as usize;
            // Both sides of a corner stand in one place; a piece without length is but a dot.
            if let Some(lines) = runs.get_mut(index) {
                lines.push(vec![layout.page(a.at), layout.page(b.at)]);
            }
        }
    }
    for (index, lines) in runs.into_iter().enumerate() {
        if !lines.is_empty() {
            let colour = viridis(index as f64 / (COLOURS - 1) as f64);
            page.drawing.lines(lines, colour, LINE);
        }
    }
    shear_mark(&mut page.drawing, layout.page(local.top_at));
    let curve = &document.flow.wall_shear.curve;
    let width = f64::from(page.drawing.width);
    let write = |shear: f64| significant(local.value(shear), 2);
    for Label {
        text,
        middle,
        leader,
    } in labels(curve, &layout, width, &write)
    {
        page.drawing.lines(vec![leader.to_vec()], INK, 1.2);
        let base = [middle[0], middle[1] + 5.0];
        page.drawing
            .text(base, Anchor::Middle, TextSize::Small, text);
    }
    page.y += layout.size[1].ceil() + 44.0;
}

/// The marker, the mean and the totals in words.
fn legend(page: &mut Page<'_>, local: &Local, document: &SensitivityDocument<'_>) {
    let flow = document.flow;
    let extent = [flow.geometry.width, flow.geometry.height];
    let bound = if flow.wall_shear.singular_corners.is_empty() {
        ""
    } else {
        " away from sharp re-entrant corners, beside which it has no bound"
    };
    let largest = format!(
        "largest{bound}: {} {}, at {}; mean over the wall: {}",
        significant(local.top, 4),
        local.unit,
        numbers::place(local.top_at, extent, 4),
        significant(local.mean, 4),
    );
    page.y += 10.0;
    shear_mark(&mut page.drawing, [MARGIN + 9.0, page.y + 10.0]);
    page.paragraph(&largest, TextSize::Medium, MARGIN + 28.0);
    let totals: Vec<String> = ["over_etch", "depth", "width"]
        .iter()
        .filter_map(|name| {
            let case = document.study.case(name)?;
            let percent = 100.0 * 1e-6 * case.per_metre()?;
            Some(format!("{name} {} %", significant(percent, 4)))
        })
        .collect();
    let totals = format!("change of K for 1 \u{b5}m: {}", totals.join(", "));
    page.paragraph(&totals, TextSize::Medium, MARGIN);
    let _ = write!(page.drawing.description, " {largest}; {totals}.");
}
