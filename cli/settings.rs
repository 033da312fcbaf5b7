//! The values of a bench, key by key, checked against the table of keys.
//!
//! They come from a file, are overridden by options of the command line and completed with the defaults. Each value
//! remembers where it came from. What the values mean is left to [`Bench`](crate::bench::Bench).

use serde_json::{json, Map, Value};

use crate::document::{quoted, Node};
use crate::key_error::{words, KeyError};
use crate::keys::{defaults, find, join, paths, Key, Kind, Need, BENCH};
use crate::nearest::nearest;
use crate::quantity::Quantity;

/// Where a value came from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Origin {
    /// The bench file.
    File,
    /// An option of the command line.
    Flag,
    /// Neither: the default of the key.
    Default,
}

/// A checked value.
#[derive(Clone, Debug, PartialEq)]
pub enum Setting {
    /// A text, or one of a few words.
    Text(String),
    /// A number and a unit.
    Quantity(Quantity),
    /// Two of them, for x and y.
    Pair([Quantity; 2]),
    /// A plain number.
    Number(f64),
}

/// The nearest known key to a name in a group: one beside it, unless the very same name stands elsewhere.
fn nearest_key(group: &str, name: &str, beside: &[Key]) -> String {
    let elsewhere = paths();
    let same = elsewhere.iter().find(|p| p.rsplit('.').next() == Some(name));
    match same {
        Some(path) => path.clone(),
        None => join(group, nearest(name, beside.iter().map(|k| k.name)).unwrap_or_default()),
    }
}

/// All values of a bench.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Settings {
    values: Vec<(String, Setting, Origin)>,
    /// Groups that are there, even if empty.
    groups: Vec<String>,
}

impl Settings {
    /// Checks a document against the table of keys. Nothing is completed yet.
    ///
    /// # Errors
    /// The first key or value that is wrong.
    pub fn read(document: &Node) -> Result<Settings, KeyError> {
        let Node::Object(entries) = document else {
            return Err(KeyError::NotAnObject { found: document.described() });
        };
        let mut settings = Settings::default();
        settings.read_group("", BENCH, entries, Origin::File)?;
        Ok(settings)
    }

    fn read_group(
        &mut self,
        group: &str,
        keys: &[Key],
        entries: &[(String, Node)],
        origin: Origin,
    ) -> Result<(), KeyError> {
        for (n, (name, node)) in entries.iter().enumerate() {
            let path = join(group, name);
            let Some(key) = keys.iter().find(|k| k.name == name) else {
                let known: Vec<&str> = keys.iter().map(|k| k.name).filter(|k| !k.starts_with('$')).collect();
                let place = if group.is_empty() { "The bench".into() } else { format!("{group:?}") };
                let nearest = nearest_key(group, name, keys);
                return Err(KeyError::Unknown { key: path, nearest, place, known: known.join(", ") });
            };
            if entries[..n].iter().any(|e| e.0 == *name) {
                return Err(KeyError::Twice { key: path });
            }
            if let (Kind::Group(below), Node::Object(entries)) = (key.kind, node) {
                self.groups.push(path.clone());
                self.read_group(&path, below, entries, origin)?;
            } else {
                self.put(&path, check(key, &path, node)?, origin);
            }
        }
        Ok(())
    }

    fn put(&mut self, path: &str, setting: Setting, origin: Origin) {
        self.values.retain(|v| v.0 != path);
        self.values.push((path.into(), setting, origin));
    }

    /// Overrides a value with the text of an option such as `--gap`.
    ///
    /// # Errors
    /// As [`Settings::read`], with the option in place of the key.
    pub fn set(&mut self, path: &str, option: &str, text: &str) -> Result<(), KeyError> {
        let setting = check(find(path), option, &Node::Leaf(text.into()))?;
        self.put(path, setting, Origin::Flag);
        Ok(())
    }

    /// Adds the defaults of what was left out.
    ///
    /// # Errors
    /// [`KeyError::Missing`] for a key that has none.
    pub fn complete(&mut self) -> Result<(), KeyError> {
        self.complete_group("", BENCH)
    }

