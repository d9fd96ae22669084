//! Sockets, for real.

use std::net::SocketAddr;

use tautline::feed::{Feed, InputState, Patience};
use tempfile::TempDir;
use tokio::{
    io::{AsyncReadExt, AsyncWriteExt},
    net::{TcpListener, TcpStream, UdpSocket, UnixListener},
};

use crate::bed::{channels, line, lines, next, open, rest, seconds, status, until};

fn address(feed: &Feed) -> SocketAddr {
    status(feed).address.expect("it listens")
}

#[tokio::test]
async fn tcp_connects_and_connects_again() {
    let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let mut feed = open(&[&format!("tcp://{}", listener.local_addr().unwrap())], false).await;
    let (mut client, _) = listener.accept().await.unwrap();
    client.write_all(lines([1, 2]).as_bytes()).await.unwrap();
    assert_eq!(seconds(&next(&mut feed, 2).await), [1, 2]);
    // Half a line is lost with its connection, and spoils no other.
    client.write_all(&lines([3]).as_bytes()[..20]).await.unwrap();
    drop(client);
    let (mut client, _) = listener.accept().await.unwrap();
    client.write_all(lines([4]).as_bytes()).await.unwrap();
    assert_eq!(seconds(&next(&mut feed, 1).await), [4]);
    let status = status(&feed);
    assert_eq!((status.state, status.tally.reconnects, status.tally.malformed), (InputState::Connected, 1, 1));
    assert!(status.last_arrival.is_some());
    drop(client);
    drop(listener);
    until(&feed, |status| status.state == InputState::Reconnecting && status.tally.trouble.is_some()).await;
}

#[tokio::test]
async fn tcp_waits_for_a_server_to_come() {
    let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let address = listener.local_addr().unwrap();
    drop(listener);
    let mut feed = open(&[&format!("tcp://{address}")], true).await;
    until(&feed, |status| status.tally.trouble.is_some()).await;
    assert_eq!(status(&feed).state, InputState::Waiting);
    let listener = TcpListener::bind(address).await.unwrap();
    let (mut client, _) = listener.accept().await.unwrap();
    client.write_all(lines([1]).trim_end().as_bytes()).await.unwrap();
    drop(client);
    assert_eq!(seconds(&rest(&mut feed).await), [1]);
    assert_eq!(status(&feed).state, InputState::Ended);
    assert_eq!(status(&feed).tally.findings(), [""; 0], "it came in the end");
}

#[tokio::test]
async fn a_slow_reader_slows_the_sender_and_loses_nothing() {
    let listener = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let mut feed = open(&[&format!("tcp://{}", listener.local_addr().unwrap())], true).await;
    let (mut client, _) = listener.accept().await.unwrap();
    // Far more than all buffers hold.
    let sender = tokio::spawn(async move { client.write_all(lines(0..300_000).as_bytes()).await });
    until(&feed, |status| status.tally.frames > 100).await;
    assert!(!sender.is_finished(), "it has to wait");
    assert_eq!(seconds(&rest(&mut feed).await), (0..300_000).collect::<Vec<_>>());
    sender.await.unwrap().unwrap();
}

#[tokio::test]
async fn a_unix_socket_is_read() {
    let folder = TempDir::new().unwrap();
    let path = folder.path().join("feed.sock");
    let listener = UnixListener::bind(&path).unwrap();
    let mut feed = open(&[&format!("unix:{}", path.display())], false).await;
    for second in [1, 2] {
        let (mut client, _) = listener.accept().await.unwrap();
        client.write_all(lines([second]).as_bytes()).await.unwrap();
        assert_eq!(seconds(&next(&mut feed, 1).await), [second]);
    }
    assert_eq!(status(&feed).tally.reconnects, 1);
}

