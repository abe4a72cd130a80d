//! The same pair under other reasonable settings: each kind of evidence, other numbers of axes, the other
//! alignment, the other embedding.

use super::contrast::pair_of;
use super::ground::Ground;
use super::nearer::nearer;
use super::ruling::{level_of, reaches, Grounds, Ruling, Verdict};
use super::selected::Selected;
use super::separation::{conformal, Separation};
use super::spot::strained;
use super::view::{log_rank, View};
use crate::align::{Alignment, Params};
use crate::domain::{Pair, Side};
use crate::embed::Method;
use crate::evidence::{JointDistance, Kind, Material};
use crate::holdout::{Questions, Way};
use crate::prepare::{embedded_by, Study};

/// Numbers of axes about the one that was chosen.
const AXES_ABOUT: [i64; 5] = [-2, -1, 0, 1, 2];

/// One other setting.
#[derive(Debug, Clone, PartialEq)]
pub struct Variation {
    /// What is different, in words.
    pub setting: String,
    /// Ranks both ways.
    pub ranks: Pair<usize>,
    /// p of the test against unrelated pairs.
    pub p_nearer: f64,
    /// p of the test against homologous pairs, landmarks left out one by one.
    pub p_further: f64,
    /// p of the test against a search.
    pub p_selected: f64,
    /// The verdict.
    pub verdict: Verdict,
}

/// Rules on a pair under every other setting. A kind that carries no distance is judged by ranks, as mean
/// logarithms; in joint spaces the pair's interval keeps its width.
#[must_use]
pub fn variations(
    ground: &Ground,
    from: Side,
    pair: Pair<usize>,
    ruling: &Ruling,
) -> Vec<Variation> {
    let mut all = Vec::new();
    for kind in Kind::ALL {
        if Alignment::BOTH
            .iter()
            .any(|alignment| kind == kind_of(*alignment))
        {
            continue;
        }
        if let Some(view) = ground.view.by(kind) {
            all.push(by_ranks(ground, from, pair, &view, format!("{kind} alone")));
        }
    }
    if ground.weighed.blends {
        all.insert(
            0,
            by_ranks(
                ground,
                from,
                pair,
                &ground.view,
                String::from("what ranks, by ranks"),
            ),
        );
    }
    let shown = ground.located.choice.evidence;
    for alignment in Alignment::BOTH {
        let chosen = ground.located.choice.axes[alignment] as i64;
        for about in AXES_ABOUT {
            let axes = chosen + about;
            let most = ground.study.axes.iter().copied().max().unwrap_or(1) as i64;
            let is_main = alignment == shown && about == 0;
            if axes < 1 || axes > most.max(chosen) || (is_main && !ground.weighed.blends) {
                continue;
            }
            let space = params(
                &ground.study,
                alignment,
                axes as usize,
                ground.located.choice.embedding,
            );
            let name = format!("{alignment} on {axes} axes");
            all.extend(in_space(
                ground,
                &ground.study,
                from,
                pair,
                ruling,
                space,
                name,
            ));
        }
    }
    let other = match ground.study.embedded.recipe.method {
        Method::Diffusion => Method::Components,
        Method::Components => Method::Diffusion,
    };
    if let Some(study) = embedded_by(&ground.study, other) {
        for alignment in Alignment::BOTH {
            let axes = ground.located.choice.axes[alignment];
            let space = params(&study, alignment, axes, 0);
            let name = format!("{alignment} on {axes} axes of {other}");
            all.extend(in_space(ground, &study, from, pair, ruling, space, name));
        }
    }
    all
}

fn kind_of(alignment: Alignment) -> Kind {
    match alignment {
        Alignment::Procrustes => Kind::Procrustes,
        Alignment::Canonical => Kind::Canonical,
    }
}

fn params(study: &Study, alignment: Alignment, axes: usize, embedding: usize) -> Params {
    let available = Pair::from_fn(|side| study.species[side].embedding.axes());
    Params {
        alignment,
        axes: axes.min(available.a).min(available.b),
        ridge: study.settings.ridge,
        embedding,
    }
}

