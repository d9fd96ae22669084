use std::{
    cell::{Cell, RefCell},
    ops::Range,
};

use super::{
    error::{ConfigError, ConfigErrors},
    wording::{advice, printable},
};

/// Errors listed; more are only counted.
const MOST_ERRORS: usize = 200;

/// Where something stands in the file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Place {
    pub line: usize,
    pub key: String,
}

/// What is wrong with a file so far.
pub(crate) struct Findings {
    line_starts: Vec<usize>,
    errors: RefCell<Vec<ConfigError>>,
    unlisted: Cell<usize>,
}

impl Findings {
    pub fn new(text: &str) -> Self {
        let breaks = text.bytes().enumerate().filter(|(_, byte)| *byte == b'\n');
        Self {
            line_starts: [0].into_iter().chain(breaks.map(|(at, _)| at + 1)).collect(),
            errors: RefCell::default(),
            unlisted: Cell::default(),
        }
    }

    pub fn report(&self, place: &Place, message: impl Into<String>) {
        let mut errors = self.errors.borrow_mut();
        if errors.len() < MOST_ERRORS {
            errors.push(ConfigError { line: Some(place.line), key: place.key.clone(), message: message.into() });
        } else {
            self.unlisted.set(self.unlisted.get() + 1);
        }
    }

    /// What could have been meant instead of a name that is not there; nothing once nobody will read it.
    pub fn advice<'a>(&self, given: &str, candidates: impl IntoIterator<Item = &'a str>) -> String {
        if self.errors.borrow().len() < MOST_ERRORS { advice(given, candidates) } else { String::new() }
    }

    /// The line a span starts in, from 1.
    pub fn line(&self, span: Option<Range<usize>>) -> Option<usize> {
        span.map(|span| self.line_starts.partition_point(|start| *start <= span.start))
    }

    /// The value, if nothing is wrong.
    pub fn verdict<T>(self, value: T, file: &str) -> Result<T, ConfigErrors> {
        let mut errors = self.errors.into_inner();
        if errors.is_empty() {
            return Ok(value);
        }
        errors.sort_by_key(|error| error.line);
        Err(ConfigErrors { file: printable(file), errors, unlisted: self.unlisted.get() })
    }
}
