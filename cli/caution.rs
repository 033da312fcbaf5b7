//! Where a person could go wrong with a result, or come to harm: one sentence or two for each.

use tiltgap_meshes::{Dimensions, Which};
use tiltgap_solver::{wedge_factors, Connection};

use crate::assess::Report;
use crate::concise::{concise_si, fixed, NotANumber};

/// Field at which air of normal density breaks down in a uniform gap of some millimetres, in V/m: common practice, no
/// source.
const BREAKDOWN_V_M: f64 = 3e6;
/// Field from which a caution is given, in V/m: edges, burrs and dust lower the breakdown by a factor 2 to 3 (common
/// practice, no source).
const CAUTION_V_M: f64 = 1e6;
/// Limit of the voltage between accessible parts in normal condition, in V d.c. ([IEC61010-1], 6.3; from memory).
const ACCESSIBLE_V: f64 = 60.0;
/// Part of the centre gap below which an edge counts as nearly touching.
const NEARLY_TOUCHING: f64 = 0.1;
/// Relative difference between k_C and k_F from which it is worth a sentence.
const DIFFERENCE: f64 = 1e-4;

/// What can hurt a person or the balance.
///
/// # Errors
/// Here and below if a number in a sentence cannot be shown.
pub fn dangers(report: &Report) -> Result<Vec<String>, NotANumber> {
    Ok([voltage(report)?, field(report)?].into_iter().flatten().collect())
}

/// Where a person could take a number for something else.
pub fn mistakes(report: &Report) -> Result<Vec<String>, NotANumber> {
    let all = [
        nearly_touching(report)?,
        no_overlap(report),
        guarded(report),
        film(report)?,
        factors_differ(report),
        torque_factor(report),
        bridge(report)?,
        tilt_sign(report),
        hinge_within(report),
        section(report),
        Some(
            "The uncertainties are numerical only. Gap, tilt and sizes have uncertainties of their own: 1 % of the gap \
             is about 2 % of force and torque."
                .into(),
        ),
    ];
    Ok(all.into_iter().flatten().collect())
}

fn voltage(report: &Report) -> Result<Option<String>, NotANumber> {
    let v = report.job.question.voltage_v.abs();
    if v <= ACCESSIBLE_V {
        return Ok(None);
    }
    Ok(Some(format!(
        "Safety: {} is above 60 V d.c., the limit for accessible parts (IEC 61010-1). Put a series resistor next to \
         the supply, switch off and discharge the plates before touching anything, and follow your local rules.",
        concise_si(v, 0.0, "V")?
    )))
}

fn field(report: &Report) -> Result<Option<String>, NotANumber> {
    let question = &report.job.question;
    // Of plates in the medium alone: a film takes its share of the voltage.
    let arrangement = &question.arrangement;
    let narrowest_m = arrangement.lowest_edge().1 - arrangement.pose.gap_m + arrangement.effective_gap_m();
    let field = question.voltage_v.abs() / narrowest_m;
    if field < CAUTION_V_M {
        return Ok(None);
    }
    let verdict = if field >= BREAKDOWN_V_M {
        "at or above the 3 kV/mm at which air breaks down: expect sparks"
    } else {
        "near the 3 kV/mm at which air breaks down"
    };
    Ok(Some(format!(
        "Sparks: the mean field in the narrowest gap ({}) is {} kV/mm, {verdict} (common practice); edges and dust \
         lower that by a factor 2 to 3.",
        concise_si(rounded(narrowest_m), 0.0, "m")?,
        fixed(field / 1e6, 2)
    )))
}

/// To three digits, for sentences.
fn rounded(v: f64) -> f64 {
    format!("{v:.2e}").parse().unwrap_or(v)
}

fn nearly_touching(report: &Report) -> Result<Option<String>, NotANumber> {
    let arrangement = &report.job.question.arrangement;
    let (edge, height_m) = arrangement.lowest_edge();
    let (height_m, part) = (height_m - arrangement.film_m(), arrangement.narrowness());
    if part >= NEARLY_TOUCHING {
        return Ok(None);
    }
    Ok(Some(format!(
        "Nearly touching: the {edge} stands {} above the {}, {} % of {} gap. A little dust, bow or \
         error of tilt there changes force and torque a lot.",
        concise_si(rounded(height_m), 0.0, "m")?,
        if arrangement.film.is_some() { "film" } else { "lower plate" },
        fixed(100.0 * part, 1),
        if arrangement.film.is_some() { "the free centre" } else { "the centre" }
    )))
}

fn no_overlap(report: &Report) -> Option<String> {
    (report.job.question.arrangement.overlap().area_m2() == 0.0)
        .then(|| "The plates do not overlap: the ideal formula gives zero, and there are no factors.".into())
}

