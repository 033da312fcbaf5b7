//! Writes the linear system of one level as Matrix Market files, so that a general-purpose solver can have a go at it,
//! and says how long this crate takes for the same.
//!
//!     cargo run --release -p tiltgap-solver --example export_matrix -- 4 A.mtx b.mtx
//!
//! The system: free nodes of the upper half of a square bench (gap 4 % of the side, tilt 1 deg), right-hand side for 1 V
//! on the upper plate. Matrix and right-hand side are for one plate; this crate solves for both at once.

use std::error::Error;
use std::io::Write;
use std::time::Instant;

use tiltgap_meshes::{Arrangement, Dimensions, Grid, GridOptions, Plate, Pose};
use tiltgap_solver::{Level, LevelParams, Matrix, Operator};

fn main() -> Result<(), Box<dyn Error>> {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let [q, matrix_path, side_path] = arguments.as_slice() else {
        return Err("give the level, a file for the matrix and one for the right-hand side".into());
    };
    let q: usize = q.parse()?;
    let plate = Plate { length_m: 1.0, width_m: 1.0, thickness_m: 0.0 };
    let pose = Pose { gap_m: 0.04, tilt_rad: 1f64.to_radians(), roll_rad: 0.0, shift_m: [0.0; 2] };
    let arrangement = Arrangement::open(plate, plate, pose, Dimensions::Three);
    let options = GridOptions::suited(&arrangement);

    let begun = Instant::now();
    let level = Level::solve(&arrangement, &options, q, None, &LevelParams::default(), &mut |_, _| {})?;
    let seconds = begun.elapsed().as_secs_f64();

    let grid = Grid::new(&arrangement, q, &options)?;
    let operator = Operator::assemble(&grid).ok_or("the grid is folded")?;
    let matrix = operator.matrix();
    let [nx, ny, nz] = grid.shape();
    let mut number = vec![None; grid.nodes()];
    let mut free = 0;
    let mut on_upper = vec![false; grid.nodes()];
    for i in 0..nx {
        for j in 0..ny {
            for k in 0..nz {
                let node = grid.index(i, j, k);
                on_upper[node] = grid.upper.contains(i, j, k);
                if !on_upper[node] && !grid.lower.contains(i, j, k) {
                    number[node] = Some(free);
                    free += 1;
                }
            }
        }
    }
    let (mut starts, mut columns, mut values) = (vec![0usize], Vec::new(), Vec::new());
    let mut side = Vec::with_capacity(free);
    for (node, row) in matrix.outer_iterator().enumerate() {
        if number[node].is_none() {
            continue;
        }
        let mut known = 0.0;
        for (column, &value) in row.iter() {
            match number[column] {
                Some(n) => {
                    columns.push(n as u32);
                    values.push(value);
                }
                None if on_upper[column] => known -= value,
                None => {}
            }
        }
        starts.push(columns.len());
        side.push(known);
    }
    sprs::io::write_matrix_market(matrix_path, &Matrix::new((free, free), starts, columns, values))?;
    let mut file = std::io::BufWriter::new(std::fs::File::create(side_path)?);
    writeln!(file, "%%MatrixMarket matrix array real general\n{free} 1")?;
    for value in side {
        writeln!(file, "{value:e}")?;
    }
    let mut out = std::io::stdout().lock();
    writeln!(out, "{}", level.grid)?;
    writeln!(
        out,
        "{free} unknowns; both right-hand sides, matrix and all: {seconds:.3} s; {}",
        level.profile
    )?;
    Ok(())
}
