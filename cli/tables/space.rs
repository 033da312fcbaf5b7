//! The poses of a table: its axes, and which pose of the bench belongs to a place on them.

use tiltgap_meshes::{Arrangement, Pose, Vector3};
use tiltgap_solver::{hinge_offset_m, wedge_factors, Hinge, Ideal, Question};

use super::axis::{Axis, Span, Variable};
use super::error::TableError;
use crate::concise::concise_si;

/// Which poses a table runs through.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// Gap, tilt and roll independent of each other.
    Free,
    /// The beam turns about its hinge and carries the plate along. The bench's gap and shift are those of the beam angle
    /// zero, at which the plates are parallel; its tilt is not used.
    AlongHinge,
}

/// A place on the axes, one value for each, in SI units.
pub type Place = [f64];

/// The poses of a table.
#[derive(Clone, Debug, PartialEq)]
pub struct Space {
    /// The bench; what is no axis is taken from its pose.
    pub question: Question,
    /// Which poses.
    pub kind: Kind,
    /// The axes.
    pub axes: Vec<Axis>,
}

/// What the lamellae of the tilted gap would carry over a rectangle that does not move: a smooth function of the place,
/// which carries most of the variation of the full values.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Lamella {
    /// The ideal formula with that rectangle as its area.
    pub ideal: Ideal,
    /// Mean of d/h.
    pub capacitance: f64,
    /// Mean of (d/h)^2.
    pub force: f64,
    /// Mean of x (d/h)^2, in metres.
    pub moment_m: f64,
}

/// The pose at which the beam stands at an angle.
fn turned(bench: &Arrangement, hinge: &Hinge, angle_rad: f64) -> Pose {
    let offset = |tilt_rad: f64| -> Vector3 {
        let pose = Pose { tilt_rad, ..bench.pose };
        hinge_offset_m(&Arrangement { pose, ..*bench }, hinge)
    };
    // The hinge stays where it is; the plate's centre goes round it.
    let (parallel, tilted) = (offset(0.0), offset(angle_rad));
    let mut sideways_m = parallel[0] - tilted[0];
    if sideways_m.abs() < LEAST_SHIFT * bench.size_m() {
        sideways_m = 0.0;
    }
    Pose {
        gap_m: bench.pose.gap_m + parallel[2] - tilted[2],
        tilt_rad: angle_rad,
        roll_rad: bench.pose.roll_rad,
        shift_m: [bench.pose.shift_m[0] + sideways_m, bench.pose.shift_m[1]],
    }
}

impl Space {
    /// The poses over some ranges.
    ///
    /// # Errors
    /// If a pose in the ranges is impossible, or the bench lacks what the table needs. Nothing is solved.
    pub fn new(question: &Question, kind: Kind, spans: &[Span]) -> Result<Space, TableError> {
        let mut space = Space { question: *question, kind, axes: Vec::new() };
        // The corners of the ranges hold the extremes of all edges; along the hinge the middle is looked at as well.
        let mut corners: Vec<Vec<f64>> = vec![Vec::new()];
        for span in spans {
            let values = match kind {
                Kind::Free => vec![span.from, span.to],
                Kind::AlongHinge => {
                    (0..=LOOKS).map(|n| span.from + (span.to - span.from) * n as f64 / LOOKS as f64).collect()
                }
            };
            corners = corners.iter().flat_map(|c| values.iter().map(|v| [&c[..], &[*v]].concat())).collect();
        }
        let variables: Vec<Variable> = spans.iter().map(|s| s.variable).collect();
        for corner in &corners {
            let pose = space.pose_of(variables.iter().copied(), corner)?;
            let arrangement = Arrangement { pose, ..question.arrangement };
            if let Err(reason) = arrangement.check(tiltgap_meshes::Sideways::Smooth) {
                return Err(TableError::Impossible { place: described(&variables, corner), reason });
            }
            if arrangement.overlap().area_m2() == 0.0 {
                return Err(TableError::NoOverlap { place: described(&variables, corner) });
            }
        }
        space.axes = match (kind, question.hinge) {
            (Kind::Free, _) => Axis::free(spans, question),
            (Kind::AlongHinge, Some(hinge)) => {
                spans.iter().map(|s| Axis::along_hinge(*s, question, &hinge)).collect()
            }
            (Kind::AlongHinge, None) => return Err(TableError::NoHinge),
        };
        match space.axes.iter().find(|a| !a.is_sound()) {
            None => Ok(space),
            Some(axis) => Err(TableError::Folded { variable: axis.span.variable.name() }),
        }
    }

    fn pose_of(&self, variables: impl Iterator<Item = Variable>, at: &Place) -> Result<Pose, TableError> {
        let bench = &self.question.arrangement;
        match self.kind {
            Kind::AlongHinge => {
                let hinge = self.question.hinge.ok_or(TableError::NoHinge)?;
                Ok(turned(bench, &hinge, at[0]))
            }
            Kind::Free => {
                let mut pose = bench.pose;
                for (variable, v) in variables.zip(at) {
                    match variable {
                        Variable::Gap => pose.gap_m = *v,
                        Variable::Tilt => pose.tilt_rad = *v,
                        Variable::Roll => pose.roll_rad = *v,
                        Variable::Angle => return Err(TableError::NoHinge),
                    }
                }
                Ok(pose)
            }
        }
    }

    /// The question for the pose at a place: one value for each axis.
    pub fn question_at(&self, at: &Place) -> Question {
        assert_eq!(at.len(), self.axes.len(), "{at:?} is no place on {} axes", self.axes.len());
        let variables = self.axes.iter().map(|a| a.span.variable);
        let pose = self.pose_of(variables, at).expect("the axes were checked when the space was made");
        Question { arrangement: Arrangement { pose, ..self.question.arrangement }, ..self.question }
    }

