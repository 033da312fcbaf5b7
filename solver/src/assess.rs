//! The main job: charge, force and torque of a bench with an error bar, beside the ideal formula.
//!
//! A [`Question`] goes in, an [`Assessment`] comes out. The level family is climbed until the error bar meets the
//! accuracy asked for.

use std::time::Instant;

use tiltgap_meshes::{Arrangement, Dimensions, GridOptions, Vector3, Which};

use crate::corner::{cross, minus};
use crate::family::{Family, Pull, Quantities, Ring};
use crate::wedge::wedge_factors;
use crate::{Error, Level, Wrench};

/// Permittivity of vacuum in F/m, CODATA 2022 \[CODATA2022\].
pub const EPS0: f64 = 8.854_187_818_8e-12;

/// How the plates are wired.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Connection {
    /// Lower plate and surroundings at 0 V, upper plate at V.
    Grounded,
    /// The supply floats: V between the plates, total charge zero.
    Floating,
}

/// Where the beam turns: at (-arm, height) from the centre of the upper plate's facing surface when parallel.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Hinge {
    /// Distance from the hinge to the plate's centre along x, in metres; positive.
    pub arm_m: f64,
    /// Height of the hinge above the plate's centre, in metres.
    pub height_m: f64,
}

/// All that has to be known for an assessment.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Question {
    /// Plates, pose, surroundings.
    pub arrangement: Arrangement,
    /// The hinge, if there is one.
    pub hinge: Option<Hinge>,
    /// The wiring.
    pub connection: Connection,
    /// Voltage between the plates, in volts.
    pub voltage_v: f64,
    /// Relative permittivity of the medium.
    pub relative_permittivity: f64,
}

/// Settings of the numerical side.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Params {
    /// Largest relative standard uncertainty accepted on force and torque factor. Default 1e-4.
    pub accuracy: f64,
    /// Memory that a level may take, in bytes. Default 8 GiB.
    pub memory_bytes: u64,
}

impl Default for Params {
    fn default() -> Self {
        Params { accuracy: 1e-4, memory_bytes: 8 << 30 }
    }
}

/// What is reported while the work goes on.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Progress {
    /// A level is about to be solved.
    Level {
        /// The level q.
        q: u32,
        /// Its nodes.
        nodes: usize,
    },
    /// One iteration of the conjugate gradient is done.
    Iteration {
        /// The level q.
        q: u32,
        /// Iterations so far.
        iteration: usize,
        /// Estimated relative error in the energy norm.
        error: f64,
    },
}

/// A value with its numerical standard uncertainty, in the same unit.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Estimate {
    /// The value.
    pub value: f64,
    /// Its standard uncertainty (numerical part).
    pub uncertainty: f64,
}

/// Components along x, y and z.
pub type Components = [Estimate; 3];

/// The ideal formula: parallel plates without fringe.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ideal {
    /// eps A/d, in F (F/m in two dimensions); A is the overlap at zero tilt, without a guard ring; with a film the gap is
    /// d = (gap - t) + t/permittivity ratio.
    pub capacitance_f: f64,
    /// eps A V^2/(2 d^2), in N (N/m).
    pub force_n: f64,
    /// Force times arm, in N m (N m/m); none without a hinge.
    pub torque_nm: Option<f64>,
}

/// A correction factor: value = wedge x fringe.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Factor {
    /// Full value over ideal value.
    pub value: f64,
    /// Standard uncertainty of the value (numerical).
    pub uncertainty: f64,
    /// What the tilt alone does, from the lamella integral.
    pub wedge: f64,
    /// What the fringe adds: value/wedge.
    pub fringe: f64,
}

/// The correction factors of the ideal formula; none where the ideal value does not exist (plates that do not
/// overlap, no hinge).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Factors {
    /// C/C0.
    pub capacitance: Option<Factor>,
    /// -F_z/F0.
    pub force: Option<Factor>,
    /// T_hinge,y/T0.
    pub torque: Option<Factor>,
}

