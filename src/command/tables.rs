//! A table of every assessment for each reviewed day, where one is wanted.

use std::{
    fs,
    hash::{DefaultHasher, Hash, Hasher},
    io,
    path::{Path, PathBuf},
};

use chrono::NaiveDate;

use super::Failure;
use crate::{
    report::parquet::{Columns, Error, ParquetFile, made_for},
    review::{Output, Stretch, Task, Terms},
};

pub(super) struct Tables {
    folder: Option<PathBuf>,
    corridors: usize,
    compared: bool,
    terms: Terms,
}

impl Tables {
    /// In a folder, which is made; or nowhere.
    pub fn new(folder: Option<&Path>, task: &Task, terms: &Terms) -> Result<Self, Failure> {
        folder.map_or(Ok(()), make)?;
        Ok(Self {
            folder: folder.map(Path::to_owned),
            corridors: task.config.grid.corridors.len(),
            compared: task.alternatives.iter().any(Option::is_some),
            terms: terms.clone(),
        })
    }

    fn path(&self, date: NaiveDate) -> Option<PathBuf> {
        Some(self.folder.as_ref()?.join(format!("{date}.parquet")))
    }

    /// Whether nothing more is wanted of a day.
    pub fn has(&self, stretch: &Stretch, date: NaiveDate) -> bool {
        self.path(date).is_none_or(|path| made_for(&path).is_some_and(|key| key == self.key(stretch)))
    }

    /// Tells a table from one made of other files, or under other terms.
    fn key(&self, stretch: &Stretch) -> String {
        let mut hasher = DefaultHasher::new();
        (&self.terms, stretch.keys()).hash(&mut hasher);
        format!("{:016x}", hasher.finish())
    }
}

impl Output for Tables {
    type Rows = Option<Columns>;
    type Book = Option<ParquetFile>;

    fn open(&self, stretch: &Stretch, date: NaiveDate) -> io::Result<(Self::Book, Vec<Self::Rows>)> {
        let file =
            self.path(date).map(|path| ParquetFile::create(&path, self.compared, &self.key(stretch))).transpose();
        let rows = || self.folder.as_ref().map(|_| Columns::new(self.compared));
        Ok((file.map_err(failed)?, (0..self.corridors).map(|_| rows()).collect()))
    }

    fn turn(&self, book: &mut Self::Book, rows: &mut Self::Rows, is_last: bool) -> io::Result<()> {
        match (book, rows) {
            (Some(file), Some(rows)) if is_last || rows.is_full() => file.write(rows).map_err(failed),
            _ => Ok(()),
        }
    }

    fn close(&self, book: Self::Book) -> io::Result<()> {
        book.map_or(Ok(()), ParquetFile::finish).map_err(failed)
    }
}

fn failed(error: Error) -> io::Error {
    io::Error::other(error)
}

/// Makes a folder, unless it is there.
pub(super) fn make(folder: &Path) -> Result<(), Failure> {
    fs::create_dir_all(folder).map_err(|error| format!("cannot make {}: {error}", folder.display()).into())
}
