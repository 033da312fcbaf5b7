//! One level of the family, solved: capacitance matrix and wrench in units of the grid.

use std::time::Instant;

use rayon::prelude::*;
use tiltgap_meshes::{Arrangement, Body, Grid, GridOptions, Which};

use crate::cg::{self, conjugate_gradient, Linear};
use crate::field::{dots, Field};
use crate::operator::Operator;
use crate::separable::Separable;
use crate::wrench::Wrench;
use crate::Error;

/// Settings of one level.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LevelParams {
    /// The outer iteration.
    pub outer: cg::Params,
    /// Relative accuracy of the inner iteration that holds the plates.
    pub inner_tolerance: f64,
}

impl Default for LevelParams {
    fn default() -> Self {
        LevelParams { outer: cg::Params::default(), inner_tolerance: 1e-6 }
    }
}

/// Wall time of the stages of a level, in seconds.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Profile {
    /// Grid and sparse matrix.
    pub assembly: f64,
    /// Start field, modes and pivots of the preconditioner.
    pub preparation: f64,
    /// Conjugate gradient, residual and capacitance matrix.
    pub iteration: f64,
}

impl Profile {
    /// All stages together.
    pub fn total(&self) -> f64 {
        self.assembly + self.preparation + self.iteration
    }
}

impl std::fmt::Display for Profile {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let [a, p, i, all] = [self.assembly, self.preparation, self.iteration, self.total()].map(|s| 1e3 * s);
        write!(f, "{all:.0} ms: assembly {a:.0}, preparation {p:.0}, iteration {i:.0}")
    }
}

/// A solved level, in units of the grid (size 1, permittivity 1, volts).
#[derive(Clone, Debug)]
pub struct Level {
    /// The grid.
    pub grid: Grid,
    /// Fields that belong to 1 V on the lower plate (first) and on the upper plate (second), the other at 0 V.
    pub phi: Field<2>,
    /// Maxwell capacitance matrix of the two conductors (a plate with its guard ring is one).
    pub matrix: [[f64; 2]; 2],
    /// Charges on the plates without their guard ring: `[i][j]` is that on plate i with conductor j at 1 V.
    pub plate_charges: [[f64; 2]; 2],
    /// What the iteration did.
    pub info: cg::Info,
    /// True residual at the end, relative to the energy, measured through the diagonal of the operator.
    pub residual: f64,
    /// Where the time went.
    pub profile: Profile,
}

/// The operator on the free nodes.
struct Free<'a> {
    operator: &'a Operator,
    fixed: &'a [bool],
}

impl Linear<2> for Free<'_> {
    fn multiply(&self, x: &[[f64; 2]], y: &mut Field<2>) -> [f64; 2] {
        self.operator.multiply(x, self.fixed, y)
    }
}

/// sqrt(sum of r^2/diagonal) over sqrt(energy), the worst column.
fn scaled_norm(r: &Field<2>, diagonal: &[f64], scale: [f64; 2]) -> f64 {
    let weighted: Field<2> = r.par_iter().zip(diagonal).map(|(r, d)| [r[0] / d, r[1] / d]).collect();
    let squares = dots(r, &weighted);
    (0..2).map(|c| squares[c].sqrt() / scale[c]).fold(0.0, f64::max)
}

