//! Foreign text in our own sentences: bounded, and free of what could disturb a terminal.

/// Characters of a foreign text that a message quotes.
const LONGEST_QUOTE: usize = 60;
/// Candidates that a message lists when none is near.
const LONGEST_LIST: usize = 12;
/// Jaro-Winkler similarity (Winkler 1990) from which a name counts as near.
const NEAR: f64 = 0.8;

/// Control characters, and those that are invisible or turn the direction of writing.
pub(crate) fn is_unprintable(c: char) -> bool {
    c.is_control()
        || matches!(c, '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}')
}

/// The text without what cannot be printed.
pub(crate) fn printable(text: &str) -> String {
    text.chars().filter(|c| !is_unprintable(*c)).collect()
}

/// In quotation marks, what cannot be printed as escapes, and cut where it is long.
pub(crate) fn quoted(text: &str) -> String {
    match text.char_indices().nth(LONGEST_QUOTE) {
        Some((end, _)) => format!("{:?}...", &text[..end]),
        None => format!("{text:?}"),
    }
}

/// A key as it would be written in TOML.
pub(crate) fn shown_key(key: &str) -> String {
    let is_bare = !key.is_empty() && key.bytes().all(|b| b.is_ascii_alphanumeric() || b"_-".contains(&b));
    if is_bare && key.len() <= LONGEST_QUOTE { key.to_owned() } else { quoted(key) }
}

/// A number as one would write it, with an exponent where it is far from one.
pub(crate) fn shown_number(number: f64) -> String {
    let is_plain = number == 0.0 || (1e-4..1e9).contains(&number.abs());
    if is_plain { format!("{number}") } else { format!("{number:e}") }
}

/// What could have been meant instead: the nearest candidate, or all of them where they are few.
pub(crate) fn advice<'a>(given: &str, candidates: impl IntoIterator<Item = &'a str>) -> String {
    let given = &given[..given.char_indices().nth(LONGEST_QUOTE).map_or(given.len(), |(end, _)| end)];
    let candidates: Vec<_> = candidates.into_iter().collect();
    let similarity = |candidate: &&str| strsim::jaro_winkler(&given.to_lowercase(), &candidate.to_lowercase());
    let nearest = candidates.iter().copied().max_by(|a, b| similarity(a).total_cmp(&similarity(b)));
    match nearest {
        None => "there are none".to_owned(),
        Some(nearest) if similarity(&nearest) >= NEAR => format!("did you mean {}?", quoted(nearest)),
        Some(_) => {
            let shown: Vec<_> = candidates.iter().take(LONGEST_LIST).map(|candidate| quoted(candidate)).collect();
            let more = if candidates.len() > LONGEST_LIST { ", ..." } else { "" };
            format!("possible: {}{more}", shown.join(", "))
        }
    }
}
