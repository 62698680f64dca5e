//! Which connected pieces of metal a job has, and which contacts, joins and electrodes tie them together.

use crate::geometry::overlap::common_area;
use crate::geometry::{BoundingBox, IndexedRegion, Point};
use crate::index::LayerId;
use crate::problem::{Footprint, Problem};
use crate::union::Sets;

/// A line's point this near to the rim, in mm, stands on the piece whose rim it is.
const AT_RIM: f64 = 0.05;

/// Areas in common up to this many mm² are rounding.
const TOUCH: f64 = 1e-6;

/// The pieces of all layers.
#[derive(Debug)]
pub struct Pieces<'a> {
    problem: &'a Problem,
    layers: Vec<LayerPieces>,
    /// Number of the first piece of every layer.
    first: Vec<usize>,
    count: usize,
}

#[derive(Debug)]
struct LayerPieces {
    region: IndexedRegion,
    /// Loop numbers of the outer rings, one for each piece.
    outer: Vec<usize>,
    /// Per loop: its piece within the layer.
    piece_of_loop: Vec<usize>,
}

/// A set of pieces that are connected, and what connects them.
#[derive(Debug, Clone, PartialEq)]
pub struct Connected {
    /// Numbers of its pieces, rising.
    pub pieces: Vec<usize>,
    /// Names of the contacts and joins that tie its pieces together.
    pub ties: Vec<String>,
    /// Numbers of the electrodes on it.
    pub electrodes: Vec<usize>,
}

impl<'a> Pieces<'a> {
    /// Finds the pieces of every layer.
    pub fn of(problem: &'a Problem) -> Self {
        let layers: Vec<LayerPieces> =
            problem.layers.iter().map(|layer| LayerPieces::of(IndexedRegion::new(&layer.region), layer.region.loops.len())).collect();
        let mut count = 0;
        let first = layers
            .iter()
            .map(|layer| {
                count += layer.outer.len();
                count - layer.outer.len()
            })
            .collect();
        Self { problem, layers, first, count }
    }

    /// Number of pieces and of holes in a layer.
    pub fn counts(&self, layer: LayerId) -> (usize, usize) {
        self.layers.get(layer.index()).map_or((0, 0), |l| (l.outer.len(), l.piece_of_loop.len() - l.outer.len()))
    }

    /// The layer's name, with the piece's number within the layer where it has several.
    pub fn name(&self, piece: usize) -> String {
        let layer = self.first.partition_point(|&first| first <= piece).saturating_sub(1);
        let Some(sheet) = self.problem.layers.get(layer) else { return String::new() };
        match self.layers.get(layer) {
            Some(pieces) if pieces.outer.len() > 1 => format!("{} piece {}", sheet.name, piece - self.first[layer] + 1),
            _ => sheet.name.clone(),
        }
    }

    /// The piece on which a footprint stands.
    pub fn under(&self, layer: LayerId, footprint: &Footprint) -> Option<usize> {
        let pieces = self.layers.get(layer.index())?;
        let within = match footprint {
            Footprint::Area { region, centre, .. } => {
                // The middle of a bent area may lie beside it.
                let points = std::iter::once(*centre).chain(region.loops.iter().flatten().copied());
                points.into_iter().find_map(|p| pieces.at(p)).or_else(|| pieces.at_rim(*centre, f64::INFINITY))
            }
            Footprint::Line { points } => {
                let p = match points.as_slice() {
                    [a, b, ..] => a.midpoint(*b),
                    [a] => *a,
                    [] => return None,
                };
                pieces.at_rim(p, AT_RIM).or_else(|| pieces.at(p))
            }
        };
        within.map(|piece| piece + self.first[layer.index()])
    }

    /// The connected sets, in the order of their first pieces.
    pub fn connected(&self) -> Vec<Connected> {
        let mut union = Sets::new(self.count);
        let mut ties: Vec<(usize, String)> = Vec::new();
        let layer_name = |l: LayerId| self.problem.layers.get(l.index()).map_or("", |layer| layer.name.as_str());
        for contact in &self.problem.contacts {
            for (a, b) in self.overlapping(contact.between, contact.area.as_ref().map(|area| area.edges().collect())) {
                union.join(a, b);
                ties.push((a, contact.name.clone()));
            }
        }
        for join in &self.problem.joins {
            let [a, b] = join.between;
            for spot in &join.spots {
                if let (Some(p), Some(q)) = (self.under(a, spot), self.under(b, spot)) {
                    union.join(p, q);
                    ties.push((p, format!("join of {} and {}", layer_name(a), layer_name(b))));
                }
            }
        }
        let mut stands: Vec<(usize, usize)> = Vec::new();
        for (number, electrode) in self.problem.electrodes.iter().enumerate() {
            let under = electrode.spots.iter().flat_map(|spot| electrode.through.iter().filter_map(|&l| self.under(l, &spot.footprint)));
            for piece in under {
                if let Some(&(last, _)) = stands.last().filter(|(_, e)| *e == number) {
                    if union.root(last) != union.root(piece) {
                        ties.push((piece, electrode.name.clone()));
                    }
                    union.join(last, piece);
                }
                stands.push((piece, number));
            }
        }
        let mut sets: Vec<Connected> = Vec::new();
        let mut set_of = vec![usize::MAX; self.count];
        for piece in 0..self.count {
            let root = union.root(piece);
            if set_of[root] == usize::MAX {
                set_of[root] = sets.len();
                sets.push(Connected { pieces: Vec::new(), ties: Vec::new(), electrodes: Vec::new() });
            }
            sets[set_of[root]].pieces.push(piece);
        }
        for (piece, tie) in ties {
            let list = &mut sets[set_of[union.root(piece)]].ties;
            if !list.contains(&tie) {
                list.push(tie);
            }
        }
        for (piece, electrode) in stands {
            let list = &mut sets[set_of[union.root(piece)]].electrodes;
            if list.last() != Some(&electrode) {
                list.push(electrode);
            }
        }
        sets
    }

