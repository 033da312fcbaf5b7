//! What an arrangement has to satisfy before a grid can be made for it.

use crate::bend::least_volume;
use crate::surroundings::WALL_NAMES;
use crate::{Arrangement, ArrangementError, Dimensions, Pose, Sideways, Surroundings, Which};

/// Smallest and largest length accepted, in metres: a nanometre, below which a plate is not a continuum, and a
/// kilometre. Outside of these something is wrong with the input.
const LENGTH_RANGE_M: [f64; 2] = [1e-9, 1e3];

/// Smallest and largest gap in units of the largest lateral size of a plate for which the grid family was
/// checked.
const GAP_RATIO_RANGE: [f64; 2] = [1e-4, 5.0];

/// The same for slots, rims, films and the distances of walls. Beyond the largest one a wall is open space, and beyond the
/// smallest one the cells are too small for the arithmetic.
const DETAIL_RATIO_RANGE: [f64; 2] = [1e-5, 20.0];

/// Smallest thickness other than zero, in units of the plate's smaller side: below it the cells in the plate are too small
/// for the arithmetic, and a sheet without thickness is the same to all digits.
const THINNEST: f64 = 1e-7;

/// Smallest and largest permittivity of a film over that of the medium.
const FILM_PERMITTIVITY_RANGE: [f64; 2] = [1e-3, 1e3];

/// Relative accuracy to which the smallest gap without folding is found.
const FOLD_STEP: f64 = 1e-3;

/// Largest ratio between the lateral sizes of the two plates, or of one plate, that the grid serves well.
const ASPECT_LIMIT: f64 = 50.0;

impl Arrangement {
    /// Whether the fitted grid folds at this gap.
    fn folds(&self, gap_m: f64, sideways: Sideways) -> bool {
        let pose = Pose { gap_m: gap_m - self.film_m(), ..self.pose };
        least_volume(&pose, self.half_outline_m(), sideways) <= 0.0
    }

    /// The error for a pose in which the plates are free of each other but the grid folds.
    pub fn folded(&self, sideways: Sideways) -> ArrangementError {
        let (edge, height) = self.lowest_edge();
        if !self.folds(self.pose.gap_m, sideways) {
            return ArrangementError::Cramped;
        }
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
        let clearance_m = height - self.film_m();
        ArrangementError::Folded { edge, clearance_m, surface: self.surface(), needed_m: valid }
    }

