//! The outcome as a document: short for the screen, whole for the report.

use crate::concise::{concise, fixed, NotANumber};
use crate::draw::render::{self, RenderError};
use crate::error::Error;

use super::cases::Family;
use super::comparison::{Comparison, Verdict};
use super::convergence::{Coverage, Ladder, LEAST_COVERED, MOST_CAUTION, ORDERS};
use super::finding::Finding;
use super::ideal::Approach;
use super::outcome::{Ideal, Outcome, OUTSIDE};
use super::paper::{Block, Table};
use super::picture;
use super::reach::Reach;

/// How much is told.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Detail {
    /// Every comparison with its numbers, and the pictures; else one line for each family.
    pub whole: bool,
    /// The sources.
    pub sources: bool,
}

/// Metres and radians as they are shown.
const MM: f64 = 1e3;
const MRAD: f64 = 1e3;
/// Significant digits of what a bench needs.
const NEEDED_DIGITS: usize = 2;
/// Decimals of an exact value and of a level.
const EXACT_DECIMALS: usize = 8;

fn word(holds: bool) -> &'static str {
    if holds {
        "holds"
    } else {
        "FAILS"
    }
}

fn small(v: f64) -> String {
    if v == 0.0 {
        "0".into()
    } else {
        format!("{v:.1e}")
    }
}

/// The document.
///
/// # Errors
/// A number that is none, or a picture that cannot be made: mistakes in the program.
pub fn sections(outcome: &Outcome, detail: Detail) -> Result<Vec<Block>, Error> {
    let mut all = head(outcome, detail.whole);
    if let Some(ideal) = &outcome.ideal {
        all.push(Block::Heading(2, "The ideal limit".into()));
        ideal_limit(&mut all, ideal);
    }
    if !outcome.comparisons.is_empty() || !outcome.missing.is_empty() {
        all.push(Block::Heading(2, "Reference cases".into()));
        references(&mut all, outcome, detail)?;
    }
    if let Some(ladders) = &outcome.ladders {
        all.push(Block::Heading(2, "Convergence".into()));
        convergence(&mut all, ladders, detail.whole)?;
    }
    if let Some(coverage) = &outcome.coverage {
        all.push(Block::Heading(2, "Error bars".into()));
        covered(&mut all, coverage, detail.whole)?;
    }
    if let Some(own) = &outcome.own {
        all.push(Block::Heading(2, "Self checks on the bench".into()));
        let title = &outcome.circumstances.title;
        let which = if outcome.circumstances.demo { "The built-in demo bench" } else { "The bench" };
        let named = if title.is_empty() { String::new() } else { format!(" ({title})") };
        all.push(Block::Paragraph(format!("{which}{named}, by a second route to each number.")));
        all.push(findings(own));
    }
    all.push(Block::Heading(2, "Verdict".into()));
    all.push(Block::Paragraph(outcome.sentence()));
    let failed = outcome.judged().1;
    if !failed.is_empty() {
        let mut table = Table::new(1, &["What fails"]);
        failed.iter().for_each(|what| table.row([what.as_str()]));
        all.push(Block::Table(table));
    }
    Ok(all)
}

fn head(outcome: &Outcome, whole: bool) -> Vec<Block> {
    let c = &outcome.circumstances;
    let mut all = vec![Block::Heading(1, "Validation of tiltgap".into())];
    let only = c.only.as_ref().map_or(String::new(), |only| format!(", only {only}"));
    if !whole {
        all.push(Block::Paragraph(format!(
            "tiltgap {}, {} choice{only}, {}, {} threads, {:.0} s.",
            c.version, c.choice, c.date, c.threads, c.seconds
        )));
        return all;
    }
    let mut table = Table::new(2, &["", ""]);
    for (key, value) in [
        ("Program", format!("tiltgap {}", c.version)),
        ("Date", c.date.clone()),
        ("Machine", c.machine.clone()),
        ("Threads", format!("{} (the numbers do not depend on them)", c.threads)),
        ("Choice", format!("{}{only}", c.choice)),
        (
            "Accuracy asked of the solver",
            format!("{:e}, standard uncertainty of force and torque", c.accuracy),
        ),
        ("Time taken", format!("{:.0} s", c.seconds)),
        ("Bench", if c.demo { format!("{} (built-in demo)", c.title) } else { c.title.clone() }),
        ("Bench as given", c.bench.to_string()),
    ] {
        table.row([key.to_string(), value]);
    }
    all.push(Block::Table(table));
    all
}

fn findings(findings: &[Finding]) -> Block {
    let mut table = Table::new(1, &["", "off", "allowed", ""]);
    for f in findings {
        table.row([f.what.clone(), small(f.off), small(f.allowed), word(f.holds()).into()]);
    }
    Block::Table(table)
}

