//! The order of convergence, by slope fit, on a tilted pair of unequal strips whose answer is exact.

use tiltgap::validate::cases::{number, Family};
use tiltgap_meshes::GridOptions;
use tiltgap_solver::{Level, LevelParams};

use crate::cases::strips;

/// Slope of ln(error) over ln(1/q), by least squares.
fn slope(points: &[(f64, f64)]) -> f64 {
    let logs: Vec<(f64, f64)> = points.iter().map(|(q, e)| (-q.ln(), e.ln())).collect();
    let n = logs.len() as f64;
    let (mx, my) = (logs.iter().map(|p| p.0).sum::<f64>() / n, logs.iter().map(|p| p.1).sum::<f64>() / n);
    let above: f64 = logs.iter().map(|p| (p.0 - mx) * (p.1 - my)).sum();
    above / logs.iter().map(|p| (p.0 - mx).powi(2)).sum::<f64>()
}

#[test]
fn charge_force_and_torque_are_of_second_order() {
    // Graded knife edges give second order back; on a uniform grid they would leave first order.
    let cases = Family::named("strips").cases;
    let case =
        cases.iter().find(|c| c.name() == "unequal upper 0.8 shift 0.1 gap 0.05 tilt -2").expect("the case");
    let arrangement = strips(case);
    let options = GridOptions::suited(&arrangement);
    let mut errors: [Vec<(f64, f64)>; 3] = Default::default();
    for q in [4, 6, 8, 12] {
        let level =
            Level::solve(&arrangement, &options, q, None, &LevelParams::default(), &mut |_, _| {}).unwrap();
        let potential = level.neutral();
        let wrench = level.wrench(potential);
        let charge = level.matrix[1][0] * potential[0] + level.matrix[1][1] * potential[1];
        let computed = [charge, wrench.force[2], wrench.torque[1]];
        let exact = ["capacitance", "force_z", "torque_y"].map(|key| number(case.value(key)));
        for n in 0..3 {
            errors[n].push((q as f64, (computed[n] / exact[n] - 1.0).abs()));
        }
    }
    for (what, points) in ["charge", "force", "torque"].into_iter().zip(&errors) {
        let order = slope(points);
        assert!((1.85..2.15).contains(&order), "{what}: order {order}, {points:?}");
        assert!(points[3].1 < 2e-3, "{what}: {points:?}");
    }
}
