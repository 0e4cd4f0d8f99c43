//! What was decided and done on the way from an instrument's file to a section.

/// One step, for people, for `[source]` and for the check picture.
#[derive(Debug, Clone, PartialEq)]
pub struct Step {
    /// What kind of step, one word or two joined by `_`: `units`, `levelling`, `tip`, `lid`.
    pub what: &'static str,
    /// What was done and why, one sentence with its numbers.
    pub text: String,
    /// The numbers of the sentence for machines: key (ends in its unit where it has one) and value.
    pub numbers: Vec<(&'static str, f64)>,
}

impl Step {
    /// A step without numbers for machines.
    pub fn new(what: &'static str, text: impl Into<String>) -> Self {
        Self {
            what,
            text: text.into(),
            numbers: Vec::new(),
        }
    }

    /// The same with numbers.
    #[must_use]
    pub fn with(mut self, numbers: &[(&'static str, f64)]) -> Self {
        self.numbers.extend_from_slice(numbers);
        self
    }
}
