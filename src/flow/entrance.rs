//! How far from the inlet the flow needs to become fully developed, and the extra pressure that costs.
//!
//! Entrance length: where the centre-line velocity is within 1 % of its final value, from a uniform inlet.
//! The correlations are those of a round tube, used on the hydraulic diameter of any section; they keep the
//! creeping-flow length of about 0.6 diameters at vanishing Reynolds number. At high Reynolds numbers a
//! square needs up to 1.6 times as much (0.090 against 0.056 Dh Re) and parallel plates a fifth (0.011);
//! the last two are from Shah and London (1978), Laminar Flow Forced Convection in Ducts, from memory.

/// Correlations for the entrance length of a round tube.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[non_exhaustive]
pub enum EntranceModel {
    /// `L/D = [0.619^1.6 + (0.0567 Re)^1.6]^(1/1.6)`; Durst, Ray, Uensal and Bayoumi (2005), J. Fluids
    /// Eng. 127, 1154 (from memory; the slope at high Re agrees with 0.0557, computed).
    #[default]
    Durst2005,
    /// `L/D = 0.60 / (1 + 0.035 Re) + 0.056 Re`; Chen (1973), J. Fluids Eng. 95, 153 (from memory).
    Chen1973,
    /// `L/D = 0.59 + 0.056 Re`; Atkinson, Brocklebank, Card and Smith (1969), A.I.Ch.E. J. 15, 548 (from memory).
    Atkinson1969,
}

/// Entrance length of fully developed flow, m.
///
/// - `model`: which correlation
/// - `hydraulic_diameter`: m
/// - `reynolds_dh`: on the hydraulic diameter and mean velocity, not negative, laminar
///
/// # Examples
/// ```
/// use etchwise::flow::{EntranceModel, entrance_length};
/// let creeping = entrance_length(EntranceModel::Durst2005, 1e-4, 0.0);
/// assert!((creeping - 0.619e-4).abs() < 1e-18);
/// ```
pub fn entrance_length(model: EntranceModel, hydraulic_diameter: f64, reynolds_dh: f64) -> f64 {
    let diameters = match model {
        EntranceModel::Durst2005 => {
            (0.619_f64.powf(1.6) + (0.0567 * reynolds_dh).powf(1.6)).powf(1.0 / 1.6)
        }
        EntranceModel::Chen1973 => 0.60 / (1.0 + 0.035 * reynolds_dh) + 0.056 * reynolds_dh,
        EntranceModel::Atkinson1969 => 0.59 + 0.056 * reynolds_dh,
    };
    diameters * hydraulic_diameter
}

/// Excess pressure of the entrance in units of `rho ubar^2 / 2`: `2 (Ke - Kd)`.
///
/// Fully developed far downstream, the pressure drop from a uniform inlet exceeds `G L` by this factor times
/// `rho ubar^2 / 2`: 4/3 for a tube, 24/35 for parallel plates.
///
/// - `momentum_factor`, `kinetic_energy_factor`: `Kd`, `Ke` of the developed profile
///
/// # Source
/// Lundgren, Sparrow and Starr (1964), J. Basic Eng. 86, 620 (from memory; confirmed by the closed forms of
/// tube and plates). Boundary-layer solutions come out up to 8 % lower (tube 1.25).
/// # Examples
/// ```
/// let tube = etchwise::flow::excess_pressure_factor(4.0 / 3.0, 2.0);
/// assert!((tube - 4.0 / 3.0).abs() < 1e-15);
/// ```
pub fn excess_pressure_factor(momentum_factor: f64, kinetic_energy_factor: f64) -> f64 {
    2.0 * (kinetic_energy_factor - momentum_factor)
}

#[cfg(test)]
mod tests {
    use super::*;

    const MODELS: [EntranceModel; 3] = [
        EntranceModel::Durst2005,
        EntranceModel::Chen1973,
        EntranceModel::Atkinson1969,
    ];

    #[test]
    fn all_models_agree_within_a_few_per_cent_of_the_boundary_layer_slope() {
        // 0.0557 Dh Re: computed reference (marching the boundary-layer equations of the tube).
        for model in MODELS {
            let slope = entrance_length(model, 1.0, 2000.0) / 2000.0;
            assert!((slope / 0.0557 - 1.0).abs() < 0.03, "{model:?} {slope}");
        }
    }

    #[test]
    fn the_entrance_never_becomes_shorter_than_about_half_a_diameter() {
        for model in MODELS {
            for reynolds in [0.0, 1e-6, 1e-2, 1.0, 5.0] {
                assert!(entrance_length(model, 1.0, reynolds) > 0.5);
            }
        }
    }

    #[test]
    fn the_excess_pressure_of_plates_is_24_over_35() {
        assert!((excess_pressure_factor(6.0 / 5.0, 54.0 / 35.0) - 24.0 / 35.0).abs() < 1e-15);
    }
}
