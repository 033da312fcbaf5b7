//! Random benches: never a panic, never a number that cannot be.

use proptest::prelude::*;
use tiltgap_meshes::{
    Arrangement, ArrangementError, Dimensions, Film, GridOptions, Guard, Plate, Pose, Surroundings, Which,
};
use tiltgap_solver::{assess, Connection, Error, Hinge, Level, LevelParams, Params, Question};

fn arrangement() -> impl Strategy<Value = Arrangement> {
    let side = 0.3..1.0f64;
    let plate = move || {
        (side.clone(), side.clone()).prop_map(|(length_m, width_m)| Plate {
            length_m,
            width_m,
            thickness_m: 0.0,
        })
    };
    let pose = (0.01..0.5f64, -0.6..0.6f64, -0.6..0.6f64, -0.3..0.3f64, -0.3..0.3f64, any::<bool>());
    (plate(), plate(), pose, any::<bool>()).prop_map(|(lower, upper, (gap_m, a, b, dx, dy, plain), space)| {
        // Angles up to 60 % of what would touch.
        let tilt_rad = (a * gap_m / upper.length_m).atan();
        let roll_rad = if plain || !space { 0.0 } else { (b * gap_m / upper.width_m).atan() };
        let shift_m = [dx, if plain || !space { 0.0 } else { dy }];
        let dimensions = if space { Dimensions::Three } else { Dimensions::Two };
        let pose = Pose { gap_m, tilt_rad, roll_rad, shift_m };
        Arrangement::open(lower, upper, pose, dimensions)
    })
}

/// Thickness, guard ring, film, floor and box on top, in all combinations.
fn furnished() -> impl Strategy<Value = Arrangement> {
    let small = 0.01..0.2f64;
    let extras = (small.clone(), small.clone(), 0.02..0.1f64, 0.05..0.8f64, 1.0..8.0f64, small);
    (arrangement(), extras, 0..64u32).prop_map(
        |(bare, (thickness_m, rim_m, slot_m, part, permittivity_ratio, below_m), which)| {
            let has = |bit: u32| which & (1 << bit) != 0;
            let thick = |plate: Plate, bit: u32| Plate {
                thickness_m: if has(bit) { thickness_m } else { 0.0 },
                ..plate
            };
            let around = if has(2) { Which::Lower } else { Which::Upper };
            // With the ring the edges come nearer: half of the tilt leaves room for ring and film.
            let pose =
                Pose { tilt_rad: 0.5 * bare.pose.tilt_rad, roll_rad: 0.5 * bare.pose.roll_rad, ..bare.pose };
            Arrangement {
                lower: thick(bare.lower, 0),
                upper: thick(bare.upper, 1),
                pose,
                guard: has(3).then_some(Guard { around, slot_m, rim_m }),
                film: has(4).then_some(Film { thickness_m: 0.3 * part * pose.gap_m, permittivity_ratio }),
                surroundings: if has(5) {
                    Surroundings::GroundedFloor { below_m }
                } else {
                    Surroundings::Open
                },
                ..bare
            }
        },
    )
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 40, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn a_level_of_any_bench_is_physical(arrangement in prop_oneof![arrangement(), furnished()]) {
        let options = GridOptions::suited(&arrangement);
        let level = Level::solve(&arrangement, &options, 1, None, &LevelParams::default(), &mut |_, _| {});
        // A ring may come too near at a large tilt.
        if let (Err(Error::Arrangement(e)), Some(_)) = (&level, arrangement.guard) {
            prop_assert!(
                matches!(e, ArrangementError::Touching { .. } | ArrangementError::Folded { .. }),
                "{e}"
            );
            return Ok(());
        }
        let level = level.map_err(|e| TestCaseError::fail(e.to_string()))?;
        if arrangement.guard.is_none() {
            prop_assert_eq!(level.plate_charges, level.matrix);
        }
        let [[c11, c12], [c21, c22]] = level.matrix;
        // Maxwell: positive on the diagonal, negative off it, and some flux always leaves the pair.
        prop_assert!(c11 > 0.0 && c22 > 0.0 && c12 < 0.0 && c12 == c21);
        prop_assert!(c11 + c12 > 0.0 && c22 + c12 > 0.0);
        // Opposite charges attract, and the potential stays between those of the plates.
        prop_assert!(level.wrench(level.neutral()).force[2] < 0.0);
        let extremes = level.phi.iter().flatten().fold([0.0f64, 1.0], |m, &v| [m[0].min(v), m[1].max(v)]);
        prop_assert!(extremes[0] > -1e-2 && extremes[1] < 1.0 + 1e-2, "{extremes:?}");
    }

    #[test]
    fn wild_numbers_are_refused_or_solved(
        length in prop_oneof![Just(f64::NAN), Just(0.0), Just(-1.0), Just(1e-300), Just(1e300), 0.05..0.2f64],
        gap in prop_oneof![Just(f64::INFINITY), Just(0.0), Just(1e-200), 1e-3..1e-2f64],
        tilt in prop_oneof![Just(f64::NAN), Just(1.6), Just(-1.5), -0.05..0.05f64],
        voltage in prop_oneof![Just(0.0), Just(f64::NAN), Just(1e300), Just(100.0)],
        arm in prop_oneof![Just(0.0), Just(-1.0), Just(f64::NAN), Just(0.15)],
    ) {
        let plate = Plate { length_m: length, width_m: 0.1, thickness_m: 0.0 };
        let pose = Pose { gap_m: gap, tilt_rad: tilt, roll_rad: 0.0, shift_m: [0.0; 2] };
        let question = Question {
            arrangement: Arrangement::open(
                plate,
                plate,
                pose,
                Dimensions::Three,
            ),
            hinge: Some(Hinge { arm_m: arm, height_m: 0.0 }),
            connection: Connection::Grounded,
            voltage_v: voltage,
            relative_permittivity: 1.0,
        };
        let params = Params { accuracy: 0.1, memory_bytes: 1 << 27 };
        match assess(&question, &params, &mut |_| {}) {
            Ok(solved) => prop_assert!(solved.force_n[2].value < 0.0 && solved.force_n[2].value.is_finite()),
            Err(e) => prop_assert!(e.to_string().len() > 30, "{}", e),
        }
    }
}
