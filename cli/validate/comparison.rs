//! One number held against its reference.

use tiltgap_solver::{Estimate, EPS0};

use super::cases::{Case, Family};

/// Standard uncertainties in an expanded one, for about 95 % \[GUM2008\].
pub const COVERAGE_FACTOR: f64 = 2.0;
/// Largest distance accepted, in combined expanded uncertainties: three standard uncertainties, about 99.7 %.
pub const LARGEST_EN: f64 = 1.5;

/// What kind of quantity, which decides about its target.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sort {
    /// A charge or a capacitance.
    Charge,
    /// A force or a torque.
    Force,
}

/// How a number stands to its reference.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Verdict {
    /// Within the target, and within the combined expanded uncertainty.
    Good,
    /// Within the target and three standard uncertainties, not within two: one in twenty may be.
    Wide,
    /// Outside of either.
    Fails,
}

/// A number, its reference, and what is asked.
#[derive(Clone, Debug, PartialEq)]
pub struct Comparison {
    /// The family.
    pub family: String,
    /// The case.
    pub case: String,
    /// The quantity, and how it is wired where that matters.
    pub quantity: String,
    /// Kind of the reference.
    pub kind: String,
    /// Source of the reference.
    pub source: String,
    /// The number, in the units of the file.
    pub value: f64,
    /// Its standard uncertainty.
    pub uncertainty: f64,
    /// The reference.
    pub reference: f64,
    /// What the reference leaves open, taken as a standard uncertainty.
    pub open: f64,
    /// What a relative error refers to.
    pub scale: f64,
    /// Largest relative error allowed.
    pub target: f64,
    /// Whether the uncertainty is an error bar of the solver (not the rounding of a formula).
    pub solved: bool,
}

/// Where comparisons of a case come from.
pub struct Held<'a> {
    /// The family.
    pub family: &'a Family,
    /// The case.
    pub case: &'a Case,
}

impl Held<'_> {
    /// A number with its reference; `key` is the quantity of the file, `quantity` what it is called in reports.
    pub fn number(
        &self,
        (quantity, key): (&str, &str),
        sort: Sort,
        computed: Estimate,
        [reference, open]: [f64; 2],
        scale: f64,
    ) -> Comparison {
        let target = self.family.target.as_ref().map_or(0.0, |t| match sort {
            Sort::Charge => t.charge,
            Sort::Force => t.force,
        });
        Comparison {
            family: self.family.name.clone(),
            case: self.case.name().into(),
            quantity: quantity.into(),
            kind: self.family.kind_of(self.case, key).into(),
            source: self.family.source_of(self.case).into(),
            value: computed.value,
            uncertainty: computed.uncertainty,
            reference,
            open,
            scale,
            target,
            solved: true,
        }
    }

    /// A number of the case by its key; a relative error refers to the value itself.
    pub fn plain(&self, key: &str, sort: Sort, computed: Estimate) -> Comparison {
        let [reference, open] = [self.case.value(key), self.case.open(key)].map(super::cases::number);
        self.number((key, key), sort, computed, [reference, open], reference.abs())
    }
}

/// An estimate in the units of the reference cases: permittivity and voltage 1.
pub fn unit_free(e: Estimate) -> Estimate {
    times(e, 1.0 / EPS0)
}

/// An estimate times a number.
pub fn times(e: Estimate, by: f64) -> Estimate {
    Estimate { value: e.value * by, uncertainty: e.uncertainty * by.abs() }
}

impl Comparison {
    /// Signed distance from the reference.
    pub fn difference(&self) -> f64 {
        self.value - self.reference
    }

    /// Relative error, beyond what the reference leaves open.
    pub fn relative(&self) -> f64 {
        (self.difference().abs() - self.open).max(0.0) / self.scale
    }

    /// The combined standard uncertainty.
    pub fn combined(&self) -> f64 {
        self.uncertainty.hypot(self.open)
    }

    /// The normalised error E_n: the difference over the root sum of squares of the two expanded uncertainties
    /// \[ISO2022\]. What is exactly right is 0.
    pub fn normalised(&self) -> f64 {
        let off = self.difference();
        if off == 0.0 {
            0.0
        } else {
            off / (COVERAGE_FACTOR * self.combined())
        }
    }

    /// How it stands.
    pub fn verdict(&self) -> Verdict {
        let en = self.normalised().abs();
        // So that NaN fails.
        let within = self.relative() <= self.target && en <= LARGEST_EN;
        match (within, en <= 1.0) {
            (true, true) => Verdict::Good,
            (true, false) => Verdict::Wide,
            _ => Verdict::Fails,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn comparison(value: f64, uncertainty: f64, open: f64) -> Comparison {
        let family = Family::named("wedge-ideal");
        let held = Held { family: &family, case: &family.cases[0] };
        let computed = Estimate { value, uncertainty };
        let mut c = held.number(("capacitance", "capacitance"), Sort::Charge, computed, [1.0, open], 1.0);
        c.target = 1e-3;
        c
    }

    #[test]
    fn verdicts() {
        assert_eq!(comparison(1.0 + 1e-4, 1e-4, 0.0).verdict(), Verdict::Good);
        assert_eq!(comparison(1.0 + 2.5e-4, 1e-4, 0.0).verdict(), Verdict::Wide);
        assert_eq!(
            comparison(1.0 - 4e-4, 1e-4, 0.0).verdict(),
            Verdict::Fails,
            "outside of its own error bar"
        );
        assert_eq!(comparison(1.0 + 2e-3, 1e-2, 0.0).verdict(), Verdict::Fails, "outside of the target");
        assert_eq!(comparison(f64::NAN, 1e-4, 0.0).verdict(), Verdict::Fails);
        assert_eq!(comparison(1.0, f64::NAN, 0.0).normalised(), 0.0);
        let c = comparison(1.0 + 5e-4, 3e-4, 4e-4);
        assert!((c.normalised() - 0.5).abs() < 1e-9 && (c.relative() - 1e-4).abs() < 1e-12);
    }
}
