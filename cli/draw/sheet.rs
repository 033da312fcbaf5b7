//! A picture as a list of marks in named layers, in millimetres from the upper left corner.
//!
//! What is drawn is decided here and above; how it becomes SVG or pixels is left to [`render`](super::render).

use plotters::style::{IntoFont, RGBColor};

use super::theme;

/// A point in mm: to the right, downwards.
pub type Point = [f64; 2];

/// Where a text stands relative to its point.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Anchor {
    /// The point is the left end.
    Left,
    /// The point is the middle.
    Middle,
    /// The point is the right end.
    Right,
}

/// One mark.
#[derive(Clone, Debug, PartialEq)]
pub enum Mark {
    /// A filled polygon.
    Area {
        /// Corners.
        points: Vec<Point>,
        /// Fill.
        colour: RGBColor,
        /// 1 is opaque.
        opacity: f64,
    },
    /// A line.
    Line {
        /// Points.
        points: Vec<Point>,
        /// Ink.
        colour: RGBColor,
        /// Width in mm.
        width: f64,
    },
    /// A text, centred on the height of its point.
    Text {
        /// The text.
        text: String,
        /// Where.
        at: Point,
        /// Relative to the point.
        anchor: Anchor,
        /// Height in mm.
        size: f64,
        /// Ink.
        colour: RGBColor,
        /// Reads upwards instead of to the right.
        upwards: bool,
    },
}

/// Marks that belong together.
#[derive(Clone, Debug, PartialEq)]
pub struct Layer {
    /// Its name: a word of the trade, in SVG the id of the group.
    pub name: String,
    /// Its marks, the lowest first.
    pub marks: Vec<Mark>,
}

/// A picture.
#[derive(Clone, Debug, PartialEq)]
pub struct Sheet {
    /// What it shows, in one line.
    pub title: String,
    /// Width and height in mm.
    pub size: Point,
    /// Layers, the lowest first.
    pub layers: Vec<Layer>,
}

/// Length of dashes and of the blanks between them, in mm.
const DASH: [f64; 2] = [1.6, 1.0];

impl Sheet {
    /// An empty picture of the common width.
    pub fn new(title: &str, height: f64) -> Sheet {
        Sheet { title: title.into(), size: [theme::WIDTH, height], layers: Vec::new() }
    }

    /// Begins a layer; marks go there until the next one begins.
    pub fn layer(&mut self, name: &str) {
        self.layers.push(Layer { name: name.into(), marks: Vec::new() });
    }

    fn push(&mut self, mark: Mark) {
        if self.layers.is_empty() {
            self.layer("ground");
        }
        let last = self.layers.len() - 1;
        self.layers[last].marks.push(mark);
    }

    /// A filled polygon.
    pub fn area(&mut self, points: Vec<Point>, colour: RGBColor) {
        self.veil(points, colour, 1.0);
    }

    /// A polygon that lets what is below shine through.
    pub fn veil(&mut self, points: Vec<Point>, colour: RGBColor, opacity: f64) {
        if points.len() > 2 {
            self.push(Mark::Area { points, colour, opacity });
        }
    }

    /// A line.
    pub fn line(&mut self, points: Vec<Point>, colour: RGBColor, width: f64) {
        if points.len() > 1 {
            self.push(Mark::Line { points, colour, width });
        }
    }

    /// A dashed line.
    pub fn dashed(&mut self, points: &[Point], colour: RGBColor, width: f64) {
        for dash in dashes(points) {
            self.line(dash, colour, width);
        }
    }

    /// A closed frame.
    pub fn frame(&mut self, [x0, y0]: Point, [x1, y1]: Point, colour: RGBColor, width: f64) {
        self.line(vec![[x0, y0], [x1, y0], [x1, y1], [x0, y1], [x0, y0]], colour, width);
    }

    /// A text in ordinary ink and size.
    pub fn text(&mut self, text: &str, at: Point, anchor: Anchor) {
        self.styled(text, at, anchor, theme::TEXT, theme::INK);
    }

