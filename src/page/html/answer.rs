//! The answer in ten seconds: trust, clear counterparts, checks.

use std::collections::BTreeMap;

use maud::{html, Markup};

use super::{fixed, names, shown};
use crate::domain::{Pair, Side};
use crate::page::figures::Figure;
use crate::page::model::{Answer, Model, Standing, STABLE};

/// Checks that are shown at once; the others stand in a list to open.
const CHECKS: usize = 6;

/// The section.
pub fn section(model: &Model, left_out: &Figure, counterparts: &Figure) -> Markup {
    html! {
        section #answer aria-labelledby="answer-title" {
            h2 #answer-title { "The answer" }
            div.answers {
                article { (trust(model, left_out)) }
                article { (clear(model, counterparts)) }
                article { (checked(model)) }
            }
        }
    }
}

fn trust(model: &Model, figure: &Figure) -> Markup {
    let n = model.landmarks.len();
    let placed = |side: Side| model.landmarks.iter().map(move |l| l.left_out[side]);
    let within = |side: Side, k: usize| placed(side).filter(|(rank, _)| *rank <= k).count();
    let mean = |of: &dyn Fn((usize, usize)) -> f64| {
        Pair::from_fn(|side| placed(side).map(of).sum::<f64>() / n.max(1) as f64)
    };
    let both = |pair: Pair<f64>| (pair.a + pair.b) / 2.0;
    let chance = |k: usize| both(mean(&|(_, of)| (k as f64 / of.max(1) as f64).min(1.0)));
    let reciprocal = mean(&|(rank, _)| 1.0 / rank as f64);
    let harmonic = |of: usize| (1..=of).map(|rank| 1.0 / rank as f64).sum::<f64>();
    let reciprocal_chance = both(mean(&|(_, of)| harmonic(of) / of.max(1) as f64));
    let contradicted: Vec<&str> = model
        .landmarks
        .iter()
        .filter(|l| l.contradicted)
        .map(|l| l.name.as_str())
        .collect();
    html! {
        h3 { "Can the landmarks be trusted?" }
        @for side in Side::BOTH {
            p.big { (within(side, 1)) " of " (n) " " span class=(format!("small species-{}", side.letter())) { "from " bdi { (model.species[side]) } } }
        }
        p {
            "found their partner first. Each landmark was left out in turn and every choice made again without it. By chance "
            (fixed(chance(1) * n as f64, 1)) " of " (n) " would be found first."
        }
        div.scroll tabindex="0" role="region" aria-label="Left-out landmarks in numbers" {
            table.numbers {
                caption.unseen { "Where the partner of a left-out landmark comes" }
                thead { tr {
                    th scope="col" { "partner comes" }
                    @for side in Side::BOTH { th scope="col" { "from " bdi { (model.species[side]) } } }
                    th scope="col" { "chance" }
                } }
                tbody {
                    @for (words, k) in [("first", 1), ("among first five", 5)] {
                        tr {
                            th scope="row" { (words) }
                            @for side in Side::BOTH { td { (within(side, k)) " of " (n) } }
                            td { (fixed(chance(k) * n as f64, 1)) " of " (n) }
                        }
                    }
                    tr {
                        th scope="row" { "mean 1 / rank" }
                        @for side in Side::BOTH { td { (fixed(reciprocal[side], 2)) } }
                        td { (fixed(reciprocal_chance, 2)) }
                    }
                }
            }
        }
        @if contradicted.is_empty() {
            p { "No landmark is contradicted by the others." }
        } @else {
            p.alarm {
                span aria-hidden="true" { "▲ " }
                strong { "Contradicted by the others: " }
                @for (at, name) in contradicted.iter().enumerate() {
                    @if at > 0 { ", " } bdi { (name) }
                }
                ". Look at the evidence for it again."
            }
        }
        (shown(figure, &["landmarks.csv"], &html! {
            "The further above the dotted line, the more can be expected of the other parcels, if they are like the landmarks."
        }))
    }
}

fn clear(model: &Model, figure: &Figure) -> Markup {
    let open = |side: Side| {
        model
            .of_side(side)
            .filter(|(_, p)| p.standing() != Standing::Landmark)
            .count()
    };
    let stable = |side: Side| model.count(side, Standing::Stable);
    let likely = |side: Side| {
        model
            .of_side(side)
            .filter(|(_, p)| {
                p.candidates
                    .first()
                    .and_then(|c| c.chance)
                    .is_some_and(|c| c >= 0.5)
            })
            .count()
    };
    html! {
        h3 { "How many parcels have a clear counterpart?" }
        @for side in Side::BOTH {
            p.big { (stable(side)) " of " (open(side)) " " span class=(format!("small species-{}", side.letter())) { bdi { (model.species[side]) } } }
        }
        p {
            "are stable: each is the other's first, under at least half of all landmark weights (support "
            (STABLE) " or more). That is not yet right: an estimated chance of at least 0.5 have "
            (likely(Side::A)) " and " (likely(Side::B)) "."
        }
        (shown(figure, &["counterparts.csv"], &html! {
            "One-sided: first under at least half of the weights, but not the other way round. Cannot tell: another comes first under most weights. The chance is cautious: read it as at least about so much."
        }))
    }
}

