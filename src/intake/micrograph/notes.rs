//! What a person must know about the contour: steps, and warnings where something is in doubt.

use super::grey::Grey;
use super::grey_edge::GREY_EDGE;
use super::options::{Denoise, MicrographOptions, Threshold};
use super::outline_of_loops::Outlines;
use super::region_choice::Chosen;
use super::section_contour::Traced;
use crate::intake::step::Step;
use crate::units::{format_length, format_percent, format_significant};
use crate::warning::{Code, Warning};

/// Difference of the contour's level from Otsu's threshold that is worth a warning, share of the contrast.
const LEVEL_DIFFERENCE: f64 = 0.15;
/// Share of edge pixels without a grey in between above which a picture counts as black and white.
const MOST_JUMPS: f64 = 0.7;
/// Foreseen excess of the perimeter by noise that is worth a warning.
const PERIMETER_EXCESS: f64 = 2e-3;
/// Share of the area in filled islands that is worth a warning.
const FILLED_SHARE: f64 = 1e-3;

/// Steps and warnings as they are collected.
#[derive(Debug)]
pub(super) struct Notes<'a> {
    pub(super) grey: &'a Grey,
    pub(super) options: &'a MicrographOptions,
    pub(super) metres_per_pixel: [f64; 2],
    pub(super) steps: Vec<Step>,
    pub(super) warnings: Vec<Warning>,
}

