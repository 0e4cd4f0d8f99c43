//! One varied parameter: its range, its unit, the variable of the fit, and what must happen to `K`.

use crate::geometry::{Quantity, kinds};

use crate::study::wall_motion::Measure;

/// What the numbers of a parameter are.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ParameterUnit {
    /// Metres.
    Length,
    /// Radians.
    Angle,
    /// A plain number.
    One,
}

impl ParameterUnit {
    /// The SI unit.
    pub fn name(self) -> &'static str {
        match self {
            Self::Length => "m",
            Self::Angle => "rad",
            Self::One => "1",
        }
    }
}

/// Variable in which the polynomial of one parameter is written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ParameterScale {
    /// The logarithm of the parameter, for ranges above zero.
    Logarithm,
    /// The parameter itself, where the range touches or crosses zero.
    Linear,
}

/// Which way `K` goes when a parameter grows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Trend {
    /// It rises, or at least does not fall.
    Rises,
    /// It falls, or at least does not rise.
    Falls,
}

impl Trend {
    /// The word for it.
    pub fn word(self) -> &'static str {
        match self {
            Self::Rises => "rises",
            Self::Falls => "falls",
        }
    }

    /// 1 or -1.
    pub(super) fn sign(self) -> f64 {
        match self {
            Self::Rises => 1.0,
            Self::Falls => -1.0,
        }
    }
}

/// A parameter that is varied.
#[derive(Debug, Clone, PartialEq)]
pub struct ResponseParameter {
    /// Its name, as in `draw` or `sensitivity`.
    pub name: String,
    /// What it is, one sentence.
    pub definition: String,
    /// Unit of its values.
    pub unit: ParameterUnit,
    /// Low end of the range.
    pub low: f64,
    /// High end of the range.
    pub high: f64,
    /// What `K` must do by physics; `None` where nothing general holds.
    pub expected: Option<Trend>,
    /// Why it must, or why nothing is known.
    pub expected_because: &'static str,
}

impl ResponseParameter {
    /// The variable of the fit: the logarithm where the whole range is above zero.
    pub fn scale(&self) -> ParameterScale {
        if self.low > 0.0 {
            ParameterScale::Logarithm
        } else {
            ParameterScale::Linear
        }
    }

    /// The parameter as `-1` at the low end of the range to `1` at its high end.
    ///
    /// `t = (2 ln p - ln low - ln high) / (ln high - ln low)`, or the same without logarithms.
    pub fn scaled(&self, value: f64) -> f64 {
        let [low, high, p] = [self.low, self.high, value].map(|v| self.variable(v));
        (2.0 * p - low - high) / (high - low)
    }

    /// The value at a scaled place; the ends are exact.
    pub fn value_at(&self, t: f64) -> f64 {
        if t <= -1.0 {
            return self.low;
        }
        if t >= 1.0 {
            return self.high;
        }
        let [low, high] = [self.low, self.high].map(|v| self.variable(v));
        let p = 0.5 * (low + high) + 0.5 * t * (high - low);
        match self.scale() {
            ParameterScale::Logarithm => p.exp(),
            ParameterScale::Linear => p,
        }
    }

    /// `dt / dp` with `p` the variable of the fit.
    pub(super) fn scaling_slope(&self) -> f64 {
        2.0 / (self.variable(self.high) - self.variable(self.low))
    }

    fn variable(&self, value: f64) -> f64 {
        match self.scale() {
            ParameterScale::Logarithm => value.ln(),
            ParameterScale::Linear => value,
        }
    }
}

/// Why `K` must rise.
const HOLDS: &str = "the section at a larger value holds the one at a smaller value, and conductance grows with the section";
/// Why `K` must fall.
const LIES_IN: &str = "the section at a larger value lies in the one at a smaller value, and conductance grows with the section";
/// Why nothing is expected.
const OPEN: &str = "neither of two such sections need hold the other";
/// Why a stretch raises `K`: the stretched field in the Ritz quotient gives at least the stretch times `K`.
const STRETCHED: &str = "stretching a section by s >= 1 along one axis raises K at least s times (energy of the stretched field)";

/// Parameters of nominal kinds with which the section grows, by kind; a star stands for every kind.
const GROWING: [(&str, &[&str]); 20] = [
    ("rectangle", &["width", "height"]),
    (
        "trapezoid",
        &["top_width", "depth", "left_angle", "right_angle"],
    ),
    ("koh_groove", &["opening", "depth"]),
    ("isotropic_etch", &["mask_opening", "depth"]),
    ("rounded_rectangle", &["width", "height"]),
    ("stadium", &["width", "height"]),
    ("circle", &["diameter"]),
    ("ellipse", &["width", "height"]),
    ("half_ellipse", &["width", "depth"]),
    ("circular_segment", &["depth", "radius", "width"]),
    ("circular_sector", &["radius", "angle"]),
    ("triangle", &["base", "left_angle", "right_angle"]),
    ("triangle_height", &["base", "height"]),
    ("regular_polygon", &["side", "across_flats"]),
    ("drie_trench", &["top_width", "taper", "bow"]),
    ("gaussian_groove", &["depth", "width"]),
    ("parabolic_groove", &["width", "depth"]),
    ("annulus", &["outer_diameter"]),
    ("rhombus", &["side"]),
    ("*", &["lid_bulge"]),
];

