//! Two networks whose links a transport compares, and the quadratic form this gives.

use ndarray::linalg::general_mat_mul;
use ndarray::{s, Array1, Array2, ArrayView1, Axis, Zip};

use super::simplex::Flow;

/// One network: links `(parcels, parcels)`, row = source, and which of them were observed.
#[derive(Debug, Clone)]
pub struct Structure {
    links: Array2<f64>,
    observed: Option<Array2<f64>>,
}

impl Structure {
    /// Takes links and, where not all were observed, a mask that is one where they were and zero
    /// elsewhere. What was not observed is compared with nothing.
    ///
    /// # Panics
    /// If links or mask are not square or differ in shape, or an observed link is not finite.
    #[must_use]
    pub fn new(links: Array2<f64>, observed: Option<Array2<f64>>) -> Structure {
        assert!(links.is_square(), "links lead from parcels to parcels");
        let mut links = links;
        if let Some(mask) = &observed {
            assert_eq!(mask.dim(), links.dim(), "one truth value for each link");
            Zip::from(&mut links).and(mask).for_each(|link, &seen| {
                if seen == 0.0 {
                    *link = 0.0;
                }
            });
        }
        assert!(links.iter().all(|x| x.is_finite()), "links are finite");
        Structure { links, observed }
    }

    /// Links `(parcels, parcels)`, zero where not observed.
    #[must_use]
    pub fn links(&self) -> &Array2<f64> {
        &self.links
    }

    /// Whether a link was observed.
    #[must_use]
    pub fn is_observed(&self, source: usize, target: usize) -> bool {
        self.observed
            .as_ref()
            .is_none_or(|mask| mask[(source, target)] > 0.0)
    }

    /// One where a link was observed, zero elsewhere; `None` where all were.
    #[must_use]
    pub fn observed(&self) -> Option<&Array2<f64>> {
        self.observed.as_ref()
    }

    /// Number of parcels.
    #[must_use]
    pub fn len(&self) -> usize {
        self.links.nrows()
    }

    /// Whether there is no parcel.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.links.is_empty()
    }

    /// Whether every link equals the one the other way.
    #[must_use]
    pub fn is_symmetric(&self) -> bool {
        self.links == self.links.t() && self.observed.as_ref().is_none_or(|mask| mask == mask.t())
    }
}

/// What depends on one side's marginal alone: row sums of squared links both ways.
#[derive(Debug, Clone)]
struct Squares(Array2<f64>);

impl Squares {
    fn of(links: &Array2<f64>) -> Squares {
        let squared = links.mapv(|x| x * x);
        Squares(&squared + &squared.t())
    }
}

/// Two structures ready for comparison. With links A (n x n) and B (m x m) a plan T (n x m) pays
///
/// ```text
/// Q(T) = sum over i, k of A and j, l of B of (A_ik - B_jl)^2 T_ij T_kl
/// ```
///
/// over the pairs of links that were observed in both (Peyré, Cuturi & Solomon 2016, square loss).
/// What [`Structures::add_gradient`] adds up is the linear map H with Q(T) = <H(T), T> / 2.
#[derive(Debug, Clone)]
pub struct Structures {
    sizes: (usize, usize),
    /// Products X T Y' and factors they count with; X and Y are stored so that column i of X and row
    /// j of Y' are rows.
    products: Vec<(f64, Array2<f64>, Array2<f64>)>,
    /// Where every link was observed, squares enter through the marginals.
    squares: Option<(Squares, Squares)>,
}

impl Structures {
    /// Prepares two structures.
    #[must_use]
    pub fn new(a: &Structure, b: &Structure) -> Structures {
        let sizes = (a.len(), b.len());
        let plain = |x: ndarray::ArrayView2<'_, f64>| x.as_standard_layout().into_owned();
        let mut products = Vec::new();
        // A product and its adjoint; they are one where both sides are symmetric.
        let symmetric = a.is_symmetric() && b.is_symmetric();
        let mut add = |factor: f64, x: &Array2<f64>, y: &Array2<f64>| {
            if symmetric {
                products.push((2.0 * factor, plain(x.view()), plain(y.view())));
            } else {
                products.push((factor, plain(x.t()), plain(y.t())));
                products.push((factor, plain(x.view()), plain(y.view())));
            }
        };
        add(-2.0, &a.links, &b.links);
        let squares = if a.observed.is_none() && b.observed.is_none() {
            Some((Squares::of(&a.links), Squares::of(&b.links)))
        } else {
            let ones = |of: &Structure| {
                of.observed
                    .clone()
                    .unwrap_or_else(|| Array2::ones(of.links.dim()))
            };
            let squared = |of: &Structure| of.links.mapv(|x| x * x);
            add(1.0, &squared(a), &ones(b));
            add(1.0, &ones(a), &squared(b));
            None
        };
        Structures {
            sizes,
            products,
            squares,
        }
    }

    /// Parcels of both sides.
    #[must_use]
    pub fn sizes(&self) -> (usize, usize) {
        self.sizes
    }

    /// H of the plan p q'.
    #[must_use]
    pub fn gradient_of_product(
        &self,
        p: ArrayView1<'_, f64>,
        q: ArrayView1<'_, f64>,
    ) -> Array2<f64> {
        let mut sum = Array2::zeros(self.sizes);
        for (factor, x, y) in &self.products {
            let (left, right) = (x.t().dot(&p) * *factor, y.t().dot(&q));
            add_outer(&mut sum, &left, &right);
        }
        let (rows, columns) = (&p * q.sum(), &q * p.sum());
        self.add_squares(&mut sum, rows.view(), columns.view());
        sum
    }

