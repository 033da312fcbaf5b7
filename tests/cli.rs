//! The program from outside: exit codes, messages, what goes to standard output and what does not.

use std::io::Write;
use std::process::{Command, Stdio};
use std::sync::OnceLock;
use std::time::Instant;

use proptest::prelude::*;
use serde_json::{json, Value};

/// What a run left behind.
struct Run {
    code: i32,
    stdout: String,
    stderr: String,
}

fn program() -> Command {
    Command::new(env!("CARGO_BIN_EXE_tiltgap"))
}

/// Runs the built program with a text on standard input.
fn run_with(arguments: &[&str], stdin: &[u8]) -> Run {
    let mut command = program();
    command.args(arguments).stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
    let mut child = command.spawn().unwrap();
    // A program that refuses an option does not read its input.
    let _ = child.stdin.take().unwrap().write_all(stdin);
    let output = child.wait_with_output().unwrap();
    let [stdout, stderr] = [output.stdout, output.stderr].map(|b| String::from_utf8(b).unwrap());
    Run { code: output.status.code().expect("no signal"), stdout, stderr }
}

fn run(arguments: &[&str]) -> Run {
    run_with(arguments, b"")
}

/// A run that has to fail: the code, nothing on standard output, one sentence on standard error.
fn refused(arguments: &[&str], stdin: &[u8], code: i32, sentence: &str) {
    let run = run_with(arguments, stdin);
    assert_eq!(run.code, code, "{arguments:?}: {}", run.stderr);
    assert_eq!(run.stdout, "", "{arguments:?}");
    assert!(run.stderr.contains(sentence), "{arguments:?}: {} does not say {sentence}", run.stderr);
    assert!(!run.stderr.contains("panicked"), "{}", run.stderr);
}

/// A bench that is quick to assess per metre of width, changed at one place.
fn bench(path: &str, value: Value) -> Vec<u8> {
    let mut bench = json!({
        "title": "strips for a test",
        "lower_plate": { "length": "100 mm", "width": "80 mm" },
        "upper_plate": { "length": "90 mm", "width": "80 mm" },
        "pose": { "gap": "6 mm", "tilt": "1 deg", "shift": ["2 mm", "0 mm"] },
        "hinge": { "arm": "140 mm", "height": "3 mm" },
        "drive": { "voltage": "50 V" },
    });
    if !path.is_empty() {
        *bench.pointer_mut(path).unwrap() = value;
    }
    bench.to_string().into_bytes()
}

fn plain() -> Vec<u8> {
    bench("", Value::Null)
}

/// The report of the demo bench, made once.
fn demo() -> &'static Value {
    static DEMO: OnceLock<Value> = OnceLock::new();
    DEMO.get_or_init(|| {
        let run = run(&["assess", "--json", "--accuracy", "1e-3"]);
        assert_eq!((run.code, run.stderr.as_str()), (0, ""));
        serde_json::from_str(&run.stdout).unwrap()
    })
}

#[test]
fn bad_files_are_refused() {
    let missing = "there is no file \"no-such-bench.json\"; check the path";
    refused(&["assess", "no-such-bench.json"], b"", 2, missing);
    refused(&["assess", "."], b"", 2, "\".\" is a directory");
    for (text, sentence) in [
        (&b""[..], "standard input is empty"),
        (b"gap = 4 mm", "standard input is not JSON: expected value at line 1, column 1"),
        (b"{\n \"title\": \"x\",\n}", "trailing comma at line 3, column 1"),
        (b"{\"title\": \"\xff\"}", "is not text in UTF-8 (byte 12)"),
        (b"[]", "the bench is an array of 0, not an object"),
        (b"{\"titel\": \"x\"}", "there is no key \"titel\"; did you mean \"title\"?"),
        (b"{\"title\": \"x\", \"title\": \"y\"}", "the key \"title\" occurs twice"),
    ] {
        refused(&["assess", "-"], text, 2, sentence);
    }
}

