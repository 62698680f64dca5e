//! Boxes of words on the page: none over another, none off the page.

/// A place on the page in pixels, x to the right, y down.
pub type Spot = [f64; 2];

/// An upright box on the page, px.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Area {
    /// Left side.
    pub left: f64,
    /// Upper side.
    pub top: f64,
    /// Right side.
    pub right: f64,
    /// Lower side.
    pub bottom: f64,
}

impl Area {
    /// The box of this width and height around a centre.
    pub fn around(centre: Spot, width: f64, height: f64) -> Self {
        Self {
            left: centre[0] - 0.5 * width,
            top: centre[1] - 0.5 * height,
            right: centre[0] + 0.5 * width,
            bottom: centre[1] + 0.5 * height,
        }
    }

    /// The smallest box that holds two points.
    pub fn spanning(a: Spot, b: Spot) -> Self {
        Self { left: a[0].min(b[0]), top: a[1].min(b[1]), right: a[0].max(b[0]), bottom: a[1].max(b[1]) }
    }

    /// The box widened on all sides.
    pub fn widened(self, by: f64) -> Self {
        Self { left: self.left - by, top: self.top - by, right: self.right + by, bottom: self.bottom + by }
    }

    /// True when both have inner points in common.
    pub fn overlaps(&self, other: &Self) -> bool {
        self.left < other.right && other.left < self.right && self.top < other.bottom && other.top < self.bottom
    }

    /// Distance between two boxes; 0 where they overlap.
    pub fn gap(&self, other: &Self) -> f64 {
        let x = (self.left - other.right).max(other.left - self.right).max(0.0);
        let y = (self.top - other.bottom).max(other.top - self.bottom).max(0.0);
        x.hypot(y)
    }

    /// True when the other lies within.
    pub fn holds(&self, other: &Self) -> bool {
        self.left <= other.left && self.top <= other.top && self.right >= other.right && self.bottom >= other.bottom
    }

    /// Width, px.
    pub fn width(&self) -> f64 {
        self.right - self.left
    }

    /// Height, px.
    pub fn height(&self) -> f64 {
        self.bottom - self.top
    }

    /// The middle.
    pub fn centre(&self) -> Spot {
        [0.5 * (self.left + self.right), 0.5 * (self.top + self.bottom)]
    }

    /// True when the straight line between two points enters the box.
    pub fn crossed_by(&self, a: Spot, b: Spot) -> bool {
        let (mut from, mut to) = (0.0f64, 1.0f64);
        for (start, step, low, high) in [(a[0], b[0] - a[0], self.left, self.right), (a[1], b[1] - a[1], self.top, self.bottom)] {
            if step.abs() < 1e-12 {
                if start <= low || start >= high {
                    return false;
                }
                continue;
            }
            let (one, two) = ((low - start) / step, (high - start) / step);
            from = from.max(one.min(two));
            to = to.min(one.max(two));
        }
        from < to
    }
}

/// Side of a cell of the grid that finds neighbours, px.
const CELL: f64 = 48.0;

/// Boxes that were placed, in a grid so that asking is quick.
#[derive(Debug)]
pub struct Occupied {
    page: Area,
    columns: usize,
    cells: Vec<Vec<usize>>,
    areas: Vec<Area>,
}

impl Occupied {
    /// An empty page; boxes must lie within `page`.
    pub fn new(page: Area) -> Self {
        let columns = (page.right / CELL) as usize + 1;
        let rows = (page.bottom / CELL) as usize + 1;
        Self { page, columns, cells: vec![Vec::new(); columns * rows], areas: Vec::new() }
    }

    fn cells_of(&self, area: &Area) -> impl Iterator<Item = usize> + use<> {
        let (columns, rows) = (self.columns, self.cells.len() / self.columns);
        let number = |v: f64, count: usize| ((v / CELL).max(0.0) as usize).min(count - 1);
        let (left, right) = (number(area.left, columns), number(area.right, columns));
        let (top, bottom) = (number(area.top, rows), number(area.bottom, rows));
        (top..=bottom).flat_map(move |row| (left..=right).map(move |column| row * columns + column))
    }

    /// True when the box lies on the page and on no other box.
    pub fn is_free(&self, area: &Area) -> bool {
        self.page.holds(area) && !self.cells_of(area).any(|cell| self.cells[cell].iter().any(|&other| self.areas[other].overlaps(area)))
    }

    /// Takes the place, whatever is there.
    pub fn take(&mut self, area: Area) {
        for cell in self.cells_of(&area).collect::<Vec<_>>() {
            self.cells[cell].push(self.areas.len());
        }
        self.areas.push(area);
    }

    /// How many boxes the straight line enters.
    pub fn crossed_by(&self, a: Spot, b: Spot) -> usize {
        self.areas.iter().filter(|area| area.crossed_by(a, b)).count()
    }

    /// Number of boxes; for [`Occupied::forget`].
    pub fn count(&self) -> usize {
        self.areas.len()
    }

    /// Gives back all places taken after `count` boxes were there.
    pub fn forget(&mut self, count: usize) {
        self.areas.truncate(count);
        for cell in &mut self.cells {
            cell.retain(|&other| other < count);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_taken_place_is_not_free_and_the_page_has_an_end() {
        let mut occupied = Occupied::new(Area { left: 0.0, top: 0.0, right: 200.0, bottom: 100.0 });
        let first = Area::around([50.0, 50.0], 100.0, 20.0);
        assert!(occupied.is_free(&first));
        occupied.take(first);
        assert!(!occupied.is_free(&Area::around([99.0, 59.0], 4.0, 4.0)));
        assert!(occupied.is_free(&Area::around([102.0, 50.0], 4.0, 4.0)), "touching is no overlap");
        assert!(!occupied.is_free(&Area::around([198.0, 50.0], 5.0, 4.0)), "off the page");
        let count = occupied.count();
        let second = Area::around([150.0, 50.0], 20.0, 20.0);
        occupied.take(second);
        assert!(!occupied.is_free(&second));
        occupied.forget(count);
        assert!(occupied.is_free(&second) && !occupied.is_free(&first));
    }

    #[test]
    fn the_gap_between_boxes_is_the_shortest_way() {
        let area = Area::around([10.0, 10.0], 4.0, 4.0);
        assert_eq!(area.gap(&Area::around([11.0, 11.0], 4.0, 4.0)), 0.0);
        assert_eq!(area.gap(&Area::around([20.0, 10.0], 4.0, 4.0)), 6.0);
        assert_eq!(area.gap(&Area::around([17.0, 18.0], 4.0, 4.0)), 5.0);
    }

    #[test]
    fn a_line_enters_a_box_or_passes_it() {
        let area = Area::around([10.0, 10.0], 4.0, 4.0);
        assert!(area.crossed_by([0.0, 0.0], [20.0, 20.0]));
        assert!(area.crossed_by([10.0, 0.0], [10.0, 20.0]));
        assert!(!area.crossed_by([0.0, 0.0], [7.0, 7.0]), "ends before");
        assert!(!area.crossed_by([0.0, 13.0], [20.0, 13.0]));
    }
}
