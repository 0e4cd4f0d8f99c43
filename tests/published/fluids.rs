//! Fluid properties against their published check values.

use crate::data::{Check, all_files, counting_rows, off};
use etchwise::flow::Fluid;

/// Rounding of the independent evaluation behind computed values, relative.
const ROUNDING: f64 = 1e-12;

/// The fluid of a row, when the row is one.
pub(crate) fn fluid(check: &Check) -> Option<Fluid> {
    let temperature = || check.parameter("temperature");
    match check.kind.as_str() {
        "water" => Some(Fluid::water(temperature()).unwrap()),
        "dry_air" => Some(Fluid::dry_air(temperature(), check.parameter("pressure")).unwrap()),
        _ => None,
    }
}

#[test]
fn fluids_reproduce_their_check_values_to_the_last_printed_digit() {
    let files = all_files();
    let mut failures = Vec::new();
    let mut rows = 0;
    for (file, check) in counting_rows(&files) {
        let Some(fluid) = fluid(check) else { continue };
        let value = match check.quantity.as_str() {
            "viscosity" => fluid.viscosity,
            "density" => fluid.density.unwrap(),
            other => panic!("no fluid has a `{other}`"),
        };
        let tolerance = check.half_digit() + ROUNDING * check.value;
        failures.extend(off(file, check, value / check.unit_in_si(), tolerance));
        rows += 1;
    }
    assert!(failures.is_empty(), "{}", failures.join("\n"));
    assert_eq!(rows, 27);
}
