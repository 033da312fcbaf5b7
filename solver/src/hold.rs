//! Holding the plates: the inner problem of the capacitance-matrix method [Buzbee1971].
//!
//! S lambda = g on the surface nodes of the plates, where S = R A0^-1 R^T is the response of the surface to charges on
//! itself in the untilted bench. Inside the metal nothing has to be held: with its surface at zero it is at zero. S is
//! never formed: modes are at hand, and in modes it is one tridiagonal system of the planes for each pair
//! ([`Stack`]). Conjugate gradient; the preconditioner adds what the space outside would hold if the faces were planes
//! without end, their values fading out beyond the edges, and what the metal holds between its faces and rims
//! ([`Metal`]). It needs nearly the same few iterations at every level. The right-hand sides run side by side, each on a thread of its own:
//! the products are too small to be worth more.

use ndarray::Array2;
use rayon::prelude::*;
use tiltgap_meshes::{Axis, Body, NodeBox};

use crate::holes::Holes;
use crate::metal::Metal;
use crate::modes::Modes;
use crate::sheet::Sheet;
use crate::shell::{Shell, Spectrum};
use crate::stack::{Ladder, Stack};
use crate::Error;

/// Most inner iterations; more than ten times what the worst case takes.
const MOST_ITERATIONS: usize = 400;

/// One plate, with its guard ring if it has one: its surface and the boxes of its metal.
struct Plate {
    shell: Shell,
    metals: Vec<Metal>,
    /// Modes on the nodes of a face, its values taken to fade out beyond its edges.
    faded: Sheet,
    /// The slot of a guard ring.
    holes: Holes,
}

/// The plates' own operator, ready to be inverted.
pub struct Hold {
    /// Nodes along z of the planes, ascending: lower plate, then upper plate.
    planes: Vec<usize>,
    stack: Stack,
    plates: [Plate; 2],
    tolerance: f64,
}

/// The surface of a body as a [`Shell`].
fn surface(body: &Body, [x, y]: [&Modes; 2], [nx, ny]: [usize; 2]) -> Shell {
    let hull = &body.hull;
    let ([i0, i1], [j0, j1], [k0, k1]) = (hull.i, hull.j, hull.k);
    // A side of a box at the end of an axis lies in a symmetry plane or an insulating wall: the metal goes on there.
    let walls = |range: [usize; 2], nodes: usize| {
        let ends = [(range[0], range[0] > 0), (range[1], range[1] + 1 < nodes)];
        ends.into_iter().filter(|e| e.1).map(|e| e.0).collect::<Vec<_>>()
    };
    let mask = |held: &dyn Fn(&NodeBox, usize, usize) -> bool| {
        Array2::from_shape_fn((i1 - i0 + 1, j1 - j0 + 1), |(i, j)| {
            let (i, j) = (i0 + i, j0 + j);
            f64::from(u8::from(body.boxes.iter().any(|b| b.contains(i, j, k0) && held(b, i, j))))
        })
    };
    let rim = mask(&|b, i, j| walls(b.i, nx).contains(&i) || walls(b.j, ny).contains(&j));
    let lines = |of: &dyn Fn(&NodeBox) -> Vec<usize>, first: usize| {
        let mut lines: Vec<usize> = body.boxes.iter().flat_map(of).map(|n| n - first).collect();
        lines.sort_unstable();
        lines.dedup();
        lines
    };
    let (rows, columns) = (lines(&|b| walls(b.i, nx), i0), lines(&|b| walls(b.j, ny), j0));
    let sheet = Sheet { x: x.on(i0, i1), y: y.on(j0, j1).vectors() };
    Shell::new(sheet, k1 - k0 + 1, mask(&|_, _, _| true), &rim, rows, columns)
}

/// Nodes beyond an edge at which the values of the face have faded out. Cut off at the edge they would have a step there,
/// which costs the preconditioner a factor: measured on thin and thick squares, levels 2 to 6, the inner iterations fall
/// from 15 to 21 to 11 to 14 (thick: 23 to 31 to 19 to 21). With 3 or 6 nodes they are more.
const FADE: f64 = 4.0;

