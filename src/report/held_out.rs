//! What holding landmarks out showed: for people, and as tables.

use std::fmt::{Result, Write};

use super::summary::short;
use super::tables::{Table, PARCEL_SEPARATOR};
use crate::domain::{Pair, Side};
use crate::inspect::Inspection;
use crate::prepare::Study;
use crate::questions::{Estimate, HeldOut};

/// Landmarks listed in each group.
const LISTED: usize = 6;
/// Percentile below which a landmark is named as poorly found.
const POORLY_FOUND: f64 = 0.9;

/// The account for people. `inspection` tells which systems no landmark covers.
///
/// # Panics
/// Never: writing to memory does not fail.
#[must_use]
pub fn held_out(study: &Study, found: &HeldOut, inspection: &Inspection) -> String {
    let mut text = String::new();
    heading(&mut text, study, found)
        .and_then(|()| figures(&mut text, study, found))
        .and_then(|()| permuted(&mut text, found))
        .and_then(|()| poorly_found(&mut text, study, found))
        .and_then(|()| influence(&mut text, study, found))
        .and_then(|()| reach(&mut text, study, found, inspection))
        .expect("writing to memory does not fail");
    text
}

fn heading(text: &mut String, study: &Study, found: &HeldOut) -> Result {
    let blocks = study.landmarks.blocks();
    writeln!(text, "{}", study.title)?;
    let sets = found.sets.sets.len();
    let size = found.sets.sets.first().map_or(0, Vec::len);
    let how = match (found.each, found.sets.drawn_of, sets) {
        (true, _, _) => format!("Each of {blocks} landmark blocks held out by itself"),
        (false, Some(all), _) => {
            format!("{sets} of all {all} sets of {size} of {blocks} landmark blocks held out, drawn by the seed")
        }
        (false, None, 1) => format!(
            "Held out together: {}; {} of {blocks} blocks remain",
            blocks_in_words(study, &found.sets.sets[0]),
            blocks - size
        ),
        (false, None, _) => {
            format!("All {sets} sets of {size} of {blocks} landmark blocks held out in turn")
        }
    };
    writeln!(
        text,
        "{how}.\nEvery choice made again without them (axes, alignment, weights of kinds).\n"
    )
}

fn blocks_in_words(study: &Study, set: &[usize]) -> String {
    let names: Vec<&str> = set.iter().map(|&b| study.landmarks.block_name(b)).collect();
    names.join(", ")
}

fn figures(text: &mut String, study: &Study, found: &HeldOut) -> Result {
    let names = Pair::from_fn(|side| short(study.species[side].parcels.species()));
    writeln!(
        text,
        "{:<24}{:>14}{:>14}{:>22}{:>8}{:>14}",
        "The counterpart comes",
        cut(&format!("from {}", names.a)),
        cut(&format!("from {}", names.b)),
        "both (90 % interval)",
        "chance",
        "fingerprint"
    )?;
    let f = &found.figures;
    for (at, (what, sides)) in [
        ("first", f.first),
        ("among the first five", f.within_five),
        ("mean reciprocal rank", f.reciprocal),
    ]
    .into_iter()
    .enumerate()
    {
        let Estimate { value, low, high } = f.both[at];
        let fingerprint = found
            .fingerprint
            .as_ref()
            .map_or_else(|| "none".to_owned(), |f| format!("{:.2}", f.both[at].value));
        writeln!(
            text,
            "{what:<24}{:>14.2}{:>14.2}{:>22}{:>8.2}{fingerprint:>14}",
            sides.a,
            sides.b,
            format!("{value:.2} ({low:.2}-{high:.2})"),
            found.chance[at]
        )?;
    }
    writeln!(
        text,
        "  Intervals are over {} blocks, taken for independent draws of such landmarks.\n",
        found.blocks
    )
}

fn cut(words: &str) -> String {
    match words.chars().count() > 12 {
        true => words.chars().take(11).chain(['…']).collect(),
        false => words.to_owned(),
    }
}

fn permuted(text: &mut String, found: &HeldOut) -> Result {
    let Some(permuted) = &found.permuted else {
        return Ok(());
    };
    let kinds: Vec<String> = permuted.kinds.iter().map(ToString::to_string).collect();
    let left_out = found
        .kinds
        .iter()
        .any(|m| !permuted.kinds.contains(&m.kind));
    writeln!(
        text,
        "Does the pairing matter? Mean reciprocal rank by {} ({} axes), each block left out:\n  \
         {:.2} as paired, {:.2} on average with pairings permuted; p = {} ({} permutations).",
        kinds.join(" and "),
        permuted.axes,
        permuted.observed,
        permuted.mean,
        p_value(permuted.p, permuted.least_p),
        permuted.permutations
    )?;
    if left_out {
        writeln!(
            text,
            "  Other kinds of evidence take no part in this test: they are too dear to be fitted for each."
        )?;
    }
    writeln!(text)
}

