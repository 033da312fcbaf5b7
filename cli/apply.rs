//! The job `apply`: readings in, the ideal formula and its correction out.

use std::io::{Read, Write};
use std::path::{Path, PathBuf};

use csv::{ByteRecord, WriterBuilder};
use rayon::prelude::*;
use serde_json::{json, Map, Value};

use crate::arguments::ApplyArguments;
use crate::assess;
use crate::concise::{concise, concise_si};
use crate::document::quoted;
use crate::error::Error;
use crate::inputs::{Entry, Item, Rules, Use, Values};
use crate::nearest::nearest;
use crate::quantity::{Dimension, Quantity};
use crate::readings::{From, Readings};
use crate::store::{save, Format, StoreError, Stored};
use crate::table::Table as Columns;
use crate::tables::table::{Corrected, NAMES};

/// Standard gravity in m/s^2, exact by definition \[CGPM1901\]: a load's weight where nobody measured the local value,
/// which differs by up to 0.3 % from it (common practice).
pub const STANDARD_GRAVITY: f64 = 9.806_65;
/// Most sentences about single cells that are shown; all of them stand in the output.
const MOST_SHOWN: usize = 100;
/// Longest file of readings, in bytes.
const LONGEST: u64 = 1 << 30;
/// Last column of the output.
const PROBLEM: &str = "problem";

/// What is wrong with the way the readings are given.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum ApplyError {
    /// Neither file nor values.
    #[error("there are no readings; name a CSV file (- for standard input), or give one with --at, for example {example}")]
    Nothing {
        /// What does.
        example: String,
    },
    /// An item of `--at`.
    #[error("--at: {} {what}", quoted(.item))]
    Item {
        /// As given.
        item: String,
        /// What is wrong.
        what: String,
    },
    /// Something that `--at` lacks.
    #[error("--at: the {0} is missing; add it, for example {0}={1}")]
    Missing(&'static str, &'static str),
    /// `--voltage` is no voltage.
    #[error("--voltage: {} {what}", quoted(.text))]
    Voltage {
        /// As given.
        text: String,
        /// What is wrong.
        what: String,
    },
    /// The output would fall on an input.
    #[error("-o: {0:?} is one of the inputs; give another file")]
    OntoInput(PathBuf),
    /// Table and readings both from standard input.
    #[error("table and readings cannot both come from standard input; put one of them into a file")]
    BothStdin,
    /// A column of the output that the readings have already.
    #[error("the readings have a column {} already, which is one of the output; rename it", quoted(.0))]
    Taken(String),
    /// Readings that cannot be read.
    #[error("{path:?} cannot be read: {reason}; check the path")]
    Unreadable {
        /// Which.
        path: PathBuf,
        /// Why.
        reason: String,
    },
    /// Readings that are far too long.
    #[error("the readings are longer than 1 GiB; cut them into several files")]
    Long,
    /// JSON of a file.
    #[error("--json goes with --at; corrected readings of a file are CSV")]
    Json,
}

/// What a run leaves to be done.
pub struct Outcome {
    /// For standard output.
    pub text: String,
    /// Sentences for standard error.
    pub notes: Vec<String>,
    /// Rows that could not be corrected, of how many.
    pub failed: (usize, usize),
}

/// A value of `--at` that does, for messages.
fn example_value(item: Item) -> &'static str {
    use crate::tables::axis::Variable;
    match item {
        Item::Pose(Variable::Gap) => "3.2mm",
        Item::Pose(Variable::Angle) => "-5mrad",
        Item::Pose(_) => "0.4deg",
        Item::Voltage => "250V",
        Item::Load => "20mg",
    }
}

/// A table from a file, or from standard input for `-`.
///
/// # Errors
/// See [`StoreError`].
pub fn load(path: &Path, stdin: &mut dyn Read) -> Result<Stored, StoreError> {
    let stored = if path == Path::new("-") {
        let mut bytes = Vec::new();
        let shown = Path::new("standard input");
        stdin
            .take(LONGEST)
            .read_to_end(&mut bytes)
            .map_err(|error| StoreError::Unreadable { path: shown.into(), error })?;
        Stored::read(shown, &bytes)?
    } else {
        Stored::load(path)?
    };
    stored.expect(Format::Table, path)
}

