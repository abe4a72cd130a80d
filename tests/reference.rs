//! The numbers: against values from independent programs, against published examples, where methods
//! must coincide, where they must refuse, and what must hold for any input.
//!
//! The values come from numpy, scipy, scikit-learn and statsmodels through
//! `tests/data/reference/make_reference.py`; their versions stand in `reference.json` and in every
//! message of failure. No reference value was made by this crate.

#[path = "common/reference.rs"]
mod common;

use kinmark::affinity::{Likeness, Profiles};
use kinmark::align::{
    self, Affine, AlignError, Alignment, JointMap, ProcrustesParams, RidgeCcaParams, Scaling,
};
use kinmark::domain::{Connectivity, Pair, Share, Side, Transform, WeightKind};
use kinmark::embed::{components, diffusion_map, DiffusionError, DiffusionTime, Embedding};
use kinmark::linalg::{from_small, largest_eigenpairs, small_svd};
use kinmark::transform::{self, LARGEST_CORRELATION};
use linfa::prelude::*;
use linfa::traits::Transformer;
use ndarray::{array, concatenate, s, Array1, Array2, Axis};

use common::*;

/// Canonical correlations and variates without ridge: dividing by variances magnifies rounding, most
/// where axes are many for the landmarks.
const CANONICAL: f64 = 1e-10;
/// Everything else that comes from decompositions of small matrices, none of them near singular.
const DIRECT: f64 = 1e-11;
/// Transforms, profiles and affinities: a few operations an entry, nothing is solved.
const ENTRYWISE: f64 = 1e-13;
/// Principal components where linfa-reduction's iterative solver gives the axes; it stops early.
const ITERATIVE: f64 = 1e-10;
/// What a relation between two fits keeps after both have been rounded.
const INVARIANCE: f64 = 1e-9;
/// Orthogonality of what is orthogonal by construction.
const ORTHOGONAL: f64 = 1e-12;
/// Recovery of a transformation that was planted without noise.
const RECOVERY: f64 = 1e-10;
/// Eigenvalues of the iterative solver for large matrices; their error is of the order of the
/// squared residual.
const EIGENVALUE: f64 = 1e-10;
/// Residuals of the same solver's eigenpairs.
const EIGENPAIR: f64 = 1e-8;
/// Published correlations are printed to four decimals.
const FOUR_DECIMALS: f64 = 1e-4;
/// Published coordinates are printed to two decimals, and so are the data they were computed from.
const TWO_DECIMALS: f64 = 1e-2;

// ---------------------------------------------------------------------------------------------
// Against independent programs.

/// Rotation, scale, translation and residual: `scipy.linalg.orthogonal_procrustes` on coordinates
/// centred and multiplied by the roots of the weights.
#[test]
fn procrustes_agrees_with_scipy() {
    let source = reference().cite("scipy.linalg.orthogonal_procrustes");
    for case in &reference().procrustes {
        let Weighted { x, y, weights } = &case.inputs;
        let expected = &case.expected;
        for (scaling, size) in [
            (Scaling::Fitted, &expected.scaled),
            (Scaling::One, &expected.unscaled),
        ] {
            let what = |part: &str| format!("{} {scaling:?}: {part} of {source}", case.name);
            let found = fit_procrustes(x, y, weights.as_slice(), scaling).expect("a valid fit");
            let origin = Array2::zeros((1, x.ncols()));
            let translation = found.predict(&origin).remove_axis(Axis(0));
            let determinant = to_nalgebra(&found.rotation).determinant();
            assert_close(
                &found.rotation,
                &expected.rotation,
                DIRECT,
                what("rotation"),
            );
            assert_near(
                determinant,
                expected.determinant,
                DIRECT,
                what("determinant"),
            );
            assert_close(&found.mean_x, &expected.mean_x, DIRECT, what("mean of x"));
            assert_close(&found.mean_y, &expected.mean_y, DIRECT, what("mean of y"));
            assert_near(found.scale, size.scale, DIRECT, what("scale"));
            assert_near(found.residual, size.residual, DIRECT, what("residual"));
            assert_close(&translation, &size.translation, DIRECT, what("translation"));
            assert_eq!(found.fixed, x.ncols(), "{}", what("axes fixed"));
        }
    }
}

/// Distances in the joint space are those after moving one side onto the other by the rotation of
/// `scipy.linalg.orthogonal_procrustes`, at the scale that makes both sides' landmarks spread alike:
/// the least-squares scale would shrink whichever side is moved.
#[test]
fn procrustes_joint_space_has_the_distances_of_scipy() {
    let source = reference().cite("scipy.linalg.orthogonal_procrustes");
    for case in &reference().procrustes {
        let Weighted { x, y, weights } = &case.inputs;
        let (mean_x, mean_y) = (&*case.expected.mean_x, &*case.expected.mean_y);
        let spread = |points: &Array2<f64>, mean: &Array1<f64>| {
            let squares = (points - mean).mapv(|z| z * z).sum_axis(Axis(1));
            squares.dot(&**weights) / weights.sum()
        };
        let scale = (spread(y, mean_y) / spread(x, mean_x)).sqrt();
        let moved = (&**x - mean_x).dot(&*case.expected.rotation) * scale + mean_y;
        let joint = fit_procrustes(x, y, weights.as_slice(), Scaling::Fitted)
            .expect("a valid fit")
            .joint();
        assert_close(
            &cross_distances(&joint, Pair { a: x, b: y }),
            &distances(&moved, y),
            DIRECT,
            format!("{}: distances after {source}", case.name),
        );
    }
}

/// Superimposing whole spaces is the Procrustes problem without weights:
/// `scipy.linalg.orthogonal_procrustes` on centred coordinates.
#[test]
fn superimposing_agrees_with_scipy() {
    let source = reference().cite("scipy.linalg.orthogonal_procrustes");
    let unweighted = |case: &&Case<Weighted, ExpectedProcrustes>| {
        case.inputs
            .weights
            .iter()
            .all(|w| *w == case.inputs.weights[0])
    };
    let mut compared = 0;
    for case in reference().procrustes.iter().filter(unweighted) {
        let Weighted { x, y, .. } = &case.inputs;
        let size = &case.expected.scaled;
        let expected = x.dot(&*case.expected.rotation) * size.scale + &*size.translation;
        let stay = Affine::centred(Array1::zeros(x.ncols()), Array2::eye(x.ncols()));
        let found = stay.then(&JointMap::superimpose(x, y)).apply(x.view());
        let what = format!("{}: positions after {source}", case.name);
        assert_close(&found, &expected, DIRECT, what);
        compared += 1;
    }
    assert!(compared > 0, "no case of equal weights");
}

