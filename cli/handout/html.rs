//! A handout as one HTML page that needs nothing else: style, drawing, table and calculator are in it.
//!
//! The page's own policy lets nothing run but the calculator, known by its hash, and nothing be fetched.

use std::fmt::Write;

use base64::engine::general_purpose::STANDARD;
use base64::Engine;
use sha2::{Digest, Sha256};

use super::document::{true_minus, Block, Calculator, Document, Grid, Section};
use crate::draw::render::{escaped, svg_in_page};
use crate::error::Error;

const STYLE: &str = include_str!("page.css");
const SCRIPT: &str = include_str!("calculator.js");

/// One of the program's own texts: letters with an index, backquotes as code.
fn own(text: &str) -> String {
    let mut all = escaped(&true_minus(text)).replace(" - ", " − ");
    for index in ["C", "F", "T"] {
        all = all.replace(&format!("k_{index}"), &format!("<var>k</var><sub>{index}</sub>"));
    }
    let mut parts = all.split('`');
    let mut text: String = parts.next().unwrap_or_default().into();
    for (n, part) in parts.enumerate() {
        text.push_str(if n % 2 == 0 { "<code>" } else { "</code>" });
        text.push_str(part);
    }
    text
}

/// Data inside of a script element: nothing in it can end the element.
fn data(value: &serde_json::Value) -> String {
    value.to_string().replace('<', "\\u003c").replace('>', "\\u003e").replace('&', "\\u0026")
}

fn hash(text: &str) -> String {
    format!("'sha256-{}'", STANDARD.encode(Sha256::digest(text.as_bytes())))
}

// Writing to memory does not fail, here and below.
fn grid(html: &mut String, grid: &Grid) {
    let kind = if grid.has_factors() { "factors" } else { "words" };
    let _ = write!(
        html,
        "<div class=\"scroll\" tabindex=\"0\" role=\"region\" aria-label=\"{}\">\n<table class=\"{kind}\">\n\
        <caption>{}</caption>\n<thead>\n",
        escaped(&grid.caption),
        own(&grid.caption)
    );
    if grid.across.is_empty() {
        let _ = write!(html, "<tr><th scope=\"col\">{}</th>", own(&grid.corner));
    } else {
        let _ = write!(
            html,
            "<tr><th scope=\"col\" rowspan=\"2\">{}</th><th scope=\"colgroup\" colspan=\"{}\">{}</th></tr>\n<tr>",
            own(&grid.corner),
            grid.columns.len(),
            own(&grid.across)
        );
    }
    for name in &grid.columns {
        let _ = write!(html, "<th scope=\"col\">{}</th>", own(name));
    }
    html.push_str("</tr>\n</thead>\n<tbody>\n");
    for (name, cells) in &grid.rows {
        let _ = write!(html, "<tr><th scope=\"row\">{}</th>", own(name));
        for cell in cells {
            let below = match cell {
                super::document::Cell::Factor(f) => format!("<small>{}</small>", own(&f.percent)),
                super::document::Cell::Text(_) => String::new(),
            };
            let _ = write!(html, "<td>{}{below}</td>", own(cell.shown()));
        }
        html.push_str("</tr>\n");
    }
    html.push_str("</tbody>\n</table>\n</div>\n");
}

