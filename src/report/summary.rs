//! What the terminal shows: the answers first, in about 25 lines.

use std::fmt::{Result, Write};

use crate::align::Alignment;
use crate::domain::{Hemispheres, Pair, Side};
use crate::evidence::Kind;
use crate::holdout::{Member, Placed};
use crate::locate::{
    Counterpart, Located, Placement, REPLICATES_FROM_RELIABILITY, REPLICATES_UP_TO_P,
};
use crate::prepare::Study;

/// What every output says about its use.
pub const CAUTION: &str = "\
Caution: each correspondence is a statistical hypothesis, not a target. For stimulation, surgery
or dosing defer to histology, local protocols, ethics boards and licensed practice.";

/// Parcels listed in each group.
const LISTED: usize = 4;
/// Longest label shown in full.
const LABEL_WIDTH: usize = 24;
/// Longest long name shown in full.
const NAME_WIDTH: usize = 40;
/// Support from which a first counterpart counts as stable.
const STABLE: f64 = 0.5;

/// The summary of a run, for people.
///
/// # Panics
/// Never: writing to memory does not fail.
#[must_use]
pub fn summary(study: &Study, located: &Located) -> String {
    let mut text = String::new();
    heading(&mut text, study)
        .and_then(|()| trust(&mut text, study, located))
        .and_then(|()| correspondences(&mut text, study, located))
        .and_then(|()| outsiders(&mut text, study, located))
        .expect("writing to memory does not fail");
    text
}

fn heading(text: &mut String, study: &Study) -> Result {
    let species = Pair::from_fn(|side: Side| {
        let (parcels, treatment) = (&study.species[side].parcels, &study.treatment[side]);
        format!(
            "{}: {} parcels ({}, {})",
            parcels.species(),
            parcels.len(),
            treatment.weights,
            treatment.transform
        )
    });
    let (landmarks, blocks) = (study.landmarks.len(), study.landmarks.blocks());
    let in_blocks = if landmarks == blocks {
        String::new()
    } else {
        format!(" in {blocks} blocks")
    };
    writeln!(text, "{}", study.title)?;
    let sides = match study.settings.hemispheres {
        Hemispheres::Ignore => "",
        Hemispheres::Match => " Candidates on the same side only.",
        Hemispheres::Fold => " Left and right copies folded.",
    };
    writeln!(
        text,
        "{}. {}. {landmarks} landmarks{in_blocks}.{sides}\n",
        species.a, species.b
    )
}

/// How far the landmarks can be trusted when left out.
fn trust(text: &mut String, study: &Study, located: &Located) -> Result {
    let names = Pair::from_fn(|side| short(study.species[side].parcels.species()));
    let from = names.map(|name| format!("from {name}"));
    writeln!(
        text,
        "Can the landmarks be trusted? Each left out, every choice made again without it:\n  \
         {:<26} {:>18} {:>18} {:>8}",
        "its counterpart comes", from.a, from.b, "chance"
    )?;
    let n = located.left_out.len();
    let placed = |side: Side| located.left_out.iter().map(move |l| l.placed[side]);
    let mean = |of: &dyn Fn(Placed) -> f64| {
        Pair::from_fn(|side| placed(side).map(of).sum::<f64>() / n as f64)
    };
    let both = |pair: Pair<f64>| (pair.a + pair.b) / 2.0;
    for (what, within) in [("first", 1), ("among the first five", 5)] {
        let hits = Pair::from_fn(|side| placed(side).filter(|p| p.rank <= within).count())
            .map(|hits| format!("{hits} of {n}"));
        let chance = both(mean(&|p| (within as f64 / p.candidates as f64).min(1.0)));
        writeln!(
            text,
            "  {what:<26} {:>18} {:>18} {chance:>8.2}",
            hits.a, hits.b
        )?;
    }
    let reciprocal = mean(&|p| 1.0 / p.rank as f64);
    let harmonic = |n: usize| (1..=n).map(|rank| 1.0 / rank as f64).sum::<f64>();
    let chance = both(mean(&|p| harmonic(p.candidates) / p.candidates as f64));
    writeln!(
        text,
        "  {:<26} {:>18.2} {:>18.2} {chance:>8.2}",
        "mean reciprocal rank", reciprocal.a, reciprocal.b
    )?;
    let contradicted: Vec<&str> = study
        .landmarks
        .list()
        .iter()
        .zip(&located.left_out)
        .filter(|(_, found)| found.contradicted.is_some())
        .map(|(landmark, _)| landmark.name.as_str())
        .collect();
    if !contradicted.is_empty() {
        writeln!(
            text,
            "  Contradicted by the others: {}.",
            contradicted.join(", ")
        )?;
    }
    embedded_by(text, study)?;
    ranked_by(text, located)?;
    axes(text, located)?;
    uncertainty(text, study, located)
}

