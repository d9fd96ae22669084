//! Network.
