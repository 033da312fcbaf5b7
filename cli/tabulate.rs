//! The jobs `tabulate` and `join`: checked arguments in, a table (or a share of one) in a file.

use std::io::{Read, Write};
use std::path::{Path, PathBuf};

use rayon::ThreadPool;
use serde_json::Value;
use tiltgap_solver::Params;

use crate::arguments::{AssessArguments, BenchArguments, JoinArguments, TabulateArguments};
use crate::assess::{self, Job};
use crate::document::quoted;
use crate::effort::Effort;
use crate::error::Error;
use crate::interrupt;
use crate::lock::Lock;
use crate::ranges::Range;
use crate::store::{beside, save, text, Format, Part, StoreError, Stored, TEMPORARY};
use crate::table_job::{difference, TableJob};
use crate::tables::axis::Variable;
use crate::tables::fit::Campaign;
use crate::tables::sketch::sketch;
use crate::tables::space::Kind;
use crate::tables::table::Table;

/// Options that do not go together, or shares that do not.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum TabulateError {
    /// No axis.
    #[error("a table needs a range: give --gaps, --tilts or --rolls, for example --gaps 2mm..8mm --tilts 0deg..1deg")]
    NoRange,
    /// Along the hinge without its range.
    #[error(
        "--along-hinge: give the range of the beam angle with --angles, for example --angles -15mrad..10mrad"
    )]
    NoAngles,
    /// A range that follows from the beam angle.
    #[error("--along-hinge: {option} does not go with it, since gap and tilt follow from the beam angle; leave it out")]
    Tied {
        /// The option.
        option: &'static str,
    },
    /// Angles of a beam that does not turn.
    #[error(
        "--angles: the beam angle is the axis of a table along the hinge; add --along-hinge, or give --tilts"
    )]
    Angles,
    /// No part.
    #[error("--part: {} will not do; give which of how many, for example 1/3", quoted(.0))]
    Part(String),
    /// A share has to be put somewhere.
    #[error("--part: a share goes to a file of its own; give -o, for example -o share1.json")]
    ShareToStdout,
    /// One share twice.
    #[error("{a:?} and {b:?} are both share {part}; give each share once")]
    Twice {
        /// One file.
        a: PathBuf,
        /// The other.
        b: PathBuf,
        /// Which share.
        part: String,
    },
    /// Not all shares.
    #[error("share {part} is not there; give all {of} of them")]
    MissingShare {
        /// Which.
        part: String,
        /// How many there are.
        of: usize,
    },
    /// Shares that were cut in different ways.
    #[error("{path:?} is share {part}, and the first file is one of {of}; give the shares of one table")]
    OtherCut {
        /// Which file.
        path: PathBuf,
        /// Its share.
        part: String,
        /// Number of shares of the first file.
        of: usize,
    },
    /// A share that lacks points.
    #[error("{path:?} lacks {count} of its points; make it again with `tiltgap tabulate`")]
    Incomplete {
        /// Which file.
        path: PathBuf,
        /// How many are missing.
        count: usize,
    },
}

/// Where the result goes.
enum Output {
    Stdout,
    /// The file and its lock.
    File(PathBuf, Lock),
}

/// The output when none is named.
const DEFAULT_OUTPUT: &str = "table.json";

fn ranges(arguments: &TabulateArguments) -> Result<(Kind, Vec<Range>), Error> {
    let given = [
        (Variable::Gap, &arguments.gaps),
        (Variable::Tilt, &arguments.tilts),
        (Variable::Roll, &arguments.rolls),
        (Variable::Angle, &arguments.angles),
    ];
    let mut ranges = Vec::new();
    for (variable, text) in given {
        let Some(text) = text else { continue };
        match (arguments.along_hinge, variable) {
            (true, Variable::Gap | Variable::Tilt | Variable::Roll) => {
                return Err(TabulateError::Tied { option: variable.option().0 }.into());
            }
            (false, Variable::Angle) => return Err(TabulateError::Angles.into()),
            _ => ranges.push(Range::parse(variable, text)?),
        }
    }
    match (arguments.along_hinge, ranges.is_empty()) {
        (true, true) => Err(TabulateError::NoAngles.into()),
        (false, true) => Err(TabulateError::NoRange.into()),
        (true, false) => Ok((Kind::AlongHinge, ranges)),
        (false, false) => Ok((Kind::Free, ranges)),
    }
}

/// What an existing output means for the work.
enum Found {
    Nothing,
    /// What is there is what is to be made.
    Finished,
    /// The beginning of it.
    Begun(Campaign),
}

