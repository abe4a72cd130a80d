//! Landmarks held out: where their counterparts come when the others alone are told.

use serde::Serialize;

use super::influence::{before, influence, Influence};
use super::permuted::{permute, Permuted};
use super::plan::{PlanRequest, Sets};
use super::rate::{by_chance, wilson, Estimate};
use crate::align::{self, JointMap, Params};
use crate::domain::{Landmark, Landmarks, Pair, Side};
use crate::evidence::{Fingerprint, Material};
use crate::holdout::{place_each, Asked, Compared, Member, Placed, Questions, Ranked};
use crate::locate::{beyond_landmarks, Weighed};
use crate::place;
use crate::prepare::{axes_to_try, Study};
use crate::warning::Warning;
use crate::watch::{Interrupted, Unwatched, Watch};

/// Ranks within which a counterpart counts as found.
pub(super) const WITHIN: [usize; 2] = [1, 5];

/// A landmark that was held out.
#[derive(Debug, Clone, PartialEq)]
pub struct HeldOutLandmark {
    /// Index of the set it was held out with.
    pub set: usize,
    /// The landmark.
    pub landmark: usize,
    /// The member asked for on each side.
    pub asked: Pair<usize>,
    /// Where its counterpart comes, seen from either side.
    pub placed: Pair<Placed>,
    /// The same by the connectional fingerprint; `None` where the study has none.
    pub fingerprint: Option<Pair<Placed>>,
    /// Distance between the members asked for, in the joint space fitted without the set; 1 is that of
    /// random pairs.
    pub distance: f64,
    /// That joint space.
    pub space: Params,
    /// Whether the others contradict it; known where every block is held out by itself.
    pub contradicted: Option<bool>,
}

/// How often counterparts were found.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Figures {
    /// Share of landmarks whose counterpart came first, from a and from b.
    pub first: Pair<f64>,
    /// Share with it among the first five.
    pub within_five: Pair<f64>,
    /// Mean reciprocal rank.
    pub reciprocal: Pair<f64>,
    /// The same over both directions, every block counting once, with intervals over blocks.
    pub both: [Estimate; 3],
}

/// Everything that holding landmarks out shows.
#[derive(Debug, Clone)]
pub struct HeldOut {
    /// The sets of blocks.
    pub sets: Sets,
    /// Whether each set is one block, judged out of one and the same run.
    pub each: bool,
    /// Every landmark that was held out, in every set.
    pub landmarks: Vec<HeldOutLandmark>,
    /// Blocks among them.
    pub blocks: usize,
    /// By what ranks.
    pub figures: Figures,
    /// By the fingerprint.
    pub fingerprint: Option<Figures>,
    /// By chance: first, among five, reciprocal rank.
    pub chance: [f64; 3],
    /// Against permuted pairings.
    pub permuted: Option<Permuted>,
    /// How much each set moves everyone else; empty for subsets.
    pub influence: Vec<Influence>,
    /// The kinds that rank with all landmarks.
    pub kinds: Vec<Member>,
    /// Open parcels beyond every landmark, of all open parcels.
    pub beyond: Pair<(usize, usize)>,
    /// What came up on the way.
    pub warnings: Vec<Warning>,
}

