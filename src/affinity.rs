//! How alike two parcels of one species are: by the profiles of their connections.

mod cut;

use ndarray::linalg::general_mat_mul;
use ndarray::{s, Array1, Array2, ArrayView2, ArrayViewMut1, Axis, CowArray, Ix2};

use crate::domain::{choices, Connectivity, Share, WeightKind};

choices! {
    /// How two profiles are compared.
    pub enum Likeness {
        /// Cosine of the angle between them.
        Cosine = "cosine",
        /// Pearson correlation.
        Pearson = "pearson",
    }
}

/// How affinities are made from strengths.
#[derive(Debug, Clone, Copy, PartialEq, serde::Serialize)]
pub struct Params {
    /// How profiles are compared.
    pub likeness: Likeness,
    /// Share of each parcel's links, the strongest, that its profile keeps; 1 keeps all.
    pub strongest: Share,
}

/// Share of links kept by default for correlations: nearly every pair of regions correlates a
/// little, and the tail carries more noise than structure.
const STRONGEST_CORRELATIONS: f64 = 0.1;

impl Params {
    /// The default for weights of a kind.
    #[must_use]
    pub fn default_for(weights: WeightKind) -> Params {
        Params {
            likeness: Likeness::Cosine,
            strongest: match weights {
                WeightKind::Correlations => {
                    Share::new(STRONGEST_CORRELATIONS).unwrap_or(Share::ALL)
                }
                _ => Share::ALL,
            },
        }
    }
}

/// Entries that two profiles must both have been observed in before they are compared, at least.
const FEWEST_SHARED: f64 = 3.0;
/// The same as a share of a whole profile.
const SMALLEST_SHARED: f64 = 0.1;

/// Whether so many entries of so many possible ones are enough to compare two profiles by.
#[must_use]
pub fn enough_shared(shared: f64, possible: f64) -> bool {
    shared >= FEWEST_SHARED && shared >= SMALLEST_SHARED * possible
}

/// One half of the profiles: links sent, or links received.
#[derive(Debug, Clone)]
struct Half<'n> {
    /// The parcels that have it, where not all do.
    parcels: Option<Vec<usize>>,
    /// Strengths `(parcels that have it, entries)`; zero where nothing was observed. Those of the
    /// network itself where nothing is cut, since a copy of a large one is dear.
    links: CowArray<'n, f64, Ix2>,
    /// One where an entry was observed, zero elsewhere; `None` where all were.
    observed: Option<Array2<f64>>,
}

/// The profile of every parcel: its links to all others, and in a directed network the links it
/// receives beside them. Kept apart, so that they need not be copied side by side.
///
/// In a rectangular network the rows are the parcels; links received are known for those that are
/// columns too, and compared among these only. Entries that were never observed are left out of
/// every comparison: two profiles are compared where both were observed.
#[derive(Debug, Clone)]
pub struct Profiles<'n> {
    parcels: usize,
    halves: Vec<Half<'n>>,
}

