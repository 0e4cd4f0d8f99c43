//! One operating point of a channel of constant section.

/// Flow through a channel of given length.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OperatingPoint {
    /// Channel length, m.
    pub length: f64,
    /// Flow rate, m^3/s.
    pub flow_rate: f64,
    /// Pressure drop over the length, Pa.
    pub pressure_drop: f64,
    /// Pressure gradient, Pa/m.
    pub pressure_gradient: f64,
    /// Mean velocity, m/s.
    pub mean_velocity: f64,
    /// Peak velocity, m/s.
    pub peak_velocity: f64,
    /// Reynolds number on the hydraulic diameter, when the density is known.
    pub reynolds_dh: Option<f64>,
    /// Mean wall shear, Pa.
    pub wall_shear_mean: f64,
    /// Largest wall shear, Pa.
    pub wall_shear_max: f64,
    /// Volume over flow rate, s.
    pub residence_time: f64,
    /// Hydrodynamic entrance length, m, when the density is known.
    pub entrance_length: Option<f64>,
}
