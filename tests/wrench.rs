//! Force and torque by a second route each: the difference quotient of the discrete energy, and action and reaction.

use tiltgap_meshes::{Arrangement, Dimensions, Grid, GridOptions, Plate, Pose, Sideways};
use tiltgap_solver::{cg, Connection, Level, LevelParams, Operator};

use crate::cases::solve;

/// A bench without any symmetry.
fn rolled() -> Arrangement {
    Arrangement::open(
        Plate { length_m: 1.0, width_m: 0.9, thickness_m: 0.0 },
        Plate { length_m: 0.9, width_m: 1.0, thickness_m: 0.0 },
        Pose { gap_m: 0.08, tilt_rad: 0.05, roll_rad: 0.03, shift_m: [0.03, -0.02] },
        Dimensions::Three,
    )
}

fn solved(arrangement: &Arrangement, sideways: Sideways) -> (Level, Operator) {
    let options = GridOptions { sideways, far: 20.0 };
    let params =
        LevelParams { outer: cg::Params { tolerance: 1e-11, ..Default::default() }, inner_tolerance: 1e-9 };
    let level = Level::solve(arrangement, &options, 1, None, &params, &mut |_, _| {}).unwrap();
    let operator = Operator::assemble(&level.grid).unwrap();
    (level, operator)
}

/// Energy of a fixed nodal field on the grid with its upper plate displaced by the rigid motion `by` (translation, then
/// rotation vector about the centre of the facing surface), spread over the grid by the plate's own carry.
fn displaced_energy(grid: &Grid, field: &[[f64; 2]], potential: [f64; 2], by: [f64; 6]) -> f64 {
    let (carry, shape) = (&grid.upper.carry, grid.shape());
    let position = |i: usize, j: usize, k: usize| {
        let (x, r, w) = (grid.position(i, j, k), carry.lever(i, j, k), carry.weights(i, j, k));
        let turned = [by[4] * r[2] - by[5] * r[1], by[5] * r[0] - by[3] * r[2], by[3] * r[1] - by[4] * r[0]];
        [0, 1, 2].map(|d| x[d] + w[d] * (by[d] + turned[d]))
    };
    let phi = |i: usize, j: usize, k: usize| {
        let v = field[grid.index(i, j, k)];
        potential[0] * v[0] + potential[1] * v[1]
    };
    // The definition, corner by corner: W = sum of det/8 |J^-T delta|^2 / 2, by Cramer's rule.
    let mut energy = 0.0;
    for i in 0..shape[0] - 1 {
        for j in 0..shape[1] - 1 {
            for k in 0..shape[2] - 1 {
                for corner in 0..8 {
                    let at = [i + (corner >> 2 & 1), j + (corner >> 1 & 1), k + (corner & 1)];
                    let mut e = [[0.0; 3]; 3];
                    let mut delta = [0.0; 3];
                    for l in 0..3 {
                        let cell = [i, j, k];
                        let (mut low, mut high) = (at, at);
                        (low[l], high[l]) = (cell[l], cell[l] + 1);
                        let (a, b) = (position(low[0], low[1], low[2]), position(high[0], high[1], high[2]));
                        e[l] = [0, 1, 2].map(|d| b[d] - a[d]);
                        delta[l] = phi(high[0], high[1], high[2]) - phi(low[0], low[1], low[2]);
                    }
                    let cross = |u: [f64; 3], v: [f64; 3]| {
                        [u[1] * v[2] - u[2] * v[1], u[2] * v[0] - u[0] * v[2], u[0] * v[1] - u[1] * v[0]]
                    };
                    let normal = [cross(e[1], e[2]), cross(e[2], e[0]), cross(e[0], e[1])];
                    let det: f64 = (0..3).map(|d| e[0][d] * normal[0][d]).sum();
                    let g = [0, 1, 2].map(|d| (0..3).map(|l| delta[l] * normal[l][d]).sum::<f64>() / det);
                    energy += 0.5 * det / 8.0 * (g[0] * g[0] + g[1] * g[1] + g[2] * g[2]);
                }
            }
        }
    }
    energy
}

#[test]
fn all_six_components_are_the_derivative_of_the_discrete_energy() {
    for sideways in [Sideways::Linear, Sideways::Smooth] {
        let (level, _) = solved(&rolled(), sideways);
        // Both plates at a potential of their own.
        let potential = [0.4, -0.7];
        let wrench = level.wrench(potential);
        let computed = [wrench.force, wrench.torque].concat();
        let scale = computed.iter().fold(0.0, |a: f64, b| a.max(b.abs()));
        let step = 1e-5;
        for component in 0..6 {
            let energy = |sign: f64| {
                let mut by = [0.0; 6];
                by[component] = sign * step;
                displaced_energy(&level.grid, &level.phi, potential, by)
            };
            // At fixed potentials the force is plus the derivative of the field energy, and the field is stationary,
            // so that the nodal values may stay.
            let quotient = (energy(1.0) - energy(-1.0)) / (2.0 * step);
            let off = (computed[component] - quotient).abs() / scale;
            assert!(off < 1e-6, "{sideways:?} component {component}: {} for {quotient}", computed[component]);
        }
    }
}

