//! Tables of factors: the interpolated ones against direct assessments, and the files that hold them.

use std::path::PathBuf;
use std::process::{Command, Stdio};
use std::sync::OnceLock;
use std::time::{Duration, Instant};

use serde_json::Value;
use tiltgap::store::{Format, Stored};
use tiltgap::tables::table::Table;
use tiltgap_solver::{assess, Params};

use crate::cli::within;

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

/// A job that is quick: a cross-section over gap and tilt, coarse.
const QUICK: [&str; 5] = ["--per-metre", "--connection", "floating", "--accuracy", "3e-3"];
const QUICK_RANGES: [&str; 4] = ["--gaps", "4mm..6mm/3", "--tilts", "0deg..1deg"];

fn quick<'a>(more: &[&'a str]) -> Vec<&'a str> {
    [&["tabulate"][..], &QUICK, &QUICK_RANGES, more].concat()
}

fn bytes(path: &str) -> Vec<u8> {
    std::fs::read(path).unwrap_or_else(|e| panic!("{path}: {e}"))
}

/// The table of the quick job, made once.
fn quick_table() -> &'static Vec<u8> {
    static TABLE: OnceLock<Vec<u8>> = OnceLock::new();
    TABLE.get_or_init(|| {
        let scratch = Scratch::new("quick");
        let path = scratch.file("t.json");
        let (code, _, stderr) = within(&quick(&["-o", &path, "--threads", "2"]), b"");
        assert_eq!(code, 0, "{stderr}");
        assert!(!std::fs::exists(format!("{path}.progress")).unwrap());
        assert!(!std::fs::exists(format!("{path}.lock")).unwrap());
        bytes(&path)
    })
}

#[test]
fn one_thread_gives_the_same_bytes() {
    let scratch = Scratch::new("one-thread");
    let path = scratch.file("t.json");
    let (code, _, stderr) = within(&quick(&["-o", &path, "--threads", "1"]), b"");
    assert_eq!(code, 0, "{stderr}");
    assert_eq!(bytes(&path), *quick_table());
    let (code, stdout, _) = within(&quick(&["-o", "-"]), b"");
    assert_eq!((code, stdout.into_bytes()), (0, quick_table().clone()));
}

#[test]
fn shares_joined_give_the_same_bytes() {
    let scratch = Scratch::new("shares");
    let shares = ["1", "2", "3"].map(|n| scratch.file(&format!("share{n}.json")));
    for (n, share) in shares.iter().enumerate() {
        let part = format!("{}/3", n + 1);
        let (code, _, stderr) = within(&quick(&["--part", &part, "-o", share]), b"");
        assert_eq!(code, 0, "{stderr}");
    }
    let path = scratch.file("t.json");
    let [a, b, c] = shares.each_ref().map(String::as_str);
    // In any order.
    let (code, _, stderr) = within(&["join", c, a, b, "-o", &path], b"");
    assert_eq!(code, 0, "{stderr}");
    assert_eq!(bytes(&path), *quick_table());
    for (arguments, sentence) in [
        (&["join", a, b, "-o", "x"][..], "share 3/3 is not there; give all 3 of them"),
        (&["join", a, a, c, "-o", "x"], "are both share 1/3; give each share once"),
        (&["join", &path, "-o", "x"], "is a tiltgap table, not a tiltgap share of a table"),
        (&["apply", a, "--at", "gap=5mm"], "put all shares together with `tiltgap join`"),
        (&["join", a, "no-such.json"], "there is no file \"no-such.json\""),
    ] {
        let (code, stdout, stderr) = within(arguments, b"");
        assert_eq!((code, stdout.as_str()), (2, ""), "{stderr}");
        assert!(stderr.contains(sentence), "{stderr}");
    }
}

