//! What the columns of a table are, by their names.

use super::table_units::{WrittenUnit, split_unit};

/// What a column is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Role {
    /// Positions along the line, or along x.
    Position,
    /// `y`: heights in a trace, positions across in a list of points.
    Second,
    /// Heights.
    Height,
    /// Heights, if no other column is called so.
    PerhapsHeight,
    /// Depths: heights whose sign is not sure.
    Depth,
    /// The number of the sample.
    Index,
    /// Time.
    Time,
    /// Label of a loop or a lumen: an outline.
    Label,
    /// Not known.
    Unknown,
}

/// Names and what they are, lower case, in English, German, French, Spanish and Japanese.
const NAMES: [(Role, &[&str]); 8] = [
    (
        Role::Position,
        &[
            "x",
            "lateral",
            "position",
            "positions",
            "pos",
            "distance",
            "dist",
            "abscissa",
            "horizontal",
            "weg",
            "strecke",
            "abstand",
            "abscisse",
            "posici\u{f3}n",
            "posicion",
            "distancia",
            "\u{4f4d}\u{7f6e}",
            "\u{8ddd}\u{96e2}",
        ],
    ),
    (Role::Second, &["y"]),
    (
        Role::Height,
        &[
            "z",
            "height",
            "heights",
            "elevation",
            "vertical",
            "h\u{f6}he",
            "hoehe",
            "hauteur",
            "altura",
            "\u{9ad8}\u{3055}",
        ],
    ),
    (
        Role::PerhapsHeight,
        &["raw", "profile", "profil", "perfil", "signal", "level"],
    ),
    (
        Role::Depth,
        &[
            "depth",
            "tiefe",
            "profondeur",
            "profundidad",
            "\u{6df1}\u{3055}",
        ],
    ),
    (
        Role::Index,
        &[
            "index",
            "idx",
            "no",
            "nr",
            "num",
            "number",
            "nummer",
            "point",
            "points",
            "punkt",
            "sample",
            "i",
            "row",
            "\u{756a}\u{53f7}",
        ],
    ),
    (
        Role::Time,
        &["time", "t", "zeit", "temps", "tiempo", "\u{6642}\u{9593}"],
    ),
    (Role::Label, &["loop", "lumen"]),
];

/// A column by its name.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct NamedColumn<'a> {
    /// The field of the column line; empty without one.
    pub(crate) field: &'a str,
    /// The name without its unit.
    pub(crate) name: &'a str,
    /// What it is.
    pub(crate) role: Role,
    /// Its unit.
    pub(crate) unit: WrittenUnit<'a>,
}

impl<'a> NamedColumn<'a> {
    /// A column by its field in the column line.
    pub(crate) fn new(field: &'a str) -> Self {
        let field = field.trim();
        let (name, unit) = split_unit(field);
        Self {
            field,
            name,
            role: role_of(name),
            unit,
        }
    }

    /// Its name for messages: the field, or its number from 1.
    pub(crate) fn shown(&self, index: usize) -> String {
        if self.field.is_empty() {
            format!("column {}", index + 1)
        } else {
            format!("`{}`", super::table_lines::shortened(self.field))
        }
    }
}

/// What a name stands for: the first of its words that is known.
fn role_of(name: &str) -> Role {
    const LONGEST_NAME: usize = 200;
    if name.len() > LONGEST_NAME {
        return Role::Unknown;
    }
    if matches!(name.trim(), "#" | "N\u{b0}") {
        return Role::Index;
    }
    let lower = name.to_lowercase();
    let mut perhaps = Role::Unknown;
    for word in lower.split(|c: char| !c.is_alphanumeric()) {
        let word = word
            .trim_end_matches(|c: char| c.is_ascii_digit())
            .trim_end_matches('\u{8ef8}');
        let found = NAMES.iter().find(|(_, names)| names.contains(&word));
        match found.map(|(role, _)| *role) {
            None => {}
            Some(Role::PerhapsHeight) => perhaps = Role::PerhapsHeight,
            Some(role) => return role,
        }
    }
    perhaps
}

/// Whether fields name columns: one of them is known or has a unit of length, and none is a number.
pub(crate) fn names_columns(fields: &[&str]) -> bool {
    let mut known = false;
    for field in fields {
        let text = field.trim().trim_matches('"');
        let body = text.trim_start_matches(['-', '+', '.', '\u{2212}']);
        if body.starts_with(|c: char| c.is_ascii_digit()) {
            return false;
        }
        let column = NamedColumn::new(text);
        known |= matches!(
            column.unit,
            WrittenUnit::Length(..) | WrittenUnit::Destroyed(_)
        ) || !matches!(
            column.role,
            Role::Unknown | Role::PerhapsHeight | Role::Time
        );
    }
    known
}

