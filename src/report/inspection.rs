//! What `inspect` shows: what was understood of a study, on a screen or two.

use std::fmt::{Display, Result, Write};

use serde::Serialize;

use super::record::{json, Identity};
use super::summary::short;
use crate::domain::{DistanceSource, Pair, RowsAre, Side, WeightKind};
use crate::inspect::{AttributeFacts, Inspection, SpeciesFacts, TransformReason};
use crate::prepare::{Filled, Study, SumsToOne};
use crate::transform::WIDE_SPAN;

/// Names listed before the rest is only counted.
const LISTED: usize = 6;
/// Communities shown.
const SYSTEMS: usize = 8;
/// What is shown of what nobody said.
const UNKNOWN: &str = "not known";
/// Rank correlations below this size are not worth a verb: common practice, no source.
const SLIGHT: f64 = 0.1;
/// Width of a line of text.
const WIDTH: usize = 96;

/// Everything about a study before its run, as JSON.
///
/// # Panics
/// Never: everything in it can be written as JSON.
#[must_use]
pub fn inspection_json(study: &Study, found: &Inspection) -> Vec<u8> {
    #[derive(Serialize)]
    #[serde(rename_all = "kebab-case")]
    struct Whole<'s> {
        #[serde(flatten)]
        identity: Identity<'s>,
        title: &'s str,
        #[serde(flatten)]
        found: &'s Inspection,
        caution: &'static str,
    }
    json(&Whole {
        identity: Identity::of(study),
        title: &study.title,
        found,
        caution: super::CAUTION,
    })
}

/// The same for people.
///
/// # Panics
/// Never: writing to memory does not fail.
#[must_use]
pub fn inspection(study: &Study, found: &Inspection) -> String {
    let mut text = String::new();
    verdict(&mut text, study, found)
        .and_then(|()| matrices(&mut text, study, found))
        .and_then(|()| landmarks(&mut text, found))
        .and_then(|()| coverage(&mut text, found))
        .expect("writing to memory does not fail");
    text
}

/// Can it be run, and what should be looked at first.
fn verdict(text: &mut String, study: &Study, found: &Inspection) -> Result {
    writeln!(text, "{}", study.title)?;
    writeln!(
        text,
        "Can be run: every check that locate makes is passed.\n"
    )?;
    list(text, "Worth a thought before the run", &found.suggestions)?;
    list(text, "Warnings", &found.warnings)
}

fn list<T: Display>(text: &mut String, title: &str, entries: &[T]) -> Result {
    if entries.is_empty() {
        return writeln!(text, "{title}: none.\n");
    }
    writeln!(text, "{title} ({}):", entries.len())?;
    for entry in entries {
        wrapped(text, "  - ", &entry.to_string())?;
    }
    writeln!(text)
}

