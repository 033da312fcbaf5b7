//! The keys of a bench file, once.
//!
//! Reading, defaults, the nearest key in an error and the JSON Schema all follow this table; a new key is a new line
//! here and a place where its value is used.

use serde_json::{json, Map, Value};

use crate::quantity::Dimension;

/// Relative permittivity of dry air at 20 °C and 1013.25 hPa, static: the refractivity N = 77.6/T (p + 4810 e/T) of
/// \[SmithWeintraub1953\] (p and e in hPa, T in K, good to 0.5 %) is 268, so that (1 + N 1e-6)^2 = 1.000 537(3). Half
/// saturated air has 1e-4 more by the same formula.
pub const PERMITTIVITY_OF_AIR: f64 = 1.000_54;
/// Largest relative permittivity accepted: above every liquid and most ceramics.
const PERMITTIVITY_LIMIT: f64 = 1e5;

/// Largest relative permittivity of a film: what the grids were made for.
const FILM_PERMITTIVITY_LIMIT: f64 = 1e3;

/// What a value may be.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Range {
    /// Anything.
    Any,
    /// Above zero.
    Positive,
    /// Zero or above.
    NotNegative,
    /// Either sign, but not zero.
    NotZero,
    /// From and to, both included.
    Between(f64, f64),
}

impl Range {
    /// Whether the value lies in the range.
    pub fn contains(self, v: f64) -> bool {
        match self {
            Range::Any => true,
            Range::Positive => v > 0.0,
            Range::NotNegative => v >= 0.0,
            Range::NotZero => v != 0.0,
            Range::Between(from, to) => (from..=to).contains(&v),
        }
    }

    /// What is asked for, in words that end a sentence: "must be positive".
    pub fn wanted(self) -> String {
        match self {
            Range::Any => "may be any".into(),
            Range::Positive => "must be positive".into(),
            Range::NotNegative => "must not be negative".into(),
            Range::NotZero => "must not be zero (either sign will do)".into(),
            Range::Between(from, to) => format!("must lie between {from} and {to}"),
        }
    }
}

/// What stands at a key.
#[derive(Clone, Copy, Debug)]
pub enum Kind {
    /// Any text.
    Text,
    /// A text with a number and a unit.
    Quantity(Dimension, Range),
    /// Two such texts, for x and y.
    Pair(Dimension),
    /// A plain number.
    Number(Range),
    /// One of a few words.
    Choice(&'static [&'static str]),
    /// An object with keys of its own.
    Group(&'static [Key]),
}

/// Whether a key may be left out.
#[derive(Clone, Copy, Debug)]
pub enum Need {
    /// It must be there, in its group.
    Required,
    /// If it is left out this is its value.
    Default(fn() -> Value),
    /// It may be left out, and then it is not there.
    Optional,
}

/// One key.
#[derive(Clone, Copy, Debug)]
pub struct Key {
    /// As written in the file.
    pub name: &'static str,
    /// What stands there.
    pub kind: Kind,
    /// Whether it may be left out.
    pub need: Need,
    /// A value that does, as JSON.
    pub example: &'static str,
    /// What it means, for the schema.
    pub about: &'static str,
}

const fn key(name: &'static str, kind: Kind, need: Need, example: &'static str, about: &'static str) -> Key {
    Key { name, kind, need, example, about }
}

use Dimension::{Angle, Length, Voltage};
use Kind::{Choice, Group, Number, Pair, Text};
use Need::{Default, Optional, Required};
use Range::{Any, Between, NotNegative, NotZero, Positive};

const LENGTH: Key = key(
    "length",
    Kind::Quantity(Length, Positive),
    Required,
    "\"110 mm\"",
    "extent along x, from the hinge edge to the free edge",
);

const WIDTH: Key =
    key("width", Kind::Quantity(Length, Positive), Required, "\"90 mm\"", "extent along y, the hinge axis");

const THICKNESS: Key = key(
    "thickness",
    Kind::Quantity(Length, NotNegative),
    Default(|| json!("0 mm")),
    "\"2 mm\"",
    "extent along z, away from the gap; 0 is a thin sheet",
);

const GUARD: Key = key(
    "guard",
    Group(&[
        key(
            "slot",
            Kind::Quantity(Length, Positive),
            Required,
            "\"0.2 mm\"",
            "width of the empty slot between the plate and its guard ring",
        ),
        key("rim", Kind::Quantity(Length, Positive), Required, "\"15 mm\"", "width of the guard ring itself"),
    ]),
    Optional,
    "{ \"slot\": \"0.2 mm\", \"rim\": \"15 mm\" }",
    "guard ring around this plate, coplanar and equally thick, on its potential; one of the two plates may have one",
);

