//! Slips of units: figures that are allowed but of a size that parts of this trade do not have get a remark.

use crate::geometry::BoundingBox;
use crate::quantity::coordinate;
use crate::reading::fields::Notes;

/// A key, the sizes between which its number is usual, and what may have gone wrong.
struct Usual {
    key: &'static str,
    least: f64,
    most: f64,
    hint: &'static str,
}

/// Common practice, no source; wide enough that a part of this trade is hardly ever told of.
const USUAL: [Usual; 6] = [
    Usual { key: "thickness_mm", least: 0.005, most: 10.0, hint: "sheets are in mm: 0.15, not 150 (micrometres) or 0.00015 (metres)" },
    Usual {
        key: "resistivity_uohm_cm",
        least: 0.5,
        most: 200.0,
        hint: "in microohm cm copper is 1.72, nickel about 9; 1e-8 ohm m is 1 microohm cm",
    },
    Usual { key: "emf_mv", least: 100.0, most: f64::INFINITY, hint: "millivolts are meant: 3650, not 3.65" },
    Usual { key: "resistance_mohm", least: 0.05, most: 1000.0, hint: "a cell has 0.15 to some 60 milliohm" },
    Usual { key: "temperature_c", least: 0.0, most: 250.0, hint: "degrees Celsius are meant, not kelvin" },
    Usual { key: "joint_mohm", least: 0.0, most: 10.0, hint: "a sound weld has less than 1 milliohm; 100 microohm are 0.1" },
];

/// Largest usual size of a part, and the least one of the longer side, mm.
const EXTENTS: [f64; 2] = [5.0, 2000.0];

/// Remarks on a number of unusual size, where there is one; 0 is a plain statement, not a slip.
pub fn remark_number(who: &str, key: &str, value: Option<f64>, notes: &Notes) {
    let Some(value) = value else { return };
    let usual = USUAL.iter().find(|usual| usual.key == key);
    if let Some(usual) = usual.filter(|usual| value != 0.0 && !(usual.least..=usual.most).contains(&value.abs())) {
        notes.remark(format!("{who}: `{key}` is {value}: plausible? ({})", usual.hint));
    }
}

/// Remarks on a sheet of unusual extents.
pub fn remark_extents(who: &str, bounds: BoundingBox, notes: &Notes) {
    let (width, height) = (bounds.width(), bounds.height());
    let [least, most] = EXTENTS;
    if width.max(height) > most || width.max(height) < least {
        notes.remark(format!(
            "{who}: its extents are {} x {} mm: plausible? (without `unit inch` an outline is in mm)",
            coordinate(width),
            coordinate(height)
        ));
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Point;

    fn remarks(tell: impl Fn(&Notes)) -> Vec<String> {
        let notes = Notes::default();
        tell(&notes);
        notes.remarks.into_inner().into_iter().map(|r| r.text).collect()
    }

    #[test]
    fn every_slip_of_a_unit_gets_one_remark_and_usual_figures_none() {
        for (key, slips, usual) in [
            ("thickness_mm", vec![150.0 / 7.0, 0.00015], vec![0.006, 0.15, 10.0]),
            ("resistivity_uohm_cm", vec![1.72e-8, 0.0172, 1720.0], vec![1.587, 9.0, 120.0]),
            ("resistance_mohm", vec![0.015, 15_000.0], vec![0.15, 60.0]),
            ("temperature_c", vec![353.0], vec![20.0, -40.0, 120.0]),
            ("emf_mv", vec![3.65, -3.65], vec![3650.0, -2000.0, 48_000.0, 0.0]),
            ("joint_mohm", vec![170.0], vec![0.0, 0.02, 5.0]),
        ] {
            for slip in slips {
                let told = remarks(|notes| remark_number("plate", key, Some(slip), notes));
                assert_eq!(told.len(), 1, "{key} {slip}");
                assert!(told[0].starts_with(&format!("plate: `{key}` is {slip}: plausible?")), "{told:?}");
            }
            for good in usual {
                assert_eq!(remarks(|notes| remark_number("plate", key, Some(good), notes)), [""; 0], "{key} {good}");
            }
        }
    }

    #[test]
    fn parts_of_an_unusual_size_get_a_remark() {
        let sized = |x: f64, y: f64| {
            remarks(|notes| remark_extents("plate", BoundingBox { min: Point::new(1.0, 1.0), max: Point::new(1.0 + x, 1.0 + y) }, notes))
        };
        assert_eq!(sized(0.24, 0.08), ["plate: its extents are 0.24 x 0.08 mm: plausible? (without `unit inch` an outline is in mm)"]);
        assert_eq!([sized(24.0, 3048.0).len(), sized(3048.0, 1.0).len(), sized(4.9, 1.0).len()], [1, 1, 1]);
        assert_eq!([sized(24.0, 8.0).len(), sized(1999.0, 2.0).len(), sized(2.0, 5.1).len()], [0, 0, 0]);
    }
}
