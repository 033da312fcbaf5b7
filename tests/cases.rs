//! The reference cases as the tests use them: read, posed and held as in `validate`, solved once for all tests.

use std::sync::OnceLock;

use tiltgap::validate::cases::{number, Case, Family};
use tiltgap::validate::comparison::{Comparison, Verdict};
use tiltgap::validate::trial::{self, trials};
use tiltgap_meshes::Arrangement;
use tiltgap_solver::{Assessment, Connection, Error};

pub use tiltgap::validate::trial::DEFAULT;

/// An assessment in the units of the reference cases: permittivity and voltage 1, no hinge.
pub fn solve(arrangement: Arrangement, connection: Connection, accuracy: f64) -> Result<Assessment, Error> {
    trial::solve(arrangement, connection, None, accuracy)
}

/// Fails unless a number is within `limit` of its scale, beyond what the reference leaves open, and within three combined
/// standard uncertainties.
pub fn assert_within(comparison: &Comparison, limit: f64) {
    let held = Comparison { target: limit, ..comparison.clone() };
    assert!(
        held.verdict() != Verdict::Fails,
        "off by {:.1e}, E_n {:.2}: {held:?}",
        held.relative(),
        held.normalised()
    );
}

/// Everything of a family that the program solves, at the default accuracy, within the targets of its file; returns how
/// many numbers that are.
pub fn hold(name: &str) -> usize {
    let family = Family::named(name);
    let all = trials(&family);
    let numbers =
        all.iter().flat_map(|trial| trial.run(DEFAULT).unwrap_or_else(|e| panic!("{}: {e}", trial.case)));
    numbers.inspect(|c| assert_within(c, c.target)).count()
}

/// The same at some accuracy, within limits for charges and for forces and torques.
pub fn hold_at(name: &str, accuracy: f64, limits: [f64; 2]) {
    let mut family = Family::named(name);
    let target = family.target.as_mut().expect("a target");
    [target.charge, target.force] = limits;
    for trial in trials(&family) {
        for c in trial.run(accuracy).unwrap_or_else(|e| panic!("{}: {e}", trial.case)) {
            assert_within(&c, c.target);
        }
    }
}

/// A strip case, which may be beyond the reach of the grid, and what came of it.
pub type Solved = (Case, Result<Assessment, Error>);

/// All strip cases at the default accuracy, solved once for all tests.
pub fn strips_at_default() -> &'static [Solved] {
    static SOLVED: OnceLock<Vec<Solved>> = OnceLock::new();
    SOLVED.get_or_init(|| strips_at(DEFAULT))
}

/// All strip cases at some accuracy.
pub fn strips_at(accuracy: f64) -> Vec<Solved> {
    let solve = |case: Case| {
        let solved = solve(strips(&case), Connection::Floating, accuracy);
        (case, solved)
    };
    Family::named("strips").cases.into_iter().map(solve).collect()
}

/// The strips of a case.
pub fn strips(case: &Case) -> Arrangement {
    tiltgap::validate::posed_strips::placed(case, "geometry")
}

/// Charge, force and torque of a solved strip case.
pub fn strip_checks(case: &Case, solved: &Assessment) -> Vec<Comparison> {
    let family = Family::named("strips");
    let held = tiltgap::validate::comparison::Held { family: &family, case };
    tiltgap::validate::posed_strips::strip_checks(&held, solved)
}

/// All plate cases in both connections at the default accuracy, solved once for all tests.
pub fn plates_at_default() -> &'static [Comparison] {
    static SOLVED: OnceLock<Vec<Comparison>> = OnceLock::new();
    SOLVED.get_or_init(|| {
        let family = Family::named("plates");
        let all = trials(&family);
        all.iter().flat_map(|t| t.run(DEFAULT).unwrap_or_else(|e| panic!("{}: {e}", t.case))).collect()
    })
}

/// A number of the geometry of a strip case over another.
pub fn narrowness(case: &Case) -> f64 {
    number(&case.0["near_edge_gap"]) / case.geometry("gap")
}

/// The target of strips at the default accuracy.
pub fn strip_target() -> f64 {
    Family::named("strips").target.expect("a target").force
}
