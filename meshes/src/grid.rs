//! The fitted grid: a tensor product of graded axes, bent so that the tilted plate lies on grid planes.
//!
//! In reference coordinates both plates are axis-parallel boxes. A node at xi stands in the room at
//! X = xi + B (R - I) P, where P is the point of the upper plate nearest to xi (relative to the plate's centre) and
//! the weight B is 0 on and below the lower plate and the film on it, rises across the gap, is 1 through the upper plate
//! and falls linearly to 0 at the far boundary or at the grounded walls. The plate moves rigidly and nothing becomes a
//! staircase.

use crate::axis::Beyond;
use crate::{
    Arrangement, ArrangementError, Axis, Body, Carry, Dimensions, End, NodeBox, Pose, Sideways, Surroundings,
    Vector3, Which,
};

/// Choices that all levels of a family share.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GridOptions {
    /// How sideways motion is spread across the gap.
    pub sideways: Sideways,
    /// Distance of the far boundary from the plates, in units of the size.
    pub far: f64,
}

/// Distance of the far boundary in units of the largest extent, and what counts as extent: the size, this many gaps,
/// this many shifts. Measured at level triples 4-6-8 on strips and squares: what is left of the far boundary is below
/// 3e-6 of force and charge.
const FAR: f64 = 20.0;
const GAPS_IN_EXTENT: f64 = 5.0;
const SHIFTS_IN_EXTENT: f64 = 2.0;

impl GridOptions {
    /// The choices that suit an arrangement.
    pub fn suited(arrangement: &Arrangement) -> Self {
        let pose = &arrangement.pose;
        let shift = pose.shift_m[0].hypot(pose.shift_m[1]);
        let extent = (GAPS_IN_EXTENT * pose.gap_m).max(SHIFTS_IN_EXTENT * shift) / arrangement.size_m();
        GridOptions { sideways: Sideways::Smooth, far: FAR * extent.max(1.0) }
    }
}

/// Cells with a permittivity of their own.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FilmCells {
    /// Nodes of the film; its cells are those between them.
    pub nodes: NodeBox,
    /// Permittivity over that of the medium.
    pub permittivity: f64,
}

/// How the potential falls off far away: as a power of the distance from a point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FarField {
    /// The point: the middle of the lower plate, in a grounded wall its image there.
    pub origin: Vector3,
    /// The power of 1/r.
    pub decay: f64,
}

/// A fitted grid of level q; lengths in units of the arrangement's size.
#[derive(Clone, Debug, PartialEq)]
pub struct Grid {
    /// Level of the family.
    pub q: usize,
    /// Axes x, y, z in reference coordinates.
    pub axes: [Axis; 3],
    /// The lower plate.
    pub lower: Body,
    /// The upper plate; its motion also bends the grid.
    pub upper: Body,
    /// The film on the lower plate.
    pub film: Option<FilmCells>,
    /// How the potential falls off.
    pub far_field: FarField,
    /// Whether the grid is the half at y > 0 of a symmetric arrangement.
    pub half: bool,
}

/// From and to along x, y, z, in units of the size.
type Span = [[f64; 2]; 3];

/// A plate with its guard ring in reference coordinates.
struct Solid {
    /// The plate.
    plate: Span,
    /// Plate and guard ring.
    hull: Span,
    /// Inner edges of the guard ring along x and y.
    slot: Option<[[f64; 2]; 2]>,
    /// Centre of the facing surface.
    centre: Vector3,
}

fn widened([from, to]: [f64; 2], by: f64) -> [f64; 2] {
    [from - by, to + by]
}

impl Solid {
    fn new(arrangement: &Arrangement, which: Which) -> Solid {
        let size = arrangement.size_m();
        let (plate, at) = (arrangement.plate(which), arrangement.centre_m(which));
        let three = arrangement.dimensions == Dimensions::Three;
        let thickness = plate.thickness_m / size;
        let gap = arrangement.pose.gap_m / size;
        let (z, height) = match which {
            Which::Lower => ([-thickness, 0.0], 0.0),
            Which::Upper => ([gap, gap + thickness], gap),
        };
        let extent = |d: usize, extent_m: f64| widened([at[d] / size; 2], extent_m / size / 2.0);
        let across = if three { extent(1, plate.width_m) } else { SLAB };
        let span = [extent(0, plate.length_m), across, z];
        let grown = |by: f64| {
            let [x, y, z] = span;
            [widened(x, by), if three { widened(y, by) } else { y }, z]
        };
        let guard = arrangement.guard.filter(|g| g.around == which);
        Solid {
            plate: span,
            hull: grown(arrangement.margin_m(which) / size),
            slot: guard.map(|g| {
                let [x, y, _] = grown(g.slot_m / size);
                [x, y]
            }),
            centre: [at[0] / size, if three { at[1] / size } else { 0.0 }, height],
        }
    }

