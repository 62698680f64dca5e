//! Numbers that are joined into sets step by step.

/// Sets of the numbers below a count; each is known by one of its numbers, its root.
#[derive(Debug)]
pub struct Sets {
    parent: Vec<usize>,
}

impl Sets {
    /// Every number is a set of its own.
    pub fn new(count: usize) -> Self {
        Self { parent: (0..count).collect() }
    }

    /// The root of a number's set.
    pub fn root(&mut self, mut i: usize) -> usize {
        while self.parent[i] != i {
            self.parent[i] = self.parent[self.parent[i]];
            i = self.parent[i];
        }
        i
    }

    /// Joins two sets under the smaller of their roots, so that roots do not depend on the order of joining.
    pub fn join(&mut self, a: usize, b: usize) {
        let (a, b) = (self.root(a), self.root(b));
        self.join_under(a.min(b), a.max(b));
    }

    /// Joins the set of one root to that of another, which stays the root.
    pub fn join_under(&mut self, root: usize, other: usize) {
        self.parent[other] = root;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn roots_do_not_depend_on_the_order_of_joining() {
        let pairs = [(4, 3), (1, 2), (3, 2), (6, 5)];
        let roots = |pairs: &mut dyn Iterator<Item = &(usize, usize)>| {
            let mut sets = Sets::new(7);
            pairs.for_each(|&(a, b)| sets.join(a, b));
            (0..7).map(|i| sets.root(i)).collect::<Vec<_>>()
        };
        assert_eq!(roots(&mut pairs.iter()), [0, 1, 1, 1, 1, 5, 5]);
        assert_eq!(roots(&mut pairs.iter().rev()), [0, 1, 1, 1, 1, 5, 5]);
    }
}
