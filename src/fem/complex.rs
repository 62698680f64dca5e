//! Leaves glued along edges: which corners share an unknown, which edge sides pass current to each other, and the fans around vertices.
//!
//! Two leaves on either side of a mesh edge are glued there when they have a layer in common; where a bond ends, three or more leaves meet in
//! one *link*. Corners joined through links are one unknown, so that two fans which touch only in a point have two (no current passes a point).
//! A link is open where a held leaf or a held line borders it: current may leave there into the pole, and all its corners carry the pole's unknown.

use crate::geometry::Point;
use crate::mesh::{Mesh, NONE};

/// What a cell of the mesh consists of.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct CellPlan {
    /// Its leaves; no two have a layer in common.
    pub leaves: Vec<LeafPlan>,
    /// How they exchange current over the cell's area.
    pub exchanges: Vec<ExchangePlan>,
}

/// One conducting copy of a triangle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LeafPlan {
    /// The layers it stands for, one bit each; more than one where they are bonded.
    pub layers: u64,
    /// Conductance in S.
    pub conductance: f64,
    /// Set where the leaf is part of a pole: it carries no flux of its own.
    pub held: Option<Hold>,
}

/// Part of a pole.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Hold {
    /// Which pole.
    pub pole: u32,
    /// The caller's mark for what leaves into it.
    pub mark: u32,
}

/// One end of an exchange.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum End {
    /// A leaf: its place in the cell's list, or (in a [`Complex`]) the element's number.
    Leaf(u32),
    /// A pole.
    Pole(u32),
}

/// An exchange over an area, from one end to the other.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ExchangePlan {
    /// Current counts + from the first into the second.
    pub ends: [End; 2],
    /// S/mm².
    pub per_area: f64,
    /// The caller's mark.
    pub mark: u32,
}

/// What a line joins the layers to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Touch {
    /// To a pole, without a drop.
    Held(u32),
    /// To a pole, by S/mm.
    Pole(u32, f64),
    /// To another layer (as a bit), by S/mm.
    Layer(u64, f64),
}

/// What a line label of the mesh does.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LinePlan {
    /// The layers it touches, one bit each.
    pub layers: u64,
    /// What is on the other side.
    pub touch: Touch,
    /// The caller's mark.
    pub mark: u32,
}

/// One leaf of one triangle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Element {
    /// The triangle.
    pub triangle: u32,
    /// Its plan.
    pub leaf: LeafPlan,
}

/// An exchange over one triangle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AreaExchange {
    /// The triangle.
    pub triangle: u32,
    /// Element numbers or poles; current counts + from the first into the second.
    pub ends: [End; 2],
    /// S/mm².
    pub per_area: f64,
    /// The caller's mark.
    pub mark: u32,
}

/// The far end of an exchange along an edge.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum FarEnd {
    /// A pole.
    Pole(u32),
    /// Another element on the same edge of the mesh, and which of its edges that is.
    Leaf(u32, u8),
}

/// An exchange along one edge; current counts + from the element into the far end.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct EdgeExchange {
    /// An element on that edge.
    pub element: u32,
    /// Which of its edges.
    pub edge: u8,
    /// The other side.
    pub far: FarEnd,
    /// S/mm.
    pub per_length: f64,
    /// The caller's mark.
    pub mark: u32,
}

/// What a link lets through.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Link {
    /// What leaves one member enters the others (with one member: nothing passes), but for the edge exchanges on it.
    Closed,
    /// Current may leave into a pole.
    Open(Hold),
}

/// Why the leaves could not be put together.
#[derive(Debug, Clone, PartialEq)]
pub enum ComplexFault {
    /// Two poles hold one place.
    PolesMeet {
        /// The two poles.
        poles: [u32; 2],
        /// Where.
        at: Point,
    },
    /// Metal that is tied to no pole.
    NoPole {
        /// Layers of the metal, one bit each.
        layers: u64,
        /// A point on it.
        at: Point,
    },
}

