//! The held planes in modes: for each pair of modes a tridiagonal system that ties the planes of the two plates.
//!
//! With the planes of both plates kept and all other nodes along z eliminated, what is left of the untilted operator
//! is tridiagonal: inside a plate its planes are neighbours, across the gap one coupling is left, and the spaces
//! below and above add to the outermost planes. Its inverse is the response of the planes to charges on them.

use ndarray::{Array2, Array3, Axis as Direction, Zip};
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

/// Factored tridiagonal systems of planes, one for each pair of modes.
pub struct Tridiagonal {
    /// Reciprocal pivots: mode along x, plane, mode along y.
    pivots: Array3<f64>,
    /// Couplings of each plane to the next one.
    links: Vec<Link>,
}

impl Tridiagonal {
    /// From the diagonal of each plane and the links between neighbours.
    pub fn new(diagonals: &[Array2<f64>], links: Vec<Link>) -> Tridiagonal {
        let (nx, ny) = diagonals[0].dim();
        let mut pivots = Array3::zeros((nx, diagonals.len(), ny));
        for a in 0..nx {
            for p in 0..diagonals.len() {
                for b in 0..ny {
                    let eliminated = match p.checked_sub(1).map(|last| (&links[last], last)) {
                        Some((Link::Same(c), last)) => c * c * pivots[[a, last, b]],
                        Some((Link::Each(c), last)) => c[[a, b]] * c[[a, b]] * pivots[[a, last, b]],
                        None => 0.0,
                    };
                    pivots[[a, p, b]] = 1.0 / (diagonals[p][[a, b]] - eliminated);
                }
            }
        }
        Tridiagonal { pivots, links }
    }

    /// Number of modes along x, of planes and of modes along y.
    pub fn dim(&self) -> (usize, usize, usize) {
        self.pivots.dim()
    }

    /// Solves for mode `a` along x in place: plane down, mode along y across.
    pub fn solve(&self, a: usize, planes: &mut [f64]) {
        let (_, count, ny) = self.dim();
        let pivots = self.pivots.index_axis(Direction(0), a);
        let pivots = pivots.to_slice().expect("pivots of a mode are contiguous");
        let of = |p: usize| &pivots[p * ny..(p + 1) * ny];
        for (u, d) in planes[..ny].iter_mut().zip(of(0)) {
            *u *= d;
        }
        for p in 1..count {
            let (before, here) = planes.split_at_mut(p * ny);
            let known = before[(p - 1) * ny..].iter();
            let here = here[..ny].iter_mut().zip(known).zip(of(p));
            match &self.links[p - 1] {
                Link::Same(c) => here.for_each(|((u, l), d)| *u = (*u - c * l) * d),
                Link::Each(c) => here.zip(c.row(a)).for_each(|(((u, l), d), c)| *u = (*u - c * l) * d),
            }
        }
        for p in (1..count).rev() {
            let (here, above) = planes.split_at_mut(p * ny);
            let here = here[(p - 1) * ny..].iter_mut().zip(&above[..ny]).zip(of(p - 1));
            match &self.links[p - 1] {
                Link::Same(c) => here.for_each(|((u, v), d)| *u -= c * v * d),
                Link::Each(c) => here.zip(c.row(a)).for_each(|(((u, v), d), c)| *u -= c * v * d),
            }
        }
    }
}

/// The systems of the held planes of the two plates.
pub struct Stack {
    /// Planes of the lower and of the upper plate.
    planes: [usize; 2],
    /// Their tridiagonal systems: potentials of the planes that belong to charges on them.
    pub system: Tridiagonal,
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
        Stack { planes, system: Tridiagonal::new(&diagonals, links), beyond, gap: [first, last], across }
    }

    /// Charges that the space outside of the metal holds for given potentials of the faces, as if they were planes without
    /// end; ascending, a plate without thickness has one face.
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
