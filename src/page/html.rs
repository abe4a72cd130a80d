//! The page: what stands in it before its script runs. Text goes through `maud`, which escapes it.

mod answer;
mod axes;
mod landmarks;
mod parcels;
mod record;

use base64::prelude::{Engine, BASE64_STANDARD};
use maud::{html, Markup, PreEscaped, DOCTYPE};
use sha2::{Digest, Sha256};

use super::data::island;
use super::figures::Figure;
use super::model::Model;
use crate::domain::Side;
use crate::report::CAUTION;

const STYLE: &str = include_str!("page.css");
const SCRIPT: &str = include_str!("page.js");

/// The whole page.
pub fn page(model: &Model, figures: &[Figure]) -> String {
    let figure = |name: &str| {
        let found = figures.iter().find(|figure| figure.name == name);
        found.expect("the page shows only figures that there are")
    };
    // Nothing is loaded, and no script runs but this one.
    let digest = BASE64_STANDARD.encode(Sha256::digest(SCRIPT.as_bytes()));
    let policy = format!(
        "default-src 'none'; style-src 'unsafe-inline'; script-src 'sha256-{digest}'; \
         base-uri 'none'; form-action 'none'"
    );
    let counts = |side: Side| {
        let parcels = model.of_side(side).count();
        html! { bdi { (model.species[side]) } " (" (parcels) " parcels)" }
    };
    html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta http-equiv="Content-Security-Policy" content=(policy);
                meta name="viewport" content="width=device-width, initial-scale=1";
                meta name="generator" content=(concat!("kinmark ", env!("CARGO_PKG_VERSION")));
                title { (model.title) }
                style { (PreEscaped(STYLE)) }
            }
            body {
                a.skip href="#answer" { "To the answer" }
                header.top {
                    p.kind { "Correspondence of parcels between two species" }
                    h1 { bdi { (model.title) } }
                    p.facts {
                        span.species-a { (counts(Side::A)) } " and " span.species-b { (counts(Side::B)) } ", "
                        (model.landmarks.len()) " landmarks. "
                        "kinmark " (model.record["version"].as_str().unwrap_or("of unknown version")) "."
                    }
                    (caution())
                    nav aria-label="Parts of this page" {
                        a href="#answer" { "Answer" }
                        a href="#joint" { "Joint space" }
                        a href="#parcels" { "All parcels" }
                        a href="#axes" { "Axes" }
                        a href="#landmarks" { "Landmarks" }
                        a href="#matrix" { "Matrix" }
                        a href="#record" { "Method and record" }
                    }
                }
                main {
                    noscript {
                        p.note { "Picking parcels, other axes and the table of parcels need JavaScript; the tables of the run hold the same numbers." }
                    }
                    (answer::section(model, figure("left-out"), figure("counterparts")))
                    (parcels::joint(model, figure("joint-space")))
                    (parcels::table(model))
                    (axes::section(model, figure("axes")))
                    (landmarks::section(model, figure("landmarks")))
                    (parcels::matrix(model, figure("matrix")))
                    (record::section(model))
                }
                footer { (caution()) }
                p #said .unseen role="status" {}
                script #data type="application/json" { (PreEscaped(island(model))) }
                script { (PreEscaped(SCRIPT)) }
            }
        }
    }
    .into_string()
}

/// What every output says about its use.
fn caution() -> Markup {
    let text = CAUTION.replace('\n', " ");
    let text = text.strip_prefix("Caution: ").unwrap_or(&text);
    html! { p.caution { strong { "Caution. " } (upper(text)) } }
}

fn upper(text: &str) -> String {
    let mut chars = text.chars();
    let first = chars.next().map(|c| c.to_uppercase().to_string());
    first.unwrap_or_default() + chars.as_str()
}

/// A figure with what is to be said of it and the tables that its numbers come from.
fn shown(figure: &Figure, tables: &[&str], caption: &Markup) -> Markup {
    let drawing = html! { (PreEscaped(figure.inline())) };
    shown_as(figure, &drawing, tables, caption)
}

/// The same with the drawing wrapped in something.
fn shown_as(figure: &Figure, drawing: &Markup, tables: &[&str], caption: &Markup) -> Markup {
    let file = format!("figures/{}.svg", figure.name);
    html! {
        figure id=(format!("figure-{}", figure.name)) {
            (drawing)
            figcaption {
                (caption) " "
                span.source { "Numbers: " (names(tables)) ". Drawing: " a href=(file) { (file) } }
            }
        }
    }
}

/// Names of tables, as links to the files beside the page.
fn names(tables: &[&str]) -> Markup {
    html! {
        @for (at, table) in tables.iter().enumerate() {
            @if at > 0 { ", " }
            a href=(table) { (table) }
        }
    }
}

/// A button that picks a parcel.
fn parcel(model: &Model, at: usize) -> Markup {
    let parcel = &model.parcels[at];
    let side = parcel.side.letter();
    // Short names stay on one line; long ones may break anywhere.
    let short = parcel.label.chars().count() <= 20;
    html! {
        button type="button" class={ "parcel of-" (side) @if short { " short" } } data-parcel=(at) {
            bdi { (parcel.label) }
        }
    }
}

/// A number with so many decimals, and the sign that typesetting takes.
fn fixed(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    let is_zero = text.chars().all(|c| matches!(c, '-' | '0' | '.'));
    let text = text.trim_start_matches(|c| is_zero && c == '-').to_owned();
    text.replace('-', "\u{2212}")
}