/// All leaves of a mesh, glued.
#[derive(Debug, Clone)]
pub struct Complex {
    /// Number of poles; their unknowns are the first ones.
    pub poles: usize,
    /// The leaves, triangle by triangle.
    pub elements: Vec<Element>,
    /// Per triangle: its first element; one more entry than triangles.
    pub first: Vec<u32>,
    /// Per element: the unknowns of its three corners.
    pub unknowns: Vec<[u32; 3]>,
    /// Where each unknown lies.
    pub positions: Vec<[f64; 2]>,
    /// Per element: the links of its three edges.
    pub link_of: Vec<[u32; 3]>,
    /// The links.
    pub links: Vec<Link>,
    /// Fans: corners (3 * element + corner) around one vertex that pass current to each other through closed links.
    pub fans: Vec<u32>,
    /// Per fan: its first entry in `fans`; one more entry than fans.
    pub fan_starts: Vec<u32>,
    /// Per corner: its fan; `NONE` for held leaves.
    pub fan_of: Vec<u32>,
    /// Exchanges over areas.
    pub area_exchanges: Vec<AreaExchange>,
    /// Exchanges along edges.
    pub edge_exchanges: Vec<EdgeExchange>,
    /// Per element: its first entry in `exchanges_of`; one more than elements.
    pub exchange_starts: Vec<u32>,
    /// Area exchanges in which an element takes part.
    pub exchanges_of: Vec<u32>,
    /// Per unknown: the connected piece it belongs to.
    pub piece_of: Vec<u32>,
    /// Number of pieces.
    pub pieces: usize,
}

fn root(parent: &mut [u32], mut i: u32) -> u32 {
    while parent[i as usize] != i {
        let up = parent[parent[i as usize] as usize];
        parent[i as usize] = up;
        i = up;
    }
    i
}

/// The smaller number stays the root, so that numbering does not depend on the order of joining.
fn join(parent: &mut [u32], a: u32, b: u32) {
    let (a, b) = (root(parent, a), root(parent, b));
    parent[a.max(b) as usize] = a.min(b);
}

impl Complex {
    /// Glues the leaves that the plans of the mesh's cells ask for. `lines` is indexed by the mesh's line labels' entries.
    ///
    /// # Errors
    /// When two poles hold one place, or some metal is tied to no pole.
    pub fn new(mesh: &Mesh, plans: &[CellPlan], lines: &[LinePlan], poles: usize) -> Result<Self, ComplexFault> {
        let mut first = Vec::with_capacity(mesh.triangles.len() + 1);
        first.push(0u32);
        let mut elements = Vec::with_capacity(mesh.triangles.len());
        let mut area_exchanges = Vec::new();
        for (t, &cell) in mesh.cells.iter().enumerate() {
            let plan = &plans[cell as usize];
            let base = elements.len() as u32;
            elements.extend(plan.leaves.iter().map(|&leaf| Element { triangle: t as u32, leaf }));
            first.push(elements.len() as u32);
            area_exchanges.extend(plan.exchanges.iter().map(|x| AreaExchange {
                triangle: t as u32,
                ends: x.ends.map(|end| match end {
                    End::Leaf(i) => End::Leaf(base + i),
                    pole => pole,
                }),
                per_area: x.per_area,
                mark: x.mark,
            }));
        }
        let mut complex = Self {
            poles,
            unknowns: vec![[NONE; 3]; elements.len()],
            link_of: vec![[NONE; 3]; elements.len()],
            links: Vec::with_capacity(elements.len() * 3 / 2),
            positions: Vec::new(),
            fans: Vec::new(),
            fan_starts: vec![0],
            fan_of: vec![NONE; 3 * elements.len()],
            edge_exchanges: Vec::new(),
            exchange_starts: Vec::new(),
            exchanges_of: Vec::new(),
            piece_of: Vec::new(),
            pieces: 0,
            elements,
            first,
            area_exchanges,
        };
        complex.glue(mesh, lines)?;
        complex.list_exchanges();
        complex.find_pieces(mesh)?;
        Ok(complex)
    }

    /// The elements of a triangle.
    pub fn of_triangle(&self, triangle: usize) -> std::ops::Range<usize> {
        self.first[triangle] as usize..self.first[triangle + 1] as usize
    }

    /// The element of a triangle that stands for a layer (given as a bit).
    pub fn element_of(&self, triangle: usize, layer: u64) -> Option<usize> {
        self.of_triangle(triangle).find(|&e| self.elements[e].leaf.layers & layer != 0)
    }

    /// Number of unknowns, poles included.
    pub fn order(&self) -> usize {
        self.positions.len()
    }

