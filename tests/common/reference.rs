//! What the reference tests share: the values in `tests/data/reference/reference.json`, comparison
//! within a tolerance, random draws, and one-line fits.

use std::fmt::Display;
use std::ops::Deref;
use std::sync::OnceLock;

use approx::relative_eq;
use kinmark::align::{AlignError, Procrustes, ProcrustesParams, RidgeCca, RidgeCcaParams, Scaling};
use kinmark::domain::Pair;
use linfa::prelude::*;
use nalgebra::DMatrix;
use ndarray::{Array1, Array2, ArrayBase, Axis, Data, Dimension};
use rand::{Rng, SeedableRng};
use rand_distr::StandardNormal;
use rand_xoshiro::Xoshiro256PlusPlus;
use serde::Deserialize;

// ---------------------------------------------------------------------------------------------
// The file.

/// A matrix, written as a list of rows.
#[derive(Deserialize)]
#[serde(try_from = "Vec<Vec<f64>>")]
pub struct Matrix(Array2<f64>);

impl TryFrom<Vec<Vec<f64>>> for Matrix {
    type Error = ndarray::ShapeError;

    fn try_from(rows: Vec<Vec<f64>>) -> Result<Self, Self::Error> {
        let shape = (rows.len(), rows.first().map_or(0, Vec::len));
        Array2::from_shape_vec(shape, rows.concat()).map(Matrix)
    }
}

impl Deref for Matrix {
    type Target = Array2<f64>;

    fn deref(&self) -> &Array2<f64> {
        &self.0
    }
}

/// A list of numbers.
#[derive(Deserialize)]
#[serde(from = "Vec<f64>")]
pub struct Vector(Array1<f64>);

impl From<Vec<f64>> for Vector {
    fn from(entries: Vec<f64>) -> Self {
        Vector(Array1::from(entries))
    }
}

impl Deref for Vector {
    type Target = Array1<f64>;

    fn deref(&self) -> &Array1<f64> {
        &self.0
    }
}

/// One set of inputs and what an independent program makes of it.
#[derive(Deserialize)]
pub struct Case<I, E> {
    pub name: String,
    pub inputs: I,
    pub expected: E,
}

/// Landmarks of two embeddings, row by row the same, with weights that sum to 1.
#[derive(Deserialize)]
pub struct Weighted {
    pub x: Matrix,
    pub y: Matrix,
    pub weights: Vector,
}

/// Observations of two sets of variables, all weighed alike.
#[derive(Deserialize)]
pub struct Unweighted {
    pub x: Matrix,
    pub y: Matrix,
}

#[derive(Deserialize)]
pub struct ExpectedProcrustes {
    pub rotation: Matrix,
    pub determinant: f64,
    pub mean_x: Vector,
    pub mean_y: Vector,
    pub scaled: ExpectedSize,
    pub unscaled: ExpectedSize,
}

/// What depends on whether a scale is fitted.
#[derive(Deserialize)]
pub struct ExpectedSize {
    pub scale: f64,
    pub translation: Vector,
    pub residual: f64,
}

#[derive(Deserialize)]
pub struct ExpectedCanonical {
    pub correlations: Vector,
    pub abs_variates_x: Matrix,
    pub abs_variates_y: Matrix,
    pub published_correlations: Option<Vector>,
    pub published_source: Option<String>,
}

#[derive(Deserialize)]
pub struct ExpectedRidge {
    pub kappa: f64,
    pub regularised_correlations: Vector,
    pub plain_correlations: Vector,
    pub tied: Option<Tied>,
    /// One row a component, the tied ones left out.
    pub weights_x: Matrix,
    pub weights_y: Matrix,
}

/// Components whose correlations are all 1: only the sums of their outer products are determined.
#[derive(Deserialize)]
pub struct Tied {
    pub count: usize,
    pub outer_x: Matrix,
    pub outer_y: Matrix,
}

