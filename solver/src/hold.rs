//! Holding the plates: the inner problem of the capacitance-matrix method [Buzbee1971].
//!
//! S lambda = g on the surface nodes of the plates, where S = R A0^-1 R^T is the response of the surface to charges on
//! itself in the untilted bench. Inside the metal nothing has to be held: with its surface at zero it is at zero. S is
//! never formed: modes are at hand, and in modes it is one tridiagonal system of the planes for each pair
//! ([`Stack`]). Conjugate gradient; the preconditioner adds what the space outside would hold if the faces were planes
//! without end, restricted to the plates, and what the metal holds between its faces and rims ([`Metal`]). It needs
//! nearly the same few iterations at every level. The right-hand sides run side by side, each on a thread of its own:
//! the products are too small to be worth more.

use ndarray::Array2;
use rayon::prelude::*;
use tiltgap_meshes::{Axis, Body};

use crate::metal::Metal;
use crate::modes::Modes;
use crate::shell::{Part, Shell};
use crate::stack::{Ladder, Stack};
use crate::Error;

/// Most inner iterations; more than ten times what the worst case takes.
const MOST_ITERATIONS: usize = 400;

/// One plate, with its guard ring if it has one: the planes of its surface and the boxes of its metal.
struct Plate {
    shell: Shell,
    metals: Vec<Metal>,
    /// Area that belongs to each node of a face.
    area: Array2<f64>,
    /// Its first plane among those of both plates.
    first: usize,
}

/// The plates' own operator, ready to be inverted.
pub struct Hold {
    /// Nodes along z of the planes, ascending: lower plate, then upper plate.
    planes: Vec<usize>,
    /// The planes that are faces.
    faces: Vec<usize>,
    stack: Stack,
    plates: Vec<Plate>,
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
    let mask = |part: Part| {
        Array2::from_shape_fn((i1 - i0 + 1, j1 - j0 + 1), |(i, j)| {
            let held = body.boxes.iter().any(|b| {
                let inside = b.contains(i0 + i, j0 + j, k0);
                let rim = walls(b.i, nx).contains(&(i0 + i)) || walls(b.j, ny).contains(&(j0 + j));
                inside && (part == Part::Face || rim)
            });
            f64::from(u8::from(held))
        })
    };
    let lines = |of: &dyn Fn(&tiltgap_meshes::NodeBox) -> Vec<usize>, first: usize| {
        let mut lines: Vec<usize> = body.boxes.iter().flat_map(of).map(|n| n - first).collect();
        lines.sort_unstable();
        lines.dedup();
        lines
    };
    let (rows, columns) = (lines(&|b| walls(b.i, nx), i0), lines(&|b| walls(b.j, ny), j0));
    let part = |k| if k == k0 || k == k1 { Part::Face } else { Part::Rim };
    Shell::new(
        x.on(i0, i1),
        y.on(j0, j1).vectors(),
        (k0..=k1).map(part).collect(),
        [mask(Part::Face), mask(Part::Rim)],
        rows,
        columns,
    )
}

/// One right-hand side on all planes.
type OnPlanes = Vec<Array2<f64>>;

