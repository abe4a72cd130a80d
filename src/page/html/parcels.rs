//! The parts of the page that the script fills: joint space and parcel, table of parcels, matrix.

use maud::{html, Markup, PreEscaped};

use super::{names, shown, shown_as};
use crate::domain::Side;
use crate::page::figures::{Figure, MatrixShown};
use crate::page::model::Model;

/// The joint space with what can be chosen, beside one parcel looked over.
pub fn joint(model: &Model, figure: &Figure) -> Markup {
    let two = html! { bdi { (model.species.a) } " and " bdi { (model.species.b) } };
    let drawing = html! {
        div #plot tabindex="0" role="application" aria-label="Joint space, picked with the arrow keys" aria-describedby="plot-help" {
            (PreEscaped(figure.inline()))
        }
    };
    html! {
        section #joint aria-labelledby="joint-title" {
            h2 #joint-title { "Joint space, and one parcel looked over" }
            div.bench {
                div.space {
                    div.controls data-needs-script {
                        label { "Space " select #alignment {} }
                        label { "Across " select #axis-x {} }
                        label { "Upwards " select #axis-y {} }
                        label { "Ellipses " select #ellipses {
                            option value="picked" { "of what is picked" }
                            option value="landmarks" { "of landmarks" }
                            option value="all" { "of all" }
                            option value="none" { "none" }
                        } }
                    }
                    p #plot-help .hint data-needs-script {
                        "Pick a parcel: click on it, type its name, or go to the drawing with the Tab key and move with the arrow keys; Escape lets go."
                    }
                    (shown_as(figure, &drawing, &["positions.csv", "landmarks.csv"], &html! {
                            "Coordinates of " (two) " in one frame; each axis has a scale of its own. Ellipses hold 90 % of bootstrap positions of a parcel relative to the other species, if normal; their axes lie along those of the figure, since the table holds the standard error of each coordinate and not how two of them go together."
                    }))
                }
                aside.card.empty #card aria-labelledby="card-title" {
                    form.find data-needs-script {
                        label for="find" { "Parcel" }
                        div.row {
                            input #find type="search" list="all-parcels" autocomplete="off" spellcheck="false" placeholder="type a name";
                            button type="submit" { "Pick" }
                            button #let-go type="button" { "Let go" }
                        }
                        datalist #all-parcels {}
                        p #find-fault .fault role="alert" {}
                    }
                    h3 #card-title tabindex="-1" { "No parcel is picked" }
                    div #card-body {
                        p.hint data-needs-script { "What is picked is marked everywhere on this page: in the joint space, the matrix and the tables, together with its first counterparts." }
                    }
                }
            }
        }
    }
}

/// Columns of the table of all parcels: key, heading, what it means, whether it holds numbers.
const COLUMNS: [(&str, &str, &str, bool); 10] = [
    ("parcel", "Parcel", "label", false),
    ("group", "Group", "group from the table of parcels", false),
    (
        "standing",
        "Standing",
        "stable, one-sided, cannot tell, landmark",
        false,
    ),
    ("first", "First candidate", "candidate of rank 1", false),
    (
        "chance",
        "Chance",
        "estimated chance that the first candidate is right; cautious, 0 to 1",
        true,
    ),
    (
        "support",
        "Support",
        "share of replicates in which it came first, 0 to 1; stability, not truth",
        true,
    ),
    (
        "interval",
        "Rank interval",
        "central 90 % of its ranks over replicates",
        true,
    ),
    (
        "set",
        "In set",
        "candidates listed that are in the candidate set",
        true,
    ),
    (
        "doubt",
        "No counterpart p",
        "p-value of doubt that it has a counterpart; small is a doubt, not a finding",
        true,
    ),
    (
        "beyond",
        "Beyond landmarks",
        "distance from the landmarks' mean, furthest landmark = 1; above 1 is extrapolation",
        true,
    ),
];

/// The table of all parcels.
pub fn table(model: &Model) -> Markup {
    let grouped = model.parcels.iter().any(|p| !p.attributes[1].is_empty());
    html! {
        section #parcels aria-labelledby="parcels-title" {
            h2 #parcels-title { "All parcels" }
            div.controls data-needs-script {
                label { "Search " input #search type="search" placeholder="parcel, candidate, group" autocomplete="off" spellcheck="false"; }
                label { "Species " select #filter-species {
                    option value="" { "both" }
                    @for (at, side) in Side::BOTH.into_iter().enumerate() {
                        option value=(at) { (model.species[side]) }
                    }
                } }
                label { "Standing " select #filter-standing {
                    option value="" { "all" }
                    @for word in ["stable", "one-sided", "cannot tell", "no candidate", "landmark"] {
                        option value=(word) { (word) }
                    }
                } }
                label { "Marked " select #filter-mark {
                    option value="" { "or not" }
                    option value="doubt" { "doubt about a counterpart" }
                    option value="little" { "too little data" }
                    option value="beyond" { "beyond the landmarks" }
                    @if model.checks.is_some() { option value="checked" { "checked" } }
                } }
                span.buttons {
                    button #copy type="button" { "Copy as CSV" }
                    button #download type="button" { "Download CSV" }
                }
            }
            p #counted .hint role="status" {}
            div.scroll tabindex="0" role="region" aria-label="Table of all parcels" {
                table #parcel-table {
                    caption.unseen { "All parcels with their first candidates" }
                    thead { tr {
                        @for (key, heading, meaning, numbers) in COLUMNS {
                            @if key != "group" || grouped {
                                th scope="col" data-key=(key) class=[numbers.then_some("number")] {
                                    button type="button" title=(meaning) { (heading) span.arrow aria-hidden="true" {} }
                                }
                            }
                        }
                        @if model.checks.is_some() {
                            th scope="col" data-key="verdict" { button type="button" title="verdict of checks.csv" { "Verdict" span.arrow aria-hidden="true" {} } }
                        }
                    } }
                    tbody {}
                }
            }
            p #pages .buttons hidden { button #before type="button" { "Rows before" } button #after type="button" { "Rows after" } }
            p.source {
                "Numbers: " (names(&["counterparts.csv", "parcels.csv", "positions.csv"])) ". "
                "The CSV holds the rows that pass the filters, in their order, with all digits of the tables. A text cell that begins with =, +, -, @ or a tab gets an apostrophe before it, so that no spreadsheet takes it for a formula; the tables of the run hold labels as they are."
            }
        }
    }
}

/// The correspondence matrix.
pub fn matrix(model: &Model, figure: &Figure) -> Markup {
    let thinned = MatrixShown::of(model).thinned;
    html! {
        section #matrix aria-labelledby="matrix-title" {
            h2 #matrix-title { "Correspondence matrix" }
            (shown(figure, &["counterparts.csv", "positions.csv"], &html! {
                "Both species in the order of their coordinates on the first axis of the space that gives the distances: where they agree, a diagonal. Empty cells are pairs that neither side lists; counterparts.csv holds the best candidates only, as many as the setting top says. "
                @if thinned { "There are more parcels than the figure has room for: pairs below rank 3 are left out. " }
            }))
            p #matrix-cell .hint data-needs-script aria-live="polite" { "Point at a cell to read it; a click picks its parcel of " bdi { (model.species.a) } "." }
        }
    }
}
