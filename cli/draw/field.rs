//! Picture of the field: lines of force that begin at equal charges, so that their density shows the strength of the field.

use plotters::style::RGBColor;
use tiltgap_solver::Level;

use super::caption::{self, Caption};
use super::lines::{thinned, Tracer};
use super::potential::{Bands, Equipotentials};
use super::profile::{profiles, Profile};
use super::scene::{PlateNodes, Scene, MM};
use super::sheet::{Point, Sheet};
use super::theme;
use super::views::{self, View};

/// Distance of lines in the gap on the page, in mm: this much, and this part of the height of the gap on the page, so that a
/// wide gap is not grey with lines. The height counts as at most this part of the view's.
const SPACING: [f64; 2] = [0.6, 0.03];
const HIGHEST_GAP: f64 = 0.35;
/// Where a line begins: this part of a cell off the plate.
const OFF_PLATE: f64 = 0.25;
/// Length of an arrowhead and half its width, in mm; the shortest line that bears one; the least distance of two.
const ARROW: [f64; 2] = [1.5, 0.5];
const ARROW_LINE: f64 = 5.0;
const ARROW_DISTANCE: f64 = 3.5;
/// Ink of the lines.
const LINE_INK: RGBColor = theme::UPPER;

/// Places that cut the charge of one side of a plate into parts of `part`, in the middle of each: in numbers of the plate's
/// nodes from its first.
fn seeds(profile: &Profile, side: usize, part: f64) -> Vec<f64> {
    let charge: Vec<f64> =
        profile.density[side].iter().zip(&profile.share_mm).map(|(d, s)| (d * s).abs()).collect();
    let total: f64 = charge.iter().sum();
    let count = (total / part).round() as usize;
    let mut places = Vec::with_capacity(count);
    let (mut sum, mut n) = (0.0, 0);
    for m in 0..count {
        let target = total * (m as f64 + 0.5) / count as f64;
        while n + 1 < charge.len() && sum + charge[n] < target {
            sum += charge[n];
            n += 1;
        }
        // The charge of a node is spread over half a cell on either side of it, within the plate.
        let last = (charge.len() - 1) as f64;
        let (from, to) = ((n as f64 - 0.5).max(0.0), (n as f64 + 0.5).min(last));
        let t = if charge[n] > 0.0 { (target - sum) / charge[n] } else { 0.5 };
        places.push(from + t.clamp(0.02, 0.98) * (to - from));
    }
    places
}

/// Where the lines of a plate begin, in numbers of nodes of the scene, and the sign of the charge there.
fn starts(profile: &Profile, nodes: PlateNodes, part: f64) -> Vec<([f64; 2], f64)> {
    let [i, k] = nodes.map(|range| range.map(|n| n as f64));
    let off = [-OFF_PLATE, OFF_PLATE];
    let mut all = Vec::new();
    for side in 0..2 {
        for place in seeds(profile, side, part) {
            let sign = profile.density[side][place.round() as usize].signum();
            let node = (place as usize).min(profile.columns.len() - 2);
            let [a, b] = [profile.columns[node] as f64, profile.columns[node + 1] as f64];
            all.push(([a + (place - node as f64) * (b - a), k[side] + off[side]], sign));
        }
        // The nodes of a rim crowd at its corners as the charge does.
        let count = (profile.rims[side].abs() / part).round() as usize;
        all.extend((0..count).map(|m| {
            let height = k[0] + (k[1] - k[0]) * (m as f64 + 0.5) / count as f64;
            ([i[side] + off[side], height], profile.rims[side].signum())
        }));
    }
    all
}

/// All lines, each in the direction of the field, in mm. `part` is the charge of a line (C/m^2 times mm).
fn lines(scene: &Scene, plates: &[Profile; 2], part: f64, within: [[f64; 2]; 2]) -> Vec<Vec<[f64; 2]>> {
    let tracer = Tracer::new(scene);
    let mut all = Vec::new();
    // From the upper plate; then what reaches the lower one from elsewhere.
    for plate in [1, 0].into_iter().filter(|&plate| scene.outlines[plate].is_some()) {
        for (start, sign) in starts(&plates[plate], scene.nodes[plate], part) {
            let traced = tracer.trace(start, sign, within);
            if plate == 0 && traced.hit {
                continue;
            }
            let mut line = traced.points;
            if sign < 0.0 {
                line.reverse();
            }
            all.push(line);
        }
    }
    all
}

