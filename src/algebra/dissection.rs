//! Nested dissection by coordinates: an elimination order with little fill for meshes in the plane (George 1973).

/// Below this many unknowns a part is eliminated as it comes.
const LEAF: usize = 32;
/// Unknowns with more neighbours than this (electrodes) go into the separator themselves rather than their neighbours.
const HUB: usize = 48;

/// An order in which to eliminate: the place in the order is the step, the entry the unknown.
///
/// `starts`, `neighbours`: the full adjacency; `positions`: where each unknown lies, in any unit.
pub fn elimination_order(starts: &[usize], neighbours: &[u32], positions: &[[f64; 2]]) -> Vec<u32> {
    let n = positions.len();
    let mut order: Vec<u32> = (0..n as u32).collect();
    // Which part an unknown lies in at present; a part is known by a number of its own.
    let mut part = vec![0u32; n];
    let mut parts = 1;
    let mut stack = vec![(0, n)];
    while let Some((from, to)) = stack.pop() {
        if to - from <= LEAF {
            continue;
        }
        let list = &mut order[from..to];
        let mut low = [f64::INFINITY; 2];
        let mut high = [f64::NEG_INFINITY; 2];
        for &v in list.iter() {
            for axis in 0..2 {
                low[axis] = low[axis].min(positions[v as usize][axis]);
                high[axis] = high[axis].max(positions[v as usize][axis]);
            }
        }
        let axis = usize::from(high[1] - low[1] > high[0] - low[0]);
        let half = list.len() / 2;
        // Ties are broken by number, so that the order depends on nothing else.
        list.select_nth_unstable_by(half, |&a, &b| positions[a as usize][axis].total_cmp(&positions[b as usize][axis]).then(a.cmp(&b)));
        let (left, right, wall) = (parts, parts + 1, parts + 2);
        parts += 3;
        for (i, &v) in list.iter().enumerate() {
            part[v as usize] = if i < half { left } else { right };
        }
        let across = |v: u32, part: &[u32]| {
            let other = left + right - part[v as usize];
            neighbours[starts[v as usize]..starts[v as usize + 1]].iter().any(|&w| part[w as usize] == other)
        };
        for &v in list.iter() {
            if starts[v as usize + 1] - starts[v as usize] > HUB && across(v, &part) {
                part[v as usize] = wall;
            }
        }
        for &v in list[..half].iter() {
            if part[v as usize] == left && across(v, &part) {
                part[v as usize] = wall;
            }
        }
        // Left, right, wall: the wall is eliminated last. Stable, so that neighbours in the plane stay neighbours.
        let mut sorted: Vec<u32> = Vec::with_capacity(list.len());
        let mut ends = [0; 2];
        for (k, p) in [left, right, wall].into_iter().enumerate() {
            sorted.extend(list.iter().copied().filter(|&v| part[v as usize] == p));
            if k < 2 {
                ends[k] = sorted.len();
            }
        }
        list.copy_from_slice(&sorted);
        // A part that could not be split (all in one wall, or hubs only) is left as it is.
        if ends[0] > 0 && ends[0] < to - from {
            stack.push((from, from + ends[0]));
        }
        if ends[1] > ends[0] && ends[1] - ends[0] < to - from {
            stack.push((from + ends[0], from + ends[1]));
        }
    }
    order
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn it_orders_every_unknown_once_and_the_middle_of_a_strip_last() {
        let n = 400;
        let positions: Vec<[f64; 2]> = (0..n).map(|i| [i as f64, 0.0]).collect();
        let mut starts = vec![0];
        let mut neighbours = Vec::new();
        for i in 0..n as u32 {
            neighbours.extend([i.wrapping_sub(1), i + 1].into_iter().filter(|&j| j < n as u32));
            starts.push(neighbours.len());
        }
        let order = elimination_order(&starts, &neighbours, &positions);
        let mut sorted = order.clone();
        sorted.sort_unstable();
        assert_eq!(sorted, (0..n as u32).collect::<Vec<_>>());
        assert_eq!(order[n - 1], n as u32 / 2 - 1);
    }
}
