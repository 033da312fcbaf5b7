//! Down to the ideal capacitor: insulating walls make the factors exactly one, and in open space they approach one
//! with the published slopes.

use tiltgap_meshes::{Arrangement, Dimensions, Plate, Pose, Surroundings};
use tiltgap_solver::{assess, Connection, Hinge, Params, Question};

fn bench(surroundings: Surroundings, dimensions: Dimensions, gap_m: f64) -> Arrangement {
    let plate = Plate { length_m: 0.1, width_m: 0.08, thickness_m: 0.0 };
    let pose = Pose { gap_m, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    Arrangement { surroundings, ..Arrangement::open(plate, plate, pose, dimensions) }
}

/// k_C, k_F and k_T.
fn factors(arrangement: Arrangement, connection: Connection) -> [f64; 3] {
    let hinge = Some(Hinge { arm_m: 0.15, height_m: 0.0 });
    let question =
        Question { arrangement, hinge, connection, voltage_v: 300.0, relative_permittivity: 1.0006 };
    let f = assess(&question, &Params { accuracy: 1e-5, ..Params::default() }, &mut |_| {}).unwrap().factors;
    [f.capacitance, f.force, f.torque].map(|f| f.unwrap().value)
}

#[test]
fn insulating_walls_make_the_factors_one() {
    for dimensions in [Dimensions::Two, Dimensions::Three] {
        for connection in [Connection::Grounded, Connection::Floating] {
            for gap_m in [0.0005, 0.004, 0.05] {
                let k = factors(bench(Surroundings::InsulatedWalls, dimensions, gap_m), connection);
                assert!(
                    k.iter().all(|k| (k - 1.0).abs() < 1e-10),
                    "{dimensions:?} {connection:?} {gap_m}: {k:?}"
                );
            }
        }
    }
}

#[test]
fn strips_approach_one_with_the_published_slopes() {
    // Palmer, Electrical Engineering 56, 363 (1937), from memory, and the closed form of the force factor that follows
    // from Love's map (reference-cases/strips-parallel.json): k_C = 1 + delta/pi (1 + ln(2 pi/delta)), k_F = 1 +
    // delta/pi; at delta = 0.005 their own error is below 3e-5.
    let pi = std::f64::consts::PI;
    let mut before = [f64::INFINITY; 2];
    for delta in [0.02, 0.01, 0.005] {
        let [k_c, k_f, _] =
            factors(bench(Surroundings::Open, Dimensions::Two, 0.1 * delta), Connection::Floating);
        let excess = [delta / pi * (1.0 + (2.0 * pi / delta).ln()), delta / pi];
        let slope = [(k_c - 1.0) / excess[0], (k_f - 1.0) / excess[1]];
        let limit = 2.0 * delta;
        assert!(slope.iter().all(|s| (s - 1.0).abs() < limit), "{delta}: {slope:?}");
        assert!(k_c - 1.0 < before[0] && k_f - 1.0 < before[1] && k_f > 1.0);
        before = [k_c - 1.0, k_f - 1.0];
    }
}

#[test]
fn plates_approach_one_and_the_torque_with_them() {
    // The force excess of thin plates is at most the perimeter rule P d/(2 pi A), which corners lower
    // (reference-cases/squares.json: 1.0114 for 1.0127 at delta = 0.02).
    let pi = std::f64::consts::PI;
    let mut before = f64::INFINITY;
    for gap_m in [0.004, 0.002, 0.001] {
        let [k_c, k_f, k_t] =
            factors(bench(Surroundings::Open, Dimensions::Three, gap_m), Connection::Floating);
        let rule = 2.0 * (0.1 + 0.08) * gap_m / (2.0 * pi * 0.1 * 0.08);
        let share = (k_f - 1.0) / rule;
        assert!((0.8..1.0).contains(&share), "{gap_m}: {share}");
        assert!((k_t - k_f).abs() < 1e-4 && k_c > k_f && k_c < before);
        before = k_c;
    }
}