impl<'n> Profiles<'n> {
    /// Profiles of a complete square network, strengths `(parcels, parcels)`; each half of a profile
    /// is cut to its strongest links.
    #[must_use]
    pub fn new(strengths: ArrayView2<'n, f64>, strongest: Share) -> Profiles<'n> {
        let mut halves = vec![Half::whole(CowArray::from(strengths), strongest)];
        if is_directed(strengths) {
            halves.push(Half::whole(
                CowArray::from(strengths.reversed_axes()),
                strongest,
            ));
        }
        Profiles {
            parcels: strengths.nrows(),
            halves,
        }
    }

    /// Profiles of any network whose rows are the parcels.
    #[must_use]
    pub fn of(network: &'n Connectivity, strongest: Share) -> Profiles<'n> {
        let strengths = network.weights().view();
        if network.is_square() && !network.has_missing() {
            return Profiles::new(strengths, strongest);
        }
        let observed = network.has_missing().then(|| {
            Array2::from_shape_fn(strengths.dim(), |(i, j)| {
                // The diagonal is known to be no link; it is not missing.
                f64::from(u8::from(!network.is_missing(i, j)))
            })
        });
        let mut outgoing = Half::whole(CowArray::from(strengths), strongest);
        outgoing.observed.clone_from(&observed);
        let mut halves = vec![outgoing];
        // Columns that are parcels, and the rows these stand in.
        let (columns, rows): (Vec<usize>, Vec<usize>) = (0..strengths.ncols())
            .filter_map(|column| Some((column, network.row_of_column(column)?)))
            .unzip();
        let symmetric = network.is_square() && !is_directed_where_observed(network);
        if !symmetric && !columns.is_empty() {
            let received = strengths.select(Axis(1), &columns).reversed_axes();
            let mut incoming = Half::whole(CowArray::from(received), strongest);
            incoming.observed = observed.map(|mask| {
                let mask = mask.select(Axis(1), &columns).reversed_axes();
                mask.as_standard_layout().into_owned()
            });
            incoming.parcels =
                (rows.len() < strengths.nrows() || !rows.is_sorted()).then_some(rows);
            halves.push(incoming);
        }
        Profiles {
            parcels: strengths.nrows(),
            halves,
        }
    }

    /// Number of entries of a profile.
    #[must_use]
    pub fn width(&self) -> usize {
        self.halves.iter().map(|half| half.links.ncols()).sum()
    }

    /// Share of each parcel's profile that was observed.
    #[must_use]
    pub fn coverage(&self) -> Array1<f64> {
        let mut seen = Array1::zeros(self.parcels);
        let mut possible: Array1<f64> = Array1::zeros(self.parcels);
        for half in &self.halves {
            let width = half.links.ncols() as f64;
            for at in 0..half.links.nrows() {
                let parcel = half.parcel(at);
                possible[parcel] += width;
                seen[parcel] += half
                    .observed
                    .as_ref()
                    .map_or(width, |mask| mask.row(at).sum());
            }
        }
        seen / possible
    }

    /// All profiles, one a row: `(parcels, width)`. Where nothing was observed stands the mean of the
    /// parcels that were, which says nothing about the one that was not.
    #[must_use]
    pub fn matrix(&self) -> Array2<f64> {
        let mut all = Array2::zeros((self.parcels, self.width()));
        let mut first = 0;
        for half in &self.halves {
            let width = half.links.ncols();
            let count = half.observed.as_ref().map_or_else(
                || Array1::from_elem(width, half.links.nrows() as f64),
                |mask| mask.sum_axis(Axis(0)),
            );
            let mean = half.links.sum_axis(Axis(0)) / count.mapv(|c| c.max(1.0));
            let mut block = all.slice_mut(s![.., first..first + width]);
            block.assign(&mean);
            for (at, links) in half.links.rows().into_iter().enumerate() {
                let mut row = block.row_mut(half.parcel(at));
                for (entry, &link) in links.iter().enumerate() {
                    if half
                        .observed
                        .as_ref()
                        .is_none_or(|mask| mask[(at, entry)] > 0.0)
                    {
                        row[entry] = link;
                    }
                }
            }
            first += width;
        }
        all
    }

    /// All profiles scaled so that products of rows are their likenesses: of unit length, and for
    /// Pearson of zero mean. What is compared is then the pattern of links, not their number.
    #[must_use]
    pub fn standardised(&self, likeness: Likeness) -> Array2<f64> {
        let mut profiles = self.matrix();
        for mut profile in profiles.rows_mut() {
            let before = profile.dot(&profile);
            if likeness == Likeness::Pearson {
                let mean = profile.mean().unwrap_or(0.0);
                profile.mapv_inplace(|x| x - mean);
            }
            let square = profile.dot(&profile);
            // What is left of a constant profile after centring is rounding, not a pattern.
            let is_pattern = square > before * f64::EPSILON * profile.len() as f64;
            let scale = if is_pattern {
                square.sqrt().recip()
            } else {
                0.0
            };
            profile.mapv_inplace(|x| x * scale);
        }
        profiles
    }

    /// Affinities `(parcels, parcels)`: symmetric, in [0, 1], one on the diagonal. Unlikeness beyond
    /// independence (a negative cosine or correlation) counts as none, and so do two profiles of
    /// which less than a tenth, or fewer than three entries, were observed in both.
    #[must_use]
    pub fn affinity(&self, likeness: Likeness) -> Array2<f64> {
        if self.halves.iter().all(Half::is_complete) {
            self.affinity_of_complete(likeness)
        } else {
            self.affinity_where_both_observed(likeness)
        }
    }

    fn affinity_of_complete(&self, likeness: Likeness) -> Array2<f64> {
        let n = self.parcels;
        let mut gram = Array2::zeros((n, n));
        for half in &self.halves {
            general_mat_mul(1.0, &half.links, &half.links.t(), 1.0, &mut gram);
        }
        let width = self.width() as f64;
        let means: Array1<f64> = self.halves.iter().fold(Array1::zeros(n), |sum, half| {
            sum + half.links.sum_axis(Axis(1))
        }) / width;
        likenesses(gram, likeness, width, &means)
    }

    /// The same over the entries that both profiles have; every sum is then one for each pair.
    fn affinity_where_both_observed(&self, likeness: Likeness) -> Array2<f64> {
        let square = |n: usize| Array2::<f64>::zeros((n, n));
        let n = self.parcels;
        // For pair (i, j), over entries observed in both: products, squares and sum of i's, count.
        let (mut products, mut squares, mut sums, mut shared) =
            (square(n), square(n), square(n), square(n));
        let mut possible = square(n);
        for half in &self.halves {
            let all_seen;
            let mask = match &half.observed {
                Some(mask) => mask,
                None => {
                    all_seen = Array2::ones(half.links.dim());
                    &all_seen
                }
            };
            let squared = half.links.mapv(|x| x * x);
            let (links, mask) = (half.links.view(), mask.view());
            half.add(links, links, &mut products);
            half.add(squared.view(), mask, &mut squares);
            half.add(links, mask, &mut sums);
            half.add(mask, mask, &mut shared);
            let ones = Array2::from_elem((half.links.nrows(), 1), 1.0);
            let width = ones.mapv(|one: f64| one * half.links.ncols() as f64);
            half.add(width.view(), ones.view(), &mut possible);
        }
        let mut affinity = products;
        fill(&mut affinity, |products, i, j| {
            let count = shared[(i, j)];
            if !enough_shared(count, possible[(i, j)]) {
                return 0.0;
            }
            let (mut product, mut own_i, mut own_j) =
                (products[(i, j)], squares[(i, j)], squares[(j, i)]);
            let before = own_i.max(own_j);
            if likeness == Likeness::Pearson {
                let (sum_i, sum_j) = (sums[(i, j)], sums[(j, i)]);
                product -= sum_i * sum_j / count;
                own_i -= sum_i * sum_i / count;
                own_j -= sum_j * sum_j / count;
            }
            if own_i.min(own_j) <= before * f64::EPSILON * count {
                0.0
            } else {
                product / (own_i * own_j).sqrt()
            }
        });
        affinity
    }
}

impl<'n> Half<'n> {
    fn whole(links: CowArray<'n, f64, Ix2>, strongest: Share) -> Half<'n> {
        let links = if strongest == Share::ALL {
            links
        } else {
            let mut links = links.as_standard_layout().into_owned();
            for row in links.rows_mut() {
                keep_strongest(row, strongest);
            }
            CowArray::from(links)
        };
        Half {
            parcels: None,
            links,
            observed: None,
        }
    }

    fn is_complete(&self) -> bool {
        self.parcels.is_none() && self.observed.is_none()
    }

    /// The parcel whose links stand in a row.
    fn parcel(&self, row: usize) -> usize {
        self.parcels.as_ref().map_or(row, |parcels| parcels[row])
    }

    /// Adds the products of rows of `left` with rows of `right` to the pairs of parcels they stand for.
    fn add(&self, left: ArrayView2<'_, f64>, right: ArrayView2<'_, f64>, to: &mut Array2<f64>) {
        match &self.parcels {
            None => general_mat_mul(1.0, &left, &right.t(), 1.0, to),
            Some(parcels) => {
                let products = left.dot(&right.t());
                for ((i, j), product) in products.indexed_iter() {
                    to[(parcels[i], parcels[j])] += product;
                }
            }
        }
    }
}

/// Turns products of profiles of `width` entries and these means into likenesses.
fn likenesses(
    mut gram: Array2<f64>,
    likeness: Likeness,
    width: f64,
    means: &Array1<f64>,
) -> Array2<f64> {
    let n = gram.nrows();
    if likeness == Likeness::Pearson {
        for ((i, j), g) in gram.indexed_iter_mut() {
            *g -= width * means[i] * means[j];
        }
    }
    // What is left of a constant profile after centring is rounding, not likeness.
    let floor = gram.diag().iter().copied().fold(0.0, f64::max) * f64::EPSILON * n as f64;
    let inverse: Array1<f64> = gram.diag().mapv(|norm| {
        if norm > floor {
            norm.sqrt().recip()
        } else {
            0.0
        }
    });
    fill(&mut gram, |gram, i, j| {
        gram[(i, j)] * inverse[i] * inverse[j]
    });
    gram
}

/// The affinities of a network: of complete square networks of which profiles keep few links without
/// storing what was cut.
#[must_use]
pub fn of(network: &Connectivity, params: &Params) -> Array2<f64> {
    let few = params.strongest.get() <= cut::FEW;
    if few && network.is_square() && !network.has_missing() {
        return cut::affinity_of_cut(network.weights().view(), params.strongest, params.likeness);
    }
    Profiles::of(network, params.strongest).affinity(params.likeness)
}

/// Fills in pair by pair: clamped to [0, 1], symmetric, one on the diagonal.
fn fill(gram: &mut Array2<f64>, likeness: impl Fn(&Array2<f64>, usize, usize) -> f64) {
    for i in 0..gram.nrows() {
        for j in 0..i {
            let value = likeness(gram, i, j).clamp(0.0, 1.0);
            gram[(i, j)] = value;
            gram[(j, i)] = value;
        }
        gram[(i, i)] = 1.0;
    }
}

/// Whether links of a square network differ by direction where both directions were observed.
fn is_directed_where_observed(network: &Connectivity) -> bool {
    let strengths = network.weights();
    (0..strengths.nrows()).any(|i| {
        (0..i).any(|j| {
            strengths[(i, j)] != strengths[(j, i)]
                && !network.is_missing(i, j)
                && !network.is_missing(j, i)
        })
    })
}

/// Whether links differ by direction.
#[must_use]
pub fn is_directed(strengths: ArrayView2<'_, f64>) -> bool {
    strengths != strengths.t()
}

/// Keeps the strongest share of a row's links and every tie with the weakest kept; what is cut, and
/// everything negative, becomes zero.
fn keep_strongest(mut row: ArrayViewMut1<'_, f64>, share: Share) {
    let others = row.len().saturating_sub(1) as f64;
    // The slack keeps 0.55 x 100 at 55 in spite of rounding.
    let keep = ((share.get() * others - 1e-9).ceil() as usize).max(1);
    let mut positive: Vec<f64> = row.iter().copied().filter(|x| *x > 0.0).collect();
    positive.sort_by(|x, y| y.total_cmp(x));
    let weakest = positive
        .get(keep.min(positive.len()).wrapping_sub(1))
        .copied()
        .unwrap_or(f64::INFINITY);
    row.mapv_inplace(|x| if x >= weakest { x } else { 0.0 });
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;

    /// A network whose entries follow no pattern; `missing` says which were never observed.
    fn network(
        rows: usize,
        columns: usize,
        missing: impl Fn(usize, usize) -> bool,
    ) -> Connectivity {
        let label = |i: usize| format!("p{i:02}");
        let weights = Array2::from_shape_fn((rows, columns), |(i, j)| {
            let wave = ((i * 31 + j * 17) as f64).sin() + 1.1;
            if i == j || missing(i, j) {
                0.0
            } else {
                wave
            }
        });
        let mask = Array2::from_shape_fn((rows, columns), |(i, j)| missing(i, j));
        let any = mask.iter().any(|m| *m);
        Connectivity::new(
            (0..rows).map(label).collect(),
            (0..columns).map(label).collect(),
            weights,
            any.then_some(mask),
        )
        .expect("labels fit")
    }

    /// The definition, entry by entry.
    fn by_definition(network: &Connectivity, likeness: Likeness, i: usize, j: usize) -> f64 {
        let (rows, columns) = network.weights().dim();
        let w = |a: usize, b: usize| network.weights()[(a, b)];
        let mut pairs = Vec::new();
        for k in 0..columns {
            if !network.is_missing(i, k) && !network.is_missing(j, k) {
                pairs.push((w(i, k), w(j, k)));
            }
        }
        if i < columns && j < columns {
            for k in 0..rows {
                if !network.is_missing(k, i) && !network.is_missing(k, j) {
                    pairs.push((w(k, i), w(k, j)));
                }
            }
        }
        let n = pairs.len() as f64;
        let (mut mean_x, mut mean_y) = (0.0, 0.0);
        if likeness == Likeness::Pearson {
            mean_x = pairs.iter().map(|p| p.0).sum::<f64>() / n;
            mean_y = pairs.iter().map(|p| p.1).sum::<f64>() / n;
        }
        let sum = |of: &dyn Fn(f64, f64) -> f64| {
            pairs
                .iter()
                .map(|p| of(p.0 - mean_x, p.1 - mean_y))
                .sum::<f64>()
        };
        let product = sum(&|x, y| x * y);
        let own = sum(&|x, _| x * x) * sum(&|_, y| y * y);
        (product / own.sqrt()).clamp(0.0, 1.0)
    }

    #[test]
    fn only_what_both_profiles_have_is_compared() {
        for likeness in [Likeness::Cosine, Likeness::Pearson] {
            for network in [
                network(12, 12, |i, j| (i * 7 + j * 3) % 5 == 0),
                network(12, 5, |_, _| false),
                network(12, 5, |i, j| i == 2 && j > 2),
            ] {
                let found = Profiles::of(&network, Share::ALL).affinity(likeness);
                for i in 0..12 {
                    assert_eq!(found[(i, i)], 1.0);
                    for j in 0..i {
                        let expected = by_definition(&network, likeness, i, j);
                        assert_abs_diff_eq!(found[(i, j)], expected, epsilon = 1e-12);
                        assert_eq!(found[(i, j)], found[(j, i)]);
                    }
                }
            }
        }
    }

    #[test]
    fn the_masked_path_agrees_with_the_complete_one() {
        let network = network(10, 10, |_, _| false);
        let complete = Profiles::of(&network, Share::ALL);
        for likeness in [Likeness::Cosine, Likeness::Pearson] {
            assert_abs_diff_eq!(
                complete.affinity_of_complete(likeness),
                complete.affinity_where_both_observed(likeness),
                epsilon = 1e-12
            );
        }
    }

    #[test]
    fn too_little_in_common_is_no_likeness() {
        // Parcels 0 and 1 were observed on different sides of the middle, with two entries in common.
        let network = network(20, 20, |i, j| {
            (i == 0 && j > 10) || (i == 1 && j < 9) || (j == 0) || (j == 1)
        });
        let profiles = Profiles::of(&network, Share::ALL);
        assert_eq!(profiles.affinity(Likeness::Cosine)[(0, 1)], 0.0);
        assert!(profiles.affinity(Likeness::Cosine)[(2, 3)] > 0.0);
        let coverage = profiles.coverage();
        assert!(coverage[0] < coverage[2]);
    }

    #[test]
    fn a_missing_entry_says_nothing_to_components() {
        let network = network(6, 6, |i, j| i == 4 && j == 2);
        let matrix = Profiles::of(&network, Share::ALL).matrix();
        let others: f64 = (0..6).filter(|i| *i != 4).map(|i| matrix[(i, 2)]).sum();
        assert_abs_diff_eq!(matrix[(4, 2)], others / 5.0, epsilon = 1e-12);
    }
}
