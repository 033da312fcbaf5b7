//! A finished table: factors at any place in its ranges, and readings corrected with them.

use tiltgap_solver::{wedge_factors, Ideal};

use super::fit::{Campaign, Fit};
use super::interpolant::Weights;
use super::quantity::Quantity;
use super::space::Space;

/// Step of the difference quotients of the closed formulas (ideal and lamellae), as a part of an axis: their error is the
/// square of it, far below what a sensitivity has to be known to.
pub const STEP: f64 = 1e-4;

/// Capacitance (and charge), force, torque: the order of everything that comes in threes.
pub const NAMES: [&str; 3] = ["capacitance", "force", "torque"];

/// A number of the table with the parts of its standard uncertainty.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Known {
    /// The value.
    pub value: f64,
    /// Numerical part: what the nodes were known to.
    pub numerical: f64,
    /// Interpolation part: what was missed at the check points.
    pub interpolation: f64,
}

impl Known {
    /// Both parts together.
    pub fn uncertainty(&self) -> f64 {
        self.numerical.hypot(self.interpolation)
    }

    fn times(self, by: f64) -> Known {
        Known {
            value: self.value * by,
            numerical: (self.numerical * by).abs(),
            interpolation: (self.interpolation * by).abs(),
        }
    }
}

/// A factor of the table.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TableFactor {
    /// Full value over ideal value.
    pub factor: Known,
    /// What the tilt alone makes of it.
    pub wedge: f64,
}

impl TableFactor {
    /// Error of the ideal formula in per cent of the full value; negative if it gives too little.
    pub fn error_percent(&self) -> f64 {
        100.0 * (1.0 / self.factor.value - 1.0)
    }
}

/// What was read, with standard uncertainties; SI units.
#[derive(Clone, Debug, PartialEq)]
pub struct Reading {
    /// One value for each axis.
    pub at: Vec<f64>,
    /// Their uncertainties.
    pub at_uncertainty: Vec<f64>,
    /// Voltage between the plates, in volts.
    pub voltage_v: f64,
    /// Its uncertainty.
    pub voltage_uncertainty_v: f64,
}

/// One of capacitance, force and torque for a reading.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Corrected {
    /// By the ideal formula.
    pub ideal: f64,
    /// Standard uncertainty of that, from the reading.
    pub ideal_uncertainty: f64,
    /// The factor.
    pub factor: Known,
    /// Ideal value times factor, with the parts from the table.
    pub corrected: Known,
    /// Part of its standard uncertainty that comes from the reading.
    pub input: f64,
}

impl Corrected {
    /// Combined standard uncertainty of the corrected value.
    pub fn uncertainty(&self) -> f64 {
        self.corrected.uncertainty().hypot(self.input)
    }
}

/// A table.
#[derive(Clone, Debug, PartialEq)]
pub struct Table {
    /// Bench and axes.
    pub space: Space,
    /// What it holds.
    pub quantities: Vec<Quantity>,
    /// How it interpolates.
    pub fit: Fit,
}

fn in_a_row(ideal: &Ideal, with_hinge: bool) -> Vec<f64> {
    let mut row = vec![ideal.capacitance_f, ideal.force_n];
    if let (true, Some(torque)) = (with_hinge, ideal.torque_nm) {
        row.push(torque);
    }
    row
}

impl Table {
    /// The table of a finished campaign.
    pub fn new(space: Space, quantities: Vec<Quantity>, campaign: &Campaign) -> Table {
        let fit = campaign.fit(&space, &quantities);
        Table { space, quantities, fit }
    }

    /// Whether torques about a hinge are in it.
    pub fn has_torque(&self) -> bool {
        self.quantities.contains(&Quantity::TorqueFactor)
    }

    fn weights(&self, at: &[f64]) -> Weights {
        if let Some((n, v)) = self.space.outside(at) {
            panic!("{v} is outside of the axis {:?}: ask `space.outside` first", self.space.axes[n].span);
        }
        let reduced: Vec<f64> = self.space.axes.iter().zip(at).map(|(axis, v)| axis.reduced(*v)[0]).collect();
        self.fit.interpolant.weights(&reduced)
    }

