//! One axis of a table: what varies, over which range, and the coordinate in which factors are smooth.
//!
//! Polynomials want a coordinate in which the factors bend evenly. A gap is graded by the logarithm of what is left
//! below the lowest corner, an angle by the inverse hyperbolic tangent of the slope of the wedge (the logarithm of the
//! ratio of the edge gaps), a beam angle by the logarithm of the gap at the edge that comes down.

use tiltgap_meshes::Arrangement;
use tiltgap_solver::{Hinge, Question};

/// Steps of the bisection that inverts a grading: more than a floating-point number has bits.
const BISECTIONS: usize = 80;

/// By which part of a range a value may miss its end: two ways of writing the same number differ by less, 0.008 m and
/// 8 mm, or 1 deg and 17.45 mrad written with all digits.
pub const ROUNDING: f64 = 1e-9;

/// What varies along an axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Variable {
    /// The gap at the centre, in metres.
    Gap,
    /// The tilt, in radians.
    Tilt,
    /// The roll, in radians.
    Roll,
    /// The angle of the beam about its hinge, in radians; gap, tilt and shift follow from it.
    Angle,
}

impl Variable {
    /// All of them.
    pub const ALL: [Variable; 4] = [Variable::Gap, Variable::Tilt, Variable::Roll, Variable::Angle];

    /// As columns, readings and files call it.
    pub fn name(self) -> &'static str {
        match self {
            Variable::Gap => "gap",
            Variable::Tilt => "tilt",
            Variable::Roll => "roll",
            Variable::Angle => "angle",
        }
    }
}

/// A range, both ends included; in SI units.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Span {
    /// What varies.
    pub variable: Variable,
    /// The lower end.
    pub from: f64,
    /// The upper end, above the lower one.
    pub to: f64,
}

impl Span {
    /// `count` values from end to end, evenly spaced; the ends are met exactly.
    pub fn evenly(&self, count: usize) -> Vec<f64> {
        let last = (count - 1) as f64;
        let inner = (0..count - 1).map(|n| self.from + (self.to - self.from) * (n as f64 / last));
        inner.chain([self.to]).collect()
    }
}

/// A monotonic function of the variable; its range is mapped to -1 to 1.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Grading {
    /// ln(gap - drop), drop the height by which the lowest corner of all poses stands below the centre.
    Above {
        /// The drop, in metres.
        drop_m: f64,
    },
    /// artanh(steepness x sin(angle)), 1/steepness the sine at which an edge would touch at the smallest gap.
    Wedge {
        /// The steepness.
        steepness: f64,
    },
    /// ln of the gap at a point of the beam: base + reach x sin(angle) - height x cos(angle).
    Edge {
        /// Height of the hinge above the lower plate, in metres.
        base_m: f64,
        /// Distance of the point from the hinge along the beam, in metres.
        reach_m: f64,
        /// Height of the hinge above the upper plate, in metres.
        height_m: f64,
    },
    /// The difference of two such logarithms, for a plate that reaches across the hinge.
    Edges {
        /// As in [`Grading::Edge`].
        base_m: f64,
        /// Of the far and of the near edge.
        reach_m: [f64; 2],
        /// As in [`Grading::Edge`].
        height_m: f64,
    },
}

impl Grading {
    /// Value and slope.
    fn at(&self, v: f64) -> [f64; 2] {
        let (s, c) = v.sin_cos();
        let edge = |base: f64, reach: f64, height: f64| {
            let h = base + reach * s - height * c;
            [h.ln(), (reach * c + height * s) / h]
        };
        match *self {
            Grading::Above { drop_m } => [(v - drop_m).ln(), 1.0 / (v - drop_m)],
            Grading::Wedge { steepness } => {
                let e = steepness * s;
                [e.atanh(), steepness * c / (1.0 - e * e)]
            }
            Grading::Edge { base_m, reach_m, height_m } => edge(base_m, reach_m, height_m),
            Grading::Edges { base_m, reach_m: [far, near], height_m } => {
                let (far, near) = (edge(base_m, far, height_m), edge(base_m, near, height_m));
                [far[0] - near[0], far[1] - near[1]]
            }
        }
    }
}

