//! The job `table`: a table of correction factors on the screen, as CSV or as JSON.
//!
//! What is shown are round values of the axes (or as many as the person asked for), not the nodes.

use std::io::Read;

use csv::WriterBuilder;
use serde_json::{json, Map, Value};
use tiltgap_solver::Connection;

use crate::apply::load;
use crate::arguments::{TableArguments, Which};
use crate::concise::{concise, fixed, NotANumber};
use crate::error::Error;
use crate::ranges::Range;
use crate::store::Stored;
use crate::table::{paragraph, Table as Columns};
use crate::tables::axis::Variable;
use crate::tables::space::Kind;
use crate::tables::table::{Table, TableFactor, NAMES};

/// Symbols and names of the three factors.
pub const FACTORS: [(&str, &str); 3] =
    [("k_C", "capacitance and charge"), ("k_F", "force"), ("k_T", "torque about the hinge")];

/// Does the work.
///
/// # Errors
/// If the table cannot be read, or has no such factor.
pub fn show(arguments: &TableArguments, stdin: &mut dyn Read) -> Result<String, Error> {
    let stored = load(&arguments.table, stdin)?;
    let table = stored.table(&arguments.table)?;
    let which: Vec<usize> = match arguments.quantity {
        Which::Capacitance => vec![0],
        Which::Force => vec![1],
        Which::Torque if !table.has_torque() => return Err(Error::NoTorque),
        Which::Torque => vec![2],
        Which::All => (0..table.in_threes()).collect(),
    };
    if arguments.json {
        points_json(&stored, &table, &which)
    } else if arguments.csv {
        Ok(points_csv(&stored, &table, &which))
    } else {
        Ok(screen(&stored, &table, &which, arguments.percent)?)
    }
}

/// The printed places, the last axis fastest.
pub fn places(ranges: &[Range]) -> Vec<Vec<f64>> {
    let mut all = vec![Vec::new()];
    for range in ranges {
        let values = range.printed_values();
        all = all.iter().flat_map(|p: &Vec<f64>| values.iter().map(|v| [&p[..], &[*v]].concat())).collect();
    }
    all
}

/// A value of an axis as it is shown.
pub fn label(range: &Range, v: f64) -> String {
    fixed(range.shown(v), range.decimals())
}

/// A factor, or what it adds in per cent.
fn cell(f: &TableFactor, percent: bool) -> Result<String, NotANumber> {
    let (value, uncertainty) = (f.factor.value, f.factor.uncertainty());
    if percent {
        concise(100.0 * (value - 1.0), 100.0 * uncertainty)
    } else {
        concise(value, uncertainty)
    }
}

fn head(stored: &Stored, percent: bool) -> String {
    let job = &stored.job;
    let kind = match job.kind {
        Kind::Free => "gap and tilt vary independently",
        Kind::AlongHinge => "along the way of the beam about its hinge",
    };
    let wiring = match job.question.connection {
        Connection::Grounded => "lower plate and surroundings grounded",
        Connection::Floating => "floating pair without net charge",
    };
    let width = if job.per_metre() { ", cross-section of very wide plates" } else { "" };
    let mut text = paragraph("", &job.bench.title);
    let what = format!("Correction factors, accuracy {:e}; {kind}; {wiring}{width}.", job.accuracy);
    text.push_str(&paragraph("", &what));
    let how = if percent {
        "Shown is 100 (k - 1): full value = ideal value x (1 + this/100)."
    } else {
        "Full value = ideal value x k."
    };
    let how = format!("{how} In parentheses the standard uncertainty in units of the last digits.");
    text.push_str(&paragraph("", &how));
    text
}

fn screen(stored: &Stored, table: &Table, which: &[usize], percent: bool) -> Result<String, NotANumber> {
    let ranges = &stored.job.ranges;
    let mut text = head(stored, percent);
    let title = |range: &Range| format!("{}, {}", range.span.variable.name(), range.unit);
    if let [range] = &ranges[..] {
        let mut columns = Columns::new(0);
        let symbols = which.iter().map(|n| FACTORS[*n].0.to_string());
        columns.row([title(range)].into_iter().chain(symbols));
        for v in range.printed_values() {
            let factors = table.factors(&[v]);
            let mut row = vec![label(range, v)];
            for n in which {
                row.push(cell(&factors[*n], percent)?);
            }
            columns.row(row);
        }
        return Ok(format!("{text}\n{}", columns.text()));
    }
    // The last axis of three makes one block for each of its values.
    let blocks: Vec<Vec<f64>> = places(&ranges[2..]);
    for n in which {
        for block in &blocks {
            let (symbol, name) = FACTORS[*n];
            let third: Vec<String> = ranges[2..]
                .iter()
                .zip(block)
                .map(|(r, v)| format!(", {} {} {}", r.span.variable.name(), label(r, *v), r.unit))
                .collect();
            text.push_str(&format!("\n{symbol}, {name}{}\n", third.concat()));
            let mut columns = Columns::new(0);
            let across = ranges[1].printed_values();
            let corner = format!("{} \\ {}", title(&ranges[0]), title(&ranges[1]));
            columns.row([corner].into_iter().chain(across.iter().map(|v| label(&ranges[1], *v))));
            for down in ranges[0].printed_values() {
                let mut row = vec![label(&ranges[0], down)];
                for v in &across {
                    let at = [&[down, *v], &block[..]].concat();
                    row.push(cell(&table.factors(&at)[*n], percent)?);
                }
                columns.row(row);
            }
            text.push_str(&columns.text());
        }
    }
    Ok(text)
}

