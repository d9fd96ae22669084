//! JSON Lines: `{"time":"2031-03-14T05:00:00Z","values":{"Skarn.kv":408.0},"quality":{"Skarn.kv":"questionable"}}`.

use std::{borrow::Cow, fmt};

use serde::{
    Deserialize,
    de::{Deserializer, MapAccess, Visitor},
};
use serde_json::value::RawValue;

use super::{Aside, Channels, Frame, Quality, Tally, draft::Draft, line_error::LineError, rfc3339};

/// Reads the frame on one line.
pub(super) fn frame(
    line: &[u8],
    channels: &Channels,
    draft: &mut Draft,
    tally: &mut Tally,
) -> Result<Frame, LineError> {
    let text = str::from_utf8(line).map_err(|_| LineError::NotUtf8)?;
    match object(text) {
        Ok(object) => object.frame(channels, draft, tally),
        Err(error) => {
            let lenient = with_null_for_bare_words(text).ok_or(error)?;
            object(&lenient)?.frame(channels, draft, tally)
        }
    }
}

fn object(text: &str) -> Result<Object<'_>, LineError> {
    // The derived code would take an array for the fields in their order.
    if text.trim_start().starts_with('{') { Ok(serde_json::from_str(text)?) } else { Err(LineError::NoObject) }
}

/// A line taken apart; what it says is not looked at yet.
#[derive(Deserialize)]
struct Object<'a> {
    #[serde(borrow)]
    time: Cow<'a, str>,
    #[serde(borrow)]
    values: Entries<'a>,
    #[serde(borrow)]
    quality: Option<Entries<'a>>,
    #[serde(borrow)]
    tautline: Option<&'a RawValue>,
}

impl Object<'_> {
    fn frame(&self, channels: &Channels, draft: &mut Draft, tally: &mut Tally) -> Result<Frame, LineError> {
        let time = rfc3339(&self.time)?;
        for (Name(name), value) in &self.values.0 {
            match channels.in_feed(name) {
                Some(slot) => draft.value(channels, slot, value.get().parse().ok(), tally),
                None => tally.unknown.count(name),
            }
        }
        for (Name(name), quality) in self.quality.iter().flat_map(|entries| &entries.0) {
            if let Some(slot) = channels.in_feed(name) {
                draft.quality(slot, Quality::from_word(quality.get().trim_matches('"')));
            }
        }
        let aside = self.tautline.and_then(|text| Aside::read(text.get(), channels, &tally.untaken));
        Ok(Frame { aside, ..draft.finish(time) })
    }
}

/// An object by channel name, in its own order and with what is given twice.
struct Entries<'a>(Vec<(Name<'a>, &'a RawValue)>);

#[derive(Deserialize)]
#[serde(transparent)]
struct Name<'a>(#[serde(borrow)] Cow<'a, str>);

impl<'de: 'a, 'a> Deserialize<'de> for Entries<'a> {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_map(EntriesVisitor)
    }
}

struct EntriesVisitor;

impl<'de> Visitor<'de> for EntriesVisitor {
    type Value = Entries<'de>;

    fn expecting(&self, f: &mut fmt::Formatter) -> fmt::Result {
        f.write_str("an object by channel name")
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Entries<'de>, A::Error> {
        let mut entries = Vec::with_capacity(32);
        while let Some(entry) = map.next_entry()? {
            entries.push(entry);
        }
        Ok(Entries(entries))
    }
}

/// The line with `null` for NaN, Infinity and -Infinity, which JSON lacks but Python writes; `None` if there are none.
fn with_null_for_bare_words(line: &str) -> Option<String> {
    let mut lenient = String::with_capacity(line.len());
    let mut rest = line;
    let mut found = false;
    while let Some(start) = rest.find(['"', 'N', 'I', '-']) {
        let (before, from) = rest.split_at(start);
        lenient.push_str(before);
        let word = ["NaN", "Infinity", "-Infinity"].into_iter().find(|word| from.starts_with(word));
        let length = match word {
            Some(word) => word.len(),
            None if from.starts_with('"') => string_length(from),
            None => 1,
        };
        lenient.push_str(if word.is_some() { "null" } else { &from[..length] });
        found |= word.is_some();
        rest = &from[length..];
    }
    lenient.push_str(rest);
    found.then_some(lenient)
}

/// Bytes of the JSON string that the text starts with, quotes included.
fn string_length(text: &str) -> usize {
    let mut escaped = false;
    let closing = text.bytes().skip(1).position(|byte| {
        let closes = byte == b'"' && !escaped;
        escaped = byte == b'\\' && !escaped;
        closes
    });
    closing.map_or(text.len(), |closing| closing + 2)
}
