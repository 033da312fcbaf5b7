//! Eigenmodes of one axis: the transforms of the fast diagonalisation [Lynch1964].
//!
//! For the second-difference operator D and the lumped masses M of an axis, the modes Q satisfy D Q = M Q Lambda and
//! Q^T M Q = 1. Where the axis is its own mirror image the modes are even or odd, and a transform costs half.

use nalgebra::{DMatrix, SymmetricEigen};
use ndarray::linalg::general_mat_mul;
use ndarray::{Array2, ArrayView2, ArrayViewMut2, Axis as Direction, Slice};
use tiltgap_meshes::{Axis, End};

/// Symmetric tridiagonal matrix of an axis: second differences with what stands at the ends.
#[derive(Clone, Debug, PartialEq)]
pub struct Stiffness {
    /// Diagonal.
    pub diagonal: Vec<f64>,
    /// Off-diagonal, one entry for each cell (negative).
    pub off: Vec<f64>,
    /// What the far ends add to the diagonal (included there).
    ends: [f64; 2],
}

impl Stiffness {
    /// Of an axis; a far end adds the Robin weight of a distant face.
    pub fn new(axis: &Axis) -> Self {
        let off: Vec<f64> = axis.cells().iter().map(|h| -1.0 / h).collect();
        let n = axis.len();
        let mut diagonal = vec![0.0; n];
        for (k, o) in off.iter().enumerate() {
            diagonal[k] -= o;
            diagonal[k + 1] -= o;
        }
        // Nothing is added where the potential is given: that node is no unknown.
        let ends = axis.ends.map(|end| if end == End::Held { 0.0 } else { end.stiffness() });
        diagonal[0] += ends[0];
        diagonal[n - 1] += ends[1];
        Stiffness { diagonal, off, ends }
    }

    /// Energy of a vector, as a sum of squares: accurate for the smoothest mode too.
    fn energy(&self, v: &[f64]) -> f64 {
        let inner: f64 = self.off.iter().enumerate().map(|(k, o)| -o * (v[k + 1] - v[k]).powi(2)).sum();
        inner + self.ends[0] * v[0].powi(2) + self.ends[1] * v[v.len() - 1].powi(2)
    }
}

/// The modes of an axis.
#[derive(Clone, Debug)]
pub struct Modes {
    /// Eigenvalues, in units of 1/length^2; even modes first where the axis is symmetric.
    pub values: Vec<f64>,
    /// Between nodal values and modal coefficients, on all nodes.
    pub transform: Transform,
    /// First plus last node of the mirror image, where the modes are even and odd ones.
    centre: Option<usize>,
}

/// Modes on a range of nodes, and the products with them. On a range that is its own mirror image the modes fold into
/// even and odd ones on half of the nodes (the middle node is the last of the even ones), at half the cost.
#[derive(Clone, Debug)]
pub enum Transform {
    /// Node down, mode across.
    Whole(Array2<f64>),
    /// The same in two blocks of half the nodes, even modes first.
    Folded {
        /// Nodes up to the middle one, even modes.
        even: Array2<f64>,
        /// Nodes before the middle one, odd modes.
        odd: Array2<f64>,
    },
}

/// Eigenvectors of the symmetric matrix D on the nodes from `first`, scaled by `basis`^T M^-1/2 D M^-1/2 `basis`, as nodal
/// vectors.
fn eigenvectors(stiffness: &Stiffness, masses: &[f64], first: usize, basis: &DMatrix<f64>) -> DMatrix<f64> {
    let n = basis.nrows();
    let root: Vec<f64> = masses[first..first + n].iter().map(|m| m.sqrt()).collect();
    let mut scaled = DMatrix::zeros(n, n);
    for k in 0..n {
        scaled[(k, k)] = stiffness.diagonal[first + k] / masses[first + k];
    }
    for k in 0..n - 1 {
        let value = stiffness.off[first + k] / (root[k] * root[k + 1]);
        scaled[(k, k + 1)] = value;
        scaled[(k + 1, k)] = value;
    }
    let mut vectors = basis * SymmetricEigen::new(basis.transpose() * scaled * basis).eigenvectors;
    for (k, mut row) in vectors.row_iter_mut().enumerate() {
        row /= root[k];
    }
    vectors
}

/// Relative difference up to which two nodes count as mirror images.
const MIRROR: f64 = 1e-9;

/// Whether the operator on the nodes from `first` to `last` is its own mirror image.
fn mirrored(stiffness: &Stiffness, masses: &[f64], first: usize, last: usize) -> bool {
    let same = |a: f64, b: f64| (a - b).abs() <= MIRROR * a.abs();
    (last - first).is_multiple_of(2)
        && (first..=last).all(|k| {
            let other = first + last - k;
            same(masses[k], masses[other]) && same(stiffness.diagonal[k], stiffness.diagonal[other])
        })
}

impl Modes {
    /// Computes the modes; the cost grows with the cube of the number of nodes. Where the potential is given at an end
    /// of the axis the modes vanish there, and there are fewer of them than nodes.
    pub fn new(axis: &Axis) -> Modes {
        let held = axis.ends.map(|end| usize::from(end == End::Held));
        Modes::within(axis, held[0], axis.len() - 1 - held[1])
    }