/// Both matrices side by side.
fn matrices(text: &mut String, study: &Study, found: &Inspection) -> Result {
    let of = |cell: &dyn Fn(Side, &SpeciesFacts) -> String| {
        Pair::from_fn(|side| cell(side, &found.species[side]))
    };
    let rows: Vec<(&str, Pair<String>)> = vec![
        ("Matrices", of(&|_, s| short(&s.name))),
        (
            "file",
            of(&|side, _| {
                let subjects = study.cohorts[side].as_ref().map(|cohort| cohort.len());
                match (&study.inputs.matrix[side], subjects) {
                    (Some(file), subjects) => {
                        let name = file.path.file_name().unwrap_or(file.path.as_os_str());
                        let name = short(&name.to_string_lossy());
                        match subjects {
                            Some(n) => format!("{name}, {n} subjects"),
                            None => name,
                        }
                    }
                    (None, n) => format!("mean of {} subjects", n.unwrap_or(0)),
                }
            }),
        ),
        ("parcels", of(&|_, s| s.parcels.to_string())),
        ("  by", of(&|_, s| columns(s))),
        ("weights", of(&|_, s| s.weights.to_string())),
        ("  from - to", of(&|_, s| range(s))),
        ("  positive ones span", of(&|_, s| span(s))),
        ("  sum to 1", of(&|_, s| sums(s).to_owned())),
        ("transform", of(&|_, s| s.transform.to_string())),
        ("  because", of(&|_, s| because(s).to_owned())),
        ("direction", of(&|_, s| direction(s).to_owned())),
        (
            "density",
            of(&|_, s| format!("{:.3} ({} links)", s.density, s.connections)),
        ),
        (
            "parts",
            of(&|_, s| match s.outside_largest_part.len() {
                0 => s.parts.to_string(),
                n => format!("{}; {n} parcels outside", s.parts),
            }),
        ),
        ("never observed", of(&|_, s| never_observed(s))),
        (
            "set aside, no links",
            of(&|_, s| s.set_aside.len().to_string()),
        ),
        ("  not covered", of(&|_, s| s.not_covered.len().to_string())),
        ("hemispheres", of(&|_, s| hemispheres(&s.attributes))),
        ("also known", of(&|_, s| also_known(&s.attributes))),
        ("distances", of(&|_, s| distances(s))),
        ("  with strength", of(&|_, s| over_distance(s))),
        ("profiles compared by", of(&|_, s| affinity(s))),
        ("axes above chance", of(&|_, s| axes_worth(s))),
        ("  first five carry", of(&|_, s| first_five(s))),
    ];
    for (name, cells) in rows {
        if cells.a == UNKNOWN && cells.b == UNKNOWN {
            continue;
        }
        writeln!(
            text,
            "{}",
            format!("{name:<22}{:<34}{}", cells.a, cells.b).trim_end()
        )?;
    }
    for species in both(found) {
        let name = short(&species.name);
        let hubs: Vec<String> = species
            .hubs
            .iter()
            .map(|hub| {
                format!(
                    "{} ({} partners, {})",
                    short(&hub.parcel),
                    hub.partners,
                    number(hub.strength)
                )
            })
            .collect();
        wrapped(text, "", &format!("{name} hubs: {}", hubs.join(", ")))?;
        for (what, parcels) in [
            ("outside the largest part", &species.outside_largest_part),
            ("set aside, no links", &species.set_aside),
            ("not covered by the data", &species.not_covered),
        ] {
            if !parcels.is_empty() {
                wrapped(text, "", &format!("{name} {what}: {}", names(parcels)))?;
            }
        }
        if species.affinity_parts > 1 {
            let parts = species.affinity_parts;
            wrapped(
                text,
                "",
                &format!("{name}: profiles fall into {parts} parts that share no partner"),
            )?;
        }
    }
    writeln!(text)
}

fn landmarks(text: &mut String, found: &Inspection) -> Result {
    let facts = &found.landmarks;
    let mut said = vec![format!(
        "Landmarks: {} in {} blocks",
        facts.count, facts.blocks
    )];
    said.push(match facts.groups.len() {
        0 => "each a single parcel on either side".to_owned(),
        n => format!(
            "{n} with several parcels on a side ({})",
            names(&facts.groups)
        ),
    });
    if !facts.weighted.is_empty() {
        let light: Vec<String> = facts
            .weighted
            .iter()
            .map(|(name, weight)| format!("{name} {weight}"))
            .collect();
        said.push(format!("weights below 1: {}", names(&light)));
    }
    wrapped(text, "", &(said.join("; ") + "."))?;
    for (block, members) in facts.shared_blocks.iter().take(LISTED) {
        wrapped(text, "  ", &format!("block {block}: {}", names(members)))?;
    }
    if facts.shared_blocks.len() > LISTED {
        let more = facts.shared_blocks.len() - LISTED;
        writeln!(text, "  and {more} more blocks of several landmarks")?;
    }
    let bases: Vec<String> = facts
        .bases
        .iter()
        .map(|basis| match basis.basis.as_str() {
            "" => format!("nothing said {}", basis.landmarks),
            said => format!("{} {}", short(said), basis.landmarks),
        })
        .collect();
    let bases = if bases.is_empty() {
        "not stated".to_owned()
    } else {
        names(&bases)
    };
    wrapped(text, "  ", &format!("they rest on: {bases}"))?;
    let axes = &found.axes;
    let tried = if axes.fewest == axes.most {
        format!("{} will be used", axes.most)
    } else {
        format!("{} to {} will be tried", axes.fewest, axes.most)
    };
    writeln!(text, "  axes of the joint spaces: {tried}\n")
}

