//! What the usual shortcut formulas say of a section, and how far off they are.
//!
//! Every row is a formula that people use instead of solving: it is evaluated on a few measures of the
//! outline (widths, height, area, perimeter, polar moment) and set against the solved conductance. A row
//! without meaning for the section has no number, only the reason.
//!
//! Measures, all exact for the polygon. Height: that of the bounding box. Top width: the chord of fluid just
//! under the highest point, as a limit (the lid width of a groove under a flat lid). Bottom width: likewise
//! just over the lowest point. Mid-height width: the chord at half height. Equal-area width: area over
//! height. In the rectangle and plate formulas `h` is always the shorter side, whichever way the section
//! lies.

use std::f64::consts::PI;

use crate::geometry::Outline;

use super::chords::{Chord, Side, chord};

/// One shortcut formula against the solved section.
#[derive(Debug, Clone, PartialEq)]
pub struct ShortcutRow {
    /// Name of the formula.
    pub name: &'static str,
    /// Where it is published.
    pub source: &'static str,
    /// Where it holds.
    pub range: &'static str,
    /// Conductance it gives, m^4; `None` when it has no meaning for the section, `remark` says why.
    pub conductance: Option<f64>,
    /// Relative error of its resistance, `K_solved / K_formula - 1`; `None` without a number on either side.
    pub resistance_error: Option<f64>,
    /// What to know about this row for this section: measures used, range left, or the reason for no number.
    pub remark: String,
}

/// A width below this share of the equal-area width is no side of a rectangle any more.
const LEAST_WIDTH_SHARE: f64 = 0.05;
/// Short over long side up to which plates are within 3 % (common practice: 20 times as wide as high).
const PLATES_UP_TO: f64 = 0.05;
/// Short over long side up to which the 0.63 form is within 0.2 % of the series (computed).
const LINEAR_UP_TO: f64 = 0.5;

/// Fixed texts of one formula.
struct Formula {
    name: &'static str,
    source: &'static str,
    range: &'static str,
}

/// A conductance with a remark, or the reason why there is none.
type Outcome = Result<(f64, String), String>;
/// How a formula is evaluated.
type Evaluate = fn(&Measures) -> Outcome;

/// Measures of a section with one lumen and no island.
struct Measures {
    area: f64,
    perimeter: f64,
    height: f64,
    top: Chord,
    middle: Chord,
    bottom: Chord,
    polar_moment: f64,
}

const PLATES: Formula = Formula {
    name: "parallel plates, w h^3 / 12",
    source: "textbook; no side walls",
    range: "w/h above 20 for 3 %",
};
const LINEAR_SOURCE: &str = "first term of the Fourier series; Bruus (2008), Theoretical Microfluidics, Oxford (from memory)";
const LINEAR_RANGE: &str =
    "rectangles; R within 0.2 % for h/w up to 0.5, 14 % too high at h = w (computed)";
const PIPE: Formula = Formula {
    name: "round pipe of equal hydraulic diameter, pi Dh^4 / 128",
    source: "textbook",
    range: "circles; elsewhere the area of that pipe is not the area of the section",
};
const PIPE_FRICTION: Formula = Formula {
    name: "friction of a round pipe (f Re = 16 on Dh) with the section's own area, A Dh^2 / 32",
    source: "textbook",
    range: "near-round sections; rectangles from 11 % low (square) to 50 % high (plates) in K",
};
const POLAR: Formula = Formula {
    name: "polar moment, A^4 / (16 pi^2 Ip)",
    source: "Saint-Venant (1879), torsion; Bahrami, Yovanovich and Culham (2006), J. Fluids Eng. 128, 1036 \
             (formula and page from memory)",
    range: "exact for ellipses; R -12 % (equilateral triangle) to +10 % (flat rectangle), more for slender \
            triangles and re-entrant sections (computed)",
};
const ROOT_AREA: Formula = Formula {
    name: "sqrt(A) with an aspect ratio",
    source: "Muzychka and Yovanovich (2009), J. Fluids Eng. 131, 061401 (abstract read; formula from memory)",
    range: "regular shapes 10 % by the abstract; flat triangles fail by +17 % and more (computed)",
};
const COMPACT_SOURCE: &str = "Mortensen, Okkels and Bruus (2005), Phys. Rev. E 71, 057301 (abstract read; \
                              coefficients from memory)";

/// What the usual formulas say of a section.
///
/// - `outline`: the section, m
/// - `conductance`: its solved conductance, m^4
///
/// Rows come in a fixed order, the same for every section.
///
/// # Examples
/// ```
/// use etchwise::{flow::{closed_form, shortcuts}, geometry::Outline};
/// let square = Outline::single(vec![[0.0, 0.0], [1e-4, 0.0], [1e-4, 1e-4], [0.0, 1e-4]]);
/// let solved = closed_form::rectangle(1e-4, 1e-4)?.conductance;
/// let rows = shortcuts(&square, solved);
/// let polar = rows.iter().find(|row| row.name.starts_with("polar moment")).expect("a row");
/// assert!((polar.resistance_error.expect("a number") + 0.075).abs() < 5e-4);
/// # Ok::<(), closed_form::ClosedFormError>(())
/// ```
pub fn shortcuts(outline: &Outline, conductance: f64) -> Vec<ShortcutRow> {
    let measures = Measures::of(outline);
    formulas()
        .into_iter()
        .map(|(formula, evaluate)| {
            let outcome = match &measures {
                Ok(measures) => evaluate(measures),
                Err(reason) => Err(reason.clone()),
            };
            row(&formula, outcome, conductance)
        })
        .collect()
}

