//! Tables, shares of tables and the progress of either as files.
//!
//! One layout for all three: JSON with the job, the plan and the solved points. The checksum is the SHA-256 of everything
//! else in the file, written compactly in the order of the file, so that a file that was cut short or edited is refused
//! and one that was merely indented anew is not.

use std::fmt;
use std::fs::File;
use std::io::{self, Read, Write};
use std::path::{Path, PathBuf};

use serde_json::{json, Map, Number, Value};
use sha2::{Digest, Sha256};
use tiltgap_solver::{wedge_factors, Estimate};

use crate::error::Error;
use crate::table_job::TableJob;
use crate::tables::fit::Campaign;
use crate::tables::plan::{place, Plan, Point, MOST_NODES};
use crate::tables::quantity::{Quantity, Sample};
use crate::tables::space::Space;
use crate::tables::table::Table;

/// Version of the layout.
const VERSION: u64 = 1;
/// Longest file that is read, in bytes: a table with three long axes has a hundredth of that.
const LONGEST: u64 = 256 << 20;

/// What is added to the name of a file while it is written.
pub const TEMPORARY: &str = ".tmp";

/// What a file is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Format {
    /// A finished table.
    Table,
    /// The finished part of one.
    Share,
    /// The beginning of either.
    Progress,
}

impl Format {
    const ALL: [Format; 3] = [Format::Table, Format::Share, Format::Progress];

    fn name(self) -> &'static str {
        match self {
            Format::Table => "tiltgap table",
            Format::Share => "tiltgap share of a table",
            Format::Progress => "tiltgap progress of a table",
        }
    }
}

/// Part number `number` of `of`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Part {
    /// From 1.
    pub number: usize,
    /// In how many.
    pub of: usize,
}

impl fmt::Display for Part {
    fn fmt(&self, f: &mut fmt::Formatter) -> fmt::Result {
        write!(f, "{}/{}", self.number, self.of)
    }
}

impl Part {
    /// Reads `1/3`.
    pub fn parse(text: &str) -> Option<Part> {
        let (number, of) = text.split_once('/')?;
        let (number, of) = (number.trim().parse().ok()?, of.trim().parse().ok()?);
        (1..=of).contains(&number).then_some(Part { number, of })
    }

    /// The points of a plan that belong to it.
    pub fn of_points(self, points: Vec<Point>) -> Vec<Point> {
        points.into_iter().skip(self.number - 1).step_by(self.of).collect()
    }
}

/// Why a file is not read.
#[derive(Debug, thiserror::Error)]
pub enum StoreError {
    /// No such file.
    #[error("there is no file {0:?}; check the path, or make a table with `tiltgap tabulate`")]
    Missing(PathBuf),
    /// The system does not give it.
    #[error("{path:?} cannot be read: {error}")]
    Unreadable {
        /// Which.
        path: PathBuf,
        /// What the system says.
        error: io::Error,
    },
    /// Not JSON.
    #[error("{path:?} is no whole JSON text ({what}): it was cut short or is no table; make it again with `tiltgap tabulate`")]
    Syntax {
        /// Which.
        path: PathBuf,
        /// What is wrong.
        what: String,
    },
    /// JSON, but none of ours.
    #[error("{0:?} is no table of this program (its \"format\" says something else); check the path")]
    Foreign(PathBuf),
    /// One of ours, but not what was asked for.
    #[error("{path:?} is a {}, not a {}; {remedy}", .found.name(), .wanted.name())]
    OtherFormat {
        /// Which.
        path: PathBuf,
        /// What it is.
        found: Format,
        /// What it should be.
        wanted: Format,
        /// What to do.
        remedy: &'static str,
    },
    /// From a newer program.
    #[error("{path:?} has version {version} of the layout, this program knows version {VERSION}; use a newer tiltgap")]
    Newer {
        /// Which.
        path: PathBuf,
        /// Its version.
        version: u64,
    },
    /// Edited.
    #[error("{0:?} was changed after it was written (its checksum does not fit); make it again with `tiltgap tabulate`")]
    Checksum(PathBuf),
    /// The checksum fits, but not the content.
    #[error("{path:?} is damaged: {what}; make it again with `tiltgap tabulate`")]
    Damaged {
        /// Which.
        path: PathBuf,
        /// What is wrong.
        what: String,
    },
}

