use std::ops::Range;

use toml_edit::Value;

use super::{
    findings::{Findings, Place},
    limits::{ANY, Limits},
    wording::{is_unprintable, quoted, shown_number},
};

/// A text and where it stands.
pub(crate) struct Placed {
    pub text: String,
    pub place: Place,
}

/// Something that the file gives, and where.
pub(crate) struct Given<'a> {
    pub findings: &'a Findings,
    pub place: Place,
    /// `None`: a table.
    pub value: Option<&'a Value>,
    /// Its type in the words of TOML.
    pub kind: &'static str,
}

impl<'a> Given<'a> {
    /// Reports that it is of another type.
    pub fn is_not(&self, wanted: &str) {
        let article = if self.kind.starts_with(['a', 'i']) { "an" } else { "a" };
        self.wrong(format!("must be {wanted}, not {article} {}", self.kind));
    }

    /// Reports something wrong with it.
    pub fn wrong(&self, message: impl Into<String>) {
        self.findings.report(&self.place, message);
    }

    /// NaN where it is no number within the limits.
    pub fn number(&self, limits: Limits) -> f64 {
        let number = match self.value {
            Some(Value::Float(float)) => *float.value(),
            Some(Value::Integer(integer)) => *integer.value() as f64,
            _ => {
                self.is_not("a number");
                return f64::NAN;
            }
        };
        if limits.hold(number) {
            return number;
        }
        let wanted = if ANY.hold(number) { limits.to_string() } else { "a finite number of ordinary size".to_owned() };
        self.wrong(format!("must be {wanted}, not {}", shown_number(number)));
        f64::NAN
    }

    pub fn flag(&self) -> Option<bool> {
        let flag = self.value.and_then(Value::as_bool);
        if flag.is_none() {
            self.is_not("true or false");
        }
        flag
    }

    /// Empty where it is no text, or one that cannot be printed.
    pub fn text(&self) -> String {
        match self.value.and_then(Value::as_str) {
            None => self.is_not("a string"),
            Some(text) if text.trim().is_empty() => self.wrong("is empty; write something in it"),
            Some(text) if text.contains(is_unprintable) => {
                self.wrong(format!("{} holds control or invisible characters; take them out", quoted(text)));
            }
            Some(text) => return text.to_owned(),
        }
        String::new()
    }

    pub fn placed(&self) -> Placed {
        Placed { text: self.text(), place: self.place.clone() }
    }

    /// The place of one of several things in it.
    pub fn element(&self, index: usize, span: Option<Range<usize>>) -> Place {
        let line = self.findings.line(span).unwrap_or(self.place.line);
        Place { line, key: format!("{}[{index}]", self.place.key) }
    }

    /// The values of an array, each with its place.
    pub fn array(&self, wanted: &str) -> Option<Vec<Self>> {
        let Some(array) = self.value.and_then(Value::as_array) else {
            self.is_not(wanted);
            return None;
        };
        let element = |(index, value): (usize, &'a Value)| Self {
            place: self.element(index, value.span()),
            value: Some(value),
            kind: value.type_name(),
            ..*self
        };
        Some(array.iter().enumerate().map(element).collect())
    }
}
