//! An insulating film on the lower plate.

/// A sheet of insulation that lies on the facing surface of the lower plate and covers it (not a guard ring).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Film {
    /// Thickness, in metres.
    pub thickness_m: f64,
    /// Its permittivity over that of the medium in the gap.
    pub permittivity_ratio: f64,
}

impl Film {
    /// Thickness of a layer of the medium that is worth as much, in metres.
    pub fn equivalent_m(&self) -> f64 {
        self.thickness_m / self.permittivity_ratio
    }
}
