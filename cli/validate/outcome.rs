//! What came of a validation, and whether all of it holds.

use time::format_description::well_known::Rfc3339;
use time::OffsetDateTime;

use super::cases::Family;
use super::comparison::{Comparison, Verdict};
use super::convergence::{Coverage, Ladder};
use super::finding::Finding;
use super::ideal::Approach;
use super::reach::Reach;
use super::Job;

/// Program, machine, date and settings.
#[derive(Clone, Debug, PartialEq)]
pub struct Circumstances {
    /// Version of the program.
    pub version: String,
    /// Date and time, UTC, RFC 3339.
    pub date: String,
    /// Processor, where it is known, and system.
    pub machine: String,
    /// Threads.
    pub threads: usize,
    /// "quick" or "full".
    pub choice: &'static str,
    /// What was asked for alone.
    pub only: Option<String>,
    /// Accuracy of the solver.
    pub accuracy: f64,
    /// Title of the bench.
    pub title: String,
    /// The bench as given.
    pub bench: serde_json::Value,
    /// Whether the bench is the built-in demo.
    pub demo: bool,
    /// Wall time, in seconds.
    pub seconds: f64,
}

/// The processor, where the system tells.
fn machine() -> String {
    let name = std::fs::read_to_string("/proc/cpuinfo").ok().and_then(|text| {
        let line = text.lines().find(|l| l.starts_with("model name"))?;
        Some(line.split_once(':')?.1.trim().to_string())
    });
    let system = format!("{} {}", std::env::consts::OS, std::env::consts::ARCH);
    name.map_or(system.clone(), |name| format!("{name}, {system}"))
}

impl Circumstances {
    /// Of a job that begins now.
    pub fn new(job: &Job) -> Circumstances {
        let now = OffsetDateTime::now_utc();
        let now = now.replace_nanosecond(0).unwrap_or(now);
        let bench = &job.setup.bench;
        Circumstances {
            version: env!("CARGO_PKG_VERSION").into(),
            date: now.format(&Rfc3339).unwrap_or_default(),
            machine: machine(),
            threads: job.setup.threads,
            choice: if job.full { "full" } else { "quick" },
            only: job.only.clone(),
            accuracy: job.params.accuracy,
            title: bench.title.clone(),
            bench: bench.as_given.clone().into(),
            demo: bench.demo,
            seconds: 0.0,
        }
    }
}

/// The part about the ideal limit.
#[derive(Clone, Debug, PartialEq)]
pub struct Ideal {
    /// Where the factors are exactly 1.
    pub findings: Vec<Finding>,
    /// The open pair with a shrinking gap.
    pub approach: Vec<Approach>,
    /// What the person's bench needs; empty if there is none.
    pub reach: Vec<Reach>,
}

/// A case that could not be solved.
#[derive(Clone, Debug, PartialEq)]
pub struct Missing {
    /// Its family.
    pub family: String,
    /// Its name.
    pub case: String,
    /// What the solver says.
    pub error: String,
}

/// What came of all parts that were done.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// Program, machine, date, settings.
    pub circumstances: Circumstances,
    /// The ideal limit.
    pub ideal: Option<Ideal>,
    /// Families with comparisons.
    pub families: Vec<Family>,
    /// Numbers and their references.
    pub comparisons: Vec<Comparison>,
    /// Cases that failed.
    pub missing: Vec<Missing>,
    /// Families of which some or all cases are not solved, and why.
    pub waiting: Vec<(String, String)>,
    /// Levels.
    pub ladders: Option<Vec<Ladder>>,
    /// Error bars.
    pub coverage: Option<Coverage>,
    /// Self checks.
    pub own: Option<Vec<Finding>>,
}

/// Kinds of references that count as given from outside.
pub const OUTSIDE: [&str; 2] = ["closed form", "published"];

impl Outcome {
    /// Nothing yet.
    pub fn new(circumstances: Circumstances) -> Outcome {
        Outcome {
            circumstances,
            ideal: None,
            families: Vec::new(),
            comparisons: Vec::new(),
            missing: Vec::new(),
            waiting: Vec::new(),
            ladders: None,
            coverage: None,
            own: None,
        }
    }

    /// How many things were checked, and a sentence about each that does not hold.
    pub fn judged(&self) -> (usize, Vec<String>) {
        let mut checked = 0;
        let mut failed = Vec::new();
        let mut check = |holds: bool, what: &dyn Fn() -> String| {
            checked += 1;
            if !holds {
                failed.push(what());
            }
        };
        let finding = |f: &Finding| format!("{}: {:.1e} off, {:.1e} allowed", f.what, f.off, f.allowed);
        for f in self.ideal.iter().flat_map(|i| &i.findings).chain(self.own.iter().flatten()) {
            check(f.holds(), &|| finding(f));
        }
        for a in self.ideal.iter().flat_map(|i| &i.approach) {
            let [c, f] = a.slope;
            check(a.holds(), &|| {
                format!(
                    "open pair, gap {} of the length, wedge {}: slopes {c:.4} and {f:.4} of the published ones, {:.4} allowed",
                    a.delta, a.beta, a.allowed
                )
            });
        }
        for c in &self.comparisons {
            check(c.verdict() != Verdict::Fails, &|| {
                format!(
                    "{}, {}, {}: off by {:.1e}, {:.1e} allowed; E_n = {:.2}",
                    c.family,
                    c.case,
                    c.quantity,
                    c.relative(),
                    c.target,
                    c.normalised()
                )
            });
        }
        for m in &self.missing {
            check(false, &|| format!("{}, {}: not solved: {}", m.family, m.case, m.error));
        }
        for l in self.ladders.iter().flatten() {
            check(l.holds(), &|| {
                let order = l.order.map_or("none".into(), |p| format!("{p:.2}"));
                format!("convergence of {}: order {order}, or a limit that misses the exact value", l.name)
            });
        }
        if let Some(c) = &self.coverage {
            check(c.holds(), &|| {
                format!(
                    "error bars: two standard uncertainties hold {:.1} % of {} numbers, median caution {:.1}",
                    100.0 * c.within_two,
                    c.count,
                    c.caution.unwrap_or(f64::NAN)
                )
            });
        }
        (checked, failed)
    }

    /// Whether all of it holds.
    pub fn holds(&self) -> bool {
        self.judged().1.is_empty()
    }

    /// The verdict in one plain sentence.
    pub fn sentence(&self) -> String {
        let (checked, failed) = self.judged();
        let doubtful = self.comparisons.iter().filter(|c| c.verdict() == Verdict::Wide).count();
        if !failed.is_empty() {
            return format!(
                "{} of {checked} checks fail: do not rely on numbers of this build before that is understood.",
                failed.len()
            );
        }
        let values = match (self.comparisons.len(), doubtful) {
            (0, _) => String::new(),
            (n, 0) => format!("; all {n} reference values lie within two combined standard uncertainties"),
            (n, d) => format!(
                "; of {n} reference values {} lie within two combined standard uncertainties and {d} between two and three",
                n - d
            ),
        };
        format!("All {checked} checks hold{values}.")
    }
}
