//! The ideal limit: where the ideal formula is exact, and how real plates approach it.

use std::f64::consts::PI;

use tiltgap_meshes::{Arrangement, Dimensions, Film, Plate, Pose, Surroundings};
use tiltgap_solver::{Connection, Error, Factor, Hinge};

use super::finding::Finding;
use super::posed_walls::guarded_below;
use super::trial::{bars, solve, DEFAULT};

/// Between insulating walls the field is uniform on every grid: rounding and the iteration alone.
const EXACT: f64 = 1e-10;
const EXACT_BECAUSE: &str = "the field is uniform, on every grid: rounding alone";

/// A bench between insulating walls.
fn walled(dimensions: Dimensions, film: Option<Film>) -> Arrangement {
    let plate = Plate { length_m: 0.1, width_m: 0.08, thickness_m: 0.0 };
    let pose = Pose { gap_m: 0.004, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    let surroundings = Surroundings::InsulatedWalls;
    Arrangement { film, surroundings, ..Arrangement::open(plate, plate, pose, dimensions) }
}

/// How far the worst of three factors is from 1; infinitely far if one is missing.
fn distance(factors: [Option<Factor>; 3]) -> f64 {
    let off = |f: Option<Factor>| f.map_or(f64::INFINITY, |f| (f.value - 1.0).abs());
    factors.map(off).into_iter().fold(0.0, |worst, off| if off <= worst { worst } else { off })
}

/// Factors between insulating walls, where they are exactly 1, with and without a film.
///
/// # Errors
/// What the solver says.
pub fn insulated() -> Result<Vec<Finding>, Error> {
    let film = Some(Film { thickness_m: 0.0005, permittivity_ratio: 2.3 });
    let mut all = Vec::new();
    for (dimensions, place) in [(Dimensions::Two, "in the plane"), (Dimensions::Three, "in space")] {
        for (connection, wired) in [(Connection::Grounded, "grounded"), (Connection::Floating, "floating")] {
            for (film, with) in [(None, ""), (film, ", film")] {
                let hinge = Some(Hinge { arm_m: 0.15, height_m: 0.0 });
                let f = solve(walled(dimensions, film), connection, hinge, DEFAULT)?.factors;
                let what = format!("insulating walls {place}, {wired}{with}: k less 1");
                let off = distance([f.capacitance, f.force, f.torque]);
                all.push(Finding::new(what, off, EXACT, EXACT_BECAUSE));
            }
        }
    }
    Ok(all)
}

/// Slots of the guarded plate, in its length.
const SLOTS: [f64; 3] = [4e-3, 1e-3, 2.5e-4];
/// Gap of the guarded plate, in its length.
const GUARDED_GAP: f64 = 0.05;
/// Part of the slot that may be missing: the exact correction of thin edges is 0.196 times slot over gap of it
/// (`guard-gaps.json`), 0.016 here at most.
const SLOT_PART: f64 = 0.1;

/// Factors of a guarded plate: 1 and half of the slot on either side.
///
/// # Errors
/// What the solver says.
pub fn guarded() -> Result<Vec<Finding>, Error> {
    let mut all = Vec::new();
    for slot in SLOTS {
        let factors =
            solve(guarded_below(slot, 0.0, GUARDED_GAP), Connection::Grounded, None, DEFAULT)?.factors;
        for (name, k) in [("k_C", factors.capacitance), ("k_F", factors.force)] {
            let k = k.map_or(f64::NAN, |k| k.value);
            let what = format!("guarded, slot {slot} of the length: {name} = {k:.6}, less 1 + slot");
            let because = "a tenth of the slot, and the accuracy of the factor";
            all.push(Finding::new(what, k - 1.0 - slot, SLOT_PART * slot + DEFAULT, because));
        }
    }
    Ok(all)
}

/// An open pair at one gap and one tilt.
#[derive(Clone, Debug, PartialEq)]
pub struct Approach {
    /// Gap over length.
    pub delta: f64,
    /// Wedge: half the difference of the edge gaps over their mean.
    pub beta: f64,
    /// k_C and k_F.
    pub factors: [f64; 2],
    /// What the fringe adds to k_C and k_F, in per cent: what the ideal wedge formula leaves out.
    pub fringe_percent: [f64; 2],
    /// Measured over published excess of the fringe factors.
    pub slope: [f64; 2],
    /// How far from 1 the slopes may be.
    pub allowed: f64,
}

impl Approach {
    /// Whether the slopes are the published ones.
    pub fn holds(&self) -> bool {
        self.slope.iter().all(|s| (s - 1.0).abs() <= self.allowed)
    }
}

/// Gaps over length, and wedges, of the approach.
const DELTAS: [f64; 3] = [0.02, 0.01, 0.005];
const BETAS: [f64; 3] = [0.0, 0.3, 0.6];

/// Leading terms of the fringe of two strips. For parallel ones: k_C = 1 + delta/pi (1 + ln(2 pi/delta)) \[Palmer1937\] and
/// k_F = 1 + delta/pi. Tilted, each edge has the fringe of its own gap delta (1 -+ beta), so that -delta/(2 pi)
/// ln(1 - beta^2) is added to k_C; k_F follows from the change of C with the gap: wedge factor times (1 + delta/pi).
pub fn leading_excess(delta: f64, beta: f64, wedge: f64) -> [f64; 2] {
    let c = delta / PI * (1.0 + (2.0 * PI / delta).ln() - 0.5 * (1.0 - beta * beta).ln());
    [c / wedge, delta / PI]
}

/// The open pair with a shrinking gap at several tilts.
///
/// # Errors
/// What the solver says.
pub fn approach() -> Result<Vec<Approach>, Error> {
    let mut all = Vec::new();
    for beta in BETAS {
        for delta in DELTAS {
            let mut bench = bars(1.0, delta, 0.0);
            bench.pose.tilt_rad = (2.0 * delta * beta).asin();
            let f = solve(bench, Connection::Floating, None, ACCURACY)?.factors;
            let (Some(c), Some(k)) = (f.capacitance, f.force) else { continue };
            let excess = [c.fringe - 1.0, k.fringe - 1.0];
            let leading = leading_excess(delta, beta, c.wedge);
            all.push(Approach {
                delta,
                beta,
                factors: [c.value, k.value],
                fringe_percent: excess.map(|e| 100.0 * e),
                slope: [excess[0] / leading[0], excess[1] / leading[1]],
                // The next terms are smaller than these by the excess of the charge, at the wider edge.
                allowed: (1.0 + beta) * leading_excess(delta, 0.0, 1.0)[0],
            });
        }
    }
    Ok(all)
}

/// An excess of 1.6e-3 has to be known to a per cent.
const ACCURACY: f64 = 1e-5;
