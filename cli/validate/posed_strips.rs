//! Families of the plane in free space: strips parallel, tilted, unequal, guarded, and bars.

use tiltgap_meshes::{Arrangement, Dimensions, Guard, Plate, Pose, Which};
use tiltgap_solver::{Assessment, Connection, Estimate, Hinge};

use super::cases::{number, Case, Family};
use super::comparison::{times, unit_free, Comparison, Held, Sort};
use super::trial::{bars, limits, solve, strip, Checks, Trial};

/// Lever, in units of the lower plate's length, at which a force counts where a torque is small: a torque about the
/// centre is known no better than the force at a twentieth of the length.
pub const LEVER: f64 = 0.05;
/// Edge gap, in units of the centre gap, below which the fitted grid comes to its limit.
const NARROWEST: f64 = 0.07;
/// Widest gap of the plane, in lengths.
const WIDEST: f64 = 2.0;
/// Widest opening of a wedge, in degrees.
const WIDEST_OPENING: f64 = 20.0;

/// The strips of a case in the convention of `strips.json`; `key` is where it stands.
pub fn placed(case: &Case, key: &str) -> Arrangement {
    let g = |name: &str| number(&case.0[key][name]);
    let tilt_rad = g("tilt_deg").to_radians();
    let pose = Pose { gap_m: g("gap"), tilt_rad, roll_rad: 0.0, shift_m: [g("shift_x"), 0.0] };
    Arrangement::open(strip(g("lower_length"), 0.0), strip(g("upper_length"), 0.0), pose, Dimensions::Two)
}

/// Charge, force and torque of a solved case of strips.
pub fn strip_checks(held: &Held, solved: &Assessment) -> Vec<Comparison> {
    let of = |key: &str| number(held.case.value(key));
    let force = of("force_x").abs().max(of("force_z").abs());
    let check = |key: &str, sort: Sort, computed: Estimate, scale: f64| {
        let reference = [held.case.value(key), held.case.open(key)].map(number);
        held.number((key, key), sort, unit_free(computed), reference, scale)
    };
    vec![
        check("capacitance", Sort::Charge, solved.capacitance_f, of("capacitance")),
        check("force_x", Sort::Force, solved.force_n[0], force),
        check("force_z", Sort::Force, solved.force_n[2], force),
        check("torque_y", Sort::Force, solved.torque_centre_nm[1], of("torque_y").abs().max(LEVER * force)),
    ]
}

/// Whether the upper strip keeps clear of where the grid has its limit.
fn in_reach(arrangement: &Arrangement) -> bool {
    arrangement.narrowness() >= NARROWEST
}

