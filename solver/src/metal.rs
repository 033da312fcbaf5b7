//! The inside of a thick box of metal, as far as it ties the nodes of the surface to each other.
//!
//! The untilted operator does not know that the inside of a plate is metal. Seen from the surface, what it sets there is
//! the box's own operator with the inside eliminated: A_SS - A_SI A_II^-1 A_IS. The inverse is separable again
//! (sine-like modes that vanish on the surface), and both what goes in and what comes out lives on the layer of nodes
//! next to the surface, so that it costs no more than a [`Shell`] does. It makes the part of the preconditioner of the
//! inner iteration that keeps the rims and the stiff direction across a thin plate in hand.

use ndarray::Array2;
use tiltgap_meshes::{Axis, NodeBox};

use crate::modes::Modes;
use crate::shell::{Part, Shell};
use crate::stack::{Ladder, Link, Tridiagonal};

/// One axis of the box.
struct Side {
    /// 1/h of each cell, times the permittivity along z.
    rungs: Vec<f64>,
    /// Lengths of the nodes, the halves inside the box alone.
    masses: Vec<f64>,
    /// First and last node inside.
    inside: [usize; 2],
}

impl Side {
    fn new(rungs: Vec<f64>, halves: &[f64], walls: [bool; 2]) -> Side {
        let n = rungs.len();
        let mut masses = vec![0.0; n + 1];
        for (k, h) in halves.iter().enumerate() {
            masses[k] += h;
            masses[k + 1] += h;
        }
        let inside = [usize::from(walls[0]), n - usize::from(walls[1])];
        Side { rungs, masses, inside }
    }

    /// Along x or y, between the nodes `from` and `to`; an end of the axis (a symmetry plane) is no wall.
    fn lateral(axis: &Axis, [from, to]: [usize; 2]) -> Side {
        let cells = axis.cells();
        let cells = &cells[from..to];
        let halves: Vec<f64> = cells.iter().map(|h| h / 2.0).collect();
        let walls = [from > 0, to + 1 < axis.len()];
        Side::new(cells.iter().map(|h| 1.0 / h).collect(), &halves, walls)
    }

    fn nodes(&self) -> usize {
        self.masses.len()
    }

    fn is_inside(&self, k: usize) -> bool {
        self.inside[0] <= k && k <= self.inside[1]
    }

    /// Nodes inside that are next to a wall, counted from the first inside.
    fn next_to_walls(&self) -> Vec<usize> {
        let [first, last] = self.inside;
        let mut nodes = Vec::new();
        if first > 0 {
            nodes.push(0);
        }
        if last + 1 < self.nodes() && (last > first || nodes.is_empty()) {
            nodes.push(last - first);
        }
        nodes
    }
}

/// A box of metal in a body.
pub struct Metal {
    /// Where the box begins in the body, along x and y.
    at: [usize; 2],
    sides: [Side; 3],
    /// The layer next to the surface, and the system of the planes inside; none if there is no node inside.
    inner: Option<(Shell, Tridiagonal)>,
}

impl Metal {
    /// The metal of `piece`, a box of a body whose nodes begin at `corner` along x and y.
    pub fn new(axes: [&Axis; 2], ladder: &Ladder, piece: &NodeBox, corner: [usize; 2]) -> Metal {
        let [below, above] = piece.k;
        let sides = [
            Side::lateral(axes[0], piece.i),
            Side::lateral(axes[1], piece.j),
            Side::new(ladder.rungs[below..above].to_vec(), &ladder.halves[below..above], [true; 2]),
        ];
        let inner = sides.iter().all(|s| s.inside[0] <= s.inside[1]).then(|| {
            let [x, y] = [(0, piece.i[0]), (1, piece.j[0])].map(|(d, first)| {
                let [from, to] = sides[d].inside.map(|n| first + n);
                let modes = Modes::within(axes[d], from, to);
                (modes.on(from, to), modes.values)
            });
            let [ni, nj, nk] = [0, 1, 2].map(|d| sides[d].inside[1] + 1 - sides[d].inside[0]);
            let (rows, columns) = (sides[0].next_to_walls(), sides[1].next_to_walls());
            let rim = Array2::from_shape_fn((ni, nj), |(i, j)| {
                f64::from(u8::from(rows.contains(&i) || columns.contains(&j)))
            });
            let parts = (0..nk).map(|k| if k == 0 || k + 1 == nk { Part::Face } else { Part::Rim }).collect();
            let shell = Shell::new(x.0, y.0.vectors(), parts, [Array2::ones((ni, nj)), rim], rows, columns);
            let z = &sides[2];
            let diagonal = |k: usize| {
                Array2::from_shape_fn(shell.modes(), |(a, b)| {
                    z.rungs[k - 1] + z.rungs[k] + (x.1[a] + y.1[b]) * z.masses[k]
                })
            };
            let diagonals = (1..=nk).map(diagonal).collect();
            let links = (1..nk).map(|k| Link::Same(-z.rungs[k])).collect();
            let system = Tridiagonal::new(diagonals, links);
            (shell, system)
        });
        Metal { at: [piece.i[0] - corner[0], piece.j[0] - corner[1]], sides, inner }
    }

