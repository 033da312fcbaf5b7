//! The geometry at one corner of a cell: what operator, force and torque are all made of.
//!
//! At a corner the cell has three edge vectors e0, e1, e2 (towards growing x, y, z). With the potential differences
//! delta along them the gradient is g = sum of delta_l G_l, where the rows G_l of the inverse Jacobian are the
//! reciprocal vectors of the edges, and the corner stands for an eighth of the parallelepiped.

use tiltgap_meshes::{dot, Grid, Vector3};

/// Vector product.
#[inline(always)]
pub fn cross(a: Vector3, b: Vector3) -> Vector3 {
    [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]
}

/// Difference of two vectors.
#[inline(always)]
pub fn minus(a: Vector3, b: Vector3) -> Vector3 {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

/// The corners that meet at a node: up to eight, one for each choice of a side (0 below, 1 above) along each axis.
pub struct Star {
    edges: [[Vector3; 2]; 3],
    /// Products of the edges along the other two axes, in cyclic order: `[axis][side of the next][side of the one after]`.
    normals: [[[Vector3; 2]; 2]; 3],
}

impl Star {
    /// From the edge vectors, `[axis][side]`.
    #[inline(always)]
    pub fn new(edges: [[Vector3; 2]; 3]) -> Star {
        let mut normals = [[[[0.0; 3]; 2]; 2]; 3];
        for l in 0..3 {
            for a in 0..2 {
                for b in 0..2 {
                    normals[l][a][b] = cross(edges[(l + 1) % 3][a], edges[(l + 2) % 3][b]);
                }
            }
        }
        Star { edges, normals }
    }

    /// The face normals of the corner on sides `s`: determinant times the reciprocal vectors G_l, where
    /// `G_l . e_m` is 1 for l = m and 0 otherwise.
    #[inline(always)]
    pub fn normals(&self, s: [usize; 3]) -> [Vector3; 3] {
        let n = &self.normals;
        [n[0][s[1]][s[2]], n[1][s[2]][s[0]], n[2][s[0]][s[1]]]
    }

    /// Determinant of the edges of the corner on sides `s`: eight times the volume that it stands for.
    #[inline(always)]
    pub fn determinant(&self, s: [usize; 3]) -> f64 {
        dot(self.edges[0][s[0]], self.normals[0][s[1]][s[2]])
    }
}

/// A field on the nodes of one plane i = constant, j slow, k fast.
pub type Plane<T> = Vec<T>;

/// Positions of all nodes with first index `i`.
pub fn positions(grid: &Grid, i: usize) -> Plane<Vector3> {
    let [_, ny, nz] = grid.shape();
    let mut plane = Vec::with_capacity(ny * nz);
    for j in 0..ny {
        for k in 0..nz {
            plane.push(grid.position(i, j, k));
        }
    }
    plane
}

/// The six differences of a nodal vector at node (j, k) of the middle of three planes: `[axis][side]`, side 0 from
/// the neighbour below to the node, side 1 from the node to the neighbour above. Where there is no neighbour the
/// difference is zero.
#[inline(always)]
pub fn differences(
    planes: [Option<&Plane<Vector3>>; 3],
    j: usize,
    k: usize,
    [ny, nz]: [usize; 2],
) -> [[Vector3; 2]; 3] {
    let here = j * nz + k;
    let mut d = [[[0.0; 3]; 2]; 3];
    let Some(middle) = planes[1] else { return d };
    let x = middle[here];
    if let Some(below) = planes[0] {
        d[0][0] = minus(x, below[here]);
    }
    if let Some(above) = planes[2] {
        d[0][1] = minus(above[here], x);
    }
    if j > 0 {
        d[1][0] = minus(x, middle[here - nz]);
    }
    if j + 1 < ny {
        d[1][1] = minus(middle[here + nz], x);
    }
    if k > 0 {
        d[2][0] = minus(x, middle[here - 1]);
    }
    if k + 1 < nz {
        d[2][1] = minus(middle[here + 1], x);
    }
    d
}

/// The cell on sides `s` of a node, by its first node.
#[inline(always)]
pub fn cell(at: [usize; 3], s: [usize; 3]) -> [usize; 3] {
    [0, 1, 2].map(|d| at[d] + s[d] - 1)
}

/// Calls `act` with the sides (0 below, 1 above) of each of the cells that meet at a node: up to eight.
#[inline(always)]
pub fn for_each_octant(at: [usize; 3], shape: [usize; 3], mut act: impl FnMut([usize; 3])) {
    let sides = |d: usize| usize::from(at[d] == 0)..1 + usize::from(at[d] + 1 < shape[d]);
    for sx in sides(0) {
        for sy in sides(1) {
            for sz in sides(2) {
                act([sx, sy, sz]);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reciprocal_vectors_are_reciprocal() {
        let forward = [[1.0, 0.1, 0.0], [0.2, 2.0, 0.3], [0.0, -0.4, 0.5]];
        let backward = [[0.9, 0.0, 0.1], [0.0, 1.5, 0.0], [0.1, 0.1, 0.7]];
        let edges = [0, 1, 2].map(|l| [backward[l], forward[l]]);
        let star = Star::new(edges);
        for_each_octant([1, 1, 1], [3, 3, 3], |s| {
            let (normals, det) = (star.normals(s), star.determinant(s));
            for l in 0..3 {
                for m in 0..3 {
                    let expected = if l == m { 1.0 } else { 0.0 };
                    assert!((dot(normals[l], edges[m][s[m]]) / det - expected).abs() < 1e-15);
                }
            }
        });
        let mut corner = 0;
        for_each_octant([0, 2, 1], [3, 3, 3], |s| {
            assert!(s[0] == 1 && s[1] == 0);
            corner += 1;
        });
        assert_eq!(corner, 2);
    }
}