/// Looks at output and progress. Nothing is overwritten that is not the beginning of the same work, unless `restart`
/// says so, and nothing at all that this program did not write.
fn existing(
    output: &Path,
    progress: &Path,
    job: &TableJob,
    part: Option<Part>,
    restart: bool,
) -> Result<Found, Error> {
    let job_json = job.to_json();
    let wanted = if part.is_some() { Format::Share } else { Format::Table };
    match Stored::load(output) {
        Err(StoreError::Missing(_)) => {}
        Ok(_) | Err(StoreError::Checksum(_) | StoreError::Damaged { .. }) if restart => {}
        Ok(stored) => {
            same(output, &stored, &job_json, part)?;
            stored.expect(wanted, output)?;
            return Ok(Found::Finished);
        }
        Err(error) => return Err(Error::Occupied { path: output.into(), error: Box::new(error) }),
    }
    if restart {
        return Ok(Found::Nothing);
    }
    match Stored::load(progress) {
        Err(StoreError::Missing(_)) => Ok(Found::Nothing),
        Ok(stored) => {
            same(progress, &stored, &job_json, part)?;
            Ok(Found::Begun(stored.expect(Format::Progress, progress)?.campaign))
        }
        Err(error) => Err(Error::Occupied { path: progress.into(), error: Box::new(error) }),
    }
}

/// Refuses a file that was made for something else, with the first difference.
fn same(path: &Path, stored: &Stored, job_json: &Value, part: Option<Part>) -> Result<(), Error> {
    let name = |part: Option<Part>| part.map_or("the whole table".into(), |p| format!("share {p}"));
    let parts = (stored.part != part).then(|| ("part".into(), name(stored.part), name(part)));
    match difference(&stored.job_json, job_json).or(parts) {
        None => Ok(()),
        Some((key, there, here)) => Err(Error::Differs { path: path.into(), key, there, here }),
    }
}

fn pool(threads: usize) -> Result<ThreadPool, Error> {
    let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build();
    pool.map_err(|e| Error::Threads { threads, reason: e.to_string() })
}

/// A finished piece of work in words.
fn summary(path: &Path, job: &TableJob, campaign: &Campaign, table: Option<&Table>) -> String {
    let nodes: Vec<String> = job
        .ranges
        .iter()
        .zip(&campaign.plan.nodes)
        .map(|(range, count)| format!("{count} values of the {}", range.span.variable.name()))
        .collect();
    let nodes = nodes.join(" times ");
    let Some(table) = table else {
        return format!("{path:?}: {} points of {nodes}\n", campaign.samples.len());
    };
    let missed: Vec<String> = table
        .fit
        .missed
        .iter()
        .zip(["k_C", "k_F", "k_T"])
        .take(table.in_threes())
        .map(|(m, name)| format!("{name} {:.0e}", m.worst))
        .collect();
    format!(
        "{path:?}: {nodes}, {} check points; largest error of the interpolation there: {}\n",
        campaign.plan.checks(),
        missed.join(", ")
    )
}

/// Runs `tabulate`; what is to be shown on standard output comes back.
///
/// # Errors
/// Whatever is wrong with arguments, bench, ranges, files or the calculation.
pub fn tabulate(
    arguments: &TabulateArguments,
    stdin: &mut dyn Read,
    stderr: &mut (dyn Write + Send),
    terminal: bool,
) -> Result<String, Error> {
    let (kind, ranges) = ranges(arguments)?;
    let part = match &arguments.part {
        None => None,
        Some(text) => Some(Part::parse(text).ok_or_else(|| TabulateError::Part(text.clone()))?),
    };
    let assess = AssessArguments {
        bench: BenchArguments {
            bench: arguments.bench.clone(),
            connection: arguments.connection.clone(),
            per_metre: arguments.per_metre,
            threads: arguments.threads.clone(),
            ..BenchArguments::default()
        },
        accuracy: arguments.accuracy.clone(),
        json: false,
    };
    let Job { bench, question, params, threads, .. } = Job::new(&assess, stdin)?;
    let job = TableJob { bench, question, kind, ranges, accuracy: params.accuracy };
    let output = arguments.output.clone().unwrap_or_else(|| DEFAULT_OUTPUT.into());
    if part.is_some() && (output == Path::new("-") || arguments.output.is_none()) {
        return Err(TabulateError::ShareToStdout.into());
    }
    make(
        Made { job, part, params, threads, output, restart: arguments.restart, given: None },
        stderr,
        terminal,
    )
}

/// What is to be made.
struct Made {
    job: TableJob,
    part: Option<Part>,
    params: Params,
    threads: usize,
    output: PathBuf,
    restart: bool,
    /// Points that are already there, from shares.
    given: Option<Campaign>,
}