#[test]
fn a_run_that_is_killed_again_and_again_gives_the_same_bytes() {
    let scratch = Scratch::new("killed");
    let path = scratch.file("t.json");
    let whole = quick_table();
    let mut numbers = Numbers(3);
    let start = || {
        let mut command = Command::new(env!("CARGO_BIN_EXE_tiltgap"));
        command.args(quick(&["-o", &path])).stdin(Stdio::null()).stdout(Stdio::null()).stderr(Stdio::null());
        command.spawn().unwrap()
    };
    let mut killed = 0;
    // Kills without a destructor: the operating system ends the process at any moment.
    while killed < 10 && !std::fs::exists(&path).unwrap() {
        let mut child = start();
        std::thread::sleep(Duration::from_millis(40 + (260.0 * numbers.next()) as u64));
        child.kill().unwrap();
        child.wait().unwrap();
        killed += 1;
    }
    assert!(start().wait().unwrap().success());
    assert_eq!(bytes(&path), *whole, "after {killed} kills");
    for suffix in [".progress", ".progress.tmp", ".lock", ".tmp"] {
        assert!(!std::fs::exists(format!("{path}{suffix}")).unwrap(), "{suffix}");
    }
}

#[test]
fn what_is_in_the_way_is_left_as_it_is() {
    let scratch = Scratch::new("in-the-way");
    let path = scratch.file("t.json");
    std::fs::write(&path, quick_table()).unwrap();
    let (code, stdout, stderr) = within(&quick(&["-o", &path]), b"");
    assert_eq!((code, stderr.as_str()), (0, ""));
    assert!(stdout.contains("holds this table already"), "{stdout}");
    let mut other = quick(&["-o", &path]);
    let accuracy = other.iter_mut().find(|a| **a == "3e-3").unwrap();
    *accuracy = "1e-2";
    let (code, _, stderr) = within(&other, b"");
    assert_eq!(code, 2);
    assert!(stderr.contains("settings.accuracy is 0.003 there and 0.01 here"), "{stderr}");
    assert_eq!(bytes(&path), *quick_table());
    let cut = &quick_table()[..1000];
    for (content, sentence) in [
        (cut, "it was cut short or is no table"),
        (b"{\"mine\": 1}", "is no table of this program"),
        (b"", "is no whole JSON text"),
    ] {
        std::fs::write(&path, content).unwrap();
        // Not even with --restart: it may be anything.
        for more in [&[][..], &["--restart"]] {
            let (code, _, stderr) = within(&quick(&[&["-o", path.as_str()][..], more].concat()), b"");
            assert_eq!(code, 2);
            assert!(stderr.contains(sentence) && stderr.contains("is left as it is"), "{stderr}");
            assert_eq!(bytes(&path), content);
        }
    }
    std::fs::remove_file(&path).unwrap();
    let progress = format!("{path}.progress");
    std::fs::write(&progress, cut).unwrap();
    let (code, _, stderr) = within(&quick(&["-o", &path]), b"");
    assert_eq!(code, 2);
    assert!(stderr.contains("is left as it is") && bytes(&progress) == cut, "{stderr}");
    let (code, _, stderr) = within(&quick(&["-o", &path, "--restart"]), b"");
    assert_eq!((code, bytes(&path) == *quick_table()), (0, true), "{stderr}");
}

#[test]
fn ranges_that_will_not_do_are_refused_before_anything_is_solved() {
    let begun = Instant::now();
    for (arguments, sentence) in [
        (&["tabulate"][..], "a table needs a range"),
        (&["tabulate", "--gaps", "2mm"], "--gaps: \"2mm\" is no range"),
        (&["tabulate", "--gaps", "0mm..8mm"], "gap 0 m: the gap is 0e0 m"),
        (
            &["tabulate", "--gaps", "0.5mm..8mm", "--tilts", "0deg..1deg"],
            "the plates touch: the hinge (-x) edge",
        ),
        (&["tabulate", "--gaps", "2mm..8mm", "--part", "4/3", "-o", "x"], "--part: \"4/3\" will not do"),
        (&["tabulate", "--gaps", "2mm..8mm", "--part", "1/3"], "a share goes to a file of its own"),
        (&["tabulate", "--angles", "0deg..1deg"], "add --along-hinge"),
        (&["tabulate", "--along-hinge", "--angles", "-2deg..1deg"], "angle -2.00000 deg"),
        (&["tabulate", "--gaps", "2mm..8mm", "-o", "no/such/table.json"], "cannot be written"),
    ] {
        let (code, stdout, stderr) = within(arguments, b"");
        assert!(code >= 2 && stdout.is_empty(), "{arguments:?}: {code} {stderr}");
        assert!(stderr.contains(sentence), "{arguments:?}: {stderr}");
    }
    assert!(begun.elapsed() < Duration::from_secs(5));
}

