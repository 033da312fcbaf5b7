//! Laplace's equation around two tilted plates, and what follows from it: charge, force and torque.
//!
//! Inside, the unit of length is the largest side of a plate, the unit of potential one volt and the permittivity
//! one; [`assess()`] puts the SI units back.

mod assess;
mod cells;
pub mod cg;
mod corner;
mod error;
mod extrapolate;
mod family;
mod field;
mod hold;
mod holes;
mod level;
mod metal;
mod modes;
mod operator;
mod section;
mod separable;
mod sheet;
mod shell;
mod stack;
mod surface;
mod wedge;
mod wrench;

pub use assess::{
    assess, hinge_offset_m, Assessment, Components, Connection, Estimate, Factor, Factors, ForceAndTorque,
    GuardReport, Hinge, Ideal, LevelReport, Params, Progress, Question, EPS0,
};
pub use cells::cell_field;
pub use error::Error;
pub use extrapolate::{extrapolate, observed_order, Limit};
pub use family::{BYTES_PER_NODE, FLOOR};
pub use field::Field;
pub use level::{Level, LevelParams, Profile};
pub use operator::{Matrix, Operator};
pub use section::Section;
pub use surface::{surface_charge, SurfaceCharge};
pub use wedge::{wedge_factors, WedgeFactors};
pub use wrench::Wrench;
