//! Questions put to the machine below.

pub mod assess;
pub mod notes;
pub mod requirement;
pub mod setup;