/// All formulas in the order of the rows.
fn formulas() -> Vec<(Formula, Evaluate)> {
    let linear = |name| Formula {
        name,
        source: LINEAR_SOURCE,
        range: LINEAR_RANGE,
    };
    let compact = |name, range| Formula {
        name,
        source: COMPACT_SOURCE,
        range,
    };
    vec![
        (PLATES, |m| Ok(plates(m))),
        (linear("rectangle 1 - 0.63 h/w on the top width"), |m| {
            linear_rectangle(m, m.side_width(m.top, "top"))
        }),
        (
            linear("rectangle 1 - 0.63 h/w on the mid-height width"),
            |m| linear_rectangle(m, m.side_width(m.middle, "mid-height")),
        ),
        (
            linear("rectangle 1 - 0.63 h/w on the mean of top and bottom width"),
            |m| linear_rectangle(m, m.mean_of_top_and_bottom()),
        ),
        (
            linear("rectangle 1 - 0.63 h/w on the equal-area width"),
            |m| linear_rectangle(m, Ok(m.equal_area_width())),
        ),
        (PIPE, |m| {
            let dh = m.hydraulic_diameter();
            Ok((PI * dh.powi(4) / 128.0, format!("Dh = {dh:.4e} m")))
        }),
        (PIPE_FRICTION, |m| {
            let dh = m.hydraulic_diameter();
            Ok((m.area * dh * dh / 32.0, format!("Dh = {dh:.4e} m")))
        }),
        (POLAR, |m| {
            let k = m.area.powi(4) / (16.0 * PI * PI * m.polar_moment);
            Ok((k, String::new()))
        }),
        (ROOT_AREA, root_area),
        (
            compact(
                "compactness, ellipse form, alpha = (8/3) C - 8 pi/3",
                "ellipses: R within 0.14 % for axes up to 2:1, 4 % at 10:1 (computed)",
            ),
            |m| {
                Ok(compactness(
                    m,
                    8.0 / 3.0,
                    -8.0 * PI / 3.0,
                    4.0 * PI,
                    "an ellipse",
                ))
            },
        ),
        (
            compact(
                "compactness, rectangle form, alpha = (22/7) C - 65/3",
                "rectangles: R within 0.6 % for C up to 29, 3.1 % at 20:1 (computed)",
            ),
            |m| Ok(compactness(m, 22.0 / 7.0, -65.0 / 3.0, 16.0, "a rectangle")),
        ),
        (
            compact(
                "compactness, triangle form, alpha = (25/17) C + 40 sqrt(3)/17",
                "triangles: R within 0.9 % for isosceles ones with apex 10 to 170 degrees (computed)",
            ),
            |m| {
                let root = 3.0_f64.sqrt();
                let intercept = 40.0 * root / 17.0;
                Ok(compactness(
                    m,
                    25.0 / 17.0,
                    intercept,
                    12.0 * root,
                    "a triangle",
                ))
            },
        ),
    ]
}

impl Measures {
    /// The measures, or why the formulas have no meaning.
    fn of(outline: &Outline) -> Result<Self, String> {
        if outline.lumens.len() != 1 {
            return Err(format!(
                "no meaning: the section has {} lumens and the formula knows one",
                outline.lumens.len()
            ));
        }
        let islands: usize = outline.lumens.iter().map(|l| l.islands.len()).sum();
        if islands > 0 {
            return Err(format!(
                "no meaning: {islands} island(s) in the section and the formula knows none"
            ));
        }
        let area = outline.area();
        let (low, high) = outline
            .bounds()
            .filter(|_| area.is_finite() && area > 0.0)
            .ok_or_else(|| "no meaning: the section has no area".to_owned())?;
        Ok(Self {
            area,
            perimeter: outline.wetted_perimeter(),
            height: high[1] - low[1],
            top: chord(outline, high[1], Side::Below),
            middle: chord(outline, 0.5 * (low[1] + high[1]), Side::Below),
            bottom: chord(outline, low[1], Side::Above),
            polar_moment: outline.polar_moment(),
        })
    }

    fn hydraulic_diameter(&self) -> f64 {
        4.0 * self.area / self.perimeter
    }

    fn equal_area_width(&self) -> f64 {
        self.area / self.height
    }

