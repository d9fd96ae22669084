//! The review: its figures against the records, files in every order and condition, parts and their merging.

mod bed;
mod figures;
mod files;
mod parts;
mod recorded;
mod what_if;
