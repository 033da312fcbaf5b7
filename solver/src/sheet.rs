//! The transforms of a plane of nodes, along x and along y.

use ndarray::{Array2, ArrayView2, ArrayViewMut2};

use crate::modes::{multiply, Transform};

/// Modes on the nodes of a plane.
pub struct Sheet {
    /// Modes along x.
    pub x: Transform,
    /// Modes along y, node down and mode across.
    pub y: Array2<f64>,
}

impl Sheet {
    /// Number of modes along x and y.
    pub fn modes(&self) -> (usize, usize) {
        (self.x.modes(), self.y.ncols())
    }

    /// Modal coefficients of nodal values.
    pub fn forward(&self, nodal: ArrayView2<f64>) -> Array2<f64> {
        let mut along_y = Array2::zeros((nodal.nrows(), self.y.ncols()));
        multiply(nodal, self.y.view(), along_y.view_mut());
        let mut modal = Array2::zeros(self.modes());
        self.x.forward(along_y.view(), modal.view_mut());
        modal
    }

    /// Nodal values of modal coefficients.
    pub fn backward(&self, modal: ArrayView2<f64>, nodal: ArrayViewMut2<f64>) {
        let mut along_y = Array2::zeros((nodal.nrows(), self.y.ncols()));
        self.x.backward(modal, along_y.view_mut());
        multiply(along_y.view(), self.y.t(), nodal);
    }
}
