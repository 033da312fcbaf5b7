//! Pictures and field files: what is drawn against what was solved, and the built program from outside.

use std::io::Read;
use std::path::Path;
use std::process::{Command, Output};

use base64::engine::general_purpose::STANDARD;
use base64::Engine;
use roxmltree::Document;
use serde_json::{json, Value};
use tiltgap::arguments::BenchArguments;
use tiltgap::assess::Setup;
use tiltgap::draw::lines::Tracer;
use tiltgap::draw::potential::{Bands, Equipotentials};
use tiltgap::draw::profile::profiles;
use tiltgap::draw::scene::Scene;
use tiltgap_meshes::{Arrangement, Dimensions, GridOptions, Plate, Pose, Surroundings};
use tiltgap_solver::{cell_field, surface_charge, Level, LevelParams, Section, EPS0};

fn solved(arrangement: &Arrangement, q: usize) -> Level {
    let mut params = LevelParams::default();
    params.outer.tolerance = 1e-12;
    let options = GridOptions::suited(arrangement);
    Level::solve(arrangement, &options, q, None, &params, &mut |_, _| {}).unwrap()
}

fn plates(dimensions: Dimensions, pose: Pose) -> Arrangement {
    let lower = Plate { length_m: 0.1, width_m: 0.08, thickness_m: 0.0 };
    let upper = Plate { length_m: 0.09, ..lower };
    Arrangement::open(lower, upper, pose, dimensions)
}

/// The set-up of a bench given as JSON, per metre or in space.
fn setup(bench: &Value, per_metre: bool) -> Setup {
    let arguments = BenchArguments { bench: Some("-".into()), per_metre, ..BenchArguments::default() };
    Setup::new(&arguments, &mut bench.to_string().as_bytes()).unwrap()
}

fn bench(title: &str, tilt: &str) -> Value {
    json!({
        "title": title,
        "lower_plate": { "length": "110 mm", "width": "90 mm" },
        "upper_plate": { "length": "110 mm", "width": "90 mm" },
        "pose": { "gap": "4 mm", "tilt": tilt },
        "drive": { "voltage": "400 V" },
    })
}

#[test]
fn the_charge_of_the_faces_is_that_of_the_capacitance_matrix() {
    let pose = Pose { gap_m: 0.01, tilt_rad: 0.05, roll_rad: 0.0, shift_m: [0.004, 0.0] };
    let rolled = Pose { roll_rad: -0.03, shift_m: [0.004, 0.006], ..pose };
    for (dimensions, pose, q) in
        [(Dimensions::Two, pose, 6), (Dimensions::Three, pose, 3), (Dimensions::Three, rolled, 2)]
    {
        let level = solved(&plates(dimensions, pose), q);
        for (p, plate) in [level.grid.lower.plate(), level.grid.upper.plate()].into_iter().enumerate() {
            let charge = surface_charge(&level, plate);
            for c in 0..2 {
                let sum: f64 =
                    charge.charge.iter().map(|faces| faces.iter().map(|f| f[c]).sum::<f64>()).sum();
                let (sum, of_matrix) = (sum * level.grid.multiplicity(), level.matrix[p][c]);
                // First order in what the iteration leaves, where the matrix is of second: at a tolerance of 1e-8
                // they differ by 3e-6.
                let off = (sum - of_matrix).abs() / level.matrix[p][p];
                assert!(off < 1e-8, "plate {p}, column {c}: {sum} {of_matrix}");
            }
            // The gap side bears the charge: up for the lower plate, down for the upper one.
            let side = |face: usize| charge.charge.iter().map(|f| f[face][p]).sum::<f64>();
            assert!(if p == 0 { side(2) > side(0) } else { side(0) > side(2) });
            let area: f64 = charge.area.iter().sum::<f64>() * level.grid.multiplicity();
            let width = if dimensions == Dimensions::Two { 1.0 } else { 0.8 };
            assert!((area - [1.0, 0.9][p] * width).abs() < 1e-12, "{area}");
        }
    }
}