    /// A text of this size and colour.
    pub fn styled(&mut self, text: &str, at: Point, anchor: Anchor, size: f64, colour: RGBColor) {
        self.push(Mark::Text { text: text.into(), at, anchor, size, colour, upwards: false });
    }

    /// A text that reads upwards.
    pub fn upwards(&mut self, text: &str, at: Point, anchor: Anchor) {
        let (size, colour) = (theme::TEXT, theme::INK);
        self.push(Mark::Text { text: text.into(), at, anchor, size, colour, upwards: true });
    }
}

/// Width of a text, in mm.
pub fn text_width(text: &str, size: f64) -> f64 {
    // Measured at a size at which whole pixels do not matter.
    const PIXELS: f64 = 1000.0;
    theme::load_font();
    let (width, _) = (theme::FAMILY, PIXELS).into_font().box_size(text).unwrap_or((0, 0));
    // The library measures with a scale factor that its SVG output does not have; see `render::FONT_SCALE`.
    width as f64 / PIXELS * size * super::render::FONT_SCALE
}

/// A text that fits into a width, cut off with an ellipsis if it has to be.
pub fn fitted(text: &str, size: f64, width: f64) -> String {
    if text_width(text, size) <= width {
        return text.into();
    }
    let chars: Vec<char> = text.chars().collect();
    let cut = |n: usize| chars[..n].iter().collect::<String>().trim_end().to_string() + "…";
    // The longest beginning that fits, by halving.
    let (mut fits, mut too_long) = (0, chars.len());
    while too_long - fits > 1 {
        let middle = (fits + too_long) / 2;
        if text_width(&cut(middle), size) <= width {
            fits = middle;
        } else {
            too_long = middle;
        }
    }
    cut(fits)
}

/// Where the middle of a text may stand at most, so that all of it is on the sheet.
pub fn on_sheet(x: f64, text: &str, size: f64) -> f64 {
    let half = text_width(text, size) / 2.0;
    x.clamp(half + BORDER, theme::WIDTH - half - BORDER)
}

/// Blank that stays at the sides of a sheet, in mm.
const BORDER: f64 = 1.0;

/// A line cut into dashes.
fn dashes(points: &[Point]) -> Vec<Vec<Point>> {
    let mut all = Vec::new();
    let (mut ink, mut left) = (true, DASH[0]);
    let mut dash: Vec<Point> = points.first().copied().into_iter().collect();
    for pair in points.windows(2) {
        let [mut a, b] = [pair[0], pair[1]];
        let mut length = (b[0] - a[0]).hypot(b[1] - a[1]);
        while length > left {
            let t = left / length;
            a = [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])];
            length -= left;
            dash.push(a);
            if ink {
                all.push(std::mem::take(&mut dash));
            }
            dash = vec![a];
            ink = !ink;
            left = DASH[usize::from(!ink)];
        }
        left -= length;
        dash.push(b);
    }
    if ink && dash.len() > 1 {
        all.push(dash);
    }
    all
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dashes_cover_their_part_of_a_line() {
        let line = [[0.0, 0.0], [3.0, 4.0], [3.0, 100.0]];
        let inked: f64 = dashes(&line)
            .iter()
            .flat_map(|d| d.windows(2))
            .map(|p| (p[1][0] - p[0][0]).hypot(p[1][1] - p[0][1]))
            .sum();
        let periods = (101.0 / (DASH[0] + DASH[1])).floor();
        let rest: f64 = 101.0 - periods * (DASH[0] + DASH[1]);
        assert!((inked - periods * DASH[0] - rest.min(DASH[0])).abs() < 1e-9);
    }

    #[test]
    fn long_texts_are_cut_to_fit() {
        assert_eq!(fitted("short", theme::TEXT, 50.0), "short");
        let cut = fitted(&"long ".repeat(2000), theme::TEXT, 50.0);
        assert!(cut.ends_with('…') && text_width(&cut, theme::TEXT) <= 50.0);
        assert!(text_width(&cut, theme::TEXT) > 40.0);
    }
}