/// Parameters with which it shrinks.
const SHRINKING: [(&str, &[&str]); 4] = [
    (
        "rounded_rectangle",
        &[
            "radius",
            "radius_top_left",
            "radius_top_right",
            "radius_bottom_left",
            "radius_bottom_right",
        ],
    ),
    ("drie_trench", &["foot_radius"]),
    ("annulus", &["inner_diameter"]),
    ("*", &["lid_sag"]),
];

/// What `K` must do with a parameter of a nominal kind, and why.
pub(super) fn nominal_trend(kind: &str, parameter: &str) -> (Option<Trend>, &'static str) {
    let listed = |table: &[(&str, &[&str])]| {
        table
            .iter()
            .any(|(k, names)| (*k == kind || *k == "*") && names.contains(&parameter))
    };
    if listed(&GROWING) {
        (Some(Trend::Rises), HOLDS)
    } else if listed(&SHRINKING) {
        (Some(Trend::Falls), LIES_IN)
    } else {
        (None, OPEN)
    }
}

/// What `K` must do with a wall motion, and why.
pub(super) fn motion_trend(case: &str) -> (Option<Trend>, &'static str) {
    match case {
        "film" => (Some(Trend::Falls), LIES_IN),
        "depth" | "width" | "scale" => (Some(Trend::Rises), STRETCHED),
        _ => (Some(Trend::Rises), HOLDS),
    }
}

/// What a parameter of a nominal kind is, and its unit; `None` where it cannot be varied.
pub(super) fn nominal_unit(quantity: Quantity) -> Option<ParameterUnit> {
    match quantity {
        Quantity::Length => Some(ParameterUnit::Length),
        Quantity::Angle => Some(ParameterUnit::Angle),
        Quantity::Ratio => Some(ParameterUnit::One),
        _ => None,
    }
}

/// Unit of a wall motion where its change is not written as a length.
pub(super) fn motion_unit(measure: Measure) -> ParameterUnit {
    match measure {
        Measure::Relative => ParameterUnit::One,
        Measure::Length => ParameterUnit::Length,
        Measure::Angle => ParameterUnit::Angle,
    }
}

/// Whether a word is the name of a nominal kind; hyphens count as underscores.
pub fn kind_name(word: &str) -> Option<&'static str> {
    let plain = word.replace('-', "_");
    kinds()
        .iter()
        .find(|info| info.name == plain)
        .map(|info| info.name)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::modifiers;

    fn depth(low: f64, high: f64) -> ResponseParameter {
        ResponseParameter {
            name: "depth".to_owned(),
            definition: String::new(),
            unit: ParameterUnit::Length,
            low,
            high,
            expected: None,
            expected_because: "",
        }
    }

    #[test]
    fn scaled_values_map_back_in_either_scale() {
        for parameter in [depth(20e-6, 40e-6), depth(0.0, 2e-6), depth(-1e-6, 1e-6)] {
            for t in [-1.0, -0.3, 0.0, 0.7, 1.0] {
                let value = parameter.value_at(t);
                assert!((parameter.scaled(value) - t).abs() < 1e-12, "{t}");
            }
            for (t, end) in [(-1.0, parameter.low), (1.0, parameter.high)] {
                assert_eq!(parameter.value_at(t).to_bits(), end.to_bits());
            }
        }
        assert_eq!(depth(20e-6, 40e-6).scale(), ParameterScale::Logarithm);
        assert_eq!(depth(0.0, 40e-6).scale(), ParameterScale::Linear);
        let middle = depth(20e-6, 80e-6).value_at(0.0);
        assert!((middle - 40e-6).abs() < 1e-18, "{middle}");
    }

    #[test]
    fn the_tables_of_trends_name_parameters_that_exist() {
        for (kind, names) in GROWING.iter().chain(&SHRINKING) {
            let own = kinds().iter().find(|info| info.name == *kind);
            let known: Vec<&str> = match own {
                Some(info) => info.parameters.iter().map(|p| p.name).collect(),
                None => modifiers().iter().map(|p| p.name).collect(),
            };
            assert!(own.is_some() || *kind == "*", "{kind}");
            for name in *names {
                assert!(known.contains(name), "{kind} {name}");
            }
        }
    }
}
