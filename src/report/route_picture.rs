//! The picture of a route: pressure, resistance per length and wall shear along its length, one below the other.
//!
//! Segments follow each other on one axis; branches beside each other are drawn in one stretch with lines of
//! their own, named at their ends. Stations are dots. Without a fluid `1/K` is shown instead, without a flow it
//! alone.

use std::fmt::Write as _;

use super::drawing::{Anchor, Colour, Drawing, INK, Item, PAPER, TextSize};
use super::line_style::dashed;
use super::numbers::{self, significant, with_unit};
use super::picture::{MARGIN, PictureError, PictureFormat};
use super::png::to_png;
use super::route_document::RouteDocument;
use super::svg::to_svg;
use super::table::wrapped;
use super::ticks;
use crate::geometry::Point;
use crate::study::{Between, LawOfK, UsedRule};

const PLOT_WIDTH: f64 = 1000.0;
const PLOT_HEIGHT: f64 = 190.0;
/// Room for the labels of the axis, px.
const AXIS_ROOM: f64 = 86.0;
/// Between two plots, px.
const GAP: f64 = 44.0;
/// Steps of a curve between two stations.
const STEPS: usize = 24;
const MOST_TICKS: usize = 5;
const GRID: Colour = [214, 214, 214];
/// Lines of branches; dashes and names say the same.
const BRANCHES: [Colour; 4] = [[0, 90, 156], [176, 48, 0], [0, 110, 70], [110, 40, 130]];
const DASHES: [&[f64]; 4] = [&[], &[10.0, 5.0], &[3.0, 4.0], &[14.0, 4.0, 3.0, 4.0]];

/// The picture as the bytes of a file.
///
/// # Errors
/// [`PictureError`] when there is nothing to draw or the encoder refuses.
pub fn route_picture(
    document: &RouteDocument<'_>,
    format: PictureFormat,
) -> Result<Vec<u8>, PictureError> {
    let drawing = draw_route(document)?;
    Ok(match format {
        PictureFormat::Png => to_png(&drawing)?,
        PictureFormat::Svg => to_svg(&drawing)?.into_bytes(),
    })
}

/// The picture as a drawing.
///
/// # Errors
/// [`PictureError::NoExtent`] for a route without length.
pub fn draw_route(document: &RouteDocument<'_>) -> Result<Drawing, PictureError> {
    let length = document.route.length();
    if !(length.is_finite() && length > 0.0) {
        return Err(PictureError::NoExtent);
    }
    let mut page = RoutePage {
        document,
        length,
        drawing: Drawing {
            width: (PLOT_WIDTH + 2.0 * MARGIN + 2.0 * AXIS_ROOM) as u32,
            height: 0,
            title: String::new(),
            description: String::new(),
            items: Vec::new(),
        },
        y: MARGIN,
    };
    page.heading();
    page.segment_names();
    for quantity in Shown::of(document) {
        page.plot(quantity);
    }
    page.axis();
    page.notes();
    page.drawing.height = (page.y + MARGIN).ceil() as u32;
    Ok(page.drawing)
}

/// What a plot shows.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Shown {
    Pressure,
    ResistancePerLength,
    Inverse,
    Shear,
}

impl Shown {
    fn of(document: &RouteDocument<'_>) -> Vec<Self> {
        let flows = !document.operations.is_empty();
        let mut all = Vec::new();
        if flows {
            all.push(Self::Pressure);
        }
        all.push(if document.fluid.is_some() {
            Self::ResistancePerLength
        } else {
            Self::Inverse
        });
        if flows {
            all.push(Self::Shear);
        }
        all
    }
}

/// One line of a plot.
struct Line {
    branch: usize,
    /// Position along the route and value, SI.
    points: Vec<Point>,
    /// Those at stations.
    marks: Vec<Point>,
}

struct RoutePage<'a> {
    document: &'a RouteDocument<'a>,
    length: f64,
    drawing: Drawing,
    y: f64,
}

