//! What the pictures have in common: heading, axes, colour bars, legend.

use super::canvas::{Canvas, Pen, Point, Rect};
use super::style::{AXIS, BODY, Colour, EMPHASIS, GRID, MARGIN, SUBTITLE, TEXT, TEXT_LIGHT, TITLE};
use super::text::{Anchor, Font};
use super::ticks::Ticks;

const TICK_PX: f64 = 5.0;
/// Distance from an axis to its numbers.
pub(super) const GAP_PX: f64 = 13.0;

/// Title and the line below it, shortened to the width of the picture.
pub(super) fn heading(canvas: &mut Canvas, title: &str, what: &str) {
    let room_px = canvas.area().width() - 2.0 * MARGIN;
    let mut line = |text: &str, baseline_px: f64, font: Font, colour: Colour| {
        let text = font.shortened(text, room_px);
        canvas.text(&text, (MARGIN, baseline_px), Anchor::Left, font, colour);
    };
    line(title, 46.0, TITLE, TEXT);
    line(what, 80.0, SUBTITLE, TEXT_LIGHT);
}

/// Where an axis stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Side {
    Left,
    Right,
    Top,
    Bottom,
}

/// A rectangle and the values at its edges.
#[derive(Debug, Clone, Copy)]
pub(super) struct Frame {
    pub rect: Rect,
    /// Values at the left and the right edge.
    pub across: (f64, f64),
    /// Values at the bottom and the top edge.
    pub up: (f64, f64),
}

impl Frame {
    /// A square with the same values across and up, about zero.
    pub fn about_zero(rect: Rect, half_width: f64) -> Frame {
        Frame {
            rect,
            across: (-half_width, half_width),
            up: (-half_width, half_width),
        }
    }

    pub fn x_px(&self, value: f64) -> f64 {
        let (low, high) = self.across;
        self.rect.left + (value - low) / (high - low) * self.rect.width()
    }

    pub fn y_px(&self, value: f64) -> f64 {
        let (low, high) = self.up;
        self.rect.bottom - (value - low) / (high - low) * self.rect.height()
    }

    pub fn at(&self, x: f64, y: f64) -> Point {
        (self.x_px(x), self.y_px(y))
    }

    /// Ticks and their numbers along one side.
    pub fn axis(&self, canvas: &mut Canvas, side: Side, ticks: &Ticks, colour: Colour) {
        let Rect {
            left,
            top,
            right,
            bottom,
        } = self.rect;
        let lower_px = 0.5 * BODY.capital_px();
        for value in &ticks.values {
            let (x, y) = self.at(*value, *value);
            let (tick, text_at, anchor) = match side {
                Side::Left => (
                    Rect::sized(left - TICK_PX, y - 0.75, TICK_PX, 1.5),
                    (left - GAP_PX, y + lower_px),
                    Anchor::Right,
                ),
                Side::Right => (
                    Rect::sized(right, y - 0.75, TICK_PX, 1.5),
                    (right + GAP_PX, y + lower_px),
                    Anchor::Left,
                ),
                Side::Top => (
                    Rect::sized(x - 0.75, top - TICK_PX, 1.5, TICK_PX),
                    (x, top - GAP_PX),
                    Anchor::Middle,
                ),
                Side::Bottom => (
                    Rect::sized(x - 0.75, bottom, 1.5, TICK_PX),
                    (x, bottom + GAP_PX + BODY.capital_px()),
                    Anchor::Middle,
                ),
            };
            canvas.fill_rect(tick, AXIS, 1.0);
            canvas.text(&ticks.label(*value), text_at, anchor, BODY, colour);
        }
    }

    /// Faint lines at the ticks, for reading values off.
    pub fn grid(&self, canvas: &mut Canvas, across: &Ticks, up: &Ticks) {
        for value in &across.values {
            let x = self.x_px(*value);
            canvas.fill_rect(
                Rect::sized(x - 0.5, self.rect.top, 1.0, self.rect.height()),
                GRID,
                1.0,
            );
        }
        for value in &up.values {
            let y = self.y_px(*value);
            canvas.fill_rect(
                Rect::sized(self.rect.left, y - 0.5, self.rect.width(), 1.0),
                GRID,
                1.0,
            );
        }
    }

