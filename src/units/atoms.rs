//! The closed list of unit names.
//!
//! Conversions are exact by definition where one exists: inch 25.4 mm (1959 agreement), litre 1e-3 m^3,
//! standard atmosphere 101325 Pa, pound-force per square inch from 4.4482216152605 N and the inch,
//! conventional millimetre of mercury 13595.1 kg/m^3 times 9.80665 m/s^2 times 1 mm (all from memory,
//! as in the SI brochure and NIST SP 811).

use super::scale::UnitScale;

/// Exponents of metre, kilogram, second.
pub(super) type Dimension = [i32; 3];

/// One unit name with its size.
#[derive(Debug, Clone, Copy)]
pub(super) struct Atom {
    /// Spellings, the micro sign written as `u`.
    names: &'static [&'static str],
    /// SI value.
    pub(super) scale: UnitScale,
    /// Dimension.
    pub(super) dimension: Dimension,
}

const LENGTH: Dimension = [1, 0, 0];
const VOLUME: Dimension = [3, 0, 0];
const TIME: Dimension = [0, 0, 1];
const MASS: Dimension = [0, 1, 0];
const FORCE: Dimension = [1, 1, -2];
const PRESSURE: Dimension = [-1, 1, -2];
const VISCOSITY: Dimension = [-1, 1, -1];

const fn atom(names: &'static [&'static str], size: f64, power: i32, dimension: Dimension) -> Atom {
    Atom {
        names,
        scale: UnitScale::new(size, power),
        dimension,
    }
}

const ATOMS: &[Atom] = &[
    atom(&["m"], 1.0, 0, LENGTH),
    atom(&["cm"], 1.0, -2, LENGTH),
    atom(
        &[
            "mm",
            "millimetre",
            "millimeter",
            "millimetres",
            "millimeters",
        ],
        1.0,
        -3,
        LENGTH,
    ),
    atom(
        &[
            "um",
            "micron",
            "microns",
            "micrometre",
            "micrometer",
            "micrometres",
            "micrometers",
        ],
        1.0,
        -6,
        LENGTH,
    ),
    atom(
        &["nm", "nanometre", "nanometer", "nanometres", "nanometers"],
        1.0,
        -9,
        LENGTH,
    ),
    atom(&["pm"], 1.0, -12, LENGTH),
    atom(
        &["A", "\u{c5}", "\u{212b}", "angstrom", "angstroms"],
        1.0,
        -10,
        LENGTH,
    ),
    atom(&["in", "inch", "inches"], 254.0, -4, LENGTH),
    atom(&["mil", "mils", "thou"], 254.0, -7, LENGTH),
    atom(&["L", "l"], 1.0, -3, VOLUME),
    atom(&["mL", "ml"], 1.0, -6, VOLUME),
    atom(&["uL", "ul"], 1.0, -9, VOLUME),
    atom(&["nL", "nl"], 1.0, -12, VOLUME),
    atom(&["pL", "pl"], 1.0, -15, VOLUME),
    atom(&["s"], 1.0, 0, TIME),
    atom(&["ms"], 1.0, -3, TIME),
    atom(&["min"], 60.0, 0, TIME),
    atom(&["h"], 3600.0, 0, TIME),
    atom(&["kg"], 1.0, 0, MASS),
    atom(&["g"], 1.0, -3, MASS),
    atom(&["mg"], 1.0, -6, MASS),
    atom(&["N"], 1.0, 0, FORCE),
    atom(&["mN"], 1.0, -3, FORCE),
    atom(&["uN"], 1.0, -6, FORCE),
    atom(&["dyn"], 1.0, -5, FORCE),
    atom(&["Pa"], 1.0, 0, PRESSURE),
    atom(&["uPa"], 1.0, -6, PRESSURE),
    atom(&["mPa"], 1.0, -3, PRESSURE),
    atom(&["hPa", "mbar"], 1.0, 2, PRESSURE),
    atom(&["kPa"], 1.0, 3, PRESSURE),
    atom(&["MPa"], 1.0, 6, PRESSURE),
    atom(&["GPa"], 1.0, 9, PRESSURE),
    atom(&["bar"], 1.0, 5, PRESSURE),
    atom(&["psi"], 6_894.757_293_168_361, 0, PRESSURE),
    atom(&["mmHg"], 133.322_387_415, 0, PRESSURE),
    atom(&["atm"], 101_325.0, 0, PRESSURE),
    atom(&["P"], 1.0, -1, VISCOSITY),
    atom(&["cP"], 1.0, -3, VISCOSITY),
];

/// The unit with this spelling.
pub(super) fn find(name: &str) -> Option<&'static Atom> {
    ATOMS.iter().find(|atom| atom.names.contains(&name))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_spelling_is_listed_once() {
        let mut names: Vec<&str> = ATOMS.iter().flat_map(|a| a.names.iter().copied()).collect();
        let count = names.len();
        names.sort_unstable();
        names.dedup();
        assert_eq!(names.len(), count);
        assert!(count > 50);
    }
}
