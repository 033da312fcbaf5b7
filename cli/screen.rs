//! The report for a person: one table of what the ideal formula gives and what is really there, how the difference
//! divides into wedge and fringe, and what to mind.

use std::f64::consts::PI;

use serde_json::Value;
use tiltgap_meshes::{Dimensions, Surroundings, Which};
use tiltgap_solver::{Components, Connection, Estimate, Factor, ForceAndTorque};

use crate::assess::{Job, Report};
use crate::caution::{dangers, mistakes, signed};
use crate::concise::{concise, concise_si, decimals, fixed, NotANumber, Scale};
use crate::keys::CLEARANCES;
use crate::progress::grouped;
use crate::table::{paragraph, Table};

/// Longest text of a quantity that is shown as it was written; a longer one is shown from its value.
const AS_WRITTEN: usize = 16;

/// One line of the main table.
struct Row {
    name: &'static str,
    unit: &'static str,
    symbol: &'static str,
    ideal: f64,
    full: Estimate,
    factor: Option<Factor>,
}

/// The whole text.
///
/// # Errors
/// If a number cannot be shown.
pub fn screen(report: &Report) -> Result<String, NotANumber> {
    let parts = [
        head(report)?,
        main_table(report)?,
        shares(report),
        wrench(report)?,
        guard(report)?,
        matrix(report)?,
        numerics(report)?,
        minding(report)?,
    ];
    let parts: Vec<&str> = parts.iter().map(String::as_str).filter(|p| !p.is_empty()).collect();
    Ok(parts.join("\n"))
}

fn two_dimensional(job: &Job) -> bool {
    job.question.arrangement.dimensions == Dimensions::Two
}

/// The unit, per metre if it is a cross-section.
fn per_metre(job: &Job, unit: &str) -> String {
    if two_dimensional(job) {
        format!("{unit}/m")
    } else {
        unit.into()
    }
}

/// A quantity of the bench as it was written, or from its value if that is long.
fn written(text: &Value, si: f64, unit: &str) -> Result<String, NotANumber> {
    match text.as_str() {
        Some(text) if text.chars().count() <= AS_WRITTEN => Ok(text.into()),
        _ if unit == "deg" => Ok(format!("{} deg", concise(si * 180.0 / PI, 0.0)?)),
        _ => concise_si(si, 0.0, unit),
    }
}

fn head(report: &Report) -> Result<String, NotANumber> {
    let job = &report.job;
    let (bench, given) = (&job.bench, &job.bench.as_given);
    let mut text = paragraph("", &format!("tiltgap {}: {}", env!("CARGO_PKG_VERSION"), bench.title));
    if bench.demo {
        let note =
            "No bench file was given: this is the built-in demo bench (invented; `tiltgap demo` prints it).";
        text.push_str(&paragraph("", note));
    }
    text.push('\n');
    let length = |group: &str, key: &str, si: f64| written(&given[group][key], si, "m");
    let plate = |group: &str, p: &tiltgap_meshes::Plate| -> Result<String, NotANumber> {
        let long = length(group, "length", p.length_m)?;
        let thick = length(group, "thickness", p.thickness_m)?;
        let mut text = if two_dimensional(job) {
            format!("length {long}, very wide, thickness {thick}")
        } else {
            let wide = length(group, "width", p.width_m)?;
            format!("{long} x {wide} (length x width), thickness {thick}")
        };
        let part = |key: &str, name: &str, si: f64| written(&given[group][key][name], si, "m");
        if let Some(guard) = bench.guard.filter(|_| given[group].get("guard").is_some()) {
            let (slot, rim) = (part("guard", "slot", guard.slot_m)?, part("guard", "rim", guard.rim_m)?);
            text += &format!("; guard ring {rim} wide after a slot of {slot}");
        }
        if let Some(film) = bench.film.filter(|_| given[group].get("film").is_some()) {
            let thick = part("film", "thickness", film.thickness_m)?;
            let permittivity = film.permittivity_ratio * bench.relative_permittivity;
            text += &format!("; film {thick}, relative permittivity {}", concise(permittivity, 0.0)?);
        }
        Ok(text)
    };
    let pose = &bench.pose;
    let angle = |key: &str, si: f64| written(&given["pose"][key], si, "deg");
    let shift = |n: usize| written(&given["pose"]["shift"][n], pose.shift_m[n], "m");
    let voltage = written(&given["drive"]["voltage"], bench.voltage_v, "V")?;
    let wiring = match job.question.connection {
        Connection::Grounded => {
            format!("{voltage} on the upper plate; lower plate and surroundings at 0 V (grounded)")
        }
        Connection::Floating => {
            format!("{voltage} between the plates, which carry no net charge (floating)")
        }
    };
    let mut lines = vec![
        ("Lower plate", plate("lower_plate", &bench.lower)?),
        ("Upper plate", plate("upper_plate", &bench.upper)?),
        (
            "Pose",
            format!(
                "gap {}, tilt {}, roll {}, shift {}, {}",
                length("pose", "gap", pose.gap_m)?,
                angle("tilt", pose.tilt_rad)?,
                angle("roll", pose.roll_rad)?,
                shift(0)?,
                shift(1)?
            ),
        ),
        ("Edge gaps", edge_gaps(job)?),
    ];
    lines.push((
        "Hinge",
        match &bench.hinge {
            Some(hinge) => format!(
                "arm {}, height {}",
                length("hinge", "arm", hinge.arm_m)?,
                length("hinge", "height", hinge.height_m)?
            ),
            None => "none in the bench: torque about the centre of the upper plate only".into(),
        },
    ));
    lines.push(("Drive", wiring));
    lines.push(("Surroundings", surroundings(report)?));
    for (name, what) in lines {
        text.push_str(&paragraph(&format!("{name:<14}"), &what));
    }
    Ok(text)
}

