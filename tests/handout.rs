//! Handouts: what stands in them, that nothing typed does harm in any format, and what they may cost.

use std::path::Path;
use std::sync::OnceLock;
use std::time::Instant;

use roxmltree::Document;
use serde_json::{json, Value};
use sha2::{Digest, Sha256};

use crate::cli::within;
use crate::tables::Scratch;

/// A quick table over gap and tilt per metre of width, printed 9 x 7, with this title.
fn made(scratch: &Scratch, title: &str, more: &[&str]) -> String {
    let bench = json!({
        "title": title,
        "lower_plate": { "length": "100 mm", "width": "80 mm" },
        "upper_plate": { "length": "90 mm", "width": "80 mm" },
        "pose": { "gap": "6 mm", "tilt": "0.5 deg", "shift": ["2 mm", "0 mm"] },
        "hinge": { "arm": "140 mm", "height": "3 mm" },
        "drive": { "voltage": "500 V", "connection": "floating" },
    });
    let path = scratch.file("table.json");
    let arguments = [&["tabulate", "-", "--per-metre", "--accuracy", "1e-3", "-o", &path], more].concat();
    let (code, _, stderr) = within(&arguments, bench.to_string().as_bytes());
    assert_eq!(code, 0, "{stderr}");
    path
}

const FREE: [&str; 4] = ["--gaps", "4mm..12mm/9", "--tilts", "-0.3deg..0.9deg/7"];

/// The table that most tests need, made once.
fn table() -> &'static str {
    static TABLE: OnceLock<(Scratch, String)> = OnceLock::new();
    &TABLE
        .get_or_init(|| {
            let scratch = Scratch::new("handout");
            let path = made(&scratch, "strips for a test", &FREE);
            (scratch, path)
        })
        .1
}

/// The same table under another title: a title enters no number, only the checksum.
fn retitled(scratch: &Scratch, title: &str) -> String {
    let mut value: Value = serde_json::from_str(&std::fs::read_to_string(table()).unwrap()).unwrap();
    value["bench"]["title"] = title.into();
    let map = value.as_object_mut().unwrap();
    map.shift_remove("checksum");
    let sum = Sha256::digest(Value::from(map.clone()).to_string().as_bytes());
    let sum: String = sum.iter().map(|b| format!("{b:02x}")).collect();
    map.insert("checksum".into(), sum.into());
    let path = scratch.file("retitled.json");
    std::fs::write(&path, value.to_string()).unwrap();
    path
}

fn handout(table: &str, format: &str, more: &[&str]) -> String {
    let arguments = [&["handout", table, "-o", "-", "--format", format], more].concat();
    let (code, stdout, stderr) = within(&arguments, b"");
    assert_eq!((code, stderr.as_str()), (0, ""), "{format}");
    stdout
}

/// The body of a page as XML: what is void in HTML is closed first.
fn body(page: &str) -> String {
    let begin = page.find("<main>").unwrap();
    let end = page.find("</main>").unwrap() + "</main>".len();
    let mut text = page[begin..end].replace(" hidden>", ">").replace("novalidate>", ">");
    let mut closed = String::new();
    while let Some(at) = text.find("<input ") {
        let end = at + text[at..].find('>').unwrap();
        closed += &text[..end];
        closed += "/>";
        text = text[end + 1..].into();
    }
    closed + &text
}

const FORMATS: [&str; 4] = ["html", "md", "tex", "csv"];