/// With a guard ring the numbers are of the plate without it.
fn guarded(report: &Report) -> Option<String> {
    Some(match report.job.bench.guard?.around {
        Which::Upper => "The upper plate has a guard ring: charge, force, torque and factors are those of the plate alone. If \
                         the ring hangs on the beam too, the balance feels both together."
            .into(),
        Which::Lower => "The lower plate has a guard ring: charge and factors are those of the lower plate alone, and so \
                         are force and torque, taken as what it alone does to the upper plate. The balance feels the upper \
                         plate in all, which is stated apart."
            .into(),
    })
}

/// Which gap the ideal formula takes with a film.
fn film(report: &Report) -> Result<Option<String>, NotANumber> {
    let arrangement = &report.job.question.arrangement;
    if arrangement.film.is_none() {
        return Ok(None);
    }
    Ok(Some(format!(
        "The ideal formula takes the effective gap (d - t) + t/e_r = {} (t, e_r: thickness and permittivity of the film, the \
         latter over that of the medium). Charge that settles on the film changes the force and is not in any number.",
        concise_si(rounded(arrangement.effective_gap_m()), 0.0, "m")?
    )))
}

fn factors_differ(report: &Report) -> Option<String> {
    let factors = &report.assessment.factors;
    let (Some(c), Some(f)) = (factors.capacitance, factors.force) else { return None };
    let wrong = c.value / f.value - 1.0;
    (wrong.abs() >= DIFFERENCE).then(|| {
        format!(
            "k_C is not k_F: a force corrected with the factor of the capacitance would be wrong by {} %. Correct a \
             charge with k_C, a force with k_F, a torque with k_T.",
            signed(100.0 * wrong)
        )
    })
}

fn torque_factor(report: &Report) -> Option<String> {
    let factors = &report.assessment.factors;
    let (Some(f), Some(t)) = (factors.force, factors.torque) else { return None };
    let wrong = f.value / t.value - 1.0;
    (wrong.abs() >= DIFFERENCE).then(|| {
        format!(
            "Masses on the beam balance the torque about the hinge: that takes k_T; with k_F it would be wrong by {} %.",
            signed(100.0 * wrong)
        )
    })
}

/// Two decimals and always a sign.
pub fn signed(percent: f64) -> String {
    let text = fixed(percent, 2);
    if text.starts_with('-') {
        text
    } else {
        format!("+{text}")
    }
}

/// A bridge with the guard at 0 V reads the direct capacitance of the two plates (common practice, no source).
fn bridge(report: &Report) -> Result<Option<String>, NotANumber> {
    let (question, a) = (&report.job.question, &report.assessment);
    let direct = a.capacitance_matrix_f[1][0];
    let apart = (a.capacitance_f.value + direct.value).abs();
    // With a guard ring the matrix has plate and ring as one, and C is of the plate alone.
    let guarded = question.arrangement.guard.is_some();
    if guarded
        || question.arrangement.dimensions == Dimensions::Two
        || apart <= DIFFERENCE * a.capacitance_f.value
    {
        return Ok(None);
    }
    Ok(Some(format!(
        "C is the charge on the upper plate over the voltage, in this wiring. A three-terminal bridge reads the direct \
         capacitance, minus the off-diagonal of the matrix: {}.",
        concise_si(-direct.value, direct.uncertainty, "F")?
    )))
}

fn tilt_sign(report: &Report) -> Option<String> {
    let question = &report.job.question;
    let mut turned = question.arrangement;
    let tilt_rad = turned.pose.tilt_rad;
    if tilt_rad == 0.0 {
        return None;
    }
    let low = if tilt_rad > 0.0 { "hinge (-x)" } else { "free (+x)" };
    turned.pose.tilt_rad = -tilt_rad;
    let effect = question.hinge.and_then(|hinge| {
        let [here, there] = [&question.arrangement, &turned].map(wedge_factors);
        let [here, there] = [here?, there?].map(|w| fixed(w.torque(hinge.arm_m), 3));
        Some(format!(", which turns the wedge factor of the torque from {here} into {there}"))
    });
    Some(format!(
        "Positive tilt raises the free (+x) edge; here the {low} edge is the lower one. If your beam leans the other \
         way, change the sign{}.",
        effect.unwrap_or_default()
    ))
}

fn hinge_within(report: &Report) -> Option<String> {
    let hinge = report.job.question.hinge?;
    let half = report.job.question.arrangement.upper.length_m / 2.0;
    (hinge.arm_m < half).then(|| {
        "The hinge lies above the upper plate (the arm is less than half its length): part of the plate pulls the \
         other way."
            .into()
    })
}