fn surroundings(report: &Report) -> Result<String, NotANumber> {
    let bench = &report.job.bench;
    let given = &bench.as_given["surroundings"];
    let walls = bench.surroundings.walls().by_axis();
    let mut parts = Vec::new();
    for (names, walls) in CLEARANCES.iter().zip(walls) {
        for (name, wall) in names.iter().zip(walls) {
            if let Some(si) = wall {
                parts.push(format!("{} {}", name.replace('_', " "), written(&given[*name], si, "m")?));
            }
        }
    }
    let what = match bench.surroundings {
        Surroundings::Open | Surroundings::InsulatedWalls => "open".into(),
        Surroundings::GroundedFloor { .. } => format!("grounded floor, {}", parts.join(", ")),
        Surroundings::GroundedBox(_) => format!("grounded box, {}", parts.join(", ")),
    };
    Ok(format!("{what}; relative permittivity {}", concise(bench.relative_permittivity, 0.0)?))
}

fn edge_gaps(job: &Job) -> Result<String, NotANumber> {
    let edges = job.question.arrangement.edge_gaps();
    let scale = Scale::suited(job.question.arrangement.pose.gap_m, "m");
    let show = |v: f64| fixed(scale.of(v), 4);
    let mut text = format!("hinge (-x) {}, free (+x) {}", show(edges.hinge_edge_m), show(edges.free_edge_m));
    if !two_dimensional(job) {
        text += &format!(
            ", -y {}, +y {}, lowest corner {}",
            show(edges.left_edge_m),
            show(edges.right_edge_m),
            show(edges.lowest_corner_m)
        );
    }
    Ok(format!("{text} {}", scale.unit))
}

fn rows(report: &Report) -> Vec<Row> {
    let (question, a) = (&report.job.question, &report.assessment);
    let down = Estimate { value: -a.force_n[2].value, ..a.force_n[2] };
    let mut rows = vec![
        Row {
            name: "Capacitance",
            unit: "F",
            symbol: "k_C",
            ideal: a.ideal.capacitance_f,
            full: a.capacitance_f,
            factor: a.factors.capacitance,
        },
        Row {
            name: match report.job.bench.guard.map(|g| g.around) {
                None => "Charge, upper plate",
                Some(_) => "Charge, guarded plate",
            },
            unit: "C",
            symbol: "k_C",
            ideal: a.ideal.capacitance_f * question.voltage_v,
            full: a.charge_upper_c,
            factor: a.factors.capacitance,
        },
        Row {
            name: "Force, downwards",
            unit: "N",
            symbol: "k_F",
            ideal: a.ideal.force_n,
            full: down,
            factor: a.factors.force,
        },
    ];
    if let (Some(torque), Some(ideal)) = (&a.torque_hinge_nm, a.ideal.torque_nm) {
        rows.push(Row {
            name: "Torque at hinge, closing",
            unit: "N m",
            symbol: "k_T",
            ideal,
            full: torque[1],
            factor: a.factors.torque,
        });
    }
    rows
}

