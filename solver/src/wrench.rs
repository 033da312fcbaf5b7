//! Force and torque: the exact derivative of the discrete energy.
//!
//! For a rigid virtual displacement v of a plate, spread over the grid by its [`Carry`], the force is the derivative
//! of the energy at fixed nodal potentials (Coulomb's virtual work method [Coulomb83]; the field is stationary):
//! F_v = sum over corners of volume (1/2 |g|^2 div v - g . grad v . g) = -sum of volume T : grad v, with the Maxwell
//! stress T = g g - |g|^2/2. With v = B (t + axis x lever), B the weights of the carry, all six components come out of one pass, and because
//! the form is quadratic in the field one pass serves every pair of plate potentials.

use rayon::prelude::*;
use tiltgap_meshes::{dot, Carry, Grid, Vector3};

use crate::corner::{cross, differences, minus, octants, positions, Corner};
use crate::field::{in_order, Field};

/// Force and torque (about the centre of the plate's facing surface), in units of the grid.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Wrench {
    /// Force x, y, z.
    pub force: Vector3,
    /// Torque x, y, z.
    pub torque: Vector3,
}

/// The wrench on a plate as a quadratic form in the potentials of the two plates.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct WrenchForm {
    /// Coefficients of U0^2, 2 U0 U1 and U1^2, six components each (force, torque).
    coefficients: [[f64; 6]; 3],
}

/// The products of two plate potentials that a symmetric form takes.
const PRODUCTS: [[usize; 2]; 3] = [[0, 0], [0, 1], [1, 1]];

impl WrenchForm {
    /// Evaluates the form of a plate that moves with `carry`, for the fields `phi` that belong to unit potential on
    /// either plate. On a symmetric half the components that vanish are exactly zero.
    pub fn new(grid: &Grid, carry: &Carry, phi: &Field<2>) -> WrenchForm {
        let [nx, _, _] = grid.shape();
        let planes: Vec<[f64; 18]> =
            (0..nx).into_par_iter().map(|i| plane_form(grid, carry, phi, i)).collect();
        let sum = in_order(planes);
        let mut form = WrenchForm::default();
        for (n, coefficient) in form.coefficients.iter_mut().enumerate() {
            for c in 0..6 {
                let vanishes = grid.half && [1, 3, 5].contains(&c);
                coefficient[c] = if vanishes { 0.0 } else { sum[6 * n + c] * grid.multiplicity() };
            }
        }
        form
    }

    /// The wrench for given potentials of the lower and the upper plate.
    pub fn at(&self, potential: [f64; 2]) -> Wrench {
        let mut total = [0.0; 6];
        for (coefficient, [a, b]) in self.coefficients.iter().zip(PRODUCTS) {
            let weight = potential[a] * potential[b] * if a == b { 1.0 } else { 2.0 };
            for c in 0..6 {
                total[c] += weight * coefficient[c];
            }
        }
        let [fx, fy, fz, tx, ty, tz] = total;
        Wrench { force: [fx, fy, fz], torque: [tx, ty, tz] }
    }
}

/// Contribution of the corners at the nodes of one plane.
fn plane_form(grid: &Grid, carry: &Carry, phi: &Field<2>, i: usize) -> [f64; 18] {
    let shape = grid.shape();
    let [nx, ny, nz] = shape;
    let around = [i.checked_sub(1), Some(i), (i + 1 < nx).then_some(i + 1)];
    let position = around.map(|i| i.map(|i| positions(grid, i)));
    let lever = |at: [usize; 3]| carry.lever(at[0], at[1], at[2]);
    let [p0, p1, p2] = &position;
    let mut sum = [0.0; 18];
    for j in 0..ny {
        for k in 0..nz {
            if !(k.saturating_sub(1)..=(k + 1).min(nz - 1)).any(|k| carry.moves(k)) {
                continue;
            }
            let edges = differences([p0.as_ref(), p1.as_ref(), p2.as_ref()], j, k, [ny, nz]);
            let at = [i, j, k];
            let own = (lever(at), carry.weights(k));
            let other: [[(Vector3, Vector3); 2]; 3] = [0, 1, 2].map(|l| {
                [0, 1].map(|side| {
                    let mut to = at;
                    to[l] = (to[l] + 2 * side).wrapping_sub(1);
                    if to[l] < shape[l] {
                        (lever(to), carry.weights(to[2]))
                    } else {
                        own // there is no cell on that side
                    }
                })
            });
            let node = grid.index(i, j, k);
            let stride = [ny * nz, nz, 1];
            for s in octants([i, j, k], shape) {
                let Some(corner) = Corner::new(&[edges[0][s[0]], edges[1][s[1]], edges[2][s[2]]]) else {
                    continue;
                };
                // Lever and weights at the lower and the upper end of the corner's three edges.
                let ends = [0, 1, 2].map(|l| if s[l] == 0 { [other[l][0], own] } else { [own, other[l][1]] });
                let mut gradient = [[0.0; 3]; 2];
                for l in 0..3 {
                    let (low, high) =
                        if s[l] == 0 { (node - stride[l], node) } else { (node, node + stride[l]) };
                    for r in 0..2 {
                        let delta = phi[high][r] - phi[low][r];
                        for d in 0..3 {
                            gradient[r][d] += delta * corner.reciprocal[l][d];
                        }
                    }
                }
                for (n, [a, b]) in PRODUCTS.into_iter().enumerate() {
                    let (ga, gb) = (gradient[a], gradient[b]);
                    let both = dot(ga, gb);
                    // Traction T.G of the (symmetrised) stress on a reciprocal vector.
                    let traction = |g: Vector3| {
                        let (along_a, along_b) = (dot(ga, g), dot(gb, g));
                        [0, 1, 2].map(|d| 0.5 * (ga[d] * along_b + gb[d] * along_a - both * g[d]))
                    };
                    let vertical = traction(corner.reciprocal[2]);
                    for d in 0..3 {
                        sum[6 * n + d] -= corner.volume * (ends[2][1].1[d] - ends[2][0].1[d]) * vertical[d];
                    }
                    for l in 0..3 {
                        let t = if l == 2 { vertical } else { traction(corner.reciprocal[l]) };
                        let moment_at = |(lever, weights): (Vector3, Vector3)| {
                            cross(lever, [weights[0] * t[0], weights[1] * t[1], weights[2] * t[2]])
                        };
                        let moment = minus(moment_at(ends[l][1]), moment_at(ends[l][0]));
                        for d in 0..3 {
                            sum[6 * n + 3 + d] -= corner.volume * moment[d];
                        }
                    }
                }
            }
        }
    }
    sum
}
