//! The ideal formula, and what the tilt alone makes of it.
//!
//! The wedge factors come from lamellae: over each spot of the overlap the field is that of a small parallel capacitor
//! of the local gap h = d + sx x + sy y (with a film under it, of the effective gap, which differs from the true one by
//! the same length everywhere; of a guarded plate alone), so that charge, force and torque are the integrals of 1/h, 1/h^2 and
//! (arm + x)/h^2. Along x they are closed forms in e = half the difference of the end gaps over their sum: 1/h gives
//! artanh(e)/e, 1/h^2 gives 1/(1 - e^2) (an arc of field lines between planes hinged together). Across y, where
//! a roll makes e vary, Gauss-Legendre panels do the rest.

use tiltgap_meshes::{Arrangement, Rectangle};

/// Below this |e| the closed forms lose digits to cancellation, and this many terms of their series are exact to
/// rounding.
const SERIES_BELOW: f64 = 0.05;
const SERIES_TERMS: i32 = 7;
/// Panels across y; they shrink by half towards the narrow side, where the integrand is steepest.
const PANELS: usize = 12;
/// Nodes (positive half) and weights of the eight-point Gauss-Legendre rule on -1 to 1 [AbramowitzStegun1964], table 25.4.
const GAUSS: [[f64; 2]; 4] = [
    [0.183_434_642_495_649_8, 0.362_683_783_378_362],
    [0.525_532_409_916_329, 0.313_706_645_877_887_3],
    [0.796_666_477_413_626_7, 0.222_381_034_453_374_5],
    [0.960_289_856_497_536_3, 0.101_228_536_290_376_3],
];

/// What the tilt alone does to charge, force and torque, relative to parallel plates at the centre gap.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WedgeFactors {
    /// Mean of d/h over the overlap.
    pub capacitance: f64,
    /// Mean of (d/h)^2.
    pub force: f64,
    /// Mean of x (d/h)^2, in metres; x from the centre of the upper plate.
    pub moment_m: f64,
}

impl WedgeFactors {
    /// The factor of the torque about a hinge at distance `arm_m`: mean of (arm + x)(d/h)^2 over arm.
    pub fn torque(&self, arm_m: f64) -> f64 {
        self.force + self.moment_m / arm_m
    }
}

/// artanh(e)/e, the mean of 1/(1 + e s) over s from -1 to 1.
fn mean_reciprocal(e: f64) -> f64 {
    if e.abs() < SERIES_BELOW {
        (0..SERIES_TERMS).rev().map(|k| e.powi(2 * k) / (2 * k + 1) as f64).sum()
    } else {
        e.atanh() / e
    }
}

/// Mean of s/(1 + e s)^2 over s from -1 to 1.
fn mean_lever(e: f64) -> f64 {
    if e.abs() < SERIES_BELOW {
        -(1..=SERIES_TERMS)
            .rev()
            .map(|k| e.powi(2 * k - 1) * (2 * k) as f64 / (2 * k + 1) as f64)
            .sum::<f64>()
    } else {
        (mean_reciprocal(e) - 1.0 / (1.0 - e * e)) / e
    }
}

/// Integrals over one lamella of unit width along x, from `x[0]` to `x[1]` with gap `middle` at its centre and slope
/// `slope`: of 1/h, 1/h^2 and x/h^2.
fn lamella(x: [f64; 2], middle: f64, slope: f64) -> [f64; 3] {
    let (length, centre) = (x[1] - x[0], 0.5 * (x[0] + x[1]));
    let e = 0.5 * length * slope / middle;
    let square = length / (middle * middle * (1.0 - e * e));
    let lever = 0.5 * length * length / (middle * middle) * mean_lever(e);
    [length / middle * mean_reciprocal(e), square, centre * square + lever]
}