const FILM: Key = key(
    "film",
    Group(&[
        key(
            "thickness",
            Kind::Quantity(Length, Positive),
            Required,
            "\"50 um\"",
            "thickness of the film; the gap counts from the metal below it",
        ),
        key(
            "relative_permittivity",
            Number(Between(1.0, FILM_PERMITTIVITY_LIMIT)),
            Required,
            "2.3",
            "of the film",
        ),
    ]),
    Optional,
    "{ \"thickness\": \"50 um\", \"relative_permittivity\": 2.3 }",
    "insulating film that covers the facing surface of the lower plate (not a guard ring)",
);

const LOWER_PLATE: &[Key] = &[LENGTH, WIDTH, THICKNESS, GUARD, FILM];
const UPPER_PLATE: &[Key] = &[LENGTH, WIDTH, THICKNESS, GUARD];

const POSE: &[Key] = &[
    key(
        "gap",
        Kind::Quantity(Length, Positive),
        Required,
        "\"4 mm\"",
        "height of the centre of the upper plate's facing surface above the lower plate's",
    ),
    key(
        "tilt",
        Kind::Quantity(Angle, Any),
        Default(|| json!("0 deg")),
        "\"-2 mrad\"",
        "rotation about the hinge direction; positive raises the free (+x) edge",
    ),
    key(
        "roll",
        Kind::Quantity(Angle, Any),
        Default(|| json!("0 deg")),
        "\"0.1 deg\"",
        "rotation about x, after the tilt; positive raises the +y edge",
    ),
    key(
        "shift",
        Pair(Length),
        Default(|| json!(["0 mm", "0 mm"])),
        "[\"1 mm\", \"0 mm\"]",
        "lateral offset of the upper plate along x and y",
    ),
];

const HINGE: &[Key] = &[
    key(
        "arm",
        Kind::Quantity(Length, Positive),
        Required,
        "\"150 mm\"",
        "distance along x from the hinge to the centre of the upper plate",
    ),
    key(
        "height",
        Kind::Quantity(Length, Any),
        Default(|| json!("0 mm")),
        "\"5 mm\"",
        "height of the hinge above the upper plate's facing surface when parallel",
    ),
];

const DRIVE: &[Key] = &[
    key(
        "voltage",
        Kind::Quantity(Voltage, NotZero),
        Required,
        "\"400 V\"",
        "potential of the upper plate minus that of the lower one",
    ),
    key(
        "connection",
        Choice(&["grounded", "floating"]),
        Default(|| json!("grounded")),
        "\"grounded\"",
        "grounded: lower plate and surroundings at 0 V; floating: the pair carries no net charge",
    ),
];

/// A clearance of the grounded floor or box.
const fn clearance(name: &'static str, about: &'static str) -> Key {
    key(name, Kind::Quantity(Length, Positive), Optional, "\"40 mm\"", about)
}

/// Kinds of surroundings.
pub const OPEN: &str = "open";
/// A grounded plane below.
pub const GROUNDED_FLOOR: &str = "grounded-floor";
/// Grounded walls around.
pub const GROUNDED_BOX: &str = "grounded-box";
/// Names of the clearances in the group of the surroundings, by axis and end; the floor uses the one below alone.
pub const CLEARANCES: [[&str; 2]; 3] = [["hinge_side", "free_side"], ["left", "right"], ["below", "above"]];

const SURROUNDINGS: &[Key] = &[
    key(
        "kind",
        Choice(&[OPEN, GROUNDED_FLOOR, GROUNDED_BOX]),
        Default(|| json!(OPEN)),
        "\"open\"",
        "open: nothing else near, zero potential far away; grounded-floor: a grounded plane without end below the \
         plates; grounded-box: grounded walls, of which some may be left out",
    ),
    clearance("below", "from the back of the lower plate down to the grounded floor"),
    clearance("above", "grounded box: from the facing surface of the lower plate up to the lid"),
    clearance("hinge_side", "grounded box: from the lower plate's edge (or guard ring) at -x to the wall there"),
    clearance("free_side", "grounded box: from the lower plate's edge (or guard ring) at +x to the wall there"),
    clearance("left", "grounded box: from the lower plate's edge (or guard ring) at -y to the wall there"),
    clearance("right", "grounded box: from the lower plate's edge (or guard ring) at +y to the wall there"),
];

