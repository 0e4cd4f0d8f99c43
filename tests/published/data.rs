//! The data files: their schema and reading.

use std::path::PathBuf;

use serde::Deserialize;

/// How a source was seen.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub(crate) enum Seen {
    /// The paper or book itself.
    Paper,
    /// Its abstract only.
    Abstract,
    /// A public text that quotes it, or a digitised data set.
    Secondary,
    /// Recalled, not looked up.
    Memory,
    /// Computed for this project by a method that shares nothing with the code under test.
    Computed,
}

/// The head of a file.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct Source {
    pub(crate) authors: String,
    pub(crate) year: Option<i32>,
    pub(crate) title: String,
    pub(crate) publication: String,
    pub(crate) doi: Option<String>,
    pub(crate) place: String,
    pub(crate) seen: Seen,
    pub(crate) note: Option<String>,
    pub(crate) rows: usize,
}

/// Spread of a measured value.
#[derive(Debug, Clone, Copy, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct Measured {
    pub(crate) count: u32,
    pub(crate) standard_deviation: f64,
    pub(crate) lowest: f64,
    pub(crate) highest: f64,
}

/// One row.
#[derive(Debug, Clone, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct Check {
    /// Nominal kind of the section, or `water`, `dry_air`.
    pub(crate) kind: String,
    /// Parameters of the kind: text with a unit, or a count.
    pub(crate) parameters: toml::Table,
    pub(crate) quantity: String,
    /// The value as printed.
    pub(crate) value: f64,
    /// Printed decimals of the value.
    pub(crate) decimals: i32,
    /// Independent value, for sources that need confirmation.
    pub(crate) recomputed: Option<f64>,
    /// Unit of a value that is not a pure number.
    pub(crate) unit: Option<String>,
    /// Length whose fourth power is the unit of a conductance or torsion constant.
    pub(crate) unit_length: Option<String>,
    /// Whether a corner of the section turns inwards.
    #[serde(default)]
    pub(crate) re_entrant: bool,
    /// Whether the section has a part far below any grid: the solver has to warn, its value is not compared.
    #[serde(default)]
    pub(crate) below_grid: bool,
    /// Cells across that this section needs for the allowance, when more than the usual 128.
    pub(crate) cells_across: Option<f64>,
    /// Spread, for a measured value.
    pub(crate) measured: Option<Measured>,
    pub(crate) note: Option<String>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Layout {
    source: Source,
    check: Vec<Check>,
}

/// One data file.
#[derive(Debug, Clone)]
pub(crate) struct DataFile {
    pub(crate) name: String,
    pub(crate) source: Source,
    pub(crate) checks: Vec<Check>,
}

impl DataFile {
    /// Whether its rows never count for pass or fail.
    pub(crate) fn is_quarantine(&self) -> bool {
        self.name.starts_with("quarantine_")
    }

    /// The source in one line, for failure messages.
    pub(crate) fn citation(&self) -> String {
        let s = &self.source;
        let year = s.year.map_or(String::new(), |year| format!(" ({year})"));
        let doi = s
            .doi
            .as_deref()
            .map_or(String::new(), |doi| format!(", doi {doi}"));
        let note = s
            .note
            .as_deref()
            .map_or(String::new(), |note| format!(" [{note}]"));
        format!(
            "{}{year}, {}, {}{doi}; {}{note}",
            s.authors, s.title, s.publication, s.place
        )
    }
}

impl Check {
    /// Half a unit in the last printed decimal.
    pub(crate) fn half_digit(&self) -> f64 {
        0.5 * 10.0_f64.powi(-self.decimals)
    }

    /// Shape and quantity, for failure messages.
    pub(crate) fn label(&self) -> String {
        let note = self
            .note
            .as_deref()
            .map_or(String::new(), |note| format!(" [{note}]"));
        format!("{} {} {}{note}", self.kind, self.parameters, self.quantity).replace('\n', " ")
    }

    /// A parameter in SI.
    pub(crate) fn parameter(&self, name: &str) -> f64 {
        let text = self.parameters[name].as_str().unwrap();
        let (number, unit) = text.split_once(' ').unwrap();
        number.parse::<f64>().unwrap() * si(unit)
    }

    /// A parameter in SI that may be left out for zero.
    pub(crate) fn parameter_or_zero(&self, name: &str) -> f64 {
        if self.parameters.contains_key(name) {
            self.parameter(name)
        } else {
            0.0
        }
    }

    /// The factor that turns the printed value into SI.
    pub(crate) fn unit_in_si(&self) -> f64 {
        if let Some(length) = &self.unit_length {
            let (number, unit) = length.split_once(' ').unwrap();
            return (number.parse::<f64>().unwrap() * si(unit)).powi(4);
        }
        self.unit.as_deref().map_or(1.0, si)
    }
}

/// SI value of the units that occur in the files.
fn si(unit: &str) -> f64 {
    match unit {
        "um" | "uPa s" => 1e-6,
        "mm" => 1e-3,
        "K" | "Pa" | "kg/m^3" => 1.0,
        "deg" => std::f64::consts::PI / 180.0,
        "1e11 Pa s/m^3" => 1e11,
        _ => panic!("the data files have no unit `{unit}`"),
    }
}

/// All data files, sorted by name.
#[expect(clippy::disallowed_methods, reason = "a test reads its own data files")]
pub(crate) fn all_files() -> Vec<DataFile> {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/published");
    let mut files: Vec<DataFile> = std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "toml"))
        .map(|path| {
            let text = std::fs::read_to_string(&path).unwrap();
            let layout: Layout =
                toml::from_str(&text).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
            DataFile {
                name: path.file_name().unwrap().to_str().unwrap().to_owned(),
                source: layout.source,
                checks: layout.check,
            }
        })
        .collect();
    files.sort_by(|a, b| a.name.cmp(&b.name));
    files
}

/// Rows that count, with their file.
pub(crate) fn counting_rows(files: &[DataFile]) -> impl Iterator<Item = (&DataFile, &Check)> {
    files
        .iter()
        .filter(|file| !file.is_quarantine())
        .flat_map(|file| file.checks.iter().map(move |check| (file, check)))
}

/// Compares and, when off, says by how much and where the value comes from.
pub(crate) fn off(file: &DataFile, check: &Check, computed: f64, tolerance: f64) -> Option<String> {
    let difference = computed - check.value;
    // Written so that a value that is not a number is off.
    let within = difference.abs() <= tolerance;
    (!within).then(|| {
        format!(
            "{}: computed {computed:.10}, published {}, difference {difference:.3e}, tolerance \
             {tolerance:.3e}\n    {}",
            check.label(),
            check.value,
            file.citation()
        )
    })
}

/// Half width of the 95 % interval of the mean of a measured value (Student's t, textbook table).
pub(crate) fn mean_interval(measured: &Measured) -> f64 {
    assert_eq!(
        measured.count, 9,
        "the table here holds 8 degrees of freedom"
    );
    2.306 * measured.standard_deviation / f64::from(measured.count).sqrt()
}
