//! What a table is made for: bench, ranges and accuracy. Two runs with equal jobs make equal tables.

use serde_json::{json, Value};
use tiltgap_meshes::Dimensions;
use tiltgap_solver::{Connection, Question};

use crate::bench::Bench;
use crate::ranges::Range;
use crate::report_json::wiring;
use crate::source::Source;
use crate::tables::error::TableError;
use crate::tables::quantity::Quantity;
use crate::tables::space::{Kind, Space};

/// A job.
#[derive(Clone, Debug, PartialEq)]
pub struct TableJob {
    /// The bench.
    pub bench: Bench,
    /// The bench as a question; the table varies its pose.
    pub question: Question,
    /// Which poses.
    pub kind: Kind,
    /// From where to where, in the order of the axes.
    pub ranges: Vec<Range>,
    /// Relative standard uncertainty accepted at the nodes, and largest error accepted between them.
    pub accuracy: f64,
}

impl TableJob {
    /// The poses.
    ///
    /// # Errors
    /// If one of them is impossible.
    pub fn space(&self) -> Result<Space, TableError> {
        let spans: Vec<_> = self.ranges.iter().map(|r| r.span).collect();
        Space::new(&self.question, self.kind, &spans)
    }

    /// The numbers that the table holds.
    pub fn quantities(&self) -> Vec<Quantity> {
        Quantity::all(self.question.hinge.is_some())
    }

    /// Whether everything is per metre of width.
    pub fn per_metre(&self) -> bool {
        self.question.arrangement.dimensions == Dimensions::Two
    }

    /// As it is stored, bench and settings; equal jobs have equal texts.
    pub fn to_json(&self) -> Value {
        json!({
            "bench": self.bench.as_given,
            "settings": {
                "program": env!("CARGO_PKG_VERSION"),
                "poses": match self.kind {
                    Kind::Free => "free",
                    Kind::AlongHinge => "along the hinge",
                },
                "accuracy": self.accuracy,
                "dimensions": if self.per_metre() { 2 } else { 3 },
                "connection": wiring(self.question.connection),
                "ranges": self.ranges.iter().map(Range::to_json).collect::<Vec<_>>(),
            },
        })
    }

    /// As it was stored, or what is wrong with it.
    ///
    /// # Errors
    /// A sentence, for a file that was not written by this program.
    pub fn from_json(value: &Value) -> Result<TableJob, String> {
        let settings = &value["settings"];
        let wrong = |key: &str| format!("\"settings.{key}\" is {}", settings[key]);
        let mut given = value["bench"].as_object().ok_or("\"bench\" is not there")?.clone();
        // What the bench does not have was echoed as null.
        given.retain(|_, v| !v.is_null());
        let text = Value::from(given).to_string();
        let bench =
            Bench::new(&Source::File("bench of the table".into()), &text, &[]).map_err(|e| e.to_string())?;
        let kind = match settings["poses"].as_str() {
            Some("free") => Kind::Free,
            Some("along the hinge") => Kind::AlongHinge,
            _ => return Err(wrong("poses")),
        };
        let dimensions = match settings["dimensions"].as_u64() {
            Some(2) => Dimensions::Two,
            Some(3) => Dimensions::Three,
            _ => return Err(wrong("dimensions")),
        };
        let connections = [Connection::Grounded, Connection::Floating];
        let connection = connections
            .into_iter()
            .find(|c| settings["connection"] == wiring(*c))
            .ok_or_else(|| wrong("connection"))?;
        let accuracy = settings["accuracy"].as_f64().filter(|a| *a > 0.0).ok_or_else(|| wrong("accuracy"))?;
        let ranges: Option<Vec<Range>> = settings["ranges"]
            .as_array()
            .filter(|r| (1..=3).contains(&r.len()))
            .and_then(|r| r.iter().map(Range::from_json).collect());
        let ranges = ranges.ok_or_else(|| wrong("ranges"))?;
        let question = bench.question(dimensions, connection);
        Ok(TableJob { bench, question, kind, ranges, accuracy })
    }
}

/// The first place in which two stored jobs differ: path, value here and value there.
pub fn difference(here: &Value, there: &Value) -> Option<(String, String, String)> {
    fn walk(path: &str, here: &Value, there: &Value) -> Option<(String, String, String)> {
        if here == there {
            return None;
        }
        let below = |key: &str| if path.is_empty() { key.to_string() } else { format!("{path}.{key}") };
        match (here, there) {
            (Value::Object(a), Value::Object(b)) => {
                let keys = a.keys().chain(b.keys().filter(|k| !a.contains_key(*k)));
                keys.into_iter().find_map(|k| walk(&below(k), &here[k], &there[k]))
            }
            (Value::Array(a), Value::Array(b)) if a.len() == b.len() => {
                (0..a.len()).find_map(|n| walk(&format!("{path}[{n}]"), &a[n], &b[n]))
            }
            _ => Some((path.into(), here.to_string(), there.to_string())),
        }
    }
    walk("", here, there)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::table_job;

    #[test]
    fn a_stored_job_comes_back() {
        let job = table_job();
        let stored = job.to_json();
        let back = TableJob::from_json(&stored).unwrap();
        assert_eq!(back.to_json(), stored);
        assert_eq!((back.question, back.ranges, back.accuracy), (job.question, job.ranges, job.accuracy));
        let mut without = stored.clone();
        without["bench"]["hinge"] = Value::Null;
        assert_eq!(TableJob::from_json(&without).unwrap().question.hinge, None);
        for key in ["poses", "accuracy", "dimensions", "connection", "ranges"] {
            let mut broken = stored.clone();
            broken["settings"][key] = json!("x");
            assert!(TableJob::from_json(&broken).unwrap_err().contains(key));
        }
    }

    #[test]
    fn the_difference_is_named() {
        let here = table_job().to_json();
        assert_eq!(difference(&here, &here), None);
        let mut there = here.clone();
        there["settings"]["ranges"][0]["to"] = json!(0.009);
        let expected = ("settings.ranges[0].to".into(), "0.008".into(), "0.009".into());
        assert_eq!(difference(&here, &there), Some(expected));
        let mut there = here.clone();
        there["bench"]["drive"]["voltage"] = json!("300 V");
        assert_eq!(difference(&here, &there).unwrap().0, "bench.drive.voltage");
    }
}
