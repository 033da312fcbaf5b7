//! The discrete energy as a sparse matrix.
//!
//! W(phi) = sum over cells and their corners of volume/2 |g|^2 is a quadratic form; its second derivative is the
//! symmetric positive matrix A, so that C = phi^T A phi. On the untilted grid A is the usual 7-point stencil; a tilt
//! adds neighbours across the corners of the coordinate planes (19 points at most, zeros are left out).
//!
//! A far boundary contributes p n.r/|r|^2 phi (Robin), where the field falls off as 1/r^p: exact for the field of a
//! charge in space and of a pair of opposite line charges in the plane (p = 1), and of both over a grounded plane.
//! Nodes of plates and grounded walls are rows like any other; who multiplies says which are fixed.

use rayon::prelude::*;
use sprs::CsMatI;
use tiltgap_meshes::{dot, End, Grid, Vector3};

use crate::corner::{cell, cross, differences, for_each_octant, minus, positions, Plane, Star};
use crate::field::{in_order, Field};

/// Sparse matrix with 32-bit columns.
pub type Matrix = CsMatI<f64, u32, usize>;

/// Blocks of rows, the units of parallel work: enough for the threads of a workstation, few enough that the planes
/// that neighbouring blocks both need do not cost much.
const BLOCKS: usize = 8;

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
    /// Whether any of the pairs is not zero.
    coupled: bool,
}

/// The assembled operator of one grid.
#[derive(Clone, Debug)]
pub struct Operator {
    /// A, symmetric, in blocks of rows; rows and columns are the nodes of the grid.
    blocks: Vec<Matrix>,
    /// Rows of every block but the last.
    block_rows: usize,
}

/// Energy at a node all of whose edges lie along the axes: no couplings.
fn upright(edges: &[[Vector3; 2]; 3]) -> NodeEnergy {
    let mut energy = NodeEnergy::default();
    for l in 0..3 {
        let [m, n] = [(l + 1) % 3, (l + 2) % 3];
        let area = (edges[m][0][m] + edges[m][1][m]) * (edges[n][0][n] + edges[n][1][n]) / 8.0;
        for side in (0..2).filter(|&side| edges[l][side][l] > 0.0) {
            energy.edge[l][side] = area / edges[l][side][l];
        }
    }
    energy
}

/// Energy at a node from the corners that meet there; none if one of them is folded.
fn bent(grid: &Grid, edges: [[Vector3; 2]; 3], at: [usize; 3], shape: [usize; 3]) -> Option<NodeEnergy> {
    let star = Star::new(edges);
    let mut energy = NodeEnergy::default();
    let mut folded = false;
    for_each_octant(at, shape, |s| {
        let det = star.determinant(s);
        folded |= det.is_nan() || det <= 0.0;
        let normals = star.normals(s);
        // volume G_l.G_m = det/8 (normal_l/det).(normal_m/det)
        let weight = grid.permittivity(cell(at, s)) / (8.0 * det);
        for l in 0..3 {
            energy.edge[l][s[l]] += weight * dot(normals[l], normals[l]);
        }
        for (p, [l, m]) in PAIRS.into_iter().enumerate() {
            // Differences are taken from the node outwards: a neighbour below turns the sign.
            let sign = if s[l] == s[m] { weight } else { -weight };
            energy.pair[p][s[l]][s[m]] += sign * dot(normals[l], normals[m]);
        }
    });
    energy.coupled = energy.pair.as_flattened().as_flattened().iter().any(|&c| c != 0.0);
    (!folded).then_some(energy)
}

/// Energies of the nodes of the plane with first index `i`, from the positions on it and on its two neighbours; none
/// if a cell is folded.
fn plane_energy(grid: &Grid, planes: [Option<&Plane<Vector3>>; 3], i: usize) -> Option<Plane<NodeEnergy>> {
    let shape = grid.shape();
    let [_, ny, nz] = shape;
    let still: Vec<bool> = (0..nz).map(|k| !grid.upper.carry.moves_near(k)).collect();
    let mut energies = Vec::with_capacity(ny * nz);
    for j in 0..ny {
        for k in 0..nz {
            let edges = differences(planes, j, k, [ny, nz]);
            let plain = still[k] && !grid.at_film(i, j, k);
            energies.push(if plain { upright(&edges) } else { bent(grid, edges, [i, j, k], shape)? });
        }
    }
    Some(energies)
}

