//! From an arrangement to the first mesh: constrained Delaunay with a least angle; the only user of `spade`.

use super::{Arrangement, Edges, Mesh, MeshFault, NONE};
use crate::geometry::{BoundingBox, Point};
use spade::{AngleLimit, ConstrainedDelaunayTriangulation, Point2, RefinementParameters, Triangulation};
use std::collections::HashMap;
use std::sync::Arc;

/// Least angle asked of the first mesh, in degrees; smaller angles of the drawing stay. Bisection lowers it once, to no less than half.
const LEAST_ANGLE_DEGREES: f64 = 22.0;

/// Triangles that the drawing's bounding box would hold at the largest size allowed: enough for a smooth picture, and a round or two less.
const COARSEST: f64 = 1500.0;

/// What came out beside the mesh.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Quality {
    /// False when the vertex limit was met before all angles were good: the result is right but needs more triangles.
    pub angles_reached: bool,
}

/// Triangulates an arrangement; triangles whose cover is not `kept` (by its areas) are left out.
///
/// # Errors
/// [`MeshFault::TooLarge`] when the drawing alone has more than `max_vertices` points; [`MeshFault::Triangulation`] if the library fails.
pub fn triangulated(drawing: &Arrangement, max_vertices: usize, kept: &dyn Fn(&[u32]) -> bool) -> Result<(Mesh, Quality), MeshFault> {
    if drawing.points.len() > max_vertices {
        return Err(MeshFault::TooLarge(max_vertices));
    }
    let (points, triangles, constraints, angles_reached) = refined(drawing, max_vertices)?;
    let owner = owners(drawing, &points, &constraints)?;
    let mut edges = Edges::new(points.len(), &triangles);
    for (e, ends) in edges.ends.iter().enumerate() {
        edges.label[e] = owner.get(ends).copied().unwrap_or(NONE);
    }
    let (cells, covers) = covers(drawing, &triangles, &edges);
    let chosen: Vec<usize> = (0..triangles.len()).filter(|&t| kept(&covers[cells[t] as usize])).collect();
    Ok((
        assembled(drawing, &points, &triangles, &cells, covers, &owner, sorted_along_a_curve(&points, &triangles, chosen)),
        Quality { angles_reached },
    ))
}

type Refined = (Vec<Point>, Vec<[u32; 3]>, Vec<[u32; 2]>, bool);

fn refined(drawing: &Arrangement, max_vertices: usize) -> Result<Refined, MeshFault> {
    let mut vertices: Vec<Point2<f64>> = drawing.points.iter().map(|p| Point2::new(p.x, p.y)).collect();
    // Four free points around the drawing: rim points that lie a hair inside their hull would otherwise leave slivers which no refinement ends.
    let extent = BoundingBox::around(drawing.points.iter().copied());
    let margin = 0.25 * extent.width().min(extent.height()) + 0.01 * extent.width().max(extent.height());
    for (x, y) in [(extent.min.x - margin, extent.min.y - margin), (extent.max.x + margin, extent.max.y + margin)] {
        vertices.extend([Point2::new(x, y), Point2::new(extent.min.x + extent.max.x - x, y)]);
    }
    let count = vertices.len();
    let edges = drawing.segments.iter().map(|s| s.map(|v| v as usize)).collect();
    let mut conflicts = 0;
    let mut cdt = ConstrainedDelaunayTriangulation::<Point2<f64>>::try_bulk_load_cdt(vertices, edges, |_| conflicts += 1)
        .map_err(|e| MeshFault::Triangulation(e.to_string()))?;
    if conflicts > 0 || cdt.num_vertices() != count {
        return Err(MeshFault::Triangulation(format!("{conflicts} conflicting edges, {} of {count} points", cdt.num_vertices())));
    }
    let parameters = RefinementParameters::<f64>::new()
        .with_angle_limit(AngleLimit::from_deg(LEAST_ANGLE_DEGREES))
        .exclude_outer_faces(false)
        .with_max_allowed_area(extent.width() * extent.height() / COARSEST)
        .with_max_additional_vertices(max_vertices.saturating_sub(count).min(20 * count + 10_000));
    let outcome = cdt.refine(parameters);
    let points = cdt.vertices().map(|v| Point::new(v.position().x, v.position().y)).collect();
    let triangles = cdt.inner_faces().map(|f| f.vertices().map(|v| v.fix().index() as u32)).collect();
    let constraints =
        cdt.undirected_edges().filter(|e| e.is_constraint_edge()).map(|e| e.vertices().map(|v| v.fix().index() as u32)).collect();
    Ok((points, triangles, constraints, outcome.refinement_complete))
}

