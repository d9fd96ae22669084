//! What the figures of a review mean.

/// Each with its meaning.
pub(super) const DEFINITIONS: [(&str, &str); 15] = [
    (
        "transfer",
        "MW from the exporting terminal into the circuits; here positive from the corridor's first terminal to \
      its second, so that a reversal shows as a change of sign.",
    ),
    (
        "headroom",
        "The smallest transfer at which any criterion first fails after any outage judged, or on the intact \
      corridor, less the present transfer. Negative: MW to take off. Whole megawatts are rounded down.",
    ),
    ("spread", "One standard deviation of the headroom, from how well the sources behind the terminals are known."),
    (
        "set by",
        "The outage and the criterion with the smallest limit. A share of time is of the time with a known \
      headroom. Nothing lost: the intact corridor sets it.",
    ),
    (
        "criteria",
        "Angle: an equilibrium with the required angle margin. Area: the required area margin of the first \
      swing. Loading: no circuit above its short-time rating (intact: its continuous rating). Voltage: no bus under its \
      floor. Separation: the outage parts the two sides.",
    ),
    (
        "ample, thin, spent, blind",
        "Headroom above the thin threshold; below it; at or below zero; no state, because too \
      little was measured. Spreads are taken off first where the configuration asks for it.",
    ),
    (
        "minutes",
        "A state lasts until the next frame, but no longer than a value stands (feed.max_age_s), nor past \
      midnight UTC. What follows is without data.",
    ),
    (
        "availability",
        "Time with data, as a part of the time from the first to the last frame; of a corridor, time with a \
      known state.",
    ),
    (
        "headroom for N % of the time",
        "The duration curve: the most whole megawatts that were there for that part of the \
      time with a known headroom.",
    ),
    ("course", "Slots of equal time with the lowest and the highest value in each, and the worst state."),
    ("would have been", "The same frames with the changes of the what-if: everything but these is as recorded."),
    (
        "no balance",
        "The changes of the what-if ask for more than the corridor can carry: no headroom is left that a number could \
      tell. It counts as spent, and as less than any headroom.",
    ),
    (
        "missing, set aside",
        "Time for which a channel brought no usable value, or did not fit the others and was left out.",
    ),
    (
        "sources",
        "Resistance and reactance behind each terminal, one standard deviation after the ±; configured, or learned \
      from so many steps.",
    ),
    ("alarms", "How often each was raised as configured now, whatever was configured then."),
];