impl RoutePage<'_> {
    fn paragraph(&mut self, text: &str, size: TextSize) {
        let room = (f64::from(self.drawing.width) - 2.0 * MARGIN) / size.advance();
        for line in wrapped(text, room.floor() as usize) {
            self.y += size.line_height();
            let at = [MARGIN, self.y - 5.0];
            self.drawing.text(at, Anchor::Start, size, line);
        }
    }

    fn x(&self, position: f64) -> f64 {
        MARGIN + AXIS_ROOM + position / self.length * PLOT_WIDTH
    }

    fn heading(&mut self) {
        let document = self.document;
        let name = numbers::title(document.name);
        let mut what = format!(
            "length {}, volume {} \u{b5}L",
            with_unit(self.length, numbers::LENGTHS, 4),
            significant(document.route.volume() / 1e-9, 4)
        );
        if let Some(resistance) = document.resistance() {
            let _ = write!(
                what,
                ", R = {} Pa s/m\u{b3}",
                significant(resistance.value, 5)
            );
        }
        if let Some(operation) = document.operations.first() {
            let _ = write!(
                what,
                "; at {}: pressure drop {}, largest wall shear {} Pa ({})",
                with_unit(operation.flow_rate, numbers::FLOW_RATES, 4),
                with_unit(operation.pressure_drop, numbers::PRESSURES, 4),
                significant(operation.shear_max, 4),
                document.place(operation.shear_at)
            );
        }
        self.drawing.title = format!("route {name} along its length");
        self.drawing.description = format!("{name}: {what}.");
        self.paragraph(&name, TextSize::Large);
        self.y += 6.0;
        self.paragraph(&what, TextSize::Medium);
        self.y += 20.0;
    }

    /// Where segments begin, the end of the last included, m.
    fn bounds(&self) -> Vec<f64> {
        let mut at = vec![0.0];
        for segment in &self.document.route.segments {
            let longest = segment
                .branches
                .iter()
                .map(|b| b.length)
                .fold(0.0, f64::max);
            at.push(at.last().copied().unwrap_or(0.0) + longest);
        }
        at
    }

    fn segment_names(&mut self) {
        let bounds = self.bounds();
        let base = self.y + 12.0;
        for (segment, pair) in self.document.route.segments.iter().zip(bounds.windows(2)) {
            let count: usize = segment.branches.iter().map(|b| b.count).sum();
            let mut name = numbers::title(&segment.name);
            if count > 1 {
                let _ = write!(name, " (x{count})");
            }
            let (from, to) = (self.x(pair[0]), self.x(pair[1]));
            let most = ((to - from - 6.0) / TextSize::Small.advance()).max(0.0) as usize;
            if name.chars().count() > most && most >= 4 {
                name = name.chars().take(most - 2).chain("..".chars()).collect();
            }
            if name.chars().count() <= most {
                let at = [0.5 * (from + to), base];
                self.drawing.text(at, Anchor::Middle, TextSize::Small, name);
            }
        }
        self.y += 34.0;
    }

    fn lines(&self, shown: Shown) -> Vec<Line> {
        let document = self.document;
        let bounds = self.bounds();
        let mut lines = Vec::new();
        for (s, segment) in document.route.segments.iter().enumerate() {
            for (b, branch) in segment.branches.iter().enumerate() {
                let operation = document
                    .operations
                    .first()
                    .and_then(|o| o.segments.get(s)?.branches.get(b));
                let value = |index: usize| {
                    let at = operation.and_then(|o| o.points.get(index));
                    let k = document.route.flows[branch.points[index].flow]
                        .flow
                        .conductance
                        .value;
                    match shown {
                        Shown::Pressure => at.map_or(0.0, |at| at.pressure),
                        Shown::Shear => at.map_or(0.0, |at| at.local.wall_shear_max),
                        Shown::ResistancePerLength => {
                            document.fluid.map_or(0.0, |f| f.viscosity) / k
                        }
                        Shown::Inverse => 1.0 / k,
                    }
                };
                let place = |index: usize| bounds[s] + branch.points[index].position;
                let mut points = Vec::new();
                let mut marks = Vec::new();
                for (index, point) in branch.points.iter().enumerate() {
                    points.push([place(index), value(index)]);
                    if point.station.is_some() {
                        marks.push([place(index), value(index)]);
                    }
                    let way = point.station.and_then(|station| branch.ways.get(station));
                    let Some((
                        Between {
                            used: UsedRule::Law(law),
                            ..
                        },
                        _,
                    )) = way
                    else {
                        continue;
                    };
                    if index + 1 < branch.points.len() {
                        let ends = [index, index + 1];
                        let k = ends.map(|i| {
                            document.route.flows[branch.points[i].flow]
                                .flow
                                .conductance
                                .value
                        });
                        points.extend(curve(shown, *law, k, ends.map(|i| [place(i), value(i)])));
                    }
                }
                lines.push(Line {
                    branch: b,
                    points,
                    marks,
                });
            }
        }
        lines
    }

    fn plot(&mut self, shown: Shown) {
        let lines = self.lines(shown);
        let all = lines.iter().flat_map(|l| &l.points).map(|p| p[1]);
        let top = all.fold(0.0, f64::max);
        if !(top.is_finite() && top > 0.0) {
            return;
        }
        let (head, unit, size) = match shown {
            Shown::Pressure => {
                let (unit, size) = numbers::fitting_unit(top, numbers::PRESSURES);
                ("pressure above the outlet", unit.to_owned(), size)
            }
            Shown::Shear => {
                let (unit, size) = numbers::fitting_unit(top, numbers::PRESSURES);
                (
                    "largest wall shear at the solved sections",
                    unit.to_owned(),
                    size,
                )
            }
            Shown::ResistancePerLength | Shown::Inverse => {
                let power = top.log10().floor() as i32;
                let (what, of) = if shown == Shown::Inverse {
                    ("1/K", "1/m^4")
                } else {
                    ("resistance per length mu/K", "Pa s/m^4")
                };
                (what, format!("(1e{power} {of})"), 10_f64.powi(power))
            }
        };
        let (left, right) = (MARGIN + AXIS_ROOM, MARGIN + AXIS_ROOM + PLOT_WIDTH);
        let label = format!("{head} / {unit}");
        self.drawing
            .text([left, self.y], Anchor::Start, TextSize::Small, label);
        self.y += 10.0;
        let floor = self.y + PLOT_HEIGHT;
        let reach = 1.06 * top;
        let height = |v: f64| floor - v / reach * PLOT_HEIGHT;
        let (levels, step) = ticks::levels(reach / size, MOST_TICKS);
        for value in std::iter::once(0.0).chain(levels) {
            let y = height(value * size);
            self.drawing
                .lines(vec![vec![[left, y], [right, y]]], GRID, 1.0);
            let label = ticks::label(value, step);
            self.drawing
                .text([left - 10.0, y + 5.0], Anchor::End, TextSize::Small, label);
        }
        for bound in self.bounds() {
            let x = self.x(bound);
            let line = dashed(&[[x, self.y], [x, floor]], &[4.0, 4.0]);
            self.drawing.lines(line, INK, 0.8);
        }
        self.drawing.lines(
            vec![vec![[left, self.y], [left, floor], [right, floor]]],
            INK,
            1.0,
        );
        for line in &lines {
            let page: Vec<Point> = line
                .points
                .iter()
                .map(|p| [self.x(p[0]), height(p[1])])
                .collect();
            let style = line.branch % BRANCHES.len();
            let drawn = if DASHES[style].is_empty() {
                vec![page]
            } else {
                dashed(&page, DASHES[style])
            };
            self.drawing.lines(drawn, BRANCHES[style], 2.2);
            for mark in &line.marks {
                self.dot([self.x(mark[0]), height(mark[1])], BRANCHES[style]);
            }
        }
        self.y = floor + GAP;
    }

    fn dot(&mut self, [x, y]: Point, colour: Colour) {
        let ring = |radius: f64| -> Vec<Point> {
            (0..16)
                .map(|i| {
                    let (sine, cosine) = (f64::from(i) * std::f64::consts::TAU / 16.0).sin_cos();
                    [x + radius * cosine, y + radius * sine]
                })
                .collect()
        };
        for (radius, fill) in [(5.0, PAPER), (3.6, colour)] {
            self.drawing.items.push(Item::Area {
                loops: vec![ring(radius)],
                fill,
            });
        }
    }

    /// Ticks of length below the last plot.
    fn axis(&mut self) {
        let (name, size) = numbers::fitting_unit(self.length, numbers::LENGTHS);
        let base = self.y - GAP;
        let Some(step) = ticks::round_above(self.length / size / 10.0) else {
            return;
        };
        let count = (self.length / size / step * (1.0 + 1e-9)).floor() as usize;
        for k in 0..=count {
            let value = step * k as f64;
            let x = self.x(value * size);
            self.drawing
                .lines(vec![vec![[x, base], [x, base + 6.0]]], INK, 1.0);
            let label = ticks::label(value, step);
            self.drawing
                .text([x, base + 20.0], Anchor::Middle, TextSize::Small, label);
        }
        self.y = base + 42.0;
        let at = [MARGIN + AXIS_ROOM + 0.5 * PLOT_WIDTH, self.y];
        let label = format!("distance along the longest branches / {name}");
        self.drawing
            .text(at, Anchor::Middle, TextSize::Small, label);
        self.y += 16.0;
    }

    /// Which line is which branch, and what dots are.
    fn notes(&mut self) {
        for segment in self
            .document
            .route
            .segments
            .iter()
            .filter(|s| s.branches.len() > 1)
        {
            self.y += 6.0;
            self.paragraph(
                &format!("branches of segment {}:", numbers::title(&segment.name)),
                TextSize::Medium,
            );
            for (index, branch) in segment.branches.iter().enumerate() {
                self.y += TextSize::Medium.line_height();
                let style = index % BRANCHES.len();
                let sample = [
                    [MARGIN + 10.0, self.y - 10.0],
                    [MARGIN + 74.0, self.y - 10.0],
                ];
                let drawn = if DASHES[style].is_empty() {
                    vec![sample.to_vec()]
                } else {
                    dashed(&sample, DASHES[style])
                };
                self.drawing.lines(drawn, BRANCHES[style], 2.2);
                let text = format!(
                    "{}, {} % of the flow",
                    numbers::title(&branch.name),
                    significant(100.0 * branch.share, 4)
                );
                let at = [MARGIN + 86.0, self.y - 5.0];
                self.drawing.text(at, Anchor::Start, TextSize::Medium, text);
            }
        }
        self.y += 6.0;
        let text = "dots: stations; dashed verticals: ends of segments; curves between dots: the stated interpolation \
                    (shear: straight)";
        self.paragraph(text, TextSize::Small);
        if !self.document.operations.is_empty() {
            let text =
                "A resistance is not a pressure rating: bonded chips and fittings can burst.";
            self.paragraph(text, TextSize::Small);
        }
    }
}

/// Points between two stations by a law of `K`.
fn curve(shown: Shown, law: LawOfK, k: [f64; 2], ends: [Point; 2]) -> Vec<Point> {
    let [from, to] = ends;
    let whole = law.inverse(k[0], k[1], 1.0);
    (1..STEPS)
        .filter_map(|step| {
            let share = step as f64 / STEPS as f64;
            let value = match shown {
                Shown::Pressure => {
                    from[1] + (to[1] - from[1]) * law.inverse(k[0], k[1], share) / whole
                }
                Shown::ResistancePerLength | Shown::Inverse => {
                    from[1] * k[0] / law.conductance(k[0], k[1], share)
                }
                Shown::Shear => return None,
            };
            Some([from[0] + share * (to[0] - from[0]), value])
        })
        .collect()
}