fn inner(a: &OnPlanes, b: &OnPlanes) -> f64 {
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
        let mut first = 0;
        let plates: Vec<Plate> = bodies
            .iter()
            .map(|body| {
                let shell = surface(body, modes, axes.map(|axis| axis.len()));
                let corner = [body.hull.i[0], body.hull.j[0]];
                let thick = body.hull.k[1] > body.hull.k[0];
                let metals = body
                    .boxes
                    .iter()
                    .filter(|_| thick)
                    .map(|b| Metal::new(axes, ladder, b, corner))
                    .collect();
                let area = Array2::from_shape_fn(shell.mask(0).dim(), |(i, j)| {
                    masses[0][corner[0] + i] * masses[1][corner[1] + j]
                });
                let plate = Plate { shell, metals, area, first };
                first += plate.shell.planes();
                plate
            })
            .collect();
        let planes = bodies.iter().flat_map(|b| b.hull.k[0]..=b.hull.k[1]).collect();
        Hold { planes, faces: stack.faces(), stack, plates, tolerance }
    }

    /// Nodes along z of the planes of the plates.
    pub fn planes(&self) -> &[usize] {
        &self.planes
    }

    /// The plate that a plane belongs to, and the number of the plane in it.
    fn place(&self, plane: usize) -> (&Plate, usize) {
        let plate =
            self.plates.iter().rev().find(|p| p.first <= plane).expect("planes begin at the first plate");
        (plate, plane - plate.first)
    }

    fn forward(&self, nodal: &OnPlanes) -> OnPlanes {
        let one = |(p, v): (usize, &Array2<f64>)| {
            let (plate, own) = self.place(p);
            plate.shell.forward(own, v.view())
        };
        nodal.iter().enumerate().map(one).collect()
    }

    fn backward(&self, modal: &OnPlanes) -> OnPlanes {
        let one = |(p, v): (usize, &Array2<f64>)| {
            let (plate, own) = self.place(p);
            plate.shell.backward(own, v.view())
        };
        modal.iter().enumerate().map(one).collect()
    }

    /// S v.
    fn respond(&self, v: &OnPlanes) -> OnPlanes {
        let mut modal = self.forward(v);
        self.stack.respond(&mut modal);
        self.backward(&modal)
    }

    /// An approximation of S^-1 v.
    fn precondition(&self, v: &OnPlanes) -> OnPlanes {
        let mut charge: OnPlanes = v.iter().map(|v| Array2::zeros(v.dim())).collect();
        let of_faces: OnPlanes = self
            .faces
            .iter()
            .map(|&p| {
                let (plate, own) = self.place(p);
                plate.shell.forward(own, (&v[p] * &plate.area).view())
            })
            .collect();
        for (&p, modal) in self.faces.iter().zip(self.stack.outside(&of_faces)) {
            let (plate, own) = self.place(p);
            charge[p] = plate.shell.backward(own, modal.view()) * &plate.area;
        }
        for plate in &self.plates {
            let planes = plate.first..plate.first + plate.shell.planes();
            for metal in &plate.metals {
                metal.add_charges(&v[planes.clone()], &mut charge[planes.clone()]);
            }
        }
        charge
    }

    /// Charges on the plates that bring the potential there to zero. `kept` holds, for each mode along x, the modal
    /// potential on the plate planes: plane, right-hand side, mode along y. Returns the modal charges of each plane and
    /// right-hand side, and the number of iterations.
    ///
    /// # Errors
    /// [`Error::NotConverged`]
    pub fn charges<const K: usize>(&self, kept: &[Vec<f64>]) -> Result<(Vec<Array2<f64>>, usize), Error> {
        let planes = self.planes.len();
        let dim = self.plates[0].shell.modes();
        let solved: Vec<Result<(OnPlanes, usize), Error>> = (0..K)
            .into_par_iter()
            .map(|r| {
                let potential: OnPlanes = (0..planes)
                    .map(|p| Array2::from_shape_fn(dim, |(a, b)| kept[a][(p * K + r) * dim.1 + b]))
                    .collect();
                let (charge, iterations) = self.solve(self.backward(&potential))?;
                Ok((self.forward(&charge), iterations))
            })
            .collect();
        let mut charges = vec![Array2::zeros((0, 0)); planes * K];
        let mut most = 0;
        for (r, solved) in solved.into_iter().enumerate() {
            let (modal, iterations) = solved?;
            for (p, modal) in modal.into_iter().enumerate() {
                charges[p * K + r] = modal;
            }
            most = most.max(iterations);
        }
        Ok((charges, most))
    }

    /// S^-1 b by conjugate gradient.
    fn solve(&self, b: OnPlanes) -> Result<(OnPlanes, usize), Error> {
        let mut x: OnPlanes = b.iter().map(|v| Array2::zeros(v.dim())).collect();
        let mut r = b;
        let mut z = self.precondition(&r);
        let mut p = z.clone();
        let mut rz = inner(&r, &z);
        let target = self.tolerance.powi(2) * rz;
        for iteration in 0..=MOST_ITERATIONS {
            if rz <= target || rz == 0.0 {
                return Ok((x, iteration));
            }
            let w = self.respond(&p);
            let step = rz / inner(&p, &w);
            for n in 0..x.len() {
                x[n].scaled_add(step, &p[n]);
                r[n].scaled_add(-step, &w[n]);
            }
            z = self.precondition(&r);
            let new = inner(&r, &z);
            for n in 0..p.len() {
                p[n] *= new / rz;
                p[n] += &z[n];
            }
            rz = new;
        }
        let reached = self.tolerance * (rz / target).sqrt();
        Err(Error::NotConverged { iterations: MOST_ITERATIONS, reached, tolerance: self.tolerance })
    }
}
