//! Keeps every frame that the desk gets, so that any live day can be replayed to the same records, bit by bit.
//!
//! One file a UTC day of the frames, `2031-03-14.jsonl.zst`: JSON Lines as every command reads them, zstd. The first frame
//! after the program starts, of each day, after a change of the configuration and after frames that could not be recorded
//! brings along how everything stood before it ([`feed::Start`](crate::feed::Start)), so that each day stands alone; and
//! frames tell what operators did since the one before. [`Recorder::take`] gives back the frame as it will be read from the
//! file, and that is what has to be assessed: so a replay cannot see anything else.
//!
//! A [`Recorder`] hands lines to a thread that compresses and writes them. What is older than the flush interval is on the
//! disk, and readable whatever happens to the program; the unfinished end that a kill leaves is repaired when the
//! file is opened again. A disk that fails never stops the program: what is not recorded is counted and said.

mod day_file;
mod folder;
mod recorder;
mod repair;
mod writer;

pub use folder::RecordError;
pub use recorder::{Present, Recorder};
pub use writer::Status;
