use std::collections::HashSet;

use toml_edit::{Array, Item, TableLike, Value};

use super::{
    document::original_of_duplicate,
    findings::{Findings, Place},
    given::{Given, Placed},
    limits::Limits,
    wording::shown_key,
};

/// A table of the configuration, read key by key.
///
/// A value that is not what it must be is reported, and NaN or an empty text stands in for it, so that one pass finds
/// everything. When the table is dropped, keys that were never asked for are reported as unknown.
pub(crate) struct Section<'a> {
    findings: &'a Findings,
    place: Place,
    /// `None`: not in the file. Nothing in it is missed then.
    items: Option<&'a dyn TableLike>,
    asked: Vec<&'a str>,
}

impl<'a> Section<'a> {
    pub fn root(findings: &'a Findings, items: &'a dyn TableLike) -> Self {
        Self::new(findings, Place { line: 1, key: String::new() }, Some(items))
    }

    fn new(findings: &'a Findings, place: Place, items: Option<&'a dyn TableLike>) -> Self {
        Self { findings, place, items, asked: Vec::new() }
    }

    pub fn findings(&self) -> &'a Findings {
        self.findings
    }

    pub fn is_present(&self) -> bool {
        self.items.is_some()
    }

    /// Whether the file gives a key.
    pub fn has(&self, key: &str) -> bool {
        self.items.is_some_and(|items| items.contains_key(key))
    }

    /// Where a key stands, or where it is missed.
    pub fn place(&self, key: &str) -> Place {
        let found = self.items.and_then(|items| items.get_key_value(key));
        let line = found.and_then(|(key, item)| self.findings.line(key.span().or_else(|| item.span())));
        let key = shown_key(original_of_duplicate(key).unwrap_or(key));
        Place {
            line: line.unwrap_or(self.place.line),
            key: if self.place.key.is_empty() { key } else { format!("{}.{key}", self.place.key) },
        }
    }

    /// Reports something wrong with a key.
    pub fn wrong(&self, key: &str, message: impl Into<String>) {
        self.findings.report(&self.place(key), message);
    }

    /// Reports that a key is missing.
    pub fn missed(&self, key: &str, advice: &str) {
        if self.is_present() {
            self.wrong(key, format!("is missing; {advice}"));
        }
    }

    /// What the file gives under a key; the key counts as known from then on.
    pub fn take(&mut self, key: &'a str) -> Option<Given<'a>> {
        self.asked.push(key);
        let item = self.items?.get(key)?;
        Some(Given { findings: self.findings, place: self.place(key), value: item.as_value(), kind: item.type_name() })
    }

    /// A number; NaN where something else stands there.
    pub fn number(&mut self, key: &'a str, limits: Limits) -> Option<f64> {
        Some(self.take(key)?.number(limits))
    }

    /// A number that must be there.
    pub fn required_number(&mut self, key: &'a str, limits: Limits) -> f64 {
        let number = self.number(key, limits);
        self.needed(key, number, &format!("give {limits}"))
    }

    /// A number that was asked for and must be there.
    pub fn needed(&self, key: &str, number: Option<f64>, advice: &str) -> f64 {
        number.unwrap_or_else(|| {
            self.missed(key, advice);
            f64::NAN
        })
    }

    /// As many numbers as there are limits, in an array.
    pub fn numbers<const N: usize>(&mut self, key: &'a str, limits: [Limits; N]) -> Option<[f64; N]> {
        let given = self.take(key)?;
        let values = given.array("an array of numbers");
        if values.as_ref().is_some_and(|values| values.len() != N) {
            self.wrong(key, format!("must be an array of {N} numbers"));
        }
        let values = values.filter(|values| values.len() == N);
        Some(values.map_or([f64::NAN; N], |values| std::array::from_fn(|n| values[n].number(limits[n]))))
    }

    /// True or false.
    pub fn flag(&mut self, key: &'a str) -> Option<bool> {
        self.take(key)?.flag()
    }

    /// A text; empty where something else stands there.
    pub fn text(&mut self, key: &'a str) -> Option<String> {
        Some(self.take(key)?.text())
    }

    /// A text that must be there.
    pub fn required_text(&mut self, key: &'a str, advice: &str) -> String {
        self.text(key).unwrap_or_else(|| {
            self.missed(key, advice);
            String::new()
        })
    }

    /// An array of texts; empty ones where something else stands there.
    pub fn texts(&mut self, key: &'a str) -> Option<Vec<Placed>> {
        let given = self.take(key)?;
        let texts = given.array("an array of strings").map(|values| values.iter().map(Given::placed).collect());
        Some(texts.unwrap_or_else(|| vec![Placed { text: String::new(), place: given.place }]))
    }

    /// Every text in this table and in the tables within it, by dotted path from here; no key is unknown.
    pub fn texts_by_path(&mut self) -> Vec<(String, Placed)> {
        let mut found = Vec::new();
        let items = self.items.into_iter().flat_map(TableLike::iter);
        for (key, item) in items.filter(|(key, _)| original_of_duplicate(key).is_none()) {
            if item.is_table_like() {
                let within = self.section(key).texts_by_path().into_iter();
                found.extend(within.map(|(path, placed)| (format!("{key}.{path}"), placed)));
            } else if let Some(given) = self.take(key) {
                found.push((key.to_owned(), given.placed()));
            }
        }
        found
    }

    /// A table within this one; an absent one has nothing in it.
    pub fn section(&mut self, key: &'a str) -> Self {
        let Some(given) = self.take(key) else { return Self::new(self.findings, self.place(key), None) };
        let item = self.items.and_then(|items| items.get(key));
        let items = item.and_then(Item::as_table_like);
        if items.is_none() {
            given.is_not("a table");
        }
        let line = self.findings.line(item.and_then(Item::span)).unwrap_or(given.place.line);
        Self::new(self.findings, Place { line, ..given.place }, items)
    }

    /// A table that must be there.
    pub fn required_section(&mut self, key: &'a str, advice: &str) -> Self {
        if self.items.is_some_and(|items| !items.contains_key(key)) {
            self.missed(key, advice);
        }
        self.section(key)
    }

    /// An array of tables, of which at least one must be there.
    pub fn required_sections(&mut self, key: &'a str, most: usize) -> Vec<Self> {
        let item = self.items.and_then(|items| items.get(key));
        if item.is_none_or(|item| item.as_array().is_some_and(Array::is_empty)) {
            self.missed(key, "describe at least one, under its name in double brackets");
        }
        self.sections(key, most)
    }

    /// An array of tables, of which at most so many are read.
    pub fn sections(&mut self, key: &'a str, most: usize) -> Vec<Self> {
        let Some(given) = self.take(key) else { return Vec::new() };
        let findings = self.findings;
        let mut sections: Vec<Self> = if let Some(Item::ArrayOfTables(tables)) = self.items.and_then(|i| i.get(key)) {
            let places = tables.iter().enumerate().map(|(index, table)| given.element(index, table.span()));
            places.zip(tables).map(|(place, table)| Self::new(findings, place, Some(table))).collect()
        } else {
            let section = |element: Given<'a>| {
                let table = element.value.and_then(Value::as_inline_table);
                if table.is_none() {
                    element.is_not("a table");
                }
                Self::new(findings, element.place, table.map(|table| table as _))
            };
            let elements = given.array("an array of tables, with double brackets").unwrap_or_default();
            elements.into_iter().map(section).collect()
        };
        if sections.len() > most {
            self.wrong(key, format!("has {} entries; at most {most} are possible", sections.len()));
            sections.drain(most..).for_each(Self::abandon);
        }
        sections
    }

    /// Leaves it without a look at the rest of its keys.
    pub fn abandon(mut self) {
        self.items = None;
    }
}

impl Drop for Section<'_> {
    fn drop(&mut self) {
        let asked: HashSet<_> = self.asked.iter().copied().collect();
        for (key, _) in self.items.into_iter().flat_map(TableLike::iter) {
            if original_of_duplicate(key).is_some() {
                self.wrong(key, "is given twice; keep one");
            } else if !asked.contains(key) {
                self.wrong(key, format!("unknown key; {}", self.findings.advice(key, self.asked.iter().copied())));
            }
        }
    }
}
