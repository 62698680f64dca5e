//! The arithmetic of a collector plate over a field of round cells: where cans, spots, corners and the tab lie, and which stock sheet carries it.

use crate::diagnostic::Fault;
use crate::geometry::Point;
use crate::problem::material::metal;

/// Most cells of a plate.
pub const MOST_CELLS: u32 = 400;

/// Distance between cans beyond their diameter, mm; common practice, no source.
const GAP_MM: f64 = 0.5;

/// Continuous current of a can of 18 mm, A; others in proportion to their end face; common practice, no source.
const CURRENT_OF_18_A: f64 = 5.0;

/// Largest drop over the plate, mV; common practice, no source.
pub const DROP_MV: f64 = 20.0;

/// What hand formulas may use up of a limit: spots and inside corners need the rest.
const SHARE_OF_LIMIT: f64 = 0.6;

/// A spot's current leaves to one side of its rim more than to the other.
const UNEVEN_RIM: f64 = 1.2;

/// Stock sheets, thin ones first: metal, thickness in mm, limit in A/mm2; common practice, no source.
const STOCK: [(&str, f64, f64); 10] = [
    ("nickel-201", 0.15, 8.0),
    ("nickel-201", 0.2, 8.0),
    ("nickel-201", 0.3, 8.0),
    ("copper-etp", 0.2, 12.0),
    ("copper-etp", 0.3, 12.0),
    ("copper-etp", 0.5, 12.0),
    ("copper-etp", 1.0, 6.0),
    ("copper-etp", 1.5, 6.0),
    ("copper-etp", 2.0, 6.0),
    ("copper-etp", 3.0, 6.0),
];

/// What is asked for.
#[derive(Debug, Clone, PartialEq)]
pub struct Order {
    /// A designation such as `21700`, or the can's diameter in mm.
    pub cells: String,
    /// Cells across the tab's direction.
    pub rows: u32,
    /// Cells along the tab's direction.
    pub columns: u32,
    /// From one can's middle to the next one's, mm; `None`: the usual one.
    pub pitch_mm: Option<f64>,
    /// Every second row moved by half a pitch.
    pub staggered: bool,
}

/// Cells that one pattern places.
#[derive(Debug, Clone, PartialEq)]
pub struct Block {
    /// The middle of the first can.
    pub first: Point,
    /// Cells in a row.
    pub count: u32,
    /// Rows.
    pub rows: u32,
    /// From one row to the next, mm.
    pub row_step_mm: f64,
}

/// The plate: its metal is a rectangle from (0, 0) with a tab at the end of greatest x. Lengths in mm.
#[derive(Debug, Clone, PartialEq)]
pub struct Plate {
    /// The can's diameter.
    pub can_mm: f64,
    /// From one can's middle to the next one's in a row.
    pub pitch_mm: f64,
    /// The cells: one block, or two where rows are staggered.
    pub blocks: Vec<Block>,
    /// The plate's size without the tab.
    pub size_mm: [f64; 2],
    /// Radius of its outer corners and of the inside corners at the tab.
    pub corner_mm: f64,
    /// The tab: y of its lower and upper edge, x of its end.
    pub tab_mm: [f64; 3],
    /// Half the distance of a can's spots, in x and in y.
    pub half_mm: f64,
    /// A spot's diameter.
    pub spot_mm: f64,
    /// Current of a cell, A.
    pub current_a: f64,
    /// Row of the metals table.
    pub metal: &'static str,
    /// Thickness.
    pub thickness_mm: f64,
    /// Limit of the current density, A/mm2.
    pub density_a_mm2: f64,
}

