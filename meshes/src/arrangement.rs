//! The two plates, the pose of the upper one and what is around them.

use crate::bend::least_volume;
use crate::{dot, Plate, Pose, Sideways, Vector3};

/// Smallest and largest length accepted, in metres: a nanometre, below which a plate is not a continuum, and a
/// kilometre. Outside of these something is wrong with the input.
const LENGTH_RANGE_M: [f64; 2] = [1e-9, 1e3];

/// Smallest and largest gap in units of the largest lateral size of a plate for which the grid family was
/// checked.
const GAP_RATIO_RANGE: [f64; 2] = [1e-4, 5.0];

/// Relative accuracy to which the smallest gap without folding is found.
const FOLD_STEP: f64 = 1e-3;

/// Largest ratio between the lateral sizes of the two plates, or of one plate, that the grid serves well.
const ASPECT_LIMIT: f64 = 50.0;

/// Cross-section (results per metre of width) or real plates.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Dimensions {
    /// Infinitely wide plates: everything per metre of width.
    Two,
    /// Plates of finite width.
    Three,
}

/// What surrounds the plates.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Surroundings {
    /// Free space; the potential vanishes at infinity.
    Open,
    /// Insulating walls along the edges of the lower plate and nothing outside: no fringe. The ideal limit.
    InsulatedWalls,
}

/// An axis-parallel rectangle in the plane of the lower plate, in metres.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rectangle {
    /// From and to along x.
    pub x: [f64; 2],
    /// From and to along y.
    pub y: [f64; 2],
}

impl Rectangle {
    /// Area; zero if the rectangle is empty.
    pub fn area_m2(&self) -> f64 {
        (self.x[1] - self.x[0]).max(0.0) * (self.y[1] - self.y[0]).max(0.0)
    }
}

/// Heights of the upper plate's facing surface at the middle of its four edges, in metres.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EdgeGaps {
    /// Edge at -x, towards the hinge.
    pub hinge_edge_m: f64,
    /// Edge at +x, the free end of the beam.
    pub free_edge_m: f64,
    /// Edge at -y.
    pub left_edge_m: f64,
    /// Edge at +y.
    pub right_edge_m: f64,
    /// Lowest corner.
    pub lowest_corner_m: f64,
}

/// Two plates, a pose and the surroundings: all that the geometry of a bench is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Arrangement {
    /// The fixed plate.
    pub lower: Plate,
    /// The plate on the beam.
    pub upper: Plate,
    /// Where the upper plate stands.
    pub pose: Pose,
    /// What is around.
    pub surroundings: Surroundings,
    /// Cross-section or real plates.
    pub dimensions: Dimensions,
}

