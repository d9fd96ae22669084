//! Where the lines of a drill go: a file, standard output or a socket.

use std::{
    fs::File,
    io::{self, BufWriter, Stdout, Write},
    net::{TcpListener, TcpStream},
    path::Path,
    time::Duration,
};

use flate2::{Compression, write::GzEncoder};
use thiserror::Error;

/// A good deal smaller than zstd's default, and still faster than frames are made.
const ZSTD_LEVEL: i32 = 9;
/// A reader who takes nothing for so long is let go.
const PATIENCE: Duration = Duration::from_secs(30);

/// Takes whole lines.
pub struct Output {
    sink: Box<dyn Sink>,
}

/// Why nothing can be written there.
#[derive(Debug, Error)]
pub enum OutputError {
    /// A file that cannot be made.
    #[error("cannot write to {path}: {source}; check that its folder is there and may be written to")]
    File {
        /// Its path.
        path: String,
        /// What the system says.
        source: io::Error,
    },
    /// Nobody takes the connection.
    #[error("cannot connect to {address}: {source}; start what listens there first")]
    Connect {
        /// Host and port.
        address: String,
        /// What the system says.
        source: io::Error,
    },
    /// The port cannot be had.
    #[error("cannot listen on {address}: {source}; give a host and port of this machine, such as 127.0.0.1:7400")]
    Listen {
        /// Host and port.
        address: String,
        /// What the system says.
        source: io::Error,
    },
}

trait Sink: Write {
    fn finish(self: Box<Self>) -> io::Result<()>;
}

impl Output {
    /// Opens `-` (standard output), `tcp://host:port` (connects), `tcp-listen://host:port` (waits for a first reader,
    /// without a host on loopback), or a file, compressed where it ends in `.gz` or `.zst`.
    pub fn open(target: &str) -> Result<Self, OutputError> {
        if target == "-" {
            return Ok(Self { sink: Box::new(BufWriter::new(io::stdout())) });
        }
        if let Some(address) = target.strip_prefix("tcp://") {
            let failed = |source| OutputError::Connect { address: address.to_owned(), source };
            let stream = TcpStream::connect(address).map_err(failed)?;
            stream.set_nodelay(true).and_then(|()| stream.set_write_timeout(Some(PATIENCE))).map_err(failed)?;
            return Ok(Self { sink: Box::new(stream) });
        }
        if let Some(address) = target.strip_prefix("tcp-listen://") {
            let address = if address.starts_with(':') { format!("127.0.0.1{address}") } else { address.to_owned() };
            let served = Served::listen(&address).map_err(|source| OutputError::Listen { address, source })?;
            return Ok(Self { sink: Box::new(served) });
        }
        let failed = |source| OutputError::File { path: target.to_owned(), source };
        let file = BufWriter::new(File::create(target).map_err(failed)?);
        let sink: Box<dyn Sink> = match Path::new(target).extension().and_then(|ending| ending.to_str()) {
            Some("gz") => Box::new(GzEncoder::new(file, Compression::default())),
            Some("zst") => Box::new(zstd::Encoder::new(file, ZSTD_LEVEL).map_err(failed)?),
            _ => Box::new(file),
        };
        Ok(Self { sink })
    }

    /// Takes a line with its end.
    pub fn line(&mut self, line: &[u8]) -> io::Result<()> {
        self.sink.write_all(line)
    }

    /// Hands on what has been taken so far.
    pub fn flush(&mut self) -> io::Result<()> {
        self.sink.flush()
    }

    /// Ends it. Without this a compressed file is not complete.
    pub fn finish(self) -> io::Result<()> {
        self.sink.finish()
    }
}

impl Sink for BufWriter<Stdout> {
    fn finish(mut self: Box<Self>) -> io::Result<()> {
        self.flush()
    }
}

impl Sink for BufWriter<File> {
    fn finish(mut self: Box<Self>) -> io::Result<()> {
        self.flush()
    }
}

impl Sink for GzEncoder<BufWriter<File>> {
    fn finish(self: Box<Self>) -> io::Result<()> {
        (*self).finish()?.flush()
    }
}

impl Sink for zstd::Encoder<'static, BufWriter<File>> {
    fn finish(self: Box<Self>) -> io::Result<()> {
        (*self).finish()?.flush()
    }
}

impl Sink for TcpStream {
    fn finish(mut self: Box<Self>) -> io::Result<()> {
        self.flush()
    }
}

/// Readers that came by themselves: each gets the lines from when it came, and one that hangs or leaves is let go.
struct Served {
    listener: TcpListener,
    readers: Vec<TcpStream>,
}

impl Served {
    fn listen(address: &str) -> io::Result<Self> {
        let listener = TcpListener::bind(address)?;
        eprintln!("tautline: waiting for a reader on {}", listener.local_addr()?);
        let (first, _) = listener.accept()?;
        listener.set_nonblocking(true)?;
        let mut served = Self { listener, readers: Vec::new() };
        served.welcome(first)?;
        Ok(served)
    }

    fn welcome(&mut self, reader: TcpStream) -> io::Result<()> {
        reader.set_nonblocking(false)?;
        reader.set_nodelay(true)?;
        reader.set_write_timeout(Some(PATIENCE))?;
        self.readers.push(reader);
        Ok(())
    }
}

impl Write for Served {
    fn write(&mut self, line: &[u8]) -> io::Result<usize> {
        while let Ok((reader, _)) = self.listener.accept() {
            // One that is gone already need not be welcomed.
            let _ = self.welcome(reader);
        }
        self.readers.retain_mut(|reader| reader.write_all(line).is_ok());
        Ok(line.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl Sink for Served {
    fn finish(self: Box<Self>) -> io::Result<()> {
        Ok(())
    }
}
