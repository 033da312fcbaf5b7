//! A handout as CSV: numbers as numbers, and no cell that a spreadsheet would take for a formula.

use csv::WriterBuilder;

use super::document::{Block, Cell, Document, Grid};

/// Characters at the beginning of a cell that make spreadsheets calculate (common practice).
const FORMULA: [char; 8] = ['=', '+', '-', '@', '\t', '\r', '|', '%'];

/// A cell that stays a text. An apostrophe before it is what spreadsheets have for that.
pub fn harmless(text: &str) -> String {
    let begins = text.trim_start_matches([' ', '\u{a0}', '"', '\'']).starts_with(FORMULA);
    if begins && text.parse::<f64>().map_or(true, |v| !v.is_finite()) {
        format!("'{text}")
    } else {
        text.into()
    }
}

struct Rows(csv::Writer<Vec<u8>>);

impl Rows {
    fn row(&mut self, cells: impl IntoIterator<Item = impl AsRef<str>>) {
        let cells: Vec<String> = cells.into_iter().map(|c| harmless(c.as_ref())).collect();
        self.0.write_record(&cells).expect("memory takes what is written");
    }

    fn blank(&mut self) {
        self.row([""]);
    }

    fn grid(&mut self, grid: &Grid, what: &str, cell: impl Fn(&Cell) -> String) {
        self.row([format!("{}{what}", grid.caption)]);
        let corner = if grid.across.is_empty() {
            grid.corner.clone()
        } else {
            format!("{} (down); {} (across)", grid.corner, grid.across)
        };
        self.row([corner].iter().chain(&grid.columns));
        for (name, cells) in &grid.rows {
            self.row([name.clone()].into_iter().chain(cells.iter().map(&cell)));
        }
        self.blank();
    }
}

/// A number of a factor, or the text of a cell that is none.
fn or_text(cell: &Cell, number: impl Fn([f64; 2]) -> String) -> String {
    match cell {
        Cell::Text(text) => text.clone(),
        Cell::Factor(f) => number(f.numbers),
    }
}

/// The text.
pub fn spreadsheet(document: &Document) -> String {
    let mut rows = Rows(WriterBuilder::new().flexible(true).from_writer(Vec::new()));
    rows.row([&document.title]);
    rows.row([&document.subtitle]);
    rows.blank();
    for section in &document.sections {
        if section.blocks.iter().all(|b| matches!(b, Block::Calculator(_))) {
            continue;
        }
        rows.row([&section.heading]);
        for block in &section.blocks {
            match block {
                Block::Text(words) | Block::Caution(words) | Block::Drawing { description: words, .. } => {
                    rows.row([words]);
                }
                Block::List(lines) | Block::Formulas(lines) => lines.iter().for_each(|l| rows.row([l])),
                Block::Facts(facts) => facts.iter().for_each(|(name, value)| rows.row([name, value])),
                Block::Grid(g) if g.has_factors() => {
                    rows.grid(g, "", |c| or_text(c, |[v, _]| format!("{v:.7}")));
                    rows.grid(g, ", standard uncertainty", |c| or_text(c, |[_, u]| format!("{u:.2e}")));
                    rows.grid(g, ", per cent 100 (k - 1)", |c| {
                        or_text(c, |[v, _]| format!("{:.5}", 100.0 * (v - 1.0)))
                    });
                }
                Block::Grid(g) => rows.grid(g, "", |c| or_text(c, |[v, _]| v.to_string())),
                Block::Calculator(_) => {}
            }
        }
        rows.blank();
    }
    let bytes = rows.0.into_inner().expect("memory takes what is written");
    String::from_utf8(bytes).expect("texts and digits")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_is_a_formula_but_numbers_stay_numbers() {
        for text in ["=1+1", " =1", "+a", "-2+3", "@SUM(A1)", "\t=1", "-inf", "\"=1", "'=1"] {
            assert_eq!(harmless(text), format!("'{text}"));
        }
        for text in ["-1.5", "+2e-3", "a=b", "1.0", ""] {
            assert_eq!(harmless(text), text);
        }
    }
}
