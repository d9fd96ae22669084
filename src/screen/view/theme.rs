use ratatui::style::{Color, Modifier, Style};

use crate::{
    alarm::{self, Priority},
    desk::State,
    events::EventKind,
    screen::state::MomentKind,
};

/// How things look. Colour is for what is abnormal, and never alone.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Theme {
    /// Whether colours may be used at all.
    pub colour: bool,
}

impl Theme {
    /// Monochrome where the environment asks for it (no-color.org).
    pub fn from_environment() -> Self {
        Self { colour: std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty()) }
    }

    /// A state's word: capitals when it is abnormal.
    pub fn word(self, state: State) -> String {
        if state == State::Ample { state.word().into() } else { state.word().to_uppercase() }
    }

    /// A state's mark, one cell wide.
    pub fn mark(self, state: State) -> &'static str {
        match state {
            State::Ample => "·",
            State::Thin => "!",
            State::Spent => "✕",
            State::Blind => "?",
        }
    }

    /// The style of a state's word. Colours come in pairs, so that they read on light and dark terminals alike, and
    /// differ in brightness, so that they do for the colour-blind.
    pub fn badge(self, state: State) -> Style {
        let pair = |fg, bg| Style::new().fg(fg).bg(bg);
        match (state, self.colour) {
            (State::Ample, _) => Style::new(),
            (State::Thin, true) => pair(Color::Black, Color::Yellow),
            (State::Thin, false) => Style::new().add_modifier(Modifier::BOLD | Modifier::UNDERLINED),
            (State::Spent, true) => pair(Color::White, Color::Red).add_modifier(Modifier::BOLD),
            (State::Spent, false) => Style::new().add_modifier(Modifier::BOLD | Modifier::REVERSED),
            (State::Blind, true) => pair(Color::Black, Color::Cyan),
            (State::Blind, false) => Style::new().add_modifier(Modifier::REVERSED),
        }
    }

    /// Mark and word of an alarm's state, the word at most 14 cells wide: capitals while it waits to be acknowledged.
    pub fn alarm(self, state: alarm::State) -> (&'static str, &'static str) {
        match state {
            alarm::State::Normal => ("·", "normal"),
            alarm::State::Unacknowledged => ("▲", "UNACKNOWLEDGED"),
            alarm::State::Acknowledged => ("●", "acknowledged"),
            alarm::State::ReturnedUnacknowledged => ("△", "RETURNED UNACK"),
            alarm::State::Shelved => ("◇", "shelved"),
            alarm::State::Suppressed => ("○", "suppressed"),
            alarm::State::OutOfService => ("–", "out of service"),
        }
    }

    /// The sign of a moment of a recording, one cell wide, and its style.
    pub fn sign(self, kind: MomentKind) -> (&'static str, Style) {
        match kind {
            MomentKind::Mark => ("*", Style::new().add_modifier(Modifier::REVERSED)),
            MomentKind::Raised(priority) => ("▲", self.priority(priority)),
            MomentKind::Low { of_day: true, .. } => ("▼", self.strong()),
            MomentKind::Low { .. } => ("▾", self.strong()),
            MomentKind::Event(kind) => match kind {
                EventKind::State => ("=", Style::new()),
                EventKind::Direction => ("D", Style::new()),
                EventKind::Trip => ("T", self.caution()),
                EventKind::Return => ("R", Style::new()),
                EventKind::Bypass => ("B", self.caution()),
                EventKind::Insertion => ("I", Style::new()),
                EventKind::Step => ("s", self.quiet()),
                EventKind::Meter => ("m", Style::new()),
                EventKind::Gap => ("G", self.badge(State::Blind)),
                EventKind::Alarm => ("△", Style::new()),
                EventKind::Act => ("●", Style::new()),
                EventKind::Program => ("·", self.quiet()),
            },
        }
    }

    /// The style of a priority.
    pub fn priority(self, priority: Priority) -> Style {
        match priority {
            Priority::Urgent => self.badge(State::Spent),
            Priority::High => self.badge(State::Thin),
            Priority::Medium => self.strong(),
            Priority::Low => Style::new(),
        }
    }

    /// Something that needs attention without being a state.
    pub fn caution(self) -> Style {
        self.badge(State::Thin)
    }

    /// Headings and what has the cursor.
    pub fn strong(self) -> Style {
        Style::new().add_modifier(Modifier::BOLD)
    }

    /// Scales, units and what is only there to be found.
    pub fn quiet(self) -> Style {
        Style::new().add_modifier(Modifier::DIM)
    }
}