#[test]
fn sections_and_cells_between_insulating_walls_are_exact() {
    let pose = Pose { gap_m: 0.02, tilt_rad: 0.0, roll_rad: 0.0, shift_m: [0.0; 2] };
    let mut arrangement = plates(Dimensions::Three, pose);
    arrangement.upper = arrangement.lower;
    arrangement.surroundings = Surroundings::InsulatedWalls;
    let level = solved(&arrangement, 2);
    let section = Section::new(&level, 0.13);
    let (fine, columns) = section.refined(&level.grid, 4);
    assert!(fine.points.len() > 8 * section.points.len());
    for s in [&section, &fine] {
        for (point, v) in s.points.iter().zip(s.potential([1.0, 5.0])) {
            assert!((v - 1.0 - 4.0 * point[1] / 0.2).abs() < 1e-7);
        }
    }
    for (i, &column) in columns[0].iter().enumerate() {
        let (a, b) = (section.index(i, 3), fine.index(column, columns[1][3]));
        assert!((section.points[a][0] - fine.points[b][0]).abs() < 1e-14);
    }
    for field in cell_field(&level, [1.0, 5.0]) {
        assert!(
            field[0].abs() < 1e-6 && field[1].abs() < 1e-6 && (field[2] + 20.0).abs() < 1e-6,
            "{field:?}"
        );
    }
}

/// Far from the edges the field is that of two planes hinged together: equipotentials are planes through the hinge, the
/// charge density is eps V over the arc.
#[test]
fn inside_a_wedge_equipotentials_and_charge_are_those_of_hinged_planes() {
    let tilt = 1f64.to_radians();
    for per_metre in [true, false] {
        let setup = setup(&bench("wedge", "1 deg"), per_metre);
        let level = solved(&setup.question.arrangement, 6);
        let scene = Scene::new(&setup, &level);
        let (bands, hinge_mm) = (Bands::new(scene.plates_v), 4.0 / tilt.tan());
        let equipotentials = Equipotentials::new(&scene, &bands);
        let mut seen = 0;
        for (v, contour) in bands.levels.iter().zip(&equipotentials.levels) {
            let angle = tilt * (v - scene.plates_v[0]) / setup.question.voltage_v;
            let slope = angle.tan();
            let gap = |p: &&[f64; 2]| p[1] > 0.0 && p[1] < tilt.tan() * (p[0] + hinge_mm);
            for p in contour.lines.iter().flatten().filter(|p| p[0].abs() < 20.0).filter(gap) {
                seen += 1;
                // A thousandth of the gap is 0.004 mm.
                assert!((p[1] - slope * (p[0] + hinge_mm)).abs() < 0.004, "{v} V: {p:?}");
            }
        }
        assert!(seen > 100, "{seen}");
        // A field line is an arc about the hinge, from one plate to the other.
        let [i, k] = scene.nodes[0];
        let start = [(i[0] + i[1]) as f64 / 2.0 + 0.3, k[1] as f64 + 0.25];
        let line = Tracer::new(&scene).trace(start, -1.0, [[-100.0, 100.0]; 2]);
        assert!(line.hit && line.points.len() > 100 && line.points.len() < 2000);
        let radius = |p: &[f64; 2]| (p[0] + hinge_mm).hypot(p[1]);
        let (first, last) = (line.points[0], line.points[line.points.len() - 1]);
        assert!(line.points.iter().all(|p| (radius(p) - radius(&first)).abs() < 1e-3));
        assert!((last[1] - tilt.tan() * (last[0] + hinge_mm)).abs() < 1e-9, "{last:?}");
        let eps_v = EPS0 * setup.question.relative_permittivity * setup.question.voltage_v;
        let [lower, upper] = profiles(&scene, &level);
        for (profile, side, sign, cosine) in [(lower, 1, -1.0, 1.0), (upper, 0, 1.0, tilt.cos())] {
            let mut seen = 0;
            for (x, density) in
                profile.x_mm.iter().zip(&profile.density[side]).filter(|(x, _)| x.abs() < 20.0)
            {
                seen += 1;
                let arc_m = 1e-3 * tilt * (x + hinge_mm) / cosine;
                assert!((sign * density * arc_m / eps_v - 1.0).abs() < 2e-3, "{x}: {density}");
            }
            assert!(seen > 4);
        }
    }
}