/// Does the work.
///
/// # Errors
/// What is wrong with table, options or readings as a whole. What is wrong with single readings is in the outcome.
pub fn apply(arguments: &ApplyArguments, stdin: &mut dyn Read) -> Result<Outcome, Error> {
    let threads = assess::threads(arguments.threads.as_deref())?;
    let voltage = arguments.voltage.as_deref().map(voltage).transpose()?;
    let both = arguments.table == Path::new("-") && arguments.readings.as_deref() == Some(Path::new("-"));
    if both {
        return Err(ApplyError::BothStdin.into());
    }
    let stored = load(&arguments.table, stdin)?;
    let table = stored.table(&arguments.table)?;
    let rules = Rules { job: &stored.job, table: &table };
    if let Some(text) = &arguments.at {
        let values = single(text, &rules, voltage)?;
        let corrected = table.correct(&rules.reading(&values));
        let text = if arguments.json {
            single_json(&corrected)?
        } else {
            single_screen(&corrected, &rules, &values)?
        };
        let failed = (0, 1);
        return finish(arguments, text, Vec::new(), failed);
    }
    if arguments.json {
        return Err(ApplyError::Json.into());
    }
    let Some(path) = &arguments.readings else {
        let items: Vec<String> =
            rules.needed().iter().map(|i| format!("{}={}", i.name(), example_value(*i))).collect();
        return Err(ApplyError::Nothing { example: items.join(",") }.into());
    };
    let (from, bytes) = bytes(path, stdin)?;
    let readings = Readings::read(&from, &bytes, &rules, voltage.is_some())?;
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .map_err(|e| Error::Threads { threads, reason: e.to_string() })?;
    let (text, wrong) = pool.install(|| corrected_rows(&readings, &rules, voltage))?;
    let failed = (wrong.iter().filter(|w| !w.is_empty()).count(), wrong.len());
    let mut notes = readings.notes;
    let sentences: Vec<String> = wrong.into_iter().flatten().collect();
    let all = sentences.len();
    notes.extend(sentences.into_iter().take(MOST_SHOWN));
    if all > MOST_SHOWN {
        notes.push(format!("and {} more; all are in the column {PROBLEM:?} of the output", all - MOST_SHOWN));
    }
    finish(arguments, text, notes, failed)
}

/// Puts a text where it belongs.
fn finish(
    arguments: &ApplyArguments,
    text: String,
    notes: Vec<String>,
    failed: (usize, usize),
) -> Result<Outcome, Error> {
    match &arguments.output {
        Some(path) if path != Path::new("-") => {
            let same = |input: &Path| match (input.canonicalize(), path.canonicalize()) {
                (Ok(a), Ok(b)) => a == b,
                _ => false,
            };
            if same(&arguments.table) || arguments.readings.as_deref().is_some_and(same) {
                return Err(ApplyError::OntoInput(path.clone()).into());
            }
            save(path, &text)?;
            Ok(Outcome { text: String::new(), notes, failed })
        }
        _ => Ok(Outcome { text, notes, failed }),
    }
}

fn voltage(text: &str) -> Result<f64, ApplyError> {
    let parsed = Quantity::parse(text, Dimension::Voltage);
    parsed.map(|q| q.si).map_err(|e| ApplyError::Voltage { text: text.into(), what: e.to_string() })
}

fn bytes(path: &Path, stdin: &mut dyn Read) -> Result<(From, Vec<u8>), ApplyError> {
    let mut bytes = Vec::new();
    let (from, read) = if path == Path::new("-") {
        (From::Stdin, stdin.take(LONGEST + 1).read_to_end(&mut bytes))
    } else {
        let opened = std::fs::File::open(path);
        (From::File(path.into()), opened.and_then(|file| file.take(LONGEST + 1).read_to_end(&mut bytes)))
    };
    read.map_err(|e| ApplyError::Unreadable { path: path.into(), reason: e.to_string() })?;
    if bytes.len() as u64 > LONGEST {
        return Err(ApplyError::Long);
    }
    Ok((from, bytes))
}

