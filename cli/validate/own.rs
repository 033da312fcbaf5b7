//! Self checks on a bench: what has to hold whatever the bench is, by a second route each.

use tiltgap_meshes::{Arrangement, Clearances, Dimensions, GridOptions, Plate, Surroundings};
use tiltgap_solver::{
    assess, extrapolate, Assessment, Connection, Error, Estimate, Level, LevelParams, Operator, Params,
    Question,
};

use super::finding::Finding;

/// Identities of one and the same discrete problem, up to what the iteration leaves: charges are of first order in it.
const IDENTICAL: f64 = 1e-6;
const IDENTICAL_BECAUSE: &str = "the same discrete problem, up to what the iteration leaves";
/// Changes of units only.
const SCALED: f64 = 1e-9;
const SCALED_BECAUSE: &str = "a change of units only: rounding";
/// Standard uncertainties within which two routes to one number have to agree.
const AGREE: f64 = 3.0;
/// Step of a difference quotient, in parts of the narrowest gap, and of its five-point error relative to that.
const STEP: f64 = 0.04;
/// What a five-point quotient of that step leaves at most: 4 STEP^4 of a field that goes like 1/gap^2, and the outside,
/// which a moved bench takes along rigidly.
const QUOTIENT: f64 = 1e-4;
/// Levels of which forces on both plates are extrapolated.
const LEVELS: [usize; 3] = [2, 3, 4];
/// What is left of a net force at the limit of these levels, in parts of the pull.
const NET: f64 = 5e-4;
/// Factors of the scaling checks.
const LENGTHS: f64 = 10.0;
const VOLTAGE: f64 = 2.0;

/// The bench with all lengths multiplied.
fn enlarged(q: &Question, by: f64) -> Question {
    let mut q = *q;
    let a = &mut q.arrangement;
    for plate in [&mut a.lower, &mut a.upper] {
        plate.length_m *= by;
        plate.width_m *= by;
        plate.thickness_m *= by;
    }
    a.pose.gap_m *= by;
    a.pose.shift_m = a.pose.shift_m.map(|s| by * s);
    if let Some(guard) = &mut a.guard {
        (guard.slot_m, guard.rim_m) = (by * guard.slot_m, by * guard.rim_m);
    }
    if let Some(film) = &mut a.film {
        film.thickness_m *= by;
    }
    let longer = |c: Option<f64>| c.map(|c| by * c);
    a.surroundings = match a.surroundings {
        Surroundings::GroundedFloor { below_m } => Surroundings::GroundedFloor { below_m: by * below_m },
        Surroundings::GroundedBox(c) => Surroundings::GroundedBox(Clearances {
            hinge_side_m: longer(c.hinge_side_m),
            free_side_m: longer(c.free_side_m),
            left_m: longer(c.left_m),
            right_m: longer(c.right_m),
            below_m: longer(c.below_m),
            above_m: longer(c.above_m),
        }),
        other => other,
    };
    if let Some(hinge) = &mut q.hinge {
        (hinge.arm_m, hinge.height_m) = (by * hinge.arm_m, by * hinge.height_m);
    }
    q
}

/// The walls, exchanged.
fn rearranged(s: Surroundings, change: impl Fn(Clearances) -> Clearances) -> Surroundings {
    match s {
        Surroundings::GroundedBox(c) => Surroundings::GroundedBox(change(c)),
        other => other,
    }
}

/// The bench in a mirror that exchanges +x and -x (without hinge, which would stand on the other side), or +y and -y.
fn mirrored(q: &Question, axis: usize) -> Question {
    let mut q = *q;
    q.hinge = None;
    let a = &mut q.arrangement;
    a.pose.shift_m[axis] = -a.pose.shift_m[axis];
    if axis == 0 {
        a.pose.tilt_rad = -a.pose.tilt_rad;
        a.surroundings = rearranged(a.surroundings, |c| Clearances {
            hinge_side_m: c.free_side_m,
            free_side_m: c.hinge_side_m,
            ..c
        });
    } else {
        a.pose.roll_rad = -a.pose.roll_rad;
        a.surroundings =
            rearranged(a.surroundings, |c| Clearances { left_m: c.right_m, right_m: c.left_m, ..c });
    }
    q
}

