//! The closed forms of the library against the same published values as the solver.

use crate::data::{Check, all_files, counting_rows, mean_interval, off};
use etchwise::flow::closed_form::{
    ClosedForm, circle, eccentric_annulus, ellipse, equilateral_triangle, rectangle,
    rectangle_mid_wall_shear,
};

/// What the independent methods behind computed values leave: residuals of 1e-10, relative.
const REFERENCE_ERROR: f64 = 2e-9;
/// Viscosity and channel length of rows that print a resistance: 1 mPa s, 1 mm.
const RESISTANCE_FACTOR: f64 = 1e-3 * 1e-3;

/// The closed form of a row's section, when there is one.
fn closed_form(check: &Check) -> Option<ClosedForm> {
    let p = |name| check.parameter(name);
    let form = match check.kind.as_str() {
        "rectangle" => rectangle(p("width"), p("height")),
        "circle" => circle(0.5 * p("diameter")),
        "ellipse" => ellipse(p("width"), p("height")),
        "annulus" => eccentric_annulus(
            0.5 * p("outer_diameter"),
            0.5 * p("inner_diameter"),
            check.parameter_or_zero("offset"),
        ),
        "regular_polygon" => match check.parameters["sides"].as_integer().unwrap() {
            3 => equilateral_triangle(p("side")),
            4 => rectangle(p("side"), p("side")),
            _ => return None,
        },
        _ => return None,
    };
    Some(form.unwrap())
}

/// A quantity of the closed form, `None` where it has none.
fn quantity(check: &Check, form: &ClosedForm) -> Option<f64> {
    let sides = || (check.parameter("width"), check.parameter("height"));
    let shear = || {
        let (w, h) = sides();
        rectangle_mid_wall_shear(w, h).unwrap()
    };
    let k = form.conductance;
    Some(match check.quantity.as_str() {
        "fanning_dh" => form.fanning_dh(),
        "conductance" => k / check.unit_in_si(),
        "torsion_constant" => 4.0 * k / check.unit_in_si(),
        "resistance" => RESISTANCE_FACTOR / k / check.unit_in_si(),
        "conductance_over_width_height3" => k / (sides().0 * sides().1.powi(3)),
        "torsion_constant_over_width_height3" => 4.0 * k / (sides().0 * sides().1.powi(3)),
        // Torque over largest shear: 4 K / (2 abs(dphi/dn)).
        "torsion_section_modulus_over_width_height2" => {
            2.0 * k / (shear().long_side * sides().0 * sides().1.powi(2))
        }
        "peak_to_mean" => form.peak_to_mean()?,
        "mid_long_shear_over_mean" => shear().long_side / form.mean_wall_shear(),
        "mid_short_shear_over_mean" => shear().short_side / form.mean_wall_shear(),
        "mid_short_over_mid_long_shear" => shear().short_side / shear().long_side,
        _ => return None,
    })
}

#[test]
fn closed_forms_reproduce_published_values_to_the_last_printed_digit() {
    let files = all_files();
    let mut failures = Vec::new();
    let mut rows = 0;
    for (file, check) in counting_rows(&files) {
        let Some(form) = closed_form(check) else {
            continue;
        };
        let Some(value) = quantity(check, &form) else {
            continue;
        };
        let tolerance = check.measured.as_ref().map_or_else(
            || check.half_digit() * (1.0 + 1e-6) + REFERENCE_ERROR * check.value,
            |measured| {
                assert!((measured.lowest..=measured.highest).contains(&value));
                mean_interval(measured)
            },
        );
        failures.extend(off(file, check, value, tolerance));
        rows += 1;
    }
    assert!(failures.is_empty(), "{}", failures.join("\n"));
    assert_eq!(rows, 216);
}
