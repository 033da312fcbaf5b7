//! The job `assess`: checked arguments in, a report out.
//!
//! [`Job::new`] settles everything that can be wrong before the work begins; [`Job::run`] does the work and keeps the
//! job beside its result.

use std::io::{Read, Write};
use std::time::Instant;

use tiltgap_meshes::Dimensions;
use tiltgap_solver::{Assessment, Connection, Params, Question};

use crate::arguments::AssessArguments;
use crate::bench::{Bench, Override};
use crate::document::quoted;
use crate::error::Error;
use crate::memory;
use crate::progress::ProgressLine;
use crate::source::Source;

/// Largest accuracy (coarsest result) that can be asked for.
const COARSEST: f64 = 0.1;
/// Below this no level is tried: the far boundary and the solver tolerance leave more than that.
const FINEST: f64 = 1e-7;
/// Most threads that can be asked for.
const MOST_THREADS: usize = 64;
/// The part of the memory still available that a level may take.
const MEMORY_PART: f64 = 0.75;

/// An option that will not do.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum JobError {
    /// The accuracy is no number in the range.
    #[error("--accuracy: {} will not do; give a number above 0 and at most 0.1, for example 1e-4", quoted(.text))]
    Accuracy {
        /// What was given.
        text: String,
    },
    /// The accuracy is beyond every grid.
    #[error(
        "the accuracy {text} cannot be reached: the boundary far away and the rounding of the arithmetic leave more \
         than that on any grid; ask for 1e-5 or more"
    )]
    OutOfReach {
        /// What was given.
        text: String,
    },
    /// The number of threads is no number in the range.
    #[error("--threads: {} will not do; give a whole number from 1 to 64, for example 2", quoted(.text))]
    Threads {
        /// What was given.
        text: String,
    },
    /// A cross-section in open space with the lower plate grounded.
    #[error(
        "--per-metre: the connection \"grounded\" is not defined per metre of width in open surroundings, since a \
         charged line has no zero of potential at infinity; add `--connection floating`, or leave out --per-metre"
    )]
    GroundedSection,
    /// A cross-section with something that it cannot have.
    #[error(
        "--per-metre: a cross-section has no {what}; {remedy}, or leave out --per-metre to assess the real plates"
    )]
    NotInSection {
        /// Roll or shift along y.
        what: &'static str,
        /// What to do.
        remedy: &'static str,
    },
}

/// A checked job.
#[derive(Clone, Debug, PartialEq)]
pub struct Job {
    /// The bench, with the options in place.
    pub bench: Bench,
    /// The question put to the solver.
    pub question: Question,
    /// Settings of the solver.
    pub params: Params,
    /// Threads to compute with.
    pub threads: usize,
    /// Whether the floating connection was chosen because nothing was stated.
    pub floating_chosen: bool,
}

/// A job and its result.
#[derive(Clone, Debug, PartialEq)]
pub struct Report {
    /// The job.
    pub job: Job,
    /// The result.
    pub assessment: Assessment,
    /// Wall time since the program began, in seconds.
    pub seconds: f64,
    /// Most memory held, in bytes, where that is known.
    pub peak_memory_bytes: Option<u64>,
}

fn accuracy(text: Option<&str>) -> Result<f64, JobError> {
    let Some(text) = text else { return Ok(Params::default().accuracy) };
    let wrong = || JobError::Accuracy { text: text.into() };
    let value: f64 = text.trim().parse().map_err(|_| wrong())?;
    if !(value > 0.0 && value <= COARSEST) {
        return Err(wrong());
    }
    if value < FINEST {
        return Err(JobError::OutOfReach { text: text.into() });
    }
    Ok(value)
}

/// The threads to compute with: those asked for, or one for each core.
///
/// # Errors
/// [`JobError::Threads`].
pub fn threads(text: Option<&str>) -> Result<usize, JobError> {
    let Some(text) = text else {
        return Ok(std::thread::available_parallelism().map_or(1, usize::from).min(MOST_THREADS));
    };
    let number: Option<usize> = text.trim().parse().ok();
    number.filter(|n| (1..=MOST_THREADS).contains(n)).ok_or_else(|| JobError::Threads { text: text.into() })
}

/// Settings of the solver with the memory that can be had.
pub fn memory_params() -> Params {
    let most = Params::default().memory_bytes;
    let left = memory::available_bytes().map_or(most, |b| (MEMORY_PART * b as f64) as u64);
    Params { memory_bytes: most.min(left), ..Params::default() }
}

/// What a cross-section needs: the connection, and whether it was chosen here.
fn section(bench: &Bench) -> Result<(Connection, bool), JobError> {
    if bench.pose.roll_rad != 0.0 {
        return Err(JobError::NotInSection { what: "roll", remedy: "add `--roll 0deg`" });
    }
    if bench.pose.shift_m[1] != 0.0 {
        let remedy = "set the second number of \"pose.shift\" to \"0 mm\"";
        return Err(JobError::NotInSection { what: "shift along y", remedy });
    }
    let open = bench.question(Dimensions::Two, bench.connection).arrangement.potential_is_open();
    match (bench.connection, open, bench.connection_stated) {
        (Connection::Grounded, true, true) => Err(JobError::GroundedSection),
        (Connection::Grounded, true, false) => Ok((Connection::Floating, true)),
        (connection, ..) => Ok((connection, false)),
    }
}