    /// The outline of the rectangle.
    pub fn border(&self, canvas: &mut Canvas) {
        outline(canvas, self.rect);
    }
}

/// A thin line just outside `rect`.
pub(super) fn outline(canvas: &mut Canvas, rect: Rect) {
    let outer = rect.grown(1.5);
    for edge in [
        Rect {
            right: rect.left,
            ..outer
        },
        Rect {
            left: rect.right,
            ..outer
        },
        Rect {
            bottom: rect.top,
            ..outer
        },
        Rect {
            top: rect.bottom,
            ..outer
        },
    ] {
        canvas.fill_rect(edge, AXIS, 1.0);
    }
}

/// A vertical colour bar; `colour_at` takes 0 at the bottom to 1 at the top.
pub(super) fn colour_bar(canvas: &mut Canvas, frame: &Frame, colour_at: impl Fn(f64) -> Colour) {
    let height = frame.rect.height();
    canvas.paint(frame.rect, |_, row| {
        colour_at(1.0 - (row as f64 + 0.5) / height)
    });
    frame.border(canvas);
}

/// A sample of what a legend explains.
#[derive(Debug, Clone, Copy)]
pub(super) enum Sample {
    /// A line.
    Line(Pen),
    /// An area.
    Area(Colour),
    /// Nothing: a note.
    None,
}

/// Width of a sample with the gap to its text.
const SAMPLE_PX: f64 = 62.0;

/// Entries in a row from left to right; what does not fit is shortened.
pub(super) fn legend(canvas: &mut Canvas, from: Point, room_px: f64, entries: &[(Sample, String)]) {
    const BETWEEN_PX: f64 = 34.0;
    let end_px = from.0 + room_px;
    let mut x = from.0;
    for (sample, text) in entries {
        let sample_px = if matches!(sample, Sample::None) {
            0.0
        } else {
            SAMPLE_PX
        };
        if end_px - x < sample_px + 60.0 {
            break;
        }
        let middle = from.1 - 0.5 * BODY.capital_px();
        match sample {
            Sample::Line(pen) => {
                canvas.stroke(&[(x + 2.0, middle), (x + 48.0, middle)], *pen);
            }
            Sample::Area(colour) => {
                canvas.fill_rect(Rect::sized(x, middle - 10.0, 48.0, 20.0), *colour, 1.0);
            }
            Sample::None => {}
        }
        let text = BODY.shortened(text, end_px - x - sample_px);
        canvas.text(&text, (x + sample_px, from.1), Anchor::Left, BODY, TEXT);
        x += sample_px + BODY.width_px(&text) + BETWEEN_PX;
    }
}

/// Text on a plate that keeps it readable over anything, moved to stay inside `room`.
pub(super) fn plate(
    canvas: &mut Canvas,
    text: &str,
    middle: Point,
    room: Rect,
    (ink, paper, opacity): (Colour, Colour, f64),
) {
    const PAD_PX: f64 = 7.0;
    let width = EMPHASIS.width_px(text) + 2.0 * PAD_PX;
    let height = PLATE_HEIGHT_PX;
    if width > room.width() || height > room.height() {
        return;
    }
    let left = (middle.0 - 0.5 * width).clamp(room.left, room.right - width);
    let top = (middle.1 - 0.5 * height).clamp(room.top, room.bottom - height);
    if !(left.is_finite() && top.is_finite()) {
        return;
    }
    let rect = Rect::sized(left.round(), top.round(), width, height);
    canvas.fill(rect, paper, opacity, |x, y| rounded_box(rect, 5.0, (x, y)));
    let baseline = rect.top + 0.5 * (height + EMPHASIS.capital_px());
    canvas.text(
        text,
        (rect.left + PAD_PX, baseline),
        Anchor::Left,
        EMPHASIS,
        ink,
    );
}

/// Height of a plate.
pub(super) const PLATE_HEIGHT_PX: f64 = 28.0;

/// Signed distance to a rectangle with round corners.
fn rounded_box(rect: Rect, radius: f64, at: Point) -> f64 {
    let centre = rect.centre();
    let across = (at.0 - centre.0).abs() - 0.5 * rect.width() + radius;
    let down = (at.1 - centre.1).abs() - 0.5 * rect.height() + radius;
    across.max(0.0).hypot(down.max(0.0)) + across.max(down).min(0.0) - radius
}
