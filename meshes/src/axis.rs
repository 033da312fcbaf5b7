//! One graded axis: nodes that crowd towards the plate edges, in a family that refines cleanly.
//!
//! An axis is a chain of segments. Each is the image of a uniform parameter under a fixed smooth map, so that level
//! q of the family samples the same maps with a spacing proportional to 1/q. That is what makes the error of a
//! level a power series in 1/q, and what lets a field be carried from a level to a finer one by plain polynomial
//! interpolation in the parameter.

use crate::stencil::{lagrange, Stencil};

/// Exponent of the grading towards a knife edge: the field behaves like r^(1/2) there, so that in the parameter it
/// behaves like s^(3/2) and second order survives.
const EDGE_POWER: f64 = 3.0;
/// Exponent of the grading through a plate, where the edges are right-angled (r^(2/3)).
const BODY_POWER: f64 = 2.0;
/// Cells per q: along a plate, across the gap, outside, through a plate or along a short segment.
const PLATE_CELLS: usize = 8;
const GAP_CELLS: usize = 4;
const OUTSIDE_CELLS: usize = 5;
const SHORT_CELLS: usize = 4;
/// Segments below this part of the size count as short.
const SHORT_SEGMENT: f64 = 0.25;
/// Length over which the outside begins to stretch, in units of the size.
const OUTSIDE_SCALE: f64 = 0.2;
/// Edges nearer than this (units of the size) become one grid line: what that changes is within the uncertainty that every
/// result carries at least, while cells so narrow cost a hundred iterations.
const SAME_EDGE: f64 = 1e-6;

/// What stands at an end of an axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum End {
    /// Far boundary of open space.
    Far {
        /// Distance from the plates, in units of the size.
        distance: f64,
        /// The potential falls off as this power of 1/r.
        decay: f64,
    },
    /// No flux: a symmetry plane or an insulating wall.
    Natural,
    /// A grounded wall: the potential is zero.
    Held,
}

impl End {
    /// What the end adds to the stiffness of the last node: the Robin weight of a distant face, infinity where the
    /// potential is given.
    pub fn stiffness(self) -> f64 {
        match self {
            End::Far { distance, decay } => decay / distance,
            End::Natural => 0.0,
            End::Held => f64::INFINITY,
        }
    }
}

/// A graded axis: nodes in ascending order, the cells of its segments, what stands at its ends.
#[derive(Clone, Debug, PartialEq)]
pub struct Axis {
    /// Node coordinates, ascending, in units of the size.
    pub nodes: Vec<f64>,
    /// Cells in each segment, in order.
    pub segments: Vec<usize>,
    /// What stands at the first and at the last node.
    pub ends: [End; 2],
}

/// n + 1 nodes from a to b, crowded at both ends.
fn both_ends(a: f64, b: f64, n: usize, power: f64) -> Vec<f64> {
    (0..=n)
        .map(|m| {
            let s = -1.0 + 2.0 * m as f64 / n as f64;
            0.5 * (a + b) + 0.5 * (b - a) * s.signum() * (1.0 - (1.0 - s.abs()).powf(power))
        })
        .map(|x| x.clamp(a, b))
        .collect()
}

/// n + 1 nodes from a to b, crowded at b.
fn one_end(a: f64, b: f64, n: usize, power: f64) -> Vec<f64> {
    (0..=n).map(|m| a + (b - a) * (1.0 - (1.0 - m as f64 / n as f64).powf(power))).collect()
}

/// n + 1 distances from an edge, crowded at the edge and stretching exponentially out to `far`; a wall nearer than
/// where the stretching would begin is reached without it.
fn outward(n: usize, far: f64) -> Vec<f64> {
    let scale = OUTSIDE_SCALE.min(far);
    let growth = (far / scale).ln();
    (0..=n)
        .map(|m| {
            let t = m as f64 / n as f64;
            scale * t.powf(EDGE_POWER) * (growth * t).exp()
        })
        .collect()
}

/// What lies beyond the outermost plate edge on one side.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Beyond {
    /// Open space, out to this distance from the edge, where the potential falls off as a power of 1/r.
    Open {
        /// Distance of the far boundary, in units of the size.
        far: f64,
        /// The power.
        decay: f64,
    },
    /// A grounded wall at this coordinate.
    Wall(f64),
    /// The axis is the half at positive coordinates of a symmetric one: a symmetry plane at 0.
    Mirror,
    /// Nothing: an insulating wall along the edge.
    Nothing,
}

impl Beyond {
    /// What stands at the end of the axis.
    fn end(self) -> End {
        match self {
            Beyond::Open { far, decay } => End::Far { distance: far, decay },
            Beyond::Wall(_) => End::Held,
            Beyond::Mirror | Beyond::Nothing => End::Natural,
        }
    }

    /// Distance from the plate edge to the end of the axis.
    fn distance(self, edge: f64) -> f64 {
        match self {
            Beyond::Open { far, .. } => far,
            Beyond::Wall(at) => (at - edge).abs(),
            Beyond::Mirror | Beyond::Nothing => 0.0,
        }
    }
}