    /// Calls `act` with the two ends of each edge of the box along axis `d` and its conductance.
    fn for_each_edge(&self, d: usize, mut act: impl FnMut([usize; 3], [usize; 3], f64)) {
        let [x, y, z] = &self.sides;
        let (nx, ny, nz) = (x.nodes(), y.nodes(), z.nodes());
        let step = |n: usize, axis: usize| if axis == d { n - 1 } else { n };
        for k in 0..step(nz, 2) {
            for i in 0..step(nx, 0) {
                for j in 0..step(ny, 1) {
                    let weight = match d {
                        0 => x.rungs[i] * y.masses[j] * z.masses[k],
                        1 => y.rungs[j] * x.masses[i] * z.masses[k],
                        _ => z.rungs[k] * x.masses[i] * y.masses[j],
                    };
                    let mut other = [i, j, k];
                    other[d] += 1;
                    act([i, j, k], other, weight);
                }
            }
        }
    }

    /// Adds to `charge` what the box sets against the potential on its surface; one array for each plane of the body.
    pub fn add_charges(&self, potential: &[Array2<f64>], charge: &mut [Array2<f64>]) {
        let [x, y, z] = &self.sides;
        let dim = (x.nodes(), y.nodes());
        let surface = |[i, j, k]: [usize; 3]| !(x.is_inside(i) && y.is_inside(j) && z.is_inside(k));
        let nk = z.nodes();
        let mut own: Vec<Array2<f64>> = (0..nk)
            .map(|k| {
                Array2::from_shape_fn(dim, |(i, j)| {
                    if surface([i, j, k]) {
                        potential[k][[self.at[0] + i, self.at[1] + j]]
                    } else {
                        0.0
                    }
                })
            })
            .collect();
        if let Some((shell, system)) = &self.inner {
            let first = [x.inside[0], y.inside[0], z.inside[0]];
            let (ni, nj) = shell.mask(0).dim();
            let mut source: Vec<Array2<f64>> = (0..shell.planes()).map(|_| Array2::zeros((ni, nj))).collect();
            for d in 0..3 {
                self.for_each_edge(d, |a, b, weight| {
                    for (from, to) in [(a, b), (b, a)] {
                        if surface(from) && !surface(to) {
                            let at = [0, 1, 2].map(|d| to[d] - first[d]);
                            source[at[2]][[at[0], at[1]]] += weight * own[from[2]][[from[0], from[1]]];
                        }
                    }
                });
            }
            let mut modal: Vec<Array2<f64>> =
                source.iter().enumerate().map(|(p, v)| shell.forward(p, v.view())).collect();
            system.solve(&mut modal);
            for (p, modal) in modal.iter().enumerate() {
                let nodal = shell.backward(p, modal.view());
                for ((i, j), v) in nodal.indexed_iter() {
                    own[first[2] + p][[first[0] + i, first[1] + j]] = *v;
                }
            }
        }
        // `own` now differs from zero on the surface and the layer next to it, which is all that the surface sees.
        for d in 0..3 {
            self.for_each_edge(d, |a, b, weight| {
                let flow = weight * (own[a[2]][[a[0], a[1]]] - own[b[2]][[b[0], b[1]]]);
                for (at, flow) in [(a, flow), (b, -flow)] {
                    if surface(at) {
                        charge[at[2]][[self.at[0] + at[0], self.at[1] + at[1]]] += flow;
                    }
                }
            });
        }
    }
}