/// By the ranks of one view alone.
fn by_ranks(
    ground: &Ground,
    from: Side,
    pair: Pair<usize>,
    view: &View,
    setting: String,
) -> Variation {
    let study = &ground.study;
    let nearer = nearer(view, pair, &ground.located.beyond, &study.candidates);
    let own = log_rank(view.placed(pair));
    let separation = Separation {
        own,
        interval: (own, own),
        left_out: view.left_out_ranks(&study.landmarks, &ground.asked),
        unrelated: nearer
            .pairs
            .iter()
            .map(|pair| log_rank(view.placed(*pair)))
            .collect(),
    };
    let selected = Selected::of(view, &ground.lie, pair, &study.landmarks, &ground.asked);
    varied(
        study,
        from,
        view.placed(pair).map(|p| p.rank),
        nearer.p,
        &separation,
        &selected,
        setting,
    )
}

/// By distance in one joint space; `None` where it cannot be fitted.
fn in_space(
    ground: &Ground,
    study: &Study,
    from: Side,
    pair: Pair<usize>,
    ruling: &Ruling,
    space: Params,
    setting: String,
) -> Option<Variation> {
    let material = Material::new(study.species.as_ref(), &study.landmarks);
    let questions = Questions {
        open: &ground.open,
        candidates: &study.candidates,
        asked: &ground.asked,
        seed: study.settings.seed,
    };
    let stands: Vec<usize> = ground.view.without.iter().map(|(at, _)| *at).collect();
    let kind = Way::Joint(space).kind();
    let view = View::of(&material, &JointDistance(space), kind, &questions, &stands)?;
    let nearer = nearer(&view, pair, &ground.located.beyond, &study.candidates);
    let own = strained(&material, space, &[], &[pair])[0];
    let width = ruling.separation.interval.1 - ruling.separation.own;
    let separation = Separation {
        own,
        interval: (own, own + width),
        left_out: stands
            .iter()
            .map(|&at| {
                let block = study.landmarks.list()[at].block;
                strained(&material, space, &[block], &[ground.asked.of(at)])[0]
            })
            .collect(),
        unrelated: strained(&material, space, &[], &nearer.pairs),
    };
    let selected = Selected::of(&view, &ground.lie, pair, &study.landmarks, &ground.asked);
    let ranks = view.placed(pair).map(|p| p.rank);
    Some(varied(
        study,
        from,
        ranks,
        nearer.p,
        &separation,
        &selected,
        setting,
    ))
}

fn varied(
    study: &Study,
    from: Side,
    ranks: Pair<usize>,
    p_nearer: f64,
    separation: &Separation,
    selected: &Selected,
    setting: String,
) -> Variation {
    let p_further = conformal(separation.own, &separation.left_out);
    let p_selected = selected.p(from, None);
    let grounds = Grounds::of(&study.settings, p_further, p_nearer, p_selected, separation);
    Variation {
        setting,
        ranks,
        p_nearer,
        p_further,
        p_selected,
        verdict: grounds.verdict(),
    }
}

/// Other candidates of `parcel` that lie as near as homologous pairs do and nearer than unrelated ones:
/// by position they would pass too. `None` where they were not followed.
#[must_use]
pub fn would_pass(
    ground: &Ground,
    from: Side,
    parcel: usize,
    but: usize,
    ruling: &Ruling,
) -> Option<Vec<usize>> {
    let level = level_of(&ground.study.settings);
    let candidates = &ground.study.candidates;
    let mut passing = Vec::new();
    for &other in &ground.open[from.opposite()] {
        if other == but || !candidates.admit(from, parcel, other) {
            continue;
        }
        let pair = pair_of(from, parcel, other);
        if ground.upper_end(pair)? <= ruling.usual.limit {
            let near = nearer(&ground.view, pair, &ground.located.beyond, candidates);
            if reaches(near.p, level) {
                passing.push(other);
            }
        }
    }
    Some(passing)
}
