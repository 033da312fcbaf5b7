//! The numbers of a table: what is kept of an assessment, and in which form it is interpolated.
//!
//! Kept are factors: every number over the ideal value at its pose. Interpolated is the *fringe excess*: what is more
//! than the lamellae of the tilted gap carry, over what they carry. It is smooth where the factor itself is not, up to
//! plates that nearly touch.

use tiltgap_solver::{Assessment, Estimate};

use super::space::{Lamella, Space};

/// One number.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Quantity {
    /// C/C0, the capacitance in the wiring of the bench.
    CapacitanceFactor,
    /// -F_z/F0.
    ForceFactor,
    /// T_y about the hinge over T0.
    TorqueFactor,
    /// An element of Maxwell's matrix over C0: 11, 12 or 22.
    Matrix(usize, usize),
    /// A component of the force over F0.
    Force(usize),
    /// A component of the torque about the plate's centre over F0 times the largest side.
    CentreTorque(usize),
    /// A component of the torque about the hinge over T0.
    HingeTorque(usize),
}

use Quantity::{CapacitanceFactor, CentreTorque, Force, ForceFactor, HingeTorque, Matrix, TorqueFactor};

/// Names of the three directions.
const DIRECTIONS: [char; 3] = ['x', 'y', 'z'];

impl Quantity {
    /// All that a table holds, in the order of the file: the factors come first.
    pub fn all(with_hinge: bool) -> Vec<Quantity> {
        let mut all = vec![CapacitanceFactor, ForceFactor];
        if with_hinge {
            all.push(TorqueFactor);
        }
        all.extend([Matrix(0, 0), Matrix(0, 1), Matrix(1, 1)]);
        all.extend([0, 1, 2].map(Force));
        all.extend([0, 1, 2].map(CentreTorque));
        if with_hinge {
            all.extend([0, 1, 2].map(HingeTorque));
        }
        all
    }

    /// As the file calls it.
    pub fn name(self) -> String {
        match self {
            CapacitanceFactor => "factor_C".into(),
            ForceFactor => "factor_F".into(),
            TorqueFactor => "factor_T".into(),
            Matrix(i, j) => format!("matrix_{}{}", i + 1, j + 1),
            Force(d) => format!("force_{}", DIRECTIONS[d]),
            CentreTorque(d) => format!("centre_torque_{}", DIRECTIONS[d]),
            HingeTorque(d) => format!("hinge_torque_{}", DIRECTIONS[d]),
        }
    }

    /// Its value in an assessment, over the ideal value.
    pub fn of(self, a: &Assessment, size_m: f64) -> Estimate {
        let over = |e: Estimate, ideal: f64| Estimate {
            value: e.value / ideal,
            uncertainty: (e.uncertainty / ideal).abs(),
        };
        let ideal = &a.ideal;
        let torque_nm = || ideal.torque_nm.expect("a table with a hinge");
        let hinge = || a.torque_hinge_nm.expect("a table with a hinge");
        match self {
            CapacitanceFactor => over(a.capacitance_f, ideal.capacitance_f),
            ForceFactor => over(a.force_n[2], -ideal.force_n),
            TorqueFactor => over(hinge()[1], torque_nm()),
            Matrix(i, j) => over(a.capacitance_matrix_f[i][j], ideal.capacitance_f),
            Force(d) => over(a.force_n[d], ideal.force_n),
            CentreTorque(d) => over(a.torque_centre_nm[d], ideal.force_n * size_m),
            HingeTorque(d) => over(hinge()[d], torque_nm()),
        }
    }

    /// What the lamellae carry of it, and what they carry of charge or force: both over the ideal value with the
    /// lamellae's rectangle.
    pub fn carried(self, lamella: &Lamella, space: &Space) -> [f64; 2] {
        let Lamella { capacitance, force, moment_m, .. } = *lamella;
        let torque = || {
            let arm_m = space.question.hinge.expect("a table with a hinge").arm_m;
            force + moment_m / arm_m
        };
        match self {
            CapacitanceFactor | Matrix(0, 0) | Matrix(1, 1) => [capacitance, capacitance],
            Matrix(..) => [-capacitance, capacitance],
            ForceFactor => [force, force],
            Force(2) => [-force, force],
            TorqueFactor | HingeTorque(1) => [torque(), force],
            CentreTorque(1) => [moment_m / space.question.arrangement.size_m(), force],
            Force(_) | CentreTorque(_) | HingeTorque(_) => [0.0, force],
        }
    }
}

/// What is kept of the assessment of one pose.
#[derive(Clone, Debug, PartialEq)]
pub struct Sample {
    /// One estimate for each quantity; the uncertainties are numerical.
    pub estimates: Vec<Estimate>,
    /// Finest level solved.
    pub level: u32,
    /// Outer iterations over all levels.
    pub iterations: usize,
}

impl Sample {
    /// Takes from an assessment what is kept.
    pub fn new(quantities: &[Quantity], assessment: &Assessment, size_m: f64) -> Sample {
        Sample {
            estimates: quantities.iter().map(|q| q.of(assessment, size_m)).collect(),
            level: assessment.levels.last().map_or(0, |l| l.q),
            iterations: assessment.levels.iter().map(|l| l.outer_iterations).sum(),
        }
    }

    /// The fringe excesses, with their uncertainties.
    pub fn excesses(&self, quantities: &[Quantity], space: &Space, at: &[f64]) -> Vec<Estimate> {
        let lamella = space.lamella(at);
        let ratio = space.question_at(at).ideal().capacitance_f / lamella.ideal.capacitance_f;
        quantities
            .iter()
            .zip(&self.estimates)
            .map(|(q, e)| {
                let [carried, over] = q.carried(&lamella, space);
                Estimate {
                    value: (e.value * ratio - carried) / over,
                    uncertainty: (e.uncertainty * ratio / over).abs(),
                }
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::report;
    use crate::tables::axis::{Span, Variable};
    use crate::tables::space::Kind;

    #[test]
    fn names_are_unique_and_factors_come_first() {
        for with_hinge in [true, false] {
            let names: Vec<String> = Quantity::all(with_hinge).into_iter().map(Quantity::name).collect();
            let mut sorted = names.clone();
            sorted.sort();
            sorted.dedup();
            assert_eq!(sorted.len(), names.len());
            assert_eq!(names[..2], ["factor_C", "factor_F"]);
        }
    }

    #[test]
    fn the_excess_of_a_factor_is_its_fringe_factor_less_one() {
        let report = report();
        let question = report.job.question;
        let span = Span { variable: Variable::Gap, from: 0.002, to: 0.008 };
        let space = Space::new(&question, Kind::Free, &[span]).unwrap();
        let quantities = Quantity::all(true);
        let sample = Sample::new(&quantities, &report.assessment, question.arrangement.size_m());
        let excess = sample.excesses(&quantities, &space, &[0.004]);
        let wedge = tiltgap_solver::wedge_factors(&question.arrangement).unwrap();
        assert!((excess[0].value - (1.3 / wedge.capacitance - 1.0)).abs() < 1e-14);
        assert!((excess[1].value - (1.125 / wedge.force - 1.0)).abs() < 1e-14);
        assert!((excess[2].value - (1.1 - wedge.torque(0.15)) / wedge.force).abs() < 1e-14);
        assert_eq!(sample.level, 3);
    }
}
