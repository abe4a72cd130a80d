//! Every kind of evidence judged and weighed by left-out landmarks: what ranks, and on what grounds.

use std::sync::Arc;

use super::left_out::{firsts, summarise, LeftOut};
use crate::align::Alignment;
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Pair, Seed};
use crate::evidence::{Evidence, Expression, Grown, Kind, Material, Transport, Unavailable};
use crate::holdout::{
    self, Choice, Compared, FirstOf, Member, OutOfBag, Questions, Ranked, Trials, Way,
};
use crate::settings::{EvidenceChoice, Settings};
use crate::watch::{Interrupted, Watch};

/// What ranks, chosen and weighed by left-out landmarks.
#[derive(Debug, Clone)]
pub struct Weighed {
    /// Every way of ranking that was judged.
    pub ways: Vec<Way>,
    /// What left-out landmarks say about them.
    pub trials: Trials,
    /// Axes of both joint spaces, and which of them ranks or shows distances.
    pub choice: Choice,
    /// The kinds that rank, with their weights.
    pub members: Vec<Member>,
    /// Whether their ranks are blended.
    pub blends: bool,
    /// Replicates of transport, where it takes part.
    pub bagged: Option<Arc<OutOfBag>>,
    /// Kinds that have nothing to say about this study.
    pub unavailable: Vec<Unavailable>,
    /// The alignment that was asked for, if one was.
    alignment: Option<Alignment>,
}

impl Weighed {
    /// Fits every kind that the settings ask for without each block of landmarks, on every number of
    /// axes in `axes` where a kind has axes.
    ///
    /// # Errors
    /// [`Interrupted`] where the watch says so.
    ///
    /// # Panics
    /// If an alignment cannot be fitted, which the checks on a study rule out.
    pub fn new(
        settings: &Settings,
        axes: &[usize],
        material: &Material<'_>,
        questions: &Questions<'_>,
        watch: &dyn Watch,
    ) -> Result<Weighed, Interrupted> {
        let mut ways = holdout::joint_ways(axes, settings.ridge, material.embeddings());
        let mut unavailable = Vec::new();
        for way in further_ways(settings, axes) {
            match can_be_fitted(&way, material, questions.seed) {
                Ok(()) => ways.push(way),
                Err(why) => unavailable.push(why),
            }
        }
        let mut trials = holdout::run(material, &ways, questions, watch)?;
        let bagged = match transport(settings, material, questions, watch)? {
            Some(Ok(bagged)) => {
                let placed = holdout::placed_out_of_bag(material, &bagged, questions);
                ways.push(Way::Transport);
                trials.add(placed);
                Some(Arc::new(bagged))
            }
            Some(Err(why)) => {
                unavailable.push(why);
                None
            }
            None => None,
        };
        let alignment = settings.evidence.alignment();
        let choice = holdout::choose(&ways, &trials, alignment, None);
        let members = members(settings.evidence, &ways, &trials, &choice);
        Ok(Weighed {
            choice,
            members,
            blends: matches!(
                settings.evidence,
                EvidenceChoice::Mixture | EvidenceChoice::Transport
            ),
            bagged,
            unavailable,
            alignment,
            ways,
            trials,
        })
    }

    /// What ranks, ready to be asked.
    #[must_use]
    pub fn ranked<'r>(
        &'r self,
        material: &'r Material<'r>,
        questions: &Questions<'r>,
    ) -> Ranked<'r> {
        Ranked {
            material,
            ways: &self.ways,
            trials: &self.trials,
            members: &self.members,
            alignment: self.alignment,
            blends: self.blends,
            bagged: self.bagged.as_deref(),
            questions: *questions,
        }
    }

    /// Leaves every landmark out of what ranks, every choice made again without it. `also` looks at
    /// each ranking before it is dropped. Returns each landmark and what came first for it.
    #[must_use]
    pub fn leave_out(
        &self,
        material: &Material<'_>,
        questions: &Questions<'_>,
        also: &(dyn Fn(usize, &Compared) + Sync),
    ) -> (Vec<LeftOut>, Vec<Pair<FirstOf>>) {
        let found = holdout::leave_out(&self.ranked(material, questions), also);
        // To those who judge landmarks a mixture is a way of ranking like any other.
        let mut trials = self.trials.clone();
        let way = match self.blends {
            true => trials.add(found.iter().map(|found| found.placed).collect()),
            false => self.members[0].way,
        };
        let left_out = summarise(
            material,
            &self.ways,
            &trials,
            way,
            &self.choice,
            self.alignment,
            questions.asked,
        );
        let firsts = match self.blends {
            true => found.into_iter().map(|found| found.first).collect(),
            false => firsts(material.landmarks, &left_out),
        };
        (left_out, firsts)
    }
}

