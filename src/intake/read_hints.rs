//! What to do about each problem of a file.

use super::read_error::ReadProblem;

impl ReadProblem {
    /// What the user can do, in one sentence.
    pub(super) fn hint(&self) -> String {
        match self {
            Self::Unit { source } | Self::UnitOption { source } => source.hint(),
            Self::Nominal { source } => source.hint(),
            Self::Wall { source } => source.hint(),
            Self::Table { source } => source.hint(),
            Self::Trace { source } => source.hint(),
            Self::Groove { source } => source.hint(),
            Self::Cut { source, .. } => source.hint(),
            Self::Map { source } => source.hint(),
            Self::Micrograph { source } => source.hint(),
            Self::Route { source } => source.hint(),
            Self::Network { source } => source.hint(),
            Self::UnknownKey { nearest, known, .. } => match nearest {
                Some(word) => format!("did you mean `{word}`?"),
                None => format!("known keys: {known}"),
            },
            Self::MissingKey { key, table } => format!("add `{key}` to {table}"),
            Self::WrongType { expected, .. } => format!("write {expected}"),
            Self::Header { .. } | Self::HeaderColumn { .. } => {
                "name the columns with their unit, `x_um,y_um` or `x [mm];y [mm]`; `loop` and \
                 `lumen` may follow"
                    .to_owned()
            }
            Self::UnitConflict { file, .. } => {
                format!("leave the option out, or make it `{file}`; or correct the file")
            }
            Self::ImplausibleSize { unit, likely, .. } => implausible_hint(unit.as_deref(), *likely),
            Self::ColumnCount { found, .. } if *found > 2 => {
                "each row needs one x and one y; a third column needs a header that names it `loop` \
                 or `lumen`; decimal commas are read only between semicolons"
                    .to_owned()
            }
            other => other.fixed_hint().to_owned(),
        }
    }

    /// Hints without numbers.
    fn fixed_hint(&self) -> &'static str {
        match self {
            Self::NotOfInstrument { .. } => {
                "solve it as it is with `etchwise solve`, or say what it is by --as trace, map or image"
            }
            Self::NotATrace => "give a trace in columns or a profile in an x3p or sdf file",
            Self::SeveralSections { is_map: false, .. } => {
                "choose one by its number, for example --groove 1; `etchwise trace` writes a section file for each"
            }
            Self::SeveralSections { is_map: true, .. } => {
                "choose one by --groove 1 and a single --station; `etchwise map` writes a section file for each"
            }
            Self::NotFound => "check the spelling and the folder",
            Self::IsFolder => "name a file in it",
            Self::Io { .. } => "check the permissions and the disk",
            Self::FileTooLarge { .. } => {
                "thin the outline or cut the file down to the section; section files and drawings \
                 above 64 MiB can be given as an outline in columns"
            }
            Self::TooManyVertices { .. } => {
                "thin the outline; vertices closer than a thousandth of the section change nothing"
            }
            Self::Empty | Self::NoOutline => {
                "give at least three vertices, one `x y` pair a line, or a section file with \
                 `[[lumen]]` or `[nominal]`"
            }
            Self::Binary => "save the outline as UTF-8 text",
            Self::BrokenEncoding { .. } => "save it again as UTF-8; the file may be cut off",
            Self::UnknownContent => {
                "see the README for the three forms; `--as section`, `--as outline` or `--as svg` \
                 gives a more exact message"
            }
            Self::NotAPair { .. } => "write each vertex as [x, y]",
            Self::NotANumber { .. } | Self::EmptyField => {
                "write a plain number with a decimal point; comments start with #"
            }
            Self::NotFinite { .. } => "leave the vertex out or give its finite coordinate",
            Self::ColumnCount { .. } => {
                "each row needs an x and a y, separated by a comma, semicolon, tab or spaces"
            }
            Self::AmbiguousDecimal { .. } => {
                "write decimal points; or separate columns by semicolons if commas are decimal \
                 marks; or add a header such as `x_um,y_um`"
            }
            Self::MixedDecimal { .. } => {
                "use one decimal mark throughout and no thousands separators"
            }
            Self::MissingUnit => {
                "name it in the header (`x_um,y_um`), in the section file (`unit = \"um\"`) or by \
                 `--unit um`"
            }
            Self::LoopReopened { .. } => {
                "keep the rows of a loop together, or give it its own label"
            }
            Self::Toml { .. } => "correct the line; coordinates are written [[x, y], [x, y]]",
            Self::ScaleNotPositive { .. } => "give the length of one unit, such as \"1 um\"",
            Self::TwoOutlines => "keep one of the two",
            Self::EmptyReach => {
                "add [[reach.inner]] or [[reach.outer]] with `outer = [[x, y], ...]`, or take [reach] out"
            }
            Self::SvgAttribute { .. } => {
                "write it as SVG has it: plain numbers, sizes above zero, lengths without % or em"
            }
            Self::Svg { .. } => "open and save it again in a drawing program",
            Self::SvgUnsupported { .. } => {
                "draw the walls as plain closed paths, rectangles, circles, ellipses or polygons"
            }
            Self::SvgNoScale => {
                "give the length of one drawing unit by `--scale \"1 um\"`, or set width and height \
                 in mm, cm or in together with a viewBox"
            }
            Self::SvgTwoScales { .. } => {
                "make width, height and viewBox agree, or give `--scale \"1 um\"`"
            }
            _ => "correct the file",
        }
    }
}

fn implausible_hint(unit: Option<&str>, likely: Option<&str>) -> String {
    let allow = "or allow it with --allow-any-size";
    match (unit, likely) {
        (Some(unit), Some(likely)) => {
            format!(
                "the unit `{unit}` may be wrong; with `{likely}` the size is plausible; correct it, {allow}"
            )
        }
        (None, Some(likely)) => {
            format!(
                "the scale may be wrong; numbers in `{likely}` give a plausible size; correct it, {allow}"
            )
        }
        _ => format!("check the unit and the coordinates, {allow}"),
    }
}