/// What the landmarks speak for.
fn coverage(text: &mut String, found: &Inspection) -> Result {
    writeln!(text, "Do the landmarks cover the connectivity?")?;
    for species in both(found) {
        let (name, coverage) = (short(&species.name), &species.coverage);
        let systems = coverage.systems.len();
        let uncovered = coverage.uncovered().count();
        let without = match uncovered {
            0 => "each of more than one parcel has a landmark".to_owned(),
            n => format!("{n} WITHOUT a landmark"),
        };
        writeln!(
            text,
            "  {name}: {systems} systems of parcels that connect alike; {without}"
        )?;
        for system in coverage.systems.iter().take(SYSTEMS) {
            let marks = match system.landmarks.len() {
                0 => "no landmark".to_owned(),
                1 => "1 landmark".to_owned(),
                n => format!("{n} landmarks"),
            };
            let heads: Vec<String> = system.parcels.iter().take(4).map(|p| short(p)).collect();
            writeln!(
                text,
                "    {:>4} parcels, {marks:<13} around {}",
                system.parcels.len(),
                heads.join(", ")
            )?;
        }
        if systems > SYSTEMS {
            writeln!(text, "    and {} smaller ones", systems - SYSTEMS)?;
        }
        if let Some(median) = coverage.median_affinity {
            let far: Vec<String> = coverage
                .least_covered
                .iter()
                .map(|far| format!("{} {:.2}", short(&far.parcel), far.affinity))
                .collect();
            let line = format!(
                "least like any landmark (median {median:.2}): {}",
                far.join(", ")
            );
            wrapped(text, "    ", &line)?;
        }
        let beyond: Vec<String> = coverage
            .beyond_landmarks
            .iter()
            .map(|b| format!("{} {:.2}", short(&b.parcel), b.distance))
            .collect();
        let beyond = match beyond.len() {
            0 => "none".to_owned(),
            n => format!("{n}: {}", names(&beyond)),
        };
        let line = format!(
            "beyond every landmark on {} axes (furthest landmark 1): {beyond}",
            found.axes.most
        );
        wrapped(text, "    ", &line)?;
    }
    Ok(())
}

fn both(found: &Inspection) -> [&SpeciesFacts; 2] {
    [&found.species.a, &found.species.b]
}

fn range(species: &SpeciesFacts) -> String {
    let ends = format!(
        "{} to {}",
        number(species.smallest),
        number(species.largest)
    );
    match species.least_positive {
        Some(least) if species.smallest == 0.0 => {
            format!("{ends}, least above 0: {}", number(least))
        }
        _ => ends,
    }
}

fn span(species: &SpeciesFacts) -> String {
    match species.span {
        Some(span) => format!("{span:.1} orders of magnitude"),
        None => "no weight is positive".to_owned(),
    }
}

fn sums(species: &SpeciesFacts) -> &'static str {
    match species.sums_to_one {
        SumsToOne::Rows if species.rectangular == Some(RowsAre::Targets) => {
            "each target (shares of what it receives)"
        }
        SumsToOne::Columns if species.rectangular == Some(RowsAre::Targets) => {
            "each source (shares of what it sends)"
        }
        SumsToOne::Rows => "each row (shares of a source)",
        SumsToOne::Columns => "each column (shares of a target)",
        SumsToOne::Both => "each row and each column",
        SumsToOne::Neither => "neither rows nor columns",
    }
}

fn because(species: &SpeciesFacts) -> String {
    match species.transform_because {
        TransformReason::WideSpan => format!("span above {WIDE_SPAN} orders of magnitude"),
        TransformReason::NarrowSpan => format!("span not above {WIDE_SPAN} orders"),
        TransformReason::Kind => format!("default for {}", species.weights),
        TransformReason::Asked => "the study file says so".to_owned(),
    }
}

/// What the entries of a profile stand for.
fn columns(species: &SpeciesFacts) -> String {
    let Some(parcels_are) = species.rectangular else {
        return "each other".to_owned();
    };
    let traced = species
        .tracer
        .map_or_else(String::new, |tracer| format!(", {tracer}"));
    let others = parcels_are.opposite();
    match species.columns - species.columns_within {
        0 => format!("{} of them as {others}{traced}", species.columns),
        n => format!("{} {others}{traced}, {n} elsewhere", species.columns),
    }
}

fn never_observed(species: &SpeciesFacts) -> String {
    let entries = species.parcels * species.columns;
    match species.missing {
        0 => "none".to_owned(),
        n => format!(
            "{n} entries ({:.1} %)",
            100.0 * n as f64 / entries.max(1) as f64
        ),
    }
}

fn direction(species: &SpeciesFacts) -> &'static str {
    match species.rectangular {
        Some(RowsAre::Sources) => return "rectangular, parcels are sources",
        Some(RowsAre::Targets) => return "rectangular, parcels are targets",
        None => {}
    }
    match (species.weights, species.directed, species.filled) {
        (WeightKind::Correlations, ..) => "none (mean of both halves)",
        (_, false, _) => "none (symmetric)",
        (_, true, Filled::BothHalves) => "directed, row to column",
        (_, true, Filled::Above) => "directed (upper half only)",
        (_, true, Filled::Below) => "directed (lower half only)",
    }
}

