//! The report as JSON, in SI units.
//!
//! Numbers read back to the same bits. JSON has no NaN and no infinity, and `serde_json` would write null for them in
//! silence; here every number goes through a check that refuses them.

use serde_json::{json, Map, Number, Value};
use tiltgap_meshes::{Dimensions, Which};
use tiltgap_solver::{Components, Connection, Estimate, Factor, ForceAndTorque};

use crate::assess::Report;
use crate::caution::{dangers, mistakes};
use crate::error::Error;

/// An object under construction; its numbers are finite.
struct Object(Map<String, Value>);

fn number(key: &str, value: f64) -> Result<Value, Error> {
    Number::from_f64(value).map(Value::Number).ok_or_else(|| Error::NotFinite { key: key.into(), value })
}

fn numbers(key: &str, values: &[f64]) -> Result<Value, Error> {
    values.iter().map(|v| number(key, *v)).collect()
}

fn estimate(key: &str, e: Estimate) -> Result<Value, Error> {
    Ok(json!({ "value": number(key, e.value)?, "uncertainty": number(key, e.uncertainty)? }))
}

fn vector(key: &str, v: &Components) -> Result<Value, Error> {
    let [x, y, z] = v.map(|e| estimate(key, e));
    Ok(json!({ "x": x?, "y": y?, "z": z? }))
}

fn factor(key: &str, f: &Option<Factor>) -> Result<Value, Error> {
    let Some(f) = f else { return Ok(Value::Null) };
    Ok(json!({
        "value": number(key, f.value)?,
        "uncertainty": number(key, f.uncertainty)?,
        "wedge": number(key, f.wedge)?,
        "fringe": number(key, f.fringe)?,
    }))
}

fn force_and_torque(key: &str, all: &ForceAndTorque) -> Result<Value, Error> {
    let hinge =
        all.torque_hinge_nm.as_ref().map(|t| vector(&format!("{key}.torque_hinge_nm"), t)).transpose()?;
    Ok(json!({
        "force_n": vector(&format!("{key}.force_n"), &all.force_n)?,
        "torque_hinge_nm": hinge,
        "torque_centre_nm": vector(&format!("{key}.torque_centre_nm"), &all.torque_centre_nm)?,
    }))
}

impl Object {
    fn put(&mut self, key: &str, value: impl Into<Value>) {
        self.0.insert(key.into(), value.into());
    }

    fn number(&mut self, key: &str, value: f64) -> Result<(), Error> {
        self.put(key, number(key, value)?);
        Ok(())
    }
}

/// "grounded" or "floating".
pub fn wiring(connection: Connection) -> &'static str {
    match connection {
        Connection::Grounded => "grounded",
        Connection::Floating => "floating",
    }
}

/// The report; ends with a newline.
///
/// # Errors
/// [`Error::NotFinite`] with the key of the first number that is none.
pub fn report_json(report: &Report) -> Result<String, Error> {
    let (job, a) = (&report.job, &report.assessment);
    let pose = &job.question.arrangement.pose;
    let mut bench = job.bench.as_given.clone();
    bench.insert("demo".into(), job.bench.demo.into());
    let mut out = Object(Map::new());
    out.put("version", env!("CARGO_PKG_VERSION"));
    out.put("bench", bench);
    out.put(
        "pose",
        json!({
            "gap_m": number("pose.gap_m", pose.gap_m)?,
            "tilt_rad": number("pose.tilt_rad", pose.tilt_rad)?,
            "roll_rad": number("pose.roll_rad", pose.roll_rad)?,
            "shift_m": numbers("pose.shift_m", &pose.shift_m)?,
        }),
    );
    out.put("dimensions", if job.question.arrangement.dimensions == Dimensions::Two { 2 } else { 3 });
    out.put("connection", wiring(job.question.connection));
    out.number("voltage_v", job.question.voltage_v)?;
    out.number("accuracy", job.params.accuracy)?;
    let matrix = |key: &str, part: fn(&Estimate) -> f64| -> Result<Value, Error> {
        a.capacitance_matrix_f.iter().map(|row| numbers(key, &[part(&row[0]), part(&row[1])])).collect()
    };
    let key = "capacitance_matrix_f";
    out.put(key, matrix(key, |e| e.value)?);
    let key = "capacitance_matrix_uncertainty_f";
    out.put(key, matrix(key, |e| e.uncertainty)?);
    for (key, e) in
        [("capacitance_f", a.capacitance_f), ("charge_upper_c", a.charge_upper_c), ("energy_j", a.energy_j)]
    {
        out.put(key, estimate(key, e)?);
    }
    out.put("force_n", vector("force_n", &a.force_n)?);
    let hinge = a.torque_hinge_nm.as_ref().map(|t| vector("torque_hinge_nm", t)).transpose()?;
    out.put("torque_hinge_nm", hinge);
    out.put("torque_centre_nm", vector("torque_centre_nm", &a.torque_centre_nm)?);
    if let Some(guard) = &a.guard {
        out.put(
            "guard",
            json!({
                "around": match job.bench.guard.map(|g| g.around) {
                    Some(Which::Lower) => "lower_plate",
                    _ => "upper_plate",
                },
                "capacitance_f": estimate("guard.capacitance_f", guard.capacitance_f)?,
                "ring": force_and_torque("guard.ring", &guard.ring)?,
                "beam": force_and_torque("guard.beam", &guard.beam)?,
            }),
        );
    }
    out.put(
        "ideal",
        json!({
            "gap_m": number("ideal.gap_m", job.question.arrangement.effective_gap_m())?,
            "capacitance_f": number("ideal.capacitance_f", a.ideal.capacitance_f)?,
            "force_n": number("ideal.force_n", a.ideal.force_n)?,
            "torque_nm": a.ideal.torque_nm.map(|t| number("ideal.torque_nm", t)).transpose()?,
        }),
    );
    out.put(
        "factors",
        json!({
            "capacitance": factor("factors.capacitance", &a.factors.capacitance)?,
            "force": factor("factors.force", &a.factors.force)?,
            "torque": factor("factors.torque", &a.factors.torque)?,
        }),
    );
    out.put("numerics", numerics(report)?);
    out.put("cautions", [dangers(report)?, mistakes(report)?].concat());
    Ok(format!("{:#}\n", Value::Object(out.0)))
}

