//! An insulating film on the lower plate.

use tiltgap_meshes::{
    Arrangement, ArrangementError, Dimensions, Film, GridOptions, Plate, Pose, Surroundings,
};
use tiltgap_solver::{cg, Connection, Error, Level, LevelParams};

use crate::cases::solve;

fn bench(dimensions: Dimensions, tilt_rad: f64) -> Arrangement {
    let plate = Plate { length_m: 0.1, width_m: 0.08, thickness_m: 0.0 };
    let pose = Pose { gap_m: 0.004, tilt_rad, roll_rad: 0.0, shift_m: [0.0; 2] };
    let film = Some(Film { thickness_m: 0.0005, permittivity_ratio: 2.3 });
    Arrangement { film, ..Arrangement::open(plate, plate, pose, dimensions) }
}

#[test]
fn between_insulating_walls_the_ideal_formula_is_exact() {
    for dimensions in [Dimensions::Two, Dimensions::Three] {
        for (thickness_m, permittivity_ratio) in [(0.0005, 2.3), (0.003, 80.0), (0.001, 0.2)] {
            let film = Some(Film { thickness_m, permittivity_ratio });
            let arrangement =
                Arrangement { film, surroundings: Surroundings::InsulatedWalls, ..bench(dimensions, 0.0) };
            let d: f64 = 0.004 - thickness_m + thickness_m / permittivity_ratio;
            assert!((arrangement.effective_gap_m() - d).abs() < 1e-15);
            let solved = solve(arrangement, Connection::Grounded, 1e-5).unwrap();
            for factor in [solved.factors.capacitance, solved.factors.force] {
                let k = factor.unwrap();
                assert!((k.value - 1.0).abs() < 1e-10 && (k.wedge - 1.0).abs() < 1e-14, "{k:?}");
            }
        }
    }
}

/// Force and torque of a level are the derivative of its capacitance: against central differences of re-solved benches.
#[test]
fn force_and_torque_are_the_derivative_of_the_energy() {
    let params =
        LevelParams { outer: cg::Params { tolerance: 1e-11, ..Default::default() }, inner_tolerance: 1e-9 };
    let options = GridOptions { far: 20.0, ..GridOptions::suited(&bench(Dimensions::Three, 0.0)) };
    let level = |arrangement: &Arrangement| {
        Level::solve(arrangement, &options, 2, None, &params, &mut |_, _| {}).unwrap()
    };
    let at = bench(Dimensions::Three, 0.02);
    let wrench = level(&at).wrench([0.0, 1.0]);
    // In units of the grid: half of the slope of C22.
    let slope = |step: f64, moved: &dyn Fn(f64) -> Arrangement| {
        let c = |s: f64| level(&moved(s)).matrix[1][1];
        (8.0 * (c(step) - c(-step)) - (c(2.0 * step) - c(-2.0 * step))) / (24.0 * step)
    };
    let size = at.size_m();
    let up =
        slope(3e-4, &|s| Arrangement { pose: Pose { gap_m: at.pose.gap_m + s * size, ..at.pose }, ..at });
    // Tilt turns against the sense of a torque about y.
    let turn =
        -slope(1e-3, &|s| Arrangement { pose: Pose { tilt_rad: at.pose.tilt_rad + s, ..at.pose }, ..at });
    // Re-solved, the grid beyond the plate moves along rigidly, while the derivative stretches it: without a film too they
    // differ by 4e-6 at this level.
    assert!((wrench.force[2] / up - 1.0).abs() < 1e-5, "{} {up}", wrench.force[2]);
    assert!((wrench.torque[1] / turn - 1.0).abs() < 1e-5, "{} {turn}", wrench.torque[1]);
}

/// A film of the medium's own permittivity is no film.
#[test]
fn a_film_like_the_medium_changes_nothing() {
    let film = Some(Film { thickness_m: 0.001, permittivity_ratio: 1.0 });
    for dimensions in [Dimensions::Two, Dimensions::Three] {
        let with = Arrangement { film, ..bench(dimensions, 0.02) };
        let without = Arrangement { film: None, ..with };
        let [with, without] = [with, without].map(|a| solve(a, Connection::Floating, 1e-4).unwrap());
        for (a, b) in [(with.capacitance_f, without.capacitance_f), (with.force_n[2], without.force_n[2])] {
            let stated = a.uncertainty.hypot(b.uncertainty);
            assert!((a.value - b.value).abs() < 3.0 * stated, "{a:?} {b:?}");
        }
    }
}

#[test]
fn a_film_that_does_not_fit_is_refused() {
    let check = |arrangement: Arrangement| match solve(arrangement, Connection::Floating, 1e-3) {
        Err(Error::Arrangement(e)) => e,
        other => panic!("{other:?}"),
    };
    let thick = |thickness_m: f64| Some(Film { thickness_m, permittivity_ratio: 2.0 });
    let touching = Arrangement { film: thick(0.0035), ..bench(Dimensions::Three, 0.02) };
    let error = check(touching);
    assert!(matches!(error, ArrangementError::Touching { surface: "film", .. }), "{error}");
    assert!(error.to_string().contains("the hinge (-x) edge of the upper plate would stand"), "{error}");
    let absurd = Arrangement { film: thick(1e-9), ..bench(Dimensions::Three, 0.0) };
    assert!(matches!(check(absurd), ArrangementError::Detail { .. }));
    let permittivity = Some(Film { thickness_m: 0.001, permittivity_ratio: f64::NAN });
    let error = check(Arrangement { film: permittivity, ..bench(Dimensions::Three, 0.0) });
    assert!(matches!(error, ArrangementError::FilmPermittivity { .. }));
}