fn hemispheres(known: &AttributeFacts) -> String {
    let sides = [
        ("left", known.left),
        ("right", known.right),
        ("midline", known.midline - known.folded.min(known.midline)),
        ("folded", known.folded),
        (UNKNOWN, known.side_unknown),
    ];
    let there = sides.iter().filter(|(_, n)| *n > 0);
    if known.side_unknown > 0 && there.clone().count() == 1 {
        return UNKNOWN.to_owned();
    }
    let said: Vec<String> = there.map(|(side, n)| format!("{n} {side}")).collect();
    said.join(", ")
}

fn also_known(known: &AttributeFacts) -> String {
    let said: Vec<String> = [
        ("groups", known.groups.len()),
        ("places", known.coordinates),
        ("areas", known.areas),
        ("volumes", known.volumes),
        ("long names", known.long_names),
    ]
    .iter()
    .filter(|(_, n)| *n > 0)
    .map(|(what, n)| format!("{n} {what}"))
    .collect();
    if said.is_empty() {
        UNKNOWN.to_owned()
    } else {
        said.join(", ")
    }
}

fn distances(species: &SpeciesFacts) -> String {
    species.distances.as_ref().map_or_else(
        || UNKNOWN.to_owned(),
        |d| {
            let from = match d.from {
                DistanceSource::File => "file",
                DistanceSource::Coordinates => "straight lines",
            };
            format!("{} to {} ({from})", number(d.smallest), number(d.largest))
        },
    )
}

/// Whether connections weaken with distance.
fn over_distance(species: &SpeciesFacts) -> String {
    let rho = species
        .distances
        .as_ref()
        .and_then(|d| d.strength_with_distance);
    match rho {
        None => UNKNOWN.to_owned(),
        Some(rho) if rho <= -SLIGHT => format!("falls (Spearman {rho:.2})"),
        Some(rho) if rho >= SLIGHT => format!("rises (Spearman {rho:.2})"),
        Some(rho) => format!("hardly changes (Spearman {rho:.2})"),
    }
}

fn affinity(species: &SpeciesFacts) -> String {
    let share = species.affinity.strongest.get();
    let kept = if share == 1.0 {
        "all links".to_owned()
    } else {
        format!("strongest {:.3} %", 100.0 * share).replace(".000", "")
    };
    format!("{}, {kept}", species.affinity.likeness)
}

fn axes_worth(species: &SpeciesFacts) -> String {
    let (worth, of) = (species.axes.above_broken_stick, species.axes.shares.len());
    if worth == of {
        format!("all {of} computed")
    } else {
        format!("{worth} of {of} computed")
    }
}

fn first_five(species: &SpeciesFacts) -> String {
    let shares = species.axes.shares.iter().take(5);
    let shares: Vec<String> = shares.map(|s| format!("{:.0}", 100.0 * s)).collect();
    format!("{} %", shares.join(", "))
}

/// A number in as few characters as it takes to know its size.
fn number(x: f64) -> String {
    let size = x.abs();
    if x.fract() == 0.0 && size < 1e7 {
        format!("{x}")
    } else if (0.001..1e5).contains(&size) {
        let text = format!("{x:.*}", if size < 10.0 { 3 } else { 1 });
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        format!("{x:.1e}")
    }
}

/// The first few of a list, and how many more there are.
fn names(all: &[String]) -> String {
    let shown: Vec<String> = all.iter().take(LISTED).map(|name| short(name)).collect();
    match all.len().saturating_sub(LISTED) {
        0 => shown.join(", "),
        more => format!("{} and {more} more", shown.join(", ")),
    }
}

/// A paragraph in lines of limited width; `first` begins the first one, blanks the others.
fn wrapped(text: &mut String, first: &str, words: &str) -> Result {
    let indent = " ".repeat(first.chars().count().max(2));
    let mut line = first.to_owned();
    let mut empty = true;
    for word in words.split(' ') {
        if !empty && line.chars().count() + 1 + word.chars().count() > WIDTH {
            writeln!(text, "{line}")?;
            line.clone_from(&indent);
            empty = true;
        }
        if !empty {
            line.push(' ');
        }
        line.push_str(word);
        empty = false;
    }
    writeln!(text, "{line}")
}
