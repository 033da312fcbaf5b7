//! The preconditioner: the untilted bench solved exactly.
//!
//! On the untilted grid the operator is separable, A0 = Dx.My.Mz + Mx.Dy.Mz + Mx.My.Dz. Modes along x and y leave
//! one tridiagonal system along z for each pair of modes (fast diagonalisation [Lynch1964]). The plates, where the
//! potential is given, are held by charges on their nodes (capacitance-matrix method [Buzbee1971]): with R picking the
//! plate nodes, u = A0^-1 (r - R^T lambda), and lambda such that R u = 0. One forward and one backward transform
//! serve both solves with A0.

use ndarray::{Array3, ArrayView2, ArrayViewMut2, Axis as Direction};
use rayon::prelude::*;
use tiltgap_meshes::{Axis, End, Grid};

use crate::cg::Preconditioner;
use crate::field::Field;
use crate::hold::Hold;
use crate::modes::Modes;
use crate::stack::{Ladder, Stack};
use crate::Error;

/// Columns in a chunk of the transform along x.
const COLUMNS: usize = 256;

/// Tridiagonal systems along z, one for each pair of modes, factored.
pub struct Columns {
    /// Reciprocal pivots, `[mode along x][node along z][mode along y]`.
    pivots: Array3<f64>,
    /// Off-diagonal of the stiffness along z.
    off: Vec<f64>,
}

impl Columns {
    /// `pinned` is added to both ends along z.
    fn new(x: &Modes, y: &Modes, z: &Ladder, pinned: f64) -> Columns {
        let nz = z.rungs.len() + 1;
        let mut pivots = Array3::zeros((x.len(), nz, y.len()));
        pivots.axis_iter_mut(Direction(0)).into_par_iter().enumerate().for_each(|(a, mut slab)| {
            let mut last = vec![0.0; y.len()];
            for (k, mut row) in slab.axis_iter_mut(Direction(0)).enumerate() {
                let below = k.checked_sub(1).map(|cell| (z.rungs[cell], z.halves[cell])).unwrap_or_default();
                let above = z.rungs.get(k).map(|&rung| (rung, z.halves[k])).unwrap_or_default();
                let end = match k {
                    0 => pinned + z.ends[0].stiffness(),
                    k if k + 1 == nz => pinned + z.ends[1].stiffness(),
                    _ => 0.0,
                };
                for ((pivot, last), lambda) in row.iter_mut().zip(&mut last).zip(&y.values) {
                    let mass = below.1 + above.1;
                    // Where the potential is given the stiffness is infinite, and the pivot vanishes.
                    *last = 1.0
                        / (end + below.0 + above.0 + (x.values[a] + lambda) * mass
                            - below.0 * below.0 * *last);
                    *pivot = *last;
                }
            }
        });
        Columns { pivots, off: z.rungs.iter().map(|rung| -rung).collect() }
    }

    /// Solves for mode `a` along x in place; row k holds node k along z, `K` right-hand sides by modes along y. The
    /// solution is made from the top down to node `lowest`; below it the rows are left half-way.
    fn solve(&self, a: usize, rows: &mut [f64], right_sides: usize, lowest: usize) {
        let pivots = self.pivots.index_axis(Direction(0), a);
        let (nz, ny) = pivots.dim();
        let width = right_sides * ny;
        let row = |k: usize| pivots.row(k).to_slice().expect("rows of the pivots are contiguous");
        for k in 0..nz {
            let (before, here) = rows.split_at_mut(k * width);
            let last = if k > 0 { &before[(k - 1) * width..] } else { &[][..] };
            for r in 0..right_sides {
                let part = r * ny..(r + 1) * ny;
                let here = &mut here[part.clone()];
                if k > 0 {
                    let (off, last) = (self.off[k - 1], &last[part]);
                    for ((u, &p), &l) in here.iter_mut().zip(row(k)).zip(last) {
                        *u = (*u - off * l) * p;
                    }
                } else {
                    for (u, &p) in here.iter_mut().zip(row(k)) {
                        *u *= p;
                    }
                }
            }
        }
        for k in (lowest..nz - 1).rev() {
            let (here, above) = rows[k * width..].split_at_mut(width);
            let off = self.off[k];
            for r in 0..right_sides {
                let part = r * ny..(r + 1) * ny;
                for ((u, &p), &v) in here[part.clone()].iter_mut().zip(row(k)).zip(&above[part]) {
                    *u -= off * p * v;
                }
            }
        }
    }
}

/// The untilted bench with its plates held at zero, ready to be solved.
pub struct Separable {
    shape: [usize; 3],
    x: Modes,
    y: Modes,
    columns: Columns,
    hold: Hold,
    fixed: Vec<bool>,
    /// Transformed fields, kept between applications: `[mode along x][the rest]`.
    buffers: [Vec<f64>; 2],
}

impl Separable {
    /// Prepares the solve: modes, pivots, and the modal matrices of the plates. `fixed` marks the plate nodes;
    /// `inner_tolerance` is the relative accuracy of the inner iteration.
    pub fn new(grid: &Grid, fixed: &[bool], inner_tolerance: f64) -> Separable {
        let axes = [0, 1].map(|d| softened(grid, d));
        let [x, y] = [0, 1].map(|d| Modes::new(&axes[d]));
        let ladder = Ladder::new(grid);
        // Nothing pins the potential of a closed box, so A0 would be singular. Its floor and ceiling are the plates, which
        // are held: any value there gives the same answer.
        let closed = grid.axes.iter().all(|axis| axis.ends == [End::Natural; 2]);
        let pinned = if closed { 1.0 } else { 0.0 };
        let columns = Columns::new(&x, &y, &ladder, pinned);
        let bodies = [&grid.lower, &grid.upper];
        let stack = Stack::new(&ladder, bodies.map(|b| b.hull.k), [&x.values, &y.values], pinned);
        let hold = Hold::new(bodies, [&axes[0], &axes[1]], [&x, &y], &ladder, stack, inner_tolerance);
        let buffers = [0, 1].map(|_| Vec::new());
        Separable { shape: grid.shape(), x, y, columns, hold, fixed: fixed.to_vec(), buffers }
    }
}

