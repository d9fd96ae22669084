use serde::{Deserialize, Serialize};

/// A part of a whole.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Share<'a, T> {
    /// Of what.
    pub of: &'a T,
    /// How long, ms.
    pub ms: i64,
    /// 0 to 1.
    pub part: f64,
}

/// How long each of a few things lasted, in the order in which they first came.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(transparent)]
pub struct Tallied<T>(Vec<(T, i64)>);

impl<T> Default for Tallied<T> {
    fn default() -> Self {
        Self(Vec::new())
    }
}

impl<T: Clone + PartialEq> Tallied<T> {
    pub(super) fn add(&mut self, what: T, ms: i64) {
        match self.0.iter_mut().find(|(known, _)| *known == what) {
            Some((_, sum)) => *sum += ms,
            None => self.0.push((what, ms)),
        }
    }

    pub(super) fn merge(&mut self, later: &Self) {
        later.0.iter().for_each(|(what, ms)| self.add(what.clone(), *ms));
    }

    /// How long one of them lasted, ms.
    pub fn ms(&self, what: &T) -> i64 {
        self.0.iter().find(|(known, _)| known == what).map_or(0, |(_, ms)| *ms)
    }

    /// All of them together, ms.
    pub fn total_ms(&self) -> i64 {
        self.0.iter().map(|(_, ms)| ms).sum()
    }

    /// The share of each in their sum, the longest first, and of equals the one that came first.
    pub fn shares(&self) -> Vec<Share<'_, T>> {
        let total = self.total_ms().max(1) as f64;
        let mut shares: Vec<_> =
            self.0.iter().map(|(of, ms)| Share { of, ms: *ms, part: *ms as f64 / total }).collect();
        shares.sort_by_key(|share| std::cmp::Reverse(share.ms));
        shares
    }
}