/// The bench without roll, with x and y exchanged: its tilt becomes a roll.
fn exchanged(q: &Question) -> Question {
    let mut q = *q;
    q.hinge = None;
    let a = &mut q.arrangement;
    let swap = |p: Plate| Plate { length_m: p.width_m, width_m: p.length_m, ..p };
    (a.lower, a.upper) = (swap(a.lower), swap(a.upper));
    a.pose.shift_m = [a.pose.shift_m[1], a.pose.shift_m[0]];
    (a.pose.roll_rad, a.pose.tilt_rad) = (a.pose.tilt_rad, 0.0);
    a.surroundings = rearranged(a.surroundings, |c| Clearances {
        hinge_side_m: c.left_m,
        free_side_m: c.right_m,
        left_m: c.hinge_side_m,
        right_m: c.free_side_m,
        ..c
    });
    q
}

/// The largest difference of two rows of numbers, over a scale.
fn apart(a: &[f64], b: &[f64], scale: f64) -> f64 {
    a.iter().zip(b).map(|(a, b)| (a - b).abs() / scale).fold(0.0, |w, o| if o <= w { w } else { o })
}

fn values(v: [Estimate; 3]) -> [f64; 3] {
    v.map(|e| e.value)
}

/// A bench under test.
pub struct Own<'a> {
    /// The bench.
    pub question: Question,
    /// Settings of the solver.
    pub params: &'a Params,
}

