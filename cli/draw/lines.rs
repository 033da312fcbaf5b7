//! Field lines traced through the fitted grid, and lines with fewer points.

use super::scene::Scene;
use super::sheet::Point;

/// Longest step in cells of the grid: a line then has several steps in every cell, and fourth order makes the rest.
const STEP: f64 = 0.2;
/// Most steps: far more than any line that comes to an end needs.
const STEPS: usize = 20_000;
/// Largest distance by which a line may be off after thinning, in mm on the page.
const THINNING: f64 = 0.015;

/// Cells and nodes of a scene, where lines run in numbers of nodes: (i, k), not in millimetres.
pub struct Tracer<'a> {
    scene: &'a Scene<'a>,
}

impl<'a> Tracer<'a> {
    /// A tracer of a scene.
    pub fn new(scene: &'a Scene<'a>) -> Self {
        Tracer { scene }
    }

    fn cell(&self, s: [f64; 2]) -> Option<[usize; 2]> {
        let mut cell = [0; 2];
        for d in 0..2 {
            let last = self.scene.shape[d] - 1;
            if !(0.0..=last as f64).contains(&s[d]) {
                return None;
            }
            cell[d] = (s[d] as usize).min(last - 1);
        }
        Some(cell)
    }

    /// Where a point stands, in mm, and the direction of the field there in numbers of nodes, times the step.
    ///
    /// In a cell position X and potential are bilinear in the numbers s of nodes. With the Jacobian J = dX/ds the field is
    /// E = -J^-T dphi/ds, and along a line ds/dt = J^-1 E.
    fn at(&self, s: [f64; 2]) -> Option<([f64; 2], [f64; 2])> {
        let [i, k] = self.cell(s)?;
        let (u, v) = (s[0] - i as f64, s[1] - k as f64);
        let node = [[0, 0], [1, 0], [0, 1], [1, 1]].map(|[a, b]| self.scene.index(i + a, k + b));
        let weights = [(1.0 - u) * (1.0 - v), u * (1.0 - v), (1.0 - u) * v, u * v];
        let slopes = [[v - 1.0, 1.0 - v, -v, v], [u - 1.0, -u, 1.0 - u, u]];
        let sum =
            |w: &[f64; 4], of: &dyn Fn(usize) -> f64| -> f64 { (0..4).map(|n| w[n] * of(node[n])).sum() };
        let x = |n: usize| self.scene.points[n][0];
        let z = |n: usize| self.scene.points[n][1];
        let phi = |n: usize| self.scene.potential[n];
        let position = [sum(&weights, &x), sum(&weights, &z)];
        let j = [[sum(&slopes[0], &x), sum(&slopes[1], &x)], [sum(&slopes[0], &z), sum(&slopes[1], &z)]];
        let p = [sum(&slopes[0], &phi), sum(&slopes[1], &phi)];
        let det = j[0][0] * j[1][1] - j[0][1] * j[1][0];
        let e = [-(j[1][1] * p[0] - j[1][0] * p[1]) / det, -(j[0][0] * p[1] - j[0][1] * p[0]) / det];
        let along = [(j[1][1] * e[0] - j[0][1] * e[1]) / det, (j[0][0] * e[1] - j[1][0] * e[0]) / det];
        let length = along[0].abs().max(along[1].abs());
        (length > 0.0).then(|| (position, along.map(|a| STEP * a / length)))
    }

    /// Where a step from `s` by `by` meets a plate, in numbers of nodes.
    fn hit(&self, s: [f64; 2], by: [f64; 2]) -> Option<[f64; 2]> {
        let mut first: Option<(f64, [f64; 2])> = None;
        for [i, k] in self.scene.nodes {
            for (d, bound) in [(1, k[0]), (1, k[1]), (0, i[0]), (0, i[1])] {
                let bound = bound as f64;
                let from = s[d] - bound;
                if by[d] == 0.0 || from == 0.0 || from * (from + by[d]) > 0.0 {
                    continue;
                }
                let t = -from / by[d];
                let at = [s[0] + t * by[0], s[1] + t * by[1]];
                let other = 1 - d;
                let range = if d == 1 { i } else { k };
                let within = at[other] >= range[0] as f64 && at[other] <= range[1] as f64;
                if within && first.is_none_or(|(least, _)| t < least) {
                    first = Some((t, at));
                }
            }
        }
        first.map(|(_, at)| at)
    }

