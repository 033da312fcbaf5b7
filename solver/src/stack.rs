//! The held planes in modes: for each pair of modes a tridiagonal system that ties the planes of the two plates.
//!
//! With the planes of both plates kept and all other nodes along z eliminated, what is left of the untilted operator
//! is tridiagonal: inside a plate its planes are neighbours, across the gap one coupling is left, and the spaces
//! below and above add to the outermost planes. Its inverse is the response of the planes to charges on them.

use ndarray::{Array2, Zip};
use tiltgap_meshes::{End, Grid};

/// The untilted bench along z: what each cell adds for a mode of eigenvalue lambda, and what stands at the ends.
#[derive(Clone, Debug)]
pub struct Ladder {
    /// Conductance 1/h of each cell, times its permittivity.
    pub rungs: Vec<f64>,
    /// Half of the length of each cell, times its permittivity.
    pub halves: Vec<f64>,
    /// What stands at the two ends.
    pub ends: [End; 2],
}

impl Ladder {
    /// Of a grid, in which the film goes on beyond the plates: only so is the bench separable.
    pub fn new(grid: &Grid) -> Ladder {
        let axis = &grid.axes[2];
        let permittivity =
            |cell: usize| grid.film.map_or(1.0, |f| grid.permittivity([f.nodes.i[0], f.nodes.j[0], cell]));
        let cells = axis.cells();
        let cells = cells.iter().enumerate();
        Ladder {
            rungs: cells.clone().map(|(k, h)| permittivity(k) / h).collect(),
            halves: cells.map(|(k, h)| permittivity(k) * h / 2.0).collect(),
            ends: axis.ends,
        }
    }

    /// What the part of the ladder outside `cells` (from the end towards the kept node) adds to that node.
    fn beyond(&self, cells: impl Iterator<Item = usize>, end: End, lambda: f64) -> f64 {
        let mut added = end.stiffness();
        for cell in cells {
            let (rung, half) = (self.rungs[cell], lambda * self.halves[cell]);
            let outer = added + half;
            added = half + if outer.is_finite() { rung * outer / (outer + rung) } else { rung };
        }
        added
    }

    /// The cells `from..to` between two kept nodes: what they add to the first and to the last, and the coupling.
    fn between(&self, from: usize, to: usize, lambda: f64) -> [f64; 3] {
        let own = |cell: usize| self.rungs[cell] + lambda * self.halves[cell];
        let (mut first, mut last, mut coupling) = (own(from), own(from), -self.rungs[from]);
        for cell in from + 1..to {
            let pivot = last + own(cell);
            first -= coupling * coupling / pivot;
            coupling *= self.rungs[cell] / pivot;
            last = own(cell) - self.rungs[cell] * (self.rungs[cell] / pivot);
        }
        [first, last, coupling]
    }
}

/// Coupling between two neighbouring planes, as it stands in the matrix (negative).
pub enum Link {
    /// The same for all modes.
    Same(f64),
    /// One for each pair of modes.
    Each(Array2<f64>),
}

impl Link {
    /// to -= coupling times from times weight.
    fn eliminate(&self, to: &mut Array2<f64>, from: &Array2<f64>, weight: &Array2<f64>) {
        match self {
            Link::Same(c) => Zip::from(to).and(from).and(weight).for_each(|t, f, w| *t -= c * f * w),
            Link::Each(c) => {
                Zip::from(to).and(c).and(from).and(weight).for_each(|t, c, f, w| *t -= c * f * w)
            }
        }
    }

    /// to = (to - coupling times from) times weight.
    fn sweep(&self, to: &mut Array2<f64>, from: &Array2<f64>, weight: &Array2<f64>) {
        match self {
            Link::Same(c) => Zip::from(to).and(from).and(weight).for_each(|t, f, w| *t = (*t - c * f) * w),
            Link::Each(c) => {
                Zip::from(to).and(c).and(from).and(weight).for_each(|t, c, f, w| *t = (*t - c * f) * w)
            }
        }
    }
}

/// Factored tridiagonal systems of planes, one for each pair of modes.
pub struct Tridiagonal {
    /// Reciprocal pivots of the planes.
    pivots: Vec<Array2<f64>>,
    /// Couplings of each plane to the next one.
    links: Vec<Link>,
}

impl Tridiagonal {
    /// From the diagonal of each plane and the links between neighbours.
    pub fn new(diagonals: Vec<Array2<f64>>, links: Vec<Link>) -> Tridiagonal {
        let mut pivots: Vec<Array2<f64>> = Vec::with_capacity(diagonals.len());
        for (p, mut diagonal) in diagonals.into_iter().enumerate() {
            if p > 0 {
                let last = &pivots[p - 1];
                match &links[p - 1] {
                    Link::Same(c) => Zip::from(&mut diagonal).and(last).for_each(|d, q| *d -= c * c * q),
                    Link::Each(c) => {
                        Zip::from(&mut diagonal).and(c).and(last).for_each(|d, c, q| *d -= c * c * q)
                    }
                }
            }
            pivots.push(diagonal.mapv_into(|d| 1.0 / d));
        }
        Tridiagonal { pivots, links }
    }

