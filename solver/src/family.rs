//! Climbing the level family until the error bar is small enough.
//!
//! Three consecutive levels make a limit ([`extrapolate`](crate::extrapolate)); if its uncertainty is too large the
//! next level is solved, started from the one before. The first level is chosen so that the narrow edge of a strongly
//! tilted gap, and the outside of a wide one, are resolved from the start: only then does the expansion hold.

use std::time::Instant;

use tiltgap_meshes::{Arrangement, Dimensions, Grid, GridOptions, Vector3};

use crate::assess::{Components, Estimate, LevelReport, Params, Progress};
use crate::extrapolate::{extrapolate, Limit};
use crate::level::{Level, LevelParams};
use crate::Error;

/// Levels of the family: each is 4/3 or 3/2 of the one before.
const LADDER: [u32; 9] = [2, 3, 4, 6, 8, 12, 16, 24, 32];
/// Cells that the coarsest level of a triple needs along the plate between the narrow edge and the place where the
/// gap has doubled. Set on tilted strips down to an edge gap of 5 % of the centre gap.
const CELLS_AT_NARROW_EDGE: f64 = 5.5;
/// Cells per q from the edge to the middle of a plate.
const HALF_PLATE_CELLS: f64 = 4.0;
/// The far boundary at which level 2 is fine enough outside, in units of the size, and the length over which the
/// outside stretches: a boundary farther away needs more cells in proportion to the logarithm.
const OUTSIDE_AT_LEVEL_2: [f64; 2] = [20.0, 0.2];
/// Coarsest level of a triple at which a stretched outside counts in full.
const OUTSIDE_SETTLES: f64 = 3.0;
/// Relative uncertainty of force and torque from levels 2-3-4 at least. Level 2 does not quite follow the expansion yet,
/// and different fits may agree by accident: limits of 2-3-4 scatter by 3e-5 to 7e-5 about those of finer levels.
const COARSE_FLOOR: f64 = 3e-5;
/// Relative uncertainty that is always there: far boundary, solver tolerance, rounding. Measured on strips at the
/// finest levels, where nothing else is left.
pub const FLOOR: f64 = 1e-6;
/// Part of the largest component of a vector's uncertainty that every component carries at least, and of the force's
/// uncertainty that a torque carries (times the size): they are made from the same field, and a small number that
/// happens to agree between levels is not a known one.
const SHARED: f64 = 0.25;
/// Lever, in units of the size, at which the force counts for the rounding of a torque that may be zero.
const LEVER: f64 = 0.05;
/// The same when a torque is held against the accuracy asked for: a torque about the centre that is smaller than the
/// force at a fifth of the size is judged by that. In the plane, where levels are cheap, at a twentieth.
const JUDGED_LEVER: f64 = 0.2;
const JUDGED_LEVER_IN_THE_PLANE: f64 = 0.05;
/// Below this accuracy levels 2 and 3 never take part in the limit that meets it, and the family starts at 4.
const HIGH_ACCURACY: f64 = 2e-5;
const FIRST_AT_HIGH_ACCURACY: f64 = 4.0;
/// First level of a cross-section, where finer ones cost next to nothing.
const FIRST_IN_THE_PLANE: f64 = 4.0;
/// Solver tolerance (relative error in the energy norm): this part of the accuracy asked for, within these bounds. At 1e-6
/// force and torque of a level differ by less than 1e-8 from those at 1e-10, measured on tilted plates with and without
/// roll and shift.
const TOLERANCE_PART: f64 = 0.1;
const TOLERANCE_RANGE: [f64; 2] = [1e-9, 1e-6];
/// By what the solver tolerance is lowered for a guarded plate.
const GUARDED_PART: f64 = 0.01;
/// By what the uncertainty falls at best when one more level is solved: an error of fourth order, and some luck.
const BEST_STEP: f64 = 0.15;
/// Memory set aside for a node of the finest level, in bytes: matrix, fields and preconditioner together. Measured peaks
/// of the whole process are 260 to 300 with half symmetry and 340 with roll; the rest is margin.
pub const BYTES_PER_NODE: u64 = 600;