/// The wedge factors of an arrangement; none if the plates do not overlap.
///
/// Relative accuracy 1e-12, for every pose in which the plates do not touch.
pub fn wedge_factors(arrangement: &Arrangement) -> Option<WedgeFactors> {
    let Rectangle { x, y } = arrangement.overlap();
    let area = arrangement.overlap().area_m2();
    if area == 0.0 {
        return None;
    }
    let pose = &arrangement.pose;
    let (d, [sx, sy]) = (arrangement.effective_gap_m(), pose.slopes());
    let [x, y] = [x.map(|x| x - pose.shift_m[0]), y.map(|y| y - pose.shift_m[1])];
    let at = |y: f64| lamella(x, d + sx * 0.5 * (x[0] + x[1]) + sy * y, sx);
    let mut sum = [0.0; 3];
    if sy == 0.0 {
        sum = at(0.0).map(|v| v * (y[1] - y[0]));
    } else {
        // From the narrow side to the wide one.
        let (narrow, wide) = if sy > 0.0 { (y[0], y[1]) } else { (y[1], y[0]) };
        let mut edge = narrow;
        for panel in 0..PANELS {
            let next = if panel + 1 == PANELS {
                wide
            } else {
                narrow + (wide - narrow) * 0.5f64.powi((PANELS - 1 - panel) as i32)
            };
            let (centre, half) = (0.5 * (edge + next), 0.5 * (next - edge));
            for [node, weight] in GAUSS {
                for side in [-1.0, 1.0] {
                    let value = at(centre + side * half * node);
                    for n in 0..3 {
                        sum[n] += weight * half.abs() * value[n];
                    }
                }
            }
            edge = next;
        }
    }
    Some(WedgeFactors {
        capacitance: sum[0] * d / area,
        force: sum[1] * d * d / area,
        moment_m: sum[2] * d * d / area,
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use tiltgap_meshes::{Dimensions, Plate, Pose};

    fn bench(tilt: f64, roll: f64, shift_m: [f64; 2]) -> Arrangement {
        let plate = Plate { length_m: 0.1, width_m: 0.08, thickness_m: 0.0 };
        let pose = Pose { gap_m: 0.004, tilt_rad: tilt, roll_rad: roll, shift_m };
        Arrangement::open(plate, plate, pose, Dimensions::Three)
    }

    /// The integrals by brute force: midpoints on a fine grid.
    fn brute(a: &Arrangement) -> [f64; 3] {
        let (Rectangle { x, y }, n) = (a.overlap(), 2000);
        let [sx, sy] = a.pose.slopes();
        let mut sum = [0.0; 3];
        for i in 0..n {
            for j in 0..n {
                let at = |r: [f64; 2], k: usize| r[0] + (r[1] - r[0]) * (k as f64 + 0.5) / n as f64;
                let (u, v) = (at(x, i) - a.pose.shift_m[0], at(y, j) - a.pose.shift_m[1]);
                let r = a.pose.gap_m / (a.pose.gap_m + sx * u + sy * v);
                sum = [sum[0] + r, sum[1] + r * r, sum[2] + u * r * r];
            }
        }
        sum.map(|s| s / (n * n) as f64)
    }

    #[test]
    fn agrees_with_brute_force_and_with_the_closed_forms() {
        for (tilt, roll, shift) in [
            (0.02, 0.0, [0.0; 2]),
            (-0.03, 0.02, [0.004, -0.01]),
            (1e-5, 0.03, [0.0; 2]),
            (0.0, 0.0, [0.01, 0.0]),
        ] {
            let a = bench(tilt, roll, shift);
            let (w, b) = (wedge_factors(&a).unwrap(), brute(&a));
            for (value, brute, scale) in
                [(w.capacitance, b[0], 1.0), (w.force, b[1], 1.0), (w.moment_m, b[2], 0.1)]
            {
                assert!((value - brute).abs() < 2e-6 * scale, "{tilt} {roll}: {value} {brute}");
            }
        }
        // artanh(beta)/beta and 1/(1 - beta^2) with beta = (a/2) tan(tilt)/d.
        let a = bench(0.05, 0.0, [0.0; 2]);
        let beta = 0.05 * 0.05f64.tan() / 0.004;
        let w = wedge_factors(&a).unwrap();
        assert!((w.capacitance - beta.atanh() / beta).abs() < 1e-14);
        assert!((w.force - 1.0 / (1.0 - beta * beta)).abs() < 1e-14);
        let torque = w.force + 0.1 / (2.0 * 0.15 * beta) * (w.capacitance - w.force);
        assert!((w.torque(0.15) - torque).abs() < 1e-14);
    }

    #[test]
    fn series_and_closed_forms_meet_and_parallel_plates_have_no_wedge() {
        // The two sides of the switch differ by the step in e times the slope, known from the leading terms.
        let (below, above) = (SERIES_BELOW * (1.0 - 1e-9), SERIES_BELOW * (1.0 + 1e-9));
        assert!((mean_reciprocal(above) - mean_reciprocal(below)).abs() < 1e-11);
        assert!((mean_lever(above) - mean_lever(below) + 2.0 / 3.0 * (above - below)).abs() < 1e-12);
        let w = wedge_factors(&bench(0.0, 0.0, [0.0; 2])).unwrap();
        assert!([w.capacitance - 1.0, w.force - 1.0, w.moment_m].iter().all(|v| v.abs() < 1e-15));
        assert_eq!(wedge_factors(&bench(0.0, 0.0, [0.2, 0.0])), None);
    }
}
