//! A table as data for the calculator of a page: all that `apply` uses, in SI, and nothing that a person typed.
//!
//! What is made of them is in `calculator.js`, which follows [`Table::correct`](crate::tables::table::Table::correct) step
//! by step; a test in a browser compares the two.

use serde_json::{json, Map, Number, Value};
use tiltgap_meshes::Dimensions;
use tiltgap_solver::EPS0;

use crate::apply::units;
use crate::error::Error;
use crate::store::Stored;
use crate::tables::axis::{Grading, ROUNDING};
use crate::tables::space::Kind;
use crate::tables::table::{Table, NAMES, STEP};

fn number(v: f64) -> Result<Value, Error> {
    let number = Number::from_f64(v).map(Value::Number);
    number.ok_or_else(|| Error::NotFinite { key: "table".into(), value: v })
}

fn numbers(values: impl IntoIterator<Item = f64>) -> Result<Value, Error> {
    values.into_iter().map(number).collect()
}

fn object(entries: impl IntoIterator<Item = (&'static str, f64)>) -> Result<Value, Error> {
    let map: Result<Map<String, Value>, Error> =
        entries.into_iter().map(|(key, v)| Ok((key.to_string(), number(v)?))).collect();
    Ok(map?.into())
}

fn grading(grading: &Grading) -> Result<Value, Error> {
    Ok(match *grading {
        Grading::Above { drop_m } => json!({ "kind": "above", "drop": number(drop_m)? }),
        Grading::Wedge { steepness } => json!({ "kind": "wedge", "steepness": number(steepness)? }),
        Grading::Edge { base_m, reach_m, height_m } => json!({
            "kind": "edges", "base": number(base_m)?, "reach": numbers([reach_m])?, "height": number(height_m)?,
        }),
        Grading::Edges { base_m, reach_m, height_m } => json!({
            "kind": "edges", "base": number(base_m)?, "reach": numbers(reach_m)?, "height": number(height_m)?,
        }),
    })
}

/// The data.
///
/// # Errors
/// A number that is none, which is a mistake in the program.
pub fn embedded(stored: &Stored, table: &Table) -> Result<Value, Error> {
    let question = &table.space.question;
    let arrangement = &question.arrangement;
    let pose = &arrangement.pose;
    let interpolant = &table.fit.interpolant;
    let mut axes = Vec::new();
    for ((axis, range), nodes) in table.space.axes.iter().zip(&stored.job.ranges).zip(interpolant.nodes()) {
        let dimension = axis.span.variable.dimension();
        axes.push(json!({
            "name": axis.span.variable.name(),
            "from": number(axis.span.from)?,
            "to": number(axis.span.to)?,
            "unit": range.unit,
            "si": number(dimension.to_si(1.0, range.unit).unwrap_or(1.0))?,
            "grading": grading(&axis.grading)?,
            "ends": numbers(axis.ends)?,
            "nodes": numbers(nodes.iter().copied())?,
        }));
    }
    let units = units(stored.job.per_metre());
    let mut quantities = Vec::new();
    for n in 0..table.in_threes() {
        quantities.push(json!({
            "name": NAMES[n],
            "unit": units[n],
            "excess": numbers(interpolant.at_nodes(n).map(|v| v[0]))?,
            "numerical": numbers(interpolant.at_nodes(n).map(|v| v[1]))?,
            "missed": number(table.fit.missed[n].uncertainty)?,
        }));
    }
    let hinge = question.hinge.map(|h| object([("arm", h.arm_m), ("height", h.height_m)])).transpose()?;
    let film =
        arrangement.film.map(|f| object([("thickness", f.thickness_m), ("ratio", f.permittivity_ratio)]));
    Ok(json!({
        "along_hinge": table.space.kind == Kind::AlongHinge,
        "axes": axes,
        "quantities": quantities,
        "lower": numbers([arrangement.lower.length_m, arrangement.lower.width_m])?,
        "upper": numbers([arrangement.upper.length_m, arrangement.upper.width_m])?,
        "cross_section": arrangement.dimensions == Dimensions::Two,
        "pose": object([("gap", pose.gap_m), ("tilt", pose.tilt_rad), ("roll", pose.roll_rad)])?,
        "shift": numbers(pose.shift_m)?,
        "hinge": hinge,
        "film": film.transpose()?,
        "permittivity": number(EPS0 * question.relative_permittivity)?,
        "rounding": ROUNDING,
        "step": STEP,
    }))
}
