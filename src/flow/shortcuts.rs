//! What the usual shortcut formulas say.

/// One shortcut formula against the solved section.
#[derive(Debug, Clone, PartialEq)]
pub struct ShortcutRow {
    /// Name of the formula.
    pub name: &'static str,
    /// Where it is published.
    pub source: &'static str,
    /// Where it holds.
    pub range: &'static str,
    /// Conductance it gives, m^4.
    pub conductance: Option<f64>,
    /// Relative error of its resistance against the solved one.
    pub resistance_error: Option<f64>,
    /// What to know about this row.
    pub remark: String,
}
