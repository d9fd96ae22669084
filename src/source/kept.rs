//! A learner as a whole, to go on elsewhere exactly where it stood.

use chrono::{DateTime, Datelike, Utc};

use super::{
    Estimate, Learner,
    estimate::Belief,
    learner::{HISTORY, LOGGED},
    store::StoreError,
};

impl Learner {
    /// Everything of it that what follows depends on.
    #[must_use]
    pub fn kept(&self) -> Self {
        Self { detector: self.detector.kept(), ..self.clone() }
    }

    /// Whether it learns at all.
    pub fn is_enabled(&self) -> bool {
        self.settings.enabled
    }

    /// Goes on where another one stood, if it learned from the same configured sources, by the same settings, and makes
    /// sense.
    pub fn resume(&mut self, kept: Self) -> Result<(), StoreError> {
        if !self.settings.enabled {
            return Ok(());
        }
        if kept.configured != self.configured {
            return Err(StoreError::OtherSources);
        }
        let times = kept.steps.iter().map(|step| step.time).chain(kept.history.iter().map(|point| point.time));
        let Estimate { mean, covariance, steps } = kept.estimate;
        let is_possible = [kept.belief, Belief { mean, covariance }].iter().all(|it| it.is_within(&self.configured))
            && steps.iter().all(|steps| *steps < u64::MAX / 2)
            && (0.0..=1.0).contains(&kept.both)
            && kept.steps.len() <= LOGGED
            && kept.history.len() <= HISTORY
            && times.into_iter().all(|time: DateTime<Utc>| (0..=9999).contains(&time.year()))
            && kept.detector.is_possible(&self.settings);
        if !is_possible {
            return Err(StoreError::Impossible);
        }
        *self = Self { settings: self.settings, ..kept };
        Ok(())
    }
}
