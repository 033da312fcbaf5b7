//! The field strength in the cells of a solved level.
//!
//! A cell has one value, also next to a sheet, on whose two sides the field is not the same.

use rayon::prelude::*;
use tiltgap_meshes::{dot, Vector3};

use crate::corner::{cross, minus};
use crate::level::Level;

/// The field strength -grad phi in every cell, for these potentials of the lower and the upper plate: the mean of its
/// corners by volume. Cell (i, j, k) has the number (i (ny - 1) + j)(nz - 1) + k; volts over the unit of length of the
/// grid, in the directions x, y, z.
pub fn cell_field(level: &Level, plates_v: [f64; 2]) -> Vec<Vector3> {
    let grid = &level.grid;
    let [nx, ny, nz] = grid.shape();
    let cell = |i: usize, j: usize, k: usize| {
        let node = |s: [usize; 3]| (i + s[0], j + s[1], k + s[2]);
        let at = |s: [usize; 3]| {
            let (i, j, k) = node(s);
            let phi = level.phi[grid.index(i, j, k)];
            (grid.position(i, j, k), phi[0] * plates_v[0] + phi[1] * plates_v[1])
        };
        let (mut sum, mut volume) = ([0.0; 3], 0.0);
        for corner in 0..8usize {
            let s = [corner >> 2, (corner >> 1) & 1, corner & 1];
            // Edges of the cell that meet at the corner, and the differences of potential along them.
            let edge = |l: usize| {
                let [mut low, mut high] = [s; 2];
                (low[l], high[l]) = (0, 1);
                let (a, b) = (at(low), at(high));
                (minus(b.0, a.0), b.1 - a.1)
            };
            let e = [edge(0), edge(1), edge(2)];
            // Gradient times determinant.
            let normals = [cross(e[1].0, e[2].0), cross(e[2].0, e[0].0), cross(e[0].0, e[1].0)];
            volume += dot(e[0].0, normals[0]);
            for l in 0..3 {
                for d in 0..3 {
                    sum[d] -= e[l].1 * normals[l][d];
                }
            }
        }
        sum.map(|v| v / volume)
    };
    let plane = |i: usize| {
        let mut plane = Vec::with_capacity((ny - 1) * (nz - 1));
        for j in 0..ny - 1 {
            plane.extend((0..nz - 1).map(|k| cell(i, j, k)));
        }
        plane
    };
    (0..nx - 1).into_par_iter().flat_map_iter(plane).collect()
}