/// An axis under construction: segments are appended in ascending order.
struct Chain {
    nodes: Vec<f64>,
    segments: Vec<usize>,
}

impl Chain {
    fn from(start: f64) -> Self {
        Chain { nodes: vec![start], segments: Vec::new() }
    }

    fn append(&mut self, nodes: &[f64]) {
        self.segments.push(nodes.len() - 1);
        self.nodes.extend_from_slice(&nodes[1..]);
    }

    fn end(&self) -> f64 {
        self.nodes[self.nodes.len() - 1]
    }

    /// Appends what lies beyond the last edge.
    fn outside(&mut self, q: usize, beyond: Beyond) {
        let edge = self.end();
        let distance = beyond.distance(edge);
        if distance > 0.0 {
            let nodes: Vec<f64> = outward(OUTSIDE_CELLS * q, distance).iter().map(|o| edge + o).collect();
            self.append(&nodes);
        }
    }

    /// A chain that comes in from what lies beyond the first edge.
    fn inward(edge: f64, q: usize, beyond: Beyond) -> Self {
        let distance = beyond.distance(edge);
        if distance == 0.0 {
            return Chain::from(edge);
        }
        let mut nodes: Vec<f64> = outward(OUTSIDE_CELLS * q, distance).iter().map(|o| edge - o).collect();
        nodes.reverse();
        let mut chain = Chain::from(nodes[0]);
        chain.append(&nodes);
        chain
    }

    fn finish(self, beyond: [Beyond; 2]) -> Axis {
        Axis { nodes: self.nodes, segments: self.segments, ends: beyond.map(Beyond::end) }
    }
}

impl Axis {
    /// Lateral axis of level q through the given plate edges (any order), with what lies beyond them on the two sides.
    pub fn lateral(edges: &[f64], q: usize, beyond: [Beyond; 2]) -> Axis {
        let mut e: Vec<f64> = edges.to_vec();
        e.sort_by(f64::total_cmp);
        e.dedup_by(|b, a| (*b - *a).abs() < SAME_EDGE);
        let mut chain = if beyond[0] == Beyond::Mirror {
            e.retain(|&x| x > 0.0);
            let mut chain = Chain::from(0.0);
            chain.append(&one_end(0.0, e[0], PLATE_CELLS / 2 * q, EDGE_POWER));
            chain
        } else {
            Chain::inward(e[0], q, beyond[0])
        };
        for pair in e.windows(2) {
            let cells = if pair[1] - pair[0] > SHORT_SEGMENT { PLATE_CELLS } else { SHORT_CELLS };
            chain.append(&both_ends(pair[0], pair[1], cells * q, EDGE_POWER));
        }
        chain.outside(q, beyond[1]);
        chain.finish(beyond)
    }

    /// The missing direction of a cross-section: one cell of unit width between insulating walls, in which the
    /// field does not vary.
    pub fn slab() -> Axis {
        Axis { nodes: vec![-0.5, 0.5], segments: vec![1], ends: [End::Natural; 2] }
    }

    /// Vertical axis of level q: lower plate below 0, film, gap up to the upper plate, upper plate, with what lies beyond
    /// the plates.
    pub fn vertical(thickness: [f64; 2], film: f64, gap: f64, q: usize, beyond: [Beyond; 2]) -> Axis {
        let mut chain = Chain::inward(-thickness[0], q, beyond[0]);
        if thickness[0] > 0.0 {
            chain.append(&both_ends(-thickness[0], 0.0, SHORT_CELLS * q, BODY_POWER));
        }
        if film > 0.0 {
            chain.append(&both_ends(0.0, film, GAP_CELLS * q, EDGE_POWER));
        }
        chain.append(&both_ends(film, gap, GAP_CELLS * q, EDGE_POWER));
        if thickness[1] > 0.0 {
            chain.append(&both_ends(gap, gap + thickness[1], SHORT_CELLS * q, BODY_POWER));
        }
        chain.outside(q, beyond[1]);
        chain.finish(beyond)
    }

    /// Number of nodes.
    pub fn len(&self) -> usize {
        self.nodes.len()
    }

    /// Whether the axis has no node; never true of an axis that was built here.
    pub fn is_empty(&self) -> bool {
        self.nodes.is_empty()
    }

    /// Widths of the cells.
    pub fn cells(&self) -> Vec<f64> {
        self.nodes.windows(2).map(|w| w[1] - w[0]).collect()
    }

    /// Lengths that belong to the nodes: half of the cell on either side.
    pub fn masses(&self) -> Vec<f64> {
        let mut m = vec![0.0; self.len()];
        for (k, h) in self.cells().into_iter().enumerate() {
            m[k] += h / 2.0;
            m[k + 1] += h / 2.0;
        }
        m
    }

    /// The node nearest to a coordinate.
    pub fn nearest(&self, x: f64) -> usize {
        let mut best = 0;
        for (k, v) in self.nodes.iter().enumerate() {
            if (v - x).abs() < (self.nodes[best] - x).abs() {
                best = k;
            }
        }
        best
    }