impl Job {
    /// Checks the arguments and reads the bench.
    ///
    /// # Errors
    /// Whatever of it is wrong, apart from what only the arrangement of the plates can tell.
    pub fn new(arguments: &AssessArguments, stdin: &mut dyn Read) -> Result<Job, Error> {
        let accuracy = accuracy(arguments.accuracy.as_deref())?;
        let threads = threads(arguments.threads.as_deref())?;
        let overrides = [
            ("pose.gap", "--gap", &arguments.gap),
            ("pose.tilt", "--tilt", &arguments.tilt),
            ("pose.roll", "--roll", &arguments.roll),
            ("drive.voltage", "--voltage", &arguments.voltage),
            ("drive.connection", "--connection", &arguments.connection),
        ]
        .map(|(path, option, text)| Override { path, option, text: text.as_deref() });
        let source = Source::new(arguments.bench.as_deref());
        let text = source.read(stdin).map_err(crate::bench::BenchError::from)?;
        let bench = Bench::new(&source, &text, &overrides)?;
        let (dimensions, (connection, floating_chosen)) = if arguments.per_metre {
            (Dimensions::Two, section(&bench)?)
        } else {
            (Dimensions::Three, (bench.connection, false))
        };
        let params = Params { accuracy, ..memory_params() };
        let question = bench.question(dimensions, connection);
        Ok(Job { bench, question, params, threads, floating_chosen })
    }

    /// Whether the results are per metre of width.
    pub fn per_metre(&self) -> bool {
        self.question.arrangement.dimensions == Dimensions::Two
    }

    /// Does the work. `begun` is when the program began.
    ///
    /// # Errors
    /// What the solver finds wrong, or threads that do not start.
    pub fn run(
        self,
        begun: Instant,
        stderr: &mut (dyn Write + Send),
        terminal: bool,
    ) -> Result<Report, Error> {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(self.threads)
            .build()
            .map_err(|e| Error::Threads { threads: self.threads, reason: e.to_string() })?;
        let mut line = ProgressLine::new(stderr, terminal);
        let assessment = pool
            .install(|| tiltgap_solver::assess(&self.question, &self.params, &mut |news| line.show(news)))?;
        drop(line);
        Ok(Report {
            job: self,
            assessment,
            seconds: begun.elapsed().as_secs_f64(),
            peak_memory_bytes: memory::peak_bytes(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn job(change: impl Fn(&mut AssessArguments)) -> Result<Job, String> {
        let mut arguments = AssessArguments::default();
        change(&mut arguments);
        Job::new(&arguments, &mut std::io::empty()).map_err(|e| e.to_string())
    }

    #[test]
    fn accuracies() {
        assert_eq!(accuracy(None), Ok(1e-4));
        assert_eq!(accuracy(Some("1e-5")), Ok(1e-5));
        assert_eq!(accuracy(Some("0.1")), Ok(0.1));
        for text in ["0", "-1e-4", "NaN", "inf", "0.2", "x", ""] {
            let error = accuracy(Some(text)).unwrap_err();
            assert_eq!(error, JobError::Accuracy { text: text.into() });
        }
        assert_eq!(
            accuracy(Some("0")).unwrap_err().to_string(),
            "--accuracy: \"0\" will not do; give a number above 0 and at most 0.1, for example 1e-4"
        );
        assert_eq!(
            accuracy(Some("1e-15")).unwrap_err().to_string(),
            "the accuracy 1e-15 cannot be reached: the boundary far away and the rounding of the arithmetic leave \
             more than that on any grid; ask for 1e-5 or more"
        );
    }

    #[test]
    fn thread_counts() {
        assert!(threads(None).unwrap() >= 1);
        assert_eq!(threads(Some("3")), Ok(3));
        for text in ["0", "-1", "65", "two", "1.5"] {
            assert_eq!(threads(Some(text)), Err(JobError::Threads { text: text.into() }));
        }
        assert_eq!(
            threads(Some("0")).unwrap_err().to_string(),
            "--threads: \"0\" will not do; give a whole number from 1 to 64, for example 2"
        );
    }

    #[test]
    fn a_cross_section_asks_for_the_floating_connection() {
        let refused = job(|a| a.per_metre = true).unwrap_err();
        assert!(refused.ends_with("add `--connection floating`, or leave out --per-metre"), "{refused}");
        let stated = job(|a| {
            a.per_metre = true;
            a.connection = Some("floating".into());
        })
        .unwrap();
        assert!(stated.per_metre() && !stated.floating_chosen);
        let rolled = job(|a| {
            a.per_metre = true;
            a.roll = Some("1 deg".into());
        });
        assert_eq!(
            rolled.unwrap_err(),
            "--per-metre: a cross-section has no roll; add `--roll 0deg`, or leave out --per-metre to assess the \
             real plates"
        );
    }

    #[test]
    fn a_connection_that_nobody_stated_is_chosen() {
        let text = crate::source::DEMO.replace(", \"connection\": \"grounded\"", "");
        let arguments =
            AssessArguments { bench: Some("-".into()), per_metre: true, ..AssessArguments::default() };
        let job = Job::new(&arguments, &mut text.as_bytes()).unwrap();
        assert!(job.floating_chosen && job.question.connection == Connection::Floating);
        let shifted = text.replace("\"shift\": [\"0 mm\", \"0 mm\"]", "\"shift\": [\"0 mm\", \"1 mm\"]");
        let error = Job::new(&arguments, &mut shifted.as_bytes()).unwrap_err().to_string();
        assert!(error.contains("has no shift along y; set the second number of \"pose.shift\""), "{error}");
    }

    #[test]
    fn options_replace_values_of_the_bench() {
        let job = job(|a| {
            a.gap = Some("5mm".into());
            a.tilt = Some("-2mrad".into());
            a.voltage = Some("-1kV".into());
        })
        .unwrap();
        assert_eq!((job.bench.pose.gap_m, job.bench.pose.tilt_rad), (0.005, -0.002));
        assert_eq!(job.question.voltage_v, -1000.0);
    }
}
