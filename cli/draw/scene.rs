//! What there is to see of a solved bench in a cross-section: plates and potential, in millimetres and volts.

use tiltgap_meshes::{Arrangement, Dimensions, NodeBox, Plate};
use tiltgap_solver::{Level, Section};

use crate::assess::Setup;

/// Millimetres in a metre.
pub const MM: f64 = 1e3;

/// Pictures are drawn on a finer grid: cells far from the plates are so wide that their corners would show. Parts of a cell
/// at most, and the level at which nothing shows any more.
const MOST_PARTS: usize = 4;
const FINE_ENOUGH: usize = 48;

/// A plate in the plane of a section: its corners in mm (x, z), counted along the facing surface first, then back along the
/// other; the two surfaces of a sheet coincide.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Outline {
    /// Facing surface from -x to +x, other surface from +x to -x.
    pub corners: [[f64; 2]; 4],
    /// Direction away from the gap, of length 1.
    pub away: [f64; 2],
}

/// Nodes of a plate in the section: first and last along x, and along z.
pub type PlateNodes = [[usize; 2]; 2];

/// A solved bench in a plane y = constant.
pub struct Scene<'a> {
    /// The bench.
    pub setup: &'a Setup,
    /// The plane, in mm; meaningless in a cross-section per metre.
    pub y_mm: f64,
    /// Nodes along x and z of the fitted grid; node (i, k) has the number i nz + k.
    pub shape: [usize; 2],
    /// Where nodes stand, in mm (x, z).
    pub points: Vec<[f64; 2]>,
    /// Potential of the nodes, in V.
    pub potential: Vec<f64>,
    /// Potentials of the lower and the upper plate, in V.
    pub plates_v: [f64; 2],
    /// Lower and upper plate, if they are in the plane.
    pub outlines: [Option<Outline>; 2],
    /// Their nodes.
    pub nodes: [PlateNodes; 2],
    /// Numbers along x of the nodes that the level itself has.
    pub columns: Vec<usize>,
}

/// Where the plane of the pictures lies: through the middle of the overlap, or of the upper plate if there is none. In m.
pub fn plane_m(arrangement: &Arrangement) -> f64 {
    let y = arrangement.overlap().y;
    match arrangement.dimensions {
        Dimensions::Two => 0.0,
        Dimensions::Three if y[0] < y[1] => 0.5 * (y[0] + y[1]),
        Dimensions::Three => arrangement.pose.shift_m[1],
    }
}

impl Outline {
    /// The lower and the upper plate in the plane `y_m`, as far as they reach into it.
    pub fn both(arrangement: &Arrangement, y_m: f64) -> [Option<Outline>; 2] {
        [
            Outline::new(&arrangement.lower, arrangement, false, y_m),
            Outline::new(&arrangement.upper, arrangement, true, y_m),
        ]
    }

    fn new(plate: &Plate, arrangement: &Arrangement, upper: bool, y_m: f64) -> Option<Outline> {
        let level = tiltgap_meshes::Pose { tilt_rad: 0.0, roll_rad: 0.0, ..arrangement.pose };
        let r = if upper { arrangement.pose } else { level }.rotation();
        let c = if upper { arrangement.pose.centre_m() } else { [0.0; 3] };
        let outside = if upper { plate.thickness_m } else { -plate.thickness_m };
        let half = plate.length_m / 2.0;
        let mut corners = [[0.0; 2]; 4];
        for (n, (px, pz)) in
            [(-half, 0.0), (half, 0.0), (half, outside), (-half, outside)].into_iter().enumerate()
        {
            // The point of the edge that lies in the plane.
            let py = (y_m - c[1] - r[1][0] * px - r[1][2] * pz) / r[1][1];
            if arrangement.dimensions == Dimensions::Three && py.abs() > plate.width_m / 2.0 {
                return None;
            }
            corners[n] = [0, 2].map(|d| MM * (c[d] + r[d][0] * px + r[d][1] * py + r[d][2] * pz));
        }
        let along = [corners[1][0] - corners[0][0], corners[1][1] - corners[0][1]];
        let length = along[0].hypot(along[1]);
        let sign = if upper { 1.0 } else { -1.0 };
        Some(Outline { corners, away: [-sign * along[1] / length, sign * along[0] / length] })
    }
}

impl<'a> Scene<'a> {
    /// The plane through the middle of the plates.
    pub fn new(setup: &'a Setup, level: &Level) -> Scene<'a> {
        let arrangement = &setup.question.arrangement;
        let size_m = arrangement.size_m();
        let y_m = plane_m(arrangement);
        let parts = (FINE_ENOUGH / level.grid.q).clamp(1, MOST_PARTS);
        let (section, columns) = Section::new(level, y_m / size_m).refined(&level.grid, parts);
        let voltage = setup.question.voltage_v;
        let plates_v = setup.question.connection.potentials(level).map(|u| u * voltage);
        let plate = |b: &NodeBox| [b.i.map(|i| columns[0][i]), b.k.map(|k| columns[1][k])];
        Scene {
            setup,
            y_mm: MM * y_m,
            shape: section.shape,
            points: section.points.iter().map(|p| p.map(|x| MM * size_m * x)).collect(),
            potential: section.potential(plates_v),
            plates_v,
            outlines: Outline::both(arrangement, y_m),
            nodes: [plate(level.grid.lower.plate()), plate(level.grid.upper.plate())],
            columns: columns[0].clone(),
        }
    }

    /// Number of a node.
    pub fn index(&self, i: usize, k: usize) -> usize {
        i * self.shape[1] + k
    }

    /// Smallest rectangle around the plates that are in the plane, in mm: from and to, along x and z.
    pub fn extent(&self) -> [[f64; 2]; 2] {
        let mut extent = [[f64::INFINITY, f64::NEG_INFINITY]; 2];
        for corner in self.outlines.iter().flatten().flat_map(|o| o.corners) {
            for d in 0..2 {
                extent[d] = [extent[d][0].min(corner[d]), extent[d][1].max(corner[d])];
            }
        }
        extent
    }
}
