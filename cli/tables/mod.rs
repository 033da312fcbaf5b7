//! Tables of correction factors: where their nodes stand, what is kept at them, and how they are interpolated.
//!
//! No input or output here: places and samples in, factors with uncertainties out.

pub mod axis;
pub mod error;
pub mod fit;
pub mod interpolant;
pub mod nested;
pub mod plan;
pub mod quantity;
pub mod sketch;
pub mod space;
pub mod table;
