//! CSV for spreadsheets whose decimal mark is the comma.
//!
//! Tables are made once, after RFC 4180; [`CsvLocale::apply`] turns one into the other dialect. Numbers have a
//! head that ends in a unit, so the columns of text are few and known by name.

use super::csv::CsvError;

/// Dialect of a table.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum CsvLocale {
    /// RFC 4180: comma between fields, decimal point.
    #[default]
    Plain,
    /// Semicolon between fields, decimal comma, UTF-8 with a byte order mark.
    Eu,
}

/// Heads of columns that hold text, whatever it looks like.
const TEXT_HEADS: [&str; 27] = [
    "absent_because",
    "beyond_limits",
    "branch",
    "card",
    "case",
    "change_unit",
    "channel",
    "direction",
    "film_on",
    "fluid",
    "from",
    "given",
    "interpolation_to_next",
    "kind",
    "name",
    "node",
    "reason",
    "route",
    "section",
    "segment",
    "source_kind",
    "source_path",
    "source_sha256",
    "to",
    "tool_version",
    "wall",
    "warnings",
];

impl CsvLocale {
    /// A table in this dialect.
    ///
    /// - `table`: after RFC 4180, with a header row
    ///
    /// # Errors
    /// [`CsvError`] when `table` is no such table.
    ///
    /// # Examples
    /// ```
    /// use etchwise::report::CsvLocale;
    /// let table = "name,area_m2\r\n\"a;1.5\",1.5e-9\r\n";
    /// let eu = CsvLocale::Eu.apply(table)?;
    /// assert_eq!(eu, "\u{feff}name;area_m2\r\n\"a;1.5\";1,5e-9\r\n");
    /// # Ok::<(), etchwise::report::CsvError>(())
    /// ```
    pub fn apply(self, table: &str) -> Result<String, CsvError> {
        if self == Self::Plain {
            return Ok(table.to_owned());
        }
        let refused = |source| CsvError::Record {
            section: String::new(),
            source,
        };
        let unfinished = |reason: String| CsvError::Unfinished { reason };
        let mut reader = csv::ReaderBuilder::new()
            .has_headers(false)
            .from_reader(table.as_bytes());
        let mut writer = csv::WriterBuilder::new()
            .delimiter(b';')
            .terminator(csv::Terminator::CRLF)
            .from_writer(Vec::new());
        let mut is_text: Option<Vec<bool>> = None;
        for record in reader.records() {
            let record = record.map_err(refused)?;
            let Some(text_columns) = &is_text else {
                is_text = Some(record.iter().map(|h| TEXT_HEADS.contains(&h)).collect());
                writer.write_record(&record).map_err(refused)?;
                continue;
            };
            let fields = record.iter().enumerate().map(|(column, field)| {
                let is_text = text_columns.get(column).copied().unwrap_or(true);
                if !is_text && field.parse::<f64>().is_ok() {
                    field.replace('.', ",")
                } else {
                    field.to_owned()
                }
            });
            writer.write_record(fields).map_err(refused)?;
        }
        let bytes = writer.into_inner().map_err(|e| unfinished(e.to_string()))?;
        let text = String::from_utf8(bytes).map_err(|e| unfinished(e.to_string()))?;
        Ok(format!("\u{feff}{text}"))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_that_look_like_numbers_keep_their_point() {
        for head in ["route", "segment", "channel", "node", "section", "name"] {
            let table = format!("{head},length_m\r\n1.5,1.5\r\n");
            let found = CsvLocale::Eu.apply(&table).unwrap();
            assert_eq!(found, format!("\u{feff}{head};length_m\r\n1.5;1,5\r\n"));
        }
    }
}
