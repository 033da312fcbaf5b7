//! The operator against matrices written out by hand, and against its definition.

use tiltgap_meshes::{
    Arrangement, Axis, Body, Carry, Dimensions, End, FarField, Grid, GridOptions, NodeBox, Plate, Pose,
};
use tiltgap_solver::Operator;

/// One cell between natural ends: edges 1, 2 and 4, sheared by `shear` (x grows by that much from floor to ceiling).
fn one_cell(shear: f64) -> Grid {
    let axis = |length: f64| Axis { nodes: vec![0.0, length], segments: vec![1], ends: [End::Natural; 2] };
    let axes = [axis(1.0), axis(2.0), axis(4.0)];
    // The carry X = x + w (R p - p) with p = x and w = 1 everywhere.
    let carry = Carry {
        sideways: vec![1.0; 2],
        vertical: vec![1.0; 2],
        beside: [vec![1.0; 2], vec![1.0; 2]],
        point: [axes[0].nodes.clone(), axes[1].nodes.clone(), axes[2].nodes.clone()],
        rotation: [[1.0, 0.0, shear / 4.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]],
    };
    let plate = |k: usize| {
        let hull = NodeBox { i: [0, 1], j: [0, 1], k: [k, k] };
        Body { boxes: vec![hull], hull, carry: carry.clone(), guarded_carry: None }
    };
    let far_field = FarField { origin: [0.0; 3], decay: 1.0 };
    Grid { q: 1, lower: plate(0), upper: plate(1), axes, film: None, far_field, half: false }
}

fn dense(grid: &Grid) -> Vec<Vec<f64>> {
    let operator = Operator::assemble(grid).unwrap();
    let matrix = operator.matrix();
    let n = grid.nodes();
    (0..n).map(|i| (0..n).map(|j| matrix.get(i, j).copied().unwrap_or(0.0)).collect()).collect()
}

fn assert_close(found: &[Vec<f64>], expected: &[[f64; 8]; 8]) {
    for (i, row) in expected.iter().enumerate() {
        for (j, value) in row.iter().enumerate() {
            assert!((found[i][j] - value).abs() < 1e-14, "entry ({i}, {j}): {} for {value}", found[i][j]);
        }
    }
}

#[test]
fn an_upright_cell() {
    // Conductance of an edge: the area that belongs to it, a quarter of the cell's cross-section, over its length.
    // x: 2*4/4/1 = 2, y: 1*4/4/2 = 1/2, z: 1*2/4/4 = 1/8. Nodes are numbered z fastest, x slowest.
    let (x, y, z) = (2.0, 0.5, 0.125);
    let d = x + y + z;
    let expected = [
        [d, -z, -y, 0.0, -x, 0.0, 0.0, 0.0],
        [-z, d, 0.0, -y, 0.0, -x, 0.0, 0.0],
        [-y, 0.0, d, -z, 0.0, 0.0, -x, 0.0],
        [0.0, -y, -z, d, 0.0, 0.0, 0.0, -x],
        [-x, 0.0, 0.0, 0.0, d, -z, -y, 0.0],
        [0.0, -x, 0.0, 0.0, -z, d, 0.0, -y],
        [0.0, 0.0, -x, 0.0, -y, 0.0, d, -z],
        [0.0, 0.0, 0.0, -x, 0.0, -y, -z, d],
    ];
    assert_close(&dense(&one_cell(0.0)), &expected);
}

#[test]
fn a_sheared_cell() {
    // Edges e0 = (1,0,0), e1 = (0,2,0), e2 = (2,0,4): reciprocal vectors (1,0,-1/2), (0,1/2,0), (0,0,1/4), volume 1 at
    // each corner. K = volume G G^T: K00 = 5/4, K11 = 1/4, K22 = 1/16, K02 = -1/8. An edge belongs to two corners:
    // x 5/2, y 1/2, z 1/8; the coupling of the x and z differences c = -1/8 enters each of the eight corners once.
    // With delta taken from low to high, a corner adds 2 c delta_x delta_z to the quadratic form phi^T A phi; in the
    // face y = const with nodes 00, 01, 10, 11 (x, z) the four corners make c (dx0 + dx1)(dz0 + dz1) * 2, where
    // dx0 = 10-00, dx1 = 11-01, dz0 = 01-00, dz1 = 11-10: that is 2 c ((11-00)^2 - (10-01)^2).
    let (x, y, z, c) = (2.5, 0.5, 0.125, -0.125);
    let d = x + y + z;
    let (same, cross) = (2.0 * c, -2.0 * c);
    // 00 and 11 get +2c on the diagonal and -2c between them; 10 and 01 the opposite.
    let (p, m) = (d + same, d - same);
    let expected = [
        [p, -z, -y, 0.0, -x, cross, 0.0, 0.0],
        [-z, m, 0.0, -y, same, -x, 0.0, 0.0],
        [-y, 0.0, p, -z, 0.0, 0.0, -x, cross],
        [0.0, -y, -z, m, 0.0, 0.0, same, -x],
        [-x, same, 0.0, 0.0, m, -z, -y, 0.0],
        [cross, -x, 0.0, 0.0, -z, p, 0.0, -y],
        [0.0, 0.0, -x, same, -y, 0.0, m, -z],
        [0.0, 0.0, cross, -x, 0.0, -y, -z, p],
    ];
    assert_close(&dense(&one_cell(2.0)), &expected);
}

#[test]
fn the_matrix_is_symmetric_sorted_and_annihilates_constants_up_to_the_far_boundary() {
    let plate = Plate { length_m: 1.0, width_m: 0.8, thickness_m: 0.0 };
    let pose = Pose { gap_m: 0.07, tilt_rad: 0.06, roll_rad: 0.04, shift_m: [0.02, 0.01] };
    let arrangement = Arrangement::open(plate, plate, pose, Dimensions::Three);
    let grid = Grid::new(&arrangement, 1, &GridOptions::suited(&arrangement)).unwrap();
    let matrix = Operator::assemble(&grid).unwrap().matrix();
    let shape = grid.shape();
    let mut off_diagonal_pairs = 0;
    for (node, row) in matrix.outer_iterator().enumerate() {
        let columns: Vec<usize> = row.iter().map(|(c, _)| c).collect();
        assert!(columns.windows(2).all(|w| w[0] < w[1]) && columns.len() <= 19);
        off_diagonal_pairs += usize::from(columns.len() > 7);
        let sum: f64 = row.iter().map(|(_, v)| v).sum();
        let diagonal = matrix.get(node, node).unwrap();
        let at = [node / (shape[1] * shape[2]), node / shape[2] % shape[1], node % shape[2]];
        let outside = (0..3).any(|d| at[d] == 0 || at[d] + 1 == shape[d]);
        if outside {
            assert!(sum > 0.0, "the far boundary pins the potential");
        } else {
            assert!(sum.abs() < 1e-12 * diagonal, "node {at:?}: {sum}");
        }
        for (column, value) in row.iter() {
            let mirrored = matrix.get(column, node).copied().unwrap_or(0.0);
            assert!((value - mirrored).abs() <= 1e-14 * diagonal.max(*matrix.get(column, column).unwrap()));
        }
    }
    assert!(off_diagonal_pairs > 0);
}