    /// Edges along x or y, through which the grid lines go.
    fn edges(&self, d: usize) -> Vec<f64> {
        let slot = self.slot.map(|slot| slot[d]);
        [Some(self.plate[d]), Some(self.hull[d]), slot].into_iter().flatten().flatten().collect()
    }

    /// The boxes of metal.
    fn boxes(&self, dimensions: Dimensions) -> Vec<Span> {
        let [hx, hy, z] = self.hull;
        let Some([sx, sy]) = self.slot else { return vec![self.plate] };
        let mut boxes = vec![self.plate, [[hx[0], sx[0]], hy, z], [[sx[1], hx[1]], hy, z]];
        if dimensions == Dimensions::Three {
            boxes.extend([[sx, [hy[0], sy[0]], z], [sx, [sy[1], hy[1]], z]]);
        }
        boxes
    }

    /// Motion with the given weights along z. `rotation` turns the plate into its pose; `beside` gives the coordinates at
    /// which the motion has ended, on both sides along x and y.
    fn carry(
        &self,
        axes: &[Axis; 3],
        [sideways, vertical]: [Vec<f64>; 2],
        rotation: crate::Matrix3,
        moving: Span,
        beside: [[Option<f64>; 2]; 2],
    ) -> Carry {
        let falling = |d: usize| {
            let ([from, to], [before, after]) = (moving[d], beside[d]);
            let fall = |distance: f64, end: Option<f64>, edge: f64| {
                end.map_or(1.0, |end| (1.0 - distance / (end - edge).abs()).clamp(0.0, 1.0))
            };
            axes[d]
                .nodes
                .iter()
                .map(|&x| fall((from - x).max(0.0), before, from) * fall((x - to).max(0.0), after, to))
                .collect::<Vec<f64>>()
        };
        let point = [0, 1, 2].map(|d| {
            let [from, to] = moving[d];
            axes[d].nodes.iter().map(|x| x.clamp(from, to) - self.centre[d]).collect()
        });
        Carry { sideways, vertical, beside: [falling(0), falling(1)], point, rotation }
    }

    /// The body in the grid. `weights` are those of its motion along z, `walls` the coordinates of grounded walls along x
    /// and y.
    fn body(
        &self,
        axes: &[Axis; 3],
        arrangement: &Arrangement,
        weights: [Vec<f64>; 2],
        rotation: crate::Matrix3,
        walls: [[Option<f64>; 2]; 2],
    ) -> Body {
        let half = arrangement.symmetric_in_y();
        let nodes = |span: &Span| {
            let [i, mut j, k] = [0, 1, 2].map(|d| span[d].map(|x| axes[d].nearest(x)));
            if half && span[1][0] < 0.0 {
                // The nearest node to a negative edge is the one on the symmetry plane.
                j[0] = 0;
            }
            NodeBox { i, j, k }
        };
        let boxes = self.boxes(arrangement.dimensions);
        let boxes = boxes.iter().filter(|span| !half || span[1][1] > 0.0).map(nodes).collect();
        let guarded_carry = self.slot.map(|slot| {
            let across = arrangement.dimensions == Dimensions::Three;
            let ends = [0, 1].map(|d| slot[d].map(|x| (d == 0 || across).then_some(x)));
            self.carry(axes, weights.clone(), rotation, self.plate, ends)
        });
        Body {
            boxes,
            hull: nodes(&self.hull),
            carry: self.carry(axes, weights, rotation, self.hull, walls),
            guarded_carry,
        }
    }
}

/// The width of a cross-section, along y.
const SLAB: [f64; 2] = [-0.5, 0.5];

