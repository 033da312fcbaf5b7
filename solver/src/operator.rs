//! The discrete energy as a sparse matrix.
//!
//! W(phi) = sum over cells and their corners of volume/2 |g|^2 is a quadratic form; its second derivative is the
//! symmetric positive matrix A, so that C = phi^T A phi. On the untilted grid A is the usual 7-point stencil; a tilt
//! adds neighbours across the corners of the coordinate planes (19 points at most, zeros are left out).
//!
//! A far boundary contributes n.r/|r|^2 phi (Robin): exact for the field of a charge in space and of a pair of
//! opposite line charges in the plane.

use rayon::prelude::*;
use sprs::CsMatI;
use tiltgap_meshes::{dot, Dimensions, End, Grid, Vector3};

use crate::corner::{cross, differences, minus, octants, positions, Corner, Plane};
use crate::field::{in_order, Field};

/// Sparse matrix with 32-bit columns.
pub type Matrix = CsMatI<f64, u32, usize>;

/// Rows in a chunk of the parallel product.
const ROWS: usize = 2048;

/// Pairs of axes that a tilt couples.
const PAIRS: [[usize; 2]; 3] = [[0, 1], [0, 2], [1, 2]];

/// The energy of the corners at one node: with the differences delta to the six neighbours (from the node outwards)
/// it is 1/2 (sum of `edge` delta^2) + sum of `pair` delta delta'.
#[derive(Clone, Copy, Default)]
struct NodeEnergy {
    /// `[axis][side]`
    edge: [[f64; 2]; 3],
    /// `[pair of axes][side of the first][side of the second]`
    pair: [[[f64; 2]; 2]; 3],
}

/// The assembled operator of one grid.
#[derive(Clone, Debug)]
pub struct Operator {
    /// A, symmetric; rows and columns are the nodes of the grid.
    pub matrix: Matrix,
}

/// Energies of the nodes of the middle plane; none if a cell is folded.
fn plane_energy(
    planes: [Option<&Plane<Vector3>>; 3],
    i: usize,
    shape: [usize; 3],
) -> Option<Plane<NodeEnergy>> {
    let [_, ny, nz] = shape;
    let mut energies = Vec::with_capacity(ny * nz);
    for j in 0..ny {
        for k in 0..nz {
            let edges = differences(planes, j, k, [ny, nz]);
            let mut energy = NodeEnergy::default();
            for s in octants([i, j, k], shape) {
                let corner = Corner::new(&[edges[0][s[0]], edges[1][s[1]], edges[2][s[2]]])?;
                let g = &corner.reciprocal;
                for l in 0..3 {
                    energy.edge[l][s[l]] += corner.volume * dot(g[l], g[l]);
                }
                for (p, [l, m]) in PAIRS.into_iter().enumerate() {
                    // Differences are taken from the node outwards: a neighbour below turns the sign.
                    let sign = if s[l] == s[m] { 1.0 } else { -1.0 };
                    energy.pair[p][s[l]][s[m]] += sign * corner.volume * dot(g[l], g[m]);
                }
            }
            energies.push(energy);
        }
    }
    Some(energies)
}

/// Position of a neighbour in a 3 x 3 x 3 block: steps -1, 0, 1 along the axes become a number 0 to 26.
fn slot(step: [isize; 3]) -> usize {
    (9 * (step[0] + 1) + 3 * (step[1] + 1) + step[2] + 1) as usize
}

