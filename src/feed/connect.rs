//! Inputs that connect, and connect again when the connection ends.

use std::{io, time::Duration};

use socket2::{SockRef, TcpKeepalive};
use tokio::{
    io::AsyncRead,
    net::TcpStream,
    time::{sleep, timeout},
};

use super::{
    Address, InputState,
    stream::{Closed, Strand},
};

/// Pause before the second attempt; it doubles with each attempt that brings nothing, up to the longest.
const FIRST_PAUSE: Duration = Duration::from_millis(100);
const LONGEST_PAUSE: Duration = Duration::from_secs(10);
const CONNECT_TIMEOUT: Duration = Duration::from_secs(10);
/// With `once`, an address nobody has answered at is given up when the pause would grow beyond this.
const LONGEST_PAUSE_ONCE: Duration = Duration::from_secs(4);

/// Connects over TCP; a server that vanishes without a word will be missed.
pub(super) async fn tcp(address: &Address) -> io::Result<TcpStream> {
    let stream = TcpStream::connect((&*address.host, address.port)).await?;
    keep_alive(&stream);
    Ok(stream)
}

/// Gives up a peer that has not answered for some 30 s (keep-alives, RFC 9293, section 3.8.4).
pub(super) fn keep_alive(stream: &TcpStream) {
    let keepalive = TcpKeepalive::new().with_time(Duration::from_secs(15)).with_interval(Duration::from_secs(5));
    // Where the system cannot do it, the peer is missed later.
    let _unsupported = SockRef::from(stream).set_tcp_keepalive(&keepalive.with_retries(3));
}

/// Reads from one connection after another; with `once` only from the first.
pub(super) async fn run<S: AsyncRead + Unpin>(
    mut strand: Strand,
    once: bool,
    connect: impl AsyncFn() -> io::Result<S>,
) -> Result<(), Closed> {
    let gauge = strand.stream.gauge.clone();
    let mut connections = 0;
    let mut pause = FIRST_PAUSE;
    loop {
        match timeout(CONNECT_TIMEOUT, connect()).await.unwrap_or_else(|_| Err(io::ErrorKind::TimedOut.into())) {
            Ok(mut bytes) => {
                gauge.connected(connections > 0);
                connections += 1;
                let count = strand.drain(&mut bytes).await?;
                strand.finish().await?;
                if once {
                    return Ok(());
                }
                if count > 0 {
                    pause = FIRST_PAUSE;
                }
            }
            Err(error) => gauge.lock().tally.trouble(&error),
        }
        if once && pause > LONGEST_PAUSE_ONCE {
            return Ok(());
        }
        gauge.set(if connections > 0 { InputState::Reconnecting } else { InputState::Waiting });
        sleep(pause).await;
        pause = (2 * pause).min(LONGEST_PAUSE);
    }
}
