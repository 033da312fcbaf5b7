//! One line on the terminal that says how far the work is, rewritten in place and gone at the end.
//!
//! Off a terminal only what is meant to stay is written. What cannot be written is not missed.

use std::io::Write;
use std::time::{Duration, Instant};

use tiltgap_solver::Progress;

/// Shortest time between two lines.
const PAUSE: Duration = Duration::from_millis(100);

/// A line that is rewritten in place.
pub struct Line<'a> {
    out: &'a mut (dyn Write + Send),
    shown: bool,
    last: Option<Instant>,
    width: usize,
}

impl<'a> Line<'a> {
    /// A line on `out`, silent unless that is a terminal.
    pub fn new(out: &'a mut (dyn Write + Send), terminal: bool) -> Self {
        Line { out, shown: terminal, last: None, width: 0 }
    }

    /// Whether there is a terminal to show it.
    pub fn is_shown(&self) -> bool {
        self.shown
    }

    /// The next text is shown even if the one before is fresh.
    fn hurry(&mut self) {
        self.last = None;
    }

    /// Shows a text, unless the one before is fresh.
    pub fn write(&mut self, text: &str) {
        if !self.shown || self.last.is_some_and(|t| t.elapsed() < PAUSE) {
            return;
        }
        self.last = Some(Instant::now());
        let width = self.width;
        self.width = text.chars().count();
        let _ = write!(self.out, "\r{text:<width$}").and_then(|()| self.out.flush());
    }

    /// Writes a line that stays, for where there is no terminal.
    pub fn plain(&mut self, text: &str) {
        let _ = writeln!(self.out, "{text}").and_then(|()| self.out.flush());
    }
}

impl Drop for Line<'_> {
    fn drop(&mut self) {
        if self.width > 0 {
            let _ = write!(self.out, "\r{:width$}\r", "", width = self.width).and_then(|()| self.out.flush());
        }
    }
}

/// The progress of an assessment.
pub struct ProgressLine<'a> {
    line: Line<'a>,
    nodes: usize,
}

/// A whole number in groups of three digits: 153 957.
pub fn grouped(n: usize) -> String {
    let digits = n.to_string();
    let mut text = String::new();
    for (at, digit) in digits.chars().enumerate() {
        if at > 0 && (digits.len() - at).is_multiple_of(3) {
            text.push(' ');
        }
        text.push(digit);
    }
    text
}

impl<'a> ProgressLine<'a> {
    /// A line on `out`, silent unless that is a terminal.
    pub fn new(out: &'a mut (dyn Write + Send), terminal: bool) -> Self {
        ProgressLine { line: Line::new(out, terminal), nodes: 0 }
    }

    /// Shows a piece of news, unless the one before is fresh.
    pub fn show(&mut self, news: Progress) {
        let text = match news {
            Progress::Level { q, nodes } => {
                self.nodes = nodes;
                self.line.hurry();
                format!("level {q}: {} nodes", grouped(nodes))
            }
            Progress::Iteration { q, iteration, error } => {
                format!("level {q}: {} nodes, iteration {iteration}, error {error:.0e}", grouped(self.nodes))
            }
        };
        self.line.write(&text);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn shown(terminal: bool) -> String {
        let mut out = Vec::new();
        let mut line = ProgressLine::new(&mut out, terminal);
        line.show(Progress::Level { q: 4, nodes: 153_957 });
        line.show(Progress::Iteration { q: 4, iteration: 2, error: 1e-3 });
        line.show(Progress::Level { q: 6, nodes: 9 });
        drop(line);
        String::from_utf8(out).unwrap()
    }

    #[test]
    fn a_line_is_overwritten_and_cleared() {
        let (first, second) = ("level 4: 153 957 nodes", "level 6: 9 nodes      ");
        assert_eq!(shown(true), format!("\r{first}\r{second}\r{}\r", " ".repeat(16)));
        assert_eq!(shown(false), "");
    }

    #[test]
    fn digits_in_groups() {
        assert_eq!([0, 999, 1000, 1234567].map(grouped), ["0", "999", "1 000", "1 234 567"]);
    }
}
