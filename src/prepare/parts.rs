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
    /// Finds the parts, numbered by their first thing; `links` names each linked pair at least once.
    #[must_use]
    pub fn of(n: usize, links: impl Iterator<Item = (usize, usize)>) -> Parts {
        // Every thing points towards the first of its part (Galler & Fischer 1964).
        let mut towards: Vec<usize> = (0..n).collect();
        for (i, j) in links {
            let (i, j) = (first(&mut towards, i), first(&mut towards, j));
            towards[i.max(j)] = i.min(j);
        }
        let mut of = vec![0; n];
        let mut sizes = Vec::new();
        for at in 0..n {
            let start = first(&mut towards, at);
            if start == at {
                of[at] = sizes.len();
                sizes.push(0);
            }
            of[at] = of[start];
            sizes[of[at]] += 1;
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

/// The first thing of a part; the way there is shortened.
fn first(towards: &mut [usize], mut at: usize) -> usize {
    while towards[at] != at {
        towards[at] = towards[towards[at]];
        at = towards[at];
    }
    at
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn parts_are_found_and_the_largest_is_known() {
        let links = [(0, 2), (1, 3), (3, 4)];
        let parts = Parts::of(6, links.into_iter());
        assert_eq!(parts.of, [0, 1, 0, 1, 1, 2]);
        assert_eq!(parts.real(), 2);
        assert_eq!(parts.largest(), Some(1));
        assert_eq!(parts.outside().collect::<Vec<_>>(), [0, 2]);
    }
}
