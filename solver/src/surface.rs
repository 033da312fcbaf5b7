//! The charge on the two faces of a plate, node by node.
//!
//! The charge of a fixed node is the derivative of the discrete energy with respect to its potential. Each corner
//! belongs to a cell above, below or beside the plate, so that the charge splits by face; the sum of all of it is the
//! charge of the capacitance matrix to rounding.

use tiltgap_meshes::NodeBox;

use crate::corner::{cell, differences, for_each_octant, positions, Star};
use crate::level::Level;

/// Charge of the columns of nodes of a plate; lengths in units of the size, permittivity 1.
#[derive(Clone, Debug, PartialEq)]
pub struct SurfaceCharge {
    /// Columns along x and y; column (i, j), counted from the plate's first node, has the number i ny + j.
    pub shape: [usize; 2],
    /// Area of the plate that belongs to a column; on a mirrored grid that at y > 0 alone.
    pub area: Vec<f64>,
    /// Charge of a column for 1 V on the lower and on the upper plate, on the face towards -z, on the rim and on the
    /// face towards +z. A sheet has no rim.
    pub charge: Vec<[[f64; 2]; 3]>,
}

/// The charge on a plate of a solved level.
///
/// Cost: one pass over the planes of nodes that hold the plate.
pub fn surface_charge(level: &Level, plate: &NodeBox) -> SurfaceCharge {
    let grid = &level.grid;
    let shape @ [nx, ny, nz] = grid.shape();
    let stride = [ny * nz, nz, 1];
    let columns = [plate.i, plate.j].map(|r| r[1] - r[0] + 1);
    let mut charge = vec![[[0.0; 2]; 3]; columns[0] * columns[1]];
    // The corners of a node and of its neighbours are those whose energy depends on it.
    let near = |r: [usize; 2], n: usize| r[0].saturating_sub(1)..=(r[1] + 1).min(n - 1);
    for i in near(plate.i, nx) {
        let planes = [i.checked_sub(1), Some(i), (i + 1 < nx).then_some(i + 1)];
        let planes = planes.map(|i| i.map(|i| positions(grid, i)));
        let planes = [planes[0].as_ref(), planes[1].as_ref(), planes[2].as_ref()];
        for j in near(plate.j, ny) {
            for k in near(plate.k, nz) {
                let (at, node) = ([i, j, k], grid.index(i, j, k));
                let star = Star::new(differences(planes, j, k, [ny, nz]));
                for_each_octant(at, shape, |s| {
                    let above = k + s[2]; // the plane above the cell
                    let face = if above > plate.k[1] { 2 } else { usize::from(above > plate.k[0]) };
                    let permittivity = grid.permittivity(cell(at, s));
                    let normals = star.normals(s);
                    let inverse = 1.0 / star.determinant(s);
                    // Ends of the edge along each axis, and the difference of both potentials along it.
                    let low = |l: usize| node - stride[l] * (1 - s[l]);
                    let mut g = [[0.0; 3]; 2];
                    for l in 0..3 {
                        let (a, b) = (level.phi[low(l)], level.phi[low(l) + stride[l]]);
                        for c in 0..2 {
                            for d in 0..3 {
                                g[c][d] += (b[c] - a[c]) * normals[l][d] * inverse;
                            }
                        }
                    }
                    for l in 0..3 {
                        let flux = [0, 1].map(|c| permittivity * tiltgap_meshes::dot(g[c], normals[l]) / 8.0);
                        for (side, sign) in [(0, -1.0), (1, 1.0)] {
                            let mut end = at;
                            end[l] = end[l] + s[l] + side - 1;
                            if plate.contains(end[0], end[1], end[2]) {
                                let column = (end[0] - plate.i[0]) * columns[1] + end[1] - plate.j[0];
                                for c in 0..2 {
                                    charge[column][face][c] += sign * flux[c];
                                }
                            }
                        }
                    }
                });
            }
        }
    }
    let masses = |d: usize, r: [usize; 2]| {
        let x = &grid.axes[d].nodes[r[0]..=r[1]];
        let cell = |n: usize| if n + 1 < x.len() { x[n + 1] - x[n] } else { 0.0 };
        (0..x.len()).map(|n| 0.5 * (cell(n) + if n > 0 { cell(n - 1) } else { 0.0 })).collect::<Vec<f64>>()
    };
    let (mx, my) = (masses(0, plate.i), masses(1, plate.j));
    let area = mx.iter().flat_map(|a| my.iter().map(move |b| a * b)).collect();
    SurfaceCharge { shape: columns, area, charge }
}
