//! Which spacing a section gets, and which grids are refused before anything is allocated.

use crate::geometry::Outline;

/// Memory of one fluid node over all grids of the hierarchy and in the proof, bytes: 17 seen as the peak of the whole
/// process at 16 and 100 million nodes (`solve --trace`, `cargo bench --bench cost_table`), rounded up.
pub const BYTES_PER_NODE: f64 = 24.0;
/// Memory of one crossing of the outline with a lattice line, with its cells and what the proof holds of them, bytes:
/// 500 seen on straight walls, 1400 on rough ones.
const BYTES_PER_CROSSING: f64 = 1500.0;
/// Memory of one vertex of the outline, bytes: 250 seen at 100 000 vertices.
const BYTES_PER_VERTEX: f64 = 400.0;
/// Most fluid nodes of a grid: their numbers have 32 bits.
const MOST_NODES: f64 = (u32::MAX / 2) as f64;
/// How much longer than wide a section is whose conductance parallel plates give within a per cent: from here they are
/// offered instead of a grid. `1 - 0.63 / slenderness` is the leading correction (White, Viscous Fluid Flow, from memory).
const PLATE_SLENDERNESS: f64 = 63.0;
/// Fewest cells across the largest circle of the smallest lumen that can be asked for.
pub const LEAST_CELLS_ACROSS: f64 = 4.0;

/// A grid that will not be made.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ResolutionError {
    /// The section needs more nodes than the memory limit allows.
    #[error(
        "{cells_across:.0} cells across the smallest lumen ({inscribed_diameter:.3e} m) need about \
         {nodes:.2e} nodes and {bytes:.2e} bytes, more than the limit of {limit:.2e} bytes; \
         the section is {slenderness:.0} times longer than that lumen is wide"
    )]
    TooLarge {
        /// Cells across that were asked for.
        cells_across: f64,
        /// Diameter of the largest circle in the smallest lumen, m.
        inscribed_diameter: f64,
        /// Fluid nodes needed.
        nodes: f64,
        /// Memory needed.
        bytes: f64,
        /// Memory allowed.
        limit: f64,
        /// Larger dimension of the section over `inscribed_diameter`.
        slenderness: f64,
    },
    /// Fewer cells across than the method can work with, or not a number.
    #[error("{cells_across} cells across the smallest lumen are too few; the least is {least}")]
    TooCoarse {
        /// Cells across that were asked for.
        cells_across: f64,
        /// The least allowed.
        least: f64,
    },
    /// The largest circle has no size against the section, so no grid can resolve it.
    #[error(
        "the largest circle that fits into the smallest lumen is {inscribed_diameter:.3e} m across, \
         nothing against the section's {size:.3e} m"
    )]
    TooThin {
        /// Diameter of that circle, m.
        inscribed_diameter: f64,
        /// Larger dimension of the section, m.
        size: f64,
    },
}

impl ResolutionError {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::TooLarge {
                cells_across,
                nodes,
                bytes,
                limit,
                slenderness,
                ..
            } => {
                // Nodes go with the square of the cells across.
                let share = (limit / bytes).min(MOST_NODES / nodes);
                let fits = (cells_across * share.sqrt()).floor();
                if fits >= LEAST_CELLS_ACROSS {
                    format!("use --cells-across {fits} or less")
                } else if *slenderness < PLATE_SLENDERNESS {
                    // Rounded up, so that what is advised is enough.
                    let (unit, name) = if *bytes < 1e7 {
                        (1e3, "kB")
                    } else {
                        (1e6, "MB")
                    };
                    format!(
                        "raise --max-memory to {} {name} or more",
                        (bytes / unit).ceil()
                    )
                } else {
                    "solve the lumens one by one, or a shorter piece of the section; the formula for \
                     parallel plates is close at this slenderness (--shortcuts on a wider section)"
                        .to_owned()
                }
            }
            Self::TooCoarse { least, .. } => format!("use --cells-across {least} or more"),
            Self::TooThin { .. } => {
                "check the outline and its unit: a lumen of no width carries no flow".to_owned()
            }
        }
    }
}

/// Memory that a solve with its proof needs at the peak, bytes, foreseen from area and perimeter.
///
/// - `spacing`: m
pub fn memory_needed(outline: &Outline, spacing: f64) -> f64 {
    let nodes = outline.area() / (spacing * spacing);
    let crossings = 2.0 * outline.wetted_perimeter() / spacing;
    let vertices: usize = outline.loops().map(|wall| wall.points.len()).sum();
    nodes * BYTES_PER_NODE + crossings * BYTES_PER_CROSSING + vertices as f64 * BYTES_PER_VERTEX
}

/// Checks that a grid of the given spacing is affordable; returns its spacing, m.
///
/// - `inscribed_diameter`: of the largest circle in the smallest lumen, m
/// - `memory_limit`: bytes
///
/// # Errors
/// [`ResolutionError`], before anything is allocated.
pub fn spacing(
    outline: &Outline,
    inscribed_diameter: f64,
    cells_across: f64,
    memory_limit: f64,
) -> Result<f64, ResolutionError> {
    if !(cells_across.is_finite() && cells_across >= LEAST_CELLS_ACROSS) {
        return Err(ResolutionError::TooCoarse {
            cells_across,
            least: LEAST_CELLS_ACROSS,
        });
    }
    let (low, high) = outline.bounds().unwrap_or(([0.0; 2], [0.0; 2]));
    let size = (high[0] - low[0]).max(high[1] - low[1]);
    if inscribed_diameter.is_nan() || inscribed_diameter <= 1e-9 * size {
        return Err(ResolutionError::TooThin {
            inscribed_diameter,
            size,
        });
    }
    let spacing = inscribed_diameter / cells_across;
    let nodes = outline.area() / (spacing * spacing);
    let bytes = memory_needed(outline, spacing);
    if bytes > memory_limit || nodes > MOST_NODES {
        return Err(ResolutionError::TooLarge {
            cells_across,
            inscribed_diameter,
            nodes,
            bytes,
            limit: memory_limit,
            slenderness: size / inscribed_diameter,
        });
    }
    Ok(spacing)
}
