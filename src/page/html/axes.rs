//! What each axis carries.

use maud::{html, Markup};

use super::{fixed, parcel, shown};
use crate::domain::Side;
use crate::page::figures::Figure;
use crate::page::model::{Axis, Model, REPLICATES};

/// The section.
pub fn section(model: &Model, figure: &Figure) -> Markup {
    html! {
        section #axes aria-labelledby="axes-title" {
            h2 #axes-title { "What each axis carries" }
            (shown(figure, &["axes.csv"], &html! {
                "In-sample correlations are high by construction; left out, each landmark is placed by a fit without it. An axis is said to replicate from a left-out correlation of " (REPLICATES) ", which landmarks paired at random reached on the leading axis of the demo study; around and below 0 there is no agreement that would hold for a new landmark."
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
        "uncertain" => ("◧", "half"),
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
            td class=(class) { span aria-hidden="true" { (glyph) " " } (axis.verdict()) }
        }
    }
}
