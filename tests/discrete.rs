//! Single levels against an independent implementation of the same scheme (`reference-cases/levels.json`), and the
//! solver's promises about its work.

use tiltgap_meshes::{GridOptions, Sideways};
use tiltgap_solver::{cg, Error, Level, LevelParams};

use tiltgap::validate::cases::{number, triple, Family};
use tiltgap::validate::posed_plates::placed;

/// The grid family of the reference implementation.
const PLAIN: GridOptions = GridOptions { sideways: Sideways::Linear, far: 20.0 };

fn tight() -> LevelParams {
    LevelParams { outer: cg::Params { tolerance: 1e-10, ..Default::default() }, inner_tolerance: 1e-9 }
}

#[test]
fn levels_agree_with_the_reference_implementation() {
    let mut agreed = 0;
    for case in Family::named("levels").cases {
        let arrangement = placed(&case);
        let q = number(&case.0["level"]) as usize;
        let level = Level::solve(&arrangement, &PLAIN, q, None, &tight(), &mut |_, _| {}).unwrap();
        assert_eq!(level.grid.nodes(), number(&case.0["nodes"]) as usize);
        let value = &case.0["value"];
        // The grid measures in units of the larger plate, the reference in units of the lower one.
        let size = arrangement.size_m();
        let close = |what: &str, computed: f64, reference: f64, scale: f64| {
            let relative = (computed - reference).abs() / scale;
            assert!(relative < 1e-7, "{} {what}: {computed} for {reference}", case.name());
        };
        for i in 0..2 {
            for j in 0..2 {
                let reference = number(&value["matrix"][i][j]);
                close("matrix", level.matrix[i][j] * size, reference, reference.abs());
            }
        }
        for (connection, potential) in [("neutral", level.neutral()), ("grounded", [0.0, 1.0])] {
            let wrench = level.wrench(potential);
            for (quantity, computed) in [("force", wrench.force), ("torque", wrench.torque.map(|t| t * size))]
            {
                let reference = triple(&value[format!("{quantity}_{connection}")]);
                let scale = reference.iter().fold(1e-6, |a: f64, b| a.max(b.abs()));
                for d in 0..3 {
                    close(quantity, computed[d], reference[d], scale);
                }
            }
        }
        agreed += 1;
    }
    assert!(agreed >= 14, "{agreed} levels");
}

#[test]
fn iterations_do_not_depend_on_the_level_and_a_coarse_level_helps() {
    let case = &Family::named("plates").cases[1];
    let arrangement = placed(case);
    let options = GridOptions::suited(&arrangement);
    let solve = |q: usize, coarse: Option<&Level>| {
        Level::solve(&arrangement, &options, q, coarse, &LevelParams::default(), &mut |_, _| {}).unwrap()
    };
    let levels: Vec<Level> = [2, 3, 4, 6].into_iter().map(|q| solve(q, None)).collect();
    let iterations: Vec<usize> = levels.iter().map(|l| l.info.iterations).collect();
    let (least, most) = (iterations.iter().min().unwrap(), iterations.iter().max().unwrap());
    assert!(most - least <= 2 && *most <= 16, "{iterations:?}");
    assert!(levels.iter().all(|l| l.info.inner_iterations <= 30 * l.info.applications));
    assert!(levels.iter().all(|l| l.residual < 1e-7), "true residuals");
    let helped = solve(6, Some(&levels[2]));
    assert!(helped.info.iterations < levels[3].info.iterations);
    assert!((helped.matrix[0][1] / levels[3].matrix[0][1] - 1.0).abs() < 1e-12);
}

#[test]
fn not_converged_is_an_error_with_the_numbers() {
    let arrangement = placed(&Family::named("plates").cases[1]);
    let params =
        LevelParams { outer: cg::Params { tolerance: 1e-9, most_iterations: 3 }, ..Default::default() };
    match Level::solve(&arrangement, &PLAIN, 2, None, &params, &mut |_, _| {}) {
        Err(Error::NotConverged { iterations: 3, reached, tolerance }) => assert!(reached > tolerance),
        other => panic!("{:?}", other.map(|l| l.info)),
    }
}
