use std::fmt;

use Direction::{High, Low};
use serde::Serialize;

/// What an alarm watches.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Kind {
    /// Headroom, MW, less the spreads by which the corridor's state is judged.
    HeadroomMw,
    /// The same, % of the limit.
    HeadroomPct,
    /// Smallest angle margin after any outage, degrees; 0 where there is no equilibrium.
    AngleMargin,
    /// Smallest area margin after any outage.
    AreaMargin,
    /// Critical less configured clearing time, of the worst outage, ms.
    ClearingReserve,
    /// Largest angle across an open circuit, degrees.
    StandingAngle,
    /// Minutes until nothing is left at the present trend; 0 once nothing is.
    MinutesLeft,
    /// Largest current as it is against its continuous rating, %.
    Loading,
    /// Time since the last frame, s.
    DataAge,
    /// Whether the state is unknown: 1 if so.
    Blind,
    /// Channels set aside by the fit.
    Suspects,
    /// χ² of the fit over its limit.
    Fit,
    /// Spread of a learned source that had been narrowed, % of the configured spread.
    SourceWidened,
    /// Distance of a learned reactance from the configured one, where it is beyond two of its spreads, %.
    SourceMoved,
}

/// Which way is bad.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Direction {
    /// At or below the setpoint.
    Low,
    /// At or above it.
    High,
}

/// What is the same for every alarm of a kind.
struct Facts {
    word: &'static str,
    unit: &'static str,
    direction: Direction,
    /// Setpoints that make sense.
    range: [f64; 2],
    message: &'static str,
    action: &'static str,
}

const ANY: [f64; 2] = [-1e6, 1e6];
const POSITIVE: [f64; 2] = [1e-6, 1e6];
const RELIEVE: &str = "Lower the transfer, insert a bypassed capacitor or return an open circuit";

const fn facts(
    word: &'static str,
    unit: &'static str,
    direction: Direction,
    range: [f64; 2],
    message: &'static str,
    action: &'static str,
) -> Facts {
    Facts { word, unit, direction, range, message, action }
}

/// In the order of the kinds.
static FACTS: [Facts; Kind::ALL.len()] = [
    facts("headroom_mw", "MW", Low, ANY, "Little room is left before the next outage is not survived", RELIEVE),
    facts(
        "headroom_pct",
        "%",
        Low,
        [-100.0, 100.0],
        "Little room is left before the next outage is not survived",
        RELIEVE,
    ),
    facts("angle_margin_deg", "°", Low, [0.0, 90.0], "The worst outage would leave a small angle margin", RELIEVE),
    facts("area_margin", "", Low, [-1.0, 1.0], "The worst outage would use up the decelerating area", RELIEVE),
    facts(
        "clearing_reserve_ms",
        "ms",
        Low,
        [-2000.0, 2000.0],
        "The worst fault leaves little time beyond the protection's own",
        "Lower the transfer, and see that no protection works on its backup time alone",
    ),
    facts(
        "standing_angle_deg",
        "°",
        High,
        [1e-6, 180.0],
        "The angle across an open circuit stands in the way of its return",
        "Lower the transfer to what the reclosing list says, then close the circuit",
    ),
    facts(
        "minutes_left",
        "min",
        Low,
        POSITIVE,
        "At the present trend nothing is left soon",
        "Ask for redispatch now, while there is time",
    ),
    facts(
        "loading_pct",
        "%",
        High,
        POSITIVE,
        "A circuit carries more than its continuous rating allows",
        "Lower the transfer or the reactive flow within the short-time rating's minutes",
    ),
    facts(
        "data_age_s",
        "s",
        High,
        POSITIVE,
        "No frame has come: what is shown is old",
        "Look at the telemetry link; watch the corridor by other means",
    ),
    facts(
        "blind",
        "",
        High,
        [1.0, 1.0],
        "Too little is measured to say how much room is left",
        "See which channels are missing; hold the transfer at its last known safe value",
    ),
    facts(
        "suspects",
        "",
        High,
        [1.0, 1e6],
        "A measurement disagrees with all others and is set aside",
        "Have the meter checked; the headroom goes on without it",
    ),
    facts(
        "fit",
        "",
        High,
        POSITIVE,
        "The measurements do not agree with each other",
        "Trust the headroom less; have impedances, ratios and meters checked",
    ),
    facts(
        "source_widened_pct",
        "%",
        High,
        POSITIVE,
        "What was learned of one side no longer fits what is seen",
        "Ask the neighbour what changed; the spread of the headroom is wide again until new steps are seen",
    ),
    facts(
        "source_moved_pct",
        "%",
        High,
        POSITIVE,
        "One side is far from its configured short-circuit power",
        "Compare with the last study, and have the configuration renewed if the grid has changed",
    ),
];

impl Kind {
    /// All of them.
    pub const ALL: [Self; 14] = [
        Self::HeadroomMw,
        Self::HeadroomPct,
        Self::AngleMargin,
        Self::AreaMargin,
        Self::ClearingReserve,
        Self::StandingAngle,
        Self::MinutesLeft,
        Self::Loading,
        Self::DataAge,
        Self::Blind,
        Self::Suspects,
        Self::Fit,
        Self::SourceWidened,
        Self::SourceMoved,
    ];

    /// Its word in the configuration.
    pub fn word(self) -> &'static str {
        self.facts().word
    }

    /// The kind of that word.
    pub fn from_word(word: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|kind| kind.word() == word)
    }

    /// Unit of its values; empty for numbers.
    pub fn unit(self) -> &'static str {
        self.facts().unit
    }

    /// Decimals that are worth reading.
    pub fn decimals(self) -> usize {
        match self {
            Self::AreaMargin => 2,
            Self::AngleMargin | Self::StandingAngle | Self::Fit => 1,
            _ => 0,
        }
    }

    /// Which way is bad.
    pub fn direction(self) -> Direction {
        self.facts().direction
    }

    /// Smallest and largest setpoint that makes sense.
    pub fn setpoints(self) -> [f64; 2] {
        self.facts().range
    }

    /// Setpoint where none is given; `None`: it must be.
    pub fn usual_setpoint(self) -> Option<f64> {
        matches!(self, Self::Blind | Self::Suspects | Self::Fit).then_some(1.0)
    }

    /// Whether it tells of a margin that shrinks, so that it can warn of the margin's end.
    pub fn warns(self) -> bool {
        use Kind::{AngleMargin, AreaMargin, ClearingReserve, HeadroomMw, HeadroomPct, MinutesLeft};
        matches!(self, HeadroomMw | HeadroomPct | AngleMargin | AreaMargin | ClearingReserve | MinutesLeft)
    }

    /// What it means, when the definition does not say.
    pub fn usual_message(self) -> &'static str {
        self.facts().message
    }

    /// What the operator can do, when the definition does not say.
    pub fn usual_action(self) -> &'static str {
        self.facts().action
    }

    fn facts(self) -> &'static Facts {
        &FACTS[self as usize]
    }
}

impl fmt::Display for Kind {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.word())
    }
}

impl Serialize for Kind {
    fn serialize<S: serde::Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.serialize_str(self.word())
    }
}
