//! Times within JSON, RFC 3339 in full and within its years.

use chrono::{DateTime, SecondsFormat, Utc};
use serde::{Deserialize, Deserializer, Serializer, de::Error};

pub(crate) fn text(time: &DateTime<Utc>) -> String {
    time.to_rfc3339_opts(SecondsFormat::AutoSi, true)
}

pub(crate) fn serialize<S: Serializer>(time: &DateTime<Utc>, serializer: S) -> Result<S::Ok, S::Error> {
    serializer.serialize_str(&text(time))
}

pub(crate) fn deserialize<'de, D: Deserializer<'de>>(deserializer: D) -> Result<DateTime<Utc>, D::Error> {
    super::rfc3339(&String::deserialize(deserializer)?).map_err(D::Error::custom)
}

/// The same for a time that may be missing.
pub(crate) mod optional {
    use super::{DateTime, Deserialize, Deserializer, Error, Serializer, Utc};

    #[allow(clippy::ref_option, reason = "serde calls it so")]
    pub(crate) fn serialize<S: Serializer>(time: &Option<DateTime<Utc>>, serializer: S) -> Result<S::Ok, S::Error> {
        match time {
            Some(time) => super::serialize(time, serializer),
            None => serializer.serialize_none(),
        }
    }

    pub(crate) fn deserialize<'de, D: Deserializer<'de>>(deserializer: D) -> Result<Option<DateTime<Utc>>, D::Error> {
        let text = Option::<String>::deserialize(deserializer)?;
        text.map(|text| super::super::rfc3339(&text)).transpose().map_err(D::Error::custom)
    }
}