fn main_table(report: &Report) -> Result<String, NotANumber> {
    let mut table = Table::new(2);
    table.row(["", "", "ideal", "wedge only", "wedge and fringe", "factor k", ""]);
    for row in rows(report) {
        let Estimate { value, uncertainty } = row.full;
        let scale = Scale::suited(value.abs().max(uncertainty), &per_metre(&report.job, row.unit));
        let places = decimals(scale.of(value), scale.of(uncertainty));
        let plain = |v: f64| fixed(scale.of(v), places);
        let full = scale.concise(value, uncertainty)?;
        let (wedge, factor, symbol) = match &row.factor {
            Some(f) => (plain(row.ideal * f.wedge), concise(f.value, f.uncertainty)?, row.symbol),
            None => ("-".into(), "-".into(), ""),
        };
        table.row([row.name, &scale.unit, &plain(row.ideal), &wedge, &full, &factor, symbol]);
    }
    Ok(table.text())
}

/// The error of the ideal formula and its two parts, in per cent of the full value.
///
/// In two steps, ideal to wedge and wedge to full, so that the parts add up to the whole.
fn error_parts(f: &Factor) -> [f64; 3] {
    let hundredths = |v: f64| (1e4 * v).round() / 100.0;
    let all = hundredths(1.0 / f.value - 1.0);
    let wedge = hundredths((1.0 - f.wedge) / f.value);
    // The rounded parts shall add up as well.
    [all, wedge, all - wedge]
}

fn shares(report: &Report) -> String {
    let mut table = Table::new(1);
    table.row(["Error of the ideal formula", "in all", "by the wedge", "by the fringe"]);
    let a = &report.assessment;
    let named = [
        ("Capacitance, charge", a.factors.capacitance),
        ("Force", a.factors.force),
        ("Torque", a.factors.torque),
    ];
    let mut some = false;
    for (name, factor) in named {
        if let Some(f) = factor {
            let mut cells = vec![name.to_string()];
            cells.extend(error_parts(&f).map(|p| format!("{} %", signed(p))));
            table.row(cells);
            some = true;
        }
    }
    if !some {
        return String::new();
    }
    table.text() + "In per cent of the full value; minus: the ideal formula gives too little.\n"
}

fn wrench(report: &Report) -> Result<String, NotANumber> {
    let a = &report.assessment;
    let on = match report.job.bench.guard.map(|g| g.around) {
        None => "On the upper plate",
        Some(Which::Upper) => "On the guarded plate",
        Some(Which::Lower) => "From the guarded plate",
    };
    let all = ForceAndTorque {
        force_n: a.force_n,
        torque_hinge_nm: a.torque_hinge_nm,
        torque_centre_nm: a.torque_centre_nm,
    };
    force_and_torque(report, on, &all)
}

fn force_and_torque(report: &Report, on: &str, all: &ForceAndTorque) -> Result<String, NotANumber> {
    let mut table = Table::new(2);
    table.row([on, "", "x", "y", "z"]);
    let mut put = |name: &str, unit: &str, v: &Components| -> Result<(), NotANumber> {
        let size = v.iter().map(|e| e.value.abs().max(e.uncertainty)).fold(0.0, f64::max);
        let scale = Scale::suited(size, &per_metre(&report.job, unit));
        let [x, y, z] = v.map(|e| scale.concise(e.value, e.uncertainty));
        table.row([name, &scale.unit, &x?, &y?, &z?]);
        Ok(())
    };
    put("Force", "N", &all.force_n)?;
    if let Some(torque) = &all.torque_hinge_nm {
        put("Torque about the hinge", "N m", torque)?;
    }
    put("Torque about its centre", "N m", &all.torque_centre_nm)?;
    Ok(table.text())
}

