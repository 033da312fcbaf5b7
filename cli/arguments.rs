//! The command line as it is typed. Texts stay texts here; [`Job`](crate::assess::Job) checks them.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

const EXIT_CODES: &str = "\
Exit codes:
  0  good
  1  the accuracy asked for was not reached, the calculation did not converge, readings could
     not be corrected, or a check of the validation failed
  2  bad input: the bench, an option or the arrangement of the plates
  3  internal error
  130  stopped by Ctrl-C; what was done is kept";

const ABOUT_ASSESS: &str = "\
Charge, force and hinge torque of a bench, with wedge (tilt) and fringe, beside the ideal formula.

Results go to standard output, everything else to standard error. Uncertainties are numerical
standard uncertainties; those of the gap, the tilt and the sizes are not in them.";

const EXAMPLES: &str = "\
Examples:
  tiltgap assess                                  the built-in demo bench
  tiltgap demo > bench.json                       a bench file to begin with
  tiltgap assess bench.json --gap 4mm --tilt -2mrad
  tiltgap assess bench.json --accuracy 1e-5 --json > result.json

Directions: x runs along the plate length from the hinge to the free edge, y along the hinge axis,
z up. Positive tilt raises the free (+x) edge, positive roll the +y edge.

Units: lengths m, cm, mm, um, in; angles deg, rad, mrad, arcmin; voltage V, kV.";

const ABOUT_DRAW: &str = "\
A picture of a bench: the potential or the field lines in a cross-section with the plates true to
scale and their edges enlarged, or the charge density along the plates. Or the field itself, for
another viewer.

In space the cross-section is the plane y = constant through the middle of where the plates overlap.";

const DRAW_EXAMPLES: &str = "\
Examples:
  tiltgap draw --what potential -o potential.svg
  tiltgap draw bench.json --what field --tilt 1deg -o field.png
  tiltgap draw bench.json --what charge --per-metre -o charge.svg
  tiltgap draw bench.json --what field -o field.vts      potential and field, for other viewers
  tiltgap draw --what potential -o - --format svg        to standard output";
const ABOUT_TABULATE: &str = "\
Correction factors of a bench as a table: solved at nodes that the program chooses, interpolated in
between, and checked at points that are no nodes until the interpolated factors are within the
accuracy.

Two kinds of table. Free: gap, tilt and roll vary independently; what is given no range keeps the
value of the bench. Along the hinge: the beam turns about its hinge and takes the plate along; the
bench's gap and shift are those of beam angle 0, where the plates are parallel, and its tilt is not
used.

Every solved point is saved at once (in FILE.progress). A run that was ended, however it was ended,
goes on from there with the same command.";

const TABULATE_EXAMPLES: &str = "\
Examples:
  tiltgap tabulate bench.json --gaps 2mm..8mm --tilts 0deg..1deg -o table.json
  tiltgap tabulate bench.json --gaps 2mm..8mm/13 --accuracy 1e-5 -o fine.json
  tiltgap tabulate bench.json --along-hinge --angles -15mrad..10mrad -o beam.json
On three machines, and then together:
  tiltgap tabulate bench.json --gaps 2mm..8mm --part 1/3 -o share1.json     (2/3, 3/3 likewise)
  tiltgap join share1.json share2.json share3.json -o table.json";

const ABOUT_APPLY: &str = "\
The ideal formula for readings, and the same corrected with a table, with standard uncertainties
(first order, JCGM 100): from the readings' own, and from the numerical and the interpolation part
of the table.

Readings are CSV (comma, semicolon or tab). Columns are found by their names, which end in a unit:
gap_mm, tilt_deg, roll_deg, angle_mrad (in a table along the hinge), voltage_V, load_mg; with u_
before it the standard uncertainty, u_gap_mm. The values that have a range in the table are needed,
and the voltage. Other columns are passed through. A reading outside of the table is not corrected;
the column \"problem\" says why, and the exit code is 1.

load_mg: a mass at the centre of the upper plate. Its weight (standard gravity) times the arm over
the corrected torque is load_ratio; without a hinge, its weight over the corrected force.";

const APPLY_EXAMPLES: &str = "\
Examples:
  tiltgap apply table.json readings.csv -o corrected.csv
  tiltgap apply table.json - < readings.csv
  tiltgap apply table.json --at gap=3.2mm,tilt=0.4deg,voltage=250V
  tiltgap apply table.json --at gap=3.2mm,u_gap=5um,tilt=0.4deg,voltage=250V --json";

const ABOUT_VALIDATE: &str = "\
Can the numbers be trusted, how well, and where does the trust end? Four parts: the ideal limit
(insulating walls, a guarded plate, an open pair with a shrinking gap), reference cases (closed
forms, published values, independent computations), convergence and the error bars, and self checks
on a bench: yours, or the demo bench.

