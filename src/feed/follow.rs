//! A growing file, also across rotation and truncation.

use std::{fs::Metadata, io::SeekFrom, os::unix::fs::MetadataExt, path::Path, time::Duration};

use tokio::{
    fs::{self, File},
    io::AsyncSeekExt,
    time::sleep,
};

use super::{
    InputState,
    stream::{Closed, Strand},
};

/// How often the file is looked at.
const PAUSE: Duration = Duration::from_millis(100);

/// Reads what is there and what is added; with `once` only what is there.
pub(super) async fn run(path: &Path, mut strand: Strand, once: bool) -> Result<(), Closed> {
    loop {
        match File::open(path).await {
            Ok(mut file) => {
                strand.stream.gauge.connected(false);
                strand.stream.restart();
                until_replaced(path, &mut file, &mut strand, once).await?;
                strand.finish().await?;
                if once {
                    return Ok(());
                }
            }
            Err(error) => {
                let mut status = strand.stream.gauge.lock();
                status.state = InputState::Waiting;
                status.tally.trouble(&error);
            }
        }
        sleep(PAUSE).await;
    }
}

/// Reads a file until another one stands in its place, or it cannot be read any more.
async fn until_replaced(path: &Path, file: &mut File, strand: &mut Strand, once: bool) -> Result<(), Closed> {
    let mut position = 0;
    loop {
        position += strand.drain(file).await?;
        let Ok(open) = file.metadata().await else { return Ok(()) };
        if once {
            return Ok(());
        }
        if open.len() < position {
            strand.stream.restart();
            position = 0;
            if file.seek(SeekFrom::Start(0)).await.is_err() {
                return Ok(());
            }
        } else if fs::metadata(path).await.is_ok_and(|present| has_replaced(&present, &open)) {
            strand.drain(file).await?;
            return Ok(());
        } else {
            sleep(PAUSE).await;
        }
    }
}

/// An empty file has replaced nothing yet: the writer may still have the old one open.
fn has_replaced(present: &Metadata, open: &Metadata) -> bool {
    (present.dev(), present.ino()) != (open.dev(), open.ino()) && present.len() > 0
}
