//! The surface of a body in a box of nodes: its faces whole, its rims along a few lines of each plane between them.
//!
//! Charges that hold a body sit on its surface alone. In modes a face is a full transform, while the rims add only as
//! many products of two vectors to each plane as there are lines: this is what keeps a thick plate nearly as cheap as a
//! sheet. Values on the surface are kept in one row: plane after plane, a face as it is (zero in holes), of a plane between
//! the faces first its lines across x, then those along x (zero where they cross).

use ndarray::{Array2, ArrayView2, ArrayViewMut2, Axis as Direction};

use crate::modes::multiply;
use crate::sheet::Sheet;

/// A surface and its transforms.
pub struct Shell {
    /// Modes on the nodes of a plane.
    sheet: Sheet,
    planes: usize,
    /// 1 on the nodes of a face, 0 in its holes.
    face: Array2<f64>,
    /// 1 on the nodes of the lines of a plane between the faces; where lines cross, on those across x alone.
    rows_mask: Array2<f64>,
    columns_mask: Array2<f64>,
    /// The lines of rim nodes: across x at these nodes along x, and along x at these nodes along y.
    rows: Vec<usize>,
    columns: Vec<usize>,
    /// Modes at the lines: mode along x by line, line by mode along y.
    row_modes: Array2<f64>,
    column_modes: Array2<f64>,
}

/// Values on the surface in modes: faces whole, rims as the factors of their products.
pub struct Spectrum {
    /// Modal coefficients of the faces, ascending.
    pub faces: Vec<Array2<f64>>,
    /// Of the lines across x of all planes between, in modes along y: plane and line down.
    rows: Array2<f64>,
    /// Of the lines along x, in modes along x: mode down, plane and line across.
    columns: Array2<f64>,
}

impl Shell {
    /// From the modes on the nodes of the box, the number of planes, and the surface nodes (1, else 0) of a face and of a
    /// plane between the faces; the latter lie on the given `rows` (all y) and `columns` (all x).
    pub fn new(
        sheet: Sheet,
        planes: usize,
        face: Array2<f64>,
        rim: &Array2<f64>,
        rows: Vec<usize>,
        columns: Vec<usize>,
    ) -> Shell {
        let row_modes =
            sheet.x.vectors().select(Direction(0), &rows).reversed_axes().as_standard_layout().into_owned();
        let column_modes = sheet.y.select(Direction(0), &columns);
        let rows_mask = rim.select(Direction(0), &rows);
        let mut columns_mask = rim.select(Direction(1), &columns);
        for &i in &rows {
            columns_mask.row_mut(i).fill(0.0);
        }
        Shell { sheet, planes, face, rows_mask, columns_mask, rows, columns, row_modes, column_modes }
    }

    /// Number of planes.
    pub fn planes(&self) -> usize {
        self.planes
    }

    /// Number of modes along x and y.
    pub fn modes(&self) -> (usize, usize) {
        self.sheet.modes()
    }

    /// Nodes of the box along x and y.
    pub fn dim(&self) -> (usize, usize) {
        self.face.dim()
    }

    /// Planes between the faces.
    fn between(&self) -> usize {
        self.planes.saturating_sub(2)
    }

    /// Whether a plane is a face.
    fn is_face(&self, plane: usize) -> bool {
        plane == 0 || plane + 1 == self.planes
    }

    /// Length of the row of values.
    pub fn len(&self) -> usize {
        self.face.len() * self.planes.min(2) + self.rim_len() * self.between()
    }

    /// Values of one plane between the faces.
    fn rim_len(&self) -> usize {
        self.rows_mask.len() + self.columns_mask.len()
    }

    /// Where a plane begins in the row of values.
    fn start(&self, plane: usize) -> usize {
        if plane == 0 {
            0
        } else {
            self.face.len() + (plane - 1) * self.rim_len()
        }
    }

