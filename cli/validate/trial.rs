//! A reference case made into something the program can solve.

use tiltgap_meshes::{Arrangement, Dimensions, GridOptions, Plate, Pose};
use tiltgap_solver::{
    assess, extrapolate, Assessment, Connection, Error, Estimate, Hinge, Level, LevelParams, Params,
    Question, FLOOR,
};

use super::cases::{Case, Family};
use super::comparison::Comparison;
use super::{posed_formulas, posed_plates, posed_strips, posed_walls};

/// Accuracy that the program takes when none is asked for, which the targets belong to.
pub const DEFAULT: f64 = 1e-4;

/// What a trial gives: comparisons, or what the solver says.
pub type Checks = Result<Vec<Comparison>, Error>;

/// How a trial is solved: to some accuracy.
pub type Solve<'a> = Box<dyn Fn(f64) -> Checks + Send + Sync + 'a>;

/// A case and how it is solved.
pub struct Trial<'a> {
    /// Name of the family.
    pub family: &'a str,
    /// Name of the case, with the wiring where there are two.
    pub case: String,
    /// Whether a quick run has it.
    pub quick: bool,
    solve: Solve<'a>,
}

impl<'a> Trial<'a> {
    /// A trial of a case.
    pub fn new(family: &'a Family, case: &'a Case, solve: Solve<'a>) -> Trial<'a> {
        let quick = family.quick.iter().any(|name| name == case.name());
        Trial { family: &family.name, case: case.name().into(), quick, solve }
    }

    /// Solves it and holds it against its reference.
    ///
    /// # Errors
    /// What the solver says.
    pub fn run(&self, accuracy: f64) -> Checks {
        (self.solve)(accuracy)
    }
}

/// All trials that a family has. A family that the program does not solve has none.
pub fn trials(family: &Family) -> Vec<Trial<'_>> {
    let pose: fn(&Family) -> Vec<Trial<'_>> = match family.name.as_str() {
        "strips-parallel" => posed_strips::parallel,
        "strips" => posed_strips::strips,
        "wedge-strips" => posed_strips::wedges,
        "hinged-strips" => posed_strips::hinged,
        "strips-thick" => posed_strips::thick,
        "guarded-strips" => posed_strips::guarded,
        "guard-gaps" => posed_walls::guard_gaps,
        "closed-domains" => posed_walls::striplines,
        "truncation" => posed_walls::boxes,
        "squares" => posed_plates::squares,
        "plates" => posed_plates::plates,
        "wedge-squares" => posed_plates::wedges,
        "isolated" => posed_plates::isolated,
        "wedge-ideal" => posed_formulas::wedge_ideal,
        "cross-capacitance" => posed_formulas::vacuum,
        _ => return Vec::new(),
    };
    pose(family)
}

/// A sheet or a bar of the cross-section.
pub fn strip(length_m: f64, thickness_m: f64) -> Plate {
    Plate { length_m, width_m: 1.0, thickness_m }
}

/// Two equal parallel bars in the plane.
pub fn bars(length: f64, gap_m: f64, thickness: f64) -> Arrangement {
    let pose = Pose { gap_m, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    Arrangement::open(strip(length, thickness), strip(length, thickness), pose, Dimensions::Two)
}

/// An assessment in the units of the reference cases: permittivity and voltage 1.
///
/// # Errors
/// What the solver says.
pub fn solve(
    arrangement: Arrangement,
    connection: Connection,
    hinge: Option<Hinge>,
    accuracy: f64,
) -> Result<Assessment, Error> {
    let question = Question { arrangement, hinge, connection, voltage_v: 1.0, relative_permittivity: 1.0 };
    assess(&question, &Params { accuracy, ..Params::default() }, &mut |_| {})
}

/// Limits of numbers of three levels, in units of the grid.
///
/// # Errors
/// What the solver says.
pub fn limits<const N: usize>(
    arrangement: &Arrangement,
    levels: [usize; 3],
    numbers: impl Fn(&Level) -> [f64; N],
) -> Result<[Estimate; N], Error> {
    let options = GridOptions::suited(arrangement);
    let mut rows = [[0.0; N]; 3];
    let mut coarse = None;
    for (row, q) in rows.iter_mut().zip(levels) {
        let level =
            Level::solve(arrangement, &options, q, coarse.as_ref(), &LevelParams::default(), &mut |_, _| {})?;
        *row = numbers(&level);
        coarse = Some(level);
    }
    Ok(std::array::from_fn(|n| {
        let limit = extrapolate(levels.map(|q| q as f64), [rows[0][n], rows[1][n], rows[2][n]], None);
        Estimate { value: limit.value, uncertainty: limit.uncertainty.max(FLOOR * limit.value.abs()) }
    }))
}
