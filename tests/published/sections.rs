//! The solver against published values: every row that is a section, at 128 cells across unless the row
//! says otherwise.

use std::collections::BTreeMap;

use crate::data::{Check, DataFile, all_files, counting_rows, mean_interval, off};
use crate::fluids::fluid;
use etchwise::flow::{SectionFlow, SolveOptions, WallSample, solve_outline};
use etchwise::geometry::{NominalSpec, Outline, Point, SpecValue};
use etchwise::measured::Estimate;
use etchwise::warning::Code;
use rayon::prelude::*;

/// Cells across of every solve here.
const CELLS_ACROSS: f64 = 128.0;
/// Relative error allowed to `K` and the peak at this grid, beside the solver's own estimate.
const ALLOWANCE: f64 = 1e-5;
/// The same where a corner of the section turns inwards.
const ALLOWANCE_RE_ENTRANT: f64 = 3e-4;
/// The same for momentum and kinetic-energy factors.
const ALLOWANCE_FACTORS: f64 = 1e-4;
/// The same for wall shear, which carries no estimate of its own.
const ALLOWANCE_SHEAR: f64 = 2e-3;
/// Viscosity and channel length of rows that print a resistance: 1 mPa s, 1 mm.
const RESISTANCE_FACTOR: f64 = 1e-3 * 1e-3;

/// The outline of a row.
fn outline(check: &Check) -> Outline {
    let values = check
        .parameters
        .iter()
        .map(|(name, value)| {
            let value = match value {
                toml::Value::String(text) => SpecValue::Text(text.clone()),
                toml::Value::Integer(count) => {
                    SpecValue::Number(f64::from(i32::try_from(*count).unwrap()))
                }
                other => panic!("parameter {name}: {other}"),
            };
            (name.clone(), value)
        })
        .collect();
    let spec = NominalSpec {
        kind: check.kind.clone(),
        values,
    };
    spec.outline()
        .unwrap_or_else(|error| panic!("{}: {error}", check.label()))
}

/// Solves each different section of the rows once; the key is kind and parameters.
fn solve_all<'a>(rows: &[(&DataFile, &'a Check)]) -> BTreeMap<String, SectionFlow> {
    let mut sections: BTreeMap<String, &'a Check> = BTreeMap::new();
    for &(_, check) in rows {
        sections.entry(key(check)).or_insert(check);
    }
    sections
        .into_par_iter()
        .map(|(key, check)| {
            let options = SolveOptions {
                cells_across: Some(check.cells_across.unwrap_or(CELLS_ACROSS)),
                ..SolveOptions::default()
            };
            let solved = solve_outline(&outline(check), &options)
                .unwrap_or_else(|error| panic!("{}: {error}", check.label()));
            (key, solved.flow)
        })
        .collect()
}

fn key(check: &Check) -> String {
    format!("{} {}", check.kind, check.parameters)
}

/// A quantity of the solved section in the unit of the row, and the error allowed to it.
fn quantity(check: &Check, flow: &SectionFlow) -> (f64, f64) {
    let corner = if check.re_entrant {
        ALLOWANCE_RE_ENTRANT
    } else {
        ALLOWANCE
    };
    let sides = || (flow.geometry.width, flow.geometry.height);
    let k = flow.conductance;
    let mean = flow.wall_shear.mean_per_gradient;
    let from_k = |value: f64| (value, (k.relative() + corner) * value);
    let from_shear = |value: f64| (value, ALLOWANCE_SHEAR * value);
    let estimated = |estimate: Estimate, allowance: f64| {
        let value = estimate.value;
        (value, estimate.error + allowance * value)
    };
    match check.quantity.as_str() {
        "fanning_dh" => from_k(flow.fanning_dh),
        "conductance" => from_k(k.value / check.unit_in_si()),
        "torsion_constant" => from_k(4.0 * k.value / check.unit_in_si()),
        "resistance" => from_k(RESISTANCE_FACTOR / k.value / check.unit_in_si()),
        "conductance_over_width_height3" => from_k(k.value / (sides().0 * sides().1.powi(3))),
        "torsion_constant_over_width_height3" => {
            from_k(4.0 * k.value / (sides().0 * sides().1.powi(3)))
        }
        // Torque over largest shear: 4 K / (2 abs(dphi/dn)).
        "torsion_section_modulus_over_width_height2" => from_shear(
            2.0 * k.value / (flow.wall_shear.max_per_gradient * sides().0 * sides().1.powi(2)),
        ),
        "peak_to_mean" => estimated(flow.peak.to_mean, corner),
        "momentum_factor" => estimated(flow.momentum_factor, ALLOWANCE_FACTORS),
        "kinetic_energy_factor" => estimated(flow.kinetic_energy_factor, ALLOWANCE_FACTORS),
        "max_shear_over_mean" => from_shear(flow.wall_shear.max_per_gradient / mean),
        "mid_long_shear_over_mean" => from_shear(mid_shear(flow, Side::Long) / mean),
        "mid_short_shear_over_mean" => from_shear(mid_shear(flow, Side::Short) / mean),
        "mid_short_over_mid_long_shear" => {
            from_shear(mid_shear(flow, Side::Short) / mid_shear(flow, Side::Long))
        }
        other => panic!("no section has a `{other}`"),
    }
}

