//! The surface of a body in a box of nodes: its faces whole, its rims along a few lines of each plane between them.
//!
//! Charges that hold a body sit on its surface alone. In modes a face is a full transform, while the rims add only as
//! many products of two vectors to each plane as there are lines: this is what keeps a thick plate nearly as cheap as a
//! sheet.

use ndarray::{Array2, ArrayView2, Axis as Direction};

use crate::modes::{multiply, Transform};

/// Which nodes of a plane belong to the surface.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Part {
    /// A face: a full plane, with holes where there is no metal.
    Face,
    /// Between the faces: the lines along the rims.
    Rim,
}

/// A surface and its transforms.
pub struct Shell {
    /// Modes along x on the nodes of the box.
    x: Transform,
    /// Modes along y on the nodes of the box, node down.
    y: Array2<f64>,
    /// The planes, ascending.
    parts: Vec<Part>,
    /// Surface nodes of a face and of a plane between, 1 or 0.
    masks: [Array2<f64>; 2],
    /// Lines of rim nodes across x and along x, and the modes there (line down).
    rows: Vec<usize>,
    columns: Vec<usize>,
    row_modes: Array2<f64>,
    column_modes: Array2<f64>,
}

impl Shell {
    /// From the modes on the nodes of the box, the planes, and the surface nodes of a face and of a plane between the
    /// faces; the latter lie on the given `rows` (all y) and `columns` (all x).
    pub fn new(
        x: Transform,
        y: Array2<f64>,
        parts: Vec<Part>,
        masks: [Array2<f64>; 2],
        rows: Vec<usize>,
        columns: Vec<usize>,
    ) -> Shell {
        let row_modes = x.vectors().select(Direction(0), &rows);
        let column_modes = y.select(Direction(0), &columns);
        Shell { x, y, parts, masks, rows, columns, row_modes, column_modes }
    }

    /// Number of planes.
    pub fn planes(&self) -> usize {
        self.parts.len()
    }

    /// Number of modes along x and y.
    pub fn modes(&self) -> (usize, usize) {
        (self.row_modes.ncols(), self.y.ncols())
    }

    /// 1 on the surface nodes of a plane, 0 elsewhere.
    pub fn mask(&self, plane: usize) -> &Array2<f64> {
        &self.masks[usize::from(self.parts[plane] == Part::Rim)]
    }

    /// Modal coefficients of nodal values on one plane of the surface.
    pub fn forward(&self, plane: usize, nodal: ArrayView2<f64>) -> Array2<f64> {
        let mut modal = Array2::zeros(self.modes());
        match self.parts[plane] {
            Part::Face => {
                let mut along_y = Array2::zeros((nodal.nrows(), self.y.ncols()));
                multiply(nodal, self.y.view(), along_y.view_mut());
                self.x.forward(along_y.view(), modal.view_mut());
            }
            Part::Rim => {
                let (rows, columns) = (self.rows.len(), self.columns.len());
                let mut across = nodal.select(Direction(1), &self.columns);
                for &i in &self.rows {
                    across.row_mut(i).fill(0.0);
                }
                // Lines side by side, so that one product brings them all together.
                let mut left = Array2::zeros((self.modes().0, rows + columns));
                let mut right = Array2::zeros((rows + columns, self.modes().1));
                let (mut of_rows, of_columns) = left.view_mut().split_at(Direction(1), rows);
                of_rows.assign(&self.row_modes.t());
                self.x.forward(across.view(), of_columns);
                let (of_rows, mut of_columns) = right.view_mut().split_at(Direction(0), rows);
                multiply(nodal.select(Direction(0), &self.rows).view(), self.y.view(), of_rows);
                of_columns.assign(&self.column_modes);
                multiply(left.view(), right.view(), modal.view_mut());
            }
        }
        modal
    }

    /// Nodal values on one plane of the surface of modal coefficients; zero beside the surface.
    pub fn backward(&self, plane: usize, modal: ArrayView2<f64>) -> Array2<f64> {
        let mask = self.mask(plane);
        let (ni, nj) = mask.dim();
        let mut nodal = Array2::zeros((ni, nj));
        match self.parts[plane] {
            Part::Face => {
                let mut along_y = Array2::zeros((ni, self.y.ncols()));
                self.x.backward(modal, along_y.view_mut());
                multiply(along_y.view(), self.y.t(), nodal.view_mut());
            }
            Part::Rim => {
                let mut of_rows = Array2::zeros((self.rows.len(), modal.ncols()));
                multiply(self.row_modes.view(), modal, of_rows.view_mut());
                let mut rows = Array2::zeros((self.rows.len(), nj));
                multiply(of_rows.view(), self.y.t(), rows.view_mut());
                let mut of_columns = Array2::zeros((modal.nrows(), self.columns.len()));
                multiply(modal, self.column_modes.t(), of_columns.view_mut());
                let mut columns = Array2::zeros((ni, self.columns.len()));
                self.x.backward(of_columns.view(), columns.view_mut());
                for (n, &j) in self.columns.iter().enumerate() {
                    nodal.column_mut(j).assign(&columns.column(n));
                }
                for (n, &i) in self.rows.iter().enumerate() {
                    nodal.row_mut(i).assign(&rows.row(n));
                }
            }
        }
        nodal *= mask;
        nodal
    }
}