#[test]
fn bad_values_in_the_bench_are_refused() {
    for (path, value, sentence) in [
        ("/pose/gap", json!("6"), "\"pose.gap\": \"6\" has no unit; give a length with m, cm, mm, um or in"),
        ("/pose/gap", json!(6), "\"pose.gap\" is the number 6; give a text with a length and its unit"),
        ("/pose/gap", json!("6 mrad"), "\"pose.gap\": \"6 mrad\" has the unit \"mrad\""),
        (
            "/pose/gap",
            json!("-6 mm"),
            "\"pose.gap\" is \"-6 mm\", but must be positive, for example \"4 mm\"",
        ),
        ("/pose/gap", json!("0 mm"), "\"pose.gap\" is \"0 mm\", but must be positive"),
        ("/pose/gap", json!("NaN mm"), "\"pose.gap\": \"NaN mm\" does not begin with a finite number"),
        ("/pose/gap", json!("1e-300 m"), "the gap is 1e-300 m; give a length between 1 nm and 1 km"),
        ("/pose/gap", json!("1e-999 m"), "\"pose.gap\": \"1e-999 m\" is too large or too small"),
        ("/pose/gap", json!("2 m"), "check the units"),
        ("/lower_plate/length", json!("0 mm"), "\"lower_plate.length\" is \"0 mm\", but must be positive"),
        ("/lower_plate/length", json!("1e300 m"), "the length of the lower plate is 1e300 m"),
        ("/lower_plate/width", json!("1 mm"), "sides that differ by more than a factor 50"),
        ("/upper_plate/width", json!("inf m"), "does not begin with a finite number"),
        ("/pose/tilt", json!("90 deg"), "the tilt is 90 deg; give an angle between -89 and 89 deg"),
        (
            "/pose/tilt",
            json!("10 deg"),
            "the plates touch: the hinge (-x) edge of the upper plate would stand",
        ),
        (
            "/pose/tilt",
            json!("-10 deg"),
            "the plates touch: the free (+x) edge of the upper plate would stand",
        ),
        ("/pose/tilt", json!("7.64 deg"), "nearer than the fitted grid can follow"),
        ("/pose/shift", json!(["1 m", "0 mm"]), "the shift along x is 1e0 m; give at most"),
        ("/hinge/arm", json!("0 mm"), "\"hinge.arm\" is \"0 mm\", but must be positive"),
        ("/drive/voltage", json!("0 V"), "\"drive.voltage\" is \"0 V\", but must not be zero"),
        ("/drive/voltage", json!("1e9 V"), "the voltage is 1e9 V"),
    ] {
        refused(&["assess", "-"], &bench(path, value), 2, sentence);
    }
}

#[test]
fn bad_options_are_refused() {
    let section = "add `--connection floating`, or leave out --per-metre";
    for (arguments, code, sentence) in [
        (
            &["--gap", "4"][..],
            2,
            "--gap: \"4\" has no unit; give a length with m, cm, mm, um or in, for example",
        ),
        (&["--gap", "-4mm"], 2, "--gap is \"-4mm\", but must be positive"),
        (&["--gap", "4 kg"], 2, "--gap: \"4 kg\" has the unit \"kg\""),
        (&["--tilt", "nan deg"], 2, "--tilt: \"nan deg\" does not begin with a finite number"),
        (&["--tilt", "90deg"], 2, "the tilt is 90 deg"),
        (&["--voltage", "0V"], 2, "--voltage is \"0V\", but must not be zero"),
        (&["--connection", "grounde"], 2, "the nearest is \"grounded\""),
        (&["--accuracy", "0"], 2, "--accuracy: \"0\" will not do; give a number above 0 and at most 0.1"),
        (&["--accuracy", "-1e-4"], 2, "--accuracy: \"-1e-4\" will not do"),
        (&["--accuracy", "NaN"], 2, "--accuracy: \"NaN\" will not do"),
        (&["--accuracy", "1e-15"], 1, "the accuracy 1e-15 cannot be reached"),
        (&["--threads", "0"], 2, "--threads: \"0\" will not do; give a whole number from 1 to 64"),
        (&["--per-metre", "--connection", "grounded"], 2, section),
        (&["--per-metre", "--roll", "1deg"], 2, "a cross-section has no roll"),
        (&["--tlit", "1deg"], 2, "--tilt"),
        (&["--gap"], 2, "--gap"),
    ] {
        let all: Vec<&str> = ["assess", "-"].iter().chain(arguments).copied().collect();
        refused(&all, &plain(), code, sentence);
    }
    // The demo bench states that it is grounded.
    refused(&["assess", "--per-metre"], b"", 2, section);
    refused(&[], b"", 2, "Usage");
    refused(&["asses"], b"", 2, "assess");
}

