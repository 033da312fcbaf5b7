//! Contours on a grid of any shape: areas above a level without gaps between cells, and lines.
//!
//! Marching squares run on the numbers of the nodes; what comes out is carried over to where the nodes stand. A corner of a
//! contour lies on an edge between two nodes, where linear interpolation is exact in both.

use contour::ContourBuilder;

/// A grid of points with values; node (m, n) has the number n `columns` + m.
pub struct Mapped<'a> {
    /// Nodes in a row.
    pub columns: usize,
    /// Rows.
    pub rows: usize,
    /// Values at the nodes.
    pub values: &'a [f64],
    /// Where nodes stand.
    pub points: &'a [[f64; 2]],
}

/// One level of a contour, in the coordinates of the points.
#[derive(Clone, Debug, PartialEq)]
pub struct Level {
    /// Where the values are not below the level; holes are joined to the outline by a cut of no width.
    pub areas: Vec<Vec<[f64; 2]>>,
    /// Where they equal it: the outlines without what runs along the border of the grid.
    pub lines: Vec<Vec<[f64; 2]>>,
}

/// A point in numbers of nodes.
type Node = [f64; 2];

impl Mapped<'_> {
    /// Contours at some levels, in the same order.
    ///
    /// # Panics
    /// If values or points do not fill the grid.
    pub fn levels(&self, levels: &[f64]) -> Vec<Level> {
        let nodes = self.columns * self.rows;
        assert_eq!(
            (self.values.len(), self.points.len()),
            (nodes, nodes),
            "values and points of other grids"
        );
        let found = ContourBuilder::new(self.columns, self.rows, true).contours(self.values, levels);
        let found = found.expect("the values fill the grid");
        found
            .iter()
            .map(|contour| {
                let mut level = Level { areas: Vec::new(), lines: Vec::new() };
                for polygon in contour.geometry() {
                    let ring = |ring: &geo_types::LineString<f64>| -> Vec<Node> {
                        ring.coords().map(|c| [c.x - 0.5, c.y - 0.5]).collect()
                    };
                    let mut outline = ring(polygon.exterior());
                    level.lines.extend(self.inner_parts(&outline));
                    for hole in polygon.interiors() {
                        let hole = ring(hole);
                        level.lines.extend(self.inner_parts(&hole));
                        outline = joined(outline, hole);
                    }
                    level.areas.push(outline.iter().map(|&p| self.place(p)).collect());
                }
                level
            })
            .collect()
    }

    fn ends(&self) -> Node {
        [(self.columns - 1) as f64, (self.rows - 1) as f64]
    }

    /// Where a point between nodes stands; outside of the grid, the nearest point of its border.
    pub fn place(&self, at: Node) -> [f64; 2] {
        let ends = self.ends();
        let [u, v] = [0, 1].map(|d| at[d].clamp(0.0, ends[d]));
        let cell = [u, v].map(f64::floor);
        let [m, n] = [0, 1].map(|d| cell[d].min((ends[d] - 1.0).max(0.0)) as usize);
        let (s, t) = (u - m as f64, v - n as f64);
        let node =
            |m: usize, n: usize| self.points[n.min(self.rows - 1) * self.columns + m.min(self.columns - 1)];
        let (a, b, c, d) = (node(m, n), node(m + 1, n), node(m, n + 1), node(m + 1, n + 1));
        [0, 1].map(|e| (1.0 - t) * ((1.0 - s) * a[e] + s * b[e]) + t * ((1.0 - s) * c[e] + s * d[e]))
    }

    /// The parts of an outline that do not run along the border of the grid.
    fn inner_parts(&self, ring: &[Node]) -> Vec<Vec<[f64; 2]>> {
        let ends = self.ends();
        let beyond = |p: &Node| (0..2).any(|d| p[d] < 0.0 || p[d] > ends[d]);
        let parts = ring.split(beyond).filter(|part| !part.is_empty());
        let mut parts: Vec<Vec<[f64; 2]>> =
            parts.map(|part| part.iter().map(|&p| self.place(p)).collect()).collect();
        // An outline that was cut begins and ends in the middle of a part.
        let closed = ring.first() == ring.last() && ring.first().is_some_and(|p| !beyond(p));
        if closed && parts.len() > 1 {
            if let Some(mut last) = parts.pop() {
                last.extend_from_slice(&parts[0][1..]);
                parts[0] = last;
            }
        }
        parts.retain(|part| part.len() > 1);
        parts
    }
}

/// An outline with a hole joined to it between their nearest points.
fn joined(outline: Vec<Node>, hole: Vec<Node>) -> Vec<Node> {
    let mut nearest = (f64::INFINITY, 0, 0);
    for (a, p) in outline.iter().enumerate() {
        for (b, q) in hole.iter().enumerate() {
            let distance = (p[0] - q[0]).hypot(p[1] - q[1]);
            if distance < nearest.0 {
                nearest = (distance, a, b);
            }
        }
    }
    let (_, a, b) = nearest;
    let around = hole[b..].iter().chain(&hole[..=b]).copied();
    let mut ring: Vec<Node> = outline[..=a].to_vec();
    ring.extend(around);
    ring.extend_from_slice(&outline[a..]);
    ring
}

#[cfg(test)]
mod tests {
    use super::*;

    fn area(ring: &[[f64; 2]]) -> f64 {
        let cross = |a: [f64; 2], b: [f64; 2]| a[0] * b[1] - a[1] * b[0];
        0.5 * (0..ring.len()).map(|n| cross(ring[n], ring[(n + 1) % ring.len()])).sum::<f64>()
    }

    /// r on a bent grid over the square from -1 to 1.
    fn bowl(n: usize) -> (Vec<[f64; 2]>, Vec<f64>) {
        let at = |m: usize| (-1.0 + 2.0 * m as f64 / (n - 1) as f64).powi(3);
        let points: Vec<[f64; 2]> =
            (0..n * n).map(|k| [at(k % n) + 0.2 * at(k / n) * (1.0 - at(k / n).abs()), at(k / n)]).collect();
        let values = points.iter().map(|p| p[0].hypot(p[1])).collect();
        (points, values)
    }

    #[test]
    fn a_circle_on_a_bent_grid_is_a_circle() {
        let (points, values) = bowl(81);
        let grid = Mapped { columns: 81, rows: 81, values: &values, points: &points };
        let levels = grid.levels(&[0.5]);
        // All but the disc: a square whose border is shifted nowhere, with a hole.
        assert_eq!((levels[0].areas.len(), levels[0].lines.len()), (1, 1));
        let full = 4.0 - std::f64::consts::PI * 0.25;
        assert!((area(&levels[0].areas[0]).abs() - full).abs() < 0.01, "{}", area(&levels[0].areas[0]));
        assert!(levels[0].lines[0].iter().all(|p| (p[0].hypot(p[1]) - 0.5).abs() < 2e-3));
    }

    #[test]
    fn lines_end_at_the_border_of_the_grid() {
        let points: Vec<[f64; 2]> = (0..12).map(|k| [(k % 4) as f64, (k / 4) as f64]).collect();
        let values: Vec<f64> = points.iter().map(|p| p[0]).collect();
        let grid = Mapped { columns: 4, rows: 3, values: &values, points: &points };
        let level = &grid.levels(&[1.5])[0];
        assert_eq!(level.lines.len(), 1);
        assert!(level.lines[0].iter().all(|p| (p[0] - 1.5).abs() < 1e-12));
        assert!((area(&level.areas[0]).abs() - 3.0).abs() < 1e-12, "{:?}", level.areas);
    }
}
