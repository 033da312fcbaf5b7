//! From three levels of the family to the limit of an infinitely fine grid, with an error bar.
//!
//! On the family the error of a level is a + b q^-2 + c q^-3 + ...: second order inside, third order from the graded
//! edges (a knife edge leaves an energy in its first cell that is proportional to the size of that cell, q^-3). The
//! fit of the first three terms is reported.
//!
//! The standard uncertainty is half of the larger of two distances from that fit: to the fit with q^-4 in place of
//! q^-3, and to the extrapolation with the observed order (to that with order 2 alone, where no order can be observed).
//! Where a coarser triple was fitted before, a fifth of the change since then is a lower bound too. The weights were
//! set on strips, for which exact values are known, and checked on plates; see the coverage test.

/// Weight of the distances between different fits of the same levels.
const FIT_WEIGHT: f64 = 0.5;
/// Weight of the distance to the fit of the previous triple; an error of fourth order falls by (3/2)^-4 = 0.2.
const STEP_WEIGHT: f64 = 0.2;
/// Observed orders outside this range say that the levels do not follow the expansion.
const CREDIBLE_ORDERS: [f64; 2] = [1.0, 4.0];

/// The limit of three levels.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Limit {
    /// The extrapolated value.
    pub value: f64,
    /// Its standard uncertainty from the extrapolation.
    pub uncertainty: f64,
    /// Order of convergence that the three levels show, if they show one.
    pub order: Option<f64>,
}

/// Solution of the fit a + b q^-2 + c q^-p through three levels.
fn fit(q: [f64; 3], y: [f64; 3], p: i32) -> f64 {
    let (u, v) = (q.map(|q| q.powi(-2)), q.map(|q| q.powi(-p)));
    // Eliminate b between neighbours, then c.
    let slope = |k: usize| ((y[k + 1] - y[k]) / (u[k + 1] - u[k]), (v[k + 1] - v[k]) / (u[k + 1] - u[k]));
    let ((s0, t0), (s1, t1)) = (slope(0), slope(1));
    let c = (s1 - s0) / (t1 - t0);
    let b = s1 - c * t1;
    y[2] - b * u[2] - c * v[2]
}

/// The order p of a + b q^-p through three levels, where it is credible.
pub fn observed_order(q: [f64; 3], y: [f64; 3]) -> Option<f64> {
    let ratio = (y[2] - y[1]) / (y[1] - y[0]);
    let of = |p: f64| {
        let r = q.map(|q| q.powf(-p));
        (r[2] - r[1]) / (r[1] - r[0])
    };
    // The ratio of differences falls monotonically with the order.
    let [mut low, mut high] = CREDIBLE_ORDERS;
    if !(of(high)..=of(low)).contains(&ratio) {
        return None;
    }
    while high - low > 1e-6 {
        let middle = 0.5 * (low + high);
        if of(middle) > ratio {
            low = middle;
        } else {
            high = middle;
        }
    }
    Some(low)
}

/// Extrapolates three levels `q` with values `y`, ascending in q; `previous` is the limit of the triple before.
pub fn extrapolate(q: [f64; 3], y: [f64; 3], previous: Option<f64>) -> Limit {
    let value = fit(q, y, 3);
    let order = observed_order(q, y);
    let richardson = |p: f64| y[2] + (y[2] - y[1]) / ((q[2] / q[1]).powf(p) - 1.0);
    let other = richardson(order.unwrap_or(2.0));
    // With no order to be seen the levels do not follow the expansion, and the distance counts in full.
    let weight = if order.is_some() { FIT_WEIGHT } else { 1.0 };
    let uncertainty = (FIT_WEIGHT * (value - fit(q, y, 4)).abs())
        .max(weight * (value - other).abs())
        .max(previous.map_or(0.0, |p| STEP_WEIGHT * (value - p).abs()));
    Limit { value, uncertainty, order }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_expansion_is_recovered_exactly() {
        for q in [[2.0, 3.0, 4.0], [3.0, 4.0, 6.0], [4.0, 6.0, 8.0]] {
            let y = q.map(|q: f64| 7.0 - 3.0 * q.powi(-2) + 5.0 * q.powi(-3));
            let limit = extrapolate(q, y, None);
            assert!((limit.value - 7.0).abs() < 1e-13 && limit.uncertainty > 0.0);
        }
    }

    #[test]
    fn a_term_outside_the_expansion_is_covered() {
        for extra in [-1.0, 1.0] {
            for p in [2.5, 4.0, 5.0] {
                let q = [3.0, 4.0, 6.0];
                let y = q.map(|q: f64| 1.0 + q.powi(-2) + extra * 0.3 * q.powf(-p));
                let limit = extrapolate(q, y, None);
                assert!((limit.value - 1.0).abs() < 2.0 * limit.uncertainty, "{extra} {p} {limit:?}");
            }
        }
    }

    #[test]
    fn the_order_is_the_one_of_the_data() {
        let q = [2.0, 3.0, 4.0];
        for p in [1.3f64, 2.0, 3.1] {
            let order = observed_order(q, q.map(|q| 1.0 + q.powf(-p))).unwrap();
            assert!((order - p).abs() < 1e-5);
        }
        assert_eq!(observed_order(q, [1.0, 2.0, 1.5]), None);
        assert_eq!(observed_order(q, [1.0; 3]), None);
    }
}