#[test]
fn the_structure_of_a_page() {
    let page = handout(table(), "html", &[]);
    let text = body(&page);
    let document = Document::parse(&text).unwrap();
    let all = |name: &'static str| document.descendants().filter(move |n| n.has_tag_name(name));
    let sections: Vec<&str> = all("section").map(|s| s.attribute("id").unwrap()).collect();
    let golden = [
        "bench",
        "use",
        "calculator",
        "table-force",
        "table-torque",
        "table-capacitance",
        "errors",
        "wedge",
        "accuracy",
        "cautions",
        "trace",
    ];
    assert_eq!(sections, golden);
    // Every table has a caption, every head cell a scope, every field a label, the drawing a text.
    for table in all("table") {
        assert!(table.descendants().any(|n| n.has_tag_name("caption")));
    }
    assert!(all("th").all(|th| th.attribute("scope").is_some()));
    let labels: Vec<&str> = all("label").map(|l| l.attribute("for").unwrap()).collect();
    let fields: Vec<&str> = all("input").map(|i| i.attribute("id").unwrap()).collect();
    assert_eq!(labels, fields);
    assert_eq!(fields, ["in-gap", "in-u_gap", "in-tilt", "in-u_tilt", "in-voltage", "in-u_voltage"]);
    let drawing = all("svg").next().unwrap();
    assert!(drawing.attribute("aria-label").unwrap().contains("drawn to scale at gap 6 mm and tilt 0.5°"));
    // Nine gaps and seven tilts of each factor.
    for id in ["table-force", "table-torque", "table-capacitance"] {
        let section = all("section").find(|s| s.attribute("id") == Some(id)).unwrap();
        assert_eq!(section.descendants().filter(|n| n.has_tag_name("td")).count(), 9 * 7, "{id}");
    }
    // Nothing leads out of the page.
    for way in ["http:", "https:", "src=", "url(", "@import", "fetch(", "XMLHttp", "<iframe", "<a "] {
        assert!(!page.contains(way), "{way}");
    }
}

#[test]
fn all_formats_say_the_same() {
    let checksum: Value = serde_json::from_str(&std::fs::read_to_string(table()).unwrap()).unwrap();
    let short = &checksum["checksum"].as_str().unwrap()[..12];
    let (code, shown, _) = within(&["table", table(), "--csv"], b"");
    assert_eq!(code, 0);
    // The fifth gap and the third tilt: 8 mm and 0.1 deg.
    let line = shown.lines().find(|l| l.starts_with("8,0.1,")).unwrap();
    let force: f64 = line.split(',').nth(4).unwrap().parse().unwrap();
    for format in FORMATS {
        let text = handout(table(), format, &[]);
        assert!(text.contains(short), "{format}");
        let number = format!("{force:.4}");
        assert!(text.contains(&number[..number.len() - 1]), "{format}: {number}");
        for words in
            ["series resistor", "discharge the plates", "one hand", "interlock", "eye level", "licensed"]
        {
            assert!(text.contains(words), "{format}: {words}");
        }
        assert!(text.contains(env!("CARGO_PKG_VERSION")), "{format}");
    }
    let markdown = handout(table(), "md", &["--quantities", "torque"]);
    assert!(markdown.contains("## k_T") && !markdown.contains("## k_F") && !markdown.contains("## k_C"));
}

#[test]
fn a_page_is_small_and_quick() {
    table();
    let begun = Instant::now();
    let page = handout(table(), "html", &[]);
    let seconds = begun.elapsed().as_secs_f64();
    // Half a second in a release build; ten times that without optimisation.
    let limit = if cfg!(debug_assertions) { 5.0 } else { 0.5 };
    assert!(seconds < limit, "{seconds} s");
    for format in FORMATS {
        let size = handout(table(), format, &[]).len();
        assert!(size < 400_000, "{format}: {size} bytes");
    }
    assert!(page.len() < 400_000);
}

#[test]
fn titles_do_no_harm() {
    let long = "</h1><script>x</script> ".repeat(500);
    for title in [
        "</title></h1><script>alert(1)</script><img src=x onerror=alert(1)>\"'&amp;<!-- ]]> -->",
        "\\input{/etc/passwd} \\write18{id} $ # % _ ^^5c ~ {",
        "=HYPERLINK(\"http://example.invalid\")",
        "@SUM(1+1)*cmd|' /C calc'!A0",
        "-2+3",
        "\u{202e}desrever\u{202c} \u{200f}\u{2067}x",
        "[a](javascript:alert(1)) | `b` <b>*c*</b> # d",
        "標題 \u{1f600} žluťoučký",
        long.as_str(),
        "",
    ] {
        let scratch = Scratch::new("handout-title");
        let path = retitled(&scratch, title);
        let page = handout(&path, "html", &[]);
        // The two scripts of the program, and no other element that a title brought.
        assert_eq!(page.matches("<script").count(), 2, "{title}");
        assert!(!page.contains("<img") && !page.contains("<b>"));
        Document::parse(&body(&page)).unwrap();
        let turns = ['\u{202e}', '\u{202c}', '\u{200f}', '\u{2067}'];
        for format in FORMATS {
            let text = handout(&path, format, &[]);
            assert!(!text.contains(turns), "{format}: {title}");
            assert!(text.len() < 400_000, "{format}: {title}");
        }
        let tex = handout(&path, "tex", &[]);
        for command in ["\\input{/", "\\write", "^^"] {
            assert!(!tex.contains(command), "{title}");
        }
        let open = tex.replace("\\{", "").replace("\\}", "").matches('{').count();
        assert_eq!(open, tex.replace("\\{", "").replace("\\}", "").matches('}').count(), "{title}");
        let markdown = handout(&path, "md", &[]);
        let head = markdown.lines().next().unwrap();
        assert!(
            head.starts_with("# ")
                && !head.contains('<')
                && !head.replace("\\]", "").contains("](")
                && !head.contains("javascript:"),
            "{head}"
        );
        let csv = handout(&path, "csv", &[]);
        let mut reader =
            csv::ReaderBuilder::new().has_headers(false).flexible(true).from_reader(csv.as_bytes());
        for cell in reader.records().flat_map(|r| r.unwrap().iter().map(String::from).collect::<Vec<_>>()) {
            let begins = cell.starts_with(['=', '+', '-', '@', '\t', '\r']);
            assert!(!begins || cell.parse::<f64>().is_ok(), "{cell}");
        }
    }
}

