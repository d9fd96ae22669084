use std::collections::HashMap;

use super::{
    findings::{Findings, Place},
    wording::quoted,
};

/// Names that may be given once.
pub(super) struct Names<'a> {
    findings: &'a Findings,
    taken: HashMap<String, (&'static str, usize)>,
}

impl<'a> Names<'a> {
    pub fn new(findings: &'a Findings) -> Self {
        Self { findings, taken: HashMap::new() }
    }

    /// Takes a name for something; reports it, and says false, where it is taken.
    pub fn claim(&mut self, name: &str, what: &'static str, place: &Place) -> bool {
        // An empty name is reported already.
        let earlier = if name.is_empty() { None } else { self.taken.insert(name.to_owned(), (what, place.line)) };
        if let Some((what, line)) = earlier {
            self.findings.report(
                place,
                format!("{} is taken by another {what} (line {line}); choose another name", quoted(name)),
            );
        }
        earlier.is_none()
    }
}
