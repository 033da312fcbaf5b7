//! Quantities as a person writes them: a number and a unit, "4 mm", "-2mrad", "1.5 kV".
//!
//! A number without a unit is refused, because 4 may be millimetres to one person and metres to the next. Inside the
//! program everything is SI; here is the border. What was written is kept, so that a report can show it again.

use std::fmt;

/// What a quantity measures.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Dimension {
    /// Metres inside.
    Length,
    /// Radians inside.
    Angle,
    /// Volts inside.
    Voltage,
    /// Kilograms inside.
    Mass,
}

/// A unit: the SI value is the number times the first factor over the second. Two exact integers round once less than
/// one decimal fraction, so that "4 mm" is exactly the number that 0.004 is.
struct Unit {
    names: &'static [&'static str],
    times: f64,
    over: f64,
}

const fn unit(names: &'static [&'static str], times: f64, over: f64) -> Unit {
    Unit { names, times, over }
}

/// The inch is 25.4 mm by definition (international yard and pound agreement, 1959).
const LENGTHS: [Unit; 5] = [
    unit(&["m"], 1.0, 1.0),
    unit(&["cm"], 1.0, 100.0),
    unit(&["mm"], 1.0, 1e3),
    unit(&["um", "µm", "μm"], 1.0, 1e6), // the micro sign and the Greek letter
    unit(&["in"], 254.0, 1e4),
];
const ANGLES: [Unit; 4] = [
    unit(&["deg", "°"], std::f64::consts::PI, 180.0),
    unit(&["rad"], 1.0, 1.0),
    unit(&["mrad"], 1.0, 1e3),
    unit(&["arcmin"], std::f64::consts::PI, 180.0 * 60.0),
];
const VOLTAGES: [Unit; 2] = [unit(&["V"], 1.0, 1.0), unit(&["kV"], 1e3, 1.0)];
const MASSES: [Unit; 4] = [
    unit(&["kg"], 1.0, 1.0),
    unit(&["g"], 1.0, 1e3),
    unit(&["mg"], 1.0, 1e6),
    unit(&["ug", "µg", "μg"], 1.0, 1e9),
];

impl Dimension {
    fn units(self) -> &'static [Unit] {
        match self {
            Dimension::Length => &LENGTHS,
            Dimension::Angle => &ANGLES,
            Dimension::Voltage => &VOLTAGES,
            Dimension::Mass => &MASSES,
        }
    }

    /// All spellings of the units that do.
    pub fn spellings(self) -> impl Iterator<Item = &'static str> {
        self.units().iter().flat_map(|u| u.names).copied()
    }

    /// The units in one line: "m, cm, mm, um or in".
    pub fn unit_list(self) -> String {
        let names: Vec<&str> = self.units().iter().map(|u| u.names[0]).collect();
        let (last, rest) = names.split_last().expect("every dimension has units");
        format!("{} or {last}", rest.join(", "))
    }

    /// "a length", "an angle", "a voltage".
    pub fn noun(self) -> &'static str {
        match self {
            Dimension::Length => "a length",
            Dimension::Angle => "an angle",
            Dimension::Voltage => "a voltage",
            Dimension::Mass => "a mass",
        }
    }

    /// A number of this unit in SI; none if there is no such unit.
    pub fn to_si(self, value: f64, unit: &str) -> Option<f64> {
        let known = self.units().iter().find(|u| u.names.contains(&unit))?;
        Some(value * known.times / known.over)
    }

    /// An SI value in a unit; none if there is no such unit.
    pub fn from_si(self, si: f64, unit: &str) -> Option<f64> {
        let known = self.units().iter().find(|u| u.names.contains(&unit))?;
        Some(si * known.over / known.times)
    }
}

/// A number with a unit, as written and in SI.
#[derive(Clone, Debug, PartialEq)]
pub struct Quantity {
    /// In metres, radians, volts or kilograms.
    pub si: f64,
    /// As written, but for the kind of blanks.
    pub text: String,
    /// The unit, in its first spelling.
    pub unit: &'static str,
}