#[test]
fn a_table_along_the_hinge_and_one_without_a_hinge() {
    let scratch = Scratch::new("handout-along");
    let path = made(&scratch, "along", &["--along-hinge", "--angles", "-10mrad..10mrad"]);
    let page = handout(&path, "html", &[]);
    assert!(page.contains("in-angle") && !page.contains("in-gap") && page.contains("At beam angle 0"));
    Document::parse(&body(&page)).unwrap();
    for format in FORMATS {
        assert!(handout(&path, format, &[]).contains("wedge alone"), "{format}");
    }
}

#[test]
fn pictures_of_a_table() {
    let drawn = |more: &[&str]| {
        let arguments = [&["draw", table(), "-o", "-", "--format", "svg"], more].concat();
        let (code, stdout, stderr) = within(&arguments, b"");
        assert_eq!((code, stderr.as_str()), (0, ""), "{more:?}");
        Document::parse(&stdout).unwrap();
        stdout
    };
    let torque = drawn(&["--what", "factors", "--quantity", "torque"]);
    assert!(torque.contains("factor k_T") && torque.contains("tilt −0.3°") && torque.contains("gap (mm)"));
    let error = drawn(&["--what", "error"]);
    assert!(error.contains("tilt (°)") && error.contains("id=\"contours\""));
    // The bench of the table, per metre and floating as the table is.
    let potential = drawn(&["--what", "potential", "--level", "4"]);
    assert!(potential.contains("gap 6 mm · tilt 0.5°") && potential.contains("floating"));
    for (arguments, sentence) in [
        (
            &["draw", "--what", "error", "-o", "-", "--format", "svg"][..],
            "this picture shows a table; name one",
        ),
        (&["draw", table(), "--what", "error", "-o", "a.vts"], "and no table; ask for .svg or .png"),
        (&["draw", table(), "--what", "error", "--gap", "4mm", "-o", "a.svg"], "--gap changes a bench"),
        (
            &["draw", table(), "--what", "charge", "--quantity", "force", "-o", "a.svg"],
            "--quantity goes with",
        ),
    ] {
        let (code, stdout, stderr) = within(arguments, b"");
        assert_eq!((code, stdout.as_str()), (2, ""), "{stderr}");
        assert!(stderr.contains(sentence), "{stderr}");
    }
}

#[test]
fn what_will_not_do_is_a_sentence() {
    let scratch = Scratch::new("handout-wrong");
    let path = scratch.file("page.pdf");
    for (arguments, sentence) in [
        (&["handout", table(), "-o", &path][..], "let it end in .html, .md, .tex or .csv"),
        (&["handout", table(), "-o", "-"], "the name does not say which format"),
        (&["handout", table(), "-o", "no/such/a.html"], "there is no folder"),
        (&["handout", table(), "-o", table(), "--format", "md"], "that is the table itself"),
        (&["handout", "no.json", "-o", "-", "--format", "md"], "there is no file"),
        (&["handout", table(), "--quantities", "forse"], "forse"),
    ] {
        let (code, stdout, stderr) = within(arguments, b"");
        assert_eq!((code, stdout.as_str()), (2, ""), "{stderr}");
        assert!(stderr.contains(sentence), "{stderr}");
    }
    assert!(!Path::new(&path).exists());
}