/// The content of a file.
#[derive(Clone, Debug, PartialEq)]
pub struct Stored {
    /// What it is.
    pub format: Format,
    /// What it was made for.
    pub job: TableJob,
    /// The job as it stands in the file.
    pub job_json: Value,
    /// For a share, or the progress of one.
    pub part: Option<Part>,
    /// What is solved.
    pub campaign: Campaign,
    /// SHA-256 of the content, as it stands in the file.
    pub checksum: String,
}

fn number(key: &str, v: f64) -> Result<Value, Error> {
    Number::from_f64(v).map(Value::Number).ok_or_else(|| Error::NotFinite { key: key.into(), value: v })
}

fn numbers(key: &str, values: impl Iterator<Item = f64>) -> Result<Value, Error> {
    values.map(|v| number(key, v)).collect()
}

fn point_json(space: &Space, point: &Point, sample: &Sample) -> Result<Value, Error> {
    let at = place(&space.axes, point);
    let (key, value) = match point {
        Point::Node(numbers) => ("node", json!(numbers)),
        Point::Check(n) => ("check", json!(n)),
    };
    let question = space.question_at(&at);
    let wedge = wedge_factors(&question.arrangement).expect("plates that overlap, as was checked");
    let mut wedges = vec![wedge.capacitance, wedge.force];
    wedges.extend(question.hinge.map(|h| wedge.torque(h.arm_m)));
    let mut map = Map::new();
    map.insert(key.into(), value);
    map.insert("at".into(), numbers("at", at.into_iter())?);
    map.insert("values".into(), numbers("values", sample.estimates.iter().map(|e| e.value))?);
    let uncertainties = sample.estimates.iter().map(|e| e.uncertainty);
    map.insert("uncertainties".into(), numbers("uncertainties", uncertainties)?);
    map.insert("wedge".into(), numbers("wedge", wedges.into_iter())?);
    map.insert("level".into(), sample.level.into());
    map.insert("iterations".into(), sample.iterations.into());
    Ok(map.into())
}

fn checksum(content: &Map<String, Value>) -> String {
    let mut rest = content.clone();
    rest.shift_remove("checksum");
    let digest = Sha256::digest(Value::from(rest).to_string());
    digest.iter().map(|byte| format!("{byte:02x}")).collect()
}

/// The text of a file; equal jobs and points give equal texts. `table` is there for a finished table.
///
/// # Errors
/// [`Error::NotFinite`] for a number that is none.
pub fn text(
    format: Format,
    job: &TableJob,
    space: &Space,
    part: Option<Part>,
    campaign: &Campaign,
    table: Option<&Table>,
) -> Result<String, Error> {
    let mut map = Map::new();
    map.insert("format".into(), format.name().into());
    map.insert("version".into(), VERSION.into());
    map.insert("checksum".into(), "".into());
    if let Value::Object(job) = job.to_json() {
        map.extend(job);
    }
    map.insert("part".into(), part.map(|p| p.to_string()).into());
    map.insert("quantities".into(), job.quantities().into_iter().map(Quantity::name).collect());
    if let Some(table) = table {
        let missed = table.quantities.iter().zip(&table.fit.missed).map(|(q, m)| {
            let [uncertainty, worst] = [m.uncertainty, m.worst].map(|v| number("interpolation", v));
            Ok(json!({ "quantity": q.name(), "uncertainty": uncertainty?, "worst": worst? }))
        });
        map.insert("interpolation".into(), missed.collect::<Result<Value, Error>>()?);
    }
    map.insert("nodes".into(), json!(campaign.plan.nodes));
    let points: Result<Value, Error> =
        campaign.samples.iter().map(|(point, sample)| point_json(space, point, sample)).collect();
    map.insert("points".into(), points?);
    map["checksum"] = checksum(&map).into();
    Ok(laid_out(&map))
}

