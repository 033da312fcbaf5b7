//! Thick plates: exact bars in the plane, plates in space, and down to sheets.

use tiltgap::validate::trial::bars;
use tiltgap_meshes::{Arrangement, Dimensions, Plate, Pose};
use tiltgap_solver::{Connection, Estimate, EPS0};

use crate::cases::{hold, solve};

#[test]
fn exact_bars() {
    assert!(hold("strips-thick") >= 60);
}

/// A millionth of the length is nearly a sheet, and its fringe a little larger: by the terms in tau = t/d of the small-gap
/// form of the case file.
#[test]
fn a_very_thin_plate_is_nearly_a_sheet() {
    let (length, gap, thickness) = (1.0, 0.1, 1e-6);
    let of = |thickness: f64| solve(bars(length, gap, thickness), Connection::Floating, 3e-5).unwrap();
    let (sheet, plate) = (of(0.0), of(thickness));
    let tau = thickness / gap;
    let edge = gap / (std::f64::consts::PI * length);
    let by_force = edge * tau * (1.0 + 1.0 / tau).ln();
    let by_charge = edge * (1.0 + tau).ln() + by_force;
    let units = EPS0 * length / gap;
    for (more, less, predicted, units) in [
        (plate.capacitance_f, sheet.capacitance_f, by_charge, units),
        (negative(plate.force_n[2]), negative(sheet.force_n[2]), by_force, units / (2.0 * gap)),
    ] {
        let grown = (more.value - less.value) / units;
        assert!(grown > 0.0 && grown < 1e-4, "{grown}");
        assert!((grown / predicted - 1.0).abs() < 0.3, "{grown} for {predicted}");
    }
}

fn negative(e: Estimate) -> Estimate {
    Estimate { value: -e.value, ..e }
}

/// In space the metal of a tilted, rolled bench of two very thin plates costs no accuracy either.
#[test]
fn a_very_thin_plate_in_space() {
    let plate = |thickness_m: f64| Plate { length_m: 1.0, width_m: 0.8, thickness_m };
    let pose = Pose { gap_m: 0.1, tilt_rad: 0.05, roll_rad: 0.02, shift_m: [0.02, 0.0] };
    let of = |t: f64| {
        let bench = Arrangement::open(plate(t), plate(t), pose, Dimensions::Three);
        solve(bench, Connection::Grounded, 1e-3).unwrap()
    };
    let (sheet, plate) = (of(0.0), of(1e-6));
    let grown = |f: fn(&tiltgap_solver::Assessment) -> f64| f(&plate) / f(&sheet) - 1.0;
    for grown in [grown(|a| a.capacitance_f.value), grown(|a| a.force_n[2].value)] {
        assert!(grown > 0.0 && grown < 1e-4, "{grown}");
    }
}