/// How values on the nodes from `from` to `to` of an axis of `n` nodes are taken to go on beyond them: fading out linearly in
/// the number of the node.
fn beyond_edges(from: usize, to: usize, n: usize) -> Array2<f64> {
    let fade = |nodes: usize| (1.0 - nodes as f64 / FADE).max(0.0);
    Array2::from_shape_fn((to - from + 1, n), |(i, k)| match (from + i, k) {
        (own, k) if own == k => 1.0,
        (own, k) if own == from && k < from => fade(from - k),
        (own, k) if own == to && k > to => fade(k - to),
        _ => 0.0,
    })
}

/// Values on the surfaces of the two plates.
type OnPlates = [Vec<f64>; 2];

fn inner(a: &OnPlates, b: &OnPlates) -> f64 {
    a.iter().zip(b).map(|(a, b)| a.iter().zip(b).map(|(a, b)| a * b).sum::<f64>()).sum()
}

impl Hold {
    /// From the bodies, the axes of the untilted bench with their modes, and what `stack` ties.
    pub fn new(
        bodies: [&Body; 2],
        axes: [&Axis; 2],
        modes: [&Modes; 2],
        ladder: &Ladder,
        stack: Stack,
        tolerance: f64,
    ) -> Hold {
        let masses = axes.map(|axis| axis.masses());
        let plates = bodies.map(|body| {
            let shell = surface(body, modes, axes.map(|axis| axis.len()));
            let corner = [body.hull.i[0], body.hull.j[0]];
            let thick = body.hull.k[1] > body.hull.k[0];
            let boxes = body.boxes.iter().filter(|_| thick);
            let metals = boxes.map(|b| Metal::new(axes, ladder, b, corner, &shell)).collect();
            let ranges = [body.hull.i, body.hull.j];
            let [x, y] = [0, 1].map(|d| {
                let [from, to] = ranges[d];
                modes[d].spread(from, to, &beyond_edges(from, to, masses[d].len()), &masses[d])
            });
            let holes = Holes::new(shell.face_mask());
            Plate { shell, metals, faded: Sheet { x, y: y.vectors() }, holes }
        });
        let planes = bodies.iter().flat_map(|b| b.hull.k[0]..=b.hull.k[1]).collect();
        Hold { planes, stack, plates, tolerance }
    }

    /// Nodes along z of the planes of the plates.
    pub fn planes(&self) -> &[usize] {
        &self.planes
    }

