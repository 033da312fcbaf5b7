//! Two thin strips in the plane against exact values (theta-function map, see `reference-cases/strips.json`).

use tiltgap_meshes::ArrangementError;
use tiltgap_solver::{Connection, Error};

use crate::cases::{family, name, number, solve, strip_checks, strips};

/// Near-edge gap, in units of the centre gap, below which a case counts as nearly touching.
const NEARLY_TOUCHING: f64 = 0.03;

/// Every case at the given accuracy, within `limits`: the first in general, the second for nearly touching plates.
fn all_within(accuracy: f64, limits: [f64; 2]) {
    let mut solved_cases = 0;
    for case in family("strips") {
        let arrangement = strips(&case);
        let near = case["near_edge_gap"].as_f64().unwrap_or(f64::INFINITY) / number(&case["geometry"]["gap"]);
        match solve(arrangement, Connection::Floating, accuracy) {
            Ok(solved) => {
                solved_cases += 1;
                let limit = limits[usize::from(near < NEARLY_TOUCHING)];
                strip_checks(&case, &solved).iter().for_each(|check| check.assert_within(limit));
            }
            // A grid that folds is refused with a sentence; that happens only where the edges nearly touch.
            Err(Error::Arrangement(e @ ArrangementError::Folded { .. })) => {
                assert!(near < 0.07, "{}: {e}", name(&case));
                assert!(e.to_string().contains("nearer than the fitted grid can follow"));
            }
            // Plates that all but touch are out of reach of the accuracy, and the program says so.
            Err(Error::AccuracyNotReached { force, torque, .. }) => {
                assert!(near < 0.06 && force.max(torque) > accuracy, "{}", name(&case))
            }
            Err(e) => panic!("{}: {e}", name(&case)),
        }
    }
    assert!(solved_cases >= 85, "only {solved_cases} cases were solved");
}

#[test]
fn exact_strips_at_the_default_accuracy() {
    all_within(1e-4, [2e-4, 1e-3]);
}

#[test]
fn exact_strips_at_a_high_accuracy() {
    all_within(1e-5, [2e-5, 1e-3]);
}
