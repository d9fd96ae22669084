//! Numbers beyond all others, for which JSON has none: they are written as `null`.

use serde::{Deserialize, Deserializer};

/// A time in seconds, or long before all times, which JSON has no number for.
pub(super) fn or_never<'de, D: Deserializer<'de>>(deserializer: D) -> Result<f64, D::Error> {
    Ok(Option::deserialize(deserializer)?.unwrap_or(f64::NEG_INFINITY))
}

/// Spreads, or none that is large enough, likewise.
pub(super) fn or_ever<'de, D: Deserializer<'de>>(deserializer: D) -> Result<[f64; 2], D::Error> {
    Ok(<[Option<f64>; 2]>::deserialize(deserializer)?.map(|spread| spread.unwrap_or(f64::INFINITY)))
}
