//! From the problem to labelled areas and lines, and from the areas that cover a cell to what conducts there.

use super::Fault;
use crate::fem::{CellPlan, End, ExchangePlan, Hold, LeafPlan, LinePlan, Touch};
use crate::geometry::{Point, ring};
use crate::index::{ContactId, ElectrodeId, JoinId, LayerId};
use crate::mesh::{Arrangement, arrange};
use crate::problem::{Footprint, Interface, Problem};

/// Most layers that a job may have: one bit each.
pub const MOST_LAYERS: usize = 64;

/// What an area of the drawing stands for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Area {
    /// A sheet.
    Layer(LayerId),
    /// The stated area of a contact.
    Contact(ContactId),
    /// A spot of a join.
    Join(JoinId, u32),
    /// A spot of an electrode.
    Spot(ElectrodeId, u32),
    /// A meter's tip: probe and which of its two.
    Tip(u32, u32),
}

/// What passes through an exchange: by this, currents and losses are summed up.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Mark {
    /// A contact.
    Contact(ContactId),
    /// A spot of a join.
    Join(JoinId, u32),
    /// A spot of an electrode, to the outside.
    Spot(ElectrodeId, u32),
    /// A spot of an electrode, between two of the sheets it passes.
    Within(ElectrodeId, u32),
}

/// The drawing's labels and their meaning.
pub struct Plan<'a> {
    problem: &'a Problem,
    /// Meaning of the areas, in the drawing's order.
    pub areas: Vec<Area>,
    loops: Vec<Vec<Vec<Point>>>,
    lines: Vec<LinePlan>,
    polylines: Vec<Vec<Point>>,
    /// Marks by number.
    pub marks: Vec<Mark>,
}

impl<'a> Plan<'a> {
    /// Lists what has to be drawn.
    pub fn new(problem: &'a Problem) -> Result<Self, Vec<Fault>> {
        if problem.layers.len() > MOST_LAYERS {
            return Err(vec![Fault::TooManyLayers(problem.layers.len())]);
        }
        let mut plan = Self { problem, areas: Vec::new(), loops: Vec::new(), lines: Vec::new(), polylines: Vec::new(), marks: Vec::new() };
        for (l, layer) in problem.layers.iter().enumerate() {
            plan.area(Area::Layer(LayerId::new(l)), layer.region.loops.clone());
        }
        for (c, contact) in problem.contacts.iter().enumerate() {
            plan.marks.push(Mark::Contact(ContactId::new(c)));
            if let Some(area) = &contact.area {
                plan.area(Area::Contact(ContactId::new(c)), area.loops.clone());
            }
        }
        for (j, join) in problem.joins.iter().enumerate() {
            for (i, spot) in join.spots.iter().enumerate() {
                plan.marks.push(Mark::Join(JoinId::new(j), i as u32));
                if let Footprint::Area { region, .. } = spot {
                    plan.area(Area::Join(JoinId::new(j), i as u32), region.loops.clone());
                }
            }
        }
        let mut lines = Vec::new();
        for (k, electrode) in problem.electrodes.iter().enumerate() {
            for (i, spot) in electrode.spots.iter().enumerate() {
                let (k, i) = (ElectrodeId::new(k), i as u32);
                plan.marks.extend([Mark::Spot(k, i), Mark::Within(k, i)]);
                match &spot.footprint {
                    Footprint::Area { region, .. } => plan.area(Area::Spot(k, i), region.loops.clone()),
                    Footprint::Line { points } => lines.push((k, i, points, spot.joint_ohm)),
                }
            }
        }
        for (p, probe) in problem.probes.iter().enumerate() {
            for (side, tip) in probe.tips.iter().enumerate() {
                plan.area(Area::Tip(p as u32, side as u32), vec![ring::tip(tip.1, probe.tip_mm)]);
            }
        }
        plan.marks.sort_unstable();
        for (k, i, points, joint) in lines {
            plan.line(k, i, points, joint);
        }
        Ok(plan)
    }