/// A row of the matrix lives on a block of 3 x 3 x 3 nodes. Their numbers in the block run from 0 to 26; this is the
/// node itself, and these are the steps along the axes.
const CENTRE: usize = 13;
const STEPS: [usize; 3] = [9, 3, 1];

/// The numbers of an upright node: itself and its six neighbours.
const UPRIGHT: [usize; 7] = [4, 10, 12, 13, 14, 16, 22];

/// The number one step from `from` along an axis, to the given side.
#[inline(always)]
fn beside(from: usize, axis: usize, side: usize) -> usize {
    from + 2 * side * STEPS[axis] - STEPS[axis]
}

/// The row of the node with number `here` in its plane, from the energies of three planes: adds to its 27 possible
/// entries, and says whether more than the seven of an upright node may differ from zero.
fn row(
    planes: [Option<&Plane<NodeEnergy>>; 3],
    [j, k, here]: [usize; 3],
    [ny, nz]: [usize; 2],
    entries: &mut [f64; 27],
) -> bool {
    let [below, Some(middle), above] = planes else { return false };
    let own = &middle[here];
    // `[axis][side]`
    let neighbours: [[Option<&NodeEnergy>; 2]; 3] = [
        [below.map(|plane| &plane[here]), above.map(|plane| &plane[here])],
        [(j > 0).then(|| &middle[here - nz]), (j + 1 < ny).then(|| &middle[here + nz])],
        [(k > 0).then(|| &middle[here - 1]), (k + 1 < nz).then(|| &middle[here + 1])],
    ];
    let mut coupled = own.coupled;
    for axis in 0..3 {
        for side in 0..2 {
            let Some(other) = neighbours[axis][side] else { continue };
            let to = beside(CENTRE, axis, side);
            let weight = own.edge[axis][side] + other.edge[axis][1 - side];
            entries[CENTRE] += weight;
            entries[to] -= weight;
            if !other.coupled {
                continue;
            }
            coupled = true;
            // The corners at that neighbour in which this node is the end of an edge.
            for (p, [l, m]) in PAIRS.into_iter().enumerate() {
                if axis != l && axis != m {
                    continue;
                }
                let across = if axis == l { m } else { l };
                for turn in 0..2 {
                    let coupling =
                        if axis == l { other.pair[p][1 - side][turn] } else { other.pair[p][turn][1 - side] };
                    if coupling != 0.0 {
                        entries[to] -= coupling;
                        entries[beside(to, across, turn)] += coupling;
                    }
                }
            }
        }
    }
    if own.coupled {
        for (p, [l, m]) in PAIRS.into_iter().enumerate() {
            for sl in 0..2 {
                for sm in 0..2 {
                    let coupling = own.pair[p][sl][sm];
                    entries[CENTRE] += 2.0 * coupling;
                    entries[beside(CENTRE, l, sl)] -= coupling;
                    entries[beside(CENTRE, m, sm)] -= coupling;
                }
            }
        }
    }
    coupled
}

/// Entries in a row of a tilted bench without roll, nearly enough: what space is set aside for.
const ENTRIES: usize = 10;