/// The values of `--at`.
fn single(text: &str, rules: &Rules, voltage: Option<f64>) -> Result<Values, ApplyError> {
    let mut values = Values::default();
    for item in text.split(',') {
        let wrong = |what: String| ApplyError::Item { item: item.trim().into(), what };
        let Some((name, value)) = item.split_once('=') else {
            return Err(wrong("is no name with a value; write for example gap=3.2mm".into()));
        };
        let name = name.trim();
        let Some(entry) = Entry::named(name) else {
            let known = Entry::names();
            let close = nearest(name, known.split(", ")).unwrap_or_default();
            return Err(wrong(format!(
                "is no reading; there are {known}, and each with u_ before it; the nearest is {close}"
            )));
        };
        if values.get(entry.item, entry.uncertainty).is_some() {
            return Err(wrong("occurs twice; keep one of them".into()));
        }
        match rules.admits(entry).map_err(wrong)? {
            Use::Taken => {}
            Use::Follows => {
                return Err(wrong(
                    "follows from the beam angle in a table along the hinge; leave it out".into(),
                ))
            }
        }
        let quantity = Quantity::parse(value, entry.item.dimension()).map_err(|e| wrong(e.to_string()))?;
        rules.check(entry, quantity.si, quantity.unit).map_err(wrong)?;
        values.put(entry, quantity.si);
    }
    if let (None, Some(v)) = (values.get(Item::Voltage, false), voltage) {
        values.put(Entry { item: Item::Voltage, uncertainty: false }, v);
    }
    for item in rules.needed() {
        if values.get(item, false).is_none() {
            return Err(ApplyError::Missing(item.name(), example_value(item)));
        }
    }
    Ok(values)
}

/// A load beside the corrected values: its weight, and the ratio of what it does to what the field does.
///
/// With a hinge the load hangs at the centre of the upper plate, so that weight times arm stands against the torque about
/// the hinge; without one its weight stands against the force.
struct Load {
    weight_n: f64,
    weight_uncertainty_n: f64,
    /// None without a field.
    ratio: Option<(f64, f64)>,
}

fn load_of(values: &Values, rules: &Rules, corrected: &[Corrected]) -> Option<Load> {
    let mass = values.get(Item::Load, false)?;
    let mass_uncertainty = values.get(Item::Load, true).unwrap_or(0.0);
    let (weight_n, weight_uncertainty_n) = (mass * STANDARD_GRAVITY, mass_uncertainty * STANDARD_GRAVITY);
    let (against, lever) = match rules.job.question.hinge {
        Some(hinge) => (&corrected[2], hinge.arm_m),
        None => (&corrected[1], 1.0),
    };
    let ratio = (against.corrected.value != 0.0).then(|| {
        let field = against.corrected.value;
        let ratio = weight_n * lever / field;
        let own = weight_uncertainty_n * lever / field;
        (ratio, own.hypot(ratio * against.uncertainty() / field))
    });
    Some(Load { weight_n, weight_uncertainty_n, ratio })
}

/// Units of capacitance, force and torque.
pub fn units(per_metre: bool) -> [&'static str; 3] {
    if per_metre {
        ["F/m", "N/m", "N m/m"]
    } else {
        ["F", "N", "N m"]
    }
}

/// Names of the columns that are added.
fn added(rules: &Rules, with_load: bool) -> Vec<String> {
    let count = rules.table.in_threes();
    let units = units(rules.job.per_metre()).map(|u| u.replace(' ', "").replace('/', "_per_"));
    let mut names = Vec::new();
    for (group, with_unit) in [("ideal", true), ("factor", false), ("corrected", true)] {
        for n in 0..count {
            let unit = if with_unit { format!("_{}", units[n]) } else { String::new() };
            let name = format!("{group}_{}{unit}", NAMES[n]);
            let uncertainty = format!("u_{name}");
            names.extend([name, uncertainty]);
        }
    }
    if with_load {
        names.extend(["load_weight_N", "u_load_weight_N", "load_ratio", "u_load_ratio"].map(String::from));
    }
    names.push(PROBLEM.into());
    names
}