impl Notes<'_> {
    fn warn(
        &mut self,
        code: Code,
        message: String,
        advice: impl Into<String>,
        numbers: &[(&'static str, f64)],
    ) {
        self.warnings.push(Warning {
            code,
            message,
            advice: advice.into(),
            numbers: numbers.to_vec(),
        });
    }

    /// Where the level of the contour comes from.
    pub(super) fn levels(&mut self, chosen: &Chosen, traced: &Traced) {
        let value = |counts: f64| format_significant(self.grey.to_file(counts), 5);
        let (level, sides) = (traced.level.counts, &traced.sides);
        let threshold = chosen.classes.threshold;
        let beside = format!(
            "beside the wall the fluid has {} and the wall {}",
            value(sides.fluid),
            value(sides.wall)
        );
        let text = match self.options.threshold {
            Threshold::Otsu => format!(
                "Otsu's threshold is grey value {} (classes {} of their scatter apart); {beside}, and the contour \
                 is taken half-way, at {}",
                value(threshold),
                format_significant(chosen.classes.separation().min(1e3), 3),
                value(level)
            ),
            Threshold::Walls(..) => format!(
                "the stated patches have {} in the fluid and {} in the wall; the contour is taken half-way, at {}",
                value(sides.fluid),
                value(sides.wall),
                value(level)
            ),
            _ => format!(
                "the contour is taken at the stated grey value {}; {beside}",
                value(level)
            ),
        };
        let numbers = [
            ("contour", self.grey.to_file(level)),
            ("fluid", self.grey.to_file(sides.fluid)),
            ("wall", self.grey.to_file(sides.wall)),
        ];
        self.steps.push(Step::new("threshold", text).with(&numbers));
        let share = (level - sides.at(0.5)) / (sides.fluid - sides.wall);
        let otsu_share = (threshold - sides.at(0.5)) / (sides.fluid - sides.wall);
        if self.options.threshold == Threshold::Otsu {
            if otsu_share.abs() > LEVEL_DIFFERENCE {
                let message = format!(
                    "Otsu's threshold lies {} of the contrast off the half-way level of the wall that was used: the \
                     picture has more than two tones or uneven light",
                    format_percent(otsu_share.abs(), 2)
                );
                let advice = "look at the contour; state fluid and wall with --threshold FLUID_X,FLUID_Y:WALL_X,WALL_Y";
                self.warn(Code::ChoiceMade, message, advice, &[("share", otsu_share)]);
            }
        } else if share.abs() > LEVEL_DIFFERENCE {
            let message = format!(
                "the stated level lies {} of the contrast off half-way between fluid and wall",
                format_percent(share.abs(), 2)
            );
            let advice = "half-way is where an edge pixel is half wall; --threshold otsu takes it";
            self.warn(Code::ChoiceMade, message, advice, &[("share", share)]);
        }
    }

    /// Islands that stay and islands that were filled.
    pub(super) fn islands(&mut self, traced: &Traced) {
        let kept = traced.loops.len().saturating_sub(1);
        let (count, pixels) = traced.filled;
        let least = self.options.smallest_island.map_or_else(
            || "30 pixels".to_owned(),
            |area| format!("{} um^2 as asked", format_significant(area * 1e12, 4)),
        );
        let share = pixels / traced.area;
        let text = format!(
            "{kept} islands stay; {count} below {least} are filled, {} of the area in all",
            format_percent(share, 2)
        );
        let numbers = [
            ("islands", kept as f64),
            ("filled", count as f64),
            ("filled_share", share),
        ];
        self.steps.push(Step::new("islands", text).with(&numbers));
        if share > FILLED_SHARE {
            let message = format!(
                "{count} small islands were filled, {} of the area",
                format_percent(share, 2)
            );
            let advice = "if they are noise take it down with --denoise; if they are there set --islands-above";
            self.warn(
                Code::ChoiceMade,
                message,
                advice,
                &[("filled_share", share)],
            );
        }
    }

    /// How wide the edge is, and whether there is a reach.
    pub(super) fn edge(&mut self, traced: &Traced, has_reach: bool) {
        let edge = match &traced.edge {
            Ok(edge) => edge,
            Err(problem) => {
                let text = format!("no smallest and largest section: {}", problem.text());
                self.steps.push(Step::new("edge", text.clone()));
                let advice = "levels nearer to each other may do: --reach-levels 35%,65%";
                self.warn(Code::GreyEdge, text, advice, &[]);
                return;
            }
        };
        let [outer, inner] = self
            .options
            .reach_levels
            .map(|share| format_percent(share, 3));
        let [x, y] = self.metres_per_pixel;
        let metres = edge.width * (x * y).sqrt();
        let blur = match self.options.denoise {
            Denoise::None => "",
            _ => ", with the blur of --denoise",
        };
        let width = format!(
            "{} pixels ({}) wide between {outer} and {inner} of the way from wall to fluid{blur}",
            format_significant(edge.width, 3),
            format_length(metres)
        );
        let numbers = [("edge_px", edge.width), ("edge_m", metres)];
        if traced.grey_edge().is_none() {
            let place = if traced.by_areas {
                "the wall is placed by the sum of the greys across it"
            } else {
                "the wall is placed between two pixels"
            };
            let text = format!(
                "the edge is {width}: as sharp as pixels are, so there is no reach; {place}"
            );
            self.steps.push(Step::new("edge", text).with(&numbers));
            return;
        }
        let text = format!("the edge is {width}");
        // An error function has 20 % and 80 % at 0.8416 deviations; curved walls move by s^2 / (2 r).
        let deviation = edge.standard_width / (2.0 * 0.8416);
        let radius = (traced.area / std::f64::consts::PI).sqrt();
        let step = format!(
            "{text}; such a blur draws a round wall of this area in by about {} pixels",
            format_significant(deviation * deviation / (2.0 * radius), 2)
        );
        self.steps.push(Step::new("edge", step).with(&numbers));
        let (message, advice) = if has_reach {
            (
                format!("{text}: the section lies between the contours at these levels"),
                "a sharper picture narrows it; where the wall lies in the grey is not known better",
            )
        } else {
            (
                format!("{text}, but its contours could not be nested"),
                "set other levels with --reach-levels",
            )
        };
        let numbers = [numbers[0], numbers[1], ("sharp_edge_px", GREY_EDGE)];
        self.warn(Code::GreyEdge, message, advice, &numbers);
    }

    /// Whether the perimeter can be trusted: black and white pictures and noise make it long.
    pub(super) fn quality(&mut self, traced: &Traced) {
        if traced.jumps > MOST_JUMPS {
            let message = format!(
                "the picture is black and white at the wall ({} of its edge pixels have no grey between the \
                 tones): the contour has the steps of the pixels and its perimeter is up to 8 % long on slopes",
                format_percent(traced.jumps, 2)
            );
            let advice = "give the picture as it was before it was made black and white, or --denoise gauss:1";
            self.warn(
                Code::PerimeterSampling,
                message,
                advice,
                &[("jumps", traced.jumps)],
            );
            return;
        }
        let excess = perimeter_excess(traced);
        if excess > PERIMETER_EXCESS {
            let message = format!(
                "noise of neighbouring pixels ({} of the contrast) and the lattice of pixels make the contour rough: \
                 its perimeter is about {} too long",
                format_percent(traced.sides.noise / traced.sides.contrast(), 2),
                format_percent(excess, 2)
            );
            let advice = "take the noise down with --denoise gauss:1.5";
            self.warn(
                Code::PerimeterSampling,
                message,
                advice,
                &[("perimeter_excess", excess)],
            );
        }
    }

    /// How many vertices stay.
    pub(super) fn vertices(&mut self, traced: &Traced, built: &Outlines) {
        let before: usize = traced.loops.iter().map(Vec::len).sum();
        let after: usize = built.section.loops.iter().map(Vec::len).sum();
        let text = format!(
            "{before} crossings of the contour become {after} vertices within {} pixels, the area kept",
            format_significant(built.tolerance, 3)
        );
        let numbers = [
            ("vertices", after as f64),
            ("tolerance_px", built.tolerance),
        ];
        self.steps.push(Step::new("simplify", text).with(&numbers));
    }
}

/// Foreseen excess of the perimeter: half the mean square slope that noise gives the contour, halved again
/// since crossings of rows and columns alternate along it (as measured: test `noise_makes_the_perimeter_long`),
/// and 0.25 % where sharp edges are placed between two pixels only.
fn perimeter_excess(traced: &Traced) -> f64 {
    let noise = traced.sides.noise / traced.sides.contrast();
    let edge = traced.edge.as_ref();
    let width = edge.map_or(1.0, |edge| edge.standard_width.max(0.6));
    let (slope, lattice) = if traced.by_areas {
        (2.0 * noise, 0.0)
    } else if width <= GREY_EDGE {
        (noise * width / 0.6, 2.5e-3)
    } else {
        (noise * width / 0.6, 0.0)
    };
    0.25 * slope * slope + lattice
}
