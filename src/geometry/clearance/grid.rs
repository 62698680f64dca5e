//! A uniform grid over the drawing that says which boundary features may lie in a convex area.

use crate::geometry::{BoundingBox, Point};
use std::ops::Range;

/// Most cells to a side.
const MOST_CELLS: f64 = 2000.0;

/// Cells for each feature: boundaries are lines, most cells stay empty.
const CELLS_EACH: f64 = 4.0;

/// Cells to the side of a block; empty blocks are passed over at once.
const BLOCK: usize = 16;

/// Numbers of features, by the cells their hulls touch.
pub struct Grid {
    origin: Point,
    cell: f64,
    columns: usize,
    rows: usize,
    /// Where each cell's items begin; one more at the end.
    starts: Vec<u32>,
    items: Vec<u32>,
    /// Which blocks hold anything.
    blocks: Vec<bool>,
}

impl Grid {
    /// Sorts features with these convex hulls into about as many cells as there are features.
    pub fn new(extent: BoundingBox, count: usize, hulls: impl Iterator<Item = Vec<Point>> + Clone) -> Self {
        let longest = extent.width().max(extent.height());
        let even = (extent.width() * extent.height() / (CELLS_EACH * count.max(1) as f64)).sqrt();
        let cell = even.max(longest / MOST_CELLS).max(f64::MIN_POSITIVE);
        let cells = |length: f64| (length / cell) as usize + 1;
        let mut grid = Self {
            origin: extent.min,
            cell,
            columns: cells(extent.width()),
            rows: cells(extent.height()),
            starts: Vec::new(),
            items: Vec::new(),
            blocks: Vec::new(),
        };
        let mut starts = vec![0u32; grid.columns * grid.rows + 1];
        for hull in hulls.clone() {
            grid.cells_of(&hull, &mut |c| {
                starts[c + 1] += 1;
                true
            });
        }
        for c in 1..starts.len() {
            starts[c] += starts[c - 1];
        }
        let mut free = starts.clone();
        let mut items = vec![0u32; starts.last().map_or(0, |&n| n as usize)];
        for (number, hull) in hulls.enumerate() {
            grid.cells_of(&hull, &mut |c| {
                items[free[c] as usize] = number as u32;
                free[c] += 1;
                true
            });
        }
        grid.starts = starts;
        grid.items = items;
        grid.blocks = grid.occupied();
        grid
    }

    /// Side of a cell in mm.
    pub fn cell(&self) -> f64 {
        self.cell
    }

    /// Calls `visit` with every feature in a cell that the convex polygon touches (some more than once) until it says `false`;
    /// true when it never did.
    pub fn visit(&self, polygon: &[Point], visit: &mut dyn FnMut(usize) -> bool) -> bool {
        self.cells_of(polygon, &mut |c| {
            let (first, last) = (self.starts[c] as usize, self.starts[c + 1] as usize);
            self.items[first..last].iter().all(|&item| visit(item as usize))
        })
    }

    /// The cells that the convex polygon touches, in blocks that hold anything at all.
    fn cells_of(&self, polygon: &[Point], visit: &mut dyn FnMut(usize) -> bool) -> bool {
        let local: Vec<Point> = polygon.iter().map(|&p| (p - self.origin) * (1.0 / self.cell)).collect();
        let whole = [0..self.columns, 0..self.rows];
        if self.blocks.is_empty() {
            return touched(&local, whole, &mut |column, row| visit(row * self.columns + column));
        }
        let coarse: Vec<Point> = local.iter().map(|&p| p * (1.0 / BLOCK as f64)).collect();
        let blocks = [self.columns.div_ceil(BLOCK), self.rows.div_ceil(BLOCK)];
        touched(&coarse, blocks.map(|n| 0..n), &mut |i, j| {
            let inner = |block: usize, count: usize| block * BLOCK..((block + 1) * BLOCK).min(count);
            !self.blocks[j * blocks[0] + i]
                || touched(&local, [inner(i, self.columns), inner(j, self.rows)], &mut |column, row| visit(row * self.columns + column))
        })
    }

    /// Which blocks of cells hold anything.
    fn occupied(&self) -> Vec<bool> {
        let across = self.columns.div_ceil(BLOCK);
        let mut blocks = vec![false; across * self.rows.div_ceil(BLOCK)];
        for row in 0..self.rows {
            for column in 0..self.columns {
                let c = row * self.columns + column;
                if self.starts[c] < self.starts[c + 1] {
                    blocks[row / BLOCK * across + column / BLOCK] = true;
                }
            }
        }
        blocks
    }
}

/// Row by row, the unit cells within these columns and rows from the polygon's leftmost to its rightmost point in that row, and a hair beyond.
fn touched(polygon: &[Point], [columns, rows]: [Range<usize>; 2], visit: &mut dyn FnMut(usize, usize) -> bool) -> bool {
    const HAIR: f64 = 1e-6;
    let (bottom, top) = polygon.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), p| (low.min(p.y), high.max(p.y)));
    let within = |low: f64, high: f64, range: &Range<usize>| {
        let first = (low - HAIR).max(range.start as f64) as usize;
        let last = ((high + HAIR).max(-1.0) + 1.0) as usize;
        first..last.min(range.end)
    };
    for row in within(bottom, top, &rows) {
        let (bottom, top) = (row as f64 - HAIR, (row + 1) as f64 + HAIR);
        let (mut left, mut right) = (f64::INFINITY, f64::NEG_INFINITY);
        let mut a = polygon[polygon.len() - 1];
        for &b in polygon {
            let (low, high) = if a.y <= b.y { (a, b) } else { (b, a) };
            if high.y >= bottom && low.y <= top {
                let slope = if high.y > low.y { (high.x - low.x) / (high.y - low.y) } else { 0.0 };
                let enter = if low.y >= bottom { low.x } else { low.x + slope * (bottom - low.y) };
                let leave = if high.y <= top { high.x } else { low.x + slope * (top - low.y) };
                left = left.min(enter.min(leave));
                right = right.max(enter.max(leave));
            }
            a = b;
        }
        if left <= right {
            for column in within(left, right, &columns) {
                if !visit(column, row) {
                    return false;
                }
            }
        }
    }
    true
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_cell_under_a_triangle_is_visited() {
        let extent = BoundingBox { min: Point::new(-5.0, 2.0), max: Point::new(15.0, 12.0) };
        let dots: Vec<Point> =
            (0..2000).map(|i| Point::new(-5.0 + 20.0 * (i % 50) as f64 / 49.0, 2.0 + 10.0 * (i / 50) as f64 / 39.0)).collect();
        let grid = Grid::new(extent, dots.len(), dots.iter().map(|&p| vec![p]));
        let triangle = [Point::new(-9.0, 3.0), Point::new(14.0, 4.0), Point::new(2.0, 30.0)];
        let mut found = vec![false; dots.len()];
        assert!(grid.visit(&triangle, &mut |i| {
            found[i] = true;
            true
        }));
        let inside = |p: Point| (0..3).all(|i| (triangle[(i + 1) % 3] - triangle[i]).cross(p - triangle[i]) >= 0.0);
        assert!(dots.iter().zip(&found).all(|(&p, &found)| found || !inside(p)));
        let visited = found.iter().filter(|&&f| f).count();
        let within = dots.iter().filter(|&&p| inside(p)).count();
        assert!(visited < within + 250, "{visited} of {within}");
    }
}