impl Plate {
    /// Lays out what was asked for.
    ///
    /// # Errors
    /// One fault with its remedy when the order cannot be a plate.
    pub fn new(order: &Order) -> Result<Self, Fault> {
        let can = diameter(&order.cells)?;
        let pitch = order.pitch_mm.unwrap_or(can + GAP_MM);
        // Written so that what is no number fails too.
        if !(pitch >= can && pitch <= 10.0 * can) {
            return Err(fault(
                format!("a pitch of {pitch} mm does not go with cans of {can} mm"),
                format!("{can} mm, where cans touch, to {} mm", 10.0 * can),
                format!("leave `--pitch` out for the usual {} mm", can + GAP_MM),
            ));
        }
        let (rows, columns) = (order.rows, order.columns);
        let cells = rows.saturating_mul(columns);
        if cells == 0 || cells > MOST_CELLS {
            return Err(fault(
                format!("{rows} x {columns} cells"),
                format!("1 to {MOST_CELLS} cells"),
                "divide the pack: one plate for each group of cells side by side".into(),
            ));
        }
        let shifted = order.staggered && rows > 1;
        // Rounded up: cans that touch in a row must not be pressed into each other between rows.
        let row_pitch = if shifted { (pitch * 0.75f64.sqrt() * 100.0).ceil() / 100.0 } else { pitch };
        // The plate ends inside the outer cans' rims, where it cannot touch a neighbour.
        let margin = to_step(0.4 * can, 0.5);
        let along = f64::from(columns - 1) * pitch + if shifted { 0.5 * pitch } else { 0.0 };
        let size = [2.0 * margin + along, 2.0 * margin + f64::from(rows - 1) * row_pitch];
        // On a tall plate nearly the whole side is tab: wide shoulders would crowd the current into its corners.
        let tab_low = to_step((0.2 * size[1]).min(0.5 * can), 0.1);
        let tab = [tab_low, size[1] - tab_low, size[0] + to_step(0.5 * can, 0.5)];
        let block = |first_row: u32| Block {
            first: Point::new(margin + if first_row == 1 { 0.5 * pitch } else { 0.0 }, margin + f64::from(first_row) * row_pitch),
            count: columns,
            rows: if shifted { (rows - first_row).div_ceil(2) } else { rows },
            row_step_mm: if shifted { 2.0 * row_pitch } else { row_pitch },
        };
        let current = (CURRENT_OF_18_A * (can / 18.0).powi(2)).round().max(0.5);
        let spacing = to_step(0.2 * can, 0.5);
        let mut plate = Self {
            can_mm: can,
            pitch_mm: pitch,
            blocks: if shifted { vec![block(0), block(1)] } else { vec![block(0)] },
            size_mm: size,
            // An outer corner and an inside corner share the edge beside the tab.
            corner_mm: (0.45 * tab_low).min(0.5 * margin).min(6.0).mul_add(10.0, 1e-9).floor() / 10.0,
            tab_mm: tab,
            half_mm: 0.5 * spacing,
            spot_mm: to_step(spacing / 3.0, 0.1).min(if can < 40.0 { 1.0 } else { 2.0 }),
            current_a: current,
            metal: "",
            thickness_mm: 0.0,
            density_a_mm2: 0.0,
        };
        plate.choose_stock(columns, pitch / row_pitch);
        Ok(plate)
    }

    /// Number of cells.
    pub fn cells(&self) -> u32 {
        self.blocks.iter().map(|b| b.count * b.rows).sum()
    }

    /// The spots of the can in this place.
    pub fn spots(&self, can: Point) -> [Point; 4] {
        let h = self.half_mm;
        [(-h, -h), (h, -h), (-h, h), (h, h)].map(|(x, y)| Point::new(can.x + x, can.y + y))
    }

    /// The first sheet that keeps the drop, the tab's mean density and that at a spot's rim below their shares of the limits, by hand formulas:
    /// a strip per row that gathers a cell's current at every pitch, and the tab. The thickest where none does.
    fn choose_stock(&mut self, columns: u32, squares: f64) {
        let total = f64::from(self.cells()) * self.current_a;
        let width = self.tab_mm[1] - self.tab_mm[0];
        let in_row = 0.5 * f64::from(columns).powi(2) * self.current_a * squares;
        let in_tab = total * (self.tab_mm[2] - self.size_mm[0]) / width;
        let rims = 4.0 * std::f64::consts::PI * self.spot_mm;
        for (name, thickness, limit) in STOCK {
            (self.metal, self.thickness_mm, self.density_a_mm2) = (name, thickness, limit);
            let ohm_mm = metal(name).map_or(f64::INFINITY, |m| m.material().resistivity.at(20.0));
            let drop_mv = 1e3 * ohm_mm / thickness * (in_row + in_tab);
            let density = (total / width).max(UNEVEN_RIM * self.current_a / rims) / thickness;
            if drop_mv <= SHARE_OF_LIMIT * DROP_MV && density <= SHARE_OF_LIMIT * limit {
                break;
            }
        }
    }
}

/// The diameter of a can in mm, by its designation (the first two of four or five digits) or as a number.
fn diameter(cells: &str) -> Result<f64, Fault> {
    let digits = cells.len() > 3 && cells.bytes().all(|b| b.is_ascii_digit());
    let by_name = if digits && cells.len() <= 5 { cells.get(..2) } else { None };
    match by_name.unwrap_or(cells).parse::<f64>() {
        Ok(mm) if (5.0..=120.0).contains(&mm) => Ok(mm),
        _ => Err(fault(
            format!("`{cells}` is no round cell"),
            "a designation such as 18650, 21700, 26650, 32700 or 4680, or the can's diameter, 5 to 120 mm".into(),
            "give the diameter in mm, such as `--cells 21`".into(),
        )),
    }
}

fn fault(message: String, expected: String, remedy: String) -> Fault {
    Fault { message, span: None, expected: Some(expected), remedy: Some(remedy), labels: Vec::new() }
}

/// The nearest multiple of a step, and never nothing.
fn to_step(value: f64, step: f64) -> f64 {
    let per_mm = (1.0 / step).round();
    (value * per_mm).round().max(1.0) / per_mm
}

#[cfg(test)]
mod tests {
    use super::*;

    fn order(cells: &str, rows: u32, columns: u32, staggered: bool) -> Order {
        Order { cells: cells.into(), rows, columns, pitch_mm: None, staggered }
    }

