//! A sheet as SVG or as PNG, through the drawing library.
//!
//! Both go through one walk over the marks. The library works in whole units: for SVG they are hundredths of a millimetre,
//! for PNG pixels of a finer raster, which is averaged down afterwards so that every slanted edge is smooth.

use std::fmt::Write;

use plotters::backend::{BitMapBackend, DrawingBackend, SVGBackend};
use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, IntoDrawingArea};
use plotters::element::{PathElement, Polygon, Text};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{Color, FontTransform, IntoFont, IntoTextStyle, RGBColor, ShapeStyle};

use super::sheet::{Anchor, Layer, Mark, Sheet};
use super::theme;

/// Units of the SVG in a millimetre.
const SVG_UNITS: f64 = 100.0;
/// Pixels in an inch of a PNG: common practice for print.
const DOTS_PER_INCH: f64 = 300.0;
/// Width of an inch, in mm.
const INCH: f64 = 25.4;
/// Pixels of the finer raster along each side of a pixel.
const OVERSAMPLING: usize = 3;
/// Height of a line over the size of the font, which the library takes for the size: ascent 0.928 and descent 0.236 of the
/// bundled font.
pub const FONT_SCALE: f64 = 1.164;
/// How the library has to be told the size of a font, and by how much its texts stand too high, in sizes of the font.
#[derive(Clone, Copy)]
struct FontFit {
    scale: f64,
    drop: f64,
}

/// The SVG output divides a size by this, and sets the base line half a height of an x (0.547 sizes) below the middle.
const SVG_FONT: FontFit = FontFit { scale: 1.24, drop: 0.09 };
/// The bitmap output sets a text with its base line 0.113 sizes below the middle; half of a digit's height is 0.365.
const PNG_FONT: FontFit = FontFit { scale: FONT_SCALE, drop: 0.365 - 0.113 };

/// Why a sheet was not rendered: always a mistake in the program.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("internal error: the picture could not be made: {0}; please report it with the bench file")]
pub struct RenderError(String);

fn failed(error: impl std::fmt::Debug) -> RenderError {
    RenderError(format!("{error:?}"))
}

/// Draws marks with `units` of the area to a millimetre.
fn paint<DB: DrawingBackend>(
    marks: &[Mark],
    area: &DrawingArea<DB, Shift>,
    units: f64,
    font: FontFit,
) -> Result<(), RenderError> {
    let place = |p: &[f64; 2]| ((p[0] * units).round() as i32, (p[1] * units).round() as i32);
    for mark in marks {
        match mark {
            Mark::Area { points, colour, opacity } => {
                let points: Vec<(i32, i32)> = points.iter().map(place).collect();
                area.draw(&Polygon::new(points, colour.mix(*opacity).filled())).map_err(failed)?;
            }
            Mark::Line { points, colour, width } => {
                let mut points: Vec<(i32, i32)> = points.iter().map(place).collect();
                points.dedup();
                let stroke_width = (width * units).round().max(1.0) as u32;
                let style = ShapeStyle { color: colour.to_rgba(), filled: false, stroke_width };
                area.draw(&PathElement::new(points, style)).map_err(failed)?;
            }
            Mark::Text { text, at, anchor, size, colour, upwards } => {
                let h_pos = match anchor {
                    Anchor::Left => HPos::Left,
                    Anchor::Middle => HPos::Center,
                    Anchor::Right => HPos::Right,
                };
                let drop = size * font.drop;
                let at = if *upwards { [at[0] + drop, at[1]] } else { [at[0], at[1] + drop] };
                let font = (theme::FAMILY, size * units * font.scale).into_font();
                let font = if *upwards { font.transform(FontTransform::Rotate270) } else { font };
                let style = font.color(colour).into_text_style(area).pos(Pos::new(h_pos, VPos::Center));
                area.draw(&Text::new(text.as_str(), place(&at), style)).map_err(failed)?;
            }
        }
    }
    Ok(())
}

/// The body of an SVG of one layer: what the library writes between the outermost tags.
fn svg_layer(layer: &Layer, size: (u32, u32)) -> Result<String, RenderError> {
    let mut text = String::new();
    let area = SVGBackend::with_string(&mut text, size).into_drawing_area();
    paint(&layer.marks, &area, SVG_UNITS, SVG_FONT)?;
    area.present().map_err(failed)?;
    drop(area);
    let body = text.split_once(">\n").and_then(|(_, rest)| rest.rsplit_once("</svg>"));
    Ok(body.ok_or_else(|| failed("an SVG without its outermost tag"))?.0.into())
}

/// Text with the characters of XML escaped.
pub fn escaped(text: &str) -> String {
    text.replace('&', "&amp;").replace('<', "&lt;").replace('>', "&gt;").replace('"', "&quot;")
}