/// A line with an arrowhead in its middle, unless another one is near.
fn with_arrow(sheet: &mut Sheet, line: &[Point], heads: &mut Vec<Point>) {
    sheet.line(line.to_vec(), LINE_INK, theme::HAIR * 1.3);
    let step = |p: &[Point]| (p[1][0] - p[0][0]).hypot(p[1][1] - p[0][1]);
    let length: f64 = line.windows(2).map(step).sum();
    if length < ARROW_LINE {
        return;
    }
    let mut left = length / 2.0;
    for pair in line.windows(2) {
        let one = step(pair);
        if left > one || one == 0.0 {
            left -= one;
            continue;
        }
        let u = [0, 1].map(|d| (pair[1][d] - pair[0][d]) / one);
        let centre = [0, 1].map(|d| pair[0][d] + left * u[d]);
        if heads.iter().any(|h| (h[0] - centre[0]).hypot(h[1] - centre[1]) < ARROW_DISTANCE) {
            return;
        }
        heads.push(centre);
        let at = |along: f64, aside: f64| {
            [centre[0] + along * u[0] - aside * u[1], centre[1] + along * u[1] + aside * u[0]]
        };
        let [long, half] = ARROW;
        sheet.area(vec![at(long / 2.0, 0.0), at(-long / 2.0, half), at(-long / 2.0, -half)], LINE_INK);
        return;
    }
}

/// The picture.
pub fn field(scene: &Scene, level: &Level) -> Sheet {
    let text = [
        format!("Field lines, equipotentials {}", caption::place(scene.setup)),
        caption::circumstances(scene.setup),
    ];
    let caption = Caption::new(&scene.setup.bench.title, &text);
    let (views, bottom) = views::views(scene, caption.height());
    let plates = profiles(scene, level);
    let bands = Bands::new(scene.plates_v);
    let equipotentials = Equipotentials::new(scene, &bands);
    let mut sheet = caption.sheet(bottom);
    sheet.layer("equipotentials");
    equipotentials.lines(&mut sheet, &bands, &views, theme::FAINT);
    sheet.layer("field");
    // The gap side of the upper plate is its lower one.
    let upper = &plates[1];
    let on_gap: f64 = upper.density[0].iter().zip(&upper.share_mm).map(|(d, s)| (d * s).abs()).sum();
    let within = [views[0].panel.x.range, views[0].panel.y.range];
    let pose = &scene.setup.question.arrangement.pose;
    let length = upper.share_mm.iter().sum::<f64>();
    for View { panel, detail } in views.iter().filter(|_| on_gap > 0.0) {
        let scale = panel.size[0] / (panel.x.range[1] - panel.x.range[0]);
        let gap_mm = MM * pose.gap_m;
        // In an enlarged view the field is that of the gap there.
        let local_mm = detail.as_ref().map_or(gap_mm, |d| d.gap_mm);
        let height = (scale * local_mm).min(HIGHEST_GAP * panel.size[1]);
        let count = scale * length / (SPACING[0] + SPACING[1] * height) * local_mm / gap_mm;
        let mut heads = Vec::new();
        for line in lines(scene, &plates, on_gap / count, within) {
            let line: Vec<Point> = line.iter().map(|p| panel.place(*p)).collect();
            for part in panel.clip_line(&line) {
                with_arrow(&mut sheet, &thinned(&part), &mut heads);
            }
        }
    }
    views::places(&mut sheet, &views);
    views::plates(&mut sheet, scene, &views);
    views::axes(&mut sheet, &views);
    sheet
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn seeds_stand_at_equal_charges() {
        // Density 1 over a plate of five nodes: the nodes at the edges have half of a share.
        let share_mm = vec![0.5, 1.0, 1.0, 1.0, 0.5];
        let density = [vec![1.0; 5], vec![0.0; 5]];
        let profile = Profile {
            columns: vec![10, 11, 12, 13, 14],
            x_mm: vec![0.0; 5],
            density,
            rims: [0.0; 2],
            share_mm,
        };
        let places = seeds(&profile, 0, 0.5);
        assert_eq!(places.len(), 8);
        for (n, place) in places.iter().enumerate() {
            assert!((place - (0.25 + 0.5 * n as f64)).abs() < 1e-12, "{places:?}");
        }
        assert!(seeds(&profile, 1, 0.5).is_empty());
    }
}
