//! Level by level to the limit, and how often the error bar holds.

use tiltgap_meshes::{Arrangement, GridOptions};
use tiltgap_solver::{extrapolate, observed_order, Connection, Error, Estimate, Level, LevelParams};

use super::cases::{number, Family};
use super::comparison::{Comparison, COVERAGE_FACTOR};
use super::{posed_plates, posed_strips};

/// Levels of the ladder in the plane and in space.
const PLANE: [usize; 6] = [2, 3, 4, 6, 8, 12];
const SPACE: [usize; 5] = [2, 3, 4, 6, 8];
/// Levels of a quick run in space.
const FEW: usize = 3;
/// Orders that the expansion b q^-2 + c q^-3 can show.
pub const ORDERS: [f64; 2] = [1.5, 3.0];

/// One quantity of one arrangement on the levels of the family.
#[derive(Clone, Debug, PartialEq)]
pub struct Ladder {
    /// Case and quantity.
    pub name: String,
    /// Levels.
    pub levels: Vec<usize>,
    /// The value on each.
    pub values: Vec<f64>,
    /// Order of the last three levels.
    pub order: Option<f64>,
    /// The limit of each three neighbouring levels, the first for the third level.
    pub limits: Vec<Estimate>,
    /// The exact value, where one is known.
    pub exact: Option<f64>,
}

impl Ladder {
    fn new(name: String, levels: &[usize], values: Vec<f64>, exact: Option<f64>) -> Ladder {
        let three = |n: usize| {
            let q = [levels[n] as f64, levels[n + 1] as f64, levels[n + 2] as f64];
            (q, [values[n], values[n + 1], values[n + 2]])
        };
        let mut limits: Vec<Estimate> = Vec::new();
        for n in 0..levels.len() - 2 {
            let (q, y) = three(n);
            let limit = extrapolate(q, y, limits.last().map(|l| l.value));
            limits.push(Estimate { value: limit.value, uncertainty: limit.uncertainty });
        }
        let (q, y) = three(levels.len() - 3);
        Ladder { name, levels: levels.to_vec(), order: observed_order(q, y), values, limits, exact }
    }

    /// What errors are counted from: the exact value, or the last limit.
    pub fn target(&self) -> f64 {
        self.exact.or(self.limits.last().map(|l| l.value)).unwrap_or(f64::NAN)
    }

    /// Relative error of each level.
    pub fn errors(&self) -> Vec<f64> {
        self.values.iter().map(|v| (v / self.target() - 1.0).abs()).collect()
    }

    /// Whether the order is one that the expansion can show, and the last limit holds the exact value within three
    /// standard uncertainties.
    pub fn holds(&self) -> bool {
        let order = self.order.is_some_and(|p| (ORDERS[0]..=ORDERS[1]).contains(&p));
        let covered = self.exact.zip(self.limits.last()).is_none_or(|(exact, limit)| {
            (limit.value - exact).abs() <= 3.0 * limit.uncertainty.max(tiltgap_solver::FLOOR * exact.abs())
        });
        order && covered
    }
}

/// Charge and vertical force of an arrangement, level by level, in units of the grid.
fn climb(
    name: &str,
    arrangement: &Arrangement,
    connection: Connection,
    levels: &[usize],
    exact: [Option<f64>; 2],
) -> Result<Vec<Ladder>, Error> {
    let options = GridOptions::suited(arrangement);
    let mut coarse: Option<Level> = None;
    let mut values = [Vec::new(), Vec::new()];
    for q in levels {
        let level = Level::solve(
            arrangement,
            &options,
            *q,
            coarse.as_ref(),
            &LevelParams::default(),
            &mut |_, _| {},
        )?;
        let potential = connection.potentials(&level);
        let row = level.matrix[1];
        values[0].push(row[0] * potential[0] + row[1] * potential[1]);
        values[1].push(level.wrench(potential).force[2]);
        coarse = Some(level);
    }
    let [charge, force] = values;
    Ok(vec![
        Ladder::new(format!("{name}, charge"), levels, charge, exact[0]),
        Ladder::new(format!("{name}, force"), levels, force, exact[1]),
    ])
}

/// Ladders of two exact cases in the plane, and of a tilted pair in space with a reference.
///
/// # Errors
/// What the solver says.
pub fn ladders(full: bool) -> Result<Vec<Ladder>, Error> {
    let mut all = Vec::new();
    let strips = Family::named("strips");
    for name in ["tilted gap 0.1 tilt 0", "tilted gap 0.1 tilt 5"] {
        let Some(case) = strips.cases.iter().find(|c| c.name() == name) else { continue };
        let exact = ["capacitance", "force_z"].map(|key| Some(number(case.value(key))));
        let bench = posed_strips::placed(case, "geometry");
        let title = format!("strips, {}", name.trim_start_matches("tilted "));
        all.extend(climb(&title, &bench, Connection::Floating, &PLANE, exact)?);
    }
    let plates = Family::named("plates");
    for name in ["gap 0.1 tilt 5"] {
        let Some(case) = plates.cases.iter().find(|c| c.name() == name) else { continue };
        let bench = posed_plates::placed(case);
        let levels = if full { &SPACE[..] } else { &SPACE[..FEW] };
        all.extend(climb(&format!("plates, {name}"), &bench, Connection::Floating, levels, [None; 2])?);
    }
    Ok(all)
}

/// How the error bars do over all comparisons that have one.
#[derive(Clone, Debug, PartialEq)]
pub struct Coverage {
    /// Comparisons with an error bar of the solver.
    pub count: usize,
    /// Part of them within one combined standard uncertainty.
    pub within_one: f64,
    /// Within two.
    pub within_two: f64,
    /// Median of uncertainty over error, where the reference is exact.
    pub caution: Option<f64>,
    /// Distances in combined standard uncertainties, ascending.
    pub distances: Vec<f64>,
}

/// Part of the numbers that two standard uncertainties have to cover, and median caution that is too much.
pub const LEAST_COVERED: f64 = 0.95;
/// Largest median of uncertainty over error.
pub const MOST_CAUTION: f64 = 10.0;
/// A reference counts as exact if it leaves less than this part of the error bar open.
const EXACT: f64 = 0.01;

impl Coverage {
    /// Counts the comparisons. What vanishes by symmetry is exact and says nothing about the error bar.
    pub fn of<'a>(comparisons: impl IntoIterator<Item = &'a Comparison>) -> Coverage {
        let all: Vec<&Comparison> =
            comparisons.into_iter().filter(|c| c.solved && c.uncertainty > 0.0).collect();
        let mut distances: Vec<f64> = all.iter().map(|c| COVERAGE_FACTOR * c.normalised().abs()).collect();
        distances.sort_by(f64::total_cmp);
        let part = |within: f64| {
            distances.iter().filter(|d| **d <= within).count() as f64 / distances.len().max(1) as f64
        };
        let (within_one, within_two) = (part(1.0), part(2.0));
        let exact = all.iter().filter(|c| c.open < EXACT * c.uncertainty && c.difference() != 0.0);
        let mut caution: Vec<f64> = exact.map(|c| c.uncertainty / c.difference().abs()).collect();
        caution.sort_by(f64::total_cmp);
        let caution = caution.get(caution.len() / 2).copied();
        Coverage { count: all.len(), within_one, within_two, caution, distances }
    }

    /// Whether the error bars are honest, and not idle.
    pub fn holds(&self) -> bool {
        self.count == 0 || self.within_two >= LEAST_COVERED && self.caution.is_none_or(|c| c <= MOST_CAUTION)
    }
}