fn section(report: &Report) -> Option<String> {
    let job = &report.job;
    if job.question.arrangement.dimensions != Dimensions::Two {
        return None;
    }
    let chosen = if job.floating_chosen {
        "The floating connection was chosen, since the bench states none and the grounded one is not defined per \
         metre in open surroundings. "
    } else {
        ""
    };
    let own = if job.question.connection == Connection::Floating {
        " The capacitance matrix depends on how far away the potential is taken as zero (20 plate lengths or more); C, \
         force and torque do not."
    } else {
        ""
    };
    Some(format!(
        "{chosen}All results are per metre of width of very wide plates; the widths of the bench do not enter.{own}"
    ))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::report;

    fn all(report: &Report) -> Vec<String> {
        [dangers(report).unwrap(), mistakes(report).unwrap()].concat()
    }

    fn starting<'a>(all: &'a [String], with: &str) -> Option<&'a str> {
        all.iter().map(String::as_str).find(|c| c.starts_with(with))
    }

    #[test]
    fn the_demo_has_the_usual_ones() {
        let all = all(&report());
        let expected = [
            "Safety: 400 V is above 60 V d.c., the limit for accessible parts (IEC 61010-1). Put a series resistor next \
             to the supply, switch off and discharge the plates before touching anything, and follow your local rules.",
            "k_C is not k_F: a force corrected with the factor of the capacitance would be wrong by +15.56 %. Correct a \
             charge with k_C, a force with k_F, a torque with k_T.",
            "Masses on the beam balance the torque about the hinge: that takes k_T; with k_F it would be wrong by \
             +2.27 %.",
            "C is the charge on the upper plate over the voltage, in this wiring. A three-terminal bridge reads the \
             direct capacitance, minus the off-diagonal of the matrix: 24.000(2) pF.",
            "Positive tilt raises the free (+x) edge; here the hinge (-x) edge is the lower one. If your beam leans the \
             other way, change the sign, which turns the wedge factor of the torque from 0.986 into 1.033.",
            "The uncertainties are numerical only. Gap, tilt and sizes have uncertainties of their own: 1 % of the gap \
             is about 2 % of force and torque.",
        ];
        assert_eq!(all, expected);
    }

    #[test]
    fn low_voltage_and_parallel_equal_factors_need_none() {
        let mut r = report();
        r.job.question.voltage_v = -60.0;
        r.job.question.arrangement.pose.tilt_rad = 0.0;
        r.assessment.factors.capacitance = r.assessment.factors.force;
        r.assessment.factors.torque = r.assessment.factors.force;
        r.assessment.capacitance_f.value = 24e-12;
        assert_eq!(all(&r).len(), 1);
    }

    #[test]
    fn strong_fields_and_narrow_edges() {
        let mut r = report();
        r.job.question.voltage_v = -3900.0;
        let near = all(&r);
        assert_eq!(
            starting(&near, "Sparks"),
            Some(
                "Sparks: the mean field in the narrowest gap (3.62 mm) is 1.08 kV/mm, near the 3 kV/mm at which air \
                 breaks down (common practice); edges and dust lower that by a factor 2 to 3."
            )
        );
        assert_eq!(starting(&near, "Nearly"), None);
        r.job.question.arrangement.pose.gap_m = 0.4e-3;
        let touching = all(&r);
        assert!(starting(&touching, "Sparks").unwrap().contains("at or above the 3 kV/mm"));
        assert_eq!(
            starting(&touching, "Nearly"),
            Some(
                "Nearly touching: the hinge (-x) edge stands 16 µm above the lower plate, 4.0 % of the centre gap. A \
                 little dust, bow or error of tilt there changes force and torque a lot."
            )
        );
    }

    #[test]
    fn odd_arrangements() {
        let mut r = report();
        r.job.question.arrangement.pose.shift_m = [0.2, 0.0];
        r.job.question.hinge = r.job.question.hinge.map(|h| tiltgap_solver::Hinge { arm_m: 0.05, ..h });
        let all = all(&r);
        assert!(starting(&all, "The plates do not overlap").is_some());
        assert!(starting(&all, "The hinge lies above the upper plate").is_some());
    }

    #[test]
    fn a_cross_section_says_what_was_chosen() {
        let mut r = report();
        r.job.question.arrangement.dimensions = Dimensions::Two;
        r.job.question.connection = Connection::Floating;
        let plain = all(&r);
        assert!(starting(&plain, "All results are per metre of width").is_some());
        r.job.floating_chosen = true;
        assert!(starting(&all(&r), "The floating connection was chosen").is_some());
    }
}
