//! The aperture in one trial: every element with its phase and its state.

use super::canvas::{Canvas, Point, Rect};
use super::element::{Outlined, mark};
use super::frame::{Frame, Side, colour_bar, heading};
use super::style::{
    BODY, Colour, DARK, EMPHASIS, ENVELOPE, HEIGHT, MARGIN, NARROW, PAPER, TEXT, TEXT_LIGHT,
    UNLOCKED, phase,
};
use super::text::Anchor;
use super::ticks::{Ticks, rounded_up};
use crate::perturb::{Seen, State};
use crate::quantity::Kind;
use crate::report::units::{readable, unit_for};
use crate::scenario::Element;
use std::f64::consts::{PI, TAU};

const SIDE: usize = 560;
const TOP: f64 = 114.0;
const LEFT: f64 = MARGIN + 75.0;
/// Left edge of the column with colour bar and legend.
const COLUMN: f64 = LEFT + SIDE as f64 + 40.0;
/// Smaller elements are painted as an image of cells rather than as shapes.
const SMALLEST_SHAPE_PX: f64 = 3.0;
/// More marks than this would hide the picture that they are meant to mark.
const MOST_MARKS: usize = 2000;
/// Half turns of the cyclic colour map that the ends of an open scale take:
/// as far as the hues are strong.
const OPEN_END: f64 = 0.62;

/// Calls back with every element, as often as it is asked to.
pub type Elements<'a> = &'a dyn Fn(&mut dyn FnMut(Seen));

/// An array as drawn in one trial.
#[derive(Clone, Copy)]
pub struct AperturePicture<'a> {
    /// Title of the study.
    pub title: &'a str,
    /// What is shown, e.g. `one trial, no. 17`.
    pub what: &'a str,
    /// The element at every site.
    pub element: Element,
    /// Diameter of the circle around the array.
    pub envelope_diameter_m: f64,
    /// Every element with its phase and state.
    pub elements: Elements<'a>,
    /// Wavelength, for its note.
    pub wavelength_m: f64,
}

impl std::fmt::Debug for AperturePicture<'_> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("AperturePicture")
            .field("title", &self.title)
            .finish_non_exhaustive()
    }
}

/// How many elements are in each state, and how far phases reach.
#[derive(Debug, Clone, Copy, Default)]
struct Census {
    lit: usize,
    dark: usize,
    unlocked: usize,
    largest_phase_rad: f64,
}

/// Phase to colour.
#[derive(Debug, Clone, Copy)]
struct Scale {
    /// Phase at the ends of the bar.
    end_rad: f64,
    /// Whether the ends meet.
    cyclic: bool,
}

impl Scale {
    /// The smallest round range that holds every phase, or a full turn.
    fn holding(largest_rad: f64) -> Scale {
        if largest_rad >= PI {
            return Scale {
                end_rad: PI,
                cyclic: true,
            };
        }
        let end_rad = if largest_rad > 0.0 {
            rounded_up(largest_rad).min(PI)
        } else {
            0.1
        };
        Scale {
            end_rad,
            cyclic: false,
        }
    }

    fn colour(&self, phase_rad: f64) -> Colour {
        let share = if self.cyclic {
            wrapped(phase_rad) / PI
        } else {
            OPEN_END * (phase_rad / self.end_rad).clamp(-1.0, 1.0)
        };
        phase(share)
    }
}

/// Phase in −π to π.
fn wrapped(phase_rad: f64) -> f64 {
    if phase_rad.is_finite() {
        phase_rad - TAU * (phase_rad / TAU).round()
    } else {
        0.0
    }
}

