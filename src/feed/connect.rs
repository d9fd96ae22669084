//! Inputs that connect, and connect again when the connection ends.

use std::{io, time::Duration};

use tokio::{
    io::AsyncRead,
    time::{sleep, timeout},
};

use super::{
    InputState,
    stream::{Closed, Strand},
};

/// Pause before the second attempt; it doubles with each attempt that brings nothing, up to the longest.
const FIRST_PAUSE: Duration = Duration::from_millis(100);
const LONGEST_PAUSE: Duration = Duration::from_secs(10);
const CONNECT_TIMEOUT: Duration = Duration::from_secs(10);
/// With `once`, an address nobody has answered at is given up when the pause would grow beyond this.
const LONGEST_PAUSE_ONCE: Duration = Duration::from_secs(4);

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
