//! CSV (RFC 4180, but no line break inside a cell): a `time` column, one for each channel, `<channel>.quality` if wanted.

use csv_core::{Reader, ReaderBuilder, Terminator};

use super::{Channels, Frame, Quality, Slot, Tally, draft::Draft, line_error::LineError, rfc3339};

/// Reads rows below a header.
#[derive(Debug)]
pub(super) struct Rows {
    cells: Cells,
    /// `None` before the header; empty below a header that cannot be used.
    columns: Option<Vec<Column>>,
    /// The header's names.
    names: Vec<String>,
}

#[derive(Debug)]
enum Column {
    Time,
    Value(Slot),
    Quality(Slot),
    Unknown(String),
}

impl Rows {
    /// The next line is the header.
    pub fn new() -> Self {
        Self { cells: Cells::new(), columns: None, names: Vec::new() }
    }

    /// Goes on under other channels.
    pub fn rewire(&mut self, channels: &Channels) {
        if let Some(columns) = self.columns.as_mut().filter(|columns| !columns.is_empty()) {
            *columns = header(&self.names, channels);
        }
    }

    /// Takes the next line; the header brings no frame.
    pub fn frame(
        &mut self,
        line: &[u8],
        channels: &Channels,
        draft: &mut Draft,
        tally: &mut Tally,
    ) -> Result<Option<Frame>, LineError> {
        str::from_utf8(line).map_err(|_| LineError::NotUtf8)?;
        self.cells.split(line);
        if let Some(columns) = &self.columns {
            return row(columns, &self.cells, channels, draft, tally).map(Some);
        }
        self.names = self.cells.iter().map(ToOwned::to_owned).collect();
        let columns = header(&self.names, channels);
        let times = columns.iter().filter(|column| matches!(column, Column::Time)).count();
        self.columns = Some(if times == 1 { columns } else { Vec::new() });
        if times == 1 { Ok(None) } else { Err(LineError::Header) }
    }
}

fn header(names: &[String], channels: &Channels) -> Vec<Column> {
    names
        .iter()
        .map(String::as_str)
        .map(|name| {
            let quality_of = || name.strip_suffix(".quality").and_then(|channel| channels.in_feed(channel));
            if name == "time" {
                Column::Time
            } else if let Some(slot) = channels.in_feed(name) {
                Column::Value(slot)
            } else if let Some(slot) = quality_of() {
                Column::Quality(slot)
            } else {
                Column::Unknown(name.into())
            }
        })
        .collect()
}

fn row(
    columns: &[Column],
    cells: &Cells,
    channels: &Channels,
    draft: &mut Draft,
    tally: &mut Tally,
) -> Result<Frame, LineError> {
    if columns.is_empty() {
        return Err(LineError::Header);
    }
    if cells.ends.len() != columns.len() {
        return Err(LineError::Cells { found: cells.ends.len(), expected: columns.len() });
    }
    let filled = || columns.iter().zip(cells.iter()).filter(|(_, cell)| !cell.is_empty());
    let time = filled().find_map(|(column, cell)| matches!(column, Column::Time).then_some(cell));
    let time = rfc3339(time.ok_or(LineError::Time)?)?;
    for (column, cell) in filled() {
        match column {
            Column::Value(slot) => draft.value(channels, *slot, cell.parse().ok(), tally),
            Column::Unknown(name) => tally.unknown.count(name),
            Column::Time | Column::Quality(_) => {}
        }
    }
    for (column, cell) in filled() {
        if let Column::Quality(slot) = column {
            draft.quality(*slot, Quality::from_word(cell));
        }
    }
    Ok(draft.finish(time))
}

/// The cells of one line, in buffers that are used again.
#[derive(Debug)]
struct Cells {
    reader: Reader,
    text: Vec<u8>,
    ends: Vec<usize>,
}

impl Cells {
    fn new() -> Self {
        // A carriage return inside a line ends nothing.
        let reader = ReaderBuilder::new().terminator(Terminator::Any(b'\n')).build();
        Self { reader, text: Vec::new(), ends: Vec::new() }
    }

    fn split(&mut self, line: &[u8]) {
        // Unquoting only shortens, and a line has at most one more cell than bytes.
        self.text.resize(line.len(), 0);
        self.ends.resize(line.len() + 1, 0);
        self.reader.reset();
        let (_, _, written, count) = self.reader.read_record(line, &mut self.text, &mut self.ends);
        let (_, _, _, last) = self.reader.read_record(&[], &mut self.text[written..], &mut self.ends[count..]);
        self.ends.truncate(count + last);
    }

    fn iter(&self) -> impl Iterator<Item = &str> {
        let starts = std::iter::once(0).chain(self.ends.iter().copied());
        // The text was checked before it was cut, and it is cut at ASCII characters only.
        starts.zip(&self.ends).map(|(start, &end)| str::from_utf8(&self.text[start..end]).unwrap_or_default().trim())
    }
}
