//! Where the upper plate stands: gap, tilt, roll and lateral shift.

/// A vector (x, y, z).
pub type Vector3 = [f64; 3];
/// A 3 x 3 matrix, row by row.
pub type Matrix3 = [[f64; 3]; 3];

/// Scalar product.
#[inline(always)]
pub fn dot(a: Vector3, b: Vector3) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// Pose of the upper plate relative to the fixed lower one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pose {
    /// Height of the centre of the upper plate's facing surface above z = 0, in metres.
    pub gap_m: f64,
    /// Rotation about the hinge direction, in radians; positive raises the free (+x) edge.
    pub tilt_rad: f64,
    /// Rotation about x, applied after the tilt, in radians; positive raises the +y edge.
    pub roll_rad: f64,
    /// Lateral offset (x, y) of the upper plate's centre, in metres.
    pub shift_m: [f64; 2],
}

impl Pose {
    /// Rotation matrix R = Rx(roll) Ry(tilt) from the plate's own directions to those of the room.
    pub fn rotation(&self) -> Matrix3 {
        let (s, c) = self.roll_rad.sin_cos();
        let [r0, r1, r2] = self.tilt_rotation();
        let row = |u: f64, v: f64| [0, 1, 2].map(|k| u * r1[k] + v * r2[k]);
        [r0, row(c, -s), row(s, c)]
    }

    /// Rotation by the tilt alone, Ry(tilt): what the beam does about its hinge.
    pub fn tilt_rotation(&self) -> Matrix3 {
        let (s, c) = self.tilt_rad.sin_cos();
        [[c, 0.0, -s], [0.0, 1.0, 0.0], [s, 0.0, c]]
    }

    /// Centre of the upper plate's facing surface, in metres.
    pub fn centre_m(&self) -> Vector3 {
        [self.shift_m[0], self.shift_m[1], self.gap_m]
    }

    /// Slopes (dh/dx, dh/dy) of the upper plate's facing surface over the horizontal plane.
    pub fn slopes(&self) -> [f64; 2] {
        [self.tilt_rad.tan() / self.roll_rad.cos(), self.roll_rad.tan()]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn tilt_raises_the_free_edge_and_roll_the_far_side() {
        let pose = Pose { gap_m: 1.0, tilt_rad: 0.1, roll_rad: 0.2, shift_m: [0.0; 2] };
        let r = pose.rotation();
        assert!(dot(r[2], [1.0, 0.0, 0.0]) > 0.0 && dot(r[2], [0.0, 1.0, 0.0]) > 0.0);
        // The plane through R ex and R ey has the stated slopes.
        let column = |k: usize| [r[0][k], r[1][k], r[2][k]];
        let [sx, sy] = pose.slopes();
        for e in [column(0), column(1)] {
            assert!((e[2] - sx * e[0] - sy * e[1]).abs() < 1e-15);
        }
    }
}