    /// A chord as side of a rectangle, or why it is none.
    fn side_width(&self, chord: Chord, place: &str) -> Result<f64, String> {
        if chord.pieces > 1 {
            return Err(format!(
                "no meaning: the {place} width is in {} pieces",
                chord.pieces
            ));
        }
        let share = chord.length / self.equal_area_width();
        if share < LEAST_WIDTH_SHARE {
            return Err(format!(
                "no meaning: the section closes at this height, the {place} width is {:.2} % of the \
                 equal-area width",
                100.0 * share
            ));
        }
        Ok(chord.length)
    }

    /// Mean of top and bottom width; either end may be a point, not both.
    fn mean_of_top_and_bottom(&self) -> Result<f64, String> {
        for (chord, place) in [(self.top, "top"), (self.bottom, "bottom")] {
            if chord.pieces > 1 {
                return Err(format!(
                    "no meaning: the {place} width is in {} pieces",
                    chord.pieces
                ));
            }
        }
        let mean = Chord {
            length: 0.5 * (self.top.length + self.bottom.length),
            pieces: 1,
        };
        self.side_width(mean, "mean")
    }
}

/// One row from its formula and outcome.
fn row(formula: &Formula, outcome: Outcome, solved: f64) -> ShortcutRow {
    let (conductance, mut remark) = match outcome {
        Ok((k, remark)) if k.is_finite() && k > 0.0 => (Some(k), remark),
        Ok((k, _)) => (
            None,
            format!("no meaning: outside its range the formula gives K = {k:.3e} m^4"),
        ),
        Err(reason) => (None, reason),
    };
    let known = solved.is_finite() && solved > 0.0;
    if !known && conductance.is_some() {
        remark = join(&remark, "no solved conductance to compare with");
    }
    ShortcutRow {
        name: formula.name,
        source: formula.source,
        range: formula.range,
        conductance,
        resistance_error: conductance.filter(|_| known).map(|k| solved / k - 1.0),
        remark,
    }
}

/// Two remarks as one text.
fn join(first: &str, second: &str) -> String {
    match (first.is_empty(), second.is_empty()) {
        (true, _) => second.to_owned(),
        (_, true) => first.to_owned(),
        _ => format!("{first}; {second}"),
    }
}

/// Short and long side of width and height, and a note when the section stands upright.
fn orientation(width: f64, height: f64) -> (f64, f64, &'static str) {
    if height > width {
        (
            width,
            height,
            "higher than wide: h is the width, the shorter side",
        )
    } else {
        (height, width, "")
    }
}

/// Parallel plates on the equal-area width.
fn plates(m: &Measures) -> (f64, String) {
    let width = m.equal_area_width();
    let (h, w, upright) = orientation(width, m.height);
    let range = if h / w > PLATES_UP_TO {
        format!("outside its range: w/h = {:.3}", w / h)
    } else {
        String::new()
    };
    let measures = format!("equal-area width {width:.4e} m, height {:.4e} m", m.height);
    (
        w * h.powi(3) / 12.0,
        join(&join(&measures, upright), &range),
    )
}

/// The 0.63 form on a width.
fn linear_rectangle(m: &Measures, width: Result<f64, String>) -> Outcome {
    let width = width?;
    let (h, w, upright) = orientation(width, m.height);
    let range = if h / w > LINEAR_UP_TO {
        format!("outside its range: h/w = {:.3}", h / w)
    } else {
        String::new()
    };
    let measures = format!("width {width:.4e} m, height {:.4e} m", m.height);
    Ok((
        w * h.powi(3) / 12.0 * (1.0 - 0.63 * h / w),
        join(&join(&measures, upright), &range),
    ))
}

/// `f Re_sqrtA = 12 / (sqrt(e) (1 + e) [1 - (192 e / pi^5) tanh(pi / 2e)])`,
/// `K = 2 A^(5/2) / (P f Re_sqrtA)`.
fn root_area(m: &Measures) -> Outcome {
    let width = m.side_width(m.middle, "mid-height")?;
    let (short, long, upright) = orientation(width, m.height);
    let e = short / long;
    let bracket = 1.0 - 192.0 * e / PI.powi(5) * (PI / (2.0 * e)).tanh();
    let f_re = 12.0 / (e.sqrt() * (1.0 + e) * bracket);
    let upright = if upright.is_empty() {
        ""
    } else {
        "higher than wide"
    };
    let measures = format!("e = {e:.4}, shorter over longer of height and mid-height width");
    Ok((
        2.0 * m.area.powf(2.5) / (m.perimeter * f_re),
        join(&measures, upright),
    ))
}

/// `alpha = A^2 / K = slope C + intercept` with the compactness `C = P^2 / A`.
fn compactness(m: &Measures, slope: f64, intercept: f64, least: f64, shape: &str) -> (f64, String) {
    let c = m.perimeter * m.perimeter / m.area;
    let measures = format!("C = {c:.3}; fitted to {shape}, counts only for a section like it");
    // A polygon drawn from the most compact shape of its kind lies on the limit up to rounding.
    let range = if c < least * (1.0 - 1e-9) {
        format!("outside its range: {shape} has C of {least:.3} or more")
    } else {
        String::new()
    };
    (
        m.area * m.area / (slope * c + intercept),
        join(&measures, &range),
    )
}

#[cfg(test)]
mod tests;
