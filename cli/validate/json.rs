//! The outcome as JSON.

use serde_json::{json, Number, Value};

use crate::error::Error;

use super::comparison::{Comparison, Verdict};
use super::convergence::Ladder;
use super::finding::Finding;
use super::outcome::Outcome;

fn number(key: &str, value: f64) -> Result<Value, Error> {
    Number::from_f64(value).map(Value::Number).ok_or_else(|| Error::NotFinite { key: key.into(), value })
}

fn numbers(key: &str, values: &[f64]) -> Result<Value, Error> {
    values.iter().map(|v| number(key, *v)).collect()
}

/// A distance that may be no number: null then, with "holds" false beside it.
fn distance(value: f64) -> Value {
    Number::from_f64(value).map_or(Value::Null, Value::Number)
}

fn finding(f: &Finding) -> Value {
    json!({
        "what": f.what, "off": distance(f.off), "allowed": distance(f.allowed), "because": f.because, "holds": f.holds(),
    })
}

fn comparison(c: &Comparison) -> Value {
    json!({
        "family": c.family,
        "case": c.case,
        "quantity": c.quantity,
        "kind": c.kind,
        "source": c.source,
        "value": distance(c.value),
        "uncertainty": distance(c.uncertainty),
        "reference": distance(c.reference),
        "reference_uncertainty": distance(c.open),
        "difference": distance(c.difference()),
        "relative_error": distance(c.relative()),
        "target": distance(c.target),
        "normalised_error": distance(c.normalised()),
        "verdict": match c.verdict() {
            Verdict::Good => "holds",
            Verdict::Wide => "holds, beyond two standard uncertainties",
            Verdict::Fails => "fails",
        },
    })
}

fn ladder(l: &Ladder) -> Result<Value, Error> {
    Ok(json!({
        "name": l.name,
        "levels": l.levels,
        "values": numbers("convergence.values", &l.values)?,
        "order": l.order,
        "limits": numbers("convergence.limits", &l.limits.iter().map(|e| e.value).collect::<Vec<_>>())?,
        "limit_uncertainties":
            numbers("convergence.limits", &l.limits.iter().map(|e| e.uncertainty).collect::<Vec<_>>())?,
        "exact": l.exact,
        "holds": l.holds(),
    }))
}

/// The outcome; ends with a newline. Parts that were not done are null.
///
/// # Errors
/// A number that is none, where one has to be.
pub fn json(outcome: &Outcome) -> Result<String, Error> {
    let c = &outcome.circumstances;
    let ideal = outcome.ideal.as_ref().map(|i| {
        json!({
            "exact": i.findings.iter().map(finding).collect::<Vec<_>>(),
            "approach": i.approach.iter().map(|a| json!({
                "gap_over_length": a.delta,
                "wedge": a.beta,
                "factors": a.factors.map(distance),
                "fringe_percent": a.fringe_percent.map(distance),
                "slope_over_published": a.slope.map(distance),
                "allowed": a.allowed,
                "holds": a.holds(),
            })).collect::<Vec<_>>(),
            "bench_needs": i.reach.iter().map(|r| json!({
                "what": r.what,
                "part": r.part,
                "gap_m": distance(r.gap_m),
                "gap_continued": r.continued,
                "tilt_rad": distance(r.tilt_rad),
            })).collect::<Vec<_>>(),
        })
    });
    let ladders = outcome.ladders.as_ref().map(|l| l.iter().map(ladder).collect::<Result<Vec<_>, _>>());
    let coverage = outcome.coverage.as_ref().map(|c| {
        json!({
            "count": c.count,
            "within_one": c.within_one,
            "within_two": c.within_two,
            "median_caution": c.caution.map(distance),
            "holds": c.holds(),
        })
    });
    let (checked, failed) = outcome.judged();
    let json = json!({
        "version": c.version,
        "date": c.date,
        "machine": c.machine,
        "threads": c.threads,
        "choice": c.choice,
        "only": c.only,
        "accuracy": c.accuracy,
        "bench": c.bench,
        "demo": c.demo,
        "seconds": number("seconds", c.seconds)?,
        "ideal_limit": ideal,
        "references": outcome.comparisons.iter().map(comparison).collect::<Vec<_>>(),
        "not_solved": outcome.missing.iter().map(|m| json!({
            "family": m.family, "case": m.case, "error": m.error,
        })).collect::<Vec<_>>(),
        "waiting": outcome.waiting.iter().map(|(family, why)| json!({
            "family": family, "why": why,
        })).collect::<Vec<_>>(),
        "convergence": ladders.transpose()?,
        "coverage": coverage,
        "self_checks": outcome.own.as_ref().map(|own| own.iter().map(finding).collect::<Vec<_>>()),
        "checked": checked,
        "failed": failed,
        "holds": failed.is_empty(),
        "verdict": outcome.sentence(),
    });
    Ok(format!("{json:#}\n"))
}
