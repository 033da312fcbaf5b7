//! Interpolation weights on a few neighbouring nodes of an axis.

/// Up to four weights on consecutive nodes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stencil {
    /// First node.
    pub first: usize,
    /// Weights of the first node and those after it; unused ones are zero.
    pub weights: [f64; 4],
    /// How many weights are in use, 1 to 4.
    pub count: usize,
}

impl Stencil {
    /// The stencil that picks one node.
    pub fn at(node: usize) -> Self {
        Stencil { first: node, weights: [1.0, 0.0, 0.0, 0.0], count: 1 }
    }

    /// The same weights, `by` nodes further on.
    pub fn shifted(self, by: usize) -> Self {
        Stencil { first: self.first + by, ..self }
    }

    /// The interpolated value.
    pub fn apply(&self, values: &[f64]) -> f64 {
        (0..self.count).map(|n| self.weights[n] * values[self.first + n]).sum()
    }
}

/// Lagrange interpolation at `parameter` between uniform nodes 0, 1, ... `cells`: cubic where there are four nodes.
pub fn lagrange(parameter: f64, cells: usize) -> Stencil {
    let count = (cells + 1).min(4);
    let below = (parameter.floor() as usize).min(cells);
    if parameter == below as f64 {
        return Stencil::at(below);
    }
    let first = below.saturating_sub(1).min(cells + 1 - count);
    let mut weights = [0.0; 4];
    for n in 0..count {
        weights[n] = 1.0;
        for m in (0..count).filter(|&m| m != n) {
            weights[n] *= (parameter - (first + m) as f64) / (n as f64 - m as f64);
        }
    }
    Stencil { first, weights, count }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cubics_are_exact_and_short_axes_are_linear() {
        let cubic = |x: f64| 1.0 + x * (2.0 - x * (0.5 - 0.25 * x));
        let values: Vec<f64> = (0..=6).map(|n| cubic(n as f64)).collect();
        for p in [0.1, 0.9, 1.0, 2.5, 5.3, 5.9, 6.0] {
            assert!((lagrange(p, 6).apply(&values) - cubic(p)).abs() < 1e-12, "{p}");
        }
        assert_eq!(lagrange(0.25, 1).apply(&[0.0, 8.0]), 2.0);
    }
}
