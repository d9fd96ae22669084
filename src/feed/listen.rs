//! Inputs that others connect or send to.

use std::{collections::VecDeque, time::Duration};

use tokio::{
    net::{TcpListener, TcpStream, UdpSocket},
    select,
    sync::mpsc,
    task::JoinSet,
    time::sleep,
};

use super::{
    Frame, InputState,
    connect::keep_alive,
    inlet::Inlet,
    merge::Lane,
    stream::{Closed, Queue, Strand, Stream},
};

/// Clients served at once; more are turned away.
const MAX_CLIENTS: usize = 32;
/// Frames from datagrams that wait before the oldest are dropped.
const MAX_HELD_FRAMES: usize = 256;
/// Larger than any datagram.
const DATAGRAM_BYTES: usize = 1 << 16;

/// Serves clients, each a lane of its own; with `once` until none is left.
pub(super) async fn tcp(
    listener: TcpListener,
    lanes: mpsc::Sender<Lane<Inlet>>,
    once: bool,
    new_stream: impl Fn() -> Stream,
) -> Result<(), Closed> {
    let gauge = new_stream().gauge;
    let mut clients = JoinSet::new();
    loop {
        select! {
            accepted = listener.accept() => match accepted {
                Ok((_, from)) if clients.len() >= MAX_CLIENTS => {
                    gauge.lock().tally.trouble(&format!("{from} turned away: {MAX_CLIENTS} clients are connected"));
                }
                Ok((client, _)) => {
                    let (queue, outlet) = Queue::new();
                    lanes.send(Lane::new(gauge.clone(), Inlet::new(outlet, true))).await.map_err(|_| Closed)?;
                    gauge.connected(false);
                    clients.spawn(serve(client, Strand { stream: new_stream(), queue }));
                }
                Err(error) => {
                    // No descriptors left, most likely: leave time for some to be closed.
                    gauge.lock().tally.trouble(&error);
                    sleep(Duration::from_millis(100)).await;
                }
            },
            Some(_) = clients.join_next() => if clients.is_empty() {
                if once {
                    return Ok(());
                }
                gauge.set(InputState::Waiting);
            }
        }
    }
}

async fn serve(mut client: TcpStream, mut strand: Strand) -> Result<(), Closed> {
    keep_alive(&client);
    strand.drain(&mut client).await?;
    strand.finish().await
}

/// Takes datagrams of one or more whole lines. Nobody can be made to wait: when too many wait, the oldest are dropped.
pub(super) async fn udp(socket: UdpSocket, Strand { mut stream, queue }: Strand) -> Result<(), Closed> {
    let mut datagram = vec![0; DATAGRAM_BYTES];
    let mut held: VecDeque<Frame> = VecDeque::new();
    stream.gauge.connected(false);
    loop {
        select! {
            received = socket.recv(&mut datagram) => match received {
                Ok(count) => {
                    held.extend(stream.push(&datagram[..count]));
                    held.extend(stream.finish());
                    let excess = held.len().saturating_sub(MAX_HELD_FRAMES);
                    held.drain(..excess);
                    stream.gauge.lock().tally.overrun += excess as u64;
                }
                Err(error) => stream.gauge.lock().tally.trouble(&error),
            },
            room = queue.room(), if !held.is_empty() => room?(held.drain(..).collect()),
        }
    }
}