    /// What the upper plate would touch first.
    fn surface(&self) -> &'static str {
        if self.film.is_some() {
            "film"
        } else {
            "lower plate's surface"
        }
    }

    /// Checks every number of the arrangement, and that a grid with the given sideways motion can follow the pose.
    ///
    /// # Errors
    /// The first value that is out of its range, the edge that touches, or the edge at which the grid folds.
    pub fn check(&self, sideways: Sideways) -> Result<(), ArrangementError> {
        self.check_plates()?;
        self.check_guard()?;
        self.check_pose()?;
        self.check_film()?;
        let (edge, height) = self.lowest_edge();
        let depth_m = self.film_m() - height;
        if depth_m >= 0.0 {
            let needed_m = self.pose.gap_m + depth_m;
            return Err(ArrangementError::Touching { edge, surface: self.surface(), depth_m, needed_m });
        }
        if self.folds(self.pose.gap_m, sideways) {
            return Err(self.folded(sideways));
        }
        self.check_walls()
    }

    fn check_plates(&self) -> Result<(), ArrangementError> {
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
            let value_m = plate.thickness_m;
            if !(0.0..=most_m).contains(&value_m) {
                return Err(ArrangementError::Thickness { what, value_m, most_m });
            }
            let least_m = THINNEST * most_m;
            if value_m > 0.0 && value_m < least_m {
                return Err(ArrangementError::Thin { what, value_m, least_m });
            }
        }
        Ok(())
    }

    fn check_guard(&self) -> Result<(), ArrangementError> {
        let Some(guard) = self.guard else { return Ok(()) };
        let size_m = self.size_m();
        for (what, value_m) in
            [("slot of the guard ring", guard.slot_m), ("rim of the guard ring", guard.rim_m)]
        {
            self.check_detail(what, value_m, size_m)?;
        }
        Ok(())
    }

    /// A length beside those of the plates, held against the size.
    fn check_detail(&self, what: &'static str, value_m: f64, size_m: f64) -> Result<(), ArrangementError> {
        let [least_m, most_m] = DETAIL_RATIO_RANGE.map(|r| r * size_m);
        if (least_m..=most_m).contains(&value_m) {
            Ok(())
        } else {
            Err(ArrangementError::Detail { what, value_m, least_m, most_m })
        }
    }

    fn check_pose(&self) -> Result<(), ArrangementError> {
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
        if self.dimensions == Dimensions::Two {
            for (what, value) in [("roll", self.pose.roll_rad), ("shift along y", self.pose.shift_m[1])] {
                if value != 0.0 {
                    return Err(ArrangementError::NotInSection { what });
                }
            }
        }
        if self.surroundings == Surroundings::InsulatedWalls
            && (self.lower != self.upper
                || self.pose.shift_m != [0.0; 2]
                || self.lower.thickness_m != 0.0
                || self.guard.is_some())
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
        Ok(())
    }

    fn check_film(&self) -> Result<(), ArrangementError> {
        let Some(film) = self.film else { return Ok(()) };
        self.check_detail("thickness of the film", film.thickness_m, self.size_m())?;
        if !(FILM_PERMITTIVITY_RANGE[0]..=FILM_PERMITTIVITY_RANGE[1]).contains(&film.permittivity_ratio) {
            return Err(ArrangementError::FilmPermittivity { ratio: film.permittivity_ratio });
        }
        Ok(())
    }

    /// Walls are far enough from where they are measured, and the upper plate is free of them.
    fn check_walls(&self) -> Result<(), ArrangementError> {
        let (walls, size_m) = (self.surroundings.walls().by_axis(), self.size_m());
        if matches!(self.surroundings, Surroundings::GroundedBox(_))
            && walls.as_flattened().iter().all(|w| w.is_none())
        {
            return Err(ArrangementError::NoWall);
        }
        let upper: Vec<_> = [0.0, self.upper.thickness_m].iter().flat_map(|&h| self.corners(h)).collect();
        for (axis, walls) in walls.into_iter().enumerate() {
            if axis == 1 && self.dimensions == Dimensions::Two {
                continue;
            }
            for (end, clearance_m) in walls.into_iter().enumerate() {
                let Some(clearance_m) = clearance_m else { continue };
                let wall = WALL_NAMES[axis][end];
                self.check_detail(CLEARANCE_NAMES[axis][end], clearance_m, size_m)?;
                // Distance of the wall from the lower plate's centre, and how far the upper plate reaches that way.
                let sign = if end == 0 { -1.0 } else { 1.0 };
                let at = clearance_m
                    + match (axis, end) {
                        (2, 0) => self.lower.thickness_m,
                        (2, _) => 0.0,
                        _ => self.outline_m(Which::Lower)[axis] / 2.0,
                    };
                let reach = upper.iter().map(|c| sign * c.1[axis]).fold(f64::NEG_INFINITY, f64::max);
                if reach >= at {
                    return Err(ArrangementError::Cut {
                        wall,
                        clearance_m,
                        beyond_m: reach - at,
                        needed_m: clearance_m + reach - at,
                    });
                }
            }
        }
        Ok(())
    }
}

/// Names of the clearances, by axis and end.
const CLEARANCE_NAMES: [[&str; 2]; 3] = [
    ["clearance on the hinge side", "clearance on the free side"],
    ["clearance on the left", "clearance on the right"],
    ["clearance below", "clearance above"],
];

#[cfg(test)]
mod tests {
    use super::*;
    use crate::Plate;

    fn squares(gap_m: f64, tilt_deg: f64) -> Arrangement {
        let plate = Plate { length_m: 0.1, width_m: 0.1, thickness_m: 0.0 };
        let pose = Pose { gap_m, tilt_rad: f64::to_radians(tilt_deg), roll_rad: 0.0, shift_m: [0.0; 2] };
        Arrangement::open(plate, plate, pose, Dimensions::Three)
    }

    #[test]
    fn touching_plates_name_the_edge_and_the_depth() {
        let error = squares(0.004, 10.0).check(Sideways::Smooth).unwrap_err();
        let depth = 0.05 * 10f64.to_radians().sin() - 0.004;
        match &error {
            ArrangementError::Touching { edge, depth_m, needed_m, .. } => {
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