#[tokio::test]
async fn several_clients_send_to_one_address() {
    let mut feed = open(&["tcp-listen://:0"], true).await;
    let address = address(&feed);
    assert!(address.ip().is_loopback());
    assert_eq!(status(&feed).state, InputState::Waiting);
    let mut first = TcpStream::connect(address).await.unwrap();
    first.write_all(line(1, "Skarn.kv", 400.0).as_bytes()).await.unwrap();
    assert_eq!(seconds(&next(&mut feed, 1).await), [1]);
    let mut second = TcpStream::connect(address).await.unwrap();
    second.write_all(line(2, "SM.from.mw", 7.0).as_bytes()).await.unwrap();
    first.write_all(lines([3, 4]).as_bytes()).await.unwrap();
    second.write_all(lines([5]).as_bytes()).await.unwrap();
    assert_eq!(seconds(&next(&mut feed, 4).await), [2, 3, 4, 5]);
    drop(first);
    second.write_all(lines([6]).as_bytes()).await.unwrap();
    drop(second);
    assert_eq!(seconds(&rest(&mut feed).await), [6]);
    assert_eq!(status(&feed).tally.findings(), [""; 0]);
}

#[tokio::test]
async fn too_many_clients_are_turned_away() {
    let feed = open(&["tcp-listen://127.0.0.1:0"], false).await;
    let address = address(&feed);
    let mut clients = Vec::new();
    for _ in 0..32 {
        clients.push(TcpStream::connect(address).await.unwrap());
    }
    let mut turned_away = TcpStream::connect(address).await.unwrap();
    // Nobody takes lanes from the feed yet: they must not pile up, and neither must clients.
    let reader = tokio::spawn(async move {
        let mut feed = feed;
        feed.next_batch(1).await;
        feed
    });
    assert_eq!(turned_away.read(&mut [0]).await.unwrap_or(0), 0, "closed at once");
    clients[7].write_all(lines([1]).as_bytes()).await.unwrap();
    let feed = reader.await.unwrap();
    assert!(status(&feed).tally.trouble.unwrap().contains("turned away"));
}

#[tokio::test]
async fn datagrams_bring_whole_lines() {
    let mut feed = open(&["udp-listen://127.0.0.1:0"], false).await;
    let sender = UdpSocket::bind("127.0.0.1:0").await.unwrap();
    sender.connect(address(&feed)).await.unwrap();
    sender.send(lines([1, 2]).as_bytes()).await.unwrap();
    sender.send(&lines([3]).as_bytes()[..30]).await.unwrap();
    sender.send(lines([4]).trim_end().as_bytes()).await.unwrap();
    assert_eq!(seconds(&next(&mut feed, 3).await), [1, 2, 4]);
    assert_eq!(status(&feed).tally.malformed, 1);
}

#[tokio::test]
async fn too_many_datagrams_push_out_the_oldest() {
    const COUNT: i64 = 1000;
    let mut feed = open(&["udp-listen://127.0.0.1:0"], false).await;
    let sender = UdpSocket::bind("127.0.0.1:0").await.unwrap();
    sender.connect(address(&feed)).await.unwrap();
    for second in 0..COUNT {
        sender.send(lines([second]).as_bytes()).await.unwrap();
        // The system would drop datagrams too, out of sight.
        while status(&feed).tally.frames <= second.unsigned_abs() {
            tokio::task::yield_now().await;
        }
    }
    let overrun = i64::try_from(status(&feed).tally.overrun).unwrap();
    assert!(overrun > 0 && overrun < COUNT);
    let frames = next(&mut feed, usize::try_from(COUNT - overrun).unwrap()).await;
    assert!(seconds(&frames).is_sorted());
    assert_eq!(seconds(&frames).last(), Some(&(COUNT - 1)), "the newest are kept");
}

#[tokio::test]
async fn an_address_in_use_is_named() {
    let taken = TcpListener::bind("127.0.0.1:0").await.unwrap();
    let input = format!("tcp-listen://{}", taken.local_addr().unwrap());
    let error = Feed::open(&[input.parse().unwrap()], &channels(), Patience::default()).await.unwrap_err();
    assert!(error.to_string().starts_with(&format!("cannot open {input}: ")), "{error}");
}
