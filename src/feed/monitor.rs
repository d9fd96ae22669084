use std::{
    net::SocketAddr,
    sync::{Arc, Mutex, MutexGuard, PoisonError},
    time::Instant,
};

use super::{Tally, tally::printable};

/// How every input is doing, for whoever shows it; cheap to clone and to ask from any thread.
#[derive(Debug, Clone)]
pub struct Monitor(pub(super) Arc<[Arc<Gauge>]>);

/// How one input is doing.
#[derive(Debug, Clone)]
pub struct InputStatus {
    /// The input as it was given, without control characters.
    pub name: Arc<str>,
    /// What it is doing.
    pub state: InputState,
    /// When bytes last came, by this computer's clock. Only the age of live data looks at it.
    pub last_arrival: Option<Instant>,
    /// Where it listens, if it does.
    pub address: Option<SocketAddr>,
    /// What came.
    pub tally: Tally,
}

/// What an input is doing.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum InputState {
    /// Nobody has connected, or the file does not exist yet.
    Waiting,
    /// Reading.
    Connected,
    /// The connection is lost, and is being opened again.
    Reconnecting,
    /// Nothing more will come.
    Ended,
}

impl Monitor {
    /// Every input, in the order they were given.
    pub fn inputs(&self) -> Vec<InputStatus> {
        self.0.iter().map(|gauge| gauge.lock().clone()).collect()
    }
}

/// An input's status, shared between its task and the monitor.
#[derive(Debug)]
pub(super) struct Gauge(Mutex<InputStatus>);

impl Gauge {
    pub fn new(name: &str) -> Arc<Self> {
        let name = printable(name).into();
        let state = InputState::Waiting;
        Arc::new(Self(Mutex::new(InputStatus {
            name,
            state,
            last_arrival: None,
            address: None,
            tally: Tally::default(),
        })))
    }

    pub fn lock(&self) -> MutexGuard<'_, InputStatus> {
        // Counts stay usable whatever happened to a thread that was counting.
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// Bytes may come from now on, and no trouble stands any more.
    pub fn connected(&self, again: bool) {
        let mut status = self.lock();
        status.state = InputState::Connected;
        status.tally.trouble = None;
        status.tally.reconnects += u64::from(again);
    }

    pub fn set(&self, state: InputState) {
        self.lock().state = state;
    }
}