/// Holds landmarks out by a plan whose sets were found in the landmarks of the study.
///
/// # Errors
/// [`Interrupted`] where the watch says so.
///
/// # Panics
/// If an alignment cannot be fitted, which the checks on a [`Study`] rule out.
pub fn hold_out(
    study: &Study,
    plan: &PlanRequest,
    sets: Sets,
    permutations: usize,
    watch: &dyn Watch,
) -> Result<HeldOut, Interrupted> {
    let settings = &study.settings;
    let material = Material::new(study.species.as_ref(), &study.landmarks);
    let open = place::open_parcels(&study.landmarks, material.sizes());
    let asked = Asked::draw(&study.landmarks, &study.candidates, settings.seed);
    let questions = Questions {
        open: &open,
        candidates: &study.candidates,
        asked: &asked,
        seed: settings.seed,
    };
    let each = *plan == PlanRequest::Each;
    let with_all = Weighed::new(settings, &study.axes, &material, &questions, watch)?;
    let ranked = with_all.ranked(&material, &questions);
    let wants_influence = !matches!(plan, PlanRequest::Subsets { .. });
    let full = wants_influence.then(|| before(&ranked, &with_all));

    let mut landmarks = Vec::new();
    let mut moved = Vec::new();
    if each {
        let fingerprint = has_fingerprint(&material, &questions)
            .then(|| place_each(&material, &Fingerprint, &questions));
        let (left_out, _) = with_all.leave_out(&material, &questions, &|_, _| ());
        for (at, found) in left_out.into_iter().enumerate() {
            landmarks.push(HeldOutLandmark {
                set: study.landmarks.list()[at].block,
                landmark: at,
                asked: found.asked,
                placed: found.placed,
                fingerprint: fingerprint.as_ref().map(|all| all[at]),
                distance: found.distance,
                space: found.chosen,
                contradicted: Some(found.contradicted.is_some()),
            });
        }
        if let Some(full) = &full {
            for set in &sets.sets {
                let first = study
                    .landmarks
                    .list()
                    .iter()
                    .position(|l| l.block == set[0]);
                let without = ranked.without(first.expect("every block has a landmark"));
                moved.push(influence(&ranked, full, set, &without));
            }
        }
    } else {
        watch.begin("reruns without landmarks", sets.sets.len());
        for (index, set) in sets.sets.iter().enumerate() {
            if watch.interrupted() {
                return Err(Interrupted);
            }
            let kept = study
                .landmarks
                .without(set)
                .expect("the plan leaves enough landmarks");
            let material = material.with_landmarks(&kept);
            let rerun = Rerun::new(study, &material, &questions, watch)?;
            let fingerprint = has_fingerprint(&material, &questions);
            for (at, landmark) in study.landmarks.list().iter().enumerate() {
                if set.contains(&landmark.block) {
                    landmarks.push(rerun.held_out(index, at, landmark, &questions, fingerprint));
                }
            }
            if let Some(full) = &full {
                let compared = rerun.ranked(&questions).full(open.clone());
                moved.push(influence(&ranked, full, set, &compared));
            }
            watch.advance(1);
        }
        watch.end();
    }

    let permuted = permute(
        settings,
        study.axes.iter().copied().max().unwrap_or(1),
        &material,
        &questions,
        permutations,
        watch,
    )?;
    let list = study.landmarks.list();
    let placed = |of: &dyn Fn(&HeldOutLandmark) -> Option<Pair<Placed>>| {
        landmarks
            .iter()
            .map(|held| Some((list[held.landmark].block, of(held)?)))
            .collect::<Option<Vec<_>>>()
            .map(|all| Figures::of(&all))
    };
    let figures = placed(&|held| Some(held.placed)).expect("every landmark is placed");
    let fingerprint = placed(&|held| held.fingerprint);
    let mut blocks: Vec<usize> = landmarks.iter().map(|l| list[l.landmark].block).collect();
    blocks.sort_unstable();
    blocks.dedup();
    let axes = with_all.choice.axes[with_all.choice.evidence];
    let beyond = beyond_landmarks(&material, axes);
    Ok(HeldOut {
        each,
        blocks: blocks.len(),
        chance: chance(&landmarks, &study.landmarks, study),
        figures,
        fingerprint,
        permuted,
        influence: moved,
        kinds: with_all.members.clone(),
        beyond: Pair::from_fn(|side| {
            let far = open[side].iter().filter(|&&p| beyond[side][p] > 1.0);
            (far.count(), open[side].len())
        }),
        warnings: with_all
            .unavailable
            .iter()
            .map(|why| Warning::EvidenceUnavailable {
                kind: why.kind.clone(),
                why: why.why.clone(),
            })
            .collect(),
        landmarks,
        sets,
    })
}

fn has_fingerprint(material: &Material<'_>, questions: &Questions<'_>) -> bool {
    use crate::bootstrap::{Purpose, Stream};
    use crate::evidence::Evidence;
    let mut chance = Stream::new(questions.seed, Purpose::Evidence, u64::MAX);
    let weights = material.weights(|_| 1.0);
    Fingerprint.fit(material, &weights, &mut chance).is_ok()
}

/// A run with fewer landmarks, in which every choice was made by those that are left.
struct Rerun<'r> {
    material: &'r Material<'r>,
    weighed: Weighed,
    asked: Asked,
    space: Params,
    map: JointMap,
}

