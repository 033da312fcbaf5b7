//! What can be wrong with a table that is to be made, as sentences.

use tiltgap_meshes::ArrangementError;

/// Why there can be no table over some ranges.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum TableError {
    /// A pose in the ranges is impossible.
    #[error(
        "the ranges hold a pose that is impossible, {place}: {reason}; for the whole table to be possible, begin the gaps \
         higher or narrow the angles"
    )]
    Impossible {
        /// Where.
        place: String,
        /// Why.
        reason: ArrangementError,
    },
    /// Plates that do not overlap have no ideal value.
    #[error("at {place} the plates do not overlap, so that the ideal formula is zero and has no correction factor; \
             lower \"pose.shift\" or narrow the ranges")]
    NoOverlap {
        /// Where.
        place: String,
    },
    /// Along a hinge that is not there.
    #[error("--along-hinge: the bench has no hinge; add \"hinge\" with its \"arm\", for example {{ \"arm\": \"150 mm\" }}")]
    NoHinge,
    /// The coordinate does not rise along an axis.
    #[error("the range of the {variable} is so wide that an edge of the plate comes down and rises again; narrow it")]
    Folded {
        /// Of what.
        variable: &'static str,
    },
}
