//! Picture of the charge density along both sides of both plates, beside the ideal formula and the wedge alone.

use tiltgap_solver::{Level, EPS0};

use super::caption::{self, Caption};
use super::panel::{legend, Entry, Panel, Scale, Spread, BELOW, LEFT, RIGHT};
use super::profile::{profiles, Profile};
use super::scene::{Scene, MM};
use super::sheet::Sheet;
use super::theme;

/// Height of the panel, in mm.
const HEIGHT: f64 = 70.0;
/// The density at the edges has no bound; the axis ends this factor above the ideal density (or the largest of the wedge),
/// and this factor below it at the latest.
const ABOVE: f64 = 8.0;
const BELOW_IDEAL: f64 = 1e-4;
/// Blank to the left and right of the plates, in parts of what is shown.
const ASIDE: f64 = 0.03;
/// Units of density and what they are in C/m^2, and the least number of them on the plates.
const UNITS: [(&str, f64); 4] = [("mC/m²", 1e-3), ("µC/m²", 1e-6), ("nC/m²", 1e-9), ("pC/m²", 1e-12)];
const LEAST_OF_A_UNIT: f64 = 0.1;

/// eps V over the local gap, at places along the overlap: (x in mm, density in C/m^2).
fn wedge(scene: &Scene) -> Vec<[f64; 2]> {
    const PLACES: usize = 200;
    let question = &scene.setup.question;
    let arrangement = &question.arrangement;
    let (pose, x) = (&arrangement.pose, arrangement.overlap().x);
    if x[0] >= x[1] {
        return Vec::new();
    }
    let [sx, sy] = pose.slopes();
    let y = scene.y_mm / MM - pose.shift_m[1];
    let density = |x: f64| {
        let gap = pose.gap_m + sx * (x - pose.shift_m[0]) + sy * y;
        EPS0 * question.relative_permittivity * question.voltage_v.abs() / gap
    };
    (0..=PLACES)
        .map(|n| x[0] + (x[1] - x[0]) * n as f64 / PLACES as f64)
        .map(|x| [MM * x, density(x)])
        .filter(|p| p[1] > 0.0)
        .collect()
}

/// (x, density without its sign) on one side of a plate, without the two edges themselves.
fn side(profile: &Profile, side: usize) -> Vec<[f64; 2]> {
    let last = profile.x_mm.len() - 1;
    (1..last).map(|n| [profile.x_mm[n], profile.density[side][n].abs()]).collect()
}

/// "+", "−" or "±": the sign of what a side bears.
fn sign(profile: &Profile, side: usize) -> &'static str {
    let inner = &profile.density[side][1..profile.density[side].len() - 1];
    match (inner.iter().any(|d| *d > 0.0), inner.iter().any(|d| *d < 0.0)) {
        (true, true) => "±",
        (false, true) => "−",
        _ => "+",
    }
}

/// The picture.
pub fn charge(scene: &Scene, level: &Level) -> Sheet {
    let text = [
        format!("Magnitude of the charge density {}", caption::place(scene.setup)),
        caption::circumstances(scene.setup),
    ];
    let question = &scene.setup.question;
    let [lower, upper] = profiles(scene, level);
    let ideal =
        EPS0 * question.relative_permittivity * question.voltage_v.abs() / question.arrangement.pose.gap_m;
    let wedge = wedge(scene);
    let most = wedge.iter().map(|p| p[1]).fold(ideal, f64::max);
    let curves = [
        (side(&upper, 0), format!("upper plate, gap side ({})", sign(&upper, 0)), theme::UPPER, false),
        (side(&upper, 1), format!("upper plate, far side ({})", sign(&upper, 1)), theme::UPPER, true),
        (side(&lower, 1), format!("lower plate, gap side ({})", sign(&lower, 1)), theme::LOWER, false),
        (side(&lower, 0), format!("lower plate, far side ({})", sign(&lower, 0)), theme::LOWER, true),
    ];
    let shown = curves.iter().flat_map(|c| &c.0).map(|p| p[1]).filter(|d| *d > 0.0);
    let least = shown.fold(ideal, f64::min).max(BELOW_IDEAL * ideal);
    let unit = UNITS.iter().find(|u| ideal >= LEAST_OF_A_UNIT * u.1).unwrap_or(&UNITS[UNITS.len() - 1]);
    let ends = [lower.x_mm.clone(), upper.x_mm.clone()].concat();
    let x = [
        ends.iter().copied().fold(f64::INFINITY, f64::min),
        ends.iter().copied().fold(f64::NEG_INFINITY, f64::max),
    ];
    let aside = ASIDE * (x[1] - x[0]);
    let caption = Caption::new(&scene.setup.bench.title, &text);
    let top = caption.height();
    let panel = Panel {
        corner: [LEFT, top],
        size: [theme::WIDTH - LEFT - RIGHT, HEIGHT],
        x: Scale::linear("x (mm)", [x[0] - aside, x[1] + aside]),
        y: Scale {
            label: format!("charge density ({})", unit.0),
            range: [least / 1.5 / unit.1, ABOVE * most / unit.1],
            spread: Spread::Logarithmic,
        },
    };
    let legend_top = top + HEIGHT + BELOW + 1.0;
    let rows = 3.0;
    let height = legend_top + rows * theme::LINE_SPACING * theme::TEXT + theme::MARGIN;
    let mut sheet = caption.sheet(height);
    sheet.layer("grid");
    panel.grid(&mut sheet);
    let draw = |sheet: &mut Sheet, points: &[[f64; 2]], colour, dashed: bool, width: f64| {
        let line: Vec<_> =
            points.iter().filter(|p| p[1] > 0.0).map(|p| panel.place([p[0], p[1] / unit.1])).collect();
        for part in panel.clip_line(&line) {
            let part = super::lines::thinned(&part);
            if dashed {
                sheet.dashed(&part, colour, width);
            } else {
                sheet.line(part, colour, width);
            }
        }
    };
    sheet.layer("charge");
    for (points, _, colour, dashed) in &curves {
        draw(&mut sheet, points, *colour, *dashed, theme::CURVE);
    }
    sheet.layer("ideal");
    if let (Some(first), Some(last)) = (wedge.first(), wedge.last()) {
        draw(&mut sheet, &[[first[0], ideal], [last[0], ideal]], theme::INK, false, theme::FRAME);
    }
    draw(&mut sheet, &wedge, theme::THIRD, false, theme::FRAME);
    sheet.layer("axes");
    panel.axes(&mut sheet);
    sheet.layer("legend");
    let entry = |name, colour, dashed, width| Entry { name, colour, dashed, width };
    let mut entries: Vec<Entry> = curves.iter().map(|c| entry(&c.1, c.2, c.3, theme::CURVE)).collect();
    if !wedge.is_empty() {
        entries.push(entry("ideal, ε V/d", theme::INK, false, theme::FRAME));
        entries.push(entry("wedge alone, ε V/h(x)", theme::THIRD, false, theme::FRAME));
    }
    let width = (theme::WIDTH - 2.0 * theme::MARGIN) / 2.0;
    legend(&mut sheet, [theme::MARGIN + 2.0, legend_top], width, 2, &entries);
    sheet
}