/// Cheap ways of ranking beside distances in the joint spaces that the settings ask for.
fn further_ways(settings: &Settings, axes: &[usize]) -> Vec<Way> {
    let grown = Way::Grown(Grown {
        axes: axes.iter().copied().max().unwrap_or(1),
        ridge: settings.ridge,
    });
    match settings.evidence {
        EvidenceChoice::Mixture => vec![Way::Fingerprint, grown],
        EvidenceChoice::Fingerprint => vec![Way::Fingerprint],
        EvidenceChoice::Grown => vec![grown],
        _ => Vec::new(),
    }
}

/// Whether a study has what a way of ranking needs.
fn can_be_fitted(way: &Way, material: &Material<'_>, seed: Seed) -> Result<(), Unavailable> {
    let weights = material.weights(|_| 1.0);
    let mut chance = Stream::new(seed, Purpose::Evidence, u64::MAX);
    match way.evidence() {
        Some(evidence) => evidence.fit(material, &weights, &mut chance).map(|_| ()),
        None => Ok(()),
    }
}

/// Replicates of transport, where the settings ask for it.
fn transport(
    settings: &Settings,
    material: &Material<'_>,
    questions: &Questions<'_>,
    watch: &dyn Watch,
) -> Result<Option<Result<OutOfBag, Unavailable>>, Interrupted> {
    if !matches!(
        settings.evidence,
        EvidenceChoice::Mixture | EvidenceChoice::Transport
    ) {
        return Ok(None);
    }
    let members = Expression::ALL.map(|expression| Transport {
        expression,
        mass: settings.mass,
    });
    let members: Vec<&dyn Evidence> = members.iter().map(|m| m as &dyn Evidence).collect();
    let replicates = Transport::replicates(settings.transport_replicates, material.sizes());
    holdout::out_of_bag(material, &members, replicates, questions, watch).map(Some)
}

/// Whether a kind takes part under a setting.
fn takes(evidence: EvidenceChoice, kind: Kind) -> bool {
    let only = match evidence {
        EvidenceChoice::Mixture => return true,
        EvidenceChoice::Procrustes => Kind::Procrustes,
        EvidenceChoice::Canonical => Kind::Canonical,
        EvidenceChoice::Fingerprint => Kind::Fingerprint,
        EvidenceChoice::Grown => Kind::Grown,
        EvidenceChoice::Transport => Kind::Transport,
    };
    kind == only
}

/// The kinds that rank, with their weights.
fn members(
    evidence: EvidenceChoice,
    ways: &[Way],
    trials: &Trials,
    choice: &Choice,
) -> Vec<Member> {
    let found: Vec<(Kind, usize)> = Kind::ALL
        .into_iter()
        .filter(|kind| takes(evidence, *kind))
        .filter_map(|kind| {
            let way = match kind {
                Kind::Procrustes => Some(choice.ways.procrustes),
                Kind::Canonical => Some(choice.ways.canonical),
                _ => ways.iter().position(|way| way.kind() == kind),
            };
            Some((kind, way?))
        })
        .collect();
    let kinds: Vec<Kind> = found.iter().map(|(kind, _)| *kind).collect();
    let errors: Vec<Vec<f64>> = found
        .iter()
        .map(|(_, way)| trials.errors(*way, None))
        .collect();
    holdout::weigh(&kinds, &errors)
        .into_iter()
        .zip(found)
        .zip(errors)
        .map(|((weight, (kind, way)), errors)| Member {
            kind,
            weight,
            error: errors.iter().sum::<f64>() / errors.len() as f64,
            way,
        })
        .collect()
}
