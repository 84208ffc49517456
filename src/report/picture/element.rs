//! One element of the array, drawn at its true shape and marked by its state.

use super::canvas::{Canvas, Pen, Point, Rect};
use super::style::{Colour, DARK, PAPER, UNLOCKED, phase};
use crate::perturb::State;
use crate::scenario::{Element, Shape};

/// Smaller elements show their state by a dot rather than by a pattern.
const SMALLEST_PATTERN_PX: f64 = 10.0;
/// Phase of a lit element in the legend, in half turns.
const SAMPLE_HALF_TURNS: f64 = 0.35;

/// A dot with a pale rim, for an element too small to show its state by a pattern.
pub(super) fn mark(canvas: &mut Canvas, state: State, centre: Point, half_px: f64) {
    let colour = match state {
        State::Unlocked => UNLOCKED,
        State::Dark => DARK,
        State::Lit => phase(SAMPLE_HALF_TURNS),
    };
    let middle = Rect::sized(centre.0.round(), centre.1.round(), 0.0, 0.0);
    canvas.fill_rect(middle.grown(half_px + 1.0), PAPER, 1.0);
    canvas.fill_rect(middle.grown(half_px), colour, 1.0);
}

/// The element's outline in pixels.
pub(super) struct Outlined {
    shape: Shape,
    pub size_px: f64,
    obscuration: f64,
}

impl Outlined {
    pub fn new(element: &Element, px_per_m: f64) -> Outlined {
        let size_px = element.size_m * px_per_m;
        Outlined {
            shape: element.shape,
            size_px: if size_px.is_finite() {
                size_px.max(0.0)
            } else {
                0.0
            },
            obscuration: element.obscuration.clamp(0.0, 1.0),
        }
    }

    /// Signed distance to the edge, for places relative to the centre.
    fn distance_px(&self, x: f64, y: f64) -> f64 {
        let half = 0.5 * self.size_px;
        let edge = match self.shape {
            Shape::Circle => x.hypot(y) - half,
            Shape::Square => x.abs().max(y.abs()) - half,
            // Flats face ±x, and the directions 60° away from it.
            Shape::Hexagon => x.abs().max(0.5 * x.abs() + 0.75f64.sqrt() * y.abs()) - half,
        };
        if self.obscuration > 0.0 {
            edge.max(self.obscuration * half - x.hypot(y))
        } else {
            edge
        }
    }

    /// Whether the element is too small for a pattern.
    pub fn is_small(&self) -> bool {
        self.size_px < SMALLEST_PATTERN_PX
    }

    /// An element marked by its state; a lit one in a colour that stands for any phase.
    pub fn marked(&self, canvas: &mut Canvas, centre: Point, state: State) {
        match state {
            State::Lit => self.fill(canvas, centre, phase(SAMPLE_HALF_TURNS)),
            _ if self.is_small() => {
                let half_px = (0.35 * self.size_px).round().max(1.5);
                mark(canvas, state, centre, half_px);
            }
            State::Dark => self.dark(canvas, centre),
            State::Unlocked => self.unlocked(canvas, centre),
        }
    }

    fn bounds(&self, centre: Point) -> Rect {
        // A hexagon reaches 2/√3 of its flats along y.
        let reach = 0.58 * self.size_px;
        Rect::sized(centre.0, centre.1, 0.0, 0.0).grown(reach)
    }

    pub fn fill(&self, canvas: &mut Canvas, centre: Point, colour: Colour) {
        canvas.fill(self.bounds(centre), colour, 1.0, |x, y| {
            self.distance_px(x - centre.0, y - centre.1)
        });
    }

    /// A line along the inside of the edge.
    fn rim(&self, canvas: &mut Canvas, centre: Point, colour: Colour, width_px: f64) {
        canvas.fill(self.bounds(centre), colour, 1.0, |x, y| {
            let distance = self.distance_px(x - centre.0, y - centre.1);
            distance.max(-distance - width_px)
        });
    }

    /// Hollow with a cross.
    fn dark(&self, canvas: &mut Canvas, centre: Point) {
        let width_px = (self.size_px / 12.0).clamp(1.0, 3.0);
        self.fill(canvas, centre, PAPER);
        self.rim(canvas, centre, DARK, width_px.min(1.5));
        let arm = 0.5 * self.size_px * 0.62;
        let (x, y) = centre;
        let pen = Pen::solid(DARK, width_px);
        canvas.stroke(&[(x - arm, y - arm), (x + arm, y + arm)], pen);
        canvas.stroke(&[(x - arm, y + arm), (x + arm, y - arm)], pen);
    }

    /// A thick rim with stripes.
    fn unlocked(&self, canvas: &mut Canvas, centre: Point) {
        let width_px = (self.size_px / 8.0).clamp(1.2, 5.0);
        let period_px = (self.size_px / 4.0).clamp(2.5, 14.0);
        self.fill(canvas, centre, PAPER);
        canvas.fill(self.bounds(centre), UNLOCKED, 1.0, |x, y| {
            let (x, y) = (x - centre.0, y - centre.1);
            let inside = self.distance_px(x, y);
            let across = (x + y) * 0.5f64.sqrt();
            let to_stripe = (across - period_px * (across / period_px).round()).abs();
            let stripe = to_stripe - 0.22 * period_px;
            inside.max(stripe.min(-inside - width_px))
        });
    }
}
