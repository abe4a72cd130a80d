//! All parcels, best first: for people, and as a table.

use std::fmt::{Result, Write};

use super::held_out::p_value;
use super::summary::short;
use super::tables::{Table, PARCEL_SEPARATOR};
use crate::domain::Side;
use crate::locate::{q_values, Counterpart, Located, Placement};
use crate::prepare::Study;

/// A set that holds more than this share of the candidates tells next to nothing.
const WIDE: f64 = 0.25;
/// A p-value of doubt about a counterpart from which a parcel is not listed among the best.
const DOUBTFUL: f64 = 0.1;
/// Candidates of a set that are named on the terminal.
const NAMED: usize = 3;

/// One parcel with a first candidate.
struct Row<'l> {
    placement: &'l Placement,
    first: &'l Counterpart,
    q: f64,
}

/// The parcels of a species, best first: by chance, then by strength, then in the order of the file.
fn rows(located: &Located, side: Side) -> Vec<Row<'_>> {
    let placed: Vec<(&Placement, &Counterpart)> = located.placements[side]
        .iter()
        .filter_map(|placement| Some((placement, placement.counterparts.first()?)))
        .collect();
    let p: Vec<f64> = placed
        .iter()
        .map(|(placement, _)| placement.p_of_none)
        .collect();
    let mut rows: Vec<Row<'_>> = placed
        .into_iter()
        .zip(q_values(&p))
        .map(|((placement, first), q)| Row {
            placement,
            first,
            q,
        })
        .collect();
    rows.sort_by(|x, y| {
        let chance = |row: &Row<'_>| row.first.chance.unwrap_or(0.0);
        (chance(y).total_cmp(&chance(x)))
            .then(y.placement.strength.total_cmp(&x.placement.strength))
    });
    rows
}

/// Where a parcel is shown.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Section {
    /// Its first candidate can be named.
    Best,
    /// Its set is too wide, or much speaks against a counterpart.
    NoClearCounterpart,
    /// It has fewer connections than every landmark.
    TooLittleData,
}

impl Section {
    fn of(located: &Located, side: Side, placement: &Placement) -> Section {
        let judged = located.judgements[side][placement.parcel];
        let is_wide = settled_set(placement).len() as f64 > WIDE * placement.candidates as f64;
        let is_doubtful = judged.doubt.is_some_and(|doubt| doubt.p <= DOUBTFUL);
        match (judged.too_little_data, is_wide || is_doubtful) {
            (true, _) => Section::TooLittleData,
            (false, true) => Section::NoClearCounterpart,
            (false, false) => Section::Best,
        }
    }
}

/// The set that says whether a parcel is settled: the one calibrated without contradicted landmarks, where
/// there are any, since with a dozen landmarks a single wrong one lets nearly everything in.
fn settled_set(placement: &Placement) -> &[usize] {
    let calm = placement.calm_set.as_ref();
    calm.unwrap_or(&placement.candidate_set)
}

/// The account for people.
///
/// # Panics
/// Never: writing to memory does not fail.
#[must_use]
pub fn ranked(study: &Study, located: &Located) -> String {
    let mut text = String::new();
    heading(&mut text, study, located)
        .and_then(|()| {
            Side::BOTH
                .into_iter()
                .try_for_each(|side| species(&mut text, study, located, side))
        })
        .expect("writing to memory does not fail");
    text
}

fn heading(text: &mut String, study: &Study, located: &Located) -> Result {
    let level = located.set_level;
    writeln!(text, "{}", study.title)?;
    writeln!(
        text,
        "Candidate sets hold the counterpart of {:.0} % of parcels that are like the landmarks.",
        100.0 * level.used
    )?;
    if level.is_lowered() {
        writeln!(
            text,
            "  {} landmark blocks allow no more; {:.0} % was asked for and takes {}.",
            level.blocks,
            100.0 * level.asked,
            (1.0 / (1.0 - level.asked) - 1.0 - 1e-9).ceil()
        )?;
    }
    let contradicted: Vec<&str> = located
        .left_out
        .iter()
        .zip(study.landmarks.list())
        .filter(|(l, _)| l.contradicted.is_some())
        .map(|(_, landmark)| landmark.name.as_str())
        .collect();
    if !contradicted.is_empty() {
        writeln!(
            text,
            "  Sets are shown as calibrated without {}, which the others contradict; in brackets with all\n  \
             landmarks, as it must be if they are right after all.",
            contradicted.join(", ")
        )?;
    }
    let least = 1.0 / (level.blocks + 1) as f64;
    writeln!(
        text,
        "q: of parcels with such a q or less, the expected share without any counterpart among the\n  \
         candidates; {} landmark blocks give no q below {least:.3}. The test is weak: a large q means nothing.",
        level.blocks
    )
}