/// An axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Axis {
    /// What varies, from where to where.
    pub span: Span,
    /// The coordinate in which it is smooth.
    pub grading: Grading,
    /// The grading at the two ends.
    pub ends: [f64; 2],
}

impl Axis {
    fn new(span: Span, grading: Grading) -> Axis {
        Axis { span, grading, ends: [span.from, span.to].map(|v| grading.at(v)[0]) }
    }

    /// Axes of a table over free poses. `question` holds the bench; all corners of the ranges are poses in which the
    /// plates are apart.
    pub fn free(spans: &[Span], question: &Question) -> Vec<Axis> {
        let bench = &question.arrangement;
        let range = |variable: Variable, own: f64| {
            let found = spans.iter().find(|s| s.variable == variable);
            found.map_or([own, own], |s| [s.from, s.to])
        };
        let pose = bench.pose;
        let least_m = range(Variable::Gap, pose.gap_m)[0];
        let steepest =
            |variable: Variable, own: f64| range(variable, own).into_iter().map(f64::abs).fold(0.0, f64::max);
        let (tilt, roll) = (steepest(Variable::Tilt, pose.tilt_rad), steepest(Variable::Roll, pose.roll_rad));
        // How far the lowest corner stands below the centre.
        let drop = |tilt_rad: f64, roll_rad: f64| {
            let pose = tiltgap_meshes::Pose { tilt_rad, roll_rad, ..pose };
            pose.gap_m - Arrangement { pose, ..*bench }.edge_gaps().lowest_corner_m
        };
        let steepness = |drop_m: f64, angle: f64, other_m: f64| {
            if angle == 0.0 {
                0.0
            } else {
                drop_m / angle.sin() / (least_m - other_m)
            }
        };
        spans
            .iter()
            .map(|&span| {
                let grading = match span.variable {
                    Variable::Gap => Grading::Above { drop_m: drop(tilt, roll) },
                    Variable::Tilt => {
                        Grading::Wedge { steepness: steepness(drop(tilt, 0.0), tilt, drop(0.0, roll)) }
                    }
                    Variable::Roll => {
                        Grading::Wedge { steepness: steepness(drop(0.0, roll), roll, drop(tilt, 0.0)) }
                    }
                    Variable::Angle => panic!("a free table has no beam angle"),
                };
                Axis::new(span, grading)
            })
            .collect()
    }

    /// The axis of a table along the hinge.
    pub fn along_hinge(span: Span, question: &Question, hinge: &Hinge) -> Axis {
        let arrangement = &question.arrangement;
        let half_m = 0.5 * arrangement.upper.length_m;
        let base_m = arrangement.pose.gap_m + hinge.height_m;
        let height_m = hinge.height_m;
        let reach_m = [hinge.arm_m + half_m, hinge.arm_m - half_m];
        let grading = if reach_m[1] > 0.0 {
            Grading::Edge { base_m, reach_m: reach_m[0], height_m }
        } else {
            Grading::Edges { base_m, reach_m, height_m }
        };
        Axis::new(span, grading)
    }

    /// The graded coordinate, -1 to 1 over the range, and its slope.
    pub fn reduced(&self, v: f64) -> [f64; 2] {
        let [value, slope] = self.grading.at(v);
        let [a, b] = self.ends;
        [((value - a) - (b - value)) / (b - a), 2.0 * slope / (b - a)]
    }

