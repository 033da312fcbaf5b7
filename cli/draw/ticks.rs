//! Round numbers for axes, scales and contours, and how they are written.

/// Steps that count as round, between 1 and 10.
const ROUND: [f64; 4] = [1.0, 2.0, 5.0, 10.0];
/// Relative tolerance at the ends of a range, for rounding.
const SLACK: f64 = 1e-9;

/// The round step (1, 2 or 5 times a power of ten) that cuts a length into at most `most` parts.
pub fn round_step(length: f64, most: usize) -> f64 {
    let raw = length / most.max(1) as f64;
    let power = 10f64.powf(raw.log10().floor());
    let step = ROUND.into_iter().map(|r| r * power).find(|s| *s >= raw * (1.0 - SLACK));
    step.unwrap_or(10.0 * power)
}

/// Multiples of a step in a range, ends included.
pub fn multiples([from, to]: [f64; 2], step: f64) -> Vec<f64> {
    let slack = SLACK * (to - from).abs();
    let first = ((from - slack) / step).ceil() as i64;
    let last = ((to + slack) / step).floor() as i64;
    (first..=last).map(|n| n as f64 * step).collect()
}

/// At most `most` + 1 round numbers in a range.
pub fn ticks(range: [f64; 2], most: usize) -> Vec<f64> {
    multiples(range, round_step(range[1] - range[0], most))
}

/// Decimals that a step needs.
fn decimals(step: f64) -> usize {
    (-(step.abs().log10() + SLACK).floor()).max(0.0) as usize
}

/// Numbers at a common step, all with the same decimals, with a true minus sign.
pub fn labels(numbers: &[f64]) -> Vec<String> {
    let step = numbers.windows(2).map(|w| (w[1] - w[0]).abs()).fold(f64::INFINITY, f64::min);
    let step = if step.is_finite() { step } else { numbers.first().map_or(1.0, |n| n.abs().max(1.0)) };
    numbers.iter().map(|n| number(*n, decimals(step))).collect()
}

/// A number with a true minus sign, and no minus zero.
pub fn number(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    let zero = text.bytes().all(|b| !(b'1'..=b'9').contains(&b));
    if zero {
        text.trim_start_matches('-').into()
    } else {
        text.replace('-', "−")
    }
}

/// A number with at most `digits` significant digits, without zeros at the end.
pub fn short(value: f64, digits: usize) -> String {
    if value == 0.0 {
        return "0".into();
    }
    let exponent = value.abs().log10().floor() as i32;
    let decimals = (digits as i32 - 1 - exponent).max(0) as usize;
    let text = number(value, decimals);
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').into()
    } else {
        text
    }
}

/// Powers of ten in a range of positive numbers, and the multiples 2 to 9 of them.
pub fn decades([from, to]: [f64; 2]) -> (Vec<f64>, Vec<f64>) {
    let inside = |v: &f64| *v >= from * (1.0 - SLACK) && *v <= to * (1.0 + SLACK);
    let powers: Vec<i32> = (from.log10().floor() as i32..=to.log10().ceil() as i32).collect();
    let major = powers.iter().map(|n| 10f64.powi(*n)).filter(inside).collect();
    let minor =
        powers.iter().flat_map(|n| (2..10).map(|m| m as f64 * 10f64.powi(*n))).filter(inside).collect();
    (major, minor)
}

/// 1, 2 and 5 times the powers of ten in a range, and how they are written.
pub fn halves([from, to]: [f64; 2]) -> (Vec<f64>, Vec<String>) {
    let powers = from.log10().floor() as i32..=to.log10().ceil() as i32;
    let all = powers.flat_map(|n| ROUND[..3].iter().map(move |m| (*m, n)));
    all.filter_map(|(m, n)| {
        let value = m * 10f64.powi(n);
        let inside = value >= from * (1.0 - SLACK) && value <= to * (1.0 + SLACK);
        let power = power_label(10f64.powi(n));
        let plain = !power.starts_with("10") || n == 1;
        let text = if plain { short(value, 1) } else { format!("{m}·{power}") };
        inside.then_some((value, text))
    })
    .unzip()
}

/// A power of ten as it is written on an axis: 0.01, 1, 10², 10⁶.
pub fn power_label(value: f64) -> String {
    const PLAIN: std::ops::RangeInclusive<i32> = -2..=3;
    let exponent = value.log10().round() as i32;
    if PLAIN.contains(&exponent) {
        return short(value, 1);
    }
    let raised = |c: char| match c {
        '-' => '⁻',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        digit => char::from_u32(0x2070 + digit as u32 - '0' as u32).unwrap_or(digit),
    };
    format!("10{}", exponent.to_string().chars().map(raised).collect::<String>())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_are_round_and_few() {
        assert_eq!(ticks([-78.0, 78.0], 8), [-60.0, -40.0, -20.0, 0.0, 20.0, 40.0, 60.0]);
        assert_eq!(round_step(400.0, 20), 20.0);
        assert_eq!(round_step(1.0, 3), 0.5);
        for length in [1e-9, 0.37, 12.0, 4e7] {
            for most in [3, 7, 20] {
                let parts = length / round_step(length, most);
                assert!(
                    parts <= most as f64 * (1.0 + 1e-8) && parts > most as f64 / 2.6,
                    "{length} {most} {parts}"
                );
            }
        }
    }

    #[test]
    fn numbers_are_written_alike() {
        assert_eq!(labels(&[-0.5, 0.0, 0.5]), ["−0.5", "0.0", "0.5"]);
        assert_eq!(labels(&[-20.0, -0.0, 20.0]), ["−20", "0", "20"]);
        assert_eq!(labels(&[0.02, 0.04]), ["0.02", "0.04"]);
        assert_eq!([short(400.0, 3), short(-0.40001, 3), short(12345.0, 3)], ["400", "−0.4", "12345"]);
        assert_eq!([1e-3, 0.01, 1.0, 1000.0, 1e4].map(power_label), ["10⁻³", "0.01", "1", "1000", "10⁴"]);
        let (major, minor) = decades([0.5, 30.0]);
        assert_eq!((major, minor.len()), (vec![1.0, 10.0], 5 + 8 + 2));
    }
}