    /// A line from a point (in numbers of nodes) along the field, or against it for a negative sign, until it meets a plate
    /// or leaves the grid or the rectangle `within`; in mm. Runge and Kutta's method of fourth order.
    pub fn trace(&self, start: [f64; 2], sign: f64, within: [[f64; 2]; 2]) -> Traced {
        let mut s = start;
        let mut line = Vec::new();
        let mut hit = false;
        for _ in 0..STEPS {
            let Some((position, k1)) = self.at(s) else { break };
            line.push(position);
            let outside = (0..2).any(|d| position[d] < within[d][0] || position[d] > within[d][1]);
            if outside {
                break;
            }
            // A step that would meet a plate goes straight there: beyond a sheet the field is another one.
            if let Some(end) = self.hit(s, k1.map(|k| sign * k)) {
                line.extend(self.at(end).map(|a| a.0));
                hit = true;
                break;
            }
            let ahead = |k: [f64; 2], part: f64| [s[0] + sign * part * k[0], s[1] + sign * part * k[1]];
            let slope = |at: [f64; 2]| self.at(at).map(|a| a.1);
            let Some(k2) = slope(ahead(k1, 0.5)) else { break };
            let Some(k3) = slope(ahead(k2, 0.5)) else { break };
            let Some(k4) = slope(ahead(k3, 1.0)) else { break };
            let by = [0, 1].map(|d| sign * (k1[d] + 2.0 * k2[d] + 2.0 * k3[d] + k4[d]) / 6.0);
            s = [s[0] + by[0], s[1] + by[1]];
        }
        Traced { points: line, hit }
    }
}

/// A line and how it ended.
#[derive(Clone, Debug, PartialEq)]
pub struct Traced {
    /// Points from the start on, in mm.
    pub points: Vec<[f64; 2]>,
    /// Whether it ended on a plate.
    pub hit: bool,
}

/// A line with as few points as do (Ramer, Douglas and Peucker's method), off by a hundredth of a millimetre at most.
pub fn thinned(line: &[Point]) -> Vec<Point> {
    if line.len() < 3 {
        return line.to_vec();
    }
    let mut keep = vec![false; line.len()];
    (keep[0], keep[line.len() - 1]) = (true, true);
    let mut spans = vec![(0, line.len() - 1)];
    while let Some((from, to)) = spans.pop() {
        let (a, b) = (line[from], line[to]);
        let along = [b[0] - a[0], b[1] - a[1]];
        let length = along[0].hypot(along[1]);
        let off = |p: Point| {
            let d = [p[0] - a[0], p[1] - a[1]];
            if length == 0.0 {
                d[0].hypot(d[1])
            } else {
                (d[0] * along[1] - d[1] * along[0]).abs() / length
            }
        };
        let far = (from + 1..to).max_by(|m, n| off(line[*m]).total_cmp(&off(line[*n])));
        if let Some(far) = far.filter(|n| off(line[*n]) > THINNING) {
            keep[far] = true;
            spans.extend([(from, far), (far, to)]);
        }
    }
    line.iter().zip(keep).filter(|(_, k)| *k).map(|(p, _)| *p).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn thinning_keeps_the_shape() {
        let arc: Vec<Point> =
            (0..1000).map(|n| (n as f64 * 0.003).sin_cos()).map(|(s, c)| [10.0 * c, 10.0 * s]).collect();
        let few = thinned(&arc);
        assert!(few.len() < 60, "{}", few.len());
        for pair in few.windows(2) {
            let middle = [0, 1].map(|d| 0.5 * (pair[0][d] + pair[1][d]));
            assert!((middle[0].hypot(middle[1]) - 10.0).abs() < 1.1 * THINNING);
        }
    }
}
