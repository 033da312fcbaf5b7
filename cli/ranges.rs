//! Ranges as a person writes them, `2mm..8mm` or `2mm..8mm/7`, and the round values at which a table is printed.

use serde_json::{json, Value};

use crate::document::quoted;
use crate::quantity::{Dimension, Quantity, QuantityError};
use crate::tables::axis::{Span, Variable};

/// Most values in a printed direction.
const MOST_PRINTED: usize = 1000;
/// Values that a printed direction has at most when they are chosen here.
const CHOSEN: f64 = 9.0;
/// A step is a power of ten times one of these.
const ROUND_STEPS: [f64; 3] = [1.0, 2.0, 5.0];
/// Two values nearer than this part of a step are the same.
const SAME: f64 = 1e-6;

/// What is wrong with a range.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum RangeError {
    /// Not of the form from..to.
    #[error("{option}: {} is no range; give two values with two dots between them, for example {example}", quoted(.text))]
    Form {
        /// The option.
        option: &'static str,
        /// What was given.
        text: String,
        /// What does.
        example: &'static str,
    },
    /// An end is no quantity.
    #[error("{option}: {} {error}, for example {example}", quoted(.text))]
    End {
        /// The option.
        option: &'static str,
        /// What was given.
        text: String,
        /// What is wrong.
        error: QuantityError,
        /// What does.
        example: &'static str,
    },
    /// Empty or backwards.
    #[error("{option}: {} does not rise; give the lower end first, for example {example}", quoted(.text))]
    Order {
        /// The option.
        option: &'static str,
        /// What was given.
        text: String,
        /// What does.
        example: &'static str,
    },
    /// The number of printed values will not do.
    #[error("{option}: {} will not do as the number of printed values; give a whole number from 2 to 1000 after the slash, for example {example}/7", quoted(.text))]
    Count {
        /// The option.
        option: &'static str,
        /// What was given.
        text: String,
        /// What does.
        example: &'static str,
    },
}

/// A range with its unit.
#[derive(Clone, Debug, PartialEq)]
pub struct Range {
    /// From where to where.
    pub span: Span,
    /// Unit in which it was given.
    pub unit: &'static str,
    /// Number of printed values, if it was given.
    pub printed: Option<usize>,
}

impl Variable {
    /// What it measures.
    pub fn dimension(self) -> Dimension {
        match self {
            Variable::Gap => Dimension::Length,
            Variable::Tilt | Variable::Roll | Variable::Angle => Dimension::Angle,
        }
    }

    /// The option with its range, and an example.
    pub fn option(self) -> (&'static str, &'static str) {
        match self {
            Variable::Gap => ("--gaps", "2mm..8mm"),
            Variable::Tilt => ("--tilts", "0deg..1deg"),
            Variable::Roll => ("--rolls", "-0.2deg..0.2deg"),
            Variable::Angle => ("--angles", "-15mrad..10mrad"),
        }
    }
}

impl Range {
    /// Reads the value of an option.
    ///
    /// # Errors
    /// See [`RangeError`].
    pub fn parse(variable: Variable, text: &str) -> Result<Range, RangeError> {
        let (option, example) = variable.option();
        let owned = || text.to_string();
        let (ends, count) = match text.split_once('/') {
            Some((ends, count)) => (ends, Some(count)),
            None => (text, None),
        };
        let Some((from, to)) = ends.split_once("..") else {
            return Err(RangeError::Form { option, text: owned(), example });
        };
        let [from, to] = [from, to].map(|end| {
            Quantity::parse(end, variable.dimension()).map_err(|error| RangeError::End {
                option,
                text: end.into(),
                error,
                example,
            })
        });
        let (from, to) = (from?, to?);
        if from.si >= to.si {
            return Err(RangeError::Order { option, text: owned(), example });
        }
        let printed = match count {
            None => None,
            Some(count) => {
                let number: Option<usize> = count.trim().parse().ok();
                let good = number.filter(|n| (2..=MOST_PRINTED).contains(n));
                Some(good.ok_or(RangeError::Count { option, text: count.into(), example })?)
            }
        };
        Ok(Range { span: Span { variable, from: from.si, to: to.si }, unit: from.unit, printed })
    }

    /// As it is stored.
    pub fn to_json(&self) -> Value {
        json!({
            "variable": self.span.variable.name(),
            "from": self.span.from,
            "to": self.span.to,
            "unit": self.unit,
            "printed": self.printed,
        })
    }