/// What the intervals speak of where there are subjects.
fn uncertainty(text: &mut String, study: &Study, located: &Located) -> Result {
    let Some(replicates) = located.evidence.subject_replicates else {
        return Ok(());
    };
    let errors = &located.spaces[located.choice.evidence].standard_errors;
    let shares: Vec<String> = Side::BOTH
        .into_iter()
        .filter_map(|side| {
            let share = errors.mean_share_of_subjects(side)?;
            let name = short(study.species[side].parcels.species());
            let of = match &study.cohorts[side] {
                Some(cohort) => format!("{} subjects", cohort.len()),
                None => "no subjects".to_owned(),
            };
            Some(format!("{name} ({of}) {:.0} %", 100.0 * share))
        })
        .collect();
    writeln!(
        text,
        "Uncertainty of positions from subjects rather than landmarks: {};\n  \
         support and rank intervals draw both again, in {replicates} replicates.\n",
        shares.join(", ")
    )
}

/// The embedding that left-out landmarks chose, where they did.
fn embedded_by(text: &mut String, study: &Study) -> Result {
    let tried: Vec<String> = study
        .embedded
        .tried
        .iter()
        .map(|tried| format!("{} {:.2}", tried.recipe.in_words(), tried.error))
        .collect();
    if tried.is_empty() {
        return Ok(());
    }
    writeln!(
        text,
        "  Embedding chosen by left-out landmarks: {};\n  errors of those tried: {}.",
        study.embedded.recipe.in_words(),
        tried.join(", ")
    )
}

/// What carried the ranking.
fn ranked_by(text: &mut String, located: &Located) -> Result {
    let rests = &located.evidence;
    let in_words = |kind: Kind| match kind {
        Kind::Procrustes => joint(located, Alignment::Procrustes),
        Kind::Canonical => joint(located, Alignment::Canonical),
        Kind::Fingerprint => "landmark fingerprints".to_owned(),
        Kind::Grown => "canonical distance with grown anchors".to_owned(),
        Kind::Transport => format!(
            "transport averaged over {} replicates",
            rests.transport_replicates
        ),
    };
    if let [only] = &rests.kinds[..] {
        return writeln!(text, "  Ranked by {}.", in_words(only.kind));
    }
    let mut kinds: Vec<&Member> = rests.kinds.iter().collect();
    kinds.sort_by(|x, y| y.weight.total_cmp(&x.weight));
    let named: Vec<String> = kinds
        .iter()
        .map(|member| format!("{} {:.2}", member.kind, member.weight))
        .collect();
    writeln!(
        text,
        "  Ranked by a mixture, weighed by left-out landmarks: {};\n  \
         its support and rank intervals come from {} replicates.",
        named.join(", "),
        rests.ranking_replicates
    )
}

/// Which axes may be interpreted.
fn axes(text: &mut String, located: &Located) -> Result {
    let each = Alignment::BOTH.map(|alignment| {
        let space = &located.spaces[alignment];
        let all = space.map.axes();
        let found: Vec<String> = (0..all)
            .filter(|&axis| space.replicates(axis))
            .map(|axis| (axis + 1).to_string())
            .collect();
        let which = match found.len() {
            0 => String::new(),
            _ => format!(" ({})", found.join(", ")),
        };
        format!("{} {} of {all}{which}", alignment.in_words(), found.len())
    });
    writeln!(
        text,
        "  Axes that replicate: {}; the others are noise,\n  \
         not to be interpreted: landmarks do not agree on them when left out (or p above {REPLICATES_UP_TO_P}),\n  \
         or reliability is below {REPLICATES_FROM_RELIABILITY}.\n",
        each.join(", ")
    )
}

fn joint(located: &Located, alignment: Alignment) -> String {
    let axes = located.choice.axes[alignment];
    format!("{} distance on {axes} axes", alignment.in_words())
}