/// The lateral axis on which the untilted bench is solved. In a cross-section its cells are stretched by rho^-1/2, where
/// rho is the local gap over the centre gap: true conductances go with 1/rho across the gap, with rho along it and not
/// at all outside, so that this halves the spread of the ratio between the two operators on a logarithmic scale
/// (measured at an edge gap of 1 % of the centre gap: 263 iterations become 73). In space the regions beside the plates
/// undo the gain, and the axes stay as they are.
fn softened(grid: &Grid, direction: usize) -> Axis {
    let axis = &grid.axes[direction];
    if !grid.is_cross_section() {
        return axis.clone();
    }
    let (carry, z) = (&grid.upper.carry, &grid.axes[2].nodes);
    let film = grid.film.map_or(grid.lower.hull.k[1], |f| f.nodes.k[1]);
    let gap = z[grid.upper.hull.k[0]] - z[film];
    let rho: Vec<f64> =
        carry.point[direction].iter().map(|p| 1.0 + carry.rotation[2][direction] * p / gap).collect();
    let mut nodes = vec![axis.nodes[0]];
    for (k, h) in axis.cells().into_iter().enumerate() {
        nodes.push(nodes[k] + h / (0.5 * (rho[k] + rho[k + 1])).sqrt());
    }
    Axis { nodes, ..axis.clone() }
}

/// The transform along x of all columns, in parallel over chunks of them.
fn along_x(
    from: &[f64],
    to: &mut [f64],
    width: usize,
    transform: impl Fn(ArrayView2<f64>, ArrayViewMut2<f64>) + Sync,
) {
    let from = ArrayView2::from_shape((from.len() / width, width), from).expect("rows of the width");
    let mut to = ArrayViewMut2::from_shape((to.len() / width, width), to).expect("rows of the width");
    to.axis_chunks_iter_mut(Direction(1), COLUMNS)
        .into_par_iter()
        .zip(from.axis_chunks_iter(Direction(1), COLUMNS).into_par_iter())
        .for_each(|(to, from)| transform(from, to));
}

impl<const K: usize> Preconditioner<K> for Separable {
    fn apply(&mut self, r: &[[f64; K]], z: &mut Field<K>) -> Result<usize, Error> {
        let [_, nodes_along_y, nz] = self.shape;
        let Separable { x, y, columns, hold, fixed, buffers, .. } = self;
        // Transformed along x, and along x and y: what belongs to one mode along x.
        let (ny, half_way, slab) = (y.len(), nodes_along_y * nz * K, y.len() * nz * K);
        let (first, second) = buffers.split_at_mut(1);
        let (first, second) = (&mut first[0], &mut second[0]);
        first.resize(x.len() * half_way, 0.0);
        second.resize(x.len() * slab, 0.0);
        along_x(r.as_flattened(), first, half_way, |from, to| x.transform.forward(from, to));
        let planes = hold.planes();
        let lowest = planes[0];
        let nodal_dim = (nodes_along_y, nz * K);
        // Per mode along x: transform along y to rows (z, right-hand side) by modes, solve, keep the plate planes.
        let kept: Vec<Vec<f64>> = first
            .par_chunks(half_way)
            .zip(second.par_chunks_mut(slab))
            .enumerate()
            .map_init(
                || vec![0.0; slab],
                |scratch, (a, (nodal, modal))| {
                    let nodal = ArrayView2::from_shape(nodal_dim, nodal).expect("a slab");
                    let rows = ArrayViewMut2::from_shape((nz * K, ny), modal).expect("a slab");
                    y.transform.forward(nodal, rows.reversed_axes());
                    scratch.copy_from_slice(modal);
                    columns.solve(a, scratch, K, lowest);
                    let of =
                        |r: usize| planes.iter().flat_map(move |k| (k * K + r) * ny..(k * K + r + 1) * ny);
                    (0..K).flat_map(of).map(|n| scratch[n]).collect()
                },
            )
            .collect();
        let (charges, iterations) = hold.charges::<K>(&kept)?;
        second.par_chunks_mut(slab).zip(first.par_chunks_mut(half_way)).enumerate().for_each(
            |(a, (modal, nodal))| {
                let mut charges = charges[a].chunks_exact(ny);
                for r in 0..K {
                    for (k, charges) in planes.iter().zip(&mut charges) {
                        let row = &mut modal[(k * K + r) * ny..(k * K + r + 1) * ny];
                        row.iter_mut().zip(charges).for_each(|(v, c)| *v -= c);
                    }
                }
                columns.solve(a, modal, K, 0);
                let rows = ArrayView2::from_shape((nz * K, ny), &*modal).expect("a slab");
                let nodal = ArrayViewMut2::from_shape(nodal_dim, nodal).expect("a slab");
                y.transform.backward(rows.reversed_axes(), nodal);
            },
        );
        along_x(first, z.as_flattened_mut(), half_way, |from, to| x.transform.backward(from, to));
        z.par_iter_mut().zip(fixed.par_iter()).for_each(|(z, &fixed)| {
            if fixed {
                *z = [0.0; K];
            }
        });
        Ok(iterations)
    }
}
