//! One rectangular plate: a rigid conducting box.

/// A rectangular conducting plate. Thickness grows away from the gap; zero thickness is a sheet.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plate {
    /// Extent along x (from the hinge edge to the free edge), in metres.
    pub length_m: f64,
    /// Extent along y (along the hinge axis), in metres.
    pub width_m: f64,
    /// Extent along z, away from the gap, in metres; zero for a sheet.
    pub thickness_m: f64,
}