/// The strongest and the weakest correspondences of a's parcels.
fn correspondences(text: &mut String, study: &Study, located: &Located) -> Result {
    let mut firsts: Vec<(&Placement, &Counterpart)> = located
        .placements
        .a
        .iter()
        .filter_map(|placement| Some((placement, placement.counterparts.first()?)))
        .collect();
    firsts.sort_by(|(_, x), (_, y)| {
        (y.support.total_cmp(&x.support))
            .then(y.chance.unwrap_or(0.0).total_cmp(&x.chance.unwrap_or(0.0)))
            .then(x.distance.total_cmp(&y.distance))
    });
    let of_all = firsts.len();
    let is_strong = |found: &Counterpart| found.mutual && found.support >= STABLE;
    let is_weak = |found: &Counterpart| found.support < STABLE;

    let strong: Vec<_> = firsts
        .iter()
        .filter(|(_, found)| is_strong(found))
        .collect();
    writeln!(
        text,
        "Stable: each the other's first, under at least half of all landmark weights ({} of {of_all}).",
        strong.len()
    )?;
    for (placement, found) in strong.iter().take(LISTED) {
        pair(text, study, placement, found)?;
    }
    let weak: Vec<_> = firsts
        .iter()
        .rev()
        .filter(|(_, found)| is_weak(found))
        .collect();
    writeln!(
        text,
        "Cannot tell: another comes first under most landmark weights ({} of {of_all}).",
        weak.len()
    )?;
    for (placement, found) in weak.iter().take(LISTED) {
        pair(text, study, placement, found)?;
    }
    writeln!(
        text,
        "  Support is stability under other landmark weights. Chance of being right is cautious (read it as\n  \
         at least about so much) and capped by what left-out landmarks support.\n"
    )
}

/// The parcels furthest from everything, and those set aside.
fn outsiders(text: &mut String, study: &Study, located: &Located) -> Result {
    writeln!(
        text,
        "Furthest from every candidate (1: as random pairs; far alone is no proof of no counterpart):"
    )?;
    for side in Side::BOTH {
        let parcels = &study.species[side].parcels;
        let mut far: Vec<(usize, f64)> = located.placements[side]
            .iter()
            .filter_map(|placement| {
                let distances = placement.counterparts.iter().map(|c| c.distance);
                Some((placement.parcel, distances.min_by(f64::total_cmp)?))
            })
            .collect();
        far.sort_by(|x, y| y.1.total_cmp(&x.1));
        let named: Vec<String> = far
            .iter()
            .take(LISTED)
            .map(|(parcel, d)| format!("{} {d:.2}", short(&parcels.labels()[*parcel])))
            .collect();
        let mut aside = String::new();
        for (why, set_aside) in [
            ("set aside without connections", parcels.isolated()),
            ("not covered by the data", parcels.uncovered()),
        ] {
            if !set_aside.is_empty() {
                aside += &format!("; {why}: {}", set_aside.len());
            }
        }
        let species = short(parcels.species());
        writeln!(text, "  {species}: {}{aside}", named.join(", "))?;
    }
    Ok(())
}

fn pair(text: &mut String, study: &Study, placement: &Placement, found: &Counterpart) -> Result {
    let label = |side: Side, parcel: usize| short(&study.species[side].parcels.labels()[parcel]);
    let (low, high) = found.rank_interval;
    writeln!(
        text,
        "  {:<20} {:<20} chance {:.2}  support {:.2}  rank {low}-{high}",
        label(Side::A, placement.parcel),
        label(Side::B, found.parcel),
        found.chance.unwrap_or(0.0),
        found.support
    )?;
    let named =
        |side: Side, parcel: usize| study.species[side].attributes[parcel].long_name.as_deref();
    match (
        named(Side::A, placement.parcel),
        named(Side::B, found.parcel),
    ) {
        (None, None) => Ok(()),
        (one, other) => writeln!(
            text,
            "    ({} - {})",
            cut(one.unwrap_or("no long name"), NAME_WIDTH),
            cut(other.unwrap_or("no long name"), NAME_WIDTH)
        ),
    }
}

/// A label cut to what a terminal line can hold.
pub(super) fn short(label: &str) -> String {
    cut(label, LABEL_WIDTH)
}

fn cut(words: &str, width: usize) -> String {
    if words.chars().count() <= width {
        return words.to_owned();
    }
    let head: String = words.chars().take(width - 1).collect();
    format!("{head}…")
}
