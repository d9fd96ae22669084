use std::fmt;

use thiserror::Error;

use super::wording::printable;

/// One thing wrong with a configuration: where, what, and what to do about it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ConfigError {
    /// Line in the file, from 1; `None` where the file as a whole cannot be read.
    pub line: Option<usize>,
    /// Dotted path of the key, such as `corridor[0].circuit[2].x_ohm_per_km`; empty where no key is to blame.
    pub key: String,
    /// What is wrong and what to do, free of control characters.
    pub message: String,
}

/// Everything wrong with a configuration, in the order of the file.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub struct ConfigErrors {
    /// The file's name, free of control characters.
    pub file: String,
    /// At least one.
    pub errors: Vec<ConfigError>,
    /// How many more there are than `errors` lists.
    pub unlisted: usize,
}

impl ConfigErrors {
    pub(crate) fn one(file: &str, error: ConfigError) -> Self {
        Self { file: printable(file), errors: vec![error], unlisted: 0 }
    }
}

impl fmt::Display for ConfigErrors {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Self { file, errors, unlisted } = self;
        let total = errors.len() + unlisted;
        write!(f, "{total} {} in {file}", if total == 1 { "error" } else { "errors" })?;
        for ConfigError { line, key, message } in errors {
            write!(f, "\n{file}:")?;
            if let Some(line) = line {
                write!(f, "{line}:")?;
            }
            if !key.is_empty() {
                write!(f, " {key}:")?;
            }
            write!(f, " {message}")?;
        }
        if *unlisted > 0 {
            write!(f, "\n... and {unlisted} more")?;
        }
        Ok(())
    }
}