/// Correlations and variates without ridge and weights:
/// `statsmodels.multivariate.cancorr.CanCorr`, on the Linnerud data and on random draws, one of them
/// with more variables on one side. Signs of variates are arbitrary there, so sizes are compared.
#[test]
fn canonical_correlation_agrees_with_statsmodels() {
    let source = reference().cite("statsmodels.multivariate.cancorr.CanCorr");
    let cases = std::iter::once(&reference().cca_linnerud).chain(&reference().cca_random);
    for case in cases {
        let Unweighted { x, y } = &case.inputs;
        let expected = &case.expected;
        let what = |part: &str| format!("{}: {part} of {source}", case.name);
        let found = fit_canonical(x, y, None, 0.0).expect("a valid fit");
        let correlations = &*expected.correlations;
        assert_close(
            &found.correlations,
            correlations,
            CANONICAL,
            what("correlations"),
        );
        assert_close(
            &found.regularised,
            correlations,
            CANONICAL,
            what("correlations"),
        );
        assert_eq!(found.fixed, correlations.len(), "{}", what("rank"));

        let swapped = fit_canonical(y, x, None, 0.0).expect("a valid fit");
        assert_close(
            &swapped.correlations,
            correlations,
            CANONICAL,
            what("swapped sides"),
        );

        let variates = found.transform(DatasetBase::new(Array2::clone(x), Array2::clone(y)));
        let (u, v) = (
            variates.records().mapv(f64::abs),
            variates.targets().mapv(f64::abs),
        );
        assert_close(
            &u,
            &expected.abs_variates_x,
            CANONICAL,
            what("variates of x"),
        );
        assert_close(
            &v,
            &expected.abs_variates_y,
            CANONICAL,
            what("variates of y"),
        );
    }
}

/// Ridge canonical correlation with weights: the eigenvectors of `Rxx^-1 Sxy Ryy^-1 Syx` from
/// `numpy.linalg.eig`. Signs follow one rule on both sides: the largest canonical weight of the
/// records is positive.
#[test]
fn ridge_canonical_correlation_agrees_with_numpy() {
    let source = reference().cite("numpy.linalg.eig");
    for case in &reference().ridge_cca {
        let Weighted { x, y, weights } = &case.inputs;
        for expected in &case.expected {
            let kappa = expected.kappa;
            let what = |part: &str| format!("{} ridge {kappa}: {part} of {source}", case.name);
            let tolerance = if kappa == 0.0 { CANONICAL } else { DIRECT };
            let found = fit_canonical(x, y, weights.as_slice(), kappa).expect("a valid fit");
            let (regularised, plain) = (
                &*expected.regularised_correlations,
                &*expected.plain_correlations,
            );
            assert_close(
                &found.regularised,
                regularised,
                tolerance,
                what("regularised"),
            );
            assert_close(&found.correlations, plain, tolerance, what("correlations"));

            let first = expected.tied.as_ref().map_or(0, |tied| tied.count);
            for (found, expected, side) in [
                (&found.weights_x, &expected.weights_x, "weights of x"),
                (&found.weights_y, &expected.weights_y, "weights of y"),
            ] {
                let own = found.slice(s![.., first..]);
                assert_close(&own.t(), &expected.view(), tolerance, what(side));
            }
            if let Some(tied) = &expected.tied {
                for (found, expected, side) in [
                    (&found.weights_x, &tied.outer_x, "tied weights of x"),
                    (&found.weights_y, &tied.outer_y, "tied weights of y"),
                ] {
                    let shared = found.slice(s![.., ..first]);
                    assert_close(&shared.dot(&shared.t()), expected, tolerance, what(side));
                }
                // Joint distances need the tied pairs one by one, which the reference leaves open.
                continue;
            }

            // In the joint space each variate counts by its regularised correlation.
            let position = |points: &Array2<f64>, rows: &Array2<f64>| {
                let mean = weights.dot(points);
                (points - &mean).dot(&rows.t()) * regularised
            };
            assert_close(
                &cross_distances(&found.joint(), Pair { a: x, b: y }),
                &distances(
                    &position(x, &expected.weights_x),
                    &position(y, &expected.weights_y),
                ),
                tolerance,
                what("joint distances"),
            );
        }
    }
}

/// Eigenvalues and coordinates of diffusion maps, for three density exponents and three times (0
/// standing for all scales): `numpy.linalg.eigh` of the normalised affinity. Signs follow one rule
/// on both sides: the largest coordinate on an axis is positive.
#[test]
fn diffusion_maps_agree_with_numpy() {
    let source = reference().cite("numpy.linalg.eigh");
    for case in &reference().diffusion {
        for expected in &case.expected {
            let ExpectedDiffusion { alpha, t, .. } = expected;
            let what = |part: &str| format!("{} a={alpha} t={t}: {part} of {source}", case.name);
            let found = map_of(&case.inputs.affinity, *alpha, *t, 6);
            let (eigenvalues, coordinates) = (&*expected.eigenvalues, &*expected.coordinates);
            assert_close(&found.eigenvalues, eigenvalues, DIRECT, what("eigenvalues"));
            assert_close(&found.coordinates, coordinates, DIRECT, what("coordinates"));
        }
    }
}

