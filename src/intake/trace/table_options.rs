//! What the caller knows about a table of heights.

/// The decimal mark of a table.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Decimal {
    /// `1.5`
    Point,
    /// `1,5`
    Comma,
}

impl Decimal {
    /// The word for it on the command line.
    pub fn word(self) -> &'static str {
        match self {
            Self::Point => "point",
            Self::Comma => "comma",
        }
    }

    /// The decimal mark with this word.
    pub fn from_word(word: &str) -> Option<Self> {
        [Self::Point, Self::Comma]
            .into_iter()
            .find(|decimal| decimal.word() == word)
    }
}

/// What the caller knows about a table of heights.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct TableOptions {
    /// Unit of positions and heights: a unit such as `um`, or the length of one number such as `0.16 um`.
    pub unit: Option<String>,
    /// Unit of positions; goes before `unit`.
    pub x_unit: Option<String>,
    /// Unit of heights; goes before `unit`.
    pub z_unit: Option<String>,
    /// Column of positions, its name or its number from 1.
    pub x_column: Option<String>,
    /// Column of heights, its name or its number from 1.
    pub z_column: Option<String>,
    /// Distance of neighbouring samples along x, m, for tables without positions.
    pub x_step: Option<f64>,
    /// Distance of neighbouring rows of a height map, m.
    pub y_step: Option<f64>,
    /// Decimal mark; found from the rows when `None`.
    pub decimal: Option<Decimal>,
    /// Take positions and heights of any range.
    pub allow_any_size: bool,
}
