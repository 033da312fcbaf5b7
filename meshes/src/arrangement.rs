//! The two plates, the pose of the upper one and what is around them.

use crate::{dot, Film, Guard, Plate, Pose, Surroundings, Vector3, Which};

/// Cross-section (results per metre of width) or real plates.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Dimensions {
    /// Infinitely wide plates: everything per metre of width.
    Two,
    /// Plates of finite width.
    Three,
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
    /// The guard ring, if one of them has one.
    pub guard: Option<Guard>,
    /// The film on the lower plate, if there is one.
    pub film: Option<Film>,
    /// What is around.
    pub surroundings: Surroundings,
    /// Cross-section or real plates.
    pub dimensions: Dimensions,
}

impl Arrangement {
    /// Two plates alone in open space.
    pub fn open(lower: Plate, upper: Plate, pose: Pose, dimensions: Dimensions) -> Self {
        Arrangement {
            lower,
            upper,
            pose,
            guard: None,
            film: None,
            surroundings: Surroundings::Open,
            dimensions,
        }
    }

    /// One of the plates.
    pub fn plate(&self, which: Which) -> &Plate {
        match which {
            Which::Lower => &self.lower,
            Which::Upper => &self.upper,
        }
    }

    /// By how much the guard ring stands out over a plate on each side, in metres.
    pub fn margin_m(&self, which: Which) -> f64 {
        self.guard.filter(|g| g.around == which).map_or(0.0, |g| g.margin_m())
    }

    /// Length and width of a plate with its guard ring, in metres.
    pub fn outline_m(&self, which: Which) -> [f64; 2] {
        let (plate, margin) = (self.plate(which), self.margin_m(which));
        [plate.length_m + 2.0 * margin, plate.width_m + 2.0 * margin]
    }

    /// Lateral centre of a plate, in metres.
    pub fn centre_m(&self, which: Which) -> [f64; 2] {
        match which {
            Which::Lower => [0.0; 2],
            Which::Upper => self.pose.shift_m,
        }
    }

    /// Largest lateral side of either plate with its guard ring, in metres: the unit of length of the grid. In two
    /// dimensions the width does not count.
    pub fn size_m(&self) -> f64 {
        self.sides().into_iter().fold(0.0, f64::max)
    }

    /// Lateral sides of the plates with their guard rings, in metres.
    pub(crate) fn sides(&self) -> Vec<f64> {
        let outlines = [Which::Lower, Which::Upper].map(|w| self.outline_m(w));
        let counted = if self.dimensions == Dimensions::Two { 1 } else { 2 };
        outlines.iter().flat_map(|o| o[..counted].to_vec()).collect()
    }

    /// Thickness of the film, zero without one, in metres.
    pub fn film_m(&self) -> f64 {
        self.film.map_or(0.0, |f| f.thickness_m)
    }

    /// Height of the free space between the film and the centre of the upper plate, in metres.
    pub fn clear_gap_m(&self) -> f64 {
        self.pose.gap_m - self.film_m()
    }

    /// The gap that the ideal formula uses: of two plates in the medium alone with the same capacitance per area,
    /// (d - t) + t/permittivity ratio, in metres.
    pub fn effective_gap_m(&self) -> f64 {
        self.clear_gap_m() + self.film.map_or(0.0, |f| f.equivalent_m())
    }

    /// The part of the lower plate that the upper one covers at zero tilt and roll, both without their guard ring. In two
    /// dimensions y runs over one metre of width.
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
        let [_, [left, right], _] = self.surroundings.walls().by_axis();
        self.dimensions == Dimensions::Three
            && self.pose.roll_rad == 0.0
            && self.pose.shift_m[1] == 0.0
            && left == right
    }

    /// Whether nothing but the far away gives the potential its zero: no grounded wall.
    pub fn potential_is_open(&self) -> bool {
        let mut walls = self.surroundings.walls().by_axis();
        if self.dimensions == Dimensions::Two {
            walls[1] = [None; 2];
        }
        self.surroundings != Surroundings::InsulatedWalls && walls.as_flattened().iter().all(|w| w.is_none())
    }

    /// Heights of the upper plate's edges above the plane of the lower plate's surface.
    pub fn edge_gaps(&self) -> EdgeGaps {
        let margin = self.margin_m(Which::Upper);
        let [a, b] = self.half_outline_m().map(|h| (h - margin).max(0.0));
        let height = |x: f64, y: f64| self.pose.gap_m + dot(self.pose.rotation()[2], [x, y, 0.0]);
        let corners = [[-a, -b], [-a, b], [a, -b], [a, b]];
        EdgeGaps {
            hinge_edge_m: height(-a, 0.0),
            free_edge_m: height(a, 0.0),
            left_edge_m: height(0.0, -b),
            right_edge_m: height(0.0, b),
            lowest_corner_m: corners.into_iter().map(|[x, y]| height(x, y)).fold(f64::INFINITY, f64::min),
        }
    }

    /// Half the length and half the width of the upper plate with its guard ring, in metres; no width in a
    /// cross-section.
    pub(crate) fn half_outline_m(&self) -> [f64; 2] {
        let [length, width] = self.outline_m(Which::Upper);
        [length / 2.0, if self.dimensions == Dimensions::Two { 0.0 } else { width / 2.0 }]
    }

    /// The corners of the upper plate with its guard ring, at `height_m` over its facing surface, with their signs along x
    /// and y.
    pub(crate) fn corners(&self, height_m: f64) -> [([f64; 2], Vector3); 4] {
        let (r, c, half) = (self.pose.rotation(), self.pose.centre_m(), self.half_outline_m());
        [[-1.0, -1.0], [-1.0, 1.0], [1.0, -1.0], [1.0, 1.0]].map(|[sx, sy]| {
            let p = [sx * half[0], sy * half[1], height_m];
            ([sx, sy], [0, 1, 2].map(|k| c[k] + dot(r[k], p)))
        })
    }

    /// Name of the lowest edge or corner of the upper plate (or of its guard ring), and its height in metres above the
    /// lower plate.
    pub fn lowest_edge(&self) -> (String, f64) {
        let (sign, at) = self
            .corners(0.0)
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

    /// Height of the lowest corner over what lies below it, the film or the lower plate, as a part of that height at the
    /// centre: 1 without tilt, 0 in contact.
    pub fn narrowness(&self) -> f64 {
        (self.lowest_edge().1 - self.film_m()) / self.clear_gap_m()
    }
}
