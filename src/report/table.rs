//! Plain text tables of aligned columns, and paragraphs of bounded width.

/// Width at which paragraphs are broken, characters.
pub(crate) const TEXT_WIDTH: usize = 92;

/// How a column is aligned.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Align {
    /// Flush left.
    Left,
    /// Flush right.
    Right,
}

/// Rows of cells, printed with two blanks between columns.
#[derive(Debug, Clone, Default)]
pub(crate) struct Table {
    columns: Vec<Align>,
    rows: Vec<Vec<String>>,
}

impl Table {
    /// An empty table with the given columns.
    pub(crate) fn new(columns: &[Align]) -> Self {
        Self {
            columns: columns.to_vec(),
            rows: Vec::new(),
        }
    }

    /// Adds a row; cells beyond the last column are dropped, missing ones stay empty.
    pub(crate) fn row<S: Into<String>>(&mut self, cells: impl IntoIterator<Item = S>) {
        self.rows.push(
            cells
                .into_iter()
                .take(self.columns.len())
                .map(Into::into)
                .collect(),
        );
    }

    /// The table as lines, each behind `indent` blanks and ended by a line feed.
    pub(crate) fn print(&self, indent: usize) -> String {
        let widths: Vec<usize> = (0..self.columns.len())
            .map(|c| {
                self.rows
                    .iter()
                    .filter_map(|row| row.get(c))
                    .map(|cell| cell.chars().count())
                    .max()
                    .unwrap_or(0)
            })
            .collect();
        let mut out = String::new();
        for row in &self.rows {
            let mut line = " ".repeat(indent);
            for ((cell, &width), align) in row.iter().zip(&widths).zip(&self.columns) {
                let fill = " ".repeat(width - cell.chars().count());
                match align {
                    Align::Left => line.extend([cell.as_str(), fill.as_str()]),
                    Align::Right => line.extend([fill.as_str(), cell.as_str()]),
                }
                line.push_str("  ");
            }
            out.push_str(line.trim_end());
            out.push('\n');
        }
        out
    }
}

/// The words of `text` in lines of at most `width` characters, broken at blanks only,
/// never before a per cent sign.
pub(crate) fn wrapped(text: &str, width: usize) -> Vec<String> {
    let mut lines = Vec::new();
    let mut line = String::new();
    let mut words = text.split_whitespace().peekable();
    while let Some(word) = words.next() {
        let sign = words.next_if_eq(&"%").map_or("", |_| " %");
        let longer = line.chars().count() + 1 + word.chars().count() + sign.len();
        if !line.is_empty() && longer > width {
            lines.push(std::mem::take(&mut line));
        }
        if !line.is_empty() {
            line.push(' ');
        }
        line.push_str(word);
        line.push_str(sign);
    }
    if !line.is_empty() {
        lines.push(line);
    }
    lines
}

/// A paragraph with `first` before its first line and as many blanks before the others.
pub(crate) fn paragraph(first: &str, text: &str) -> String {
    let indent = first.chars().count();
    let mut out = String::new();
    for (i, line) in wrapped(text, TEXT_WIDTH.saturating_sub(indent).max(20))
        .iter()
        .enumerate()
    {
        if i == 0 {
            out.push_str(first);
        } else {
            out.push_str(&" ".repeat(indent));
        }
        out.push_str(line);
        out.push('\n');
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_line_up_by_characters_not_bytes() {
        let mut table = Table::new(&[Align::Left, Align::Right]);
        table.row(["\u{b5}m", "1"]);
        table.row(["long", "100"]);
        assert_eq!(table.print(1), " \u{b5}m      1\n long  100\n");
    }

    #[test]
    fn paragraphs_break_at_blanks_and_hang() {
        let text = "word ".repeat(40);
        let out = paragraph("- ", &text);
        assert!(out.lines().count() > 1);
        assert!(out.lines().all(|l| l.chars().count() <= TEXT_WIDTH));
        assert!(out.lines().skip(1).all(|l| l.starts_with("  word")));
        assert_eq!(out.matches("word").count(), 40);
    }

    #[test]
    fn a_per_cent_sign_stays_with_its_number_within_the_width() {
        assert_eq!(wrapped("off by 0.25 % here", 12), ["off by", "0.25 % here"]);
        assert_eq!(wrapped("off by 0.25 % here", 13), ["off by 0.25 %", "here"]);
    }
}
