//! Grounded floor and box: images, stripline, and open space as the limit of a large box.

use tiltgap_meshes::{
    Arrangement, ArrangementError, Clearances, Dimensions, GridOptions, Plate, Pose, Surroundings,
};
use tiltgap_solver::{extrapolate, Connection, Error, Level, LevelParams, EPS0};

use crate::cases::{family, name, number, solve};

fn strips(gap_m: f64) -> Arrangement {
    let plate = Plate { length_m: 1.0, width_m: 1.0, thickness_m: 0.0 };
    let pose = Pose { gap_m, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    Arrangement::open(plate, plate, pose, Dimensions::Two)
}

/// The limit of a number of the levels 6, 8 and 12.
fn limit(arrangement: &Arrangement, number: impl Fn(&Level) -> f64) -> f64 {
    let options = GridOptions::suited(arrangement);
    let levels = [6, 8, 12];
    let values = levels.map(|q| {
        let params = LevelParams::default();
        number(&Level::solve(arrangement, &options, q, None, &params, &mut |_, _| {}).unwrap())
    });
    extrapolate(levels.map(|q| q as f64), values, None).value
}

/// A strip over a floor holds and feels, at half the distance and half the voltage, what each of a pair does. The strip is
/// the lower plate; the upper one is short, far off, across the field and without charge, so that it changes nothing.
#[test]
fn a_plate_over_a_grounded_plane_is_half_a_pair_at_twice_the_distance() {
    let mut compared = 0;
    for case in family("strips-parallel") {
        let delta = number(&case["geometry"]["gap"]);
        if !(0.02..=1.0).contains(&delta) {
            continue;
        }
        let below_m = delta / 2.0;
        let open = strips(0.5);
        let bench = Arrangement {
            upper: Plate { length_m: 0.05, ..open.upper },
            surroundings: Surroundings::GroundedFloor { below_m },
            ..open
        };
        let idle = |level: &Level| [1.0, -level.matrix[1][0] / level.matrix[1][1]];
        let charge = limit(&bench, |l| l.matrix[0][0] + idle(l)[1] * l.matrix[0][1]) * below_m;
        let force = limit(&bench, |l| l.wrench_on_lower(idle(l)).force[2]) * -2.0 * below_m.powi(2);
        let value = |key: &str| number(&case["value"][key]);
        for (found, exact) in [(charge, value("capacitance_factor")), (force, value("force_factor"))] {
            assert!((found / exact - 1.0).abs() < 1e-4, "{}: {found} for {exact}", name(&case));
        }
        compared += 1;
    }
    assert!(compared >= 5);
}

/// The upper plate is the strip; the lower plate, far wider, is all of the lower plane.
#[test]
fn stripline() {
    let mut compared = 0;
    for case in family("closed-domains").iter().filter(|case| case["group"] == "stripline") {
        let width = number(&case["geometry"]["width"]);
        let (lid, far) = (1.0, 8.0);
        let strip = Plate { length_m: width, width_m: 1.0, thickness_m: 0.0 };
        let plane = Plate { length_m: width + far, width_m: 1.0, thickness_m: 0.0 };
        let pose = Pose { gap_m: lid / 2.0, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
        let walls = Clearances { above_m: Some(lid), ..Clearances::default() };
        let bench = Arrangement {
            surroundings: Surroundings::GroundedBox(walls),
            ..Arrangement::open(plane, strip, pose, Dimensions::Two)
        };
        let exact = number(&case["value"]["capacitance"]);
        let found = limit(&bench, |level| level.matrix[1][1]);
        assert!((found / exact - 1.0).abs() < 1e-4, "{}: {found} for {exact}", name(case));
        let force = limit(&bench, |level| level.wrench([0.0, 1.0]).force[2]);
        assert!(force.abs() < 1e-4 * exact, "midway there is no force: {force}");
        compared += 1;
    }
    assert!(compared >= 4);
}

/// A square box of half side S around a neutral pair acts like a circle of radius 1.0787 S: the capacitance exceeds that in
/// open space by gap^2 C/(2 pi radius^2), leading term (truncation.json).
#[test]
fn a_large_box_is_open_space_at_the_predicted_rate() {
    let gap = 0.5;
    let open = solve(strips(gap), Connection::Floating, 3e-6).unwrap().capacitance_f.value / EPS0;
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
        let bench = Arrangement { surroundings: Surroundings::GroundedBox(walls), ..strips(gap) };
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