/// Why an arrangement cannot be solved. Every message names the values and what to do.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum ArrangementError {
    /// A length is not a positive number of reasonable size.
    #[error("the {what} is {value_m:e} m; give a length between 1 nm and 1 km, for example 100 mm")]
    Length {
        /// Which length.
        what: &'static str,
        /// Its value.
        value_m: f64,
    },
    /// A thickness is negative, not a number or larger than the plate.
    #[error(
        "the {what} is {value_m:e} m; give a thickness from 0 up to the plate's smaller side ({most_m:e} m)"
    )]
    Thickness {
        /// Which thickness.
        what: &'static str,
        /// Its value.
        value_m: f64,
        /// Largest accepted value.
        most_m: f64,
    },
    /// The lateral shift is not a number or absurdly large.
    #[error("the shift along {axis} is {value_m:e} m; give at most {most_m:e} m, twice the largest plate")]
    Shift {
        /// Which direction.
        axis: &'static str,
        /// Its value.
        value_m: f64,
        /// Largest accepted value.
        most_m: f64,
    },
    /// An angle is not a number or is not below 90 degrees.
    #[error("the {what} is {degrees} deg; give an angle between -89 and 89 deg, for example 0.4 deg")]
    Angle {
        /// Tilt or roll.
        what: &'static str,
        /// Its value in degrees.
        degrees: f64,
    },
    /// A cross-section has neither roll nor a shift along y.
    #[error(
        "a cross-section (per metre of width) has no {what}; set it to 0, or solve the plates in three dimensions"
    )]
    NotInSection {
        /// Roll or shift along y.
        what: &'static str,
    },
    /// Insulating walls stand along the edges of both plates.
    #[error(
        "insulating walls along the plate edges need two equal plates without shift and without thickness"
    )]
    Walls,
    /// Gap and plate size are too different.
    #[error(
        "the gap ({gap_m:e} m) is {ratio:.3e} of the largest plate side ({size_m:e} m); \
         the grids are made for 1e-4 to 5: check the units"
    )]
    GapRatio {
        /// The gap.
        gap_m: f64,
        /// Largest lateral size of a plate.
        size_m: f64,
        /// Gap over size.
        ratio: f64,
    },
    /// One plate is far longer, wider or smaller than the other.
    #[error(
        "the plate sides range from {least_m:e} m to {most_m:e} m; sides that differ by more than a factor 50 are not \
         resolved: check the units, or use the two-dimensional calculation (per metre) for long plates"
    )]
    Aspect {
        /// Smallest lateral side.
        least_m: f64,
        /// Largest lateral side.
        most_m: f64,
    },
    /// The plates touch or cross.
    #[error(
        "the plates touch: the {edge} of the upper plate would stand {depth_m:.3e} m below the lower plate's surface; \
         raise the gap above {needed_m:.6e} m or lower the tilt and the roll"
    )]
    Touching {
        /// Which edge or corner.
        edge: String,
        /// How far below.
        depth_m: f64,
        /// The smallest gap for which that edge is free.
        needed_m: f64,
    },
    /// The plates are free of each other, but nearer than the fitted grid can follow.
    #[error(
        "the {edge} of the upper plate is only {clearance_m:.3e} m above the lower plate's surface, nearer than the \
         fitted grid can follow at so large an angle: raise the gap above {needed_m:.6e} m or lower the tilt and the roll"
    )]
    Folded {
        /// Which edge or corner.
        edge: String,
        /// Its height above the lower plate.
        clearance_m: f64,
        /// A gap for which the grid is valid.
        needed_m: f64,
    },
}

impl Arrangement {
    /// Largest lateral side of either plate, in metres: the unit of length of the grid. In two dimensions the
    /// width does not count.
    pub fn size_m(&self) -> f64 {
        self.sides().into_iter().fold(0.0, f64::max)
    }

    fn sides(&self) -> Vec<f64> {
        match self.dimensions {
            Dimensions::Two => vec![self.lower.length_m, self.upper.length_m],
            Dimensions::Three => {
                vec![self.lower.length_m, self.upper.length_m, self.lower.width_m, self.upper.width_m]
            }
        }
    }

    /// The part of the lower plate that the upper one covers at zero tilt and roll. In two dimensions y runs over
    /// one metre of width.
    pub fn overlap(&self) -> Rectangle {
        let span = |lower: f64, upper: f64, shift: f64| {
            [(-lower / 2.0).max(shift - upper / 2.0), (lower / 2.0).min(shift + upper / 2.0)]
        };
        let [dx, dy] = self.pose.shift_m;
        Rectangle {
            x: span(self.lower.length_m, self.upper.length_m, dx),
            y: match self.dimensions {
                Dimensions::Two => [-0.5, 0.5],
                Dimensions::Three => span(self.lower.width_m, self.upper.width_m, dy),
            },
        }
    }

    /// Whether the plane y = 0 is a plane of symmetry, so that half the unknowns do.
    pub fn symmetric_in_y(&self) -> bool {
        self.dimensions == Dimensions::Three && self.pose.roll_rad == 0.0 && self.pose.shift_m[1] == 0.0
    }

    /// Heights of the upper plate's edges above the plane of the lower plate's surface.
    pub fn edge_gaps(&self) -> EdgeGaps {
        let [a, b] = [self.upper.length_m / 2.0, self.half_width_m()];
        let height = |x: f64, y: f64| self.pose.gap_m + dot(self.pose.rotation()[2], [x, y, 0.0]);
        EdgeGaps {
            hinge_edge_m: height(-a, 0.0),
            free_edge_m: height(a, 0.0),
            left_edge_m: height(0.0, -b),
            right_edge_m: height(0.0, b),
            lowest_corner_m: self.corners().into_iter().map(|c| c.1[2]).fold(f64::INFINITY, f64::min),
        }
    }