/// What the guard ring takes upon itself.
fn guard(report: &Report) -> Result<String, NotANumber> {
    let Some(guard) = &report.assessment.guard else { return Ok(String::new()) };
    let e = guard.capacitance_f;
    let scale = Scale::suited(e.value.abs(), &per_metre(&report.job, "F"));
    let (ring, beam) = match report.job.bench.guard.map(|g| g.around) {
        Some(Which::Lower) => ("From the guard ring", "On the upper plate in all"),
        _ => ("On the guard ring", "On plate and ring in all"),
    };
    let text = force_and_torque(report, ring, &guard.ring)?
        + &format!(
            "Capacitance of the guard ring: {} {}.\n",
            scale.concise(e.value, e.uncertainty)?,
            scale.unit
        );
    Ok(format!("{text}\n{}", force_and_torque(report, beam, &guard.beam)?))
}

fn matrix(report: &Report) -> Result<String, NotANumber> {
    let m = &report.assessment.capacitance_matrix_f;
    let size = m.iter().flatten().map(|e| e.value.abs()).fold(0.0, f64::max);
    let scale = Scale::suited(size, &per_metre(&report.job, "F"));
    let mut table = Table::new(2);
    table.row(["Capacitance matrix", "", "lower at 1 V", "upper at 1 V"]);
    for (name, row) in ["Charge on the lower plate", "Charge on the upper plate"].into_iter().zip(m) {
        let [lower, upper] = row.map(|e| scale.concise(e.value, e.uncertainty));
        table.row([name, &scale.unit, &lower?, &upper?]);
    }
    Ok(table.text())
}

fn numerics(report: &Report) -> Result<String, NotANumber> {
    let a = &report.assessment;
    let mut table = Table::new(0);
    table.row(["level", "nodes", "outer iterations", "inner, mean", "residual", "seconds"]);
    for l in &a.levels {
        table.row([
            l.q.to_string(),
            grouped(l.nodes),
            l.outer_iterations.to_string(),
            fixed(l.inner_iterations, 1),
            format!("{:.1e}", l.residual),
            fixed(l.seconds, 3),
        ]);
    }
    let order = match a.observed_order {
        Some(order) => format!("observed order {}", fixed(order, 2)),
        None => "no observed order".into(),
    };
    let memory =
        report.peak_memory_bytes.map_or(String::new(), |b| format!(", {} MB", b.div_ceil(1_000_000)));
    let threads = match report.job.threads {
        1 => "1 thread".to_string(),
        n => format!("{n} threads"),
    };
    let summary = format!(
        "Limit of these levels, {order}; accuracy asked for {:e}; {} s on {threads}{memory}.",
        report.job.params.accuracy,
        fixed(report.seconds, 2)
    );
    Ok(table.text() + &paragraph("", &summary))
}