fn draw(arguments: &[&str], folder: &Path) -> Output {
    let mut command = Command::new(env!("CARGO_BIN_EXE_tiltgap"));
    command.arg("draw").args(arguments).current_dir(folder).output().unwrap()
}

fn drawn(arguments: &[&str], folder: &Path) -> Vec<u8> {
    let output = draw(arguments, folder);
    let stderr = String::from_utf8(output.stderr).unwrap();
    assert_eq!((output.status.code(), stderr.as_str()), (Some(0), ""), "{arguments:?}");
    output.stdout
}

/// A folder with a bench in it.
fn folder(bench: &Value) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("bench.json"), bench.to_string()).unwrap();
    folder
}

/// Names of the layers and all texts of an SVG, which has to be harmless XML.
fn layers_and_texts(svg: &[u8]) -> (Vec<String>, Vec<String>) {
    let text = std::str::from_utf8(svg).unwrap();
    let document = Document::parse(text).unwrap();
    for node in document.descendants().filter(|n| n.is_element()) {
        let name = node.tag_name().name();
        let drawing = ["svg", "title", "rect", "g", "text", "polygon", "polyline", "line"];
        assert!(drawing.contains(&name), "{name}");
        assert!(node.attributes().all(|a| !a.name().starts_with("on") && !a.name().contains("href")));
    }
    let of = |name: &'static str| document.descendants().filter(move |n| n.has_tag_name(name));
    let named = |name| of(name).map(|n| n.attribute("id").unwrap().to_string()).collect();
    (named("g"), document_texts(&document))
}

fn document_texts(document: &Document) -> Vec<String> {
    let texts = document.descendants().filter(|n| n.tag_name().name() == "text");
    texts.map(|n| n.text().unwrap().trim().to_string()).collect()
}

#[test]
fn pictures_have_their_layers_and_texts() {
    let bench = json!({
        "title": "a <b> & c",
        "lower_plate": { "length": "100 mm", "width": "80 mm" },
        "upper_plate": { "length": "100 mm", "width": "80 mm" },
        "pose": { "gap": "5 mm", "tilt": "0.5 deg" },
        "drive": { "voltage": "100 V", "connection": "floating" },
    });
    let folder = folder(&bench);
    for (what, layers) in [
        ("potential", &["caption", "potential", "equipotentials", "places", "plates", "axes", "scale"][..]),
        ("field", &["caption", "equipotentials", "field", "places", "plates", "axes"]),
        ("charge", &["caption", "grid", "charge", "ideal", "axes", "legend"]),
    ] {
        let arguments =
            ["bench.json", "--per-metre", "--what", what, "-o", "-", "--format", "svg", "--level", "4"];
        let svg = drawn(&arguments, folder.path());
        let (found, texts) = layers_and_texts(&svg);
        assert_eq!(found, layers, "{what}");
        assert_eq!(texts[0], "a <b> & c");
        assert!(texts.contains(&"gap 5 mm · tilt 0.5° · 100 V · floating".to_string()), "{texts:?}");
        let own: &[&str] = match what {
            "charge" => &["charge density (µC/m²)", "x (mm)", "upper plate, gap side (+)", "ideal, ε V/d"],
            "field" => &["x (mm)", "z (mm)", "a (×3.2)", "b (×2.7)"],
            _ => &["potential (V)", "−40", "0", "40", "x (mm)", "z (mm)", "a (×3.2)", "b (×2.7)"],
        };
        assert!(own.iter().all(|t| texts.iter().any(|found| found == t)), "{what}: {texts:?}");
    }
}