    /// Whether the fitted grid folds at this gap.
    fn folds(&self, gap_m: f64, sideways: Sideways) -> bool {
        let pose = Pose { gap_m, ..self.pose };
        least_volume(&pose, [self.upper.length_m / 2.0, self.half_width_m()], sideways) <= 0.0
    }

    /// The error for a pose in which the plates are free of each other but the grid folds.
    pub fn folded(&self, sideways: Sideways) -> ArrangementError {
        let (edge, clearance_m) = self.lowest_edge();
        // The smallest gap that does not fold, from above.
        let (mut folded, mut valid) = (self.pose.gap_m, 2.0 * self.pose.gap_m);
        while self.folds(valid, sideways) {
            valid *= 2.0;
        }
        while valid - folded > FOLD_STEP * valid {
            let middle = 0.5 * (folded + valid);
            if self.folds(middle, sideways) {
                folded = middle;
            } else {
                valid = middle;
            }
        }
        ArrangementError::Folded { edge, clearance_m, needed_m: valid }
    }

    fn half_width_m(&self) -> f64 {
        match self.dimensions {
            Dimensions::Two => 0.0,
            Dimensions::Three => self.upper.width_m / 2.0,
        }
    }

    /// The four corners of the upper plate's facing surface with their signs along x and y.
    fn corners(&self) -> [([f64; 2], Vector3); 4] {
        let (r, c) = (self.pose.rotation(), self.pose.centre_m());
        [[-1.0, -1.0], [-1.0, 1.0], [1.0, -1.0], [1.0, 1.0]].map(|[sx, sy]| {
            let p = [sx * self.upper.length_m / 2.0, sy * self.half_width_m(), 0.0];
            ([sx, sy], [0, 1, 2].map(|k| c[k] + dot(r[k], p)))
        })
    }

    /// Name of the lowest edge or corner of the upper plate, and its height in metres.
    pub fn lowest_edge(&self) -> (String, f64) {
        let (sign, at) = self
            .corners()
            .into_iter()
            .min_by(|a, b| a.1[2].total_cmp(&b.1[2]))
            .unwrap_or(([0.0; 2], [0.0, 0.0, self.pose.gap_m]));
        let along_x = if sign[0] < 0.0 { "hinge (-x)" } else { "free (+x)" };
        let along_y = if sign[1] < 0.0 { "-y" } else { "+y" };
        let name = match (self.pose.tilt_rad != 0.0, self.pose.roll_rad != 0.0) {
            (true, false) => format!("{along_x} edge"),
            (false, true) => format!("{along_y} edge"),
            _ => format!("corner at the {along_x} and {along_y} edges"),
        };
        (name, at[2])
    }