    /// The area exchanges of an element.
    pub fn exchanges(&self, element: usize) -> &[u32] {
        &self.exchanges_of[self.exchange_starts[element] as usize..self.exchange_starts[element + 1] as usize]
    }

    /// The unknown at a corner of one end of an exchange.
    pub fn unknown_at(&self, end: End, corner: usize) -> usize {
        match end {
            End::Leaf(e) => self.unknowns[e as usize][corner] as usize,
            End::Pole(p) => p as usize,
        }
    }

    fn glue(&mut self, mesh: &Mesh, lines: &[LinePlan]) -> Result<(), ComplexFault> {
        let corners = 3 * self.elements.len();
        let mut fan_parent: Vec<u32> = (0..corners as u32).collect();
        let mut open: Vec<(u32, Hold)> = Vec::new();
        let mut opened: Vec<(u32, u32)> = Vec::new();
        let mut members: Vec<(u32, u8, u32)> = Vec::new();
        for (e, sides) in mesh.edges.sides.iter().enumerate() {
            members.clear();
            for &side in sides.iter().filter(|&&s| s != NONE) {
                members.extend(self.of_triangle(side as usize / 3).map(|x| (x as u32, (side % 3) as u8, 0)));
            }
            let groups = self.group(&mut members);
            let label = mesh.edges.label[e];
            let on_edge: &[u32] = if label == NONE { &[] } else { &mesh.line_sets[label as usize] };
            for group in 0..groups {
                let link = self.links.len() as u32;
                let mut kind = Link::Closed;
                let mut touch = |hold: Hold| match kind {
                    Link::Open(other) if other.pole != hold.pole => Err([other.pole, hold.pole]),
                    Link::Open(_) => Ok(()),
                    Link::Closed => {
                        kind = Link::Open(hold);
                        Ok(())
                    }
                };
                let own = || members.iter().filter(move |m| m.2 == group);
                let layers = own().fold(0, |l, m| l | self.elements[m.0 as usize].leaf.layers);
                let at = || mesh.points[mesh.edges.ends[e][0] as usize].midpoint(mesh.points[mesh.edges.ends[e][1] as usize]);
                let meet = |poles| ComplexFault::PolesMeet { poles, at: at() };
                for hold in own().filter_map(|m| self.elements[m.0 as usize].leaf.held) {
                    touch(hold).map_err(meet)?;
                }
                for line in on_edge.iter().map(|&l| &lines[l as usize]).filter(|l| l.layers & layers != 0) {
                    let free = |m: &&(u32, u8, u32)| self.elements[m.0 as usize].leaf.held.is_none();
                    let (far, per_length) = match line.touch {
                        Touch::Held(pole) => {
                            touch(Hold { pole, mark: line.mark }).map_err(meet)?;
                            continue;
                        }
                        Touch::Pole(pole, per_length) => (Some(FarEnd::Pole(pole)), per_length),
                        Touch::Layer(other, per_length) => {
                            let mut others =
                                members.iter().filter(|m| m.2 != group && self.elements[m.0 as usize].leaf.layers & other != 0);
                            (others.find(free).map(|m| FarEnd::Leaf(m.0, m.1)), per_length)
                        }
                    };
                    if let (Some(&(element, edge, _)), Some(far)) = (own().find(free), far) {
                        self.edge_exchanges.push(EdgeExchange { element, edge, far, per_length, mark: line.mark });
                    }
                }
                let mut previous: Option<[u32; 2]> = None;
                for &(x, k, _) in own() {
                    self.link_of[x as usize][k as usize] = link;
                    let ends = self.ends_by_vertex(mesh, x, k);
                    if let Link::Open(hold) = kind {
                        open.push((ends[0], hold));
                        open.push((ends[1], hold));
                    }
                    if let Some(before) = previous {
                        for i in 0..2 {
                            match kind {
                                Link::Closed => join(&mut fan_parent, before[i], ends[i]),
                                Link::Open(_) => opened.push((before[i], ends[i])),
                            }
                        }
                    }
                    previous = Some(ends);
                }
                self.links.push(kind);
            }
        }
        self.collect_fans(&mut fan_parent);
        let mut parent = fan_parent;
        for (a, b) in opened {
            join(&mut parent, a, b);
        }
        for (x, element) in self.elements.iter().enumerate() {
            if let Some(hold) = element.leaf.held {
                open.extend((0..3).map(|k| ((3 * x + k) as u32, hold)));
            }
        }
        self.number(mesh, &mut parent, &open)
    }