/// Which segment of the drawing each constraint edge is a part of: from one end of the segment, along the straightest constraint, to the other.
fn owners(drawing: &Arrangement, points: &[Point], constraints: &[[u32; 2]]) -> Result<HashMap<[u32; 2], u32>, MeshFault> {
    let mut start = vec![0u32; points.len() + 1];
    for &[a, b] in constraints {
        start[a as usize + 1] += 1;
        start[b as usize + 1] += 1;
    }
    for v in 0..points.len() {
        start[v + 1] += start[v];
    }
    let mut next = start.clone();
    let mut around = vec![0u32; 2 * constraints.len()];
    for &[a, b] in constraints {
        for (from, to) in [(a, b), (b, a)] {
            around[next[from as usize] as usize] = to;
            next[from as usize] += 1;
        }
    }
    let mut owner = HashMap::with_capacity(constraints.len());
    for (s, &[from, to]) in drawing.segments.iter().enumerate() {
        let mut at = from;
        let mut steps = 0;
        while at != to {
            let here = points[at as usize];
            let ahead = points[to as usize] - here;
            let best = around[start[at as usize] as usize..start[at as usize + 1] as usize]
                .iter()
                .copied()
                .map(|n| {
                    let step = points[n as usize] - here;
                    (if n == to { 2.0 } else { step.dot(ahead) / (step.norm() * ahead.norm()) }, n)
                })
                .max_by(|x, y| x.partial_cmp(y).unwrap_or(std::cmp::Ordering::Equal));
            steps += 1;
            match best {
                Some((straightness, n)) if straightness > 0.999 && steps <= constraints.len() => {
                    owner.insert([at.min(n), at.max(n)], s as u32);
                    at = n;
                }
                _ => return Err(MeshFault::Triangulation(format!("segment {s} of the drawing was lost"))),
            }
        }
    }
    Ok(owner)
}

/// Covers by walking in from outside: passing a segment enters or leaves the areas it bounds. Returns a cell per triangle and the covers of the cells.
fn covers(drawing: &Arrangement, triangles: &[[u32; 3]], edges: &Edges) -> (Vec<u32>, Vec<Vec<u32>>) {
    let mut list: Vec<Vec<u32>> = vec![Vec::new()];
    let mut known: HashMap<Vec<u32>, u32> = HashMap::from([(Vec::new(), 0)]);
    let mut passed: HashMap<(u32, u32), u32> = HashMap::new();
    let mut pass = |cell: u32, segment: u32| -> u32 {
        if segment == NONE {
            return cell;
        }
        *passed.entry((cell, segment)).or_insert_with(|| {
            let toggled = symmetric_difference(&list[cell as usize], &drawing.areas[segment as usize]);
            *known.entry(toggled.clone()).or_insert_with(|| {
                list.push(toggled);
                list.len() as u32 - 1
            })
        })
    };
    let mut cells = vec![NONE; triangles.len()];
    let mut stack: Vec<(u32, u32)> = Vec::new();
    for (e, sides) in edges.sides.iter().enumerate() {
        if sides[1] == NONE {
            stack.push((sides[0] / 3, pass(0, edges.label[e])));
        }
    }
    while let Some((t, cell)) = stack.pop() {
        if cells[t as usize] != NONE {
            continue;
        }
        cells[t as usize] = cell;
        for k in 0..3 {
            let other = edges.across(t as usize, k);
            if other != NONE && cells[other as usize / 3] == NONE {
                stack.push((other / 3, pass(cell, edges.label[edges.of_triangle[t as usize][k] as usize])));
            }
        }
    }
    (cells, list)
}

fn symmetric_difference(a: &[u32], b: &[u32]) -> Vec<u32> {
    let mut all: Vec<u32> = a.iter().filter(|x| !b.contains(x)).chain(b.iter().filter(|x| !a.contains(x))).copied().collect();
    all.sort_unstable();
    all
}

/// Triangles near each other in the plane become near in the list (Morton order of their middles), which the caches of all later stages like.
fn sorted_along_a_curve(points: &[Point], triangles: &[[u32; 3]], mut chosen: Vec<usize>) -> Vec<usize> {
    let middles: Vec<Point> =
        chosen.iter().map(|&t| triangles[t].iter().fold(Point::default(), |s, &v| s + points[v as usize]) * (1.0 / 3.0)).collect();
    let extent = BoundingBox::around(middles.iter().copied());
    let scale = 65535.0 / extent.width().max(extent.height()).max(f64::MIN_POSITIVE);
    let spread = |x: f64| (0..16).fold(0u64, |code, bit| code | (((x as u64 >> bit) & 1) << (2 * bit)));
    let mut keyed: Vec<(u64, usize)> = chosen
        .iter()
        .zip(&middles)
        .map(|(&t, m)| (spread((m.x - extent.min.x) * scale) | spread((m.y - extent.min.y) * scale) << 1, t))
        .collect();
    keyed.sort_unstable();
    chosen.clear();
    chosen.extend(keyed.into_iter().map(|(_, t)| t));
    chosen
}

