//! How many nodes an axis will need, from a sketch: the coarsest level along the edges of the ranges.
//!
//! A single level is a smooth function of the pose, since its grid follows the plate, and bends as the real factors do. So
//! it tells how fast polynomials converge, at a hundredth of the cost. Everybody who computes a share of a table draws
//! the same sketch.

use rayon::prelude::*;
use tiltgap_meshes::GridOptions;
use tiltgap_solver::{Connection, Error, Level, LevelParams, Question};

use super::axis::Axis;
use super::interpolant::Interpolant;
use super::nested::nested_points;
use super::plan::{place, Plan, Point};
use super::space::Space;

/// The coarsest level of the family.
const LEVEL: usize = 2;
/// Poses along each axis; the sketch can ask for one node less.
const POSES: usize = 11;
/// Fewest nodes on an axis.
const FEWEST: usize = 3;
/// Part of the accuracy asked for that the interpolation along one axis may take in the sketch.
const PART: f64 = 0.25;

/// Charge and vertical force over those of the lamellae.
fn coarse(space: &Space, at: &[f64]) -> Result<[f64; 2], Error> {
    let Question { arrangement, connection, .. } = space.question_at(at);
    let options = GridOptions::suited(&arrangement);
    let level = Level::solve(&arrangement, &options, LEVEL, None, &LevelParams::default(), &mut |_, _| {})?;
    let potential = match connection {
        Connection::Floating => level.neutral(),
        Connection::Grounded => [0.0, 1.0],
    };
    let [_, [c21, c22]] = level.matrix;
    let charge = c21 * potential[0] + c22 * potential[1];
    let lamella = space.lamella(at);
    let gap = arrangement.effective_gap_m() / arrangement.size_m();
    let force = -level.wrench(potential).force[2];
    Ok([charge * gap / lamella.capacitance, force * gap * gap / lamella.force])
}

/// Nodes for the axis `k`, all other axes at their hardest end.
fn needed(space: &Space, k: usize, accuracy: f64) -> Result<usize, Error> {
    let axis: &Axis = &space.axes[k];
    let hard: Vec<f64> = {
        let ends = place(&space.axes, &Point::Node(vec![0; space.axes.len()]));
        let other = place(&space.axes, &Point::Node(vec![1; space.axes.len()]));
        let near = place(&space.axes, &Point::Check(0));
        // The end that the check point near the hardest corner is nearer to.
        (0..ends.len())
            .map(|n| if (near[n] - ends[n]).abs() < (near[n] - other[n]).abs() { ends[n] } else { other[n] })
            .collect()
    };
    let coordinates = nested_points(POSES);
    let values: Result<Vec<[f64; 2]>, Error> = coordinates
        .par_iter()
        .map(|x| {
            let mut at = hard.clone();
            at[k] = axis.value(*x);
            coarse(space, &at)
        })
        .collect();
    let values = values?;
    let error = |count: usize| {
        let pairs = values[..count].iter().flat_map(|v| v.map(|v| [v, 0.0])).collect();
        let interpolant = Interpolant::new(vec![coordinates[..count].to_vec()], pairs, 2);
        (count..POSES)
            .flat_map(|n| {
                let weights = interpolant.weights(&[coordinates[n]]);
                [0, 1].map(|q| (interpolant.at(&weights, q).value / values[n][q] - 1.0).abs())
            })
            .fold(0.0, f64::max)
    };
    Ok((FEWEST..POSES).find(|&n| error(n) <= PART * accuracy).unwrap_or(POSES))
}

/// The plan to begin with.
///
/// # Errors
/// What the solver says of a pose.
pub fn sketch(space: &Space, accuracy: f64) -> Result<Plan, Error> {
    let nodes: Result<Vec<usize>, Error> =
        (0..space.axes.len()).map(|k| needed(space, k, accuracy)).collect();
    Ok(Plan { nodes: nodes? })
}