/// The row of node (i, j, k): its 27 possible entries, from the energies of three planes.
fn row(planes: [Option<&Plane<NodeEnergy>>; 3], at: [usize; 3], shape: [usize; 3]) -> [f64; 27] {
    let [_, ny, nz] = shape;
    let step = |axis: usize, side: usize| {
        let mut s = [0isize; 3];
        s[axis] = 2 * side as isize - 1;
        s
    };
    let exists = |axis: usize, side: usize| if side == 0 { at[axis] > 0 } else { at[axis] + 1 < shape[axis] };
    let energy = |s: [isize; 3]| {
        let here = (at[1] as isize + s[1]) * nz as isize + at[2] as isize + s[2];
        debug_assert!((at[1] as isize + s[1]) < ny as isize);
        planes[(1 + s[0]) as usize].map(|plane| plane[here as usize]).unwrap_or_default()
    };
    let plus = |a: [isize; 3], b: [isize; 3]| [a[0] + b[0], a[1] + b[1], a[2] + b[2]];
    let mut entries = [0.0; 27];
    let own = energy([0; 3]);
    let centre = slot([0; 3]);
    for axis in 0..3 {
        for side in (0..2).filter(|&side| exists(axis, side)) {
            let to = step(axis, side);
            let other = energy(to);
            let weight = own.edge[axis][side] + other.edge[axis][1 - side];
            entries[centre] += weight;
            entries[slot(to)] -= weight;
            // The corners at that neighbour in which this node is the end of an edge.
            for (p, [l, m]) in PAIRS.into_iter().enumerate().filter(|(_, pair)| pair.contains(&axis)) {
                let across = if axis == l { m } else { l };
                for turn in 0..2 {
                    let sides = if axis == l { [1 - side, turn] } else { [turn, 1 - side] };
                    let coupling = other.pair[p][sides[0]][sides[1]];
                    if coupling != 0.0 {
                        entries[slot(to)] -= coupling;
                        entries[slot(plus(to, step(across, turn)))] += coupling;
                    }
                }
            }
        }
    }
    for (p, [l, m]) in PAIRS.into_iter().enumerate() {
        for sl in 0..2 {
            for sm in 0..2 {
                let coupling = own.pair[p][sl][sm];
                if coupling != 0.0 {
                    entries[centre] += 2.0 * coupling;
                    entries[slot(step(l, sl))] -= coupling;
                    entries[slot(step(m, sm))] -= coupling;
                }
            }
        }
    }
    entries
}

/// Rows of a range of planes.
#[derive(Default)]
struct Rows {
    lengths: Vec<u8>,
    columns: Vec<u32>,
    values: Vec<f64>,
}

/// Rows of the planes `from..to`, with the Robin terms on the diagonal; none if a cell is folded.
fn rows(grid: &Grid, robin: &[f64], from: usize, to: usize) -> Option<Rows> {
    let shape = grid.shape();
    let [nx, ny, nz] = shape;
    let place = |i: isize| (0..nx as isize).contains(&i).then(|| positions(grid, i as usize));
    let start = from as isize;
    // Two sliding windows: positions of three planes give the energies of one, energies of three give the rows.
    let mut position: [Option<Plane<Vector3>>; 3] = [place(start - 2), place(start - 1), place(start)];
    let mut energy: [Option<Plane<NodeEnergy>>; 3] = [None, None, None];
    let mut rows = Rows::default();
    for i in start - 1..=to as isize {
        energy.rotate_left(1);
        energy[2] = if (0..nx as isize).contains(&i) {
            let planes = [position[0].as_ref(), position[1].as_ref(), position[2].as_ref()];
            Some(plane_energy(planes, i as usize, shape)?)
        } else {
            None
        };
        position.rotate_left(1);
        position[2] = place(i + 2);
        let middle = i - 1;
        if middle < start {
            continue;
        }
        let planes = [energy[0].as_ref(), energy[1].as_ref(), energy[2].as_ref()];
        for j in 0..ny {
            for k in 0..nz {
                let node = grid.index(middle as usize, j, k);
                let mut entries = row(planes, [middle as usize, j, k], shape);
                entries[slot([0; 3])] += robin[node];
                let before = rows.columns.len();
                for (n, &value) in entries.iter().enumerate() {
                    if value != 0.0 {
                        let step = |n: usize, stride: usize| (n as isize - 1) * stride as isize;
                        let column =
                            node as isize + step(n / 9, ny * nz) + step(n / 3 % 3, nz) + step(n % 3, 1);
                        rows.columns.push(column as u32);
                        rows.values.push(value);
                    }
                }
                rows.lengths.push((rows.columns.len() - before) as u8);
            }
        }
    }
    Some(rows)
}

