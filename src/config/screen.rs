//! `[screen]`.

use super::section::Section;
use crate::alarm::Priority;

/// How the screen calls for attention (`[screen]`).
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ScreenSettings {
    /// Whether an unacknowledged alarm blinks, once in two seconds (`blink`).
    pub blink: bool,
    /// Priorities that ring the terminal's bell when they are raised (`bell`).
    pub bell: Vec<Priority>,
    /// Whether `watch` applies a changed configuration without being told to (`apply_changes`).
    pub apply_changes: bool,
}

impl Default for ScreenSettings {
    fn default() -> Self {
        Self { blink: true, bell: vec![Priority::High, Priority::Urgent], apply_changes: false }
    }
}

pub(super) fn read(mut section: Section<'_>) -> ScreenSettings {
    let default = ScreenSettings::default();
    let findings = section.findings();
    let priority = |given: super::given::Placed| {
        let priority = Priority::from_word(&given.text);
        if priority.is_none() && !given.text.is_empty() {
            let advice = findings.advice(&given.text, Priority::ALL.map(Priority::word));
            findings.report(&given.place, format!("no priority {}; {advice}", super::quoted(&given.text)));
        }
        priority
    };
    ScreenSettings {
        blink: section.flag("blink").unwrap_or(default.blink),
        bell: section
            .texts("bell")
            .map_or(default.bell, |priorities| priorities.into_iter().filter_map(priority).collect()),
        apply_changes: section.flag("apply_changes").unwrap_or(default.apply_changes),
    }
}
