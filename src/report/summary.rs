//! What the terminal shows: the answers first, in about 25 lines.

use std::fmt::Write as _;

use crate::align::Alignment;
use crate::domain::{Pair, Side};
use crate::holdout::{Curve, Placed};
use crate::locate::{Counterpart, Located, Placement};
use crate::prepare::Study;

/// What every output says about its use.
pub const CAUTION: &str = "Caution: each correspondence is a statistical hypothesis, not a target. For stimulation, surgery or dosing defer to histology, local protocols, ethics boards and licensed practice.";

/// Correspondences listed in each group.
const LISTED: usize = 4;
/// Longest label shown in full.
const LABEL_WIDTH: usize = 24;

/// The summary of a run, for people.
#[must_use]
pub fn summary(study: &Study, located: &Located) -> String {
    let mut text = String::new();
    heading(&mut text, study);
    trust(&mut text, study, located);
    correspondences(&mut text, study, located);
    text
}

fn heading(text: &mut String, study: &Study) {
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
    line(text, format_args!("{}", study.title));
    line(
        text,
        format_args!(
            "{}. {}. {landmarks} landmarks{in_blocks}.",
            species.a, species.b
        ),
    );
}

/// How far the landmarks can be trusted when left out.
fn trust(text: &mut String, study: &Study, located: &Located) {
    let chosen = located.choice.evidence;
    let error = |alignment: Alignment| {
        let axes = located.choice.axes[alignment];
        located
            .curves
            .iter()
            .find(|curve| curve.alignment == alignment)
            .and_then(|curve: &Curve| curve.points.iter().find(|p| p.axes == axes))
            .map_or(f64::NAN, |point| point.error)
    };
    line(text, format_args!(""));
    line(
        text,
        format_args!(
            "Can the landmarks be trusted? Each left out, every choice made again without it:"
        ),
    );
    let names = Pair::from_fn(|side| short(study.species[side].parcels.species()));
    line(
        text,
        format_args!(
            "  {:<26} {:>18} {:>18} {:>8}",
            "its counterpart comes",
            format!("from {}", names.a),
            format!("from {}", names.b),
            "chance"
        ),
    );
    let n = located.left_out.len();
    let placed = |side: Side| located.left_out.iter().map(move |l| l.placed[side]);
    let mean = |of: &dyn Fn(Placed) -> f64| {
        Pair::from_fn(|side| placed(side).map(of).sum::<f64>() / n as f64)
    };
    for (what, within) in [("first", 1), ("among the first five", 5)] {
        let hits = Pair::from_fn(|side| placed(side).filter(|p| p.rank <= within).count());
        let chance = mean(&|p| within.min(p.candidates) as f64 / p.candidates as f64);
        line(
            text,
            format_args!(
                "  {what:<26} {:>18} {:>18} {:>8.2}",
                format!("{} of {n}", hits.a),
                format!("{} of {n}", hits.b),
                (chance.a + chance.b) / 2.0
            ),
        );
    }
    let reciprocal = mean(&|p| 1.0 / p.rank as f64);
    let chance =
        mean(&|p| (1..=p.candidates).map(|r| 1.0 / r as f64).sum::<f64>() / p.candidates as f64);
    line(
        text,
        format_args!(
            "  {:<26} {:>18.2} {:>18.2} {:>8.2}",
            "mean reciprocal rank",
            reciprocal.a,
            reciprocal.b,
            (chance.a + chance.b) / 2.0
        ),
    );
    let contradicted: Vec<&str> = study
        .landmarks
        .list()
        .iter()
        .zip(&located.left_out)
        .filter(|(_, found)| found.contradicted)
        .map(|(landmark, _)| landmark.name.as_str())
        .collect();
    if !contradicted.is_empty() {
        line(
            text,
            format_args!("  Contradicted by the others: {}.", contradicted.join(", ")),
        );
    }
    let other = Alignment::BOTH
        .into_iter()
        .find(|a| *a != chosen)
        .unwrap_or(chosen);
    line(
        text,
        format_args!(
            "  Ranked by {} distance on {} axes: left-out error {:.2} (0 all first, 1 all last); {} on {}: {:.2}.",
            named(chosen),
            located.choice.axes[chosen],
            error(chosen),
            named(other),
            located.choice.axes[other],
            error(other)
        ),
    );
}