/// One level of the family.
#[derive(Clone, Debug, PartialEq)]
pub struct LevelReport {
    /// The level q.
    pub q: u32,
    /// Nodes of the grid.
    pub nodes: usize,
    /// Iterations of the outer conjugate gradient.
    pub outer_iterations: usize,
    /// Mean number of inner iterations for one outer one.
    pub inner_iterations: f64,
    /// True relative residual at the end.
    pub residual: f64,
    /// Wall time, in seconds.
    pub seconds: f64,
}

/// Force and torque on one thing, in SI units (per metre of width in two dimensions).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ForceAndTorque {
    /// Force, in N.
    pub force_n: Components,
    /// Torque about the hinge, in N m; none without a hinge.
    pub torque_hinge_nm: Option<Components>,
    /// Torque about the centre of the upper plate's facing surface, in N m.
    pub torque_centre_nm: Components,
}

/// What a guard ring takes upon itself, and what the beam feels in all.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GuardReport {
    /// Charge on the ring over the voltage, in F, in the sense of the plate's capacitance.
    pub capacitance_f: Estimate,
    /// What acts on the ring, in the sense of what acts on the plate.
    pub ring: ForceAndTorque,
    /// What acts on all that hangs on the beam: the upper plate, with the ring if it is around that.
    pub beam: ForceAndTorque,
}

/// The answer, in SI units; in two dimensions per metre of width.
///
/// With a guard ring around the upper plate, charge, force and torque are those of that plate alone. With one around the
/// lower plate the charge is that of the lower plate alone, with its sign turned, and force and torque are what the upper
/// plate would feel from it alone: those on the lower plate, turned. [`GuardReport`] has the rest.
#[derive(Clone, Debug, PartialEq)]
pub struct Assessment {
    /// Maxwell capacitance matrix, in F: `[i][j]` is the charge on i (0 lower, 1 upper) with j at 1 V.
    pub capacitance_matrix_f: [[Estimate; 2]; 2],
    /// Charge on the upper plate over the voltage, in F.
    pub capacitance_f: Estimate,
    /// Charge on the upper plate, in C.
    pub charge_upper_c: Estimate,
    /// Field energy, in J.
    pub energy_j: Estimate,
    /// Force on the upper plate, in N.
    pub force_n: Components,
    /// Torque on the upper plate about the hinge, in N m; none without a hinge.
    pub torque_hinge_nm: Option<Components>,
    /// Torque on the upper plate about the centre of its facing surface, in N m.
    pub torque_centre_nm: Components,
    /// What a guard ring takes upon itself; all of the above is then of the plate without it.
    pub guard: Option<GuardReport>,
    /// The ideal formula.
    pub ideal: Ideal,
    /// The correction factors.
    pub factors: Factors,
    /// The levels that were solved.
    pub levels: Vec<LevelReport>,
    /// Order of convergence observed for the force over the three finest levels.
    pub observed_order: Option<f64>,
    /// Wall time of the whole assessment, in seconds.
    pub seconds: f64,
}

/// Position of the hinge relative to the centre of the upper plate's facing surface, in metres. Beam and plate turn
/// about the hinge together; a roll is a misalignment of the plate on its beam and does not move the hinge.
pub fn hinge_offset_m(arrangement: &Arrangement, hinge: &Hinge) -> Vector3 {
    let r = arrangement.pose.tilt_rotation();
    [0, 1, 2].map(|k| tiltgap_meshes::dot(r[k], [-hinge.arm_m, 0.0, hinge.height_m]))
}

