//! What a tiled, phase-locked laser array puts on its target.
//!
//! A [`scenario`] describes the array, its errors, the target and what is
//! required. [`array`] lays the elements out, [`perturb`] draws their errors,
//! [`farfield`] computes the irradiance at the target, [`figures`] reads the
//! figures of merit from it, [`trials`] repeats that with fresh errors,
//! [`study`] puts a question to the machine, and [`report`] renders the answer.
//!
//! # Conventions
//!
//! - Aperture plane (x, y) and target plane (u, v) in metres, right-handed,
//!   seen along the beam; direction θ = (u, v)/range in radians, small angles.
//! - Fields carry exp(+iφ) for a phase error φ; the far field is
//!   U(θ) = Σ √P aₙ exp(iφₙ) exp(−ikθ·rₙ) A(θ − δₙ), so that a positive tilt δ
//!   moves an element's beam towards positive θ.
//! - Irradiance is |U|²/(λ·range)² in W/m²; powers in watts. An element's field
//!   is normalised to unit power after clipping at its edge.
//! - "rms" is one standard deviation; angular rms is per axis and of the emitted
//!   beam (a mirror's tilt counts twice).
//! - SI units everywhere inside; a name that carries a unit says it.
//! - Maps are row-major, `[row, column]` = `[v, u]`, both ascending.
//!
//! The library prints nothing, reads no clock, no environment and no randomness
//! but the scenario's seed.
#![forbid(unsafe_code)]
#![deny(missing_docs, missing_debug_implementations)]
#![warn(clippy::print_stdout, clippy::print_stderr)]

pub mod array;
pub mod error;
pub mod farfield;
pub mod figures;
pub mod perturb;
pub mod quantity;
pub mod report;
pub mod scenario;
pub mod study;
pub mod trials;
