//! The formula of a response table, written out with its units and how to evaluate it.

use std::fmt::Write as _;

use super::document::ResponseDocument;
use crate::report::numbers::one_line;
use crate::study::{FitTerm, ParameterScale, ResponseParameter};

/// Letters of the scaled parameters.
const LETTERS: [&str; 3] = ["a", "b", "c"];

/// Letter of a scaled parameter.
pub(super) fn letter(axis: usize) -> &'static str {
    LETTERS.get(axis).copied().unwrap_or("t")
}

/// Middle and half width of a range in the variable of the fit: `t = (p - middle) / half`.
pub(super) fn scaling(parameter: &ResponseParameter) -> [f64; 2] {
    let [low, high] = [parameter.low, parameter.high].map(|v| match parameter.scale() {
        ParameterScale::Logarithm => v.ln(),
        ParameterScale::Linear => v,
    });
    [0.5 * (low + high), 0.5 * (high - low)]
}

/// The scaled parameter as a formula: `a = (ln(depth / m) + 10.47) / 0.3466`.
pub(super) fn scaled_text(axis: usize, parameter: &ResponseParameter) -> String {
    let [middle, half] = scaling(parameter);
    let unit = parameter.unit.name();
    let name = one_line(&parameter.name);
    let ratio = if unit == "1" {
        name
    } else {
        format!("{name} / {unit}")
    };
    let variable = match parameter.scale() {
        ParameterScale::Logarithm => format!("ln({ratio})"),
        ParameterScale::Linear => ratio,
    };
    let sign = if middle < 0.0 { '+' } else { '-' };
    format!(
        "{} = ({variable} {sign} {:?}) / {half:?}",
        letter(axis),
        middle.abs()
    )
}

/// The polynomials of a term: `T2(a) T1(b)`; empty for the constant.
pub(super) fn factors(term: &FitTerm) -> String {
    let factors: Vec<String> = term
        .degrees
        .iter()
        .enumerate()
        .filter(|(_, n)| **n > 0)
        .map(|(axis, n)| format!("T{n}({})", letter(axis)))
        .collect();
    factors.join(" ")
}

/// What the polynomials are.
pub(super) const POLYNOMIALS: &str = "T1(t) = t, T2(t) = 2 t^2 - 1, T(n+1)(t) = 2 t Tn(t) - T(n-1)(t), which is \
                                      Tn(t) = cos(n arccos t)";

/// The whole formula in one line, all coefficients to full digits.
///
/// `ln(K / m^4) = c + c T1(a) + ...; a = ...; R' = mu / K`
pub fn formula_text(document: &ResponseDocument<'_>) -> String {
    let mut text = "ln(K / m^4) =".to_owned();
    for (index, term) in document.table.fit.terms.iter().enumerate() {
        let sign = match (index, term.coefficient < 0.0) {
            (0, true) => " -",
            (0, false) => " ",
            (_, true) => " - ",
            (_, false) => " + ",
        };
        let _ = write!(text, "{sign}{:?}", term.coefficient.abs());
        let factors = factors(term);
        if !factors.is_empty() {
            let _ = write!(text, " {factors}");
        }
    }
    for (axis, parameter) in document.table.parameters.iter().enumerate() {
        let _ = write!(text, "; {}", scaled_text(axis, parameter));
    }
    let _ = write!(text, "; {POLYNOMIALS}; R' = mu / K");
    text
}