fn points_csv(stored: &Stored, table: &Table, which: &[usize]) -> String {
    let ranges = &stored.job.ranges;
    let mut writer = WriterBuilder::new().from_writer(Vec::new());
    let mut names: Vec<String> =
        ranges.iter().map(|r| format!("{}_{}", r.span.variable.name(), r.unit)).collect();
    for n in which {
        names.extend([format!("factor_{}", NAMES[*n]), format!("u_factor_{}", NAMES[*n])]);
    }
    writer.write_record(&names).expect("memory takes what is written");
    for at in places(ranges) {
        let factors = table.factors(&at);
        let mut row: Vec<String> = ranges.iter().zip(&at).map(|(r, v)| label(r, *v)).collect();
        for n in which {
            let f = &factors[*n].factor;
            row.extend([format!("{:.8}", f.value), format!("{:.2e}", f.uncertainty())]);
        }
        writer.write_record(&row).expect("memory takes what is written");
    }
    String::from_utf8(writer.into_inner().expect("memory takes what is written")).expect("names and digits")
}

fn points_json(stored: &Stored, table: &Table, which: &[usize]) -> Result<String, Error> {
    let number = |key: &str, v: f64| {
        serde_json::Number::from_f64(v)
            .map(Value::Number)
            .ok_or_else(|| Error::NotFinite { key: key.into(), value: v })
    };
    let ranges = &stored.job.ranges;
    let mut points = Vec::new();
    for at in places(ranges) {
        let mut point = Map::new();
        for (range, v) in ranges.iter().zip(&at) {
            let unit = if range.span.variable == Variable::Gap { "m" } else { "rad" };
            point.insert(format!("{}_{unit}", range.span.variable.name()), number("axis", *v)?);
        }
        let mut factors = Map::new();
        for (n, f) in table.factors(&at).iter().enumerate().filter(|(n, _)| which.contains(n)) {
            let key = NAMES[n];
            let factor = json!({
                "value": number(key, f.factor.value)?,
                "uncertainty": number(key, f.factor.uncertainty())?,
                "numerical": number(key, f.factor.numerical)?,
                "interpolation": number(key, f.factor.interpolation)?,
                "wedge": number(key, f.wedge)?,
            });
            factors.insert(key.into(), factor);
        }
        point.insert("factors".into(), factors.into());
        points.push(Value::from(point));
    }
    let title = stored.job.bench.title.as_str();
    let json = json!({ "title": title, "accuracy": stored.job.accuracy, "points": points });
    Ok(format!("{json:#}\n"))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::{campaign, table, table_job};
    use crate::store::{text, Format};

    fn shown(change: impl Fn(&mut TableArguments)) -> String {
        let (job, table) = (table_job(), table());
        let space = job.space().unwrap();
        let file = text(Format::Table, &job, &space, None, &campaign(&space), Some(&table)).unwrap();
        let mut arguments = TableArguments { table: "-".into(), ..TableArguments::default() };
        change(&mut arguments);
        show(&arguments, &mut file.as_bytes()).unwrap()
    }

    #[test]
    fn gaps_go_down_and_tilts_across() {
        let text = shown(|a| a.quantity = Which::Force);
        assert!(text.contains("k_F, force\n") && !text.contains("k_C"));
        let lines: Vec<&str> = text.lines().filter(|l| l.contains("   ")).collect();
        assert_eq!(lines.len(), 1 + 7, "{text}");
        assert!(lines[0].ends_with("0.8         1.0") || lines[0].trim_end().ends_with("1.0"), "{text}");
        // Without tilt the invented factor is 1 + 7 gap: 1.014 at 2 mm.
        let first: Vec<&str> = lines[1].split_whitespace().collect();
        assert_eq!((first[0], first[1].starts_with("1.0140")), ("2", true), "{text}");
        assert!(text.lines().all(|l| l.chars().count() <= 100), "{text}");
    }

    #[test]
    fn per_cent_csv_and_json_say_the_same() {
        assert!(shown(|a| a.percent = true).contains("1.400("), "{}", shown(|a| a.percent = true));
        let csv = shown(|a| a.csv = true);
        let mut lines = csv.lines();
        assert!(lines
            .next()
            .unwrap()
            .starts_with("gap_mm,tilt_deg,factor_capacitance,u_factor_capacitance,factor_force"));
        assert!(lines.next().unwrap().starts_with("2,0.0,1.01400000,"), "{csv}");
        assert_eq!(lines.count(), 7 * 6 - 1);
        let json: Value = serde_json::from_str(&shown(|a| a.json = true)).unwrap();
        let first = &json["points"][0];
        assert_eq!(first["gap_m"], 0.002);
        assert!((first["factors"]["force"]["value"].as_f64().unwrap() - 1.014).abs() < 1e-9);
    }
}
