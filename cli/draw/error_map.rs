//! Map of the error of the ideal formula in per cent over gap and tilt, with labelled contours; that of 1 % is stressed.

use plotters::style::RGBColor;

use super::caption::Caption;
use super::contours::Mapped;
use super::panel::{Panel, Scale, BELOW, LEFT, RIGHT};
use super::sheet::{text_width, Anchor, Point, Sheet};
use super::theme;
use super::ticks::short;

/// Contours in per cent, on both sides of zero: steps of about two, as errors are thought of.
const LEVELS: [f64; 8] = [0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0];
/// The contour that is stressed.
const STRESSED: f64 = 1.0;
const STRESSED_WIDTH: f64 = 0.8;
/// Height of the panel, in mm.
const HEIGHT: f64 = 76.0;
/// Bands up to which the scale is spread.
const STRONGEST: f64 = 0.8;
/// Least distance between labels and from the frame, in text heights.
const LABEL_DISTANCE: f64 = 2.2;

/// What is drawn. Contours are straight between the points of the map: give as fine a map as the table interpolates.
#[derive(Clone, Debug, PartialEq)]
pub struct ErrorMap {
    /// Title of the bench.
    pub title: String,
    /// Lines below the title.
    pub lines: Vec<String>,
    /// The two axes with their units, for example "gap (mm)" and "tilt (°)".
    pub axes: [String; 2],
    /// Places along the first, ascending.
    pub x: Vec<f64>,
    /// Places along the second, ascending.
    pub y: Vec<f64>,
    /// Error in per cent, a row along the first axis for every place on the second.
    pub percent: Vec<Vec<f64>>,
}

/// Contours inside the range of the values, ascending.
fn levels(values: &[f64]) -> Vec<f64> {
    let (low, high) =
        values.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(*v), h.max(*v)));
    let mut all: Vec<f64> = LEVELS.iter().flat_map(|l| [-l, *l]).chain([0.0]).collect();
    all.retain(|l| *l > low && *l < high);
    all.sort_by(f64::total_cmp);
    all
}

/// Colour of an error: light near zero, on a scale of one side for each sign.
fn colour(percent: f64, most: f64) -> RGBColor {
    let least = LEVELS[0];
    let strength = ((percent.abs() / least).max(1.0).ln() / (most / least).max(2.0).ln()).min(1.0);
    let side = if percent < 0.0 { -0.5 } else { 0.5 };
    theme::diverging(0.5 + side * STRONGEST * strength)
}

/// The picture.
///
/// # Panics
/// If the rows do not fit the axes.
pub fn error_map(data: &ErrorMap) -> Sheet {
    let (columns, rows) = (data.x.len(), data.y.len());
    assert!(
        data.percent.len() == rows && data.percent.iter().all(|r| r.len() == columns),
        "rows of other axes"
    );
    let values = data.percent.concat();
    let most = values.iter().fold(0.0f64, |m, v| m.max(v.abs()));
    let caption = Caption::new(&data.title, &data.lines);
    let top = caption.height();
    let range = |axis: &[f64]| {
        let [a, b] = [axis.first(), axis.last()].map(|v| v.copied().unwrap_or(0.0));
        if b > a {
            [a, b]
        } else {
            [a - 0.5, a + 0.5]
        }
    };
    let panel = Panel {
        corner: [LEFT, top],
        size: [theme::WIDTH - LEFT - RIGHT, HEIGHT],
        x: Scale::linear(&data.axes[0], range(&data.x)),
        y: Scale::linear(&data.axes[1], range(&data.y)),
    };
    let mut sheet = caption.sheet(top + HEIGHT + BELOW + theme::MARGIN);
    sheet.layer("error");
    let points: Vec<Point> =
        data.y.iter().flat_map(|t| data.x.iter().map(|g| panel.place([*g, *t]))).collect();
    let levels = levels(&values);
    let contours = Mapped { columns, rows, values: &values, points: &points }.levels(&levels);
    // The band between two contours has the colour of its end that is farther from zero.
    let lowest = values.iter().copied().fold(f64::INFINITY, f64::min);
    let highest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let band = |n: usize| {
        let low = if n == 0 { lowest } else { levels[n - 1] };
        let high = levels.get(n).copied().unwrap_or(highest);
        colour(if low.abs() > high.abs() { low } else { high }, most)
    };
    let [[x0, y0], [x1, y1]] = panel.bounds();
    sheet.area(vec![[x0, y0], [x1, y0], [x1, y1], [x0, y1]], band(0));
    for (n, contour) in contours.iter().enumerate() {
        for area in &contour.areas {
            sheet.area(panel.clip_area(area), band(n + 1));
        }
    }
    sheet.layer("contours");
    for (level, contour) in levels.iter().zip(&contours) {
        let stressed = level.abs() == STRESSED;
        let (ink, width) =
            if stressed { (theme::INK, STRESSED_WIDTH) } else { (theme::MIDDLE, theme::FRAME) };
        for line in &contour.lines {
            sheet.line(line.clone(), ink, width);
        }
    }
    sheet.layer("labels");
    let mut taken: Vec<Point> = Vec::new();
    // The stressed contour takes its place first.
    let mut order: Vec<usize> = (0..levels.len()).collect();
    order.sort_by_key(|n| levels[*n].abs() != STRESSED);
    for n in order {
        let level = levels[n];
        for line in &contours[n].lines {
            label(&mut sheet, line, &format!("{} %", short(level, 2)), &panel, &mut taken);
        }
    }
    sheet.layer("axes");
    panel.axes(&mut sheet);
    sheet
}