#[derive(Deserialize)]
pub struct AffinityInput {
    pub affinity: Matrix,
}

#[derive(Deserialize)]
pub struct ExpectedDiffusion {
    pub alpha: f64,
    pub t: f64,
    pub eigenvalues: Vector,
    pub coordinates: Matrix,
}

#[derive(Deserialize)]
pub struct ProfilesInput {
    pub profiles: Matrix,
}

#[derive(Deserialize)]
pub struct ExpectedComponents {
    pub scores: Matrix,
    pub singular_values: Vector,
    pub variances: Vector,
    pub shares: Vector,
}

#[derive(Deserialize)]
pub struct AffinityCases {
    pub directed: Vec<Case<DirectedInput, ExpectedAffinity>>,
    pub correlation: Vec<Case<CorrelationInput, Vec<ExpectedStrongest>>>,
}

#[derive(Deserialize)]
pub struct DirectedInput {
    pub weights: Matrix,
}

#[derive(Deserialize)]
pub struct ExpectedAffinity {
    pub profiles: Matrix,
    pub cosine: Matrix,
    pub pearson: Matrix,
}

#[derive(Deserialize)]
pub struct CorrelationInput {
    pub correlation: Matrix,
}

#[derive(Deserialize)]
pub struct ExpectedStrongest {
    pub share: f64,
    pub kept: Matrix,
    pub cosine: Matrix,
}

#[derive(Deserialize)]
pub struct MatrixInput {
    pub matrix: Matrix,
}

/// A transform that does not suit the data has no value.
#[derive(Deserialize)]
pub struct ExpectedTransforms {
    pub log1p: Option<Matrix>,
    pub log_floor: Option<Matrix>,
    pub fisher_z: Option<Matrix>,
    pub ranks: Matrix,
}

/// Versions of the programs that gave the values.
#[derive(Deserialize)]
struct Versions {
    numpy: String,
    scipy: String,
    #[serde(rename = "scikit-learn")]
    scikit_learn: String,
    statsmodels: String,
}

/// The whole file.
#[derive(Deserialize)]
pub struct Reference {
    versions: Versions,
    pub procrustes: Vec<Case<Weighted, ExpectedProcrustes>>,
    pub cca_linnerud: Case<Unweighted, ExpectedCanonical>,
    pub cca_random: Vec<Case<Unweighted, ExpectedCanonical>>,
    pub ridge_cca: Vec<Case<Weighted, Vec<ExpectedRidge>>>,
    pub diffusion: Vec<Case<AffinityInput, Vec<ExpectedDiffusion>>>,
    pub components: Vec<Case<ProfilesInput, ExpectedComponents>>,
    pub affinity: AffinityCases,
    pub transforms: Vec<Case<MatrixInput, ExpectedTransforms>>,
}

/// The values, read once.
pub fn reference() -> &'static Reference {
    static REFERENCE: OnceLock<Reference> = OnceLock::new();
    REFERENCE.get_or_init(|| {
        serde_json::from_str(include_str!("../data/reference/reference.json"))
            .expect("reference.json has the form its script gives it")
    })
}

impl Reference {
    /// A function by its full Python name, with the version of its package: what a failure is
    /// measured against.
    pub fn cite(&self, function: &str) -> String {
        let module = function.split('.').next().unwrap_or(function);
        let (package, version) = match module {
            "numpy" => ("numpy", &self.versions.numpy),
            "scipy" => ("scipy", &self.versions.scipy),
            "sklearn" => ("scikit-learn", &self.versions.scikit_learn),
            "statsmodels" => ("statsmodels", &self.versions.statsmodels),
            _ => panic!("no version of {module:?} in reference.json"),
        };
        format!("{function} ({package} {version})")
    }
}

// ---------------------------------------------------------------------------------------------
// Comparison.

