//! The job `draw`: a bench or a table in, a picture or a field file out.
//!
//! [`Job::new`] checks a bench, [`Job::run`] solves one level and draws it; [`of_table`] draws a table. A picture is a [`sheet`] of marks in millimetres
//! ([`potential`], [`field`], [`charge`] for a bench; [`factors`] and [`error_map`] for a table), which [`render`] makes SVG or
//! PNG; [`vts`] writes the field itself.

pub mod bench_view;
pub mod caption;
pub mod charge;
pub mod contours;
pub mod error_map;
pub mod factors;
pub mod field;
pub mod lines;
pub mod of_table;
pub mod output;
pub mod panel;
pub mod potential;
pub mod profile;
pub mod render;
pub mod scene;
pub mod sheet;
pub mod theme;
pub mod ticks;
pub mod views;
pub mod vts;

use std::io::{Read, Write};

use tiltgap_meshes::{Dimensions, Grid, GridOptions};
use tiltgap_solver::{Level, LevelParams, Progress, BYTES_PER_NODE};

use crate::arguments::{DrawArguments, Format, What};
use crate::assess::{memory_for_a_level, pool, Setup};
use crate::document::quoted;
use crate::error::Error;
use crate::progress::{grouped, ProgressLine};
use output::Target;
use scene::Scene;

/// Levels that pictures are drawn from: in cross-section, in space, and for a field file in space, which would be larger
/// than most viewers like.
const LEVEL_IN_THE_PLANE: usize = 12;
const LEVEL_IN_SPACE: usize = 6;
const LEVEL_OF_A_FILE: usize = 4;
/// Tolerance of the solver. The charge of a node is of first order in what the iteration leaves, as are the potentials of a
/// floating pair: at the usual 1e-8 they are off by some 1e-5.
const TOLERANCE: f64 = 1e-10;
/// Levels that can be asked for.
const LEVELS: std::ops::RangeInclusive<usize> = 2..=32;

/// An option of `draw` that will not do.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum DrawError {
    /// The name says no format.
    #[error("-o {0}: the name does not say which format; let it end in .svg, .png or .vts, or add --format")]
    NoFormat(String),
    /// Pixels on standard output.
    #[error("-o -: a PNG goes to a file, not to standard output; give a file name, or --format svg")]
    PixelsToStdout,
    /// Charge has no place in the field file.
    #[error(
        "--what charge: a .vts file holds the potential and the field in space; ask for --what field, or for .svg or .png"
    )]
    ChargeAsField,
    /// A picture of a table without one.
    #[error("this picture shows a table; name one, or make it with `tiltgap tabulate`")]
    NoTable,
    /// A bench where a table is needed.
    #[error("{0:?} is no table, which this picture shows; make one of a bench with `tiltgap tabulate`")]
    ABench(String),
    /// An option that a picture of a table does not have.
    #[error("{0} changes a bench, but the picture shows a table, in which it is settled; leave it out")]
    NotOfATable(&'static str),
    /// A factor where a bench is shown.
    #[error("--quantity goes with --what factors and --what error; leave it out")]
    NotOfABench,
    /// A map needs two axes.
    #[error("this table is over the {0} alone, and a map needs two axes; ask for --what factors")]
    OneAxis(&'static str),
    /// A table has no place in the field file.
    #[error("a .vts file holds the potential and the field in space, and no table; ask for .svg or .png")]
    TableAsField,
    /// The level is no number in the range.
    #[error("--level: {} will not do; give a whole number from 2 to 32, for example 6", quoted(.0))]
    Level(String),
    /// The level does not fit into the memory.
    #[error(
        "--level {level}: that is {} nodes and some {megabytes} MB, more than the memory that is free; give a lower \
         level", grouped(*nodes)
    )]
    Memory {
        /// The level.
        level: usize,
        /// Its nodes.
        nodes: usize,
        /// What it would take.
        megabytes: u64,
    },
}

/// In which form the output is asked for.
///
/// # Errors
/// If nothing says so, or the form does not go where it shall.
pub fn format(arguments: &DrawArguments, target: &Target) -> Result<Format, DrawError> {
    let named = match target.extension().as_deref() {
        Some("svg") => Some(Format::Svg),
        Some("png") => Some(Format::Png),
        Some("vts") => Some(Format::Vts),
        _ => None,
    };
    let format = arguments.format.or(named).ok_or_else(|| DrawError::NoFormat(target.to_string()))?;
    if format == Format::Png && matches!(target, Target::Stdout) {
        return Err(DrawError::PixelsToStdout);
    }
    Ok(format)
}

