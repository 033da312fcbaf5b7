//! Picture of the potential: filled bands between equipotentials, the plates, the edges enlarged.

use plotters::style::RGBColor;

use super::caption::{self, Caption};
use super::contours::{Level, Mapped};
use super::panel::{Panel, Scale};
use super::scene::Scene;
use super::sheet::{on_sheet, Anchor, Sheet};
use super::theme;
use super::ticks;
use super::views::{self, View};

/// Most bands between the potentials of the plates.
const BANDS: usize = 20;
/// In the main view every so many bands has a line, so that the gap is not full of them.
const COARSE: usize = 5;
/// What is nearer to a plate's potential than this part of a band is that of the plate.
const OF_A_PLATE: f64 = 1e-3;
/// Height of the colour scale, in mm, and room for its numbers.
const SCALE_HEIGHT: f64 = 3.5;

/// Bands of potential, their colours and limits.
pub struct Bands {
    /// Limits between bands, ascending, in V; multiples of `step`.
    pub levels: Vec<f64>,
    /// Distance of levels.
    step: f64,
    /// Potentials of the plates, the lower one first, in V.
    range: [f64; 2],
}

impl Bands {
    /// Round levels strictly between the potentials of the plates.
    pub fn new(plates_v: [f64; 2]) -> Bands {
        let mut range = plates_v;
        range.sort_by(f64::total_cmp);
        let step = ticks::round_step(range[1] - range[0], BANDS);
        let slack = OF_A_PLATE * step;
        let inside = |v: &f64| *v > range[0] + slack && *v < range[1] - slack;
        let levels = ticks::multiples(range, step).into_iter().filter(inside).collect();
        Bands { levels, step, range }
    }

    /// Colour of the band below limit number `n` (above the last one, if there is no such limit).
    pub fn colour(&self, n: usize) -> RGBColor {
        let low = if n == 0 { self.range[0] } else { self.levels[n - 1] };
        let high = self.levels.get(n).copied().unwrap_or(self.range[1]);
        let middle = 0.5 * (low + high);
        let most = self.range[0].abs().max(self.range[1].abs());
        let two_signs = self.range[0] < -0.01 * most && self.range[1] > 0.01 * most;
        if two_signs {
            theme::diverging(0.5 + 0.5 * middle / most)
        } else {
            theme::sequential(middle.abs() / most)
        }
    }

    /// Limits above and not above zero: where the fill ascends from the ground, and where it descends.
    fn split(&self) -> usize {
        let slack = 1e-6 * self.step;
        self.levels.iter().position(|v| *v > slack).unwrap_or(self.levels.len())
    }
}

/// Contours of the potential of a scene.
pub struct Equipotentials {
    /// Areas at or above the limit, for limits above zero; at or below it, for others.
    pub levels: Vec<Level>,
}

impl Equipotentials {
    /// Contours at the limits of the bands.
    pub fn new(scene: &Scene, bands: &Bands) -> Equipotentials {
        let [nx, nz] = scene.shape;
        let grid = |values| Mapped { columns: nz, rows: nx, values, points: &scene.points };
        let split = bands.split();
        let turned: Vec<f64> = scene.potential.iter().map(|v| -v).collect();
        let below: Vec<f64> = bands.levels[..split].iter().map(|v| -v).collect();
        let mut levels = grid(&turned).levels(&below);
        levels.extend(grid(&scene.potential).levels(&bands.levels[split..]));
        Equipotentials { levels }
    }

    /// Fills the views: from the band of the far field up, and down.
    fn fill(&self, sheet: &mut Sheet, bands: &Bands, views: &[View]) {
        let split = bands.split();
        for View { panel, .. } in views {
            let [[x0, y0], [x1, y1]] = panel.bounds();
            sheet.area(vec![[x0, y0], [x1, y0], [x1, y1], [x0, y1]], bands.colour(split));
            let up = (split..self.levels.len()).map(|n| (n, n + 1));
            let down = (0..split).rev().map(|n| (n, n));
            for (n, colour) in up.chain(down) {
                for area in &self.levels[n].areas {
                    let area: Vec<_> = area.iter().map(|p| panel.place(*p)).collect();
                    sheet.area(super::lines::thinned(&panel.clip_area(&area)), bands.colour(colour));
                }
            }
        }
    }

