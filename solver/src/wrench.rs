//! Force and torque: the exact derivative of the discrete energy.
//!
//! For a rigid virtual displacement v of a plate, spread over the grid by its [`Carry`], the force is the derivative
//! of the energy at fixed nodal potentials (Coulomb's virtual work method [Coulomb1983]; the field is stationary):
//! F_v = sum over corners of volume (1/2 |g|^2 div v - g . grad v . g) = -sum of volume T : grad v, with the Maxwell
//! stress T = g g - |g|^2/2. With v = B (t + axis x lever), B the weights of the carry, all six components come out of one pass.

use rayon::prelude::*;
use tiltgap_meshes::{dot, Carry, Grid, Vector3};

use crate::corner::{cell, cross, differences, for_each_octant, minus, positions, Star};
use crate::field::{in_order, Field};

/// Force and torque (about the centre of the plate's facing surface), in units of the grid.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Wrench {
    /// Force x, y, z.
    pub force: Vector3,
    /// Torque x, y, z.
    pub torque: Vector3,
}

impl Wrench {
    /// The wrench on the plate that moves with `carry`, in the field `phi` = U0 `phi[0]` + U1 `phi[1]` of the plate
    /// potentials U. On a mirrored grid the components that vanish are exactly zero.
    pub fn new(grid: &Grid, carry: &Carry, phi: &Field<2>, potential: [f64; 2]) -> Wrench {
        let [nx, _, _] = grid.shape();
        let planes = (0..nx).into_par_iter().map(|i| plane_wrench(grid, carry, phi, potential, i)).collect();
        let sum = in_order(planes);
        let [fx, fy, fz, tx, ty, tz] = sum.map(|v| v * grid.multiplicity());
        if grid.mirrored() {
            Wrench { force: [fx, 0.0, fz], torque: [0.0, ty, 0.0] }
        } else {
            Wrench { force: [fx, fy, fz], torque: [tx, ty, tz] }
        }
    }
}

/// Contribution of the corners at the nodes of one plane.
///
/// The derivative of the energy with respect to an edge vector is -volume T.G of the corners that have that edge. So
/// the tractions are added up for each edge at a node first, and only then meet the displacement of its two ends.
fn plane_wrench(grid: &Grid, carry: &Carry, phi: &Field<2>, potential: [f64; 2], i: usize) -> [f64; 6] {
    let shape = grid.shape();
    let [nx, ny, nz] = shape;
    let stride = [ny * nz, nz, 1];
    let [below, middle, above] =
        [i.checked_sub(1), Some(i), (i + 1 < nx).then_some(i + 1)].map(|i| i.map(|i| positions(grid, i)));
    let planes = [below.as_ref(), middle.as_ref(), above.as_ref()];
    let mut sum = [0.0; 6];
    for j in 0..ny {
        for k in (0..nz).filter(|&k| carry.moves_near(k)) {
            let (at, node) = ([i, j, k], grid.index(i, j, k));
            let exists = |l: usize, side: usize| if side == 0 { at[l] > 0 } else { at[l] + 1 < shape[l] };
            let mut difference = [[0.0; 2]; 3];
            for l in 0..3 {
                for side in (0..2).filter(|&side| exists(l, side)) {
                    let low = node - stride[l] * (1 - side);
                    let (low, high) = (phi[low], phi[low + stride[l]]);
                    difference[l][side] =
                        potential[0] * (high[0] - low[0]) + potential[1] * (high[1] - low[1]);
                }
            }
            let star = Star::new(differences(planes, j, k, [ny, nz]));
            // `[axis][side]`
            let mut traction = [[[0.0; 3]; 2]; 3];
            for_each_octant(at, shape, |s| {
                // With n = det G: det T.G = g (g.n) - |g|^2/2 n, and the gradient is g = sum of delta n/det.
                let normals = star.normals(s);
                let inverse = 1.0 / star.determinant(s);
                let permittivity = grid.permittivity(cell(at, s));
                let mut g = [0.0; 3];
                for l in 0..3 {
                    let delta = difference[l][s[l]] * inverse;
                    for d in 0..3 {
                        g[d] += delta * normals[l][d];
                    }
                }
                let half = 0.5 * dot(g, g);
                for l in 0..3 {
                    let along = dot(g, normals[l]);
                    for d in 0..3 {
                        traction[l][s[l]][d] += permittivity * (g[d] * along - half * normals[l][d]);
                    }
                }
            });
            let end = |at: [usize; 3]| (carry.lever(at[0], at[1], at[2]), carry.weights(at[0], at[1], at[2]));
            let own = end(at);
            for l in 0..3 {
                for side in (0..2).filter(|&side| exists(l, side)) {
                    let mut to = at;
                    to[l] = to[l] + 2 * side - 1;
                    let other = end(to);
                    let (low, high) = if side == 0 { (other, own) } else { (own, other) };
                    let t = traction[l][side];
                    let pull = |w: Vector3| [w[0] * t[0], w[1] * t[1], w[2] * t[2]];
                    let (up, down) = (pull(high.1), pull(low.1));
                    let (force, moment) = (minus(up, down), minus(cross(high.0, up), cross(low.0, down)));
                    for d in 0..3 {
                        sum[d] -= force[d] / 8.0;
                        sum[3 + d] -= moment[d] / 8.0;
                    }
                }
            }
        }
    }
    sum
}
