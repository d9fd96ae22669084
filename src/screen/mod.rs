//! Screen.