    /// Lines in every view; in the main one every so many only.
    pub fn lines(&self, sheet: &mut Sheet, bands: &Bands, views: &[View], colour: RGBColor) {
        for View { panel, detail } in views {
            for (level, value) in self.levels.iter().zip(&bands.levels) {
                let number = (value / bands.step).round() as i64;
                if detail.is_none() && number % COARSE as i64 != 0 {
                    continue;
                }
                for line in &level.lines {
                    let line: Vec<_> = line.iter().map(|p| panel.place(*p)).collect();
                    for part in panel.clip_line(&line) {
                        sheet.line(super::lines::thinned(&part), colour, theme::HAIR);
                    }
                }
            }
        }
    }
}

/// The colour scale: bands side by side, round numbers below.
fn colour_scale(sheet: &mut Sheet, bands: &Bands, top: f64) {
    sheet.layer("scale");
    let panel = Panel {
        corner: [super::panel::LEFT, top],
        size: [theme::WIDTH - super::panel::LEFT - super::panel::RIGHT, SCALE_HEIGHT],
        x: Scale::linear("potential (V)", bands.range),
        y: Scale::linear("", [0.0, 1.0]),
    };
    for n in 0..=bands.levels.len() {
        let low = if n == 0 { bands.range[0] } else { bands.levels[n - 1] };
        let high = bands.levels.get(n).copied().unwrap_or(bands.range[1]);
        let (a, b) = (panel.place([low, 1.0]), panel.place([high, 0.0]));
        sheet.area(vec![a, [b[0], a[1]], b, [a[0], b[1]]], bands.colour(n));
    }
    let [[x0, y0], [x1, y1]] = panel.bounds();
    sheet.frame([x0, y0], [x1, y1], theme::INK, theme::FRAME);
    // The potentials of a floating pair are round up to the tolerance of the solver only.
    let slack = 1e-4 * (bands.range[1] - bands.range[0]);
    let range = [bands.range[0] - slack, bands.range[1] + slack];
    let numbers = ticks::ticks(range, BANDS / 3);
    let below = y1 + theme::TEXT;
    for (value, label) in numbers.iter().zip(ticks::labels(&numbers)) {
        let x = panel.place([*value, 0.0])[0];
        sheet.line(vec![[x, y1], [x, y1 + 0.8]], theme::INK, theme::FRAME);
        sheet.text(&label, [on_sheet(x, &label, theme::TEXT), below], Anchor::Middle);
    }
    let at = [(x0 + x1) / 2.0, below + theme::LINE_SPACING * theme::TEXT];
    sheet.text("potential (V)", at, Anchor::Middle);
}

/// The picture.
pub fn potential(scene: &Scene) -> Sheet {
    let lines = [
        format!("Potential {}, true to scale", caption::place(scene.setup)),
        caption::circumstances(scene.setup),
    ];
    let caption = Caption::new(&scene.setup.bench.title, &lines);
    let (views, bottom) = views::views(scene, caption.height());
    let bands = Bands::new(scene.plates_v);
    let equipotentials = Equipotentials::new(scene, &bands);
    let height = bottom + SCALE_HEIGHT + theme::TEXT * (1.5 + theme::LINE_SPACING) + theme::MARGIN;
    let mut sheet = caption.sheet(height);
    sheet.layer("potential");
    equipotentials.fill(&mut sheet, &bands, &views);
    sheet.layer("equipotentials");
    equipotentials.lines(&mut sheet, &bands, &views, theme::MIDDLE);
    views::places(&mut sheet, &views);
    views::plates(&mut sheet, scene, &views);
    views::axes(&mut sheet, &views);
    colour_scale(&mut sheet, &bands, bottom);
    sheet
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bands_are_round_and_inside() {
        let bands = Bands::new([0.0, 400.0]);
        assert_eq!((bands.levels.len(), bands.levels[0], bands.levels[18]), (19, 20.0, 380.0));
        let bands = Bands::new([123.0, -277.0]);
        assert!(bands.levels.iter().all(|v| *v > -277.0 && *v < 123.0));
        assert!(bands.levels.windows(2).all(|w| w[1] > w[0]));
        // Far away is the lightest.
        let light = |c: RGBColor| c.0 as u32 + c.1 as u32 + c.2 as u32;
        let split = bands.split();
        assert!((0..=bands.levels.len()).all(|n| light(bands.colour(n)) <= light(bands.colour(split)) + 12));
    }
}
