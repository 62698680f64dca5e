//! One panel at its place on the page: its values on pixels, and what a place on the page shows.

use super::Panel;
use super::arrange::Frame;
use super::canvas::Canvas;
use super::colour::Ramp;
use super::place::Spot;
use super::raster::Raster;
use super::scale::Scale;

/// A panel on the page.
#[derive(Debug)]
pub struct View<'a> {
    /// What it shows.
    pub panel: &'a Panel,
    /// Where.
    pub frame: Frame,
    /// The panel's points on the page.
    pub corners: Vec<Spot>,
    /// First column and row of the raster on the page.
    origin: [usize; 2],
    raster: Raster,
}

impl<'a> View<'a> {
    /// Puts the panel at its frame and fills its pixels with shares of the scale.
    pub fn new(panel: &'a Panel, frame: Frame, scale: &Scale) -> Self {
        let corners: Vec<Spot> = panel.points.iter().map(|&p| frame.at(p)).collect();
        let origin = [frame.area.left.max(0.0) as usize, frame.area.top.max(0.0) as usize];
        let offset = origin.map(|o| o as f64);
        let inside: Vec<Spot> = corners.iter().map(|p| [p[0] - offset[0], p[1] - offset[1]]).collect();
        let (width, height) = (frame.area.width() as usize + 2, frame.area.height() as usize + 2);
        let raster = Raster::new(width, height, &inside, &panel.triangles, &smoothed(panel, scale.top));
        Self { panel, frame, corners, origin, raster }
    }

    fn inside(&self, at: Spot) -> Spot {
        [at[0] - self.origin[0] as f64, at[1] - self.origin[1] as f64]
    }

    /// Share of the colour scale at a place on the page; `None` off the metal.
    pub fn share(&self, at: Spot) -> Option<f32> {
        self.raster.value(self.inside(at))
    }

    /// Number of the triangle at a place on the page.
    pub fn triangle(&self, at: Spot) -> Option<usize> {
        self.raster.triangle(self.inside(at))
    }

    /// Unit vector of the current at a place on the page (y down); `None` off the metal and where nothing flows.
    pub fn direction(&self, at: Spot) -> Option<Spot> {
        let [x, y] = *self.panel.flow.get(self.triangle(at)?)?;
        let length = x.hypot(y);
        (length > 0.0).then(|| [x / length, -y / length])
    }

    /// Distance of neighbouring equipotentials at a place, px; `None` off the metal.
    pub fn line_distance(&self, at: Spot, step: f64) -> Option<f64> {
        let corner = self.panel.triangles[self.triangle(at)?];
        let [a, b, c] = corner.map(|n| self.corners[n as usize]);
        let [u, v, w] = corner.map(|n| self.panel.potential_mv.get(n as usize).copied().unwrap_or(0.0));
        let det = (b[0] - a[0]) * (c[1] - a[1]) - (c[0] - a[0]) * (b[1] - a[1]);
        let x = ((v - u) * (c[1] - a[1]) - (w - u) * (b[1] - a[1])) / det;
        let y = ((w - u) * (b[0] - a[0]) - (v - u) * (c[0] - a[0])) / det;
        Some(step / x.hypot(y))
    }

    /// Paints the coloured metal.
    pub fn paint(&self, canvas: &mut Canvas, ramp: &Ramp) {
        for row in 0..self.raster.height {
            canvas.row(self.origin[0], self.origin[1] + row, self.raster.row(row).map(|v| v.map(|share| ramp.at(share))));
        }
    }
}

/// Per triangle and corner: the mean by area of the values around the corner in the same region, over the top of the scale.
fn smoothed(panel: &Panel, top: f64) -> Vec<[f32; 3]> {
    let region = |t: usize| panel.regions.get(t).copied().unwrap_or(0);
    let mut order: Vec<usize> = (0..panel.triangles.len()).collect();
    order.sort_by_key(|&t| region(t));
    let mut sums = vec![(0.0f64, 0.0f64); panel.points.len()];
    let mut shares = vec![[0.0f32; 3]; panel.triangles.len()];
    for members in order.chunk_by(|&a, &b| region(a) == region(b)) {
        for &t in members {
            let triangle = panel.triangles[t];
            let [a, b, c] = triangle.map(|corner| panel.points[corner as usize]);
            let area = (b - a).cross(c - a).abs();
            for corner in triangle {
                let (weighted, weight) = &mut sums[corner as usize];
                *weighted += area * panel.values[t];
                *weight += area;
            }
        }
        for &t in members {
            shares[t] = panel.triangles[t].map(|corner| {
                let (weighted, weight) = sums[corner as usize];
                if weight > 0.0 { (weighted / weight / top) as f32 } else { 0.0 }
            });
        }
        for &t in members {
            panel.triangles[t].iter().for_each(|&corner| sums[corner as usize] = (0.0, 0.0));
        }
    }
    shares
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Point;

    #[test]
    fn a_point_takes_the_mean_by_area_of_its_own_region() {
        let mut panel = Panel {
            points: [(0.0, 0.0), (2.0, 0.0), (0.0, 1.0), (-1.0, 0.0)].map(|(x, y)| Point::new(x, y)).to_vec(),
            triangles: vec![[0, 1, 2], [0, 2, 3]],
            values: vec![3.0, 9.0],
            ..Panel::default()
        };
        assert_eq!(smoothed(&panel, 2.0), vec![[2.5, 1.5, 2.5], [2.5, 2.5, 4.5]]);
        panel.regions = vec![7, 3];
        assert_eq!(smoothed(&panel, 2.0), vec![[1.5; 3], [4.5; 3]]);
    }
}
