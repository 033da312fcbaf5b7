//! Values with an uncertainty in concise notation: 1.0462(3), 22.310(14) pF.
//!
//! The digits in parentheses are the standard uncertainty in units of the last digits shown (\[GUM2008\], 7.2.2). The
//! uncertainty gets two digits if the first is a 1 and one otherwise, so that rounding changes it by at most a
//! quarter.

/// More digits than this are noise of the arithmetic: values without uncertainty are shown with at most so many.
const MOST_DIGITS: i32 = 12;

/// SI prefixes with their powers of ten.
const PREFIXES: [(i32, &str); 11] = [
    (-18, "a"),
    (-15, "f"),
    (-12, "p"),
    (-9, "n"),
    (-6, "µ"),
    (-3, "m"),
    (0, ""),
    (3, "k"),
    (6, "M"),
    (9, "G"),
    (12, "T"),
];

/// A number that cannot be written down.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
#[error("{value} with uncertainty {uncertainty} is not a number that can be shown")]
pub struct NotANumber {
    /// The value.
    pub value: f64,
    /// Its uncertainty.
    pub uncertainty: f64,
}

/// Power of ten of the first digit of a positive number.
fn first_digit(v: f64) -> i32 {
    // Through the decimal form, which has no trouble with the rounding of a logarithm.
    let text = format!("{v:e}");
    text.split_once('e').and_then(|(_, e)| e.parse().ok()).unwrap_or(0)
}

/// Power of ten of the last digit to show for an uncertainty, if it says anything about the value.
fn last_digit(value: f64, uncertainty: f64) -> Option<i32> {
    if uncertainty == 0.0 || uncertainty < value.abs() * 10f64.powi(-MOST_DIGITS) {
        return None;
    }
    let rounded = format!("{uncertainty:.1e}");
    // Two digits if the first is a 1, unless they round to a 20.
    let two = rounded.starts_with('1');
    Some(first_digit(rounded.parse().unwrap_or(uncertainty)) - i32::from(two))
}

/// Number of decimals to which a value of this uncertainty is known; at most those of twelve digits.
pub fn decimals(value: f64, uncertainty: f64) -> usize {
    let least = if value == 0.0 { 0 } else { first_digit(value.abs()) - MOST_DIGITS + 1 };
    (-last_digit(value, uncertainty).unwrap_or(least)).max(0) as usize
}

/// A number with a fixed count of decimals, never "-0".
pub fn fixed(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(rest) if rest.bytes().all(|b| matches!(b, b'0' | b'.')) => rest.into(),
        _ => text,
    }
}

/// Concise notation of a value and its standard uncertainty, both in the unit that follows.
///
/// Without uncertainty (zero, or below the twelfth digit of the value) the value stands alone. An uncertainty of ten
/// or more rounds the value to whole tens, hundreds and so on, and is written in full: 12340(120).
///
/// # Errors
/// [`NotANumber`] if either is NaN or infinite, or the uncertainty is negative.
pub fn concise(value: f64, uncertainty: f64) -> Result<String, NotANumber> {
    if !value.is_finite() || !uncertainty.is_finite() || uncertainty < 0.0 {
        return Err(NotANumber { value, uncertainty });
    }
    let Some(last) = last_digit(value, uncertainty) else {
        let text = fixed(value, decimals(value, 0.0));
        let short = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
        return Ok(short.into());
    };
    if last > 0 {
        let step = 10f64.powi(last);
        return Ok(format!(
            "{}({})",
            fixed((value / step).round() * step, 0),
            fixed((uncertainty / step).round() * step, 0)
        ));
    }
    let decimals = -last as usize;
    let digits = fixed(uncertainty, decimals).replace('.', "");
    Ok(format!("{}({})", fixed(value, decimals), digits.trim_start_matches('0')))
}

/// The scale on which a quantity is shown: a power of ten and the unit with its prefix.
#[derive(Clone, Debug, PartialEq)]
pub struct Scale {
    power: i32,
    /// Unit with prefix, such as "pF" or "mN/m".
    pub unit: String,
}

impl Scale {
    /// The scale that puts `size` between 1 and 1000. Zero is shown in the unit itself, and what has no prefix with a
    /// power of ten.
    pub fn suited(size: f64, unit: &str) -> Scale {
        let size = size.abs();
        let power = if size > 0.0 && size.is_finite() { first_digit(size).div_euclid(3) * 3 } else { 0 };
        let unit = match PREFIXES.iter().find(|p| p.0 == power) {
            Some((_, prefix)) => format!("{prefix}{unit}"),
            None => format!("e{power} {unit}"),
        };
        Scale { power, unit }
    }

    /// A value in this scale.
    pub fn of(&self, v: f64) -> f64 {
        // In two steps, since a power of ten itself may be out of range.
        let half = self.power / 2;
        v / 10f64.powi(half) / 10f64.powi(self.power - half)
    }

    /// Concise notation in this scale, without the unit.
    ///
    /// # Errors
    /// As [`concise`].
    pub fn concise(&self, value: f64, uncertainty: f64) -> Result<String, NotANumber> {
        // A tiny negative uncertainty would become a zero on this scale.
        if uncertainty < 0.0 {
            return Err(NotANumber { value, uncertainty });
        }
        concise(self.of(value), self.of(uncertainty))
    }
}

