//! The job `handout`: a table in, a page for the bench out.
//!
//! [`content`] makes a [`document`] of the table, a [`survey`] of its range being part of it; [`html`], [`markdown`],
//! [`latex`] and [`spreadsheet`] write the document. What the HTML page calculates with is [`embedded`].

pub mod content;
pub mod document;
pub mod embedded;
pub mod html;
pub mod latex;
pub mod markdown;
pub mod spreadsheet;
pub mod survey;

use std::io::{Read, Write};

use crate::apply::load;
use crate::arguments::{Factor, HandoutArguments, HandoutFormat};
use crate::draw::output::Target;
use crate::error::Error;

/// An option of `handout` that will not do.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum HandoutError {
    /// The name says no format.
    #[error(
        "-o {0}: the name does not say which format; let it end in .html, .md, .tex or .csv, or add --format"
    )]
    NoFormat(String),
    /// The page would take the place of the table.
    #[error("-o {0}: that is the table itself; give another file name")]
    OntoTable(String),
}

/// Where the page goes if nothing else is said.
const OUTPUT: &str = "handout.html";

/// Does the work.
///
/// # Errors
/// What is wrong with options, table or output.
pub fn handout(
    arguments: &HandoutArguments,
    stdin: &mut dyn Read,
    stdout: &mut dyn Write,
) -> Result<(), Error> {
    let path = arguments.output.clone().unwrap_or_else(|| OUTPUT.into());
    let target = Target::new(&path);
    let named = match target.extension().as_deref() {
        Some("html" | "htm") => Some(HandoutFormat::Html),
        Some("md") => Some(HandoutFormat::Md),
        Some("tex") => Some(HandoutFormat::Tex),
        Some("csv") => Some(HandoutFormat::Csv),
        _ => None,
    };
    let format = arguments.format.or(named).ok_or_else(|| HandoutError::NoFormat(target.to_string()))?;
    target.check()?;
    if let (Ok(a), Ok(b)) = (arguments.table.canonicalize(), path.canonicalize()) {
        if a == b {
            return Err(HandoutError::OntoTable(target.to_string()).into());
        }
    }
    let stored = load(&arguments.table, stdin)?;
    let table = stored.table(&arguments.table)?;
    let asked =
        |n: &usize| arguments.quantities.is_empty() || arguments.quantities.iter().any(|q| q.number() == *n);
    if arguments.quantities.contains(&Factor::Torque) && !table.has_torque() {
        return Err(Error::NoTorque);
    }
    let which: Vec<usize> =
        content::ORDER.into_iter().filter(|n| *n < table.in_threes() && asked(n)).collect();
    let document = content::document(&stored, &table, &which)?;
    let text = match format {
        HandoutFormat::Html => html::html(&document)?,
        HandoutFormat::Md => markdown::markdown(&document),
        HandoutFormat::Tex => latex::latex(&document),
        HandoutFormat::Csv => spreadsheet::spreadsheet(&document),
    };
    target.write(text.as_bytes(), stdout)
}