    /// Number of planes.
    pub fn len(&self) -> usize {
        self.pivots.len()
    }

    /// Solves in place.
    pub fn solve(&self, planes: &mut [Array2<f64>]) {
        planes[0] *= &self.pivots[0];
        for p in 1..self.len() {
            let (before, here) = planes.split_at_mut(p);
            self.links[p - 1].sweep(&mut here[0], &before[p - 1], &self.pivots[p]);
        }
        for p in (1..self.len()).rev() {
            let (here, above) = planes.split_at_mut(p);
            self.links[p - 1].eliminate(&mut here[p - 1], &above[0], &self.pivots[p - 1]);
        }
    }
}

/// The systems of the held planes of the two plates.
pub struct Stack {
    /// Planes of the lower and of the upper plate.
    planes: [usize; 2],
    system: Tridiagonal,
    /// What the space beyond adds to the lowest and to the highest plane.
    beyond: [Array2<f64>; 2],
    /// What the gap adds to the two facing planes, and the coupling that it makes between them.
    gap: [Array2<f64>; 2],
    across: Array2<f64>,
}

impl Stack {
    /// The stack of the nodes `spans` (first and last along z) of the lower and the upper plate, for the eigenvalues along
    /// x and y. `pinned` is added to both outermost planes.
    pub fn new(ladder: &Ladder, spans: [[usize; 2]; 2], values: [&[f64]; 2], pinned: f64) -> Stack {
        let [[bottom, low], [high, top]] = spans;
        let dim = (values[0].len(), values[1].len());
        let over =
            |f: &dyn Fn(f64) -> f64| Array2::from_shape_fn(dim, |(a, b)| f(values[0][a] + values[1][b]));
        let cells = ladder.rungs.len();
        let beyond = [
            over(&|l| pinned + ladder.beyond(0..bottom, ladder.ends[0], l)),
            over(&|l| pinned + ladder.beyond((top..cells).rev(), ladder.ends[1], l)),
        ];
        let [first, last, across] = [0, 1, 2].map(|n| over(&|l| ladder.between(low, high, l)[n]));
        let own = |cell: usize, l: f64| ladder.rungs[cell] + l * ladder.halves[cell];
        let (mut diagonals, mut links) = (Vec::new(), Vec::new());
        for [from, to] in spans {
            for k in from..=to {
                diagonals.push(over(&|l| {
                    (if k > from { own(k - 1, l) } else { 0.0 }) + if k < to { own(k, l) } else { 0.0 }
                }));
                if k < to {
                    links.push(Link::Same(-ladder.rungs[k]));
                }
            }
            if from == bottom {
                links.push(Link::Each(across.clone()));
            }
        }
        let planes = spans.map(|[from, to]| to - from + 1);
        let count = diagonals.len();
        diagonals[0] += &beyond[0];
        diagonals[planes[0] - 1] += &first;
        diagonals[planes[0]] += &last;
        diagonals[count - 1] += &beyond[1];
        Stack { planes, system: Tridiagonal::new(diagonals, links), beyond, gap: [first, last], across }
    }

    /// The planes that face away from or towards the gap, ascending: two for a thick plate, one for a thin one.
    pub fn faces(&self) -> Vec<usize> {
        let [lower, upper] = self.planes;
        let mut faces = vec![0, lower - 1, lower, lower + upper - 1];
        faces.dedup();
        faces
    }

    /// Potentials of the planes that belong to charges on them, in place.
    pub fn respond(&self, planes: &mut [Array2<f64>]) {
        self.system.solve(planes);
    }

    /// Charges that the space outside of the metal holds for given potentials of the [`faces`](Stack::faces), as if they
    /// were planes without end.
    pub fn outside(&self, potential: &[Array2<f64>]) -> Vec<Array2<f64>> {
        let last = potential.len() - 1;
        let facing = usize::from(self.planes[0] > 1);
        let mut charge: Vec<Array2<f64>> = potential.iter().map(|v| Array2::zeros(v.dim())).collect();
        let mut add = |to: usize, from: usize, weight: &Array2<f64>| {
            Zip::from(&mut charge[to]).and(weight).and(&potential[from]).for_each(|c, w, v| *c += w * v);
        };
        add(0, 0, &self.beyond[0]);
        add(facing, facing, &self.gap[0]);
        add(facing, facing + 1, &self.across);
        add(facing + 1, facing, &self.across);
        add(facing + 1, facing + 1, &self.gap[1]);
        add(last, last, &self.beyond[1]);
        charge
    }
}