The last sentence is the verdict; the exit code is 1 if anything fails.";

const VALIDATE_EXAMPLES: &str = "\
Examples:
  tiltgap validate                                the quick choice, on the demo bench
  tiltgap validate --full bench.json --report validation.html
  tiltgap validate --only strips-parallel --full --sources
  tiltgap validate --only self-checks bench.json --tilt -2mrad";

/// The whole command line.
#[derive(Debug, Parser)]
#[command(
    name = "tiltgap",
    version,
    about = "For a hinged-plate electrostatic balance: charge, force and torque of a tilted gap with fringing,\n\
             and how wrong the ideal capacitor formula is.",
    after_help = EXIT_CODES
)]
pub struct Arguments {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// What to do.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Charge, force and hinge torque of a bench, beside the ideal formula.
    #[command(long_about = ABOUT_ASSESS, after_help = EXIT_CODES, after_long_help = format!("{EXAMPLES}\n\n{EXIT_CODES}"))]
    Assess(AssessArguments),
    /// A picture of a bench: potential, field lines or charge density.
    #[command(long_about = ABOUT_DRAW, after_help = EXIT_CODES, after_long_help = format!("{DRAW_EXAMPLES}\n\n{EXIT_CODES}"))]
    Draw(DrawArguments),
    /// Make a table of correction factors over gap and tilt, or along the beam's way.
    #[command(long_about = ABOUT_TABULATE, after_help = EXIT_CODES, after_long_help = format!("{TABULATE_EXAMPLES}\n\n{EXIT_CODES}"))]
    Tabulate(TabulateArguments),
    /// Put the shares of a table together.
    #[command(after_help = EXIT_CODES)]
    Join(JoinArguments),
    /// Correct readings: the ideal formula times the factors of a table.
    #[command(long_about = ABOUT_APPLY, after_help = EXIT_CODES, after_long_help = format!("{APPLY_EXAMPLES}\n\n{EXIT_CODES}"))]
    Apply(ApplyArguments),
    /// Show a table of correction factors.
    #[command(after_help = EXIT_CODES)]
    Table(TableArguments),
    /// Hold the program against exact limits, reference cases and itself.
    #[command(long_about = ABOUT_VALIDATE, after_help = EXIT_CODES, after_long_help = format!("{VALIDATE_EXAMPLES}\n\n{EXIT_CODES}"))]
    Validate(ValidateArguments),
    /// Print the JSON Schema of the bench file, for editors.
    Schema,
    /// Print the demo bench file, to begin with.
    Demo,
}

/// A bench, and the options that replace values of it: what `assess` and `draw` have in common.
#[derive(Clone, Debug, Default, Args)]
pub struct BenchArguments {
    /// Bench file (JSON); `-` reads standard input. Without it: the built-in demo bench.
    #[arg(value_name = "BENCH")]
    pub bench: Option<PathBuf>,

    /// Gap at the centre of the upper plate, for example 4mm.
    ///
    /// Replaces pose.gap of the bench.
    #[arg(long, value_name = "LENGTH", allow_hyphen_values = true)]
    pub gap: Option<String>,

    /// Tilt, for example -2mrad; positive raises the free (+x) edge.
    ///
    /// Replaces pose.tilt of the bench.
    #[arg(long, value_name = "ANGLE", allow_hyphen_values = true)]
    pub tilt: Option<String>,

    /// Roll, for example 0.1deg; positive raises the +y edge.
    ///
    /// Replaces pose.roll of the bench.
    #[arg(long, value_name = "ANGLE", allow_hyphen_values = true)]
    pub roll: Option<String>,

    /// Voltage of the upper plate against the lower one, for example 400V.
    ///
    /// Replaces drive.voltage of the bench.
    #[arg(long, value_name = "VOLTAGE", allow_hyphen_values = true)]
    pub voltage: Option<String>,

    /// Wiring, grounded or floating [default: grounded].
    ///
    /// grounded: lower plate and surroundings at 0 V, upper plate at the voltage.
    /// floating: the voltage between the plates, which carry no net charge.
    /// Replaces drive.connection of the bench.
    #[arg(long, value_name = "WIRING", allow_hyphen_values = true, verbatim_doc_comment)]
    pub connection: Option<String>,

    /// Cross-section of very wide plates (2-D): results per metre of width.
    ///
    /// In open surroundings it needs the floating connection.
    #[arg(long)]
    pub per_metre: bool,

    /// Threads to compute with, 1 to 64 [default: all cores].
    ///
    /// The result does not depend on it, to the last bit.
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    pub threads: Option<String>,
}

/// Arguments of `assess`.
#[derive(Clone, Debug, Default, Args)]
pub struct AssessArguments {
    /// The bench.
    #[command(flatten)]
    pub bench: BenchArguments,

