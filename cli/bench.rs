//! A bench: two plates, the pose of the upper one, hinge, voltage, wiring and medium, in SI.

use serde_json::{Map, Value};
use tiltgap_meshes::{Arrangement, Dimensions, Plate, Pose, Surroundings};
use tiltgap_solver::{Connection, Hinge, Question};

use crate::document::Node;
use crate::key_error::KeyError;
use crate::settings::{Origin, Settings};
use crate::source::{Source, SourceError};

/// Why there is no bench.
#[derive(Debug, thiserror::Error)]
pub enum BenchError {
    /// The text could not be had.
    #[error(transparent)]
    Source(#[from] SourceError),
    /// Nothing in it.
    #[error("{from} is empty; begin with `tiltgap demo > bench.json`")]
    Empty {
        /// Where it comes from.
        from: Source,
    },
    /// It is not JSON.
    #[error("{from} is not JSON: {what} at line {line}, column {column}")]
    Syntax {
        /// Where it comes from.
        from: Source,
        /// What is wrong.
        what: String,
        /// Line, from 1.
        line: usize,
        /// Column, from 1.
        column: usize,
    },
    /// A key or a value is wrong.
    #[error("{from}: {error}")]
    Key {
        /// Where it comes from.
        from: Source,
        /// What is wrong.
        error: Box<KeyError>,
    },
    /// An option is wrong.
    #[error(transparent)]
    Option(Box<KeyError>),
}

/// An option that replaces a value of the bench.
#[derive(Clone, Copy, Debug)]
pub struct Override<'a> {
    /// Path of the key.
    pub path: &'static str,
    /// The option, with its dashes.
    pub option: &'static str,
    /// What was given.
    pub text: Option<&'a str>,
}

/// A checked bench.
#[derive(Clone, Debug, PartialEq)]
pub struct Bench {
    /// Its title.
    pub title: String,
    /// The fixed plate.
    pub lower: Plate,
    /// The plate on the beam.
    pub upper: Plate,
    /// Where the upper plate stands.
    pub pose: Pose,
    /// Where the beam turns.
    pub hinge: Option<Hinge>,
    /// Upper minus lower potential, in V.
    pub voltage_v: f64,
    /// The wiring.
    pub connection: Connection,
    /// Whether file or option say which wiring.
    pub connection_stated: bool,
    /// What is around.
    pub surroundings: Surroundings,
    /// Relative permittivity of the medium.
    pub relative_permittivity: f64,
    /// Whether it is the built-in demo bench.
    pub demo: bool,
    /// All values as given, in the form of the file.
    pub as_given: Map<String, Value>,
}

fn syntax(from: &Source, text: &str, error: &serde_json::Error) -> BenchError {
    if text.trim().is_empty() {
        return BenchError::Empty { from: from.clone() };
    }
    let (line, column) = (error.line(), error.column());
    let full = error.to_string();
    let what = full.strip_suffix(&format!(" at line {line} column {column}")).unwrap_or(&full).into();
    BenchError::Syntax { from: from.clone(), what, line, column }
}

impl Bench {
    /// Reads, overrides, completes and checks. Whether the plates have room is left to the arrangement.
    ///
    /// # Errors
    /// See [`BenchError`].
    pub fn new(from: &Source, text: &str, overrides: &[Override]) -> Result<Bench, BenchError> {
        let document = Node::parse(text).map_err(|e| syntax(from, text, &e))?;
        let key = |error| BenchError::Key { from: from.clone(), error: Box::new(error) };
        let mut settings = Settings::read(&document).map_err(key)?;
        for o in overrides {
            if let Some(text) = o.text {
                settings.set(o.path, o.option, text).map_err(|e| BenchError::Option(Box::new(e)))?;
            }
        }
        settings.complete().map_err(key)?;
        Ok(Bench::from_settings(&settings, *from == Source::Demo))
    }

    fn from_settings(settings: &Settings, demo: bool) -> Bench {
        let si = |path: &str| settings.si(path);
        let plate = |which: &str| Plate {
            length_m: si(&format!("{which}.length")),
            width_m: si(&format!("{which}.width")),
            thickness_m: si(&format!("{which}.thickness")),
        };
        Bench {
            title: settings.text("title").into(),
            lower: plate("lower_plate"),
            upper: plate("upper_plate"),
            pose: Pose {
                gap_m: si("pose.gap"),
                tilt_rad: si("pose.tilt"),
                roll_rad: si("pose.roll"),
                shift_m: settings.si_pair("pose.shift"),
            },
            hinge: settings
                .has("hinge")
                .then(|| Hinge { arm_m: si("hinge.arm"), height_m: si("hinge.height") }),
            voltage_v: si("drive.voltage"),
            connection: match settings.text("drive.connection") {
                "grounded" => Connection::Grounded,
                "floating" => Connection::Floating,
                other => panic!("the table of keys has a connection {other:?} that nobody handles"),
            },
            connection_stated: settings.origin("drive.connection") != Origin::Default,
            surroundings: match settings.text("surroundings.kind") {
                "open" => Surroundings::Open,
                other => panic!("the table of keys has surroundings {other:?} that nobody handles"),
            },
            relative_permittivity: settings.number("medium.relative_permittivity"),
            demo,
            as_given: settings.as_given(),
        }
    }

    /// The question that the solver answers.
    pub fn question(&self, dimensions: Dimensions, connection: Connection) -> Question {
        Question {
            arrangement: Arrangement {
                surroundings: self.surroundings,
                ..Arrangement::open(self.lower, self.upper, self.pose, dimensions)
            },
            hinge: self.hinge,
            connection,
            voltage_v: self.voltage_v,
            relative_permittivity: self.relative_permittivity,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::source::DEMO;

    #[test]
    fn the_demo_bench_is_a_bench() {
        let bench = Bench::new(&Source::Demo, DEMO, &[]).unwrap();
        assert!(bench.demo && bench.connection_stated);
        assert_eq!((bench.pose.gap_m, bench.pose.tilt_rad), (0.004, 0.4f64.to_radians()));
        assert_eq!(bench.hinge, Some(Hinge { arm_m: 0.15, height_m: 0.0 }));
        let file: Value = serde_json::from_str(DEMO).unwrap();
        assert_eq!(Value::from(bench.as_given), file);
    }

    #[test]
    fn messages_say_where_the_bench_comes_from() {
        let gap = Override { path: "pose.gap", option: "--gap", text: Some("4") };
        let message = |text: &str, overrides: &[Override]| {
            Bench::new(&Source::File("b.json".into()), text, overrides).unwrap_err().to_string()
        };
        assert_eq!(message(" \n", &[]), "\"b.json\" is empty; begin with `tiltgap demo > bench.json`");
        assert_eq!(
            message("{\n x}", &[]),
            "\"b.json\" is not JSON: key must be a string at line 2, column 2"
        );
        assert!(message("{}", &[]).starts_with("\"b.json\": \"lower_plate.length\" is missing"));
        assert!(message(DEMO, &[gap]).starts_with("--gap: \"4\" has no unit"));
    }
}