    /// The value of the variable at a coordinate; the ends are met exactly.
    pub fn value(&self, reduced: f64) -> f64 {
        let Span { from, to, .. } = self.span;
        if reduced <= -1.0 {
            return from;
        }
        if reduced >= 1.0 {
            return to;
        }
        let (mut low, mut high) = (from, to);
        for _ in 0..BISECTIONS {
            let middle = 0.5 * (low + high);
            if self.reduced(middle)[0] < reduced {
                low = middle;
            } else {
                high = middle;
            }
        }
        0.5 * (low + high)
    }

    /// Whether a value lies on the axis, but for rounding at the ends.
    pub fn holds(&self, v: f64) -> bool {
        let Span { from, to, .. } = self.span;
        let slack = ROUNDING * (to - from);
        (from - slack..=to + slack).contains(&v)
    }

    /// Whether the grading rises from end to end, so that every value has its place.
    pub fn is_sound(&self) -> bool {
        let [a, b] = self.ends;
        let steps = 64;
        a.is_finite()
            && b.is_finite()
            && (0..=steps).all(|n| {
                let v = self.span.from + (self.span.to - self.span.from) * n as f64 / steps as f64;
                let [_, slope] = self.grading.at(v);
                slope.is_finite() && slope > 0.0
            })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::report;

    fn span(variable: Variable, from: f64, to: f64) -> Span {
        Span { variable, from, to }
    }

    fn axes() -> Vec<Axis> {
        let question = report().job.question;
        let spans = [span(Variable::Gap, 0.002, 0.008), span(Variable::Tilt, -0.01, 0.02)];
        let mut axes = Axis::free(&spans, &question);
        let rolls = [span(Variable::Roll, 0.0, 0.01), span(Variable::Tilt, 0.0, 0.02)];
        axes.extend(Axis::free(&rolls, &question));
        let hinge = question.hinge.unwrap();
        axes.push(Axis::along_hinge(span(Variable::Angle, -0.019, 0.01), &question, &hinge));
        let across = Hinge { arm_m: 0.03, height_m: 0.004 };
        axes.push(Axis::along_hinge(span(Variable::Angle, -0.03, 0.05), &question, &across));
        axes
    }

    #[test]
    fn the_coordinate_runs_from_end_to_end() {
        for axis in axes() {
            assert!(axis.is_sound(), "{axis:?}");
            let Span { from, to, .. } = axis.span;
            assert!((axis.reduced(from)[0] + 1.0).abs() < 1e-15 && (axis.reduced(to)[0] - 1.0).abs() < 1e-15);
            assert_eq!([axis.value(-1.0), axis.value(1.0)], [from, to]);
            for x in [-0.9, -0.3, 0.0, 0.5, 0.99] {
                let v = axis.value(x);
                assert!((axis.reduced(v)[0] - x).abs() < 1e-12, "{axis:?}");
                let step = 1e-5 * (to - from);
                let quotient = (axis.reduced(v + step)[0] - axis.reduced(v - step)[0]) / (2.0 * step);
                assert!((quotient / axis.reduced(v)[1] - 1.0).abs() < 1e-6, "{axis:?}");
            }
        }
    }

    #[test]
    fn a_gap_is_graded_by_what_is_left_below_the_lowest_corner() {
        let [gap, ..] = axes()[..] else { panic!() };
        let drop = 0.055 * 0.02f64.sin();
        let Grading::Above { drop_m } = gap.grading else { panic!("{gap:?}") };
        assert!((drop_m - drop).abs() < 1e-17);
        let middle = ((0.002 - drop) * (0.008 - drop)).sqrt() + drop;
        assert!((gap.value(0.0) - middle).abs() < 1e-12);
    }

    #[test]
    fn an_edge_comes_down_exponentially() {
        // The free edge stands at gap + (arm + half the length) sin(angle); half way it has the geometric mean.
        let axis = axes()[4];
        let edge = |v: f64| 0.004 + 0.205 * v.sin();
        let mean = (edge(-0.019) * edge(0.01)).sqrt();
        assert!((edge(axis.value(0.0)) - mean).abs() < 1e-12);
    }
}