impl AperturePicture<'_> {
    /// The picture, 1000 × 760 pixels.
    pub fn png(&self) -> Vec<u8> {
        let mut canvas = Canvas::new(NARROW, HEIGHT);
        heading(&mut canvas, self.title, self.what);
        let rect = Rect::sized(LEFT, TOP, SIDE as f64, SIDE as f64);
        let envelope_m = self.envelope_diameter_m;
        let half_width_m = if envelope_m.is_finite() && envelope_m > 0.0 {
            0.53 * envelope_m
        } else {
            1.0
        };
        let frame = Frame::about_zero(rect, half_width_m);
        let census = self.census();
        let scale = Scale::holding(census.largest_phase_rad);
        let px_per_m = SIDE as f64 / (2.0 * half_width_m);
        let outlined = Outlined::new(&self.element, px_per_m);
        canvas.clipped(rect, |canvas| {
            if outlined.size_px < SMALLEST_SHAPE_PX {
                self.cells(canvas, &frame, &scale, &outlined);
            } else {
                self.shapes(canvas, &frame, &scale, &outlined);
            }
            if envelope_m > 0.0 {
                let radius_px = 0.5 * envelope_m * px_per_m;
                canvas.circle(rect.centre(), radius_px, ENVELOPE);
                // A circle leaves the corners of its square free.
                let name = format!("D = {}", readable(envelope_m, Kind::Length, 3));
                let corner = (rect.right - 12.0, rect.top + 28.0);
                canvas.text(&name, corner, Anchor::Right, BODY, TEXT_LIGHT);
            }
        });
        frame.border(&mut canvas);

        let unit = unit_for(half_width_m, Kind::Length);
        let shown = half_width_m / unit.factor;
        let axes = Frame::about_zero(rect, shown);
        let ticks = Ticks::between(-shown, shown, 5);
        axes.axis(&mut canvas, Side::Left, &ticks, TEXT);
        axes.axis(&mut canvas, Side::Bottom, &ticks, TEXT);
        let name = unit.label("x and y at the aperture");
        let below = (rect.centre().0, rect.bottom + 60.0);
        canvas.text(&name, below, Anchor::Middle, BODY, TEXT);

        self.bar(&mut canvas, &scale);
        self.states(&mut canvas, &census, outlined.is_small());
        canvas.into_png()
    }

    fn census(&self) -> Census {
        let mut census = Census::default();
        (self.elements)(&mut |seen| match seen.state {
            State::Lit => {
                census.lit += 1;
                if seen.phase_rad.is_finite() {
                    census.largest_phase_rad = census.largest_phase_rad.max(seen.phase_rad.abs());
                }
            }
            State::Dark => census.dark += 1,
            State::Unlocked => census.unlocked += 1,
        });
        census
    }

    /// Every element that has a place, with its centre in pixels.
    fn for_each(&self, frame: &Frame, visit: &mut dyn FnMut(Seen, Point)) {
        (self.elements)(&mut |mut seen| {
            let centre = frame.at(seen.x_m, seen.y_m);
            if !seen.phase_rad.is_finite() {
                seen.phase_rad = 0.0;
            }
            if centre.0.is_finite() && centre.1.is_finite() {
                visit(seen, centre);
            }
        });
    }

    fn shapes(&self, canvas: &mut Canvas, frame: &Frame, scale: &Scale, outlined: &Outlined) {
        self.for_each(frame, &mut |seen, centre| {
            if seen.state == State::Lit {
                outlined.fill(canvas, centre, scale.colour(seen.phase_rad));
            }
        });
        // Afterwards, so that no neighbour covers a mark.
        self.for_each(frame, &mut |seen, centre| {
            if seen.state != State::Lit {
                outlined.marked(canvas, centre, seen.state);
            }
        });
    }

    /// Elements smaller than a few pixels: colour by the mean of what falls on a pixel.
    fn cells(&self, canvas: &mut Canvas, frame: &Frame, scale: &Scale, outlined: &Outlined) {
        let mut cells = vec![Cell::default(); SIDE * SIDE];
        let mut marks = Vec::new();
        // Below a pixel an element still takes a pixel's width, so that none is lost.
        let half = 0.5 * outlined.size_px.max(1.0);
        self.for_each(frame, &mut |seen, centre| {
            let state = seen.state;
            if state != State::Lit && marks.len() <= MOST_MARKS {
                marks.push((state, centre));
            }
            let phase_rad = seen.phase_rad;
            let (sin, cos) = phase_rad.sin_cos();
            let (x, y) = (centre.0 - frame.rect.left, centre.1 - frame.rect.top);
            let range = |at: f64| {
                let low = (at - half).floor().clamp(0.0, SIDE as f64) as usize;
                low..((at + half).ceil().clamp(0.0, SIDE as f64) as usize)
            };
            let overlap = |at: f64, pixel: usize| {
                ((at + half).min(pixel as f64 + 1.0) - (at - half).max(pixel as f64)).max(0.0)
                    as f32
            };
            for row in range(y) {
                let tall = overlap(y, row);
                for column in range(x) {
                    let area = tall * overlap(x, column);
                    let cell = &mut cells[row * SIDE + column];
                    match state {
                        State::Lit => {
                            cell.lit += area;
                            cell.phase_rad += area * phase_rad as f32;
                            cell.cos += area * cos as f32;
                            cell.sin += area * sin as f32;
                        }
                        State::Dark => cell.dark += area,
                        State::Unlocked => cell.unlocked += area,
                    }
                }
            }
        });
        canvas.paint(frame.rect, |column, row| {
            cells
                .get(row * SIDE + column)
                .map_or(PAPER, |cell| cell.colour(scale))
        });
        if marks.len() <= MOST_MARKS {
            for (state, centre) in marks {
                mark(canvas, state, centre, 2.0);
            }
        }
    }

    /// The colour bar, in radians and in waves.
    fn bar(&self, canvas: &mut Canvas, scale: &Scale) {
        let rect = Rect::sized(COLUMN + 95.0, TOP + 66.0, 24.0, 286.0);
        let end = scale.end_rad;
        let radians = Frame {
            rect,
            across: (0.0, 1.0),
            up: (-end, end),
        };
        colour_bar(canvas, &radians, |share| {
            scale.colour(end * (2.0 * share - 1.0) * (1.0 - 1e-9))
        });
        radians.axis(canvas, Side::Right, &Ticks::between(-end, end, 9), TEXT);
        let waves_end = end / TAU;
        let waves = Frame {
            up: (-waves_end, waves_end),
            ..radians
        };
        let ticks = Ticks::between(-waves_end, waves_end, 9);
        waves.axis(canvas, Side::Left, &ticks, TEXT_LIGHT);
        let title = (COLUMN, TOP + 14.0);
        canvas.text("Phase error", title, Anchor::Left, EMPHASIS, TEXT);
        let above = rect.top - 20.0;
        let (left, right) = (rect.left - 12.0, rect.right + 12.0);
        canvas.text("waves", (left, above), Anchor::Right, BODY, TEXT_LIGHT);
        canvas.text("rad", (right, above), Anchor::Left, BODY, TEXT);
    }

    /// How many elements are in each state, with a sample of each.
    fn states(&self, canvas: &mut Canvas, census: &Census, dots: bool) {
        let sample = Outlined::new(&self.element, 26.0 / self.element.size_m);
        let mut baseline = TOP + 416.0;
        let mut line = |canvas: &mut Canvas, state: Option<State>, text: String| {
            let middle = (COLUMN + 16.0, baseline - 0.5 * BODY.capital_px());
            match state {
                Some(state) if dots => mark(canvas, state, middle, 7.0),
                Some(state) => sample.marked(canvas, middle, state),
                None => {}
            }
            let text_left = if state.is_some() { 48.0 } else { 0.0 };
            let room_px = NARROW as f64 - COLUMN - text_left - 15.0;
            let text = BODY.shortened(&text, room_px);
            canvas.text(
                &text,
                (COLUMN + text_left, baseline),
                Anchor::Left,
                BODY,
                TEXT,
            );
            baseline += 38.0;
        };
        line(canvas, Some(State::Lit), format!("lit: {}", census.lit));
        line(canvas, Some(State::Dark), format!("dark: {}", census.dark));
        line(
            canvas,
            Some(State::Unlocked),
            format!("unlocked: {}", census.unlocked),
        );
        if self.wavelength_m.is_finite() && self.wavelength_m > 0.0 {
            let wave = readable(self.wavelength_m, Kind::Length, 4);
            line(canvas, None, format!("1 wave = {wave}"));
        }
    }
}

/// What falls on one pixel, by area.
#[derive(Debug, Clone, Copy, Default)]
struct Cell {
    lit: f32,
    dark: f32,
    unlocked: f32,
    phase_rad: f32,
    cos: f32,
    sin: f32,
}

impl Cell {
    fn colour(&self, scale: &Scale) -> Colour {
        let phase_rad = if scale.cyclic {
            self.sin.atan2(self.cos)
        } else {
            self.phase_rad / self.lit.max(f32::MIN_POSITIVE)
        };
        let lit = scale.colour(f64::from(phase_rad));
        let paper = (1.0 - self.lit - self.dark - self.unlocked).max(0.0);
        let parts = [
            (paper, PAPER),
            (self.lit, lit),
            (self.dark, DARK),
            (self.unlocked, UNLOCKED),
        ];
        let sum: f32 = parts.iter().map(|(share, _)| share).sum();
        let mut mixed = [0.0; 3];
        for (share, Colour(rgb)) in parts {
            for (value, part) in mixed.iter_mut().zip(rgb) {
                *value += share / sum * f32::from(part);
            }
        }
        Colour(mixed.map(|value| value.round() as u8))
    }
}
