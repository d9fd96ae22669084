//! Assessments as Parquet, one row for each corridor and frame, for notebooks and databases.
//!
//! Numbers are those of the assessment record to the last bit; `time` is in microseconds UTC. Each row group is of one corridor.
//! [`Columns`] collects the rows of a corridor, [`ParquetFile`] writes them down.

mod columns;
mod fields;

use std::{
    fs::File,
    io,
    path::{Path, PathBuf},
    sync::Arc,
};

use parquet::{
    basic::{Compression, LogicalType},
    errors::ParquetError,
    file::{
        metadata::KeyValue,
        properties::{EnabledStatistics, WriterProperties},
        reader::{FileReader, SerializedFileReader},
        writer::SerializedFileWriter,
    },
    schema::types::{ColumnPath, TypePtr},
};
use thiserror::Error;

pub use columns::Columns;
use fields::{Field, Get, fields};

use super::CAUTION;
use crate::whole_file::WholeFile;

/// Tells what a file was made for.
const KEY: &str = "review";
const PROGRAM: &str = concat!("tautline ", env!("CARGO_PKG_VERSION"));

/// What can go wrong with a file.
#[derive(Debug, Error)]
pub enum Error {
    /// Its disk or its folder.
    #[error("cannot write {0}: {1}")]
    Io(PathBuf, #[source] io::Error),
    /// The format.
    #[error("cannot write {0}: {1}")]
    Format(PathBuf, #[source] ParquetError),
}

/// A file under way. It is written beside its place, and put there when it is finished; if it never is, nothing is left.
pub struct ParquetFile {
    path: PathBuf,
    writer: SerializedFileWriter<WholeFile>,
}

impl ParquetFile {
    /// Begins a file, with columns for a what-if or without. [`made_for`] gives the key back.
    pub fn create(path: &Path, with_what_if: bool, key: &str) -> Result<Self, Error> {
        let file = WholeFile::begin(path).map_err(|error| Error::Io(path.to_owned(), error))?;
        let fields: Vec<_> = fields(with_what_if).collect();
        let format = |error| Error::Format(path.to_owned(), error);
        let schema = schema(&fields).map_err(format)?;
        let writer = SerializedFileWriter::new(file, schema, Arc::new(properties(&fields, key))).map_err(format)?;
        Ok(Self { path: path.to_owned(), writer })
    }

    /// Writes all rows of a corridor that have come as a row group, and takes them out.
    pub fn write(&mut self, columns: &mut Columns) -> Result<(), Error> {
        if columns.is_empty() {
            return Ok(());
        }
        columns.write(&mut self.writer).map_err(|error| Error::Format(self.path.clone(), error))
    }

    /// Puts the file in its place.
    pub fn finish(self) -> Result<(), Error> {
        let Self { path, writer } = self;
        let file = writer.into_inner().map_err(|error| Error::Format(path.clone(), error))?;
        file.put(&path).map_err(|error| Error::Io(path, error))
    }
}

/// The key that a finished file was made with; `None` for any other file.
pub fn made_for(path: &Path) -> Option<String> {
    let reader = SerializedFileReader::new(File::open(path).ok()?).ok()?;
    let said = reader.metadata().file_metadata().key_value_metadata()?;
    said.iter().find(|said| said.key == KEY)?.value.clone()
}

fn schema(fields: &[&Field]) -> Result<TypePtr, ParquetError> {
    use parquet::{
        basic::{ConvertedType, Repetition, Type as Physical},
        schema::types::Type,
    };
    let primitive = |name: &str, physical, logical, repetition| {
        let builder = Type::primitive_type_builder(name, physical).with_logical_type(logical);
        builder.with_repetition(repetition).build().map(Arc::new)
    };
    let one = |field: &&Field| match field.get {
        Get::Time(_) => {
            let micros = LogicalType::timestamp(true, parquet::basic::TimeUnit::MICROS);
            primitive(field.name, Physical::INT64, Some(micros), Repetition::REQUIRED)
        }
        Get::Count(_) => primitive(field.name, Physical::INT64, None, Repetition::REQUIRED),
        Get::Number(_) | Get::Steady(_) => primitive(field.name, Physical::DOUBLE, None, Repetition::OPTIONAL),
        Get::Text(_) => primitive(field.name, Physical::BYTE_ARRAY, Some(LogicalType::String), Repetition::OPTIONAL),
        Get::List(_) => {
            let element = primitive("element", Physical::BYTE_ARRAY, Some(LogicalType::String), Repetition::REQUIRED)?;
            let list = Type::group_type_builder("list")
                .with_repetition(Repetition::REPEATED)
                .with_fields(vec![element])
                .build()?;
            let whole = Type::group_type_builder(field.name).with_repetition(Repetition::REQUIRED);
            let whole = whole.with_logical_type(Some(LogicalType::List)).with_converted_type(ConvertedType::LIST);
            whole.with_fields(vec![Arc::new(list)]).build().map(Arc::new)
        }
    };
    let fields = fields.iter().map(one).collect::<Result<_, _>>()?;
    Type::group_type_builder("assessments").with_fields(fields).build().map(Arc::new)
}

fn properties(fields: &[&Field], key: &str) -> WriterProperties {
    let said = |key: &str, value: &str| KeyValue::new(key.to_owned(), value.to_owned());
    let builder = WriterProperties::builder()
        .set_compression(Compression::SNAPPY)
        .set_created_by(PROGRAM.to_owned())
        .set_key_value_metadata(Some(vec![said("program", PROGRAM), said("caution", CAUTION), said(KEY, key)]))
        // A reader skips row groups by them; what is within one is small.
        .set_statistics_enabled(EnabledStatistics::Chunk)
        .set_offset_index_disabled(true);
    // What hardly ever comes twice needs no dictionary.
    let noisy = fields.iter().filter(|field| matches!(field.get, Get::Number(_) | Get::Time(_)));
    noisy
        .fold(builder, |builder, field| builder.set_column_dictionary_enabled(ColumnPath::from(field.name), false))
        .build()
}
