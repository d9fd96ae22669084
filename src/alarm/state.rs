//! States and transitions of an alarm, after the state diagram of ANSI/ISA-18.2 (2016, figure 3) and IEC 62682 (2014,
//! figure 3); its latched states are optional and left out.

use std::fmt;

use serde::{Deserialize, Serialize};

/// State of an alarm; the letter is that of the standards' diagram.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum State {
    /// A: nothing to tell.
    Normal,
    /// B: raised, and nobody has said that he saw it.
    Unacknowledged,
    /// C: raised and seen.
    Acknowledged,
    /// D: over before anybody said that he saw it.
    ReturnedUnacknowledged,
    /// G: put aside by the operator, for a time and a reason.
    Shelved,
    /// H: meaningless at present, by its definition.
    Suppressed,
    /// I: taken out for maintenance, without a time limit.
    OutOfService,
}

/// What moves an alarm from one state to another.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Event {
    /// The condition has held for the on-delay.
    Alarm,
    /// It has been gone for the off-delay.
    Return,
    /// The operator has seen it.
    Acknowledge,
    /// The operator puts it aside.
    Shelve,
    /// The operator brings it back.
    Unshelve,
    /// The time it was put aside for is over.
    ShelvingEnds,
    /// A condition of its design suppresses it.
    Suppress,
    /// None does any more.
    Unsuppress,
    /// Taken out of service.
    RemoveFromService,
    /// Back in service.
    ReturnToService,
    /// Its definition is gone from the configuration.
    Withdraw,
}

/// Where an event leads.
#[derive(Debug, Clone, Copy)]
enum Next {
    To(State),
    /// To where its condition and its design say.
    Afresh,
}

/// What decides where an alarm goes that is no longer held back.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Standpoint {
    /// The alarm condition holds.
    pub active: bool,
    /// A condition of its design suppresses it.
    pub suppressed: bool,
}

/// The diagram: what is not in it does not happen.
const DIAGRAM: &[(State, Event, Next)] = {
    use Event::{
        Acknowledge, Alarm, RemoveFromService, Return, ReturnToService, Shelve, ShelvingEnds, Suppress, Unshelve,
        Unsuppress,
    };
    use Next::{Afresh, To};
    use State::{Acknowledged, Normal, OutOfService, ReturnedUnacknowledged, Shelved, Suppressed, Unacknowledged};
    &[
        (Normal, Alarm, To(Unacknowledged)),
        (Unacknowledged, Acknowledge, To(Acknowledged)),
        (Unacknowledged, Return, To(ReturnedUnacknowledged)),
        (Acknowledged, Return, To(Normal)),
        (ReturnedUnacknowledged, Alarm, To(Unacknowledged)),
        (ReturnedUnacknowledged, Acknowledge, To(Normal)),
        (Normal, Shelve, To(Shelved)),
        (Unacknowledged, Shelve, To(Shelved)),
        (Acknowledged, Shelve, To(Shelved)),
        (ReturnedUnacknowledged, Shelve, To(Shelved)),
        (Suppressed, Shelve, To(Shelved)),
        (Shelved, Unshelve, Afresh),
        (Shelved, ShelvingEnds, Afresh),
        (Normal, Suppress, To(Suppressed)),
        (Unacknowledged, Suppress, To(Suppressed)),
        (Acknowledged, Suppress, To(Suppressed)),
        (ReturnedUnacknowledged, Suppress, To(Suppressed)),
        (Suppressed, Unsuppress, Afresh),
        (Normal, RemoveFromService, To(OutOfService)),
        (Unacknowledged, RemoveFromService, To(OutOfService)),
        (Acknowledged, RemoveFromService, To(OutOfService)),
        (ReturnedUnacknowledged, RemoveFromService, To(OutOfService)),
        (Shelved, RemoveFromService, To(OutOfService)),
        (Suppressed, RemoveFromService, To(OutOfService)),
        (OutOfService, ReturnToService, Afresh),
    ]
};

impl State {
    /// All of them, in the order of the diagram.
    pub const ALL: [Self; 7] = [
        Self::Normal,
        Self::Unacknowledged,
        Self::Acknowledged,
        Self::ReturnedUnacknowledged,
        Self::Shelved,
        Self::Suppressed,
        Self::OutOfService,
    ];