/// The numbers of a level for the given potentials; `offset` leads from the centre of the upper plate to the hinge.
fn measured(
    arrangement: &Arrangement,
    level: &Level,
    potential: [f64; 2],
    offset: Option<Vector3>,
) -> Quantities {
    let about_hinge = |w: Wrench| Pull {
        force: w.force,
        centre: w.torque,
        hinge: offset.map_or([0.0; 3], |o| minus(w.torque, cross(o, w.force))),
    };
    let [[c11, c12], [c21, c22]] = level.matrix;
    let matrix = [c11, c12, c22];
    let beam = about_hinge(level.wrench(potential));
    let of = |row: [f64; 2]| row[0] * potential[0] + row[1] * potential[1];
    let Some(guard) = arrangement.guard else {
        return Quantities { charge: of([c21, c22]), matrix, pull: beam, ring: None };
    };
    // What acts on the lower side, turned: as the upper plate would feel it about its own centre.
    let centre = arrangement.pose.centre_m().map(|c| c / arrangement.size_m());
    let turned =
        |w: Wrench| Wrench { force: w.force.map(|f| -f), torque: minus(cross(centre, w.force), w.torque) };
    let alone = level.wrench_on_plate(guard.around, potential);
    let (charge, whole, plate, both) = match guard.around {
        Which::Upper => (of(level.plate_charges[1]), of([c21, c22]), alone, level.wrench(potential)),
        Which::Lower => (
            -of(level.plate_charges[0]),
            -of([c11, c12]),
            turned(alone),
            turned(level.wrench_on_lower(potential)),
        ),
    };
    let ring = Wrench { force: minus(both.force, plate.force), torque: minus(both.torque, plate.torque) };
    let ring = Ring { charge: whole - charge, pull: about_hinge(ring), beam };
    Quantities { charge, matrix, pull: about_hinge(plate), ring: Some(ring) }
}

/// What has to be multiplied with the numbers of the grid to give SI units (per metre of width in two dimensions).
struct Units {
    capacitance_f: f64,
    force_n: f64,
    torque_nm: f64,
}

impl Question {
    /// Checks everything but the arrangement, which the grid checks.
    fn check(&self) -> Result<(), Error> {
        let wrong = |text: String| Err(Error::Question(text));
        if !self.voltage_v.is_finite() || self.voltage_v == 0.0 || self.voltage_v.abs() > VOLTAGE_LIMIT_V {
            return wrong(format!(
                "the voltage is {:e} V; give one other than 0, at most 10 MV",
                self.voltage_v
            ));
        }
        if !(1.0..=PERMITTIVITY_LIMIT).contains(&self.relative_permittivity) {
            let value = self.relative_permittivity;
            return wrong(format!(
                "the relative permittivity is {value}; give one from 1 to 1e6, for example 1.00054"
            ));
        }
        if let Some(Hinge { arm_m, height_m }) = self.hinge {
            if !arm_m.is_finite() || arm_m <= 0.0 || !height_m.is_finite() {
                return wrong(format!(
                    "the hinge has arm {arm_m:e} m and height {height_m:e} m; give a positive arm"
                ));
            }
        }
        let arrangement = &self.arrangement;
        let in_the_plane = arrangement.dimensions == Dimensions::Two;
        if in_the_plane && self.connection == Connection::Grounded && arrangement.potential_is_open() {
            return wrong(
                "per metre of width in open space the grounded connection is not defined (the potential of a charged \
                 line has no zero at infinity); choose the floating connection"
                    .into(),
            );
        }
        Ok(())
    }

    fn units(&self) -> Units {
        let size = self.arrangement.size_m();
        // A cross-section is solved as a slab one size wide.
        let width = if self.arrangement.dimensions == Dimensions::Two { size } else { 1.0 };
        let permittivity = EPS0 * self.relative_permittivity / width;
        let energy = permittivity * self.voltage_v.powi(2);
        Units { capacitance_f: permittivity * size, force_n: energy, torque_nm: energy * size }
    }

    /// The ideal formula for this question.
    pub fn ideal(&self) -> Ideal {
        let area = self.arrangement.overlap().area_m2();
        let gap = self.arrangement.effective_gap_m();
        let capacitance_f = EPS0 * self.relative_permittivity * area / gap;
        let force_n = capacitance_f * self.voltage_v.powi(2) / (2.0 * gap);
        Ideal { capacitance_f, force_n, torque_nm: self.hinge.map(|h| force_n * h.arm_m) }
    }
}

