//! A program on a real (pseudo) terminal.

use std::{
    fs::File,
    io::{Read, Write},
    os::fd::OwnedFd,
    process::{Child, Command, ExitStatus},
    sync::mpsc::{Receiver, channel},
    thread,
    time::{Duration, Instant},
};

use rustix::{
    fs::{Mode, OFlags},
    process::{Pid, Signal, WaitOptions, kill_process, waitpid},
    pty::{OpenptFlags, grantpt, openpt, ptsname, unlockpt},
    termios::{LocalModes, Winsize, tcgetattr, tcsetwinsize},
};

const PATIENCE: Duration = Duration::from_secs(30);

/// A program on a terminal of 80×24.
pub struct Stage {
    pub child: Child,
    pub keyboard: File,
    terminal: OwnedFd,
    output: Receiver<Vec<u8>>,
    pub seen: String,
}

impl Stage {
    pub fn new(mut command: Command) -> Self {
        let master = openpt(OpenptFlags::RDWR | OpenptFlags::NOCTTY).unwrap();
        grantpt(&master).unwrap();
        unlockpt(&master).unwrap();
        let name = ptsname(&master, Vec::new()).unwrap();
        let terminal = rustix::fs::open(name, OFlags::RDWR | OFlags::NOCTTY, Mode::empty()).unwrap();
        tcsetwinsize(&terminal, Winsize { ws_row: 24, ws_col: 80, ws_xpixel: 0, ws_ypixel: 0 }).unwrap();
        let end = || terminal.try_clone().unwrap();
        let child = command.stdin(end()).stdout(end()).stderr(end()).env("TERM", "xterm-256color").spawn().unwrap();

        let keyboard = File::from(master);
        let mut screen = keyboard.try_clone().unwrap();
        let (sender, output) = channel();
        thread::spawn(move || {
            let mut bytes = [0; 4096];
            while let Ok(count @ 1..) = screen.read(&mut bytes) {
                if sender.send(bytes[..count].to_vec()).is_err() {
                    break;
                }
            }
        });
        Self { child, keyboard, terminal, output, seen: String::new() }
    }

    pub fn signal(&self, signal: Signal) {
        kill_process(Pid::from_child(&self.child), signal).unwrap();
    }

    #[allow(dead_code, reason = "shared by tests of which not all need it")]
    /// Presses keys, then has everything drawn anew.
    pub fn press(&mut self, keys: &str) {
        self.keyboard.write_all(keys.as_bytes()).unwrap();
        thread::sleep(Duration::from_millis(300));
        self.seen.clear();
        self.signal(Signal::CONT);
    }

    pub fn is_raw(&self) -> bool {
        !tcgetattr(&self.terminal).unwrap().local_modes.contains(LocalModes::ICANON)
    }

    /// Waits until the output contains a text.
    pub fn wait_for(&mut self, text: &str) {
        let start = Instant::now();
        while !self.seen.contains(text) {
            assert!(start.elapsed() < PATIENCE, "no “{text}” in {:?}", self.seen);
            if let Ok(bytes) = self.output.recv_timeout(Duration::from_millis(100)) {
                self.seen += &String::from_utf8_lossy(&bytes);
            }
        }
    }

    /// The same, having everything drawn anew meanwhile: what changes one letter is not written as a whole.
    #[allow(dead_code, reason = "shared by tests of which not all need it")]
    pub fn wait_for_redrawn(&mut self, text: &str) {
        let start = Instant::now();
        while !words(&self.seen).contains(text) {
            assert!(start.elapsed() < PATIENCE, "no “{text}” in {:?}", self.seen);
            self.signal(Signal::CONT);
            while let Ok(bytes) = self.output.recv_timeout(Duration::from_millis(500)) {
                self.seen += &String::from_utf8_lossy(&bytes);
                if words(&self.seen).contains(text) {
                    break;
                }
            }
        }
    }

    #[allow(dead_code, reason = "shared by tests of which not all need it")]
    pub fn wait_for_stop(&self) {
        let start = Instant::now();
        let options = WaitOptions::UNTRACED | WaitOptions::NOHANG;
        while !waitpid(Some(Pid::from_child(&self.child)), options).unwrap().is_some_and(|(_, status)| status.stopped())
        {
            assert!(start.elapsed() < PATIENCE, "it does not stop");
            thread::sleep(Duration::from_millis(10));
        }
    }

    pub fn wait_for_end(&mut self) -> ExitStatus {
        let start = Instant::now();
        loop {
            if let Some(status) = self.child.try_wait().unwrap() {
                while let Ok(bytes) = self.output.recv_timeout(Duration::from_millis(200)) {
                    self.seen += &String::from_utf8_lossy(&bytes);
                }
                return status;
            }
            assert!(start.elapsed() < PATIENCE, "it does not end");
            thread::sleep(Duration::from_millis(10));
        }
    }

    pub fn assert_given_back(&self) {
        assert!(!self.is_raw());
        for sequence in ["\u{1b}[?1049l", "\u{1b}[?25h", "\u{1b}[?1000l"] {
            assert!(self.seen.contains(sequence), "{sequence:?} is missing at the end");
        }
    }
}

/// What a terminal shows, without its control sequences.
fn words(seen: &str) -> String {
    let runs =
        seen.split('\u{1b}').map(|run| run.trim_start_matches(|c: char| "[?;".contains(c) || c.is_ascii_digit()));
    runs.filter_map(|run| run.get(1..)).collect::<Vec<_>>().join(" ").split_whitespace().collect::<Vec<_>>().join(" ")
}