    fn cans(plate: &Plate) -> Vec<Point> {
        let one = |b: &Block| {
            let block = b.clone();
            let pitch = plate.pitch_mm;
            (0..b.rows).flat_map(move |r| {
                let (first, step) = (block.first, block.row_step_mm);
                (0..block.count).map(move |c| Point::new(first.x + f64::from(c) * pitch, first.y + f64::from(r) * step))
            })
        };
        plate.blocks.iter().flat_map(one).collect()
    }

    #[test]
    fn no_cans_or_spots_overlap_and_all_spots_are_on_the_plate() {
        for cells in ["5", "10", "18650", "21700", "26650", "32700", "4680", "120"] {
            for (rows, columns, staggered) in [
                (1, 1, false),
                (1, 1, true),
                (1, 9, false),
                (1, 9, true),
                (9, 1, false),
                (9, 1, true),
                (2, 6, true),
                (3, 4, true),
                (20, 20, false),
                (20, 20, true),
            ] {
                let plate = Plate::new(&order(cells, rows, columns, staggered)).unwrap();
                let cans = cans(&plate);
                let tag = format!("{cells} {rows} x {columns} {staggered}");
                assert_eq!((cans.len() as u32, plate.cells()), (rows * columns, rows * columns), "{tag}");
                let apart = |points: &[Point], least: f64| {
                    points.iter().enumerate().all(|(i, a)| points[..i].iter().all(|b| (a.x - b.x).hypot(a.y - b.y) >= least))
                };
                assert!(apart(&cans, plate.can_mm), "{tag}: cans overlap");
                assert!(
                    2.0 * plate.half_mm > 1.5 * plate.spot_mm && plate.half_mm + plate.spot_mm < 0.5 * plate.can_mm,
                    "{tag}: {plate:?}"
                );
                let (radius, corner, [x_end, y_end]) = (0.5 * plate.spot_mm, plate.corner_mm, plate.size_mm);
                for spot in cans.iter().flat_map(|&c| plate.spots(c)) {
                    // Distance into the rounded rectangle: to its edges, or to the arc where the spot lies in a corner's square.
                    let (dx, dy) = (spot.x.min(x_end - spot.x), spot.y.min(y_end - spot.y));
                    let inside = if dx < corner && dy < corner { corner - (corner - dx).hypot(corner - dy) } else { dx.min(dy) };
                    assert!(inside > radius, "{tag}: a spot at {spot:?} leaves the plate");
                }
                // The outer corner and the inside corner both fit beside the tab.
                assert!(corner > 0.0 && 2.0 * corner <= plate.tab_mm[0], "{tag}: {plate:?}");
                assert!(corner <= plate.tab_mm[2] - x_end && plate.tab_mm[1] - plate.tab_mm[0] > 0.5 * y_end, "{tag}: {plate:?}");
            }
        }
    }

    #[test]
    fn designations_give_diameter_pitch_and_current() {
        for (cells, can, current) in
            [("18650", 18.0, 5.0), ("21700", 21.0, 7.0), ("26650", 26.0, 10.0), ("32700", 32.0, 16.0), ("4680", 46.0, 33.0)]
        {
            let plate = Plate::new(&order(cells, 2, 5, false)).unwrap();
            assert_eq!((plate.can_mm, plate.pitch_mm, plate.current_a), (can, can + 0.5, current), "{cells}");
        }
        assert_eq!(Plate::new(&order("18.5", 1, 1, false)).unwrap().can_mm, 18.5);
    }

    #[test]
    fn more_current_takes_a_better_sheet() {
        let sheets: Vec<_> =
            [2, 6, 12, 20].map(|n| Plate::new(&order("21700", n, n, false)).unwrap()).map(|p| (p.metal, p.thickness_mm)).into();
        let rank = |sheet: &(&str, f64)| STOCK.iter().position(|s| (s.0, s.1) == *sheet).unwrap();
        assert!(sheets.windows(2).all(|w| rank(&w[0]) < rank(&w[1])), "{sheets:?}");
    }

    #[test]
    fn what_cannot_be_a_plate_is_refused_with_a_remedy() {
        let pitched = |pitch: f64| Order { pitch_mm: Some(pitch), ..order("21700", 2, 2, false) };
        let wrong = [
            order("4", 1, 1, false),
            order("cell", 1, 1, false),
            order("nan", 1, 1, false),
            order("217000", 1, 1, false),
            order("00650", 1, 1, false),
            order("1é50", 1, 1, false),
            order("21700", 0, 4, false),
            order("21700", 200, 200, false),
            pitched(20.9),
            pitched(f64::NAN),
            pitched(1e9),
        ];
        for order in wrong {
            let Err(fault) = Plate::new(&order) else { panic!("{order:?} was taken") };
            assert!(fault.remedy.is_some() && fault.expected.is_some(), "{fault:?}");
        }
        assert!(Plate::new(&pitched(21.0)).is_ok());
    }
}
