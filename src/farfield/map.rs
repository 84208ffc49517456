//! The target-plane map: irradiance on a uniform grid about the aim point.

/// Grid of a map: an odd number of square pixels a side, the centre one on the aim point.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Grid {
    /// Pixels a side, odd.
    pub pixels: usize,
    /// Pixel pitch in metres at the target.
    pub pixel_m: f64,
}

impl Grid {
    /// The smallest grid of this pixel that covers `width_m`.
    pub fn covering(width_m: f64, pixel_m: f64) -> Grid {
        // A width that is a whole number of pixels but for rounding takes just that many.
        let cells = (width_m / pixel_m * (1.0 - 1e-12)).ceil().max(1.0) as usize;
        Grid {
            pixels: cells | 1,
            pixel_m,
        }
    }

    /// Full width in metres.
    pub fn width_m(&self) -> f64 {
        self.pixels as f64 * self.pixel_m
    }

    /// Index of the pixel on the aim point, in either direction.
    pub fn centre(&self) -> usize {
        self.pixels / 2
    }

    /// Pixel centres in metres, ascending; the same for u and v.
    pub fn axis_m(&self) -> Vec<f64> {
        let centre = self.centre() as f64;
        (0..self.pixels)
            .map(|index| (index as f64 - centre) * self.pixel_m)
            .collect()
    }
}

/// Irradiance in W/m² at the pixel centres of a [`Grid`], row-major `[v, u]`, both ascending.
#[derive(Debug, Clone, PartialEq)]
pub struct Map {
    /// The grid.
    pub grid: Grid,
    /// `pixels × pixels` values.
    pub irradiance_w_m2: Vec<f64>,
}

impl Map {
    /// A map of zeros.
    pub fn dark(grid: Grid) -> Map {
        Map {
            grid,
            irradiance_w_m2: vec![0.0; grid.pixels * grid.pixels],
        }
    }

    /// Irradiance at row (v) and column (u).
    pub fn at(&self, row: usize, column: usize) -> f64 {
        self.irradiance_w_m2[row * self.grid.pixels + column]
    }

    /// Irradiance at the aim point.
    pub fn aim_w_m2(&self) -> f64 {
        self.at(self.grid.centre(), self.grid.centre())
    }
}
