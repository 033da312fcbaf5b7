//! A rectangle of a sheet with two axes: where data stand on it, and its frame, ticks and labels.

use plotters::style::RGBColor;

use super::sheet::{on_sheet, text_width, Anchor, Point, Sheet};
use super::theme;
use super::ticks;

/// How numbers are spread along an axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Spread {
    /// Evenly.
    Linear,
    /// By their logarithm.
    Logarithmic,
}

/// One axis.
#[derive(Clone, Debug, PartialEq)]
pub struct Scale {
    /// Name and unit; empty for none.
    pub label: String,
    /// From and to, in data.
    pub range: [f64; 2],
    /// How numbers are spread.
    pub spread: Spread,
}

impl Scale {
    /// An axis with evenly spread numbers.
    pub fn linear(label: &str, range: [f64; 2]) -> Scale {
        Scale { label: label.into(), range, spread: Spread::Linear }
    }

    /// Relative place of a number, 0 to 1 in the range.
    pub fn place(&self, value: f64) -> f64 {
        let [from, to] = self.range;
        match self.spread {
            Spread::Linear => (value - from) / (to - from),
            Spread::Logarithmic => (value / from).ln() / (to / from).ln(),
        }
    }
}

/// A panel. Numbers along x run to the right, along y upwards.
#[derive(Clone, Debug, PartialEq)]
pub struct Panel {
    /// Upper left corner, in mm.
    pub corner: Point,
    /// Width and height, in mm.
    pub size: Point,
    /// Axis to the right.
    pub x: Scale,
    /// Axis upwards.
    pub y: Scale,
}

/// Length of a tick, and the distance of its label from the frame, in mm.
const TICK: f64 = 1.2;
const TICK_LABEL: f64 = 0.9;
/// Room for the axes of a panel, in mm: numbers and a label to the left, and below.
pub const LEFT: f64 = 17.5;
/// Room to the right, for half a number.
pub const RIGHT: f64 = 5.0;
/// Room below.
pub const BELOW: f64 = 12.5;
/// Room that a number takes on the x axis, and on the y axis, in mm.
const NUMBER_WIDTH: f64 = 12.0;
const NUMBER_HEIGHT: f64 = 6.5;
/// Below so many powers of ten an axis has numbers at 2 and 5 times them as well.
const FEW_DECADES: usize = 3;
/// Least blank between two labels, in mm.
const LABEL_BLANK: f64 = 1.5;

impl Panel {
    /// Where data stand on the sheet.
    pub fn place(&self, [x, y]: [f64; 2]) -> Point {
        [
            self.corner[0] + self.size[0] * self.x.place(x),
            self.corner[1] + self.size[1] * (1.0 - self.y.place(y)),
        ]
    }

    /// The lower right corner.
    pub fn end(&self) -> Point {
        [self.corner[0] + self.size[0], self.corner[1] + self.size[1]]
    }

    /// Left edge, right edge, upper and lower edge, for clipping.
    pub fn bounds(&self) -> [Point; 2] {
        [self.corner, self.end()]
    }

    /// The part of a polygon that is in the panel.
    pub fn clip_area(&self, points: &[Point]) -> Vec<Point> {
        clip_area(points, self.bounds())
    }

    /// The parts of a line that are in the panel.
    pub fn clip_line(&self, points: &[Point]) -> Vec<Vec<Point>> {
        clip_line(points, self.bounds())
    }

    fn numbers(scale: &Scale, most: usize) -> (Vec<f64>, Vec<String>, Vec<f64>) {
        match scale.spread {
            Spread::Linear => {
                let numbers = ticks::ticks(scale.range, most);
                let labels = ticks::labels(&numbers);
                (numbers, labels, Vec::new())
            }
            Spread::Logarithmic => {
                let (major, minor) = ticks::decades(scale.range);
                if major.len() < FEW_DECADES {
                    let (shown, labels) = ticks::halves(scale.range);
                    return (shown, labels, minor);
                }
                // Where decades are many, not every one gets its number.
                let every = major.len().div_ceil(most.max(1)).max(1);
                let shown: Vec<f64> = major.iter().copied().step_by(every).collect();
                let labels = shown.iter().map(|v| ticks::power_label(*v)).collect();
                (shown, labels, if every == 1 { minor } else { major })
            }
        }
    }

