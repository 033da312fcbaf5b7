//! Holding the plates: the inner problem of the capacitance-matrix method [Buzbee1971].
//!
//! S lambda = g on the plate nodes, where S = R A0^-1 R^T is the response of the plates to charges on themselves in the
//! untilted bench. S is never formed: modes are at hand, and in modes it is a small matrix (planes x planes) for each
//! pair. Conjugate gradient, preconditioned with the inverse of those small matrices restricted to the plates, needs
//! the same few iterations at every level. The right-hand sides run side by side, each on a thread of its own: the
//! products are too small to be worth more.

use ndarray::{Array2, ArrayView2};
use rayon::prelude::*;
use tiltgap_meshes::NodeBox;

use crate::modes::{multiply, Modes, Transform};
use crate::Error;

/// Most inner iterations; more than ten times what the worst case takes.
const MOST_ITERATIONS: usize = 400;

/// The plate planes and their response in modes.
pub struct PlaneModes {
    /// Nodes along z of the plate planes, ascending: lower plate, then upper plate.
    pub planes: Vec<usize>,
    /// G, row by row: response of plane p to a charge on plane q, `[p * planes + q]`, modes along x by modes along y.
    pub response: Vec<Array2<f64>>,
}

/// One plane of a plate.
struct Sheet {
    /// Modes along x on the nodes of the plate.
    x: Transform,
    /// Modes along y on the nodes of the plate, node down.
    y: Array2<f64>,
    /// Area that belongs to each node.
    area: Array2<f64>,
}

/// The plates' own operator, ready to be inverted.
pub struct Hold {
    modes: PlaneModes,
    /// G^-1, in the same order as G.
    stiffness: Vec<Array2<f64>>,
    sheets: Vec<Sheet>,
    tolerance: f64,
}

impl Sheet {
    /// Modal coefficients of nodal values on the sheet; `modes` is the number of modes along x.
    fn forward(&self, nodal: ArrayView2<f64>, modes: usize) -> Array2<f64> {
        let mut along_y = Array2::zeros((nodal.nrows(), self.y.ncols()));
        multiply(nodal, self.y.view(), along_y.view_mut());
        let mut modal = Array2::zeros((modes, self.y.ncols()));
        self.x.forward(along_y.view(), modal.view_mut());
        modal
    }

    /// Nodal values on the sheet of modal coefficients.
    fn backward(&self, modal: ArrayView2<f64>) -> Array2<f64> {
        let mut along_y = Array2::zeros((self.area.nrows(), self.y.ncols()));
        self.x.backward(modal, along_y.view_mut());
        let mut nodal = Array2::zeros(self.area.dim());
        multiply(along_y.view(), self.y.t(), nodal.view_mut());
        nodal
    }
}

/// Inverts the matrices (planes x planes) of all pairs of modes; they are symmetric and positive.
fn inverse(response: &[Array2<f64>], planes: usize) -> Vec<Array2<f64>> {
    let mut inverse = response.to_vec();
    let (nx, ny) = response[0].dim();
    for a in 0..nx {
        for b in 0..ny {
            let g = nalgebra::DMatrix::from_fn(planes, planes, |p, q| response[p * planes + q][[a, b]]);
            // A response that is singular up to rounding is replaced by its diagonal: the inverse only preconditions.
            let inv = g.clone().cholesky().map(|c| c.inverse()).unwrap_or_else(|| {
                nalgebra::DMatrix::from_fn(planes, planes, |p, q| if p == q { 1.0 / g[(p, p)] } else { 0.0 })
            });
            for p in 0..planes {
                for q in 0..planes {
                    inverse[p * planes + q][[a, b]] = inv[(p, q)];
                }
            }
        }
    }
    inverse
}

/// One right-hand side on all sheets.
type OnSheets = Vec<Array2<f64>>;

fn inner(a: &OnSheets, b: &OnSheets) -> f64 {
    a.iter().zip(b).map(|(a, b)| a.iter().zip(b).map(|(a, b)| a * b).sum::<f64>()).sum()
}

