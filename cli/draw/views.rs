//! The views of a cross-section: all of it true to scale, and the narrow and the wide edge of the gap enlarged.

use super::panel::{Panel, Scale, BELOW, LEFT, RIGHT};
use super::scene::{Outline, Scene};
use super::sheet::{Anchor, Point, Sheet};
use super::theme;
use super::ticks::short;

/// Free space shown around the plates, in lengths of the longer plate and in gaps.
const AROUND_LENGTHS: f64 = 0.16;
const AROUND_GAPS: f64 = 0.7;
/// Tallest main view, in mm.
const TALLEST: f64 = 100.0;
/// Height of an enlarged view, in mm, and in gaps at that edge.
const ENLARGED: f64 = 36.0;
const GAPS_SHOWN: f64 = 3.2;
/// Weakest and strongest enlargement worth a view.
const ENLARGEMENT: [f64; 2] = [1.7, 500.0];

/// A frame on a fill has a light rim this many times as wide; opacity of the field under a letter.
const HALO: f64 = 3.0;
const PATCH_OPACITY: f64 = 0.8;

/// One view.
#[derive(Clone, Debug, PartialEq)]
pub struct View {
    /// Its axes, in mm.
    pub panel: Panel,
    /// Letter and enlargement; the main view has none.
    pub detail: Option<Detail>,
}

/// What an enlarged view is called.
#[derive(Clone, Debug, PartialEq)]
pub struct Detail {
    /// The letter that marks its place in the main view.
    pub letter: &'static str,
    /// Enlargement over the main view.
    pub times: f64,
    /// The gap there, in mm.
    pub gap_mm: f64,
}

/// A view from `corner` of this size in mm, centred at a point, with `scale` mm to the millimetre.
fn view(corner: Point, size: Point, centre: Point, scale: f64, labels: [&str; 2]) -> Panel {
    let range = |d: usize| [centre[d] - size[d] / scale / 2.0, centre[d] + size[d] / scale / 2.0];
    Panel { corner, size, x: Scale::linear(labels[0], range(0)), y: Scale::linear(labels[1], range(1)) }
}

/// Local gap of two plates at `x`, in mm, or none where they do not face each other.
fn gap_at(scene: &Scene, x: f64) -> Option<f64> {
    let height = |o: &Outline| {
        let [a, b] = [o.corners[0], o.corners[1]];
        let t = (x - a[0]) / (b[0] - a[0]);
        (-1e-9..=1.0 + 1e-9).contains(&t).then(|| a[1] + t * (b[1] - a[1]))
    };
    Some(height(scene.outlines[1].as_ref()?)? - height(scene.outlines[0].as_ref()?)?)
}

/// The two ends of the gap, the narrow one first: place along x and local gap, in mm.
fn ends(scene: &Scene) -> Option<[[f64; 2]; 2]> {
    let [lower, upper] = [scene.outlines[0]?, scene.outlines[1]?];
    let x = [lower.corners[0][0].max(upper.corners[0][0]), lower.corners[1][0].min(upper.corners[1][0])];
    let ends = [[x[0], gap_at(scene, x[0])?], [x[1], gap_at(scene, x[1])?]];
    Some(if ends[0][1] <= ends[1][1] { ends } else { [ends[1], ends[0]] })
}