/// The mesh of the chosen triangles: vertices renumbered in order of use, the longest edge of each triangle opposite its first vertex.
fn assembled(
    drawing: &Arrangement,
    points: &[Point],
    triangles: &[[u32; 3]],
    cells: &[u32],
    covers: Vec<Vec<u32>>,
    owner: &HashMap<[u32; 2], u32>,
    chosen: Vec<usize>,
) -> Mesh {
    let mut number = vec![NONE; points.len()];
    let mut old = Vec::new();
    let mut kept = Vec::with_capacity(chosen.len());
    for &t in &chosen {
        let corners = triangles[t];
        let length = |k: usize| points[corners[(k + 1) % 3] as usize].distance(points[corners[(k + 2) % 3] as usize]);
        let longest = (0..3).max_by(|&i, &j| length(i).total_cmp(&length(j))).unwrap_or(0);
        kept.push([0, 1, 2].map(|k| {
            let v = corners[(longest + k) % 3];
            if number[v as usize] == NONE {
                number[v as usize] = old.len() as u32;
                old.push(v);
            }
            number[v as usize]
        }));
    }
    let mut edges = Edges::new(old.len(), &kept);
    let mut sets: Vec<Vec<u32>> = Vec::new();
    let mut known: HashMap<&[u32], u32> = HashMap::new();
    for (e, ends) in edges.ends.iter().enumerate() {
        let [a, b] = ends.map(|v| old[v as usize]);
        let Some(&segment) = owner.get(&[a.min(b), a.max(b)]) else { continue };
        let lines = &drawing.lines[segment as usize];
        if !lines.is_empty() {
            edges.label[e] = *known.entry(lines).or_insert_with(|| {
                sets.push(lines.clone());
                sets.len() as u32 - 1
            });
        }
    }
    Mesh {
        points: old.iter().map(|&v| points[v as usize]).collect(),
        triangles: kept,
        cells: chosen.iter().map(|&t| cells[t]).collect(),
        edges,
        covers: Arc::new(covers),
        line_sets: Arc::new(sets),
    }
}

#[cfg(test)]
mod tests {
    use super::super::{arrange, bisected};
    use super::*;
    use crate::geometry::Ring;

    fn plate() -> Mesh {
        let p = Point::new;
        let body = vec![vec![p(0.0, 0.0), p(60.0, 0.0), p(60.0, 20.0), p(0.0, 20.0)], Ring::circle(p(40.0, 10.0), 8.0).flattened()];
        let spot = vec![Ring::circle(p(0.0, 10.0), 4.0).flattened()];
        let line = [p(50.0, 0.0), p(50.0, 20.0)];
        let drawing = arrange(&[&body, &spot], &[&line]).unwrap();
        let (mesh, quality) = triangulated(&drawing, 100_000, &|cover| cover.contains(&0)).unwrap();
        assert!(quality.angles_reached);
        mesh
    }

    fn area(mesh: &Mesh, wanted: &[u32]) -> f64 {
        (0..mesh.triangles.len()).filter(|&t| mesh.cover(t) == wanted).map(|t| mesh.area(t)).sum()
    }

    #[test]
    fn covers_and_lines_survive_triangulation_and_bisection() {
        let mut mesh = plate();
        let pi = std::f64::consts::PI;
        for round in 0..5 {
            mesh.check().unwrap();
            assert!((area(&mesh, &[0, 1]) - 2.0 * pi).abs() < 1e-6, "half of the spot is on the metal");
            assert!((area(&mesh, &[0]) - (1200.0 - 16.0 * pi - 2.0 * pi)).abs() < 1e-6);
            let length: f64 = (0..mesh.edges.ends.len())
                .filter(|&e| mesh.edges.label[e] != NONE)
                .map(|e| mesh.points[mesh.edges.ends[e][0] as usize].distance(mesh.points[mesh.edges.ends[e][1] as usize]))
                .sum();
            assert!((length - 20.0).abs() < 1e-9);
            let marked: Vec<bool> = (0..mesh.triangles.len()).map(|t| (t * 7 + round) % 5 == 0).collect();
            let before = mesh.triangles.len();
            mesh = bisected(&mesh, &marked).0;
            assert!(mesh.triangles.len() > before);
        }
    }

    #[test]
    fn angles_stay_above_half_the_first_after_many_local_bisections() {
        let mut mesh = plate();
        let least = |mesh: &Mesh| {
            (0..mesh.triangles.len())
                .flat_map(|t| {
                    let c = mesh.corners(t);
                    (0..3).map(move |k| {
                        let (u, v) = (c[(k + 1) % 3] - c[k], c[(k + 2) % 3] - c[k]);
                        u.cross(v).atan2(u.dot(v)).to_degrees()
                    })
                })
                .fold(180.0, f64::min)
        };
        let first = least(&mesh);
        for _ in 0..12 {
            let marked: Vec<bool> = (0..mesh.triangles.len()).map(|t| mesh.corners(t).iter().any(|p| p.norm() < 1e-9)).collect();
            mesh = bisected(&mesh, &marked).0;
        }
        assert!(first >= LEAST_ANGLE_DEGREES - 0.1 && least(&mesh) >= 0.5 * first, "{first} {}", least(&mesh));
    }
}