fn ideal_limit(all: &mut Vec<Block>, ideal: &Ideal) {
    all.push(findings(&ideal.findings));
    all.push(Block::Paragraph(
        "Open pair of strips with a shrinking gap: what the fringe adds, and its slope over the published one \
         (reference-cases/bibliography.md: Palmer1937; tilted, each edge with its own gap). Wedge: half the difference \
         of the edge gaps over their mean."
            .into(),
    ));
    let head = [
        "wedge",
        "gap/length",
        "k_C",
        "k_F",
        "fringe C, %",
        "fringe F, %",
        "slope C",
        "slope F",
        "allowed",
        "",
    ];
    let mut table = Table::new(0, &head);
    for a in &ideal.approach {
        let Approach { delta, beta, factors, fringe_percent, slope, allowed } = a;
        table.row([
            fixed(*beta, 1),
            fixed(*delta, 3),
            fixed(factors[0], 5),
            fixed(factors[1], 5),
            fixed(fringe_percent[0], 3),
            fixed(fringe_percent[1], 3),
            fixed(slope[0], 4),
            fixed(slope[1], 4),
            format!("1 ± {}", fixed(*allowed, 3)),
            word(a.holds()).into(),
        ]);
    }
    all.push(Block::Table(table));
    if ideal.reach.is_empty() {
        return;
    }
    all.push(Block::Paragraph(
        "What this bench needs for the ideal formula: the largest gap with the plates parallel, and the largest tilt at the \
         gap of the bench, for the wedge alone. * continued below the gaps that were solved."
            .into(),
    ));
    let mut table = Table::new(1, &["ideal formula for", "good to", "gap, mm", "tilt, mrad"]);
    for Reach { what, part, gap_m, continued, tilt_rad } in &ideal.reach {
        let mark = if *continued { "*" } else { "" };
        table.row([
            (*what).into(),
            format!("{} %", 100.0 * part),
            format!("{}{mark}", crate::draw::ticks::short(MM * gap_m, NEEDED_DIGITS)),
            crate::draw::ticks::short(MRAD * tilt_rad, NEEDED_DIGITS),
        ]);
    }
    all.push(Block::Table(table));
}

fn largest<'a>(of: &[&'a Comparison], size: impl Fn(&Comparison) -> f64) -> Option<&'a Comparison> {
    of.iter().copied().max_by(|a, b| size(a).total_cmp(&size(b)))
}

fn references(all: &mut Vec<Block>, outcome: &Outcome, detail: Detail) -> Result<(), NotANumber> {
    let outside = outcome.comparisons.iter().filter(|c| OUTSIDE.contains(&c.kind.as_str())).count();
    all.push(Block::Paragraph(format!(
        "{} values in {} families, {outside} of them closed forms or published. E_n: difference over the root sum of \
         squares of the expanded (k = 2) uncertainties of number and reference; up to 1 is agreement, above 1.5 (three \
         standard uncertainties) or off by more than the target of its family a value fails.",
        outcome.comparisons.len(),
        outcome.families.len()
    )));
    let mut table =
        Table::new(1, &["family", "values", "largest error", "target", "largest E_n", "beyond 1", ""]);
    for family in &outcome.families {
        let mine: Vec<&Comparison> = outcome.comparisons.iter().filter(|c| c.family == family.name).collect();
        let (Some(off), Some(en)) =
            (largest(&mine, |c| c.relative() / c.target), largest(&mine, |c| c.normalised().abs()))
        else {
            continue;
        };
        let fails = mine.iter().any(|c| c.verdict() == Verdict::Fails)
            || outcome.missing.iter().any(|m| m.family == family.name);
        table.row([
            family.name.clone(),
            mine.len().to_string(),
            small(off.relative()),
            small(off.target),
            fixed(en.normalised().abs(), 2),
            mine.iter().filter(|c| c.verdict() == Verdict::Wide).count().to_string(),
            word(!fails).into(),
        ]);
    }
    all.push(Block::Table(table));
    for m in &outcome.missing {
        all.push(Block::Paragraph(format!("Not solved: {}, {}: {}", m.family, m.case, m.error)));
    }
    if detail.whole {
        for family in &outcome.families {
            whole_family(all, outcome, family)?;
        }
    } else if detail.sources {
        for family in &outcome.families {
            all.push(Block::Heading(3, format!("{}: {}", family.name, family.title)));
            for text in sources(outcome, family) {
                all.push(Block::Paragraph(text));
            }
        }
    }
    if detail.whole {
        all.push(Block::Heading(3, "Where the program or the comparison ends".into()));
        let mut table = Table::new(2, &["family", "not solved, and why"]);
        outcome.waiting.iter().for_each(|(name, why)| table.row([name, why]));
        all.push(Block::Table(table));
    }
    Ok(())
}

