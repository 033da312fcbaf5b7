//! What stands in a handout: a table of factors becomes sections of words, numbers and tables.

use tiltgap_meshes::{Dimensions, Surroundings, Which};
use tiltgap_solver::{Connection, EPS0};

use super::document::{Block, Calculator, Cell, Document, FactorCell, Field, Grid, Section};
use super::embedded::embedded;
use super::survey::{self, Survey};
use crate::caution::signed;
use crate::concise::{concise, concise_si, fixed, NotANumber};
use crate::draw::bench_view::bench_view;
use crate::draw::caption::plain;
use crate::error::Error;
use crate::ranges::Range;
use crate::show::{label, places, FACTORS};
use crate::store::Stored;
use crate::tables::axis::{Variable, ROUNDING};
use crate::tables::space::Kind;
use crate::tables::table::{Reading, Table, TableFactor};

/// Most values that a direction is printed at; a table that asks for more is printed at round ones.
const MOST_PRINTED: usize = 40;
/// Most columns of one printed table: what fits a page.
const MOST_COLUMNS: usize = 7;
/// Characters of a checksum that are printed: enough to tell the tables of a laboratory apart.
const CHECKSUM: usize = 12;
/// A title that is longer ends with an ellipsis.
const LONGEST_TITLE: usize = 160;
/// Significant digits of lengths, angles and the like.
const DIGITS: usize = 6;

/// Of which the handout speaks, in its order: force, torque, capacitance.
pub const ORDER: [usize; 3] = [1, 2, 0];

/// A handout in the making.
struct Maker<'a> {
    stored: &'a Stored,
    table: &'a Table,
    which: &'a [usize],
    ranges: Vec<Range>,
    survey: Survey,
}

/// The handout of a table with these factors.
///
/// # Errors
/// A number that cannot be shown, which is a mistake in the program.
pub fn document(stored: &Stored, table: &Table, which: &[usize]) -> Result<Document, Error> {
    let ranges: Vec<Range> = stored
        .job
        .ranges
        .iter()
        .map(|r| Range { printed: r.printed.filter(|n| *n <= MOST_PRINTED), ..r.clone() })
        .collect();
    let survey = Survey::new(table, &ranges);
    let maker = Maker { stored, table, which, ranges, survey };
    let mut title: String = plain(&stored.job.bench.title);
    if title.chars().count() > LONGEST_TITLE {
        title = title.chars().take(LONGEST_TITLE).collect::<String>().trim_end().to_string() + "…";
    }
    let mut sections = vec![maker.bench()?, maker.use_of_it()?, maker.calculator()?];
    sections.extend(maker.tables()?);
    sections.extend([maker.errors()?, maker.wedge()?, maker.accuracy()?, maker.cautions()?, maker.trace()?]);
    Ok(Document {
        title,
        subtitle: "Correction factors for the ideal capacitor formulas of a hinged-plate balance".into(),
        sections,
    })
}

fn mm(m: f64) -> Result<String, NotANumber> {
    Ok(format!("{} mm", concise(significant(1e3 * m), 0.0)?))
}

fn degrees(rad: f64) -> Result<String, NotANumber> {
    Ok(format!("{}°", concise(significant(rad.to_degrees()), 0.0)?))
}

/// To six digits.
fn significant(v: f64) -> f64 {
    format!("{v:.*e}", DIGITS - 1).parse().unwrap_or(v)
}

/// "8.3e-5" with at most two digits, "0" for nothing.
fn small(v: f64) -> String {
    if v == 0.0 {
        "0".into()
    } else {
        format!("{v:.1e}")
    }
}

fn fact(name: &str, value: String) -> (String, String) {
    (name.into(), value)
}

/// The name of a variable at the beginning of a cell or a caption.
fn capital(name: &str) -> String {
    let mut letters = name.chars();
    letters.next().map_or(String::new(), |first| first.to_uppercase().chain(letters).collect())
}

