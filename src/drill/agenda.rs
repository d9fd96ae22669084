//! What will happen in a corridor, in order of time.

use super::{
    Action, CorridorTruth,
    chance::{Draw, Purpose, draw_steps, stream},
};

/// Something due.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Due {
    Action(Action),
    /// The circuit's fault is cleared by opening it.
    Clear(usize),
    Random {
        side: usize,
        draw: Draw,
    },
    RandomBoth([Draw; 2]),
}

/// Everything due, soonest last; of one instant, in the order of the scenario.
pub(super) fn agenda(truth: &CorridorTruth, duration_s: f64, seed: u64) -> Vec<(f64, Due)> {
    let mut due = Vec::new();
    for event in &truth.events {
        due.push((event.at_s, Due::Action(event.action)));
        if let Action::Fault { circuit, fault } = event.action {
            due.push((event.at_s + fault.clear_ms / 1000.0, Due::Clear(circuit)));
        }
    }
    for (side, purpose) in [Purpose::StepsFrom, Purpose::StepsTo].into_iter().enumerate() {
        if let Some(steps) = &truth.sides[side].steps {
            let drawn = draw_steps(steps, duration_s, stream(seed, truth.corridor, purpose));
            due.extend(drawn.into_iter().map(|(at_s, [draw, _])| (at_s, Due::Random { side, draw })));
        }
    }
    if let Some(steps) = &truth.coincident_steps {
        let drawn = draw_steps(steps, duration_s, stream(seed, truth.corridor, Purpose::CoincidentSteps));
        due.extend(drawn.into_iter().map(|(at_s, draws)| (at_s, Due::RandomBoth(draws))));
    }
    due.sort_by(|a, b| a.0.total_cmp(&b.0));
    due.reverse();
    due
}