/// All views, the main one first, below `top`; and where the next thing may begin.
pub fn views(scene: &Scene, top: f64) -> (Vec<View>, f64) {
    let [x, z] = scene.extent();
    let arrangement = &scene.setup.question.arrangement;
    let length = super::scene::MM * arrangement.lower.length_m.max(arrangement.upper.length_m);
    let around = AROUND_LENGTHS * length + AROUND_GAPS * super::scene::MM * arrangement.pose.gap_m;
    let width = theme::WIDTH - LEFT - RIGHT;
    let real = [x, z].map(|r| r[1] - r[0] + 2.0 * around);
    let scale = (width / real[0]).min(TALLEST / real[1]);
    // A tall view takes the whole width all the same and shows more of the outside.
    let size = [width, scale * real[1]];
    let centre = [x, z].map(|r| 0.5 * (r[0] + r[1]));
    let main = view([LEFT, top], size, centre, scale, ["x (mm)", "z (mm)"]);
    let mut all = vec![View { panel: main, detail: None }];
    let mut bottom = top + size[1] + BELOW;
    let Some(ends) = ends(scene) else { return (all, bottom) };
    // From left to right as in the main view.
    let mut in_order = ends;
    in_order.sort_by(|a, b| a[0].total_cmp(&b[0]));
    let times = |gap: f64| ENLARGED / (GAPS_SHOWN * gap * scale);
    let worth: Vec<[f64; 2]> = in_order
        .into_iter()
        .filter(|[_, gap]| (ENLARGEMENT[0]..=ENLARGEMENT[1]).contains(&times(*gap)))
        .collect();
    // Side by side, or one across the whole width.
    let width = theme::WIDTH / worth.len().max(1) as f64 - (LEFT + RIGHT);
    let mut x = LEFT;
    for (&[at, gap], letter) in worth.iter().zip(["a", "b"]) {
        let times = times(gap);
        // The lower plate's facing surface is the plane z = 0.
        let z = gap / 2.0;
        // Nothing is enlarged that the main view does not show.
        let half = width / (2.0 * scale * times);
        let [from, to] = all[0].panel.x.range;
        let at = if to - from > 2.0 * half { at.clamp(from + half, to - half) } else { at };
        let corner = [x, bottom];
        let panel = view(corner, [width, ENLARGED], [at, z], scale * times, ["x (mm)", "z (mm)"]);
        all.push(View { panel, detail: Some(Detail { letter, times, gap_mm: gap }) });
        x += width + LEFT + RIGHT;
    }
    if all.len() > 1 {
        bottom += ENLARGED + BELOW;
    }
    (all, bottom)
}

/// A plate on the sheet, at least as thick as a stroke, away from the gap.
pub fn drawn(outline: &Outline, place: impl Fn([f64; 2]) -> Point) -> [Point; 4] {
    let mut corners = outline.corners.map(place);
    // The sheet's y runs downwards.
    let away = [outline.away[0], -outline.away[1]];
    let [a, d] = [corners[0], corners[3]];
    if (d[0] - a[0]).hypot(d[1] - a[1]) < theme::PLATE {
        for (near, far) in [(1, 2), (0, 3)] {
            corners[far] = [0, 1].map(|e| corners[near][e] + theme::PLATE * away[e]);
        }
    }
    corners
}

/// The plates in every view: as thick as they are, a sheet as a stroke on its far side, so that the gap keeps its width.
pub fn plates(sheet: &mut Sheet, scene: &Scene, views: &[View]) {
    sheet.layer("plates");
    for view in views {
        for outline in scene.outlines.iter().flatten() {
            let corners = drawn(outline, |c| view.panel.place(c));
            sheet.area(view.panel.clip_area(&corners), theme::INK);
        }
    }
}

/// Places of the enlarged views in the main one; drawn before the plates, which the light rims would cut.
pub fn places(sheet: &mut Sheet, views: &[View]) {
    sheet.layer("places");
    let main = &views[0].panel;
    for view in &views[1..] {
        let Some(detail) = &view.detail else { continue };
        let (x, y) = (view.panel.x.range, view.panel.y.range);
        let [upper, lower] = [main.place([x[0], y[1]]), main.place([x[1], y[0]])];
        sheet.frame(upper, lower, theme::PAPER, HALO * theme::FRAME);
        sheet.frame(upper, lower, theme::INK, theme::FRAME);
        let above = [(upper[0] + lower[0]) / 2.0, upper[1] - theme::TEXT];
        let half = theme::TEXT * 0.6;
        let [left, right, top, bottom] = [above[0] - half, above[0] + half, above[1] - half, above[1] + half];
        sheet.veil(
            vec![[left, top], [right, top], [right, bottom], [left, bottom]],
            theme::PAPER,
            PATCH_OPACITY,
        );
        sheet.text(detail.letter, above, Anchor::Middle);
    }
}

/// Axes and letters of all views.
pub fn axes(sheet: &mut Sheet, views: &[View]) {
    sheet.layer("axes");
    for view in views {
        view.panel.axes(sheet);
        if let Some(Detail { letter, times, .. }) = &view.detail {
            view.panel.letter(sheet, &format!("{letter} (×{})", short(*times, 2)));
        }
    }
}