/// Writes a label on a line, as near to its middle as there is room.
fn label(sheet: &mut Sheet, line: &[Point], text: &str, panel: &Panel, taken: &mut Vec<Point>) {
    let half = [text_width(text, theme::TEXT) / 2.0 + 0.4, theme::TEXT * 0.65];
    let [low, high] = panel.bounds();
    let room = |p: &Point| {
        let inside = (0..2).all(|d| p[d] - half[d] > low[d] + 1.0 && p[d] + half[d] < high[d] - 1.0);
        let apart = |q: &Point| {
            (p[0] - q[0]).abs() > 2.0 * half[0] + theme::TEXT
                || (p[1] - q[1]).abs() > LABEL_DISTANCE * theme::TEXT
        };
        inside && taken.iter().all(apart)
    };
    let places = along(line);
    let middle = places.len() / 2;
    let mut order: Vec<usize> = (0..places.len()).collect();
    order.sort_by_key(|n| n.abs_diff(middle));
    let Some(at) = order.into_iter().map(|n| places[n]).find(room) else { return };
    let corner = |sx: f64, sy: f64| [at[0] + sx * half[0], at[1] + sy * half[1]];
    let field = vec![corner(-1.0, -1.0), corner(1.0, -1.0), corner(1.0, 1.0), corner(-1.0, 1.0)];
    sheet.veil(field, theme::PAPER, 0.75);
    sheet.text(text, at, Anchor::Middle);
    taken.push(at);
}

/// Points every millimetre along a line.
fn along(line: &[Point]) -> Vec<Point> {
    let mut points = Vec::new();
    let mut left = 0.5;
    for pair in line.windows(2) {
        let length = (pair[1][0] - pair[0][0]).hypot(pair[1][1] - pair[0][1]);
        let mut at = left;
        while at < length {
            let t = at / length;
            points.push([0, 1].map(|d| pair[0][d] + t * (pair[1][d] - pair[0][d])));
            at += 1.0;
        }
        left = at - length;
    }
    points
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::draw::{render, sheet::Mark};

    /// An error that changes its sign: wedge against fringe, with invented weights.
    fn synthetic() -> ErrorMap {
        let gaps_mm: Vec<f64> = (0..13).map(|n| 2.0 + 0.5 * n as f64).collect();
        let tilts_deg: Vec<f64> = (0..9).map(|n| -1.0 + 0.25 * n as f64).collect();
        let at = |tilt: f64, gap: f64| {
            let beta = 55.0 * tilt.to_radians().tan() / gap;
            100.0 * (1.0 - (1.0 + 0.8 * gap / 110.0) * (1.0 - 0.4 * beta) / (1.0 - beta * beta))
        };
        let percent = tilts_deg.iter().map(|t| gaps_mm.iter().map(|g| at(*t, *g)).collect()).collect();
        ErrorMap {
            title: "synthetic".into(),
            lines: vec!["Error of the ideal torque".into()],
            axes: ["gap (mm)", "tilt (°)"].map(String::from),
            x: gaps_mm,
            y: tilts_deg,
            percent,
        }
    }

    #[test]
    fn the_contour_of_one_per_cent_is_stressed_where_the_error_is_one_per_cent() {
        let data = synthetic();
        let sheet = error_map(&data);
        let layer = |name: &str| &sheet.layers.iter().find(|l| l.name == name).unwrap().marks;
        let stressed: Vec<&Mark> = layer("contours")
            .iter()
            .filter(|m| matches!(m, Mark::Line { width, .. } if *width == STRESSED_WIDTH))
            .collect();
        assert!(!stressed.is_empty());
        let texts: Vec<&str> = layer("labels")
            .iter()
            .filter_map(|m| if let Mark::Text { text, .. } = m { Some(text.as_str()) } else { None })
            .collect();
        assert!(texts.iter().any(|t| t.ends_with("1 %")), "{texts:?}");
        assert!(render::svg(&sheet).unwrap().contains("tilt (°)"));
    }

    #[test]
    fn labels_do_not_overlap() {
        let sheet = error_map(&synthetic());
        let marks = &sheet.layers.iter().find(|l| l.name == "labels").unwrap().marks;
        let places: Vec<(Point, f64)> = marks
            .iter()
            .filter_map(|m| match m {
                Mark::Text { text, at, size, .. } => Some((*at, text_width(text, *size))),
                _ => None,
            })
            .collect();
        assert!(places.len() > 3);
        for (n, (a, wa)) in places.iter().enumerate() {
            for (b, wb) in &places[..n] {
                let clear = (a[0] - b[0]).abs() > (wa + wb) / 2.0 || (a[1] - b[1]).abs() > theme::TEXT;
                assert!(clear, "{a:?} {b:?}");
            }
        }
    }
}