/// The strongest and the weakest correspondences, and what fits nowhere.
fn correspondences(text: &mut String, study: &Study, located: &Located) {
    let firsts: Vec<(&Placement, &Counterpart)> = located
        .placements
        .a
        .iter()
        .filter_map(|p| Some((p, p.counterparts.first()?)))
        .collect();
    let mut by_support = firsts.clone();
    by_support.sort_by(|(_, x), (_, y)| {
        (y.mutual.cmp(&x.mutual))
            .then(y.support.total_cmp(&x.support))
            .then(x.distance.total_cmp(&y.distance))
    });
    line(text, format_args!(""));
    line(
        text,
        format_args!(
            "Strongest correspondences (each the other's first, first under most landmark weights):"
        ),
    );
    for (placement, found) in by_support.iter().filter(|(_, f)| f.mutual).take(LISTED) {
        pair_line(text, study, placement, found);
    }
    line(
        text,
        format_args!("Weakest (another comes first under most landmark weights; cannot tell):"),
    );
    let mut weakest = firsts.clone();
    weakest.sort_by(|(_, x), (_, y)| {
        x.support
            .total_cmp(&y.support)
            .then(y.distance.total_cmp(&x.distance))
    });
    for (placement, found) in weakest.iter().take(LISTED) {
        pair_line(text, study, placement, found);
    }
    let mutual = firsts.iter().filter(|(_, f)| f.mutual).count();
    line(
        text,
        format_args!(
            "  In all {mutual} of {} parcels and their first counterparts are each other's first.",
            firsts.len()
        ),
    );
    line(text, format_args!(""));
    line(
        text,
        format_args!("Furthest from every candidate (1 = as far as random pairs; check these for no counterpart):"),
    );
    for side in Side::BOTH {
        let parcels = &study.species[side].parcels;
        let mut far: Vec<(&Placement, f64)> = located.placements[side]
            .iter()
            .filter_map(|p| {
                let least = p
                    .counterparts
                    .iter()
                    .map(|c| c.distance)
                    .min_by(f64::total_cmp)?;
                Some((p, least))
            })
            .collect();
        far.sort_by(|x, y| y.1.total_cmp(&x.1));
        let named: Vec<String> = far
            .iter()
            .take(LISTED)
            .map(|(p, d)| format!("{} {d:.2}", short(&parcels.labels()[p.parcel])))
            .collect();
        let aside = match parcels.isolated().len() {
            0 => String::new(),
            n => format!("; set aside without connections: {n}"),
        };
        line(
            text,
            format_args!(
                "  {}: {}{aside}",
                short(parcels.species()),
                named.join(", ")
            ),
        );
    }
}

fn pair_line(text: &mut String, study: &Study, placement: &Placement, found: &Counterpart) {
    let label = |side: Side, parcel: usize| short(&study.species[side].parcels.labels()[parcel]);
    let (low, high) = found.rank_interval;
    line(
        text,
        format_args!(
            "  {:<20} {:<20} support {:.2}  rank {low}-{high}  distance {:.2}",
            label(Side::A, placement.parcel),
            label(Side::B, found.parcel),
            found.support,
            found.distance
        ),
    );
}

fn named(alignment: Alignment) -> &'static str {
    match alignment {
        Alignment::Procrustes => "Procrustes",
        Alignment::Canonical => "canonical",
    }
}

/// A label cut to what a terminal line can hold.
fn short(label: &str) -> String {
    if label.chars().count() <= LABEL_WIDTH {
        return label.to_owned();
    }
    let head: String = label.chars().take(LABEL_WIDTH - 1).collect();
    format!("{head}…")
}

fn line(text: &mut String, words: std::fmt::Arguments<'_>) {
    let start = text.len();
    text.write_fmt(words)
        .expect("writing to memory does not fail");
    let end = text.trim_end().len().max(start);
    text.truncate(end);
    text.push('\n');
}
