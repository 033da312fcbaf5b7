//! The JSON Schema of the bench file, for editors that check and complete while one types.
//!
//! It follows from the table of keys. The program itself does not use it: its own messages say more.

use serde_json::{json, Map, Value};

use crate::keys::{Key, Kind, Need, Range, BENCH};
use crate::quantity::Dimension;

/// Pattern of a number as it begins a quantity.
const NUMBER: &str = r"[-+−]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][-+−]?[0-9]+)?";

/// The whole schema.
pub fn bench_schema() -> Value {
    let mut schema = Map::new();
    schema.insert("$schema".into(), json!("https://json-schema.org/draft/2020-12/schema"));
    schema.insert("title".into(), json!("tiltgap bench"));
    schema.insert(
        "description".into(),
        json!("Two plates, the pose of the upper one, hinge, voltage and wiring. Quantities are texts with a unit."),
    );
    schema.extend(group(BENCH));
    schema.into()
}

fn group(keys: &[Key]) -> Map<String, Value> {
    let required: Vec<&str> =
        keys.iter().filter(|k| matches!(k.need, Need::Required)).map(|k| k.name).collect();
    let properties: Map<String, Value> = keys.iter().map(|k| (k.name.into(), one(k).into())).collect();
    let mut map = Map::new();
    map.insert("type".into(), json!("object"));
    map.insert("properties".into(), properties.into());
    if !required.is_empty() {
        map.insert("required".into(), json!(required));
    }
    map.insert("additionalProperties".into(), json!(false));
    map
}

fn quantity(dimension: Dimension) -> Value {
    let units: Vec<&str> = dimension.spellings().collect();
    json!({ "type": "string", "pattern": format!(r"^\s*{NUMBER}\s*({})\s*$", units.join("|")) })
}

fn one(key: &Key) -> Map<String, Value> {
    let mut map = match key.kind {
        Kind::Text => json!({ "type": "string" }),
        Kind::Quantity(dimension, _) => quantity(dimension),
        Kind::Pair(dimension) => {
            json!({ "type": "array", "items": quantity(dimension), "minItems": 2, "maxItems": 2 })
        }
        Kind::Number(Range::Between(from, to)) => json!({ "type": "number", "minimum": from, "maximum": to }),
        Kind::Number(_) => json!({ "type": "number" }),
        Kind::Choice(words) => json!({ "enum": words }),
        Kind::Group(keys) => group(keys).into(),
    };
    let map = map.as_object_mut().map(std::mem::take).unwrap_or_default();
    let mut described = Map::new();
    described.insert("description".into(), json!(about(key)));
    described.extend(map);
    if let (Need::Default(value), false) = (key.need, matches!(key.kind, Kind::Group(_))) {
        described.insert("default".into(), value());
    }
    if !matches!(key.kind, Kind::Group(_) | Kind::Choice(_)) {
        let example: Value = serde_json::from_str(key.example).unwrap_or_default();
        described.insert("examples".into(), json!([example]));
    }
    described
}

fn about(key: &Key) -> String {
    match key.kind {
        Kind::Quantity(dimension, range) => {
            let wanted = if range == Range::Any { String::new() } else { format!("; {}", range.wanted()) };
            format!("{} ({}){wanted}", key.about, dimension.unit_list())
        }
        Kind::Pair(dimension) => format!("{} ({})", key.about, dimension.unit_list()),
        _ => key.about.into(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_schema_says_what_the_table_says() {
        let schema = bench_schema();
        assert_eq!(schema["required"], json!(["lower_plate", "upper_plate", "pose", "drive"]));
        assert_eq!(schema["additionalProperties"], json!(false));
        let pose = &schema["properties"]["pose"];
        assert_eq!(pose["required"], json!(["gap"]));
        assert_eq!(pose["properties"]["tilt"]["default"], json!("0 deg"));
        assert!(pose["properties"]["gap"]["pattern"]
            .as_str()
            .unwrap()
            .ends_with(r"\s*(m|cm|mm|um|µm|μm|in)\s*$"));
        assert_eq!(
            pose["properties"]["gap"]["description"],
            "height of the centre of the upper plate's facing surface above the lower plate's \
             (m, cm, mm, um or in); must be positive"
        );
        let medium = &schema["properties"]["medium"]["properties"]["relative_permittivity"];
        assert_eq!((&medium["minimum"], &medium["type"]), (&json!(1.0), &json!("number")));
        assert_eq!(
            schema["properties"]["drive"]["properties"]["connection"]["enum"],
            json!(["grounded", "floating"])
        );
    }
}
