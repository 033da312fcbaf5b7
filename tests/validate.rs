//! The command `validate`: quick and passing, its JSON and reports, what it refuses, and that it can fail.

use std::time::Instant;

use clap::Parser;
use serde_json::Value;
use tiltgap::arguments::{Arguments, Command, ValidateArguments};
use tiltgap::validate::cases::{Family, FILES};
use tiltgap::validate::{validate, Job};
use tiltgap::Streams;

/// Exit code, standard output, standard error of a run inside this process.
fn run(arguments: &[&str], stdin: &str) -> (u8, String, String) {
    let (mut stdin, mut stdout, mut stderr) = (stdin.as_bytes(), Vec::new(), Vec::new());
    let mut streams =
        Streams { stdin: &mut stdin, stdout: &mut stdout, stderr: &mut stderr, terminal: false };
    let all = ["tiltgap", "validate"].iter().chain(arguments).copied();
    let code = tiltgap::run(all, &mut streams, Instant::now());
    (code, String::from_utf8(stdout).unwrap(), String::from_utf8(stderr).unwrap())
}

/// A small bench in cross-section, for tests that are about words.
fn bench(title: &str) -> String {
    let mut bench: Value = serde_json::from_str(tiltgap::source::DEMO).unwrap();
    bench["title"] = title.into();
    bench["drive"]["connection"] = "floating".into();
    bench.to_string()
}

#[test]
fn the_quick_choice_passes_on_the_demo_bench_and_reports_itself() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("report.html");
    let (code, out, err) = run(&["--quick", "--json", "--report", path.to_str().unwrap()], "");
    assert_eq!(code, 0, "{out}\n{err}");
    let json: Value = serde_json::from_str(&out).unwrap();
    assert_eq!((&json["holds"], &json["failed"]), (&Value::Bool(true), &Value::Array(Vec::new())));
    for key in
        ["version", "date", "machine", "threads", "accuracy", "bench", "coverage", "verdict", "seconds"]
    {
        assert!(!json[key].is_null(), "{key}");
    }
    let length = |key: &str| json[key].as_array().unwrap().len();
    assert!(length("references") >= 60 && length("self_checks") >= 10 && length("convergence") == 6);
    assert_eq!(json["ideal_limit"]["approach"].as_array().unwrap().len(), 9);
    // Every family that is solved has a part in the quick choice.
    for family in Family::all().iter().filter(|f| f.target.is_some()) {
        let mine =
            json["references"].as_array().unwrap().iter().filter(|c| c["family"] == family.name.as_str());
        assert!(mine.count() > 0, "{}", family.name);
    }
    let page = std::fs::read_to_string(&path).unwrap();
    for part in ["tiltgap 0.", "Machine", "Date", "Bench as given", "<svg", "Verdict", "All ", "wedge-strips"]
    {
        assert!(page.contains(part), "{part}");
    }
    for outside in ["http-equiv", "<script", "src=", "href="] {
        assert!(!page.contains(outside), "the page is not self-contained: {outside}");
    }
    assert!(err.lines().count() >= 4 && err.contains("reference cases: "), "{err}");
}

#[test]
fn one_family_alone() {
    let (code, out, err) = run(&["--only", "wedge-ideal", "--full", "--sources"], "");
    assert_eq!(code, 0, "{out}\n{err}");
    assert!(
        out.contains("45 values in 1 families, 45 of them closed forms")
            && out.contains("Source (closed form)")
    );
    assert!(!out.contains("Self checks") && !out.contains("Convergence"));
    assert!(out.lines().all(|l| l.chars().count() <= 100), "{out}");
}

#[test]
fn the_self_checks_are_those_of_the_bench_given_and_titles_are_escaped() {
    let folder = tempfile::tempdir().unwrap();
    let title = "<script>alert(1)</script> [x](y) | z";
    for (name, forbidden) in [("a.html", "<script"), ("a.md", "[x](y)")] {
        let path = folder.path().join(name);
        let arguments = ["-", "--per-metre", "--only", "self-checks", "--report", path.to_str().unwrap()];
        let (code, out, err) = run(&arguments, &bench(title));
        assert_eq!(code, 0, "{out}\n{err}");
        assert!(out.contains("reciprocity") && out.lines().all(|l| l.chars().count() <= 100), "{out}");
        let text = std::fs::read_to_string(&path).unwrap();
        assert!(text.contains("alert(1)"), "{text}");
        assert!(!text.contains(forbidden), "{text}");
    }
}

#[test]
fn what_is_not_there_is_refused_with_the_nearest_name() {
    let refused = |arguments: &[&str]| {
        let (code, out, err) = run(arguments, "");
        assert_eq!((code, out.as_str()), (2, ""), "{err}");
        err
    };
    assert!(refused(&["--only", "wedge-stirps"]).contains("did you mean \"wedge-strips\"?"));
    assert!(refused(&["--only", "self-cheks"]).contains("did you mean \"self-checks\"?"));
    assert!(refused(&["--only", "discs"]).contains("Plates are rectangular"));
    assert!(refused(&["--report", "a.pdf"]).contains("neither .html nor .md"));
    assert!(refused(&["--report", "no/such/a.md"]).contains("there is no folder"));
    assert!(refused(&["--quick", "--full"]).contains("cannot be used with"));
}

#[test]
fn a_wrong_reference_makes_it_fail() {
    let arguments: Vec<&str> = "tiltgap validate --only strips-parallel".split(' ').collect();
    let Command::Validate(arguments) = Arguments::try_parse_from(arguments).unwrap().command else {
        panic!("another command")
    };
    let outcome = |families: Vec<Family>, arguments: &ValidateArguments| {
        let job = Job::with(arguments, &mut std::io::empty(), families).unwrap();
        let (mut stdout, mut stderr) = (Vec::new(), Vec::new());
        let mut streams = Streams {
            stdin: &mut std::io::empty(),
            stdout: &mut stdout,
            stderr: &mut stderr,
            terminal: false,
        };
        let holds = validate(&job, arguments, &mut streams, Instant::now()).unwrap();
        (holds, String::from_utf8(stdout).unwrap())
    };
    let (_, text) = FILES.iter().find(|(name, _)| *name == "strips-parallel").unwrap();
    assert!(outcome(vec![Family::parse(text).unwrap()], &arguments).0);
    // Half a per mille more than the closed form at a gap of 0.2.
    let mut family = Family::parse(text).unwrap();
    let case = family.cases.iter_mut().find(|c| c.name() == "gap 0.2").unwrap();
    let value = &mut case.0["value"]["force_factor"];
    *value = (value.as_f64().unwrap() * 1.0005).into();
    let (holds, said) = outcome(vec![family], &arguments);
    assert!(
        !holds && said.contains("FAILS") && said.contains("strips-parallel, gap 0.2, force_factor"),
        "{said}"
    );
    assert!(said.contains("do not rely on numbers of this build"));
}
