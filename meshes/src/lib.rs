//! Graded grids that are fitted to the two plates of a hinged-plate balance.
//!
//! The crate knows geometry and nothing else: [`Plate`] and [`Pose`] say where the metal is, [`Arrangement`]
//! puts the two plates in their surroundings. What is solved on the grid is the business of `tiltgap-solver`.
//!
//! Directions (used everywhere): x along the plate length, from the hinge (at -x) to the free edge (+x); y along
//! the hinge axis; z up. The lower plate is fixed, its facing surface in z = 0, centred at the origin.

mod arrangement;
mod axis;
mod bend;
mod grid;
mod plate;
mod pose;
mod stencil;

pub use arrangement::{Arrangement, ArrangementError, Dimensions, EdgeGaps, Rectangle, Surroundings};
pub use axis::{Axis, End};
pub use bend::{Carry, Sideways};
pub use grid::{Grid, GridOptions, NodeBox};
pub use plate::Plate;
pub use pose::{dot, Matrix3, Pose, Vector3};
pub use stencil::Stencil;