/// Scores, variances and shares of principal components: `numpy.linalg.svd` of the centred profiles.
/// Signs follow one rule on both sides: the largest score of a component is positive.
///
/// Few axes of many profiles come from linfa-reduction's iterative solver, many from a dense
/// decomposition; both are compared.
#[test]
fn components_agree_with_numpy() {
    let source = reference().cite("numpy.linalg.svd");
    for case in &reference().components {
        let profiles = &*case.inputs.profiles;
        let expected = &case.expected;
        let [few, many] = [3, 6].map(|axes| components(profiles, axes));
        for (found, solver, tolerance) in [(&few, "iterative", ITERATIVE), (&many, "dense", DIRECT)]
        {
            let what = |part: &str| format!("{} {solver}: {part} of {source}", case.name);
            let axes = found.axes();
            let scores = expected.scores.slice(s![.., ..axes]);
            let leading = |of: &Vector| of.slice(s![..axes]).to_owned();
            let lengths = found
                .coordinates
                .map_axis(Axis(0), |score| score.dot(&score).sqrt());
            let singular = leading(&expected.singular_values);
            let (variances, shares) = (leading(&expected.variances), leading(&expected.shares));
            assert_close(
                &found.coordinates.view(),
                &scores,
                tolerance,
                what("scores"),
            );
            assert_close(&lengths, &singular, tolerance, what("singular values"));
            assert_close(&found.eigenvalues, &variances, tolerance, what("variances"));
            assert_close(&found.shares, &shares, tolerance, what("shares"));
        }
        // Falling back would give the dense scores to the bit, and the solver would go untested.
        assert_eq!((few.axes(), many.axes()), (3, 6), "{}", case.name);
        assert_ne!(
            few.coordinates,
            many.coordinates.slice(s![.., ..3]),
            "{}: the iterative solver was not used",
            case.name
        );
    }
}

/// Profiles and affinities of a directed network: `sklearn.metrics.pairwise.cosine_similarity` and
/// `numpy.corrcoef`, negative values cut.
#[test]
fn directed_affinities_agree_with_scikit_learn_and_numpy() {
    let cosine = reference().cite("sklearn.metrics.pairwise.cosine_similarity");
    let pearson = reference().cite("numpy.corrcoef");
    for case in &reference().affinity.directed {
        let profiles = Profiles::new(case.inputs.weights.view(), Share::ALL);
        let expected = &case.expected;
        assert_close(
            &profiles.matrix(),
            &expected.profiles,
            ENTRYWISE,
            format!("{}: profiles", case.name),
        );
        for (likeness, expected, source) in [
            (Likeness::Cosine, &expected.cosine, &cosine),
            (Likeness::Pearson, &expected.pearson, &pearson),
        ] {
            let what = format!("{}: {source}", case.name);
            assert_close(&profiles.affinity(likeness), expected, ENTRYWISE, what);
        }
    }
}

/// From correlations over Fisher's z and the strongest links to affinities: `numpy.arctanh` and
/// `sklearn.metrics.pairwise.cosine_similarity`. One case has ties at the cut.
///
/// Only shares below 1 are compared. A share of 1 means that nothing is cut, so that negative
/// correlations stay in the profiles; the reference cuts them at every share.
#[test]
fn affinities_of_correlations_agree_with_scikit_learn() {
    let source = [
        reference().cite("numpy.arctanh"),
        reference().cite("sklearn.metrics.pairwise.cosine_similarity"),
    ]
    .join(" and ");
    for case in &reference().affinity.correlation {
        let correlation = &*case.inputs.correlation;
        assert_below_the_cut(correlation, &case.name);
        let z = strengths(correlation, WeightKind::Correlations, Transform::FisherZ);
        let partial = case.expected.iter().filter(|e| e.share < 1.0);
        assert_ne!(
            partial.clone().count(),
            0,
            "{}: no share below 1",
            case.name
        );
        for expected in partial {
            let what = |part: &str| format!("{} {}: {part} of {source}", case.name, expected.share);
            let share = Share::new(expected.share).expect("a share in (0, 1]");
            let profiles = Profiles::new(z.view(), share);
            let affinity = profiles.affinity(Likeness::Cosine);
            assert_close(
                &profiles.matrix(),
                &expected.kept,
                ENTRYWISE,
                what("profiles"),
            );
            assert_close(&affinity, &expected.cosine, ENTRYWISE, what("affinity"));
        }
    }
}

/// Transforms of weights: `numpy.log1p`, `numpy.log10`, `numpy.arctanh` and `scipy.stats.rankdata`,
/// off the diagonal. The cases have counts with a diagonal, zeros, full matrices, and signed
/// correlations with and without zeros.
#[test]
fn transforms_agree_with_numpy_and_scipy() {
    for case in &reference().transforms {
        let expected = &case.expected;
        let kind = if expected.fisher_z.is_some() {
            assert_below_the_cut(&case.inputs.matrix, &case.name);
            WeightKind::Correlations
        } else {
            WeightKind::Counts
        };
        for (transform, expected, function) in [
            (Transform::Log1p, expected.log1p.as_ref(), "numpy.log1p"),
            (
                Transform::LogFloor,
                expected.log_floor.as_ref(),
                "numpy.log10",
            ),
            (
                Transform::FisherZ,
                expected.fisher_z.as_ref(),
                "numpy.arctanh",
            ),
            (
                Transform::Ranks,
                Some(&expected.ranks),
                "scipy.stats.rankdata",
            ),
        ] {
            let Some(expected) = expected else { continue };
            let found = strengths(&case.inputs.matrix, kind, transform);
            let what = format!("{} {transform}: {}", case.name, reference().cite(function));
            assert_close(&found, expected, ENTRYWISE, what);
        }
    }
}

/// Weights given as decimal logarithms become what the weights themselves become: `numpy.log1p` and
/// `numpy.log10` of the weights. Absent connections have no logarithm, so only full matrices serve.
#[test]
fn logarithms_agree_with_numpy_on_the_weights() {
    let mut compared = 0;
    for case in &reference().transforms {
        let mut entries = case.inputs.matrix.indexed_iter();
        if !entries.all(|((i, j), w)| i == j || *w > 0.0) {
            continue;
        }
        // Without a link to itself, a parcel has minus infinity there, which must not be read.
        let logarithms = case.inputs.matrix.mapv(f64::log10);
        for (transform, expected, function) in [
            (Transform::Log1p, &case.expected.log1p, "numpy.log1p"),
            (Transform::LogFloor, &case.expected.log_floor, "numpy.log10"),
        ] {
            let expected = expected.as_ref().expect("positive weights have logarithms");
            let found = strengths(&logarithms, WeightKind::Log10, transform);
            let what = format!("{} {transform}: {}", case.name, reference().cite(function));
            assert_close(&found, expected, ENTRYWISE, what);
            compared += 1;
        }
    }
    assert!(compared > 0, "no full matrix");
}

// ---------------------------------------------------------------------------------------------
// Published examples.

