//! Two thin strips in the plane against exact values (theta-function map, see `reference-cases/strips.json`).

use tiltgap_meshes::ArrangementError;
use tiltgap_solver::Error;

use crate::cases::{
    assert_within, narrowness, strip_checks, strip_target, strips_at, strips_at_default, Solved, DEFAULT,
};

/// Near-edge gap, in units of the centre gap, below which a case counts as nearly touching.
const NEARLY_TOUCHING: f64 = 0.03;
/// Relative error allowed to nearly touching plates.
const NEARLY_TOUCHING_LIMIT: f64 = 1e-3;

/// Every case within `limit`, or within the wider one where the plates nearly touch. A case may be out of reach of the
/// accuracy, and say so, only where the edge gap is below `reach` of the centre gap.
fn all_within(cases: &[Solved], accuracy: f64, limit: f64, reach: f64) {
    let mut solved_cases = 0;
    for (case, solved) in cases {
        let near = narrowness(case);
        match solved {
            Ok(solved) => {
                solved_cases += 1;
                let limit = if near < NEARLY_TOUCHING { NEARLY_TOUCHING_LIMIT } else { limit };
                strip_checks(case, solved).iter().for_each(|check| assert_within(check, limit));
            }
            // A grid that folds is refused with a sentence; that happens only where the edges nearly touch.
            Err(Error::Arrangement(e @ ArrangementError::Folded { .. })) => {
                assert!(near < 0.07, "{}: {e}", case.name());
                assert!(e.to_string().contains("nearer than the fitted grid can follow"));
            }
            Err(Error::AccuracyNotReached { force, torque, .. }) => {
                assert!(near < reach && force.max(*torque) > accuracy, "{}", case.name())
            }
            Err(e) => panic!("{}: {e}", case.name()),
        }
    }
    assert!(solved_cases >= 82, "only {solved_cases} cases were solved");
}

#[test]
fn exact_strips_at_the_default_accuracy() {
    all_within(strips_at_default(), DEFAULT, strip_target(), 0.06);
}

#[test]
fn exact_strips_at_a_high_accuracy() {
    all_within(&strips_at(1e-5), 1e-5, 1e-5, 0.2);
}
