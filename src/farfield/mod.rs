//! Array and draw → irradiance at the target.

pub mod map;
