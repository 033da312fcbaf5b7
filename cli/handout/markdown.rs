//! A handout as Markdown: headings, lists and pipe tables only, which every reader of Markdown knows.

use std::fmt::Write;

use super::document::{true_minus, Block, Cell, Document, Grid};

/// Text with all punctuation escaped that means something in Markdown or in the HTML it may hold.
///
/// [CommonMark] lets any ASCII punctuation be escaped; letters with an index keep their plain underscore, which means
/// nothing inside of a word.
///
/// [CommonMark]: https://spec.commonmark.org/
pub fn escaped(text: &str) -> String {
    let mut all = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '<' => all.push_str("&lt;"),
            '>' => all.push_str("&gt;"),
            '&' => all.push_str("&amp;"),
            '\\' | '`' | '*' | '_' | '{' | '}' | '[' | ']' | '#' | '!' | '|' | '~' | '$' | '"' | '\''
            | '^' | '@' => {
                all.push('\\');
                all.push(c);
            }
            // A colon would make an address a link in some dialects.
            ':' => all.push_str("&#58;"),
            '\n' | '\r' => all.push(' '),
            c => all.push(c),
        }
    }
    all
}

/// One of the program's own texts; backquotes in it are meant.
fn own(text: &str) -> String {
    text.replace('*', "\\*").replace('|', "\\|")
}

fn grid(text: &mut String, grid: &Grid, cell: impl Fn(&Cell) -> String, what: &str) {
    let across = if grid.across.is_empty() { String::new() } else { format!(" \\\\ {}", grid.across) };
    // Writing to memory does not fail, here and below.
    let _ = writeln!(text, "**{}{what}**\n", own(&grid.caption));
    let columns: Vec<String> = grid.columns.iter().map(|c| own(&true_minus(c))).collect();
    let _ = writeln!(text, "| {}{across} | {} |", own(&grid.corner), columns.join(" | "));
    let side = if grid.has_factors() { "---:|" } else { "---|" };
    let _ = writeln!(text, "|{}", side.repeat(1 + grid.columns.len()));
    for (name, cells) in &grid.rows {
        let cells: Vec<String> = cells.iter().map(|c| own(&cell(c))).collect();
        let _ = writeln!(text, "| {} | {} |", own(&true_minus(name)), cells.join(" | "));
    }
    text.push('\n');
}

/// The text.
pub fn markdown(document: &Document) -> String {
    let mut text = format!("# {}\n\n", escaped(&document.title));
    let _ = writeln!(text, "{}\n", document.subtitle);
    for section in &document.sections {
        if section.blocks.iter().all(|b| matches!(b, Block::Calculator(_))) {
            continue;
        }
        let _ = writeln!(text, "## {}\n", own(&section.heading));
        for block in &section.blocks {
            match block {
                Block::Text(words) => {
                    let _ = writeln!(text, "{}\n", own(words));
                }
                Block::Caution(words) => {
                    let _ = writeln!(text, "> **Danger.** {}\n", own(words));
                }
                Block::List(items) => {
                    for item in items {
                        let _ = writeln!(text, "* {}", own(item));
                    }
                    text.push('\n');
                }
                Block::Facts(facts) => {
                    let _ = writeln!(text, "| | |\n|---|---|");
                    for (name, value) in facts {
                        let _ = writeln!(text, "| {} | {} |", own(name), own(&true_minus(value)));
                    }
                    text.push('\n');
                }
                Block::Formulas(formulas) => {
                    for formula in formulas {
                        let _ = writeln!(text, "    {}", true_minus(formula));
                    }
                    text.push('\n');
                }
                Block::Grid(g) if g.has_factors() => {
                    grid(&mut text, g, |c| true_minus(c.shown()), "");
                    grid(&mut text, g, |c| true_minus(c.percent()), ", as 100 (k − 1)");
                }
                Block::Grid(g) => grid(&mut text, g, |c| true_minus(c.shown()), ""),
                Block::Drawing { description, .. } => {
                    let _ = writeln!(text, "{}\n", own(&true_minus(description)));
                }
                Block::Calculator(_) => {}
            }
        }
    }
    text.truncate(text.trim_end().len());
    text.push('\n');
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn titles_mean_nothing_in_markdown() {
        assert_eq!(
            escaped("<b>*x*</b> [a](http://b)|\n# c"),
            "&lt;b&gt;\\*x\\*&lt;/b&gt; \\[a\\](http&#58;//b)\\| \\# c"
        );
    }
}
