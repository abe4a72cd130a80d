//! Linear transport, solved exactly by the network simplex method for the transportation problem
//! (Dantzig 1951; supplies perturbed as by Orden 1956, so that no pivot is degenerate and the method
//! cannot cycle).
//!
//! A basis is a spanning tree of the bipartite graph of sources and sinks. It is kept between
//! solutions: where costs change little, as from step to step of a conditional gradient, few pivots
//! lead from one optimum to the next.

use ndarray::Array2;

use super::masses::Masses;
use crate::linalg::least_difference;

/// No node.
const NONE: u32 = u32::MAX;
/// Bits below a whole unit of mass, for the perturbation.
const PERTURBATION_BITS: u32 = 20;
/// Rows of costs searched for the arc that enters, at least.
const SEARCHED_ROWS: usize = 8;
/// Reduced costs above minus this share of the largest cost count as zero.
const TOLERANCE: f64 = 1e-12;

/// Mass that goes from a source to a sink.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Flow {
    /// The source.
    pub source: usize,
    /// The sink.
    pub sink: usize,
    /// How much, as a share of the whole mass.
    pub mass: f64,
}

/// A transportation problem with fixed masses, and the basis reached last.
#[derive(Debug, Clone)]
pub struct Transportation {
    masses: Masses,
    sources: usize,
    /// For each node (sources, then sinks) the one above it in the tree.
    parent: Vec<u32>,
    /// Perturbed units on the arc between a node and the one above it.
    flow: Vec<i64>,
    depth: Vec<u32>,
    /// The nodes below a node, as a doubly linked list.
    first_child: Vec<u32>,
    next: Vec<u32>,
    previous: Vec<u32>,
    /// Dual values: on an arc of the tree those of source and sink sum to its cost.
    source_potential: Vec<f64>,
    sink_potential: Vec<f64>,
    /// Row at which the search for an entering arc goes on.
    row: usize,
    started: bool,
}

impl Transportation {
    /// A problem without a basis yet.
    ///
    /// # Panics
    /// If there are 2^20 sources or more.
    #[must_use]
    pub fn new(masses: Masses) -> Transportation {
        let (sources, sinks) = (masses.sources().len(), masses.sinks().len());
        assert!(
            sources < 1 << PERTURBATION_BITS,
            "the perturbation of all sources stays below one unit"
        );
        let nodes = sources + sinks;
        Transportation {
            masses,
            sources,
            parent: vec![NONE; nodes],
            flow: vec![0; nodes],
            depth: vec![0; nodes],
            first_child: vec![NONE; nodes],
            next: vec![NONE; nodes],
            previous: vec![NONE; nodes],
            source_potential: vec![0.0; sources],
            sink_potential: vec![0.0; sinks],
            row: 0,
            started: false,
        }
    }

    /// The masses.
    #[must_use]
    pub fn masses(&self) -> &Masses {
        &self.masses
    }

    /// An optimal plan for `costs` `(sources, sinks)`: at most sources + sinks − 1 flows, by source,
    /// then sink. Starts from the basis of the last solution, if there is one.
    ///
    /// # Panics
    /// If the costs have another shape, or are not finite.
    pub fn solve(&mut self, costs: &Array2<f64>) -> Vec<Flow> {
        assert_eq!(
            costs.dim(),
            (self.sources, self.masses.sinks().len()),
            "one cost for each arc"
        );
        let largest = costs.iter().fold(0.0, |m: f64, c| m.max(c.abs()));
        assert!(largest.is_finite(), "costs are finite");
        if !self.started {
            self.start(costs);
            self.started = true;
        }
        self.price_from_the_root(costs);
        let tolerance = TOLERANCE * largest;
        while let Some((source, sink, reduced)) = self.entering(costs, tolerance) {
            self.pivot(source, sink, reduced);
        }
        self.flows()
    }

    /// A first basis: the cheapest arc takes what it can, then the next one, and so on. Each arc
    /// exhausts exactly one of its ends, which hangs below the other from then on.
    fn start(&mut self, costs: &Array2<f64>) {
        let sinks = self.masses.sinks().len();
        let shift = |units: &i64| units << PERTURBATION_BITS;
        let mut left: Vec<i64> = self.masses.sources().iter().map(|m| shift(m) + 1).collect();
        left.extend(self.masses.sinks().iter().map(shift));
        let last = left.len() - 1;
        left[last] += self.sources as i64;
        let costs = costs.as_standard_layout();
        let costs = costs.as_slice().expect("standard layout");
        let mut arcs: Vec<u32> = (0..costs.len() as u32).collect();
        arcs.sort_unstable_by(|&x, &y| {
            costs[x as usize]
                .total_cmp(&costs[y as usize])
                .then(x.cmp(&y))
        });
        let mut alive = left.len();
        for arc in arcs {
            let (source, sink) = (arc as usize / sinks, self.sources + arc as usize % sinks);
            if left[source] == 0 || left[sink] == 0 {
                continue;
            }
            let moved = left[source].min(left[sink]);
            left[source] -= moved;
            left[sink] -= moved;
            let (done, other) = if left[source] == 0 {
                (source, sink)
            } else {
                (sink, source)
            };
            self.flow[done] = moved;
            self.attach(done as u32, other as u32);
            alive -= 1;
            if alive == 1 {
                break;
            }
        }
    }

