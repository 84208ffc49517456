//! Requirements, and the figures of merit that they may name.

use crate::quantity::Kind;

/// A figure of merit, in the order of every table.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[allow(
    missing_docs,
    reason = "each is defined in `figures`, by the key that `key` returns"
)]
pub enum Figure {
    Strehl,
    StrehlPeak,
    AimIrradiance,
    PeakIrradiance,
    Offset,
    RadiatedPower,
    BucketPower,
    BucketFraction,
    Encircled50Diameter,
    Encircled80Diameter,
    Encircled86Diameter,
    Fwhm,
    FwhmX,
    FwhmY,
    SecondMomentX,
    SecondMomentY,
    SideLobeRatio,
    CombiningEfficiency,
    BeamQuality,
    WindowFraction,
}

impl Figure {
    /// Every figure, in the order of every table.
    pub const ALL: [Figure; 20] = [
        Figure::Strehl,
        Figure::StrehlPeak,
        Figure::AimIrradiance,
        Figure::PeakIrradiance,
        Figure::Offset,
        Figure::RadiatedPower,
        Figure::BucketPower,
        Figure::BucketFraction,
        Figure::Encircled50Diameter,
        Figure::Encircled80Diameter,
        Figure::Encircled86Diameter,
        Figure::Fwhm,
        Figure::FwhmX,
        Figure::FwhmY,
        Figure::SecondMomentX,
        Figure::SecondMomentY,
        Figure::SideLobeRatio,
        Figure::CombiningEfficiency,
        Figure::BeamQuality,
        Figure::WindowFraction,
    ];

    /// Name without unit, as `[require]` writes it.
    pub fn name(self) -> &'static str {
        match self {
            Figure::Strehl => "strehl",
            Figure::StrehlPeak => "strehl_peak",
            Figure::AimIrradiance => "aim_irradiance",
            Figure::PeakIrradiance => "peak_irradiance",
            Figure::Offset => "offset",
            Figure::RadiatedPower => "radiated_power",
            Figure::BucketPower => "bucket_power",
            Figure::BucketFraction => "bucket_fraction",
            Figure::Encircled50Diameter => "encircled_50_diameter",
            Figure::Encircled80Diameter => "encircled_80_diameter",
            Figure::Encircled86Diameter => "encircled_86_diameter",
            Figure::Fwhm => "fwhm",
            Figure::FwhmX => "fwhm_x",
            Figure::FwhmY => "fwhm_y",
            Figure::SecondMomentX => "second_moment_x",
            Figure::SecondMomentY => "second_moment_y",
            Figure::SideLobeRatio => "side_lobe_ratio",
            Figure::CombiningEfficiency => "combining_efficiency",
            Figure::BeamQuality => "beam_quality",
            Figure::WindowFraction => "window_fraction",
        }
    }

    /// Kind of quantity.
    pub fn kind(self) -> Kind {
        match self {
            Figure::AimIrradiance | Figure::PeakIrradiance => Kind::Irradiance,
            Figure::RadiatedPower | Figure::BucketPower => Kind::Power,
            Figure::Offset
            | Figure::Encircled50Diameter
            | Figure::Encircled80Diameter
            | Figure::Encircled86Diameter
            | Figure::Fwhm
            | Figure::FwhmX
            | Figure::FwhmY
            | Figure::SecondMomentX
            | Figure::SecondMomentY => Kind::Length,
            _ => Kind::Ratio,
        }
    }

    /// Key in JSON and CSV: the name with its SI unit.
    pub fn key(self) -> String {
        let suffix = match self.kind() {
            Kind::Length => "_m",
            Kind::Power => "_w",
            Kind::Irradiance => "_w_m2",
            _ => "",
        };
        format!("{}{suffix}", self.name())
    }
}

/// `[require]`
#[derive(Debug, Clone, PartialEq)]
pub struct Requirement {
    /// Bounds, in the order written.
    pub bounds: Vec<Bound>,
    /// What they apply to.
    pub statistic: Statistic,
    /// With trials: share that must satisfy all bounds at once.
    pub confidence: f64,
}

/// One bound on one figure.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bound {
    /// The figure.
    pub figure: Figure,
    /// Its side.
    pub comparison: Comparison,
    /// Its value in SI units.
    pub value: f64,
}

/// Side of a bound.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Comparison {
    /// `>=`
    AtLeast,
    /// `<=`
    AtMost,
}

/// What the bounds apply to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Statistic {
    /// Each trial.
    Trials,
    /// The mean over trials.
    Mean,
    /// The figure of the mean map.
    LongExposure,
}