    /// Relative standard uncertainty accepted [default: 1e-4].
    ///
    /// The largest one of force and torque, numerical part; above 0 and at most 0.1.
    #[arg(long, value_name = "NUMBER", allow_hyphen_values = true)]
    pub accuracy: Option<String>,

    /// Write JSON in SI units instead of tables.
    #[arg(long)]
    pub json: bool,
}

/// Arguments of `validate`.
#[derive(Clone, Debug, Default, Args)]
pub struct ValidateArguments {
    /// The bench.
    #[command(flatten)]
    pub bench: BenchArguments,

    /// A choice of the cases, in seconds [the default].
    #[arg(long, conflicts_with = "full")]
    pub quick: bool,

    /// All cases that the program solves, in minutes.
    #[arg(long)]
    pub full: bool,

    /// One part (ideal-limit, references, convergence, self-checks) or one family of cases.
    #[arg(long, value_name = "NAME")]
    pub only: Option<String>,

    /// Name the sources of the reference values.
    #[arg(long)]
    pub sources: bool,

    /// Write JSON instead of tables.
    #[arg(long)]
    pub json: bool,

    /// Write the whole report to a file, .html or .md; it appears whole or not at all.
    #[arg(long, value_name = "FILE")]
    pub report: Option<PathBuf>,
}

/// Arguments of `tabulate`.
#[derive(Clone, Debug, Default, Args)]
pub struct TabulateArguments {
    /// Bench file (JSON); `-` reads standard input. Without it: the built-in demo bench.
    #[arg(value_name = "BENCH")]
    pub bench: Option<PathBuf>,

    /// Range of the gap, for example 2mm..8mm.
    ///
    /// With /7 behind it the table is printed for 7 gaps, evenly spaced, ends included. The nodes are
    /// the program's business.
    #[arg(long, value_name = "FROM..TO", allow_hyphen_values = true)]
    pub gaps: Option<String>,

    /// Range of the tilt, for example 0deg..1deg.
    #[arg(long, value_name = "FROM..TO", allow_hyphen_values = true)]
    pub tilts: Option<String>,

    /// Range of the roll, for example -0.2deg..0.2deg.
    #[arg(long, value_name = "FROM..TO", allow_hyphen_values = true)]
    pub rolls: Option<String>,

    /// A table along the way of the beam about its hinge; give --angles.
    #[arg(long)]
    pub along_hinge: bool,

    /// Range of the beam angle, for example -15mrad..10mrad; positive raises the free edge.
    #[arg(long, value_name = "FROM..TO", allow_hyphen_values = true)]
    pub angles: Option<String>,

    /// Wiring, grounded or floating [default: that of the bench].
    #[arg(long, value_name = "WIRING", allow_hyphen_values = true)]
    pub connection: Option<String>,

    /// Accuracy of the factors [default: 1e-4].
    ///
    /// The largest relative standard uncertainty at a node, and the largest error of the interpolation
    /// at a check point.
    #[arg(long, value_name = "NUMBER", allow_hyphen_values = true)]
    pub accuracy: Option<String>,

    /// Cross-section of very wide plates (2-D): everything per metre of width.
    #[arg(long)]
    pub per_metre: bool,

    /// Where the table goes [default: table.json]; `-` is standard output, where nothing is resumed.
    #[arg(short, long, value_name = "FILE")]
    pub output: Option<PathBuf>,

    /// Compute share I of N, to be put together with `join`.
    #[arg(long, value_name = "I/N", allow_hyphen_values = true)]
    pub part: Option<String>,

    /// Begin anew, over a table or a progress made with other settings.
    #[arg(long)]
    pub restart: bool,

    /// Threads to compute with, 1 to 64 [default: all cores].
    ///
    /// The table does not depend on it, to the last byte.
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    pub threads: Option<String>,
}

/// Arguments of `join`.
#[derive(Clone, Debug, Default, Args)]
pub struct JoinArguments {
    /// All shares of one table, in any order.
    #[arg(value_name = "SHARE", required = true)]
    pub shares: Vec<PathBuf>,

    /// Where the table goes [default: table.json]; `-` is standard output.
    #[arg(short, long, value_name = "FILE")]
    pub output: Option<PathBuf>,

    /// Begin anew, over a table made with other settings.
    #[arg(long)]
    pub restart: bool,

    /// Threads for what the checks may ask for beyond the shares, 1 to 64 [default: all cores].
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    pub threads: Option<String>,
}

/// Arguments of `apply`.
#[derive(Clone, Debug, Default, Args)]
pub struct ApplyArguments {
    /// The table, from `tabulate` or `join`; `-` reads standard input.
    #[arg(value_name = "TABLE")]
    pub table: PathBuf,

    /// Readings (CSV); `-` reads standard input.
    #[arg(value_name = "READINGS", conflicts_with = "at")]
    pub readings: Option<PathBuf>,