#[test]
fn an_accuracy_out_of_reach_is_exit_code_1() {
    let arguments = ["assess", "-", "--per-metre", "--accuracy", "1e-7"];
    refused(
        &arguments,
        &plain(),
        1,
        "the accuracy 1e-7 was not reached: the finest level that could be solved",
    );
}

#[test]
fn the_report_has_all_keys() {
    let report = demo();
    for path in [
        "/version",
        "/bench/title",
        "/pose/gap_m",
        "/pose/tilt_rad",
        "/pose/roll_rad",
        "/pose/shift_m/1",
        "/capacitance_matrix_f/1/1",
        "/capacitance_matrix_uncertainty_f/1/1",
        "/capacitance_f/value",
        "/capacitance_f/uncertainty",
        "/charge_upper_c/uncertainty",
        "/energy_j/uncertainty",
        "/force_n/x/value",
        "/force_n/z/uncertainty",
        "/torque_hinge_nm/y/value",
        "/torque_centre_nm/y/uncertainty",
        "/ideal/capacitance_f",
        "/ideal/force_n",
        "/ideal/torque_nm",
        "/factors/capacitance/value",
        "/factors/force/uncertainty",
        "/factors/torque/wedge",
        "/factors/torque/fringe",
        "/numerics/levels/0/q",
        "/numerics/levels/0/nodes",
        "/numerics/levels/0/outer_iterations",
        "/numerics/levels/0/inner_iterations",
        "/numerics/levels/0/residual",
        "/numerics/levels/0/seconds",
        "/numerics/observed_order",
        "/numerics/seconds",
        "/numerics/threads",
    ] {
        assert!(report.pointer(path).is_some_and(|v| v.is_number() || v.is_string()), "{path}");
    }
    assert_eq!(report["bench"]["demo"], true);
    assert_eq!(report["dimensions"], 3);
}

#[test]
fn the_numbers_of_the_report_belong_together() {
    let report = demo();
    let at = |path: &str| report.pointer(path).and_then(Value::as_f64).unwrap();
    let same = |a: f64, b: f64| assert!((a / b - 1.0).abs() < 1e-12, "{a} {b}");
    same(at("/charge_upper_c/value"), at("/capacitance_f/value") * 400.0);
    same(at("/energy_j/value"), at("/capacitance_f/value") * 400.0 * 400.0 / 2.0);
    same(at("/factors/capacitance/value"), at("/capacitance_f/value") / at("/ideal/capacitance_f"));
    same(at("/factors/force/value"), -at("/force_n/z/value") / at("/ideal/force_n"));
    same(at("/factors/torque/value"), at("/torque_hinge_nm/y/value") / at("/ideal/torque_nm"));
    same(at("/ideal/torque_nm"), 0.15 * at("/ideal/force_n"));
    for factor in ["capacitance", "force", "torque"] {
        let part = |key: &str| at(&format!("/factors/{factor}/{key}"));
        same(part("value"), part("wedge") * part("fringe"));
    }
    // The hinge lies at -arm along the tilted plate: T_hinge = T_centre - offset x F.
    let (tilt, arm) = (at("/pose/tilt_rad"), 0.15);
    let lever = arm * (-tilt.cos() * at("/force_n/z/value") + tilt.sin() * at("/force_n/x/value"));
    let moved = at("/torque_centre_nm/y/value") + lever;
    assert!((moved / at("/torque_hinge_nm/y/value") - 1.0).abs() < 1e-6);
}

