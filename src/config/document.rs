use toml_edit::{Document, Key, TomlError};

use super::{
    error::ConfigError,
    wording::{printable, shown_key},
};

/// Follows the text of a duplicate key that was renamed so that the rest of the document can be read.
const DUPLICATE_MARK: char = '\0';
/// Duplicates looked at before giving up: each costs a parse.
const MOST_DUPLICATES: usize = 20;

/// Parses TOML into a document that has the lines of the text.
///
/// Duplicate keys do not stop it: they are renamed, and [`original_of_duplicate`] knows them.
pub(crate) fn parse(text: &str) -> Result<Document<String>, ConfigError> {
    let mut text = text.to_owned();
    let mut duplicates = 0;
    loop {
        let error = match Document::parse(text.clone()) {
            Ok(document) => return Ok(document),
            Err(error) => error,
        };
        let fresh = duplicate(&text, &error).filter(|key| original_of_duplicate(key.get()).is_none());
        let (Some(key), Some(span), true) = (fresh, error.span(), duplicates < MOST_DUPLICATES) else {
            return Err(syntax_error(&text, &error));
        };
        let unique = format!("{}{DUPLICATE_MARK}{duplicates}", key.get());
        text.replace_range(span, &Key::new(unique).display_repr());
        duplicates += 1;
    }
}

/// The key a renamed duplicate had.
pub(crate) fn original_of_duplicate(key: &str) -> Option<&str> {
    key.split_once(DUPLICATE_MARK).map(|(original, _)| original)
}

/// The duplicate key that an error is about.
fn duplicate(text: &str, error: &TomlError) -> Option<Key> {
    let span = error.span().filter(|_| error.message() == "duplicate key")?;
    Key::parse(text.get(span)?).ok()?.pop()
}

fn syntax_error(text: &str, error: &TomlError) -> ConfigError {
    let at = error.span().map_or(text.len(), |span| span.start);
    let before = text.get(..at).unwrap_or(text);
    let line = before.matches('\n').count();
    // The key that the line gives, as far as one can be made out.
    let key = text.lines().nth(line).and_then(|line| Key::parse(line.split_once('=')?.0).ok());
    let key = duplicate(text, error).map_or(key, |key| Some(vec![key]));
    let shown = |key: &Key| shown_key(original_of_duplicate(key.get()).unwrap_or(key.get()));
    ConfigError {
        line: Some(line + 1),
        key: key.unwrap_or_default().iter().map(shown).collect::<Vec<_>>().join("."),
        message: format!("not valid TOML: {}", printable(error.message())),
    }
}