    /// Its word, as the journal has it.
    pub fn word(self) -> &'static str {
        match self {
            Self::Normal => "normal",
            Self::Unacknowledged => "unacknowledged",
            Self::Acknowledged => "acknowledged",
            Self::ReturnedUnacknowledged => "returned unacknowledged",
            Self::Shelved => "shelved",
            Self::Suppressed => "suppressed by design",
            Self::OutOfService => "out of service",
        }
    }

    /// The state of that word.
    pub fn from_word(word: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|state| state.word() == word)
    }

    /// Waits for the operator to say that he has seen it.
    pub fn calls(self) -> bool {
        matches!(self, Self::Unacknowledged | Self::ReturnedUnacknowledged)
    }

    /// Raised, and shown as such.
    pub fn is_standing(self) -> bool {
        matches!(self, Self::Unacknowledged | Self::Acknowledged)
    }

    /// Waits for the operator to say that he saw it.
    pub fn wants_acknowledgement(self) -> bool {
        matches!(self, Self::Unacknowledged | Self::ReturnedUnacknowledged)
    }

    /// The state after an event; `None` where the event changes nothing.
    pub(super) fn after(self, event: Event, standpoint: Standpoint) -> Option<Self> {
        if event == Event::Withdraw {
            return (self != Self::Normal).then_some(Self::Normal);
        }
        let (.., next) = DIAGRAM.iter().find(|(from, on, _)| (*from, *on) == (self, event))?;
        Some(match next {
            Next::To(state) => *state,
            Next::Afresh if standpoint.suppressed => Self::Suppressed,
            Next::Afresh if standpoint.active => Self::Unacknowledged,
            Next::Afresh => Self::Normal,
        })
    }
}

impl Event {
    /// All of them.
    pub const ALL: [Self; 11] = [
        Self::Alarm,
        Self::Return,
        Self::Acknowledge,
        Self::Shelve,
        Self::Unshelve,
        Self::ShelvingEnds,
        Self::Suppress,
        Self::Unsuppress,
        Self::RemoveFromService,
        Self::ReturnToService,
        Self::Withdraw,
    ];

    /// Its word, as the journal has it.
    pub fn word(self) -> &'static str {
        match self {
            Self::Alarm => "alarm",
            Self::Return => "return to normal",
            Self::Acknowledge => "acknowledge",
            Self::Shelve => "shelve",
            Self::Unshelve => "unshelve",
            Self::ShelvingEnds => "shelving ends",
            Self::Suppress => "suppress by design",
            Self::Unsuppress => "unsuppress",
            Self::RemoveFromService => "remove from service",
            Self::ReturnToService => "return to service",
            Self::Withdraw => "withdraw",
        }
    }

    /// Whether it is somebody's doing.
    pub fn is_act(self) -> bool {
        use Event::{Acknowledge, RemoveFromService, ReturnToService, Shelve, Unshelve};
        matches!(self, Acknowledge | Shelve | Unshelve | RemoveFromService | ReturnToService)
    }
}

impl fmt::Display for State {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.word())
    }
}

impl fmt::Display for Event {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(self.word())
    }
}

#[cfg(test)]
mod tests {
    use super::{
        Event::{self, *},
        Standpoint,
        State::{self, *},
    };

    /// Every state, event and standpoint with where the standards' diagram leads (ANSI/ISA-18.2-2016 figure 3 and its
    /// clause on states A to I, IEC 62682:2014 likewise; from memory of the standards). `.` is no transition, `?` is
    /// A or B by the condition, H while the design suppresses it.
    const PUBLISHED: [(State, [char; 10]); 7] = [
        //                       alarm return ack shelve unshelve ends suppress unsuppress remove return
        (Normal, ['B', '.', '.', 'G', '.', '.', 'H', '.', 'I', '.']),
        (Unacknowledged, ['.', 'D', 'C', 'G', '.', '.', 'H', '.', 'I', '.']),
        (Acknowledged, ['.', 'A', '.', 'G', '.', '.', 'H', '.', 'I', '.']),
        (ReturnedUnacknowledged, ['B', '.', 'A', 'G', '.', '.', 'H', '.', 'I', '.']),
        (Shelved, ['.', '.', '.', '.', '?', '?', '.', '.', 'I', '.']),
        (Suppressed, ['.', '.', '.', 'G', '.', '.', '.', '?', 'I', '.']),
        (OutOfService, ['.', '.', '.', '.', '.', '.', '.', '.', '.', '?']),
    ];

    fn letter(state: State) -> char {
        "ABCDGHI".as_bytes()[State::ALL.iter().position(|s| *s == state).expect("listed")] as char
    }

    #[test]
    fn every_transition_is_that_of_the_standards() {
        let [true_, false_] = [true, false];
        for (state, row) in PUBLISHED {
            for (event, published) in Event::ALL.into_iter().zip(row) {
                for (active, suppressed) in [(false_, false_), (false_, true_), (true_, false_), (true_, true_)] {
                    let expected = match published {
                        '.' => None,
                        '?' if suppressed => Some('H'),
                        '?' if active => Some('B'),
                        '?' => Some('A'),
                        letter => Some(letter),
                    };
                    let next = state.after(event, Standpoint { active, suppressed }).map(letter);
                    assert_eq!(next, expected, "{state} on {event}, active {active}, suppressed {suppressed}");
                }
            }
        }
    }

    #[test]
    fn a_withdrawn_alarm_is_gone_from_every_state() {
        let standpoint = Standpoint { active: true, suppressed: true };
        for state in State::ALL {
            assert_eq!(state.after(Withdraw, standpoint), (state != Normal).then_some(Normal), "{state}");
        }
    }

    #[test]
    fn words_are_read_back() {
        for state in State::ALL {
            assert_eq!(State::from_word(state.word()), Some(state));
        }
    }
}
