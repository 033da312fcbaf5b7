//! A handout as LaTeX: an article that stands alone and needs no package beyond a small TeX system.

use std::fmt::Write;

use super::document::{true_minus, Block, Cell, Document, Grid};
use crate::draw::sheet::{Anchor, Mark, Sheet};
use crate::draw::theme;

/// Millimetres that the drawing may be wide; it is scaled to it.
const WIDTH: f64 = 128.0;
/// Columns of a table above which they are set closely.
const WIDE: usize = 5;
/// Lines that are at least this thick are drawn thick, in mm.
const THICK: f64 = 0.4;

const PREAMBLE: &str = r"\documentclass[10pt]{article}
\usepackage[T1]{fontenc}
\usepackage[utf8]{inputenc}
\IfFileExists{lmodern.sty}{\usepackage{lmodern}}{}
\usepackage{booktabs}
\usepackage{textcomp}
\IfFileExists{pict2e.sty}{\usepackage{pict2e}}{}
\setlength{\textwidth}{170mm}\setlength{\oddsidemargin}{-5.4mm}\setlength{\evensidemargin}{-5.4mm}
\setlength{\textheight}{235mm}\setlength{\topmargin}{-15mm}\setlength{\headheight}{0pt}\setlength{\headsep}{0pt}
\setlength{\parindent}{0pt}\setlength{\parskip}{4pt plus 1pt}
% A letter that the fonts here do not have.
\newcommand{\letter}[1]{[U+#1]\allowbreak{}}
";

/// Text with everything escaped that means something in TeX; letters outside of Latin by number.
pub fn escaped(text: &str) -> String {
    let mut all = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '\\' => all.push_str("\\textbackslash{}"),
            '{' | '}' | '$' | '&' | '#' | '%' | '_' => {
                all.push('\\');
                all.push(c);
            }
            '^' => all.push_str("\\textasciicircum{}"),
            '~' => all.push_str("\\textasciitilde{}"),
            '<' => all.push_str("\\textless{}"),
            '>' => all.push_str("\\textgreater{}"),
            '|' => all.push_str("\\textbar{}"),
            '"' => all.push_str("\\textquotedbl{}"),
            '\'' => all.push_str("\\textquotesingle{}"),
            '`' => all.push_str("\\textasciigrave{}"),
            // No ligatures of hyphens.
            '-' => all.push_str("-{}"),
            '°' => all.push_str("\\textdegree{}"),
            'µ' => all.push_str("\\textmu{}"),
            '−' => all.push_str("$-$"),
            '×' => all.push_str("$\\times$"),
            '²' => all.push_str("$^2$"),
            'ε' => all.push_str("$\\varepsilon$"),
            '…' => all.push_str("\\ldots{}"),
            c if c.is_control() => all.push(' '),
            c if c.is_ascii() => all.push(c),
            // Latin-1 letters, which every font in T1 has.
            'À'..='Ö' | 'Ø'..='ö' | 'ø'..='ÿ' => all.push(c),
            c => {
                let _ = write!(all, "\\letter{{{:04X}}}", u32::from(c));
            }
        }
    }
    all
}

/// A title: long words may be broken between pieces of some letters.
fn title(text: &str) -> String {
    const PIECE: usize = 12;
    let word = |word: &str| {
        let letters: Vec<char> = word.chars().collect();
        let pieces: Vec<String> =
            letters.chunks(PIECE).map(|piece| escaped(&piece.iter().collect::<String>())).collect();
        pieces.join("\\allowbreak{}")
    };
    text.split(' ').map(word).collect::<Vec<_>>().join(" ")
}

/// One of the program's own texts: letters with an index become mathematics, backquotes a typewriter's letters.
fn own(text: &str) -> String {
    let mut all = escaped(text);
    for (symbol, index) in [("k\\_C", "C"), ("k\\_F", "F"), ("k\\_T", "T")] {
        all = all.replace(symbol, &format!("$k_{index}$"));
    }
    let mut typed = false;
    let mut parts = all.split("\\textasciigrave{}");
    let mut text: String = parts.next().unwrap_or_default().into();
    for part in parts {
        typed = !typed;
        text.push_str(if typed { "\\texttt{" } else { "}" });
        text.push_str(part);
    }
    text
}

/// A number with a true minus.
fn number(text: &str) -> String {
    own(&true_minus(text))
}

fn grid(text: &mut String, grid: &Grid) {
    let columns = grid.columns.len();
    let wide = grid.columns.iter().any(|c| c.len() > 16);
    let words = grid.rows.iter().flat_map(|r| &r.1).any(|c| c.shown().len() > 24);
    let layout = if wide || words {
        // Words need lines of their own; the names take what is left.
        format!("@{{}}p{{32mm}}*{{{columns}}}{{p{{{}mm}}}}@{{}}", 128 / columns.max(1) - 4)
    } else {
        format!("@{{}}r*{{{columns}}}{{r}}@{{}}")
    };
    let between = if columns > WIDE { 2.5 } else { 4.5 };
    let _ = writeln!(text, "\\begin{{center}}\\small\\setlength{{\\tabcolsep}}{{{between}pt}}");
    let _ = writeln!(text, "{}\\\\[3pt]\n\\begin{{tabular}}{{{layout}}}\n\\toprule", own(&grid.caption));
    if !grid.across.is_empty() {
        let _ = writeln!(text, "& \\multicolumn{{{columns}}}{{c}}{{{}}}\\\\", own(&grid.across));
    }
    let heads: Vec<String> = grid.columns.iter().map(|c| number(c)).collect();
    let _ = writeln!(text, "{} & {}\\\\\n\\midrule", own(&grid.corner), heads.join(" & "));
    for (name, cells) in &grid.rows {
        let line = |of: &dyn Fn(&Cell) -> String| cells.iter().map(of).collect::<Vec<_>>().join(" & ");
        let _ = writeln!(text, "{} & {}\\\\", number(name), line(&|c| number(c.shown())));
        if grid.has_factors() {
            let small = |c: &Cell| match c {
                Cell::Text(_) => String::new(),
                Cell::Factor(_) => format!("\\scriptsize {}", number(c.percent())),
            };
            let _ = writeln!(text, "& {}\\\\[1pt]", line(&small));
        }
    }
    text.push_str("\\bottomrule\n\\end{tabular}\n\\end{center}\n");
}

