//! Reading the reference cases, and what the tests on them share.

use std::sync::OnceLock;

use serde_json::Value;
use tiltgap_meshes::{Arrangement, Dimensions, Plate, Pose};
use tiltgap_solver::{assess, Assessment, Connection, Error, Estimate, Params, Question, EPS0};

/// The cases of a family of `reference-cases`.
pub fn family(name: &str) -> Vec<Value> {
    let path = format!("{}/reference-cases/{name}.json", env!("CARGO_MANIFEST_DIR"));
    let text = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}"));
    let file: Value = serde_json::from_str(&text).unwrap_or_else(|e| panic!("{path}: {e}"));
    file["cases"].as_array().expect("cases").clone()
}

/// A number of a case.
pub fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or_else(|| panic!("not a number: {value}"))
}

/// Three numbers of a case.
pub fn triple(value: &Value) -> [f64; 3] {
    [0, 1, 2].map(|k| number(&value[k]))
}

/// The name of a case.
pub fn name(case: &Value) -> &str {
    case["name"].as_str().expect("a name")
}

/// The plates of a three-dimensional case.
pub fn plates(case: &Value) -> Arrangement {
    let g = &case["geometry"];
    let plate = |p: &Value| Plate {
        length_m: number(&p["length"]),
        width_m: number(&p["width"]),
        thickness_m: number(&p["thickness"]),
    };
    Arrangement::open(
        plate(&g["lower"]),
        plate(&g["upper"]),
        Pose {
            gap_m: number(&g["gap"]),
            tilt_rad: number(&g["tilt_deg"]).to_radians(),
            roll_rad: number(&g["roll_deg"]).to_radians(),
            shift_m: [number(&g["shift"][0]), number(&g["shift"][1])],
        },
        Dimensions::Three,
    )
}

/// The strips of a two-dimensional case.
pub fn strips(case: &Value) -> Arrangement {
    let g = &case["geometry"];
    let plate = |length: &Value| Plate { length_m: number(length), width_m: 1.0, thickness_m: 0.0 };
    Arrangement::open(
        plate(&g["lower_length"]),
        plate(&g["upper_length"]),
        Pose {
            gap_m: number(&g["gap"]),
            tilt_rad: number(&g["tilt_deg"]).to_radians(),
            roll_rad: 0.0,
            shift_m: [number(&g["shift_x"]), 0.0],
        },
        Dimensions::Two,
    )
}

/// An assessment in the units of the reference cases: permittivity and voltage 1, no hinge.
pub fn solve(arrangement: Arrangement, connection: Connection, accuracy: f64) -> Result<Assessment, Error> {
    let question =
        Question { arrangement, hinge: None, connection, voltage_v: 1.0, relative_permittivity: 1.0 };
    assess(&question, &Params { accuracy, ..Params::default() }, &mut |_| {})
}

/// A case and what came of it.
pub type Solved = (Value, Result<Assessment, Error>);

/// Accuracy that the program takes when none is asked for.
pub const DEFAULT: f64 = 1e-4;

/// All strip cases at the default accuracy, solved once for all tests.
pub fn strips_at_default() -> &'static [Solved] {
    static SOLVED: OnceLock<Vec<Solved>> = OnceLock::new();
    SOLVED.get_or_init(|| strips_at(DEFAULT))
}

/// All strip cases at some accuracy.
pub fn strips_at(accuracy: f64) -> Vec<Solved> {
    let solve = |case: Value| {
        let solved = solve(strips(&case), Connection::Floating, accuracy);
        (case, solved)
    };
    family("strips").into_iter().map(solve).collect()
}

/// A plate case, how it is wired and what came of it.
pub type SolvedPlates = (Value, Connection, Assessment);

/// All plate cases in both connections at the default accuracy, solved once for all tests.
pub fn plates_at_default() -> &'static [SolvedPlates] {
    static SOLVED: OnceLock<Vec<SolvedPlates>> = OnceLock::new();
    SOLVED.get_or_init(|| plates_at(DEFAULT))
}

/// All plate cases in both connections at some accuracy.
pub fn plates_at(accuracy: f64) -> Vec<SolvedPlates> {
    let mut all = Vec::new();
    for case in family("plates") {
        for connection in [Connection::Floating, Connection::Grounded] {
            let solved = solve(plates(&case), connection, accuracy);
            all.push((case.clone(), connection, solved.unwrap_or_else(|e| panic!("{}: {e}", name(&case)))));
        }
    }
    all
}

