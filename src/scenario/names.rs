//! The words that a scenario chooses from.

use super::{
    Comparison, Dropped, Facets, Keep, Lattice, MethodChoice, Origin, Outline, Shape, Statistic,
};

/// A choice, by the word that stands for it in a scenario.
pub trait Named: Copy + PartialEq + 'static {
    /// Every choice and its word.
    const NAMES: &'static [(&'static str, Self)];

    /// The word.
    fn name(self) -> &'static str {
        Self::NAMES
            .iter()
            .find(|(_, choice)| *choice == self)
            .map_or("", |(name, _)| name)
    }
}

impl Named for Lattice {
    const NAMES: &'static [(&'static str, Self)] = &[
        ("square", Lattice::Square),
        ("hexagonal", Lattice::Hexagonal),
    ];
}

impl Named for Outline {
    const NAMES: &'static [(&'static str, Self)] = &[
        ("circle", Outline::Circle),
        ("square", Outline::Square),
        ("hexagon", Outline::Hexagon),
    ];
}

impl Named for Keep {
    const NAMES: &'static [(&'static str, Self)] =
        &[("whole", Keep::Whole), ("centre", Keep::Centre)];
}

impl Named for Origin {
    const NAMES: &'static [(&'static str, Self)] = &[("site", Origin::Site), ("gap", Origin::Gap)];
}

impl Named for Shape {
    const NAMES: &'static [(&'static str, Self)] = &[
        ("circle", Shape::Circle),
        ("square", Shape::Square),
        ("hexagon", Shape::Hexagon),
    ];
}

impl Named for Facets {
    const NAMES: &'static [(&'static str, Self)] =
        &[("curved", Facets::Curved), ("flat", Facets::Flat)];
}

impl Named for Dropped {
    const NAMES: &'static [(&'static str, Self)] =
        &[("dark", Dropped::Dark), ("unlocked", Dropped::Unlocked)];
}

impl Named for Statistic {
    const NAMES: &'static [(&'static str, Self)] = &[
        ("trials", Statistic::Trials),
        ("mean", Statistic::Mean),
        ("long_exposure", Statistic::LongExposure),
    ];
}

impl Named for MethodChoice {
    const NAMES: &'static [(&'static str, Self)] = &[
        ("auto", MethodChoice::Auto),
        ("sampled", MethodChoice::Sampled),
        ("factored", MethodChoice::Factored),
        ("direct", MethodChoice::Direct),
        ("closed_form", MethodChoice::ClosedForm),
    ];
}

impl Named for Comparison {
    const NAMES: &'static [(&'static str, Self)] =
        &[(">=", Comparison::AtLeast), ("<=", Comparison::AtMost)];
}
