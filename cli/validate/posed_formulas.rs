//! Families that are formulas of the program itself: what the tilt alone does, and the permittivity of vacuum.

use tiltgap_solver::{wedge_factors, Estimate, EPS0};

use super::cases::Family;
use super::comparison::{Held, Sort};
use super::trial::{bars, Trial};

/// Relative accuracy of the wedge factors, as they state it.
const ROUNDING: f64 = 1e-12;
/// Gap of the lamellae, in lengths; the factors do not depend on it.
const GAP: f64 = 0.05;

/// Lamellae over the gap d (1 + beta u): plates of length 1 that are tilted by beta d over half the length.
pub(super) fn wedge_ideal(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| case.group() == "lamella");
    posed
        .map(|case| {
            let solve = move |_| {
                let mut bench = bars(1.0, GAP, 0.0);
                bench.pose.tilt_rad = (2.0 * GAP * case.geometry("beta")).atan();
                let arm_m = 1.0 / case.geometry("length_over_arm");
                let held = Held { family, case };
                let factors = wedge_factors(&bench);
                let of = |key: &str, sort: Sort, value: Option<f64>| {
                    let value = value.unwrap_or(f64::NAN);
                    let computed = Estimate { value, uncertainty: ROUNDING * value.abs() };
                    super::comparison::Comparison { solved: false, ..held.plain(key, sort, computed) }
                };
                Ok(vec![
                    of("capacitance_factor", Sort::Charge, factors.map(|f| f.capacitance)),
                    of("force_factor", Sort::Force, factors.map(|f| f.force)),
                    of("torque_factor", Sort::Force, factors.map(|f| f.torque(arm_m))),
                ])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// The permittivity that the solver uses, as the capacitance that a standard realises with it.
pub(super) fn vacuum(family: &Family) -> Vec<Trial<'_>> {
    let posed = family.cases.iter().filter(|case| case.name() == VACUUM);
    posed
        .map(|case| {
            let solve = move |_| {
                let value = EPS0 * std::f64::consts::LN_2 / std::f64::consts::PI;
                let computed = Estimate { value, uncertainty: 0.0 };
                let held = Held { family, case };
                let compared = held.plain("cross_capacitance", Sort::Charge, computed);
                Ok(vec![super::comparison::Comparison { solved: false, ..compared }])
            };
            Trial::new(family, case, Box::new(solve))
        })
        .collect()
}

/// The case with the constant that the program uses.
const VACUUM: &str = "equal, eps0 of CODATA 2022";