impl Own<'_> {
    fn assess(&self, question: &Question) -> Result<Assessment, Error> {
        assess(question, self.params, &mut |_| {})
    }

    fn space(&self) -> bool {
        self.question.arrangement.dimensions == Dimensions::Three
    }

    /// All checks.
    ///
    /// # Errors
    /// What the solver says.
    pub fn checks(&self) -> Result<Vec<Finding>, Error> {
        let mut q = self.question;
        let base = self.assess(&q)?;
        let mut all = self.levels()?;
        all.extend(self.derivatives(&base)?);
        all.extend(self.scaling(&base)?);
        q.hinge = None;
        let pull = values(base.force_n).iter().fold(0.0, |a: f64, f| a.max(f.abs()));
        let turn = pull * q.arrangement.size_m();
        let axes: &[usize] = if self.space() { &[0, 1] } else { &[0] };
        for &axis in axes {
            let image = self.assess(&mirrored(&q, axis))?;
            let (mut force, mut torque) = (values(image.force_n), values(image.torque_centre_nm).map(|t| -t));
            (force[axis], torque[axis]) = (-force[axis], -torque[axis]);
            let off = apart(&force, &values(base.force_n), pull).max(apart(
                &torque,
                &values(base.torque_centre_nm),
                turn,
            ));
            let name = ["+x and -x", "+y and -y"][axis];
            let what = format!("mirror, {name} exchanged: force and torque");
            all.push(Finding::new(what, off, IDENTICAL, IDENTICAL_BECAUSE));
        }
        if self.space() {
            let mut plain = q;
            plain.arrangement.pose.roll_rad = 0.0;
            let [a, b] = [self.assess(&plain)?, self.assess(&exchanged(&plain))?];
            let [f, t] = [values(b.force_n), values(b.torque_centre_nm)];
            let back = ([f[1], f[0], f[2]], [-t[1], -t[0], -t[2]]);
            let off = apart(&back.0, &values(a.force_n), pull).max(apart(
                &back.1,
                &values(a.torque_centre_nm),
                turn,
            ));
            let both = a.force_n[2].uncertainty.hypot(b.force_n[2].uncertainty) / pull;
            let what = "symmetry, x and y exchanged: a tilt is a roll";
            let because = "three standard uncertainties: the other grid has no half";
            all.push(Finding::new(what, off, IDENTICAL.max(AGREE * both), because));
        }
        Ok(all)
    }

    /// Reciprocity of the charges, the energy against them, and action and reaction, on levels.
    fn levels(&self) -> Result<Vec<Finding>, Error> {
        let arrangement = &self.question.arrangement;
        let options = GridOptions::suited(arrangement);
        let mut all = Vec::new();
        let mut net = [[0.0; 3]; 3];
        let mut pull: f64 = 0.0;
        let mut coarse: Option<Level> = None;
        for (n, q) in LEVELS.into_iter().enumerate() {
            let params = LevelParams::default();
            let level = Level::solve(arrangement, &options, q, coarse.as_ref(), &params, &mut |_, _| {})?;
            if n == 0 {
                all.extend(charges(arrangement, &level)?);
            }
            let potential = self.question.connection.potentials(&level);
            let (up, down) = (level.wrench(potential).force, level.wrench_on_lower(potential).force);
            pull = up.iter().fold(0.0, |a: f64, f| a.max(f.abs()));
            for d in 0..3 {
                net[d][n] = up[d] + down[d];
            }
            coarse = Some(level);
        }
        // Walls take their part of a force, and so does the far away in a plane of a charged line.
        if arrangement.potential_is_open() {
            let q = LEVELS.map(|q| q as f64);
            let off = net.map(|y| extrapolate(q, y, None).value.abs() / pull).into_iter().fold(0.0, f64::max);
            let what = "action and reaction: net force on both plates over the pull";
            all.push(Finding::new(what, off, NET, "what the limit of levels 2, 3, 4 leaves"));
        }
        Ok(all)
    }

    /// Charge and force of the whole of the upper conductor: energy and what it pulls with.
    fn energy(&self, a: &Assessment) -> Estimate {
        let [[c11, c12], [_, c22]] = a.capacitance_matrix_f;
        let value = match self.question.connection {
            Connection::Grounded => c22.value,
            Connection::Floating => {
                let whole = c11.value + 2.0 * c12.value + c22.value;
                (c11.value * c22.value - c12.value * c12.value) / whole
            }
        };
        Estimate { value, uncertainty: c22.uncertainty * value / c22.value }
    }

    /// Force and torque against difference quotients of the energy, over gap and tilt.
    fn derivatives(&self, base: &Assessment) -> Result<Vec<Finding>, Error> {
        let question = &self.question;
        let a = &question.arrangement;
        let (force, torque) = base
            .guard
            .as_ref()
            .map_or((base.force_n, base.torque_centre_nm), |g| (g.beam.force_n, g.beam.torque_centre_nm));
        let half_v2 = 0.5 * question.voltage_v.powi(2);
        let near = a.clear_gap_m() * a.narrowness();
        let (s, c) = a.pose.roll_rad.sin_cos();
        let turning = c * torque[1].value + s * torque[2].value;
        let pull = values(force).iter().fold(0.0, |m: f64, f| m.max(f.abs()));
        let lever = 0.5 * a.upper.length_m;
        let mut all = Vec::new();
        type Move = fn(&mut Question, f64);
        let moves: [(&str, f64, f64, Move, f64, f64); 2] = [
            (
                "force against energy difference over the gap",
                STEP * near,
                1.0,
                |q, h| q.arrangement.pose.gap_m += h,
                force[2].value,
                force[2].uncertainty / pull,
            ),
            (
                "torque against energy difference over the tilt",
                STEP * near / lever,
                -1.0,
                |q, h| q.arrangement.pose.tilt_rad += h,
                turning,
                torque[1].uncertainty / (pull * lever),
            ),
        ];
        for (what, step, sign, change, direct, uncertainty) in moves {
            let scale = if sign > 0.0 { pull } else { pull * lever };
            let at = |h: f64| -> Result<Estimate, Error> {
                let mut moved = *question;
                change(&mut moved, h);
                Ok(self.energy(&self.assess(&moved)?))
            };
            let [a, b, c, d] = [at(-2.0 * step)?, at(-step)?, at(step)?, at(2.0 * step)?];
            let slope = (a.value - 8.0 * b.value + 8.0 * c.value - d.value) / (12.0 * step);
            let off = (sign * half_v2 * slope - direct) / scale;
            let allowed = QUOTIENT + AGREE * uncertainty;
            let because = "the quotient's own error, and three standard uncertainties";
            all.push(Finding::new(what, off, allowed, because));
        }
        Ok(all)
    }

    /// Lengths times 10, voltage times 2.
    fn scaling(&self, base: &Assessment) -> Result<Vec<Finding>, Error> {
        let plane = !self.space();
        let mut all = Vec::new();
        let row = |a: &Assessment| {
            let mut row = vec![a.capacitance_f.value, a.force_n[2].value, a.torque_centre_nm[1].value];
            row.extend(a.torque_hinge_nm.map(|t| t[1].value));
            row
        };
        // Per metre of width everything has one length less.
        let less = if plane { 1.0 / LENGTHS } else { 1.0 };
        let larger = self.assess(&enlarged(&self.question, LENGTHS))?;
        let by = [LENGTHS * less, less, LENGTHS * less, LENGTHS * less];
        let scaled: Vec<f64> = row(base).iter().zip(by).map(|(v, by)| v * by).collect();
        all.push(ratio("lengths x 10: charge x 10, force x 1, torque x 10", &row(&larger), &scaled));
        let mut stronger = self.question;
        stronger.voltage_v *= VOLTAGE;
        let stronger = self.assess(&stronger)?;
        let squared = VOLTAGE * VOLTAGE;
        let scaled: Vec<f64> =
            row(base).iter().zip([1.0, squared, squared, squared]).map(|(v, by)| v * by).collect();
        all.push(ratio("voltage x 2: capacitance the same, force and torque x 4", &row(&stronger), &scaled));
        Ok(all)
    }
}