    /// Faint lines at the numbers of the axes.
    pub fn grid(&self, sheet: &mut Sheet) {
        let ([x0, y0], [x1, y1]) = (self.corner, self.end());
        for v in Panel::numbers(&self.x, self.most(0)).0 {
            let x = self.place([v, self.y.range[0]])[0];
            sheet.line(vec![[x, y0], [x, y1]], theme::FAINT, theme::HAIR);
        }
        for v in Panel::numbers(&self.y, self.most(1)).0 {
            let y = self.place([self.x.range[0], v])[1];
            sheet.line(vec![[x0, y], [x1, y]], theme::FAINT, theme::HAIR);
        }
    }

    fn most(&self, axis: usize) -> usize {
        let room = [NUMBER_WIDTH, NUMBER_HEIGHT][axis];
        ((self.size[axis] / room) as usize).max(2)
    }

    /// Frame, ticks, numbers and labels.
    pub fn axes(&self, sheet: &mut Sheet) {
        let ([x0, y0], [x1, y1]) = (self.corner, self.end());
        sheet.frame([x0, y0], [x1, y1], theme::INK, theme::FRAME);
        let tick = |sheet: &mut Sheet, from: Point, to: Point| {
            sheet.line(vec![from, to], theme::INK, theme::FRAME);
        };
        let (numbers, labels, minor) = Panel::numbers(&self.x, self.most(0));
        let below = y1 + TICK + TICK_LABEL + theme::TEXT / 2.0;
        let mut taken = f64::NEG_INFINITY;
        for (v, label) in numbers.iter().zip(&labels) {
            let x = self.place([*v, self.y.range[0]])[0];
            tick(sheet, [x, y1], [x, y1 + TICK]);
            let half = text_width(label, theme::TEXT) / 2.0;
            let x = on_sheet(x, label, theme::TEXT);
            if x - half > taken {
                sheet.text(label, [x, below], Anchor::Middle);
                taken = x + half + LABEL_BLANK;
            }
        }
        for v in minor {
            let x = self.place([v, self.y.range[0]])[0];
            tick(sheet, [x, y1], [x, y1 + TICK / 2.0]);
        }
        if !self.x.label.is_empty() {
            let at = [(x0 + x1) / 2.0, below + theme::LINE_SPACING * theme::TEXT];
            sheet.text(&self.x.label, at, Anchor::Middle);
        }
        let (numbers, labels, minor) = Panel::numbers(&self.y, self.most(1));
        let mut widest: f64 = 0.0;
        for (v, label) in numbers.iter().zip(&labels) {
            let y = self.place([self.x.range[0], *v])[1];
            tick(sheet, [x0, y], [x0 - TICK, y]);
            sheet.text(label, [x0 - TICK - TICK_LABEL, y], Anchor::Right);
            widest = widest.max(text_width(label, theme::TEXT));
        }
        for v in minor {
            let y = self.place([self.x.range[0], v])[1];
            tick(sheet, [x0, y], [x0 - TICK / 2.0, y]);
        }
        if !self.y.label.is_empty() {
            let x = (x0 - TICK - TICK_LABEL - widest - theme::TEXT).max(theme::TEXT * 0.7);
            sheet.upwards(&self.y.label, [x, (y0 + y1) / 2.0], Anchor::Middle);
        }
    }

    /// A text in a small white field in the upper left corner.
    pub fn letter(&self, sheet: &mut Sheet, text: &str) {
        let [x, y] = self.corner;
        let width = text_width(text, theme::TEXT) + theme::TEXT;
        let height = theme::LINE_SPACING * theme::TEXT;
        let field = vec![[x, y], [x + width, y], [x + width, y + height], [x, y + height]];
        sheet.area(field, theme::PAPER);
        sheet.frame([x, y], [x + width, y + height], theme::INK, theme::HAIR);
        sheet.text(text, [x + width / 2.0, y + height / 2.0], Anchor::Middle);
    }
}

/// A curve to be explained: name, colour, dashed or not.
pub struct Entry<'a> {
    /// Its name.
    pub name: &'a str,
    /// Its colour.
    pub colour: RGBColor,
    /// Dashed.
    pub dashed: bool,
    /// Width of the stroke, in mm.
    pub width: f64,
}

/// Explains curves line by line from `at` downwards, in `columns` columns of this width; returns the height taken.
pub fn legend(sheet: &mut Sheet, at: Point, column_width: f64, columns: usize, entries: &[Entry]) -> f64 {
    const SAMPLE: f64 = 8.0;
    let pitch = theme::LINE_SPACING * theme::TEXT;
    let rows = entries.len().div_ceil(columns);
    for (n, entry) in entries.iter().enumerate() {
        let x = at[0] + (n / rows) as f64 * column_width;
        let y = at[1] + (n % rows) as f64 * pitch + pitch / 2.0;
        let sample = [[x, y], [x + SAMPLE, y]];
        if entry.dashed {
            sheet.dashed(&sample, entry.colour, entry.width);
        } else {
            sheet.line(sample.to_vec(), entry.colour, entry.width);
        }
        sheet.text(entry.name, [x + SAMPLE + theme::TEXT / 2.0, y], Anchor::Left);
    }
    rows as f64 * pitch
}

