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
use crate::sheet::Sheet;
use crate::shell::Shell;
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
        if last + 1 < self.masses.len() && (last > first || nodes.is_empty()) {
            nodes.push(last - first);
        }
        nodes
    }
}

/// A node of the box: its number in the box, and its place in the row of values of a [`Shell`].
struct Node {
    number: usize,
    place: usize,
}

/// An edge of the box with at least one end on the surface.
struct Edge {
    ends: [usize; 2],
    conductance: f64,
}

/// What is inside a box: the layer next to the surface, and the systems of the planes.
struct Inside {
    shell: Shell,
    system: Tridiagonal,
    /// Its nodes next to the surface.
    layer: Vec<Node>,
}

/// A box of metal in a body.
pub struct Metal {
    /// Nodes in the box.
    count: usize,
    /// The nodes of the surface, in the planes of the body.
    surface: Vec<Node>,
    edges: Vec<Edge>,
    /// None if there is no node inside.
    inside: Option<Inside>,
}

impl Inside {
    fn new(
        axes: [&Axis; 2],
        sides: &[Side; 3],
        piece: &NodeBox,
        number: impl Fn([usize; 3]) -> usize,
    ) -> Self {
        let [x, y] = [(0, piece.i[0]), (1, piece.j[0])].map(|(d, first)| {
            let [from, to] = sides[d].inside.map(|n| first + n);
            let modes = Modes::within(axes[d], from, to);
            (modes.on(from, to), modes.values)
        });
        let first = [0, 1, 2].map(|d| sides[d].inside[0]);
        let [ni, nj, nk] = [0, 1, 2].map(|d| sides[d].inside[1] + 1 - first[d]);
        let (rows, columns) = (sides[0].next_to_walls(), sides[1].next_to_walls());
        let at_rim = |i: usize, j: usize| rows.contains(&i) || columns.contains(&j);
        let is_face = |k: usize| k == 0 || k + 1 == nk;
        let sheet = Sheet { x: x.0, y: y.0.vectors() };
        let rim = Array2::from_shape_fn((ni, nj), |(i, j)| f64::from(u8::from(at_rim(i, j))));
        let shell = Shell::new(sheet, nk, Array2::ones((ni, nj)), &rim, rows.clone(), columns.clone());
        let mut layer = Vec::new();
        for plane in 0..nk {
            for i in 0..ni {
                for j in (0..nj).filter(|&j| is_face(plane) || at_rim(i, j)) {
                    let number = number([first[0] + i, first[1] + j, first[2] + plane]);
                    layer.push(Node { number, place: shell.place(plane, [i, j]) });
                }
            }
        }
        let z = &sides[2];
        let diagonal = |k: usize| {
            Array2::from_shape_fn(shell.modes(), |(a, b)| {
                z.rungs[k - 1] + z.rungs[k] + (x.1[a] + y.1[b]) * z.masses[k]
            })
        };
        let diagonals: Vec<_> = (1..=nk).map(diagonal).collect();
        let system = Tridiagonal::new(&diagonals, (1..nk).map(|k| Link::Same(-z.rungs[k])).collect());
        Inside { shell, system, layer }
    }

    /// Potentials of the layer that belong to charges on it, in place; by number in the box.
    fn respond(&self, values: &mut [f64]) {
        let shell = &self.shell;
        let mut charge = vec![0.0; shell.len()];
        for node in &self.layer {
            charge[node.place] = values[node.number];
        }
        let (source, mut response) = (shell.forward(&charge), shell.spectrum());
        let (nx, planes, ny) = self.system.dim();
        let mut modal = vec![0.0; planes * ny];
        for a in 0..nx {
            shell.spread(&source, a, &mut modal);
            self.system.solve(a, &mut modal);
            shell.gather(&mut response, a, &modal);
        }
        let potential = shell.backward(&response);
        for node in &self.layer {
            values[node.number] = potential[node.place];
        }
    }
}

impl Metal {
    /// The metal of `piece`, a box of a body whose surface is `shell`, whose nodes begin at `corner` along x and y.
    pub fn new(
        axes: [&Axis; 2],
        ladder: &Ladder,
        piece: &NodeBox,
        corner: [usize; 2],
        shell: &Shell,
    ) -> Metal {
        let [below, above] = piece.k;
        let sides = [
            Side::lateral(axes[0], piece.i),
            Side::lateral(axes[1], piece.j),
            Side::new(ladder.rungs[below..above].to_vec(), &ladder.halves[below..above], [true; 2]),
        ];
        let dim = [0, 1, 2].map(|d| sides[d].masses.len());
        let number = |at: [usize; 3]| (at[2] * dim[0] + at[0]) * dim[1] + at[1];
        let is_inside = |at: [usize; 3]| (0..3).all(|d| sides[d].is_inside(at[d]));
        let offset = [piece.i[0] - corner[0], piece.j[0] - corner[1]];
        let (mut surface, mut edges) = (Vec::new(), Vec::new());
        for k in 0..dim[2] {
            for i in 0..dim[0] {
                for j in 0..dim[1] {
                    let at = [i, j, k];
                    if !is_inside(at) {
                        let place = shell.place(k, [offset[0] + i, offset[1] + j]);
                        surface.push(Node { number: number(at), place });
                    }
                    for d in (0..3).filter(|&d| at[d] + 1 < dim[d]) {
                        let mut next = at;
                        next[d] += 1;
                        if is_inside(at) && is_inside(next) {
                            continue;
                        }
                        let across = (0..3).filter(|&e| e != d).map(|e| sides[e].masses[at[e]]);
                        let conductance = sides[d].rungs[at[d]] * across.product::<f64>();
                        edges.push(Edge { ends: [number(at), number(next)], conductance });
                    }
                }
            }
        }
        let hollow = sides.iter().all(|s| s.inside[0] <= s.inside[1]);
        let inside = hollow.then(|| Inside::new(axes, &sides, piece, number));
        Metal { count: dim.iter().product(), surface, edges, inside }
    }

    /// Charges that belong to potentials: what flows out of each node through the edges of the surface.
    fn flows(&self, values: &[f64]) -> Vec<f64> {
        let mut out = vec![0.0; self.count];
        for Edge { ends: [a, b], conductance } in &self.edges {
            let flow = conductance * (values[*a] - values[*b]);
            out[*a] += flow;
            out[*b] -= flow;
        }
        out
    }

    /// Adds to `charge` what the box sets against the potential on its surface; both as rows of values of the body's shell.
    pub fn add_charges(&self, potential: &[f64], charge: &mut [f64]) {
        let mut values = vec![0.0; self.count];
        for node in &self.surface {
            values[node.number] = potential[node.place];
        }
        let mut out = self.flows(&values);
        if let Some(inside) = &self.inside {
            // What flows into the layer raises it, and what it then sends back comes on top.
            let mut layer = vec![0.0; self.count];
            for node in &inside.layer {
                layer[node.number] = -out[node.number];
            }
            inside.respond(&mut layer);
            for (out, back) in out.iter_mut().zip(self.flows(&layer)) {
                *out += back;
            }
        }
        for node in &self.surface {
            charge[node.place] += out[node.number];
        }
    }
}
