//! Outcomes → console text, JSON, CSV, NPZ and pictures, as bytes; the command line writes them.

pub mod check;
pub mod console;
pub mod files;
pub mod picture;
pub mod summary;
pub mod tables;
pub mod units;
