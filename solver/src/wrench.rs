//! Force and torque: the exact derivative of the discrete energy.
//!
//! For a rigid virtual displacement v of a plate, spread over the grid by its [`Carry`], the force is the derivative
//! of the energy at fixed nodal potentials (Coulomb's virtual work method [Coulomb83]; the field is stationary):
//! F_v = sum over corners of volume (1/2 |g|^2 div v - g . grad v . g) = -sum of volume T : grad v, with the Maxwell
//! stress T = g g - |g|^2/2. With v = B (t + axis x lever), B the weights of the carry, all six components come out of one pass, and because
//! the form is quadratic in the field one pass serves every pair of plate potentials.

use rayon::prelude::*;
use tiltgap_meshes::{dot, Carry, Grid, Vector3};

use crate::corner::{cross, differences, for_each_octant, minus, positions, Star};
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
    /// either plate. On a mirrored grid the components that vanish are exactly zero.
    pub fn new(grid: &Grid, carry: &Carry, phi: &Field<2>) -> WrenchForm {
        let [nx, _, _] = grid.shape();
        let planes: Vec<[f64; 18]> =
            (0..nx).into_par_iter().map(|i| plane_form(grid, carry, phi, i)).collect();
        let sum = in_order(planes);
        let mut form = WrenchForm::default();
        for (n, coefficient) in form.coefficients.iter_mut().enumerate() {
            for c in 0..6 {
                let vanishes = grid.mirrored() && [1, 3, 5].contains(&c);
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
///
/// The derivative of the energy with respect to an edge vector is -volume T.G of the corners that have that edge. So
/// the tractions are added up for each edge at a node first, and only then meet the displacement of its two ends.

fn plane_form(grid: &Grid, carry: &Carry, phi: &Field<2>, i: usize) -> [f64; 18] {
    let shape = grid.shape();
    let [nx, ny, nz] = shape;
    let stride = [ny * nz, nz, 1];
    let [below, middle, above] =
        [i.checked_sub(1), Some(i), (i + 1 < nx).then_some(i + 1)].map(|i| i.map(|i| positions(grid, i)));
    let planes = [below.as_ref(), middle.as_ref(), above.as_ref()];
    let mut sum = [0.0; 18];
    for j in 0..ny {
        for k in 0..nz {
            if !carry.moves_near(k) {
                continue;
            }
            let (at, node) = ([i, j, k], grid.index(i, j, k));
            let star = Star::new(differences(planes, j, k, [ny, nz]));
            let exists = |l: usize, side: usize| if side == 0 { at[l] > 0 } else { at[l] + 1 < shape[l] };
            let mut difference = [[[0.0; 2]; 2]; 3];
            for l in 0..3 {
                for side in (0..2).filter(|&side| exists(l, side)) {
                    let low = node - stride[l] * (1 - side);
                    let (low, high) = (phi[low], phi[low + stride[l]]);
                    difference[l][side] = [high[0] - low[0], high[1] - low[1]];
                }
            }
            // `[axis][side][product]`
            let mut traction = [[[[0.0; 3]; 3]; 2]; 3];
            for_each_octant(at, shape, |s| {
                let det = star.determinant(s);
                let normals = star.normals(s);
                let mut gradient = [[0.0; 3]; 2];
                for l in 0..3 {
                    for r in 0..2 {
                        let delta = difference[l][s[l]][r] / det;
                        for d in 0..3 {
                            gradient[r][d] += delta * normals[l][d];
                        }
                    }
                }
                let mut along = [[0.0; 3]; 2];
                for r in 0..2 {
                    for l in 0..3 {
                        along[r][l] = dot(gradient[r], normals[l]);
                    }
                }
                for (p, [a, b]) in PRODUCTS.into_iter().enumerate() {
                    let (ga, gb) = (gradient[a], gradient[b]);
                    let both = dot(ga, gb);
                    for l in 0..3 {
                        let sum = &mut traction[l][s[l]][p];
                        for d in 0..3 {
                            sum[d] +=
                                0.5 * (ga[d] * along[b][l] + gb[d] * along[a][l] - both * normals[l][d]);
                        }
                    }
                }
            });
            let end = |at: [usize; 3]| (carry.lever(at[0], at[1], at[2]), carry.weights(at[2]));
            let own = end(at);
            for l in 0..3 {
                for side in (0..2).filter(|&side| exists(l, side)) {
                    let mut to = at;
                    to[l] = to[l] + 2 * side - 1;
                    let other = end(to);
                    let (low, high) = if side == 0 { (other, own) } else { (own, other) };
                    for (p, t) in traction[l][side].iter().enumerate() {
                        let pull = |w: Vector3| [w[0] * t[0], w[1] * t[1], w[2] * t[2]];
                        let (up, down) = (pull(high.1), pull(low.1));
                        let (force, moment) = (minus(up, down), minus(cross(high.0, up), cross(low.0, down)));
                        for d in 0..3 {
                            sum[6 * p + d] -= force[d] / 8.0;
                            sum[6 * p + 3 + d] -= moment[d] / 8.0;
                        }
                    }
                }
            }
        }
    }
    sum
}