/// Robin weights of the nodes on the far boundary: n.r/|r|^2 over each face of a boundary cell, shared by its nodes.
fn robin(grid: &Grid, dimensions: Dimensions) -> Vec<f64> {
    let shape = grid.shape();
    let mut weights = vec![0.0; grid.nodes()];
    for axis in 0..3 {
        let [u, v] = [(axis + 1) % 3, (axis + 2) % 3];
        for (end, kind) in grid.axes[axis].ends.into_iter().enumerate() {
            if !matches!(kind, End::Far(_)) {
                continue;
            }
            let fixed = if end == 0 { 0 } else { shape[axis] - 1 };
            for a in 0..shape[u] - 1 {
                for b in 0..shape[v] - 1 {
                    let nodes = [[0, 0], [0, 1], [1, 0], [1, 1]].map(|[da, db]| {
                        let mut n = [0; 3];
                        (n[axis], n[u], n[v]) = (fixed, a + da, b + db);
                        n
                    });
                    let x = nodes.map(|[i, j, k]| grid.position(i, j, k));
                    let normal = cross(minus(x[2], x[0]), minus(x[1], x[0]));
                    let mut middle = [0, 1, 2].map(|d| x.iter().map(|p| p[d]).sum::<f64>() / 4.0);
                    if dimensions == Dimensions::Two {
                        middle[1] = 0.0; // the distance counts in the plane of the cross-section
                    }
                    let weight = dot(normal, middle).abs() / dot(middle, middle) / 4.0;
                    for [i, j, k] in nodes {
                        weights[grid.index(i, j, k)] += weight;
                    }
                }
            }
        }
    }
    weights
}

impl Operator {
    /// Assembles the operator of a grid, in parallel over planes of constant x; none if the grid is folded, that is
    /// if a corner of a cell has no positive volume.
    pub fn assemble(grid: &Grid, dimensions: Dimensions) -> Option<Operator> {
        let [nx, _, _] = grid.shape();
        let robin = robin(grid, dimensions);
        let pieces = (4 * rayon::current_num_threads()).min(nx);
        let parts: Option<Vec<Rows>> = (0..pieces)
            .into_par_iter()
            .map(|p| rows(grid, &robin, p * nx / pieces, (p + 1) * nx / pieces))
            .collect();
        let parts = parts?;
        let entries = parts.iter().map(|p| p.columns.len()).sum();
        let (mut columns, mut values) = (Vec::with_capacity(entries), Vec::with_capacity(entries));
        let mut starts = Vec::with_capacity(grid.nodes() + 1);
        starts.push(0usize);
        for part in parts {
            for length in part.lengths {
                starts.push(starts[starts.len() - 1] + length as usize);
            }
            columns.extend_from_slice(&part.columns);
            values.extend_from_slice(&part.values);
        }
        let n = grid.nodes();
        Some(Operator { matrix: Matrix::new((n, n), starts, columns, values) })
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.matrix.rows()
    }

    /// y = A x on the rows that are not `fixed`, zero on the fixed ones; returns x.y, column by column.
    ///
    /// # Panics
    /// If the lengths do not fit.
    pub fn multiply<const K: usize>(&self, x: &[[f64; K]], fixed: &[bool], y: &mut Field<K>) -> [f64; K] {
        let n = self.rows();
        assert!(
            x.len() == n && y.len() == n && fixed.len() == n,
            "{} rows, {} and {} values",
            n,
            x.len(),
            y.len()
        );
        let starts = self.matrix.indptr();
        let starts = starts.raw_storage();
        let (columns, values) = (self.matrix.indices(), self.matrix.data());
        let part = |(chunk, y): (usize, &mut [[f64; K]])| {
            let mut sum = [0.0; K];
            for (local, y) in y.iter_mut().enumerate() {
                let node = chunk * ROWS + local;
                let mut value = [0.0; K];
                if !fixed[node] {
                    let range = starts[node]..starts[node + 1];
                    for (&column, &a) in columns[range.clone()].iter().zip(&values[range]) {
                        let x = &x[column as usize];
                        for r in 0..K {
                            value[r] += a * x[r];
                        }
                    }
                    for r in 0..K {
                        sum[r] += value[r] * x[node][r];
                    }
                }
                *y = value;
            }
            sum
        };
        in_order(y.par_chunks_mut(ROWS).enumerate().map(part).collect())
    }

    /// The diagonal of A.
    pub fn diagonal(&self) -> Vec<f64> {
        (0..self.rows()).into_par_iter().map(|n| self.matrix.get(n, n).copied().unwrap_or(0.0)).collect()
    }
}