/// Fitness club data of A. C. Linnerud in the CANCORR procedure, SAS/STAT User's Guide: canonical
/// correlations .7956, .2006 and .0726, cited from memory. The version of the data is that of
/// scikit-learn, named in the message.
#[test]
fn linnerud_correlations_are_the_published_ones() {
    let case = &reference().cca_linnerud;
    let (Some(published), Some(source)) = (
        &case.expected.published_correlations,
        &case.expected.published_source,
    ) else {
        panic!("the Linnerud case has published values");
    };
    let found = fit_canonical(&case.inputs.x, &case.inputs.y, None, 0.0).expect("a valid fit");
    let data = reference().cite("sklearn.datasets.load_linnerud");
    let what = format!("{source}, data of {data}");
    assert_close(&found.correlations, published, FOUR_DECIMALS, what);
}

/// Borg & Groenen (2005), Modern Multidimensional Scaling, 2nd edition, Springer, section 20.3: a
/// rectangle is turned, reflected, halved and shifted, and Procrustes brings it back. Values cited
/// from memory; the book prints two decimals.
#[test]
fn a_rectangle_moves_as_in_borg_and_groenen() {
    let source = "Borg & Groenen (2005), section 20.3";
    let target = array![[1.0, 2.0], [-1.0, 2.0], [-1.0, -2.0], [1.0, -2.0]];
    let moved = array![[0.07, 2.62], [0.93, 3.12], [1.93, 1.38], [1.07, 0.88]];
    let found = fit_procrustes(&moved, &target, None, Scaling::Fitted).expect("a valid fit");
    let rotation = array![[-0.866, -0.5], [-0.5, 0.866]];
    let translation = found.predict(&Array2::zeros((1, 2)));
    assert_close(
        &found.rotation,
        &rotation,
        TWO_DECIMALS,
        format!("{source}, rotation"),
    );
    assert_near(found.scale, 2.0, TWO_DECIMALS, format!("{source}, scale"));
    let what = format!("{source}, translation");
    assert_close(&translation, &array![[3.73, -2.46]], TWO_DECIMALS, what);
    let what = format!("{source}, fitted points");
    assert_close(&found.predict(&moved), &target, TWO_DECIMALS, what);
}

// ---------------------------------------------------------------------------------------------
// Where methods must coincide.

/// With one axis a side there is one pair of directions, so that the canonical correlation is the
/// weighted Pearson correlation without its sign; and the scale of Procrustes is the slope of the
/// weighted regression without its sign.
#[test]
fn one_axis_gives_correlation_and_regression() {
    for_each_draw(|seed, rng| {
        let Pair { a: x, b: y } = related(rng, 9, 1);
        let weights = random_weights(rng, 9);
        let total: f64 = weights.iter().sum();
        let mean = |of: &dyn Fn(usize) -> f64| -> f64 {
            (0..9).map(|i| weights[i] * of(i)).sum::<f64>() / total
        };
        let (mean_x, mean_y) = (mean(&|i| x[(i, 0)]), mean(&|i| y[(i, 0)]));
        let xx = mean(&|i| (x[(i, 0)] - mean_x).powi(2));
        let yy = mean(&|i| (y[(i, 0)] - mean_y).powi(2));
        let xy = mean(&|i| (x[(i, 0)] - mean_x) * (y[(i, 0)] - mean_y));

        let canonical = fit_canonical(&x, &y, Some(&weights), 0.0).expect("a valid fit");
        let pearson = (xy / (xx * yy).sqrt()).abs();
        let what = format!("seed {seed}: weighted Pearson correlation");
        assert_close(&canonical.correlations, &array![pearson], DIRECT, &what);
        assert_close(&canonical.regularised, &array![pearson], DIRECT, &what);

        let procrustes =
            fit_procrustes(&x, &y, Some(&weights), Scaling::Fitted).expect("a valid fit");
        let what = format!("seed {seed}: weighted regression");
        assert_near(procrustes.scale, xy.abs() / xx, DIRECT, &what);
        assert_close(&procrustes.rotation, &array![[xy.signum()]], DIRECT, &what);
        assert_near(procrustes.residual, yy - xy * xy / xx, DIRECT, &what);
    });
}

/// Weights say how much landmarks count relative to each other, and nothing else.
#[test]
fn only_ratios_of_weights_matter() {
    for_each_draw(|seed, rng| {
        let Pair { a: x, b: y } = related(rng, 12, 4);
        let weights = random_weights(rng, 12);
        let doubled: Vec<f64> = weights.iter().map(|w| 2.0 * w).collect();
        // Doubling is exact in binary, so that no bit may change.
        for scaling in [Scaling::Fitted, Scaling::One] {
            let [once, twice] = [&weights, &doubled]
                .map(|w| fit_procrustes(&x, &y, Some(w), scaling).expect("a valid fit"));
            assert_eq!(once, twice, "seed {seed}: doubled weights, {scaling:?}");
        }
        for ridge in [0.0, 0.2] {
            let [once, twice] = [&weights, &doubled]
                .map(|w| fit_canonical(&x, &y, Some(w), ridge).expect("a valid fit"));
            assert_eq!(once, twice, "seed {seed}: doubled weights, ridge {ridge}");
        }
        let what = format!("seed {seed}: equal weights");
        assert_same_fits((&x, &y, Some(&[0.3; 12])), (&x, &y, None), &what);
    });
}

/// A landmark without weight has no influence.
#[test]
fn a_landmark_of_weight_zero_is_left_out() {
    for_each_draw(|seed, rng| {
        let Pair { a: x, b: y } = related(rng, 12, 4);
        let mut weights = random_weights(rng, 12);
        let out = seed as usize % 12;
        weights[out] = 0.0;
        let kept: Vec<usize> = (0..12).filter(|i| *i != out).collect();
        let (fewer_x, fewer_y) = (x.select(Axis(0), &kept), y.select(Axis(0), &kept));
        let fewer: Vec<f64> = kept.iter().map(|i| weights[*i]).collect();
        assert_same_fits(
            (&x, &y, Some(&weights)),
            (&fewer_x, &fewer_y, Some(&fewer)),
            &format!("seed {seed}: landmark {out} left out"),
        );
    });
}

// ---------------------------------------------------------------------------------------------
// Refusals.

/// Asserts that a fit was refused for a reason.
macro_rules! assert_refused {
    ($fit:expr, $reason:pat $(if $guard:expr)?) => {
        match $fit {
            Err($reason) $(if $guard)? => {}
            Err(other) => panic!("{}: refused for another reason: {other:?}", stringify!($fit)),
            Ok(_) => panic!("{}: not refused", stringify!($fit)),
        }
    };
}

