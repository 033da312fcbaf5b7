//! One thing that has to hold: how far off it is, and how far it may be.

/// A checked statement.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// What is checked.
    pub what: String,
    /// How far off it is, in the sense of `what`; relative unless it says otherwise.
    pub off: f64,
    /// How far off it may be.
    pub allowed: f64,
    /// Why that far.
    pub because: String,
}

impl Finding {
    /// A checked statement.
    pub fn new(what: impl Into<String>, off: f64, allowed: f64, because: &str) -> Finding {
        Finding { what: what.into(), off: off.abs(), allowed, because: because.into() }
    }

    /// Whether it holds; what is not a number does not.
    pub fn holds(&self) -> bool {
        self.off <= self.allowed
    }
}