    /// Sorts the leaves on the two sides of an edge into groups that have layers in common, directly or through others.
    fn group(&self, members: &mut [(u32, u8, u32)]) -> u32 {
        let layers = |m: &(u32, u8, u32)| self.elements[m.0 as usize].leaf.layers;
        if let [a, b] = members
            && layers(a) & layers(b) != 0
        {
            return 1;
        }
        for i in 0..members.len() {
            members[i].2 = i as u32;
        }
        // A handful of leaves: joining until nothing changes is enough.
        let mut changed = true;
        while changed {
            changed = false;
            for i in 0..members.len() {
                for j in 0..i {
                    if layers(&members[i]) & layers(&members[j]) != 0 && members[i].2 != members[j].2 {
                        let low = members[i].2.min(members[j].2);
                        (members[i].2, members[j].2) = (low, low);
                        changed = true;
                    }
                }
            }
        }
        let mut names: Vec<u32> = members.iter().map(|m| m.2).collect();
        names.sort_unstable();
        names.dedup();
        for m in members.iter_mut() {
            m.2 = names.partition_point(|&n| n < m.2) as u32;
        }
        names.len() as u32
    }

    /// The unknowns on both sides of an exchange along an edge, the element's first, at the smaller vertex and at the other one.
    pub fn across_edge(&self, mesh: &Mesh, x: &EdgeExchange) -> [[usize; 2]; 2] {
        let unknown = |corner: u32| self.unknowns[corner as usize / 3][corner as usize % 3] as usize;
        let near = self.ends_by_vertex(mesh, x.element, x.edge).map(unknown);
        let far = match x.far {
            FarEnd::Pole(pole) => [pole as usize; 2],
            FarEnd::Leaf(element, edge) => self.ends_by_vertex(mesh, element, edge).map(unknown),
        };
        [0, 1].map(|i| [near[i], far[i]])
    }

    /// Length of the edge of an exchange, mm.
    pub fn edge_length(&self, mesh: &Mesh, x: &EdgeExchange) -> f64 {
        let corners = mesh.corners(self.elements[x.element as usize].triangle as usize);
        corners[(x.edge as usize + 1) % 3].distance(corners[(x.edge as usize + 2) % 3])
    }

    /// The two corners of an element at the ends of one of its edges, the smaller vertex first.
    fn ends_by_vertex(&self, mesh: &Mesh, element: u32, edge: u8) -> [u32; 2] {
        let corners = mesh.triangles[self.elements[element as usize].triangle as usize];
        let (i, j) = ((edge as usize + 1) % 3, (edge as usize + 2) % 3);
        let (i, j) = if corners[i] < corners[j] { (i, j) } else { (j, i) };
        [3 * element + i as u32, 3 * element + j as u32]
    }

    fn collect_fans(&mut self, parent: &mut [u32]) {
        let mut count = 0;
        let mut number = vec![NONE; parent.len()];
        for c in 0..parent.len() {
            if self.elements[c / 3].leaf.held.is_none() {
                let r = root(parent, c as u32) as usize;
                if number[r] == NONE {
                    number[r] = count;
                    count += 1;
                }
                self.fan_of[c] = number[r];
            }
        }
        let mut starts = vec![0u32; count as usize + 1];
        for &f in self.fan_of.iter().filter(|&&f| f != NONE) {
            starts[f as usize + 1] += 1;
        }
        for f in 0..count as usize {
            starts[f + 1] += starts[f];
        }
        let mut next = starts.clone();
        self.fans = vec![0; starts[count as usize] as usize];
        for (c, &f) in self.fan_of.iter().enumerate().filter(|(_, f)| **f != NONE) {
            self.fans[next[f as usize] as usize] = c as u32;
            next[f as usize] += 1;
        }
        self.fan_starts = starts;
    }