fn numerics(report: &Report) -> Result<Value, Error> {
    let a = &report.assessment;
    let levels: Result<Vec<Value>, Error> = a
        .levels
        .iter()
        .map(|l| {
            Ok(json!({
                "q": l.q,
                "nodes": l.nodes,
                "outer_iterations": l.outer_iterations,
                "inner_iterations": number("numerics.levels.inner_iterations", l.inner_iterations)?,
                "residual": number("numerics.levels.residual", l.residual)?,
                "seconds": number("numerics.levels.seconds", l.seconds)?,
            }))
        })
        .collect();
    let order = a.observed_order.map(|o| number("numerics.observed_order", o)).transpose()?;
    Ok(json!({
        "levels": levels?,
        "observed_order": order,
        "seconds": number("numerics.seconds", report.seconds)?,
        "peak_memory_bytes": report.peak_memory_bytes,
        "threads": report.job.threads,
    }))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::report;

    fn parsed(report: &Report) -> Value {
        serde_json::from_str(&report_json(report).unwrap()).unwrap()
    }

    #[test]
    fn keys_and_values() {
        let json = parsed(&report());
        let keys: Vec<&str> = json.as_object().unwrap().keys().map(String::as_str).collect();
        let expected = [
            "version",
            "bench",
            "pose",
            "dimensions",
            "connection",
            "voltage_v",
            "accuracy",
            "capacitance_matrix_f",
            "capacitance_matrix_uncertainty_f",
            "capacitance_f",
            "charge_upper_c",
            "energy_j",
            "force_n",
            "torque_hinge_nm",
            "torque_centre_nm",
            "ideal",
            "factors",
            "numerics",
            "cautions",
        ];
        assert_eq!(keys, expected);
        assert_eq!(json["bench"]["demo"], true);
        assert_eq!(json["bench"]["pose"]["gap"], "4 mm");
        assert_eq!(
            json["pose"],
            json!({"gap_m": 0.004, "tilt_rad": 0.4f64.to_radians(), "roll_rad": 0.0, "shift_m": [0.0, 0.0]})
        );
        assert_eq!((&json["dimensions"], &json["connection"]), (&json!(3), &json!("grounded")));
        assert_eq!(json["capacitance_matrix_f"], json!([[26e-12, -24e-12], [-24e-12, 26e-12]]));
        assert_eq!(json["force_n"]["z"], json!({"value": -450e-6, "uncertainty": 3e-9}));
        assert_eq!(json["torque_hinge_nm"]["y"]["value"], 66e-6);
        assert_eq!(
            json["ideal"],
            json!({"gap_m": 0.004, "capacitance_f": 20e-12, "force_n": 400e-6, "torque_nm": 60e-6})
        );
        assert_eq!(json["factors"]["force"]["wedge"], 1.02);
        assert_eq!(json["numerics"]["levels"][1]["nodes"], 66_220);
        assert_eq!(json["numerics"]["peak_memory_bytes"], 46_500_000);
    }

    #[test]
    fn what_is_not_there_is_null() {
        let mut r = report();
        r.assessment.torque_hinge_nm = None;
        r.assessment.ideal.torque_nm = None;
        r.assessment.factors.torque = None;
        r.assessment.observed_order = None;
        r.peak_memory_bytes = None;
        let json = parsed(&r);
        for value in [
            &json["torque_hinge_nm"],
            &json["ideal"]["torque_nm"],
            &json["factors"]["torque"],
            &json["numerics"]["observed_order"],
            &json["numerics"]["peak_memory_bytes"],
        ] {
            assert_eq!(*value, Value::Null);
        }
    }

    #[test]
    fn numbers_read_back_to_the_same_bits() {
        let mut r = report();
        for value in [1.0 / 3.0, f64::MIN_POSITIVE, 5e-324, 1.797e308, -0.0, 2.6179962046217393e-11] {
            r.assessment.energy_j.value = value;
            let back = parsed(&r)["energy_j"]["value"].as_f64().unwrap();
            assert_eq!(back.to_bits(), value.to_bits());
        }
    }

    #[test]
    fn nan_and_infinity_are_refused_with_their_key() {
        let mut r = report();
        r.assessment.torque_centre_nm[1].uncertainty = f64::NAN;
        assert!(report_json(&r).unwrap_err().to_string().contains("torque_centre_nm is NaN"));
        let mut r = report();
        r.assessment.levels[0].residual = f64::INFINITY;
        assert!(report_json(&r).unwrap_err().to_string().contains("numerics.levels.residual is inf"));
    }
}
