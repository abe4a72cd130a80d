//! The landmarks: left-out ranks, influence, contradictions.

use maud::{html, Markup};

use super::{fixed, names, parcel, shown};
use crate::domain::Side;
use crate::linalg::median;
use crate::page::figures::Figure;
use crate::page::model::{Landmark, Model};

/// The section.
pub fn section(model: &Model, figure: &Figure) -> Markup {
    let fingerprint = model.holdout.is_some();
    let influence = model.influence.is_some();
    html! {
        section #landmarks aria-labelledby="landmarks-title" {
            h2 #landmarks-title { "Landmarks" }
            (shown(figure, &["landmarks.csv"], &html! {
                "Ranks in fits and choices without the landmark's block. A contradicted landmark may be wrong, or right but poorly served by connectivity: a reason to look at its evidence again, not a verdict."
            }))
            div.scroll tabindex="0" role="region" aria-label="Table of landmarks" {
                table {
                    caption.unseen { "Landmarks with left-out ranks and influence" }
                    thead { tr {
                        th scope="col" { "Landmark" }
                        @for side in Side::BOTH { th scope="col" { bdi { (model.species[side]) } } }
                        th scope="col" { "Basis" }
                        th.number scope="col" { "Weight" }
                        @for side in Side::BOTH { th.number scope="col" { "Rank from " bdi { (model.species[side]) } } }
                        @if fingerprint { th.number scope="col" { "By fingerprint" } }
                        @if influence {
                            th.number scope="col" { "Others move" }
                            th.number scope="col" { "Firsts that change" }
                        }
                        th scope="col" { "Contradicted" }
                    } }
                    tbody { @for landmark in &model.landmarks { (row(model, landmark)) } }
                }
            }
            p.source {
                "Numbers: " (names(&["landmarks.csv"]))
                @if fingerprint { ", " (names(&["holdout.csv"])) " (ranks by the connectional fingerprint alone, from either side)" }
                @if influence {
                    ", " (names(&["influence.csv"])) " (without the landmark's block: median distance that open parcels move, distance of random pairs = 1; share of them whose first candidate changes)."
                } @else {
                    ". How much each landmark moves the others is not in this run: " code { "kinmark holdout RUN" } " adds influence.csv."
                }
            }
        }
    }
}

fn row(model: &Model, landmark: &Landmark) -> Markup {
    html! {
        tr data-block=(landmark.block) {
            th scope="row" {
                bdi { (landmark.name) }
                @if landmark.block != landmark.name { br; span.hint { "block " bdi { (landmark.block) } } }
            }
            @for side in Side::BOTH { td { @for &at in &landmark.parcels[side] { (parcel(model, at)) " " } } }
            td { bdi { (landmark.basis) } }
            td.number { (landmark.weight) }
            @for side in Side::BOTH {
                @let (rank, of) = landmark.left_out[side];
                td.number { strong { (rank) } " of " (of) }
            }
            @if model.holdout.is_some() { td.number { (by_fingerprint(model, landmark).unwrap_or_else(|| "–".to_owned())) } }
            @if model.influence.is_some() {
                @match moved(model, landmark) {
                    Some((by, changed)) => {
                        td.number { (fixed(by, 3)) }
                        td.number { (fixed(100.0 * changed, 0)) " %" }
                    }
                    None => { td.number { "–" } td.number { "–" } }
                }
            }
            td { @if landmark.contradicted { strong.alarm { span aria-hidden="true" { "▲ " } "contradicted" } } @else { "no" } }
        }
    }
}

/// Ranks by the fingerprint alone, where `holdout.csv` holds each landmark out by itself.
fn by_fingerprint(model: &Model, landmark: &Landmark) -> Option<String> {
    let table = model.holdout.as_ref()?;
    let [set, name, from_a, from_b] = [
        table.column("held_out")?,
        table.column("landmark")?,
        table.column("fingerprint_rank_from_a")?,
        table.column("fingerprint_rank_from_b")?,
    ];
    let row = table
        .rows
        .iter()
        .find(|row| row[name] == landmark.name && row[set] == landmark.block)?;
    (!row[from_a].is_empty()).then(|| format!("{}, {}", row[from_a], row[from_b]))
}

/// Median distance that open parcels move without the landmark's block, and share of firsts that change.
fn moved(model: &Model, landmark: &Landmark) -> Option<(f64, f64)> {
    let influence = model.influence.as_ref()?;
    let set = influence
        .sets
        .iter()
        .position(|set| *set == landmark.block)?;
    let open: Vec<(f64, bool)> = influence.moved[set]
        .iter()
        .flatten()
        .filter_map(|moved| Some((moved.by, moved.first?.1 != 1)))
        .collect();
    let changed = open.iter().filter(|(_, changed)| *changed).count();
    let share = changed as f64 / open.len().max(1) as f64;
    Some((median(open.iter().map(|(by, _)| *by).collect())?, share))
}