    /// Where the corrected readings go [default: standard output].
    #[arg(short, long, value_name = "FILE")]
    pub output: Option<PathBuf>,

    /// One reading, for example gap=3.2mm,tilt=0.4deg,voltage=250V.
    #[arg(long, value_name = "READING", allow_hyphen_values = true)]
    pub at: Option<String>,

    /// With --at: write JSON in SI units.
    #[arg(long)]
    pub json: bool,

    /// The voltage of all readings, where they have no column for it.
    #[arg(long, value_name = "VOLTAGE", allow_hyphen_values = true)]
    pub voltage: Option<String>,

    /// Threads to compute with, 1 to 64 [default: all cores].
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    pub threads: Option<String>,
}

/// Which factors are shown.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub enum Which {
    /// Of charge and capacitance, k_C.
    Capacitance,
    /// Of the force, k_F.
    Force,
    /// Of the torque about the hinge, k_T.
    Torque,
    /// All of them.
    #[default]
    All,
}

/// Arguments of `table`.
#[derive(Clone, Debug, Default, Args)]
pub struct TableArguments {
    /// The table, from `tabulate` or `join`; `-` reads standard input.
    #[arg(value_name = "TABLE")]
    pub table: PathBuf,

    /// Which factors.
    #[arg(long, value_name = "QUANTITY", value_enum, default_value = "all")]
    pub quantity: Which,

    /// Show 100 (k - 1), what has to be added to the ideal value in per cent.
    #[arg(long, conflicts_with_all = ["csv", "json"])]
    pub percent: bool,

    /// Write CSV.
    #[arg(long, conflicts_with = "json")]
    pub csv: bool,

    /// Write JSON in SI units.
    #[arg(long)]
    pub json: bool,
}

/// What a picture shows.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum What {
    /// Cross-section with filled equipotentials.
    Potential,
    /// Cross-section with field lines.
    Field,
    /// Charge density along both faces of both plates.
    Charge,
}

/// Form of the output of `draw`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Format {
    /// Vector picture, text as text.
    Svg,
    /// Raster picture, 300 pixels to the inch.
    Png,
    /// Potential and field on the grid: VTK XML structured grid, in SI units.
    Vts,
}

/// Arguments of `draw`.
#[derive(Clone, Debug, Args)]
pub struct DrawArguments {
    /// The bench.
    #[command(flatten)]
    pub bench: BenchArguments,

    /// What to show.
    #[arg(long, value_name = "WHAT", value_enum)]
    pub what: What,

    /// File to write, .svg, .png or .vts; `-` is standard output.
    ///
    /// It appears whole or not at all; a file of that name is replaced.
    #[arg(long, short, value_name = "FILE", allow_hyphen_values = true)]
    pub output: PathBuf,

    /// Format [default: by the file name].
    #[arg(long, value_name = "FORMAT", value_enum)]
    pub format: Option<Format>,

    /// Level of the grid [default: 12 with --per-metre, else 6; 4 for a .vts].
    ///
    /// A finer grid takes more time and memory; the picture hardly changes.
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    pub level: Option<String>,
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    fn assess(args: &[&str]) -> Result<AssessArguments, clap::Error> {
        let all = ["tiltgap", "assess"].iter().chain(args);
        Arguments::try_parse_from(all).map(|a| match a.command {
            Command::Assess(a) => a,
            other => panic!("{other:?}"),
        })
    }

    #[test]
    fn clap_finds_the_definition_sound() {
        Arguments::command().debug_assert();
    }

    #[test]
    fn negative_quantities_are_values() {
        let a = assess(&["--tilt", "-2mrad", "-", "--gap=4mm", "--voltage", "-1e2 V"]).unwrap();
        assert_eq!(a.bench.tilt.as_deref(), Some("-2mrad"));
        assert_eq!(a.bench.voltage.as_deref(), Some("-1e2 V"));
        assert_eq!(a.bench.bench, Some("-".into()));
        assert!(!a.json && !a.bench.per_metre && a.accuracy.is_none());
    }

    #[test]
    fn what_is_not_an_option_is_refused() {
        for args in [&["--tlit", "1deg"][..], &["a", "b"], &["--gap"], &["--gap", "1mm", "--gap", "2mm"]] {
            assert!(assess(args).is_err(), "{args:?}");
        }
    }

    #[test]
    fn help_fits_the_terminal() {
        let mut command = Arguments::command();
        for name in ["assess", "draw"] {
            let command = command.find_subcommand_mut(name).unwrap();
            for help in [command.render_help(), command.render_long_help()].map(|h| h.to_string()) {
                assert!(help.contains("Exit codes:") && help.contains("-2mrad"));
                assert!(help.lines().all(|l| l.chars().count() <= 100), "{help}");
            }
        }
    }
}
