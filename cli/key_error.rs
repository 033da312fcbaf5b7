//! What can be wrong with a key of the bench or its value, as sentences.

use crate::document::quoted;
use crate::quantity::QuantityError;

/// What is wrong with a key or its value. Every message names the key (or the option), the value and an example.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum KeyError {
    /// The text is JSON, but not an object.
    #[error("the bench is {found}, not an object; begin with {{ \"lower_plate\": ... }}")]
    NotAnObject {
        /// What it is.
        found: String,
    },
    /// No such key.
    #[error("there is no key {}; did you mean {nearest:?}? {place} may hold {known}", quoted(.key))]
    Unknown {
        /// Path of the key.
        key: String,
        /// Path of the nearest known key.
        nearest: String,
        /// The group it was found in.
        place: String,
        /// The keys that may stand there.
        known: String,
    },
    /// Twice the same key.
    #[error("the key {key:?} occurs twice; keep one of them")]
    Twice {
        /// Path of the key.
        key: String,
    },
    /// A required key is not there.
    #[error("{key:?} is missing; add it, for example \"{name}\": {example}")]
    Missing {
        /// Path of the key.
        key: String,
        /// Its last part.
        name: &'static str,
        /// A value that does.
        example: &'static str,
    },
    /// A value of the wrong JSON type.
    #[error("{} is {found}; give {wanted}, for example {example}", named(.key))]
    Type {
        /// Path of the key.
        key: String,
        /// What was found.
        found: String,
        /// What was expected.
        wanted: String,
        /// A value that does.
        example: &'static str,
    },
    /// A text that is not a quantity.
    #[error("{}: {} {error}, for example {example}", named(.key), quoted(.text))]
    Quantity {
        /// Path of the key, or the option.
        key: String,
        /// The text.
        text: String,
        /// What is wrong with it.
        error: QuantityError,
        /// A value that does.
        example: &'static str,
    },
    /// A value out of its range.
    #[error("{} is {found}, but {wanted}, for example {example}", named(.key))]
    Range {
        /// Path of the key, or the option.
        key: String,
        /// The value.
        found: String,
        /// What it must be.
        wanted: String,
        /// A value that does.
        example: &'static str,
    },
    /// A word that is not among those that do.
    #[error("{} is {}; give {words}; the nearest is {nearest:?}", named(.key), quoted(.found))]
    Word {
        /// Path of the key, or the option.
        key: String,
        /// The word.
        found: String,
        /// Those that do.
        words: String,
        /// The nearest of them.
        nearest: &'static str,
    },
    /// A key that another one asks for is not there.
    #[error("{because} needs {key:?}; add it, for example \"{name}\": {example}")]
    Needed {
        /// Path of the key.
        key: String,
        /// Its last part.
        name: &'static str,
        /// A value that does.
        example: &'static str,
        /// What asks for it.
        because: String,
    },
    /// A key that means nothing beside another one.
    #[error("{key:?} means nothing with {beside}; {remedy}")]
    Idle {
        /// Path of the key.
        key: String,
        /// The other one, with its value.
        beside: String,
        /// What to do.
        remedy: String,
    },
    /// Two guard rings.
    #[error(
        "both plates have a \"guard\"; keep the one around the plate whose charge or force is measured, and make the other \
         plate as large as it is with its ring"
    )]
    TwoGuards,
    /// A text of several lines or with escape sequences.
    #[error("{key:?} is {}, which has a character that cannot be printed; write plain text in one line", quoted(.found))]
    Unprintable {
        /// Path of the key.
        key: String,
        /// The text.
        found: String,
    },
}

/// A key in quotes, an option as it is.
fn named(name: &str) -> String {
    if name.starts_with("--") {
        name.into()
    } else {
        format!("{name:?}")
    }
}

/// A list of words in quotes: "a", "b" or "c".
pub fn words(list: &[&str]) -> String {
    match list.split_last() {
        None => String::new(),
        Some((one, [])) => format!("{one:?}"),
        Some((last, rest)) => {
            let rest: Vec<String> = rest.iter().map(|w| format!("{w:?}")).collect();
            format!("{} or {last:?}", rest.join(", "))
        }
    }
}