/// Weights must be one for each landmark, finite, not negative, and at least two of them positive.
#[test]
fn weights_that_cannot_be_used_are_refused() {
    let x = array![[1.0, 0.0], [0.0, 1.0], [2.0, 3.0]];
    let y = array![[0.5, 0.0], [0.0, 0.7], [1.0, 2.0]];
    let procrustes = |weights: &[f64]| fit_procrustes(&x, &y, Some(weights), Scaling::Fitted);
    let canonical = |weights: &[f64]| fit_canonical(&x, &y, Some(weights), 0.1);

    for count in [0, 2, 4] {
        let weights = vec![1.0; count];
        assert_refused!(
            procrustes(&weights),
            AlignError::WeightCount { weights, landmarks: 3 } if weights == count
        );
        assert_refused!(
            canonical(&weights),
            AlignError::WeightCount { weights, landmarks: 3 } if weights == count
        );
    }
    for bad in [-1.0, -1e-300, f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
        let weights = [1.0, bad, 1.0];
        let is_it = |found: f64| found.to_bits() == bad.to_bits();
        assert_refused!(procrustes(&weights), AlignError::BadWeight(found) if is_it(found));
        assert_refused!(canonical(&weights), AlignError::BadWeight(found) if is_it(found));
    }
    for (weights, positive) in [([0.0; 3], 0), ([0.0, 3.0, 0.0], 1)] {
        assert_refused!(procrustes(&weights), AlignError::TooFew(found) if found == positive);
        assert_refused!(canonical(&weights), AlignError::TooFew(found) if found == positive);
    }
    // Two positive weights are enough.
    assert!(procrustes(&[0.0, 3.0, 0.1]).is_ok());
    assert!(canonical(&[0.0, 3.0, 0.1]).is_ok());
}

/// Landmarks must match row by row; a rotation needs as many axes on both sides, canonical
/// correlation does not.
#[test]
fn shapes_that_do_not_fit_are_refused() {
    let (x, longer) = (Array2::eye(3), Array2::from_elem((4, 3), 1.0));
    let narrower = array![[1.0, 0.0], [0.0, 1.0], [2.0, 3.0]];
    let one = Array2::ones((1, 3));
    assert_refused!(
        fit_procrustes(&x, &longer, None, Scaling::Fitted),
        AlignError::RowsDiffer { x: 3, y: 4 }
    );
    assert_refused!(
        fit_canonical(&x, &longer, None, 0.1),
        AlignError::RowsDiffer { x: 3, y: 4 }
    );
    assert_refused!(
        fit_procrustes(&x, &narrower, None, Scaling::Fitted),
        AlignError::AxesDiffer { x: 3, y: 2 }
    );
    assert!(fit_canonical(&x, &narrower, None, 0.1).is_ok());
    assert_refused!(
        fit_procrustes(&one, &one, None, Scaling::Fitted),
        AlignError::TooFew(1)
    );
    assert_refused!(fit_canonical(&one, &one, None, 0.1), AlignError::TooFew(1));
}

/// A ridge adds to variances, so that it must be finite and not negative; zero is allowed.
#[test]
fn ridges_that_cannot_be_used_are_refused() {
    let x = array![[1.0, 0.0], [0.0, 1.0], [2.0, 3.0]];
    for bad in [-0.1, f64::NAN, f64::INFINITY] {
        assert_refused!(
            fit_canonical(&x, &x, None, bad),
            AlignError::BadRidge(found) if found.to_bits() == bad.to_bits()
        );
    }
    assert!(fit_canonical(&x, &x, None, 0.0).is_ok());
}

// ---------------------------------------------------------------------------------------------
// What holds for any input.

/// Every method rests on singular values of small matrices. Their product gives back the matrix, also
/// where values coincide (axes both embeddings share exactly) or vanish (fewer landmarks than axes).
#[test]
fn small_singular_value_decompositions_are_complete() {
    for_each_draw(|seed, rng| {
        let matrices = (2..9).flat_map(|axes| {
            let full = normal(rng, axes, axes);
            let deficient = normal(rng, axes, 2).dot(&normal(rng, 2, axes));
            let mut values = Array1::linspace(1.0, 0.1, axes);
            values.slice_mut(s![..axes / 2 + 1]).fill(1.0);
            let tied = (orthogonal(rng, axes, 1.0) * values).dot(&orthogonal(rng, axes, 1.0));
            [("full", full), ("rank 2", deficient), ("tied", tied)]
        });
        for (kind, matrix) in matrices {
            let axes = matrix.nrows();
            let what = |part: &str| format!("seed {seed}, {kind}, {axes} axes: {part}");
            let svd = small_svd(&to_nalgebra(&matrix));
            let (u, v) = (from_small(&svd.u), from_small(&svd.v));
            let product = (&u * &Array1::from(svd.values.clone())).dot(&v.t());
            let identity = Array2::eye(axes);
            assert_close(&product, &matrix, ORTHOGONAL, what("product"));
            assert_close(&u.t().dot(&u), &identity, ORTHOGONAL, what("left vectors"));
            assert_close(&v.t().dot(&v), &identity, ORTHOGONAL, what("right vectors"));
            assert!(
                svd.values.windows(2).all(|w| w[0] >= w[1]),
                "{}",
                what("order")
            );
        }
    });
}

/// The residual that is reported, from singular values, is the one that moving the landmarks leaves.
/// It is least: no small turn makes it smaller.
#[test]
fn residuals_are_those_of_the_moved_landmarks() {
    for_each_draw(|seed, rng| {
        for (landmarks, axes) in [(3, 5), (4, 8), (12, 4)] {
            let (x, y) = (normal(rng, landmarks, axes), normal(rng, landmarks, axes));
            let weights = Array1::from(random_weights(rng, landmarks));
            let found =
                fit_procrustes(&x, &y, weights.as_slice(), Scaling::Fitted).expect("a valid fit");
            let left = |moved: &Array2<f64>| {
                let squares = (moved - &y).mapv(|gap| gap * gap).sum_axis(Axis(1));
                weights.dot(&squares) / weights.sum()
            };
            let what = format!("seed {seed}, {landmarks} landmarks, {axes} axes");
            let moved = found.predict(&x);
            assert_near(left(&moved), found.residual, INVARIANCE, &what);
            for angle in [-0.01_f64, 0.01] {
                let mut turn = Array2::eye(axes);
                turn.slice_mut(s![..2, ..2]).assign(&array![
                    [angle.cos(), -angle.sin()],
                    [angle.sin(), angle.cos()]
                ]);
                let turned = (&moved - &found.mean_y).dot(&turn) + &found.mean_y;
                assert!(
                    left(&turned) >= found.residual - INVARIANCE,
                    "{what}: turned by {angle}"
                );
            }
        }
    });
}

