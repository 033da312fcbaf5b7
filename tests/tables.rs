//! Tables of factors: the interpolated ones against direct assessments, and the files that hold them.

use std::path::PathBuf;
use std::time::Instant;

use tiltgap::store::{Format, Stored};
use tiltgap::tables::quantity::Quantity;
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

/// Interpolated factors against direct assessments at random places: the part of them that is covered by two standard
/// uncertainties of the pair, and the largest relative difference of a factor.
fn against_direct(table: &Table, count: usize, accuracy: f64) -> (f64, f64) {
    let mut numbers = Numbers(20);
    let (mut covered, mut all, mut worst) = (0, 0, 0.0f64);
    for _ in 0..count {
        let at: Vec<f64> = table
            .space
            .axes
            .iter()
            .map(|a| a.span.from + (a.span.to - a.span.from) * numbers.next())
            .collect();
        let question = table.space.question_at(&at);
        let params = Params { accuracy, ..Params::default() };
        let direct = assess(&question, &params, &mut |_| {}).unwrap();
        let size = question.arrangement.size_m();
        for (q, known) in table.quantities.iter().zip(table.all(&at)) {
            let e = q.of(&direct, size);
            let pair = known.uncertainty().hypot(e.uncertainty);
            let difference = (known.value - e.value).abs();
            use Quantity::{CapacitanceFactor, ForceFactor, TorqueFactor};
            all += 1;
            covered += usize::from(difference <= 2.0 * pair);
            if matches!(q, CapacitanceFactor | ForceFactor | TorqueFactor) {
                worst = worst.max(difference / e.value.abs());
            }
        }
    }
    (covered as f64 / all as f64, worst)
}

#[test]
fn interpolated_factors_agree_with_direct_ones() {
    let scratch = Scratch::new("direct");
    let (table, _) = tabulated(&scratch, &["--gaps", "2mm..8mm", "--tilts", "0deg..1deg"]);
    let (covered, worst) = against_direct(&table, 12, 1e-4);
    assert!(covered >= 0.95 && worst < 2e-4, "{covered} {worst:e}");
}

/// The whole of what is claimed, for `cargo test --release -- --ignored --nocapture`.
#[test]
#[ignore = "takes minutes; the same with fewer points is in the normal suite"]
fn two_hundred_random_points() {
    let hinge = "-19.24mrad..10mrad";
    for (name, arguments) in [
        ("free", &["--gaps", "2mm..8mm", "--tilts", "0deg..1deg"][..]),
        ("along the hinge", &["--along-hinge", "--angles", hinge]),
    ] {
        let scratch = Scratch::new("two-hundred");
        let (table, seconds) = tabulated(&scratch, arguments);
        let (covered, worst) = against_direct(&table, 200, 1e-4);
        eprintln!("{name}: table in {seconds:.1} s, {:.1} % covered, worst {worst:.1e}", 100.0 * covered);
        assert!(covered >= 0.95 && worst < 2e-4, "{name}: {covered} {worst:e}");
    }
}
