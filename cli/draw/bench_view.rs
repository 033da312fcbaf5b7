//! Drawing of a bench as it stands, from its own numbers: plates true to scale in cross-section, hinge, dimensions.

use tiltgap_meshes::Arrangement;
use tiltgap_solver::{hinge_offset_m, Hinge};

use super::scene::{plane_m, Outline, MM};
use super::sheet::{on_sheet, text_width, Anchor, Point, Sheet};
use super::theme;
use super::ticks::short;
use super::views::drawn;

/// Blank at both sides, in mm: half of a number fits.
const SIDE: f64 = 8.0;
/// Most height that the bench itself may take, in mm.
const TALLEST: f64 = 60.0;
/// Distance of the dimension lines from the bench and from each other, in mm.
const PITCH: f64 = 7.5;
/// Half the height of the stroke at the end of a dimension line, in mm.
const END: f64 = 1.2;
/// Radius of the hinge, in mm, and corners of its circle.
const HINGE: f64 = 1.4;
const CORNERS: usize = 24;
/// Significant digits of a dimension: it is there to be recognised.
const DIGITS: usize = 4;

/// A dimension line with its ends at the height `y`, and its text above it.
fn dimension(sheet: &mut Sheet, [x0, x1]: [f64; 2], y: f64, text: &str) {
    sheet.line(vec![[x0, y], [x1, y]], theme::MIDDLE, theme::FRAME);
    for x in [x0, x1] {
        sheet.line(vec![[x, y - END], [x, y + END]], theme::MIDDLE, theme::FRAME);
    }
    let middle = on_sheet(0.5 * (x0 + x1), text, theme::TEXT);
    sheet.text(text, [middle, y - 0.75 * theme::TEXT], Anchor::Middle);
}

fn mm(m: f64) -> String {
    format!("{} mm", short(MM * m, DIGITS))
}