/// A sheet in TeX's own drawing commands: lines and outlines, no fills.
fn picture(text: &mut String, sheet: &Sheet) {
    let scale = WIDTH / sheet.size[0];
    let [width, height] = sheet.size.map(|s| s * scale);
    let place = |p: &[f64; 2]| (p[0] * scale, height - p[1] * scale);
    let _ = writeln!(text, "\\begin{{center}}\\setlength{{\\unitlength}}{{1mm}}");
    let _ = writeln!(text, "\\begin{{picture}}({width:.2},{height:.2})");
    for mark in sheet.layers.iter().flat_map(|l| &l.marks) {
        match mark {
            Mark::Line { points, width, .. } => {
                text.push_str(if *width >= THICK { "\\thicklines" } else { "\\thinlines" });
                path(text, points.iter().map(place));
            }
            Mark::Area { points, .. } => {
                text.push_str("\\thinlines");
                path(text, points.iter().chain(points.first()).map(place));
            }
            Mark::Text { text: words, at, anchor, .. } => {
                let side = match anchor {
                    Anchor::Left => "[l]",
                    Anchor::Middle => "",
                    Anchor::Right => "[r]",
                };
                let (x, y) = place(at);
                let _ = writeln!(
                    text,
                    "\\put({x:.2},{y:.2}){{\\makebox(0,0){side}{{\\footnotesize {}}}}}",
                    own(words)
                );
            }
        }
    }
    text.push_str("\\end{picture}\n\\end{center}\n");
}

/// Straight pieces as curves whose middle lies on them: TeX's lines know few slopes.
fn path(text: &mut String, points: impl Iterator<Item = (f64, f64)>) {
    let points: Vec<(f64, f64)> = points.collect();
    for pair in points.windows(2) {
        let [(x0, y0), (x1, y1)] = [pair[0], pair[1]];
        if (x1 - x0).hypot(y1 - y0) > theme::HAIR {
            let (xm, ym) = (0.5 * (x0 + x1), 0.5 * (y0 + y1));
            let _ = write!(text, "\\qbezier({x0:.2},{y0:.2})({xm:.2},{ym:.2})({x1:.2},{y1:.2})");
        }
    }
    text.push('\n');
}

/// The text.
pub fn latex(document: &Document) -> String {
    let mut text = String::from(PREAMBLE);
    text.push_str("\\begin{document}\n");
    let _ = writeln!(
        text,
        "{{\\LARGE\\bfseries\\raggedright {}\\par}}\n{}\n",
        title(&document.title),
        own(&document.subtitle)
    );
    for section in &document.sections {
        if section.blocks.iter().all(|b| matches!(b, Block::Calculator(_))) {
            continue;
        }
        let _ = writeln!(text, "\\section*{{{}}}", own(&section.heading));
        for block in &section.blocks {
            match block {
                Block::Text(words) => {
                    let _ = writeln!(text, "{}\n", number(words));
                }
                Block::Caution(words) => {
                    let _ = writeln!(text, "\\textbf{{Danger.}} {}\n", own(words));
                }
                Block::List(items) => {
                    text.push_str("\\begin{itemize}\\setlength{\\itemsep}{0pt}\n");
                    for item in items {
                        let _ = writeln!(text, "\\item {}", own(item));
                    }
                    text.push_str("\\end{itemize}\n");
                }
                Block::Facts(facts) => {
                    text.push_str("\\begin{tabular}{@{}p{40mm}p{122mm}@{}}\n");
                    for (name, value) in facts {
                        let _ = writeln!(text, "{} & {}\\\\", own(name), number(value));
                    }
                    text.push_str("\\end{tabular}\n\n");
                }
                Block::Formulas(formulas) => {
                    text.push_str("\\begin{center}\n");
                    let lines: Vec<String> = formulas.iter().map(|f| own(&f.replace(" - ", " − "))).collect();
                    let _ = writeln!(text, "{}\n\\end{{center}}", lines.join("\\\\\n"));
                }
                Block::Grid(g) => grid(&mut text, g),
                Block::Drawing { sheet, .. } => picture(&mut text, sheet),
                Block::Calculator(_) => {}
            }
        }
    }
    text.push_str("\\end{document}\n");
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn titles_mean_nothing_in_tex() {
        assert_eq!(
            escaped("\\input{/etc/passwd} $x^2$ 50% a_b & ~#"),
            "\\textbackslash{}input\\{/etc/passwd\\} \\$x\\textasciicircum{}2\\$ 50\\% a\\_b \\& \\textasciitilde{}\\#"
        );
        assert_eq!(escaped("ä標^^5c"), "ä\\letter{6A19}\\textasciicircum{}\\textasciicircum{}5c");
        assert_eq!(own("`a b` times k_F"), "\\texttt{a b} times $k_F$");
    }
}
