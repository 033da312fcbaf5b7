//! What is around the two plates.

/// What surrounds the plates.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Surroundings {
    /// Free space; the potential vanishes at infinity.
    Open,
    /// A grounded plane without end under the lower plate, this far below its back (in metres); free space above.
    GroundedFloor {
        /// Distance from the back of the lower plate, in metres.
        below_m: f64,
    },
    /// A grounded box, of which sides may be missing (free space there).
    GroundedBox(Clearances),
    /// Insulating walls along the edges of the lower plate and nothing outside: no fringe. The ideal limit.
    InsulatedWalls,
}

/// Distances of grounded walls from the lower plate, which is fixed in the room like they are (from its guard ring, if it
/// has one), in metres. Where there is none the space is open.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Clearances {
    /// From the lower plate's edge on the hinge side (-x).
    pub hinge_side_m: Option<f64>,
    /// From its edge on the free side (+x).
    pub free_side_m: Option<f64>,
    /// From its edge at -y.
    pub left_m: Option<f64>,
    /// From its edge at +y.
    pub right_m: Option<f64>,
    /// From its back.
    pub below_m: Option<f64>,
    /// From its facing surface up to the lid.
    pub above_m: Option<f64>,
}

impl Clearances {
    /// By axis (x, y, z) and end (negative, positive).
    pub fn by_axis(&self) -> [[Option<f64>; 2]; 3] {
        [[self.hinge_side_m, self.free_side_m], [self.left_m, self.right_m], [self.below_m, self.above_m]]
    }
}

impl Surroundings {
    /// The grounded walls.
    pub fn walls(&self) -> Clearances {
        match *self {
            Surroundings::Open | Surroundings::InsulatedWalls => Clearances::default(),
            Surroundings::GroundedFloor { below_m } => {
                Clearances { below_m: Some(below_m), ..Clearances::default() }
            }
            Surroundings::GroundedBox(clearances) => clearances,
        }
    }
}

/// Names of the walls, by axis and end.
pub(crate) const WALL_NAMES: [[&str; 2]; 3] =
    [["hinge side", "free side"], ["left", "right"], ["below", "above"]];
