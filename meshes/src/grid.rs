//! The fitted grid: a tensor product of graded axes, bent so that the tilted plate lies on grid planes.
//!
//! In reference coordinates both plates are axis-parallel boxes. A node at xi stands in the room at
//! X = xi + B (R - I) P, where P is the point of the upper plate nearest to xi (relative to the plate's centre) and
//! the weight B is 0 on and below the lower plate, rises across the gap, is 1 through the upper plate and falls
//! linearly to 0 at the far boundary. The plate moves rigidly and nothing becomes a staircase.

use crate::{Arrangement, ArrangementError, Axis, Carry, Dimensions, Pose, Sideways, Surroundings, Vector3};

/// Nodes of a plate, first and last (both included) along each axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct NodeBox {
    /// Along x.
    pub i: [usize; 2],
    /// Along y.
    pub j: [usize; 2],
    /// Along z.
    pub k: [usize; 2],
}

impl NodeBox {
    /// Whether a node belongs to the plate.
    pub fn contains(&self, i: usize, j: usize, k: usize) -> bool {
        let within = |r: [usize; 2], v: usize| r[0] <= v && v <= r[1];
        within(self.i, i) && within(self.j, j) && within(self.k, k)
    }
}

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

/// A fitted grid of level q; lengths in units of the arrangement's size.
#[derive(Clone, Debug, PartialEq)]
pub struct Grid {
    /// Level of the family.
    pub q: usize,
    /// Axes x, y, z in reference coordinates.
    pub axes: [Axis; 3],
    /// Nodes of the lower plate.
    pub lower: NodeBox,
    /// Nodes of the upper plate.
    pub upper: NodeBox,
    /// Motion of the upper plate; it also bends the grid.
    pub upper_carry: Carry,
    /// Motion of the lower plate.
    pub lower_carry: Carry,
    /// Whether the grid is the half at y > 0 of a symmetric arrangement.
    pub half: bool,
}

/// A plate in reference coordinates, in units of the size.
struct Body {
    /// From and to along x, y, z.
    span: [[f64; 2]; 3],
    /// Centre of the facing surface.
    centre: Vector3,
}

impl Body {
    fn points(&self, axes: &[Axis; 3]) -> [Vec<f64>; 3] {
        [0, 1, 2].map(|d| {
            let [from, to] = self.span[d];
            axes[d].nodes.iter().map(|x| x.clamp(from, to) - self.centre[d]).collect()
        })
    }

    fn nodes(&self, axes: &[Axis; 3]) -> NodeBox {
        let [i, j, k] = [0, 1, 2].map(|d| self.span[d].map(|x| axes[d].nearest(x)));
        NodeBox { i, j, k }
    }
}

