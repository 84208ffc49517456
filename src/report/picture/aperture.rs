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
use crate::array::Array;
use crate::perturb::{Draw, State};
use crate::quantity::Kind;
use crate::report::units::{readable, unit_for};
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

/// An array as drawn in one trial.
#[derive(Debug, Clone, Copy)]
pub struct AperturePicture<'a> {
    /// Title of the study.
    pub title: &'a str,
    /// What is shown, e.g. `one trial, no. 17`.
    pub what: &'a str,
    /// The array.
    pub array: &'a Array,
    /// Its errors in the trial; an element without an entry has none.
    pub draw: &'a Draw,
    /// Wavelength, for its note.
    pub wavelength_m: f64,
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
        let envelope_m = self.array.envelope_diameter_m;
        let half_width_m = if envelope_m.is_finite() && envelope_m > 0.0 {
            0.53 * envelope_m
        } else {
            1.0
        };
        let frame = Frame::about_zero(rect, half_width_m);
        let scale = Scale::holding(
            (0..self.array.len())
                .filter(|index| self.state(*index) == State::Lit)
                .map(|index| self.phase_rad(index).abs())
                .fold(0.0, f64::max),
        );
        let px_per_m = SIDE as f64 / (2.0 * half_width_m);
        let outlined = Outlined::new(&self.array.element, px_per_m);
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
        self.states(&mut canvas, outlined.is_small());
        canvas.into_png()
    }

    fn state(&self, index: usize) -> State {
        self.draw.state.get(index).copied().unwrap_or(State::Lit)
    }

    fn phase_rad(&self, index: usize) -> f64 {
        let phase_rad = self.draw.phase_rad.get(index).copied().unwrap_or(0.0);
        if phase_rad.is_finite() {
            phase_rad
        } else {
            0.0
        }
    }

    fn centres<'b>(&'b self, frame: &'b Frame) -> impl Iterator<Item = (usize, Point)> + 'b {
        let pairs = self.array.x_m.iter().zip(&self.array.y_m);
        pairs
            .map(|(x, y)| frame.at(*x, *y))
            .enumerate()
            .filter(|(_, centre)| centre.0.is_finite() && centre.1.is_finite())
    }

    fn shapes(&self, canvas: &mut Canvas, frame: &Frame, scale: &Scale, outlined: &Outlined) {
        for (index, centre) in self.centres(frame) {
            if self.state(index) == State::Lit {
                outlined.fill(canvas, centre, scale.colour(self.phase_rad(index)));
            }
        }
        // Afterwards, so that no neighbour covers a mark.
        for (index, centre) in self.centres(frame) {
            let state = self.state(index);
            if state != State::Lit {
                outlined.marked(canvas, centre, state);
            }
        }
    }

    /// Elements smaller than a few pixels: colour by the mean of what falls on a pixel.
    fn cells(&self, canvas: &mut Canvas, frame: &Frame, scale: &Scale, outlined: &Outlined) {
        let mut cells = vec![Cell::default(); SIDE * SIDE];
        let mut marks = Vec::new();
        // Below a pixel an element still takes a pixel's width, so that none is lost.
        let half = 0.5 * outlined.size_px.max(1.0);
        for (index, centre) in self.centres(frame) {
            let state = self.state(index);
            if state != State::Lit && marks.len() <= MOST_MARKS {
                marks.push((state, centre));
            }
            let phase_rad = self.phase_rad(index);
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
        }
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
    fn states(&self, canvas: &mut Canvas, dots: bool) {
        let count = |state: State| {
            (0..self.array.len())
                .filter(|index| self.state(*index) == state)
                .count()
        };
        let sample = Outlined::new(&self.array.element, 26.0 / self.array.element.size_m);
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
        line(
            canvas,
            Some(State::Lit),
            format!("lit: {}", count(State::Lit)),
        );
        line(
            canvas,
            Some(State::Dark),
            format!("dark: {}", count(State::Dark)),
        );
        line(
            canvas,
            Some(State::Unlocked),
            format!("unlocked: {}", count(State::Unlocked)),
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
