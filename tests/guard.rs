//! Guard rings: against exact guarded strips, the exact corrections of a slot, and down to the ideal capacitor.

use tiltgap_meshes::{Arrangement, Dimensions, Guard, Plate, Pose, Surroundings, Which};
use tiltgap_solver::{Assessment, Connection, Estimate, EPS0};

use crate::cases::{family, name, number, solve, Check, DEFAULT};

fn guarded(case: &serde_json::Value) -> Arrangement {
    let g = &case["geometry"];
    let plate = |key: &str| Plate { length_m: number(&g[key]), width_m: 1.0, thickness_m: 0.0 };
    let pose = Pose {
        gap_m: number(&g["gap"]),
        tilt_rad: number(&g["tilt_deg"]).to_radians(),
        roll_rad: 0.0,
        shift_m: [0.0; 2],
    };
    let guard = Guard { around: Which::Upper, slot_m: number(&g["slot"]), rim_m: number(&g["rim"]) };
    let open = Arrangement::open(plate("counter_length"), plate("length"), pose, Dimensions::Two);
    Arrangement { guard: Some(guard), ..open }
}

fn checks(case: &serde_json::Value, solved: &Assessment) -> Vec<Check> {
    let of = |key: &str| number(&case["value"][key]);
    let force = of("force_z").abs();
    let check = |what: &str, computed: Estimate, key: &str, scale: f64| {
        Check::new(format!("{} {what}", name(case)), computed, of(key), 0.0, scale)
    };
    vec![
        check("C", solved.capacitance_f, "capacitance", of("capacitance")),
        check(
            "C of the guard",
            solved.guard.unwrap().capacitance_f,
            "guard_capacitance",
            of("guard_capacitance"),
        ),
        check("force x", solved.force_n[0], "force_x", force),
        check("force z", solved.force_n[2], "force_z", force),
        check("torque", solved.torque_centre_nm[1], "torque_y", 0.05 * force),
    ]
}

#[test]
fn exact_guarded_strips() {
    for (accuracy, limit) in [(DEFAULT, 1e-4), (1e-5, 1e-5)] {
        for case in family("guarded-strips") {
            let solved = solve(guarded(&case), Connection::Floating, accuracy).unwrap();
            for check in checks(&case, &solved) {
                check.assert_within(limit);
            }
        }
    }
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

/// A guarded lower plate on the potential of the floor under it, so that its back is without charge, with a guard as wide
/// as five gaps.
fn guarded_below(slot_m: f64, thickness_m: f64, gap_m: f64) -> Arrangement {
    let guard = Guard { around: Which::Lower, slot_m, rim_m: 5.0 * gap_m };
    let plate = |length_m: f64, thickness_m: f64| Plate { length_m, width_m: 1.0, thickness_m };
    let counter = plate(1.0 + 2.0 * guard.margin_m(), 0.0);
    let pose = Pose { gap_m, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    Arrangement {
        guard: Some(guard),
        surroundings: Surroundings::GroundedFloor { below_m: gap_m },
        ..Arrangement::open(plate(1.0, thickness_m), counter, pose, Dimensions::Two)
    }
}

/// Each edge of the plate reaches half of the slot further, less the exact correction of a deep slot: to 1 % of that
/// correction.
#[test]
fn the_exact_correction_of_a_deep_slot() {
    let mut compared = 0;
    for case in family("guard-gaps") {
        let ratio = number(&case["geometry"]["guard_gap"]);
        if !(0.2..=1.0).contains(&ratio) {
            continue;
        }
        let gap = 0.1;
        let slot = ratio * gap;
        let solved = solve(guarded_below(slot, 3.0 * slot, gap), Connection::Grounded, 5e-6).unwrap();
        let correction = slot * number(&case["value"]["shift_deep"]);
        let found = 1.0 + slot - solved.capacitance_f.value / EPS0 * gap;
        assert!((found - correction).abs() < 0.01 * correction, "{}: {found} for {correction}", name(&case));
        assert!((found - correction).abs() < 1e-4, "{}: {found} for {correction}", name(&case));
        compared += 1;
    }
    assert!(compared >= 3);
}

/// The ideal capacitor, reached by real electrodes: with a narrow slot, k_C and k_F of the guarded plate go to 1 as the slot
/// does, in proportion to it.
#[test]
fn a_guarded_plate_goes_to_the_ideal_capacitor() {
    let mut last = f64::INFINITY;
    for slot in [4e-3, 1e-3, 2.5e-4] {
        let solved = solve(guarded_below(slot, 0.0, 0.05), Connection::Grounded, DEFAULT).unwrap();
        let [c, f] = [solved.factors.capacitance, solved.factors.force].map(|k| k.unwrap().value);
        // Half of the slot on either side belongs to the plate.
        for k in [c, f] {
            assert!((k - 1.0 - slot).abs() < 0.1 * slot + 1e-4, "{slot}: {k}");
            assert!((k - 1.0).abs() < last);
        }
        last = c - 1.0;
    }
    assert!(last < 4e-4);
}

/// The same in space: both pairs of edges reach half of the slot further, and what a narrow slot takes away from that is
/// smaller than the uncertainty.
#[test]
fn a_guarded_plate_in_space_goes_to_the_ideal_capacitor() {
    let (slot_m, rim_m) = (1e-4, 0.02);
    let plate = |margin_m: f64| Plate {
        length_m: 0.11 + 2.0 * margin_m,
        width_m: 0.09 + 2.0 * margin_m,
        thickness_m: 0.0,
    };
    let pose = Pose { gap_m: 0.004, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    let bench = Arrangement {
        guard: Some(Guard { around: Which::Lower, slot_m, rim_m }),
        surroundings: Surroundings::GroundedFloor { below_m: 0.01 },
        ..Arrangement::open(plate(0.0), plate(slot_m + rim_m), pose, Dimensions::Three)
    };
    let solved = solve(bench, Connection::Grounded, DEFAULT).unwrap();
    let expected = 1.0 + slot_m / 0.11 + slot_m / 0.09;
    for k in [solved.factors.capacitance, solved.factors.force].map(|k| k.unwrap()) {
        assert!((k.value - expected).abs() < 1e-4, "{k:?} for {expected}");
        assert!(k.uncertainty <= 1e-4);
    }
}
