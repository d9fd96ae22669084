//! A recording in a few lines of text for each corridor.

use std::{fmt, sync::Arc};

use chrono::{DateTime, TimeDelta, Utc};
use chrono_tz::Tz;

use super::CAUTION;
use crate::{
    desk::{Assessment, Binding, State},
    grid::Grid,
};

/// Takes in assessments frame by frame, and says at the end what became of each corridor.
#[derive(Debug)]
pub struct Summary {
    grid: Arc<Grid>,
    zone: Tz,
    max_age: TimeDelta,
    frames: u64,
    first: Option<DateTime<Utc>>,
    last: Option<DateTime<Utc>>,
    corridors: Vec<Tally>,
}

/// What is remembered of one corridor.
#[derive(Debug, Clone, Default)]
struct Tally {
    /// Lowest and highest transfer, MW, positive from `from` to `to`.
    transfer_mw: Option<(f64, f64)>,
    least: Option<Least>,
    /// Seconds in each of [`STATES`], then without data.
    seconds: [f64; 5],
    before: Option<(DateTime<Utc>, State)>,
}

#[derive(Debug, Clone)]
struct Least {
    headroom_mw: f64,
    time: DateTime<Utc>,
    binding: Option<Binding>,
}

const STATES: [State; 4] = [State::Ample, State::Thin, State::Spent, State::Blind];
const NO_DATA: usize = 4;

impl Summary {
    /// Nothing taken in yet. A state lasts until the next frame, but at most `max_age`: what follows is without data.
    pub fn new(grid: Arc<Grid>, zone: Tz, max_age: TimeDelta) -> Self {
        let corridors = vec![Tally::default(); grid.corridors.len()];
        Self { grid, zone, max_age, frames: 0, first: None, last: None, corridors }
    }

    /// Takes in all corridors at one frame, in the order of the configuration.
    pub fn take(&mut self, assessments: &[Assessment]) {
        self.frames += 1;
        for ((tally, corridor), assessment) in self.corridors.iter_mut().zip(&self.grid.corridors).zip(assessments) {
            self.first = self.first.or(Some(assessment.time));
            self.last = Some(assessment.time);
            let is_reversed = assessment.exporter.as_ref().is_some_and(|exporter| *exporter != corridor.buses[0].name);
            tally.take(assessment, is_reversed, self.max_age);
        }
    }
}

impl Tally {
    fn take(&mut self, assessment: &Assessment, is_reversed: bool, max_age: TimeDelta) {
        let time = assessment.time;
        if let Some((since, state)) = self.before.replace((time, assessment.state)) {
            let lasted = time - since;
            let place = STATES.iter().position(|known| *known == state).unwrap_or(NO_DATA);
            self.seconds[place] += lasted.min(max_age).as_seconds_f64();
            self.seconds[NO_DATA] += (lasted - max_age).max(TimeDelta::zero()).as_seconds_f64();
        }
        if let Some(transfer) = assessment.transfer_mw {
            let signed = if is_reversed { -transfer } else { transfer };
            let (low, high) = self.transfer_mw.unwrap_or((signed, signed));
            self.transfer_mw = Some((low.min(signed), high.max(signed)));
        }
        if let Some(headroom_mw) = assessment.headroom_mw
            && self.least.as_ref().is_none_or(|least| headroom_mw < least.headroom_mw)
        {
            self.least = Some(Least { headroom_mw, time, binding: assessment.binding.clone() });
        }
    }
}

impl fmt::Display for Summary {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (Some(first), Some(last)) = (self.first, self.last) else {
            return writeln!(f, "Not a single frame.\n\n{CAUTION}");
        };
        let local = |time: DateTime<Utc>| time.with_timezone(&self.zone);
        writeln!(f, "{} to {}, {} frames", local(first).format(LONG), local(last).format(LONG), self.frames)?;
        for (corridor, tally) in self.grid.corridors.iter().zip(&self.corridors) {
            let [from, to] = [0, 1].map(|bus| plain(&corridor.buses[bus].name));
            writeln!(f, "\n{}", plain(&corridor.name))?;
            match tally.transfer_mw {
                None => writeln!(f, "  transfer        never known")?,
                Some((low, high)) => {
                    writeln!(f, "  transfer        {low:.0} to {high:.0} MW, positive from {from} to {to}")?;
                }
            }
            match &tally.least {
                None => writeln!(f, "  least headroom  never known")?,
                Some(least) => writeln!(
                    f,
                    "  least headroom  {:+.0} MW at {}{}",
                    least.headroom_mw.floor(),
                    local(least.time).format("%H:%M:%S"),
                    why(least.binding.as_ref())
                )?,
            }
            let names = STATES.iter().map(|state| state.word()).chain(["without data"]);
            let minutes = names.zip(tally.seconds).filter(|(_, seconds)| *seconds > 0.0);
            let minutes: Vec<_> = minutes.map(|(name, seconds)| format!("{name} {:.1}", seconds / 60.0)).collect();
            writeln!(f, "  minutes         {}", minutes.join(", "))?;
        }
        writeln!(f, "\n{CAUTION}")
    }
}

const LONG: &str = "%-d %b %Y %H:%M:%S %Z";

/// A name without what could steer a terminal.
fn plain(name: &str) -> String {
    name.chars().map(|char| if char.is_control() { '·' } else { char }).collect()
}

fn why(binding: Option<&Binding>) -> String {
    let Some(binding) = binding else { return String::new() };
    let outage = binding.outage.as_ref().map_or("nothing lost".into(), |name| format!("{} out", plain(name)));
    format!(": {outage}, by {}", binding.criterion.word())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::screen::state::sample;

    #[test]
    fn a_day_is_told_in_a_few_lines() {
        let mut summary = Summary::new(sample::grid(&["Skarn-\u{1b}Velm"]), Tz::UTC, TimeDelta::seconds(10));
        let mut reversed = sample::at(240, 300.0);
        (reversed.exporter, reversed.transfer_mw) = (Some("Velm".into()), Some(310.0));
        for (second, headroom_mw) in [(0, 212.0), (5, 40.5), (10, -3.2), (15, 60.0), (180, 212.0)] {
            summary.take(&[sample::at(second, headroom_mw)]);
        }
        summary.take(&[reversed]);
        let told = summary.to_string();
        let told: Vec<_> = told.lines().take(6).collect();
        assert_eq!(
            told,
            [
                "14 Mar 2031 05:00:00 UTC to 14 Mar 2031 05:04:00 UTC, 6 frames",
                "",
                "Skarn-·Velm",
                "  transfer        -310 to 1284 MW, positive from Skarn to Velm",
                "  least headroom  -4 MW at 05:00:10: SV2 out, by angle",
                "  minutes         ample 0.2, thin 0.2, spent 0.1, without data 3.4",
            ]
        );
        assert!(summary.to_string().contains("tautline advises."));
    }
}
