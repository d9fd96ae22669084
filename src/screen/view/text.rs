use std::borrow::Cow;

use ratatui::text::{Line, Span};
use unicode_width::{UnicodeWidthChar, UnicodeWidthStr};

/// Text from outside, without what could steer a terminal or turn reading order around.
pub fn clean(text: &str) -> Cow<'_, str> {
    if text.chars().any(is_hostile) {
        Cow::Owned(text.chars().map(|char| if is_hostile(char) { '·' } else { char }).collect())
    } else {
        Cow::Borrowed(text)
    }
}

/// Control characters, line separators and bidirectional controls (Unicode annexes 9 and 14).
fn is_hostile(char: char) -> bool {
    char.is_control()
        || matches!(char, '\u{61c}' | '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}')
}

/// Cleaned and cut to a width, with an ellipsis where something is lost.
pub fn cut(text: &str, width: usize) -> String {
    let text = clean(text);
    if text.width() <= width {
        return text.into_owned();
    }
    let mut kept = String::new();
    let mut used = 0;
    for char in text.chars() {
        used += char.width().unwrap_or(0);
        if used >= width {
            break;
        }
        kept.push(char);
    }
    if width > 0 {
        kept.push('…');
    }
    kept
}

/// Cleaned, and cut or filled up to exactly a width.
pub fn left(text: &str, width: usize) -> String {
    let text = cut(text, width);
    let gap = width.saturating_sub(text.width());
    text + &" ".repeat(gap)
}

/// The same, against the right edge.
pub fn right(text: &str, width: usize) -> String {
    let text = cut(text, width);
    " ".repeat(width.saturating_sub(text.width())) + &text
}

/// Wraps words to lines of a width; what comes after the first is indented.
pub fn wrap(text: &str, width: usize, indent: usize) -> Vec<String> {
    let mut lines = Vec::new();
    let mut line = String::new();
    for word in clean(text).split_whitespace() {
        if !line.trim().is_empty() && line.width() + 1 + word.width() > width {
            lines.push(std::mem::replace(&mut line, " ".repeat(indent)));
        } else if !line.trim().is_empty() {
            line.push(' ');
        }
        line.push_str(word);
    }
    lines.push(line);
    lines
}

/// Something at the left edge and something at the right; the left one gives way.
pub fn spread<'a>(left: Vec<Span<'a>>, right: Vec<Span<'a>>, width: usize) -> Line<'a> {
    let right_width: usize = right.iter().map(Span::width).sum();
    let mut room = width.saturating_sub(right_width);
    let mut spans = Vec::new();
    for span in left {
        let text = cut(&span.content, room);
        room -= text.width().min(room);
        spans.push(Span::styled(text, span.style));
    }
    spans.push(Span::raw(" ".repeat(room)));
    spans.extend(right);
    Line::from(spans)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_from_outside_is_tamed_and_measured() {
        assert_eq!(clean("SV\u{1b}[31m1\u{202e}x\u{85}"), "SV·[31m1·x·");
        for (text, width, expected) in [
            ("Skarn", 8, "Skarn   "),
            ("Skarn-Velm", 6, "Skarn…"),
            ("東西線", 5, "東西…"),
            ("東西線", 4, "東… "),
            ("x", 0, ""),
        ] {
            assert_eq!(left(text, width), expected);
            assert_eq!(right(text, width).width(), width);
        }
        assert_eq!(wrap("how many more may it carry", 10, 2), ["how many", "  more may", "  it carry"]);
        assert_eq!(wrap("", 10, 2), [""]);
    }

    #[test]
    fn the_right_edge_is_kept() {
        let line = spread(vec!["a long left text".into()], vec!["right".into()], 12);
        assert_eq!(line.to_string(), "a long…right");
        assert_eq!(spread(vec!["left".into()], vec!["right".into()], 12).to_string(), "left   right");
    }
}
