//! Source.