/// How the potential falls off in these surroundings. One grounded wall makes the field of a dipole of that of a charge;
/// in the plane a pair without total charge has the field of a dipole from the start.
fn far_field(arrangement: &Arrangement, walls: [[Option<f64>; 2]; 3]) -> FarField {
    let three = arrangement.dimensions == Dimensions::Three;
    let walls = if three { walls } else { [walls[0], [None; 2], walls[2]] };
    let walled = walls.iter().filter(|w| w.iter().any(|w| w.is_some())).count() as f64;
    let origin = walls.map(|w| match w {
        [Some(at), None] | [None, Some(at)] => at,
        _ => 0.0,
    });
    FarField { origin, decay: if three { 1.0 + walled } else { walled.max(1.0) } }
}

impl Grid {
    /// The grid of level `q` (1, 2, 3, ...) for an arrangement.
    ///
    /// # Errors
    /// What [`Arrangement::check`] finds wrong.
    pub fn new(arrangement: &Arrangement, q: usize, options: &GridOptions) -> Result<Grid, ArrangementError> {
        arrangement.check(options.sideways)?;
        let size = arrangement.size_m();
        let three = arrangement.dimensions == Dimensions::Three;
        let half = arrangement.symmetric_in_y();
        let pose = &arrangement.pose;
        let (gap, film) = (pose.gap_m / size, arrangement.film_m() / size);
        let solids = [Which::Lower, Which::Upper].map(|which| Solid::new(arrangement, which));
        let outline = &solids[0].hull;
        // Coordinates of the grounded walls. The lid is measured from the lower plate's facing surface.
        let walls: [[Option<f64>; 2]; 3] = {
            let clearances = arrangement.surroundings.walls().by_axis();
            [0, 1, 2].map(|d| {
                let [low, high] = clearances[d];
                [low.map(|c| outline[d][0] - c / size), high.map(|c| outline[d][1] + c / size)]
            })
        };
        let far_field = far_field(arrangement, walls);
        let beyond = |d: usize| {
            [0, 1].map(|end| match (arrangement.surroundings, walls[d][end]) {
                _ if half && d == 1 && end == 0 => Beyond::Mirror,
                (Surroundings::InsulatedWalls, _) => Beyond::Nothing,
                (_, Some(at)) => Beyond::Wall(at),
                _ => Beyond::Open { far: options.far, decay: far_field.decay },
            })
        };
        let edges = |d: usize| solids.iter().flat_map(|s| s.edges(d)).collect::<Vec<f64>>();
        let thickness = [&arrangement.lower, &arrangement.upper].map(|p| p.thickness_m / size);
        let axes = [
            Axis::lateral(&edges(0), q, beyond(0)),
            if three { Axis::lateral(&edges(1), q, beyond(1)) } else { Axis::slab() },
            Axis::vertical(thickness, film, gap, q, beyond(2)),
        ];
        // Along z: up through the gap, then down to the ends, and the reverse for the lower plate.
        let z = &axes[2].nodes;
        let ramp = |z: f64, from: f64, to: f64| ((z - from) / (to - from)).clamp(0.0, 1.0);
        let ends = [z[0], z[z.len() - 1]];
        let fall = |z: f64, from: f64, to: f64| if to == from { 1.0 } else { 1.0 - ramp(z, from, to) };
        let upper_fall = |z: f64| fall(z, gap + thickness[1], ends[1]);
        let lower_fall = |z: f64| fall(z, -thickness[0], ends[0]);
        let spread = |weight: &dyn Fn(f64) -> f64| z.iter().map(|&z| weight(z)).collect::<Vec<f64>>();
        let sideways = |b: f64| options.sideways.weight(b);
        let lower_weights = [
            spread(&|z| sideways(1.0 - ramp(z, film, gap)) * lower_fall(z)),
            spread(&|z| (1.0 - ramp(z, film, gap)) * lower_fall(z)),
        ];
        let upper_weights = [
            spread(&|z| sideways(ramp(z, film, gap)) * upper_fall(z)),
            spread(&|z| ramp(z, film, gap) * upper_fall(z)),
        ];
        let level = Pose { gap_m: 0.0, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
        let beside = [walls[0], if three { walls[1] } else { [None; 2] }];
        let lower = solids[0].body(&axes, arrangement, lower_weights, level.rotation(), beside);
        let upper = solids[1].body(&axes, arrangement, upper_weights, pose.rotation(), beside);
        let film = arrangement.film.map(|f| FilmCells {
            nodes: NodeBox { k: [axes[2].nearest(0.0), axes[2].nearest(film)], ..*lower.plate() },
            permittivity: f.permittivity_ratio,
        });
        Ok(Grid { q, lower, upper, film, far_field, half, axes })
    }

    /// Permittivity of the cell between the nodes `at` and their next ones, over that of the medium.
    #[inline]
    pub fn permittivity(&self, at: [usize; 3]) -> f64 {
        let within = |r: [usize; 2], n: usize| r[0] <= n && n < r[1];
        match &self.film {
            Some(FilmCells { nodes, permittivity })
                if within(nodes.i, at[0]) && within(nodes.j, at[1]) && within(nodes.k, at[2]) =>
            {
                *permittivity
            }
            _ => 1.0,
        }
    }

    /// Whether a node belongs to the film or to its surface.
    #[inline]
    pub fn at_film(&self, i: usize, j: usize, k: usize) -> bool {
        self.film.is_some_and(|f| f.nodes.contains(i, j, k))
    }

    /// Nodes along x, y, z.
    pub fn shape(&self) -> [usize; 3] {
        [0, 1, 2].map(|d| self.axes[d].len())
    }

    /// Number of nodes.
    pub fn nodes(&self) -> usize {
        self.shape().iter().product()
    }

    /// Number of a node: z runs fastest, x slowest.
    #[inline]
    pub fn index(&self, i: usize, j: usize, k: usize) -> usize {
        (i * self.axes[1].len() + j) * self.axes[2].len() + k
    }

    /// The grounded walls, each a box of nodes one plane thick.
    pub fn walls(&self) -> Vec<NodeBox> {
        let last = self.shape().map(|n| n - 1);
        let mut walls = Vec::new();
        for d in 0..3 {
            for (end, at) in [(0, 0), (1, last[d])] {
                if self.axes[d].ends[end] == End::Held {
                    let mut range = last.map(|n| [0, n]);
                    range[d] = [at, at];
                    let [i, j, k] = range;
                    walls.push(NodeBox { i, j, k });
                }
            }
        }
        walls
    }

    /// Numbers of the nodes of a box.
    pub fn nodes_of(&self, of: &NodeBox) -> impl Iterator<Item = usize> + '_ {
        let NodeBox { i, j, k } = *of;
        (i[0]..=i[1]).flat_map(move |i| {
            (j[0]..=j[1]).flat_map(move |j| (k[0]..=k[1]).map(move |k| self.index(i, j, k)))
        })
    }

