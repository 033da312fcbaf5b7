//! Pictures of a table of factors: the factor in curves, and the error of the ideal formula as a map.
//!
//! Nothing is solved: the table is interpolated at many places. This decides which axis goes where; the pictures are in
//! [`factors`](super::factors) and [`error_map`](super::error_map).

use std::io::{Read, Write};
use std::path::Path;

use tiltgap_solver::Connection;

use super::error_map::{error_map, ErrorMap};
use super::factors::{factors, Curve, FactorCurves};
use super::output::Target;
use super::sheet::Sheet;
use super::ticks::short;
use super::{render, DrawError};
use crate::apply::load;
use crate::arguments::{BenchArguments, DrawArguments, Factor, Format, What};
use crate::error::Error;
use crate::ranges::Range;
use crate::report_json::wiring;
use crate::show::FACTORS;
use crate::store::{Format as Stage, StoreError, Stored};
use crate::tables::axis::{Variable, ROUNDING};
use crate::tables::table::Table;

/// Places along a curve, and along the two axes of a map: more than a printed page tells apart.
const ALONG_A_CURVE: usize = 201;
const ALONG_A_MAP: [usize; 2] = [121, 81];
/// Most curves in one picture.
const MOST_CURVES: usize = 6;
/// Significant digits in captions and legends.
const DIGITS: usize = 4;

/// Whether a picture shows a table.
pub fn shows(what: What) -> bool {
    matches!(what, What::Factors | What::Error)
}

/// The bench in a table, and the options that make it the one of the table; none if the file is no table.
///
/// What is wrong with a file that is neither is told by whoever reads it as a bench.
pub fn bench_of_table(arguments: &BenchArguments) -> Option<(BenchArguments, String)> {
    let path = arguments.bench.as_deref().filter(|path| *path != Path::new("-"))?;
    let stored = Stored::load(path).ok().filter(|s| s.format == Stage::Table)?;
    let mut bench = stored.job_json["bench"].as_object()?.clone();
    bench.retain(|_, v| !v.is_null());
    let mut options = BenchArguments { bench: Some("-".into()), ..arguments.clone() };
    options.per_metre |= stored.job.per_metre();
    options.connection.get_or_insert_with(|| wiring(stored.job.question.connection).into());
    Some((options, serde_json::Value::from(bench).to_string()))
}

/// Draws a table.
///
/// # Errors
/// If it cannot be read, has no such factor or too few axes, or the output cannot be written.
pub fn draw(arguments: &DrawArguments, stdin: &mut dyn Read, stdout: &mut dyn Write) -> Result<(), Error> {
    let target = Target::new(&arguments.output);
    let format = super::format(arguments, &target)?;
    if format == Format::Vts {
        return Err(DrawError::TableAsField.into());
    }
    let bench = &arguments.bench;
    for (option, given) in [
        ("--gap", bench.gap.is_some()),
        ("--tilt", bench.tilt.is_some()),
        ("--roll", bench.roll.is_some()),
        ("--voltage", bench.voltage.is_some()),
        ("--connection", bench.connection.is_some()),
        ("--per-metre", bench.per_metre),
        ("--level", arguments.level.is_some()),
    ] {
        if given {
            return Err(DrawError::NotOfATable(option).into());
        }
    }
    let path = bench.bench.as_deref().ok_or(DrawError::NoTable)?;
    target.check()?;
    let stored = load(path, stdin).map_err(|error| match error {
        StoreError::Foreign(path) => Error::from(DrawError::ABench(path.display().to_string())),
        other => other.into(),
    })?;
    let table = stored.table(path)?;
    let factor = arguments.quantity.unwrap_or(Factor::Force);
    if factor == Factor::Torque && !table.has_torque() {
        return Err(Error::NoTorque);
    }
    let view = View { stored: &stored, table: &table, factor: factor.number() };
    let sheet = match arguments.what {
        What::Error => view.error()?,
        _ => view.factors(),
    };
    let bytes = match format {
        Format::Png => render::png(&sheet)?,
        _ => render::svg(&sheet)?.into_bytes(),
    };
    target.write(&bytes, stdout)
}

/// A table and the factor that is shown of it.
struct View<'a> {
    stored: &'a Stored,
    table: &'a Table,
    factor: usize,
}

fn unit(range: &Range) -> &str {
    if range.unit == "deg" {
        "°"
    } else {
        range.unit
    }
}

fn label(range: &Range) -> String {
    format!("{} ({})", range.span.variable.name(), unit(range))
}

/// "tilt 0.4°", "gap 4 mm".
fn value(range: &Range, si: f64) -> String {
    let blank = if unit(range) == "°" { "" } else { " " };
    // What is nothing but rounding beside the range is zero.
    let shown = range.shown(si);
    let whole = range.shown(range.span.to) - range.shown(range.span.from);
    let shown = if shown.abs() < ROUNDING * whole { 0.0 } else { shown };
    format!("{} {}{blank}{}", range.span.variable.name(), short(shown, DIGITS), unit(range))
}

