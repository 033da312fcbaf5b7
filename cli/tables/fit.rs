//! From samples to an interpolant that knows its own error, and what to do if that is too large.
//!
//! The check points are no nodes: what the interpolant misses there is its error, measured. It goes into the table as
//! the interpolation part of the uncertainty, beside the numerical part that the nodes bring along.

use std::collections::BTreeMap;

use tiltgap_solver::Estimate;

use super::interpolant::Interpolant;
use super::plan::{place, Plan, Point, MOST_NODES};
use super::quantity::{Quantity, Sample};
use super::space::Space;

/// The interpolation part is the root mean square of what is missed, and at least this part of the largest: two standard
/// uncertainties then cover all that was seen.
const PART_OF_WORST: f64 = 0.5;

/// All that was solved for a table so far.
#[derive(Clone, Debug, PartialEq)]
pub struct Campaign {
    /// What is to be solved.
    pub plan: Plan,
    /// What has been.
    pub samples: BTreeMap<Point, Sample>,
}

/// What was missed at the check points, one number for each quantity, in units of the excess.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Missed {
    /// Standard uncertainty that stands for it.
    pub uncertainty: f64,
    /// The most that was missed.
    pub worst: f64,
}

/// An interpolant with its error.
#[derive(Clone, Debug, PartialEq)]
pub struct Fit {
    /// The fringe excesses.
    pub interpolant: Interpolant,
    /// What was missed, one for each quantity.
    pub missed: Vec<Missed>,
}

/// What the checks say.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Verdict {
    /// The interpolated factors are within the accuracy.
    Good,
    /// The axis of this number needs another node.
    Grow(usize),
    /// The most that was missed, of a factor and relative to it, with as many nodes as there may be.
    Exhausted(f64),
}

/// How many of the quantities are factors, which the verdict is about.
fn factors(quantities: &[Quantity]) -> usize {
    use Quantity::{CapacitanceFactor, ForceFactor, TorqueFactor};
    quantities.iter().take_while(|q| matches!(q, CapacitanceFactor | ForceFactor | TorqueFactor)).count()
}

impl Campaign {
    /// Nothing solved yet.
    pub fn new(plan: Plan) -> Campaign {
        Campaign { plan, samples: BTreeMap::new() }
    }

    /// What is left to be solved, in order.
    pub fn missing(&self) -> Vec<Point> {
        self.plan.points().into_iter().filter(|p| !self.samples.contains_key(p)).collect()
    }

    fn interpolant(&self, space: &Space, quantities: &[Quantity], plan: &Plan) -> Interpolant {
        let axes = &space.axes;
        let coordinates = (0..axes.len()).map(|k| plan.coordinates(axes, k)).collect();
        let mut values = Vec::new();
        for point in plan.points().iter().filter(|p| matches!(p, Point::Node(_))) {
            let excesses = self.samples[point].excesses(quantities, space, &place(axes, point));
            values.extend(excesses.into_iter().map(|e| [e.value, e.uncertainty]));
        }
        Interpolant::new(coordinates, values, quantities.len())
    }

    /// What was solved at the check points: coordinates and excesses.
    fn checks(&self, space: &Space, quantities: &[Quantity]) -> Vec<(Vec<f64>, Vec<Estimate>)> {
        (0..self.plan.checks())
            .map(|n| {
                let point = Point::Check(n);
                let at = place(&space.axes, &point);
                let reduced = space.axes.iter().zip(&at).map(|(a, v)| a.reduced(*v)[0]).collect();
                (reduced, self.samples[&point].excesses(quantities, space, &at))
            })
            .collect()
    }

    /// The interpolant and what it misses.
    ///
    /// # Panics
    /// If something is [missing](Campaign::missing).
    pub fn fit(&self, space: &Space, quantities: &[Quantity]) -> Fit {
        let interpolant = self.interpolant(space, quantities, &self.plan);
        let mut squares = vec![0.0; quantities.len()];
        let mut worst = vec![0.0f64; quantities.len()];
        for (at, excesses) in self.checks(space, quantities) {
            let weights = interpolant.weights(&at);
            for (q, excess) in excesses.iter().enumerate() {
                let missed = interpolant.at(&weights, q).value - excess.value;
                squares[q] += missed * missed;
                worst[q] = worst[q].max(missed.abs());
            }
        }
        let missed = squares
            .iter()
            .zip(&worst)
            .map(|(sum, worst)| {
                let rms = (sum / self.plan.checks() as f64).sqrt();
                Missed { uncertainty: rms.max(PART_OF_WORST * worst), worst: *worst }
            })
            .collect();
        Fit { interpolant, missed }
    }