    /// Depths and potentials of all nodes, from the root down.
    fn price_from_the_root(&mut self, costs: &Array2<f64>) {
        let root = (0..self.parent.len())
            .find(|&node| self.parent[node] == NONE)
            .expect("a tree has a root");
        self.depth[root] = 0;
        if root < self.sources {
            self.source_potential[root] = 0.0;
        } else {
            self.sink_potential[root - self.sources] = 0.0;
        }
        let mut waiting = vec![root as u32];
        while let Some(node) = waiting.pop() {
            let node = node as usize;
            let mut child = self.first_child[node];
            while child != NONE {
                let at = child as usize;
                self.depth[at] = self.depth[node] + 1;
                if at < self.sources {
                    let sink = node - self.sources;
                    self.source_potential[at] = costs[(at, sink)] - self.sink_potential[sink];
                } else {
                    let sink = at - self.sources;
                    self.sink_potential[sink] = costs[(node, sink)] - self.source_potential[node];
                }
                waiting.push(child);
                child = self.next[at];
            }
        }
    }

    /// The arc of most negative reduced cost among the next rows that have any; `None` where no row
    /// has, which is optimality.
    fn entering(&mut self, costs: &Array2<f64>, tolerance: f64) -> Option<(usize, usize, f64)> {
        let mut best: Option<(usize, usize, f64)> = None;
        for searched in 1..=self.sources {
            let row = self.row;
            self.row = (row + 1) % self.sources;
            let cost = costs.row(row);
            let cost = cost.as_slice().expect("costs are stored row by row");
            let (value, sink) = least_difference(cost, &self.sink_potential);
            let reduced = value - self.source_potential[row];
            if reduced < best.map_or(-tolerance, |(_, _, least)| least) {
                best = Some((row, sink, reduced));
            }
            if searched % SEARCHED_ROWS == 0 && best.is_some() {
                break;
            }
        }
        best
    }

    /// Brings an arc into the basis.
    fn pivot(&mut self, source: usize, sink: usize, reduced: f64) {
        let ends = [source as u32, (self.sources + sink) as u32];
        // On either path to the common ancestor the flow falls on the first arc, rises on the next,
        // and so on: masses are kept.
        let falls = |node: usize, side: usize| (node < self.sources) == (side == 0);
        let mut at = ends;
        let (mut least, mut leaves, mut leaves_on) = (i64::MAX, NONE, 0);
        while at[0] != at[1] {
            let side = usize::from(self.depth[at[0] as usize] < self.depth[at[1] as usize]);
            let node = at[side] as usize;
            if falls(node, side) && self.flow[node] < least {
                (least, leaves, leaves_on) = (self.flow[node], at[side], side);
            }
            at[side] = self.parent[node];
        }
        let ancestor = at[0];
        for side in 0..2 {
            let mut node = ends[side];
            while node != ancestor {
                let change = if (node as usize) < self.sources && side == 0
                    || (node as usize) >= self.sources && side == 1
                {
                    -least
                } else {
                    least
                };
                self.flow[node as usize] += change;
                node = self.parent[node as usize];
            }
        }
        // The part of the tree below the leaving arc is hung from the entering arc.
        let (mut node, mut above) = (ends[leaves_on], ends[1 - leaves_on]);
        let mut carried = least;
        loop {
            let old_parent = self.parent[node as usize];
            let old_flow = self.flow[node as usize];
            self.detach(node);
            self.flow[node as usize] = carried;
            self.attach(node, above);
            if node == leaves {
                break;
            }
            (above, node, carried) = (node, old_parent, old_flow);
        }
        let shift = if leaves_on == 0 { reduced } else { -reduced };
        self.shift_below(ends[leaves_on], shift);
    }

    /// Sets depths and moves potentials below and at a node: those of sources up, of sinks down.
    fn shift_below(&mut self, top: u32, shift: f64) {
        let mut node = top;
        self.depth[top as usize] = self.depth[self.parent[top as usize] as usize] + 1;
        loop {
            let at = node as usize;
            if at < self.sources {
                self.source_potential[at] += shift;
            } else {
                self.sink_potential[at - self.sources] -= shift;
            }
            // Depth first: down, else across, else up to where there is an across.
            if self.first_child[at] != NONE {
                node = self.first_child[at];
            } else {
                while node != top && self.next[node as usize] == NONE {
                    node = self.parent[node as usize];
                }
                if node == top {
                    return;
                }
                node = self.next[node as usize];
            }
            self.depth[node as usize] = self.depth[self.parent[node as usize] as usize] + 1;
        }
    }

    fn attach(&mut self, node: u32, parent: u32) {
        let first = self.first_child[parent as usize];
        self.parent[node as usize] = parent;
        self.next[node as usize] = first;
        self.previous[node as usize] = NONE;
        if first != NONE {
            self.previous[first as usize] = node;
        }
        self.first_child[parent as usize] = node;
    }

    fn detach(&mut self, node: u32) {
        let (before, after) = (self.previous[node as usize], self.next[node as usize]);
        if before == NONE {
            self.first_child[self.parent[node as usize] as usize] = after;
        } else {
            self.next[before as usize] = after;
        }
        if after != NONE {
            self.previous[after as usize] = before;
        }
    }

    /// The flows of the basis without the perturbation. Whole units are exact: the perturbations of
    /// all masses together stay below half a unit.
    fn flows(&self) -> Vec<Flow> {
        let half = 1 << (PERTURBATION_BITS - 1);
        let mut flows: Vec<Flow> = (0..self.parent.len())
            .filter(|&node| self.parent[node] != NONE)
            .filter_map(|node| {
                let units = (self.flow[node] + half) >> PERTURBATION_BITS;
                let parent = self.parent[node] as usize;
                let (source, sink) = if node < self.sources {
                    (node, parent)
                } else {
                    (parent, node)
                };
                (units > 0).then(|| Flow {
                    source,
                    sink: sink - self.sources,
                    mass: self.masses.share(units),
                })
            })
            .collect();
        flows.sort_unstable_by_key(|flow| (flow.source, flow.sink));
        flows
    }
}