/// Concise notation with a prefix chosen for the larger of value and uncertainty: 22.31(1) pF.
///
/// # Errors
/// As [`concise`].
pub fn concise_si(value: f64, uncertainty: f64, unit: &str) -> Result<String, NotANumber> {
    let scale = Scale::suited(value.abs().max(uncertainty), unit);
    Ok(format!("{} {}", scale.concise(value, uncertainty)?, scale.unit))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn digits_follow_the_uncertainty() {
        for (value, uncertainty, text) in [
            (1.04623, 0.0003, "1.0462(3)"),
            (1.04623, 0.00014, "1.04623(14)"),
            (1.04623, 0.000196, "1.0462(2)"),
            (1.04623, 0.000096, "1.04623(10)"),
            (1.04623, 0.00094, "1.0462(9)"),
            (-1.04623, 0.0003, "-1.0462(3)"),
            (0.9999, 0.002, "1.000(2)"),
            (3.2, 40.0, "0(40)"),
            (0.3, 4.0, "0(4)"),
            (-0.3, 4.0, "0(4)"),
            (0.0, 0.05, "0.00(5)"),
            (12345.0, 120.0, "12350(120)"),
            (12345.0, 3.0, "12345(3)"),
            (12345.0, 0.12, "12345.00(12)"),
            (5.0, 1.3, "5.0(13)"),
        ] {
            assert_eq!(concise(value, uncertainty).unwrap(), text, "{value} {uncertainty}");
        }
    }

    #[test]
    fn without_uncertainty_the_value_stands_alone() {
        for (value, text) in [
            (0.0, "0"),
            (-0.0, "0"),
            (1.0, "1"),
            (0.1, "0.1"),
            (1.0 / 3.0, "0.333333333333"),
            (1500.0, "1500"),
        ] {
            assert_eq!(concise(value, 0.0).unwrap(), text);
            assert_eq!(concise(value, value.abs() * 1e-14).unwrap(), text);
        }
    }

    #[test]
    fn what_is_not_a_number_is_refused() {
        for (value, uncertainty) in
            [(f64::NAN, 0.0), (1.0, f64::NAN), (f64::INFINITY, 1.0), (1.0, f64::INFINITY), (1.0, -1.0)]
        {
            assert!(concise(value, uncertainty).is_err());
        }
        let error = concise(f64::NAN, 0.5).unwrap_err().to_string();
        assert_eq!(error, "NaN with uncertainty 0.5 is not a number that can be shown");
    }

    #[test]
    fn a_tiny_negative_uncertainty_beside_a_large_value_is_refused() {
        assert!(concise_si(1e266, -7e-208, "N").is_err());
    }

    #[test]
    fn prefixes_are_chosen_for_the_larger_of_the_two() {
        for (value, uncertainty, text) in [
            (22.31e-12, 0.01e-12, "22.310(10) pF"),
            (999.96e-12, 0.3e-12, "1000.0(3) pF"),
            (-3.2e-3, 0.0, "-3.2 mF"),
            (0.3e-9, 4e-9, "0(4) nF"),
            (0.0, 0.0, "0 F"),
            (4.5e-30, 2e-31, "4.5(2) e-30 F"),
            (1.2e16, 0.0, "12 e15 F"),
            (1.0e3, 0.0, "1 kF"),
        ] {
            assert_eq!(concise_si(value, uncertainty, "F").unwrap(), text);
        }
        // The smallest number there is, 4.94e-324.
        assert!((Scale::suited(5e-324, "F").of(5e-324) - 4.94).abs() < 0.01);
    }

    /// The two numbers that a text in concise notation stands for.
    fn read(text: &str) -> (f64, f64) {
        let (value, rest) = text.split_once('(').unwrap();
        let last = value.split_once('.').map_or(0, |(_, d)| d.len()) as i32;
        (value.parse().unwrap(), rest.trim_end_matches(')').parse::<f64>().unwrap() / 10f64.powi(last))
    }

    proptest! {
        #[test]
        fn reads_back_within_its_own_rounding(
            mantissa in -10.0..10.0f64, power in -9..9i32, part in 1.0..10.0f64, below in -3..9i32,
        ) {
            let value = mantissa * 10f64.powi(power);
            let uncertainty = part * 10f64.powi(power - below);
            let text = concise(value, uncertainty).unwrap();
            let (v, u) = read(&text);
            prop_assert!((v - value).abs() <= 0.26 * uncertainty, "{text} {value}");
            prop_assert!((u - uncertainty).abs() <= 0.26 * uncertainty, "{text} {uncertainty}");
            let digits = text.split_once('(').unwrap().1.trim_end_matches(')').trim_end_matches('0');
            prop_assert!(digits.len() <= 2, "{text}");
        }

        #[test]
        fn any_numbers_are_shown_or_refused(value: f64, uncertainty: f64) {
            prop_assert_eq!(
                concise_si(value, uncertainty, "N").is_ok(),
                value.is_finite() && uncertainty.is_finite() && uncertainty >= 0.0
            );
        }
    }
}