    /// Whether the interpolated factors are within the accuracy at the check points, and if not what to do.
    ///
    /// What the numerical uncertainties of nodes and checks explain, no further node can mend: it counts as good once what
    /// the last node on every axis changed is explained as well.
    pub fn verdict(&self, space: &Space, quantities: &[Quantity], accuracy: f64) -> Verdict {
        let fit = self.fit(space, quantities);
        let checks = self.checks(space, quantities);
        let count = factors(quantities);
        let (mut worst, mut explained, mut noise) = (0.0f64, true, accuracy);
        for (at, excesses) in &checks {
            let weights = fit.interpolant.weights(at);
            for (q, excess) in excesses.iter().enumerate().take(count) {
                let here = fit.interpolant.at(&weights, q);
                let missed = (here.value - excess.value).abs() / (1.0 + excess.value).abs();
                worst = worst.max(missed);
                let pair = here.uncertainty.hypot(excess.uncertainty) / (1.0 + excess.value).abs();
                explained &= missed <= accuracy.max(2.0 * pair);
                noise = noise.max(2.0 * pair);
            }
        }
        if worst <= accuracy {
            return Verdict::Good;
        }
        // What the last node on each axis changed.
        let changes: Vec<f64> = (0..space.axes.len())
            .map(|k| {
                let mut plan = self.plan.clone();
                plan.nodes[k] -= 1;
                let before = self.interpolant(space, quantities, &plan);
                let change = |at: &[f64], q: usize| {
                    let [old, new] = [&before, &fit.interpolant].map(|i| i.at(&i.weights(at), q).value);
                    (new - old).abs()
                };
                checks.iter().flat_map(|(at, _)| (0..count).map(|q| change(at, q))).fold(0.0, f64::max)
            })
            .collect();
        if explained && changes.iter().all(|c| *c <= noise) {
            return Verdict::Good;
        }
        let growing = (0..changes.len()).filter(|k| self.plan.nodes[*k] < MOST_NODES);
        match growing.max_by(|a, b| changes[*a].total_cmp(&changes[*b])) {
            Some(axis) => Verdict::Grow(axis),
            None => Verdict::Exhausted(worst),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::report;
    use crate::tables::axis::{Span, Variable};
    use crate::tables::space::Kind;

    fn space() -> Space {
        let spans = [
            Span { variable: Variable::Gap, from: 0.002, to: 0.008 },
            Span { variable: Variable::Tilt, from: 0.0, to: 0.0174 },
        ];
        Space::new(&report().job.question, Kind::Free, &spans).unwrap()
    }

    /// Samples made from invented excesses, with noise that alternates.
    fn campaign(
        space: &Space,
        nodes: &[usize],
        excess: impl Fn(&[f64]) -> f64,
        u: f64,
        noise: f64,
    ) -> Campaign {
        let quantities = Quantity::all(true);
        let mut campaign = Campaign::new(Plan { nodes: nodes.to_vec() });
        for (n, point) in campaign.missing().into_iter().enumerate() {
            let at = place(&space.axes, &point);
            let lamella = space.lamella(&at);
            let jump = if n.is_multiple_of(2) { noise } else { -noise };
            let estimates = quantities
                .iter()
                .map(|q| {
                    let [carried, over] = q.carried(&lamella, space);
                    Estimate { value: carried + over * (excess(&at) + jump), uncertainty: u }
                })
                .collect();
            campaign.samples.insert(point, Sample { estimates, level: 4, iterations: 9 });
        }
        assert!(campaign.missing().is_empty());
        campaign
    }

    #[test]
    fn a_smooth_excess_is_good_and_its_error_is_stated() {
        let space = space();
        let quantities = Quantity::all(true);
        let excess = |at: &[f64]| 0.1 * at[0].ln().sin() + at[1];
        let campaign = campaign(&space, &[6, 4], excess, 1e-5, 0.0);
        assert_eq!(campaign.verdict(&space, &quantities, 1e-4), Verdict::Good);
        let fit = campaign.fit(&space, &quantities);
        assert!(fit.missed[0].worst < 1e-4 && fit.missed[0].worst > 1e-9);
        for (gap, tilt) in [(0.0023, 0.011), (0.0055, 0.003), (0.0079, 0.017)] {
            let reduced = [space.axes[0].reduced(gap)[0], space.axes[1].reduced(tilt)[0]];
            let i = &fit.interpolant;
            let missed = i.at(&i.weights(&reduced), 0).value - excess(&[gap, tilt]);
            assert!(missed.abs() < 4.0 * fit.missed[0].uncertainty, "{missed:e}");
        }
    }

    #[test]
    fn the_axis_that_bends_grows() {
        let space = space();
        let quantities = Quantity::all(true);
        let along_gap = campaign(&space, &[3, 3], |at| 0.1 * (6.0 * at[0].ln()).sin(), 1e-5, 0.0);
        assert_eq!(along_gap.verdict(&space, &quantities, 1e-4), Verdict::Grow(0));
        let along_tilt = campaign(&space, &[3, 3], |at| 0.1 * (300.0 * at[1]).sin(), 1e-5, 0.0);
        assert_eq!(along_tilt.verdict(&space, &quantities, 1e-4), Verdict::Grow(1));
    }

    #[test]
    fn noise_within_the_uncertainties_is_not_chased() {
        let space = space();
        let quantities = Quantity::all(true);
        let noisy = |u: f64| campaign(&space, &[5, 4], |at| 10.0 * at[0], u, 2e-4);
        assert!(matches!(noisy(1e-5).verdict(&space, &quantities, 1e-4), Verdict::Grow(_)));
        assert_eq!(noisy(5e-4).verdict(&space, &quantities, 1e-4), Verdict::Good);
    }
}
