//! Preconditioned conjugate gradient for several right-hand sides in lockstep.
//!
//! Each column has its own step lengths; the matrix and the preconditioner are applied to all columns at once. The
//! preconditioner may vary a little from one application to the next, as one does that contains an inner iteration
//! \[GolubYe1999\]: the direction is then updated with z.(r_new - r_old), which costs nothing extra because the
//! difference is a multiple of A p.

use rayon::prelude::*;

use crate::field::{dots, Field, CHUNK};
use crate::Error;

/// A symmetric positive definite operator on the free nodes.
pub trait Linear<const K: usize> {
    /// y = A x; returns x.y, column by column.
    fn multiply(&self, x: &[[f64; K]], y: &mut Field<K>) -> [f64; K];
}

/// An approximate inverse of a [`Linear`] operator.
pub trait Preconditioner<const K: usize> {
    /// z = M r; returns the number of inner iterations it took.
    ///
    /// # Errors
    /// If the inner iteration fails.
    fn apply(&mut self, r: &[[f64; K]], z: &mut Field<K>) -> Result<usize, Error>;
}

/// Settings of the iteration.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Params {
    /// Stop when sqrt(r.Mr), an estimate of the error in the energy norm, is below this part of `scale`.
    pub tolerance: f64,
    /// Give up after this many iterations.
    pub most_iterations: usize,
}

impl Default for Params {
    fn default() -> Self {
        Params { tolerance: 1e-8, most_iterations: 3000 }
    }
}

/// What the iteration did.
#[derive(Clone, Debug, PartialEq)]
pub struct Info {
    /// Outer iterations.
    pub iterations: usize,
    /// Inner iterations, all together.
    pub inner_iterations: usize,
    /// Applications of the preconditioner.
    pub applications: usize,
    /// Estimate of the relative error in the energy norm, after each iteration, the worst column.
    pub history: Vec<f64>,
}

/// Improves `x` until A x = b on the free nodes, given the residual `r` = b - A x of the start; on return `r` is the
/// residual by recurrence. `scale` is the energy norm of the solution, column by column: what the error is relative
/// to.
///
/// `progress` is called with the iteration number and the present error estimate.
///
/// # Errors
/// [`Error::NotConverged`] with what was reached, or a failure of the preconditioner.
pub fn conjugate_gradient<const K: usize>(
    a: &impl Linear<K>,
    m: &mut impl Preconditioner<K>,
    x: &mut Field<K>,
    r: &mut Field<K>,
    scale: [f64; K],
    params: &Params,
    progress: &mut dyn FnMut(usize, f64),
) -> Result<Info, Error> {
    let n = x.len();
    let (mut z, mut w) = (vec![[0.0; K]; n], vec![[0.0; K]; n]);
    let mut info = Info { iterations: 0, inner_iterations: 0, applications: 0, history: Vec::new() };
    let relative = |rz: &[f64; K]| (0..K).map(|c| rz[c].max(0.0).sqrt() / scale[c]).fold(0.0, f64::max);
    info.inner_iterations += m.apply(r, &mut z)?;
    info.applications += 1;
    let mut rz = dots(r, &z);
    let mut p = z.clone();
    info.history.push(relative(&rz));
    loop {
        let reached = info.history[info.history.len() - 1];
        progress(info.iterations, reached);
        if reached <= params.tolerance {
            return Ok(info);
        }
        if info.iterations == params.most_iterations || !reached.is_finite() {
            let (iterations, tolerance) = (info.iterations, params.tolerance);
            return Err(Error::NotConverged { iterations, reached, tolerance });
        }
        let pw = a.multiply(&p, &mut w);
        // A column that is solved exactly stays where it is.
        let step: [f64; K] = std::array::from_fn(|c| if pw[c] > 0.0 { rz[c] / pw[c] } else { 0.0 });
        let chunks =
            (x.par_chunks_mut(CHUNK), r.par_chunks_mut(CHUNK), p.par_chunks(CHUNK), w.par_chunks(CHUNK));
        chunks.into_par_iter().for_each(|(x, r, p, w)| {
            for n in 0..x.len() {
                for c in 0..K {
                    x[n][c] += step[c] * p[n][c];
                    r[n][c] -= step[c] * w[n][c];
                }
            }
        });
        info.inner_iterations += m.apply(r, &mut z)?;
        info.applications += 1;
        let (new, zw) = (dots(r, &z), dots(&z, &w));
        let turn: [f64; K] =
            std::array::from_fn(|c| if rz[c] > 0.0 { -step[c] * zw[c] / rz[c] } else { 0.0 });
        p.par_chunks_mut(CHUNK).zip(z.par_chunks(CHUNK)).for_each(|(p, z)| {
            for n in 0..p.len() {
                for c in 0..K {
                    p[n][c] = z[n][c] + turn[c] * p[n][c];
                }
            }
        });
        rz = new;
        info.iterations += 1;
        info.history.push(relative(&rz));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The second-difference matrix of order n, with ends held.
    struct Chain;
    impl Linear<1> for Chain {
        fn multiply(&self, x: &[[f64; 1]], y: &mut Field<1>) -> [f64; 1] {
            let at = |n: isize| if n < 0 { 0.0 } else { x.get(n as usize).map_or(0.0, |v| v[0]) };
            for n in 0..x.len() as isize {
                y[n as usize] = [2.0 * at(n) - at(n - 1) - at(n + 1)];
            }
            dots(x, y)
        }
    }
    struct Nothing;
    impl Preconditioner<1> for Nothing {
        fn apply(&mut self, r: &[[f64; 1]], z: &mut Field<1>) -> Result<usize, Error> {
            z.copy_from_slice(r);
            Ok(0)
        }
    }

    fn run(most_iterations: usize) -> (Field<1>, Result<Info, Error>) {
        let (mut x, mut r) = (vec![[0.0]; 40], vec![[1.0]; 40]);
        let params = Params { tolerance: 1e-10, most_iterations };
        let info = conjugate_gradient(&Chain, &mut Nothing, &mut x, &mut r, [1.0], &params, &mut |_, _| {});
        (x, info)
    }

    #[test]
    fn solves_in_as_many_steps_as_there_are_distinct_eigenvalues_at_most() {
        let (x, info) = run(100);
        let info = info.unwrap();
        // The right side is symmetric: only 20 of the 40 eigenvectors take part.
        assert!(info.iterations <= 20, "{}", info.iterations);
        for (n, v) in x.iter().enumerate() {
            let exact = (n + 1) as f64 * (40 - n) as f64 / 2.0;
            assert!((v[0] - exact).abs() < 1e-9 * exact);
        }
        let mut y = vec![[0.0]; 40];
        Chain.multiply(&x, &mut y);
        assert!(y.iter().all(|v| (v[0] - 1.0).abs() < 1e-9));
    }

    #[test]
    fn not_converged_is_an_error_with_the_numbers() {
        match run(7).1 {
            Err(Error::NotConverged { iterations: 7, reached, tolerance }) => {
                assert!(tolerance == 1e-10 && reached > tolerance)
            }
            other => panic!("{other:?}"),
        }
    }
}