    /// Stencils that carry a field from the axis of a coarser level of the same family to this one: cubic in the
    /// parameter of each segment, never across the end of a segment, where the field has a kink or worse.
    ///
    /// # Panics
    /// If the axes do not have the same number of segments.
    pub fn carry_from(&self, coarse: &Axis) -> Vec<Stencil> {
        assert_eq!(self.segments.len(), coarse.segments.len(), "axes of different families");
        let mut stencils = vec![Stencil::at(0)];
        let mut start = 0;
        for (&fine_cells, &cells) in self.segments.iter().zip(&coarse.segments) {
            for m in 1..=fine_cells {
                let parameter = (m * cells) as f64 / fine_cells as f64;
                stencils.push(lagrange(parameter, cells).shifted(start));
            }
            start += cells;
        }
        stencils
    }

    /// Stencils that carry a field from this axis to one where cells are cut into `parts`, for drawing; cubic in the
    /// parameter as in [`Axis::carry_from`]. The first and the last cell of a segment stay whole: they are small, and there
    /// the coordinate itself hardly grows with the parameter, so that interpolation would turn it back.
    pub fn subdivided(&self, parts: usize) -> Vec<Stencil> {
        let mut stencils = vec![Stencil::at(0)];
        let mut start = 0;
        for &cells in &self.segments {
            for cell in 0..cells {
                let whole = cell == 0 || cell + 1 == cells;
                let parts = if whole { 1 } else { parts };
                stencils.extend((1..=parts).map(|m| {
                    let parameter = cell as f64 + m as f64 / parts as f64;
                    lagrange(parameter, cells).shifted(start)
                }));
            }
            start += cells;
        }
        stencils
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const FAR: Beyond = Beyond::Open { far: 20.0, decay: 1.0 };

    #[test]
    fn the_prescribed_counts_and_the_edges() {
        let axis = Axis::lateral(&[-0.5, 0.5, -0.5, 0.5], 2, [FAR; 2]);
        assert_eq!(axis.segments, [10, 16, 10]);
        assert!(axis.nodes.windows(2).all(|w| w[1] > w[0]));
        assert_eq!(axis.nodes[axis.nearest(0.5)], 0.5);
        assert!((axis.nodes[36] - 20.5).abs() < 1e-12);
        let half = Axis::lateral(&[-0.5, 0.5], 2, [Beyond::Mirror, FAR]);
        assert_eq!((half.segments.as_slice(), half.nodes[0]), ([8, 10].as_slice(), 0.0));
        assert!(half.nodes.iter().zip(&axis.nodes[18..]).all(|(a, b)| (a - b).abs() < 1e-14));
        let unequal = Axis::lateral(&[-0.5, 0.5, -0.4, 0.3], 1, [FAR; 2]);
        assert_eq!(unequal.segments, [5, 4, 8, 4, 5]);
        let walled = Axis::lateral(&[-0.5, 0.5], 2, [Beyond::Wall(-0.6), Beyond::Wall(9.0)]);
        assert_eq!(walled.ends, [End::Held; 2]);
        assert!((walled.nodes[0] + 0.6).abs() < 1e-15 && (walled.nodes[36] - 9.0).abs() < 1e-14);
    }

    #[test]
    fn a_subdivided_axis_keeps_its_nodes_and_their_order() {
        for axis in [
            Axis::lateral(&[-0.5, 0.5, -0.4, 0.3], 2, [FAR; 2]),
            Axis::vertical([0.0, 0.1], 0.0, 0.04, 3, [FAR; 2]),
            Axis::slab(),
        ] {
            let fine: Vec<f64> = axis.subdivided(4).iter().map(|s| s.apply(&axis.nodes)).collect();
            assert!(fine.windows(2).all(|w| w[1] > w[0]));
            assert!(axis.nodes.iter().all(|x| fine.contains(x)));
            let cut: usize = axis.segments.iter().map(|n| n + 3 * n.saturating_sub(2)).sum();
            assert_eq!(fine.len(), cut + 1);
        }
    }

    #[test]
    fn carrying_a_smooth_function_is_of_fourth_order() {
        // A function that is smooth in the parameter of every segment.
        let field = |axis: &Axis| {
            let mut values = vec![1.0];
            for (s, &n) in axis.segments.iter().enumerate() {
                let start = values[values.len() - 1];
                values.extend((1..=n).map(|m| start + ((1 + s) as f64 * m as f64 / n as f64).sin()));
            }
            values
        };
        let error = |q: usize| {
            let [coarse, fine] = [q, 2 * q].map(|q| Axis::vertical([0.0, 0.1], 0.02, 0.1, q, [FAR; 2]));
            let (from, to) = (field(&coarse), field(&fine));
            let off = fine.carry_from(&coarse).into_iter().zip(&to).map(|(s, t)| (s.apply(&from) - t).abs());
            off.fold(0.0, f64::max)
        };
        let order = (error(4) / error(8)).log2();
        assert!(error(4) < 1e-3 && (3.5..4.5).contains(&order), "{} {order}", error(4));
    }
}
