//! The screen as it is drawn, and how it answers keys.

#[path = "screen/sample.rs"]
#[allow(dead_code, reason = "shared with the library's own tests")]
mod sample;
#[path = "screen/stage.rs"]
mod stage;

#[path = "screen/alarms.rs"]
mod alarms;
#[path = "screen/drawings.rs"]
mod drawings;
#[path = "screen/instrument.rs"]
mod instrument;
#[path = "screen/keys.rs"]
mod keys;
#[cfg(unix)]
#[path = "screen/pty.rs"]
mod pty;
#[cfg(unix)]
#[path = "screen/terminal.rs"]
mod terminal;
#[path = "screen/unbreakable.rs"]
mod unbreakable;
#[cfg(unix)]
#[path = "screen/watching.rs"]
mod watching;
