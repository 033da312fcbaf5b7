//! What can go wrong in a calculation, with the values.

use tiltgap_meshes::ArrangementError;

/// Why there is no result, or no result of the accuracy asked for.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum Error {
    /// The arrangement itself is at fault: bad input.
    #[error(transparent)]
    Arrangement(#[from] ArrangementError),
    /// A number of the question or of the settings is out of range: bad input.
    #[error("{0}")]
    Question(String),
    /// The conjugate gradient did not reach its tolerance.
    #[error(
        "the conjugate gradient stopped after {iterations} iterations at a relative energy error of {reached:.2e}, \
         {tolerance:.2e} was asked for"
    )]
    NotConverged {
        /// Iterations done.
        iterations: usize,
        /// Estimated relative error in the energy norm.
        reached: f64,
        /// What was asked for.
        tolerance: f64,
    },
    /// The error bar on the finest affordable level is larger than asked for.
    #[error(
        "the accuracy {asked:.1e} was not reached: at level {level} ({nodes} nodes, {memory_bytes} bytes) the relative \
         standard uncertainty is {force:.1e} for the force and {torque:.1e} for the torque; ask for no less than that"
    )]
    AccuracyNotReached {
        /// The accuracy asked for.
        asked: f64,
        /// Finest level q that was solved.
        level: u32,
        /// Nodes of that level.
        nodes: usize,
        /// Memory of that level, in bytes.
        memory_bytes: u64,
        /// Relative standard uncertainty reached for the force.
        force: f64,
        /// Relative standard uncertainty reached for the torque.
        torque: f64,
    },
}