/// Both within `tolerance` of each other, absolutely for numbers up to 1 and relatively beyond.
pub fn assert_near(found: f64, expected: f64, tolerance: f64, what: impl Display) {
    assert!(
        relative_eq!(
            found,
            expected,
            epsilon = tolerance,
            max_relative = tolerance
        ),
        "{what}: found {found:e}, expected {expected:e}, off by {:e}, tolerance {tolerance:e}",
        (found - expected).abs()
    );
}

/// The same for every entry of two arrays of one shape.
pub fn assert_close<S, T, D>(
    found: &ArrayBase<S, D>,
    expected: &ArrayBase<T, D>,
    tolerance: f64,
    what: impl Display,
) where
    S: Data<Elem = f64>,
    T: Data<Elem = f64>,
    D: Dimension,
    D::Pattern: std::fmt::Debug,
{
    assert_eq!(found.dim(), expected.dim(), "{what}: shape");
    for ((at, found), expected) in found.indexed_iter().zip(expected) {
        assert_near(
            *found,
            *expected,
            tolerance,
            format_args!("{what}, entry {at:?}"),
        );
    }
}

// ---------------------------------------------------------------------------------------------
// Random draws.

/// Draws per property; seeds are 0, 1, ..., so that a failure names one that can be run again.
const DRAWS: u64 = 200;
/// Draws per property where matrices are large.
const FEW_DRAWS: u64 = 3;

/// Calls `check` with the seed and the generator of every draw.
pub fn for_each_draw(mut check: impl FnMut(u64, &mut Xoshiro256PlusPlus)) {
    for seed in 0..DRAWS {
        check(seed, &mut Xoshiro256PlusPlus::seed_from_u64(seed));
    }
}

/// The same with few draws, for what takes long.
pub fn for_few_draws(mut check: impl FnMut(u64, &mut Xoshiro256PlusPlus)) {
    for seed in 0..FEW_DRAWS {
        check(seed, &mut Xoshiro256PlusPlus::seed_from_u64(seed));
    }
}

/// Calls `check` with a description, the generator and a random affinity, for few draws of a small
/// affinity, which is decomposed fully, and a large one, which is decomposed iteratively.
pub fn for_each_affinity(mut check: impl FnMut(&str, &mut Xoshiro256PlusPlus, &Array2<f64>)) {
    for_few_draws(|seed, rng| {
        for parcels in [30, 200] {
            let affinity = random_affinity(rng, parcels);
            check(&format!("seed {seed}, {parcels} parcels"), rng, &affinity);
        }
    });
}

/// Independent standard normal entries.
pub fn normal(rng: &mut Xoshiro256PlusPlus, rows: usize, columns: usize) -> Array2<f64> {
    Array2::from_shape_simple_fn((rows, columns), || rng.sample(StandardNormal))
}

/// A point drawn from the standard normal distribution.
pub fn normal_point(rng: &mut Xoshiro256PlusPlus, axes: usize) -> Array1<f64> {
    normal(rng, 1, axes).remove_axis(Axis(0))
}

/// Weights between 0.2 and 2, far from equal.
pub fn random_weights(rng: &mut Xoshiro256PlusPlus, count: usize) -> Vec<f64> {
    (0..count).map(|_| rng.gen_range(0.2..2.0)).collect()
}

/// A random orthogonal matrix with the determinant asked for, 1 or -1.
pub fn orthogonal(rng: &mut Xoshiro256PlusPlus, axes: usize, determinant: f64) -> Array2<f64> {
    let mut q = to_nalgebra(&normal(rng, axes, axes)).qr().q();
    if q.determinant() * determinant < 0.0 {
        q.column_mut(0).neg_mut();
    }
    Array2::from_shape_fn((axes, axes), |at| q[at])
}