pub(super) fn strips(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| in_reach(&placed(case, "geometry")));
    posed
        .map(|case| {
            let solve = move |accuracy| {
                let solved = solve(placed(case, "geometry"), Connection::Floating, None, accuracy)?;
                Ok(strip_checks(&Held { family, case }, &solved))
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// The hinge of a wedge is its apex.
pub(super) fn wedges(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| case.geometry("opening_deg") <= WIDEST_OPENING);
    let posed = posed.filter(|case| {
        let bench = placed(case, "placement");
        in_reach(&bench) && bench.pose.gap_m <= bench.size_m()
    });
    posed
        .map(|case| {
            let solve = move |accuracy| {
                let arm_m = 0.5 * (case.geometry("inner_radius") + case.geometry("outer_radius"));
                let hinge = Some(Hinge { arm_m, height_m: 0.0 });
                let solved = solve(placed(case, "placement"), Connection::Floating, hinge, accuracy)?;
                let held = Held { family, case };
                let torque = solved.torque_hinge_nm.unwrap_or_default()[1];
                Ok(vec![
                    held.plain("capacitance", Sort::Charge, unit_free(solved.capacitance_f)),
                    held.plain("torque_apex", Sort::Force, unit_free(torque)),
                ])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// The hinge is the end of the upper strip at -x.
pub(super) fn hinged(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| in_reach(&placed(case, "geometry")));
    posed
        .map(|case| {
            let solve = move |accuracy| {
                let arm_m = 0.5 * case.geometry("upper_length");
                let hinge = Some(Hinge { arm_m, height_m: 0.0 });
                let solved = solve(placed(case, "geometry"), Connection::Floating, hinge, accuracy)?;
                let held = Held { family, case };
                let torque = solved.torque_hinge_nm.unwrap_or_default()[1];
                let force = number(case.value("force_z")).abs();
                let [x, open] = [case.value("force_x"), case.open("force_x")].map(number);
                let force_x = unit_free(solved.force_n[0]);
                Ok(vec![
                    held.plain("capacitance", Sort::Charge, unit_free(solved.capacitance_f)),
                    held.number(("force_x", "force_x"), Sort::Force, force_x, [x, open], force),
                    held.plain("force_z", Sort::Force, unit_free(solved.force_n[2])),
                    held.plain("torque_hinge", Sort::Force, unit_free(torque)),
                ])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// The factors of two bars, or of two sheets.
fn factors(held: &Held, arrangement: Arrangement, accuracy: f64) -> Checks {
    let solved = solve(arrangement, Connection::Floating, None, accuracy)?;
    let of = |f: Option<tiltgap_solver::Factor>| {
        f.map_or(Estimate::default(), |f| Estimate { value: f.value, uncertainty: f.uncertainty })
    };
    Ok(vec![
        held.plain("capacitance_factor", Sort::Charge, of(solved.factors.capacitance)),
        held.plain("force_factor", Sort::Force, of(solved.factors.force)),
    ])
}

pub(super) fn thick(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| case.geometry("thickness") <= case.geometry("length"));
    posed
        .map(|case| {
            let [length, gap, thickness] = ["length", "gap", "thickness"].map(|key| case.geometry(key));
            let solve =
                move |accuracy| factors(&Held { family, case }, bars(length, gap, thickness), accuracy);
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// Equal parallel strips, as a pair, and as one strip over a grounded floor: the same by image charges.
pub(super) fn parallel(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| case.geometry("gap") <= WIDEST);
    posed
        .flat_map(|case| {
            let (length, gap) = (case.geometry("length"), case.geometry("gap"));
            let pair = move |accuracy| factors(&Held { family, case }, bars(length, gap, 0.0), accuracy);
            let mut all = vec![Trial::new(family, case, Box::new(pair))];
            if (NARROWEST_IMAGE..=WIDEST_IMAGE).contains(&gap) {
                let image = move |_| over_a_floor(&Held { family, case }, gap);
                all.push(Trial::new(family, case, Box::new(image)));
            }
            all
        })
        .collect()
}

/// Gaps, in lengths, of pairs whose image is posed.
const NARROWEST_IMAGE: f64 = 0.02;
const WIDEST_IMAGE: f64 = 1.0;

/// A strip over a floor holds and feels, at half the distance and half the voltage, what each of a pair does. The strip is
/// the lower plate; the upper one is short, far off, across the field and without charge, so that it changes nothing.
fn over_a_floor(held: &Held, gap: f64) -> Checks {
    let below_m = gap / 2.0;
    let open = bars(1.0, 0.5, 0.0);
    let bench = Arrangement {
        upper: Plate { length_m: 0.05, ..open.upper },
        surroundings: tiltgap_meshes::Surroundings::GroundedFloor { below_m },
        ..open
    };
    let [charge, force] = limits(&bench, [6, 8, 12], |level| {
        let idle = [1.0, -level.matrix[1][0] / level.matrix[1][1]];
        [level.matrix[0][0] + idle[1] * level.matrix[0][1], level.wrench_on_lower(idle).force[2]]
    })?;
    let check = |quantity: &str, key: &str, sort: Sort, computed: Estimate| {
        let reference = [held.case.value(key), held.case.open(key)].map(number);
        held.number((quantity, key), sort, computed, reference, reference[0])
    };
    Ok(vec![
        check("capacitance_factor, by image", "capacitance_factor", Sort::Charge, times(charge, below_m)),
        check("force_factor, by image", "force_factor", Sort::Force, times(force, -2.0 * below_m.powi(2))),
    ])
}

pub(super) fn guarded(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter();
    posed
        .map(|case| {
            let solve = move |accuracy| {
                let g = |key: &str| case.geometry(key);
                let tilt_rad = g("tilt_deg").to_radians();
                let pose = Pose { gap_m: g("gap"), tilt_rad, roll_rad: 0.0, shift_m: [0.0; 2] };
                let guard = Guard { around: Which::Upper, slot_m: g("slot"), rim_m: g("rim") };
                let plates = [g("counter_length"), g("length")].map(|length| strip(length, 0.0));
                let open = Arrangement::open(plates[0], plates[1], pose, Dimensions::Two);
                let bench = Arrangement { guard: Some(guard), ..open };
                let solved = solve(bench, Connection::Floating, None, accuracy)?;
                let held = Held { family, case };
                let ring = solved.guard.map_or(Estimate::default(), |g| g.capacitance_f);
                let force = number(case.value("force_z")).abs();
                let check = |key: &str, computed: Estimate, scale: f64| {
                    let reference = [case.value(key), case.open(key)].map(number);
                    held.number((key, key), Sort::Force, unit_free(computed), reference, scale)
                };
                Ok(vec![
                    held.plain("capacitance", Sort::Charge, unit_free(solved.capacitance_f)),
                    held.plain("guard_capacitance", Sort::Charge, unit_free(ring)),
                    check("force_x", solved.force_n[0], force),
                    check("force_z", solved.force_n[2], force),
                    check("torque_y", solved.torque_centre_nm[1], LEVER * force),
                ])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}
