//! A JSON text as it was written: objects keep the order of their keys, and keys that occur twice.
//!
//! `serde_json` lets the last of two equal keys win, which would hide a slip of the pen; here both stay, so that the
//! bench can refuse them.

use std::fmt;

use serde::de::{Deserialize, Deserializer, MapAccess, SeqAccess, Visitor};
use serde_json::Value;

/// A JSON value.
#[derive(Clone, Debug, PartialEq)]
pub enum Node {
    /// Text, number, truth value or null.
    Leaf(Value),
    /// An array.
    Array(Vec<Node>),
    /// An object, in the order of the text, with keys that occur twice.
    Object(Vec<(String, Node)>),
}

/// Longest value quoted in a message.
const QUOTED: usize = 40;

/// A text in quotes with what cannot be printed escaped, cut if long.
pub fn quoted(text: &str) -> String {
    let mut short: String = text.chars().take(QUOTED).collect();
    if short.len() < text.len() {
        short.push('…');
    }
    format!("{short:?}")
}

impl Node {
    /// Reads a JSON text; a byte order mark at the beginning is passed over.
    ///
    /// # Errors
    /// What is wrong, with line and column.
    pub fn parse(text: &str) -> Result<Node, serde_json::Error> {
        serde_json::from_str(text.strip_prefix('\u{feff}').unwrap_or(text))
    }

    /// What it is, for a message: `the text "4 mm"`, `the number 4`, `an object`.
    pub fn described(&self) -> String {
        match self {
            Node::Leaf(Value::String(text)) => format!("the text {}", quoted(text)),
            Node::Leaf(Value::Number(number)) => format!("the number {number}"),
            Node::Leaf(value) => value.to_string(),
            Node::Array(items) => format!("an array of {}", items.len()),
            Node::Object(_) => "an object".into(),
        }
    }
}

impl From<Value> for Node {
    fn from(value: Value) -> Node {
        match value {
            Value::Array(items) => Node::Array(items.into_iter().map(Node::from).collect()),
            Value::Object(map) => Node::Object(map.into_iter().map(|(k, v)| (k, v.into())).collect()),
            leaf => Node::Leaf(leaf),
        }
    }
}

struct NodeVisitor;

impl<'de> Visitor<'de> for NodeVisitor {
    type Value = Node;

    fn expecting(&self, f: &mut fmt::Formatter) -> fmt::Result {
        f.write_str("a JSON value")
    }

    fn visit_unit<E>(self) -> Result<Node, E> {
        Ok(Node::Leaf(Value::Null))
    }

    fn visit_bool<E>(self, v: bool) -> Result<Node, E> {
        Ok(Node::Leaf(v.into()))
    }

    fn visit_i64<E>(self, v: i64) -> Result<Node, E> {
        Ok(Node::Leaf(v.into()))
    }

    fn visit_u64<E>(self, v: u64) -> Result<Node, E> {
        Ok(Node::Leaf(v.into()))
    }

    fn visit_f64<E>(self, v: f64) -> Result<Node, E> {
        Ok(Node::Leaf(v.into()))
    }

    fn visit_str<E>(self, v: &str) -> Result<Node, E> {
        Ok(Node::Leaf(v.into()))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<Node, A::Error> {
        let mut array = Vec::new();
        while let Some(item) = items.next_element()? {
            array.push(item);
        }
        Ok(Node::Array(array))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<Node, A::Error> {
        let mut object = Vec::new();
        while let Some(entry) = entries.next_entry()? {
            object.push(entry);
        }
        Ok(Node::Object(object))
    }
}

impl<'de> Deserialize<'de> for Node {
    fn deserialize<D: Deserializer<'de>>(from: D) -> Result<Node, D::Error> {
        from.deserialize_any(NodeVisitor)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn order_and_doubles_stay() {
        let node = Node::parse("\u{feff}{\"b\": 1, \"a\": [null, true, -2, 0.5, \"x\"], \"b\": {}}").unwrap();
        let Node::Object(entries) = node else { panic!() };
        let names: Vec<&str> = entries.iter().map(|e| e.0.as_str()).collect();
        assert_eq!(names, ["b", "a", "b"]);
        let Node::Array(items) = &entries[1].1 else { panic!() };
        let described: Vec<String> = items.iter().map(Node::described).collect();
        assert_eq!(described, ["null", "true", "the number -2", "the number 0.5", "the text \"x\""]);
        assert_eq!([entries[1].1.described(), entries[2].1.described()], ["an array of 5", "an object"]);
    }

    #[test]
    fn slips_have_a_line_and_a_column() {
        for (text, line, column) in [("{\n \"a\": 1,\n}", 3, 1), ("{} x", 1, 4), ("", 1, 0), ("[1", 1, 2)] {
            let error = Node::parse(text).unwrap_err();
            assert_eq!((error.line(), error.column()), (line, column), "{text}");
        }
        assert!(Node::parse(&"[".repeat(100_000)).is_err());
    }

    #[test]
    fn quotes_are_short_and_harmless() {
        assert_eq!(quoted("a\u{1b}[31mb"), "\"a\\u{1b}[31mb\"");
        assert_eq!(quoted(&"x".repeat(50)), format!("\"{}…\"", "x".repeat(40)));
    }
}
