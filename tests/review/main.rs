//! Reviews of recorded days.

mod page;
mod paper;
mod parquet;
mod report;