fn make(made: Made, stderr: &mut (dyn Write + Send), terminal: bool) -> Result<String, Error> {
    let Made { job, part, params, threads, output, restart, given } = made;
    let space = job.space()?;
    let progress = beside(&output, ".progress");
    let target = if output == Path::new("-") {
        Output::Stdout
    } else {
        Output::File(output.clone(), Lock::of(&output)?)
    };
    let found = match &target {
        Output::Stdout => Found::Nothing,
        Output::File(path, _) => existing(path, &progress, &job, part, restart)?,
    };
    if matches!(found, Found::Finished) {
        let what = if part.is_some() { "share" } else { "table" };
        return Ok(format!("{output:?} holds this {what} already; there is nothing to do\n"));
    }
    interrupt::listen();
    let pool = pool(threads)?;
    let mut campaign = match (found, &given) {
        (Found::Begun(campaign), _) => campaign,
        (_, Some(given)) => given.clone(),
        _ => Campaign::new(pool.install(|| sketch(&space, job.accuracy))?),
    };
    // A progress may be older than the shares, or further.
    campaign.samples.extend(given.into_iter().flat_map(|g| g.samples));
    let quantities = job.quantities();
    let keep = matches!(target, Output::File(..)).then_some(progress.as_path());
    let mut effort =
        Effort { job: &job, space: space.clone(), quantities, part, params, progress: keep, campaign };
    let (format, table) = if part.is_some() {
        effort.round(&pool, stderr, terminal)?;
        (Format::Share, None)
    } else {
        (Format::Table, Some(effort.finish(&pool, stderr, terminal)?))
    };
    let campaign = &effort.campaign;
    let content = text(format, &job, &space, part, campaign, table.as_ref())?;
    match target {
        Output::Stdout => Ok(content),
        Output::File(path, _lock) => {
            save(&path, &content)?;
            // What cannot be removed is found finished the next time. A save that was cut short left the second.
            let _ = std::fs::remove_file(&progress);
            let _ = std::fs::remove_file(beside(&progress, TEMPORARY));
            Ok(summary(&path, &job, campaign, table.as_ref()))
        }
    }
}

/// Runs `join`: puts shares together, and solves what the checks may ask for beyond them.
///
/// # Errors
/// As [`tabulate`], or if the shares do not belong together.
pub fn join(
    arguments: &JoinArguments,
    stderr: &mut (dyn Write + Send),
    terminal: bool,
) -> Result<String, Error> {
    let threads = assess::threads(arguments.threads.as_deref())?;
    let mut shares: Vec<(&Path, Part, Stored)> = Vec::new();
    for path in &arguments.shares {
        let stored = Stored::load(path)?.expect(Format::Share, path)?;
        let damaged = || StoreError::Damaged { path: path.clone(), what: "it is no part".into() };
        let part = stored.part.ok_or_else(damaged)?;
        if let Some((first, cut, other)) = shares.first() {
            if let Some((key, there, here)) = difference(&other.job_json, &stored.job_json) {
                return Err(Error::Differs { path: first.to_path_buf(), key, there, here });
            }
            if cut.of != part.of || other.campaign.plan != stored.campaign.plan {
                let (path, part, of) = (path.clone(), part.to_string(), cut.of);
                return Err(TabulateError::OtherCut { path, part, of }.into());
            }
        }
        if let Some((a, ..)) = shares.iter().find(|s| s.1 == part) {
            let (a, b, part) = (a.to_path_buf(), path.clone(), part.to_string());
            return Err(TabulateError::Twice { a, b, part }.into());
        }
        let own = part.of_points(stored.campaign.plan.points());
        let count = own.iter().filter(|p| !stored.campaign.samples.contains_key(p)).count();
        if count > 0 {
            return Err(TabulateError::Incomplete { path: path.clone(), count }.into());
        }
        shares.push((path, part, stored));
    }
    let of = shares.first().map_or(1, |s| s.1.of);
    for number in 1..=of {
        if !shares.iter().any(|s| s.1.number == number) {
            return Err(TabulateError::MissingShare { part: Part { number, of }.to_string(), of }.into());
        }
    }
    let mut shares = shares.into_iter().map(|s| s.2);
    let first = shares.next().expect("the command line asks for one share at least");
    let mut campaign = first.campaign;
    campaign.samples.extend(shares.flat_map(|s| s.campaign.samples));
    let output = arguments.output.clone().unwrap_or_else(|| DEFAULT_OUTPUT.into());
    let params = Params { accuracy: first.job.accuracy, memory_bytes: assess::memory_for_a_level() };
    let made = Made {
        job: first.job,
        part: None,
        params,
        threads,
        output,
        restart: arguments.restart,
        given: Some(campaign),
    };
    make(made, stderr, terminal)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::{campaign, table_job};

    #[test]
    fn ranges_go_with_the_kind_of_table() {
        let error = |change: &dyn Fn(&mut TabulateArguments)| {
            let mut arguments = TabulateArguments::default();
            change(&mut arguments);
            ranges(&arguments).unwrap_err().to_string()
        };
        assert!(error(&|_| {}).contains("a table needs a range"));
        assert!(error(&|a| a.along_hinge = true).contains("--angles -15mrad..10mrad"));
        assert!(error(&|a| a.angles = Some("0deg..1deg".into())).contains("add --along-hinge"));
        assert!(error(&|a| {
            a.along_hinge = true;
            a.tilts = Some("0deg..1deg".into());
        })
        .contains("--tilts does not go with it"));
    }

    #[test]
    fn the_summary_says_how_good_it_is() {
        let job = table_job();
        let space = job.space().unwrap();
        let campaign = campaign(&space);
        let table = Table::new(space, job.quantities(), &campaign);
        let text = summary(Path::new("t.json"), &job, &campaign, Some(&table));
        assert!(
            text.starts_with("\"t.json\": 5 values of the gap times 4 values of the tilt, 9 check points"),
            "{text}"
        );
    }
}
