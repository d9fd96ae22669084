//! Brings up the screen over a connection on a thread of its own.

use std::{
    io::{IsTerminal, stdout},
    sync::Arc,
};

use tokio::{
    runtime::{Builder, Runtime},
    sync::watch,
};

use super::{Failure, inputs};
use crate::{
    config::Config,
    screen::{
        self, Ending,
        connection::{Order, Parcel},
        state::App,
    },
};

/// Orders that wait at most; more come faster than anybody means them.
pub(super) const ORDERS_WAITING: usize = 64;

/// Refuses where there is no terminal to draw on.
pub(super) fn needs_terminal() -> Result<(), Failure> {
    if stdout().is_terminal() {
        Ok(())
    } else {
        Err("standard output is no terminal to draw on; `tautline assess` writes records instead".into())
    }
}

/// A runtime for the screen and whatever it waits for.
pub(super) fn runtime() -> Result<Runtime, Failure> {
    Ok(Builder::new_multi_thread().worker_threads(2).enable_all().build()?)
}

/// Shows a connection until the user leaves, or it breaks; the terminal is given back by then.
pub(super) fn show(
    runtime: &Runtime,
    config: &Config,
    parcels: watch::Receiver<Option<Parcel>>,
    order: impl Fn(Order) -> bool,
) -> Result<Ending, Failure> {
    let mut app = App::new(Arc::new(config.grid.clone()), config.time_zone, inputs::max_age(config));
    app.settings = config.screen.clone();
    Ok(runtime.block_on(screen::run(app, parcels, order))?)
}

/// What to say of a connection that broke down.
pub(super) fn fault() -> Failure {
    "the thread that assesses failed; this is a fault of the program, please report it".into()
}