#[test]
fn titles_do_no_harm() {
    let long = "long ".repeat(2000);
    for title in [
        "</text></svg><script>alert(1)</script>\"'&amp;<!-- ]]> --> --",
        "\u{202e}desrever\u{202c} \u{200f}\u{2067}x",
        long.as_str(),
        "\\input{/etc/passwd} \u{fffd} \u{1f600} 標題",
        "",
    ] {
        let folder = folder(&bench(title, "0.4 deg"));
        let common = ["bench.json", "--per-metre", "--level", "2"];
        let with = |more: &[&'static str]| [&common[..], more].concat();
        let svg = drawn(&with(&["--what", "charge", "-o", "-", "--format", "svg"]), folder.path());
        let (_, texts) = layers_and_texts(&svg);
        assert!(texts.iter().all(|t| t.chars().count() < 90), "{texts:?}");
        let text = String::from_utf8(svg).unwrap();
        assert!(!text.contains(['\u{202e}', '\u{202c}', '\u{200f}', '\u{2067}']));
        let vts = drawn(&with(&["--what", "field", "-o", "-", "--format", "vts"]), folder.path());
        Document::parse(std::str::from_utf8(&vts).unwrap()).unwrap();
        drawn(&with(&["--what", "charge", "-o", "a.png"]), folder.path());
    }
}

#[test]
fn a_png_is_a_picture_of_300_pixels_to_the_inch() {
    let folder = folder(&bench("png", "0.4 deg"));
    drawn(
        &["bench.json", "--what", "potential", "--per-metre", "--level", "4", "-o", "a.PNG"],
        folder.path(),
    );
    let file = std::fs::File::open(folder.path().join("a.PNG")).unwrap();
    let mut reader = png::Decoder::new(std::io::BufReader::new(file)).read_info().unwrap();
    let mut pixels = vec![0; reader.output_buffer_size()];
    let info = reader.next_frame(&mut pixels).unwrap();
    // 128 mm are 1511.8 pixels.
    assert_eq!((info.width, reader.info().pixel_dims.unwrap().xppu), (1512, 11811));
    let white = pixels.iter().filter(|p| **p == 255).count();
    assert!(white > pixels.len() / 5 && white < 9 * pixels.len() / 10, "{white} of {}", pixels.len());
    // Nothing else is left in the folder.
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 2);
}

/// The numbers of an array of a field file.
fn array(document: &Document, name: &str) -> Vec<f64> {
    let node = document.descendants().find(|n| n.attribute("Name") == Some(name)).unwrap();
    let text = node.text().unwrap().trim();
    // Four numbers of eight bytes are 44 characters.
    let header = STANDARD.decode(&text[..44]).unwrap();
    let number = |n: usize| u64::from_le_bytes(header[8 * n..8 * n + 8].try_into().unwrap());
    let packed = STANDARD.decode(&text[44..]).unwrap();
    assert_eq!((number(0), number(3)), (1, packed.len() as u64));
    let mut bytes = Vec::new();
    flate2::read::ZlibDecoder::new(&packed[..]).read_to_end(&mut bytes).unwrap();
    assert_eq!(number(1), bytes.len() as u64);
    bytes.chunks_exact(8).map(|b| f64::from_le_bytes(b.try_into().unwrap())).collect()
}