    /// The modes that live on the nodes from `first` to `last` and vanish on the others.
    pub fn within(axis: &Axis, first: usize, last: usize) -> Modes {
        let (stiffness, masses) = (Stiffness::new(axis), axis.masses());
        let n = last + 1 - first;
        let h = n / 2;
        let symmetric = mirrored(&stiffness, &masses, first, last);
        let vectors = if symmetric {
            let half = 0.5f64.sqrt();
            let (mut even, mut odd) = (DMatrix::zeros(n, h + 1), DMatrix::zeros(n, h));
            for k in 0..h {
                (even[(k, k)], even[(n - 1 - k, k)]) = (half, half);
                (odd[(k, k)], odd[(n - 1 - k, k)]) = (half, -half);
            }
            even[(h, h)] = 1.0;
            [even, odd].iter().map(|basis| eigenvectors(&stiffness, &masses, first, basis)).collect()
        } else {
            vec![eigenvectors(&stiffness, &masses, first, &DMatrix::identity(n, n))]
        };
        let columns: Vec<Vec<f64>> = vectors
            .iter()
            .flat_map(|v| v.column_iter())
            .map(|c| {
                let mut nodal = vec![0.0; axis.len()];
                nodal[first..=last].copy_from_slice(c.as_slice());
                nodal
            })
            .collect();
        let vectors = Array2::from_shape_fn((axis.len(), n), |(k, a)| columns[a][k]);
        let values = columns.iter().map(|v| stiffness.energy(v)).collect();
        let centre = first + last;
        let folds = symmetric && centre == axis.len() - 1;
        Modes { values, transform: Transform::new(vectors, folds), centre: symmetric.then_some(centre) }
    }

    /// Number of modes.
    pub fn len(&self) -> usize {
        self.values.len()
    }

    /// The transform of values on the nodes from `from` to `to` that are first spread over the axis: with E the matrix
    /// `spread` (those nodes down, all nodes across) and M the masses, E M Q.
    pub fn spread(&self, from: usize, to: usize, spread: &Array2<f64>, masses: &[f64]) -> Transform {
        let mut vectors = self.transform.vectors();
        for (k, mut row) in vectors.outer_iter_mut().enumerate() {
            row *= masses[k];
        }
        Transform::new(spread.dot(&vectors), self.centre == Some(from + to))
    }

    /// The transform on the nodes from `from` to `to`, both included.
    pub fn on(&self, from: usize, to: usize) -> Transform {
        let vectors = self.transform.vectors().slice_axis(Direction(0), Slice::from(from..=to)).to_owned();
        Transform::new(vectors, self.centre == Some(from + to))
    }
}

impl Transform {
    /// From modes, node down and mode across; `symmetric` says that the first half of the modes (and the middle one) is
    /// even about the middle node, the rest odd.
    fn new(vectors: Array2<f64>, symmetric: bool) -> Transform {
        if !symmetric {
            return Transform::Whole(vectors);
        }
        let (n, modes) = vectors.dim();
        let (h, odd_modes) = (n / 2, modes / 2);
        let block =
            |dim: (usize, usize), first: usize| Array2::from_shape_fn(dim, |(k, a)| vectors[[k, first + a]]);
        Transform::Folded {
            even: block((h + 1, modes - odd_modes), 0),
            odd: block((h, odd_modes), modes - odd_modes),
        }
    }

    /// Number of modes.
    pub fn modes(&self) -> usize {
        match self {
            Transform::Whole(vectors) => vectors.ncols(),
            Transform::Folded { even, odd } => even.ncols() + odd.ncols(),
        }
    }

    /// The modes, node down and mode across.
    pub fn vectors(&self) -> Array2<f64> {
        match self {
            Transform::Whole(vectors) => vectors.clone(),
            Transform::Folded { even, odd } => {
                let (h, evens) = (odd.nrows(), even.ncols());
                Array2::from_shape_fn((2 * h + 1, evens + odd.ncols()), |(k, a)| {
                    let (side, sign) = if k > h { (2 * h - k, -1.0) } else { (k, 1.0) };
                    match (a < evens, side == h) {
                        (true, _) => even[[side, a]],
                        (false, true) => 0.0,
                        (false, false) => sign * odd[[side, a - evens]],
                    }
                })
            }
        }
    }

