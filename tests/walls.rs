//! Grounded floor and box: images, stripline, and open space as the limit of a large box.

use tiltgap::validate::trial::bars;
use tiltgap_meshes::{Arrangement, ArrangementError, Clearances, Dimensions, Plate, Pose, Surroundings};
use tiltgap_solver::{Connection, Error, EPS0};

use crate::cases::{hold, solve};

/// A strip over a floor is half a pair at twice the distance: the family poses both.
#[test]
fn a_plate_over_a_grounded_plane_and_a_pair_are_the_exact_strips() {
    assert!(hold("strips-parallel") >= 28);
}

#[test]
fn stripline() {
    assert_eq!(hold("closed-domains"), 4);
}

#[test]
fn boxes_around_a_pair() {
    assert!(hold("truncation") >= 5);
}

/// A square box of half side S around a neutral pair acts like a circle of radius 1.0787 S: the capacitance exceeds that in
/// open space by gap^2 C/(2 pi radius^2), leading term (truncation.json).
#[test]
fn a_large_box_is_open_space_at_the_predicted_rate() {
    let gap = 0.5;
    let open = solve(bars(1.0, gap, 0.0), Connection::Floating, 3e-6).unwrap().capacitance_f.value / EPS0;
    let mut excess = Vec::new();
    for half_side in [5.0, 10.0] {
        let side = Some(half_side - 0.5);
        let walls = Clearances {
            hinge_side_m: side,
            free_side_m: side,
            below_m: Some(half_side - gap / 2.0),
            above_m: Some(half_side + gap / 2.0),
            ..Clearances::default()
        };
        let bench = Arrangement { surroundings: Surroundings::GroundedBox(walls), ..bars(1.0, gap, 0.0) };
        let boxed = solve(bench, Connection::Floating, 3e-6).unwrap().capacitance_f.value / EPS0;
        let found = boxed / open - 1.0;
        let radius: f64 = 1.0787 * half_side;
        let predicted = gap * gap * open / (2.0 * std::f64::consts::PI * radius.powi(2));
        assert!((found / predicted - 1.0).abs() < 0.02, "{half_side}: {found:e} for {predicted:e}");
        excess.push(found);
    }
    let order = (excess[0] / excess[1]).log2();
    assert!((order - 2.0).abs() < 0.05, "{order}");
}

/// In space the same, and more: with the lid and walls so far away only the floor is left.
#[test]
fn a_floor_far_below_is_open_space() {
    let plate = Plate { length_m: 0.1, width_m: 0.1, thickness_m: 0.002 };
    let pose = Pose { gap_m: 0.01, tilt_rad: 0.03, roll_rad: 0.01, shift_m: [0.0; 2] };
    let open = Arrangement::open(plate, plate, pose, Dimensions::Three);
    let force = |surroundings| {
        let solved = solve(Arrangement { surroundings, ..open }, Connection::Floating, 3e-4).unwrap();
        (solved.capacitance_f.value, solved.force_n[2].value)
    };
    let alone = force(Surroundings::Open);
    let over = |below_m: f64| force(Surroundings::GroundedFloor { below_m });
    let (near, far) = (over(0.2), over(1.0));
    let off = |a: (f64, f64)| [(a.0 / alone.0 - 1.0).abs(), (a.1 / alone.1 - 1.0).abs()];
    assert!(off(far).iter().all(|v| *v < 2e-4), "{:?}", off(far));
    assert!(off(near)[0] > off(far)[0]);
}

#[test]
fn walls_that_cut_a_plate_are_refused() {
    let plate = Plate { length_m: 0.1, width_m: 0.08, thickness_m: 0.002 };
    let pose = Pose { gap_m: 0.004, tilt_rad: 0.04, roll_rad: 0.0, shift_m: [0.01, 0.0] };
    let open = Arrangement::open(plate, plate, pose, Dimensions::Three);
    let error = |walls: Clearances| {
        let bench = Arrangement { surroundings: Surroundings::GroundedBox(walls), ..open };
        match solve(bench, Connection::Grounded, 1e-3) {
            Err(Error::Arrangement(e)) => e,
            other => panic!("{other:?}"),
        }
    };
    let none = Clearances::default();
    for (walls, name) in [
        (Clearances { above_m: Some(0.007), ..none }, "above"),
        (Clearances { free_side_m: Some(0.005), ..none }, "free side"),
    ] {
        let e = error(walls);
        assert!(matches!(&e, ArrangementError::Cut { wall, .. } if *wall == name), "{e}");
        assert!(e.to_string().contains("raise that clearance"), "{e}");
    }
    assert_eq!(error(none), ArrangementError::NoWall);
    let e = error(Clearances { left_m: Some(-0.01), ..none });
    assert!(matches!(e, ArrangementError::Detail { what: "clearance on the left", .. }), "{e}");
    assert!(matches!(error(Clearances { below_m: Some(f64::NAN), ..none }), ArrangementError::Detail { .. }));
}
