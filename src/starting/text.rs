//! A plate as the two texts that a person edits: the outline and the job sheet, every key with a comment.

use super::plate::{Block, DROP_MV, Order, Plate};
use crate::geometry::Point;
use crate::quantity::coordinate;

/// Where comments begin.
const COLUMN: usize = 34;

/// The sheet's file name.
pub const SHEET: &str = "plate.toml";

/// The outline's file name.
pub const OUTLINE: &str = "plate.outline";

/// Tangent of a quarter of a right angle.
const QUARTER: &str = "0.41421356";

/// What the plate is, in a few words.
pub fn described(order: &Order) -> String {
    let arrangement = if order.staggered { "staggered" } else { "square" };
    format!("Collector plate, {} x {} cells {}, {arrangement}", order.rows, order.columns, order.cells)
}

/// The outline.
pub fn outline(order: &Order, plate: &Plate) -> String {
    let mut page = Page::default();
    page.text += &format!("# {}\n", described(order));
    page.text += "# x y in mm; a third number rounds: the edge that starts there is an arc, tan(angle / 4)\n\n";
    page.line("unit mm", "or inch");
    page.line("ring plate", "one closed line, either way round");
    let ([x, y], [low, high, end], r) = (plate.size_mm, plate.tab_mm, plate.corner_mm);
    let points = [
        ([r, 0.0], "", ""),
        ([x - r, 0.0], QUARTER, "outer corner"),
        ([x, r], "", ""),
        ([x, low], "", "the tab begins"),
        ([end, low], "", "the lead's edge"),
        ([end, high], "", "to here"),
        ([x, high], "", ""),
        ([x, y - r], QUARTER, "outer corner"),
        ([x - r, y], "", ""),
        ([r, y], QUARTER, "outer corner"),
        ([0.0, y - r], "", ""),
        ([0.0, r], QUARTER, "outer corner, back to the first point"),
    ];
    for ([x, y], bulge, comment) in points {
        page.line(format!("{} {} {bulge}", coordinate(x), coordinate(y)).trim_end(), comment);
    }
    page.text += "\n# A hole: circle x y diameter, anywhere below.\n";
    page.text
}

/// The job sheet.
pub fn sheet(order: &Order, plate: &Plate) -> String {
    let mut page = Page::default();
    let [low, high, end] = plate.tab_mm;
    page.text += &format!("# {}, with a tab for the lead.\n", described(order));
    page.text += "# A beginning, by common practice without a source: put your own figures in.\n\n";
    page.line(&format!("title = \"{}\"", described(order)), "");
    page.line("temperature_c = 20", "of the metal, degrees Celsius");
    page.block("[accuracy]", "how closely to solve");
    page.line("bracket_percent = 0.1", "stop when the loss is enclosed to 0.1 %");
    page.block("[[layer]]", "a sheet of metal; several: bottom first");
    page.line("name = \"plate\"", "the other blocks call it by this name");
    page.line(&format!("metal = \"{}\"", plate.metal), "`pinchbar metals` lists them");
    page.line(&format!("thickness_mm = {}", plate.thickness_mm), "a stock size, by hand formulas");
    page.line(&format!("outline = \"{OUTLINE}\""), "the file beside this one");
    page.line(&format!("corner_radius_mm = {}", coordinate(plate.corner_mm)), "of the inside corners, where the tab begins");
    for (block, name) in plate.blocks.iter().zip(if plate.blocks.len() > 1 { ["A", "B"] } else { ["C", ""] }) {
        cell(&mut page, plate, block, name);
    }
    page.block("[[terminal]]", "where the current leaves");
    page.line("name = \"lead\"", "no current_a: it takes the balance");
    page.line("layer = \"plate\"", "the sheet it is fixed to");
    page.line("# the tab's end, from corner to corner", "");
    page.line(&format!("line_mm = [{}, {}]", pair([end, low]), pair([end, high])), "");
    page.block("[limits]", "what you accept; PASS up to 80 % of it");
    page.line(&format!("drop_mv = {DROP_MV}"), "largest, between any can and the lead");
    page.line(&format!("density_a_mm2 = {{ plate = {} }}", plate.density_a_mm2), "gauge peak in the plate");
    page.line("joint_mv = 3", "largest over one spot");
    page.text
}

