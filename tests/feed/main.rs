//! From bytes to frames: every kind of input, whole and broken.

mod bed;
mod broken;
mod files;
mod following;
mod inputs;
mod merging;
mod sockets;
mod values;
