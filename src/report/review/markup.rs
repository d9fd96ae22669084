//! Text and tables as markup that is well-formed as XML too. Everything from outside goes through [`escape`].

/// Adds to a text as `format!` would.
macro_rules! put {
    ($text:ident, $($what:tt)*) => {{
        use std::fmt::Write as _;
        // Writing to a string does not fail.
        let _written = $text.write_fmt(format_args!($($what)*));
    }};
}

pub(super) use put;

/// A cell of a table, not escaped yet.
pub(super) enum Cell {
    Text(String),
    Number(String),
    /// To an anchor of this page.
    Link(String, String),
    /// Parts of a whole, 0 to 1: as it was, and as it would have been.
    Bars(Vec<f64>),
}

impl Cell {
    pub fn text(text: impl Into<String>) -> Self {
        Self::Text(text.into())
    }

    pub fn number(text: impl Into<String>) -> Self {
        Self::Number(text.into())
    }
}

/// A table that can be scrolled sideways where it is wider than the page.
pub(super) struct Table<'a> {
    pub caption: &'a str,
    /// What it is called where captions alone would be the same; the caption where it is empty.
    pub label: &'a str,
    pub heading: &'a [&'a str],
}

/// Fit for content and for attributes in double quotation marks.
pub(super) fn escape(text: &str) -> String {
    let mut escaped = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => escaped.push_str("&amp;"),
            '<' => escaped.push_str("&lt;"),
            '>' => escaped.push_str("&gt;"),
            '"' => escaped.push_str("&quot;"),
            '\'' => escaped.push_str("&#39;"),
            c => escaped.push(c),
        }
    }
    escaped
}

impl Table<'_> {
    /// Writes it; the first cell of each row heads it.
    pub fn write(&self, page: &mut String, rows: impl IntoIterator<Item = Vec<Cell>>) {
        let label = if self.label.is_empty() { self.caption } else { self.label };
        put!(page, "<div class=\"scroll\" tabindex=\"0\" role=\"group\" aria-label=\"{}\"><table>", escape(label));
        put!(page, "<caption>{}</caption><thead><tr>", escape(self.caption));
        let mut body = String::new();
        let mut numeric = vec![true; self.heading.len()];
        for row in rows {
            body += "<tr>";
            for (place, cell) in row.iter().enumerate() {
                if let Some(numeric) = numeric.get_mut(place) {
                    *numeric &= matches!(cell, Cell::Number(_));
                }
                cell.write(&mut body, place == 0);
            }
            body += "</tr>";
        }
        for (heading, numeric) in self.heading.iter().zip(numeric) {
            let class = if numeric { " class=\"n\"" } else { "" };
            match *heading {
                "" => *page += "<td></td>",
                heading => put!(page, "<th scope=\"col\"{class}>{}</th>", escape(heading)),
            }
        }
        put!(page, "</tr></thead><tbody>{body}</tbody></table></div>\n");
    }
}

impl Cell {
    fn write(&self, page: &mut String, heads: bool) {
        let [open, close] = if heads { ["<th scope=\"row\"", "</th>"] } else { ["<td", "</td>"] };
        *page += open;
        match self {
            Self::Text(text) => put!(page, ">{}", escape(text)),
            Self::Number(text) => put!(page, " class=\"n\">{}", escape(text)),
            Self::Link(to, text) => put!(page, "><a href=\"#{}\">{}</a>", escape(to), escape(text)),
            Self::Bars(parts) => {
                *page += " class=\"bars\">";
                for (part, class) in parts.iter().zip(["was", "would"]) {
                    let pct = 100.0 * part.clamp(0.0, 1.0);
                    let none = if *part > 0.0 { "" } else { " none" };
                    put!(page, "<div class=\"bar {class}{none}\" style=\"width:{pct:.1}%\"></div>");
                }
            }
        }
        *page += close;
    }
}

/// A number of pixels, to a tenth.
pub(super) fn px(page: &mut String, value: f64) {
    let tenths = (value * 10.0).round() / 10.0;
    // −0 is 0.
    put!(page, "{}", tenths + 0.0);
}

/// The anchor of a corridor.
pub(super) fn anchor(place: usize) -> String {
    format!("corridor-{}", place + 1)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_from_outside_is_markup() {
        let mut page = String::new();
        let hostile = "\"><script>alert('&')</script>";
        let row = vec![Cell::text(hostile), Cell::Link(hostile.into(), hostile.into()), Cell::number(hostile)];
        Table { caption: hostile, label: hostile, heading: &["", hostile, "c"] }.write(&mut page, [row]);
        assert!(!page.contains("<script") && !page.contains("\">alert"), "{page}");
        assert!(page.contains("&quot;&gt;&lt;script&gt;alert(&#39;&amp;&#39;)"), "{page}");
    }

    #[test]
    fn pixels_are_short() {
        let mut page = String::new();
        for value in [-0.01, 12.0, 12.345, -7.96] {
            px(&mut page, value);
            page.push(' ');
        }
        assert_eq!(page, "0 12 12.3 -8 ");
    }
}