/// Largest voltage accepted, in volts: far above what any gap in air holds.
const VOLTAGE_LIMIT_V: f64 = 1e7;
/// Largest relative permittivity accepted.
const PERMITTIVITY_LIMIT: f64 = 1e6;

/// Solves the bench, climbing the level family until the error bar meets `params.accuracy`.
///
/// `progress` is called from the calling thread.
///
/// # Errors
/// Bad input ([`Error::Arrangement`], [`Error::Question`]), no convergence, or an accuracy that is out of reach.
pub fn assess(
    question: &Question,
    params: &Params,
    progress: &mut dyn FnMut(Progress),
) -> Result<Assessment, Error> {
    let begun = Instant::now();
    question.check()?;
    let arrangement = &question.arrangement;
    let options = GridOptions::suited(arrangement);
    let size = arrangement.size_m();
    let offset = question.hinge.map(|h| hinge_offset_m(arrangement, &h).map(|c| c / size));
    let quantities = |level: &Level| {
        let potential = match question.connection {
            Connection::Grounded => [0.0, 1.0],
            Connection::Floating => level.neutral(),
        };
        measured(arrangement, level, potential, offset)
    };
    let family = Family::climb(arrangement, &options, params, &quantities, progress)?;
    let units = question.units();
    let scaled =
        |e: Estimate, by: f64| Estimate { value: e.value * by, uncertainty: e.uncertainty * by.abs() };
    let vector = |v: Components, by: f64| v.map(|e| scaled(e, by));
    let limit = &family.limit;
    let [c11, c12, c22] = limit.matrix.map(|e| scaled(e, units.capacitance_f));
    let capacitance_f = scaled(limit.charge, units.capacitance_f);
    let si = |pull: &Pull<Components>| ForceAndTorque {
        force_n: vector(pull.force, units.force_n),
        torque_hinge_nm: question.hinge.map(|_| vector(pull.hinge, units.torque_nm)),
        torque_centre_nm: vector(pull.centre, units.torque_nm),
    };
    let ForceAndTorque { force_n, torque_hinge_nm, torque_centre_nm } = si(&limit.pull);
    let guard = limit.ring.map(|ring| GuardReport {
        capacitance_f: scaled(ring.charge, units.capacitance_f),
        ring: si(&ring.pull),
        beam: si(&ring.beam),
    });
    let ideal = question.ideal();
    let wedge = wedge_factors(arrangement);
    let factor = |e: Estimate, ideal: f64, wedge: f64| {
        let value = e.value / ideal;
        Factor { value, uncertainty: e.uncertainty / ideal, wedge, fringe: value / wedge }
    };
    let down = scaled(force_n[2], -1.0);
    let factors = Factors {
        capacitance: wedge.map(|w| factor(capacitance_f, ideal.capacitance_f, w.capacitance)),
        force: wedge.map(|w| factor(down, ideal.force_n, w.force)),
        torque: match (wedge, question.hinge, torque_hinge_nm, ideal.torque_nm) {
            (Some(w), Some(h), Some(t), Some(t0)) => Some(factor(t[1], t0, w.torque(h.arm_m))),
            _ => None,
        },
    };
    Ok(Assessment {
        capacitance_matrix_f: [[c11, c12], [c12, c22]],
        capacitance_f,
        charge_upper_c: scaled(capacitance_f, question.voltage_v),
        energy_j: scaled(capacitance_f, 0.5 * question.voltage_v.powi(2)),
        force_n,
        torque_hinge_nm,
        torque_centre_nm,
        guard,
        ideal,
        factors,
        levels: family.levels,
        observed_order: family.observed_order,
        seconds: begun.elapsed().as_secs_f64(),
    })
}
