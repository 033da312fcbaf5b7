//! scratch
use tiltgap_meshes::*;
use tiltgap_solver::*;
fn main() {
    let a: Vec<f64> = std::env::args().skip(1).map(|s| s.parse().unwrap()).collect();
    // d theta roll dx dy a2 b1 b2 | tol inner | q...
    let [d, theta, roll, dx, dy, a2, b1, b2, dim] = [a[0], a[1], a[2], a[3], a[4], a[5], a[6], a[7], a[8]];
    let arr = Arrangement {
        lower: Plate { length_m: 1.0, width_m: b1, thickness_m: 0.0 },
        upper: Plate { length_m: a2, width_m: b2, thickness_m: 0.0 },
        pose: Pose { gap_m: d, tilt_rad: theta.to_radians(), roll_rad: roll.to_radians(), shift_m: [dx, dy] },
        surroundings: Surroundings::Open,
        dimensions: if dim == 2.0 { Dimensions::Two } else { Dimensions::Three },
    };
    let options = if std::env::var("PLAIN").is_ok() {
        GridOptions { sideways: Sideways::Linear, far: 20.0 }
    } else {
        GridOptions::suited(&arr)
    };
    let params =
        LevelParams { outer: cg::Params { tolerance: a[9], most_iterations: 500 }, inner_tolerance: a[10] };
    let mut prev: Option<Level> = None;
    for q in &a[11..] {
        let l = match Level::solve(&arr, &options, *q as usize, prev.as_ref(), &params, &mut |_, _| {}) {
            Ok(l) => l,
            Err(e) => {
                println!("{e}");
                return;
            }
        };
        let n = l.neutral();
        let (wn, wg) = (l.wrench(n), l.wrench([0.0, 1.0]));
        let cn = l.matrix[1][0] * n[0] + l.matrix[1][1] * n[1];
        println!(
            "q {} nodes {} it {} inner {:.1} res {:.1e} {:.3}s  C {:.12} {:.12} {:.12} Cn {:.12}\n   Fn {:.11?} Tn {:.11?}\n   Fg {:.11?} Tg {:.11?}",
            q, l.grid.nodes(), l.info.iterations, l.info.inner_iterations as f64 / l.info.applications as f64, l.residual, l.profile.total(),
            l.matrix[0][0], l.matrix[0][1], l.matrix[1][1], cn, wn.force, wn.torque, wg.force, wg.torque
        );
        eprintln!("{}", l.profile);
        if std::env::var("H").is_ok() {
            println!("{:?}", l.info.history.iter().map(|h| format!("{h:.1e}")).collect::<Vec<_>>());
        }
        if std::env::var("NOCARRY").is_err() {
            prev = Some(l);
        }
    }
}
