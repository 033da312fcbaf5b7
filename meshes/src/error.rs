//! Why an arrangement cannot be solved.

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
    /// A plate is neither a sheet nor thick enough for the grid.
    #[error(
        "the {what} is {value_m:e} m, too thin for the grid; give 0 for a sheet, or at least {least_m:e} m"
    )]
    Thin {
        /// Which thickness.
        what: &'static str,
        /// Its value.
        value_m: f64,
        /// Smallest accepted value other than 0.
        least_m: f64,
    },
    /// A slot, a rim, a film or the distance of a wall is out of its range.
    #[error("the {what} is {value_m:e} m; for plates of this size give {least_m:.3e} m to {most_m:.3e} m")]
    Detail {
        /// Which length.
        what: &'static str,
        /// Its value.
        value_m: f64,
        /// Smallest accepted value.
        least_m: f64,
        /// Largest accepted value.
        most_m: f64,
    },
    /// The permittivity of the film is out of its range.
    #[error(
        "the permittivity of the film is {ratio:e} of that of the medium; the grids are made for 0.001 to 1000, and \
         glass or plastics have 2 to 10"
    )]
    FilmPermittivity {
        /// Its ratio to that of the medium.
        ratio: f64,
    },
    /// A box without any wall.
    #[error("the grounded box has no wall; give at least one clearance, or choose open surroundings")]
    NoWall,
    /// A wall of the box cuts the upper plate.
    #[error(
        "the wall {wall} of the grounded box cuts the upper plate: the plate would reach {beyond_m:.3e} m through it; \
         raise that clearance from {clearance_m:e} m above {needed_m:.6e} m, or lower the tilt and the roll"
    )]
    Cut {
        /// Which wall.
        wall: &'static str,
        /// Its clearance.
        clearance_m: f64,
        /// How far the plate reaches through it.
        beyond_m: f64,
        /// The clearance at which it touches.
        needed_m: f64,
    },
    /// The grid folds between the upper plate and a wall.
    #[error(
        "the upper plate stands so near to a wall of the grounded box that the fitted grid cannot follow the tilt; move \
         the wall away, or lower the tilt and the roll"
    )]
    Cramped,
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
        "insulating walls along the plate edges need two equal plates without shift, thickness and guard ring"
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
        "the plates touch: the {edge} of the upper plate would stand {depth_m:.3e} m below the {surface}; \
         raise the gap above {needed_m:.6e} m or lower the tilt and the roll"
    )]
    Touching {
        /// Which edge or corner.
        edge: String,
        /// What it touches: the lower plate's surface or the film on it.
        surface: &'static str,
        /// How far below.
        depth_m: f64,
        /// The smallest gap for which that edge is free.
        needed_m: f64,
    },
    /// The plates are free of each other, but nearer than the fitted grid can follow.
    #[error(
        "the {edge} of the upper plate is only {clearance_m:.3e} m above the {surface}, nearer than the \
         fitted grid can follow at so large an angle: raise the gap above {needed_m:.6e} m or lower the tilt and the roll"
    )]
    Folded {
        /// Which edge or corner.
        edge: String,
        /// Its height above the surface.
        clearance_m: f64,
        /// What it is near to: the lower plate's surface or the film on it.
        surface: &'static str,
        /// A gap for which the grid is valid.
        needed_m: f64,
    },
}
