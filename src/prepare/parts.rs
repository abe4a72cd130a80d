//! Parts of a network between which there is no link.

/// The parts of `n` things of which some pairs are linked.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Parts {
    /// For each thing its part.
    pub of: Vec<usize>,
    /// For each part how many things it has.
    pub sizes: Vec<usize>,
}

impl Parts {
    /// Finds the parts, numbered by their first thing.
    #[must_use]
    pub fn of(n: usize, linked: impl Fn(usize, usize) -> bool) -> Parts {
        let mut of = vec![usize::MAX; n];
        let mut sizes = Vec::new();
        for first in 0..n {
            if of[first] != usize::MAX {
                continue;
            }
            let part = sizes.len();
            let mut size = 0;
            let mut waiting = vec![first];
            of[first] = part;
            while let Some(i) = waiting.pop() {
                size += 1;
                for j in 0..n {
                    if of[j] == usize::MAX && linked(i, j) {
                        of[j] = part;
                        waiting.push(j);
                    }
                }
            }
            sizes.push(size);
        }
        Parts { of, sizes }
    }

    /// How many parts have more than one thing.
    #[must_use]
    pub fn real(&self) -> usize {
        self.sizes.iter().filter(|size| **size > 1).count()
    }

    /// The largest part, the first of equals; `None` where there is nothing.
    #[must_use]
    pub fn largest(&self) -> Option<usize> {
        (0..self.sizes.len()).max_by_key(|&p| (self.sizes[p], std::cmp::Reverse(p)))
    }

    /// Things outside the largest part, in order; things alone are left out.
    pub fn outside(&self) -> impl Iterator<Item = usize> + '_ {
        let largest = self.largest();
        (0..self.of.len())
            .filter(move |&i| Some(self.of[i]) != largest && self.sizes[self.of[i]] > 1)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn parts_are_found_and_the_largest_is_known() {
        let links = [(0, 2), (1, 3), (3, 4)];
        let parts = Parts::of(6, |i, j| links.contains(&(i, j)) || links.contains(&(j, i)));
        assert_eq!(parts.of, [0, 1, 0, 1, 1, 2]);
        assert_eq!(parts.real(), 2);
        assert_eq!(parts.largest(), Some(1));
        assert_eq!(parts.outside().collect::<Vec<_>>(), [0, 2]);
    }
}
