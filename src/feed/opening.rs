use std::{io, sync::Arc};

use tokio::{
    net::{TcpListener, UdpSocket, UnixStream},
    sync::mpsc,
    task::{JoinSet, spawn_blocking},
};

use super::{
    Channels, Format, Input, InputState, Reader, connect, follow,
    inlet::Inlet,
    listen,
    merge::Lane,
    monitor::Gauge,
    stream::{Closed, Queue, Strand, Stream},
    switch::Switch,
};

/// Opens inputs one after another, each read by a task of its own.
#[derive(Debug)]
pub(super) struct Opening<'a> {
    channels: &'a Arc<Channels>,
    switch: Switch,
    once: bool,
    lane_sender: mpsc::Sender<Lane<Inlet>>,
    pub lanes: Vec<Lane<Inlet>>,
    pub gauges: Vec<Arc<Gauge>>,
    pub tasks: JoinSet<()>,
}

impl<'a> Opening<'a> {
    pub fn new(
        channels: &'a Arc<Channels>,
        switch: &Switch,
        once: bool,
        lane_sender: mpsc::Sender<Lane<Inlet>>,
    ) -> Self {
        let switch = switch.clone();
        Self { channels, switch, once, lane_sender, lanes: Vec::new(), gauges: Vec::new(), tasks: JoinSet::new() }
    }

    pub async fn open(&mut self, input: &Input, is_live: bool) -> io::Result<()> {
        let once = self.once;
        match input.clone() {
            Input::File(path) => {
                let channels = self.channels.clone();
                let opened = spawn_blocking(move || Reader::open(&path, &channels)).await;
                self.read(opened.map_err(io::Error::other)??, is_live);
            }
            Input::Stdin => {
                self.read(Reader::new(&input.to_string(), io::stdin(), Format::JsonLines, self.channels), is_live);
            }
            Input::Tcp(address) => {
                let (strand, gauge) = self.strand(input, Format::JsonLines);
                self.spawn(gauge, connect::run(strand, once, async move || connect::tcp(&address).await));
            }
            Input::Unix(path) => {
                let (strand, gauge) = self.strand(input, Format::JsonLines);
                self.spawn(gauge, connect::run(strand, once, async move || UnixStream::connect(&path).await));
            }
            Input::Follow(path) => {
                let (strand, gauge) = self.strand(input, Format::of(&path));
                self.spawn(gauge, async move { follow::run(&path, strand, once).await });
            }
            Input::UdpListen(address) => {
                let socket = UdpSocket::bind((&*address.host, address.port)).await?;
                let (strand, gauge) = self.strand(input, Format::JsonLines);
                gauge.lock().address = socket.local_addr().ok();
                self.spawn(gauge, listen::udp(socket, strand));
            }
            Input::TcpListen(address) => {
                let listener = TcpListener::bind((&*address.host, address.port)).await?;
                let gauge = Gauge::new(&input.to_string());
                gauge.lock().address = listener.local_addr().ok();
                let (channels, of_clients, switch) = (self.channels.clone(), gauge.clone(), self.switch.clone());
                let stream =
                    move || Stream::new(Format::JsonLines, channels.clone(), of_clients.clone()).with(switch.clone());
                let lanes = self.lane_sender.clone();
                self.gauges.push(gauge.clone());
                self.spawn(gauge, listen::tcp(listener, lanes, once, stream));
            }
        }
        Ok(())
    }

    /// Reads on a thread that may block.
    fn read(&mut self, reader: Reader, is_live: bool) {
        let mut reader = reader.with(self.switch.clone());
        let queue = self.lane(reader.gauge().clone(), is_live);
        self.tasks.spawn_blocking(move || {
            while let Some(frames) = reader.next_frames() {
                if queue.send_blocking(frames).is_err() {
                    return;
                }
            }
        });
    }

    fn strand(&mut self, input: &Input, format: Format) -> (Strand, Arc<Gauge>) {
        let gauge = Gauge::new(&input.to_string());
        let queue = self.lane(gauge.clone(), true);
        let stream = Stream::new(format, self.channels.clone(), gauge.clone()).with(self.switch.clone());
        (Strand { stream, queue }, gauge)
    }

    fn lane(&mut self, gauge: Arc<Gauge>, is_live: bool) -> Queue {
        let (queue, outlet) = Queue::new();
        self.lanes.push(Lane::new(gauge.clone(), Inlet::new(outlet, is_live)));
        self.gauges.push(gauge);
        queue
    }

    fn spawn(&mut self, gauge: Arc<Gauge>, task: impl Future<Output = Result<(), Closed>> + Send + 'static) {
        self.tasks.spawn(async move {
            let _ended_or_unwanted = task.await;
            gauge.set(InputState::Ended);
        });
    }
}
