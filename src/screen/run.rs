use std::{
    io::{self, Write, stdout},
    time::Duration,
};

use crossterm::event::{Event, EventStream, KeyCode, KeyModifiers, MouseEventKind};
use futures::StreamExt;
use rustix::process::{Signal, getpid, kill_process};
use tokio::{
    signal::unix::{SignalKind, signal},
    sync::watch,
    time::{Instant, MissedTickBehavior, interval, sleep_until},
};

use super::{
    connection::{Order, Parcel},
    export,
    pace::{Pace, Why},
    state::App,
    terminal::{self, Screen},
    view::{self, Theme},
};

/// How a screen ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Ending {
    /// The user left, or a signal asked for it.
    Left,
    /// The connection broke: whoever started it knows why.
    Disconnected,
}

/// Shows what comes in until the user leaves or a signal ends it. An order is refused with `false`.
pub async fn run(
    mut app: App,
    mut parcels: watch::Receiver<Option<Parcel>>,
    order: impl Fn(Order) -> bool,
) -> io::Result<Ending> {
    let theme = Theme::from_environment();
    let mut interrupted = signal(SignalKind::interrupt())?;
    let mut terminated = signal(SignalKind::terminate())?;
    let mut hung_up = signal(SignalKind::hangup())?;
    let mut suspended = signal(SignalKind::from_raw(Signal::TSTP.as_raw()))?;
    let mut continued = signal(SignalKind::from_raw(Signal::CONT.as_raw()))?;
    let mut second = interval(Duration::from_secs(1));
    second.set_missed_tick_behavior(MissedTickBehavior::Skip);
    let mut screen = Screen::take()?;
    let mut keys = EventStream::new();
    let mut pace = Pace::default();
    pace.want(Why::Key);

    while !app.leaving {
        let due = pace.due(std::time::Instant::now());
        tokio::select! {
            biased;
            event = keys.next() => match event {
                Some(Ok(event)) => match answer(&mut app, &event) {
                    Answer::Nothing => continue,
                    Answer::Drawing => {}
                    Answer::Order(wanted) => {
                        if !order(wanted) {
                            app.refused();
                        }
                    }
                    Answer::Suspend => suspend()?,
                },
                Some(Err(error)) => return Err(error),
                None => break,
            },
            _ = interrupted.recv() => break,
            _ = terminated.recv() => break,
            _ = hung_up.recv() => break,
            _ = suspended.recv() => suspend()?,
            _ = continued.recv() => screen.retake()?,
            () = sleep_until(due.map_or_else(Instant::now, Instant::from_std)), if due.is_some() => {
                app.clock = std::time::Instant::now();
                app.size = screen.terminal.size()?;
                let mut drawn = None;
                let page = screen.terminal.draw(|frame| drawn = Some(view::draw(frame, &app, theme)))?;
                app.drawn = drawn.unwrap_or_default();
                let exported = app.export.take().map(|what| export::export(&app, page.buffer, what));
                if app.rings() {
                    stdout().write_all(b"\x07")?;
                    stdout().flush()?;
                }
                pace.done(std::time::Instant::now());
                if let Some(outcome) = exported {
                    app.exported(outcome);
                    pace.want(Why::Key);
                }
                continue;
            }
            changed = parcels.changed() => {
                if changed.is_err() {
                    return Ok(Ending::Disconnected);
                }
                if let Some(parcel) = parcels.borrow_and_update().clone() {
                    app.receive(parcel);
                }
                pace.want(Why::Data);
                continue;
            }
            _ = second.tick() => {
                if app.ticks() {
                    pace.want(Why::Data);
                }
                continue;
            }
        }
        pace.want(Why::Key);
    }
    Ok(Ending::Left)
}

/// Gives the terminal back and stops until told to continue, which takes it anew.
fn suspend() -> io::Result<()> {
    terminal::give_back();
    Ok(kill_process(getpid(), Signal::STOP)?)
}

enum Answer {
    Nothing,
    Drawing,
    Suspend,
    Order(Order),
}

fn answer(app: &mut App, event: &Event) -> Answer {
    let order = match event {
        Event::Key(key) if key.modifiers.contains(KeyModifiers::CONTROL) && key.code == KeyCode::Char('z') => {
            return Answer::Suspend;
        }
        Event::Key(key) => app.key(*key),
        Event::Mouse(mouse) if matches!(mouse.kind, MouseEventKind::Moved | MouseEventKind::Drag(_)) => {
            return Answer::Nothing;
        }
        Event::Mouse(mouse) => app.mouse(*mouse),
        Event::Resize(..) => None,
        _ => return Answer::Nothing,
    };
    order.map_or(Answer::Drawing, Answer::Order)
}