impl Level {
    /// Solves level `q` of an arrangement, starting from a coarser level where there is one.
    ///
    /// `progress` is called with the iteration and the present error estimate.
    ///
    /// # Errors
    /// A bad arrangement (also one that folds the grid), or no convergence.
    pub fn solve(
        arrangement: &Arrangement,
        options: &GridOptions,
        q: usize,
        coarse: Option<&Level>,
        params: &LevelParams,
        progress: &mut dyn FnMut(usize, f64),
    ) -> Result<Level, Error> {
        let begun = Instant::now();
        let grid = Grid::new(arrangement, q, options)?;
        let operator = Operator::assemble(&grid).ok_or_else(|| arrangement.folded(options.sideways))?;
        let assembly = begun.elapsed().as_secs_f64();
        let n = grid.nodes();
        let mut fixed = vec![false; n];
        let mut phi = match coarse {
            Some(level) => level.carry_to(&grid),
            None => between_the_plates(&grid),
        };
        for wall in grid.walls() {
            for node in grid.nodes_of(&wall) {
                fixed[node] = true;
                phi[node] = [0.0; 2];
            }
        }
        for (body, potential) in [(&grid.lower, [1.0, 0.0]), (&grid.upper, [0.0, 1.0])] {
            for node in body.boxes.iter().flat_map(|b| grid.nodes_of(b)) {
                fixed[node] = true;
                phi[node] = potential;
            }
        }
        let free = Free { operator: &operator, fixed: &fixed };
        let nothing = vec![false; n];
        let mut r = vec![[0.0; 2]; n];
        let scale = operator.multiply(&phi, &nothing, &mut r).map(f64::sqrt);
        let residual_of = |phi: &Field<2>, r: &mut Field<2>| {
            free.multiply(phi, r);
            r.par_iter_mut().for_each(|r| *r = [-r[0], -r[1]]);
        };
        residual_of(&phi, &mut r);
        let inner_tolerance = params.inner_tolerance * (FINE_LEVEL / q as f64).powi(2).min(1.0);
        let mut separable = Separable::new(&grid, &fixed, inner_tolerance);
        let prepared = begun.elapsed().as_secs_f64();
        let info =
            conjugate_gradient(&free, &mut separable, &mut phi, &mut r, scale, &params.outer, progress)?;
        let diagonal = operator.diagonal();
        let by_recurrence = scaled_norm(&r, &diagonal, scale);
        residual_of(&phi, &mut r);
        let residual = scaled_norm(&r, &diagonal, scale);
        if residual > DRIFT * by_recurrence.max(params.outer.tolerance) {
            let (iterations, tolerance) = (info.iterations, params.outer.tolerance);
            return Err(Error::NotConverged { iterations, reached: residual, tolerance });
        }
        let matrix = energy_matrix(&operator, &nothing, &phi, &mut r, grid.multiplicity());
        let plate_charges = plate_charges(&grid, &r, matrix);
        let profile = Profile {
            assembly,
            preparation: prepared - assembly,
            iteration: begun.elapsed().as_secs_f64() - prepared,
        };
        Ok(Level { grid, phi, matrix, plate_charges, info, residual, profile })
    }

    /// The fields of this level on the grid of a finer one.
    fn carry_to(&self, fine: &Grid) -> Field<2> {
        let stencils = [0, 1, 2].map(|d| fine.axes[d].carry_from(&self.grid.axes[d]));
        let [_, ny, nz] = self.grid.shape();
        let [fx, fy, fz] = fine.shape();
        let mut phi = vec![[0.0; 2]; fine.nodes()];
        // One axis after the other: x of whole planes, then y of rows, then z.
        phi.par_chunks_mut(fy * fz).zip(&stencils[0]).for_each(|(out, sx)| {
            let mut plane = vec![[0.0; 2]; ny * nz];
            for n in 0..sx.count {
                let from = &self.phi[(sx.first + n) * ny * nz..(sx.first + n + 1) * ny * nz];
                for (p, f) in plane.iter_mut().zip(from) {
                    p[0] += sx.weights[n] * f[0];
                    p[1] += sx.weights[n] * f[1];
                }
            }
            let mut row = vec![[0.0; 2]; nz];
            for (j, sy) in stencils[1].iter().enumerate() {
                row.fill([0.0; 2]);
                for n in 0..sy.count {
                    for (p, f) in row.iter_mut().zip(&plane[(sy.first + n) * nz..]) {
                        p[0] += sy.weights[n] * f[0];
                        p[1] += sy.weights[n] * f[1];
                    }
                }
                for (k, sz) in stencils[2].iter().enumerate() {
                    let mut value = [0.0; 2];
                    for n in 0..sz.count {
                        value[0] += sz.weights[n] * row[sz.first + n][0];
                        value[1] += sz.weights[n] * row[sz.first + n][1];
                    }
                    out[j * fz + k] = value;
                }
            }
        });
        debug_assert_eq!(stencils[0].len(), fx);
        phi
    }