/// The drawing.
pub fn bench_view(arrangement: &Arrangement, hinge: Option<&Hinge>) -> Sheet {
    let outlines = Outline::both(arrangement, plane_m(arrangement));
    let pose = &arrangement.pose;
    let centre = [MM * pose.shift_m[0], MM * pose.gap_m];
    let hinge_at = hinge.map(|h| {
        let offset = hinge_offset_m(arrangement, h);
        [centre[0] + MM * offset[0], centre[1] + MM * offset[2]]
    });
    let mut extent = [[f64::INFINITY, f64::NEG_INFINITY]; 2];
    let corners = outlines.iter().flatten().flat_map(|o| o.corners);
    for point in corners.chain(hinge_at).chain([centre, [0.0, 0.0]]) {
        for d in 0..2 {
            extent[d] = [extent[d][0].min(point[d]), extent[d][1].max(point[d])];
        }
    }
    let [x, z] = extent;
    let scale = ((theme::WIDTH - 2.0 * SIDE) / (x[1] - x[0]).max(f64::MIN_POSITIVE))
        .min(TALLEST / (z[1] - z[0]).max(f64::MIN_POSITIVE));
    let left = 0.5 * (theme::WIDTH - scale * (x[1] - x[0]));
    let rows_above = 1.0 + f64::from(u8::from(hinge.is_some()));
    let top = theme::MARGIN + theme::TEXT + PITCH * rows_above + HINGE;
    let place = |p: Point| [left + scale * (p[0] - x[0]), top + scale * (z[1] - p[1])];
    let bottom = place([0.0, z[0]])[1];
    let mut sheet = Sheet::new("The bench in cross-section, to scale", bottom + 2.6 * PITCH + theme::TEXT);
    sheet.layer("plates");
    for outline in outlines.iter().flatten() {
        sheet.area(drawn(outline, place).to_vec(), theme::INK);
    }
    if let Some(film) = arrangement.film {
        if let Some(lower) = &outlines[0] {
            let [a, b, ..] = lower.corners;
            let up = |p: Point| [p[0], p[1] + MM * film.thickness_m];
            sheet.veil([a, b, up(b), up(a)].map(place).to_vec(), theme::LOWER, 0.6);
        }
    }
    sheet.layer("hinge");
    if let Some(at) = hinge_at {
        let [at, to] = [at, centre].map(place);
        sheet.dashed(&[at, to], theme::MIDDLE, theme::FRAME);
        let turn = |n: usize| std::f64::consts::TAU * n as f64 / CORNERS as f64;
        let circle = (0..CORNERS).map(|n| [at[0] + HINGE * turn(n).cos(), at[1] + HINGE * turn(n).sin()]);
        sheet.area(circle.collect(), theme::UPPER);
    }
    sheet.layer("dimensions");
    let spans = outlines.map(|o| o.map(|o| [place(o.corners[0])[0], place(o.corners[1])[0]]));
    let plate = |p: &tiltgap_meshes::Plate| mm(p.length_m);
    if let Some(span) = spans[1] {
        let text = format!("upper plate {}", plate(&arrangement.upper));
        dimension(&mut sheet, span, top - HINGE - 0.6 * PITCH, &text);
    }
    if let (Some(hinge), Some(at)) = (hinge, hinge_at) {
        let span = [at, centre].map(|p| place(p)[0]);
        dimension(&mut sheet, span, top - HINGE - 1.6 * PITCH, &format!("arm {}", mm(hinge.arm_m)));
    }
    if let Some(span) = spans[0] {
        let text = format!("lower plate {}", plate(&arrangement.lower));
        dimension(&mut sheet, span, bottom + 2.3 * PITCH, &text);
    }
    // The gap is narrow: its text stands below the lower plate.
    let [upper, lower] = [centre, [centre[0], 0.0]].map(place);
    let foot = bottom + 0.55 * PITCH;
    sheet.line(vec![upper, lower], theme::UPPER, theme::CURVE);
    sheet.line(vec![lower, [lower[0], foot]], theme::MIDDLE, theme::FRAME);
    let tilt = short(pose.tilt_rad.to_degrees(), DIGITS);
    let text = format!("gap {} at the centre, tilt {tilt}°", mm(pose.gap_m));
    let half = 0.5 * text_width(&text, theme::TEXT);
    let x = lower[0].clamp(half + theme::MARGIN, theme::WIDTH - half - theme::MARGIN);
    sheet.text(&text, [x, foot + 0.65 * theme::TEXT], Anchor::Middle);
    sheet
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::draw::sheet::Mark;
    use crate::fixture::report;

    #[test]
    fn plates_gap_and_arm_have_one_scale() {
        let question = report().job.question;
        let sheet = bench_view(&question.arrangement, question.hinge.as_ref());
        let layer = |name: &str| &sheet.layers.iter().find(|l| l.name == name).unwrap().marks;
        let [Mark::Area { points: lower, .. }, Mark::Area { points: upper, .. }] = &layer("plates")[..]
        else {
            panic!("{sheet:?}")
        };
        let scale = (lower[1][0] - lower[0][0]) / 110.0;
        assert!(((upper[1][0] - upper[0][0]) / (110.0 * 0.4f64.to_radians().cos()) - scale).abs() < 1e-12);
        // Heights of the edges: 4 mm less and more 55 mm sin(0.4 deg).
        for (n, sign) in [(0, -1.0), (1, 1.0)] {
            let gap = (lower[n][1] - upper[n][1]) / scale;
            assert!((gap - 4.0 - sign * 55.0 * 0.4f64.to_radians().sin()).abs() < 1e-9, "{gap}");
        }
        let texts: Vec<&str> = layer("dimensions")
            .iter()
            .filter_map(|m| if let Mark::Text { text, .. } = m { Some(text.as_str()) } else { None })
            .collect();
        let expected =
            ["upper plate 110 mm", "arm 150 mm", "lower plate 110 mm", "gap 4 mm at the centre, tilt 0.4°"];
        assert_eq!(texts, expected);
    }
}