#[test]
fn two_processes_on_one_output_do_not_meet() {
    let scratch = Scratch::new("two");
    let path = scratch.file("t.json");
    let _held = tiltgap::lock::Lock::of(path.as_ref()).unwrap();
    let (code, _, stderr) = within(&quick(&["-o", &path]), b"");
    assert_eq!(code, 2);
    assert!(stderr.contains("another tiltgap is at work on"), "{stderr}");
}

#[test]
fn readings_are_corrected_row_by_row() {
    let scratch = Scratch::new("readings");
    let (table, input) = (scratch.file("t.json"), scratch.file("in.csv"));
    std::fs::write(&table, quick_table()).unwrap();
    std::fs::write(
        &input,
        "\u{feff}# spring\nnote;voltage_V;u_gap_um;tilt_mrad;gap_mm\n\"a; b\";250;5;2,5;4,5\nfar;250;5;0;9.1\nc;1e2;0;17;6\n",
    )
    .unwrap();
    let output = scratch.file("out.csv");
    let (code, stdout, stderr) = within(&["apply", &table, &input, "-o", &output], b"");
    assert_eq!((code, stdout.as_str()), (1, ""));
    assert!(stderr.starts_with("line 4, column gap_mm: 9.1 is outside the table, 4 to 6 mm\n"), "{stderr}");
    assert!(stderr.contains("1 of 3 readings could not be corrected"), "{stderr}");
    let text = String::from_utf8(bytes(&output)).unwrap();
    let rows: Vec<Vec<&str>> = text.lines().map(|l| l.split(';').collect()).collect();
    assert_eq!(rows.len(), 4);
    assert_eq!(rows[0][..5], ["note", "voltage_V", "u_gap_um", "tilt_mrad", "gap_mm"]);
    assert!(rows[1][0] == "\"a" && rows[2][0] == "far" && rows[2].last().unwrap().contains("outside"));
    let column = |name: &str| rows[0].iter().position(|n| *n == name).unwrap();
    let of_last = |name: &str| -> f64 { rows[3][column(name)].parse().unwrap() };
    let product = of_last("ideal_force_N_per_m") * of_last("factor_force");
    assert!((of_last("corrected_force_N_per_m") / product - 1.0).abs() < 1e-7);
    // The same reading by itself.
    let (code, stdout, _) =
        within(&["apply", &table, "--at", "gap=6mm,tilt=17mrad,voltage=100V", "--json"], b"");
    assert_eq!(code, 0);
    let single: Value = serde_json::from_str(&stdout).unwrap();
    for name in ["capacitance", "force", "torque"] {
        let factor = single["factors"][name]["value"].as_f64().unwrap();
        assert!((factor - of_last(&format!("factor_{name}"))).abs() < 1e-8);
        assert!(single["corrected"][name]["uncertainty"].as_f64().unwrap() > 0.0);
    }
    assert!(single["ideal"]["torque_nm"].is_number());
    // Through standard input and output, on one thread: the same bytes.
    let (code, stdout, _) = within(&["apply", &table, "-", "--threads", "1"], &bytes(&input));
    assert_eq!((code, stdout), (1, text));
}

