//! Method, settings, inputs, warnings, and how to cite.

use maud::{html, Markup};
use serde_json::Value;

use super::names;
use crate::domain::Side;
use crate::page::model::{Answer, Model};
use crate::report::TABLES;

/// Rows of an added table that are shown; the file holds all.
const SHOWN: usize = 60;

/// Published methods that a run rests on, with their sources as in docs/method.md.
const SOURCES: [(&str, &str); 7] = [
    ("Embedding by a diffusion map", "Coifman RR, Lafon S (2006). Applied and Computational Harmonic Analysis 21:5–30. doi:10.1016/j.acha.2006.04.006"),
    ("Weighted Procrustes", "Schönemann PH (1966). Psychometrika 31:1–10. doi:10.1007/BF02289451"),
    ("Canonical correlation", "Hotelling H (1936). Biometrika 28:321–377. doi:10.1093/biomet/28.3-4.321"),
    ("Its ridge", "Vinod HD (1976). Journal of Econometrics 4:147–166. doi:10.1016/0304-4076(76)90010-5"),
    ("Connectional fingerprints", "Passingham RE, Stephan KE, Kötter R (2002). Nature Reviews Neuroscience 3:606–616. doi:10.1038/nrn893"),
    ("Transport between networks", "Vayer T and others (2019), fused Gromov–Wasserstein; Peyré G, Cuturi M, Solomon J (2016)"),
    ("Bayesian bootstrap", "Rubin DB (1981). Annals of Statistics 9:130–134. doi:10.1214/aos/1176345338"),
];

/// The section.
pub fn section(model: &Model) -> Markup {
    let record = &model.record;
    html! {
        section #record aria-labelledby="record-title" {
            h2 #record-title { "Method and record" }
            div.record {
                div {
                    h3 { "Warnings" }
                    @match record["warnings"].as_array().filter(|all| !all.is_empty()) {
                        Some(all) => ul.warnings { @for warning in all { li { span aria-hidden="true" { "▲ " } bdi { (plain(warning)) } } } },
                        None => p { "None." },
                    }
                    h3 { "Method in short" }
                    (method(model))
                    h3 { "How to cite" }
                    (cite(model))
                }
                div {
                    h3 { "Settings" }
                    (pairs("Settings of the run, after defaults", &record["settings"]))
                    h3 { "Treatment of the matrices" }
                    @for side in Side::BOTH {
                        h4 { bdi { (model.species[side]) } }
                        (pairs("Treatment of a matrix", &record["treatment"][side.letter()]))
                    }
                    h3 { "Evidence" }
                    (evidence(record))
                }
            }
            h3 { "Inputs and their checksums" }
            div.scroll tabindex="0" role="region" aria-label="Inputs" {
                table.inputs {
                    caption.unseen { "Files that were read, with SHA-256" }
                    thead { tr { th scope="col" { "Role" } th scope="col" { "File" } th scope="col" { "SHA-256" } } }
                    tbody { @for (role, path, sha256) in inputs(&record["inputs"], String::new()) {
                        tr { th scope="row" { (role) } td { bdi { (path) } } td { code { (sha256) } } }
                    } }
                }
            }
            @for (name, table) in [("checks.csv", &model.checks), ("holdout.csv", &model.holdout), ("rank.csv", &model.rank)] {
                @if let Some(table) = table { (added(name, table)) }
            }
            h3 { "Tables beside this page" }
            p { (names(&TABLES)) ", " (names(&["run.json"])) ". Numbers on this page are rounded; the tables hold all digits, and docs/formats.md of the program describes every column." }
        }
    }
}

fn method(model: &Model) -> Markup {
    let record = &model.record;
    let level = record["candidate-sets"]["used"].as_f64();
    html! {
        ol {
            li { "The connectivity of each species becomes strengths, profiles and affinities, and these coordinates (embedding: " (plain(&record["settings"]["embedding"])) ")." }
            li { "Landmarks bring both sets of coordinates together, by weighted Procrustes and by ridge canonical correlation. The number of axes and the space that gives the distances (" (model.spaces[model.shown].name) ") were chosen by left-out landmarks." }
            li { "Candidates are ranked by kinds of evidence that are weighed by how well they find left-out landmarks." }
            li { "Landmarks are given random weights again and again: support is the share of these replicates in which a candidate comes first, rank intervals hold the central 90 % of its ranks." }
            @if let Some(level) = level {
                li { "Candidate sets are calibrated on left-out landmarks to hold the counterpart of " (super::fixed(100.0 * level, 0)) " % of parcels like the landmarks." }
            }
        }
        p { "Formulas, sources and limits: docs/method.md and docs/validity.md of the program." }
    }
}