/// What a verdict is called in front of its word, so that it is not told by colour.
fn glyph(verdict: &str) -> &'static str {
    match verdict {
        "conserved" => "✓",
        "displaced" => "↷",
        "undetermined" => "?",
        _ => "–",
    }
}

fn checked(model: &Model) -> Markup {
    let columns = |checks: &Answer| {
        Some((
            checks.column("a")?,
            checks.column("b")?,
            checks.column("verdict")?,
            checks.column("why"),
        ))
    };
    let found = model
        .checks
        .as_ref()
        .and_then(|checks| Some((checks, columns(checks)?)));
    html! {
        h3 { "Which candidates were checked?" }
        @if let Some((checks, (a, b, verdict, why))) = found {
            @let counts = counts(checks, verdict);
            p.big { (checks.rows.len()) " " span.small { @if checks.rows.len() == 1 { "check" } @else { "checks" } " of named pairs" } }
            ul.verdicts {
                @for (word, count) in &counts {
                    li { span.glyph aria-hidden="true" { (glyph(word)) } " " strong { (count) } " " bdi { (word) } }
                }
            }
            @let asked = checks.column("asked_from");
            @let pair = |row: &Vec<String>| html! {
                li {
                    bdi { (row[a]) } " – " bdi { (row[b]) } @if let Some(side) = asked.and_then(|at| from(model, &row[at])) { " (asked from " bdi { (side) } ")" } ": "
                    strong { span aria-hidden="true" { (glyph(&row[verdict])) " " } bdi { (row[verdict]) } }
                    @if let Some(why) = why { ". " span.why { bdi { (row[why]) } } }
                }
            };
            ul.checks { @for row in checks.rows.iter().take(CHECKS) { (pair(row)) } }
            @if checks.rows.len() > CHECKS {
                details {
                    summary { (checks.rows.len() - CHECKS) " more" }
                    ul.checks { @for row in checks.rows.iter().skip(CHECKS) { (pair(row)) } }
                }
            }
            p.source { "Verdicts: " (names(&["checks.csv"])) }
        } @else {
            p.big { "None " span.small { "checked yet" } }
            p {
                "The run holds no checks.csv. " code { "kinmark check" } " on this run asks whether the position of a named pair is conserved, and adds a verdict: conserved, displaced, undetermined, or that these data cannot show it."
            }
        }
        h4 { "Best first candidates" }
        (best(model))
        h4 { "What else is in the run" }
        ul.added {
            @for (table, there, adds) in [
                ("influence.csv", model.influence.is_some(), "how everyone moves without each landmark"),
                ("holdout.csv", model.holdout.is_some(), "left-out ranks beside the fingerprint's"),
                ("checks.csv", model.checks.is_some(), "verdicts on single pairs"),
            ] {
                li {
                    @if there { span aria-hidden="true" { "■ " } (names(&[table])) ": " (adds) }
                    @else {
                        span aria-hidden="true" { "□ " } (table) ": " (adds) "; absent, "
                        code { "kinmark " (if table == "checks.csv" { "check" } else { "holdout" }) } " adds it"
                    }
                }
            }
        }
    }
}

/// The species that a check was asked from, by its letter.
fn from<'m>(model: &'m Model, letter: &str) -> Option<&'m str> {
    Side::BOTH
        .into_iter()
        .find(|side| side.letter() == letter)
        .map(|side| model.species[side].as_str())
}

/// How often each verdict was given, in the order of the words.
fn counts(checks: &Answer, verdict: usize) -> BTreeMap<&str, usize> {
    let mut counts = BTreeMap::new();
    for row in &checks.rows {
        *counts.entry(row[verdict].as_str()).or_insert(0) += 1;
    }
    counts
}

/// The parcels of a whose first candidate has the best chance.
fn best(model: &Model) -> Markup {
    const LISTED: usize = 5;
    let mut firsts: Vec<(usize, usize, f64, f64)> = model
        .of_side(Side::A)
        .filter(|(_, p)| p.standing() == Standing::Stable)
        .filter_map(|(at, p)| {
            let first = p.candidates.first()?;
            Some((at, first.parcel, first.chance?, first.support))
        })
        .collect();
    firsts.sort_by(|x, y| {
        (y.2.total_cmp(&x.2))
            .then(y.3.total_cmp(&x.3))
            .then(x.0.cmp(&y.0))
    });
    html! {
        @if firsts.is_empty() { p { "No parcel of " bdi { (model.species.a) } " is stable." } }
        @else {
            table.numbers.best {
                caption.unseen { "Stable parcels with the best chance" }
                thead { tr { th scope="col" { bdi { (model.species.a) } } th scope="col" { bdi { (model.species.b) } } th scope="col" { "chance" } th scope="col" { "support" } } }
                tbody {
                    @for (a, b, chance, support) in firsts.into_iter().take(LISTED) {
                        tr {
                            td { (super::parcel(model, a)) }
                            td { (super::parcel(model, b)) }
                            td { (fixed(chance, 2)) }
                            td { (fixed(support, 2)) }
                        }
                    }
                }
            }
        }
    }
}
