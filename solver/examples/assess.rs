//! scratch
use tiltgap_meshes::*;
use tiltgap_solver::*;
fn main() {
    let a: Vec<f64> = std::env::args().skip(1).map(|s| s.parse().unwrap()).collect();
    let [d, theta, roll, dx, dy, a2, b1, b2, dim, ground, acc] = a[..11] else { panic!() };
    let arrangement = Arrangement {
        lower: Plate { length_m: 1.0, width_m: b1, thickness_m: 0.0 },
        upper: Plate { length_m: a2, width_m: b2, thickness_m: 0.0 },
        pose: Pose { gap_m: d, tilt_rad: theta.to_radians(), roll_rad: roll.to_radians(), shift_m: [dx, dy] },
        surroundings: Surroundings::Open,
        dimensions: if dim == 2.0 { Dimensions::Two } else { Dimensions::Three },
    };
    let q = Question {
        arrangement,
        hinge: Some(Hinge { arm_m: 1.5, height_m: 0.0 }),
        connection: if ground == 1.0 { Connection::Grounded } else { Connection::Floating },
        voltage_v: 1.0,
        relative_permittivity: 1.0,
    };
    match assess(&q, &Params { accuracy: acc, ..Params::default() }, &mut |_| {}) {
        Ok(r) => {
            let s = |e: Estimate| format!("{:.9}({:.1e})", e.value / EPS0, e.uncertainty / e.value.abs());
            println!(
                "C {} F {:?} T {:?} Th {:?}\n{:#?}",
                s(r.capacitance_f),
                r.force_n.map(s),
                r.torque_centre_nm.map(s),
                r.torque_hinge_nm.unwrap().map(s),
                r.factors
            );
            for l in &r.levels {
                println!("{l:?}");
            }
            println!("order {:?} seconds {:.3}", r.observed_order, r.seconds);
        }
        Err(e) => println!("{e}"),
    }
}