fn factor_cell(f: &TableFactor) -> Result<Cell, NotANumber> {
    let (value, u) = (f.factor.value, f.factor.uncertainty());
    let percent = concise(100.0 * (value - 1.0), 100.0 * u)?;
    let sign = if value > 1.0 { "+" } else { "" };
    Ok(Cell::Factor(FactorCell {
        shown: concise(value, u)?,
        percent: format!("{sign}{percent} %"),
        numbers: [value, u],
    }))
}

impl Maker<'_> {
    fn title(range: &Range) -> String {
        format!("{}, {}", range.span.variable.name(), range.unit)
    }

    /// A place in words: "gap 2 mm, tilt 1.0 deg".
    fn place(&self, at: &[f64]) -> String {
        let parts: Vec<String> = self
            .ranges
            .iter()
            .zip(at)
            .map(|(r, v)| {
                // What is nothing but rounding beside the range is zero.
                let small = *v / (r.span.to - r.span.from);
                let v = if small.abs() < ROUNDING { 0.0 } else { *v };
                let shown = concise(significant(r.shown(v)), 0.0).unwrap_or_else(|_| label(r, v));
                format!("{} {shown} {}", r.span.variable.name(), r.unit)
            })
            .collect();
        parts.join(", ")
    }

    fn has_torque(&self) -> bool {
        self.which.contains(&2)
    }

    fn bench(&self) -> Result<Section, Error> {
        let job = &self.stored.job;
        let (bench, arrangement) = (&job.bench, &job.question.arrangement);
        let two = arrangement.dimensions == Dimensions::Two;
        let plate = |p: &tiltgap_meshes::Plate| -> Result<String, NotANumber> {
            let size = if two {
                format!("{} long, very wide", mm(p.length_m)?)
            } else {
                format!("{} × {} (length × width)", mm(p.length_m)?, mm(p.width_m)?)
            };
            Ok(if p.thickness_m > 0.0 {
                format!("{size}, {} thick", mm(p.thickness_m)?)
            } else {
                format!("{size}, thin")
            })
        };
        let mut facts = vec![
            fact("Lower plate, fixed", plate(&bench.lower)?),
            fact("Upper plate, on the beam", plate(&bench.upper)?),
        ];
        if let Some(hinge) = &bench.hinge {
            let height =
                if hinge.height_m == 0.0 { "".into() } else { format!(", height {}", mm(hinge.height_m)?) };
            facts.push(fact("Hinge", format!("arm {}{height}", mm(hinge.arm_m)?)));
        }
        if let Some(guard) = &bench.guard {
            let around = if guard.around == Which::Upper { "upper" } else { "lower" };
            let text = format!(
                "around the {around} plate, {} wide after a slot of {}",
                mm(guard.rim_m)?,
                mm(guard.slot_m)?
            );
            facts.push(fact("Guard ring", text));
        }
        if let Some(film) = &bench.film {
            let permittivity =
                concise(significant(film.permittivity_ratio * bench.relative_permittivity), 0.0)?;
            facts.push(fact(
                "Film",
                format!("{}, relative permittivity {permittivity}", mm(film.thickness_m)?),
            ));
        }
        let wiring = match job.question.connection {
            Connection::Grounded => "lower plate and surroundings at 0 V",
            Connection::Floating => "floating pair without net charge",
        };
        facts.push(fact("Wiring", wiring.into()));
        let around = match bench.surroundings {
            Surroundings::Open => "open".to_string(),
            Surroundings::GroundedFloor { below_m } => format!("grounded floor {} below", mm(below_m)?),
            Surroundings::GroundedBox(_) => "grounded box".into(),
            Surroundings::InsulatedWalls => "insulating walls".into(),
        };
        let permittivity = concise(bench.relative_permittivity, 0.0)?;
        facts
            .push(fact("Surroundings", format!("{around}; relative permittivity of the gap {permittivity}")));
        for range in &self.ranges {
            let [from, to] =
                [range.span.from, range.span.to].map(|v| concise(significant(range.shown(v)), 0.0));
            let text = format!("{} to {} {}", from?, to?, range.unit);
            facts.push(fact(&format!("Range of the {}", range.span.variable.name()), text));
        }
        let pose = &arrangement.pose;
        let mut fixed_at = Vec::new();
        for (variable, text) in [
            (Variable::Gap, format!("gap {}", mm(pose.gap_m)?)),
            (Variable::Tilt, format!("tilt {}", degrees(pose.tilt_rad)?)),
            (Variable::Roll, format!("roll {}", degrees(pose.roll_rad)?)),
        ] {
            let along = job.kind == Kind::AlongHinge;
            let varies = self.ranges.iter().any(|r| r.span.variable == variable);
            let unused = along && variable == Variable::Tilt;
            if !(varies || unused) {
                fixed_at.push(text);
            }
        }
        if pose.shift_m != [0.0; 2] {
            fixed_at.push(format!("shift {}, {}", mm(pose.shift_m[0])?, mm(pose.shift_m[1])?));
        }
        if !fixed_at.is_empty() {
            let name = if job.kind == Kind::AlongHinge { "At beam angle 0" } else { "Fixed" };
            facts.push(fact(name, fixed_at.join(", ")));
        }
        let mut drawn = *arrangement;
        if job.kind == Kind::AlongHinge {
            drawn.pose.tilt_rad = 0.0;
        }
        let description = format!(
            "The bench in cross-section, drawn to scale at gap {} and tilt {}: the upper plate {} long over the lower \
             plate {} long.",
            mm(drawn.pose.gap_m)?,
            degrees(drawn.pose.tilt_rad)?,
            mm(bench.upper.length_m)?,
            mm(bench.lower.length_m)?
        );
        let sheet = bench_view(&drawn, job.question.hinge.as_ref());
        let directions = "Positive tilt raises the free edge, the one away from the hinge; positive roll raises the edge on \
                          the left of someone who looks from the hinge. The gap is that at the centre of the upper plate.";
        let blocks =
            vec![Block::Drawing { sheet, description }, Block::Facts(facts), Block::Text(directions.into())];
        Ok(Section { id: "bench", heading: "The bench".into(), blocks })
    }

    fn use_of_it(&self) -> Result<Section, Error> {
        let question = &self.table.space.question;
        let film = question.arrangement.film.is_some();
        let metre = if self.stored.job.per_metre() { " per metre of width" } else { "" };
        let mut formulas = vec!["C = k_C × ε A/d".to_string(), "F = k_F × ε A V²/(2 d²)".into()];
        if self.table.has_torque() {
            formulas.push("T = k_T × arm × ε A V²/(2 d²)".into());
        }
        let area = question.arrangement.overlap().area_m2();
        let quantities = format!(
            "A = {} mm²{metre} is the overlap of the plates without tilt, ε = {} F/m, V the voltage, d the {}.",
            concise(significant(1e6 * area), 0.0)?,
            format_args!("{:.5e}", EPS0 * question.relative_permittivity),
            if film {
                "gap at the centre less the thickness of the film, plus that thickness over its permittivity \
                 relative to the medium"
            } else {
                "gap at the centre"
            }
        );
        let mut list = vec![
            quantities,
            "A factor k is the full value over the ideal one: wedge (the tilt) and fringe (the field outside of the gap) \
             together. Use each for its own quantity: k_C for charge and capacitance, k_F for force, k_T for torque. They \
             differ; a force corrected with k_C is wrong."
                .into(),
            "1.0290(5) means 1.0290 with a standard uncertainty of 0.0005, that of the table alone. Per cent, 100 (k - 1), are \
             what has to be added to the ideal value."
                .into(),
        ];
        let missed: Vec<String> = self
            .which
            .iter()
            .map(|n| format!("{} of {}", small(self.survey.linear[*n]), FACTORS[*n].0))
            .collect();
        list.push(format!(
            "Straight lines between printed values miss by up to {} (in the middle of the cells). Where that is too \
             much use `tiltgap apply` or the calculator of the HTML page, which interpolate as the table does.",
            missed.join(", ")
        ));
        let mut blocks = vec![Block::Formulas(formulas), Block::List(list)];
        blocks.push(Block::Text(self.example()?));
        Ok(Section { id: "use", heading: "How to use the factors".into(), blocks })
    }

    /// The middle of the table worked out.
    fn example(&self) -> Result<String, Error> {
        let at: Vec<f64> = self
            .ranges
            .iter()
            .map(|r| {
                let values = r.printed_values();
                values[values.len() / 2]
            })
            .collect();
        let voltage_v = self.table.space.question.voltage_v;
        let reading =
            Reading { at_uncertainty: vec![0.0; at.len()], at, voltage_v, voltage_uncertainty_v: 0.0 };
        let force = &self.table.correct(&reading)[1];
        let unit = crate::apply::units(self.stored.job.per_metre())[1];
        Ok(format!(
            "Example: {}, {}. The ideal formula gives {}; k_F = {}; the force is {}.",
            self.place(&reading.at),
            concise_si(voltage_v, 0.0, "V")?,
            concise_si(significant(force.ideal), 0.0, unit)?,
            concise(force.factor.value, force.factor.uncertainty())?,
            concise_si(force.corrected.value, force.corrected.uncertainty(), unit)?
        ))
    }

    fn calculator(&self) -> Result<Section, Error> {
        let mut fields = Vec::new();
        for range in &self.ranges {
            let variable = range.span.variable;
            let values = range.printed_values();
            let [from, to] =
                [range.span.from, range.span.to].map(|v| concise(significant(range.shown(v)), 0.0));
            fields.push(Field {
                name: variable.name(),
                label: capital(variable.name()),
                unit: range.unit,
                hint: format!("{} to {}", from?, to?),
                value: label(range, values[values.len() / 2]),
            });
        }
        fields.push(Field {
            name: "voltage",
            label: "Voltage".into(),
            unit: "V",
            hint: "any".into(),
            value: concise(self.table.space.question.voltage_v, 0.0)?,
        });
        let data = embedded(self.stored, self.table)?;
        let blocks = vec![Block::Calculator(Calculator { fields, data })];
        Ok(Section { id: "calculator", heading: "Calculator".into(), blocks })
    }

    fn tables(&self) -> Result<Vec<Section>, Error> {
        let mut sections = Vec::new();
        for n in self.which {
            let (symbol, name) = FACTORS[*n];
            let blocks = if self.ranges.len() == 1 { self.column(*n)? } else { self.grids(*n)? };
            let id = ["table-capacitance", "table-force", "table-torque"][*n];
            let heading = format!("{symbol}: {name}");
            sections.push(Section { id, heading, blocks });
        }
        Ok(sections)
    }

    /// A table over one axis.
    fn column(&self, n: usize) -> Result<Vec<Block>, Error> {
        let range = &self.ranges[0];
        let mut rows = Vec::new();
        for v in range.printed_values() {
            let factor = &self.table.factors(&[v])[n];
            rows.push((label(range, v), vec![factor_cell(factor)?, Cell::Text(fixed(factor.wedge, 5))]));
        }
        let (symbol, _) = FACTORS[n];
        Ok(vec![Block::Grid(Grid {
            caption: format!("Full value over ideal value, {symbol}, and what the tilt alone makes of it"),
            corner: Self::title(range),
            across: String::new(),
            columns: vec![symbol.into(), "wedge alone".into()],
            rows,
        })])
    }

    /// Tables over two axes, one for each value of the third.
    fn grids(&self, n: usize) -> Result<Vec<Block>, Error> {
        let [down, across] = [&self.ranges[0], &self.ranges[1]];
        let (symbol, _) = FACTORS[n];
        let mut blocks = Vec::new();
        for block in places(&self.ranges[2..]) {
            let third: Vec<String> = self.ranges[2..]
                .iter()
                .zip(&block)
                .map(|(r, v)| format!(", {} {} {}", r.span.variable.name(), label(r, *v), r.unit))
                .collect();
            let all = across.printed_values();
            // As many as fit a page, evenly shared among as few tables as will do.
            let share = all.len().div_ceil(all.len().div_ceil(MOST_COLUMNS));
            for part in all.chunks(share) {
                let mut rows = Vec::new();
                for v in down.printed_values() {
                    let cells: Result<Vec<Cell>, NotANumber> = part
                        .iter()
                        .map(|w| factor_cell(&self.table.factors(&[&[v, *w], &block[..]].concat())[n]))
                        .collect();
                    rows.push((label(down, v), cells?));
                }
                let ends =
                    [part.first(), part.last()].map(|v| v.map_or(String::new(), |v| label(across, *v)));
                let shown = if part.len() == all.len() {
                    String::new()
                } else {
                    format!(", {} {} to {} {}", across.span.variable.name(), ends[0], ends[1], across.unit)
                };
                blocks.push(Block::Grid(Grid {
                    caption: format!("Full value over ideal value, {symbol}{}{shown}", third.concat()),
                    corner: Self::title(down),
                    across: Self::title(across),
                    columns: part.iter().map(|v| label(across, *v)).collect(),
                    rows,
                }));
            }
        }
        Ok(blocks)
    }

    fn errors(&self) -> Result<Section, Error> {
        let mut rows = Vec::new();
        for n in self.which {
            let [low, high] = &self.survey.errors[*n];
            let below = match self.survey.good[*n] {
                0.0 => "nowhere".to_string(),
                1.0 => "everywhere".into(),
                part => format!("{} % of the range", fixed(100.0 * part, 0)),
            };
            let end = |e: &survey::End| format!("{} % ({})", signed(e.percent), self.place(&e.at));
            let cells = [end(low), end(high), below].map(Cell::Text).to_vec();
            rows.push((capital(FACTORS[*n].1), cells));
        }
        let grid = Grid {
            caption: "Error of the ideal formula over the range of the table, in per cent of the full value"
                .into(),
            corner: "Quantity".into(),
            across: String::new(),
            columns: ["from", "to", "less than 1 % off"].map(String::from).to_vec(),
            rows,
        };
        let text = format!(
            "Minus: the ideal formula gives too little. Found at {} places spread evenly over the range.",
            self.survey.places
        );
        let heading = "How far the ideal formula is off".into();
        Ok(Section { id: "errors", heading, blocks: vec![Block::Grid(grid), Block::Text(text)] })
    }

    /// The closed form of the wedge beside the full value, at the ends of the ranges.
    fn wedge(&self) -> Result<Section, Error> {
        let mut rows = Vec::new();
        for at in self.survey.corners.iter() {
            let factors = self.table.factors(at);
            let mut cells = Vec::new();
            for n in self.which {
                let f = &factors[*n];
                cells.push(Cell::Text(fixed(f.wedge, 5)));
                cells.push(Cell::Text(concise(f.factor.value, f.factor.uncertainty())?));
            }
            rows.push((self.place(at), cells));
        }
        let columns = self
            .which
            .iter()
            .flat_map(|n| [format!("{}, wedge alone", FACTORS[*n].0), format!("{}, full", FACTORS[*n].0)])
            .collect();
        let grid = Grid {
            caption: "Wedge alone and full factor at the ends of the ranges".into(),
            corner: "Place".into(),
            across: String::new(),
            columns,
            rows,
        };
        let mut formulas = vec!["k_C = artanh(b)/b".to_string(), "k_F = 1/(1 - b²)".into()];
        if self.has_torque() {
            formulas.push("k_T = k_F - (a/(2 arm)) × (k_F - k_C)/b".into());
        }
        let text = "Wedge alone is the ideal formula integrated over the tilted gap, without fringe. For equal plates without \
                    shift and roll it has closed forms in b = (a/2) tan(tilt)/d, with a the length of the plate and d the \
                    gap:";
        let blocks = vec![Block::Text(text.into()), Block::Formulas(formulas), Block::Grid(grid)];
        Ok(Section { id: "wedge", heading: "Wedge alone, and with the fringe".into(), blocks })
    }

    fn accuracy(&self) -> Result<Section, Error> {
        let campaign = &self.stored.campaign;
        let nodes: Vec<String> = campaign.plan.nodes.iter().map(|n| n.to_string()).collect();
        let mut rows = Vec::new();
        for n in self.which {
            let missed = &self.table.fit.missed[*n];
            let cells = [small(self.survey.uncertainty[*n]), small(missed.uncertainty), small(missed.worst)];
            rows.push((FACTORS[*n].0.to_string(), cells.map(Cell::Text).to_vec()));
        }
        let grid = Grid {
            caption: "Uncertainty of the factors".into(),
            corner: "Factor".into(),
            across: String::new(),
            columns: [
                "largest standard uncertainty in the range",
                "part of the interpolation",
                "most that was missed at a check point",
            ]
            .map(String::from)
            .to_vec(),
            rows,
        };
        let checks = campaign.plan.checks();
        let text = format!(
            "Laplace's equation was solved at {} nodes ({}) to a relative accuracy of {:e} or better, and at {checks} check \
             points that are no nodes; what the interpolation misses there is part of the uncertainty. The uncertainties \
             are those of the table alone: gap, tilt and plate sizes have their own, and 1 % of the gap is about 2 % of \
             force and torque.",
            campaign.plan.nodes.iter().product::<usize>(),
            nodes.join(" × "),
            self.stored.job.accuracy
        );
        let blocks = vec![Block::Text(text), Block::Grid(grid)];
        Ok(Section { id: "accuracy", heading: "How well the factors are known".into(), blocks })
    }

    fn cautions(&self) -> Result<Section, Error> {
        let volts = concise_si(self.table.space.question.voltage_v.abs(), 0.0, "V")?;
        let blocks = vec![
            Block::Caution(format!(
                "High voltage can kill, and a small balance is no exception: the supply is the hazard, not the plates. \
                 This bench is described with {volts}."
            )),
            Block::List(
                [
                    "Put a series resistor next to the supply, to limit the current of a touch or a spark.",
                    "Switch off and discharge the plates before touching anything; check with a meter.",
                    "Work with one hand; keep the other away from the apparatus and from anything grounded.",
                    "Where others have access, use an interlock that takes the voltage away when the cover is opened.",
                    "A light pointer: keep the beam below eye level and inside the set-up, end it on a dull surface, and use \
                     the lowest laser class that does (class 1 or 2; common practice). Never look along the beam.",
                    "Local rules and the advice of licensed practitioners come first.",
                ]
                .map(String::from)
                .to_vec(),
            ),
        ];
        Ok(Section { id: "cautions", heading: "Cautions".into(), blocks })
    }

    fn trace(&self) -> Result<Section, Error> {
        let job = &self.stored.job;
        let settings = &self.stored.job_json["settings"];
        let made = settings["program"]
            .as_str()
            .filter(|v| v.chars().all(|c| c.is_ascii_alphanumeric() || ".-+".contains(c)));
        let poses = match job.kind {
            Kind::Free => "gap, tilt and roll independent",
            Kind::AlongHinge => "along the way of the beam about its hinge",
        };
        let space = if job.per_metre() { "cross-section, per metre of width" } else { "in space" };
        let short: String = self.stored.checksum.chars().take(CHECKSUM).collect();
        let facts = vec![
            fact("Table", format!("checksum {short} (the beginning of \"checksum\" in the file)")),
            fact("Made by", format!("tiltgap {}", made.unwrap_or("of unknown version"))),
            fact("Page by", format!("tiltgap {}", env!("CARGO_PKG_VERSION"))),
            fact("Settings", format!("accuracy {:e}; {poses}; {space}", job.accuracy)),
        ];
        let heading = "Where these numbers come from".into();
        Ok(Section { id: "trace", heading, blocks: vec![Block::Facts(facts)] })
    }
}