/// Whatever the landmarks, the rotation keeps lengths and angles, also where there are fewer
/// landmarks than axes and the data leave part of it open.
#[test]
fn rotations_are_orthonormal() {
    for_each_draw(|seed, rng| {
        for (landmarks, axes) in [(3, 5), (12, 2), (14, 8)] {
            let (x, y) = (normal(rng, landmarks, axes), normal(rng, landmarks, axes));
            let weights = random_weights(rng, landmarks);
            let found =
                fit_procrustes(&x, &y, Some(&weights), Scaling::Fitted).expect("a valid fit");
            let what = format!("seed {seed}, {landmarks} landmarks, {axes} axes");
            let rotation = &found.rotation;
            let identity = Array2::eye(axes);
            assert_close(&rotation.t().dot(rotation), &identity, ORTHOGONAL, &what);
            assert_close(&rotation.dot(&rotation.t()), &identity, ORTHOGONAL, &what);
            assert_eq!(found.fixed, axes.min(landmarks - 1), "{what}: axes fixed");
        }
    });
}

/// A rotation or reflection, scale and shift without noise is found again, and leaves no residual.
#[test]
fn planted_similarities_are_recovered() {
    for_each_draw(|seed, rng| {
        for (determinant, scale) in [(1.0, 1.0), (1.0, 0.3), (-1.0, 1.0), (-1.0, 4.0)] {
            let x = normal(rng, 10, 4);
            let turn = orthogonal(rng, 4, determinant);
            let shift = normal_point(rng, 4);
            let y = x.dot(&turn) * scale + &shift;
            let weights = random_weights(rng, 10);
            let what = |part: &str| format!("seed {seed}, det {determinant}, x{scale}: {part}");
            let scalings: &[Scaling] = if scale == 1.0 {
                &[Scaling::Fitted, Scaling::One]
            } else {
                &[Scaling::Fitted]
            };
            for scaling in scalings {
                let found = fit_procrustes(&x, &y, Some(&weights), *scaling).expect("a valid fit");
                let translation = found.predict(&Array2::zeros((1, 4))).remove_axis(Axis(0));
                assert_close(&found.rotation, &turn, RECOVERY, what("rotation"));
                assert_near(found.scale, scale, RECOVERY, what("scale"));
                assert_close(&translation, &shift, RECOVERY, what("translation"));
                assert_near(found.residual, 0.0, RECOVERY, what("residual"));
                assert_close(&found.predict(&x), &y, RECOVERY, what("moved points"));
            }
        }
    });
}

/// The axes of an embedding are no more than a frame: turning either embedding changes no distance
/// between species, with either alignment.
#[test]
fn joint_distances_do_not_depend_on_the_frame() {
    const LANDMARKS: usize = 12;
    const AXES: usize = 4;
    for_each_draw(|seed, rng| {
        let anchors = related(rng, LANDMARKS, AXES);
        let weights = random_weights(rng, LANDMARKS);
        let embedded = anchors.map(|anchors| {
            let others = normal(rng, 20, AXES);
            concatenate(Axis(0), &[anchors.view(), others.view()]).expect("as many axes")
        });
        let turns = Pair {
            a: orthogonal(rng, AXES, -1.0),
            b: orthogonal(rng, AXES, 1.0),
        };
        for (alignment, ridge) in [
            (Alignment::Procrustes, 0.0),
            (Alignment::Canonical, 0.0),
            (Alignment::Canonical, 0.2),
        ] {
            let params = align::Params {
                alignment,
                axes: AXES,
                ridge,
                embedding: 0,
            };
            let found = |embedded: Pair<&Array2<f64>>| {
                let anchors = embedded.map(|all| all.slice(s![..LANDMARKS, ..]).to_owned());
                let joint = align::fit(params, anchors.as_ref(), &weights).expect("a valid fit");
                cross_distances(&joint, embedded)
            };
            let before = found(embedded.as_ref());
            for sides in [&[Side::A][..], &[Side::B], &Side::BOTH] {
                let turned = Pair::from_fn(|side| {
                    if sides.contains(&side) {
                        embedded[side].dot(&turns[side])
                    } else {
                        embedded[side].clone()
                    }
                });
                let what = format!("seed {seed}, {alignment}, ridge {ridge}: turned {sides:?}");
                assert_close(&found(turned.as_ref()), &before, INVARIANCE, what);
            }
        }
    });
}

/// Canonical correlations lie in [0, 1]; a ridge adds to variances only, so that a regularised
/// correlation is at most the plain one, and without ridge both are the same.
#[test]
fn canonical_correlations_lie_between_zero_and_one() {
    for_each_draw(|seed, rng| {
        // The last has more axes than landmarks can tell apart.
        for (landmarks, axes) in [(30, 3), (12, 5), (8, 6)] {
            let Pair { a: x, b: y } = related(rng, landmarks, axes);
            let weights = random_weights(rng, landmarks);
            for ridge in [0.0, 1e-6, 0.1, 10.0] {
                let what = format!("seed {seed}, {landmarks} x {axes}, ridge {ridge}");
                let found = fit_canonical(&x, &y, Some(&weights), ridge).expect("a valid fit");
                for (regularised, plain) in found.regularised.iter().zip(&found.correlations) {
                    assert!((0.0..=1.0).contains(regularised), "{what}: {regularised}");
                    assert!((0.0..=1.0).contains(plain), "{what}: {plain}");
                    assert!(
                        *regularised <= plain + INVARIANCE,
                        "{what}: {regularised} > {plain}"
                    );
                }
                let falls = found
                    .regularised
                    .windows(2)
                    .into_iter()
                    .all(|w| w[0] >= w[1]);
                assert!(falls, "{what}: {} is not in order", found.regularised);
                if ridge == 0.0 {
                    assert_close(&found.regularised, &found.correlations, CANONICAL, &what);
                }
            }
        }
    });
}