impl Hold {
    /// From the modal response of the plate planes, the plates, the modes and the node masses along x and y.
    pub fn new(
        modes: PlaneModes,
        plates: &[NodeBox; 2],
        [x, y]: [&Modes; 2],
        masses: [Vec<f64>; 2],
        tolerance: f64,
    ) -> Hold {
        let sheets = plates
            .iter()
            .flat_map(|plate| {
                let [i, j] = [plate.i, plate.j];
                let sheet = || Sheet {
                    x: x.on(i[0], i[1]),
                    y: y.on(j[0], j[1]).vectors(),
                    area: Array2::from_shape_fn((i[1] - i[0] + 1, j[1] - j[0] + 1), |(m, n)| {
                        masses[0][i[0] + m] * masses[1][j[0] + n]
                    }),
                };
                (plate.k[0]..=plate.k[1]).map(|_| sheet()).collect::<Vec<_>>()
            })
            .collect();
        let stiffness = inverse(&modes.response, modes.planes.len());
        Hold { modes, stiffness, sheets, tolerance }
    }

    /// Nodes along z of the plate planes.
    pub fn planes(&self) -> &[usize] {
        &self.modes.planes
    }

    /// Sum over q of `matrix[p][q]` times the modal coefficients of sheet q.
    fn couple(matrix: &[Array2<f64>], modal: &OnSheets) -> OnSheets {
        let planes = modal.len();
        (0..planes)
            .map(|p| {
                let mut sum = &matrix[p * planes] * &modal[0];
                for q in 1..planes {
                    ndarray::Zip::from(&mut sum)
                        .and(&matrix[p * planes + q])
                        .and(&modal[q])
                        .for_each(|s, m, v| *s += m * v);
                }
                sum
            })
            .collect()
    }

    fn forward(&self, nodal: &OnSheets) -> OnSheets {
        let modes = self.stiffness[0].nrows();
        self.sheets.iter().zip(nodal).map(|(sheet, v)| sheet.forward(v.view(), modes)).collect()
    }

    fn backward(&self, modal: &OnSheets) -> OnSheets {
        self.sheets.iter().zip(modal).map(|(sheet, v)| sheet.backward(v.view())).collect()
    }

    /// S v.
    fn respond(&self, v: &OnSheets) -> OnSheets {
        self.backward(&Self::couple(&self.modes.response, &self.forward(v)))
    }

    fn times_area(&self, v: &OnSheets) -> OnSheets {
        self.sheets.iter().zip(v).map(|(sheet, v)| v * &sheet.area).collect()
    }

    /// An approximation of S^-1 v: the modal inverse, restricted to the plates.
    fn precondition(&self, v: &OnSheets) -> OnSheets {
        let modal = self.forward(&self.times_area(v));
        self.times_area(&self.backward(&Self::couple(&self.stiffness, &modal)))
    }

    /// Charges on the plates that bring the potential there to zero. `kept` holds, for each mode along x, the modal
    /// potential on the plate planes: plane, right-hand side, mode along y. Returns the modal charges of each plane and
    /// right-hand side, and the number of iterations.
    ///
    /// # Errors
    /// [`Error::NotConverged`]
    pub fn charges<const K: usize>(&self, kept: &[Vec<f64>]) -> Result<(Vec<Array2<f64>>, usize), Error> {
        let planes = self.sheets.len();
        let ny = self.sheets[0].y.ncols();
        let solved: Vec<Result<(OnSheets, usize), Error>> = (0..K)
            .into_par_iter()
            .map(|r| {
                let potential: OnSheets = (0..planes)
                    .map(|p| Array2::from_shape_fn((kept.len(), ny), |(a, b)| kept[a][(p * K + r) * ny + b]))
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
    fn solve(&self, b: OnSheets) -> Result<(OnSheets, usize), Error> {
        let mut x: OnSheets = b.iter().map(|v| Array2::zeros(v.dim())).collect();
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
