//! The look of all pictures: sizes in millimetres, strokes, colours, the font.
//!
//! A picture is made for a page: white ground, text that is still 7 points high when the picture is set one column
//! (85 mm) wide, colours that survive grey printing and colour blindness.

use plotters::style::{register_font, FontStyle, RGBColor};

/// Width of every picture, in mm.
pub const WIDTH: f64 = 128.0;
/// Millimetres in a typographic point.
const POINT: f64 = 25.4 / 72.0;
/// Height of ordinary text, in mm: 10.5 points here are 7 points in a column of 85 mm.
pub const TEXT: f64 = 10.5 * POINT;
/// Height of the title.
pub const TITLE: f64 = 12.0 * POINT;
/// Distance between two lines of text, in text heights.
pub const LINE_SPACING: f64 = 1.35;
/// White space at the margins, in mm.
pub const MARGIN: f64 = 3.0;

/// Stroke widths in mm: hairlines (field lines, contours), frames and ticks, curves, plates.
pub const HAIR: f64 = 0.12;
/// Frames and ticks.
pub const FRAME: f64 = 0.2;
/// Curves.
pub const CURVE: f64 = 0.45;
/// A sheet, which has no thickness of its own.
pub const PLATE: f64 = 0.7;

/// Ordinary ink.
pub const INK: RGBColor = RGBColor(0x1c, 0x23, 0x2b);
/// Ink for what steps back: grid lines, frames of insets.
pub const FAINT: RGBColor = RGBColor(0xc9, 0xce, 0xd3);
/// Ink for what stands between: contour lines on a fill.
pub const MIDDLE: RGBColor = RGBColor(0x6b, 0x75, 0x80);
/// Paper.
pub const PAPER: RGBColor = RGBColor(0xff, 0xff, 0xff);

/// Colours of the upper and the lower plate, and of a third thing: blue, vermilion and green of the set for all kinds of
/// colour vision by Okabe and Ito (2008; from memory).
pub const UPPER: RGBColor = RGBColor(0x00, 0x72, 0xb2);
/// The lower plate.
pub const LOWER: RGBColor = RGBColor(0xd5, 0x5e, 0x00);
/// A third thing.
pub const THIRD: RGBColor = RGBColor(0x00, 0x9e, 0x73);

/// The family as a viewer looks it up; the first one is bundled, the second has the same widths.
pub const FAMILY: &str = "DejaVu Sans, Verdana, Helvetica, Arial, sans-serif";
/// The bundled font, from the Debian package fonts-dejavu-core; its licence stands beside it.
const FONT: &[u8] = include_bytes!("font/DejaVuSans-subset.ttf");

/// Makes the bundled font known to the drawing library.
///
/// # Panics
/// If the bundled font is none, which is a mistake in the program.
pub fn load_font() {
    assert!(register_font(FAMILY, FontStyle::Normal, FONT).is_ok(), "the bundled font cannot be read");
}

/// A colour as the drawing library has it.
fn rgb(c: colorous::Color) -> RGBColor {
    RGBColor(c.r, c.g, c.b)
}

/// A light-to-dark scale of one quantity from 0 to 1, lightness falling evenly (ColorBrewer's YlGnBu).
pub fn sequential(u: f64) -> RGBColor {
    rgb(colorous::YELLOW_GREEN_BLUE.eval_continuous(u.clamp(0.0, 1.0)))
}

/// A scale with a light middle at 0.5 (ColorBrewer's PuOr): two signs.
pub fn diverging(u: f64) -> RGBColor {
    rgb(colorous::PURPLE_ORANGE.eval_continuous(1.0 - u.clamp(0.0, 1.0)))
}

/// Colour of one of `count` curves in order: a walk through cividis, without its lightest end, which paper swallows.
pub fn curve(number: usize, count: usize) -> RGBColor {
    const LIGHTEST: f64 = 0.85;
    let u = if count > 1 { number as f64 / (count - 1) as f64 } else { 0.0 };
    rgb(colorous::CIVIDIS.eval_continuous(LIGHTEST * u))
}

/// A colour mixed with white; 1 leaves it, 0 is white.
pub fn tint(colour: RGBColor, strength: f64) -> RGBColor {
    let mix = |c: u8| (255.0 - strength * (255.0 - c as f64)).round() as u8;
    RGBColor(mix(colour.0), mix(colour.1), mix(colour.2))
}