/// Without ridge, canonical correlations see only what the axes span: no affine change of either
/// side matters.
#[test]
fn canonical_correlations_without_ridge_are_affinely_invariant() {
    for_each_draw(|seed, rng| {
        let Pair { a: x, b: y } = related(rng, 20, 4);
        let weights = random_weights(rng, 20);
        let changed = |rng: &mut _, points: &Array2<f64>| {
            points.dot(&invertible(rng, 4)) + normal_point(rng, 4) * 3.0
        };
        let (other_x, other_y) = (changed(rng, &x), changed(rng, &y));
        let correlations = |x: &Array2<f64>, y: &Array2<f64>| {
            let found = fit_canonical(x, y, Some(&weights), 0.0).expect("a valid fit");
            found.correlations
        };
        let before = correlations(&x, &y);
        for (x, y, side) in [
            (&other_x, &y, "records"),
            (&x, &other_y, "targets"),
            (&other_x, &other_y, "both"),
        ] {
            let what = format!("seed {seed}: {side} changed");
            assert_close(&correlations(x, y), &before, INVARIANCE, what);
        }
    });
}

/// The order of the parcels carries nothing: permuting them permutes the rows of a diffusion map.
/// With 200 parcels the iterative solver is at work, whose start does depend on the order.
#[test]
fn permuted_parcels_have_permuted_diffusion_maps() {
    for_each_affinity(|what, rng, affinity| {
        let order = permutation(rng, affinity.nrows());
        let permuted =
            Array2::from_shape_fn(affinity.dim(), |(i, j)| affinity[(order[i], order[j])]);
        for t in [0.0, 1.0] {
            let before = map_of(affinity, 0.5, t, 5);
            let after = map_of(&permuted, 0.5, t, 5);
            let rows = before.coordinates.select(Axis(0), &order);
            let what = |part: &str| format!("{what}, t={t}: {part}");
            assert_close(
                &after.eigenvalues,
                &before.eigenvalues,
                INVARIANCE,
                what("eigenvalues"),
            );
            assert_close(&after.coordinates, &rows, INVARIANCE, what("coordinates"));
            assert_close(&after.shares, &before.shares, INVARIANCE, what("shares"));
        }
    });
}

/// A walk goes by ratios of affinities, so that their unit does not matter.
#[test]
fn the_unit_of_affinity_does_not_matter() {
    for_each_affinity(|what, _, affinity| {
        for alpha in [0.0, 0.5, 1.0] {
            let before = map_of(affinity, alpha, 1.0, 5);
            for unit in [1e-3, 7.0] {
                let after = map_of(&(affinity * unit), alpha, 1.0, 5);
                let what = |part: &str| format!("{what}, a={alpha}, unit {unit}: {part}");
                let (values, points) = (&before.eigenvalues, &before.coordinates);
                assert_close(&after.eigenvalues, values, INVARIANCE, what("eigenvalues"));
                assert_close(&after.coordinates, points, INVARIANCE, what("coordinates"));
            }
        }
    });
}

/// The trivial axis, on which all parcels are alike, is in none of the others: under the stationary
/// distribution of the walk every axis has mean zero, and two axes are uncorrelated with second
/// moments of eigenvalue^2t.
#[test]
fn diffusion_axes_are_orthogonal_under_the_stationary_distribution() {
    for_each_affinity(|what, _, affinity| {
        for alpha in [0.0, 0.5, 1.0] {
            let walk = divided(affinity, &affinity.sum_axis(Axis(1)), alpha);
            let degree = walk.sum_axis(Axis(1));
            let stationary = &degree / degree.sum();
            let map = map_of(affinity, alpha, 1.0, 5);
            let what = |part: &str| format!("{what}, a={alpha}: {part}");
            let mean = stationary.dot(&map.coordinates);
            assert_close(&mean, &Array1::zeros(map.axes()), DIRECT, what("mean"));
            let weighted = &map.coordinates * &stationary.insert_axis(Axis(1));
            let moments = weighted.t().dot(&map.coordinates);
            let expected = Array2::from_diag(&map.eigenvalues.mapv(|l| l * l));
            assert_close(&moments, &expected, DIRECT, what("second moments"));
        }
    });
}

/// Large matrices are decomposed iteratively; eigenvalues are those of nalgebra's dense
/// `symmetric_eigen`, and the pairs found are pairs.
#[test]
fn the_iterative_eigensolver_agrees_with_a_dense_one() {
    const PARCELS: usize = 400;
    const LEADING: usize = 10;
    for_few_draws(|seed, rng| {
        let affinity = random_affinity(rng, PARCELS);
        // The normalised affinity, the kind of matrix the solver is for: its spectrum is in [-1, 1].
        let matrix = divided(&affinity, &affinity.sum_axis(Axis(1)), 0.5);
        let (values, vectors) = largest_eigenpairs(matrix.clone(), LEADING);

        let mut dense: Vec<f64> = to_nalgebra(&matrix)
            .symmetric_eigen()
            .eigenvalues
            .iter()
            .copied()
            .collect();
        dense.sort_by(|x, y| y.total_cmp(x));
        dense.truncate(LEADING);
        let what = format!("seed {seed}: eigenvalues of nalgebra");
        assert_close(&values, &Array1::from(dense), EIGENVALUE, what);

        let misses = matrix.dot(&vectors) - &vectors * &values;
        let residuals = misses.map_axis(Axis(0), |miss| miss.dot(&miss).sqrt());
        let what = format!("seed {seed}: residuals");
        assert_close(&residuals, &Array1::zeros(LEADING), EIGENPAIR, what);
        let what = format!("seed {seed}: orthonormality");
        let identity = Array2::eye(LEADING);
        assert_close(&vectors.t().dot(&vectors), &identity, ORTHOGONAL, what);

        // Asked for a quarter of all pairs it decomposes fully. Had the iteration failed and fallen
        // back, the leading pairs would be the same to the bit.
        let (_, full) = largest_eigenpairs(matrix, PARCELS / 4);
        assert_ne!(
            vectors,
            full.slice(s![.., ..LEADING]),
            "seed {seed}: the iterative solver was not used"
        );
    });
}