    /// Draws a line joint: once for every interface that it passes on its way from the first sheet to the outside; a solid one joins all at once.
    fn line(&mut self, k: ElectrodeId, i: u32, points: &[Point], joint: f64) {
        let through = &self.problem.electrodes[k.index()].through;
        let length: f64 = points.windows(2).map(|p| p[0].distance(p[1])).sum();
        let per_length = 1.0 / (joint * length);
        let bit = |l: &LayerId| 1u64 << l.0;
        let (spot, within) = (self.mark(Mark::Spot(k, i)), self.mark(Mark::Within(k, i)));
        let plans: Vec<LinePlan> = if joint == 0.0 {
            vec![LinePlan { layers: through.iter().map(bit).fold(0, |all, b| all | b), touch: Touch::Held(k.0), mark: spot }]
        } else {
            let between = through.windows(2).map(|pair| LinePlan {
                layers: bit(&pair[0]),
                touch: Touch::Layer(bit(&pair[1]), per_length),
                mark: within,
            });
            let outside = through.last().map(|last| LinePlan { layers: bit(last), touch: Touch::Pole(k.0, per_length), mark: spot });
            between.chain(outside).collect()
        };
        for plan in plans {
            self.lines.push(plan);
            self.polylines.push(points.to_vec());
        }
    }

    fn area(&mut self, meaning: Area, loops: Vec<Vec<Point>>) {
        self.areas.push(meaning);
        self.loops.push(loops);
    }

    /// The overlay of everything.
    pub fn drawing(&self) -> Result<Arrangement, Vec<Fault>> {
        let areas: Vec<&[Vec<Point>]> = self.loops.iter().map(Vec::as_slice).collect();
        let lines: Vec<&[Point]> = self.polylines.iter().map(Vec::as_slice).collect();
        arrange(&areas, &lines).map_err(|fault| vec![Fault::Mesh(fault)])
    }

    /// True for covers with any metal.
    pub fn is_metal(&self, cover: &[u32]) -> bool {
        cover.first().is_some_and(|&a| (a as usize) < self.problem.layers.len())
    }

    fn mark(&self, mark: Mark) -> u32 {
        self.marks.partition_point(|m| *m < mark) as u32
    }

    /// What the lines do.
    pub fn line_plans(&self) -> &[LinePlan] {
        &self.lines
    }