fn cite(model: &Model) -> Markup {
    let record = &model.record;
    let seed = plain(&record["settings"]["seed"]);
    let study = record["inputs"]["study"]["sha256"].as_str().unwrap_or("");
    html! {
        p.citation {
            "kinmark, version " (plain(&record["version"])) ". Run of “" bdi { (model.title) } "”, seed " (seed)
            @if !study.is_empty() { ", study file SHA-256 " (study.get(..16).unwrap_or(study)) "…" }
            "."
        }
        p { "Give the settings and checksums of this section with it, the sources of both connectivities and of the landmarks, and the methods:" }
        ul.sources { @for (what, source) in SOURCES { li { (what) ": " (source) } } }
    }
}

/// A value of the record as text.
fn plain(value: &Value) -> String {
    match value {
        Value::Null => "–".to_owned(),
        Value::String(text) => text.clone(),
        Value::Array(all) => all.iter().map(plain).collect::<Vec<_>>().join(", "),
        other => other.to_string(),
    }
}

/// Keys and values of an object, nested ones spelt with a dot.
fn flat(value: &Value, before: &str, found: &mut Vec<(String, String)>) {
    let Value::Object(fields) = value else {
        found.push((before.to_owned(), plain(value)));
        return;
    };
    for (key, value) in fields {
        let key = match before {
            "" => key.clone(),
            _ => format!("{before}.{key}"),
        };
        flat(value, &key, found);
    }
}

fn pairs(name: &str, value: &Value) -> Markup {
    let mut found = Vec::new();
    flat(value, "", &mut found);
    html! {
        table.pairs {
            caption.unseen { (name) }
            tbody { @for (key, value) in found { tr { th scope="row" { (key) } td { bdi { (value) } } } } }
        }
    }
}

fn evidence(record: &Value) -> Markup {
    let rests = &record["evidence"];
    let kinds = rests["kinds"]
        .as_array()
        .map(Vec::as_slice)
        .unwrap_or_default();
    let number = |value: &Value| {
        value
            .as_f64()
            .map_or_else(|| "–".to_owned(), |x| super::fixed(x, 2))
    };
    html! {
        table.numbers {
            caption.unseen { "Kinds of evidence" }
            thead { tr { th scope="col" { "Kind" } th scope="col" { "Weight" } th scope="col" { "Left-out error" } } }
            tbody { @for kind in kinds {
                tr { th scope="row" { (plain(&kind["kind"])) } td { (number(&kind["weight"])) } td { (number(&kind["error"])) } }
            } }
        }
        @for why in rests["unavailable"].as_array().map(Vec::as_slice).unwrap_or_default() {
            p.hint { bdi { (plain(why)) } }
        }
        p.hint { "Left-out error: 0 where all counterparts of left-out landmarks come first, 1 where all come last. Support and rank intervals come from " (plain(&rests["ranking-replicates"])) " replicates." }
    }
}

/// Role, path and checksum of every input.
fn inputs(value: &Value, role: String) -> Vec<(String, String, String)> {
    match value {
        Value::Object(fields) => {
            if let (Some(path), Some(sha256)) = (fields.get("path"), fields.get("sha256")) {
                return vec![(role, plain(path), plain(sha256))];
            }
            let below = |key: &String| match role.is_empty() {
                true => key.clone(),
                false => format!("{role}, {key}"),
            };
            fields
                .iter()
                .flat_map(|(key, value)| inputs(value, below(key)))
                .collect()
        }
        Value::Array(items) => items
            .iter()
            .enumerate()
            .flat_map(|(at, value)| inputs(value, format!("{role} {}", at + 1)))
            .collect(),
        _ => Vec::new(),
    }
}

/// A table that an answer added, as it stands.
fn added(name: &str, table: &Answer) -> Markup {
    html! {
        details {
            summary { "Added to the run: " (name) ", " (table.rows.len()) " rows" }
            div.scroll tabindex="0" role="region" aria-label=(name) {
                table {
                    caption.unseen { (name) }
                    thead { tr { @for column in &table.header { th scope="col" { bdi { (column) } } } } }
                    tbody { @for row in table.rows.iter().take(SHOWN) { tr { @for cell in row { td { bdi { (cell) } } } } } }
                }
            }
            @if table.rows.len() > SHOWN { p.hint { "The first " (SHOWN) " rows; " (names(&[name])) " holds all." } }
        }
    }
}
