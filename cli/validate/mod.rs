//! The job `validate`: can the numbers be trusted on this machine, for this bench, and how far?
//!
//! Four parts: the ideal limit, reference cases, convergence and coverage, and self checks on a bench. What is to be
//! solved is settled first ([`Job::new`]), then worked off ([`Job::run`]) into an [`Outcome`](outcome::Outcome), of which
//! screen, report and JSON are made.

pub mod cases;
pub mod comparison;
pub mod convergence;
pub mod finding;
pub mod ideal;
pub mod json;
pub mod outcome;
pub mod own;
pub mod paper;
pub mod picture;
mod posed_formulas;
pub mod posed_plates;
pub mod posed_strips;
pub mod posed_walls;
pub mod reach;
pub mod sections;
pub mod trial;

use std::io::{Read, Write};
use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};
use std::time::Instant;

use rayon::prelude::*;
use tiltgap_solver::Params;

use crate::arguments::ValidateArguments;
use crate::assess::{memory_for_a_level, pool, Setup};
use crate::draw::output::Target;
use crate::error::Error;
use crate::nearest::nearest;
use crate::progress::Line;
use crate::Streams;

use cases::Family;
use comparison::Comparison;
use convergence::{ladders, Coverage};
use outcome::{Circumstances, Ideal, Missing, Outcome};
use own::Own;
use reach::reach;
use sections::{sections, Detail};
use trial::{trials, Trial, DEFAULT};

/// An option that will not do.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum ValidateError {
    /// No part and no family of that name.
    #[error(
        "--only: there is no part and no family {name:?}; did you mean {nearest:?}? Parts: ideal-limit, references, \
         convergence, self-checks; families: {families}"
    )]
    Unknown {
        /// What was given.
        name: String,
        /// What comes nearest.
        nearest: String,
        /// The families.
        families: String,
    },
    /// A family that is data for later.
    #[error("--only {name}: the program solves none of these cases. {why}")]
    Waiting {
        /// Which.
        name: String,
        /// Why.
        why: String,
    },
    /// A report of another kind.
    #[error("--report: {path:?} is neither .html nor .md; give a name that ends in one of them")]
    Report {
        /// What was given.
        path: PathBuf,
    },
}

/// A part of the validation.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Part {
    /// The ideal limit.
    IdealLimit,
    /// The reference cases.
    References,
    /// Convergence of the levels.
    Convergence,
    /// Self checks on the bench.
    SelfChecks,
}

/// All parts, with their names, in order.
pub const PARTS: [(&str, Part); 4] = [
    ("ideal-limit", Part::IdealLimit),
    ("references", Part::References),
    ("convergence", Part::Convergence),
    ("self-checks", Part::SelfChecks),
];

/// Form of a report.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Form {
    /// One self-contained page.
    Html,
    /// Plain text with marks.
    Markdown,
}

/// A checked job.
pub struct Job {
    /// The bench of the self checks.
    pub setup: Setup,
    /// Whether a bench file was given.
    pub own_bench: bool,
    /// All cases that the program solves, or the quick choice.
    pub full: bool,
    /// What was asked for with `--only`.
    pub only: Option<String>,
    /// The parts to do.
    pub parts: Vec<Part>,
    /// The families to solve.
    pub families: Vec<Family>,
    /// Where the report goes.
    pub report: Option<(Target, Form)>,
    /// Settings of the solver.
    pub params: Params,
}

fn form(path: &Path) -> Result<Form, ValidateError> {
    let target = Target::new(path);
    match target.extension().as_deref() {
        Some("html") => Ok(Form::Html),
        Some("md") => Ok(Form::Markdown),
        _ => Err(ValidateError::Report { path: path.into() }),
    }
}

/// What `--only` leaves of parts and families.
fn chosen(only: Option<&str>, families: Vec<Family>) -> Result<(Vec<Part>, Vec<Family>), ValidateError> {
    let Some(name) = only else { return Ok((PARTS.map(|(_, part)| part).to_vec(), families)) };
    if let Some((_, part)) = PARTS.iter().find(|(n, _)| *n == name) {
        return Ok((vec![*part], families));
    }
    let names: Vec<String> = families.iter().map(|f| f.name.clone()).collect();
    let mut left: Vec<Family> = families.into_iter().filter(|f| f.name == name).collect();
    let Some(family) = left.first() else {
        let known = PARTS.iter().map(|(n, _)| *n).chain(names.iter().map(String::as_str));
        let nearest = nearest(name, known).unwrap_or_default().into();
        return Err(ValidateError::Unknown { name: name.into(), nearest, families: names.join(", ") });
    };
    if family.target.is_none() {
        let why = family.waiting.clone().unwrap_or_default();
        return Err(ValidateError::Waiting { name: name.into(), why });
    }
    left.truncate(1);
    Ok((vec![Part::References], left))
}

impl Job {
    /// Checks the arguments and reads the bench.
    ///
    /// # Errors
    /// Whatever of it is wrong.
    pub fn new(arguments: &ValidateArguments, stdin: &mut dyn Read) -> Result<Job, Error> {
        Job::with(arguments, stdin, Family::all())
    }