    /// All quantities at a place, over the ideal values there, in the order of `quantities`.
    ///
    /// # Panics
    /// Here and below if the place is outside of the axes; ask [`Space::outside`].
    pub fn all(&self, at: &[f64]) -> Vec<Known> {
        let weights = self.weights(at);
        let lamella = self.space.lamella(at);
        let ratio = lamella.ideal.capacitance_f / self.space.question_at(at).ideal().capacitance_f;
        (0..self.quantities.len())
            .map(|q| {
                let [carried, over] = self.quantities[q].carried(&lamella, &self.space);
                let excess = self.fit.interpolant.at(&weights, q);
                let known = Known {
                    value: carried / over + excess.value,
                    numerical: excess.uncertainty,
                    interpolation: self.fit.missed[q].uncertainty,
                };
                known.times(over * ratio)
            })
            .collect()
    }

    /// The factors of capacitance, force and (with a hinge) torque at a place.
    pub fn factors(&self, at: &[f64]) -> Vec<TableFactor> {
        let question = self.space.question_at(at);
        let wedge = wedge_factors(&question.arrangement).expect("plates that overlap, as was checked");
        let arm_m = question.hinge.map_or(f64::INFINITY, |h| h.arm_m);
        let wedges = [wedge.capacitance, wedge.force, wedge.torque(arm_m)];
        let known = self.all(at);
        (0..self.in_threes()).map(|n| TableFactor { factor: known[n], wedge: wedges[n] }).collect()
    }

    /// How many of capacitance, force and torque there are.
    pub fn in_threes(&self) -> usize {
        if self.has_torque() {
            3
        } else {
            2
        }
    }

