//! Text from fonts that are part of the program: the same letters everywhere.

use super::canvas::{Canvas, Point};
use super::style::Colour;
use plotters::style::{FontDesc, FontFamily, FontStyle, register_font};
use std::sync::Once;

/// Letters are placed on a grid this many times finer than the pixels,
/// without which they would be spaced unevenly.
const FINENESS: usize = 4;
/// Line height of DejaVu Sans over its em square: the font library counts in line heights.
const LINE_OVER_EM: f64 = 1.164;
/// Height of a capital over the em square.
const CAPITAL_OVER_EM: f64 = 0.729;
/// No line of text in a picture has room for more characters.
const LONGEST: usize = 400;

const FAMILY: &str = "facula sans";

/// Size and weight of text.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Font {
    /// Size of the em square in pixels.
    pub em_px: f64,
    pub bold: bool,
}

impl Font {
    /// Height of a capital letter.
    pub fn capital_px(&self) -> f64 {
        self.em_px * CAPITAL_OVER_EM
    }

    fn fine(&self) -> FontDesc<'static> {
        static REGISTERED: Once = Once::new();
        REGISTERED.call_once(|| {
            // The fonts are constants of the program, read by a test below.
            let _ = register_font(FAMILY, FontStyle::Normal, dejavu::sans::regular());
            let _ = register_font(FAMILY, FontStyle::Bold, dejavu::sans::bold());
        });
        let style = if self.bold {
            FontStyle::Bold
        } else {
            FontStyle::Normal
        };
        FontDesc::new(
            FontFamily::Name(FAMILY),
            self.em_px * LINE_OVER_EM * FINENESS as f64,
            style,
        )
    }

    /// Width of a line of text in pixels.
    pub fn width_px(&self, text: &str) -> f64 {
        self.fine()
            .box_size(text)
            .map_or(0.0, |(width, _)| f64::from(width) / FINENESS as f64)
    }

    /// The text, or as much of its beginning as fits with an ellipsis.
    pub fn shortened(&self, text: &str, room_px: f64) -> String {
        let mut characters: Vec<char> = text
            .chars()
            .take(LONGEST + 1)
            .map(|character| {
                if character.is_whitespace() || character.is_control() {
                    ' '
                } else {
                    character
                }
            })
            .collect();
        let whole: String = characters.iter().collect();
        if characters.len() <= LONGEST && self.width_px(&whole) <= room_px {
            return whole;
        }
        let fits = |count: usize| self.width_px(&ended(&characters[..count])) <= room_px;
        let (mut fitting, mut beyond) = (0, characters.len());
        while beyond - fitting > 1 {
            let middle = (fitting + beyond) / 2;
            if fits(middle) {
                fitting = middle;
            } else {
                beyond = middle;
            }
        }
        characters.truncate(fitting);
        ended(&characters)
    }
}

fn ended(characters: &[char]) -> String {
    let text: String = characters.iter().collect();
    format!("{}…", text.trim_end())
}

/// Which point of the text stands at the given place.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Anchor {
    /// Left end of the baseline.
    Left,
    /// Middle of the baseline.
    Middle,
    /// Right end of the baseline.
    Right,
}

impl Canvas {
    /// Writes a line of text with its baseline at `at`.
    pub fn text(&mut self, text: &str, at: Point, anchor: Anchor, font: Font, colour: Colour) {
        let width_px = font.width_px(text);
        let start_px = match anchor {
            Anchor::Left => at.0,
            Anchor::Middle => at.0 - 0.5 * width_px,
            Anchor::Right => at.0 - width_px,
        };
        let fine_px = font.em_px * LINE_OVER_EM * FINENESS as f64;
        // A margin for letters that reach beyond their advance.
        let margin = FINENESS * 4;
        let columns = (width_px.ceil() as usize).saturating_add(8);
        let rows = (font.em_px * 2.0).ceil() as usize;
        let mut covered = vec![0f32; columns * rows];
        let (left_px, baseline_px) = (start_px.floor(), at.1.round());
        let shift = ((start_px - left_px) * FINENESS as f64).round() as i32 + margin as i32;
        // The library puts the baseline half a line height below the given point.
        let baseline_row = (font.em_px * 1.3).round();
        let down = (baseline_row * FINENESS as f64 - fine_px / 2.0).round() as i32;
        let share = 1.0 / (FINENESS * FINENESS) as f32;
        let _ = font.fine().draw(text, (shift, down), |x, y, coverage| {
            let (Ok(x), Ok(y)) = (usize::try_from(x), usize::try_from(y)) else {
                return Ok::<(), ()>(());
            };
            let (column, row) = (x / FINENESS, y / FINENESS);
            if column < columns && row < rows {
                covered[row * columns + column] += coverage.min(1.0) * share;
            }
            Ok(())
        });
        let left_px = left_px - (margin / FINENESS) as f64;
        let top_px = baseline_px - baseline_row;
        for (row, line) in covered.chunks(columns).enumerate() {
            for (column, share) in line.iter().enumerate() {
                let (x, y) = (left_px + column as f64, top_px + row as f64);
                if *share > 0.0 && x >= 0.0 && y >= 0.0 {
                    self.blend(x as usize, y as usize, colour, f64::from(*share));
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const FONT: Font = Font {
        em_px: 20.0,
        bold: false,
    };

    #[test]
    fn long_text_ends_in_an_ellipsis_within_its_room() {
        let long = "Ultra-long title ".repeat(200);
        let shortened = FONT.shortened(&long, 300.0);
        assert!(shortened.ends_with('…'));
        assert!(FONT.width_px(&shortened) <= 300.0);
        assert!(FONT.width_px(&shortened) > 250.0);
        assert_eq!(FONT.shortened("short\nline", 300.0), "short line");
        assert_eq!(FONT.shortened("anything", 0.0), "…");
    }

    #[test]
    fn both_weights_have_the_signs_that_pictures_need() {
        for bold in [false, true] {
            let font = Font { em_px: 20.0, bold };
            for sign in "µλθ²·±…−≥≤⁻∞–".chars() {
                assert!(font.width_px(&sign.to_string()) > 2.0);
            }
        }
    }
}