/// The part of a polygon inside a rectangle, side by side (Sutherland and Hodgman's method): where a concave polygon falls
/// apart, the parts stay joined along the sides, which a fill does not show.
fn clip_area(points: &[Point], [low, high]: [Point; 2]) -> Vec<Point> {
    let mut ring = points.to_vec();
    for (d, bound, sign) in [(0, low[0], 1.0), (0, high[0], -1.0), (1, low[1], 1.0), (1, high[1], -1.0)] {
        let depth = |p: &Point| sign * (p[d] - bound);
        let mut next = Vec::with_capacity(ring.len());
        for n in 0..ring.len() {
            let (a, b) = (ring[n], ring[(n + 1) % ring.len()]);
            let (da, db) = (depth(&a), depth(&b));
            if da >= 0.0 {
                next.push(a);
            }
            if (da < 0.0) != (db < 0.0) {
                let t = da / (da - db);
                next.push([a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])]);
            }
        }
        ring = next;
    }
    ring
}

/// The parts of a line inside a rectangle.
fn clip_line(points: &[Point], bounds: [Point; 2]) -> Vec<Vec<Point>> {
    let mut parts: Vec<Vec<Point>> = Vec::new();
    let mut open = false;
    for pair in points.windows(2) {
        let (a, b) = (pair[0], pair[1]);
        let (mut from, mut to) = (0.0f64, 1.0f64);
        for d in 0..2 {
            let step = b[d] - a[d];
            let [low, high] = [bounds[0][d] - a[d], bounds[1][d] - a[d]];
            if step == 0.0 {
                if low > 0.0 || high < 0.0 {
                    to = -1.0;
                }
            } else {
                let (u, v) = (low / step, high / step);
                from = from.max(u.min(v));
                to = to.min(u.max(v));
            }
        }
        if from > to {
            open = false;
            continue;
        }
        let at = |t: f64| [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])];
        match parts.last_mut() {
            Some(part) if open && from == 0.0 => part.push(at(to)),
            _ => parts.push(vec![at(from), at(to)]),
        }
        open = to == 1.0;
    }
    parts
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn areas_and_lines_are_clipped() {
        let bounds = [[0.0, 0.0], [2.0, 1.0]];
        let inside = clip_area(&[[-1.0, -1.0], [1.0, -1.0], [1.0, 0.5], [-1.0, 0.5]], bounds);
        let twice: f64 = (0..inside.len())
            .map(|n| (inside[n], inside[(n + 1) % inside.len()]))
            .map(|(a, b)| a[0] * b[1] - a[1] * b[0])
            .sum();
        assert!((twice.abs() / 2.0 - 0.5).abs() < 1e-15);
        assert!(clip_area(&[[3.0, 0.0], [4.0, 0.0], [4.0, 1.0]], bounds).is_empty());
        let parts = clip_line(&[[-1.0, 0.5], [1.0, 0.5], [1.0, 2.0], [1.5, 2.0], [1.5, 0.5]], bounds);
        assert_eq!(parts, [vec![[0.0, 0.5], [1.0, 0.5], [1.0, 1.0]], vec![[1.5, 1.0], [1.5, 0.5]]]);
    }

    #[test]
    fn data_stand_where_the_axes_say() {
        let panel = Panel {
            corner: [10.0, 5.0],
            size: [100.0, 50.0],
            x: Scale::linear("x", [0.0, 10.0]),
            y: Scale { label: "y".into(), range: [1.0, 100.0], spread: Spread::Logarithmic },
        };
        let [x, y] = panel.place([5.0, 10.0]);
        assert!((x - 60.0).abs() < 1e-12 && (y - 30.0).abs() < 1e-12);
        let mut sheet = Sheet::new("", 60.0);
        panel.axes(&mut sheet);
        let texts: Vec<&str> = sheet.layers[0]
            .marks
            .iter()
            .filter_map(|m| match m {
                crate::draw::sheet::Mark::Text { text, .. } => Some(text.as_str()),
                _ => None,
            })
            .collect();
        assert!(texts.contains(&"10") && texts.contains(&"100") && texts.contains(&"x"));
    }
}