/// Rows of the planes `from..to`, with the Robin terms on the diagonal; none if a cell is folded.
fn rows(grid: &Grid, robin: &[f64], from: usize, to: usize) -> Option<Matrix> {
    let shape = grid.shape();
    let [nx, ny, nz] = shape;
    let place = |i: isize| (0..nx as isize).contains(&i).then(|| positions(grid, i as usize));
    let start = from as isize;
    // Two sliding windows: positions of three planes give the energies of one, energies of three give the rows.
    let mut position: [Option<Plane<Vector3>>; 3] = [place(start - 2), place(start - 1), place(start)];
    let mut energy: [Option<Plane<NodeEnergy>>; 3] = [None, None, None];
    let nodes = (to - from) * ny * nz;
    let mut columns = Vec::with_capacity(ENTRIES * nodes);
    let mut values = Vec::with_capacity(ENTRIES * nodes);
    let mut starts = Vec::with_capacity(nodes + 1);
    starts.push(0);
    // By how much the node number of each of the 27 differs from that of the row.
    let offsets: [isize; 27] = std::array::from_fn(|n| {
        let step = |n: usize, stride: usize| (n as isize - 1) * stride as isize;
        step(n / 9, ny * nz) + step(n / 3 % 3, nz) + step(n % 3, 1)
    });
    for i in start - 1..=to as isize {
        energy.rotate_left(1);
        energy[2] = if (0..nx as isize).contains(&i) {
            let planes = [position[0].as_ref(), position[1].as_ref(), position[2].as_ref()];
            Some(plane_energy(grid, planes, i as usize)?)
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
                let mut entries = [0.0; 27];
                let coupled = row(planes, [j, k, j * nz + k], [ny, nz], &mut entries);
                entries[CENTRE] += robin[node];
                let mut keep = |n: usize| {
                    if entries[n] != 0.0 {
                        columns.push((node as isize + offsets[n]) as u32);
                        values.push(entries[n]);
                    }
                };
                if coupled {
                    (0..27).for_each(&mut keep);
                } else {
                    UPRIGHT.into_iter().for_each(&mut keep);
                }
                starts.push(columns.len());
            }
        }
    }
    Some(Matrix::new((nodes, grid.nodes()), starts, columns, values))
}

/// Robin weights of the nodes on the far boundary: p n.r/|r|^2 over each face of a boundary cell, shared by its nodes.
fn robin(grid: &Grid) -> Vec<f64> {
    let shape = grid.shape();
    let mut weights = vec![0.0; grid.nodes()];
    for axis in 0..3 {
        let [u, v] = [(axis + 1) % 3, (axis + 2) % 3];
        for (end, kind) in grid.axes[axis].ends.into_iter().enumerate() {
            let End::Far { decay, .. } = kind else { continue };
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
                    let origin = grid.far_field.origin;
                    let mut middle = [0, 1, 2].map(|d| x.iter().map(|p| p[d]).sum::<f64>() / 4.0 - origin[d]);
                    if grid.is_cross_section() {
                        middle[1] = 0.0; // the distance counts in the plane of the cross-section
                    }
                    let weight = decay * dot(normal, middle).abs() / dot(middle, middle) / 4.0;
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
    pub fn assemble(grid: &Grid) -> Option<Operator> {
        let [nx, _, _] = grid.shape();
        let robin = robin(grid);
        let planes = nx.div_ceil(BLOCKS);
        let blocks: Option<Vec<Matrix>> = (0..nx.div_ceil(planes))
            .into_par_iter()
            .map(|p| rows(grid, &robin, p * planes, ((p + 1) * planes).min(nx)))
            .collect();
        Some(Operator { blocks: blocks?, block_rows: planes * grid.nodes() / nx })
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.blocks.iter().map(|b| b.rows()).sum()
    }

    /// The whole matrix in one piece.
    pub fn matrix(&self) -> Matrix {
        let views: Vec<_> = self.blocks.iter().map(|b| b.view()).collect();
        sprs::vstack(&views)
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
        let part = |(block, (matrix, y)): (usize, (&Matrix, &mut [[f64; K]]))| {
            let starts = matrix.indptr();
            let starts = starts.raw_storage();
            let (columns, values) = (matrix.indices(), matrix.data());
            let mut sum = [0.0; K];
            for (row, y) in y.iter_mut().enumerate() {
                let node = block * self.block_rows + row;
                let mut value = [0.0; K];
                if !fixed[node] {
                    let range = starts[row]..starts[row + 1];
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
        let chunks = self.blocks.par_iter().zip(y.par_chunks_mut(self.block_rows));
        in_order(chunks.enumerate().map(part).collect())
    }

    /// The diagonal of A.
    pub fn diagonal(&self) -> Vec<f64> {
        let own = |(block, matrix): (usize, &Matrix)| -> Vec<f64> {
            (0..matrix.rows())
                .map(|row| matrix.get(row, block * self.block_rows + row).copied().unwrap_or(0.0))
                .collect()
        };
        self.blocks.par_iter().enumerate().flat_map_iter(own).collect()
    }
}
