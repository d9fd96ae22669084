//! The review: its figures against the records, files in every order and condition, parts and their merging, and what is
//! written of it.

mod bed;
mod figures;
mod files;
mod page;
mod paper;
mod parquet;
mod parts;
mod recorded;
mod report;
mod what_if;
