//! From moment to moment of a recording.

use std::sync::Arc;

use chrono::{DateTime, Utc};

use super::{App, Moment, MomentKind, Page};
use crate::{events::EventKind, screen::connection::Order};

/// Where a session has jumped.
#[derive(Debug, Default)]
pub struct Jumps {
    /// What was jumped to last, as long as nothing else has moved us since.
    pub(super) landed: Option<DateTime<Utc>>,
    /// Where the last jump set out.
    set_out: Option<DateTime<Utc>>,
}

/// What to jump to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Sought {
    Event,
    Raised,
    Low,
    Mark,
}

impl Sought {
    fn fits(self, kind: MomentKind) -> bool {
        use EventKind::{Act, Alarm, Meter, Program, Step};
        match kind {
            // These come by the hundred, or follow from others.
            MomentKind::Event(Act | Alarm | Meter | Program | Step) => false,
            MomentKind::Event(_) => self == Self::Event,
            MomentKind::Raised(_) => self == Self::Raised,
            MomentKind::Low { .. } => self == Self::Low,
            MomentKind::Mark => self == Self::Mark,
        }
    }

    fn word(self) -> &'static str {
        match self {
            Self::Event => "event",
            Self::Raised => "alarm raised",
            Self::Low => "lowest headroom",
            Self::Mark => "mark",
        }
    }
}

impl App {
    /// Answers the keys that jump.
    pub(super) fn jump_key(&mut self, key: char) -> Option<Order> {
        let (sought, back) = match key {
            'w' => (Sought::Event, false),
            'W' => (Sought::Event, true),
            'r' => (Sought::Raised, false),
            'R' => (Sought::Raised, true),
            'd' => (Sought::Low, false),
            'D' => (Sought::Low, true),
            '\'' => (Sought::Mark, false),
            '"' => (Sought::Mark, true),
            'x' => return self.jump_to_lowest(),
            'X' => return self.jump_back(),
            _ => return None,
        };
        self.jump(sought, back)
    }

    /// Whatever order moves us by other means ends a row of jumps.
    pub(super) fn note_order(&mut self, order: &Order) {
        let moves =
            !matches!(order, Order::Visit(_) | Order::Mark(_) | Order::Alarm(_) | Order::Faster | Order::Slower);
        if moves {
            self.jumps.landed = None;
        }
    }

    /// Where the next jump sets out: several in a row need not wait for each other.
    fn here(&self) -> Option<DateTime<Utc>> {
        self.jumps.landed.or_else(|| self.present())
    }

    /// On the page of a corridor, what is about it or about all of them; elsewhere everything.
    fn within_reach(&self) -> Vec<Arc<Moment>> {
        let mut moments = self.moments();
        if self.page == Page::Corridor
            && let Some(here) = self.corridor().map(|corridor| corridor.name.clone())
        {
            moments.retain(|moment| moment.corridor.as_ref().is_none_or(|name| *name == here));
        }
        moments
    }

    fn jump(&mut self, sought: Sought, back: bool) -> Option<Order> {
        let here = self.here()?;
        let moments = self.within_reach();
        let mut fitting = moments.iter().filter(|moment| sought.fits(moment.kind));
        let found =
            if back { fitting.rfind(|moment| moment.time < here) } else { fitting.find(|moment| moment.time > here) };
        let Some(found) = found else {
            let where_to = if back { "earlier" } else { "later" };
            self.said = Some(format!("There is no {where_to} {}{}{}.", sought.word(), self.reach(), self.so_far()));
            return None;
        };
        let together =
            moments.iter().filter(|moment| sought.fits(moment.kind) && moment.time == found.time).count() - 1;
        let more = if together > 0 { format!(" (and {together} more)") } else { String::new() };
        Some(self.visit_moment(found, &more))
    }

    fn jump_to_lowest(&mut self) -> Option<Order> {
        let headroom = |moment: &Moment| match moment.kind {
            MomentKind::Low { headroom_mw, .. } => Some(headroom_mw),
            _ => None,
        };
        let moments = self.within_reach();
        let lows = moments.iter().filter_map(|moment| Some((headroom(moment)?, moment)));
        let Some((_, lowest)) = lows.min_by(|one, other| one.0.total_cmp(&other.0)) else {
            self.said = Some(format!("No headroom is known{}{}.", self.reach(), self.so_far()));
            return None;
        };
        let more = self.so_far();
        Some(self.visit_moment(lowest, &more))
    }

    fn jump_back(&mut self) -> Option<Order> {
        let Some(back) = self.jumps.set_out else {
            self.said = Some("There was no jump to come back from.".into());
            return None;
        };
        (self.jumps.set_out, self.jumps.landed) = (self.here(), Some(back));
        self.said = Some("Back to where the last jump set out.".into());
        Some(Order::Visit(back))
    }

    /// Goes to a moment, and says what it is.
    pub(super) fn visit_moment(&mut self, moment: &Moment, more: &str) -> Order {
        if self.page != Page::Corridor {
            self.select(moment.corridor.as_ref());
        }
        self.events.chosen = None;
        if self.here() != Some(moment.time) {
            self.jumps.set_out = self.here();
        }
        self.jumps.landed = Some(moment.time);
        let time = moment.time.with_timezone(&self.zone).format("%H:%M:%S");
        let corridor = moment.corridor.as_ref().map_or(String::new(), |name| format!(" {name}"));
        let text = if moment.text.is_empty() { String::new() } else { format!(": {}", moment.text) };
        self.said = Some(format!("{time}{corridor}, {}{text}{more}", moment.kind.word()));
        Order::Visit(moment.time)
    }

    fn reach(&self) -> String {
        let corridor = self.corridor().filter(|_| self.page == Page::Corridor);
        corridor.map_or(String::new(), |corridor| format!(" of {}", corridor.name))
    }

    /// That more may be found, while the recording is still being gone through.
    fn so_far(&self) -> String {
        let survey = self.playback().map(|playback| &playback.survey).filter(|survey| !survey.ended);
        survey.map_or(String::new(), |survey| format!(" so far, {:.0} % are gone through", 100.0 * survey.done()))
    }
}