    /// The parts of a row of modal coefficients, plane after plane, that belong to the two plates.
    fn split<'a>(&self, modal: &'a mut [f64]) -> [&'a mut [f64]; 2] {
        let (_, _, ny) = self.stack.system.dim();
        let (lower, upper) = modal.split_at_mut(self.plates[0].shell.planes() * ny);
        [lower, upper]
    }

    fn spectra(&self) -> [Spectrum; 2] {
        [0, 1].map(|n| self.plates[n].shell.spectrum())
    }

    fn forward(&self, values: &OnPlates) -> [Spectrum; 2] {
        [0, 1].map(|n| self.plates[n].shell.forward(&values[n]))
    }

    fn backward(&self, spectra: &[Spectrum; 2]) -> OnPlates {
        [0, 1].map(|n| self.plates[n].shell.backward(&spectra[n]))
    }

    /// Writes mode `a` along x of the spectra, plane after plane.
    fn spread(&self, spectra: &[Spectrum; 2], a: usize, modal: &mut [f64]) {
        for (n, part) in self.split(modal).into_iter().enumerate() {
            self.plates[n].shell.spread(&spectra[n], a, part);
        }
    }

    fn gather(&self, spectra: &mut [Spectrum; 2], a: usize, modal: &mut [f64]) {
        for (n, part) in self.split(modal).into_iter().enumerate() {
            self.plates[n].shell.gather(&mut spectra[n], a, part);
        }
    }

    /// S v.
    fn respond(&self, v: &OnPlates) -> OnPlates {
        let (charge, mut potential) = (self.forward(v), self.spectra());
        let (nx, planes, ny) = self.stack.system.dim();
        let mut modal = vec![0.0; planes * ny];
        for a in 0..nx {
            self.spread(&charge, a, &mut modal);
            self.stack.system.solve(a, &mut modal);
            self.gather(&mut potential, a, &mut modal);
        }
        self.backward(&potential)
    }

    /// An approximation of S^-1 v.
    fn precondition(&self, v: &OnPlates) -> OnPlates {
        let mut charge = [0, 1].map(|n| vec![0.0; v[n].len()]);
        let faces = |n: usize| self.plates[n].shell.planes().min(2);
        let each = [0, 1].into_iter().flat_map(|n| (0..faces(n)).map(move |face| (n, face)));
        let potential: Vec<Array2<f64>> = each
            .clone()
            .map(|(n, face)| {
                let Plate { shell, faded, holes, .. } = &self.plates[n];
                let mut whole = shell.face(face, &v[n]).to_owned();
                holes.fill(&mut whole);
                faded.forward(whole.view())
            })
            .collect();
        for ((n, face), modal) in each.zip(self.stack.outside(&potential)) {
            let Plate { shell, faded, holes, .. } = &self.plates[n];
            let mut nodal = shell.face_mut(face, &mut charge[n]);
            faded.backward(modal.view(), nodal.view_mut());
            holes.empty(&mut nodal);
        }
        for (n, plate) in self.plates.iter().enumerate() {
            for metal in &plate.metals {
                metal.add_charges(&v[n], &mut charge[n]);
            }
        }
        charge
    }

    /// Charges on the plates that bring the potential there to zero. `kept` holds, for each mode along x, the modal
    /// potential on the plate planes: right-hand side, plane, mode along y. Returns the modal charges in the same order,
    /// and the number of iterations.
    ///
    /// # Errors
    /// [`Error::NotConverged`]
    pub fn charges<const K: usize>(&self, kept: &[Vec<f64>]) -> Result<(Vec<Vec<f64>>, usize), Error> {
        let (nx, planes, ny) = self.stack.system.dim();
        let width = planes * ny;
        let solved: Vec<Result<(Vec<f64>, usize), Error>> = (0..K)
            .into_par_iter()
            .map(|r| {
                let mut potential = self.spectra();
                let mut modal = vec![0.0; width];
                for a in 0..nx {
                    modal.copy_from_slice(&kept[a][r * width..(r + 1) * width]);
                    self.gather(&mut potential, a, &mut modal);
                }
                let (charge, iterations) = self.solve(self.backward(&potential))?;
                let charge = self.forward(&charge);
                let mut all = vec![0.0; nx * width];
                for (a, modal) in all.chunks_exact_mut(width).enumerate() {
                    self.spread(&charge, a, modal);
                }
                Ok((all, iterations))
            })
            .collect();
        let mut charges = vec![Vec::with_capacity(K * width); nx];
        let mut most = 0;
        for solved in solved {
            let (modal, iterations) = solved?;
            for (to, from) in charges.iter_mut().zip(modal.chunks_exact(width)) {
                to.extend_from_slice(from);
            }
            most = most.max(iterations);
        }
        Ok((charges, most))
    }

    /// S^-1 b by conjugate gradient.
    fn solve(&self, b: OnPlates) -> Result<(OnPlates, usize), Error> {
        let mut x = [0, 1].map(|n| vec![0.0; b[n].len()]);
        let mut r = b;
        let mut z = self.precondition(&r);
        let mut p = z.clone();
        let mut rz = inner(&r, &z);
        let target = self.tolerance.powi(2) * rz;
        let add = |to: &mut Vec<f64>, by: f64, from: &Vec<f64>| {
            to.iter_mut().zip(from).for_each(|(t, f)| *t += by * f);
        };
        for iteration in 0..=MOST_ITERATIONS {
            if rz <= target || rz == 0.0 {
                return Ok((x, iteration));
            }
            let w = self.respond(&p);
            let step = rz / inner(&p, &w);
            for n in 0..2 {
                add(&mut x[n], step, &p[n]);
                add(&mut r[n], -step, &w[n]);
            }
            z = self.precondition(&r);
            let new = inner(&r, &z);
            for n in 0..2 {
                p[n].iter_mut().zip(&z[n]).for_each(|(p, z)| *p = z + new / rz * *p);
            }
            rz = new;
        }
        let reached = self.tolerance * (rz / target).sqrt();
        Err(Error::NotConverged { iterations: MOST_ITERATIONS, reached, tolerance: self.tolerance })
    }
}