/// Cells at the end of a row, written through one buffer.
struct Cells<'a> {
    record: &'a mut ByteRecord,
    buffer: String,
}

impl Cells<'_> {
    fn put(&mut self, cell: std::fmt::Arguments) {
        self.buffer.clear();
        // Writing to memory does not fail.
        let _ = std::fmt::Write::write_fmt(&mut self.buffer, cell);
        self.record.push_field(self.buffer.as_bytes());
    }

    fn value(&mut self, value: f64, uncertainty: f64) {
        self.put(format_args!("{value:.8e}"));
        self.put(format_args!("{uncertainty:.2e}"));
    }

    fn factor(&mut self, value: f64, uncertainty: f64) {
        self.put(format_args!("{value:.8}"));
        self.put(format_args!("{uncertainty:.2e}"));
    }

    /// The cells that are added to a row.
    fn all(&mut self, corrected: &[Corrected], load: Option<&Load>) {
        corrected.iter().for_each(|c| self.value(c.ideal, c.ideal_uncertainty));
        corrected.iter().for_each(|c| self.factor(c.factor.value, c.factor.uncertainty()));
        corrected.iter().for_each(|c| self.value(c.corrected.value, c.uncertainty()));
        if let Some(load) = load {
            self.value(load.weight_n, load.weight_uncertainty_n);
            match load.ratio {
                Some((ratio, uncertainty)) => self.factor(ratio, uncertainty),
                None => (0..2).for_each(|_| self.record.push_field(b"")),
            }
        }
        self.record.push_field(b"");
    }
}

/// Rows that one task corrects and writes.
const CHUNK: usize = 1024;

/// The output, and what is wrong with each row.
fn corrected_rows(
    readings: &Readings,
    rules: &Rules,
    voltage: Option<f64>,
) -> Result<(String, Vec<Vec<String>>), Error> {
    let with_load = readings.columns.iter().any(|c| c.entry.item == Item::Load && !c.entry.uncertainty);
    let added = added(rules, with_load);
    if let Some(taken) = added.iter().find(|a| readings.names.contains(a)) {
        return Err(ApplyError::Taken(taken.clone()).into());
    }
    let has_voltage = readings.columns.iter().any(|c| c.entry.item == Item::Voltage && !c.entry.uncertainty);
    let writer = || WriterBuilder::new().delimiter(readings.delimiter).flexible(true).from_writer(Vec::new());
    let into_bytes =
        |writer: csv::Writer<Vec<u8>>| writer.into_inner().expect("memory takes what is written");
    let mut head = writer();
    let names: Vec<&str> = readings.names.iter().chain(&added).map(String::as_str).collect();
    head.write_record(&names).expect("memory takes what is written");
    let chunks: Vec<(Vec<u8>, Vec<Vec<String>>)> = readings
        .rows
        .par_chunks(CHUNK)
        .map(|rows| {
            let (mut out, mut all_wrong) = (writer(), Vec::with_capacity(rows.len()));
            let (mut record, mut buffer_of_rows) = (ByteRecord::new(), String::new());
            for row in rows {
                record.clear();
                let own = row.iter().map(Some).chain(std::iter::repeat(None)).take(readings.names.len());
                own.for_each(|cell| record.push_field(cell.unwrap_or_default()));
                let values = readings.values(row, rules).map(|mut values| {
                    if let (false, Some(v)) = (has_voltage, voltage) {
                        values.put(Entry { item: Item::Voltage, uncertainty: false }, v);
                    }
                    values
                });
                let wrong = match values {
                    Ok(values) => {
                        let corrected = rules.table.correct(&rules.reading(&values));
                        let load = load_of(&values, rules, &corrected);
                        let buffer = std::mem::take(&mut buffer_of_rows);
                        let mut cells = Cells { record: &mut record, buffer };
                        cells.all(&corrected, load.as_ref());
                        buffer_of_rows = cells.buffer;
                        Vec::new()
                    }
                    Err(wrong) => {
                        (1..added.len()).for_each(|_| record.push_field(b""));
                        record.push_field(wrong.join("; ").as_bytes());
                        wrong
                    }
                };
                out.write_byte_record(&record).expect("memory takes what is written");
                all_wrong.push(wrong);
            }
            (into_bytes(out), all_wrong)
        })
        .collect();
    let mut bytes = into_bytes(head);
    let mut wrong = Vec::with_capacity(readings.rows.len());
    for (part, more) in chunks {
        bytes.extend(part);
        wrong.extend(more);
    }
    // A cell that is passed through may be in another encoding; what is no UTF-8 is replaced.
    let text =
        String::from_utf8(bytes).unwrap_or_else(|e| String::from_utf8_lossy(e.as_bytes()).into_owned());
    Ok((text, wrong))
}