#[test]
fn the_bench_in_the_report_can_be_assessed_again() {
    let first = run_with(&["assess", "-", "--per-metre", "--json", "--gap", "7mm"], &plain());
    assert_eq!(first.code, 0, "{}", first.stderr);
    let mut report: Value = serde_json::from_str(&first.stdout).unwrap();
    assert_eq!(report["dimensions"], 2);
    assert_eq!((&report["connection"], &report["pose"]["gap_m"]), (&json!("floating"), &json!(0.007)));
    assert!(report["cautions"].to_string().contains("The floating connection was chosen"));
    assert_eq!(report["bench"]["demo"], false);
    report["bench"].as_object_mut().unwrap().remove("demo");
    let again = report["bench"].to_string();
    let second = run_with(
        &["assess", "-", "--per-metre", "--json", "--connection", "floating", "--threads", "1"],
        again.as_bytes(),
    );
    let second: Value = serde_json::from_str(&second.stdout).unwrap();
    for key in ["capacitance_matrix_f", "force_n", "torque_hinge_nm", "factors"] {
        assert_eq!(report[key], second[key], "{key}: not the same bits on another number of threads");
    }
}

#[test]
fn the_screen_says_what_it_shows() {
    let run = run_with(&["assess", "-", "--per-metre", "--voltage", "400 V"], &plain());
    assert_eq!((run.code, run.stderr.as_str()), (0, ""), "silent off a terminal");
    for part in [
        "strips for a test",
        "wedge and fringe",
        "k_F",
        "pF/m",
        "IEC 61010-1",
        "is not k_F",
        "observed order",
    ] {
        assert!(run.stdout.contains(part), "{part}:\n{}", run.stdout);
    }
    assert!(!run.stdout.contains("demo"));
    assert!(!run.stdout.contains('\u{1b}') && run.stdout.lines().all(|l| l.chars().count() <= 100));
}

#[test]
fn without_a_file_the_output_says_that_it_is_the_demo() {
    let run = run(&["assess", "--per-metre", "--connection", "floating"]);
    assert_eq!(run.code, 0, "{}", run.stderr);
    assert!(run.stdout.contains("No bench file was given: this is the built-in demo bench"));
}

#[test]
fn without_a_hinge_there_is_no_torque_factor() {
    let mut bench: Value = serde_json::from_slice(&plain()).unwrap();
    bench.as_object_mut().unwrap().remove("hinge");
    let run = run_with(&["assess", "-", "--per-metre", "--json"], bench.to_string().as_bytes());
    let report: Value = serde_json::from_str(&run.stdout).unwrap();
    for value in [&report["torque_hinge_nm"], &report["factors"]["torque"], &report["ideal"]["torque_nm"]] {
        assert_eq!(*value, Value::Null);
    }
    assert!(report["torque_centre_nm"]["y"]["value"].is_number());
}

#[test]
fn demo_and_schema_are_printed() {
    let demo = run(&["demo"]);
    let bench: Value = serde_json::from_str(&demo.stdout).unwrap();
    let schema: Value = serde_json::from_str(&run(&["schema"]).stdout).unwrap();
    let known = schema["properties"].as_object().unwrap();
    assert!(bench.as_object().unwrap().keys().all(|k| known.contains_key(k)));
    // It can be edited and assessed.
    let edited = demo.stdout.replace("\"grounded\"", "\"floating\"");
    assert_eq!(run_with(&["assess", "-", "--per-metre"], edited.as_bytes()).code, 0);
    let version = run(&["--version"]);
    assert_eq!((version.code, version.stdout.starts_with("tiltgap ")), (0, true));
}

#[test]
fn a_closed_pipe_is_no_failure() {
    let mut child = program().arg("schema").stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0));
}

/// Runs inside this process, which is quicker; the streams are the same: exit code, standard output, standard error.
pub fn within(arguments: &[&str], mut stdin: &[u8]) -> (u8, String, String) {
    let (mut stdout, mut stderr) = (Vec::new(), Vec::new());
    let mut streams =
        tiltgap::Streams { stdin: &mut stdin, stdout: &mut stdout, stderr: &mut stderr, terminal: false };
    let all = ["tiltgap"].iter().chain(arguments).copied();
    let code = tiltgap::run(all, &mut streams, Instant::now());
    (code, String::from_utf8(stdout).unwrap(), String::from_utf8(stderr).unwrap())
}

