//! The number of axes and the alignment that left-out landmarks favour.

use serde::Serialize;

use super::trials::{Trials, Way};
use crate::align::{Alignment, PerAlignment};

/// Left-out error of one number of axes.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Point {
    /// Axes of the joint space.
    pub axes: usize,
    /// Mean left-out error over blocks: 0 where every counterpart comes first, 1 where all come last.
    pub error: f64,
    /// Its standard error over blocks.
    pub standard_error: f64,
}

/// Left-out error of one alignment against its number of axes.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Curve {
    /// The alignment.
    pub alignment: Alignment,
    /// One point for each number of axes that was tried.
    pub points: Vec<Point>,
}

/// What a run settles on.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Choice {
    /// Axes of each alignment.
    pub axes: PerAlignment<usize>,
    /// The alignment whose distances rank.
    pub evidence: Alignment,
    /// Which of the embeddings that were tried.
    #[serde(skip)]
    pub embedding: usize,
    /// Index of the way of ranking that this amounts to.
    #[serde(skip)]
    pub way: usize,
    /// Indices of the ways that rank by either alignment on its axes.
    #[serde(skip)]
    pub ways: PerAlignment<usize>,
}

/// Chooses by left-out landmarks, `without` one block altogether where asked.
///
/// Errors of few landmarks are rough, so differences within one standard error (of the difference,
/// over blocks: the same blocks judge every way) decide nothing. For each alignment that leaves
/// several numbers of axes, of which the largest is taken: too few axes put different parcels in one
/// place, while a surplus is held in check by the ridge and by the axes' own decreasing weight. Of
/// both alignments canonical correlation is taken, unless Procrustes is better by more than the
/// standard error or `evidence` names one. Of several embeddings the one is taken whose alignment, so
/// chosen, has the least mean error. docs/method.md has the measurements behind these rules.
///
/// # Panics
/// If `ways` lacks an alignment.
#[must_use]
pub fn choose(
    ways: &[Way],
    trials: &Trials,
    evidence: Option<Alignment>,
    without: Option<usize>,
) -> Choice {
    (0..embeddings(ways))
        .map(|embedding| choose_in(embedding, ways, trials, evidence, without))
        .min_by(|x, y| mean(&x.1).total_cmp(&mean(&y.1)))
        .expect("there is an embedding")
        .0
}

/// What each embedding's best comes to: mean left-out error over blocks and its standard error.
#[must_use]
pub fn errors_of_embeddings(
    ways: &[Way],
    trials: &Trials,
    evidence: Option<Alignment>,
) -> Vec<(f64, f64)> {
    (0..embeddings(ways))
        .map(|embedding| choose_in(embedding, ways, trials, evidence, None).1)
        .map(|errors| (mean(&errors), standard_error(&errors)))
        .collect()
}

/// Number of embeddings that were tried.
fn embeddings(ways: &[Way]) -> usize {
    let last = ways.iter().filter_map(Way::joint).map(|p| p.embedding);
    last.max().map_or(1, |last| last + 1)
}

/// What to settle on in one embedding, and its left-out errors.
fn choose_in(
    embedding: usize,
    ways: &[Way],
    trials: &Trials,
    evidence: Option<Alignment>,
    without: Option<usize>,
) -> (Choice, Vec<f64>) {
    let axes = |at: usize| ways[at].joint().map_or(0, |params| params.axes);
    let best = PerAlignment::from_fn(|alignment| {
        let tried: Vec<(usize, Vec<f64>)> = ways
            .iter()
            .enumerate()
            .filter(|(_, way)| {
                way.joint()
                    .is_some_and(|p| p.alignment == alignment && p.embedding == embedding)
            })
            .map(|(at, _)| (at, trials.errors(at, without)))
            .collect();
        let (_, least) = tried
            .iter()
            .min_by(|x, y| mean(&x.1).total_cmp(&mean(&y.1)))
            .expect("every alignment is tried");
        let (at, errors) = tried
            .iter()
            .filter(|(_, errors)| !clearly_less(least, errors))
            .max_by_key(|(at, _)| axes(*at))
            .expect("the least itself qualifies");
        (*at, errors.clone())
    });
    let evidence = evidence.unwrap_or_else(|| {
        if clearly_less(&best.procrustes.1, &best.canonical.1) {
            Alignment::Procrustes
        } else {
            Alignment::Canonical
        }
    });
    let choice = Choice {
        axes: PerAlignment::from_fn(|alignment| axes(best[alignment].0)),
        evidence,
        embedding,
        way: best[evidence].0,
        ways: PerAlignment::from_fn(|alignment| best[alignment].0),
    };
    (choice, best[evidence].1.clone())
}

/// Whether errors are smaller than others by more than the standard error of the difference.
fn clearly_less(errors: &[f64], others: &[f64]) -> bool {
    let excess: Vec<f64> = others.iter().zip(errors).map(|(x, y)| x - y).collect();
    mean(&excess) > standard_error(&excess)
}

impl Curve {
    /// The whole curve of an alignment in one embedding, for people to look at.
    #[must_use]
    pub fn of(alignment: Alignment, embedding: usize, ways: &[Way], trials: &Trials) -> Curve {
        Curve {
            alignment,
            points: ways
                .iter()
                .enumerate()
                .filter_map(|(at, way)| Some((at, way.joint()?)))
                .filter(|(_, p)| p.alignment == alignment && p.embedding == embedding)
                .map(|(at, params)| {
                    let errors = trials.errors(at, None);
                    Point {
                        axes: params.axes,
                        error: mean(&errors),
                        standard_error: standard_error(&errors),
                    }
                })
                .collect(),
        }
    }
}

fn mean(values: &[f64]) -> f64 {
    values.iter().sum::<f64>() / values.len() as f64
}

fn standard_error(values: &[f64]) -> f64 {
    let n = values.len() as f64;
    if n < 2.0 {
        return 0.0;
    }
    let mean = mean(values);
    let squares: f64 = values.iter().map(|x| (x - mean).powi(2)).sum();
    (squares / (n - 1.0) / n).sqrt()
}
