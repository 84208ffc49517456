//! Quantities: a number and a unit.

/// Kind of a quantity.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Metres.
    Length,
    /// Radians.
    Angle,
    /// Radians of optical phase, or a path error.
    Phase,
    /// Watts.
    Power,
    /// Watts per square metre.
    Irradiance,
    /// Hertz.
    Frequency,
    /// Seconds.
    Time,
    /// A pure number.
    Ratio,
}
