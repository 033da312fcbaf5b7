//! Rectangular plates, thin and thick, in space against boundary elements (see `reference-cases/plates.json`).

use crate::cases::{assert_within, hold_at, plates_at_default};

#[test]
fn rectangular_plates_at_the_default_accuracy() {
    plates_at_default().iter().for_each(|c| assert_within(c, c.target));
}

#[test]
fn rectangular_plates_at_a_high_accuracy() {
    hold_at("plates", 1e-5, [3e-5, 6e-5]);
}