/// Two groups of parcels without a link: one more eigenvalue of 1, and an axis that tells the groups
/// apart. With steps the map exists; all scales together would put the groups endlessly far apart.
#[test]
fn a_disconnected_affinity_has_steps_but_not_all_scales() {
    for_few_draws(|seed, rng| {
        // The larger goes through the iterative solver.
        for (first, second) in [(7, 11), (80, 120)] {
            let what = format!("seed {seed}, groups of {first} and {second}");
            let mut affinity = Array2::zeros((first + second, first + second));
            for (from, to) in [(0, first), (first, first + second)] {
                let group = random_affinity(rng, to - from);
                affinity.slice_mut(s![from..to, from..to]).assign(&group);
            }
            let map = map_of(&affinity, 0.5, 1.0, 4);
            assert!(map.coordinates.iter().all(|x| x.is_finite()), "{what}");
            assert_near(
                map.eigenvalues[0],
                1.0,
                DIRECT,
                format!("{what}: eigenvalue"),
            );
            assert!(
                map.eigenvalues[1] < 1.0 - DIRECT,
                "{what}: {}",
                map.eigenvalues
            );
            let axis = map.coordinates.column(0);
            for group in [axis.slice(s![..first]), axis.slice(s![first..])] {
                let level = Array1::from_elem(group.len(), group[0]);
                assert_close(&group, &level.view(), INVARIANCE, format!("{what}: level"));
            }
            assert!(
                axis[0] * axis[first] < 0.0,
                "{what}: the groups are not told apart"
            );
            assert_eq!(
                diffusion_map(affinity, 0.5, DiffusionTime::from_number(0.0), 4),
                Err(DiffusionError::Disconnected),
                "{what}"
            );
        }
    });
}

// ---------------------------------------------------------------------------------------------
// What several tests above need of the program.

/// Distances in a joint space from every parcel of a to every parcel of b.
fn cross_distances(joint: &JointMap, embedded: Pair<&Array2<f64>>) -> Array2<f64> {
    let positions = joint.positions(embedded);
    distances(&positions.a, &positions.b)
}

/// A diffusion map that must exist; `t` of 0 stands for all scales.
fn map_of(affinity: &Array2<f64>, alpha: f64, t: f64, axes: usize) -> Embedding {
    let time = DiffusionTime::from_number(t);
    diffusion_map(affinity.clone(), alpha, time, axes).expect("a connected affinity, or steps")
}

/// Strengths from the weights of a square matrix.
fn strengths(weights: &Array2<f64>, kind: WeightKind, transform: Transform) -> Array2<f64> {
    let labels: Vec<String> = (0..weights.nrows()).map(|i| i.to_string()).collect();
    let connectivity = Connectivity::new(labels.clone(), labels, weights.clone(), None)
        .expect("a label for each row and column");
    transform::apply(connectivity, kind, transform)
        .weights()
        .clone()
}

/// The program cuts correlations just below 1 before Fisher's z, the reference does not: a case can
/// be compared only where nothing is cut.
fn assert_below_the_cut(correlation: &Array2<f64>, name: &str) {
    for ((i, j), r) in correlation.indexed_iter() {
        assert!(
            i == j || r.abs() < LARGEST_CORRELATION,
            "{name}: correlation {r} would be cut"
        );
    }
}

/// Landmarks of both sides and their weights.
type Landmarks<'l> = (&'l Array2<f64>, &'l Array2<f64>, Option<&'l [f64]>);

/// Both alignments give the same on two sets of landmarks, but for rounding.
fn assert_same_fits(one: Landmarks<'_>, other: Landmarks<'_>, what: &str) {
    for scaling in [Scaling::Fitted, Scaling::One] {
        let [one, other] = [one, other]
            .map(|(x, y, weights)| fit_procrustes(x, y, weights, scaling).expect("a valid fit"));
        let what = |part: &str| format!("{what}, Procrustes {scaling:?}: {part}");
        assert_close(&one.rotation, &other.rotation, INVARIANCE, what("rotation"));
        assert_close(&one.mean_x, &other.mean_x, INVARIANCE, what("mean of x"));
        assert_close(&one.mean_y, &other.mean_y, INVARIANCE, what("mean of y"));
        assert_near(one.scale, other.scale, INVARIANCE, what("scale"));
        assert_near(one.residual, other.residual, INVARIANCE, what("residual"));
    }
    for ridge in [0.0, 0.2] {
        let [one, other] = [one, other]
            .map(|(x, y, weights)| fit_canonical(x, y, weights, ridge).expect("a valid fit"));
        let what = |part: &str| format!("{what}, ridge {ridge}: {part}");
        let (plain, regularised) = (&other.correlations, &other.regularised);
        assert_close(&one.correlations, plain, INVARIANCE, what("correlations"));
        assert_close(
            &one.regularised,
            regularised,
            INVARIANCE,
            what("regularised"),
        );
        assert_close(
            &one.weights_x,
            &other.weights_x,
            INVARIANCE,
            what("weights of x"),
        );
        assert_close(
            &one.weights_y,
            &other.weights_y,
            INVARIANCE,
            what("weights of y"),
        );
    }
}

/// Coordinates that are no numbers, and no coordinates at all, are refused before any decomposition
/// sees them.
#[test]
fn coordinates_must_be_there_and_finite() {
    let good = Array2::from_shape_fn((5, 2), |(i, k)| (i * (k + 1)) as f64);
    let mut bad = good.clone();
    bad[(3, 1)] = f64::NAN;
    let none = Array2::zeros((5, 0));
    for (x, y, fits) in [
        (&good, &good, true),
        (&bad, &good, false),
        (&good, &bad, false),
    ] {
        let dataset = DatasetBase::new(x.clone(), y.clone());
        let procrustes = Fit::fit(&ProcrustesParams::new(), &dataset);
        let canonical = Fit::fit(&RidgeCcaParams::new(0.1), &dataset);
        assert_eq!(procrustes.is_ok(), fits);
        assert_eq!(canonical.is_ok(), fits);
        if !fits {
            assert!(matches!(procrustes, Err(AlignError::NotFinite)));
        }
    }
    let dataset = DatasetBase::new(none.clone(), none);
    let fitted = Fit::fit(&RidgeCcaParams::new(0.1), &dataset);
    assert!(matches!(fitted, Err(AlignError::NoAxes)));
}
