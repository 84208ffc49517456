//! Outcomes → console text, tables, pictures and pages, as bytes.

pub mod picture;
pub mod units;
