//! Files written whole or not at all: beside their place first, then in it.

use std::{
    fs::Permissions,
    io::{self, BufWriter, Write},
    os::unix::fs::PermissionsExt,
    path::Path,
};

use tempfile::{Builder, NamedTempFile};

/// A file under way to a place. Whoever drops it before it is put there leaves nothing behind.
#[derive(Debug)]
pub(crate) struct WholeFile(NamedTempFile);

impl WholeFile {
    /// Begins it in the folder of its place.
    pub fn begin(path: &Path) -> io::Result<Self> {
        let name = path.file_name().unwrap_or(path.as_os_str());
        let folder = path.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
        let mut builder = Builder::new();
        // For whom the user's other new files are.
        builder.prefix(name).suffix(".new").permissions(Permissions::from_mode(0o666));
        builder.tempfile_in(folder).map(Self)
    }

    /// Puts it in its place, durable, where it replaces what was there.
    pub fn put(self, path: &Path) -> io::Result<()> {
        self.0.as_file().sync_all()?;
        self.0.persist(path)?;
        Ok(())
    }
}

impl Write for WholeFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.0.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.0.flush()
    }
}

/// Writes a file as a whole.
pub(crate) fn write(path: &Path, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> io::Result<()> {
    let mut file = BufWriter::new(WholeFile::begin(path)?);
    write(&mut file)?;
    file.into_inner()?.put(path)
}