    /// Pairs of pieces of two layers that lie on each other within an area.
    fn overlapping(&self, [a, b]: [LayerId; 2], area: Option<Vec<(Point, Point)>>) -> Vec<(usize, usize)> {
        let (Some(below), Some(above)) = (self.layers.get(a.index()), self.layers.get(b.index())) else { return Vec::new() };
        let (first, second) = (self.first[a.index()], self.first[b.index()]);
        if let ([_], [_]) = (below.outer.as_slice(), above.outer.as_slice()) {
            // A contact without any common area was refused.
            return vec![(first, second)];
        }
        let bounded = |layer: &LayerPieces| -> Vec<(Vec<(Point, Point)>, BoundingBox)> {
            let edges = layer.edges_of_pieces();
            edges.into_iter().map(|e| (BoundingBox::around(e.iter().map(|e| e.0)), e)).map(|(bounds, e)| (e, bounds)).collect()
        };
        let (lower, upper) = (bounded(below), bounded(above));
        let mut pairs = Vec::new();
        for (i, (p, p_box)) in lower.iter().enumerate() {
            for (j, (q, q_box)) in upper.iter().enumerate() {
                let window = p_box.common(*q_box);
                if !window.has_area() {
                    continue;
                }
                let shapes: Vec<&[(Point, Point)]> = [p.as_slice(), q.as_slice()].into_iter().chain(area.as_deref()).collect();
                if common_area(&shapes, window, TOUCH) > TOUCH {
                    pairs.push((first + i, second + j));
                }
            }
        }
        pairs
    }
}

impl LayerPieces {
    fn of(region: IndexedRegion, loops: usize) -> Self {
        let outer: Vec<usize> = (0..loops).filter(|&l| region.is_outer(l)).collect();
        let mut layer = Self { region, outer, piece_of_loop: Vec::new() };
        let mut piece_of_loop = vec![0; loops];
        let mut first_edge = vec![Point::default(); loops];
        for (number, edge) in layer.region.edges().iter().enumerate().rev() {
            first_edge[layer.region.loop_of(number)] = edge.0;
        }
        for l in 0..loops {
            // A hole's corner is on the hole's rim, inside its piece's outer ring.
            piece_of_loop[l] = layer.outer.binary_search(&l).ok().or_else(|| layer.innermost(first_edge[l])).unwrap_or(0);
        }
        layer.piece_of_loop = piece_of_loop;
        layer
    }

    /// The piece at a point; `None` off the metal.
    fn at(&self, p: Point) -> Option<usize> {
        if self.region.contains(p) { self.innermost(p) } else { None }
    }

    fn at_rim(&self, p: Point, within: f64) -> Option<usize> {
        let rim = self.region.nearest_rim(p)?;
        if rim.point.distance(p) > within {
            return None;
        }
        self.piece_of_loop.get(self.region.loop_of(rim.edge)).copied()
    }

    /// The piece whose outer ring is the innermost of those around a point.
    fn innermost(&self, p: Point) -> Option<usize> {
        if self.outer.len() == 1 {
            return Some(0);
        }
        let mut crossed: Vec<(usize, f64)> =
            self.region.index().left_of(p).map(|e| (self.region.loop_of(e), self.crossing(e, p))).collect();
        crossed.sort_by(|a, b| a.0.cmp(&b.0).then(a.1.total_cmp(&b.1)));
        let around = crossed.chunk_by(|a, b| a.0 == b.0).filter(|chunk| chunk.len() % 2 == 1);
        // Rings nest without crossing: the one met first on the way out is the innermost.
        let nearest = around.filter_map(|chunk| {
            let piece = self.outer.binary_search(&chunk[0].0).ok()?;
            chunk.last().map(|c| (piece, c.1))
        });
        nearest.max_by(|a, b| a.1.total_cmp(&b.1)).map(|(piece, _)| piece)
    }

    /// Where an edge meets the level of a point.
    fn crossing(&self, edge: usize, p: Point) -> f64 {
        let (a, b) = self.region.edges()[edge];
        a.x + (p.y - a.y) / (b.y - a.y) * (b.x - a.x)
    }

    fn edges_of_pieces(&self) -> Vec<Vec<(Point, Point)>> {
        let mut lists = vec![Vec::new(); self.outer.len()];
        for (number, &edge) in self.region.edges().iter().enumerate() {
            lists[self.piece_of_loop[self.region.loop_of(number)]].push(edge);
        }
        lists
    }
}
