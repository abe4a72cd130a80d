//! Everything that pairs of one study are judged on, computed once.

use std::sync::Mutex;

use super::selected::Lie;
use super::separation::Usual;
use super::spot::logarithm;
use super::view::View;
use crate::bootstrap::interval_of;
use crate::domain::{LandmarkError, Landmarks, Pair};
use crate::evidence::Material;
use crate::holdout::{Asked, Compared, Questions};
use crate::locate::{locate_by, map_without, stand_ins, strain, Located, Watched, Weighed};
use crate::place;
use crate::prepare::{axes_to_try, Study};
use crate::watch::{Interrupted, Watch};

/// What ranks, what was located with it, and named pairs followed through the replicates.
pub struct Ground {
    /// The study, without the landmarks that the questions are about.
    pub study: Study,
    /// Parcels that are no landmark.
    pub open: Pair<Vec<usize>>,
    /// The member of each landmark that is asked.
    pub asked: Asked,
    /// What ranks.
    pub weighed: Weighed,
    /// Where everyone falls.
    pub located: Located,
    /// The ranking with all landmarks and without each block.
    pub view: View,
    /// Where everyone lies.
    pub lie: Lie,
    /// Pairs that were followed.
    pub pairs: Vec<Pair<usize>>,
    /// What became of them.
    pub watched: Watched,
}

impl Ground {
    /// Locates everyone and follows `pairs` of open parcels.
    ///
    /// # Errors
    /// [`Interrupted`] where the watch says so.
    ///
    /// # Panics
    /// If a parcel of a pair is a landmark's.
    pub fn new(
        study: Study,
        pairs: Vec<Pair<usize>>,
        watch: &dyn Watch,
    ) -> Result<Ground, Interrupted> {
        let material = Material::new(study.species.as_ref(), &study.landmarks);
        let open = place::open_parcels(&study.landmarks, material.sizes());
        let asked = Asked::draw(&study.landmarks, &study.candidates, study.settings.seed);
        let questions = Questions {
            open: &open,
            candidates: &study.candidates,
            asked: &asked,
            seed: study.settings.seed,
        };
        let weighed = Weighed::new(&study.settings, &study.axes, &material, &questions, watch)?;
        let stands = stand_ins(&study.landmarks, study.settings.seed);
        let without: Mutex<Vec<Option<Compared>>> = Mutex::new(vec![None; stands.len()]);
        let keep = |at: usize, compared: &Compared| {
            if let Some(block) = stands.iter().position(|&stand| stand == at) {
                without.lock().expect("no one panics while keeping")[block] =
                    Some(compared.clone());
            }
        };
        let (located, watched) = locate_by(
            &study, &material, &questions, &weighed, &pairs, &keep, watch,
        )?;
        let without = without.into_inner().expect("no one panics while keeping");
        let ranked = weighed.ranked(&material, &questions);
        let view = View {
            full: ranked.full(open.clone()),
            without: stands
                .into_iter()
                .zip(without)
                .map(|(at, compared)| (at, compared.unwrap_or_else(|| ranked.without(at))))
                .collect(),
        };
        let space = &located.spaces[located.choice.evidence];
        let left_out = view.without.iter();
        let left_out = left_out.map(|(at, _)| logarithm(located.left_out[*at].distance));
        let usual = Usual::of(&left_out.collect::<Vec<f64>>());
        let lie = Lie {
            full: space.positions.clone(),
            without: view
                .without
                .iter()
                .map(|(at, _)| {
                    let block = study.landmarks.list()[*at].block;
                    let found = &located.left_out[*at];
                    let map = || map_without(&material, found.chosen, block);
                    let is_contradicted = found.contradicted.is_some();
                    (!is_contradicted)
                        .then(|| map().positions(material.embedded_in(found.chosen.embedding)))
                })
                .collect(),
            usual: usual.centre.exp(),
            limit: usual.limit.exp(),
        };
        drop(material);
        Ok(Ground {
            open,
            asked,
            weighed,
            located,
            view,
            lie,
            pairs,
            watched,
            study,
        })
    }

    /// Upper end of a pair's interval, as the logarithm of its distance over its strain; `None` where it
    /// was not followed.
    #[must_use]
    pub fn upper_end(&self, pair: Pair<usize>) -> Option<f64> {
        let index = self.pairs.iter().position(|other| *other == pair)?;
        let material = Material::new(self.study.species.as_ref(), &self.study.landmarks);
        let space = self.located.spaces[self.located.choice.evidence].params;
        let strain = strain(&material, space, &[], &[pair])[0];
        let all = self.watched.distances.iter();
        let all = all.map(|distances| logarithm(distances[index] / strain));
        interval_of(all.collect()).map(|(_, high)| high)
    }

    /// Where a followed pair stands among the pairs.
    ///
    /// # Panics
    /// If it was not followed.
    #[must_use]
    pub fn index(&self, pair: Pair<usize>) -> usize {
        let found = self.pairs.iter().position(|other| *other == pair);
        found.expect("the pair was followed")
    }
}

/// A study without some blocks of its landmarks.
///
/// # Errors
/// [`LandmarkError`] where too few remain.
pub fn without_blocks(study: &Study, blocks: &[usize]) -> Result<Study, LandmarkError> {
    let landmarks: Landmarks = study.landmarks.without(blocks)?;
    let most = study.axes.iter().copied().max().unwrap_or(1);
    Ok(Study {
        axes: axes_to_try(study.settings.axes, landmarks.blocks(), most),
        landmarks,
        ..study.clone()
    })
}
