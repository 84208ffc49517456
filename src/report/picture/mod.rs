//! Pictures of what comes out, as PNG bytes.
//!
//! Each picture is a struct of plain data with one method, `png`, that draws it.
//! Pictures use no file, no clock and no font of the system: the same data give
//! the same bytes everywhere. They draw whatever they are given without
//! failing; what cannot be shown is left out or said in words.

mod aperture;
mod canvas;
mod element;
mod encircled;
mod frame;
mod histogram;
mod map;
mod resample;
mod style;
mod text;
mod ticks;

pub use aperture::AperturePicture;
pub use encircled::EncircledPicture;
pub use histogram::HistogramPicture;
pub use map::MapPicture;

#[cfg(test)]
mod tests {
    use super::*;
    use crate::farfield::map::{Grid, Map};
    use crate::perturb::{Seen, State};
    use crate::scenario::{Element, Shape};

    fn assert_size(png: &[u8], width: u32, height: u32) {
        let picture = image::load_from_memory(png).expect("a PNG file");
        assert_eq!((picture.width(), picture.height()), (width, height));
    }

    fn map_picture(map: &Map, range_m: f64, spot_m: f64) -> Vec<u8> {
        MapPicture {
            title: "title",
            what: "without errors",
            map,
            peak_irradiance_w_m2: Some(f64::NAN),
            range_m,
            bucket_diameter_m: Some(0.2),
            encircled_80_diameter_m: None,
            spot_m,
        }
        .png()
    }

    #[test]
    fn any_map_is_drawn() {
        let grid = |pixels, pixel_m| Grid { pixels, pixel_m };
        let mut undefined = Map::dark(grid(3, 0.1));
        undefined.irradiance_w_m2 = vec![
            1.0,
            f64::NAN,
            f64::INFINITY,
            -1.0,
            2.0,
            0.0,
            0.0,
            0.0,
            1e-300,
        ];
        let mut short = Map::dark(grid(5, 0.1));
        short.irradiance_w_m2.truncate(3);
        let mut bright = Map::dark(grid(1, 1e9));
        bright.irradiance_w_m2[0] = 1e300;
        for map in [
            Map::dark(grid(5, 0.1)),
            undefined,
            short,
            bright,
            Map::dark(grid(0, f64::NAN)),
        ] {
            assert_size(&map_picture(&map, 1000.0, 0.1), 1500, 760);
        }
        let map = Map::dark(grid(3, 0.1));
        assert_size(&map_picture(&map, 0.0, f64::NAN), 1500, 760);
    }

    #[test]
    fn the_same_data_give_the_same_bytes() {
        let map = Map {
            grid: Grid {
                pixels: 3,
                pixel_m: 0.1,
            },
            irradiance_w_m2: vec![0.0, 1.0, 0.0, 1.0, 4.0, 1.0, 0.0, 1.0, 0.0],
        };
        let picture = || map_picture(&map, 1000.0, 0.1);
        assert!(picture() == picture());
    }

    /// Elements in a row, of every state in turn.
    fn aperture_picture(
        x_m: &[f64],
        size_m: f64,
        phase_rad: f64,
        envelope_diameter_m: f64,
    ) -> Vec<u8> {
        let states = [State::Lit, State::Dark, State::Unlocked];
        AperturePicture {
            title: "title",
            what: "",
            element: Element {
                shape: Shape::Hexagon,
                size_m,
                obscuration: 0.3,
                beam_radius_m: None,
            },
            envelope_diameter_m,
            elements: &|visit| {
                for (&x_m, state) in x_m.iter().zip(states.into_iter().cycle()) {
                    visit(Seen {
                        x_m,
                        y_m: 0.0,
                        phase_rad,
                        state,
                    });
                }
            },
            wavelength_m: 1e-6,
        }
        .png()
    }

    #[test]
    fn any_aperture_is_drawn() {
        let row: Vec<f64> = (-3..=3).map(f64::from).collect();
        let cases: [(&[f64], f64, f64, f64); 6] = [
            (&[], 1.0, 0.0, 0.0),
            (&[0.0], 1.0, 0.0, 1.2),
            (&row, 0.9, 0.1, 8.0),
            (&row, 0.01, 9.0, 8.0),
            (&row, 0.1, f64::NAN, 8.0),
            (&[f64::NAN, 1e300, 0.0], 0.0, 1.0, f64::INFINITY),
        ];
        for (x_m, size_m, phase_rad, envelope_m) in cases {
            assert_size(
                &aperture_picture(x_m, size_m, phase_rad, envelope_m),
                1000,
                760,
            );
        }
    }

    #[test]
    fn any_curve_is_drawn() {
        let undefined = [f64::NAN; 3];
        let cases: [(&[f64], &[f64]); 4] = [
            (&[], &[]),
            (&[0.0], &[0.5]),
            (&[0.0, 1.0, 2.0], &undefined),
            (&[2.0, 1.0, f64::INFINITY], &[0.0, 7.0, -1.0]),
        ];
        for (radius_m, fractions) in cases {
            let picture = EncircledPicture {
                title: "title",
                what: "",
                radius_m,
                ideal: fractions,
                long_exposure: fractions,
                p05: fractions,
                p95: &[0.5],
                bucket_radius_m: Some(f64::NAN),
                encircled_80_radius_m: Some(0.5),
            };
            assert_size(&picture.png(), 1000, 760);
        }
    }

    #[test]
    fn any_values_are_counted() {
        let cases: [&[f64]; 4] = [&[], &[f64::NAN], &[0.8], &[-1e308, 1e308]];
        for values in cases {
            let picture = HistogramPicture {
                title: "title",
                values,
                mean: Some(f64::NAN),
                bounds: &[],
                predicted_mean: Some(0.8),
            };
            assert_size(&picture.png(), 1000, 760);
        }
    }
}
