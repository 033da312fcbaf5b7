//! Is the error bar honest? Two standard uncertainties have to hold in 95 % of all numbers, and the bar must not be
//! wider than the error by more than a factor 10 in the median.

use crate::cases::{plate_checks, plates_at_default, strip_checks, strips_at_default, Check};

#[test]
fn error_bars_hold_and_are_not_idle() {
    let mut checks: Vec<Check> = Vec::new();
    for (case, solved) in strips_at_default() {
        if let Ok(solved) = solved {
            checks.extend(strip_checks(case, solved));
        }
    }
    for (case, connection, solved) in plates_at_default() {
        let (charges, forces) = plate_checks(case, *connection, solved);
        checks.extend(charges.into_iter().chain(forces));
    }
    // What vanishes by symmetry is exact and says nothing about the error bar.
    checks.retain(|check| check.uncertainty > 0.0);
    let inside = checks.iter().filter(|check| check.normalised() <= 2.0).count();
    let covered = inside as f64 / checks.len() as f64;
    // Caution shows where the reference is exact.
    let exact = checks.iter().filter(|check| check.open == 0.0);
    let mut caution: Vec<f64> = exact.map(|check| check.uncertainty / check.off).collect();
    caution.sort_by(f64::total_cmp);
    let median = caution[caution.len() / 2];
    eprintln!("{covered:.3} of {} within two; median caution {median:.1}", checks.len());
    assert!(checks.len() > 400 && covered >= 0.95, "{covered:.3} of {} within two", checks.len());
    assert!(median <= 10.0, "the error bars are {median:.1} times the error in the median");
}
