//! Alarms: their definitions, their behaviour, what is kept of them, and how thresholds are tried.

mod bed;
mod board;
mod definitions;
mod demo;
mod journal;
mod killing;
mod trying;