/// A checked job.
#[derive(Debug)]
pub struct Job {
    /// The bench and its question.
    pub setup: Setup,
    /// What to show.
    pub what: What,
    /// In which form.
    pub format: Format,
    /// Where it goes.
    pub target: Target,
    /// The level to draw from.
    pub level: usize,
}

impl Job {
    /// Checks the arguments and reads the bench.
    ///
    /// # Errors
    /// Whatever of it is wrong, the arrangement of the plates included.
    pub fn new(arguments: &DrawArguments, stdin: &mut dyn Read) -> Result<Job, Error> {
        let target = Target::new(&arguments.output);
        let format = format(arguments, &target)?;
        if arguments.quantity.is_some() {
            return Err(DrawError::NotOfABench.into());
        }
        if format == Format::Vts && arguments.what == What::Charge {
            return Err(DrawError::ChargeAsField.into());
        }
        let asked = arguments.level.as_deref().map(|text| {
            let number: Option<usize> = text.trim().parse().ok();
            number.filter(|n| LEVELS.contains(n)).ok_or_else(|| DrawError::Level(text.into()))
        });
        let asked = asked.transpose()?;
        let setup = match of_table::bench_of_table(&arguments.bench) {
            Some((options, bench)) => Setup::new(&options, &mut bench.as_bytes())?,
            None => Setup::new(&arguments.bench, stdin)?,
        };
        setup.question.check()?;
        let level = asked.unwrap_or(match (setup.question.arrangement.dimensions, format) {
            (Dimensions::Two, _) => LEVEL_IN_THE_PLANE,
            (_, Format::Vts) => LEVEL_OF_A_FILE,
            _ => LEVEL_IN_SPACE,
        });
        target.check()?;
        Ok(Job { setup, what: arguments.what, format, target, level })
    }

    /// Solves and draws; the output is on disk or on `stdout` afterwards.
    ///
    /// # Errors
    /// What the solver or the output finds wrong.
    pub fn run(
        self,
        stdout: &mut dyn Write,
        stderr: &mut (dyn Write + Send),
        terminal: bool,
    ) -> Result<(), Error> {
        let bytes = pool(self.setup.threads)?.install(|| self.draw(stderr, terminal))?;
        self.target.write(&bytes, stdout)
    }

    fn draw(&self, stderr: &mut (dyn Write + Send), terminal: bool) -> Result<Vec<u8>, Error> {
        let level = self.solve(&mut ProgressLine::new(stderr, terminal))?;
        if self.format == Format::Vts {
            return vts::vts(&self.setup, &level);
        }
        let scene = Scene::new(&self.setup, &level);
        let sheet = match self.what {
            What::Potential => potential::potential(&scene),
            What::Field => field::field(&scene, &level),
            What::Charge => charge::charge(&scene, &level),
            What::Factors | What::Error => panic!("{:?} is a picture of a table", self.what),
        };
        Ok(match self.format {
            Format::Png => render::png(&sheet)?,
            _ => render::svg(&sheet)?.into_bytes(),
        })
    }

    /// A grid of the family of the bench.
    fn grid(&self, q: usize) -> Result<Grid, Error> {
        let arrangement = &self.setup.question.arrangement;
        let grid = Grid::new(arrangement, q, &GridOptions::suited(arrangement));
        Ok(grid.map_err(tiltgap_solver::Error::from)?)
    }

    /// The level, started from one of half its fineness.
    fn solve(&self, line: &mut ProgressLine) -> Result<Level, Error> {
        let arrangement = &self.setup.question.arrangement;
        let nodes = self.grid(self.level)?.nodes();
        let bytes = nodes as u64 * BYTES_PER_NODE;
        if bytes > memory_for_a_level() {
            let megabytes = bytes.div_ceil(1_000_000);
            return Err(DrawError::Memory { level: self.level, nodes, megabytes }.into());
        }
        let mut coarse: Option<Level> = None;
        for q in [self.level / 2, self.level].into_iter().filter(|q| LEVELS.contains(q)) {
            let nodes = self.grid(q)?.nodes();
            line.show(Progress::Level { q: q as u32, nodes });
            let mut news = |iteration: usize, error: f64| {
                line.show(Progress::Iteration { q: q as u32, iteration, error });
            };
            let mut params = LevelParams::default();
            params.outer.tolerance = TOLERANCE;
            let options = GridOptions::suited(arrangement);
            coarse = Some(Level::solve(arrangement, &options, q, coarse.as_ref(), &params, &mut news)?);
        }
        Ok(coarse.expect("the level asked for is in the range"))
    }
}
