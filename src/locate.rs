//! The main job: where every parcel of either species falls in the other's space.

mod axes;
mod left_out;
mod replicates;
mod span;

pub use axes::{AxisEnds, Space};
pub use left_out::LeftOut;
pub use replicates::Tally;
pub use span::beyond_landmarks;

use ndarray::{Array2, ArrayView1};

use crate::align::{Alignment, Params, PerAlignment};
use crate::bootstrap::{interval, Purpose, Stream};
use crate::domain::{Pair, Side};
use crate::evidence::{Evidence, Material};
use crate::holdout::{self, Asked, Choice, Curve, Way};
use crate::place;
use crate::prepare::Study;
use crate::settings::EvidenceChoice;
use crate::warning::Warning;
use crate::watch::{Interrupted, Watch};

/// One candidate for the counterpart of a parcel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Counterpart {
    /// The candidate, a parcel of the other species.
    pub parcel: usize,
    /// Its rank, 1 being the best.
    pub rank: usize,
    /// Interval of its rank over the replicates that rank.
    pub rank_interval: (u32, u32),
    /// Distance in the joint space of the evidence; 1 is that of random pairs.
    pub distance: f64,
    /// Share of replicates in which it comes first.
    pub support: f64,
    /// Whether each is the other's first.
    pub mutual: bool,
}

/// A parcel that is no landmark, and its candidates, best first.
#[derive(Debug, Clone, PartialEq)]
pub struct Placement {
    /// The parcel.
    pub parcel: usize,
    /// Its candidates.
    pub counterparts: Vec<Counterpart>,
}

/// Everything `locate` finds.
#[derive(Debug, Clone)]
pub struct Located {
    /// Left-out error of both alignments against the number of axes.
    pub curves: Vec<Curve>,
    /// What was settled on.
    pub choice: Choice,
    /// Both joint spaces.
    pub spaces: PerAlignment<Space>,
    /// Every landmark, left out.
    pub left_out: Vec<LeftOut>,
    /// How far outside the landmarks' span each parcel lies; above 1 is beyond every landmark.
    pub beyond: Pair<Vec<f64>>,
    /// Placements of the parcels that are no landmark, in the order of the input file.
    pub placements: Pair<Vec<Placement>>,
    /// What came up on the way.
    pub warnings: Vec<Warning>,
}

/// Places every parcel.
///
/// # Errors
/// [`Interrupted`] where the watch says so.
///
/// # Panics
/// If an alignment cannot be fitted, which the checks on a [`Study`] rule out.
pub fn locate(study: &Study, watch: &dyn Watch) -> Result<Located, Interrupted> {
    let settings = &study.settings;
    let material = Material::new(study.species.as_ref(), &study.landmarks);
    let open = place::open_parcels(
        &study.landmarks,
        study.species.as_ref().map(|s| s.parcels.len()),
    );
    let params = |alignment, axes| Params {
        alignment,
        axes,
        ridge: settings.ridge,
    };

    let ways: Vec<Way> = Alignment::BOTH
        .into_iter()
        .flat_map(|alignment| study.axes.iter().map(move |&axes| params(alignment, axes)))
        .map(Way)
        .collect();
    let candidates = &study.candidates;
    let asked = Asked::draw(&study.landmarks, candidates, settings.seed);
    let trials = holdout::run(
        &material,
        &ways,
        &open,
        candidates,
        &asked,
        settings.seed,
        watch,
    )?;
    let evidence = match settings.evidence {
        EvidenceChoice::Auto => None,
        EvidenceChoice::Procrustes => Some(Alignment::Procrustes),
        EvidenceChoice::Canonical => Some(Alignment::Canonical),
    };
    let choice = holdout::choose(&ways, &trials, evidence, None);
    let settled = PerAlignment::from_fn(|alignment| params(alignment, choice.axes[alignment]));

    let left_out = left_out::summarise(&material, &ways, &trials, &choice, evidence, &asked);
    let mut spaces =
        PerAlignment::from_fn(|alignment| Space::fit(&material, settled[alignment], &asked));

    let ranking = JointRanking::new(&material, ways[choice.way], &open, study);
    let tally = replicates::run(study, &material, &spaces, &ranking, watch)?;
    for alignment in Alignment::BOTH {
        spaces[alignment].standard_errors = tally.standard_errors(alignment);
    }

    let placements =
        Pair::from_fn(|side| ranking.placements(side, study, &tally, &spaces[choice.evidence]));
    let mut warnings = Vec::new();
    for (landmark, found) in study.landmarks.list().iter().zip(&left_out) {
        if found.contradicted {
            warnings.push(Warning::Contradicted {
                landmark: landmark.name.clone(),
                from_a: (found.placed.a.rank, found.placed.a.candidates),
                from_b: (found.placed.b.rank, found.placed.b.candidates),
            });
        }
    }
    for alignment in Alignment::BOTH {
        let map = &spaces[alignment].map;
        if map.fixed < map.axes() {
            warnings.push(Warning::LandmarksDoNotSpan {
                alignment: alignment.in_words(),
                axes: map.axes(),
                fixed: map.fixed,
            });
        }
    }
    if tally.degenerate > 0 {
        warnings.push(Warning::DegenerateReplicates {
            replicates: tally.degenerate,
            of: settings.replicates,
        });
    }
    Ok(Located {
        curves: Alignment::BOTH
            .into_iter()
            .map(|alignment| Curve::of(alignment, &ways, &trials))
            .collect(),
        beyond: beyond_landmarks(&material, settled[choice.evidence].axes),
        choice,
        spaces,
        left_out,
        placements,
        warnings,
    })
}