impl Grid {
    /// The grid of level `q` (1, 2, 3, ...) for an arrangement.
    ///
    /// # Errors
    /// What [`Arrangement::check`] finds wrong.
    pub fn new(arrangement: &Arrangement, q: usize, options: &GridOptions) -> Result<Grid, ArrangementError> {
        arrangement.check(options.sideways)?;
        let far = options.far;
        let size = arrangement.size_m();
        let three = arrangement.dimensions == Dimensions::Three;
        let (lower, upper, pose) = (&arrangement.lower, &arrangement.upper, &arrangement.pose);
        let [dx, dy] = pose.shift_m.map(|s| s / size);
        let gap = pose.gap_m / size;
        let span =
            |centre: f64, extent_m: f64| [centre - extent_m / size / 2.0, centre + extent_m / size / 2.0];
        let slab = [-0.5, 0.5];
        let thickness = [lower, upper].map(|p| p.thickness_m / size);
        let bodies = [
            Body {
                span: [
                    span(0.0, lower.length_m),
                    if three { span(0.0, lower.width_m) } else { slab },
                    [-thickness[0], 0.0],
                ],
                centre: [0.0; 3],
            },
            Body {
                span: [
                    span(dx, upper.length_m),
                    if three { span(dy, upper.width_m) } else { slab },
                    [gap, gap + thickness[1]],
                ],
                centre: [dx, dy, gap],
            },
        ];
        let half = arrangement.symmetric_in_y();
        let axes = match arrangement.surroundings {
            Surroundings::Open => {
                let edges = |d: usize| [bodies[0].span[d], bodies[1].span[d]].concat();
                [
                    Axis::lateral(&edges(0), q, false, far),
                    if three { Axis::lateral(&edges(1), q, half, far) } else { Axis::slab() },
                    Axis::vertical(thickness, gap, q, far),
                ]
            }
            Surroundings::InsulatedWalls => {
                let walled = |d: usize| {
                    let from = if d == 1 && half { 0.0 } else { bodies[0].span[d][0] };
                    Axis::walled(from, bodies[0].span[d][1], q)
                };
                [walled(0), if three { walled(1) } else { Axis::slab() }, Axis::gap_alone(gap, q)]
            }
        };
        let [mut lower_box, mut upper_box] = [0, 1].map(|b| bodies[b].nodes(&axes));
        if half {
            // The nearest node to a negative edge is the one on the symmetry plane.
            (lower_box.j[0], upper_box.j[0]) = (0, 0);
        }
        let z = &axes[2].nodes;
        let ramp = |z: f64, from: f64, to: f64| ((z - from) / (to - from)).clamp(0.0, 1.0);
        let ends = [z[0], z[z.len() - 1]];
        let fall = |z: f64, from: f64, to: f64| if to == from { 1.0 } else { 1.0 - ramp(z, from, to) };
        // Up through the gap, then down to the far boundary.
        let upper_fall = |z: f64| fall(z, bodies[1].span[2][1], ends[1]);
        let lower_fall = |z: f64| fall(z, bodies[0].span[2][0], ends[0]);
        let spread = |weight: &dyn Fn(f64) -> f64| z.iter().map(|&z| weight(z)).collect::<Vec<f64>>();
        let sideways = |b: f64| options.sideways.weight(b);
        let level = Pose { gap_m: 0.0, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
        let [lower_points, upper_points] = [0, 1].map(|b| bodies[b].points(&axes));
        Ok(Grid {
            q,
            lower: lower_box,
            upper: upper_box,
            lower_carry: Carry {
                sideways: spread(&|z| sideways(1.0 - ramp(z, 0.0, gap)) * lower_fall(z)),
                vertical: spread(&|z| (1.0 - ramp(z, 0.0, gap)) * lower_fall(z)),
                point: lower_points,
                rotation: level.rotation(),
            },
            upper_carry: Carry {
                sideways: spread(&|z| sideways(ramp(z, 0.0, gap)) * upper_fall(z)),
                vertical: spread(&|z| ramp(z, 0.0, gap) * upper_fall(z)),
                point: upper_points,
                rotation: pose.rotation(),
            },
            half,
            axes,
        })
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

    /// Numbers of the nodes of a plate.
    pub fn plate_nodes(&self, plate: &NodeBox) -> impl Iterator<Item = usize> + '_ {
        let NodeBox { i, j, k } = *plate;
        (i[0]..=i[1]).flat_map(move |i| {
            (j[0]..=j[1]).flat_map(move |j| (k[0]..=k[1]).map(move |k| self.index(i, j, k)))
        })
    }

    /// Where a node stands in the room.
    #[inline]
    pub fn position(&self, i: usize, j: usize, k: usize) -> Vector3 {
        let at = [self.axes[0].nodes[i], self.axes[1].nodes[j], self.axes[2].nodes[k]];
        let carry = &self.upper_carry;
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
    use crate::Plate;

    #[test]
    fn the_plate_is_rigid_and_its_edges_are_grid_lines() {
        let arrangement = Arrangement {
            lower: Plate { length_m: 0.2, width_m: 0.18, thickness_m: 0.0 },
            upper: Plate { length_m: 0.16, width_m: 0.2, thickness_m: 0.004 },
            pose: Pose { gap_m: 0.01, tilt_rad: 0.03, roll_rad: -0.02, shift_m: [0.01, 0.004] },
            surroundings: Surroundings::Open,
            dimensions: Dimensions::Three,
        };
        let grid = Grid::new(&arrangement, 2, &GridOptions::suited(&arrangement)).unwrap();
        assert!(!grid.half);
        let r = arrangement.pose.rotation();
        let up = grid.upper;
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
        for k in grid.lower.k[1]..=grid.upper.k[0] {
            assert!((grid.lower_carry.sideways[k] + grid.upper_carry.sideways[k] - 1.0).abs() < 1e-14);
        }
    }
}