/// Force and torque on one thing, in units of the grid.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pull<T> {
    /// Force.
    pub force: T,
    /// Torque about the centre of the upper plate's facing surface.
    pub centre: T,
    /// Torque about the hinge; zero where there is none.
    pub hinge: T,
}

/// What a guard ring adds, in units of the grid.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ring<C, T> {
    /// Charge on the ring at 1 V, in the sense of the plate's.
    pub charge: C,
    /// What acts on the ring, in the sense of the plate's.
    pub pull: Pull<T>,
    /// What acts on all that hangs on the beam.
    pub beam: Pull<T>,
}

/// The numbers of a bench in units of the grid: of one level, or their limits.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Numbers<C, T> {
    /// Charge on the plate at 1 V, positive if the upper conductor is.
    pub charge: C,
    /// C11, C12, C22.
    pub matrix: [C; 3],
    /// What acts on the plate, as felt above the gap.
    pub pull: Pull<T>,
    /// The guard ring.
    pub ring: Option<Ring<C, T>>,
}

/// Numbers of one level.
pub type Quantities = Numbers<f64, Vector3>;

/// The limit of the family.
pub type FamilyLimit = Numbers<Estimate, Components>;

impl Quantities {
    /// All numbers in a row, so that they can be extrapolated alike: single ones first, then pulls.
    fn row(&self) -> Vec<f64> {
        let mut row = vec![self.charge, self.matrix[0], self.matrix[1], self.matrix[2]];
        row.push(self.ring.map_or(0.0, |r| r.charge));
        let pulls = [Some(self.pull), self.ring.map(|r| r.pull), self.ring.map(|r| r.beam)];
        for pull in pulls.into_iter().flatten() {
            row.extend([pull.force, pull.centre, pull.hinge].as_flattened());
        }
        row
    }
}

/// Where the vertical force on the plate stands in a row of [`Quantities`].
const FORCE_Z: usize = PULLS + 2;
/// Single numbers in a row, and numbers in a pull.
const PULLS: usize = 5;
const IN_PULL: usize = 9;

/// A family climbed far enough.
pub struct Family {
    /// Its limit.
    pub limit: FamilyLimit,
    /// What was solved on the way.
    pub levels: Vec<LevelReport>,
    /// Order of the vertical force over the last three levels.
    pub observed_order: Option<f64>,
}

/// Index in the ladder of the first level that resolves an arrangement and serves the accuracy.
fn first_level(arrangement: &Arrangement, options: &GridOptions, accuracy: f64) -> usize {
    let narrow = arrangement.narrowness();
    // Along the plate the nodes stand at the cube of a uniform parameter from the edge.
    let at_edge = CELLS_AT_NARROW_EDGE / (HALF_PLATE_CELLS * narrow.cbrt());
    let [far, scale] = OUTSIDE_AT_LEVEL_2;
    let outside = 2.0 * (options.far / scale).ln() / (far / scale).ln();
    let plane = if arrangement.dimensions == Dimensions::Two { FIRST_IN_THE_PLANE } else { 0.0 };
    let high = if accuracy < HIGH_ACCURACY { FIRST_AT_HIGH_ACCURACY } else { 0.0 };
    let needed = at_edge.max(outside).max(plane).max(high);
    let last = LADDER.len() - 3;
    LADDER.iter().position(|&q| q as f64 >= needed * (1.0 - f64::EPSILON)).unwrap_or(last).min(last)
}

/// A vector with the uncertainty of its components, each at least `least`, and the `floor` added.
fn vector(limits: &[Limit], floor: f64, least: f64) -> Components {
    let least = limits.iter().map(|l| SHARED * l.uncertainty).fold(least, f64::max);
    [0, 1, 2].map(|d| {
        let Limit { value, uncertainty, .. } = limits[d];
        // A component that vanishes by symmetry is exactly zero on every level.
        let exact = value == 0.0 && uncertainty == 0.0;
        let bound = if exact { 0.0 } else { uncertainty.max(least) + floor };
        Estimate { value, uncertainty: bound }
    })
}

