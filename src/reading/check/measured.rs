//! A joint's resistance: given as it is, or as what a meter reads between two tips.

use super::layer::Stack;
use super::plausible;
use crate::geometry::Point;
use crate::index::LayerId;
use crate::problem::{Measured, MeasuredJoint};
use crate::reading::fields::{Fields, Notes, Placed};

/// What a block says of its joints.
#[derive(Clone)]
pub struct GivenJoint {
    /// Of one spot; where it is to be fitted, the reading itself.
    pub ohm: f64,
    /// The tips of the reading to which it is to be fitted.
    pub tips: Option<Vec<Placed<Point>>>,
}

/// Reads `joint_mohm`, or `measured_mohm` with `tips_mm`; `zero` says what a joint of 0 is, `None` that 0 is meant where neither is given.
/// `tips`: how many there may be.
pub fn read_joint(
    fields: &Fields,
    who: &str,
    zero: Option<&str>,
    tips: std::ops::RangeInclusive<usize>,
    notes: &Notes,
) -> Option<GivenJoint> {
    if fields.has("measured_mohm") {
        if fields.has("joint_mohm") {
            let remedy = "keep `joint_mohm` for the interface alone, or `measured_mohm` for a reading between tips";
            notes.fault("the joint is given twice", fields.place("measured_mohm"), "`joint_mohm` or `measured_mohm`", remedy);
        }
        let reading = fields.number_where("measured_mohm", "from 1e-5 to 1e12", |x| (1e-5..=1e12).contains(&x));
        fields.missing("tips_mm", "where the meter's tips stood, [[x, y], ...]");
        let points = fields.points("tips_mm")?;
        if !tips.contains(&points.len()) {
            let expected = if tips.contains(&1) {
                "one tip: the other one is on the can or lug"
            } else {
                "two tips, the first one on the first sheet"
            };
            notes.fault(format!("{} tips are given", points.len()), fields.place("tips_mm"), expected, "give the tips of this reading");
            return None;
        }
        return Some(GivenJoint { ohm: reading?.value * 1e-3, tips: Some(points) });
    }
    if fields.has("tips_mm") {
        let remedy = "add `measured_mohm`, or use a `[[probe]]` to read between two tips";
        notes.fault("`tips_mm` belongs to `measured_mohm`", fields.place("tips_mm"), "a reading to which the joint is fitted", remedy);
    }
    let joint = match zero {
        None if !fields.has("joint_mohm") => Some(0.0),
        Some(zero) => {
            fields.missing("joint_mohm", &format!("the resistance of one spot's interface in milliohm; 0 is {zero}"));
            fields.joint("joint_mohm")
        }
        None => fields.joint("joint_mohm"),
    };
    plausible::remark_number(who, "joint_mohm", joint, notes);
    Some(GivenJoint { ohm: joint? * 1e-3, tips: None })
}

/// The reading with its tips on the metal: the first one on the first of the layers, the second on the second.
pub fn place_tips(joint: MeasuredJoint, given: &GivenJoint, layers: &[LayerId], stack: &Stack, notes: &Notes) -> Option<Measured> {
    let mut tips = Vec::new();
    for (tip, &layer) in given.tips.iter().flatten().zip(layers) {
        let metal = stack.metal(layer)?;
        if !metal.contains(tip.value) && metal.rim_distance(tip.value) > 1e-6 {
            let message = format!("the tip at ({}, {}) is off the metal of `{}`", tip.value.x, tip.value.y, stack.name(layer));
            notes.fault(message, &tip.span, "a tip on the metal", "move the tip");
            return None;
        }
        tips.push((layer, tip.value));
    }
    Some(Measured { joint, ohm: given.ohm, tips, fitted: false })
}