    /// As it was stored; none if it is something else.
    pub fn from_json(value: &Value) -> Option<Range> {
        let variable = Variable::ALL.into_iter().find(|v| value["variable"] == v.name())?;
        let (from, to) = (value["from"].as_f64()?, value["to"].as_f64()?);
        let unit = variable.dimension().spellings().find(|u| value["unit"] == *u)?;
        let printed = match &value["printed"] {
            Value::Null => None,
            number => Some(number.as_u64().filter(|n| (2..=MOST_PRINTED as u64).contains(n))? as usize),
        };
        (from < to).then_some(Range { span: Span { variable, from, to }, unit, printed })
    }

    /// A value of the variable in the range's unit.
    pub fn shown(&self, si: f64) -> f64 {
        self.span.variable.dimension().from_si(si, self.unit).unwrap_or(si)
    }

    /// The values at which a table is printed, in SI, both ends among them: as many as were asked for, or round ones.
    pub fn printed_values(&self) -> Vec<f64> {
        let Span { from, to, variable } = self.span;
        if let Some(count) = self.printed {
            return self.span.evenly(count);
        }
        let (low, high) = (self.shown(from), self.shown(to));
        let step = round_step(high - low);
        let mut values = vec![from];
        let mut n = (low / step + SAME).floor() + 1.0;
        while n * step < high - SAME * step {
            values.push(variable.dimension().to_si(n * step, self.unit).unwrap_or(n * step));
            n += 1.0;
        }
        values.push(to);
        values
    }

    /// Decimals with which the printed values are told apart.
    pub fn decimals(&self) -> usize {
        let values = self.printed_values();
        let shown: Vec<f64> = values.iter().map(|v| self.shown(*v)).collect();
        let size = shown.iter().fold(0.0f64, |m, v| m.max(v.abs()));
        (0..9)
            .find(|d| {
                let power = 10f64.powi(*d);
                shown.iter().all(|v| (v * power - (v * power).round()).abs() < SAME * (1.0 + size))
            })
            .unwrap_or(5) as usize
    }
}

/// The smallest round step that divides a length into few enough parts.
fn round_step(length: f64) -> f64 {
    let least = length / (CHOSEN - 1.0);
    let power = 10f64.powf(least.log10().floor());
    let steps = ROUND_STEPS.iter().map(|s| s * power).chain([10.0 * power]);
    steps.into_iter().find(|s| *s >= least * (1.0 - SAME)).unwrap_or(10.0 * power)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn shown(variable: Variable, text: &str) -> Vec<String> {
        let range = Range::parse(variable, text).unwrap();
        let decimals = range.decimals();
        range.printed_values().iter().map(|v| format!("{:.decimals$}", range.shown(*v))).collect()
    }

    #[test]
    fn ranges_are_read() {
        let range = Range::parse(Variable::Gap, "2mm..8 mm/7").unwrap();
        assert_eq!(
            (range.span.from, range.span.to, range.unit, range.printed),
            (0.002, 0.008, "mm", Some(7))
        );
        let range = Range::parse(Variable::Tilt, "-1°..20 mrad").unwrap();
        assert_eq!((range.span.to, range.unit, range.printed), (0.02, "deg", None));
        assert_eq!(Range::from_json(&range.to_json()), Some(range));
    }

    #[test]
    fn refusals_say_what_to_do() {
        for (text, message) in [
            ("2mm", "--gaps: \"2mm\" is no range; give two values with two dots between them, for example 2mm..8mm"),
            ("2..8mm", "--gaps: \"2\" has no unit; give a length with m, cm, mm, um or in, for example 2mm..8mm"),
            ("8mm..2mm", "--gaps: \"8mm..2mm\" does not rise; give the lower end first, for example 2mm..8mm"),
            ("2mm..2mm", "--gaps: \"2mm..2mm\" does not rise; give the lower end first, for example 2mm..8mm"),
            (
                "2mm..8mm/1",
                "--gaps: \"1\" will not do as the number of printed values; give a whole number from 2 to 1000 after \
                 the slash, for example 2mm..8mm/7",
            ),
        ] {
            assert_eq!(Range::parse(Variable::Gap, text).unwrap_err().to_string(), message);
        }
    }

    #[test]
    fn printed_values_are_round_or_as_many_as_asked_for() {
        assert_eq!(shown(Variable::Gap, "2mm..8mm"), ["2", "3", "4", "5", "6", "7", "8"]);
        assert_eq!(shown(Variable::Gap, "2mm..8mm/4"), ["2", "4", "6", "8"]);
        assert_eq!(shown(Variable::Tilt, "0deg..1deg"), ["0.0", "0.2", "0.4", "0.6", "0.8", "1.0"]);
        assert_eq!(shown(Variable::Gap, "2.3mm..4mm"), ["2.3", "2.5", "3.0", "3.5", "4.0"]);
        assert_eq!(shown(Variable::Angle, "-15mrad..10mrad"), ["-15", "-10", "-5", "0", "5", "10"]);
    }
}