/// One number held against its reference.
#[derive(Clone, Debug)]
pub struct Check {
    /// Case and quantity.
    pub what: String,
    /// Distance from the reference.
    pub off: f64,
    /// Stated standard uncertainty.
    pub uncertainty: f64,
    /// What the reference itself leaves open.
    pub open: f64,
    /// What a relative error refers to.
    pub scale: f64,
}

impl Check {
    /// Of a computed number, with permittivity and voltage taken out.
    pub fn new(what: String, computed: Estimate, reference: f64, open: f64, scale: f64) -> Check {
        let (value, uncertainty) = (computed.value / EPS0, computed.uncertainty / EPS0);
        Check { what, off: (value - reference).abs(), uncertainty, open, scale }
    }

    /// The distance in units of the combined standard uncertainty.
    pub fn normalised(&self) -> f64 {
        self.off / self.uncertainty.hypot(self.open)
    }

    /// Fails unless the number is within `limit` of the scale, beyond what the reference leaves open, and within three
    /// combined standard uncertainties.
    pub fn assert_within(&self, limit: f64) {
        let relative = (self.off - self.open) / self.scale;
        let Check { what, off, uncertainty, open, .. } = self;
        let said = format!(
            "{what}: off by {off:.2e} ({relative:.1e}), stated {uncertainty:.1e}, reference {open:.1e}"
        );
        assert!(relative <= limit, "{said}, allowed {limit:.1e}");
        assert!(
            self.off <= 3.0 * self.uncertainty.hypot(self.open),
            "{self:?}: not within three standard uncertainties"
        );
    }
}

/// Lever, in units of the lower plate's length, at which a force counts where a torque is small: a torque about the
/// centre is known no better than the force at a twentieth of the length.
const LEVER: f64 = 0.05;

/// Charge, force and torque of a solved strip case.
pub fn strip_checks(case: &Value, solved: &Assessment) -> Vec<Check> {
    let value = &case["value"];
    let [c, fx, fz, ty] = ["capacitance", "force_x", "force_z", "torque_y"].map(|key| number(&value[key]));
    let force = fx.abs().max(fz.abs());
    let named = |what: &str| format!("{} {what}", name(case));
    vec![
        Check::new(named("capacitance"), solved.capacitance_f, c, 0.0, c),
        Check::new(named("force x"), solved.force_n[0], fx, 0.0, force),
        Check::new(named("force z"), solved.force_n[2], fz, 0.0, force),
        Check::new(named("torque y"), solved.torque_centre_nm[1], ty, 0.0, ty.abs().max(LEVER * force)),
    ]
}

/// Matrix, charge, force and torque of a solved plate case; relative errors of vectors refer to their length.
pub fn plate_checks(case: &Value, connection: Connection, solved: &Assessment) -> (Vec<Check>, Vec<Check>) {
    let (value, spread) = (&case["value"], &case["spread"]);
    let key = |quantity: &str| match connection {
        Connection::Grounded => format!("{quantity}_grounded"),
        Connection::Floating => format!("{quantity}_neutral"),
    };
    let named = |what: &str| format!("{} {connection:?} {what}", name(case));
    let mut charges = Vec::new();
    for i in 0..2 {
        for j in 0..2 {
            let reference = number(&value["matrix"][i][j]);
            let (computed, open) = (solved.capacitance_matrix_f[i][j], number(&spread["matrix"][i][j]));
            charges.push(Check::new(
                named(&format!("C{}{}", i + 1, j + 1)),
                computed,
                reference,
                open,
                reference.abs(),
            ));
        }
    }
    if connection == Connection::Floating {
        let (reference, open) =
            (number(&value["capacitance_neutral"]), number(&spread["capacitance_neutral"]));
        charges.push(Check::new(named("C"), solved.capacitance_f, reference, open, reference));
    }
    let mut forces = Vec::new();
    let length = |v: [f64; 3]| v.iter().map(|c| c * c).sum::<f64>().sqrt();
    let force = length(triple(&value[key("force")]));
    for (quantity, computed) in [("force", solved.force_n), ("torque", solved.torque_centre_nm)] {
        let (reference, open) = (triple(&value[key(quantity)]), triple(&spread[key(quantity)]));
        let scale = if quantity == "force" { force } else { length(reference).max(LEVER * force) };
        for (d, axis) in ["x", "y", "z"].into_iter().enumerate() {
            let what = named(&format!("{quantity} {axis}"));
            forces.push(Check::new(what, computed[d], reference[d], open[d], scale));
        }
    }
    (charges, forces)
}
