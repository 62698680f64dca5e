//! Values on triangles to values on pixels: a scanline filler with a value per corner, and which triangle each pixel shows.

use super::place::Spot;

/// No triangle covers the pixel.
const NONE: u32 = u32::MAX;

/// What the pixels of one panel show.
#[derive(Debug)]
pub struct Raster {
    /// Columns.
    pub width: usize,
    /// Rows.
    pub height: usize,
    values: Vec<f32>,
    owners: Vec<u32>,
}

impl Raster {
    /// Fills `width` x `height` pixels. `corners` are in pixels of this raster, `values` per triangle and corner; a pixel shows the triangle that holds its centre.
    /// Triangle numbers must be valid.
    pub fn new(width: usize, height: usize, corners: &[Spot], triangles: &[[u32; 3]], values: &[[f32; 3]]) -> Self {
        let mut raster = Self { width, height, values: vec![0.0; width * height], owners: vec![NONE; width * height] };
        for (number, (corner, values)) in triangles.iter().zip(values).enumerate() {
            let at = corner.map(|c| corners[c as usize]);
            raster.fill(number as u32, at, values.map(f64::from));
        }
        raster
    }

    fn fill(&mut self, number: u32, at: [Spot; 3], value: [f64; 3]) {
        let [a, b, c] = at;
        let top = (a[1].min(b[1]).min(c[1]) - 0.5).ceil().max(0.0);
        let end = (a[1].max(b[1]).max(c[1]) - 0.5).ceil().min(self.height as f64);
        if top >= end {
            return;
        }
        let det = (b[0] - a[0]) * (c[1] - a[1]) - (c[0] - a[0]) * (b[1] - a[1]);
        if det == 0.0 {
            return;
        }
        let (p, q) = (value[1] - value[0], value[2] - value[0]);
        let slope_x = (p * (c[1] - a[1]) - q * (b[1] - a[1])) / det;
        let slope_y = (q * (b[0] - a[0]) - p * (c[0] - a[0])) / det;
        let mut order = at;
        order.sort_by(|l, r| l[1].total_cmp(&r[1]));
        let [low, middle, high] = order;
        let along = |from: Spot, to: Spot, y: f64| {
            let rise = to[1] - from[1];
            if rise > 0.0 { from[0] + (to[0] - from[0]) * (y - from[1]) / rise } else { from[0] }
        };
        for row in top as usize..end as usize {
            let y = row as f64 + 0.5;
            let long = along(low, high, y);
            let short = if y < middle[1] { along(low, middle, y) } else { along(middle, high, y) };
            let from = (long.min(short) - 0.5).ceil().max(0.0);
            let to = (long.max(short) - 0.5).ceil().min(self.width as f64);
            if from >= to {
                continue;
            }
            let base = row * self.width;
            let mut shown = value[0] + slope_x * (from + 0.5 - a[0]) + slope_y * (y - a[1]);
            for pixel in base + from as usize..base + to as usize {
                self.values[pixel] = shown as f32;
                self.owners[pixel] = number;
                shown += slope_x;
            }
        }
    }

    /// Value at a place, `None` off the metal.
    pub fn value(&self, at: Spot) -> Option<f32> {
        let pixel = self.pixel(at)?;
        (self.owners[pixel] != NONE).then(|| self.values[pixel])
    }

    /// The triangle shown at a place.
    pub fn triangle(&self, at: Spot) -> Option<usize> {
        let owner = self.owners[self.pixel(at)?];
        (owner != NONE).then_some(owner as usize)
    }

    /// One row: the value of each pixel, `None` off the metal.
    pub fn row(&self, row: usize) -> impl Iterator<Item = Option<f32>> + '_ {
        let range = row * self.width..(row + 1) * self.width;
        self.values[range.clone()].iter().zip(&self.owners[range]).map(|(&value, &owner)| (owner != NONE).then_some(value))
    }

    fn pixel(&self, at: Spot) -> Option<usize> {
        let inside = at[0] >= 0.0 && at[1] >= 0.0 && at[0] < self.width as f64 && at[1] < self.height as f64;
        inside.then(|| at[1] as usize * self.width + at[0] as usize)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_triangles_cover_a_square_once_and_a_linear_value_is_kept() {
        let corners = [[1.0, 1.0], [9.0, 1.0], [9.0, 9.0], [1.0, 9.0]];
        let values = corners.map(|[x, y]| (2.0 * x - 3.0 * y) as f32);
        let triangles = [[0, 1, 2], [0, 2, 3]];
        let raster = Raster::new(10, 10, &corners, &triangles, &triangles.map(|t| t.map(|c| values[c as usize])));
        let mut covered = 0;
        for row in 0..10 {
            for (column, value) in raster.row(row).enumerate() {
                if let Some(value) = value {
                    covered += 1;
                    let (x, y) = (column as f32 + 0.5, row as f32 + 0.5);
                    assert!((value - (2.0 * x - 3.0 * y)).abs() < 1e-4);
                }
            }
        }
        assert_eq!(covered, 64);
        assert_eq!(raster.triangle([8.5, 1.5]), Some(0));
        assert_eq!(raster.triangle([1.5, 8.5]), Some(1));
        assert_eq!(raster.value([0.5, 0.5]), None);
        assert_eq!(raster.value([-1.0, 40.0]), None);
    }

    #[test]
    fn what_lies_outside_is_cut_and_flat_triangles_are_nothing() {
        let corners = [[-50.0, -50.0], [50.0, -50.0], [0.0, 80.0], [3.0, 3.0], [3.0, 3.0], [3.0, 3.0]];
        let raster = Raster::new(4, 4, &corners, &[[0, 1, 2], [3, 4, 5]], &[[1.0; 3]; 2]);
        assert!((0..4).all(|row| raster.row(row).all(|v| v.is_some())));
        assert_eq!(raster.triangle([3.0, 3.0]), Some(0));
    }
}
