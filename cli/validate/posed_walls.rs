//! Families with walls: striplines, a box around a pair, guards over a floor.

use tiltgap_meshes::{Arrangement, Clearances, Dimensions, Guard, Pose, Surroundings, Which};
use tiltgap_solver::{Connection, Estimate};

use super::cases::{number, Family};
use super::comparison::{unit_free, Held, Sort};
use super::trial::{bars, limits, solve, strip, Trial};

/// Width of the grounded plane on either side of a stripline, in heights: the field falls off by exp(-pi) each.
const PLANE_BESIDE: f64 = 4.0;

/// The upper plate is the strip; the lower plate, far wider, is all of the lower plane, and a lid is the upper one.
pub(super) fn striplines(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| case.group() == "stripline");
    posed
        .map(|case| {
            let solve = move |_| {
                let (width, lid) = (case.geometry("width"), case.geometry("planes"));
                let plane = strip(width + 2.0 * PLANE_BESIDE * lid, 0.0);
                let pose = Pose { gap_m: lid / 2.0, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
                let walls = Clearances { above_m: Some(lid), ..Clearances::default() };
                let bench = Arrangement {
                    surroundings: Surroundings::GroundedBox(walls),
                    ..Arrangement::open(plane, strip(width, 0.0), pose, Dimensions::Two)
                };
                let [charge] = limits(&bench, [6, 8, 12], |level| [level.matrix[1][1]])?;
                Ok(vec![Held { family, case }.plain("capacitance", Sort::Charge, charge)])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// A square box of half side S acts like a circle of radius 1.0787 S on a neutral pair (`truncation.json`).
const CIRCLE_OF_A_SQUARE: f64 = 1.0787;
/// Radii, in gaps, from which on the leading term is nearly all there is.
const NEAREST_CIRCLE: f64 = 10.0;
/// Gaps, in lengths, whose excess can be seen at the accuracy of a capacitance.
const NARROWEST_PAIR: f64 = 0.5;

/// A grounded box around a neutral pair: by how much the charge exceeds that in free space, which is 1.
pub(super) fn boxes(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| {
        case.geometry("radius") >= NEAREST_CIRCLE * case.geometry("gap")
            && case.geometry("gap") >= NARROWEST_PAIR
    });
    posed
        .map(|case| {
            let solve = move |accuracy: f64| {
                let gap = case.geometry("gap");
                let half_side = case.geometry("radius") / CIRCLE_OF_A_SQUARE;
                let side = Some(half_side - 0.5);
                let walls = Clearances {
                    hinge_side_m: side,
                    free_side_m: side,
                    below_m: Some(half_side - gap / 2.0),
                    above_m: Some(half_side + gap / 2.0),
                    ..Clearances::default()
                };
                let free = bars(1.0, gap, 0.0);
                let boxed = Arrangement { surroundings: Surroundings::GroundedBox(walls), ..free };
                let [free, boxed] =
                    [free, boxed].map(|bench| solve(bench, Connection::Floating, None, accuracy));
                let [free, boxed] = [free?.capacitance_f, boxed?.capacitance_f];
                let ratio = boxed.value / free.value;
                let relative = (free.uncertainty / free.value).hypot(boxed.uncertainty / boxed.value);
                let excess = Estimate { value: ratio - 1.0, uncertainty: ratio * relative };
                // What the leading term leaves out is taken to be as large as it is for the circle.
                let [leading, whole] = ["leading_term", "grounded"].map(|key| number(case.value(key)));
                let reference = [leading, (whole - leading).abs()];
                let name = ("excess in a box over free space", "leading_term");
                Ok(vec![Held { family, case }.number(name, Sort::Charge, excess, reference, 1.0)])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// A guarded lower plate on the potential of the floor under it, so that its back is without charge, with a guard as wide
/// as five gaps, under a plate that covers both.
pub fn guarded_below(slot_m: f64, thickness_m: f64, gap_m: f64) -> Arrangement {
    let guard = Guard { around: Which::Lower, slot_m, rim_m: 5.0 * gap_m };
    let counter = strip(1.0 + 2.0 * guard.margin_m(), 0.0);
    let pose = Pose { gap_m, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    Arrangement {
        guard: Some(guard),
        surroundings: Surroundings::GroundedFloor { below_m: gap_m },
        ..Arrangement::open(strip(1.0, thickness_m), counter, pose, Dimensions::Two)
    }
}

/// Slots, in gaps, that are posed: the correction of narrower ones is lost in the accuracy of a capacitance.
const SLOTS: [f64; 2] = [0.2, 1.0];
/// Gap of the guarded plate, in lengths.
const GUARDED_GAP: f64 = 0.1;
/// Thickness of a deep slot, in its widths.
const DEEP: f64 = 3.0;

/// Each edge of the plate reaches half of the slot further, less the exact correction of a deep slot.
pub(super) fn guard_gaps(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| {
        let ratio = case.geometry("guard_gap") / case.geometry("gap");
        (SLOTS[0]..=SLOTS[1]).contains(&ratio)
    });
    posed
        .map(|case| {
            let solve = move |accuracy: f64| {
                let slot = GUARDED_GAP * case.geometry("guard_gap") / case.geometry("gap");
                let bench = guarded_below(slot, DEEP * slot, GUARDED_GAP);
                let solved = solve(bench, Connection::Grounded, None, accuracy)?;
                let charge = unit_free(solved.capacitance_f);
                let length = super::comparison::times(charge, GUARDED_GAP);
                let [shift, open] = [case.value("shift_deep"), case.open("shift_deep")].map(number);
                let reference = [1.0 + slot * (1.0 - shift), slot * open];
                let name = ("effective length, deep slot", "shift_deep");
                Ok(vec![Held { family, case }.number(name, Sort::Charge, length, reference, 1.0)])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}