/// An invertible matrix far from orthogonal: rotations around axes stretched between 0.4 and 3.
pub fn invertible(rng: &mut Xoshiro256PlusPlus, axes: usize) -> Array2<f64> {
    let stretch = Array1::from_shape_simple_fn(axes, || rng.gen_range(0.4..3.0));
    (orthogonal(rng, axes, 1.0) * stretch).dot(&orthogonal(rng, axes, -1.0))
}

/// Two embeddings that agree in part: the second is the first, changed linearly, with noise. The
/// axes differ in spread, as those of an embedding do.
pub fn related(rng: &mut Xoshiro256PlusPlus, rows: usize, axes: usize) -> Pair<Array2<f64>> {
    let spread = Array1::linspace(1.6, 0.6, axes);
    let a = normal(rng, rows, axes) * &spread;
    let b = a.dot(&invertible(rng, axes)) + normal(rng, rows, axes) * 0.7;
    Pair {
        a: a + normal_point(rng, axes),
        b: b + normal_point(rng, axes),
    }
}

/// A symmetric affinity in [0, 1], one on the diagonal: parcels scattered in space are alike where
/// they are near, with noise that leaves no two parcels or axes interchangeable.
pub fn random_affinity(rng: &mut Xoshiro256PlusPlus, parcels: usize) -> Array2<f64> {
    let points = normal(rng, parcels, 3) * &Array1::from(vec![1.5, 1.0, 0.7]);
    let mut affinity = Array2::eye(parcels);
    for i in 0..parcels {
        for j in 0..i {
            let gap = &points.row(i) - &points.row(j);
            let alike = (-gap.dot(&gap)).exp() * rng.gen_range(0.8..1.0);
            affinity[(i, j)] = alike;
            affinity[(j, i)] = alike;
        }
    }
    affinity
}

/// A random order of `0..count`.
pub fn permutation(rng: &mut Xoshiro256PlusPlus, count: usize) -> Vec<usize> {
    rand::seq::index::sample(rng, count, count).into_vec()
}

// ---------------------------------------------------------------------------------------------
// Fits and formulas.

/// A Procrustes fit; `None` weighs all landmarks alike.
pub fn fit_procrustes(
    x: &Array2<f64>,
    y: &Array2<f64>,
    weights: Option<&[f64]>,
    scaling: Scaling,
) -> Result<Procrustes, AlignError> {
    let params = ProcrustesParams::new().scaling(scaling);
    match weights {
        Some(weights) => params.weights(weights.to_vec()),
        None => params,
    }
    .fit(&DatasetBase::new(x.clone(), y.clone()))
}

/// A ridge canonical correlation; `None` weighs all landmarks alike.
pub fn fit_canonical(
    x: &Array2<f64>,
    y: &Array2<f64>,
    weights: Option<&[f64]>,
    ridge: f64,
) -> Result<RidgeCca, AlignError> {
    let params = RidgeCcaParams::new(ridge);
    match weights {
        Some(weights) => params.weights(weights.to_vec()),
        None => params,
    }
    .fit(&DatasetBase::new(x.clone(), y.clone()))
}

/// Distances from every row of one matrix to every row of another.
pub fn distances(from: &Array2<f64>, to: &Array2<f64>) -> Array2<f64> {
    Array2::from_shape_fn((from.nrows(), to.nrows()), |(i, j)| {
        let gap = &from.row(i) - &to.row(j);
        gap.dot(&gap).sqrt()
    })
}

/// `matrix` with row and column i divided by the power `exponent` of `totals[i]`.
pub fn divided(matrix: &Array2<f64>, totals: &Array1<f64>, exponent: f64) -> Array2<f64> {
    Array2::from_shape_fn(matrix.dim(), |(i, j)| {
        matrix[(i, j)] / (totals[i] * totals[j]).powf(exponent)
    })
}

/// Copies into nalgebra's form.
pub fn to_nalgebra(matrix: &Array2<f64>) -> DMatrix<f64> {
    DMatrix::from_fn(matrix.nrows(), matrix.ncols(), |i, j| matrix[(i, j)])
}
