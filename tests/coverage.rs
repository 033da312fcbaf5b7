//! Is the error bar honest? Two standard uncertainties have to hold in 95 % of all numbers, and the bar must not be
//! wider than the error by more than a factor 10 in the median.

use tiltgap::validate::convergence::Coverage;

use crate::cases::{plates_at_default, strip_checks, strips_at_default};

#[test]
fn error_bars_hold_and_are_not_idle() {
    let solved = strips_at_default().iter().filter_map(|(case, solved)| Some((case, solved.as_ref().ok()?)));
    let mut all: Vec<_> = solved.flat_map(|(case, solved)| strip_checks(case, solved)).collect();
    all.extend(plates_at_default().iter().cloned());
    let coverage = Coverage::of(&all);
    assert!(coverage.count > 400 && coverage.caution.is_some() && coverage.holds(), "{coverage:?}");
}
