//! Tensor interpolation over the nodes of one to three axes, with error propagation.

use super::nested::basis;

/// Values on the tensor of some nodes; the last axis runs fastest.
#[derive(Clone, Debug, PartialEq)]
pub struct Interpolant {
    nodes: Vec<Vec<f64>>,
    /// Value and numerical uncertainty at each node, all quantities of a node together.
    values: Vec<[f64; 2]>,
    quantities: usize,
}

/// The interpolating polynomials at one place: weight of each node, and its slopes along the axes.
pub struct Weights {
    of_node: Vec<f64>,
    slopes: Vec<Vec<f64>>,
}

/// An interpolated number.
#[derive(Clone, Debug, PartialEq)]
pub struct Interpolated {
    /// The value.
    pub value: f64,
    /// Its uncertainty as it follows from those of the nodes.
    pub uncertainty: f64,
    /// Its slopes along the coordinates.
    pub slopes: Vec<f64>,
}

impl Interpolant {
    /// Values `[node][quantity]` on the tensor of the nodes.
    ///
    /// # Panics
    /// If the number of values is not that of the nodes times that of the quantities.
    pub fn new(nodes: Vec<Vec<f64>>, values: Vec<[f64; 2]>, quantities: usize) -> Interpolant {
        let count: usize = nodes.iter().map(Vec::len).product();
        assert_eq!(values.len(), count * quantities, "{} values for {count} x {quantities}", values.len());
        Interpolant { nodes, values, quantities }
    }

    /// The nodes along each axis, coordinates from -1 to 1.
    pub fn nodes(&self) -> &[Vec<f64>] {
        &self.nodes
    }

    /// Value and numerical uncertainty of one quantity at each node, the last axis fastest.
    pub fn at_nodes(&self, quantity: usize) -> impl Iterator<Item = &[f64; 2]> {
        self.values.iter().skip(quantity).step_by(self.quantities)
    }

    /// The weights at a place, coordinates from -1 to 1.
    pub fn weights(&self, at: &[f64]) -> Weights {
        let bases: Vec<Vec<[f64; 2]>> = self.nodes.iter().zip(at).map(|(n, x)| basis(n, *x)).collect();
        // `None` takes values along all axes, `Some(k)` slopes along the axis k.
        let product = |along: Option<usize>| {
            let mut all = vec![1.0];
            for (k, basis) in bases.iter().enumerate() {
                let part = usize::from(along == Some(k));
                all = all.iter().flat_map(|a| basis.iter().map(move |b| a * b[part])).collect();
            }
            all
        };
        Weights { of_node: product(None), slopes: (0..bases.len()).map(|k| product(Some(k))).collect() }
    }

    /// One quantity at a place.
    ///
    /// The uncertainties of the nodes pass through as a mean, with the sizes of the weights: neighbouring nodes are solved
    /// on the same levels and miss the truth alike. What they do not have in common makes the interpolant miss the check
    /// points, and is counted there.
    pub fn at(&self, weights: &Weights, quantity: usize) -> Interpolated {
        let nodes = || self.at_nodes(quantity);
        let sum = |w: &[f64]| w.iter().zip(nodes()).map(|(w, v)| w * v[0]).sum::<f64>();
        let (mut common, mut all) = (0.0, 0.0);
        for (w, [_, uncertainty]) in weights.of_node.iter().zip(nodes()) {
            common += w.abs() * uncertainty;
            all += w.abs();
        }
        Interpolated {
            value: sum(&weights.of_node),
            uncertainty: common / all,
            slopes: weights.slopes.iter().map(|w| sum(w)).collect(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::tables::nested::nested_points;

    fn interpolant(f: impl Fn(f64, f64) -> [f64; 2], uncertainty: f64) -> Interpolant {
        let nodes = vec![nested_points(5), nested_points(3)];
        let mut values = Vec::new();
        for x in &nodes[0] {
            for y in &nodes[1] {
                values.extend(f(*x, *y).map(|v| [v, uncertainty]));
            }
        }
        Interpolant::new(nodes, values, 2)
    }

    #[test]
    fn polynomials_and_their_slopes_are_exact() {
        let i = interpolant(|x, y| [1.0 + x.powi(4) * y * y, x - 2.0 * y], 1e-5);
        let (x, y) = (0.37, -0.81f64);
        let w = i.weights(&[x, y]);
        let (first, second) = (i.at(&w, 0), i.at(&w, 1));
        assert!((first.value - 1.0 - x.powi(4) * y * y).abs() < 1e-14);
        assert!((first.slopes[0] - 4.0 * x.powi(3) * y * y).abs() < 1e-13);
        assert!((first.slopes[1] - 2.0 * x.powi(4) * y).abs() < 1e-13);
        assert!((second.value - x + 2.0 * y).abs() < 1e-14 && (second.slopes[1] + 2.0).abs() < 1e-13);
    }

    #[test]
    fn the_uncertainty_is_never_averaged_away() {
        let i = interpolant(|_, _| [1.0, 1.0], 1e-5);
        for at in [[0.0, 0.0], [0.5, 0.3], [0.93, -0.93], [1.0, 1.0]] {
            let u = i.at(&i.weights(&at), 0).uncertainty;
            assert!((u - 1e-5).abs() < 1e-19, "{at:?} {u}");
        }
    }
}