#[test]
fn apply_refuses_what_it_cannot_do() {
    let scratch = Scratch::new("refuses");
    let table = scratch.file("t.json");
    std::fs::write(&table, quick_table()).unwrap();
    let newer = scratch.file("newer.json");
    let text = String::from_utf8(quick_table().clone()).unwrap();
    std::fs::write(&newer, text.replace("\"version\": 1", "\"version\": 9")).unwrap();
    let edited = scratch.file("edited.json");
    std::fs::write(&edited, text.replace("110 mm", "111 mm")).unwrap();
    for (arguments, sentence) in [
        (&["apply", &table][..], "there are no readings; name a CSV file"),
        (&["apply", &table, "no.csv"], "\"no.csv\" cannot be read"),
        (&["apply", "no.json", "--at", "gap=5mm"], "there is no file \"no.json\""),
        (&["apply", &newer, "--at", "gap=5mm"], "version 9 of the layout, this program knows version 1"),
        (&["apply", &edited, "--at", "gap=5mm"], "was changed after it was written"),
        (&["apply", &table, "--at", "gap=5mm,tilt=0deg"], "--at: the voltage is missing"),
        (&["apply", &table, "--at", "gap=9mm,tilt=0deg"], "\"gap=9mm\" is outside the table, 4 to 6 mm"),
        (&["apply", &table, "--at", "gap=5"], "\"gap=5\" has no unit"),
        (&["apply", &table, "--at", "gpa=5mm"], "the nearest is gap"),
        (&["apply", &table, "--at", "gap=5mm,gap=5mm"], "occurs twice"),
        (&["apply", &table, "--at", "angle=5mrad"], "not along the hinge"),
        (&["apply", &table, "--at", "gap"], "is no name with a value"),
        (&["apply", "-", "-"], "cannot both come from standard input"),
        (&["apply", &table, "-", "-o", &table], "standard input is empty"),
        (&["table", &edited], "was changed after it was written"),
    ] {
        let (code, stdout, stderr) = within(arguments, b"");
        assert_eq!((code, stdout.as_str()), (2, ""), "{arguments:?}: {stderr}");
        assert!(stderr.contains(sentence), "{arguments:?}: {stderr}");
    }
    let readings = b"gap_mm,tilt_deg,voltage_V\n5,0,1\n";
    let (code, _, stderr) = within(&["apply", &table, "-", "-o", &table], readings);
    assert_eq!((code, bytes(&table) == *quick_table()), (2, true), "{stderr}");
    assert!(stderr.contains("is one of the inputs"), "{stderr}");
}

#[test]
fn along_the_hinge_the_angle_is_the_reading() {
    let scratch = Scratch::new("hinge");
    let table = scratch.file("t.json");
    let along = ["--along-hinge", "--angles", "-10mrad..10mrad", "-o", &table];
    let arguments = [&["tabulate"], &QUICK[..], &along].concat();
    let (code, _, stderr) = within(&arguments, b"");
    assert_eq!(code, 0, "{stderr}");
    let (code, stdout, stderr) =
        within(&["apply", &table, "--at", "angle=-5mrad,voltage=100V", "--json"], b"");
    assert_eq!(code, 0, "{stderr}");
    let single: Value = serde_json::from_str(&stdout).unwrap();
    // The gap at the centre: 4 mm at angle 0, arm 150 mm.
    let gap = 0.004 + 0.15 * (-0.005f64).sin();
    let (code, stdout, _) = within(
        &[
            "assess",
            "--per-metre",
            "--connection",
            "floating",
            "--gap",
            &format!("{gap} m"),
            "--tilt",
            "-5mrad",
            "--json",
        ],
        b"",
    );
    assert_eq!(code, 0);
    let direct: Value = serde_json::from_str(&stdout).unwrap();
    for name in ["capacitance", "force", "torque"] {
        let [a, b] = [&single, &direct].map(|v| v["factors"][name]["value"].as_f64().unwrap());
        // The bench of the direct one keeps its shift, which is 2 um along the way.
        assert!((a / b - 1.0).abs() < 1e-3, "{name}: {a} {b}");
    }
    let readings = b"angle_mrad,gap_mm,voltage_V\n1,4,100\n";
    let (code, stdout, stderr) = within(&["apply", &table, "-"], readings);
    assert_eq!((code, stdout.lines().count()), (0, 2));
    assert!(stderr.contains("column \"gap_mm\" is passed through and not used"), "{stderr}");
    let (code, stdout, _) = within(&["table", &table], b"");
    assert!(code == 0 && stdout.contains("angle, mrad") && stdout.contains("k_T"), "{stdout}");
}