impl<'r> Rerun<'r> {
    fn new(
        study: &Study,
        material: &'r Material<'r>,
        questions: &Questions<'_>,
        watch: &dyn Watch,
    ) -> Result<Rerun<'r>, Interrupted> {
        let settings = &study.settings;
        // The landmarks that are left are asked for members of their own draw.
        let asked = Asked::draw(material.landmarks, questions.candidates, questions.seed);
        let inner = Questions {
            asked: &asked,
            ..*questions
        };
        let most = study.axes.iter().copied().max().unwrap_or(1);
        let axes = axes_to_try(settings.axes, material.landmarks.blocks(), most);
        // The reruns are the stage that is watched; what they consist of is not.
        let weighed = match watch.interrupted() {
            true => return Err(Interrupted),
            false => Weighed::new(settings, &axes, material, &inner, &Quiet(watch))?,
        };
        let alignment = weighed.choice.evidence;
        let space = Params {
            alignment,
            axes: weighed.choice.axes[alignment],
            ridge: settings.ridge,
            embedding: weighed.choice.embedding,
        };
        let anchors = material.anchors_in(space.embedding);
        let map = align::fit(space, anchors, &material.weights(|_| 1.0))
            .expect("landmarks were checked")
            .in_standard_units(material.embedded_in(space.embedding));
        Ok(Rerun {
            material,
            weighed,
            asked,
            space,
            map,
        })
    }

    fn ranked<'q>(&'q self, questions: &Questions<'q>) -> Ranked<'q> {
        let inner = Questions {
            asked: &self.asked,
            ..*questions
        };
        self.weighed.ranked(self.material, &inner)
    }

    fn held_out(
        &self,
        set: usize,
        at: usize,
        landmark: &Landmark,
        questions: &Questions<'_>,
        fingerprint: bool,
    ) -> HeldOutLandmark {
        let asked = questions.asked.of(at);
        let candidates = Pair::from_fn(|side| {
            let mut all = [&questions.open[side][..], &landmark.parcels[side][..]].concat();
            all.sort_unstable();
            all
        });
        let place = |compared: &Compared| {
            Pair::from_fn(|from: Side| {
                compared.placed(from, asked[from], &landmark.parcels[from.opposite()])
            })
        };
        let ranked = self.ranked(questions);
        let placed = place(&ranked.full(candidates.clone()));
        let fingerprint = fingerprint.then(|| place(&ranked.alone(candidates, &Fingerprint)));
        let positions = self
            .map
            .positions(self.material.embedded_in(self.space.embedding));
        let gap = &positions.a.row(asked.a) - &positions.b.row(asked.b);
        HeldOutLandmark {
            set,
            landmark: at,
            asked,
            placed,
            fingerprint,
            distance: gap.dot(&gap).sqrt(),
            space: self.space,
            contradicted: None,
        }
    }
}

/// Passes on only that it is time to stop.
struct Quiet<'w>(&'w dyn Watch);

impl Watch for Quiet<'_> {
    fn begin(&self, stage: &str, steps: usize) {
        Unwatched.begin(stage, steps);
    }
    fn advance(&self, steps: usize) {
        Unwatched.advance(steps);
    }
    fn end(&self) {
        Unwatched.end();
    }
    fn interrupted(&self) -> bool {
        self.0.interrupted()
    }
}

impl Figures {
    /// Takes the block of each landmark and where its counterpart came.
    pub(super) fn of(placed: &[(usize, Pair<Placed>)]) -> Figures {
        let blocks = placed.iter().map(|(block, _)| block + 1).max().unwrap_or(0);
        let mean = |of: &dyn Fn(Placed) -> f64| {
            Pair::from_fn(|side: Side| {
                placed.iter().map(|(_, p)| of(p[side])).sum::<f64>() / placed.len() as f64
            })
        };
        let both = |of: &dyn Fn(Placed) -> f64| {
            let mut sums = vec![(0.0, 0.0); blocks];
            for (block, p) in placed {
                sums[*block].0 += (of(p.a) + of(p.b)) / 2.0;
                sums[*block].1 += 1.0;
            }
            let means: Vec<f64> = sums
                .iter()
                .filter(|(_, count)| *count > 0.0)
                .map(|(sum, count)| sum / count)
                .collect();
            let count = means.len() as f64;
            wilson(means.iter().sum::<f64>() / count, count)
        };
        let within = |k: usize| move |p: Placed| f64::from(u8::from(p.rank <= k));
        let reciprocal = |p: Placed| 1.0 / p.rank as f64;
        let [first, five] = WITHIN;
        Figures {
            first: mean(&within(first)),
            within_five: mean(&within(five)),
            reciprocal: mean(&reciprocal),
            both: [both(&within(first)), both(&within(five)), both(&reciprocal)],
        }
    }
}

/// What a random order of the same candidates would give.
fn chance(held: &[HeldOutLandmark], landmarks: &Landmarks, study: &Study) -> [f64; 3] {
    let mut sums = [0.0; 3];
    for held in held {
        for from in Side::BOTH {
            let own = landmarks.list()[held.landmark].parcels[from.opposite()]
                .iter()
                .filter(|&&p| study.candidates.admit(from, held.asked[from], p))
                .count();
            let ([first, five], reciprocal) = by_chance(own, held.placed[from].candidates, WITHIN);
            for (sum, x) in sums.iter_mut().zip([first, five, reciprocal]) {
                *sum += x;
            }
        }
    }
    sums.map(|sum| sum / (2 * held.len()) as f64)
}
