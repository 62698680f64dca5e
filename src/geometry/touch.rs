//! Whether arcs as drawn touch an edge that their chords miss.

use super::clearance::feature::{Feature, parts};
use super::predicate::nearest_on_segment;
use super::ring::Arc;
use super::{Point, Ring};

/// Edges of one ring count as neighbours where the stretch between them is at most this many times as long as the distance at which they touch.
const NEIGHBOURS: f64 = 10.0;

/// The drawn edges behind the chords of flattened rings.
pub struct DrawnEdges<'a> {
    rings: &'a [Ring],
    edges: Vec<Edge>,
    /// Per chord, the number of its edge.
    of_chord: Vec<u32>,
    /// Per ring, how long its chords are together.
    lengths: Vec<f64>,
    most_deviation: f64,
}

struct Edge {
    ring: u32,
    vertex: u32,
    /// How far its chords may leave it, mm; 0 for a straight edge.
    deviation: f64,
    /// From where to where it goes along its ring, mm.
    stretch: [f64; 2],
}

impl<'a> DrawnEdges<'a> {
    /// No edges yet, of these rings.
    pub fn new(rings: &'a [Ring]) -> Self {
        Self { rings, edges: Vec::new(), of_chord: Vec::new(), lengths: vec![0.0; rings.len()], most_deviation: 0.0 }
    }

    /// Adds the edges of one ring, whose flattened points are given.
    pub fn add(&mut self, number: usize, points: &[Point]) {
        let Some(ring) = self.rings.get(number) else { return };
        let (mut chord, mut along) = (0, 0.0);
        for (vertex, (a, bulge, b)) in ring.edges().enumerate() {
            let arc = Arc::new(a, bulge, b);
            let start = along;
            for _ in 0..arc.map_or(1, |arc| arc.chords()) {
                along += points[chord % points.len()].distance(points[(chord + 1) % points.len()]);
                chord += 1;
                self.of_chord.push(self.edges.len() as u32);
            }
            let deviation = arc.map_or(0.0, |arc| arc.deviation());
            self.most_deviation = self.most_deviation.max(deviation);
            self.edges.push(Edge { ring: number as u32, vertex: vertex as u32, deviation, stretch: [start, along] });
        }
        self.lengths[number] = along;
    }

    fn edge(&self, chord: usize) -> &Edge {
        &self.edges[self.of_chord[chord] as usize]
    }

    /// Ring and vertex from which a chord's edge starts.
    pub fn owner(&self, chord: usize) -> (usize, usize) {
        let edge = self.edge(chord);
        (edge.ring as usize, edge.vertex as usize)
    }

    /// How far around a chord those chords can lie whose edges touch its own arc; 0 for a straight edge.
    pub fn reach(&self, chord: usize) -> f64 {
        let deviation = self.edge(chord).deviation;
        // Each arc is as far from its chord as it deviates, and the two arcs are as far apart again.
        if deviation == 0.0 { 0.0 } else { 2.0 * (deviation + self.most_deviation) }
    }

    /// Where the drawn edges behind two chords touch: an arc touches what is no farther away than their chords may deviate, so that the verdict
    /// does not hang on how the chords happen to fall. Straight edges, and edges of one ring with next to nothing between them, never do.
    pub fn touch(&self, i: usize, j: usize, chords: [(Point, Point); 2]) -> Option<Point> {
        let (one, other) = (self.edge(i), self.edge(j));
        let allowed = one.deviation + other.deviation;
        if allowed == 0.0 || (one.ring == other.ring && self.between(one, other) <= NEIGHBOURS * allowed) {
            return None;
        }
        let [(a, b), (c, d)] = chords;
        let near = |from, to, p: Point| nearest_on_segment(from, to, p).distance(p) <= 2.0 * allowed;
        if !(near(a, b, c) || near(a, b, d) || near(c, d, a) || near(c, d, b)) {
            return None;
        }
        let one = self.drawn(one);
        let other = self.drawn(other);
        let pairs = one.iter().flat_map(|p| other.iter().filter_map(|q| p.nearest(q)));
        let (p, q) = pairs.min_by(|a, b| a.0.distance(a.1).total_cmp(&b.0.distance(b.1)))?;
        (p.distance(q) <= allowed).then(|| p.midpoint(q))
    }

    /// Length of the shorter stretch between two edges of one ring.
    fn between(&self, one: &Edge, other: &Edge) -> f64 {
        let (first, last) = if one.vertex <= other.vertex { (one, other) } else { (other, one) };
        let around = self.lengths[one.ring as usize] - (last.stretch[1] - first.stretch[0]);
        around.min(last.stretch[0] - first.stretch[1]).max(0.0)
    }

    /// An edge as it is drawn, an arc in parts of a quarter turn at most.
    fn drawn(&self, edge: &Edge) -> Vec<Feature> {
        let ring = &self.rings[edge.ring as usize].vertices;
        let vertex = edge.vertex as usize;
        let (start, end) = (ring[vertex], ring[(vertex + 1) % ring.len()].point);
        parts(start.point, start.bulge, end, [true; 2])
    }
}
