//! A handout as sections of blocks, without a format: what [`content`](super::content) makes and the writers write.
//!
//! All texts are the program's own but for the title, which a person typed. In them `k_F` and the like stand for a letter
//! with an index, and numbers have an ordinary hyphen for a minus; each writer sets both as its format likes it.

use serde_json::Value;

use crate::draw::sheet::Sheet;

/// A whole handout.
#[derive(Clone, Debug, PartialEq)]
pub struct Document {
    /// Title of the bench, harmless but for the characters of the formats.
    pub title: String,
    /// What it is, in one line.
    pub subtitle: String,
    /// From the top down.
    pub sections: Vec<Section>,
}

/// Blocks under a heading.
#[derive(Clone, Debug, PartialEq)]
pub struct Section {
    /// A word for links and tests.
    pub id: &'static str,
    /// The heading.
    pub heading: String,
    /// What stands under it.
    pub blocks: Vec<Block>,
}

/// A part of a section.
#[derive(Clone, Debug, PartialEq)]
pub enum Block {
    /// A paragraph.
    Text(String),
    /// A paragraph that keeps a person from harm.
    Caution(String),
    /// Sentences of equal rank.
    List(Vec<String>),
    /// Names and what they are.
    Facts(Vec<(String, String)>),
    /// Formulas, one a line.
    Formulas(Vec<String>),
    /// Rows and columns.
    Grid(Grid),
    /// The bench to scale, with its description in words.
    Drawing {
        /// The drawing.
        sheet: Sheet,
        /// What it shows.
        description: String,
    },
    /// Fields to type readings into, where the format can calculate.
    Calculator(Calculator),
}

/// Rows and columns with names.
#[derive(Clone, Debug, PartialEq)]
pub struct Grid {
    /// What it shows.
    pub caption: String,
    /// Above the names of the rows.
    pub corner: String,
    /// Above the names of the columns; empty where the columns speak for themselves.
    pub across: String,
    /// Names of the columns.
    pub columns: Vec<String>,
    /// Names of the rows, and their cells.
    pub rows: Vec<(String, Vec<Cell>)>,
}

/// A cell.
#[derive(Clone, Debug, PartialEq)]
pub enum Cell {
    /// A number or a few words.
    Text(String),
    /// A factor.
    Factor(FactorCell),
}

/// A factor as it is shown, and as a spreadsheet wants it.
#[derive(Clone, Debug, PartialEq)]
pub struct FactorCell {
    /// Concise notation.
    pub shown: String,
    /// 100 (k - 1) in concise notation, with its sign.
    pub percent: String,
    /// Value and standard uncertainty.
    pub numbers: [f64; 2],
}

impl Grid {
    /// Whether its cells are factors.
    pub fn has_factors(&self) -> bool {
        self.rows.iter().flat_map(|r| &r.1).any(|c| matches!(c, Cell::Factor(_)))
    }
}

/// What a calculator needs.
#[derive(Clone, Debug, PartialEq)]
pub struct Calculator {
    /// What is typed.
    pub fields: Vec<Field>,
    /// The table, for [`embedded`](super::embedded) arithmetic.
    pub data: Value,
}

/// Something to type.
#[derive(Clone, Debug, PartialEq)]
pub struct Field {
    /// As `apply` calls it.
    pub name: &'static str,
    /// For a person, with the unit.
    pub label: String,
    /// Unit of what is typed.
    pub unit: &'static str,
    /// What may be typed.
    pub hint: String,
    /// What stands there at first.
    pub value: String,
}

impl Cell {
    /// As it is shown.
    pub fn shown(&self) -> &str {
        match self {
            Cell::Text(text) => text,
            Cell::Factor(f) => &f.shown,
        }
    }

    /// In per cent, if it is a factor.
    pub fn percent(&self) -> &str {
        match self {
            Cell::Text(text) => text,
            Cell::Factor(f) => &f.percent,
        }
    }
}

/// A true minus before numbers: names have hyphens, and so have powers of ten.
pub fn true_minus(text: &str) -> String {
    let mut all = String::with_capacity(text.len());
    let mut letters = text.chars().peekable();
    let mut before = ' ';
    while let Some(c) = letters.next() {
        let number = letters.peek().is_some_and(|n| n.is_ascii_digit());
        all.push(if c == '-' && number && !before.is_alphanumeric() { '−' } else { c });
        before = c;
    }
    all
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hyphens_stay_hyphens() {
        assert_eq!(true_minus("-1.5 to -2, free-edge, 1e-5, (-x)"), "−1.5 to −2, free-edge, 1e-5, (-x)");
    }
}