    /// A reading corrected: capacitance, force and (with a hinge) torque.
    ///
    /// The part of the reading is first order \[GUM2008\]: the sensitivities are the slopes of ideal formula times
    /// factor, exact for the interpolant, so that what gap and tilt do to the factor is in them.
    pub fn correct(&self, reading: &Reading) -> Vec<Corrected> {
        let at = &reading.at;
        let weights = self.weights(at);
        let count = self.in_threes();
        let lamella = self.space.lamella(at);
        let own = self.space.question_at(at);
        let volts = reading.voltage_v / own.voltage_v;
        // Force and torque go with the square of the voltage.
        let square = [1.0, volts * volts, volts * volts];
        let ideal = in_a_row(&own.ideal(), count == 3);
        let over_lamellae = in_a_row(&lamella.ideal, count == 3);
        // Slopes along each axis: of the ideal values, of what the lamellae carry and of what the excess multiplies.
        let closed = |at: &[f64]| -> Vec<[f64; 3]> {
            let lamella = self.space.lamella(at);
            let ideal = in_a_row(&self.space.question_at(at).ideal(), count == 3);
            let reference = in_a_row(&lamella.ideal, count == 3);
            (0..count)
                .map(|n| {
                    let [carried, over] = self.quantities[n].carried(&lamella, &self.space);
                    [ideal[n], reference[n] * carried, reference[n] * over]
                })
                .collect()
        };
        let needed = |k: usize| reading.at_uncertainty[k] > 0.0;
        let slopes: Vec<Option<Vec<[f64; 3]>>> = (0..at.len())
            .map(|k| {
                needed(k).then(|| {
                    let span = self.space.axes[k].span;
                    let step = STEP * (span.to - span.from);
                    let shifted = |by: f64| {
                        let mut at = at.clone();
                        at[k] += by;
                        closed(&at)
                    };
                    let (low, high) = (shifted(-step), shifted(step));
                    (0..count).map(|n| [0, 1, 2].map(|m| (high[n][m] - low[n][m]) / (2.0 * step))).collect()
                })
            })
            .collect();
        (0..count)
            .map(|n| {
                let [carried, over] = self.quantities[n].carried(&lamella, &self.space);
                let excess = self.fit.interpolant.at(&weights, n);
                let known = Known {
                    value: carried / over + excess.value,
                    numerical: excess.uncertainty,
                    interpolation: self.fit.missed[n].uncertainty,
                };
                let corrected = known.times(over * over_lamellae[n] * square[n]);
                let factor = known.times(over * over_lamellae[n] / ideal[n]);
                let (mut ideal_squares, mut squares) = (0.0, 0.0);
                for (k, slopes) in slopes.iter().enumerate() {
                    let Some(slopes) = slopes else { continue };
                    let [of_ideal, of_carried, of_over] = slopes[n];
                    let graded = self.space.axes[k].reduced(at[k])[1];
                    let whole = of_carried
                        + of_over * excess.value
                        + over_lamellae[n] * over * excess.slopes[k] * graded;
                    ideal_squares += (of_ideal * square[n] * reading.at_uncertainty[k]).powi(2);
                    squares += (whole * square[n] * reading.at_uncertainty[k]).powi(2);
                }
                if n > 0 {
                    // d(V^2)/dV, also at V = 0.
                    let slope = 2.0 * volts / own.voltage_v * reading.voltage_uncertainty_v;
                    ideal_squares += (ideal[n] * slope).powi(2);
                    squares += (ideal[n] * factor.value * slope).powi(2);
                }
                Corrected {
                    ideal: ideal[n] * square[n],
                    ideal_uncertainty: ideal_squares.sqrt(),
                    factor,
                    corrected,
                    input: squares.sqrt(),
                }
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::table;

    #[test]
    fn corrected_is_ideal_times_factor() {
        let table = table();
        let at = vec![0.0033, 0.009];
        let reading = Reading {
            at: at.clone(),
            at_uncertainty: vec![0.0, 0.0],
            voltage_v: 250.0,
            voltage_uncertainty_v: 0.0,
        };
        let factors = table.factors(&at);
        let mut question = table.space.question_at(&at);
        question.voltage_v = 250.0;
        let ideal = in_a_row(&question.ideal(), true);
        for (n, c) in table.correct(&reading).iter().enumerate() {
            assert!((c.ideal / ideal[n] - 1.0).abs() < 1e-14);
            assert!((c.factor.value / factors[n].factor.value - 1.0).abs() < 1e-14);
            assert!((c.corrected.value / (c.ideal * c.factor.value) - 1.0).abs() < 1e-14);
            assert!(
                (c.uncertainty() / c.corrected.value - c.factor.uncertainty() / c.factor.value).abs() < 1e-15
            );
            assert_eq!((c.input, c.ideal_uncertainty), (0.0, 0.0));
        }
    }

    #[test]
    fn sensitivities_are_those_of_the_corrected_values() {
        let table = table();
        let reading = |at: [f64; 2], voltage_v: f64| Reading {
            at: at.to_vec(),
            at_uncertainty: vec![0.0; 2],
            voltage_v,
            voltage_uncertainty_v: 0.0,
        };
        let (at, volts, u) = ([0.0033, 0.009], 250.0, [2e-6, 1e-4, 0.5]);
        for k in 0..3 {
            let mut uncertain = reading(at, volts);
            let step = u[k] * 1e-3;
            let (mut low, mut high) = (reading(at, volts), reading(at, volts));
            if k < 2 {
                uncertain.at_uncertainty[k] = u[k];
                low.at[k] -= step;
                high.at[k] += step;
            } else {
                uncertain.voltage_uncertainty_v = u[k];
                low.voltage_v -= step;
                high.voltage_v += step;
            }
            let (low, high) = (table.correct(&low), table.correct(&high));
            for (n, c) in table.correct(&uncertain).iter().enumerate() {
                let quotient = (high[n].corrected.value - low[n].corrected.value) / (2.0 * step) * u[k];
                assert!((c.input - quotient.abs()).abs() < 1e-5 * quotient.abs() + 1e-30, "{k} {n}");
                let quotient = (high[n].ideal - low[n].ideal) / (2.0 * step) * u[k];
                assert!((c.ideal_uncertainty - quotient.abs()).abs() < 1e-5 * quotient.abs() + 1e-30);
            }
        }
    }

    #[test]
    fn the_gap_enters_the_force_nearly_squared() {
        let table = table();
        let reading = Reading {
            at: vec![0.004, 0.0],
            at_uncertainty: vec![4e-6, 0.0],
            voltage_v: 400.0,
            voltage_uncertainty_v: 0.0,
        };
        let force = table.correct(&reading)[1];
        let relative = force.input / force.corrected.value / 1e-3;
        assert!((1.9..2.0).contains(&relative), "{relative}");
    }

    #[test]
    fn the_other_quantities_belong_to_the_factors() {
        let table = table();
        let all = table.all(&[0.005, 0.004]);
        let at = |name: &str| {
            let n = table.quantities.iter().position(|q| q.name() == name).unwrap();
            all[n].value
        };
        assert!((at("factor_F") + at("force_z")).abs() < 1e-12);
        assert!((at("factor_T") - at("hinge_torque_y")).abs() < 1e-12);
    }
}
