//! What stands above a picture: the title of the bench, what is shown, and for which pose and voltage.

use tiltgap_solver::Connection;

use crate::assess::Setup;

use super::scene::{plane_m, MM};
use super::sheet::{fitted, Anchor, Sheet};
use super::theme;
use super::ticks::short;

/// Significant digits of a pose in a caption: it is there to be recognised, not to be calculated with.
const DIGITS: usize = 4;
/// Most characters of a title that are looked at.
const LONGEST: usize = 200;

/// A text without what has no width or turns the reading direction round: it would do harm to what stands beside it.
pub fn plain(text: &str) -> String {
    let turns = |c: &char| {
        matches!(c, '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{61c}')
    };
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
            if y == "0" { "in the plane y = 0".into() } else { format!("in the plane y = {y} mm") }
        }
    }
}

/// Height of a caption of this many lines below the title, in mm.
pub fn height(lines: usize) -> f64 {
    theme::MARGIN + theme::LINE_SPACING * (theme::TITLE + lines as f64 * theme::TEXT) + theme::TEXT / 2.0
}

/// Writes title and lines at the top of a sheet.
pub fn caption(sheet: &mut Sheet, title: &str, lines: &[String]) {
    sheet.layer("caption");
    let width = theme::WIDTH - 2.0 * theme::MARGIN;
    let mut y = theme::MARGIN + theme::TITLE / 2.0;
    let title = fitted(&plain(title), theme::TITLE, width);
    if !title.is_empty() {
        sheet.styled(&title, [theme::MARGIN, y], Anchor::Left, theme::TITLE, theme::INK);
    }
    y += theme::LINE_SPACING * (theme::TITLE + theme::TEXT) / 2.0;
    for line in lines {
        let line = fitted(line, theme::TEXT, width);
        sheet.styled(&line, [theme::MARGIN, y], Anchor::Left, theme::TEXT, theme::MIDDLE);
        y += theme::LINE_SPACING * theme::TEXT;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn titles_lose_what_does_harm() {
        assert_eq!(plain("a\u{202e}b\u{200f} c\u{7}"), "ab c");
        assert_eq!(plain(&"x".repeat(10_000)).len(), LONGEST);
    }
}
