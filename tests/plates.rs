//! Rectangular plates, thin and thick, in space against boundary elements (see `reference-cases/plates.json`).

use crate::cases::{plate_checks, plates_at, plates_at_default, SolvedPlates};

/// Every case in both connections, within the limits for charges and for force and torque, beyond what the
/// reference itself leaves open.
fn all_within(cases: &[SolvedPlates], charge_limit: f64, force_limit: f64) {
    for (case, connection, solved) in cases {
        let (charges, forces) = plate_checks(case, *connection, solved);
        charges.iter().for_each(|check| check.assert_within(charge_limit));
        forces.iter().for_each(|check| check.assert_within(force_limit));
    }
}

#[test]
fn rectangular_plates_at_the_default_accuracy() {
    all_within(plates_at_default(), 1e-4, 2e-4);
}

#[test]
fn rectangular_plates_at_a_high_accuracy() {
    all_within(&plates_at(1e-5), 3e-5, 6e-5);
}