fn largest(v: &Components) -> f64 {
    v.iter().map(|e| e.value.abs()).fold(0.0, f64::max)
}

/// Limits of a pull, from its part of the row. What the plate's pull is uncertain by is shared with the others, which are
/// made from the same field.
fn pull(limits: &[Limit], coarsest: f64) -> Pull<Components> {
    let part = |n: usize| &limits[3 * n..3 * n + 3];
    let of = |n: usize| part(n).iter().map(|l| l.value.abs()).fold(0.0, f64::max);
    let force = of(0);
    let coarse = if coarsest <= 2.0 { COARSE_FLOOR } else { 0.0 };
    let shared = part(0).iter().map(|l| SHARED * l.uncertainty).fold(0.0, f64::max);
    let torque = |n: usize| {
        let scale = of(n).max(LEVER * force);
        vector(part(n), FLOOR * scale, shared.max(coarse * scale))
    };
    Pull { force: vector(part(0), FLOOR * force, coarse * force), centre: torque(1), hinge: torque(2) }
}

impl FamilyLimit {
    fn new(limits: &[Limit], coarsest: f64) -> Self {
        let plain =
            |l: &Limit| Estimate { value: l.value, uncertainty: l.uncertainty.max(FLOOR * l.value.abs()) };
        let [charge, c11, c12, c22, of_ring] = [0, 1, 2, 3, 4].map(|n| plain(&limits[n]));
        let pulls: Vec<_> = limits[PULLS..].chunks(IN_PULL).map(|part| pull(part, coarsest)).collect();
        let ring = match pulls[..] {
            [_, pull, beam] => Some(Ring { charge: of_ring, pull, beam }),
            _ => None,
        };
        FamilyLimit { charge, matrix: [c11, c12, c22], pull: pulls[0], ring }
    }

    /// Relative uncertainties that are held against the accuracy asked for: of the force and of the torque, about the
    /// hinge where there is one, else about the centre; a torque counts at least as the force at `lever`.
    fn reached(&self, lever: f64) -> [f64; 2] {
        let Pull { force, centre, hinge } = self.pull;
        let scale = largest(&force);
        let torque = if largest(&hinge) > 0.0 { hinge } else { centre };
        let relative = |e: Estimate, least: f64| e.uncertainty / e.value.abs().max(least);
        [relative(force[2], LEVER * scale), relative(torque[1], lever * scale)]
    }
}

