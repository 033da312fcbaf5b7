//! What can go wrong in a run, and the exit code that says so.

use std::io;
use std::path::PathBuf;

use crate::apply::ApplyError;
use crate::assess::JobError;
use crate::bench::BenchError;
use crate::concise::NotANumber;
use crate::draw::output::OutputError;
use crate::draw::render::RenderError;
use crate::draw::DrawError;
use crate::progress::grouped;
use crate::ranges::RangeError;
use crate::readings::ReadingsError;
use crate::store::StoreError;
use crate::tables::error::TableError;
use crate::tabulate::TabulateError;
use crate::validate::ValidateError;

/// Exit code of a run that did what was asked for.
pub const GOOD: u8 = 0;
/// The accuracy was not reached, or the calculation did not converge.
pub const NOT_REACHED: u8 = 1;
/// Bad input.
pub const BAD_INPUT: u8 = 2;
/// A mistake in the program, or a system that does not take the output.
pub const INTERNAL: u8 = 3;
/// Long work was asked to stop: 128 and the number of the signal, as shells have it.
pub const INTERRUPTED: u8 = 130;

/// An accuracy that is suggested lies above what was reached by this factor: another accuracy means another solver
/// tolerance, and the same levels shall meet it.
const SUGGESTION_MARGIN: f64 = 1.2;