    fn complete_group(&mut self, group: &str, keys: &[Key]) -> Result<(), KeyError> {
        for key in keys {
            let path = join(group, key.name);
            if let Kind::Group(below) = key.kind {
                if matches!(key.need, Need::Optional) && !self.has(&path) {
                    continue;
                }
                self.complete_group(&path, below)?;
            } else if matches!(key.need, Need::Required) && !self.has(&path) {
                return Err(KeyError::Missing { key: path, name: key.name, example: key.example });
            }
        }
        let missing: Map<String, Value> = defaults(keys)
            .into_iter()
            .filter(|(name, v)| !v.is_object() && !self.has(&join(group, name)))
            .collect();
        if let Node::Object(entries) = Value::from(missing).into() {
            self.read_group(group, keys, &entries, Origin::Default)?;
        }
        Ok(())
    }

    /// Whether a key, or anything in a group, is there.
    pub fn has(&self, path: &str) -> bool {
        let below = format!("{path}.");
        self.groups.iter().any(|g| g == path)
            || self.values.iter().any(|v| v.0 == path || v.0.starts_with(&below))
    }

    fn entry(&self, path: &str) -> &(String, Setting, Origin) {
        self.values
            .iter()
            .find(|v| v.0 == path)
            .unwrap_or_else(|| panic!("{path} was asked for before the bench was complete"))
    }

    /// Where the value of a key came from.
    ///
    /// # Panics
    /// Here and below if there is no value of that kind: ask after [`Settings::complete`].
    pub fn origin(&self, path: &str) -> Origin {
        self.entry(path).2
    }

    /// A quantity in SI.
    pub fn si(&self, path: &str) -> f64 {
        match &self.entry(path).1 {
            Setting::Quantity(q) => q.si,
            other => panic!("{path} is {other:?}, not a quantity"),
        }
    }

    /// A quantity in SI that may be left out.
    pub fn optional_si(&self, path: &str) -> Option<f64> {
        self.has(path).then(|| self.si(path))
    }

    /// Two quantities in SI.
    pub fn si_pair(&self, path: &str) -> [f64; 2] {
        match &self.entry(path).1 {
            Setting::Pair([x, y]) => [x.si, y.si],
            other => panic!("{path} is {other:?}, not a pair"),
        }
    }

    /// A plain number.
    pub fn number(&self, path: &str) -> f64 {
        match &self.entry(path).1 {
            Setting::Number(v) => *v,
            other => panic!("{path} is {other:?}, not a number"),
        }
    }

    /// A text or a word.
    pub fn text(&self, path: &str) -> &str {
        match &self.entry(path).1 {
            Setting::Text(text) => text,
            other => panic!("{path} is {other:?}, not a text"),
        }
    }

    /// All values as they were given, in the order of the keys and the form of the file; what may be left out and was is not
    /// there.
    pub fn as_given(&self) -> Map<String, Value> {
        self.group_as_given("", BENCH)
    }

    fn group_as_given(&self, group: &str, keys: &[Key]) -> Map<String, Value> {
        let mut map = Map::new();
        for key in keys.iter().filter(|k| !k.name.starts_with('$')) {
            let path = join(group, key.name);
            if matches!(key.need, Need::Optional) && !self.has(&path) {
                continue;
            }
            let value = match key.kind {
                Kind::Group(below) => self.group_as_given(&path, below).into(),
                _ => match &self.entry(&path).1 {
                    Setting::Text(text) => json!(text),
                    Setting::Quantity(q) => json!(q.text),
                    Setting::Pair([x, y]) => json!([x.text, y.text]),
                    Setting::Number(v) => json!(v),
                },
            };
            map.insert(key.name.into(), value);
        }
        map
    }
}

