//! How a rigid motion of one plate is spread over the grid.
//!
//! Each node follows the point of the plate that is nearest to it, with weights that are 1 on the plate and 0 on the
//! other plate, at the far boundary above and below and at grounded walls beside the plates. It serves twice: it bends the grid to the pose, and it is the virtual
//! displacement field of force and torque. Vertical motion is spread linearly across the gap. Sideways motion (the
//! shortening cos(tilt) of a tilted plate) may be spread smoothly, which leaves the grid lines upright where they meet
//! the plates, so that cells stay well shaped at the edges of a strongly tilted plate.

use crate::{dot, Matrix3, Pose, Vector3};

/// How sideways motion is spread across the gap.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sideways {
    /// In proportion to the height.
    Linear,
    /// Along 3 b^2 - 2 b^3, where b is the relative height.
    Smooth,
}

impl Sideways {
    /// Weight at relative height `b` in the gap, 0 to 1.
    pub fn weight(self, b: f64) -> f64 {
        match self {
            Sideways::Linear => b,
            Sideways::Smooth => b * b * (3.0 - 2.0 * b),
        }
    }

    /// Derivative of the weight.
    pub fn slope(self, b: f64) -> f64 {
        match self {
            Sideways::Linear => 1.0,
            Sideways::Smooth => 6.0 * b * (1.0 - b),
        }
    }
}

/// The motion of one plate, spread over a grid.
#[derive(Clone, Debug, PartialEq)]
pub struct Carry {
    /// Weight of sideways motion (x and y) of each z node.
    pub sideways: Vec<f64>,
    /// Weight of vertical motion of each z node.
    pub vertical: Vec<f64>,
    /// By what both are multiplied at a node, along x and along y: 1, falling to 0 where something beside the plate stands
    /// still.
    pub beside: [Vec<f64>; 2],
    /// Plate point nearest to a node, relative to the centre of the facing surface, axis by axis.
    pub point: [Vec<f64>; 3],
    /// Rotation from the plate's own directions to those of the room.
    pub rotation: Matrix3,
}

impl Carry {
    /// Weights of motion along x, y and z at a node.
    #[inline]
    pub fn weights(&self, i: usize, j: usize, k: usize) -> Vector3 {
        let beside = self.beside[0][i] * self.beside[1][j];
        let (sideways, vertical) = (beside * self.sideways[k], beside * self.vertical[k]);
        [sideways, sideways, vertical]
    }

    /// Whether the nodes at `k` move at all.
    #[inline]
    pub fn moves(&self, k: usize) -> bool {
        self.vertical[k] != 0.0
    }

    /// Whether a node at `k` or one of its neighbours moves.
    pub fn moves_near(&self, k: usize) -> bool {
        self.vertical[k.saturating_sub(1)..(k + 2).min(self.vertical.len())].iter().any(|&w| w != 0.0)
    }

    /// Lever arm of the plate point that a node follows: from the centre of the facing surface, in the room's
    /// directions.
    #[inline]
    pub fn lever(&self, i: usize, j: usize, k: usize) -> Vector3 {
        let (p, r) = ([self.point[0][i], self.point[1][j], self.point[2][k]], &self.rotation);
        [dot(r[0], p), dot(r[1], p), dot(r[2], p)]
    }

    /// Displacement of a node from its place in the untilted grid.
    #[inline]
    pub fn displacement(&self, i: usize, j: usize, k: usize) -> Vector3 {
        let p = [self.point[0][i], self.point[1][j], self.point[2][k]];
        let (lever, weights) = (self.lever(i, j, k), self.weights(i, j, k));
        let part = |d: usize| weights[d] * (lever[d] - p[d]);
        [part(0), part(1), part(2)]
    }
}

/// Heights in the gap at which [`least_volume`] is sampled.
const SAMPLES: usize = 64;

/// Smallest ratio of the volume of a bent cell to that of the cell it came from, over the gap at the four corners of
/// the upper plate (half sides `half`, in units of the gap or whatever the gap is in): the grid folds where it is not
/// positive. It is smallest at the corners because it is linear in the lateral position.
pub fn least_volume(pose: &Pose, half: [f64; 2], sideways: Sideways) -> f64 {
    let r = pose.rotation();
    let mut least = f64::INFINITY;
    for n in 0..=SAMPLES {
        let b = n as f64 / SAMPLES as f64;
        let (weight, slope) = (sideways.weight(b), sideways.slope(b));
        let (weights, slopes) = ([weight, weight, b], [slope, slope, 1.0]);
        for sign in [[-1.0, -1.0], [-1.0, 1.0], [1.0, -1.0], [1.0, 1.0]] {
            let p = [sign[0] * half[0], sign[1] * half[1], 0.0];
            let unit = |d: usize, e: usize| if d == e { 1.0 } else { 0.0 };
            // Columns of the Jacobian: where steps along x, y and z lead.
            let column = |e: usize| [0, 1, 2].map(|d| unit(d, e) + weights[d] * (r[d][e] - unit(d, e)));
            let up = [0, 1, 2].map(|d| unit(d, 2) + slopes[d] * (dot(r[d], p) - p[d]) / pose.gap_m);
            let (x, y) = (column(0), column(1));
            let normal = [x[1] * y[2] - x[2] * y[1], x[2] * y[0] - x[0] * y[2], x[0] * y[1] - x[1] * y[0]];
            least = least.min(dot(normal, up));
        }
    }
    least
}
