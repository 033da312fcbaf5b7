//! The geometry at one corner of a cell: what operator, force and torque are all made of.
//!
//! At a corner the cell has three edge vectors e0, e1, e2 (towards growing x, y, z). With the potential differences
//! delta along them the gradient is g = sum of delta_l G_l, where the rows G_l of the inverse Jacobian are the
//! reciprocal vectors of the edges, and the corner stands for an eighth of the parallelepiped.

use tiltgap_meshes::{dot, Grid, Vector3};

/// Vector product.
pub fn cross(a: Vector3, b: Vector3) -> Vector3 {
    [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]
}

/// Difference of two vectors.
pub fn minus(a: Vector3, b: Vector3) -> Vector3 {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

/// Volume and reciprocal edge vectors of a corner.
#[derive(Clone, Copy, Debug)]
pub struct Corner {
    /// Volume that the corner stands for: det/8.
    pub volume: f64,
    /// Reciprocal vectors: `G_l . e_m` is 1 for l = m and 0 otherwise.
    pub reciprocal: [Vector3; 3],
}

impl Corner {
    /// From the edge vectors; none if the corner is folded (determinant not positive).
    #[inline]
    pub fn new(edges: &[Vector3; 3]) -> Option<Corner> {
        let normal = [cross(edges[1], edges[2]), cross(edges[2], edges[0]), cross(edges[0], edges[1])];
        let det = dot(edges[0], normal[0]);
        if det.is_nan() || det <= 0.0 {
            return None;
        }
        Some(Corner { volume: det / 8.0, reciprocal: normal.map(|n| n.map(|c| c / det)) })
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
#[inline]
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

/// The sides (0 below, 1 above) of the cells that meet at node (i, j, k): up to eight.
#[inline]
pub fn octants(at: [usize; 3], shape: [usize; 3]) -> impl Iterator<Item = [usize; 3]> {
    let exists = move |d: usize, side: usize| if side == 0 { at[d] > 0 } else { at[d] + 1 < shape[d] };
    (0..8usize)
        .map(|n| [n >> 2 & 1, n >> 1 & 1, n & 1])
        .filter(move |s| exists(0, s[0]) && exists(1, s[1]) && exists(2, s[2]))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reciprocal_vectors_are_reciprocal_and_folded_corners_are_none() {
        let edges = [[1.0, 0.1, 0.0], [0.2, 2.0, 0.3], [0.0, -0.4, 0.5]];
        let corner = Corner::new(&edges).unwrap();
        for l in 0..3 {
            for m in 0..3 {
                let expected = if l == m { 1.0 } else { 0.0 };
                assert!((dot(corner.reciprocal[l], edges[m]) - expected).abs() < 1e-15);
            }
        }
        assert!(Corner::new(&[edges[1], edges[0], edges[2]]).is_none());
    }
}
