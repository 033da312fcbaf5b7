//! A plane y = constant through a solved level: node positions and potentials on a grid that is fitted to the plates.
//!
//! Along y the nodes of a column are interpolated linearly, positions and potentials alike, so that the points lie
//! exactly in the plane and the plates, which are flat, exactly where they are.

use rayon::prelude::*;
use tiltgap_meshes::{Grid, Stencil};

use crate::level::Level;

/// A field on the nodes of a plane; lengths in units of the arrangement's size.
#[derive(Clone, Debug, PartialEq)]
pub struct Section {
    /// The plane, y = this.
    pub y: f64,
    /// Nodes along x and z; node (i, k) has the number i nz + k.
    pub shape: [usize; 2],
    /// Positions (x, z) of the nodes.
    pub points: Vec<[f64; 2]>,
    /// Potentials of the nodes for 1 V on the lower (first) and on the upper plate (second), the other at 0 V.
    pub phi: Vec<[f64; 2]>,
}

impl Section {
    /// The plane at `y`, in units of the size. On a grid that is mirrored at y = 0, `-y` and `y` are the same.
    ///
    /// Cost: one pass over the nodes.
    pub fn new(level: &Level, y: f64) -> Section {
        let grid = &level.grid;
        let [nx, ny, nz] = grid.shape();
        let y = if grid.half { y.abs() } else { y };
        let mut section = Section {
            y,
            shape: [nx, nz],
            points: Vec::with_capacity(nx * nz),
            phi: Vec::with_capacity(nx * nz),
        };
        for i in 0..nx {
            for k in 0..nz {
                // The cell of the column in which the plane lies.
                let above = (1..ny - 1).find(|&j| grid.position(i, j, k)[1] >= y).unwrap_or(ny - 1);
                let [a, b] = [above - 1, above].map(|j| grid.position(i, j, k));
                let [fa, fb] = [above - 1, above].map(|j| level.phi[grid.index(i, j, k)]);
                let t = (y - a[1]) / (b[1] - a[1]);
                let mix = |a: f64, b: f64| a + t * (b - a);
                section.points.push([mix(a[0], b[0]), mix(a[2], b[2])]);
                section.phi.push([mix(fa[0], fb[0]), mix(fa[1], fb[1])]);
            }
        }
        section
    }

    /// The same on a grid whose cells are cut into `parts` along x and z, by cubic interpolation: for pictures, where the
    /// corners of wide cells would show. `grid` is that of the section. Also returned: the new numbers of the old nodes
    /// along x and along z.
    ///
    /// # Panics
    /// If `grid` is another grid.
    pub fn refined(&self, grid: &Grid, parts: usize) -> (Section, [Vec<usize>; 2]) {
        let [sx, sz] = [0, 2].map(|d| grid.axes[d].subdivided(parts));
        assert_eq!(self.shape, [grid.axes[0].len(), grid.axes[2].len()], "a section of another grid");
        let old = |stencils: &[Stencil]| (0..stencils.len()).filter(|&n| stencils[n].count == 1).collect();
        let row = |i: usize| -> Vec<[f64; 4]> {
            let node = |k: usize| {
                let mut sum = [0.0; 4];
                for (m, u) in sx[i].weights[..sx[i].count].iter().enumerate() {
                    for (n, v) in sz[k].weights[..sz[k].count].iter().enumerate() {
                        let at = self.index(sx[i].first + m, sz[k].first + n);
                        let ([x, z], [a, b]) = (self.points[at], self.phi[at]);
                        for (sum, value) in sum.iter_mut().zip([x, z, a, b]) {
                            *sum += u * v * value;
                        }
                    }
                }
                sum
            };
            (0..sz.len()).map(node).collect()
        };
        let rows: Vec<[f64; 4]> = (0..sx.len()).into_par_iter().flat_map_iter(row).collect();
        let section = Section {
            y: self.y,
            shape: [sx.len(), sz.len()],
            points: rows.iter().map(|r| [r[0], r[1]]).collect(),
            phi: rows.iter().map(|r| [r[2], r[3]]).collect(),
        };
        (section, [old(&sx), old(&sz)])
    }

    /// Number of a node.
    pub fn index(&self, i: usize, k: usize) -> usize {
        i * self.shape[1] + k
    }

    /// The potential of all nodes in volts, for these potentials of the lower and the upper plate.
    pub fn potential(&self, plates_v: [f64; 2]) -> Vec<f64> {
        self.phi.iter().map(|p| p[0] * plates_v[0] + p[1] * plates_v[1]).collect()
    }
}