fn minding(report: &Report) -> Result<String, NotANumber> {
    let dangers = dangers(report)?.into_iter().map(|c| paragraph("! ", &c));
    let mistakes = mistakes(report)?.into_iter().map(|c| paragraph("- ", &c));
    Ok(dangers.chain(mistakes).collect())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::report;
    use crate::table::WIDTH;

    #[test]
    fn the_whole_screen() {
        let text = screen(&report()).unwrap();
        let expected = "\
tiltgap 0.1.0: demo bench: hinged balance with a 110 mm by 90 mm plate
No bench file was given: this is the built-in demo bench (invented; `tiltgap demo` prints it).

Lower plate   110 mm x 90 mm (length x width), thickness 0 mm
Upper plate   110 mm x 90 mm (length x width), thickness 0 mm
Pose          gap 4 mm, tilt 0.4 deg, roll 0 deg, shift 0 mm, 0 mm
Edge gaps     hinge (-x) 3.6160, free (+x) 4.3840, -y 4.0000, +y 4.0000, lowest corner 3.6160 mm
Hinge         arm 150 mm, height 0 mm
Drive         400 V on the upper plate; lower plate and surroundings at 0 V (grounded)
Surroundings  open; relative permittivity 1.00054

                                    ideal   wedge only   wedge and fringe      factor k
Capacitance                pF      20.000       20.200          26.000(2)   1.30000(10)   k_C
Charge, upper plate        nC      8.0000       8.0800         10.4000(8)   1.30000(10)   k_C
Force, downwards           µN     400.000      408.000         450.000(3)   1.125000(8)   k_F
Torque at hinge, closing   µN m   60.0000      59.4000        66.0000(13)    1.10000(2)   k_T

Error of the ideal formula     in all   by the wedge   by the fringe
Capacitance, charge          -23.08 %        -0.77 %        -22.31 %
Force                        -11.11 %        -1.78 %         -9.33 %
Torque                        -9.09 %        +0.91 %        -10.00 %
In per cent of the full value; minus: the ideal formula gives too little.

On the upper plate                      x             y             z
Force                     µN     1.250(4)             0   -450.000(3)
Torque about the hinge    µN m          0   66.0000(13)             0
Torque about its centre   µN m          0    -1.5000(3)             0

Capacitance matrix               lower at 1 V   upper at 1 V
Charge on the lower plate   pF      26.000(2)     -24.000(2)
Charge on the upper plate   pF     -24.000(2)      26.000(2)

level    nodes   outer iterations   inner, mean   residual   seconds
    2   20 387                  6          14.9     7.4e-8     0.035
    3   66 220                  6          17.6     4.3e-8     0.170
Limit of these levels, observed order 1.92; accuracy asked for 1e-4; 0.31 s on 2 threads, 47 MB.

! Safety: 400 V is above 60 V d.c.";
        for (n, (line, wanted)) in text.lines().zip(expected.lines()).enumerate() {
            assert!(line.starts_with(wanted), "line {n}:\n{line}\n{wanted}");
        }
        assert!(text.lines().all(|l| l.chars().count() <= WIDTH && !l.ends_with(' ')));
    }

    #[test]
    fn without_hinge_and_overlap_the_table_has_fewer_entries() {
        let mut r = report();
        let a = &mut r.assessment;
        (a.torque_hinge_nm, a.ideal.torque_nm, a.factors.torque) = (None, None, None);
        (a.factors.capacitance, a.factors.force) = (None, None);
        (r.job.bench.hinge, r.job.question.hinge) = (None, None);
        let text = screen(&r).unwrap();
        assert!(text.contains("Hinge         none in the bench"));
        assert!(!text.contains("Error of the ideal formula") && !text.contains("k_T"));
        assert!(text.lines().any(|l| l.starts_with("Force, downwards") && l.ends_with('-')));
    }

    #[test]
    fn a_cross_section_is_per_metre_and_has_no_sides() {
        let mut r = report();
        r.job.question.arrangement.dimensions = Dimensions::Two;
        r.job.question.connection = Connection::Floating;
        let text = screen(&r).unwrap();
        for part in [
            "length 110 mm, very wide",
            "pF/m",
            "nC/m",
            "µN/m",
            "µN m/m",
            "free (+x) 4.3840 mm\n",
            "no net charge (floating)",
        ] {
            assert!(text.contains(part), "{part}");
        }
    }

    #[test]
    fn nothing_that_is_not_a_number_is_shown() {
        let mut r = report();
        r.assessment.force_n[0].value = f64::NAN;
        assert!(screen(&r).is_err());
    }

    #[test]
    fn parts_of_the_error_add_up() {
        let f = Factor { value: 1.0287, uncertainty: 0.0, wedge: 1.0093, fringe: 1.0287 / 1.0093 };
        let [all, wedge, fringe] = error_parts(&f);
        assert!((all + 2.79).abs() < 1e-9 && (wedge + 0.90).abs() < 1e-9 && (fringe + 1.89).abs() < 1e-9);
    }

    #[test]
    fn long_texts_of_quantities_are_shown_from_their_value() {
        let show = |text: &str, si: f64, unit: &str| written(&Value::from(text), si, unit).unwrap();
        assert_eq!(show("4mm", 0.004, "m"), "4mm");
        assert_eq!(show("0.00400000000000000 m", 0.004, "m"), "4 mm");
        assert_eq!(show("0.00000000000000000 rad", 0.0, "deg"), "0 deg");
    }
}
