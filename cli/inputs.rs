//! What is read at the bench for one correction: which names there are, and how they become a reading of a table.
//!
//! A column of a file (`gap_mm`, `u_voltage_V`) and an item of `--at` (`gap=3.2mm`) mean the same things, and are checked
//! by the same rules.

use tiltgap_meshes::Dimensions;

use crate::concise::concise;
use crate::quantity::Dimension;
use crate::ranges::Range;
use crate::table_job::TableJob;
use crate::tables::axis::Variable;
use crate::tables::space::Kind;
use crate::tables::table::{Reading, Table};

/// Two ways of writing the one value that a table is for differ by less than this part of it.
const SAME: f64 = 1e-9;

/// Something that can be read.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Item {
    /// Gap, tilt, roll or beam angle.
    Pose(Variable),
    /// The voltage between the plates.
    Voltage,
    /// A mass that the force lifts or holds.
    Load,
}

/// An item, or its standard uncertainty.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Entry {
    /// Which.
    pub item: Item,
    /// Whether it is the uncertainty.
    pub uncertainty: bool,
}

/// Prefix of an uncertainty.
pub const UNCERTAINTY: &str = "u_";

impl Item {
    const ALL: [Item; 6] = [
        Item::Pose(Variable::Gap),
        Item::Pose(Variable::Tilt),
        Item::Pose(Variable::Roll),
        Item::Pose(Variable::Angle),
        Item::Voltage,
        Item::Load,
    ];

    /// Its name.
    pub fn name(self) -> &'static str {
        match self {
            Item::Pose(variable) => variable.name(),
            Item::Voltage => "voltage",
            Item::Load => "load",
        }
    }

    /// What it measures.
    pub fn dimension(self) -> Dimension {
        match self {
            Item::Pose(variable) => variable.dimension(),
            Item::Voltage => Dimension::Voltage,
            Item::Load => Dimension::Mass,
        }
    }

    /// A column that does: `gap_mm`.
    pub fn column(self) -> &'static str {
        match self {
            Item::Pose(Variable::Gap) => "gap_mm",
            Item::Pose(Variable::Tilt) => "tilt_deg",
            Item::Pose(Variable::Roll) => "roll_deg",
            Item::Pose(Variable::Angle) => "angle_mrad",
            Item::Voltage => "voltage_V",
            Item::Load => "load_mg",
        }
    }
}

impl Entry {
    /// The entry of a name without unit, `gap` or `u_gap`.
    pub fn named(name: &str) -> Option<Entry> {
        let (name, uncertainty) = match name.strip_prefix(UNCERTAINTY) {
            Some(rest) => (rest, true),
            None => (name, false),
        };
        let item = Item::ALL.into_iter().find(|i| i.name() == name)?;
        Some(Entry { item, uncertainty })
    }

    /// All names, for a message.
    pub fn names() -> String {
        Item::ALL.map(Item::name).join(", ")
    }
}

/// What a table makes of an entry.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Use {
    /// It is needed, or of use.
    Taken,
    /// It follows from the beam angle and is not used.
    Follows,
}

/// The rules of one table.
pub struct Rules<'a> {
    /// What it was made for.
    pub job: &'a TableJob,
    /// The table.
    pub table: &'a Table,
}

/// The values read for one correction, in SI.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Values {
    entries: Vec<(Entry, f64)>,
}

impl Values {
    /// Adds a value.
    pub fn put(&mut self, entry: Entry, si: f64) {
        self.entries.push((entry, si));
    }

    /// A value, if it was given.
    pub fn get(&self, item: Item, uncertainty: bool) -> Option<f64> {
        self.entries.iter().find(|(e, _)| *e == Entry { item, uncertainty }).map(|e| e.1)
    }
}

