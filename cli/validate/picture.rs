//! Drawings of the report: errors level by level, and coverage.

use crate::draw::caption::Caption;
use crate::draw::panel::{legend, Entry, Panel, Scale, Spread, BELOW, LEFT, RIGHT};
use crate::draw::sheet::Sheet;
use crate::draw::theme;

use super::convergence::{Coverage, Ladder};

/// Height of a panel, in mm.
const HEIGHT: f64 = 72.0;
/// More room to the left for powers of ten, in mm.
const POWERS: f64 = 4.0;
/// Errors below this are the far boundary and rounding.
const LEAST_ERROR: f64 = 1e-7;
/// Standard uncertainties up to which the coverage is drawn.
const WIDEST: f64 = 4.0;

fn panel(top: f64, x: Scale, y: Scale) -> Panel {
    let left = LEFT + if y.spread == Spread::Logarithmic { POWERS } else { 0.0 };
    Panel { corner: [left, top], size: [theme::WIDTH - left - RIGHT, HEIGHT], x, y }
}

/// Relative errors over the level, both by their logarithm.
pub fn ladders(ladders: &[Ladder]) -> Sheet {
    let lines = ["Relative error of each level; dashed: second order".to_string()];
    let caption = Caption::new("Convergence", &lines);
    let top = caption.height();
    let points = |l: &Ladder| -> Vec<[f64; 2]> {
        let pairs = l.levels.iter().map(|q| *q as f64).zip(l.errors());
        pairs.filter(|(_, e)| *e > LEAST_ERROR).map(|(q, e)| [q, e]).collect()
    };
    let all: Vec<[f64; 2]> = ladders.iter().flat_map(points).collect();
    let range = |d: usize| {
        let ends = all.iter().fold([f64::INFINITY, 0.0], |[l, h]: [f64; 2], p| [l.min(p[d]), h.max(p[d])]);
        if ends[1] > ends[0] {
            [ends[0] / 1.2, ends[1] * 1.2]
        } else {
            [1.0, 10.0]
        }
    };
    let scale = |label: &str, range| Scale { label: label.into(), range, spread: Spread::Logarithmic };
    let panel = panel(top, scale("level q", range(0)), scale("relative error", range(1)));
    let legend_top = top + HEIGHT + BELOW + 1.0;
    let height = legend_top + ladders.len() as f64 * theme::LINE_SPACING * theme::TEXT + theme::MARGIN;
    let mut sheet = caption.sheet(height);
    sheet.layer("grid");
    panel.grid(&mut sheet);
    sheet.layer("levels");
    let [from, to] = panel.x.range;
    let guide = panel.y.range[1] / 2.0;
    let slope = [panel.place([from, guide]), panel.place([to, guide * (from / to).powi(2)])];
    for part in panel.clip_line(&slope) {
        sheet.dashed(&part, theme::MIDDLE, theme::CURVE);
    }
    for (n, l) in ladders.iter().enumerate() {
        let colour = theme::curve(n, ladders.len());
        let line: Vec<_> = points(l).into_iter().map(|p| panel.place(p)).collect();
        for [x, y] in &line {
            let r = theme::CURVE * 1.5;
            sheet.area(vec![[x - r, y - r], [x + r, y - r], [x + r, y + r], [x - r, y + r]], colour);
        }
        sheet.line(line, colour, theme::CURVE);
    }
    sheet.layer("axes");
    panel.axes(&mut sheet);
    sheet.layer("legend");
    let entries: Vec<Entry> = ladders
        .iter()
        .enumerate()
        .map(|(n, l)| Entry {
            name: &l.name,
            colour: theme::curve(n, ladders.len()),
            dashed: false,
            width: theme::CURVE,
        })
        .collect();
    legend(&mut sheet, [theme::MARGIN + 2.0, legend_top], theme::WIDTH, 1, &entries);
    sheet
}

/// Part of a normal distribution within `x` standard deviations: the integral of its density by Simpson's rule.
fn normal(x: f64) -> f64 {
    const STEPS: usize = 64;
    let h = x / STEPS as f64;
    let density = |t: f64| (-0.5 * t * t).exp() * (2.0 / std::f64::consts::PI).sqrt();
    let weight = |n: usize| match n {
        0 | STEPS => 1.0,
        n if n % 2 == 1 => 4.0,
        _ => 2.0,
    };
    (0..=STEPS).map(|n| weight(n) * density(n as f64 * h)).sum::<f64>() * h / 3.0
}

/// Part of the numbers within so many combined standard uncertainties.
pub fn coverage(coverage: &Coverage) -> Sheet {
    let lines = [format!("{} numbers; dashed: a normal distribution", coverage.count)];
    let caption = Caption::new("Coverage of the error bars", &lines);
    let top = caption.height();
    let panel = panel(
        top,
        Scale::linear("combined standard uncertainties", [0.0, WIDEST]),
        Scale::linear("part within", [0.0, 1.0]),
    );
    let mut sheet = caption.sheet(top + HEIGHT + BELOW + theme::MARGIN);
    sheet.layer("grid");
    panel.grid(&mut sheet);
    sheet.layer("coverage");
    let steps = 80;
    let ideal: Vec<_> =
        (0..=steps).map(|n| WIDEST * n as f64 / steps as f64).map(|x| panel.place([x, normal(x)])).collect();
    sheet.dashed(&ideal, theme::MIDDLE, theme::CURVE);
    let all = coverage.count.max(1) as f64;
    let mut line = vec![panel.place([0.0, 0.0])];
    for (n, d) in coverage.distances.iter().enumerate().filter(|(_, d)| **d <= WIDEST) {
        line.push(panel.place([*d, n as f64 / all]));
        line.push(panel.place([*d, (n + 1) as f64 / all]));
    }
    let within = coverage.distances.iter().filter(|d| **d <= WIDEST).count();
    line.push(panel.place([WIDEST, within as f64 / all]));
    sheet.line(line, theme::UPPER, theme::CURVE);
    sheet.layer("axes");
    panel.axes(&mut sheet);
    sheet
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_normal_distribution_is_the_one_of_the_tables() {
        for (x, part) in [(0.0, 0.0), (1.0, 0.682_689_5), (2.0, 0.954_499_7), (3.0, 0.997_300_2)] {
            assert!((normal(x) - part).abs() < 1e-7, "{x}");
        }
    }
}
