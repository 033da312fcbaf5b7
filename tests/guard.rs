//! Guard rings: against exact guarded strips, the exact corrections of a slot, and down to the ideal capacitor.

use tiltgap::validate::cases::{number, Family};
use tiltgap::validate::ideal;
use tiltgap::validate::posed_walls::guarded_below;
use tiltgap_meshes::{Arrangement, Dimensions, Guard, Plate, Pose, Which};
use tiltgap_solver::{Connection, Estimate, EPS0};

use crate::cases::{hold, hold_at, solve};

#[test]
fn exact_guarded_strips() {
    assert_eq!(hold("guarded-strips"), 40);
    hold_at("guarded-strips", 1e-5, [1e-5; 2]);
}

/// What the upper plate would feel from a guarded lower one is what a guarded upper plate feels from the same below it.
#[test]
fn a_guard_around_the_lower_plate_is_the_same_bench_upside_down() {
    let plate = |length_m: f64| Plate { length_m, width_m: 0.8 * length_m, thickness_m: 0.0 };
    let pose = Pose { gap_m: 0.1, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    for dimensions in [Dimensions::Two, Dimensions::Three] {
        let with = |around: Which, lower: Plate, upper: Plate| {
            let guard = Some(Guard { around, slot_m: 0.05, rim_m: 0.3 });
            let bench = Arrangement { guard, ..Arrangement::open(lower, upper, pose, dimensions) };
            solve(bench, Connection::Floating, 1e-3).unwrap()
        };
        let above = with(Which::Upper, plate(1.5), plate(1.0));
        let below = with(Which::Lower, plate(1.0), plate(1.5));
        let same = |a: Estimate, b: Estimate, scale: f64| {
            assert!((a.value - b.value).abs() < 1e-6 * scale, "{a:?} {b:?}")
        };
        let (c, f) = (above.capacitance_f.value, above.force_n[2].value.abs());
        same(above.capacitance_f, below.capacitance_f, c);
        let rings = [&above, &below].map(|a| a.guard.unwrap());
        same(rings[0].capacitance_f, rings[1].capacitance_f, c);
        for d in 0..3 {
            same(above.force_n[d], below.force_n[d], f);
            same(rings[0].ring.force_n[d], rings[1].ring.force_n[d], f);
            same(above.torque_centre_nm[d], below.torque_centre_nm[d], f);
        }
        // Without anything else around, action is reaction: the beam feels plate and ring together in both.
        for r in rings {
            same(r.beam.force_n[2], above.guard.unwrap().beam.force_n[2], f);
        }
    }
}

/// Each edge of the plate reaches half of the slot further, less the exact correction of a deep slot: to 1 % of that
/// correction.
#[test]
fn the_exact_correction_of_a_deep_slot() {
    let mut compared = 0;
    for case in Family::named("guard-gaps").cases {
        let ratio = case.geometry("guard_gap");
        if !(0.2..=1.0).contains(&ratio) {
            continue;
        }
        let gap = 0.1;
        let slot = ratio * gap;
        let solved = solve(guarded_below(slot, 3.0 * slot, gap), Connection::Grounded, 5e-6).unwrap();
        let correction = slot * number(case.value("shift_deep"));
        let found = 1.0 + slot - solved.capacitance_f.value / EPS0 * gap;
        assert!((found - correction).abs() < 0.01 * correction, "{}: {found} for {correction}", case.name());
        assert!((found - correction).abs() < 1e-4, "{}: {found} for {correction}", case.name());
        compared += 1;
    }
    assert!(compared >= 3);
}

/// The ideal capacitor, reached by real electrodes: with a narrow slot, k_C and k_F of the guarded plate go to 1 as the slot
/// does, in proportion to it.
#[test]
fn a_guarded_plate_goes_to_the_ideal_capacitor() {
    let findings = ideal::guarded().unwrap();
    assert!(findings.len() >= 6 && findings.iter().all(|f| f.holds()), "{findings:?}");
}
