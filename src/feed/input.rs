use std::{fmt, path::PathBuf, str::FromStr};

use thiserror::Error;

/// Where frames come from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Input {
    /// A recorded file, gzip or zstd or plain; JSON Lines, or CSV by its ending.
    File(PathBuf),
    /// Standard input.
    Stdin,
    /// A server to connect to.
    Tcp(Address),
    /// An address to take connections on.
    TcpListen(Address),
    /// An address to take datagrams on.
    UdpListen(Address),
    /// A Unix socket to connect to.
    Unix(PathBuf),
    /// A growing file.
    Follow(PathBuf),
}

/// A host, loopback unless one is given, and a port.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Address {
    /// Name or number.
    pub host: String,
    /// When listening, 0 lets the system choose.
    pub port: u16,
}

/// An input that cannot be understood.
#[derive(Debug, Error, PartialEq, Eq)]
#[error(
    "`{0}` is no input; accepted are a path (JSON Lines or .csv, also as .gz or .zst), - for standard input, \
     tcp://HOST:PORT, tcp-listen://[HOST]:PORT, udp-listen://[HOST]:PORT, unix:PATH, and follow:PATH"
)]
pub struct InputError(String);

impl Input {
    /// Whether frames come as they are made, rather than as fast as they can be read.
    pub(super) fn is_live(&self) -> bool {
        !matches!(self, Self::File(_) | Self::Stdin)
    }
}

impl FromStr for Input {
    type Err = InputError;

    fn from_str(text: &str) -> Result<Self, InputError> {
        let error = || InputError(text.chars().filter(|c| !c.is_control()).collect());
        let address = |text: &str| Address::parse(text).ok_or_else(error);
        let path = |text: &str| if text.is_empty() { Err(error()) } else { Ok(PathBuf::from(text)) };
        if text == "-" {
            Ok(Self::Stdin)
        } else if let Some(rest) = text.strip_prefix("tcp://") {
            address(rest).map(Self::Tcp)
        } else if let Some(rest) = text.strip_prefix("tcp-listen://") {
            address(rest).map(Self::TcpListen)
        } else if let Some(rest) = text.strip_prefix("udp-listen://") {
            address(rest).map(Self::UdpListen)
        } else if let Some(rest) = text.strip_prefix("unix:") {
            path(rest).map(Self::Unix)
        } else if let Some(rest) = text.strip_prefix("follow:") {
            path(rest).map(Self::Follow)
        } else if text.contains("://") {
            Err(error())
        } else {
            path(text).map(Self::File)
        }
    }
}

impl Address {
    fn parse(text: &str) -> Option<Self> {
        let (host, port) = text.rsplit_once(':')?;
        let port = port.parse().ok()?;
        let host = match host.strip_prefix('[') {
            Some(host) => host.strip_suffix(']')?,
            None if host.contains(':') => return None,
            None if host.is_empty() => "127.0.0.1",
            None => host,
        };
        let is_possible = !host.is_empty() && !host.contains(|c: char| c.is_whitespace() || "/[]@".contains(c));
        is_possible.then(|| Self { host: host.into(), port })
    }

    pub(super) fn as_pair(&self) -> (&str, u16) {
        (&self.host, self.port)
    }
}

impl fmt::Display for Address {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.host.contains(':') {
            write!(f, "[{}]:{}", self.host, self.port)
        } else {
            write!(f, "{}:{}", self.host, self.port)
        }
    }
}

impl fmt::Display for Input {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::File(path) => write!(f, "{}", path.display()),
            Self::Stdin => f.write_str("standard input"),
            Self::Tcp(address) => write!(f, "tcp://{address}"),
            Self::TcpListen(address) => write!(f, "tcp-listen://{address}"),
            Self::UdpListen(address) => write!(f, "udp-listen://{address}"),
            Self::Unix(path) => write!(f, "unix:{}", path.display()),
            Self::Follow(path) => write!(f, "follow:{}", path.display()),
        }
    }
}
