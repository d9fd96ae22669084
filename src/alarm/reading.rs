//! From an assessment to the value that an alarm watches.

use std::sync::Arc;

use super::Kind;
use crate::{
    desk::{Assessment, Basis, SourceRecord, State},
    grid::{ConfiguredSource, Corridor},
    margin::OutageRecord,
};

/// A source counts as narrowed once its spread is below this part of the configured one.
const NARROW: f64 = 0.5;
/// A distance counts beyond so many spreads: 95 % of a normal distribution.
const SPREADS: f64 = 2.0;

/// The value of a kind at a frame.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Reading<'a> {
    /// A value, and what it is of: an outage, a circuit, a channel, a bus.
    Value(f64, Option<&'a Arc<str>>),
    /// There is no such thing now, so nothing is wrong with it.
    Absent,
    /// It cannot be told.
    Unknown,
}

use Reading::{Absent, Unknown, Value};

/// What of a corridor its readings need.
#[derive(Debug, Clone)]
pub(super) struct Reader {
    clear_ms: Option<f64>,
    /// Spreads taken off the headroom, as for the corridor's state.
    state_spreads: f64,
    configured: [ConfiguredSource; 2],
    /// Sides whose spread was once much narrower than configured.
    pub narrowed: [bool; 2],
}

impl Reader {
    pub fn new(corridor: &Corridor) -> Self {
        Self {
            clear_ms: corridor.fault.map(|fault| fault.clear_ms),
            state_spreads: corridor.state_spreads,
            configured: corridor.sides.map(|side| side.source),
            narrowed: [false; 2],
        }
    }

    /// Keeps what later readings are compared with.
    pub fn remember(&mut self, assessment: &Assessment) {
        for ((source, configured), narrowed) in assessment.sources.iter().zip(&self.configured).zip(&mut self.narrowed)
        {
            *narrowed |= source.basis == Basis::Learned && source.x_sd < NARROW * configured.x_sd_ohm();
        }
    }

    /// The same memory for a corridor that was configured anew.
    pub fn carry(&mut self, before: &Self) {
        self.narrowed = before.narrowed;
    }

    pub fn read<'a>(&self, kind: Kind, assessment: &'a Assessment) -> Reading<'a> {
        let reading = match kind {
            Kind::DataAge => Value(0.0, None),
            Kind::Blind => Value(f64::from(u8::from(assessment.state == State::Blind)), None),
            Kind::Suspects => Value(assessment.fit.suspects.len() as f64, assessment.fit.suspects.first()),
            Kind::Fit => match (assessment.fit.chi2, assessment.fit.limit) {
                (Some(chi2), Some(limit)) => Value(chi2 / limit, None),
                _ => Absent,
            },
            Kind::SourceWidened => worst_source(assessment, |side, source| self.widened(side, source)),
            Kind::SourceMoved => worst_source(assessment, |side, source| self.moved(side, source)),
            _ if assessment.state == State::Blind => Unknown,
            Kind::HeadroomMw => of_binding(assessment, self.headroom_mw(assessment)),
            Kind::HeadroomPct => of_binding(assessment, self.headroom_pct(assessment)),
            Kind::AngleMargin => lowest(assessment, |outage| Some(outage.angle_margin_deg.unwrap_or(0.0))),
            Kind::AreaMargin => lowest(assessment, |outage| outage.area_margin),
            Kind::ClearingReserve => lowest(assessment, |outage| Some(outage.critical_ms? - self.clear_ms?)),
            Kind::StandingAngle => standing_angle(assessment),
            Kind::MinutesLeft if assessment.state == State::Spent => of_binding(assessment, Some(0.0)),
            Kind::MinutesLeft => of_binding(assessment, assessment.minutes_to_spent),
            Kind::Loading => assessment
                .intact
                .as_ref()
                .and_then(|intact| Some(Value(intact.loading_pct?, intact.loaded_circuit.as_ref())))
                .unwrap_or(Absent),
        };
        match reading {
            Value(value, _) if !value.is_finite() => Unknown,
            reading => reading,
        }
    }

    /// The headroom by which the corridor's state is judged.
    fn headroom_mw(&self, assessment: &Assessment) -> Option<f64> {
        Some(assessment.headroom_mw? - self.state_spreads * assessment.headroom_sd_mw.unwrap_or(0.0))
    }

    /// Of a limit that is nothing, nothing is left; below −100 % a percentage says no more.
    fn headroom_pct(&self, assessment: &Assessment) -> Option<f64> {
        let headroom_mw = self.headroom_mw(assessment)?;
        let limit_mw = assessment.transfer_mw? + headroom_mw;
        Some(if limit_mw > 0.0 { (100.0 * headroom_mw / limit_mw).max(-100.0) } else { -100.0 })
    }

    fn widened(&self, side: usize, source: &SourceRecord) -> Option<f64> {
        self.narrowed[side].then(|| 100.0 * source.x_sd / self.configured[side].x_sd_ohm())
    }

    fn moved(&self, side: usize, source: &SourceRecord) -> Option<f64> {
        let configured_ohm = self.configured[side].x_ohm;
        let moved_ohm = (source.x_ohm - configured_ohm).abs();
        let counts = source.basis == Basis::Learned && configured_ohm > 0.0;
        counts.then(|| if moved_ohm > SPREADS * source.x_sd { 100.0 * moved_ohm / configured_ohm } else { 0.0 })
    }
}

fn of_binding(assessment: &Assessment, value: Option<f64>) -> Reading<'_> {
    value.map_or(Absent, |value| Value(value, assessment.binding.as_ref().and_then(|binding| binding.outage.as_ref())))
}

/// The outage with the lowest value; those that separate the corridor have none.
fn lowest(assessment: &Assessment, value: impl Fn(&OutageRecord) -> Option<f64>) -> Reading<'_> {
    let outages = assessment.outages.iter().filter(|outage| !outage.separates);
    let values = outages.filter_map(|outage| Some((value(outage)?, &outage.name)));
    values.min_by(|(a, _), (b, _)| a.total_cmp(b)).map_or(Absent, |(value, outage)| Value(value, Some(outage)))
}

fn standing_angle(assessment: &Assessment) -> Reading<'_> {
    let angles = assessment.reclose.iter().filter_map(|open| Some((open.angle_deg?, &open.circuit)));
    match angles.max_by(|(a, _), (b, _)| a.total_cmp(b)) {
        Some((angle_deg, circuit)) => Value(angle_deg, Some(circuit)),
        None if assessment.reclose.is_empty() => Absent,
        None => Unknown,
    }
}

fn worst_source(assessment: &Assessment, value: impl Fn(usize, &SourceRecord) -> Option<f64>) -> Reading<'_> {
    let sources = assessment.sources.iter().enumerate();
    let values = sources.filter_map(|(side, source)| Some((value(side, source)?, &source.bus)));
    values.max_by(|(a, _), (b, _)| a.total_cmp(b)).map_or(Absent, |(value, bus)| Value(value, Some(bus)))
}