/// Number for number.
fn ratio(what: &str, found: &[f64], expected: &[f64]) -> Finding {
    let off = found.iter().zip(expected).map(|(f, e)| apart(&[*f], &[*e], e.abs().max(f64::MIN_POSITIVE)));
    Finding::new(what, off.fold(0.0, |w, o| if o <= w { w } else { o }), SCALED, SCALED_BECAUSE)
}

/// The charges on both conductors, node by node, against the matrix, which comes from the energy.
fn charges(arrangement: &Arrangement, level: &Level) -> Result<Vec<Finding>, Error> {
    let operator = Operator::assemble(&level.grid)
        .ok_or_else(|| Error::Arrangement(arrangement.folded(GridOptions::suited(arrangement).sideways)))?;
    let n = level.grid.nodes();
    let mut flux = vec![[0.0; 2]; n];
    operator.multiply(&level.phi, &vec![false; n], &mut flux);
    // Where y = 0 is a plane of symmetry the grid has one half, and the matrix is that of both.
    let halves = if arrangement.symmetric_in_y() { 2.0 } else { 1.0 };
    let charge = [&level.grid.lower, &level.grid.upper].map(|body| {
        let mut sum = [0.0; 2];
        for node in body.boxes.iter().flat_map(|b| level.grid.nodes_of(b)) {
            sum = [sum[0] + flux[node][0], sum[1] + flux[node][1]];
        }
        sum.map(|q| halves * q)
    });
    let scale = level.matrix[1][1].abs();
    let off = (0..2).map(|i| apart(&charge[i], &level.matrix[i], scale)).fold(0.0, f64::max);
    Ok(vec![
        Finding::new(
            "reciprocity: charge on one plate with the other at 1 V",
            (charge[0][1] - charge[1][0]) / scale,
            IDENTICAL,
            IDENTICAL_BECAUSE,
        ),
        Finding::new(
            "charges on the plates against the energy of the field",
            off,
            IDENTICAL,
            IDENTICAL_BECAUSE,
        ),
    ])
}
