//! A report with round numbers and a table with an invented fringe, for the tests of what is made of them.

use tiltgap_meshes::Dimensions;
use tiltgap_solver::{Assessment, Connection, Estimate, Factor, Factors, Ideal, LevelReport, Params};

use crate::assess::{Job, Report};
use crate::bench::Bench;
use crate::ranges::Range;
use crate::source::{Source, DEMO};
use crate::table_job::TableJob;
use crate::tables::axis::Variable;
use crate::tables::fit::Campaign;
use crate::tables::plan::{place, Plan};
use crate::tables::quantity::{Quantity, Sample};
use crate::tables::space::{Kind, Space};
use crate::tables::table::Table;

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

/// A job for a table over gap and tilt of the demo bench.
pub fn table_job() -> TableJob {
    let Report { job, .. } = report();
    let range = |variable, text: &str| Range::parse(variable, text).unwrap();
    TableJob {
        bench: job.bench,
        question: job.question,
        kind: Kind::Free,
        ranges: vec![range(Variable::Gap, "2mm..8mm"), range(Variable::Tilt, "0deg..1deg")],
        accuracy: 1e-4,
    }
}

/// Samples for such a table, made from an invented fringe that grows with the gap.
pub fn campaign(space: &Space) -> Campaign {
    let quantities = Quantity::all(true);
    let mut campaign = Campaign::new(Plan { nodes: vec![5, 4] });
    for point in campaign.missing() {
        let at = place(&space.axes, &point);
        let lamella = space.lamella(&at);
        let estimates = quantities
            .iter()
            .map(|q| {
                let [carried, over] = q.carried(&lamella, space);
                let excess = 7.0 * at[0] - 0.1 * at[1];
                // A component that mirrors another must do so here as well.
                let sign = if q.name() == "force_z" { -1.0 } else { 1.0 };
                estimate(carried + sign * over * excess, 3e-5)
            })
            .collect();
        campaign.samples.insert(point, Sample { estimates, level: 4, iterations: 17 });
    }
    campaign
}

/// The table that they make.
pub fn table() -> Table {
    let job = table_job();
    let space = job.space().unwrap();
    let campaign = campaign(&space);
    Table::new(space, job.quantities(), &campaign)
}