/// One reading as JSON.
fn single_json(corrected: &[Corrected]) -> Result<String, Error> {
    let number = |key: &str, v: f64| {
        serde_json::Number::from_f64(v)
            .map(Value::Number)
            .ok_or_else(|| Error::NotFinite { key: key.into(), value: v })
    };
    let mut parts = [Map::new(), Map::new(), Map::new()];
    let keys = ["capacitance_f", "force_n", "torque_nm"];
    for n in 0..NAMES.len() {
        let Some(c) = corrected.get(n) else {
            parts[0].insert(keys[n].into(), Value::Null);
            parts[1].insert(NAMES[n].into(), Value::Null);
            parts[2].insert(NAMES[n].into(), Value::Null);
            continue;
        };
        let pair = |v: f64, u: f64| -> Result<Value, Error> {
            Ok(json!({ "value": number(NAMES[n], v)?, "uncertainty": number(NAMES[n], u)? }))
        };
        parts[0].insert(keys[n].into(), number(keys[n], c.ideal)?);
        parts[1].insert(NAMES[n].into(), pair(c.factor.value, c.factor.uncertainty())?);
        parts[2].insert(NAMES[n].into(), pair(c.corrected.value, c.uncertainty())?);
    }
    let [ideal, factors, corrected] = parts;
    Ok(format!("{:#}\n", json!({ "ideal": ideal, "factors": factors, "corrected": corrected })))
}

/// One reading for a person.
fn single_screen(corrected: &[Corrected], rules: &Rules, values: &Values) -> Result<String, Error> {
    let mut columns = Columns::new(1);
    columns.row(["", "ideal", "factor", "corrected", "from readings", "table", "interpolation"]);
    for ((c, name), unit) in corrected
        .iter()
        .zip(["Capacitance", "Force, downwards", "Torque at hinge, closing"])
        .zip(units(rules.job.per_metre()))
    {
        let part = |u: f64| {
            let relative = if c.corrected.value == 0.0 { 0.0 } else { (u / c.corrected.value).abs() };
            format!("{relative:.1e}")
        };
        columns.row([
            name.to_string(),
            concise_si(c.ideal, c.ideal_uncertainty, unit)?,
            concise(c.factor.value, c.factor.uncertainty())?,
            concise_si(c.corrected.value, c.uncertainty(), unit)?,
            part(c.input),
            part(c.corrected.numerical),
            part(c.corrected.interpolation),
        ]);
    }
    let mut text = columns.text();
    text.push_str(
        "In parentheses: standard uncertainty; on the right its parts, relative to the corrected value.\n",
    );
    if let Some(load) = load_of(values, rules, corrected) {
        let weight = concise_si(load.weight_n, load.weight_uncertainty_n, "N")?;
        text.push_str(&format!("Load: weight {weight} at standard gravity"));
        if let Some((ratio, u)) = load.ratio {
            let against = if rules.job.question.hinge.is_some() {
                "weight times arm over the corrected torque"
            } else {
                "weight over the corrected force"
            };
            text.push_str(&format!("; {against}: {}", concise(ratio, u)?));
        }
        text.push('\n');
    }
    Ok(text)
}

/// Writes the sentences of an outcome.
pub fn tell(outcome: &Outcome, stderr: &mut dyn Write) {
    for note in &outcome.notes {
        // What cannot be written is in the output too.
        let _ = writeln!(stderr, "{note}");
    }
}
