//! What each axis carries.

use maud::{html, Markup};

use super::{fixed, parcel, shown};
use crate::domain::Side;
use crate::page::figures::Figure;
use crate::page::model::{Axis, Model};

/// The section.
pub fn section(model: &Model, figure: &Figure) -> Markup {
    html! {
        section #axes aria-labelledby="axes-title" {
            h2 #axes-title { "What each axis carries" }
            (shown(figure, &["axes.csv"], &html! {
                "In-sample correlations are high by construction; left out, each landmark is placed by a fit without it. An axis replicates if landmarks agree on it when left out, more than permuted pairings do (p at most 0.1), and it stays the same under other weights of the landmarks (reliability at least 0.7). All others are noise: do not interpret them or their ends."
            }))
            @for (at, space) in model.spaces.iter().enumerate() {
                details open[at == model.shown] {
                    summary { "Ends of the " (space.name) " axes" @if at == model.shown { " (distances come from these)" } }
                    div.scroll tabindex="0" role="region" aria-label={ "Axes of the " (space.name) " space" } {
                        table.ends {
                            caption.unseen { "Axes of the " (space.name) " space and the parcels at their ends" }
                            thead { tr {
                                th scope="col" { "Axis" }
                                th scope="col" { "Low end" }
                                th scope="col" { "High end" }
                                @for side in Side::BOTH { th.number scope="col" { "Share of " bdi { (model.species[side]) } } }
                                th.number scope="col" { "In sample" }
                                th.number scope="col" { "Left out" }
                                th.number scope="col" { "p" }
                                th.number scope="col" { "Reliability" }
                                th scope="col" { "Replicates?" }
                            } }
                            tbody { @for (k, axis) in space.axes.iter().enumerate() { (row(model, k + 1, axis)) } }
                        }
                    }
                }
            }
        }
    }
}

fn row(model: &Model, number: usize, axis: &Axis) -> Markup {
    let (glyph, class) = match axis.verdict() {
        "replicates" => ("■", "yes"),
        _ => ("□", "no"),
    };
    html! {
        tr {
            th scope="row" { (number) }
            @for end in 0..2 {
                td.chips { @for side in Side::BOTH { span.chip-row {
                    @for &at in &axis.ends[side][end] { (parcel(model, at)) " " }
                } } }
            }
            @for side in Side::BOTH { td.number { (fixed(axis.shares[side], 2)) } }
            td.number { (fixed(axis.in_sample, 2)) }
            td.number { (axis.left_out.map_or_else(|| "–".to_owned(), |r| fixed(r, 2))) }
            td.number { (axis.p.map_or_else(|| "–".to_owned(), |p| fixed(p, 3))) }
            td.number { (axis.reliability.map_or_else(|| "–".to_owned(), |r| fixed(r, 2))) }
            td class=(class) { span aria-hidden="true" { (glyph) " " } (axis.verdict()) }
        }
    }
}