    /// The same with other families than those built in.
    ///
    /// # Errors
    /// As [`Job::new`].
    pub fn with(
        arguments: &ValidateArguments,
        stdin: &mut dyn Read,
        families: Vec<Family>,
    ) -> Result<Job, Error> {
        let (parts, families) = chosen(arguments.only.as_deref(), families)?;
        let report = match &arguments.report {
            Some(path) => {
                let form = form(path)?;
                let target = Target::new(path);
                target.check()?;
                Some((target, form))
            }
            None => None,
        };
        let setup = Setup::new(&arguments.bench, stdin)?;
        setup.question.check()?;
        let params = Params { accuracy: DEFAULT, memory_bytes: memory_for_a_level() };
        Ok(Job {
            setup,
            own_bench: arguments.bench.bench.is_some(),
            full: arguments.full,
            only: arguments.only.clone(),
            parts,
            families,
            report,
            params,
        })
    }

    fn has(&self, part: Part) -> bool {
        self.parts.contains(&part)
    }

    /// Does the work. `begun` is when the program began.
    ///
    /// # Errors
    /// A bench that cannot be solved, or threads that do not start. A reference case that cannot be solved is part of the
    /// outcome.
    pub fn run(
        &self,
        begun: Instant,
        stderr: &mut (dyn Write + Send),
        terminal: bool,
    ) -> Result<Outcome, Error> {
        let pool = pool(self.setup.threads)?;
        let mut news = News { line: Line::new(stderr, terminal), begun };
        pool.install(|| self.work(&mut news, begun))
    }

    fn work(&self, news: &mut News, begun: Instant) -> Result<Outcome, Error> {
        let mut outcome = Outcome::new(Circumstances::new(self));
        if self.has(Part::SelfChecks) {
            news.tell("self checks on the bench");
            outcome.own = Some(Own { question: self.setup.question, params: &self.params }.checks()?);
        }
        if self.has(Part::IdealLimit) {
            news.tell("the ideal limit");
            let reach = if self.own_bench || self.full {
                reach(&self.setup.question, &self.params)?
            } else {
                Vec::new()
            };
            let mut findings = ideal::insulated()?;
            findings.extend(ideal::guarded()?);
            outcome.ideal = Some(Ideal { findings, approach: ideal::approach()?, reach });
        }
        if self.has(Part::Convergence) {
            news.tell("convergence of the levels");
            outcome.ladders = Some(ladders(self.full)?);
        }
        if self.has(Part::References) {
            let all: Vec<Trial> = self.families.iter().flat_map(trials).collect();
            let all: Vec<&Trial> = all.iter().filter(|t| self.full || t.quick).collect();
            let (comparisons, missing) = references(&all, news);
            outcome.coverage = Some(Coverage::of(&comparisons));
            outcome.comparisons = comparisons;
            outcome.missing = missing;
            let solved = |f: &&Family| outcome.comparisons.iter().any(|c| c.family == f.name);
            outcome.families = self.families.iter().filter(solved).cloned().collect();
            let waiting = self.families.iter().filter_map(|f| Some((f.name.clone(), f.waiting.clone()?)));
            outcome.waiting = waiting.collect();
        }
        outcome.circumstances.seconds = begun.elapsed().as_secs_f64();
        Ok(outcome)
    }
}

/// All trials side by side, in order.
fn references(all: &[&Trial], news: &mut News) -> (Vec<Comparison>, Vec<Missing>) {
    let done = Mutex::new((0, news));
    let results: Vec<_> = all
        .par_iter()
        .with_max_len(1)
        .map(|trial| {
            let result = trial.run(DEFAULT);
            let mut guard = done.lock().unwrap_or_else(PoisonError::into_inner);
            let (count, news) = &mut *guard;
            *count += 1;
            news.count(&format!("reference cases: {count} of {}", all.len()), *count == all.len());
            result
        })
        .collect();
    let (mut comparisons, mut missing) = (Vec::new(), Vec::new());
    for (trial, result) in all.iter().zip(results) {
        match result {
            Ok(more) => comparisons.extend(more),
            Err(error) => missing.push(Missing {
                family: trial.family.into(),
                case: trial.case.clone(),
                error: Error::from(error).to_string(),
            }),
        }
    }
    (comparisons, missing)
}

/// Progress on standard error: rewritten on a terminal, a line for each part elsewhere.
struct News<'a> {
    line: Line<'a>,
    begun: Instant,
}

impl News<'_> {
    fn tell(&mut self, what: &str) {
        self.count(what, true);
    }

    fn count(&mut self, what: &str, stays: bool) {
        let text = format!("{:4.0} s  {what}", self.begun.elapsed().as_secs_f64());
        if self.line.is_shown() {
            self.line.write(&text);
        } else if stays {
            self.line.plain(&text);
        }
    }
}

/// The whole command: work, report, and what goes to standard output; the flag says whether all holds.
///
/// # Errors
/// As [`Job::new`] and [`Job::run`], or a report that cannot be written.
pub fn validate(
    job: &Job,
    arguments: &ValidateArguments,
    streams: &mut Streams,
    begun: Instant,
) -> Result<bool, Error> {
    let outcome = job.run(begun, streams.stderr, streams.terminal)?;
    if let Some((target, form)) = &job.report {
        let blocks = sections(&outcome, Detail { whole: true, sources: true })?;
        let text = match form {
            Form::Html => paper::html("Validation of tiltgap", &blocks),
            Form::Markdown => paper::markdown(&blocks),
        };
        target.write(text.as_bytes(), streams.stdout)?;
    }
    let text = if arguments.json {
        json::json(&outcome)?
    } else {
        paper::screen(&sections(&outcome, Detail { whole: false, sources: arguments.sources })?)
    };
    streams.stdout.write_all(text.as_bytes())?;
    streams.stdout.flush()?;
    Ok(outcome.holds())
}