/// A side of a rectangle wider than high, or square.
#[derive(Clone, Copy)]
enum Side {
    Long,
    Short,
}

/// Wall shear at the middle of a side of a rectangle: between the two samples of that side next to it.
fn mid_shear(flow: &SectionFlow, side: Side) -> f64 {
    let along = match side {
        Side::Long => 0,
        Side::Short => 1,
    };
    let samples = &flow.wall_shear.samples;
    let on_side: Vec<&WallSample> = samples
        .iter()
        .filter(|sample| sample.normal[1 - along] > 0.9)
        .collect();
    let middle = middle_of(&on_side, along);
    let nearest = |ahead: bool| {
        on_side
            .iter()
            .filter(|sample| (sample.at[along] >= middle) == ahead)
            .min_by(|a, b| {
                (a.at[along] - middle)
                    .abs()
                    .total_cmp(&(b.at[along] - middle).abs())
            })
            .unwrap()
    };
    let (before, after) = (nearest(false), nearest(true));
    let share = (middle - before.at[along]) / (after.at[along] - before.at[along]);
    before.shear_per_gradient * (1.0 - share) + after.shear_per_gradient * share
}

/// Middle of a side: a rectangle drawn here is symmetrical about the middle of its samples' bounds to
/// within one spacing, over which the shear at the middle does not change.
fn middle_of(samples: &[&WallSample], along: usize) -> f64 {
    let ends = samples
        .iter()
        .map(|sample: &&WallSample| -> Point { sample.at })
        .fold([f64::INFINITY, f64::NEG_INFINITY], |ends, at| {
            [ends[0].min(at[along]), ends[1].max(at[along])]
        });
    0.5 * (ends[0] + ends[1])
}

#[test]
fn the_solver_reproduces_published_values() {
    let files = all_files();
    let rows: Vec<(&DataFile, &Check)> = counting_rows(&files)
        .filter(|(_, check)| fluid(check).is_none())
        .collect();
    let solved = solve_all(&rows);
    let mut failures = Vec::new();
    for (file, check) in &rows {
        let flow = &solved[&key(check)];
        if check.below_grid {
            for code in [Code::ThinPart, Code::IdentityFailed] {
                let warned = flow.warnings.iter().any(|warning| warning.code == code);
                assert!(warned, "{}: no {}", check.label(), code.as_str());
            }
            continue;
        }
        let (value, allowance) = quantity(check, flow);
        let tolerance = check.measured.as_ref().map_or_else(
            || check.half_digit() * (1.0 + 1e-6) + allowance,
            |measured| {
                assert!((measured.lowest..=measured.highest).contains(&value));
                mean_interval(measured)
            },
        );
        failures.extend(off(file, check, value, tolerance));
    }
    assert!(
        failures.is_empty(),
        "{} of {} rows off:\n{}",
        failures.len(),
        rows.len(),
        failures.join("\n")
    );
    assert_eq!(rows.len(), 477);
}