/// Why a run failed.
#[derive(Debug, thiserror::Error)]
pub enum Error {
    /// The bench is at fault.
    #[error(transparent)]
    Bench(#[from] BenchError),
    /// The options are at fault.
    #[error(transparent)]
    Job(#[from] JobError),
    /// The options of `draw` are at fault.
    #[error(transparent)]
    Draw(#[from] DrawError),
    /// A file could not be written.
    #[error(transparent)]
    File(#[from] OutputError),
    /// A picture could not be made.
    #[error(transparent)]
    Render(#[from] RenderError),
    /// The arrangement is at fault, or the calculation came to no good end.
    #[error("{}", sentence(.0))]
    Solver(#[from] tiltgap_solver::Error),
    /// A result is NaN or infinite.
    #[error("internal error: {key} is {value}, which is not a number; please report it with the bench file")]
    NotFinite {
        /// The key in the report.
        key: String,
        /// Its value.
        value: f64,
    },
    /// A result cannot be shown.
    #[error("internal error: {0}; please report it with the bench file")]
    NotShown(#[from] NotANumber),
    /// The threads could not be started.
    #[error("the {threads} threads could not be started: {reason}; give fewer with --threads")]
    Threads {
        /// How many.
        threads: usize,
        /// What the system says.
        reason: String,
    },
    /// The output could not be written.
    #[error("the output cannot be written: {0}")]
    Output(#[from] io::Error),
    /// A range is at fault.
    #[error(transparent)]
    Range(#[from] RangeError),
    /// The options of a table are at fault, or shares that do not belong together.
    #[error(transparent)]
    Tabulate(#[from] TabulateError),
    /// No table over such ranges.
    #[error(transparent)]
    Table(#[from] TableError),
    /// A table cannot be read.
    #[error(transparent)]
    Store(#[from] StoreError),
    /// The way the readings are given is at fault.
    #[error(transparent)]
    Apply(#[from] ApplyError),
    /// The readings as a whole are at fault.
    #[error(transparent)]
    Readings(#[from] ReadingsError),
    /// Some readings are at fault; the others are corrected.
    #[error("{failed} of {all} readings could not be corrected, see above; the others are")]
    Rows {
        /// How many.
        failed: usize,
        /// Of how many.
        all: usize,
    },
    /// The options of a validation are at fault.
    #[error(transparent)]
    Validate(#[from] ValidateError),
    /// A validation found something that does not hold.
    #[error("the validation fails, see its verdict")]
    NotValid,
    /// The table has no such factor.
    #[error(
        "the bench of this table has no hinge, and so no factor of the torque; choose capacitance or force"
    )]
    NoTorque,
    /// One pose of a table failed.
    #[error("at {place}: {error}")]
    Pose {
        /// Which.
        place: String,
        /// Why.
        error: Box<Error>,
    },
    /// The interpolation does not come within the accuracy.
    #[error(
        "the accuracy {asked:e} was not reached: with as many nodes as there may be the interpolated factors are still up \
         to {worst:.1e} off at the check points; narrow the ranges or ask for less"
    )]
    NotInterpolated {
        /// What was asked for.
        asked: f64,
        /// The largest relative error seen.
        worst: f64,
    },
    /// A file that was made for something else.
    #[error(
        "{path:?} was made with other settings: {key} is {there} there and {here} here; give another -o, or --restart to \
         make it anew"
    )]
    Differs {
        /// Which file.
        path: PathBuf,
        /// Where the difference is.
        key: String,
        /// The value in the file.
        there: String,
        /// The value asked for.
        here: String,
    },
    /// Something is in the way of the output.
    #[error("{path:?} is left as it is, but in the way: {error}; give another -o, or remove the file")]
    Occupied {
        /// Which file.
        path: PathBuf,
        /// What is wrong with it.
        error: Box<StoreError>,
    },
    /// Another process is at work on the same output.
    #[error("another tiltgap is at work on {output:?}; wait for it, or give another -o")]
    Locked {
        /// Which.
        output: PathBuf,
    },
    /// A file could not be written.
    #[error("{path:?} cannot be written: {error}; check the directory and the space on the disk")]
    Save {
        /// Which.
        path: PathBuf,
        /// What the system says.
        error: io::Error,
    },
    /// Ctrl-C.
    #[error("stopped after {done} of {all} points; {}", resume(.progress))]
    Interrupted {
        /// Points solved in this run.
        done: usize,
        /// Points that were to be solved.
        all: usize,
        /// Where they are kept.
        progress: Option<PathBuf>,
    },
}

fn resume(progress: &Option<PathBuf>) -> String {
    match progress {
        Some(path) => format!("they are kept in {path:?}, and the same command goes on from there"),
        None => "they are lost, since the table was to go to standard output".into(),
    }
}

/// What the solver says, with the options of the command line in place of its settings.
fn sentence(error: &tiltgap_solver::Error) -> String {
    let tiltgap_solver::Error::AccuracyNotReached { asked, level, nodes, memory_bytes, force, torque } =
        error
    else {
        return error.to_string();
    };
    let megabytes = memory_bytes.div_ceil(1_000_000);
    let enough = SUGGESTION_MARGIN * force.max(*torque);
    if enough.is_finite() {
        // One digit, rounded up.
        let power = 10f64.powf(enough.log10().floor());
        let enough = format!("{:.0e}", (enough / power).ceil() * power);
        format!(
            "the accuracy {asked:e} was not reached: the finest level that could be solved, {level} ({} nodes, \
             {megabytes} MB), leaves a relative standard uncertainty of {force:.1e} on the force and {torque:.1e} on \
             the torque; ask for --accuracy {enough}",
            grouped(*nodes)
        )
    } else {
        format!(
            "the accuracy {asked:e} was not reached: three levels are needed for an error bar, and the free memory \
             ends at level {level} ({} nodes, {megabytes} MB)",
            grouped(*nodes)
        )
    }
}

impl Error {
    /// The exit code; a closed pipe is no failure.
    pub fn exit_code(&self) -> u8 {
        use tiltgap_solver::Error as Solver;
        match self {
            Error::Job(JobError::OutOfReach { .. }) => NOT_REACHED,
            Error::Bench(_) | Error::Job(_) | Error::Draw(_) => BAD_INPUT,
            Error::File(OutputError::Name { .. }) => BAD_INPUT,
            Error::Solver(Solver::Arrangement(_) | Solver::Question(_)) => BAD_INPUT,
            Error::Solver(Solver::NotConverged { .. } | Solver::AccuracyNotReached { .. }) => NOT_REACHED,
            Error::Pose { error, .. } => error.exit_code(),
            Error::NotInterpolated { .. } | Error::Rows { .. } | Error::NotValid => NOT_REACHED,
            Error::Validate(_) => BAD_INPUT,
            Error::Apply(_) | Error::Readings(_) | Error::NoTorque => BAD_INPUT,
            Error::Range(_) | Error::Tabulate(_) | Error::Table(_) | Error::Store(_) => BAD_INPUT,
            Error::Differs { .. } | Error::Occupied { .. } | Error::Locked { .. } => BAD_INPUT,
            Error::Interrupted { .. } => INTERRUPTED,
            Error::Output(error) if error.kind() == io::ErrorKind::BrokenPipe => GOOD,
            Error::NotFinite { .. }
            | Error::NotShown(_)
            | Error::Render(_)
            | Error::File(OutputError::System { .. })
            | Error::Threads { .. }
            | Error::Save { .. }
            | Error::Output(_) => INTERNAL,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use tiltgap_meshes::ArrangementError;

    #[test]
    fn an_accuracy_that_was_not_reached_says_what_would_be() {
        use tiltgap_solver::Error::AccuracyNotReached;
        let error = |force: f64, torque: f64| {
            let (asked, level, nodes, memory_bytes) = (1e-6, 4, 153_957, 92_374_200);
            Error::from(AccuracyNotReached { asked, level, nodes, memory_bytes, force, torque }).to_string()
        };
        assert_eq!(
            error(3e-5, 3.12e-5),
            "the accuracy 1e-6 was not reached: the finest level that could be solved, 4 (153 957 nodes, 93 MB), \
             leaves a relative standard uncertainty of 3.0e-5 on the force and 3.1e-5 on the torque; ask for \
             --accuracy 4e-5"
        );
        assert!(error(9.9e-5, 0.0).ends_with("--accuracy 2e-4"));
        assert!(error(f64::INFINITY, f64::INFINITY).ends_with("ends at level 4 (153 957 nodes, 93 MB)"));
    }

    #[test]
    fn exit_codes() {
        use tiltgap_solver::Error as Solver;
        let not_converged = Solver::NotConverged { iterations: 9, reached: 1e-3, tolerance: 1e-8 };
        let not_reached = Solver::AccuracyNotReached {
            asked: 1e-9,
            level: 8,
            nodes: 9,
            memory_bytes: 9,
            force: 1e-6,
            torque: 1e-6,
        };
        for (error, code) in [
            (Solver::from(ArrangementError::Walls).into(), BAD_INPUT),
            (Solver::Question("no".into()).into(), BAD_INPUT),
            (not_converged.into(), NOT_REACHED),
            (not_reached.into(), NOT_REACHED),
            (JobError::OutOfReach { text: "1e-15".into() }.into(), NOT_REACHED),
            (JobError::Accuracy { text: "0".into() }.into(), BAD_INPUT),
            (DrawError::PixelsToStdout.into(), BAD_INPUT),
            (OutputError::Name { path: "a".into(), reason: "x".into() }.into(), BAD_INPUT),
            (OutputError::System { path: "a".into(), reason: "full".into() }.into(), INTERNAL),
            (io::Error::from(io::ErrorKind::BrokenPipe).into(), GOOD),
            (io::Error::from(io::ErrorKind::StorageFull).into(), INTERNAL),
            (Error::NotFinite { key: "energy_j".into(), value: f64::NAN }, INTERNAL),
            (NotANumber { value: f64::NAN, uncertainty: 0.0 }.into(), INTERNAL),
        ] {
            assert_eq!(Error::exit_code(&error), code, "{error}");
        }
        let error = Error::NotFinite { key: "energy_j".into(), value: f64::NAN };
        assert_eq!(
            error.to_string(),
            "internal error: energy_j is NaN, which is not a number; please report it with the bench file"
        );
    }
}
