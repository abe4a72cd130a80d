//! Fused Gromov–Wasserstein transport (Vayer, Chapel, Flamary, Tavenard & Courty 2019) by
//! conditional gradient (Frank & Wolfe 1956) with exact linear steps and exact line search.

use ndarray::{Array1, Array2, Zip};

use super::masses::Masses;
use super::simplex::{Flow, Transportation};
use super::structure::Structures;
use crate::linalg::least_difference;

/// Which marginals a plan keeps.
#[derive(Debug, Clone, PartialEq)]
pub enum Marginals {
    /// Those of both sides.
    Fixed(Masses),
    /// Those of the rows, equal masses; columns take what comes (semi-relaxed: Vincent-Cuaz,
    /// Flamary, Corneli, Vayer & Courty 2022).
    Rows,
    /// Those of the columns, equal masses; rows take what comes.
    Columns,
}

/// A problem of fused transport: minimise over plans T (n x m)
///
/// ```text
/// (1 - fused) <cost, T> + fused Q(T)
/// ```
///
/// with Q of [`Structures`].
#[derive(Debug, Clone)]
pub struct Fused<'s> {
    /// Both networks.
    pub structures: &'s Structures,
    /// Cost of each pair `(parcels of a, parcels of b)`.
    pub cost: &'s Array2<f64>,
    /// How much the networks count beside the cost, in [0, 1].
    pub fused: f64,
    /// Which marginals are kept.
    pub marginals: &'s Marginals,
    /// Most steps.
    pub steps: usize,
    /// It ends when a step lowers the objective by less than this share of it.
    pub tolerance: f64,
}

/// What transport comes to.
#[derive(Debug, Clone)]
pub struct Coupling {
    /// The plan `(parcels of a, parcels of b)`, which sums to 1.
    pub plan: Array2<f64>,
    /// The objective.
    pub objective: f64,
    /// Steps taken.
    pub steps: usize,
}

impl Fused<'_> {
    /// Starts from the plan of independence and goes to a local minimum. No step looks at anything
    /// but the arguments, so the same problem gives the same bits.
    ///
    /// # Panics
    /// If cost, structures and masses disagree in size, or a number is not finite.
    #[must_use]
    pub fn solve(&self) -> Coupling {
        let (n, m) = self.structures.sizes();
        assert_eq!(self.cost.dim(), (n, m), "one cost for each pair");
        let (p, q) = match self.marginals {
            Marginals::Fixed(masses) => (
                masses.sources().iter().map(|&u| masses.share(u)).collect(),
                masses.sinks().iter().map(|&u| masses.share(u)).collect(),
            ),
            Marginals::Rows | Marginals::Columns => (
                Array1::from_elem(n, 1.0 / n as f64),
                Array1::from_elem(m, 1.0 / m as f64),
            ),
        };
        let mut linear = Linear::new(self.marginals);
        let mut plan = Array2::from_shape_fn((n, m), |(i, j)| p[i] * q[j]);
        // H of the plan, and of the vertex the last step went to.
        let mut pull = self.structures.gradient_of_product(p.view(), q.view());
        let mut pull_there = Array2::zeros((n, m));
        let mut vertex: Vec<Flow> = Vec::new();
        let mut gradient = Array2::zeros((n, m));
        let mut objective = self.objective(&plan, &pull);
        let mut taken = 0;
        while taken < self.steps {
            taken += 1;
            Zip::from(&mut gradient)
                .and(self.cost)
                .and(&pull)
                .for_each(|g, c, h| *g = (1.0 - self.fused) * c + self.fused * h);
            let next = linear.solve(&gradient);
            self.structures
                .add_gradient(&difference(&next, &vertex), &mut pull_there);
            vertex = next;
            let slope = inner(&gradient, &vertex) - dot(&gradient, &plan);
            // The change of H along the step, between the vertex and the plan.
            let bend = {
                let at_vertex = inner(&pull_there, &vertex) - inner(&pull, &vertex);
                at_vertex - dot(&pull_there, &plan) + dot(&pull, &plan)
            };
            let curvature = self.fused * bend / 2.0;
            let step = if curvature > 0.0 {
                (-slope / (2.0 * curvature)).clamp(0.0, 1.0)
            } else {
                1.0
            };
            let change = step * (slope + step * curvature);
            if slope >= 0.0 || change >= 0.0 {
                break;
            }
            plan.mapv_inplace(|x| x * (1.0 - step));
            for flow in &vertex {
                plan[(flow.source, flow.sink)] += step * flow.mass;
            }
            Zip::from(&mut pull)
                .and(&pull_there)
                .for_each(|h, there| *h = (1.0 - step) * *h + step * there);
            objective += change;
            if -change <= self.tolerance * objective.abs() {
                break;
            }
        }
        Coupling {
            objective: self.objective(&plan, &pull),
            plan,
            steps: taken,
        }
    }

    fn objective(&self, plan: &Array2<f64>, pull: &Array2<f64>) -> f64 {
        (1.0 - self.fused) * dot(self.cost, plan) + self.fused * dot(pull, plan) / 2.0
    }
}

