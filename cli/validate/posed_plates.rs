//! Families in space and free: rectangular plates in all poses, squares, and bodies alone.

use std::f64::consts::PI;

use tiltgap_meshes::{Arrangement, Dimensions, Plate, Pose};
use tiltgap_solver::{Assessment, Connection, Estimate, Factor, Hinge};

use super::cases::{number, triple, Case, Family};
use super::comparison::{times, unit_free, Comparison, Held, Sort};
use super::posed_strips::LEVER;
use super::trial::{limits, solve, Trial};

/// Widest gap of squares, in sides.
const WIDEST: f64 = 1.0;

const WIRINGS: [Connection; 2] = [Connection::Floating, Connection::Grounded];

fn wiring(connection: Connection) -> &'static str {
    match connection {
        Connection::Grounded => "grounded",
        Connection::Floating => "neutral",
    }
}

/// The plates of a case in the convention of `plates.json`.
pub fn placed(case: &Case) -> Arrangement {
    let g = &case.0["geometry"];
    let plate = |p: &serde_json::Value| Plate {
        length_m: number(&p["length"]),
        width_m: number(&p["width"]),
        thickness_m: number(&p["thickness"]),
    };
    Arrangement::open(
        plate(&g["lower"]),
        plate(&g["upper"]),
        Pose {
            gap_m: number(&g["gap"]),
            tilt_rad: number(&g["tilt_deg"]).to_radians(),
            roll_rad: number(&g["roll_deg"]).to_radians(),
            shift_m: [number(&g["shift"][0]), number(&g["shift"][1])],
        },
        Dimensions::Three,
    )
}

/// Matrix, charge, force and torque of a solved plate case; relative errors of vectors refer to their length.
pub fn plate_checks(held: &Held, connection: Connection, solved: &Assessment) -> Vec<Comparison> {
    let wired = wiring(connection);
    let mut all = Vec::new();
    let (matrix, open) = (held.case.value("matrix"), held.case.open("matrix"));
    for i in 0..2 {
        for j in i..2 {
            let reference = [&matrix[i][j], &open[i][j]].map(number);
            let name = format!("C{}{}, {wired}", i + 1, j + 1);
            let computed = unit_free(solved.capacitance_matrix_f[i][j]);
            all.push(held.number((&name, "matrix"), Sort::Charge, computed, reference, reference[0].abs()));
        }
    }
    if connection == Connection::Floating {
        all.push(held.plain("capacitance_neutral", Sort::Charge, unit_free(solved.capacitance_f)));
    }
    let length = |v: [f64; 3]| v.iter().map(|c| c * c).sum::<f64>().sqrt();
    let force = length(triple(held.case.value(&format!("force_{wired}"))));
    for (quantity, computed) in [("force", solved.force_n), ("torque", solved.torque_centre_nm)] {
        let key = format!("{quantity}_{wired}");
        let (reference, open) = (triple(held.case.value(&key)), triple(held.case.open(&key)));
        let scale = if quantity == "force" { force } else { length(reference).max(LEVER * force) };
        for (d, axis) in ["x", "y", "z"].into_iter().enumerate() {
            let name = format!("{quantity} {axis}, {wired}");
            let reference = [reference[d], open[d]];
            all.push(held.number((&name, &key), Sort::Force, unit_free(computed[d]), reference, scale));
        }
    }
    all
}

pub(super) fn plates(family: &Family) -> Vec<Trial<'_>> {
    let wired = |case| WIRINGS.map(|connection| (case, connection));
    family
        .cases
        .iter()
        .flat_map(wired)
        .map(|(case, connection)| {
            let solve = move |accuracy| {
                let solved = solve(placed(case), connection, None, accuracy)?;
                Ok(plate_checks(&Held { family, case }, connection, &solved))
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

pub(super) fn squares(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| case.geometry("gap") <= WIDEST);
    let wired = |case| WIRINGS.map(|connection| (case, connection));
    posed
        .flat_map(wired)
        .map(|(case, connection)| {
            let solve = move |accuracy| {
                let plate = Plate {
                    length_m: case.geometry("length"),
                    width_m: case.geometry("width"),
                    thickness_m: case.geometry("thickness"),
                };
                let gap_m = case.geometry("gap");
                let pose = Pose { gap_m, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
                let bench = Arrangement::open(plate, plate, pose, Dimensions::Three);
                let factors = solve(bench, connection, None, accuracy)?.factors;
                let held = Held { family, case };
                let of = |what: &str, sort: Sort, f: Option<Factor>| {
                    let suffix = if connection == Connection::Grounded { "_grounded" } else { "" };
                    let computed = f.map_or(Estimate::default(), |f| Estimate {
                        value: f.value,
                        uncertainty: f.uncertainty,
                    });
                    held.plain(&format!("{what}_factor{suffix}"), sort, computed)
                };
                Ok(vec![
                    of("capacitance", Sort::Charge, factors.capacitance),
                    of("force", Sort::Force, factors.force),
                ])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// The hinge of a wedge is its apex; the force is that towards the bisector plane.
pub(super) fn wedges(family: &Family) -> Vec<Trial<'_>> {
    family
        .cases
        .iter()
        .map(|case| {
            let solve = move |accuracy| {
                let bench = placed(case);
                let arm_m = 1.0 / (2.0 * number(&case.0["beta"]));
                let hinge = Some(Hinge { arm_m, height_m: 0.0 });
                let solved = solve(bench, Connection::Floating, hinge, accuracy)?;
                let held = Held { family, case };
                let torque = solved.torque_hinge_nm.unwrap_or_default()[1];
                // The bisector plane is tilted by half the opening.
                let (s, c) = (0.5 * bench.pose.tilt_rad).sin_cos();
                let [x, _, z] = solved.force_n;
                let force = Estimate {
                    value: s * x.value - c * z.value,
                    uncertainty: (s * x.uncertainty).hypot(c * z.uncertainty),
                };
                Ok(vec![
                    held.plain("capacitance", Sort::Charge, unit_free(solved.capacitance_f)),
                    held.plain("force", Sort::Force, unit_free(force)),
                    held.plain("torque_apex", Sort::Force, unit_free(torque)),
                ])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// A body alone is the lower plate; the upper one is small, without charge, and stands across the axis, where its own
/// plane is nearly one of equal potential, so that it changes nothing.
pub(super) fn isolated(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter_map(|case| match case.0["geometry"]["body"].as_str() {
        Some("cube") => Some((case, 1.0)),
        Some("square") => Some((case, 0.0)),
        _ => None,
    });
    posed
        .map(|(case, thickness_m)| {
            let solve = move |_| {
                let body = Plate { length_m: 1.0, width_m: 1.0, thickness_m };
                let idle = Plate { length_m: IDLE, width_m: IDLE, thickness_m: 0.0 };
                let pose = Pose { gap_m: FAR_OFF, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
                let bench = Arrangement::open(body, idle, pose, Dimensions::Three);
                let [charge] = limits(&bench, [3, 4, 6], |level| {
                    let [[c11, c12], [c21, c22]] = level.matrix;
                    [c11 - c12 * c21 / c22]
                })?;
                let held = Held { family, case };
                Ok(vec![held.plain("capacitance", Sort::Charge, times(charge, 1.0 / (4.0 * PI)))])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// Side of the idle plate, and its distance from the body, in edges of the body.
const IDLE: f64 = 0.05;
const FAR_OFF: f64 = 0.2;