    /// The lamella values at a place, over the rectangle in which the plates overlap in the bench's own pose.
    pub fn lamella(&self, at: &Place) -> Lamella {
        let mut question = self.question_at(at);
        question.arrangement.pose.shift_m = self.question.arrangement.pose.shift_m;
        let wedge = wedge_factors(&question.arrangement).expect("plates that overlap, as was checked");
        Lamella {
            ideal: question.ideal(),
            capacitance: wedge.capacitance,
            force: wedge.force,
            moment_m: wedge.moment_m,
        }
    }

    /// The first value that lies outside of its axis, with the axis.
    pub fn outside(&self, at: &Place) -> Option<(usize, f64)> {
        self.axes
            .iter()
            .zip(at)
            .enumerate()
            .find(|(_, (axis, v))| !axis.holds(**v))
            .map(|(n, (_, v))| (n, *v))
    }
}

/// A shift along the beam's way that is a smaller part of the largest plate side is left out: it changes the factors by
/// half of that part (measured), and edges so near to each other make the grid so fine that solving takes ten times as
/// long or fails.
pub const LEAST_SHIFT: f64 = 1e-6;
/// Places along the beam's way at which the pose is looked at before anything is solved.
const LOOKS: usize = 64;
/// "gap 2 mm, tilt 1 deg".
pub fn described(variables: &[Variable], at: &Place) -> String {
    let parts: Vec<String> = variables
        .iter()
        .zip(at)
        .map(|(variable, v)| match variable {
            Variable::Gap => {
                // Five digits tell the nodes of any axis apart.
                let rounded: f64 = format!("{v:.4e}").parse().unwrap_or(*v);
                let length = concise_si(rounded, 0.0, "m").unwrap_or_else(|_| format!("{v} m"));
                format!("gap {length}")
            }
            other => format!("{} {:.5} deg", other.name(), v.to_degrees()),
        })
        .collect();
    parts.join(", ")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::report;

    fn span(variable: Variable, from: f64, to: f64) -> Span {
        Span { variable, from, to }
    }

    #[test]
    fn the_hinge_stays_where_it_is() {
        let question = report().job.question;
        let hinge = Hinge { arm_m: 0.15, height_m: 0.006 };
        let bench = &question.arrangement;
        for angle in [-0.015, 0.0, 0.03] {
            let slack = LEAST_SHIFT * bench.size_m();
            let pose = turned(bench, &hinge, angle);
            let offset = hinge_offset_m(&Arrangement { pose, ..*bench }, &hinge);
            let at = [pose.shift_m[0] + offset[0], pose.gap_m + offset[2]];
            assert!((at[0] + 0.15).abs() < slack && (at[1] - 0.010).abs() < 1e-15, "{at:?}");
        }
        let pose = turned(bench, &hinge, 0.0);
        assert_eq!((pose.gap_m, pose.tilt_rad, pose.shift_m), (0.004, 0.0, [0.0, 0.0]));
        // arm (1 - cos(angle)) is 0.75 nm here.
        let level = Hinge { arm_m: 0.15, height_m: 0.0 };
        assert_eq!(turned(bench, &level, 1e-4).shift_m, [0.0, 0.0]);
        assert!(turned(bench, &level, 0.01).shift_m[0] < -7e-6);
    }

    #[test]
    fn impossible_poses_are_named_before_anything_is_solved() {
        let question = report().job.question;
        let spans = [span(Variable::Gap, 0.0005, 0.008), span(Variable::Tilt, 0.0, 0.02)];
        let error = Space::new(&question, Kind::Free, &spans).unwrap_err().to_string();
        assert!(
            error.contains("gap 500 µm, tilt 1.14592 deg") && error.contains("the plates touch"),
            "{error}"
        );
        let down = [span(Variable::Angle, -0.02, 0.0)];
        let error = Space::new(&question, Kind::AlongHinge, &down).unwrap_err().to_string();
        assert!(error.contains("angle -1.14592 deg") && error.contains("free (+x) edge"), "{error}");
        let mut without = question;
        without.hinge = None;
        assert!(matches!(Space::new(&without, Kind::AlongHinge, &down), Err(TableError::NoHinge)));
    }

    #[test]
    fn places_outside_are_noticed_and_ends_are_inside() {
        let question = report().job.question;
        let spans = [span(Variable::Gap, 0.002, 0.008), span(Variable::Tilt, 0.0, 0.02)];
        let space = Space::new(&question, Kind::Free, &spans).unwrap();
        assert_eq!(space.outside(&[0.008 + 1e-15, 0.0]), None);
        assert_eq!(space.outside(&[0.0081, 0.0]), Some((0, 0.0081)));
        assert_eq!(space.outside(&[0.004, -1e-4]), Some((1, -1e-4)));
        assert_eq!(space.outside(&[f64::NAN, 0.0]).map(|o| o.0), Some(0));
    }

    #[test]
    fn the_lamella_values_keep_their_rectangle() {
        let mut question = report().job.question;
        question.hinge = Some(Hinge { arm_m: 0.15, height_m: 0.02 });
        let space = Space::new(&question, Kind::AlongHinge, &[span(Variable::Angle, -0.01, 0.01)]).unwrap();
        let at = [0.008];
        let moved = space.question_at(&at);
        assert!(moved.arrangement.pose.shift_m[0] > 1e-4);
        let area = 0.11 * 0.09;
        let c0 = space.lamella(&at).ideal.capacitance_f;
        let ratio = moved.ideal().capacitance_f / c0;
        assert!((ratio - moved.arrangement.overlap().area_m2() / area).abs() < 1e-12 && ratio < 1.0);
    }
}