impl Rules<'_> {
    fn range(&self, variable: Variable) -> Option<&Range> {
        self.job.ranges.iter().find(|r| r.span.variable == variable)
    }

    /// Whether an entry is of use.
    ///
    /// # Errors
    /// A sentence that continues the name of the entry, if it cannot be taken into account.
    pub fn admits(&self, entry: Entry) -> Result<Use, String> {
        match entry.item {
            Item::Pose(variable) if self.range(variable).is_some() => Ok(Use::Taken),
            Item::Pose(Variable::Angle) => {
                Err("is a beam angle, and this table is not along the hinge; give the tilt".into())
            }
            Item::Pose(_) if self.job.kind == Kind::AlongHinge => Ok(Use::Follows),
            Item::Pose(variable) if entry.uncertainty => Err(format!(
                "cannot be taken into account, since this table holds one {} only; make one with {}, or leave it out",
                variable.name(),
                variable.option().0
            )),
            Item::Load if self.job.question.arrangement.dimensions == Dimensions::Two => {
                Err("cannot be compared with a force per metre of width; leave it out".into())
            }
            _ => Ok(Use::Taken),
        }
    }

    /// The items without which there is no correction.
    pub fn needed(&self) -> Vec<Item> {
        let axes = self.job.ranges.iter().map(|r| Item::Pose(r.span.variable));
        axes.chain([Item::Voltage]).collect()
    }

    /// Checks one value, in SI, given in a unit.
    ///
    /// # Errors
    /// A sentence that continues the value.
    pub fn check(&self, entry: Entry, si: f64, unit: &str) -> Result<(), String> {
        if entry.uncertainty {
            return if si < 0.0 {
                Err("is negative, which no standard uncertainty is".into())
            } else {
                Ok(())
            };
        }
        let shown = |dimension: Dimension, v: f64| {
            let v = dimension.from_si(v, unit).unwrap_or(v);
            concise(v, 0.0).unwrap_or_else(|_| v.to_string())
        };
        let Item::Pose(variable) = entry.item else {
            return if entry.item == Item::Load && si < 0.0 {
                Err("is negative, which no load is".into())
            } else {
                Ok(())
            };
        };
        let dimension = variable.dimension();
        if let Some(n) = self.job.ranges.iter().position(|r| r.span.variable == variable) {
            let axis = &self.table.space.axes[n];
            if !axis.holds(si) {
                let [from, to] = [axis.span.from, axis.span.to].map(|v| shown(dimension, v));
                return Err(format!("is outside the table, {from} to {to} {unit}"));
            }
            return Ok(());
        }
        let pose = &self.job.question.arrangement.pose;
        let own = match variable {
            Variable::Gap => pose.gap_m,
            Variable::Tilt => pose.tilt_rad,
            Variable::Roll => pose.roll_rad,
            Variable::Angle => return Ok(()),
        };
        if (si - own).abs() <= SAME * own.abs() {
            Ok(())
        } else {
            Err(format!(
                "is outside the table, which is for the {} {} {unit} only",
                variable.name(),
                shown(dimension, own)
            ))
        }
    }

    /// The reading of values that were [checked](Rules::check) and are complete.
    ///
    /// # Panics
    /// If a value that is [needed](Rules::needed) is missing.
    pub fn reading(&self, values: &Values) -> Reading {
        let get = |item: Item| {
            values.get(item, false).unwrap_or_else(|| panic!("{} was not asked for", item.name()))
        };
        let uncertainty = |item: Item| values.get(item, true).unwrap_or(0.0);
        let axes: Vec<Item> = self.job.ranges.iter().map(|r| Item::Pose(r.span.variable)).collect();
        Reading {
            at: axes.iter().map(|i| get(*i)).collect(),
            at_uncertainty: axes.iter().map(|i| uncertainty(*i)).collect(),
            voltage_v: get(Item::Voltage),
            voltage_uncertainty_v: uncertainty(Item::Voltage),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::{table, table_job};

    #[test]
    fn names_have_entries() {
        let gap = Item::Pose(Variable::Gap);
        assert_eq!(Entry::named("gap"), Some(Entry { item: gap, uncertainty: false }));
        assert_eq!(Entry::named("u_voltage"), Some(Entry { item: Item::Voltage, uncertainty: true }));
        assert_eq!([Entry::named("u_"), Entry::named("u_u_gap"), Entry::named("Gap")], [None; 3]);
    }

    #[test]
    fn the_rules_of_a_table_over_gap_and_tilt() {
        let (job, table) = (table_job(), table());
        let rules = Rules { job: &job, table: &table };
        let entry = |name: &str| Entry::named(name).unwrap();
        assert_eq!(rules.needed().len(), 3);
        assert_eq!(rules.admits(entry("u_gap")), Ok(Use::Taken));
        assert!(rules.admits(entry("angle")).unwrap_err().contains("not along the hinge"));
        assert!(rules.admits(entry("u_roll")).unwrap_err().contains("make one with --rolls"));
        assert_eq!(rules.check(entry("gap"), 0.008, "mm"), Ok(()));
        assert_eq!(rules.check(entry("gap"), 0.0091, "mm"), Err("is outside the table, 2 to 8 mm".into()));
        assert_eq!(rules.check(entry("tilt"), -0.01, "deg"), Err("is outside the table, 0 to 1 deg".into()));
        assert_eq!(rules.check(entry("roll"), 0.0, "deg"), Ok(()));
        let only = "is outside the table, which is for the roll 0 deg only";
        assert_eq!(rules.check(entry("roll"), 0.01, "deg"), Err(only.into()));
        assert!(rules.check(entry("u_gap"), -1e-6, "mm").is_err());
        assert!(rules.check(entry("load"), -1e-6, "mg").is_err());
    }
}