/// Whether fields hold nothing but units.
pub(crate) fn are_units(fields: &[&str]) -> bool {
    let mut lengths = 0;
    for field in fields {
        match split_unit(field) {
            ("", WrittenUnit::Length(..) | WrittenUnit::Destroyed(_)) => lengths += 1,
            ("", WrittenUnit::None | WrittenUnit::OtherQuantity(_)) => {}
            _ => return false,
        }
    }
    lengths > 0
}

/// The fields of a line of names over a table whose columns are separated by spaces.
///
/// Tries tabs, commas and semicolons, then two spaces and more, then single spaces with units joined to
/// the name before them; the first that gives the right number of columns counts.
pub(crate) fn spaced_names(content: &str, columns: usize) -> Option<Vec<&str>> {
    let fits = |fields: &Vec<&str>| fields.len() == columns;
    let by = |mark: char| -> Vec<&str> { content.split(mark).map(str::trim).collect() };
    let wide = || -> Vec<&str> {
        let parts = content.split("  ").map(str::trim);
        parts.filter(|part| !part.is_empty()).collect()
    };
    ['\t', ';', ',']
        .into_iter()
        .filter(|mark| content.contains(*mark))
        .map(by)
        .find(fits)
        .or_else(|| Some(wide()).filter(fits))
        .or_else(|| Some(joined_units(content)).filter(fits))
        .or_else(|| Some(content.split_whitespace().collect()).filter(fits))
}

/// The words of a line, each unit joined to the name before it: `x (um)`, `x in um`, `Lateral um`.
fn joined_units(content: &str) -> Vec<&str> {
    let start_of = |word: &str| crate::intake::delimited_text::offset_of(content, word);
    let mut joined: Vec<&str> = Vec::new();
    let mut last_is_name = false;
    for word in content.split_whitespace() {
        let bare = word.trim_matches(['(', ')', '[', ']', '/', ',']);
        let is_unit = matches!(
            super::table_units::written_unit(bare),
            WrittenUnit::Length(..) | WrittenUnit::Destroyed(_)
        ) || word.starts_with(['(', '[', '/']);
        let whole = joined.last().filter(|_| last_is_name && is_unit);
        let whole = whole.and_then(|last| content.get(start_of(last)..start_of(word) + word.len()));
        if let Some(whole) = whole {
            joined.pop();
            joined.push(whole);
            // The unit may follow after `in`, which reads as inch.
            last_is_name = word == "in";
        } else {
            joined.push(word);
            last_is_name = true;
        }
    }
    joined
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_by_their_names() {
        for (field, role) in [
            ("X_(microns)", Role::Position),
            ("y1", Role::Second),
            ("Lateral um", Role::Position),
            ("Raw Nanometer", Role::PerhapsHeight),
            ("Raw height (nm)", Role::Height),
            ("Z-H\u{f6}he [\u{b5}m]", Role::Height),
            ("Profondeur (\u{b5}m)", Role::Depth),
            ("\u{4f4d}\u{7f6e}(\u{b5}m)", Role::Position),
            ("Z\u{8ef8}", Role::Height),
            ("Index", Role::Index),
            ("Point #", Role::Index),
            ("Time (s)", Role::Time),
            ("loop", Role::Label),
            ("Temperature", Role::Unknown),
            ("", Role::Unknown),
        ] {
            assert_eq!(NamedColumn::new(field).role, role, "{field}");
        }
    }

    #[test]
    fn names_units_and_values_are_told_apart() {
        assert!(names_columns(&["Lateral um", "Raw"]));
        assert!(names_columns(&["", "x", "extra"]));
        assert!(!names_columns(&["Resolution", "0.5 um"]));
        assert!(!names_columns(&["Profile", "Hills and dips"]));
        assert!(are_units(&["", "um", "[nm]"]));
        assert!(are_units(&["s", "um"]));
        assert!(!are_units(&["s", "V"]));
        assert!(!are_units(&["x um", "nm"]));
    }

    #[test]
    fn names_over_columns_of_spaces() {
        for (line, names) in [
            ("x (um)  z (nm)", ["x (um)", "z (nm)"]),
            ("x (um) z (nm)", ["x (um)", "z (nm)"]),
            ("x in \u{b5}m z in nm", ["x in \u{b5}m", "z in nm"]),
            ("Lateral um Raw nm", ["Lateral um", "Raw nm"]),
            ("x\tz", ["x", "z"]),
            ("x, z", ["x", "z"]),
            ("x z", ["x", "z"]),
            ("um um", ["um", "um"]),
        ] {
            assert_eq!(spaced_names(line, 2).unwrap(), names, "{line}");
        }
        assert_eq!(spaced_names("one two three", 2), None);
    }
}
