//! A document of headings, paragraphs, tables and pictures: on the screen, as HTML, as Markdown.

use crate::draw::caption::plain as printable;
use crate::table::{paragraph, Table as Columns};

/// A piece of a document.
#[derive(Clone, Debug, PartialEq)]
pub enum Block {
    /// A heading; 1 is the title.
    Heading(u8, String),
    /// A paragraph.
    Paragraph(String),
    /// A table.
    Table(Table),
    /// A picture, as SVG, and what it shows.
    Picture {
        /// SVG.
        svg: String,
        /// What it shows.
        caption: String,
    },
}

/// A table.
#[derive(Clone, Debug, PartialEq)]
pub struct Table {
    /// Columns that are set to the left; the others are numbers.
    pub left: usize,
    /// Heads of the columns.
    pub head: Vec<String>,
    /// Rows.
    pub rows: Vec<Vec<String>>,
}

impl Table {
    /// An empty table.
    pub fn new(left: usize, head: &[&str]) -> Table {
        Table { left, head: head.iter().map(|h| h.to_string()).collect(), rows: Vec::new() }
    }

    /// Adds a row.
    pub fn row(&mut self, cells: impl IntoIterator<Item = impl Into<String>>) {
        self.rows.push(cells.into_iter().map(Into::into).collect());
    }
}

/// For a terminal. Pictures are left to the report.
pub fn screen(blocks: &[Block]) -> String {
    let mut text = String::new();
    for block in blocks {
        match block {
            Block::Heading(level, words) => {
                if !text.is_empty() {
                    text.push('\n');
                }
                text.push_str(&paragraph("", &printable(words)));
                if *level == 1 {
                    text.push('\n');
                }
            }
            Block::Paragraph(words) => text.push_str(&paragraph("", words)),
            Block::Table(table) => {
                let mut columns = Columns::new(table.left);
                columns.row(&table.head);
                table.rows.iter().for_each(|row| columns.row(row));
                text.push_str(&columns.text());
            }
            Block::Picture { .. } => {}
        }
    }
    text
}

/// What has a meaning in Markdown, made plain.
fn escaped(text: &str) -> String {
    let mut out = String::new();
    for c in printable_all(text).chars() {
        if matches!(
            c,
            '\\' | '`' | '*' | '_' | '{' | '}' | '[' | ']' | '<' | '>' | '#' | '|' | '!' | '&' | '~'
        ) {
            out.push('\\');
        }
        out.push(c);
    }
    out
}

/// Long texts stay whole; control characters and line breaks go.
fn printable_all(text: &str) -> String {
    text.chars().map(|c| if c.is_control() { ' ' } else { c }).collect()
}

/// As Markdown. Pictures are left to the HTML report, and their caption says so.
pub fn markdown(blocks: &[Block]) -> String {
    let mut text = String::new();
    for block in blocks {
        match block {
            Block::Heading(level, words) => {
                text.push_str(&format!("{} {}\n\n", "#".repeat((*level).into()), escaped(words)));
            }
            Block::Paragraph(words) => text.push_str(&format!("{}\n\n", escaped(words))),
            Block::Table(table) => {
                let line = |cells: &[String]| {
                    let cells: Vec<String> = cells.iter().map(|c| escaped(c)).collect();
                    format!("| {} |\n", cells.join(" | "))
                };
                text.push_str(&line(&table.head));
                let marks = (0..table.head.len()).map(|n| if n < table.left { "---" } else { "---:" });
                text.push_str(&format!("|{}|\n", marks.collect::<Vec<_>>().join("|")));
                table.rows.iter().for_each(|row| text.push_str(&line(row)));
                text.push('\n');
            }
            Block::Picture { caption, .. } => {
                text.push_str(&format!("(Picture, in the HTML report: {})\n\n", escaped(caption)));
            }
        }
    }
    text
}

/// The look of the page: black on white, fit for print.
const STYLE: &str = "body{font-family:'DejaVu Sans',Verdana,sans-serif;font-size:10pt;max-width:60em;margin:2em auto;\
padding:0 1em;color:#1c232b;background:#fff}h1{font-size:16pt}h2{font-size:13pt;margin-top:2em}h3{font-size:11pt}\
table{border-collapse:collapse;margin:1em 0;font-size:8.5pt}th,td{border-bottom:1px solid #c9ced3;padding:.2em .6em;\
text-align:right;vertical-align:top}th{border-bottom:1px solid #1c232b}.left{text-align:left}figure{margin:1em 0}\
figure svg{width:128mm;max-width:100%;height:auto}figcaption{font-size:8.5pt}@media print{body{margin:0}\
tr,figure{break-inside:avoid}}";

/// As one self-contained page.
pub fn html(title: &str, blocks: &[Block]) -> String {
    let safe = |text: &str| html_escape::encode_text(&printable_all(text)).into_owned();
    let mut text = format!(
        "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n<title>{}</title>\n\
         <style>{STYLE}</style>\n</head>\n<body>\n",
        safe(title)
    );
    for block in blocks {
        match block {
            Block::Heading(level, words) => {
                text.push_str(&format!("<h{level}>{}</h{level}>\n", safe(words)));
            }
            Block::Paragraph(words) => text.push_str(&format!("<p>{}</p>\n", safe(words))),
            Block::Table(table) => {
                let line = |cells: &[String], tag: &str| {
                    let cell = |(n, c): (usize, &String)| {
                        let class = if n < table.left { " class=\"left\"" } else { "" };
                        format!("<{tag}{class}>{}</{tag}>", safe(c))
                    };
                    format!("<tr>{}</tr>\n", cells.iter().enumerate().map(cell).collect::<String>())
                };
                text.push_str(&format!("<table>\n<thead>{}</thead>\n<tbody>\n", line(&table.head, "th")));
                table.rows.iter().for_each(|row| text.push_str(&line(row, "td")));
                text.push_str("</tbody>\n</table>\n");
            }
            Block::Picture { svg, caption } => {
                let svg = svg.find("<svg").map_or("", |at| &svg[at..]);
                text.push_str(&format!("<figure>{svg}<figcaption>{}</figcaption></figure>\n", safe(caption)));
            }
        }
    }
    text.push_str("</body>\n</html>\n");
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn titles_cannot_break_out() {
        let evil = "<script>alert(1)</script> | [x](y) & \"z\"\nnew";
        let mut table = Table::new(1, &["a", "b"]);
        table.row([evil, "1"]);
        let blocks = [
            Block::Heading(1, evil.into()),
            Block::Paragraph(evil.into()),
            Block::Table(table),
            Block::Picture { svg: "<?xml?><svg></svg>".into(), caption: evil.into() },
        ];
        let page = html(evil, &blocks);
        assert!(!page.contains("<script") && page.contains("&lt;script&gt;") && !page.contains("<?xml"));
        let marked = markdown(&blocks);
        assert!(!marked.contains("<script") && !marked.contains("[x](y)"), "{marked}");
        assert!(marked.contains("\\|"), "{marked}");
        assert_eq!(marked.lines().filter(|l| l.starts_with("| ")).count(), 2);
        assert!(!screen(&blocks).contains('\u{1b}'));
    }
}
