//! One section from a file: resistance, pressure drop, friction factor and wall shear at a flow rate.
//!
//! Run with `cargo run --release --example one_section [FILE]`; the default is a shipped as-made outline
//! of an invented wafer. The channel is 20 mm long and carries 5 uL/min of water at 25 C.

#![expect(clippy::print_stdout, reason = "an example shows its numbers")]

use std::error::Error;
use std::path::PathBuf;

use etchwise::flow::{
    Drive, Fluid, OperatingPoint, SolveOptions, solve_outline, validity_warnings,
};
use etchwise::intake::{ReadOptions, read_section};
use etchwise::units::{parse_flow_rate, parse_length, parse_temperature};

const SHIPPED: &str = concat!(
    env!("CARGO_MANIFEST_DIR"),
    "/shapes/made/glass_etch_station_1.toml"
);

fn main() -> Result<(), Box<dyn Error>> {
    let path = std::env::args_os()
        .nth(1)
        .map_or_else(|| PathBuf::from(SHIPPED), PathBuf::from);
    let section = read_section(&path, &ReadOptions::default())?;
    let problems = section.outline.problems();
    if let Some(problem) = problems.errors().next() {
        return Err(format!("{problem}; {}", problem.remedy()).into());
    }

    let flow = solve_outline(&section.outline, &SolveOptions::default())?.flow;
    let water = Fluid::water(parse_temperature("25 C")?)?;
    let length = parse_length("20 mm")?;
    let drive = Drive::FlowRate(parse_flow_rate("5 uL/min")?);
    let point = OperatingPoint::new(&flow, &water, length, drive)?;

    println!("{}", section.name.as_deref().unwrap_or("section"));
    println!(
        "  conductance K        {:.5e} m^4, estimated error {:.1e} m^4",
        flow.conductance.value, flow.conductance.error
    );
    println!(
        "  Fanning f Re on Dh   {:.4} (Darcy {:.4})",
        flow.fanning_dh, flow.darcy_dh
    );
    println!(
        "  resistance mu L / K  {:.4e} Pa s/m^3",
        water.viscosity * length / flow.conductance.value
    );
    println!("  pressure drop        {:.5e} Pa", point.pressure_drop);
    println!(
        "  velocity             mean {:.4e} m/s, peak {:.4e} m/s",
        point.mean_velocity, point.peak_velocity
    );
    println!(
        "  wall shear           mean {:.4e} Pa, largest {:.4e} Pa",
        point.wall_shear_mean, point.wall_shear_max
    );
    for warning in flow
        .warnings
        .iter()
        .chain(&validity_warnings(&flow, &water, Some(&point)))
    {
        println!("  {}: {}", warning.code.as_str(), warning.message);
    }
    Ok(())
}