    /// Modal coefficients Q^T v of nodal columns: (nodes x m) to (modes x m). Costs m times nodes times modes
    /// multiplications, half of that where the modes fold.
    pub fn forward(&self, nodal: ArrayView2<f64>, mut modal: ArrayViewMut2<f64>) {
        let (even, odd) = match self {
            Transform::Whole(vectors) => return multiply(vectors.t(), nodal, modal),
            Transform::Folded { even, odd } => (even, odd),
        };
        let (h, n) = (odd.nrows(), nodal.nrows());
        let mut plus = Array2::zeros((h + 1, nodal.ncols()));
        let mut minus = Array2::zeros((h, nodal.ncols()));
        for k in 0..h {
            let (a, b) = (nodal.row(k), nodal.row(n - 1 - k));
            ndarray::Zip::from(plus.row_mut(k)).and(minus.row_mut(k)).and(a).and(b).for_each(
                |p, m, &a, &b| {
                    *p = a + b;
                    *m = a - b;
                },
            );
        }
        plus.row_mut(h).assign(&nodal.row(h));
        let (first, second) = modal.view_mut().split_at(Direction(0), even.ncols());
        multiply(even.t(), plus.view(), first);
        multiply(odd.t(), minus.view(), second);
    }

    /// Nodal values Q c of modal columns: (modes x m) to (nodes x m); same cost as [`Transform::forward`].
    pub fn backward(&self, modal: ArrayView2<f64>, mut nodal: ArrayViewMut2<f64>) {
        let (even, odd) = match self {
            Transform::Whole(vectors) => return multiply(vectors.view(), modal, nodal),
            Transform::Folded { even, odd } => (even, odd),
        };
        let h = odd.nrows();
        let (first, second) = modal.split_at(Direction(0), even.ncols());
        let mut plus = Array2::zeros((h + 1, modal.ncols()));
        let mut minus = Array2::zeros((h, modal.ncols()));
        multiply(even.view(), first, plus.view_mut());
        multiply(odd.view(), second, minus.view_mut());
        let (mut lower, mut upper) = nodal.view_mut().split_at(Direction(0), h + 1);
        for k in 0..h {
            let (p, m) = (plus.row(k), minus.row(k));
            ndarray::Zip::from(lower.row_mut(k)).and(upper.row_mut(h - 1 - k)).and(p).and(m).for_each(
                |a, b, &p, &m| {
                    *a = p + m;
                    *b = p - m;
                },
            );
        }
        lower.row_mut(h).assign(&plus.row(h));
    }
}

/// c = a b, in whichever orientation writes along the rows of memory.
pub fn multiply(a: ArrayView2<f64>, b: ArrayView2<f64>, mut c: ArrayViewMut2<f64>) {
    if c.strides()[1] == 1 {
        general_mat_mul(1.0, &a, &b, 0.0, &mut c);
    } else {
        general_mat_mul(1.0, &b.t(), &a.t(), 0.0, &mut c.view_mut().reversed_axes());
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use tiltgap_meshes::Beyond;

    #[test]
    fn modes_diagonalise_and_transforms_invert_each_other() {
        let far = Beyond::Open { far: 20.0, decay: 1.0 };
        for axis in [
            Axis::lateral(&[-0.5, 0.5], 2, [far; 2]),
            Axis::lateral(&[-0.5, 0.5, -0.4, 0.45], 1, [far; 2]),
            Axis::lateral(&[0.5], 2, [Beyond::Mirror, far]),
            Axis::slab(),
            Axis::lateral(&[-0.5, 0.5], 2, [Beyond::Wall(-0.7), Beyond::Wall(0.7)]),
            Axis::lateral(&[0.5], 2, [Beyond::Mirror, Beyond::Wall(0.8)]),
        ] {
            let modes = Modes::new(&axis);
            let (n, masses) = (axis.len(), axis.masses());
            let held = axis.ends.map(|end| end == End::Held);
            let stiffness = Stiffness::new(&axis);
            let mut stiff = Array2::<f64>::zeros((n, n));
            for k in 0..n {
                stiff[[k, k]] = stiffness.diagonal[k];
            }
            for (k, &o) in stiffness.off.iter().enumerate() {
                (stiff[[k, k + 1]], stiff[[k + 1, k]]) = (o, o);
            }
            let q = &modes.transform.vectors();
            let mass = Array2::from_diag(&ndarray::Array1::from(masses.clone()));
            let one = q.t().dot(&mass).dot(q);
            let values = q.t().dot(&stiff).dot(q);
            let largest = modes.values.iter().copied().fold(0.0, f64::max);
            assert_eq!(modes.len(), n - held.iter().filter(|h| **h).count());
            for a in 0..modes.len() {
                for b in 0..modes.len() {
                    let delta = if a == b { 1.0 } else { 0.0 };
                    assert!((one[[a, b]] - delta).abs() < 1e-12);
                    assert!((values[[a, b]] - delta * modes.values[a]).abs() < 1e-13 * largest.max(1.0));
                }
            }
            let mut v = Array2::from_shape_fn((n, 3), |(k, c)| ((k * 7 + c * 5) % 11) as f64 - 4.0);
            for (k, _) in [0, n - 1].into_iter().zip(held).filter(|h| h.1) {
                v.row_mut(k).fill(0.0);
            }
            let (mut modal, mut back) = (Array2::zeros((modes.len(), 3)), Array2::zeros((n, 3)));
            modes.transform.forward(mass.dot(&v).view(), modal.view_mut());
            modes.transform.backward(modal.view(), back.view_mut());
            assert!((&back - &v).iter().all(|d| d.abs() < 1e-9));
        }
    }
}
