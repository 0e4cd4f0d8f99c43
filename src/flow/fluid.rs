//! The fluid of an operating point.

/// A Newtonian fluid at one temperature.
#[derive(Debug, Clone, PartialEq)]
pub struct Fluid {
    /// Name for people.
    pub name: String,
    /// Temperature, K, when known.
    pub temperature: Option<f64>,
    /// Dynamic viscosity, Pa s.
    pub viscosity: f64,
    /// Density, kg/m^3, when known.
    pub density: Option<f64>,
    /// Where the properties come from.
    pub source: String,
}
