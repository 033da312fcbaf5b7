//! A report with round numbers, for the tests of what is made of a report.

use tiltgap_meshes::Dimensions;
use tiltgap_solver::{Assessment, Connection, Estimate, Factor, Factors, Ideal, LevelReport, Params};

use crate::assess::{Job, Report};
use crate::bench::Bench;
use crate::source::{Source, DEMO};

fn estimate(value: f64, uncertainty: f64) -> Estimate {
    Estimate { value, uncertainty }
}

fn factor(value: f64, uncertainty: f64, wedge: f64) -> Option<Factor> {
    Some(Factor { value, uncertainty, wedge, fringe: value / wedge })
}

/// The demo bench with invented results.
pub fn report() -> Report {
    let bench = Bench::new(&Source::Demo, DEMO, &[]).unwrap();
    let zero = Estimate::default();
    let (c, direct) = (estimate(26e-12, 2e-15), estimate(-24e-12, 2e-15));
    let torque_y = estimate(66e-6, 13e-10);
    Report {
        job: Job {
            question: bench.question(Dimensions::Three, Connection::Grounded),
            bench,
            params: Params::default(),
            threads: 2,
            floating_chosen: false,
        },
        assessment: Assessment {
            capacitance_matrix_f: [[c, direct], [direct, c]],
            capacitance_f: c,
            charge_upper_c: estimate(10.4e-9, 8e-13),
            energy_j: estimate(2.08e-6, 1.6e-10),
            force_n: [estimate(1.25e-6, 4e-9), zero, estimate(-450e-6, 3e-9)],
            torque_hinge_nm: Some([zero, torque_y, zero]),
            torque_centre_nm: [zero, estimate(-1.5e-6, 3e-10), zero],
            guard: None,
            ideal: Ideal { capacitance_f: 20e-12, force_n: 400e-6, torque_nm: Some(60e-6) },
            factors: Factors {
                capacitance: factor(1.3, 1e-4, 1.01),
                force: factor(1.125, 7.5e-6, 1.02),
                torque: factor(1.1, 2e-5, 0.99),
            },
            levels: vec![
                LevelReport {
                    q: 2,
                    nodes: 20_387,
                    outer_iterations: 6,
                    inner_iterations: 14.86,
                    residual: 7.4e-8,
                    seconds: 0.0351,
                },
                LevelReport {
                    q: 3,
                    nodes: 66_220,
                    outer_iterations: 6,
                    inner_iterations: 17.6,
                    residual: 4.3e-8,
                    seconds: 0.17,
                },
            ],
            observed_order: Some(1.92),
            seconds: 0.3,
        },
        seconds: 0.31,
        peak_memory_bytes: Some(46_500_000),
    }
}