impl View<'_> {
    fn ranges(&self) -> &[Range] {
        &self.stored.job.ranges
    }

    /// Numbers of the axes in the order of the picture: the gap goes along x, tilt before roll across.
    fn order(&self) -> Vec<usize> {
        let rank = |n: &usize| match self.ranges()[*n].span.variable {
            Variable::Gap | Variable::Angle => 0,
            Variable::Tilt => 1,
            Variable::Roll => 2,
        };
        let mut order: Vec<usize> = (0..self.ranges().len()).collect();
        order.sort_by_key(rank);
        order
    }

    /// A place with the values of the bench, as far as they are in the table, where the picture has no axis.
    fn rest(&self) -> Vec<f64> {
        let pose = &self.table.space.question.arrangement.pose;
        let own = |r: &Range| match r.span.variable {
            Variable::Gap => pose.gap_m,
            Variable::Tilt => pose.tilt_rad,
            Variable::Roll => pose.roll_rad,
            Variable::Angle => 0.0,
        };
        self.ranges().iter().map(|r| own(r).clamp(r.span.from, r.span.to)).collect()
    }

    /// Lines below the title: what is shown, and what is held.
    fn lines(&self, what: String, held: &[usize]) -> Vec<String> {
        let job = &self.stored.job;
        let mut parts = vec![match job.question.connection {
            Connection::Grounded => "lower plate and surroundings grounded".to_string(),
            Connection::Floating => "floating pair".into(),
        }];
        if job.per_metre() {
            parts.push("cross-section, wide plates".into());
        }
        let rest = self.rest();
        parts.extend(held.iter().map(|n| value(&self.ranges()[*n], rest[*n])));
        vec![what, parts.join(" · ")]
    }

    fn factors(&self) -> Sheet {
        let order = self.order();
        let (symbol, name) = FACTORS[self.factor];
        let along = &self.ranges()[order[0]];
        let places = along.span.evenly(ALONG_A_CURVE);
        let curve = |across: Option<(usize, f64)>| {
            let mut at = self.rest();
            let name = match across {
                Some((n, v)) => {
                    at[n] = v;
                    value(&self.ranges()[n], v)
                }
                None => symbol.into(),
            };
            let known: Vec<_> = places
                .iter()
                .map(|v| {
                    at[order[0]] = *v;
                    self.table.factors(&at)[self.factor].factor
                })
                .collect();
            Curve {
                name,
                values: known.iter().map(|k| k.value).collect(),
                uncertainties: known.iter().map(|k| k.uncertainty()).collect(),
            }
        };
        let curves = match order.get(1) {
            None => vec![curve(None)],
            Some(n) => {
                let printed = self.ranges()[*n].printed_values();
                let shown = if printed.len() <= MOST_CURVES {
                    printed
                } else {
                    self.ranges()[*n].span.evenly(MOST_CURVES)
                };
                shown.into_iter().map(|v| curve(Some((*n, v)))).collect()
            }
        };
        let what = format!("Correction factor of {name}: full value = ideal value × {symbol}");
        factors(&FactorCurves {
            title: self.stored.job.bench.title.clone(),
            lines: self.lines(what, order.get(2..).unwrap_or_default()),
            factor: format!("factor {symbol}"),
            along: label(along),
            places: places.iter().map(|v| along.shown(*v)).collect(),
            curves,
        })
    }

    fn error(&self) -> Result<Sheet, DrawError> {
        let order = self.order();
        let [along, across, held @ ..] = &order[..] else {
            return Err(DrawError::OneAxis(self.ranges()[0].span.variable.name()));
        };
        let [x, y] = [(*along, ALONG_A_MAP[0]), (*across, ALONG_A_MAP[1])]
            .map(|(n, count)| self.ranges()[n].span.evenly(count));
        let mut at = self.rest();
        let mut percent = Vec::new();
        for v in &y {
            at[*across] = *v;
            let mut row = Vec::new();
            for u in &x {
                at[*along] = *u;
                row.push(self.table.factors(&at)[self.factor].error_percent());
            }
            percent.push(row);
        }
        let what = format!(
            "Error of the ideal formula for {}, in per cent of the full value; minus: it gives too little",
            FACTORS[self.factor].1
        );
        let shown = |n: usize, values: &[f64]| values.iter().map(|v| self.ranges()[n].shown(*v)).collect();
        Ok(error_map(&ErrorMap {
            title: self.stored.job.bench.title.clone(),
            lines: self.lines(what, held),
            axes: [*along, *across].map(|n| label(&self.ranges()[n])),
            x: shown(*along, &x),
            y: shown(*across, &y),
            percent,
        }))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::{campaign, table, table_job};
    use crate::store::text;

    #[test]
    fn curves_and_map_are_those_of_the_table() {
        let (job, table) = (table_job(), table());
        let space = job.space().unwrap();
        let file = text(Stage::Table, &job, &space, None, &campaign(&space), Some(&table)).unwrap();
        let stored = Stored::read(Path::new("t.json"), file.as_bytes()).unwrap();
        let view = View { stored: &stored, table: &table, factor: 1 };
        assert_eq!(view.order(), [0, 1]);
        // The bench's own pose, 4 mm and 0.4 deg.
        assert!((view.rest()[0] - 0.004).abs() < 1e-15 && (view.rest()[1].to_degrees() - 0.4).abs() < 1e-12);
        let svg = render::svg(&view.factors()).unwrap();
        for text in ["factor k_F", "gap (mm)", "tilt 0°", "tilt 1°"] {
            assert!(svg.contains(text), "{text}");
        }
        // The invented force is 1.4 % and more above the ideal one, so the error is below -1.
        let svg = render::svg(&view.error().unwrap()).unwrap();
        for text in ["tilt (°)", "gap (mm)", "−2 %", "−5 %"] {
            assert!(svg.contains(text), "{text}");
        }
        assert!(!svg.contains("−0.5 %"));
    }
}