#[test]
fn force_and_torque_are_the_derivative_of_the_solved_capacitance() {
    // Re-solving the displaced bench: gap and tilt move the plate and the grid alike.
    let bench = |gap_m: f64, tilt_rad: f64| {
        let mut a = rolled();
        (a.pose.gap_m, a.pose.tilt_rad, a.pose.roll_rad) = (gap_m, tilt_rad, 0.0);
        a
    };
    let energy = |gap: f64, tilt: f64| 0.5 * solved(&bench(gap, tilt), Sideways::Smooth).0.matrix[1][1];
    let wrench = solved(&bench(0.08, 0.05), Sideways::Smooth).0.wrench([0.0, 1.0]);
    let h = 1e-4;
    // Richardson's combination of two central differences.
    let derivative = |f: &dyn Fn(f64) -> f64| {
        let central = |h: f64| (f(h) - f(-h)) / (2.0 * h);
        (4.0 * central(h) - central(2.0 * h)) / 3.0
    };
    let torque = -derivative(&|h| energy(0.08, 0.05 + h)); // a growing tilt turns about -y
    assert!((wrench.torque[1] / torque - 1.0).abs() < 1e-6, "{} for {torque}", wrench.torque[1]);
    // A growing gap moves the grid between the plates as the virtual displacement does, but stretches the outside
    // differently: the two differ by the error of the level only.
    let force = derivative(&|h| energy(0.08 + h, 0.05));
    assert!((wrench.force[2] / force - 1.0).abs() < 2e-3, "{} for {force}", wrench.force[2]);
}

#[test]
fn energy_equals_the_charge_on_the_plates() {
    let (level, operator) = solved(&rolled(), Sideways::Smooth);
    let n = level.grid.nodes();
    let mut flux = vec![[0.0; 2]; n];
    operator.multiply(&level.phi, &vec![false; n], &mut flux);
    for (plate, of) in [(level.grid.lower.plate(), 0), (level.grid.upper.plate(), 1)] {
        let mut charge = [0.0; 2];
        for node in level.grid.nodes_of(plate) {
            charge = [charge[0] + flux[node][0], charge[1] + flux[node][1]];
        }
        for column in 0..2 {
            let (from_energy, from_charge) = (level.matrix[of][column], charge[column]);
            assert!((from_energy / from_charge - 1.0).abs() < 1e-9, "{from_energy} {from_charge}");
        }
    }
}

#[test]
fn action_is_reaction() {
    // No net force on a neutral pair in free space: what is missing is the error of the level, and falls with it.
    let arrangement = rolled();
    let options = GridOptions::suited(&arrangement);
    let missing = [1, 2].map(|q| {
        let level =
            Level::solve(&arrangement, &options, q, None, &LevelParams::default(), &mut |_, _| {}).unwrap();
        let neutral = level.neutral();
        let (upper, lower) = (level.wrench(neutral), level.wrench_on_lower(neutral));
        assert!(upper.force[2] < 0.0 && lower.force[2] > 0.0);
        let pull = upper.force[2].abs();
        let off = [0, 1, 2].map(|d| (upper.force[d] + lower.force[d]).abs() / pull);
        off.into_iter().fold(0.0, f64::max)
    });
    assert!(missing[1] < 2e-3 && missing[1] < 0.5 * missing[0], "{missing:?}");
}

#[test]
fn mirrored_benches_have_mirrored_wrenches() {
    let mut mirrored = rolled();
    mirrored.pose.roll_rad = -mirrored.pose.roll_rad;
    mirrored.pose.shift_m[1] = -mirrored.pose.shift_m[1];
    let [a, b] = [rolled(), mirrored].map(|bench| solve(bench, Connection::Grounded, 1e-2).unwrap());
    let same = |u: f64, v: f64, scale: f64| assert!((u - v).abs() < 1e-6 * scale, "{u} {v}");
    let scale = a.force_n[2].value.abs();
    for (d, sign) in [1.0, -1.0, 1.0].into_iter().enumerate() {
        same(a.force_n[d].value, sign * b.force_n[d].value, scale);
        same(a.torque_centre_nm[d].value, -sign * b.torque_centre_nm[d].value, scale);
    }
    assert!(a.force_n[1].value.abs() > 1e-3 * scale);
}