/// A stand-alone SVG: a group a layer, text as text, sizes in mm.
///
/// # Errors
/// A mistake in the program.
pub fn svg(sheet: &Sheet) -> Result<String, RenderError> {
    let [width, height] = sheet.size;
    let title = escaped(&sheet.title);
    Ok(format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width:.2}mm\" height=\"{height:.2}mm\" \
         viewBox=\"{}\" role=\"img\" stroke-linejoin=\"round\" aria-label=\"{title}\">\n<title>{title}</title>\n\
         <rect width=\"100%\" height=\"100%\" fill=\"#ffffff\"/>\n{}</svg>\n",
        view_box(sheet),
        svg_layers(sheet, "id")?
    ))
}

/// An SVG that is a part of a page: as wide as there is room, in the ink of the page and on its ground.
///
/// # Errors
/// A mistake in the program.
pub fn svg_in_page(sheet: &Sheet, description: &str) -> Result<String, RenderError> {
    let ink = |colour: RGBColor| format!("\"#{:02X}{:02X}{:02X}\"", colour.0, colour.1, colour.2);
    let mut body = svg_layers(sheet, "class")?;
    for colour in [theme::INK, theme::MIDDLE] {
        body = body.replace(&ink(colour), "\"currentColor\"");
    }
    let description = escaped(description);
    Ok(format!(
        "<svg viewBox=\"{}\" role=\"img\" stroke-linejoin=\"round\" aria-label=\"{description}\">\n\
         <title>{description}</title>\n{body}</svg>\n",
        view_box(sheet)
    ))
}

fn view_box(sheet: &Sheet) -> String {
    let [width, height] = sheet.size.map(|s| (s * SVG_UNITS).round() as u32);
    format!("0 0 {width} {height}")
}

/// A group for each layer, its name in this attribute.
fn svg_layers(sheet: &Sheet, attribute: &str) -> Result<String, RenderError> {
    theme::load_font();
    let [width, height] = sheet.size.map(|s| (s * SVG_UNITS).round() as u32);
    let mut text = String::new();
    for layer in &sheet.layers {
        let body = svg_layer(layer, (width, height))?;
        let body = body.replace(" opacity=\"1\"", "").replace(" \"/>", "\"/>");
        write!(text, "<g {attribute}=\"{}\">\n{body}</g>\n", escaped(&layer.name)).map_err(failed)?;
    }
    Ok(text)
}

/// A PNG of 300 pixels to the inch.
///
/// # Errors
/// A mistake in the program.
pub fn png(sheet: &Sheet) -> Result<Vec<u8>, RenderError> {
    theme::load_font();
    let pixels = DOTS_PER_INCH / INCH;
    let [width, height] = sheet.size.map(|s| (s * pixels).round() as usize);
    let fine = [width, height].map(|n| n * OVERSAMPLING);
    let mut raster = vec![255; 3 * fine[0] * fine[1]];
    {
        let backend = BitMapBackend::with_buffer(&mut raster, (fine[0] as u32, fine[1] as u32));
        let area = backend.into_drawing_area();
        for layer in &sheet.layers {
            paint(&layer.marks, &area, pixels * OVERSAMPLING as f64, PNG_FONT)?;
        }
        area.present().map_err(failed)?;
    }
    let mut image = Vec::with_capacity(3 * width * height);
    for y in 0..height {
        for x in 0..width {
            for c in 0..3 {
                let mut sum = 0usize;
                for v in 0..OVERSAMPLING {
                    let row = 3 * ((y * OVERSAMPLING + v) * fine[0] + x * OVERSAMPLING) + c;
                    sum += (0..OVERSAMPLING).map(|u| raster[row + 3 * u] as usize).sum::<usize>();
                }
                image.push(((sum + OVERSAMPLING * OVERSAMPLING / 2) / (OVERSAMPLING * OVERSAMPLING)) as u8);
            }
        }
    }
    let mut file = Vec::new();
    let mut encoder = png::Encoder::new(&mut file, width as u32, height as u32);
    encoder.set_color(png::ColorType::Rgb);
    encoder.set_depth(png::BitDepth::Eight);
    let per_metre = (DOTS_PER_INCH / INCH * 1e3).round() as u32;
    encoder.set_pixel_dims(Some(png::PixelDimensions {
        xppu: per_metre,
        yppu: per_metre,
        unit: png::Unit::Meter,
    }));
    encoder
        .add_text_chunk("Software".into(), concat!("tiltgap ", env!("CARGO_PKG_VERSION")).into())
        .map_err(failed)?;
    let mut writer = encoder.write_header().map_err(failed)?;
    writer.write_image_data(&image).map_err(failed)?;
    writer.finish().map_err(failed)?;
    Ok(file)
}