impl Family {
    /// Climbs until force and torque are known to `params.accuracy`.
    ///
    /// # Errors
    /// What a level finds wrong, or [`Error::AccuracyNotReached`].
    pub fn climb(
        arrangement: &Arrangement,
        options: &GridOptions,
        params: &Params,
        quantities: &dyn Fn(&Level) -> Quantities,
        progress: &mut dyn FnMut(Progress),
    ) -> Result<Family, Error> {
        arrangement.check(options.sideways)?;
        let mut level_params = LevelParams::default();
        level_params.outer.tolerance =
            (TOLERANCE_PART * params.accuracy).clamp(TOLERANCE_RANGE[0], TOLERANCE_RANGE[1]);
        if arrangement.guard.is_some() {
            // The charge of a guarded plate is of first order in the residual, that of a whole conductor of second.
            level_params.outer.tolerance *= GUARDED_PART;
        }
        let in_the_plane = arrangement.dimensions == Dimensions::Two;
        // A gap as wide as the plates stretches the outside until its levels follow the expansion late: squares at gaps
        // of 0.5 to 2 sides were off by up to 5 plain uncertainties at levels 3-4-6.
        let late = if in_the_plane { 0.0 } else { options.far / OUTSIDE_AT_LEVEL_2[0] - 1.0 };
        let lever = if in_the_plane { JUDGED_LEVER_IN_THE_PLANE } else { JUDGED_LEVER };
        let mut levels: Vec<LevelReport> = Vec::new();
        let mut rows: Vec<(f64, Vec<f64>)> = Vec::new();
        let mut before: Option<Vec<Limit>> = None;
        let mut coarse: Option<Level> = None;
        let mut best: Option<FamilyLimit> = None;
        let mut affordable: Vec<(u32, usize)> = Vec::new();
        for &q in &LADDER[first_level(arrangement, options, params.accuracy)..] {
            let nodes = Grid::new(arrangement, q as usize, options)?.nodes();
            if nodes as u64 * BYTES_PER_NODE <= params.memory_bytes {
                affordable.push((q, nodes));
            }
        }
        for (n, &(q, nodes)) in affordable.iter().enumerate() {
            if let Some(limit) = &best {
                // Even if every level that is left did its best, would it do?
                let [force, torque] = limit.reached(lever);
                let hoped = force.max(torque) * BEST_STEP.powi((affordable.len() - n) as i32);
                if hoped.max(FLOOR) > params.accuracy {
                    break;
                }
            }
            progress(Progress::Level { q, nodes });
            let begun = Instant::now();
            let mut iteration = |iteration, error| progress(Progress::Iteration { q, iteration, error });
            let level = Level::solve(
                arrangement,
                options,
                q as usize,
                coarse.as_ref(),
                &level_params,
                &mut iteration,
            )?;
            let measured = quantities(&level);
            rows.push((q as f64, measured.row()));
            let info = &level.info;
            levels.push(LevelReport {
                q,
                nodes,
                outer_iterations: info.iterations,
                inner_iterations: info.inner_iterations as f64 / info.applications as f64,
                residual: level.residual,
                seconds: begun.elapsed().as_secs_f64(),
            });
            coarse = Some(level);
            let [.., a, b, c] = rows.as_slice() else { continue };
            let limits: Vec<Limit> = (0..a.1.len())
                .map(|n| {
                    let previous = before.as_ref().map(|limits| limits[n].value);
                    let limit = extrapolate([a.0, b.0, c.0], [a.1[n], b.1[n], c.1[n]], previous);
                    Limit {
                        uncertainty: limit.uncertainty * (1.0 + late * (OUTSIDE_SETTLES / a.0).powi(2)),
                        ..limit
                    }
                })
                .collect();
            let limit = FamilyLimit::new(&limits, a.0);
            if limit.reached(lever).into_iter().all(|r| r <= params.accuracy) {
                return Ok(Family { limit, levels, observed_order: limits[FORCE_Z].order });
            }
            best = Some(limit);
            before = Some(limits);
        }
        let last = levels.last();
        let [force, torque] = best.map_or([f64::INFINITY; 2], |limit| limit.reached(lever));
        let (level, nodes) = last.map_or((0, 0), |l| (l.q, l.nodes));
        Err(Error::AccuracyNotReached {
            asked: params.accuracy,
            level,
            nodes,
            memory_bytes: nodes as u64 * BYTES_PER_NODE,
            force,
            torque,
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use tiltgap_meshes::{Plate, Pose};

    #[test]
    fn narrow_edges_and_wide_gaps_start_higher() {
        let plate = Plate { length_m: 1.0, width_m: 1.0, thickness_m: 0.0 };
        let start = |gap_m: f64, near: f64| {
            let tilt_rad = ((1.0 - near) * gap_m / 0.5).asin();
            let pose = Pose { gap_m, tilt_rad, roll_rad: 0.0, shift_m: [0.0; 2] };
            let arrangement = Arrangement::open(plate, plate, pose, Dimensions::Three);
            LADDER[first_level(&arrangement, &GridOptions::suited(&arrangement), 1e-4)]
        };
        assert_eq!([start(0.05, 1.0), start(0.05, 0.5)], [2, 2]);
        assert_eq!([start(0.05, 0.2), start(0.05, 0.05), start(0.05, 0.01)], [3, 4, 8]);
        assert_eq!([start(0.2, 1.0), start(0.5, 1.0)], [2, 3]);
    }
}
