//! `cargo bench`: how long an assessment takes, and where the time of a level goes.
//!
//! Medians over several runs; the machine's other load shows in them, ratios are steadier than times.

use std::io::Write;
use std::time::Instant;

use tiltgap_meshes::{Arrangement, Dimensions, GridOptions, Plate, Pose};
use tiltgap_solver::{assess, Connection, Hinge, Level, LevelParams, Params, Question};

/// Runs of which the median is taken.
const RUNS: usize = 5;

fn bench(beta: f64, roll_deg: f64, thickness_m: f64) -> Arrangement {
    let plate = Plate { length_m: 0.11, width_m: 0.09, thickness_m };
    let gap_m: f64 = 0.004;
    let tilt_rad = (beta * gap_m / (plate.length_m / 2.0)).atan();
    let pose = Pose { gap_m, tilt_rad, roll_rad: roll_deg.to_radians(), shift_m: [0.0; 2] };
    Arrangement::open(plate, plate, pose, Dimensions::Three)
}

fn median(mut run: impl FnMut() -> f64, runs: usize) -> f64 {
    let mut seconds: Vec<f64> = (0..runs).map(|_| run()).collect();
    seconds.sort_by(f64::total_cmp);
    seconds[runs / 2]
}

fn main() -> std::io::Result<()> {
    // Cargo passes `--bench`; `cargo test --benches` does not, and then nothing is to be timed.
    if !std::env::args().any(|a| a == "--bench") {
        return Ok(());
    }
    let mut out = std::io::stdout().lock();
    let threads = rayon::current_num_threads();
    writeln!(out, "assessment, grounded, {threads} threads, median of {RUNS} in seconds")?;
    writeln!(out, "{:>6} {:>8} {:>9} {:>9} {:>9}", "beta", "roll", "1e-3", "1e-4", "1e-5")?;
    for (beta, roll_deg) in [(0.0, 0.0), (0.1, 0.0), (0.25, 0.0), (0.5, 0.0), (0.25, 0.3)] {
        write!(out, "{beta:>6} {roll_deg:>4} deg")?;
        for accuracy in [1e-3, 1e-4, 1e-5] {
            let question = Question {
                arrangement: bench(beta, roll_deg, 0.0),
                hinge: Some(Hinge { arm_m: 0.15, height_m: 0.0 }),
                connection: Connection::Grounded,
                voltage_v: 400.0,
                relative_permittivity: 1.0,
            };
            let params = Params { accuracy, ..Params::default() };
            let mut finest = 0;
            let seconds = median(
                || {
                    let solved = assess(&question, &params, &mut |_| {}).expect("the bench is solvable");
                    finest = solved.levels.last().map_or(0, |l| l.q);
                    solved.seconds
                },
                RUNS,
            );
            write!(out, " {seconds:>9.3} (q {finest})")?;
        }
        writeln!(out)?;
    }

    writeln!(out, "\nsingle levels, beta 0.25, from scratch")?;
    writeln!(
        out,
        "{:>3} {:>10} {:>6} {:>6} {:>9} {:>12} {:>9} {:>22}",
        "q", "nodes", "outer", "inner", "seconds", "assembly, ms", "iter, ms", "ns/node/side/iteration"
    )?;
    for q in [2, 3, 4, 6, 8, 12] {
        let arrangement = bench(0.25, 0.0, 0.0);
        let options = GridOptions::suited(&arrangement);
        let mut levels: Vec<Level> = (0..if q > 6 { 1 } else { 3 })
            .map(|_| {
                let params = LevelParams::default();
                Level::solve(&arrangement, &options, q, None, &params, &mut |_, _| {}).expect("a level")
            })
            .collect();
        levels.sort_by(|a, b| a.profile.total().total_cmp(&b.profile.total()));
        let level = &levels[levels.len() / 2];
        let (nodes, info, profile) = (level.grid.nodes(), &level.info, level.profile);
        let each = profile.iteration / (nodes * 2 * info.applications) as f64 * 1e9;
        writeln!(
            out,
            "{q:>3} {nodes:>10} {:>6} {:>6.1} {:>9.3} {:>12.0} {:>9.0} {each:>22.1}",
            info.iterations,
            info.inner_iterations as f64 / info.applications as f64,
            profile.total(),
            1e3 * profile.assembly,
            1e3 * profile.iteration,
        )?;
    }

    writeln!(out, "\niterations at level 4 over the tilt (energy error 1e-8)")?;
    for beta in [0.0, 0.17, 0.44, 0.7, 0.87, 0.91] {
        let arrangement = bench(beta, 0.0, 0.0);
        let begun = Instant::now();
        let options = GridOptions::suited(&arrangement);
        let level = Level::solve(&arrangement, &options, 4, None, &LevelParams::default(), &mut |_, _| {})
            .expect("a level");
        let seconds = begun.elapsed().as_secs_f64();
        writeln!(out, "beta {beta:>5}: {:>3} outer, {seconds:.3} s", level.info.iterations)?;
    }
    Ok(())
}