    /// What a cell with this cover consists of.
    ///
    /// # Errors
    /// When two electrodes hold one place.
    pub fn cell(&self, cover: &[u32]) -> Result<CellPlan, Fault> {
        let meanings: Vec<Area> = cover.iter().map(|&a| self.areas[a as usize]).collect();
        let layers: Vec<LayerId> = meanings.iter().filter_map(|m| if let Area::Layer(l) = m { Some(*l) } else { None }).collect();
        let has = |l: LayerId| layers.contains(&l);
        // Bonds join layers to leaves.
        let mut leaf_of: Vec<usize> = (0..layers.len()).collect();
        let mut bond = |a: LayerId, b: LayerId| {
            let place = |l| layers.iter().position(|&x| x == l);
            if let (Some(a), Some(b)) = (place(a), place(b)) {
                let (low, high) = (leaf_of[a].min(leaf_of[b]), leaf_of[a].max(leaf_of[b]));
                leaf_of.iter_mut().filter(|x| **x == high).for_each(|x| *x = low);
            }
        };
        let contact_here = |c: usize| self.problem.contacts[c].area.is_none() || meanings.contains(&Area::Contact(ContactId::new(c)));
        for (_, contact) in self.problem.contacts.iter().enumerate().filter(|(c, _)| contact_here(*c)) {
            if contact.interface == Interface::Bonded {
                bond(contact.between[0], contact.between[1]);
            }
        }
        for meaning in &meanings {
            match *meaning {
                Area::Join(j, _) if self.problem.joins[j.index()].joint_ohm == 0.0 => {
                    let [a, b] = self.problem.joins[j.index()].between;
                    bond(a, b);
                }
                Area::Spot(k, i) if self.problem.electrodes[k.index()].spots[i as usize].joint_ohm == 0.0 => {
                    self.problem.electrodes[k.index()].through.windows(2).for_each(|p| bond(p[0], p[1]));
                }
                _ => {}
            }
        }
        let mut names: Vec<usize> = leaf_of.clone();
        names.sort_unstable();
        names.dedup();
        let mut plan = CellPlan::default();
        for &name in &names {
            let mut leaf = LeafPlan { layers: 0, conductance: 0.0, held: None };
            for (&l, _) in layers.iter().zip(&leaf_of).filter(|(_, n)| **n == name) {
                leaf.layers |= 1 << l.0;
                leaf.conductance += self.problem.layers[l.index()].sheet_conductance();
            }
            plan.leaves.push(leaf);
        }
        let leaf = |l: LayerId| layers.iter().position(|&x| x == l).map(|i| names.partition_point(|&n| n < leaf_of[i]));
        for meaning in &meanings {
            if let Area::Spot(k, i) = *meaning
                && self.problem.electrodes[k.index()].spots[i as usize].joint_ohm == 0.0
            {
                let hold = Hold { pole: k.0, mark: self.mark(Mark::Spot(k, i)) };
                for l in self.problem.electrodes[k.index()].through.iter().filter_map(|&l| leaf(l)) {
                    match plan.leaves[l].held {
                        Some(other) if other.pole != hold.pole => return Err(Fault::ElectrodesMeet([ElectrodeId(other.pole), k])),
                        Some(_) => {}
                        None => plan.leaves[l].held = Some(hold),
                    }
                }
            }
        }
        let end = |l: LayerId| {
            leaf(l).map(|i| match plan.leaves[i].held {
                Some(hold) => End::Pole(hold.pole),
                None => End::Leaf(i as u32),
            })
        };
        let mut exchanges = Vec::new();
        let mut exchange = |a: Option<End>, b: Option<End>, per_area: f64, mark: Mark| {
            if let (Some(a), Some(b)) = (a, b)
                && a != b
            {
                exchanges.push(ExchangePlan { ends: [a, b], per_area, mark: self.mark(mark) });
            }
        };
        for (c, contact) in self.problem.contacts.iter().enumerate().filter(|(c, _)| contact_here(*c)) {
            if let Interface::Conductance(per_area) = contact.interface
                && contact.between.iter().all(|&l| has(l))
            {
                exchange(end(contact.between[0]), end(contact.between[1]), per_area, Mark::Contact(ContactId::new(c)));
            }
        }
        for meaning in &meanings {
            match *meaning {
                Area::Join(j, i) => {
                    let join = &self.problem.joins[j.index()];
                    if join.joint_ohm > 0.0
                        && let Footprint::Area { area_mm2, .. } = &join.spots[i as usize]
                    {
                        exchange(end(join.between[0]), end(join.between[1]), 1.0 / (join.joint_ohm * area_mm2), Mark::Join(j, i));
                    }
                }
                Area::Spot(k, i) => {
                    let electrode = &self.problem.electrodes[k.index()];
                    let spot = &electrode.spots[i as usize];
                    if spot.joint_ohm > 0.0
                        && let Footprint::Area { area_mm2, .. } = &spot.footprint
                    {
                        let per_area = 1.0 / (spot.joint_ohm * area_mm2);
                        for pair in electrode.through.windows(2) {
                            exchange(end(pair[0]), end(pair[1]), per_area, Mark::Within(k, i));
                        }
                        // + from the outside into the sheet.
                        let last = electrode.through.last().and_then(|&l| end(l));
                        exchange(Some(End::Pole(k.0)), last, per_area, Mark::Spot(k, i));
                    }
                }
                _ => {}
            }
        }
        plan.exchanges = exchanges;
        Ok(plan)
    }
}
