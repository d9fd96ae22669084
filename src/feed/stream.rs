use std::{sync::Arc, time::Instant};

use tokio::{
    io::{AsyncRead, AsyncReadExt},
    sync::mpsc,
};

use super::{Channels, Decoder, Format, Frame, monitor::Gauge, switch::Switch};

/// Bytes read at once.
pub(super) const CHUNK_BYTES: usize = 1 << 16;
/// Batches that may wait in a queue before its input has to wait.
const QUEUE: usize = 8;

/// One stream of bytes: decoded, and counted on its input's gauge.
#[derive(Debug)]
pub(super) struct Stream {
    format: Format,
    channels: Arc<Channels>,
    /// Brings other channels while it is read.
    switch: Option<Switch>,
    decoder: Decoder,
    pub gauge: Arc<Gauge>,
}

impl Stream {
    pub fn new(format: Format, channels: Arc<Channels>, gauge: Arc<Gauge>) -> Self {
        Self { format, decoder: Decoder::new(format, channels.clone()), channels, switch: None, gauge }
    }

    /// The same, reading with the channels in force.
    pub fn with(self, switch: Switch) -> Self {
        Self { switch: Some(switch), ..self }
    }

    /// Forgets a line that has begun, and a header: another file starts.
    pub fn restart(&mut self) {
        self.decoder = Decoder::new(self.format, self.channels.clone());
    }

    /// The frames that these bytes complete.
    pub fn push(&mut self, bytes: &[u8]) -> Vec<Frame> {
        if let Some(channels) = self.switch.as_ref().and_then(|switch| switch.other_than(&self.channels)) {
            self.decoder.rewire(channels.clone());
            self.channels = channels;
        }
        let mut frames = Vec::new();
        let mut status = self.gauge.lock();
        status.last_arrival = Some(Instant::now());
        self.decoder.push(bytes, &mut status.tally, &mut frames);
        frames
    }

    /// The frame on a last line that has no end, if there is one.
    pub fn finish(&mut self) -> Vec<Frame> {
        let mut frames = Vec::new();
        self.decoder.finish(&mut self.gauge.lock().tally, &mut frames);
        frames
    }
}

/// Frames that came together, and when.
#[derive(Debug)]
pub(super) struct Batch {
    pub arrived: Instant,
    pub frames: Vec<Frame>,
}

/// The end of a queue where frames go in.
#[derive(Debug, Clone)]
pub(super) struct Queue(mpsc::Sender<Batch>);

/// The end where they come out.
pub(super) type Outlet = mpsc::Receiver<Batch>;

/// Nobody wants frames any more.
#[derive(Debug)]
pub(super) struct Closed;

impl Queue {
    pub fn new() -> (Self, Outlet) {
        let (sender, outlet) = mpsc::channel(QUEUE);
        (Self(sender), outlet)
    }

    /// Waits until there is room.
    pub async fn send(&self, frames: Vec<Frame>) -> Result<(), Closed> {
        if frames.is_empty() {
            return Ok(());
        }
        self.0.send(Batch { arrived: Instant::now(), frames }).await.map_err(|_| Closed)
    }

    /// The same from a thread that may block.
    pub fn send_blocking(&self, frames: Vec<Frame>) -> Result<(), Closed> {
        if frames.is_empty() {
            return Ok(());
        }
        self.0.blocking_send(Batch { arrived: Instant::now(), frames }).map_err(|_| Closed)
    }

    /// Waits for room, for frames that are chosen only then.
    pub async fn room(&self) -> Result<impl FnOnce(Vec<Frame>), Closed> {
        let permit = self.0.reserve().await.map_err(|_| Closed)?;
        Ok(|frames| permit.send(Batch { arrived: Instant::now(), frames }))
    }
}

/// A stream that feeds a queue.
#[derive(Debug)]
pub(super) struct Strand {
    pub stream: Stream,
    pub queue: Queue,
}

impl Strand {
    /// Passes frames on until the bytes end, for now at least; how many bytes that were.
    pub async fn drain(&mut self, bytes: &mut (impl AsyncRead + Unpin)) -> Result<u64, Closed> {
        let mut chunk = vec![0; CHUNK_BYTES];
        let mut total = 0;
        loop {
            match bytes.read(&mut chunk).await {
                Ok(0) => return Ok(total),
                Ok(count) => {
                    total += count as u64;
                    self.queue.send(self.stream.push(&chunk[..count])).await?;
                }
                Err(error) => {
                    self.stream.gauge.lock().tally.trouble(&error);
                    return Ok(total);
                }
            }
        }
    }

    /// Ends the last line.
    pub async fn finish(&mut self) -> Result<(), Closed> {
        self.queue.send(self.stream.finish()).await
    }
}
