//! Connectivity without coordinates: edges, which triangles meet in them, and their line labels.

/// Stands for "no neighbour" and "no label".
pub const NONE: u32 = u32::MAX;

/// The edges of a triangulation.
#[derive(Debug, Clone, Default)]
pub struct Edges {
    /// Per triangle: its three edges, the k-th opposite the k-th vertex.
    pub of_triangle: Vec<[u32; 3]>,
    /// Per edge: its two vertices, the smaller first.
    pub ends: Vec<[u32; 2]>,
    /// Per edge: `3 * triangle + k` of the one or two triangles in which it is the k-th edge; `NONE` where there is no second.
    pub sides: Vec<[u32; 2]>,
    /// Per edge: index into the mesh's line sets, or `NONE`.
    pub label: Vec<u32>,
}

impl Edges {
    /// The edges of these triangles, in the order in which the triangles name them. All labels are `NONE`.
    pub fn new(vertices: usize, triangles: &[[u32; 3]]) -> Self {
        // Half-edges sorted into buckets by their smaller vertex; a bucket holds about six.
        let mut start = vec![0u32; vertices + 1];
        for t in triangles {
            for k in 0..3 {
                start[t[(k + 1) % 3].min(t[(k + 2) % 3]) as usize + 1] += 1;
            }
        }
        for v in 0..vertices {
            start[v + 1] += start[v];
        }
        let mut next = start.clone();
        let mut bucket = vec![(NONE, NONE); 3 * triangles.len()];
        let mut edges = Self {
            of_triangle: vec![[NONE; 3]; triangles.len()],
            ends: Vec::with_capacity(triangles.len() * 3 / 2 + 16),
            sides: Vec::with_capacity(triangles.len() * 3 / 2 + 16),
            label: Vec::new(),
        };
        for (t, corners) in triangles.iter().enumerate() {
            for k in 0..3 {
                let (a, b) = (corners[(k + 1) % 3], corners[(k + 2) % 3]);
                let (low, high) = (a.min(b), a.max(b));
                let side = (3 * t + k) as u32;
                let known = (start[low as usize]..next[low as usize]).find(|&i| bucket[i as usize].0 == high);
                let edge = match known {
                    Some(i) => {
                        let edge = bucket[i as usize].1;
                        edges.sides[edge as usize][1] = side;
                        edge
                    }
                    None => {
                        let edge = edges.ends.len() as u32;
                        bucket[next[low as usize] as usize] = (high, edge);
                        next[low as usize] += 1;
                        edges.ends.push([low, high]);
                        edges.sides.push([side, NONE]);
                        edge
                    }
                };
                edges.of_triangle[t][k] = edge;
            }
        }
        edges.label = vec![NONE; edges.ends.len()];
        edges
    }

    /// The edge between two vertices, looked up around one triangle's rim; `None` when it is not one of its three.
    pub fn between(&self, triangle: usize, a: u32, b: u32) -> Option<u32> {
        let wanted = [a.min(b), a.max(b)];
        self.of_triangle[triangle].into_iter().find(|&e| self.ends[e as usize] == wanted)
    }

    /// The triangle across the k-th edge of a triangle, as `3 * triangle + k`, or `NONE`.
    pub fn across(&self, triangle: usize, k: usize) -> u32 {
        let [first, second] = self.sides[self.of_triangle[triangle][k] as usize];
        if first == (3 * triangle + k) as u32 { second } else { first }
    }

    /// Part of the mesh's self-check.
    pub(super) fn check(&self, triangles: &[[u32; 3]]) -> Result<(), String> {
        for (t, corners) in triangles.iter().enumerate() {
            for k in 0..3 {
                let (a, b) = (corners[(k + 1) % 3], corners[(k + 2) % 3]);
                let edge = self.of_triangle[t][k] as usize;
                if self.ends[edge] != [a.min(b), a.max(b)] {
                    return Err(format!("edge {edge} is not opposite vertex {k} of triangle {t}"));
                }
                let other = self.across(t, k);
                if other != NONE {
                    let (u, j) = (other as usize / 3, other as usize % 3);
                    // Neighbours run along a shared edge in opposite directions, else three triangles meet or two overlap.
                    if triangles[u][(j + 1) % 3] != b || triangles[u][(j + 2) % 3] != a {
                        return Err(format!("triangles {t} and {u} do not lie on two sides of edge {edge}"));
                    }
                }
            }
        }
        Ok(())
    }
}