fn cell(page: &mut Page, plate: &Plate, block: &Block, name: &str) {
    let several = block.count * block.rows > 1;
    page.block("[[cell]]", if several { "a can's end, repeated by the pattern below" } else { "a can's end" });
    let numbered = format!("they become {name}1, {name}2, ... row by row");
    page.line(&format!("name = \"{name}\""), if several { &numbered } else { "as the tables call it" });
    page.line("layer = \"plate\"", "the sheet it is welded to");
    page.line("# middles of the first can's four weld spots", "");
    let spots: Vec<String> = plate.spots(block.first).iter().map(|p: &Point| pair([p.x, p.y])).collect();
    page.line(&format!("spots_mm = [{}]", spots.join(", ")), "");
    page.line(&format!("diameter_mm = {}", coordinate(plate.spot_mm)), "of a spot");
    page.line("joint_mohm = 0.05", "of one spot's interface: measure yours");
    page.line(&format!("current_a = {}", coordinate(plate.current_a)), "+ into the plate; continuous");
    if several {
        let rows = if block.rows > 1 { ", step to the next row, rows" } else { "" };
        page.line(&format!("# step along a row, cells in it{rows}"), "");
        let along = format!("step_mm = {}, count = {}", pair([plate.pitch_mm, 0.0]), block.count);
        let across = format!(", row_step_mm = {}, rows = {}", pair([0.0, block.row_step_mm]), block.rows);
        page.line(&format!("pattern = {{ {along}{} }}", if block.rows > 1 { &across } else { "" }), "");
    }
}

fn pair([x, y]: [f64; 2]) -> String {
    format!("[{}, {}]", coordinate(x), coordinate(y))
}

#[derive(Default)]
struct Page {
    text: String,
}

impl Page {
    /// A header with an empty line above.
    fn block(&mut self, header: &str, comment: &str) {
        self.text.push('\n');
        self.line(header, comment);
    }

    /// A line, and its comment in the column where it has room.
    fn line(&mut self, line: &str, comment: &str) {
        if comment.is_empty() {
            self.text += &format!("{line}\n");
        } else {
            self.text += &format!("{line:COLUMN$} # {comment}\n");
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::reading::{self, Reading};
    use std::path::Path;

    fn order(cells: &str, rows: u32, columns: u32, staggered: bool) -> Order {
        Order { cells: cells.into(), rows, columns, pitch_mm: None, staggered }
    }

    /// The texts as the reader takes them.
    fn read(order: &Order) -> (String, Reading) {
        let plate = Plate::new(order).unwrap();
        let (sheet, outline) = (sheet(order, &plate), outline(order, &plate));
        let load = |path: &Path| Ok(if path.ends_with(OUTLINE) { outline.clone() } else { sheet.clone() });
        let reading = reading::read(Path::new(SHEET), &load).unwrap_or_else(|faults| panic!("{faults:?}\n{sheet}\n{outline}"));
        (sheet, reading)
    }

    #[test]
    fn every_plate_is_a_valid_job_without_a_remark() {
        for cells in ["5", "18650", "21700", "4680", "18.35", "120"] {
            for (rows, columns) in [(1, 1), (1, 7), (7, 1), (2, 6), (3, 3), (15, 15)] {
                for staggered in [false, true] {
                    let order = order(cells, rows, columns, staggered);
                    let (sheet, Reading { problem, remarks, .. }) = read(&order);
                    assert!(remarks.is_empty(), "{order:?}: {remarks:?}\n{sheet}");
                    assert_eq!(problem.electrodes.len(), (rows * columns) as usize + 1, "{order:?}");
                    assert!(problem.electrodes.iter().rev().skip(1).all(|e| e.spots.len() == 4), "{order:?}");
                }
            }
        }
    }

    #[test]
    fn a_sheet_is_a_page_and_every_key_has_a_comment() {
        for staggered in [false, true] {
            let (sheet, _) = read(&order("21700", 4, 10, staggered));
            // A list in braces cannot be broken.
            let room = |line: &str| if line.contains('#') { 80 } else { 100 };
            assert!(sheet.lines().count() <= 60 && sheet.lines().all(|l| l.chars().count() <= room(l)), "{sheet}");
            let mut above = "";
            for line in sheet.lines() {
                let key = line.contains(" = ") && !line.starts_with("title");
                assert!(!key || line.contains(" # ") || above.starts_with("# "), "{line}");
                above = line;
            }
        }
    }
}