/// Different sources of the comparisons of a family, with the kind of reference.
fn sources(outcome: &Outcome, family: &Family) -> Vec<String> {
    let mut texts: Vec<String> = Vec::new();
    for c in outcome.comparisons.iter().filter(|c| c.family == family.name) {
        let text = format!("Source ({}): {}", c.kind, c.source);
        if !texts.contains(&text) {
            texts.push(text);
        }
    }
    texts
}

fn whole_family(all: &mut Vec<Block>, outcome: &Outcome, family: &Family) -> Result<(), NotANumber> {
    all.push(Block::Heading(3, format!("{}: {}", family.name, family.title)));
    if let Some(target) = &family.target {
        all.push(Block::Paragraph(format!(
            "Target {:e} for charges, {:e} for forces and torques. {}",
            target.charge, target.force, target.reason
        )));
    }
    for text in sources(outcome, family) {
        all.push(Block::Paragraph(text));
    }
    let head = ["case", "quantity", "value", "reference", "difference", "relative", "E_n", ""];
    let mut table = Table::new(2, &head);
    for c in outcome.comparisons.iter().filter(|c| c.family == family.name) {
        table.row([
            c.case.clone(),
            c.quantity.clone(),
            concise(c.value, c.uncertainty)?,
            concise(c.reference, c.open)?,
            small(c.difference()),
            small(c.relative()),
            fixed(c.normalised(), 2),
            match c.verdict() {
                Verdict::Good => "holds",
                Verdict::Wide => "beyond 1",
                Verdict::Fails => "FAILS",
            }
            .into(),
        ]);
    }
    all.push(Block::Table(table));
    Ok(())
}

fn picture_of(sheet: &super::super::draw::sheet::Sheet, caption: &str) -> Result<Block, RenderError> {
    Ok(Block::Picture { svg: render::svg(sheet)?, caption: caption.into() })
}

fn convergence(all: &mut Vec<Block>, ladders: &[Ladder], whole: bool) -> Result<(), Error> {
    all.push(Block::Paragraph(format!(
        "Levels of the grid family, in units of the grid. The observed order has to lie between {} and {}, and the limit \
         within three standard uncertainties of the exact value.",
        ORDERS[0], ORDERS[1]
    )));
    let mut table = Table::new(1, &["", "levels", "order", "limit", "last off", "limit off", ""]);
    for l in ladders {
        let limit = l.limits.last().copied().unwrap_or_default();
        let off = l.exact.map_or("-".into(), |e| small((limit.value / e - 1.0).abs()));
        table.row([
            l.name.clone(),
            l.levels.iter().map(usize::to_string).collect::<Vec<_>>().join("-"),
            l.order.map_or("-".into(), |p| fixed(p, 2)),
            concise(limit.value, limit.uncertainty)?,
            l.errors().last().map_or("-".into(), |e| small(*e)),
            off,
            word(l.holds()).into(),
        ]);
    }
    all.push(Block::Table(table));
    if !whole {
        return Ok(());
    }
    for l in ladders {
        let mut table = Table::new(0, &["level", "value", "relative error", "limit of three levels"]);
        for (n, q) in l.levels.iter().enumerate() {
            let limit = n.checked_sub(2).and_then(|n| l.limits.get(n));
            let limit = limit.map(|e| concise(e.value, e.uncertainty)).transpose()?;
            table.row([
                q.to_string(),
                fixed(l.values[n], EXACT_DECIMALS),
                small(l.errors()[n]),
                limit.unwrap_or_default(),
            ]);
        }
        all.push(Block::Heading(3, l.name.clone()));
        if let Some(exact) = l.exact {
            all.push(Block::Paragraph(format!("Exact: {}", fixed(exact, EXACT_DECIMALS))));
        }
        all.push(Block::Table(table));
    }
    let caption = "Relative error of each level against the exact value or the last limit.";
    all.push(picture_of(&picture::ladders(ladders), caption)?);
    Ok(())
}

fn covered(all: &mut Vec<Block>, coverage: &Coverage, whole: bool) -> Result<(), Error> {
    let caution = coverage.caution.map_or(String::new(), |c| {
        format!(
            " Where the reference is exact, the error bar is {c:.1} times the error in the median (at most {MOST_CAUTION})."
        )
    });
    all.push(Block::Paragraph(format!(
        "Of {} numbers with an error bar {:.1} % lie within one and {:.1} % within two combined standard uncertainties of \
         their reference (at least {:.0} %).{caution}",
        coverage.count,
        100.0 * coverage.within_one,
        100.0 * coverage.within_two,
        100.0 * LEAST_COVERED
    )));
    if whole && coverage.count > 0 {
        let caption = "Part of the numbers within so many combined standard uncertainties of their reference, beside that of a \
                       normal distribution.";
        all.push(picture_of(&picture::coverage(coverage), caption)?);
    }
    Ok(())
}
