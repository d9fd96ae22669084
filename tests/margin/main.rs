//! The margins against values from outside this project, and what must hold for any corridor.

mod bench;
mod cases;
mod changes;
mod edges;
mod properties;
mod published;
mod what_if;
