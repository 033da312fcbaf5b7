//! What stands above a picture: the title of the bench, what is shown, and for which pose and voltage.

use tiltgap_solver::Connection;

use crate::assess::Setup;

use super::scene::{plane_m, MM};
use super::sheet::{fitted, text_width, Anchor, Sheet};
use super::theme;
use super::ticks::short;

/// Significant digits of a pose in a caption: it is there to be recognised, not to be calculated with.
const DIGITS: usize = 4;
/// Most characters of a title that are looked at.
const LONGEST: usize = 200;

/// A text without what has no width or turns the reading direction round: it would do harm to what stands beside it.
pub fn plain(text: &str) -> String {
    let turns = |c: &char| matches!(c, '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{61c}');
    let printable = |c: &char| !c.is_control() && !matches!(c, '\u{fffe}' | '\u{ffff}') && !turns(c);
    text.chars().filter(printable).take(LONGEST).collect::<String>().trim().into()
}

/// Gap, tilt, roll, shift, voltage and wiring in one line.
pub fn circumstances(setup: &Setup) -> String {
    let (pose, question) = (&setup.bench.pose, &setup.question);
    let mut parts = vec![format!("gap {} mm", short(MM * pose.gap_m, DIGITS))];
    parts.push(format!("tilt {}°", short(pose.tilt_rad.to_degrees(), DIGITS)));
    if pose.roll_rad != 0.0 {
        parts.push(format!("roll {}°", short(pose.roll_rad.to_degrees(), DIGITS)));
    }
    if pose.shift_m != [0.0; 2] {
        let [x, y] = pose.shift_m.map(|s| short(MM * s, DIGITS));
        parts.push(format!("shift {x}, {y} mm"));
    }
    parts.push(format!("{} V", short(question.voltage_v, DIGITS)));
    parts.push(match question.connection {
        Connection::Grounded => "grounded".into(),
        Connection::Floating => "floating".into(),
    });
    parts.join(" · ")
}

/// "in the plane y = 0", or "per metre of width".
pub fn place(setup: &Setup) -> String {
    let arrangement = &setup.question.arrangement;
    match arrangement.dimensions {
        tiltgap_meshes::Dimensions::Two => "in cross-section, wide plates".into(),
        tiltgap_meshes::Dimensions::Three => {
            let y = short(MM * plane_m(arrangement), DIGITS);
            if y == "0" {
                "in the plane y = 0".into()
            } else {
                format!("in the plane y = {y} mm")
            }
        }
    }
}

/// The words above a picture, broken into lines.
#[derive(Clone, Debug, PartialEq)]
pub struct Caption {
    title: Vec<String>,
    lines: Vec<String>,
}

/// Most lines of a title.
const TITLE_LINES: usize = 2;
/// Width that text may take, in mm.
const WIDTH: f64 = theme::WIDTH - 2.0 * theme::MARGIN;

/// A text in at most `most` lines of this size; what is too long is cut off.
fn broken(text: &str, size: f64, most: usize) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    let mut rest: Vec<&str> = text.split_whitespace().collect();
    while !rest.is_empty() {
        let joined = |n: usize| rest[..n].join(" ");
        if lines.len() + 1 == most {
            lines.push(fitted(&joined(rest.len()), size, WIDTH));
            break;
        }
        let fits = (1..=rest.len()).rev().find(|n| text_width(&joined(*n), size) <= WIDTH).unwrap_or(1);
        lines.push(fitted(&joined(fits), size, WIDTH));
        rest.drain(..fits);
    }
    lines
}

impl Caption {
    /// A title, which is made harmless, and lines below it.
    pub fn new(title: &str, lines: &[String]) -> Caption {
        let lines = lines.iter().flat_map(|l| broken(l, theme::TEXT, usize::MAX)).collect();
        Caption { title: broken(&plain(title), theme::TITLE, TITLE_LINES), lines }
    }

    /// Where the picture may begin, in mm.
    pub fn height(&self) -> f64 {
        let lines = self.title.len() as f64 * theme::TITLE + self.lines.len() as f64 * theme::TEXT;
        theme::MARGIN + theme::LINE_SPACING * lines + theme::TEXT
    }

    /// A sheet with the caption on it.
    pub fn sheet(&self, height: f64) -> Sheet {
        let name: Vec<&str> = self.title.iter().chain(self.lines.first()).map(String::as_str).collect();
        let mut sheet = Sheet::new(&name.join(" "), height);
        sheet.layer("caption");
        let mut top = theme::MARGIN;
        for (lines, size, colour) in
            [(&self.title, theme::TITLE, theme::INK), (&self.lines, theme::TEXT, theme::MIDDLE)]
        {
            for line in lines {
                let pitch = theme::LINE_SPACING * size;
                sheet.styled(line, [theme::MARGIN, top + pitch / 2.0], Anchor::Left, size, colour);
                top += pitch;
            }
        }
        sheet
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn titles_lose_what_does_harm() {
        assert_eq!(plain("a\u{202e}b\u{200f} c\u{7}"), "ab c");
        assert_eq!(plain(&"x".repeat(10_000)).len(), LONGEST);
        let long = Caption::new(&"word ".repeat(2000), &[]);
        assert_eq!(long.title.len(), TITLE_LINES);
        assert!(long.title.iter().all(|l| text_width(l, theme::TITLE) <= WIDTH));
    }
}