const MEDIUM: &[Key] = &[key(
    "relative_permittivity",
    Number(Between(1.0, PERMITTIVITY_LIMIT)),
    Default(|| json!(PERMITTIVITY_OF_AIR)),
    "1.00054",
    "of what is between and around the plates; the default is dry air",
)];

/// The whole file.
pub const BENCH: &[Key] = &[
    key("$schema", Text, Optional, "\"bench.schema.json\"", "for editors; not used"),
    key(
        "title",
        Text,
        Default(|| json!("untitled bench")),
        "\"my balance, spring run\"",
        "shown with the result",
    ),
    key(
        "lower_plate",
        Group(LOWER_PLATE),
        Required,
        "{ \"length\": \"110 mm\", \"width\": \"90 mm\" }",
        "the fixed plate",
    ),
    key(
        "upper_plate",
        Group(UPPER_PLATE),
        Required,
        "{ \"length\": \"110 mm\", \"width\": \"90 mm\" }",
        "the plate on the beam",
    ),
    key("pose", Group(POSE), Required, "{ \"gap\": \"4 mm\" }", "where the upper plate stands"),
    key(
        "hinge",
        Group(HINGE),
        Optional,
        "{ \"arm\": \"150 mm\" }",
        "where the beam turns; without it the torque is about the plate's centre only",
    ),
    key("drive", Group(DRIVE), Required, "{ \"voltage\": \"400 V\" }", "the voltage and the wiring"),
    key(
        "surroundings",
        Group(SURROUNDINGS),
        Default(|| json!({})),
        "{ \"kind\": \"open\" }",
        "what is around the plates",
    ),
    key(
        "medium",
        Group(MEDIUM),
        Default(|| json!({})),
        "{ \"relative_permittivity\": 1.00054 }",
        "what is between and around the plates",
    ),
];

/// Path of a key below a group, `pose.gap`; at the top its name alone.
pub fn join(group: &str, name: &str) -> String {
    if group.is_empty() {
        name.into()
    } else {
        format!("{group}.{name}")
    }
}

/// The key at a path.
///
/// # Panics
/// If there is none: paths come from the program, not from a person.
pub fn find(path: &str) -> &'static Key {
    let (mut keys, mut found) = (BENCH, None);
    for name in path.split('.') {
        let key = keys.iter().find(|k| k.name == name);
        let key = key.unwrap_or_else(|| panic!("the table of keys has no {path}"));
        keys = if let Group(below) = key.kind { below } else { &[] };
        found = Some(key);
    }
    found.unwrap_or_else(|| panic!("the table of keys has no {path}"))
}

/// Paths of all keys, groups before what is in them.
pub fn paths() -> Vec<String> {
    fn walk(group: &str, keys: &[Key], into: &mut Vec<String>) {
        for key in keys {
            let path = join(group, key.name);
            into.push(path.clone());
            if let Group(below) = key.kind {
                walk(&path, below, into);
            }
        }
    }
    let mut all = Vec::new();
    walk("", BENCH, &mut all);
    all
}

/// The defaults of a group's keys, as they could stand in the file.
pub fn defaults(keys: &[Key]) -> Map<String, Value> {
    keys.iter()
        .filter_map(|k| match k.need {
            Default(value) => Some((k.name.to_string(), value())),
            _ => None,
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_path_is_found_and_every_example_is_json() {
        assert!(paths().contains(&"pose.gap".into()) && paths().contains(&"title".into()));
        for path in paths() {
            let key = find(&path);
            assert_eq!(path.rsplit('.').next(), Some(key.name));
            assert!(serde_json::from_str::<Value>(key.example).is_ok(), "{path}");
            assert!(!key.about.is_empty());
        }
    }

    #[test]
    #[should_panic(expected = "has no pose.gpa")]
    fn a_path_that_does_not_exist_is_a_programmers_mistake() {
        find("pose.gpa");
    }

    #[test]
    fn the_permittivity_of_air_follows_from_its_source() {
        // [SmithWeintraub1953] with T = °C + 273, as there.
        let permittivity = |p: f64, e: f64| (1.0 + 77.6e-6 / 293.0 * (p + 4810.0 * e / 293.0)).powi(2);
        assert!((permittivity(1013.25, 0.0) - PERMITTIVITY_OF_AIR).abs() < 5e-6);
        // Half of the saturation pressure of water at 20 °C, 23.4 hPa.
        let moist = permittivity(1013.25, 11.7) - permittivity(1013.25, 0.0);
        assert!((moist - 1e-4).abs() < 1e-5);
    }
}