/// Lengths that a person could mean, and some that nobody can.
fn length() -> impl Strategy<Value = String> {
    prop_oneof![
        8 => (1.0..200.0f64, prop_oneof!["mm", "cm", "um", "in"]).prop_map(|(v, u)| format!("{v:.2} {u}")),
        2 => "[-+0-9.eE]{0,6} ?(mm|m|kg|V)?",
    ]
}

fn angle() -> impl Strategy<Value = String> {
    prop_oneof![
        8 => (-20.0..20.0f64, prop_oneof!["deg", "mrad", "arcmin"]).prop_map(|(v, u)| format!("{v:.2} {u}")),
        2 => "[-+0-9.eE]{0,6} ?(deg|rad|mm)?",
    ]
}

/// A report or a sentence, never both and never a mistake of the program.
fn report_or_sentence(arguments: &[&str], stdin: &[u8]) -> Result<(), TestCaseError> {
    let (code, stdout, stderr) = within(arguments, stdin);
    prop_assert!(code <= 2, "{code}: {stderr}");
    prop_assert_eq!(code == 0, !stdout.is_empty());
    prop_assert_eq!(code == 0, stderr.is_empty());
    Ok(())
}

/// Cases of a property in which most cases are solved, and in which hardly any are.
const SOLVED: u32 = 24;
const REFUSED: u32 = 128;

fn config(cases: u32) -> ProptestConfig {
    ProptestConfig { cases, failure_persistence: None, ..ProptestConfig::default() }
}

proptest! {
    #![proptest_config(config(SOLVED))]

    #[test]
    fn any_bench_gives_a_report_or_a_sentence(
        lengths in prop::array::uniform6(length()), gap in "[1-9](\\.[0-9])? mm", tilt in angle(),
        voltage in "-?[0-9]{1,3} k?V", small in prop::array::uniform4(length()), more in 0..16u32,
    ) {
        let [a1, b1, a2, b2, t, arm] = &lengths;
        let [thickness, slot, rim, wall] = &small;
        let has = |bit: u32| more & (1 << bit) != 0;
        let mut bench = json!({
            "lower_plate": { "length": a1, "width": b1 },
            "upper_plate": { "length": a2, "width": b2, "thickness": "0 mm" },
            "pose": { "gap": gap, "tilt": tilt, "shift": [t, "0 mm"] },
            "hinge": { "arm": arm },
            "drive": { "voltage": voltage },
        });
        if has(0) {
            bench["lower_plate"]["thickness"] = json!(thickness);
        }
        if has(1) {
            bench["upper_plate"]["guard"] = json!({ "slot": slot, "rim": rim });
        }
        if has(2) {
            bench["lower_plate"]["film"] = json!({ "thickness": "0.2 mm", "relative_permittivity": 3 });
        }
        if has(3) {
            bench["surroundings"] = json!({ "kind": "grounded-box", "free_side": wall, "above": wall });
        }
        report_or_sentence(&["assess", "-", "--per-metre", "--accuracy", "0.1"], bench.to_string().as_bytes())?;
    }

}

proptest! {
    #![proptest_config(config(REFUSED))]

    #[test]
    fn any_text_gives_a_sentence(text in "\\PC{0,40}") {
        let (code, stdout, stderr) = within(&["assess", "-"], text.as_bytes());
        prop_assert_eq!((code, stdout.as_str()), (2, ""));
        prop_assert!(stderr.starts_with("tiltgap: standard input"));
    }

    #[test]
    fn any_option_gives_a_sentence_or_a_report(
        option in prop_oneof!["--gap", "--tilt", "--roll", "--voltage", "--connection", "--accuracy", "--threads"],
        text in "\\PC{0,12}",
    ) {
        let argument = format!("{option}={text}");
        report_or_sentence(&["assess", "-", "--per-metre", &argument], &plain())?;
    }
}
