//! Which poses are solved for a table: nodes on the axes, and check points that are no nodes.

use super::axis::Axis;
use super::nested::nested_points;

/// Most nodes on an axis.
pub const MOST_NODES: usize = 24;
/// Check points of a table with one, two and three axes.
const CHECKS: [usize; 3] = [6, 9, 12];
/// Where the check point near the hardest corner stands on each axis: between the end and the node next to it, where an
/// interpolant of 3 to 8 nodes is worst.
const NEAR_THE_END: f64 = 0.9;
/// Fractional parts of multiples of these fill one, two and three dimensions evenly (inverse powers of the real root of
/// g^(d+1) = g + 1).
const STRIDES: [[f64; 3]; 3] = [
    [0.618_033_988_749_894_9, 0.0, 0.0],
    [0.754_877_666_246_692_7, 0.569_840_290_998_053_3, 0.0],
    [0.819_172_513_396_164_4, 0.671_043_606_703_789_3, 0.549_700_477_901_970_3],
];

/// A pose to be solved.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Point {
    /// The node with these numbers on the axes, in the order in which the axes grow.
    Node(Vec<usize>),
    /// A check point.
    Check(usize),
}

/// Nodes on each axis.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Plan {
    /// One number for each axis.
    pub nodes: Vec<usize>,
}

impl Plan {
    /// All nodes, the last axis fastest, and then the check points.
    pub fn points(&self) -> Vec<Point> {
        let mut all = vec![Vec::new()];
        for &count in &self.nodes {
            all = all.iter().flat_map(|p: &Vec<usize>| (0..count).map(|n| [&p[..], &[n]].concat())).collect();
        }
        let checks = (0..self.checks()).map(Point::Check);
        all.into_iter().map(Point::Node).chain(checks).collect()
    }

    /// Number of check points.
    pub fn checks(&self) -> usize {
        CHECKS[self.nodes.len() - 1]
    }

    /// Coordinates of the nodes on the axis `k`, as they come back from the values of the variable.
    pub fn coordinates(&self, axes: &[Axis], k: usize) -> Vec<f64> {
        let axis = &axes[k];
        nested_points(self.nodes[k]).into_iter().map(|x| axis.reduced(axis.value(x))[0]).collect()
    }
}

/// The end of each axis (1 or -1) at which an edge of the plate comes closest.
fn hardest(axes: &[Axis]) -> Vec<f64> {
    use super::axis::Variable::{Angle, Gap, Roll, Tilt};
    axes.iter()
        .map(|a| match a.span.variable {
            Gap | Angle => -1.0,
            Tilt | Roll => {
                if a.span.to.abs() >= a.span.from.abs() {
                    1.0
                } else {
                    -1.0
                }
            }
        })
        .collect()
}

/// Values of the variables at a point.
pub fn place(axes: &[Axis], point: &Point) -> Vec<f64> {
    let reduced: Vec<f64> = match point {
        Point::Node(numbers) => numbers.iter().map(|n| nested_points(n + 1)[*n]).collect(),
        Point::Check(0) => hardest(axes).into_iter().map(|end| NEAR_THE_END * end).collect(),
        Point::Check(n) => {
            let strides = STRIDES[axes.len() - 1];
            (0..axes.len()).map(|k| 2.0 * (0.5 + *n as f64 * strides[k]).fract() - 1.0).collect()
        }
    };
    axes.iter().zip(reduced).map(|(axis, x)| axis.value(x)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::report;
    use crate::tables::axis::{Span, Variable};

    fn axes() -> Vec<Axis> {
        let spans = [
            Span { variable: Variable::Gap, from: 0.002, to: 0.008 },
            Span { variable: Variable::Tilt, from: 0.0, to: 0.0174 },
        ];
        Axis::free(&spans, &report().job.question)
    }

    #[test]
    fn growing_keeps_every_point() {
        let (small, large) = (Plan { nodes: vec![3, 2] }.points(), Plan { nodes: vec![4, 2] }.points());
        assert_eq!(small.len(), 6 + 9);
        assert!(small.iter().all(|p| large.contains(p)));
        assert_eq!(small[1], Point::Node(vec![0, 1]));
    }

    #[test]
    fn checks_are_no_nodes_and_spread() {
        let axes = axes();
        let plan = Plan { nodes: vec![8, 8] };
        let nodes: Vec<Vec<f64>> = (0..2).map(|k| plan.coordinates(&axes, k)).collect();
        let mut quadrants = [0; 4];
        for n in 0..plan.checks() {
            let at = place(&axes, &Point::Check(n));
            let x: Vec<f64> = (0..2).map(|k| axes[k].reduced(at[k])[0]).collect();
            // Off the grid lines along one axis at least.
            assert!((0..2).any(|k| nodes[k].iter().all(|node| (node - x[k]).abs() > 0.02)), "{x:?}");
            quadrants[usize::from(x[0] > 0.0) + 2 * usize::from(x[1] > 0.0)] += 1;
        }
        assert!(quadrants.iter().all(|q| *q > 0), "{quadrants:?}");
        let hard = place(&axes, &Point::Check(0));
        assert!(hard[0] < 0.0022 && hard[1] > 0.016);
    }
}
