//! The closed list of warnings: each with a stable code, a sentence, its numbers and advice.
//!
//! A warning is a value inside a result, so that every output shows it; nothing here prints.

/// One warning: a stable code, what was seen, and what to do about it.
#[derive(Debug, Clone, PartialEq)]
pub struct Warning {
    /// Which warning it is.
    pub code: Code,
    /// One sentence for a person, with the numbers in it.
    pub message: String,
    /// What the user can do.
    pub advice: String,
    /// The numbers of the message for machines: key (ends in its unit where it has one) and value.
    pub numbers: Vec<(&'static str, f64)>,
}

/// Stable codes; the text form in outputs is [`Code::as_str`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[non_exhaustive]
pub enum Code {
    /// The estimated numerical error is above what was asked.
    AccuracyNotReached,
    /// A free identity of the solved section is off by more than its tolerance.
    IdentityFailed,
    /// A re-entrant corner makes the wall shear unbounded there.
    ShearSingular,
    /// The multigrid solver needed its fallback or stopped early.
    SolverSlow,
    /// Exact duplicate vertices were dropped from the outline.
    DuplicateVerticesRemoved,
    /// Flow is not laminar, or close to the limit.
    NotLaminar,
    /// The channel is short against its entrance length.
    EntranceLength,
    /// The gas is compressible or rarefied enough to matter.
    GasLimits,
    /// A fluid property was used outside its range.
    FluidRange,
    /// Pressure, gas, heat or medical use: short caution.
    Caution,
    /// The wetted perimeter of a digitised outline depends on its sampling.
    PerimeterSampling,
    /// Parts of the section are thinner than the grid can resolve.
    ThinPart,
    /// An exported field was thinned to keep its size in bounds.
    FieldThinned,
    /// A re-entrant corner makes the local sensitivity unbounded there.
    SensitivitySingular,
    /// First-order predictions and new solves differ.
    SensitivityMismatch,
    /// The formula of a response table is off by more than was asked for.
    FitNotReached,
    /// The formula of a response table falls where it must rise, or the reverse.
    NotMonotone,
    /// Lumens or islands come and go within the ranges of a response table.
    ShapeChanges,
    /// The file breaks its own format or standard, and was read all the same.
    FileDefect,
    /// Positions or lengths in the file contradict each other.
    PositionsRebuilt,
    /// Spikes or missing points were bridged.
    SamplesBridged,
    /// The lands do not lie on the reference line.
    ReferenceResidual,
    /// The lands beside a channel differ in height.
    LandsDiffer,
    /// Flank samples show the shape of the tip, not of the wall.
    FlankIsTip,
    /// A groove has no section: it runs off the trace, or has too few samples.
    GrooveLeftOut,
    /// Repeated traces differ.
    RepeatScatter,
    /// A choice was made that the file leaves open.
    ChoiceMade,
    /// The groove direction is not sure, so the section may be stretched.
    ObliqueCut,
    /// The scale of a picture rests on one statement of its file.
    ScaleUnsure,
    /// The edge in a picture is wider than a pixel.
    GreyEdge,
}

impl Code {
    /// The code as outputs print it.
    pub fn as_str(self) -> &'static str {
        match self {
            Self::AccuracyNotReached => "accuracy_not_reached",
            Self::IdentityFailed => "identity_failed",
            Self::ShearSingular => "shear_singular",
            Self::SolverSlow => "solver_slow",
            Self::DuplicateVerticesRemoved => "duplicate_vertices_removed",
            Self::NotLaminar => "not_laminar",
            Self::EntranceLength => "entrance_length",
            Self::GasLimits => "gas_limits",
            Self::FluidRange => "fluid_range",
            Self::Caution => "caution",
            Self::PerimeterSampling => "perimeter_sampling",
            Self::ThinPart => "thin_part",
            Self::FieldThinned => "field_thinned",
            Self::SensitivitySingular => "sensitivity_singular",
            Self::SensitivityMismatch => "sensitivity_mismatch",
            Self::FitNotReached => "fit_not_reached",
            Self::NotMonotone => "not_monotone",
            Self::ShapeChanges => "shape_changes",
            Self::FileDefect => "file_defect",
            Self::PositionsRebuilt => "positions_rebuilt",
            Self::SamplesBridged => "samples_bridged",
            Self::ReferenceResidual => "reference_residual",
            Self::LandsDiffer => "lands_differ",
            Self::FlankIsTip => "flank_is_tip",
            Self::GrooveLeftOut => "groove_left_out",
            Self::RepeatScatter => "repeat_scatter",
            Self::ChoiceMade => "choice_made",
            Self::ObliqueCut => "oblique_cut",
            Self::ScaleUnsure => "scale_unsure",
            Self::GreyEdge => "grey_edge",
        }
    }
}
