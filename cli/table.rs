//! Plain text in columns and in paragraphs, for a terminal of 100 columns.

/// Widest line.
pub const WIDTH: usize = 100;
/// Blanks between two columns.
const BETWEEN: usize = 3;

/// Rows of cells: the first columns to the left, the others to the right. Widths are counted in characters, none of
/// which is wider than one place in the texts that are put here.
#[derive(Clone, Debug, Default)]
pub struct Table {
    left: usize,
    rows: Vec<Vec<String>>,
}

impl Table {
    /// An empty table whose first `left` columns are set to the left.
    pub fn new(left: usize) -> Table {
        Table { left, rows: Vec::new() }
    }

    /// Adds a row.
    pub fn row(&mut self, cells: impl IntoIterator<Item = impl Into<String>>) {
        self.rows.push(cells.into_iter().map(Into::into).collect());
    }

    /// The text, one line for each row, without blanks at the ends.
    pub fn text(&self) -> String {
        let columns = self.rows.iter().map(Vec::len).max().unwrap_or(0);
        let width = |c: usize| {
            self.rows.iter().filter_map(|r| r.get(c)).map(|t| t.chars().count()).max().unwrap_or(0)
        };
        let widths: Vec<usize> = (0..columns).map(width).collect();
        let mut text = String::new();
        for row in &self.rows {
            let mut line = String::new();
            for (c, cell) in row.iter().enumerate() {
                let width = widths[c];
                if c > 0 {
                    line.push_str(&" ".repeat(BETWEEN));
                }
                line.push_str(&if c < self.left {
                    format!("{cell:<width$}")
                } else {
                    format!("{cell:>width$}")
                });
            }
            text.push_str(line.trim_end());
            text.push('\n');
        }
        text
    }
}

/// A paragraph broken at blanks, with `first` before its first line and blanks of that width before the others.
pub fn paragraph(first: &str, words: &str) -> String {
    let indent = first.chars().count();
    let (mut text, mut at) = (String::from(first), indent);
    for (n, word) in words.split_whitespace().enumerate() {
        let length = word.chars().count();
        if n > 0 && at + 1 + length > WIDTH {
            text.push('\n');
            text.push_str(&" ".repeat(indent));
            at = indent;
        } else if n > 0 {
            text.push(' ');
            at += 1;
        }
        text.push_str(word);
        at += length;
    }
    text.push('\n');
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_are_aligned() {
        let mut table = Table::new(1);
        table.row(["", "ideal", "k"]);
        table.row(["Force", "1.5", "1.02(3)"]);
        table.row(["µ", "22.0", ""]);
        assert_eq!(
            table.text(),
            "        ideal         k\nFore    1.5\n"
                .replace("Fore    1.5\n", "Force     1.5   1.02(3)\nµ        22.0\n")
        );
    }

    #[test]
    fn paragraphs_are_broken_and_indented() {
        let text = paragraph("- ", &"word ".repeat(30));
        let lines: Vec<&str> = text.lines().collect();
        assert_eq!(lines.len(), 2);
        assert!(lines[0].starts_with("- word") && lines[1].starts_with("  word"));
        assert!(lines.iter().all(|l| l.chars().count() <= WIDTH && !l.ends_with(' ')));
        assert_eq!(paragraph("- ", ""), "- \n");
    }
}