fn species(text: &mut String, study: &Study, located: &Located, side: Side) -> Result {
    let (own, other) = (
        &study.species[side].parcels,
        &study.species[side.opposite()].parcels,
    );
    let rows = rows(located, side);
    let of = |section: Section| -> Vec<&Row<'_>> {
        rows.iter()
            .filter(|row| Section::of(located, side, row.placement) == section)
            .collect()
    };
    let best = of(Section::Best);
    writeln!(
        text,
        "\n{} in {}: {} parcels, best first.",
        short(own.species()),
        short(other.species()),
        best.len()
    )?;
    header(text)?;
    for row in best {
        line(text, study, located, side, row)?;
    }
    for (section, why) in [
        (
            Section::NoClearCounterpart,
            "Not settled: the set holds more than a quarter of all candidates, for which one wrong\n  \
             landmark is enough, or mass and misfit speak against a counterpart (no_counterpart_p of\n  \
             parcels.csv at most 0.1)",
        ),
        (
            Section::TooLittleData,
            "Too little data: fewer connections than every landmark, which do not speak for them",
        ),
    ] {
        let rows = of(section);
        if !rows.is_empty() {
            writeln!(text, "{why}: {}.", rows.len())?;
        }
        for row in rows {
            line(text, study, located, side, row)?;
        }
    }
    for (why, parcels) in [
        ("without any connection", own.isolated()),
        ("with too few observed connections", own.uncovered()),
    ] {
        if !parcels.is_empty() {
            let named: Vec<String> = parcels.iter().map(|p| short(p)).collect();
            writeln!(text, "Not placed, {why}: {}.", named.join(", "))?;
        }
    }
    let none: Vec<String> = located.placements[side]
        .iter()
        .filter(|placement| placement.counterparts.is_empty())
        .map(|placement| short(&own.labels()[placement.parcel]))
        .collect();
    if !none.is_empty() {
        writeln!(text, "No admissible candidate: {}.", none.join(", "))?;
    }
    Ok(())
}

fn header(text: &mut String) -> Result {
    writeln!(
        text,
        "  {:<18}{:<18}{:>8}{:>8}{:>8}{:>7}{:>6}  set",
        "parcel", "counterpart", "strength", "chance", "support", "mutual", "q"
    )
}

fn line(text: &mut String, study: &Study, located: &Located, side: Side, row: &Row<'_>) -> Result {
    let labels = study.species[side.opposite()].parcels.labels();
    let own = study.species[side].parcels.labels();
    let set = settled_set(row.placement);
    let more: Vec<&str> = set
        .iter()
        .filter(|&&p| p != row.first.parcel)
        .take(NAMED)
        .map(|&p| labels[p].as_str())
        .collect();
    let others = match (set.len() - 1, more.len()) {
        (0, _) => String::new(),
        (all, shown) if all == shown => format!(": also {}", more.join(", ")),
        (all, shown) => format!(": also {} and {} more", more.join(", "), all - shown),
    };
    let far = match located.beyond[side][row.placement.parcel] > 1.0 {
        true => " (beyond the landmarks)",
        false => "",
    };
    writeln!(
        text,
        "  {:<18}{:<18}{:>8.2}{:>8.2}{:>8.2}{:>7}{:>6}  {}{others}{far}",
        cut(&own[row.placement.parcel]),
        cut(&labels[row.first.parcel]),
        row.placement.strength,
        row.first.chance.unwrap_or(0.0),
        row.first.support,
        if row.first.mutual { "yes" } else { "no" },
        p_value(row.q, 0.1),
        match row.placement.calm_set {
            Some(_) => format!("{} ({})", set.len(), row.placement.candidate_set.len()),
            None => set.len().to_string(),
        }
    )
}

/// A label cut to the width of its column.
fn cut(label: &str) -> String {
    match label.chars().count() > 17 {
        true => label.chars().take(16).chain(['…']).collect(),
        false => label.to_owned(),
    }
}

/// `rank.csv`.
#[must_use]
pub fn ranked_tables(study: &Study, located: &Located) -> Vec<(&'static str, Vec<u8>)> {
    let mut table = Table::new([
        "from",
        "parcel",
        "to",
        "counterpart",
        "strength",
        "chance",
        "support",
        "rank_low",
        "rank_high",
        "mutual",
        "candidate_set",
        "set_size",
        "candidates",
        "level",
        "p",
        "q",
        "beyond_landmarks",
        "candidate_set_uncontradicted",
        "set_size_uncontradicted",
    ]);
    for side in Side::BOTH {
        let (own, other) = (
            &study.species[side].parcels,
            &study.species[side.opposite()].parcels,
        );
        for row in rows(located, side) {
            let set: Vec<&str> = row
                .placement
                .candidate_set
                .iter()
                .map(|&p| other.labels()[p].as_str())
                .collect();
            let calm = row.placement.calm_set.as_ref().map(|set| -> Vec<&str> {
                set.iter().map(|&p| other.labels()[p].as_str()).collect()
            });
            let (low, high) = row.first.rank_interval;
            table.row([
                own.species().to_owned(),
                own.labels()[row.placement.parcel].clone(),
                other.species().to_owned(),
                other.labels()[row.first.parcel].clone(),
                row.placement.strength.to_string(),
                row.first.chance.map_or_else(String::new, |x| x.to_string()),
                row.first.support.to_string(),
                low.to_string(),
                high.to_string(),
                row.first.mutual.to_string(),
                set.join(PARCEL_SEPARATOR),
                set.len().to_string(),
                row.placement.candidates.to_string(),
                located.set_level.used.to_string(),
                row.placement.p_of_none.to_string(),
                row.q.to_string(),
                located.beyond[side][row.placement.parcel].to_string(),
                calm.as_ref()
                    .map_or_else(String::new, |set| set.join(PARCEL_SEPARATOR)),
                calm.map_or_else(String::new, |set| set.len().to_string()),
            ]);
        }
    }
    vec![("rank.csv", table.bytes())]
}