/// Why a text is not a quantity. The messages continue a sentence that has named the text.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum QuantityError {
    /// Nothing there.
    #[error("is empty; give {} with {}", .0.noun(), .0.unit_list())]
    Empty(Dimension),
    /// Does not begin with a number.
    #[error("does not begin with a finite number; give {} with {}", .0.noun(), .0.unit_list())]
    NoNumber(Dimension),
    /// A decimal comma.
    #[error("has a comma; write a decimal point, and {} with {}", .0.noun(), .0.unit_list())]
    Comma(Dimension),
    /// A number without a unit.
    #[error("has no unit; give {} with {}", .0.noun(), .0.unit_list())]
    NoUnit(Dimension),
    /// A unit that does not fit.
    #[error("has the unit {unit:?}; give {} with {}", dimension.noun(), dimension.unit_list())]
    Unit {
        /// What was written.
        unit: String,
        /// What was expected.
        dimension: Dimension,
    },
    /// Too large or too small for a floating-point number.
    #[error("is too large or too small to compute with; check the exponent")]
    Range,
}

/// Length of the number at the beginning of a text: sign, digits, point, exponent.
fn number_length(text: &str) -> usize {
    let bytes = text.as_bytes();
    let digits = |mut at: usize| {
        while bytes.get(at).is_some_and(u8::is_ascii_digit) {
            at += 1;
        }
        at
    };
    let sign = |at: usize| at + usize::from(matches!(bytes.get(at), Some(b'+' | b'-')));
    let begin = sign(0);
    let whole = digits(begin);
    let mut end = whole;
    let mut some = whole > begin;
    if bytes.get(whole) == Some(&b'.') {
        end = digits(whole + 1);
        some |= end > whole + 1;
    }
    if !some {
        return 0;
    }
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let from = sign(end + 1);
        let to = digits(from);
        if to > from {
            end = to;
        }
    }
    end
}

impl Quantity {
    /// Reads a quantity. Blanks around and between number and unit do not matter; the minus sign of typesetting does
    /// as well as the hyphen.
    ///
    /// # Errors
    /// See [`QuantityError`].
    pub fn parse(text: &str, dimension: Dimension) -> Result<Quantity, QuantityError> {
        let kept = text.trim();
        if kept.is_empty() {
            return Err(QuantityError::Empty(dimension));
        }
        let plain = kept.replace('\u{2212}', "-");
        let (number, unit) = plain.split_at(number_length(&plain));
        let unit = unit.trim_start();
        if number.is_empty() {
            return Err(QuantityError::NoNumber(dimension));
        }
        if unit.is_empty() {
            return Err(QuantityError::NoUnit(dimension));
        }
        if unit.starts_with(',') {
            return Err(QuantityError::Comma(dimension));
        }
        let known = dimension.units().iter().find(|u| u.names.contains(&unit));
        let Some(known) = known else {
            return Err(QuantityError::Unit { unit: unit.into(), dimension });
        };
        let value: f64 = number.parse().map_err(|_| QuantityError::NoNumber(dimension))?;
        let si = value * known.times / known.over;
        let mantissa = number.split(['e', 'E']).next().unwrap_or(number);
        let is_zero = !mantissa.bytes().any(|b| (b'1'..=b'9').contains(&b));
        if !si.is_finite() || (si == 0.0 && !is_zero) {
            return Err(QuantityError::Range);
        }
        // As written, but with one plain blank at most.
        let blank = if plain.len() > number.len() + unit.len() { " " } else { "" };
        Ok(Quantity { si, text: format!("{number}{blank}{unit}"), unit: known.names[0] })
    }
}

impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter) -> fmt::Result {
        f.write_str(&self.text)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use Dimension::*;

    fn si(text: &str, dimension: Dimension) -> f64 {
        Quantity::parse(text, dimension).unwrap().si
    }

    #[test]
    fn every_unit_and_spelling() {
        for (text, value) in [
            ("4 mm", 0.004),
            ("4mm", 0.004),
            ("  +4.0e0\u{202f}mm ", 0.004),
            ("12cm", 0.12),
            ("0.3 m", 0.3),
            ("25 um", 25e-6),
            ("25 µm", 25e-6),
            ("25 μm", 25e-6),
            (".5 in", 0.0127),
            ("5. mm", 0.005),
            ("1e1mm", 0.01),
            ("-0 mm", 0.0),
        ] {
            assert_eq!(si(text, Length), value, "{text}");
        }
        assert_eq!(si("-2 mrad", Angle), -0.002);
        assert_eq!(si("\u{2212}2 mrad", Angle), -0.002);
        assert_eq!(si("0.1rad", Angle), 0.1);
        assert_eq!(si("180 deg", Angle), std::f64::consts::PI);
        assert_eq!(si("60arcmin", Angle), si("1°", Angle));
        assert_eq!([si("1.5kV", Voltage), si("-250 V", Voltage)], [1500.0, -250.0]);
    }

    #[test]
    fn what_was_written_is_kept() {
        for (text, kept) in [(" 4 mm\n", "4 mm"), ("4.0mm", "4.0mm"), ("1e-2\n\tm", "1e-2 m")] {
            let q = Quantity::parse(text, Length).unwrap();
            assert_eq!((q.text.as_str(), q.to_string().as_str()), (kept, kept));
        }
    }

    #[test]
    fn refusals_say_what_to_do() {
        for (text, dimension, message) in [
            ("", Length, "is empty; give a length with m, cm, mm, um or in"),
            ("4", Length, "has no unit; give a length with m, cm, mm, um or in"),
            ("-3e-3", Angle, "has no unit; give an angle with deg, rad, mrad or arcmin"),
            ("4 kg", Length, "has the unit \"kg\"; give a length with m, cm, mm, um or in"),
            ("4 mV", Voltage, "has the unit \"mV\"; give a voltage with V or kV"),
            ("4e mm", Length, "has the unit \"e mm\"; give a length with m, cm, mm, um or in"),
            ("4 m m", Length, "has the unit \"m m\"; give a length with m, cm, mm, um or in"),
            ("NaN mm", Length, "does not begin with a finite number; give a length with m, cm, mm, um or in"),
            ("inf mm", Length, "does not begin with a finite number; give a length with m, cm, mm, um or in"),
            ("mm", Length, "does not begin with a finite number; give a length with m, cm, mm, um or in"),
            (
                "--json",
                Angle,
                "does not begin with a finite number; give an angle with deg, rad, mrad or arcmin",
            ),
            ("4,5 mm", Length, "has a comma; write a decimal point, and a length with m, cm, mm, um or in"),
            ("1e999 mm", Length, "is too large or too small to compute with; check the exponent"),
            ("1e-999 mm", Length, "is too large or too small to compute with; check the exponent"),
            ("1e308 kV", Voltage, "is too large or too small to compute with; check the exponent"),
        ] {
            assert_eq!(Quantity::parse(text, dimension).unwrap_err().to_string(), message, "{text}");
        }
    }

    proptest! {
        #[test]
        fn any_text_is_a_quantity_or_an_error(text in "\\PC*") {
            for dimension in [Length, Angle, Voltage] {
                if let Ok(q) = Quantity::parse(&text, dimension) {
                    prop_assert!(q.si.is_finite());
                }
            }
        }

        #[test]
        fn millimetres_are_thousandths(value in -1e6..1e6f64) {
            prop_assert_eq!(si(&format!("{value:?} mm"), Length), value / 1e3);
            prop_assert_eq!(si(&format!("{value:e}mm"), Length), value / 1e3);
            prop_assert_eq!(si(&format!("{value} V"), Voltage), value);
        }
    }
}