    /// Where a node stands in the room.
    #[inline]
    pub fn position(&self, i: usize, j: usize, k: usize) -> Vector3 {
        let at = [self.axes[0].nodes[i], self.axes[1].nodes[j], self.axes[2].nodes[k]];
        let carry = &self.upper.carry;
        if !carry.moves(k) {
            return at;
        }
        let by = carry.displacement(i, j, k);
        [at[0] + by[0], at[1] + by[1], at[2] + by[2]]
    }

    /// Whether the grid is a slab of unit width between insulating walls: a cross-section.
    pub fn is_cross_section(&self) -> bool {
        self.axes[1].len() == 2
    }

    /// Whether force along y and torque about x and z vanish because the bench is its own mirror image.
    pub fn mirrored(&self) -> bool {
        self.half || self.is_cross_section()
    }

    /// What a quantity of the grid has to be multiplied with to be that of the whole arrangement.
    pub fn multiplicity(&self) -> f64 {
        if self.half {
            2.0
        } else {
            1.0
        }
    }

    /// The factor by which the widest cell exceeds the narrowest, over all axes: the worst aspect ratio.
    pub fn worst_aspect(&self) -> f64 {
        let cells: Vec<f64> = self.axes.iter().flat_map(|a| a.cells()).collect();
        cells.iter().copied().fold(0.0, f64::max) / cells.iter().copied().fold(f64::INFINITY, f64::min)
    }
}

impl std::fmt::Display for Grid {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let [nx, ny, nz] = self.shape();
        let half = if self.half { " (half, mirrored at y = 0)" } else { "" };
        let (nodes, aspect) = (self.nodes(), self.worst_aspect());
        write!(f, "level {}: {nx} x {ny} x {nz} = {nodes} nodes{half}, worst aspect {aspect:.0}", self.q)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{Clearances, Film, Guard, Plate};

