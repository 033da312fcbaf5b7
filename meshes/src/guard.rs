//! A guard ring: a frame of metal around one plate, on that plate's potential, which takes the fringe upon itself.

/// Which of the two plates.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Which {
    /// The fixed plate.
    Lower,
    /// The plate on the beam.
    Upper,
}

/// A frame around a plate: coplanar with its facing surface, equally thick, rigidly joined to it (with the upper plate it
/// tilts), on its potential.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Guard {
    /// The plate that it surrounds.
    pub around: Which,
    /// Width of the empty slot between plate and guard, in metres.
    pub slot_m: f64,
    /// Width of the guard itself, in metres.
    pub rim_m: f64,
}

impl Guard {
    /// By how much plate and guard together stand out over the plate on each side, in metres.
    pub fn margin_m(&self) -> f64 {
        self.slot_m + self.rim_m
    }
}