fn calculator(html: &mut String, calculator: &Calculator) {
    html.push_str(
        "<noscript><p>The calculator needs JavaScript; without it use the tables, or <code>tiltgap apply</code>.</p></noscript>\n\
         <div id=\"calculator-body\" hidden>\n<p>Interpolated as <code>tiltgap apply</code> does. An uncertainty that is left \
         empty counts as zero; that of the table is always included.</p>\n<form id=\"calculator-form\" autocomplete=\"off\" \
         novalidate>\n",
    );
    for field in &calculator.fields {
        let _ = writeln!(
            html,
            "<div class=\"field\"><label for=\"in-{name}\">{label}, {unit} <span class=\"hint\">{hint}</span></label>\
             <input id=\"in-{name}\" name=\"{name}\" inputmode=\"decimal\" value=\"{value}\" \
             aria-describedby=\"calculator-message\">\
             <label for=\"in-u_{name}\">± its standard uncertainty, {unit}</label>\
             <input id=\"in-u_{name}\" name=\"u_{name}\" inputmode=\"decimal\" value=\"\" \
             aria-describedby=\"calculator-message\"></div>",
            name = field.name,
            label = escaped(&field.label),
            unit = escaped(field.unit),
            hint = escaped(&true_minus(&field.hint)),
            value = escaped(&field.value),
        );
    }
    html.push_str(
        "</form>\n<p id=\"calculator-message\" role=\"alert\"></p>\n<div class=\"scroll\" tabindex=\"0\" role=\"region\" \
         aria-label=\"Results of the calculator\">\n<table class=\"results\">\n<caption>Ideal and corrected</caption>\n<thead>\n<tr>\
         <th scope=\"col\">Quantity</th><th scope=\"col\">ideal</th><th scope=\"col\">factor</th>\
         <th scope=\"col\">corrected</th></tr>\n</thead>\n<tbody aria-live=\"polite\">\n",
    );
    for quantity in calculator.data["quantities"].as_array().into_iter().flatten() {
        let name = quantity["name"].as_str().unwrap_or_default();
        let _ = writeln!(
            html,
            "<tr><th scope=\"row\">{name}</th><td id=\"out-{name}-ideal\">–</td><td id=\"out-{name}-factor\">–</td>\
             <td id=\"out-{name}-corrected\">–</td></tr>"
        );
    }
    let _ = write!(
        html,
        "</tbody>\n</table>\n</div>\n</div>\n<script type=\"application/json\" id=\"table-data\">{}</script>\n",
        data(&calculator.data)
    );
}

fn section(html: &mut String, section: &Section) -> Result<(), Error> {
    let id = section.id;
    let _ = write!(
        html,
        "<section id=\"{id}\" aria-labelledby=\"{id}-heading\">\n<h2 id=\"{id}-heading\">{}</h2>\n",
        own(&section.heading)
    );
    for block in &section.blocks {
        match block {
            Block::Text(words) => {
                let _ = writeln!(html, "<p>{}</p>", own(words));
            }
            Block::Caution(words) => {
                let _ = writeln!(html, "<p class=\"danger\"><strong>Danger.</strong> {}</p>", own(words));
            }
            Block::List(items) => {
                html.push_str("<ul>\n");
                for item in items {
                    let _ = writeln!(html, "<li>{}</li>", own(item));
                }
                html.push_str("</ul>\n");
            }
            Block::Facts(facts) => {
                html.push_str("<dl>\n");
                for (name, value) in facts {
                    let _ = writeln!(html, "<div><dt>{}</dt><dd>{}</dd></div>", own(name), own(value));
                }
                html.push_str("</dl>\n");
            }
            Block::Formulas(formulas) => {
                html.push_str("<div class=\"formulas\">\n");
                for formula in formulas {
                    let _ = writeln!(html, "<p>{}</p>", own(formula));
                }
                html.push_str("</div>\n");
            }
            Block::Grid(g) => grid(html, g),
            Block::Drawing { sheet, description } => {
                let drawing = svg_in_page(sheet, &true_minus(description))?;
                let _ = write!(html, "<figure>\n{drawing}</figure>\n");
            }
            Block::Calculator(c) => calculator(html, c),
        }
    }
    html.push_str("</section>\n");
    Ok(())
}

/// The page.
///
/// # Errors
/// A drawing that cannot be made, which is a mistake in the program.
pub fn html(document: &Document) -> Result<String, Error> {
    let title = escaped(&document.title);
    let mut html = format!(
        "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n\
         <meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; style-src {}; script-src {}; \
         img-src data:; base-uri 'none'; form-action 'none'\">\n\
         <meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n\
         <meta name=\"color-scheme\" content=\"light dark\">\n<meta name=\"generator\" content=\"tiltgap {}\">\n\
         <link rel=\"icon\" href=\"data:,\">\n<title>{title}</title>\n<style>{STYLE}</style>\n</head>\n<body>\n<main>\n\
         <header>\n<h1 dir=\"auto\">{title}</h1>\n<p>{}</p>\n</header>\n",
        hash(STYLE),
        hash(SCRIPT),
        env!("CARGO_PKG_VERSION"),
        own(&document.subtitle)
    );
    for part in &document.sections {
        section(&mut html, part)?;
    }
    let _ = write!(html, "</main>\n<script>{SCRIPT}</script>\n</body>\n</html>\n");
    Ok(html)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn own_texts_are_set() {
        assert_eq!(own("k_F < 1, `a`, -2"), "<var>k</var><sub>F</sub> &lt; 1, <code>a</code>, −2");
        assert_eq!(data(&serde_json::json!({ "a": "</script>" })), "{\"a\":\"\\u003c/script\\u003e\"}");
    }
}
