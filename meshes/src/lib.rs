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
mod body;
mod check;
mod error;
mod film;
mod grid;
mod guard;
mod plate;
mod pose;
mod stencil;
mod surroundings;

pub use arrangement::{Arrangement, Dimensions, EdgeGaps, Rectangle};
pub use axis::{Axis, Beyond, End};
pub use bend::{Carry, Sideways};
pub use body::{Body, NodeBox};
pub use error::ArrangementError;
pub use film::Film;
pub use grid::{FarField, FilmCells, Grid, GridOptions};
pub use guard::{Guard, Which};
pub use plate::Plate;
pub use pose::{dot, Matrix3, Pose, Vector3};
pub use stencil::Stencil;
pub use surroundings::{Clearances, Surroundings};