/// JSON with one line for each key and for each item of a list of objects.
fn laid_out(map: &Map<String, Value>) -> String {
    let lines: Vec<String> = map
        .iter()
        .map(|(key, value)| {
            let items = value.as_array().filter(|items| items.iter().any(Value::is_object));
            let value = match items {
                Some(items) => {
                    let items: Vec<String> = items.iter().map(|i| format!("  {i}")).collect();
                    format!("[\n{}\n ]", items.join(",\n"))
                }
                None => value.to_string(),
            };
            format!(" {}: {value}", Value::from(key.as_str()))
        })
        .collect();
    format!("{{\n{}\n}}\n", lines.join(",\n"))
}

/// Writes a file whole or not at all: a temporary file beside it, then renamed.
///
/// # Errors
/// What the system says, with the path.
pub fn save(path: &Path, text: &str) -> Result<(), Error> {
    let temporary = beside(path, TEMPORARY);
    let written = File::create(&temporary)
        .and_then(|mut file| file.write_all(text.as_bytes()).and_then(|()| file.sync_data()))
        .and_then(|()| std::fs::rename(&temporary, path));
    written.map_err(|error| Error::Save { path: path.into(), error })
}

/// A path with something added to the name of the file.
pub fn beside(path: &Path, suffix: &str) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(suffix);
    name.into()
}

impl Stored {
    /// Reads a file of any of the three formats.
    ///
    /// # Errors
    /// See [`StoreError`].
    pub fn load(path: &Path) -> Result<Stored, StoreError> {
        let unreadable = |error: io::Error| match error.kind() {
            io::ErrorKind::NotFound => StoreError::Missing(path.into()),
            _ => StoreError::Unreadable { path: path.into(), error },
        };
        let mut bytes = Vec::new();
        let file = File::open(path).map_err(unreadable)?;
        file.take(LONGEST).read_to_end(&mut bytes).map_err(unreadable)?;
        Stored::read(path, &bytes)
    }

    /// The content of a file; `path` is for messages.
    ///
    /// # Errors
    /// See [`StoreError`].
    pub fn read(path: &Path, bytes: &[u8]) -> Result<Stored, StoreError> {
        let syntax = |what: String| StoreError::Syntax { path: path.into(), what };
        let value: Value = serde_json::from_slice(bytes).map_err(|e| syntax(e.to_string()))?;
        let foreign = || StoreError::Foreign(path.into());
        let map = value.as_object().ok_or_else(foreign)?;
        let format = Format::ALL.into_iter().find(|f| value["format"] == f.name()).ok_or_else(foreign)?;
        let damaged = |what: String| StoreError::Damaged { path: path.into(), what };
        let version = value["version"].as_u64().ok_or_else(|| damaged("it has no version".into()))?;
        if version > VERSION {
            return Err(StoreError::Newer { path: path.into(), version });
        }
        if value["checksum"] != checksum(map) {
            return Err(StoreError::Checksum(path.into()));
        }
        let job_json = json!({ "bench": value["bench"], "settings": value["settings"] });
        let job = TableJob::from_json(&job_json).map_err(damaged)?;
        let part = match &value["part"] {
            Value::Null => None,
            part => Some(
                part.as_str().and_then(Part::parse).ok_or_else(|| damaged(format!("\"part\" is {part}")))?,
            ),
        };
        let quantities = job.quantities();
        let names: Vec<String> = quantities.iter().map(|q| q.name()).collect();
        if value["quantities"] != json!(names) {
            return Err(damaged(format!("its quantities are {}", value["quantities"])));
        }
        let campaign = campaign(&value, job.ranges.len(), quantities.len()).map_err(damaged)?;
        if format == Format::Table && !campaign.missing().is_empty() {
            return Err(damaged(format!("{} of its points are not there", campaign.missing().len())));
        }
        let checksum = value["checksum"].as_str().unwrap_or_default().into();
        Ok(Stored { format, job, job_json, part, campaign, checksum })
    }