    /// Force and torque on the upper plate, with its guard ring if it has one, for the given potentials of the lower and the
    /// upper conductor.
    pub fn wrench(&self, potential: [f64; 2]) -> Wrench {
        Wrench::new(&self.grid, &self.grid.upper.carry, &self.phi, potential)
    }

    /// Force and torque on the lower plate, with its guard ring if it has one, from a virtual displacement of its own.
    pub fn wrench_on_lower(&self, potential: [f64; 2]) -> Wrench {
        Wrench::new(&self.grid, &self.grid.lower.carry, &self.phi, potential)
    }

    /// Force and torque on a plate alone, past a guard ring that stands still.
    pub fn wrench_on_plate(&self, which: Which, potential: [f64; 2]) -> Wrench {
        let body = match which {
            Which::Lower => &self.grid.lower,
            Which::Upper => &self.grid.upper,
        };
        Wrench::new(&self.grid, body.plate_carry(), &self.phi, potential)
    }

    /// Potentials of the plates for a pair without total charge, 1 V apart.
    pub fn neutral(&self) -> [f64; 2] {
        let c = &self.matrix;
        let columns = [c[0][0] + c[1][0], c[0][1] + c[1][1]];
        let total = columns[0] + columns[1];
        if total < NO_OUTSIDE * c[0][0] {
            // No field leaves the pair: it is without charge at any potential.
            return [-0.5, 0.5];
        }
        let lower = -columns[1] / total;
        [lower, 1.0 + lower]
    }
}

/// Above this level the inner tolerance is tightened with the square of the level: what the plates are not held by
/// counts in proportion to the stiffness of the cells next to them (measured: at level 24 the outer iterations rise from
/// 19 to 47 without it).
const FINE_LEVEL: f64 = 8.0;

/// Below this part of a plate's own capacitance, what the pair shares with the outside is rounding.
const NO_OUTSIDE: f64 = 1e-11;

/// By how much the true residual may exceed the one by recurrence.
const DRIFT: f64 = 10.0;

/// A first guess: linear across the gap between the plates, zero elsewhere.
fn between_the_plates(grid: &Grid) -> Field<2> {
    let mut phi = vec![[0.0; 2]; grid.nodes()];
    let up = &grid.upper.hull;
    for i in up.i[0]..=up.i[1] {
        for j in up.j[0]..=up.j[1] {
            for k in grid.lower.hull.k[1]..=up.k[0] {
                let b = grid.upper.carry.vertical[k];
                phi[grid.index(i, j, k)] = [1.0 - b, b];
            }
        }
    }
    phi
}

/// Charges on the plates without their guard ring, from the charges A phi of the nodes; without a guard ring they are
/// those of the Maxwell matrix, whose error is of second order in the residual.
fn plate_charges(grid: &Grid, charges: &Field<2>, matrix: [[f64; 2]; 2]) -> [[f64; 2]; 2] {
    let of = |body: &Body, row: [f64; 2]| {
        if body.boxes.len() == 1 {
            return row;
        }
        let mut sum = [0.0; 2];
        for node in grid.nodes_of(body.plate()) {
            (sum[0], sum[1]) = (sum[0] + charges[node][0], sum[1] + charges[node][1]);
        }
        sum.map(|c| c * grid.multiplicity())
    };
    [of(&grid.lower, matrix[0]), of(&grid.upper, matrix[1])]
}

/// phi^T A phi for the two fields: the Maxwell matrix. Leaves A phi in `scratch`.
fn energy_matrix(
    operator: &Operator,
    nothing: &[bool],
    phi: &Field<2>,
    scratch: &mut Field<2>,
    multiplicity: f64,
) -> [[f64; 2]; 2] {
    let own = operator.multiply(phi, nothing, scratch);
    let crossed: Field<2> = scratch.par_iter().map(|v| [v[1], v[0]]).collect();
    let mutual = dots(phi, &crossed);
    let off = 0.5 * (mutual[0] + mutual[1]);
    [[own[0], off], [off, own[1]]].map(|row| row.map(|c| c * multiplicity))
}