#[test]
fn a_field_file_holds_the_whole_grid_in_si_units() {
    let folder = folder(&bench("field", "0 deg"));
    drawn(&["bench.json", "--what", "field", "--level", "2", "-o", "a.vts"], folder.path());
    let text = std::fs::read_to_string(folder.path().join("a.vts")).unwrap();
    let document = Document::parse(&text).unwrap();
    let piece = document.descendants().find(|n| n.has_tag_name("Piece")).unwrap();
    let extent: Vec<usize> =
        piece.attribute("Extent").unwrap().split(' ').map(|n| n.parse().unwrap()).collect();
    let [nx, ny, nz] = [extent[1] + 1, extent[3] + 1, extent[5] + 1];
    let (points, potential) = (array(&document, "points_m"), array(&document, "potential_V"));
    let field = array(&document, "field_V_per_m");
    assert_eq!((points.len(), potential.len()), (3 * nx * ny * nz, nx * ny * nz));
    assert_eq!(field.len(), 3 * (nx - 1) * (ny - 1) * (nz - 1));
    // x runs fastest and grows, y is mirrored at the middle, z grows; the plates stand at 0 and 400 V.
    let point = |i: usize, j: usize, k: usize| (k * ny + j) * nx + i;
    let mut on_plates = 0;
    for k in 0..nz {
        for j in 0..ny {
            for i in 0..nx {
                let n = point(i, j, k);
                let [x, y, z] = [points[3 * n], points[3 * n + 1], points[3 * n + 2]];
                let mirror = point(i, ny - 1 - j, k);
                assert!((y + points[3 * mirror + 1]).abs() < 1e-15 && potential[n] == potential[mirror]);
                assert!(i == 0 || x > points[3 * (n - 1)]);
                if x.abs() < 0.055 + 1e-9 && y.abs() < 0.045 + 1e-9 && (z == 0.0 || (z - 0.004).abs() < 1e-9)
                {
                    on_plates += 1;
                    assert!((potential[n] - if z == 0.0 { 0.0 } else { 400.0 }).abs() < 1e-9);
                }
            }
        }
    }
    assert_eq!(on_plates, 2 * 17 * 17);
    // In the middle of the gap 100 kV/m, downwards; along y the field is mirrored.
    let middle =
        field
            .chunks_exact(3)
            .map(|e| e[2])
            .fold(0.0f64, |m, e| if (e + 1e5).abs() < 300.0 { m + 1.0 } else { m });
    assert!(middle > 8.0 * 8.0, "{middle}");
    let sum: f64 = field.chunks_exact(3).map(|e| e[1]).sum();
    let most = field.iter().fold(0.0f64, |m, e| m.max(e.abs()));
    assert!(sum.abs() < 1e-9 * most * field.len() as f64);
}

#[test]
fn the_same_bytes_for_any_number_of_threads() {
    let folder = folder(&bench("threads", "0.4 deg"));
    for format in ["svg", "vts"] {
        let run = |threads: &str| {
            let arguments = ["bench.json", "--what", "field", "--level", "2", "-o", "-"];
            drawn(&[&arguments[..], &["--format", format, "--threads", threads]].concat(), folder.path())
        };
        assert!(run("1") == run("2"), "{format}");
    }
}

#[test]
fn what_cannot_be_drawn_is_refused_and_leaves_files_alone() {
    let folder = folder(&bench("refused", "0.4 deg"));
    std::fs::write(folder.path().join("old.svg"), "old").unwrap();
    for (arguments, sentence) in [
        (&["--what", "field", "-o", "picture"][..], "let it end in .svg, .png or .vts, or add --format"),
        (&["--what", "field", "-o", "-"], "does not say which format"),
        (&["--what", "field", "-o", "-", "--format", "png"], "a PNG goes to a file, not to standard output"),
        (&["--what", "charge", "-o", "a.vts"], "holds the potential and the field in space"),
        (&["--what", "field", "-o", "old.svg", "--level", "0"], "--level: \"0\" will not do"),
        (&["--what", "field", "-o", "old.svg", "--level", "x"], "give a whole number from 2 to 32"),
        (&["--what", "field", "-o", "old.svg", "--level", "-4"], "--level: \"-4\" will not do"),
        (&["--what", "field", "-o", "no/such/a.svg"], "there is no folder \"no/such\""),
        (&["--what", "field", "-o", "old.svg", "--tilt", "30deg"], "the plates touch"),
        (&["--what", "field", "-o", "old.svg", "--gap", "4"], "\"4\" has no unit"),
        (
            &["--what", "field", "-o", "old.svg", "--per-metre", "--connection", "grounded"],
            "is not defined per metre",
        ),
        (&["--what", "everything", "-o", "old.svg"], "invalid value"),
        (&["--what", "field"], "--output <FILE>"),
    ] {
        let output = draw(&[&["bench.json"], arguments].concat(), folder.path());
        let stderr = String::from_utf8(output.stderr).unwrap();
        assert_eq!(output.status.code(), Some(2), "{arguments:?}: {stderr}");
        assert!(output.stdout.is_empty() && stderr.contains(sentence), "{arguments:?}: {stderr}");
        assert!(!stderr.contains("panicked"), "{stderr}");
    }
    assert_eq!(std::fs::read_to_string(folder.path().join("old.svg")).unwrap(), "old");
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 2);
}