    #[test]
    fn the_plate_is_rigid_and_its_edges_are_grid_lines() {
        let arrangement = Arrangement::open(
            Plate { length_m: 0.2, width_m: 0.18, thickness_m: 0.0 },
            Plate { length_m: 0.16, width_m: 0.2, thickness_m: 0.004 },
            Pose { gap_m: 0.01, tilt_rad: 0.03, roll_rad: -0.02, shift_m: [0.01, 0.004] },
            Dimensions::Three,
        );
        let grid = Grid::new(&arrangement, 2, &GridOptions::suited(&arrangement)).unwrap();
        assert!(!grid.half);
        let r = arrangement.pose.rotation();
        let up = grid.upper.hull;
        for (i, sx) in [(up.i[0], -1.0), (up.i[1], 1.0)] {
            for (j, sy) in [(up.j[0], -1.0), (up.j[1], 1.0)] {
                for (k, height) in [(up.k[0], 0.0), (up.k[1], 0.02)] {
                    let p = [sx * 0.4, sy * 0.5, height];
                    let x = grid.position(i, j, k);
                    let c = [0.05, 0.02, 0.05];
                    for d in 0..3 {
                        assert!((x[d] - c[d] - crate::dot(r[d], p)).abs() < 1e-14);
                    }
                }
            }
        }
        // The lower plate and the far boundary stand still, the blend is complementary.
        let [nx, ny, nz] = grid.shape();
        assert_eq!(grid.position(3, 4, 0)[2], grid.axes[2].nodes[0]);
        assert_eq!(grid.position(nx - 1, ny - 1, nz - 1)[2], grid.axes[2].nodes[nz - 1]);
        for k in grid.lower.hull.k[1]..=up.k[0] {
            assert!((grid.lower.carry.sideways[k] + grid.upper.carry.sideways[k] - 1.0).abs() < 1e-14);
        }
    }

    #[test]
    fn walls_stand_still_and_the_guarded_plate_moves_past_its_ring() {
        let plate = Plate { length_m: 0.1, width_m: 0.08, thickness_m: 0.002 };
        let pose = Pose { gap_m: 0.005, tilt_rad: 0.02, roll_rad: 0.01, shift_m: [0.0; 2] };
        let box_m = Clearances {
            hinge_side_m: Some(0.03),
            right_m: Some(0.02),
            above_m: Some(0.05),
            ..Default::default()
        };
        let arrangement = Arrangement {
            guard: Some(Guard { around: Which::Upper, slot_m: 0.001, rim_m: 0.01 }),
            film: Some(Film { thickness_m: 0.001, permittivity_ratio: 3.0 }),
            surroundings: Surroundings::GroundedBox(box_m),
            ..Arrangement::open(plate, plate, pose, Dimensions::Three)
        };
        let grid = Grid::new(&arrangement, 2, &GridOptions::suited(&arrangement)).unwrap();
        let ([nx, ny, nz], size) = (grid.shape(), arrangement.size_m());
        assert_eq!(size, 0.122);
        for (i, j, k) in [(0, 7, nz / 2), (nx / 2, ny - 1, nz / 2), (nx / 2, ny / 2, nz - 1)] {
            let at = [grid.axes[0].nodes[i], grid.axes[1].nodes[j], grid.axes[2].nodes[k]];
            assert_eq!(grid.position(i, j, k), at);
        }
        assert!((grid.axes[0].nodes[0] + 0.08 / size).abs() < 1e-15);
        assert!((grid.axes[2].nodes[nz - 1] - 0.05 / size).abs() < 1e-15);
        // The film does not bend, the ring is metal and does not move with the plate.
        let film = grid.film.unwrap().nodes;
        assert!((film.k[0]..=film.k[1]).all(|k| !grid.upper.carry.moves(k)));
        let [plate, ring] = [grid.upper.boxes[0], grid.upper.boxes[1]];
        let carry = grid.upper.plate_carry();
        let height = plate.k[0];
        assert_eq!(grid.upper.boxes.len(), 5);
        assert_eq!(carry.weights(plate.i[0], plate.j[1], height), [1.0; 3]);
        assert_eq!(carry.weights(ring.i[1], plate.j[0], height), [0.0; 3]);
        assert_eq!(grid.upper.carry.weights(ring.i[0], ring.j[1], height), [1.0; 3]);
        assert!(grid.upper.contains(ring.i[0], ring.j[0], height));
        assert!(!grid.upper.contains(plate.i[0] - 1, plate.j[0], height));
        assert_eq!(grid.permittivity([film.i[0], film.j[0], film.k[0]]), 3.0);
        assert_eq!(grid.permittivity([film.i[1], film.j[0], film.k[0]]), 1.0);
    }
}
