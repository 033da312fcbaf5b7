//! The reference cases, which are built in.
//!
//! Families, targets and the choice for a quick run are read here and nowhere else; tests and command share them.

use serde::Deserialize;
use serde_json::Value;

/// The files, by the name of their family.
macro_rules! files {
    ($($name:literal)*) => {
        [$(($name, include_str!(concat!("../../reference-cases/", $name, ".json")))),*]
    };
}

/// Name and text of every file of `reference-cases`.
pub static FILES: [(&str, &str); 22] = files!(
    "strips-parallel" "closed-domains" "wedge-ideal" "guard-gaps" "truncation" "isolated" "strips" "wedge-strips"
    "hinged-strips" "strips-thick" "guarded-strips" "squares" "plates" "wedge-squares" "discs" "discs-tilted" "discs-thick"
    "disc-wedge" "cross-capacitance" "pull-in" "edge-exponents" "levels"
);

/// What a family asks of the program at its default accuracy.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Target {
    /// Largest relative error of charges and capacitances.
    pub charge: f64,
    /// Largest relative error of forces and torques.
    pub force: f64,
    /// Why these.
    pub reason: String,
}

/// One file.
#[derive(Clone, Debug, Deserialize)]
pub struct Family {
    /// Its name.
    #[serde(rename = "family")]
    pub name: String,
    /// Closed form, published and so on.
    pub kind: String,
    /// The kind of single quantities.
    #[serde(default)]
    pub kinds: std::collections::BTreeMap<String, String>,
    /// What it is about.
    pub title: String,
    /// Where it comes from, with keys of the bibliography.
    pub source: String,
    /// What is asked of the program, if it solves any of the cases.
    pub target: Option<Target>,
    /// Names of the cases of a quick run.
    #[serde(default)]
    pub quick: Vec<String>,
    /// Which cases the program does not solve, and why.
    pub waiting: Option<String>,
    /// The cases.
    pub cases: Vec<Case>,
}

/// One case: an object of the file.
#[derive(Clone, Debug, Deserialize)]
#[serde(transparent)]
pub struct Case(pub Value);

impl Family {
    /// Reads the text of a file.
    ///
    /// # Errors
    /// What is wrong with the text.
    pub fn parse(text: &str) -> Result<Family, serde_json::Error> {
        serde_json::from_str(text)
    }

    /// All built-in families, in the order in which they are reported: closed forms first.
    ///
    /// # Panics
    /// If a built-in file cannot be read, which is a mistake in the file; a test reads them all.
    pub fn all() -> Vec<Family> {
        FILES.iter().map(|(name, _)| Family::named(name)).collect()
    }

    /// A built-in family.
    ///
    /// # Panics
    /// If there is none of that name, or its file cannot be read.
    pub fn named(name: &str) -> Family {
        let (_, text) = FILES.iter().find(|(n, _)| *n == name).unwrap_or_else(|| panic!("no family {name}"));
        Family::parse(text).unwrap_or_else(|e| panic!("{name}: {e}"))
    }

    /// What kind of value a quantity of a case is.
    pub fn kind_of<'a>(&'a self, case: &'a Case, quantity: &str) -> &'a str {
        case.0["kind"].as_str().or(self.kinds.get(quantity).map(String::as_str)).unwrap_or(&self.kind)
    }

    /// Where a case comes from.
    pub fn source_of<'a>(&'a self, case: &'a Case) -> &'a str {
        case.0["source"].as_str().unwrap_or(&self.source)
    }
}

/// A number of a case.
///
/// # Panics
/// If it is none: the built-in files are checked against their schema.
pub fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or_else(|| panic!("not a number: {value}"))
}

/// Three numbers of a case.
///
/// # Panics
/// As [`number`].
pub fn triple(value: &Value) -> [f64; 3] {
    [0, 1, 2].map(|k| number(&value[k]))
}

impl Case {
    /// Its name.
    pub fn name(&self) -> &str {
        self.0["name"].as_str().unwrap_or("")
    }

    /// The group it belongs to.
    pub fn group(&self) -> &str {
        self.0["group"].as_str().unwrap_or("")
    }

    /// A number of its geometry.
    ///
    /// # Panics
    /// As [`number`].
    pub fn geometry(&self, key: &str) -> f64 {
        number(&self.0["geometry"][key])
    }

    /// A reference value: a number, vector or matrix.
    pub fn value(&self, quantity: &str) -> &Value {
        &self.0["value"][quantity]
    }

    /// What the reference leaves open, in the shape of the value.
    pub fn open(&self, quantity: &str) -> &Value {
        let bounds = if self.0["uncertainty"].is_null() { &self.0["spread"] } else { &self.0["uncertainty"] };
        &bounds[quantity]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_file_is_built_in_and_says_what_is_asked_or_why_it_waits() {
        let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/reference-cases");
        let mut there: Vec<String> = std::fs::read_dir(folder)
            .unwrap()
            .filter_map(|e| e.unwrap().file_name().to_string_lossy().strip_suffix(".json").map(String::from))
            .filter(|name| name != "schema")
            .collect();
        let mut here: Vec<String> = FILES.iter().map(|(name, _)| (*name).into()).collect();
        there.sort();
        here.sort();
        assert_eq!(there, here);
        for family in Family::all() {
            assert!(family.target.is_some() || family.waiting.is_some(), "{}", family.name);
            assert_eq!(family.target.is_some(), !family.quick.is_empty(), "{}", family.name);
        }
    }
}