/// The full-sample ranking of open parcels against open parcels, and which of it is listed.
pub struct JointRanking {
    /// What ranks.
    way: Way,
    /// Parcels that are no landmark.
    open: Pair<Vec<usize>>,
    /// For each open parcel its listed candidates, as places in `open` of the other side.
    listed: Pair<Vec<Vec<usize>>>,
}

impl JointRanking {
    fn new(
        material: &Material<'_>,
        way: Way,
        open: &Pair<Vec<usize>>,
        study: &Study,
    ) -> JointRanking {
        let weights = material.weights(|_| 1.0);
        // The full sample comes before the first replicate, so it takes the last index.
        let mut chance = Stream::new(study.settings.seed, Purpose::Evidence, u64::MAX);
        let fitted = way
            .evidence()
            .fit(material, &weights, &mut chance)
            .expect("a checked study has landmarks enough");
        let mut dissimilarities = Array2::zeros((open.a.len(), open.b.len()));
        fitted.dissimilarities(&open.a, &open.b, &mut dissimilarities);
        study
            .candidates
            .close(&open.a, &open.b, &mut dissimilarities);
        let best = |row: ArrayView1<'_, f64>| {
            let mut order = place::order(row);
            let candidates = row.iter().filter(|d| **d < f64::INFINITY).count();
            order.truncate(study.settings.top.of(candidates));
            order
        };
        JointRanking {
            way,
            open: open.clone(),
            listed: Pair {
                a: dissimilarities.rows().into_iter().map(best).collect(),
                b: dissimilarities.columns().into_iter().map(best).collect(),
            },
        }
    }

    fn placements(
        &self,
        side: Side,
        study: &Study,
        tally: &Tally,
        space: &Space,
    ) -> Vec<Placement> {
        let other = side.opposite();
        let mut rank_intervals = tally.rank_intervals(side);
        let mut placements: Vec<Option<Placement>> = vec![None; study.species[side].parcels.len()];
        for (at, listed) in self.listed[side].iter().enumerate() {
            let parcel = self.open[side][at];
            let counterparts = listed
                .iter()
                .enumerate()
                .map(|(place, &candidate)| Counterpart {
                    parcel: self.open[other][candidate],
                    rank: place + 1,
                    rank_interval: rank_intervals.next().expect("one for each listed pair"),
                    distance: space.distance(side, parcel, self.open[other][candidate]),
                    support: tally.support(side, at, candidate),
                    mutual: place == 0 && self.listed[other][candidate].first() == Some(&at),
                })
                .collect();
            placements[parcel] = Some(Placement {
                parcel,
                counterparts,
            });
        }
        let as_listed = study.species[side].parcels.as_listed();
        as_listed
            .iter()
            .filter_map(|&parcel| placements[parcel].take())
            .collect()
    }
}

/// Intervals of ranks, one for each listed pair in order.
fn intervals(ranks: &[Vec<u32>], pairs: usize) -> Vec<(u32, u32)> {
    let mut of_pair = Vec::with_capacity(ranks.len());
    (0..pairs)
        .map(|pair| {
            of_pair.clear();
            of_pair.extend(ranks.iter().map(|replicate| replicate[pair]));
            interval(&mut of_pair).expect("at least one replicate ranks")
        })
        .collect()
}