/// A p-value with as many digits as its resolution gives.
pub(super) fn p_value(p: f64, least: f64) -> String {
    let digits = (-least.log10()).ceil().max(2.0) as usize;
    format!("{p:.digits$}")
}

fn poorly_found(text: &mut String, study: &Study, found: &HeldOut) -> Result {
    let list = study.landmarks.list();
    let flagged: Vec<&str> = found
        .landmarks
        .iter()
        .filter(|held| held.contradicted == Some(true))
        .map(|held| list[held.landmark].name.as_str())
        .collect();
    if !flagged.is_empty() {
        writeln!(text, "Contradicted by the others: {}.", flagged.join(", "))?;
    }
    // The mean over sets, for each landmark.
    let mut means: Vec<(usize, f64, Pair<usize>)> = (0..list.len())
        .filter_map(|at| {
            let own: Vec<_> = found
                .landmarks
                .iter()
                .filter(|h| h.landmark == at)
                .collect();
            let percentile = own
                .iter()
                .map(|h| (h.placed.a.percentile() + h.placed.b.percentile()) / 2.0)
                .sum::<f64>()
                / own.len() as f64;
            let first = own.first()?;
            Some((at, percentile, first.placed.map(|p| p.rank)))
        })
        .filter(|(_, percentile, _)| *percentile < POORLY_FOUND)
        .collect();
    means.sort_by(|x, y| x.1.total_cmp(&y.1));
    let many_sets = !found.each && found.sets.sets.len() > 1;
    if !means.is_empty() {
        writeln!(
            text,
            "Poorly found (counterpart behind more than a tenth of the candidates):"
        )?;
    }
    for (at, percentile, ranks) in means.iter().take(LISTED) {
        let ranks = match many_sets {
            true => String::new(),
            false => format!("  ranks {} and {}", ranks.a, ranks.b),
        };
        writeln!(
            text,
            "  {:<26} percentile {percentile:.2}{ranks}",
            short(&list[*at].name)
        )?;
    }
    if means.len() > LISTED {
        writeln!(text, "  and {} more in holdout.csv", means.len() - LISTED)?;
    }
    if !means.is_empty() || !flagged.is_empty() {
        writeln!(text)?;
    }
    Ok(())
}

fn influence(text: &mut String, study: &Study, found: &HeldOut) -> Result {
    if found.influence.is_empty() {
        return Ok(());
    }
    let mut summaries: Vec<(String, f64, f64)> = found
        .influence
        .iter()
        .map(|one| {
            let (moved, changed) = one.summary();
            (blocks_in_words(study, &one.blocks), moved, changed)
        })
        .collect();
    summaries.sort_by(|x, y| y.1.total_cmp(&x.1));
    writeln!(
        text,
        "What everyone else does without them (parcels that are no landmark):"
    )?;
    for (name, moved, changed) in summaries.iter().take(LISTED) {
        writeln!(
            text,
            "  {:<26} median move {moved:.2}   first candidate changes for {:.0} %",
            short(name),
            100.0 * changed
        )?;
    }
    if summaries.len() > LISTED {
        let (name, moved, _) = summaries.last().expect("there are some");
        writeln!(
            text,
            "  … down to {} with {moved:.2}. Moves are in the joint space; 1 is the distance of random pairs.",
            short(name)
        )?;
    }
    if found.each
        && found
            .kinds
            .iter()
            .any(|m| m.kind == crate::evidence::Kind::Transport)
    {
        writeln!(
            text,
            "  Without a block transport is averaged over a third of its replicates, so some firsts change by that alone."
        )?;
    }
    writeln!(text)
}

fn reach(text: &mut String, study: &Study, found: &HeldOut, inspection: &Inspection) -> Result {
    writeln!(
        text,
        "For which parcels do these figures speak? For those that are like the landmarks."
    )?;
    for side in Side::BOTH {
        let (far, all) = found.beyond[side];
        let species = short(study.species[side].parcels.species());
        let coverage = &inspection.species[side].coverage;
        let uncovered: Vec<String> = coverage
            .uncovered()
            .map(|system| {
                let named: Vec<String> = system.parcels.iter().take(2).map(|p| short(p)).collect();
                format!("{} parcels ({} …)", system.parcels.len(), named.join(", "))
            })
            .collect();
        let systems = match uncovered.is_empty() {
            true => "every system of parcels holds a landmark".to_owned(),
            false => format!("no landmark in systems of {}", uncovered.join("; ")),
        };
        writeln!(
            text,
            "  {species}: {far} of {all} open parcels lie beyond every landmark; {systems}."
        )?;
    }
    Ok(())
}

