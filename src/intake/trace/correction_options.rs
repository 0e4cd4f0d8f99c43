//! What is asked of the corrections of a trace.

use super::profile::Zone;
use super::trace_problem::TraceProblem;

/// Largest degree of the polynomial that is taken off.
pub const MAX_BOW: u8 = 5;

/// What the reference line goes through.
#[derive(Debug, Clone, Default, PartialEq)]
pub enum Levelling {
    /// One line through all lands; where the worst land lies off it by more than a hundredth of the depth,
    /// there are three lands or more, and no bow is asked for, piece by piece as [`Levelling::Local`].
    #[default]
    Lands,
    /// One line (or polynomial) through all lands, whatever they say.
    Line,
    /// Straight from the middle of each land to the middle of the next.
    Local,
    /// One line through the zones stated, positions as in the file.
    Zones(Vec<Zone>),
    /// One line through the first and the last twentieth of the trace.
    Ends,
    /// Nothing is taken off.
    None,
}

/// How the reference line is fitted.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub enum LineFit {
    /// Least squares on all samples of the zones.
    LeastSquares,
    /// The repeated median (Siegel 1982, *Robust regression using repeated medians*, Biometrika 69, 242;
    /// from memory) within each zone, then least squares with the bisquare weights of Beaton and Tukey
    /// (1974, Technometrics 16, 147; from memory) against it; from four zones on (more with a bow) a zone
    /// that lies off the others is weighed down in the same way.
    #[default]
    Robust,
}

/// What is asked of the corrections of a trace; lengths and positions are those of the file.
#[derive(Debug, Clone, PartialEq)]
pub struct CorrectionOptions {
    /// Turn the trace over, `z -> -z`: a mould master or a cast was measured, and its ridges are the
    /// channels.
    pub invert: bool,
    /// By which share of the measured length the section wanted is smaller than what was measured, along
    /// the trace and in height: wanted = measured x (1 - share). 0.015 turns a master into the part
    /// moulded from it that shrinks by 1.5 %; for the channel behind a measured cast that shrank by `s`
    /// it is `-s / (1 - s)`. Within +-0.5.
    pub shrinkage: [f64; 2],
    /// What the reference line goes through.
    pub level: Levelling,
    /// How it is fitted.
    pub fit: LineFit,
    /// Degree of the polynomial that is taken off, 1 (a straight line) to [`MAX_BOW`].
    pub bow: u8,
    /// Leave spikes as they are.
    pub keep_spikes: bool,
    /// Smallest height of a spike, m; `None` for six times the noise about it and at least half a
    /// hundredth of the relief.
    pub spike_size: Option<f64>,
    /// Cut-off wavelength of the Gaussian filter, m; `None` for no filter.
    pub cutoff: Option<f64>,
    /// The lands, where the ones found are not right, positions as in the file.
    pub lands: Option<Vec<Zone>>,
}

impl Default for CorrectionOptions {
    fn default() -> Self {
        Self {
            invert: false,
            shrinkage: [0.0; 2],
            level: Levelling::Lands,
            fit: LineFit::Robust,
            bow: 1,
            keep_spikes: false,
            spike_size: None,
            cutoff: None,
            lands: None,
        }
    }
}

impl CorrectionOptions {
    /// Whether the numbers make sense whatever the trace.
    ///
    /// # Errors
    /// The option that does not.
    pub fn check(&self) -> Result<(), TraceProblem> {
        let names = ["--shrink-x", "--shrink-z"];
        for (option, share) in names.into_iter().zip(self.shrinkage) {
            if !share.is_finite() || share.abs() > 0.5 {
                return Err(TraceProblem::Shrinkage { option, share });
            }
        }
        if self.bow < 1 || self.bow > MAX_BOW {
            return Err(TraceProblem::Bow { degree: self.bow });
        }
        if self.bow > 1 && matches!(self.level, Levelling::Local | Levelling::None) {
            return Err(TraceProblem::BowWithoutLine);
        }
        for (option, length) in [("--spike-size", self.spike_size), ("--cutoff", self.cutoff)] {
            match length {
                Some(length) if !(length > 0.0 && length.is_finite()) => {
                    return Err(TraceProblem::NotALength { option, length });
                }
                _ => {}
            }
        }
        Ok(())
    }
}
