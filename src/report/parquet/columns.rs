use std::{collections::HashMap, io::Write};

use parquet::{
    data_type::{ByteArray, ByteArrayType, DoubleType, Int64Type},
    errors::ParquetError,
    file::writer::{SerializedColumnWriter, SerializedFileWriter},
};

use super::fields::{Field, Get, Row, fields};
use crate::{desk::Assessment, review::Rows};

/// Rows of a row group.
const FULL: usize = 8192;

/// Rows of one corridor on their way to a file.
pub struct Columns {
    columns: Vec<(&'static Field, Buffer)>,
    rows: usize,
}

/// The values of a column.
enum Buffer {
    Whole(Vec<i64>),
    /// Not a number: no value.
    Number(Vec<f64>),
    Text(Names, Vec<u32>),
    /// The members of all lists, and how many of them each has.
    List(Names, Vec<u32>, Vec<u32>),
}

/// Texts by number, since the same ones come again and again.
#[derive(Default)]
struct Names {
    texts: Vec<ByteArray>,
    numbers: HashMap<Box<str>, u32>,
    last: u32,
}

/// No text.
const NO_NAME: u32 = u32::MAX;

impl Columns {
    /// No rows yet.
    pub fn new(with_what_if: bool) -> Self {
        Self { columns: fields(with_what_if).map(|field| (field, Buffer::of(field.get))).collect(), rows: 0 }
    }

    /// Rows that are not written yet.
    pub fn len(&self) -> usize {
        self.rows
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.rows == 0
    }

    /// Whether there are enough for a row group: they should be written before many more come.
    pub fn is_full(&self) -> bool {
        self.rows >= FULL
    }

    pub(super) fn write(&mut self, file: &mut SerializedFileWriter<impl Write + Send>) -> Result<(), ParquetError> {
        let mut group = file.next_row_group()?;
        for (_, buffer) in &mut self.columns {
            if let Some(mut column) = group.next_column()? {
                buffer.write(&mut column)?;
                column.close()?;
            }
            buffer.clear();
        }
        group.close()?;
        self.rows = 0;
        Ok(())
    }
}

impl Rows for Columns {
    fn take(&mut self, was: &Assessment, what_if: Option<&Assessment>) {
        let row = Row::new(was, what_if);
        self.columns.iter_mut().for_each(|(field, buffer)| buffer.push(field.get, &row));
        self.rows += 1;
    }
}

impl Buffer {
    fn of(get: Get) -> Self {
        match get {
            Get::Time(_) | Get::Count(_) => Self::Whole(Vec::new()),
            Get::Number(_) | Get::Steady(_) => Self::Number(Vec::new()),
            Get::Text(_) => Self::Text(Names::default(), Vec::new()),
            Get::List(_) => Self::List(Names::default(), Vec::new(), Vec::new()),
        }
    }

    fn push(&mut self, get: Get, row: &Row) {
        match (self, get) {
            (Self::Whole(values), Get::Time(get) | Get::Count(get)) => values.push(get(row)),
            (Self::Number(values), Get::Number(get) | Get::Steady(get)) => values.push(get(row).unwrap_or(f64::NAN)),
            (Self::Text(names, numbers), Get::Text(get)) => {
                numbers.push(get(row).map_or(NO_NAME, |text| names.number(text)));
            }
            (Self::List(names, numbers, lengths), Get::List(get)) => {
                let list = get(row);
                numbers.extend(list.iter().map(|text| names.number(text)));
                // Channels of one corridor.
                lengths.push(u32::try_from(list.len()).unwrap_or(u32::MAX));
            }
            // A buffer is made by `of` the same field.
            _ => unreachable!("a buffer of another kind"),
        }
    }

    fn clear(&mut self) {
        match self {
            Self::Whole(values) => values.clear(),
            Self::Number(values) => values.clear(),
            Self::Text(_, numbers) => numbers.clear(),
            Self::List(_, numbers, lengths) => {
                numbers.clear();
                lengths.clear();
            }
        }
    }

    fn write(&self, column: &mut SerializedColumnWriter) -> Result<(), ParquetError> {
        match self {
            Self::Whole(values) => {
                column.typed::<Int64Type>().write_batch(values, None, None)?;
            }
            Self::Number(values) => {
                let levels: Vec<i16> = values.iter().map(|value| i16::from(value.is_finite())).collect();
                let known: Vec<f64> = values.iter().copied().filter(|value| value.is_finite()).collect();
                column.typed::<DoubleType>().write_batch(&known, Some(&levels), None)?;
            }
            Self::Text(names, numbers) => {
                let levels: Vec<i16> = numbers.iter().map(|number| i16::from(*number != NO_NAME)).collect();
                column.typed::<ByteArrayType>().write_batch(&names.texts(numbers), Some(&levels), None)?;
            }
            Self::List(names, numbers, lengths) => {
                let (mut levels, mut repeated) = (Vec::new(), Vec::new());
                for length in lengths {
                    levels.push(i16::from(*length > 0));
                    repeated.push(0);
                    levels.extend((1..*length).map(|_| 1));
                    repeated.extend((1..*length).map(|_| 1));
                }
                let texts = names.texts(numbers);
                column.typed::<ByteArrayType>().write_batch(&texts, Some(&levels), Some(&repeated))?;
            }
        }
        Ok(())
    }
}

impl Names {
    fn number(&mut self, text: &str) -> u32 {
        let is_last = self.texts.get(self.last as usize).is_some_and(|last| last.data() == text.as_bytes());
        if !is_last {
            self.last = self.numbers.get(text).copied().unwrap_or_else(|| self.add(text));
        }
        self.last
    }

    fn add(&mut self, text: &str) -> u32 {
        // Names of one corridor.
        let number = u32::try_from(self.texts.len()).unwrap_or(NO_NAME);
        self.texts.push(ByteArray::from(text.as_bytes().to_vec()));
        self.numbers.insert(text.into(), number);
        number
    }

    fn texts(&self, numbers: &[u32]) -> Vec<ByteArray> {
        numbers.iter().filter_map(|number| self.texts.get(*number as usize).cloned()).collect()
    }
}
