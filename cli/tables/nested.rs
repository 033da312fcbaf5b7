//! Nested points on -1 to 1 for polynomial interpolation, and the polynomials that belong to them.
//!
//! Leja's sequence \[Leja1957\]: each point is where the product of the distances to all points before it is largest. The
//! first n points interpolate nearly as well as n Chebyshev points do, for every n, so that an axis can grow by one
//! node and keep all it has.

/// Half-intervals of the set of candidates, which are dense towards the ends.
const CANDIDATES: usize = 1 << 12;

/// The first `count` points. Made with additions and multiplications alone, so that every machine finds the same.
pub fn nested_points(count: usize) -> Vec<f64> {
    let candidates: Vec<f64> = (0..=2 * CANDIDATES)
        .map(|n| {
            let s = n as f64 / CANDIDATES as f64 - 1.0;
            // Odd and steepest in the middle: the candidates crowd at the ends as the square of the distance.
            -0.5 * s * (3.0 - s * s)
        })
        .collect();
    let mut product = vec![1.0; candidates.len()];
    let mut points: Vec<f64> = Vec::with_capacity(count);
    while points.len() < count {
        let mut best = 0;
        for n in 0..product.len() {
            if product[n] > product[best] {
                best = n;
            }
        }
        let point = candidates[best];
        points.push(point);
        for (p, x) in product.iter_mut().zip(&candidates) {
            *p *= (x - point).abs();
        }
    }
    points
}

/// Values and slopes at `x` of the polynomials that are 1 at one of the nodes and 0 at the others.
///
/// The nodes differ from each other; `x` may be one of them.
pub fn basis(nodes: &[f64], x: f64) -> Vec<[f64; 2]> {
    (0..nodes.len())
        .map(|j| {
            let (mut value, mut slope) = (1.0, 0.0);
            for (k, node) in nodes.iter().enumerate() {
                if k != j {
                    let per = 1.0 / (nodes[j] - node);
                    slope = (slope * (x - node) + value) * per;
                    value *= (x - node) * per;
                }
            }
            [value, slope]
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_sequence_begins_with_the_ends_and_the_middle() {
        let points = nested_points(5);
        assert_eq!(points[..3], [1.0, -1.0, 0.0]);
        // The next one is where x(1 - x^2) is largest.
        assert!((points[3].abs() - 1.0 / 3f64.sqrt()).abs() < 1e-3, "{points:?}");
        assert!(points[3] * points[4] < 0.0);
    }

    #[test]
    fn the_points_are_nested_and_apart() {
        let many = nested_points(24);
        for n in 1..24 {
            assert_eq!(nested_points(n), many[..n]);
        }
        let mut sorted = many.clone();
        sorted.sort_by(f64::total_cmp);
        assert!(sorted.windows(2).all(|w| w[1] - w[0] > 2.0 / (24.0 * 24.0)));
    }

    /// The largest sum of |values|: by how much an error at the nodes may be magnified in between.
    fn magnification(nodes: &[f64]) -> f64 {
        let at = |x: f64| basis(nodes, x).iter().map(|b| b[0].abs()).sum::<f64>();
        (0..=2000).map(|n| at(n as f64 / 1000.0 - 1.0)).fold(0.0, f64::max)
    }

    #[test]
    fn errors_at_the_nodes_are_hardly_magnified() {
        let points = nested_points(16);
        // Measured on this sequence: below n for n nodes, 2.6 at 6 and 6.5 at worst.
        for n in 2..=16 {
            let worst = magnification(&points[..n]);
            assert!(worst < n as f64 && worst < 7.0, "{n}: {worst}");
        }
    }

    #[test]
    fn polynomials_are_interpolated_exactly_with_their_slopes() {
        let nodes = nested_points(7);
        let f = |x: f64| 1.0 + x * (2.0 - x * (0.5 + x.powi(4)));
        let slope = |x: f64| 2.0 - x - 6.0 * x.powi(5);
        for x in [-1.0, -0.77, 0.0, 0.3, nodes[4], 1.0] {
            let basis = basis(&nodes, x);
            let sum = |n: usize| basis.iter().zip(&nodes).map(|(b, node)| b[n] * f(*node)).sum::<f64>();
            assert!((sum(0) - f(x)).abs() < 1e-13 && (sum(1) - slope(x)).abs() < 1e-12, "{x}");
        }
    }

    #[test]
    fn a_smooth_function_converges() {
        // A pole at 1.5 off the middle: errors fall by 1.5 + sqrt(1.5^2 - 1) = 2.6 with each node.
        let f = |x: f64| 1.0 / (1.5 - x);
        let error = |n: usize| {
            let nodes = nested_points(n);
            let at =
                |x: f64| basis(&nodes, x).iter().zip(&nodes).map(|(b, p)| b[0] * f(*p)).sum::<f64>() - f(x);
            (0..200).map(|k| at(k as f64 / 100.0 - 0.995).abs()).fold(0.0, f64::max)
        };
        let (coarse, fine) = (error(6), error(12));
        assert!(fine < coarse / 2.6f64.powi(5) && fine < 1e-4, "{coarse} {fine}");
    }
}
