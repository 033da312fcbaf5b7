//! Tables of factors: the interpolated ones against direct assessments, and the files that hold them.

use std::path::PathBuf;
use std::time::Instant;

use tiltgap::store::{Format, Stored};
use tiltgap::tables::table::Table;
use tiltgap_solver::{assess, Params};

/// A directory of its own for a test, removed at the end.
pub struct Scratch(PathBuf);

impl Scratch {
    pub fn new(name: &str) -> Scratch {
        let path = std::env::temp_dir().join(format!("tiltgap-test-{}-{name}", std::process::id()));
        std::fs::create_dir_all(&path).unwrap();
        Scratch(path)
    }

    pub fn file(&self, name: &str) -> String {
        self.0.join(name).to_str().unwrap().into()
    }
}

impl Drop for Scratch {
    fn drop(&mut self) {
        let _ = std::fs::remove_dir_all(&self.0);
    }
}

/// Runs inside this process: exit code, standard output, standard error.
pub fn within(arguments: &[&str], mut stdin: &[u8]) -> (u8, String, String) {
    let (mut stdout, mut stderr) = (Vec::new(), Vec::new());
    let mut streams =
        tiltgap::Streams { stdin: &mut stdin, stdout: &mut stdout, stderr: &mut stderr, terminal: false };
    let all = ["tiltgap"].iter().chain(arguments).copied();
    let code = tiltgap::run(all, &mut streams, Instant::now());
    (code, String::from_utf8(stdout).unwrap(), String::from_utf8(stderr).unwrap())
}

fn tabulated(scratch: &Scratch, arguments: &[&str]) -> (Table, f64) {
    let path = scratch.file("table.json");
    let all = [&["tabulate"], arguments, &["-o", &path]].concat();
    let begun = Instant::now();
    let (code, _, stderr) = within(&all, b"");
    assert_eq!(code, 0, "{stderr}");
    let seconds = begun.elapsed().as_secs_f64();
    let stored = Stored::load(path.as_ref()).unwrap().expect(Format::Table, path.as_ref()).unwrap();
    (stored.table(path.as_ref()).unwrap(), seconds)
}

/// Numbers from 0 to 1, the same in every run (a linear congruence modulo 2^64 with Knuth's multiplier).
struct Numbers(u64);

impl Numbers {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }
}

/// What a comparison at random places says of one quantity.
#[derive(Clone, Debug, Default)]
struct Agreement {
    name: String,
    /// Part of the places covered by two standard uncertainties of the pair.
    covered: f64,
    /// Largest relative difference, and where.
    worst: f64,
    at: Vec<f64>,
}

/// Interpolated quantities against direct assessments at random places; those that vanish by symmetry are left out.
fn against_direct(table: &Table, count: usize, accuracy: f64) -> Vec<Agreement> {
    let mut numbers = Numbers(20);
    let mut all: Vec<Agreement> =
        table.quantities.iter().map(|q| Agreement { name: q.name(), ..Agreement::default() }).collect();
    for _ in 0..count {
        let axes = &table.space.axes;
        let at: Vec<f64> =
            axes.iter().map(|a| a.span.from + (a.span.to - a.span.from) * numbers.next()).collect();
        let question = table.space.question_at(&at);
        let params = Params { accuracy, ..Params::default() };
        let direct = assess(&question, &params, &mut |_| {}).unwrap();
        let size = question.arrangement.size_m();
        for ((q, known), agreement) in table.quantities.iter().zip(table.all(&at)).zip(&mut all) {
            let e = q.of(&direct, size);
            let pair = known.uncertainty().hypot(e.uncertainty);
            let difference = (known.value - e.value).abs();
            agreement.covered += f64::from(difference <= 2.0 * pair) / count as f64;
            if difference > agreement.worst * e.value.abs() {
                agreement.worst = difference / e.value.abs();
                agreement.at = at.clone();
            }
        }
    }
    all
}

/// The claim: 95 % of all numbers are covered, and every factor is within 2e-4 at the default accuracy.
fn holds(all: &[Agreement]) -> Result<(), String> {
    let covered = all.iter().map(|a| a.covered).sum::<f64>() / all.len() as f64;
    let factors: Vec<&Agreement> = all.iter().filter(|a| a.name.starts_with("factor")).collect();
    let good = covered >= 0.95 && factors.iter().all(|a| a.covered >= 0.95 && a.worst < 2e-4);
    if good {
        Ok(())
    } else {
        Err(format!("{all:#?}"))
    }
}

const FREE: [&str; 4] = ["--gaps", "2mm..8mm", "--tilts", "0deg..1deg"];
/// Down to where the free edge stands at 5 % of the gap: 55.7 um of 1.114 mm.
const TO_5_PERCENT: [&str; 3] = ["--along-hinge", "--angles", "-19.2417mrad..10mrad"];

#[test]
fn interpolated_factors_agree_with_direct_ones() {
    let scratch = Scratch::new("direct");
    let (table, _) = tabulated(&scratch, &FREE);
    holds(&against_direct(&table, 12, 1e-4)).unwrap();
}

/// The whole of what is claimed, for `cargo test --release two_hundred -- --ignored --nocapture`.
fn two_hundred_random_places(arguments: &[&str]) {
    let scratch = Scratch::new(&format!("two-hundred-{}", arguments.len()));
    let (table, seconds) = tabulated(&scratch, arguments);
    let all = against_direct(&table, 200, 1e-4);
    eprintln!("{arguments:?}: table in {seconds:.1} s");
    for a in &all {
        eprintln!("{:>16} {:5.1} % covered, worst {:.1e} at {:?}", a.name, 100.0 * a.covered, a.worst, a.at);
    }
    holds(&all).unwrap();
}

#[test]
#[ignore = "takes a minute; the same with fewer places is in the normal suite"]
fn two_hundred_random_places_over_gap_and_tilt() {
    two_hundred_random_places(&FREE);
}

#[test]
#[ignore = "takes minutes: plates that nearly touch"]
fn two_hundred_random_places_along_the_hinge() {
    two_hundred_random_places(&TO_5_PERCENT);
}
