//! The terminal in raw mode, and back again whatever happens.

use std::{
    io::{self, Stdout, stdout},
    sync::Once,
};

use crossterm::{
    cursor::{Hide, Show},
    event::{DisableMouseCapture, EnableMouseCapture},
    execute,
    style::ResetColor,
    terminal::{Clear, ClearType, EnterAlternateScreen, LeaveAlternateScreen, disable_raw_mode, enable_raw_mode},
};
use ratatui::{Terminal, backend::CrosstermBackend};

/// A terminal that is given back when this is dropped, and before a panic says anything.
pub struct Screen {
    /// What to draw on.
    pub terminal: Terminal<CrosstermBackend<Stdout>>,
}

impl Screen {
    /// Takes the terminal.
    pub fn take() -> io::Result<Self> {
        static HOOK: Once = Once::new();
        HOOK.call_once(|| {
            let before = std::panic::take_hook();
            std::panic::set_hook(Box::new(move |panic| {
                give_back();
                before(panic);
            }));
        });
        enter().inspect_err(|_| give_back())?;
        let terminal = Terminal::new(CrosstermBackend::new(stdout())).inspect_err(|_| give_back())?;
        Ok(Self { terminal })
    }

    /// Takes the terminal anew, after the process was stopped and goes on.
    pub fn retake(&mut self) -> io::Result<()> {
        enter()?;
        execute!(stdout(), Clear(ClearType::All))?;
        // A new one draws everything. Clearing the old one would ask the terminal where the cursor is, and wait.
        self.terminal = Terminal::new(CrosstermBackend::new(stdout()))?;
        Ok(())
    }
}

impl Drop for Screen {
    fn drop(&mut self) {
        give_back();
    }
}

fn enter() -> io::Result<()> {
    enable_raw_mode()?;
    execute!(stdout(), EnterAlternateScreen, EnableMouseCapture, Hide)
}

/// Puts everything back; harmless when there is nothing to put back, and silent when the terminal is gone.
pub(super) fn give_back() {
    // Who sees the last of it sees a terminal that is whole.
    let _ = disable_raw_mode();
    let _ = execute!(stdout(), DisableMouseCapture, ResetColor, Show, LeaveAlternateScreen);
}