    /// Refuses a file that is not what is needed.
    ///
    /// # Errors
    /// [`StoreError::OtherFormat`].
    pub fn expect(self, wanted: Format, path: &Path) -> Result<Stored, StoreError> {
        if self.format == wanted {
            return Ok(self);
        }
        let remedy = match (self.format, wanted) {
            (Format::Share, Format::Table) => "put all shares together with `tiltgap join`",
            (Format::Progress, _) => "finish it with the `tiltgap tabulate` that began it",
            _ => "check the path",
        };
        Err(StoreError::OtherFormat { path: path.into(), found: self.format, wanted, remedy })
    }

    /// The finished table.
    ///
    /// # Errors
    /// [`StoreError::Damaged`] if its poses are impossible.
    pub fn table(&self, path: &Path) -> Result<Table, StoreError> {
        let damaged = |what: String| StoreError::Damaged { path: path.into(), what };
        let space = self.job.space().map_err(|e| damaged(e.to_string()))?;
        Ok(Table::new(space, self.job.quantities(), &self.campaign))
    }
}

/// Plan and points of a file.
fn campaign(value: &Value, axes: usize, quantities: usize) -> Result<Campaign, String> {
    let whole = |v: &Value| v.as_u64().and_then(|n| usize::try_from(n).ok());
    let nodes: Option<Vec<usize>> =
        value["nodes"].as_array().and_then(|nodes| nodes.iter().map(whole).collect());
    let nodes = nodes
        .filter(|n| n.len() == axes && n.iter().all(|c| (1..=MOST_NODES).contains(c)))
        .ok_or_else(|| format!("\"nodes\" is {}", value["nodes"]))?;
    let mut campaign = Campaign::new(Plan { nodes });
    let planned: std::collections::BTreeSet<Point> = campaign.plan.points().into_iter().collect();
    let points = value["points"].as_array().ok_or("\"points\" is no list")?;
    for (n, point) in points.iter().enumerate() {
        let wrong = |key: &str| format!("\"points[{n}].{key}\" will not do");
        let name = match (&point["node"], &point["check"]) {
            (Value::Array(numbers), Value::Null) => {
                Point::Node(numbers.iter().map(whole).collect::<Option<_>>().ok_or_else(|| wrong("node"))?)
            }
            (Value::Null, check) => Point::Check(whole(check).ok_or_else(|| wrong("check"))?),
            _ => return Err(wrong("node")),
        };
        if !planned.contains(&name) {
            return Err(wrong("node"));
        }
        let row = |key: &str| -> Result<Vec<f64>, String> {
            let row: Option<Vec<f64>> =
                point[key].as_array().and_then(|row| row.iter().map(Value::as_f64).collect());
            row.filter(|row| row.len() == quantities).ok_or_else(|| wrong(key))
        };
        let estimates = row("values")?
            .into_iter()
            .zip(row("uncertainties")?)
            .map(|(value, uncertainty)| Estimate { value, uncertainty })
            .collect();
        let level = whole(&point["level"]).ok_or_else(|| wrong("level"))? as u32;
        let iterations = whole(&point["iterations"]).ok_or_else(|| wrong("iterations"))?;
        campaign.samples.insert(name, Sample { estimates, level, iterations });
    }
    Ok(campaign)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::{campaign, table_job};
    use proptest::prelude::*;

    fn file() -> String {
        let job = table_job();
        let space = job.space().unwrap();
        let campaign = campaign(&space);
        let table = Table::new(space.clone(), job.quantities(), &campaign);
        text(Format::Table, &job, &space, None, &campaign, Some(&table)).unwrap()
    }

    fn read(text: &str) -> Result<Stored, String> {
        Stored::read(Path::new("t.json"), text.as_bytes()).map_err(|e| e.to_string())
    }

    #[test]
    fn a_file_comes_back_whole() {
        let text = file();
        let stored = read(&text).unwrap();
        let space = table_job().space().unwrap();
        assert_eq!(stored.campaign, campaign(&space));
        assert_eq!(stored.table(Path::new("t.json")).unwrap(), crate::fixture::table());
        // Indented anew it is the same file.
        let value: Value = serde_json::from_str(&text).unwrap();
        assert_eq!(read(&format!("{value:#}")).unwrap(), stored);
        assert!(text.lines().count() < 60 && text.ends_with("]\n}\n"), "{text}");
    }

    #[test]
    fn what_is_wrong_is_said() {
        let text = file();
        for (text, sentence) in [
            (String::new(), "is no whole JSON text"),
            (text[..text.len() / 2].into(), "cut short"),
            ("{}".into(), "is no table of this program"),
            ("[1]".into(), "is no table of this program"),
            (
                text.replace("\"version\": 1", "\"version\": 2"),
                "version 2 of the layout, this program knows version 1",
            ),
            (text.replace("400 V", "500 V"), "was changed after it was written"),
            (text.replacen("0.00003", "0.00001", 1), "was changed after it was written"),
        ] {
            let error = read(&text).map(|_| ()).unwrap_err();
            assert!(error.contains(sentence), "{error}");
        }
        let resealed = |change: &dyn Fn(&mut Value)| {
            let mut value: Value = serde_json::from_str(&text).unwrap();
            change(&mut value);
            value["checksum"] = checksum(value.as_object().unwrap()).into();
            read(&value.to_string()).map(|_| ()).unwrap_err()
        };
        assert!(resealed(&|v| v["nodes"] = json!([5])).contains("\"nodes\" is [5]"));
        assert!(resealed(&|v| v["nodes"] = json!([6, 4])).contains("of its points are not there"));
        assert!(resealed(&|v| v["points"][3]["values"][0] = Value::Null).contains("\"points[3].values\""));
        assert!(resealed(&|v| v["points"][0]["node"] = json!([99, 0])).contains("\"points[0].node\""));
        assert!(resealed(&|v| v["bench"]["pose"]["gap"] = json!(4)).contains("pose.gap"));
    }

    #[test]
    fn parts_cover_all_points_once() {
        assert_eq!(Part::parse("2/3"), Some(Part { number: 2, of: 3 }));
        for text in ["0/3", "4/3", "1", "a/b", "1/0", "-1/3", ""] {
            assert_eq!(Part::parse(text), None, "{text}");
        }
        let points = Plan { nodes: vec![4, 3] }.points();
        let mut all: Vec<Point> =
            (1..=3).flat_map(|number| Part { number, of: 3 }.of_points(points.clone())).collect();
        all.sort();
        assert_eq!(all, points);
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 64, failure_persistence: None, ..ProptestConfig::default() })]

        #[test]
        fn a_changed_byte_is_never_a_table(at in 0usize..4000, byte in 0u8..128) {
            let text = file();
            let at = at * text.len() / 4000;
            let mut bytes = text.clone().into_bytes();
            let same = bytes[at] == byte || (bytes[at].is_ascii_whitespace() && byte.is_ascii_whitespace());
            bytes[at] = byte;
            let read = Stored::read(Path::new("t.json"), &bytes);
            // A blank between two tokens may come and go, and a number may be written in another way.
            if let Ok(stored) = read {
                prop_assert!(same || stored == Stored::read(Path::new("t.json"), text.as_bytes()).unwrap());
            }
        }

        #[test]
        fn any_text_is_refused(text in "\\PC{0,60}") {
            prop_assert!(read(&text).is_err());
        }
    }
}