    /// Checks every number of the arrangement, and that a grid with the given sideways motion can follow the pose.
    ///
    /// # Errors
    /// The first value that is out of its range, the edge that touches, or the edge at which the grid folds.
    pub fn check(&self, sideways: Sideways) -> Result<(), ArrangementError> {
        let three = self.dimensions == Dimensions::Three;
        let lengths = [
            ("length of the lower plate", self.lower.length_m, true),
            ("length of the upper plate", self.upper.length_m, true),
            ("width of the lower plate", self.lower.width_m, three),
            ("width of the upper plate", self.upper.width_m, three),
            ("gap", self.pose.gap_m, true),
        ];
        for (what, value_m, _) in lengths.into_iter().filter(|l| l.2) {
            if !(LENGTH_RANGE_M[0]..=LENGTH_RANGE_M[1]).contains(&value_m) {
                return Err(ArrangementError::Length { what, value_m });
            }
        }
        for (what, plate) in
            [("thickness of the lower plate", &self.lower), ("thickness of the upper plate", &self.upper)]
        {
            let most_m = if three { plate.length_m.min(plate.width_m) } else { plate.length_m };
            if !(0.0..=most_m).contains(&plate.thickness_m) {
                return Err(ArrangementError::Thickness { what, value_m: plate.thickness_m, most_m });
            }
        }
        for (what, angle) in [("tilt", self.pose.tilt_rad), ("roll", self.pose.roll_rad)] {
            if angle.is_nan() || angle.abs() > 89f64.to_radians() {
                return Err(ArrangementError::Angle { what, degrees: angle.to_degrees() });
            }
        }
        let size_m = self.size_m();
        for (axis, value_m) in [("x", self.pose.shift_m[0]), ("y", self.pose.shift_m[1])] {
            if value_m.is_nan() || value_m.abs() > 2.0 * size_m {
                return Err(ArrangementError::Shift { axis, value_m, most_m: 2.0 * size_m });
            }
        }
        if !three {
            for (what, value) in [("roll", self.pose.roll_rad), ("shift along y", self.pose.shift_m[1])] {
                if value != 0.0 {
                    return Err(ArrangementError::NotInSection { what });
                }
            }
        }
        if self.surroundings == Surroundings::InsulatedWalls
            && (self.lower != self.upper || self.pose.shift_m != [0.0; 2] || self.lower.thickness_m != 0.0)
        {
            return Err(ArrangementError::Walls);
        }
        let least_m = self.sides().into_iter().fold(f64::INFINITY, f64::min);
        if size_m > ASPECT_LIMIT * least_m {
            return Err(ArrangementError::Aspect { least_m, most_m: size_m });
        }
        let (gap_m, ratio) = (self.pose.gap_m, self.pose.gap_m / size_m);
        if !(GAP_RATIO_RANGE[0]..=GAP_RATIO_RANGE[1]).contains(&ratio) {
            return Err(ArrangementError::GapRatio { gap_m, size_m, ratio });
        }
        let (edge, height) = self.lowest_edge();
        if height <= 0.0 {
            return Err(ArrangementError::Touching { edge, depth_m: -height, needed_m: gap_m - height });
        }
        if self.folds(gap_m, sideways) {
            return Err(self.folded(sideways));
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn squares(gap_m: f64, tilt_deg: f64) -> Arrangement {
        let plate = Plate { length_m: 0.1, width_m: 0.1, thickness_m: 0.0 };
        let pose = Pose { gap_m, tilt_rad: f64::to_radians(tilt_deg), roll_rad: 0.0, shift_m: [0.0; 2] };
        let (surroundings, dimensions) = (Surroundings::Open, Dimensions::Three);
        Arrangement { lower: plate, upper: plate, pose, surroundings, dimensions }
    }

    #[test]
    fn touching_plates_name_the_edge_and_the_depth() {
        let error = squares(0.004, 10.0).check(Sideways::Smooth).unwrap_err();
        let depth = 0.05 * 10f64.to_radians().sin() - 0.004;
        match &error {
            ArrangementError::Touching { edge, depth_m, needed_m } => {
                assert_eq!(edge, "hinge (-x) edge");
                assert!((depth_m - depth).abs() < 1e-15 && (needed_m - depth - 0.004).abs() < 1e-15);
            }
            other => panic!("{other}"),
        }
        assert!(
            matches!(squares(0.004, -10.0).check(Sideways::Smooth), Err(ArrangementError::Touching { edge, .. })
            if edge == "free (+x) edge")
        );
    }

    #[test]
    fn absurd_values_are_refused() {
        for gap in [f64::NAN, -1.0, 0.0, 1e-300, f64::INFINITY] {
            assert!(matches!(
                squares(gap, 0.0).check(Sideways::Smooth),
                Err(ArrangementError::Length { what: "gap", .. })
            ));
        }
        assert!(matches!(
            squares(0.01, 90.0).check(Sideways::Smooth),
            Err(ArrangementError::Angle { what: "tilt", .. })
        ));
        assert!(matches!(squares(1.0, 0.0).check(Sideways::Smooth), Err(ArrangementError::GapRatio { .. })));
        assert!(squares(0.01, 1.0).check(Sideways::Smooth).is_ok());
    }
}