    fn number(&mut self, mesh: &Mesh, parent: &mut [u32], open: &[(u32, Hold)]) -> Result<(), ComplexFault> {
        let at = |c: usize| mesh.points[mesh.triangles[self.elements[c / 3].triangle as usize][c % 3] as usize];
        let mut number = vec![NONE; parent.len()];
        for &(c, hold) in open {
            let r = root(parent, c) as usize;
            if number[r] != NONE && number[r] != hold.pole {
                return Err(ComplexFault::PolesMeet { poles: [number[r], hold.pole], at: at(c as usize) });
            }
            number[r] = hold.pole;
        }
        self.positions = vec![[0.0; 2]; self.poles];
        for c in 0..parent.len() {
            let r = root(parent, c as u32) as usize;
            if number[r] == NONE {
                number[r] = self.positions.len() as u32;
                let p = mesh.points[mesh.triangles[self.elements[c / 3].triangle as usize][c % 3] as usize];
                self.positions.push([p.x, p.y]);
            }
            self.unknowns[c / 3][c % 3] = number[r];
        }
        self.place_poles(mesh);
        Ok(())
    }

    /// A pole lies in the middle of the triangles it is tied to (for the order of elimination only).
    fn place_poles(&mut self, mesh: &Mesh) {
        let mut sums = vec![[0.0, 0.0, 0.0]; self.poles];
        let mut add = |pole: usize, p: Point| {
            sums[pole][0] += p.x;
            sums[pole][1] += p.y;
            sums[pole][2] += 1.0;
        };
        for (x, unknowns) in self.unknowns.iter().enumerate() {
            for k in (0..3).filter(|&k| (unknowns[k] as usize) < self.poles) {
                add(unknowns[k] as usize, mesh.points[mesh.triangles[self.elements[x].triangle as usize][k] as usize]);
            }
        }
        for x in &self.area_exchanges {
            for end in x.ends {
                if let End::Pole(p) = end {
                    add(p as usize, mesh.corners(x.triangle as usize)[0]);
                }
            }
        }
        for (x, pole) in self.edge_exchanges.iter().filter_map(|x| if let FarEnd::Pole(pole) = x.far { Some((x, pole)) } else { None }) {
            add(pole as usize, mesh.corners(self.elements[x.element as usize].triangle as usize)[(x.edge as usize + 1) % 3]);
        }
        for (pole, [x, y, n]) in sums.into_iter().enumerate() {
            if n > 0.0 {
                self.positions[pole] = [x / n, y / n];
            }
        }
    }

    fn list_exchanges(&mut self) {
        let mut starts = vec![0u32; self.elements.len() + 1];
        let leaves = |x: &AreaExchange| {
            x.ends.into_iter().filter_map(|end| match end {
                End::Leaf(e) => Some(e as usize),
                End::Pole(_) => None,
            })
        };
        for x in &self.area_exchanges {
            for e in leaves(x) {
                starts[e + 1] += 1;
            }
        }
        for e in 0..self.elements.len() {
            starts[e + 1] += starts[e];
        }
        let mut next = starts.clone();
        self.exchanges_of = vec![0; starts[self.elements.len()] as usize];
        for (i, x) in self.area_exchanges.iter().enumerate() {
            for e in leaves(x) {
                self.exchanges_of[next[e] as usize] = i as u32;
                next[e] += 1;
            }
        }
        self.exchange_starts = starts;
    }

    fn find_pieces(&mut self, mesh: &Mesh) -> Result<(), ComplexFault> {
        let mut parent: Vec<u32> = (0..self.order() as u32).collect();
        for u in &self.unknowns {
            join(&mut parent, u[0], u[1]);
            join(&mut parent, u[0], u[2]);
        }
        for x in &self.area_exchanges {
            join(&mut parent, self.unknown_at(x.ends[0], 0) as u32, self.unknown_at(x.ends[1], 0) as u32);
        }
        for x in &self.edge_exchanges {
            let [[near, far], _] = self.across_edge(mesh, x);
            join(&mut parent, near as u32, far as u32);
        }
        let mut number = vec![NONE; self.order()];
        // The smallest unknown is the root, and poles come first: a root that is no pole has no pole in its piece.
        for i in 0..self.order() {
            let r = root(&mut parent, i as u32) as usize;
            if r >= self.poles {
                let x = self.unknowns.iter().position(|u| u.contains(&(i as u32)));
                let (layers, at) = x
                    .map_or((0, Point::default()), |x| (self.elements[x].leaf.layers, mesh.corners(self.elements[x].triangle as usize)[0]));
                return Err(ComplexFault::NoPole { layers, at });
            }
            if number[r] == NONE {
                number[r] = self.pieces as u32;
                self.pieces += 1;
            }
            self.piece_of.push(number[r]);
        }
        Ok(())
    }
}
