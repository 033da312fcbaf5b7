//! Picture of a correction factor over the gap (or another axis), a curve for every tilt, with bands of uncertainty.

use super::caption::Caption;
use super::panel::{legend, Entry, Panel, Scale, BELOW, LEFT, RIGHT};
use super::sheet::Sheet;
use super::theme;

/// Height of the panel, in mm.
const HEIGHT: f64 = 72.0;
/// Standard uncertainties on either side of a curve: about 95 %.
const COVERAGE: f64 = 2.0;
/// Strength of the tint of a band.
const BAND: f64 = 0.3;
/// Blank above and below the curves, in parts of what is shown.
const BLANK: f64 = 0.05;
/// Columns of the legend.
const COLUMNS: usize = 3;

/// One curve.
#[derive(Clone, Debug, PartialEq)]
pub struct Curve {
    /// What it belongs to, for example "tilt 0.4°".
    pub name: String,
    /// The factor at every place.
    pub values: Vec<f64>,
    /// Its standard uncertainty at every place.
    pub uncertainties: Vec<f64>,
}

/// What is drawn.
#[derive(Clone, Debug, PartialEq)]
pub struct FactorCurves {
    /// Title of the bench.
    pub title: String,
    /// Lines below the title.
    pub lines: Vec<String>,
    /// What the factor is called, for example "force factor k_F".
    pub factor: String,
    /// Axis along which they run, with its unit, for example "gap (mm)".
    pub along: String,
    /// Places on it, ascending.
    pub places: Vec<f64>,
    /// Curves in order of what distinguishes them.
    pub curves: Vec<Curve>,
}

/// The picture.
///
/// # Panics
/// If a curve has not one value and one uncertainty for every place.
pub fn factors(data: &FactorCurves) -> Sheet {
    let places = &data.places;
    for curve in &data.curves {
        assert_eq!(
            (curve.values.len(), curve.uncertainties.len()),
            (places.len(), places.len()),
            "{}",
            curve.name
        );
    }
    let band = |c: &Curve, n: usize, sign: f64| c.values[n] + sign * COVERAGE * c.uncertainties[n];
    let ends =
        data.curves.iter().flat_map(|c| (0..places.len()).flat_map(|n| [band(c, n, -1.0), band(c, n, 1.0)]));
    let (low, high) = ends.fold((1.0f64, 1.0f64), |(l, h), v| (l.min(v), h.max(v)));
    let blank = BLANK * (high - low).max(f64::EPSILON);
    let mut lines = data.lines.clone();
    lines.push("Bands: two standard uncertainties (numerical) on either side".into());
    let caption = Caption::new(&data.title, &lines);
    let top = caption.height();
    let [first, last] = [places.first(), places.last()].map(|g| g.copied().unwrap_or(0.0));
    let panel = Panel {
        corner: [LEFT, top],
        size: [theme::WIDTH - LEFT - RIGHT, HEIGHT],
        x: Scale::linear(&data.along, [first, if last > first { last } else { first + 1.0 }]),
        y: Scale::linear(&data.factor, [low - blank, high + blank]),
    };
    let legend_top = top + HEIGHT + BELOW + 1.0;
    let rows = data.curves.len().div_ceil(COLUMNS) as f64;
    let height = legend_top + rows * theme::LINE_SPACING * theme::TEXT + theme::MARGIN;
    let mut sheet = caption.sheet(height);
    sheet.layer("grid");
    panel.grid(&mut sheet);
    sheet.layer("factors");
    for (n, curve) in data.curves.iter().enumerate() {
        let colour = theme::curve(n, data.curves.len());
        let edge = |sign: f64| (0..places.len()).map(move |m| [places[m], band(curve, m, sign)]);
        let around: Vec<_> = edge(1.0).chain(edge(-1.0).rev()).map(|p| panel.place(p)).collect();
        sheet.veil(around, colour, BAND);
    }
    for (n, curve) in data.curves.iter().enumerate() {
        let line: Vec<_> = places.iter().zip(&curve.values).map(|(g, v)| panel.place([*g, *v])).collect();
        sheet.line(line, theme::curve(n, data.curves.len()), theme::CURVE);
    }
    sheet.layer("axes");
    panel.axes(&mut sheet);
    sheet.layer("legend");
    let entries: Vec<Entry> = data
        .curves
        .iter()
        .enumerate()
        .map(|(n, c)| Entry {
            name: &c.name,
            colour: theme::curve(n, data.curves.len()),
            dashed: false,
            width: theme::CURVE,
        })
        .collect();
    let width = (theme::WIDTH - 2.0 * theme::MARGIN) / COLUMNS as f64;
    legend(&mut sheet, [theme::MARGIN + 2.0, legend_top], width, COLUMNS, &entries);
    sheet
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::draw::{render, sheet::Mark};

    /// Curves from the leading terms, with invented uncertainties.
    fn synthetic() -> FactorCurves {
        let gaps_mm: Vec<f64> = (0..25).map(|n| 2.0 + 0.25 * n as f64).collect();
        let curve = |tilt: f64| {
            let beta = |g: f64| 55.0 * tilt.to_radians().tan() / g;
            let value = |g: &f64| (1.0 + 0.6 * g / 110.0) / (1.0 - beta(*g).powi(2));
            Curve {
                name: format!("tilt {tilt}°"),
                values: gaps_mm.iter().map(value).collect(),
                uncertainties: gaps_mm.iter().map(|g| 2e-3 * g / 2.0).collect(),
            }
        };
        FactorCurves {
            title: "synthetic".into(),
            lines: vec!["Force factor over the gap".into()],
            factor: "force factor k_F".into(),
            curves: [0.0, 0.3, 0.6, 0.9].map(curve).to_vec(),
            along: "gap (mm)".into(),
            places: gaps_mm,
        }
    }

    #[test]
    fn every_curve_is_drawn_named_and_inside() {
        let sheet = factors(&synthetic());
        let layer = |name: &str| sheet.layers.iter().find(|l| l.name == name).unwrap();
        let drawn = &layer("factors").marks;
        assert_eq!(drawn.iter().filter(|m| matches!(m, Mark::Line { .. })).count(), 4);
        assert_eq!(drawn.iter().filter(|m| matches!(m, Mark::Area { .. })).count(), 4);
        for mark in drawn {
            let (Mark::Line { points, .. } | Mark::Area { points, .. }) = mark else { panic!("{mark:?}") };
            assert!(points.iter().flatten().all(|v| v.is_finite()));
            assert!(points.iter().all(|p| p[0] <= sheet.size[0] && p[1] <= sheet.size[1] && p[1] > 0.0));
        }
        let svg = render::svg(&sheet).unwrap();
        for text in ["tilt 0°", "tilt 0.9°", "gap (mm)", "force factor k_F"] {
            assert!(svg.contains(text), "{text}");
        }
    }
}