    /// Adds to `sum` the H of a difference of plans, given as flows of either sign.
    pub fn add_gradient(&self, flows: &[Flow], sum: &mut Array2<f64>) {
        let (n, m) = self.sizes;
        // Only columns that have a flow take part in the second product.
        let mut place = vec![usize::MAX; m];
        let mut columns = Vec::new();
        for flow in flows {
            if place[flow.sink] == usize::MAX {
                place[flow.sink] = columns.len();
                columns.push(flow.sink);
            }
        }
        let count = columns.len();
        if count == 0 {
            return;
        }
        let mut left = Array2::zeros((self.products.len() * count, n));
        let mut right = Array2::zeros((self.products.len() * count, m));
        for (at, (factor, x, y)) in self.products.iter().enumerate() {
            for flow in flows {
                let mut row = left.row_mut(at * count + place[flow.sink]);
                row.scaled_add(factor * flow.mass, &x.row(flow.source));
            }
            right
                .slice_mut(s![at * count..(at + 1) * count, ..])
                .assign(&y.select(Axis(0), &columns));
        }
        general_mat_mul(1.0, &left.t(), &right, 1.0, sum);
        if self.squares.is_some() {
            let (mut p, mut q) = (Array1::zeros(n), Array1::zeros(m));
            for flow in flows {
                p[flow.source] += flow.mass;
                q[flow.sink] += flow.mass;
            }
            self.add_squares(sum, p.view(), q.view());
        }
    }

    /// Adds the H of squared links for a plan with these marginals.
    fn add_squares(&self, sum: &mut Array2<f64>, p: ArrayView1<'_, f64>, q: ArrayView1<'_, f64>) {
        if let Some((a, b)) = &self.squares {
            let (rows, columns) = (a.0.dot(&p), b.0.dot(&q));
            for (mut row, own) in sum.rows_mut().into_iter().zip(&rows) {
                Zip::from(&mut row)
                    .and(&columns)
                    .for_each(|x, other| *x += own + other);
            }
        }
    }
}

/// Adds the outer product of two vectors.
fn add_outer(sum: &mut Array2<f64>, left: &Array1<f64>, right: &Array1<f64>) {
    for (mut row, &x) in sum.rows_mut().into_iter().zip(left) {
        row.scaled_add(x, right);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;

    fn wave(n: usize, step: f64) -> Array2<f64> {
        Array2::from_shape_fn((n, n), |(i, j)| {
            if i == j {
                0.0
            } else {
                ((i * n + j) as f64 * step).sin()
            }
        })
    }

    fn mask(n: usize, every: usize) -> Array2<f64> {
        Array2::from_shape_fn((n, n), |(i, j)| {
            f64::from(u8::from((3 * i + 5 * j) % every != 0))
        })
    }

    /// The sum of the definition, term by term, differentiated by hand.
    fn plain(a: &Structure, b: &Structure, plan: &Array2<f64>) -> Array2<f64> {
        let seen =
            |s: &Structure, i: usize, k: usize| s.observed.as_ref().is_none_or(|m| m[(i, k)] > 0.0);
        Array2::from_shape_fn(plan.dim(), |(i, j)| {
            let mut sum = 0.0;
            for ((k, l), t) in plan.indexed_iter() {
                if seen(a, i, k) && seen(b, j, l) {
                    sum += t * (a.links[(i, k)] - b.links[(j, l)]).powi(2);
                }
                if seen(a, k, i) && seen(b, l, j) {
                    sum += t * (a.links[(k, i)] - b.links[(l, j)]).powi(2);
                }
            }
            sum
        })
    }

    #[test]
    fn the_gradient_is_that_of_the_definition() {
        let (n, m) = (5, 7);
        let symmetric = |x: Array2<f64>| &x + &x.t();
        let cases = [
            (wave(n, 1.1), None, wave(m, 0.7), None),
            (symmetric(wave(n, 1.1)), None, symmetric(wave(m, 0.7)), None),
            (wave(n, 1.1), Some(mask(n, 4)), wave(m, 0.7), None),
            (
                wave(n, 1.1),
                Some(mask(n, 4)),
                symmetric(wave(m, 0.7)),
                Some(mask(m, 3)),
            ),
        ];
        for (a, seen_a, b, seen_b) in cases {
            let (a, b) = (Structure::new(a, seen_a), Structure::new(b, seen_b));
            let structures = Structures::new(&a, &b);
            let p = Array1::from_shape_fn(n, |i| 0.1 + i as f64);
            let q = Array1::from_shape_fn(m, |j| 1.0 / (1.0 + j as f64));
            let mut plan = Array2::zeros((n, m));
            add_outer(&mut plan, &p, &q);
            let mut found = structures.gradient_of_product(p.view(), q.view());
            assert_abs_diff_eq!(found, plain(&a, &b, &plan), epsilon = 1e-9);
            let flows = [(0, 3, 0.4), (2, 3, -0.1), (4, 6, 0.25)];
            let flows = flows.map(|(source, sink, mass)| Flow { source, sink, mass });
            for flow in &flows {
                plan[(flow.source, flow.sink)] += flow.mass;
            }
            structures.add_gradient(&flows, &mut found);
            assert_abs_diff_eq!(found, plain(&a, &b, &plan), epsilon = 1e-9);
        }
    }
}
