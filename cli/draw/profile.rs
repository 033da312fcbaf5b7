//! Charge along a plate in the plane of the pictures, on each of its two sides.

use tiltgap_meshes::Vector3;
use tiltgap_solver::{surface_charge, Level, EPS0};

use super::scene::{Scene, MM};

/// One plate along x, node by node, both edges included.
#[derive(Clone, Debug, PartialEq)]
pub struct Profile {
    /// Numbers of the nodes along x in the scene.
    pub columns: Vec<usize>,
    /// Where the nodes stand, in mm.
    pub x_mm: Vec<f64>,
    /// Charge density in C/m^2 on the side towards -z and on that towards +z. At the two edges, where the density has no
    /// bound, it is the mean over half a cell.
    pub density: [Vec<f64>; 2],
    /// What the rims at -x and +x bear, in C/m^2 times mm; zero for a sheet.
    pub rims: [f64; 2],
    /// Length of the plate that belongs to a node, in mm.
    pub share_mm: Vec<f64>,
}

/// Lower and upper plate of a solved bench.
pub fn profiles(scene: &Scene, level: &Level) -> [Profile; 2] {
    let question = &scene.setup.question;
    let size_m = question.arrangement.size_m();
    let to_si = EPS0 * question.relative_permittivity / size_m;
    let grid = &level.grid;
    [*grid.lower.plate(), *grid.upper.plate()].map(|plate| {
        let charge = surface_charge(level, &plate);
        let ny = charge.shape[1];
        // The row of nodes nearest to the plane.
        let y = &grid.axes[1].nodes[plate.j[0]..=plate.j[1]];
        let off = |j: &usize| (y[*j] * MM * size_m - scene.y_mm).abs();
        let row = (0..ny).min_by(|a, b| off(a).total_cmp(&off(b))).unwrap_or(0);
        let columns: Vec<usize> = (0..charge.shape[0]).map(|i| i * ny + row).collect();
        let on = |face: usize| -> Vec<f64> {
            let at = |c: &usize| {
                let q: f64 = (0..2).map(|p| charge.charge[*c][face][p] * scene.plates_v[p]).sum();
                to_si * q / charge.area[*c]
            };
            columns.iter().map(at).collect()
        };
        let position = |i: usize| -> Vector3 { grid.position(i, plate.j[0] + row, plate.k[0]) };
        let x_mm: Vec<f64> = (plate.i[0]..=plate.i[1]).map(|i| MM * size_m * position(i)[0]).collect();
        let x = &grid.axes[0].nodes;
        let cell = |i: usize| if i < plate.i[1] { x[i + 1] - x[i] } else { 0.0 };
        let before = |i: usize| if i > plate.i[0] { x[i] - x[i - 1] } else { 0.0 };
        let share_mm: Vec<f64> =
            (plate.i[0]..=plate.i[1]).map(|i| MM * size_m * 0.5 * (cell(i) + before(i))).collect();
        let rim = on(1);
        let rims = [0, rim.len() - 1].map(|n| rim[n] * share_mm[n]);
        Profile {
            columns: scene.columns[plate.i[0]..=plate.i[1]].to_vec(),
            x_mm,
            density: [on(0), on(2)],
            rims,
            share_mm,
        }
    })
}
