//! A bench: two plates, the pose of the upper one, hinge, voltage, wiring and medium, in SI.

use serde_json::{Map, Value};
use tiltgap_meshes::{Arrangement, Clearances, Dimensions, Film, Guard, Plate, Pose, Surroundings, Which};
use tiltgap_solver::{Connection, Hinge, Question};

use crate::document::Node;
use crate::key_error::KeyError;
use crate::keys::{find, join, CLEARANCES, GROUNDED_BOX, GROUNDED_FLOOR, OPEN};
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
    /// The guard ring, around one of them.
    pub guard: Option<Guard>,
    /// The film on the lower plate.
    pub film: Option<Film>,
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

/// The guard ring, around one of the plates.
fn guard(settings: &Settings) -> Result<Option<Guard>, KeyError> {
    let of = |group: &str, around: Which| {
        settings.has(group).then(|| Guard {
            around,
            slot_m: settings.si(&format!("{group}.slot")),
            rim_m: settings.si(&format!("{group}.rim")),
        })
    };
    match (of("lower_plate.guard", Which::Lower), of("upper_plate.guard", Which::Upper)) {
        (Some(_), Some(_)) => Err(KeyError::TwoGuards),
        (lower, upper) => Ok(lower.or(upper)),
    }
}

/// What is around, with the clearances that belong to it and no others.
fn surroundings(settings: &Settings) -> Result<Surroundings, KeyError> {
    let path = |name: &str| join("surroundings", name);
    let kind = settings.text("surroundings.kind");
    let stated = format!("\"surroundings.kind\": {kind:?}");
    let clearance = |name: &str| settings.optional_si(&path(name));
    let needs = |name: &'static str| KeyError::Needed {
        key: path(name),
        name,
        example: find(&path(name)).example,
        because: stated.clone(),
    };
    let idle = |allowed: &[&str], remedy: &str| {
        let others = CLEARANCES.as_flattened().iter().filter(|name| !allowed.contains(name));
        match others.copied().find(|name| clearance(name).is_some()) {
            Some(name) => {
                Err(KeyError::Idle { key: path(name), beside: stated.clone(), remedy: remedy.into() })
            }
            None => Ok(()),
        }
    };
    match kind {
        OPEN => {
            idle(&[], "leave it out, or choose \"grounded-floor\" or \"grounded-box\"")?;
            Ok(Surroundings::Open)
        }
        GROUNDED_FLOOR => {
            idle(&["below"], "leave it out, or choose \"grounded-box\"")?;
            let below_m = clearance("below").ok_or_else(|| needs("below"))?;
            Ok(Surroundings::GroundedFloor { below_m })
        }
        GROUNDED_BOX => {
            let [x, y, z] = CLEARANCES.map(|pair| pair.map(clearance));
            if [x, y, z].as_flattened().iter().all(|c| c.is_none()) {
                return Err(needs("above"));
            }
            Ok(Surroundings::GroundedBox(Clearances {
                hinge_side_m: x[0],
                free_side_m: x[1],
                left_m: y[0],
                right_m: y[1],
                below_m: z[0],
                above_m: z[1],
            }))
        }
        other => panic!("the table of keys has surroundings {other:?} that nobody handles"),
    }
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
        Bench::from_settings(&settings, *from == Source::Demo).map_err(key)
    }

    fn from_settings(settings: &Settings, demo: bool) -> Result<Bench, KeyError> {
        let si = |path: &str| settings.si(path);
        let plate = |which: &str| Plate {
            length_m: si(&format!("{which}.length")),
            width_m: si(&format!("{which}.width")),
            thickness_m: si(&format!("{which}.thickness")),
        };
        let relative_permittivity = settings.number("medium.relative_permittivity");
        Ok(Bench {
            title: settings.text("title").into(),
            lower: plate("lower_plate"),
            upper: plate("upper_plate"),
            pose: Pose {
                gap_m: si("pose.gap"),
                tilt_rad: si("pose.tilt"),
                roll_rad: si("pose.roll"),
                shift_m: settings.si_pair("pose.shift"),
            },
            guard: guard(settings)?,
            film: settings.has("lower_plate.film").then(|| Film {
                thickness_m: si("lower_plate.film.thickness"),
                permittivity_ratio: settings.number("lower_plate.film.relative_permittivity")
                    / relative_permittivity,
            }),
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
            surroundings: surroundings(settings)?,
            relative_permittivity,
            demo,
            as_given: settings.as_given(),
        })
    }

    /// The question that the solver answers.
    pub fn question(&self, dimensions: Dimensions, connection: Connection) -> Question {
        Question {
            arrangement: Arrangement {
                guard: self.guard,
                film: self.film,
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

    /// The demo bench with a part of its text replaced.
    fn changed(from: &str, to: &str) -> Result<Bench, String> {
        assert!(DEMO.contains(from), "{from}");
        Bench::new(&Source::Demo, &DEMO.replacen(from, to, 1), &[]).map_err(|e| e.to_string())
    }

    #[test]
    fn guard_ring_film_and_walls() {
        let plate = "\"thickness\": \"0 mm\" }";
        let guard = "\"thickness\": \"2 mm\", \"guard\": { \"slot\": \"0.2 mm\", \"rim\": \"15 mm\" }";
        let film = "\"film\": { \"thickness\": \"50 um\", \"relative_permittivity\": 2.3 } }";
        let bench = changed(plate, &format!("{guard}, {film}")).unwrap();
        assert_eq!(bench.guard, Some(Guard { around: Which::Lower, slot_m: 0.0002, rim_m: 0.015 }));
        let question = bench.question(Dimensions::Three, bench.connection);
        assert_eq!(question.arrangement.film.unwrap().permittivity_ratio, 2.3 / 1.00054);
        assert_eq!(question.arrangement.lower.thickness_m, 0.002);
        let again = Bench::new(&Source::Demo, &Value::from(bench.as_given.clone()).to_string(), &[]).unwrap();
        assert_eq!(again, bench);
        let surroundings = |text: &str| changed("\"kind\": \"open\"", text).map(|b| b.surroundings);
        assert_eq!(
            surroundings("\"kind\": \"grounded-floor\", \"below\": \"40 mm\"").unwrap(),
            Surroundings::GroundedFloor { below_m: 0.04 }
        );
        let walls = Clearances { left_m: Some(0.05), above_m: Some(0.1), ..Clearances::default() };
        assert_eq!(
            surroundings("\"kind\": \"grounded-box\", \"left\": \"50 mm\", \"above\": \"0.1 m\"").unwrap(),
            Surroundings::GroundedBox(walls)
        );
    }

    #[test]
    fn keys_that_do_not_fit_together_are_refused() {
        let floor = |text: &str| changed("\"kind\": \"open\"", text).unwrap_err();
        for (found, message) in [
            (
                floor("\"kind\": \"grounded-floor\""),
                "\"surroundings.kind\": \"grounded-floor\" needs \"surroundings.below\"; add it, for example \"below\": \
                 \"40 mm\"",
            ),
            (
                floor("\"kind\": \"grounded-box\""),
                "\"surroundings.kind\": \"grounded-box\" needs \"surroundings.above\"; add it, for example \"above\": \
                 \"40 mm\"",
            ),
            (
                floor("\"kind\": \"grounded-floor\", \"below\": \"1 cm\", \"left\": \"1 cm\""),
                "\"surroundings.left\" means nothing with \"surroundings.kind\": \"grounded-floor\"; leave it out, or \
                 choose \"grounded-box\"",
            ),
            (
                floor("\"kind\": \"open\", \"below\": \"1 cm\""),
                "\"surroundings.below\" means nothing with \"surroundings.kind\": \"open\"; leave it out, or choose \
                 \"grounded-floor\" or \"grounded-box\"",
            ),
        ] {
            assert!(found.ends_with(message), "{found}");
        }
        let ring = "\"thickness\": \"0 mm\", \"guard\": { \"slot\": \"1 mm\", \"rim\": \"1 cm\" } }";
        let both = DEMO.replace("\"thickness\": \"0 mm\" }", ring);
        let error = Bench::new(&Source::Demo, &both, &[]).unwrap_err().to_string();
        assert!(error.contains("both plates have a \"guard\""), "{error}");
        let error = changed(
            "\"thickness\": \"0 mm\" }",
            "\"thickness\": \"0 mm\", \"guard\": { \"slot\": \"1 mm\" } }",
        );
        assert!(error.unwrap_err().contains("\"lower_plate.guard.rim\" is missing"));
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