    /// Place in the row of values of a surface node.
    ///
    /// # Panics
    /// If the node is not on a line of a plane between the faces.
    pub fn place(&self, plane: usize, [i, j]: [usize; 2]) -> usize {
        let (start, (_, nj)) = (self.start(plane), self.dim());
        if self.is_face(plane) {
            return start + i * nj + j;
        }
        if let Some(n) = self.rows.iter().position(|&r| r == i) {
            return start + n * nj + j;
        }
        let n = self.columns.iter().position(|&c| c == j).expect("a node on a line");
        start + self.rows_mask.len() + i * self.columns.len() + n
    }

    /// Where the values of face `n` (0 the lower one) stand.
    fn face_range(&self, n: usize) -> std::ops::Range<usize> {
        let start = if n == 0 { 0 } else { self.start(self.planes - 1) };
        start..start + self.face.len()
    }

    /// The values of face `n` as a plane.
    pub fn face<'a>(&self, n: usize, values: &'a [f64]) -> ArrayView2<'a, f64> {
        ArrayView2::from_shape(self.dim(), &values[self.face_range(n)]).expect("a face")
    }

    /// The same, to be written.
    pub fn face_mut<'a>(&self, n: usize, values: &'a mut [f64]) -> ArrayViewMut2<'a, f64> {
        ArrayViewMut2::from_shape(self.dim(), &mut values[self.face_range(n)]).expect("a face")
    }

    /// 1 on the nodes of a face, 0 in its holes.
    pub fn face_mask(&self) -> &Array2<f64> {
        &self.face
    }

    /// An empty spectrum.
    pub fn spectrum(&self) -> Spectrum {
        let between = self.between();
        Spectrum {
            faces: vec![Array2::zeros(self.modes()); self.planes.min(2)],
            rows: Array2::zeros((between * self.rows.len(), self.modes().1)),
            columns: Array2::zeros((self.modes().0, between * self.columns.len())),
        }
    }

    /// The spectrum of values on the surface.
    pub fn forward(&self, values: &[f64]) -> Spectrum {
        let mut spectrum = self.spectrum();
        for (n, face) in spectrum.faces.iter_mut().enumerate() {
            *face = self.sheet.forward(self.face(n, values));
        }
        let ((ni, nj), between) = (self.dim(), self.between());
        let (rows, columns) = (self.rows.len(), self.columns.len());
        let mut across = Array2::zeros((between * rows, nj));
        let mut along = Array2::zeros((ni, between * columns));
        for p in 0..between {
            let start = self.start(p + 1);
            let (first, second) = values[start..start + self.rim_len()].split_at(rows * nj);
            let first = ArrayView2::from_shape((rows, nj), first).expect("lines across x");
            let second = ArrayView2::from_shape((ni, columns), second).expect("lines along x");
            across.slice_axis_mut(Direction(0), (p * rows..(p + 1) * rows).into()).assign(&first);
            along.slice_axis_mut(Direction(1), (p * columns..(p + 1) * columns).into()).assign(&second);
        }
        if between > 0 {
            multiply(across.view(), self.sheet.y.view(), spectrum.rows.view_mut());
            self.sheet.x.forward(along.view(), spectrum.columns.view_mut());
        }
        spectrum
    }

    /// Values on the surface of a spectrum that was [gathered](Shell::gather).
    pub fn backward(&self, spectrum: &Spectrum) -> Vec<f64> {
        let mut values = vec![0.0; self.len()];
        let (ni, nj) = self.dim();
        for (n, face) in spectrum.faces.iter().enumerate() {
            let mut nodal = self.face_mut(n, &mut values);
            self.sheet.backward(face.view(), nodal.view_mut());
            nodal *= &self.face;
        }
        let between = self.between();
        if between > 0 {
            let (rows, columns) = (self.rows.len(), self.columns.len());
            let mut across = Array2::zeros((between * rows, nj));
            multiply(spectrum.rows.view(), self.sheet.y.t(), across.view_mut());
            let mut along = Array2::zeros((ni, between * columns));
            self.sheet.x.backward(spectrum.columns.view(), along.view_mut());
            for p in 0..between {
                let start = self.start(p + 1);
                let (first, second) = values[start..start + self.rim_len()].split_at_mut(rows * nj);
                let mut first = ArrayViewMut2::from_shape((rows, nj), first).expect("lines across x");
                let mut second = ArrayViewMut2::from_shape((ni, columns), second).expect("lines along x");
                first.assign(&across.slice_axis(Direction(0), (p * rows..(p + 1) * rows).into()));
                second.assign(&along.slice_axis(Direction(1), (p * columns..(p + 1) * columns).into()));
                first *= &self.rows_mask;
                second *= &self.columns_mask;
            }
        }
        values
    }

    /// Writes the modal coefficients of mode `a` along x: plane down, mode along y across.
    pub fn spread(&self, spectrum: &Spectrum, a: usize, planes: &mut [f64]) {
        let ny = self.modes().1;
        let (rows, columns) = (self.rows.len(), self.columns.len());
        let at = self.row_modes.row(a);
        let lines = spectrum.columns.row(a);
        for (p, plane) in planes.chunks_exact_mut(ny).enumerate() {
            if self.is_face(p) {
                let face = &spectrum.faces[usize::from(p > 0)];
                plane.copy_from_slice(face.row(a).to_slice().expect("modes along y are contiguous"));
                continue;
            }
            plane.fill(0.0);
            for n in 0..rows {
                let line = spectrum.rows.row((p - 1) * rows + n);
                add(plane, at[n], line.to_slice().expect("contiguous"));
            }
            for n in 0..columns {
                let mode = self.column_modes.row(n);
                add(plane, lines[(p - 1) * columns + n], mode.to_slice().expect("contiguous"));
            }
        }
    }

    /// Takes the modal coefficients of mode `a` along x into an empty spectrum, so far as the surface needs them for
    /// [`Shell::backward`]. All modes have to come, each once.
    pub fn gather(&self, spectrum: &mut Spectrum, a: usize, planes: &[f64]) {
        let ny = self.modes().1;
        let (rows, columns) = (self.rows.len(), self.columns.len());
        let at = self.row_modes.row(a);
        for (p, plane) in planes.chunks_exact(ny).enumerate() {
            if self.is_face(p) {
                let mut face = spectrum.faces[usize::from(p > 0)].row_mut(a);
                face.as_slice_mut().expect("modes along y are contiguous").copy_from_slice(plane);
                continue;
            }
            for n in 0..rows {
                let mut line = spectrum.rows.row_mut((p - 1) * rows + n);
                add(line.as_slice_mut().expect("contiguous"), at[n], plane);
            }
            for n in 0..columns {
                let mode = self.column_modes.row(n);
                spectrum.columns[[a, (p - 1) * columns + n]] =
                    dot(plane, mode.to_slice().expect("contiguous"));
            }
        }
    }
}

/// to += by times from.
#[inline(always)]
fn add(to: &mut [f64], by: f64, from: &[f64]) {
    for (t, f) in to.iter_mut().zip(from) {
        *t += by * f;
    }
}

/// Sums in flight at once in a scalar product: as many as let the processor add in parallel.
const LANES: usize = 8;

/// Scalar product.
#[inline(always)]
fn dot(a: &[f64], b: &[f64]) -> f64 {
    let mut sums = [0.0; LANES];
    let (whole_a, whole_b) = (a.chunks_exact(LANES), b.chunks_exact(LANES));
    let rest: f64 = whole_a.remainder().iter().zip(whole_b.remainder()).map(|(a, b)| a * b).sum();
    for (a, b) in whole_a.zip(whole_b) {
        for n in 0..LANES {
            sums[n] += a[n] * b[n];
        }
    }
    sums.iter().sum::<f64>() + rest
}