/// The linear problem of a step.
enum Linear {
    Fixed(Box<Transportation>),
    Rows,
    Columns,
}

impl Linear {
    fn new(marginals: &Marginals) -> Linear {
        match marginals {
            Marginals::Fixed(masses) => {
                Linear::Fixed(Box::new(Transportation::new(masses.clone())))
            }
            Marginals::Rows => Linear::Rows,
            Marginals::Columns => Linear::Columns,
        }
    }

    fn solve(&mut self, costs: &Array2<f64>) -> Vec<Flow> {
        match self {
            Linear::Fixed(problem) => problem.solve(costs),
            Linear::Rows => cheapest(costs, |source, sink| (source, sink)),
            Linear::Columns => {
                let costs = costs.t().as_standard_layout().into_owned();
                let mut flows = cheapest(&costs, |sink, source| (source, sink));
                flows.sort_unstable_by_key(|flow| (flow.source, flow.sink));
                flows
            }
        }
    }
}

/// Every row sends all its mass where that is cheapest.
fn cheapest(costs: &Array2<f64>, ends: impl Fn(usize, usize) -> (usize, usize)) -> Vec<Flow> {
    let zeros = vec![0.0; costs.ncols()];
    let mass = 1.0 / costs.nrows() as f64;
    costs
        .rows()
        .into_iter()
        .enumerate()
        .map(|(row, costs)| {
            let costs = costs.as_slice().expect("standard layout");
            let (source, sink) = ends(row, least_difference(costs, &zeros).1);
            Flow { source, sink, mass }
        })
        .collect()
}

/// What must be added to one plan to get another; both by source, then sink.
fn difference(to: &[Flow], from: &[Flow]) -> Vec<Flow> {
    let key = |flow: &Flow| (flow.source, flow.sink);
    let mut changes = Vec::with_capacity(to.len());
    let (mut i, mut j) = (0, 0);
    while i < to.len() || j < from.len() {
        let only_to = j == from.len() || i < to.len() && key(&to[i]) < key(&from[j]);
        let only_from = i == to.len() || j < from.len() && key(&from[j]) < key(&to[i]);
        let mass = if only_to {
            to[i].mass
        } else if only_from {
            -from[j].mass
        } else {
            to[i].mass - from[j].mass
        };
        let at = if only_from { from[j] } else { to[i] };
        if mass != 0.0 {
            changes.push(Flow { mass, ..at });
        }
        i += usize::from(!only_from);
        j += usize::from(!only_to);
    }
    changes
}

/// Sum of the products of two matrices' entries, row by row.
fn dot(x: &Array2<f64>, y: &Array2<f64>) -> f64 {
    let (x, y) = (x.as_slice(), y.as_slice());
    let (x, y) = (x.expect("standard layout"), y.expect("standard layout"));
    // Eight sums side by side: a single one would wait for every addition.
    let mut sums = [0.0; 8];
    let (chunks_x, chunks_y) = (x.chunks_exact(8), y.chunks_exact(8));
    let rest: f64 = (chunks_x.remainder().iter())
        .zip(chunks_y.remainder())
        .map(|(x, y)| x * y)
        .sum();
    for (x, y) in chunks_x.zip(chunks_y) {
        for lane in 0..8 {
            sums[lane] += x[lane] * y[lane];
        }
    }
    sums.iter().sum::<f64>() + rest
}

/// The same with a plan given by its flows.
fn inner(x: &Array2<f64>, flows: &[Flow]) -> f64 {
    flows
        .iter()
        .map(|flow| x[(flow.source, flow.sink)] * flow.mass)
        .sum()
}