/// Checks the value of one key; `name` is what messages call it.
fn check(key: &Key, name: &str, node: &Node) -> Result<Setting, KeyError> {
    let example = key.example;
    let wrong = |wanted: &str| {
        Err(KeyError::Type { key: name.into(), found: node.described(), wanted: wanted.into(), example })
    };
    let quantity = |name: &str, text: &str, dimension| {
        Quantity::parse(text, dimension).map_err(|error| KeyError::Quantity {
            key: name.into(),
            text: text.into(),
            error,
            example,
        })
    };
    match (key.kind, node) {
        (Kind::Text, Node::Leaf(Value::String(text))) => {
            if text.chars().any(char::is_control) {
                return Err(KeyError::Unprintable { key: name.into(), found: text.clone() });
            }
            Ok(Setting::Text(text.clone()))
        }
        (Kind::Text, _) => wrong("a text"),
        (Kind::Quantity(dimension, range), Node::Leaf(Value::String(text))) => {
            let q = quantity(name, text, dimension)?;
            if !range.contains(q.si) {
                let (found, wanted) = (quoted(text), range.wanted());
                return Err(KeyError::Range { key: name.into(), found, wanted, example });
            }
            Ok(Setting::Quantity(q))
        }
        (Kind::Quantity(dimension, _), _) => {
            wrong(&format!("a text with {} and its unit ({})", dimension.noun(), dimension.unit_list()))
        }
        (Kind::Pair(dimension), Node::Array(items)) => match items.as_slice() {
            [Node::Leaf(Value::String(x)), Node::Leaf(Value::String(y))] => {
                let [x, y] = [(x, 0), (y, 1)].map(|(t, n)| quantity(&format!("{name}[{n}]"), t, dimension));
                Ok(Setting::Pair([x?, y?]))
            }
            [x, y] => {
                let (n, odd) = if matches!(x, Node::Leaf(Value::String(_))) { (1, y) } else { (0, x) };
                let wanted = format!("a text with {} and its unit", dimension.noun());
                let key = format!("{name}[{n}]");
                Err(KeyError::Type { key, found: odd.described(), wanted, example })
            }
            _ => wrong("two texts, for x and y"),
        },
        (Kind::Pair(_), _) => wrong("an array of two texts, for x and y"),
        (Kind::Number(range), Node::Leaf(Value::Number(number))) => {
            let v = number.as_f64().unwrap_or(f64::NAN);
            if !range.contains(v) {
                let (found, wanted) = (number.to_string(), range.wanted());
                return Err(KeyError::Range { key: name.into(), found, wanted, example });
            }
            Ok(Setting::Number(v))
        }
        (Kind::Number(_), _) => wrong("a plain number"),
        (Kind::Choice(list), Node::Leaf(Value::String(word))) => match list.iter().find(|w| *w == word) {
            Some(known) => Ok(Setting::Text((*known).into())),
            None => Err(KeyError::Word {
                key: name.into(),
                found: word.clone(),
                words: words(list),
                nearest: nearest(word, list.iter().copied()).unwrap_or_default(),
            }),
        },
        (Kind::Choice(list), _) => wrong(&words(list)),
        (Kind::Group(_), _) => wrong("an object"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn complete(text: &str) -> Result<Settings, KeyError> {
        let mut settings = Settings::read(&Node::parse(text).unwrap())?;
        settings.complete()?;
        Ok(settings)
    }

    /// A bench with one group replaced.
    fn bench(group: &str, text: &str) -> String {
        let mut parts = [
            ("lower_plate", r#"{"length": "110 mm", "width": "90 mm"}"#),
            ("upper_plate", r#"{"length": "110 mm", "width": "90 mm"}"#),
            ("pose", r#"{"gap": "4 mm"}"#),
            ("drive", r#"{"voltage": "400 V"}"#),
        ]
        .to_vec();
        match parts.iter_mut().find(|p| p.0 == group) {
            Some(part) => part.1 = text,
            None => parts.push((group, text)),
        }
        let parts: Vec<String> = parts.iter().map(|(k, v)| format!("{k:?}: {v}")).collect();
        format!("{{{}}}", parts.join(", "))
    }

    #[test]
    fn defaults_are_filled_in_and_known_as_such() {
        let s = complete(&bench("", "\"\"").replace(", \"\": \"\"", "")).unwrap();
        assert_eq!(s.origin("drive.connection"), Origin::Default);
        assert_eq!(s.origin("pose.gap"), Origin::File);
        assert_eq!((s.text("drive.connection"), s.text("surroundings.kind")), ("grounded", "open"));
        assert_eq!(s.number("medium.relative_permittivity"), 1.00054);
        assert_eq!((s.si("upper_plate.thickness"), s.si_pair("pose.shift")), (0.0, [0.0, 0.0]));
        assert!(!s.has("hinge"));
        assert!(!s.as_given().contains_key("hinge"));
    }

    #[test]
    fn what_was_given_can_be_given_again() {
        let text = bench("hinge", r#"{"arm": "6 in"}"#)
            .replace("\"4 mm\"", "\"4mm\", \"shift\": [\"1mm\", \"0 m\"]");
        let first = complete(&text).unwrap();
        let again = complete(&Value::from(first.as_given()).to_string()).unwrap();
        assert_eq!(first.as_given(), again.as_given());
        assert_eq!(again.si("hinge.arm"), 0.1524);
        assert_eq!(first.as_given()["pose"]["shift"], json!(["1mm", "0 m"]));
    }

    #[test]
    fn an_option_replaces_a_value_or_supplies_a_missing_one() {
        let mut s = Settings::read(&Node::parse(&bench("pose", "{\"tilt\": \"1 deg\"}")).unwrap()).unwrap();
        assert!(s.clone().complete().is_err());
        s.set("pose.gap", "--gap", "5mm").unwrap();
        s.set("pose.tilt", "--tilt", "-2mrad").unwrap();
        s.complete().unwrap();
        assert_eq!(
            (s.si("pose.gap"), s.si("pose.tilt"), s.origin("pose.tilt")),
            (0.005, -0.002, Origin::Flag)
        );
        assert_eq!(
            s.set("pose.gap", "--gap", "5").unwrap_err().to_string(),
            "--gap: \"5\" has no unit; give a length with m, cm, mm, um or in, for example \"4 mm\""
        );
    }

    #[test]
    fn every_message_names_key_value_and_example() {
        let length = "a text with a length and its unit (m, cm, mm, um or in)";
        let permittivity = |v: &str| bench("medium", &format!("{{\"relative_permittivity\": {v}}}"));
        for (text, message) in [
            ("[1, 2]".into(), "the bench is an array of 2, not an object; begin with { \"lower_plate\": ... }".into()),
            (
                bench("pose", r#"{"gpa": "4 mm"}"#),
                "there is no key \"pose.gpa\"; did you mean \"pose.gap\"? \"pose\" may hold gap, tilt, roll, shift"
                    .into(),
            ),
            (
                bench("gap", "\"4 mm\""),
                "there is no key \"gap\"; did you mean \"pose.gap\"? The bench may hold title, lower_plate, \
                 upper_plate, pose, hinge, drive, surroundings, medium"
                    .into(),
            ),
            (bench("pose", r#"{"gap": "4 mm", "gap": "4 mm"}"#), "the key \"pose.gap\" occurs twice; keep one of them".into()),
            (bench("pose", "{}"), "\"pose.gap\" is missing; add it, for example \"gap\": \"4 mm\"".into()),
            ("{}".into(), "\"lower_plate.length\" is missing; add it, for example \"length\": \"110 mm\"".into()),
            (
                bench("upper_plate", r#"{"length": "1 m"}"#),
                "\"upper_plate.width\" is missing; add it, for example \"width\": \"90 mm\"".into(),
            ),
            (bench("drive", "{}"), "\"drive.voltage\" is missing; add it, for example \"voltage\": \"400 V\"".into()),
            (bench("hinge", "{}"), "\"hinge.arm\" is missing; add it, for example \"arm\": \"150 mm\"".into()),
            (bench("pose", r#"{"gap": 4}"#), format!("\"pose.gap\" is the number 4; give {length}, for example \"4 mm\"")),
            (bench("pose", r#"{"gap": null}"#), format!("\"pose.gap\" is null; give {length}, for example \"4 mm\"")),
            (bench("pose", "[]"), "\"pose\" is an array of 0; give an object, for example { \"gap\": \"4 mm\" }".into()),
            (
                bench("pose", r#"{"gap": "4 kg"}"#),
                "\"pose.gap\": \"4 kg\" has the unit \"kg\"; give a length with m, cm, mm, um or in, for example \"4 mm\""
                    .into(),
            ),
            (
                bench("pose", r#"{"gap": "-4 mm"}"#),
                "\"pose.gap\" is \"-4 mm\", but must be positive, for example \"4 mm\"".into(),
            ),
            (
                bench("pose", r#"{"gap": "4 mm", "shift": "1 mm"}"#),
                "\"pose.shift\" is the text \"1 mm\"; give an array of two texts, for x and y, for example \
                 [\"1 mm\", \"0 mm\"]"
                    .into(),
            ),
            (
                bench("pose", r#"{"gap": "4 mm", "shift": ["1 mm"]}"#),
                "\"pose.shift\" is an array of 1; give two texts, for x and y, for example [\"1 mm\", \"0 mm\"]".into(),
            ),
            (
                bench("pose", r#"{"gap": "4 mm", "shift": ["1 mm", 2]}"#),
                "\"pose.shift[1]\" is the number 2; give a text with a length and its unit, for example \
                 [\"1 mm\", \"0 mm\"]"
                    .into(),
            ),
            (
                bench("pose", r#"{"gap": "4 mm", "shift": ["1 mm", "2"]}"#),
                "\"pose.shift[1]\": \"2\" has no unit; give a length with m, cm, mm, um or in, for example \
                 [\"1 mm\", \"0 mm\"]"
                    .into(),
            ),
            (
                bench("lower_plate", r#"{"length": "0 mm", "width": "1 mm"}"#),
                "\"lower_plate.length\" is \"0 mm\", but must be positive, for example \"110 mm\"".into(),
            ),
            (
                bench("lower_plate", r#"{"length": "1 m", "width": "1 m", "thickness": "-1 mm"}"#),
                "\"lower_plate.thickness\" is \"-1 mm\", but must not be negative, for example \"2 mm\"".into(),
            ),
            (
                bench("drive", r#"{"voltage": "0 V"}"#),
                "\"drive.voltage\" is \"0 V\", but must not be zero (either sign will do), for example \"400 V\"".into(),
            ),
            (
                bench("drive", r#"{"voltage": "1 V", "connection": "ground"}"#),
                "\"drive.connection\" is \"ground\"; give \"grounded\" or \"floating\"; the nearest is \"grounded\"".into(),
            ),
            (
                bench("drive", r#"{"voltage": "1 V", "connection": 1}"#),
                "\"drive.connection\" is the number 1; give \"grounded\" or \"floating\", for example \"grounded\"".into(),
            ),
            (
                bench("surroundings", r#"{"kind": "box"}"#),
                "\"surroundings.kind\" is \"box\"; give \"open\", \"grounded-floor\" or \"grounded-box\"; the nearest is \
                 \"grounded-box\""
                    .into(),
            ),
            (
                permittivity("\"1.0\""),
                "\"medium.relative_permittivity\" is the text \"1.0\"; give a plain number, for example 1.00054".into(),
            ),
            (
                permittivity("0.9"),
                "\"medium.relative_permittivity\" is 0.9, but must lie between 1 and 100000, for example 1.00054".into(),
            ),
            (bench("title", "3"), "\"title\" is the number 3; give a text, for example \"my balance, spring run\"".into()),
            (
                bench("title", "\"a\\u001b[31m\""),
                "\"title\" is \"a\\u{1b}[31m\", which has a character that cannot be printed; write plain text in one \
                 line"
                    .into(),
            ),
        ] {
            assert_eq!(complete(&text).unwrap_err().to_string(), message, "{text}");
        }
    }
}
