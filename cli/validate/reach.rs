//! How near a person's own bench has to come to the ideal one for the ideal formula to hold.

use tiltgap_meshes::Arrangement;
use tiltgap_solver::{assess, wedge_factors, Error, Factors, Params, Question};

/// Parts by which the ideal formula may be off.
pub const PARTS: [f64; 2] = [1e-2, 1e-3];
/// Gaps that are solved, in gaps of the bench.
const FIRST: f64 = 1.0;
const STEPS: usize = 4;
const STEP: f64 = 0.5;
/// Halvings of a bisection: to a part in a million.
const HALVINGS: usize = 40;
/// Steps to contact among which the first tilt that is too much is looked for.
const SCAN: usize = 1000;

/// What the ideal formula needs.
#[derive(Clone, Debug, PartialEq)]
pub struct Reach {
    /// "charge", "force" or "torque".
    pub what: &'static str,
    /// Part by which the ideal formula may be off.
    pub part: f64,
    /// Largest gap of the bench made parallel, in metres.
    pub gap_m: f64,
    /// Whether that gap lies below those that were solved, and is continued from the last two.
    pub continued: bool,
    /// Largest tilt, up to the contact of an edge, at which the wedge alone stays within the part, at the gap of the bench.
    pub tilt_rad: f64,
}

fn parallel(question: &Question, gap_m: f64) -> Question {
    let mut q = *question;
    (q.arrangement.pose.gap_m, q.arrangement.pose.tilt_rad, q.arrangement.pose.roll_rad) = (gap_m, 0.0, 0.0);
    q
}

fn values(factors: &Factors) -> [Option<f64>; 3] {
    [factors.capacitance, factors.force, factors.torque].map(|f| f.map(|f| f.value))
}

/// Gap at which |k - 1| is `part`: straight between, and beyond, the solved points of ln |k - 1| over ln gap.
fn gap_for(gaps: &[f64], excess: &[f64], part: f64) -> (f64, bool) {
    let last = gaps.len() - 2;
    let n = (0..=last).find(|n| excess[n + 1] <= part).unwrap_or(last);
    let slope = (excess[n] / excess[n + 1]).ln() / (gaps[n] / gaps[n + 1]).ln();
    let gap = gaps[n + 1] * ((part / excess[n + 1]).ln() / slope).exp();
    (gap, gap < gaps[gaps.len() - 1])
}

/// Largest tilt at which the wedge alone changes a factor by no more than `part`.
fn tilt_for(question: &Question, which: usize, part: f64) -> f64 {
    let arrangement = question.arrangement;
    let arm = question.hinge.map_or(f64::INFINITY, |h| h.arm_m);
    let off = |tilt: f64| {
        let mut a: Arrangement = arrangement;
        (a.pose.tilt_rad, a.pose.roll_rad) = (tilt, 0.0);
        let factors = wedge_factors(&a).map(|w| [w.capacitance, w.force, w.torque(arm)][which]);
        factors.filter(|_| a.narrowness() > 0.0).map_or(f64::INFINITY, |f| (f - 1.0).abs())
    };
    // The torque falls below its ideal value first and comes back later: the first way out counts.
    let contact = (2.0 * arrangement.pose.gap_m / arrangement.upper.length_m).atan();
    let at = |n: usize| contact * n as f64 / SCAN as f64;
    let out = (1..SCAN).find(|n| off(at(*n)) > part).unwrap_or(SCAN);
    let (mut low, mut high) = (at(out - 1), at(out));
    for _ in 0..HALVINGS {
        let middle = 0.5 * (low + high);
        if off(middle) <= part {
            low = middle;
        } else {
            high = middle;
        }
    }
    low
}

/// What the ideal formula needs on a bench, for each factor that it has.
///
/// # Errors
/// What the solver says.
pub fn reach(question: &Question, params: &Params) -> Result<Vec<Reach>, Error> {
    let clear = question.arrangement.film_m();
    let gaps: Vec<f64> = (0..STEPS)
        .map(|n| clear + FIRST * STEP.powi(n as i32) * (question.arrangement.pose.gap_m - clear))
        .collect();
    let mut solved = Vec::new();
    for gap in &gaps {
        solved.push(values(&assess(&parallel(question, *gap), params, &mut |_| {})?.factors));
    }
    let mut all = Vec::new();
    for (which, what) in ["charge", "force", "torque"].into_iter().enumerate() {
        let excess: Option<Vec<f64>> = solved.iter().map(|k| k[which].map(|k| (k - 1.0).abs())).collect();
        let Some(excess) = excess else { continue };
        for part in PARTS {
            let (gap_m, continued) = gap_for(&gaps, &excess, part);
            all.push(Reach { what, part, gap_m, continued, tilt_rad: tilt_for(question, which, part) });
        }
    }
    Ok(all)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_first_tilt_that_is_too_much_counts() {
        let plate = tiltgap_meshes::Plate { length_m: 0.11, width_m: 0.09, thickness_m: 0.0 };
        let pose = tiltgap_meshes::Pose { gap_m: 0.004, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
        let question = Question {
            arrangement: Arrangement::open(plate, plate, pose, tiltgap_meshes::Dimensions::Three),
            hinge: Some(tiltgap_solver::Hinge { arm_m: 0.15, height_m: 0.0 }),
            connection: tiltgap_solver::Connection::Floating,
            voltage_v: 1.0,
            relative_permittivity: 1.0,
        };
        // k_F = 1/(1 - beta^2) and, to first order, k_T = 1 - length/(3 arm) beta, beta = length tilt/(2 gap).
        let beta = |which, part| tilt_for(&question, which, part).tan() * 0.055 / 0.004;
        assert!((beta(1, 1e-2) - (1.0 - 1.0 / 1.01f64).sqrt()).abs() < 1e-9);
        assert!((beta(2, 1e-3) * 0.11 / 0.45 / 1e-3 - 1.0).abs() < 0.05);
        assert!(beta(2, 1e-2) > beta(2, 1e-3));
    }

    #[test]
    fn a_power_of_the_gap_is_followed_between_the_points_and_beyond() {
        let gaps = [4.0, 2.0, 1.0];
        let excess = gaps.map(|g: f64| 0.01 * g.powf(0.9));
        let (gap, continued) = gap_for(&gaps, &excess, 0.02);
        assert!((gap - 2f64.powf(1.0 / 0.9)).abs() < 1e-12 && !continued);
        let (gap, continued) = gap_for(&gaps, &excess, 0.001);
        assert!((gap - 0.1f64.powf(1.0 / 0.9)).abs() < 1e-12 && continued);
    }
}
