//! The errors of the array: one draw a trial.

/// State of an element in a trial.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum State {
    /// Lit and locked.
    Lit,
    /// Radiates nothing.
    Dark,
    /// Radiates at a random phase.
    Unlocked,
}

/// The errors of every element in one trial.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Draw {
    /// Phase error.
    pub phase_rad: Vec<f64>,
    /// Tilt error along x, common jitter included.
    pub tilt_x_rad: Vec<f64>,
    /// Tilt error along y, common jitter included.
    pub tilt_y_rad: Vec<f64>,
    /// Factor on the amplitude: 0 when dark, 1 without errors.
    pub amplitude: Vec<f64>,
    /// What each element does.
    pub state: Vec<State>,
}
