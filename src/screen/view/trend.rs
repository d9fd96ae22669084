//! Better or worse, and for how long: in words, and as a strip.

use super::figures;
use crate::{
    desk::State,
    screen::state::{History, Track},
};

/// Minutes that a change is told over.
const SPAN_MIN: usize = 10;
/// A change below this share of the limit is called steady.
const STEADY: f64 = 0.02;

/// The trend of the headroom with its arrow.
pub fn words(track: &Track) -> String {
    let assessment = &track.latest;
    let thin = assessment.minutes_to_thin.filter(|_| assessment.state == State::Ample);
    if let Some(minutes) = thin {
        return format!("↘ thin in {}", figures::minutes(minutes));
    }
    if let Some(minutes) = assessment.minutes_to_spent.filter(|_| assessment.state != State::Spent) {
        return format!("↘ spent in {}", figures::minutes(minutes));
    }
    let (Some(headroom), Some(transfer)) = (assessment.headroom_mw, assessment.transfer_mw) else {
        return figures::NONE.into();
    };
    match track.history.gained_mw(SPAN_MIN) {
        None => "→ not known yet".into(),
        Some(gained) if gained.abs() < STEADY * (headroom + transfer).abs() => "→ steady".into(),
        Some(gained) => {
            let arrow = if gained > 0.0 { '↗' } else { '↘' };
            format!("{arrow} {} MW/{SPAN_MIN}min", figures::headroom(Some(gained)))
        }
    }
}

/// The last minutes as a strip of bars from zero up, newest at the right; `✕` at or below zero, blank where unknown.
pub fn strip(history: &History, width: usize) -> String {
    bars(history.minutes().skip(history.minutes().len().saturating_sub(width)))
}

/// A bar for each value, from zero up to the highest; `✕` at or below zero, blank where unknown.
pub fn bars(values: impl Iterator<Item = Option<f64>>) -> String {
    const BARS: [char; 8] = ['▁', '▂', '▃', '▄', '▅', '▆', '▇', '█'];
    let values: Vec<_> = values.collect();
    let highest = values.iter().copied().flatten().fold(f64::MIN_POSITIVE, f64::max);
    let bar = |value: f64| {
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "0 to 7")]
        let level = (value / highest * 7.0).round().clamp(0.0, 7.0) as usize;
        BARS[level]
    };
    values
        .into_iter()
        .map(|value| match value {
            None => ' ',
            Some(value) if value <= 0.0 => '✕',
            Some(value) => bar(value),
        })
        .collect()
}