/// `holdout.csv`, and `influence.csv` where influence was looked at.
#[must_use]
pub fn held_out_tables(study: &Study, found: &HeldOut) -> Vec<(&'static str, Vec<u8>)> {
    let mut all = vec![("holdout.csv", landmarks(study, found))];
    if !found.influence.is_empty() {
        all.push(("influence.csv", moved(study, found)));
    }
    all
}

fn set_name(study: &Study, set: &[usize]) -> String {
    let names: Vec<&str> = set.iter().map(|&b| study.landmarks.block_name(b)).collect();
    names.join(PARCEL_SEPARATOR)
}

fn landmarks(study: &Study, found: &HeldOut) -> Vec<u8> {
    let mut table = Table::new([
        "held_out",
        "landmark",
        "block",
        "asked_a",
        "asked_b",
        "rank_from_a",
        "candidates_from_a",
        "percentile_from_a",
        "rank_from_b",
        "candidates_from_b",
        "percentile_from_b",
        "fingerprint_rank_from_a",
        "fingerprint_rank_from_b",
        "distance",
        "alignment",
        "axes",
        "contradicted",
    ]);
    let label = |side: Side, parcel: usize| study.species[side].parcels.labels()[parcel].clone();
    for held in &found.landmarks {
        let landmark = &study.landmarks.list()[held.landmark];
        let mut row = vec![
            set_name(study, &found.sets.sets[held.set]),
            landmark.name.clone(),
            study.landmarks.block_name(landmark.block).to_owned(),
            label(Side::A, held.asked.a),
            label(Side::B, held.asked.b),
        ];
        for side in Side::BOTH {
            let placed = held.placed[side];
            row.push(placed.rank.to_string());
            row.push(placed.candidates.to_string());
            row.push(placed.percentile().to_string());
        }
        for side in Side::BOTH {
            let rank = held.fingerprint.map(|f| f[side].rank.to_string());
            row.push(rank.unwrap_or_default());
        }
        row.push(held.distance.to_string());
        row.push(held.space.alignment.to_string());
        row.push(held.space.axes.to_string());
        row.push(
            held.contradicted
                .map_or_else(String::new, |c| c.to_string()),
        );
        table.row(row);
    }
    table.bytes()
}

fn moved(study: &Study, found: &HeldOut) -> Vec<u8> {
    let mut table = Table::new([
        "held_out",
        "species",
        "parcel",
        "landmark",
        "moved",
        "first_with",
        "first_without",
        "rank_without",
    ]);
    for one in &found.influence {
        let name = set_name(study, &one.blocks);
        for side in Side::BOTH {
            let parcels = &study.species[side].parcels;
            let others = study.species[side.opposite()].parcels.labels();
            let owners = study.landmarks.owners(side, parcels.len());
            for moved in &one.moved[side] {
                let landmark = owners[moved.parcel].map(|at| &study.landmarks.list()[at].name);
                let mut row = vec![
                    name.clone(),
                    parcels.species().to_owned(),
                    parcels.labels()[moved.parcel].clone(),
                    landmark.cloned().unwrap_or_default(),
                    moved.by.to_string(),
                ];
                match moved.first {
                    Some((was, is, rank)) => {
                        row.extend([others[was].clone(), others[is].clone(), rank.to_string()]);
                    }
                    None => row.extend([String::new(), String::new(), String::new()]),
                }
                table.row(row);
            }
        }
    }
    table.bytes()
}

/// What was asked and found in sum, for the record.
#[must_use]
pub fn held_out_json(study: &Study, found: &HeldOut) -> serde_json::Value {
    let [first, within_five, reciprocal] = found.chance;
    serde_json::json!({
        "command": "holdout",
        "held-out": match found.each {
            true => "each".into(),
            false => serde_json::Value::from(
                found.sets.sets.iter().map(|set| set_name(study, set)).collect::<Vec<_>>(),
            ),
        },
        "figures": found.figures,
        "fingerprint": found.fingerprint,
        "chance": {
            "first": first, "within-five": within_five, "reciprocal": reciprocal,
        },
        "permuted": found.permuted,
    })
}
