//! Questions about named parcels, answered: for people, for machines and as a table.

use std::fmt::{Result, Write};

use serde_json::{json, Value};

use super::summary::short;
use super::tables::{Table, PARCEL_SEPARATOR};
use crate::domain::{Pair, Side};
use crate::prepare::Study;
use crate::questions::{Checked, CheckedPair, Contrast, Grounds, Ruling, Verdict};

/// Width of a line on the terminal.
const WIDTH: usize = 96;
/// Names listed before the rest is only counted.
const LISTED: usize = 8;
/// Candidates of a parcel that is asked about without any.
const CANDIDATES: usize = 6;

/// The account for people.
///
/// # Panics
/// Never: writing to memory does not fail.
#[must_use]
pub fn checked(study: &Study, answers: &[Checked]) -> String {
    let mut text = format!("{}\n", study.title);
    for answer in answers {
        Account { study, answer }
            .write(&mut text)
            .expect("writing to memory does not fail");
    }
    text
}

/// One answer and the names that it needs.
struct Account<'a> {
    study: &'a Study,
    answer: &'a Checked,
}

impl Account<'_> {
    fn label(&self, side: Side, parcel: usize) -> &str {
        &self.study.species[side].parcels.labels()[parcel]
    }

    fn species(&self, side: Side) -> String {
        short(self.study.species[side].parcels.species())
    }

    fn write(&self, text: &mut String) -> Result {
        let answer = self.answer;
        if !answer.aside.is_empty() {
            writeln!(
                text,
                "Left out, because the question is about them: {}.",
                listed(&answer.aside)
            )?;
        }
        if answer.pairs.is_empty() {
            self.fall(text)?;
        }
        for pair in &answer.pairs {
            self.pair(text, pair)?;
        }
        for contrast in &answer.contrasts {
            self.contrast(text, contrast)?;
        }
        paragraph(text, &self.methods())
    }

    /// Where the parcel falls, without a verdict.
    fn fall(&self, text: &mut String) -> Result {
        let answer = self.answer;
        let (side, to) = (answer.side, answer.side.opposite());
        let placement = &answer.placement;
        writeln!(
            text,
            "\nWhere does {} of {} fall in {}?",
            short(self.label(side, answer.parcel)),
            self.species(side),
            self.species(to)
        )?;
        writeln!(
            text,
            "  {:<20}{:>6}{:>12}{:>10}{:>9}  {:<8}set",
            "candidate", "rank", "90 % of", "distance", "support", "mutual"
        )?;
        for found in placement.counterparts.iter().take(CANDIDATES) {
            let (low, high) = found.rank_interval;
            writeln!(
                text,
                "  {:<20}{:>6}{:>12}{:>10.2}{:>9.2}  {:<8}{}",
                short(self.label(to, found.parcel)),
                found.rank,
                format!("{low}-{high}"),
                found.distance,
                found.support,
                if found.mutual { "yes" } else { "no" },
                if found.in_candidate_set { "in" } else { "-" }
            )?;
        }
        let set: Vec<String> = placement
            .candidate_set
            .iter()
            .map(|&p| self.label(to, p).to_owned())
            .collect();
        paragraph(
            text,
            &format!(
                "Candidate set at {:.0} %: {} of {} candidates: {}.",
                100.0 * answer.set_level.used,
                set.len(),
                placement.candidates,
                listed(&set)
            ),
        )?;
        let chance = placement.counterparts.first().and_then(|c| c.chance);
        let mut said = chance.map_or_else(String::new, |chance| {
            format!("Chance that the first is right: {chance:.2}, as far as left-out landmarks support it. ")
        });
        said += &match (answer.judged.too_little_data, answer.judged.doubt) {
            (true, _) => String::from(
                "It has fewer connections than every landmark: too little data to tell whether it has a counterpart.",
            ),
            (false, Some(doubt)) => format!(
                "p that so much speaks against a clear counterpart in parcels that have one: {} (small: no clear counterpart).",
                shown(doubt.p)
            ),
            (false, None) => String::from("Whether it has a counterpart at all was not judged: transport takes no part."),
        };
        paragraph(text, &said)?;
        paragraph(
            text,
            &format!(
                "{} No verdict: the best of many candidates is near because it was searched for. Name a candidate \
                 beforehand, with --against.",
                self.reach(Pair::from_fn(|s| (s == side).then_some(answer.parcel)))
            ),
        )
    }

    /// How far outside the landmarks' span parcels lie, in a sentence.
    fn reach(&self, parcels: Pair<Option<usize>>) -> String {
        let each: Vec<String> = Side::BOTH
            .into_iter()
            .filter_map(|side| Some((side, parcels[side]?)))
            .map(|(side, parcel)| {
                let far = self.answer.beyond[side][parcel];
                let beyond = if far > 1.0 {
                    ", beyond all of them"
                } else {
                    ""
                };
                format!("{} {far:.2}{beyond}", short(self.label(side, parcel)))
            })
            .collect();
        format!(
            "Distance from the middle of the landmarks (furthest landmark 1): {}.",
            each.join("; ")
        )
    }

    fn pair(&self, text: &mut String, checked: &CheckedPair) -> Result {
        let answer = self.answer;
        let (side, to) = (answer.side, answer.side.opposite());
        let pair = checked.pair;
        let ruling = &checked.ruling;
        writeln!(
            text,
            "\n{} ({}) against {} ({}): {}",
            short(self.label(side, pair[side])),
            self.species(side),
            short(self.label(to, pair[to])),
            self.species(to),
            checked.verdict.to_string().to_uppercase()
        )?;
        paragraph(text, &self.because(checked))?;
        for from in [side, to] {
            let placed = ruling.placed[from];
            let (low, high) = ruling.rank_intervals[from];
            writeln!(
                text,
                "  rank from {:<14}{} of {} ({low}-{high} in 90 % of {} replicates; first in {:.0} %)",
                cut(&self.species(from)),
                placed.rank,
                placed.candidates,
                answer.evidence.ranking_replicates,
                100.0 * ruling.support[from]
            )?;
        }
        let units = |x: f64| (x - ruling.usual.centre).exp();
        let (low, high) = ruling.separation.interval;
        writeln!(
            text,
            "  distance {:>6.2}         {:.1} times the usual error at left-out landmarks (90 %: {:.1}-{:.1}); homologous\n  \
             {:<24}pairs reach {:.1}, and so near lie {:.0} % of unrelated pairs",
            ruling.distance,
            units(ruling.separation.own),
            units(low),
            units(high),
            "",
            units(ruling.usual.limit),
            100.0 * ruling.separation.unrelated_within()
        )?;
        let least = 1.0 / (1 + ruling.blocks) as f64;
        let by_t = ruling.p_by_t.map_or_else(String::new, |p| {
            format!("; {} if their logs are normal", shown(p))
        });
        writeln!(
            text,
            "  further? {:>6}         p for a homologous pair to lie so far ({} landmark blocks allow no p below {least:.3}){by_t}",
            shown(ruling.further.p),
            ruling.blocks
        )?;
        writeln!(
            text,
            "  nearer?  {:>6}         p for one of {} unrelated pairs as far from the landmarks to rank so near",
            shown(ruling.nearer.p),
            ruling.nearer.pairs.len()
        )?;
        writeln!(
            text,
            "  found?   {:>6}         p for a search without counterpart to return something as good",
            shown(ruling.selected.p(side, None))
        )?;
        paragraph(text, &self.reach(pair.map(Some)))?;
        let pass = checked.would_pass.as_ref().map(|pass| -> Vec<String> {
            pass.iter().map(|&p| self.label(to, p).to_owned()).collect()
        });
        paragraph(
            text,
            &match pass {
                None => String::from(
                    "Whether other candidates would pass was not asked: too many pairs at once; check this one alone.",
                ),
                Some(pass) if pass.is_empty() => {
                    String::from("Told apart by position from every other candidate.")
                }
                Some(pass) => format!("Not told apart by position from {}.", listed(&pass)),
            },
        )?;
        paragraph(text, &self.leans(checked))?;
        settings(text, checked)
    }

    /// Why, in a sentence.
    fn because(&self, checked: &CheckedPair) -> String {
        let mut why = why(&checked.ruling, self.answer.level, self.answer.side);
        if let Some(other) = &checked.without_flagged {
            let _ = write!(
                why,
                " The other landmarks contradict {}. With all landmarks: {}; without {}: {}; the cautious one counts.",
                listed(&self.answer.flagged),
                checked.ruling.verdict,
                if self.answer.flagged.len() == 1 { "it" } else { "them" },
                other.verdict
            );
        }
        why
    }

    fn leans(&self, checked: &CheckedPair) -> String {
        let mut changed: Vec<(Verdict, Vec<String>)> = Vec::new();
        for lean in &checked.leans {
            if lean.verdict == checked.ruling.verdict {
                continue;
            }
            let name = self.answer.told[lean.block].clone();
            match changed
                .iter_mut()
                .find(|(verdict, _)| *verdict == lean.verdict)
            {
                Some((_, names)) => names.push(name),
                None => changed.push((lean.verdict, vec![name])),
            }
        }
        if changed.is_empty() {
            return format!(
                "Leans on no single landmark: the same without any one of {}.",
                checked.leans.len()
            );
        }
        let each: Vec<String> = changed
            .iter()
            .map(|(verdict, names)| format!("{verdict} without {}", listed(names)))
            .collect();
        format!(
            "Leans on landmarks, of {}: {}.",
            checked.leans.len(),
            each.join("; ")
        )
    }

    fn contrast(&self, text: &mut String, contrast: &Contrast) -> Result {
        let to = self.answer.side.opposite();
        let (near, far) = (
            self.label(to, contrast.nearer),
            self.label(to, contrast.other),
        );
        writeln!(text, "\n{near} or {far}?")?;
        paragraph(
            text,
            &format!(
                "{near} is nearer in {:.0} % of {} replicates ({far} lies {:.2} times as far, 90 %: {:.2}-{:.2}), and ranks \
                 first of the two in {:.0} %. Left-out landmarks chose rightly between their counterpart and a rival as \
                 far from it as these two are apart in {:.0} % (90 %: {:.0}-{:.0}).",
                100.0 * contrast.share_nearer,
                self.answer.replicates,
                contrast.ratio,
                contrast.interval.0,
                contrast.interval.1,
                100.0 * contrast.share_before,
                100.0 * contrast.landmarks.value,
                100.0 * contrast.landmarks.low,
                100.0 * contrast.landmarks.high
            ),
        )?;
        match contrast.share_before < 0.5 {
            true => paragraph(
                text,
                "Distance and rank disagree. What ranks may use links between all parcels, the joint space only what the \
                 landmarks span; neither decides alone.",
            ),
            false => Ok(()),
        }
    }

    /// A paragraph for a paper, with every number.
    fn methods(&self) -> String {
        let Checked {
            told,
            space,
            evidence,
            ..
        } = self.answer;
        let settings = &self.study.settings;
        let kinds: Vec<String> = evidence
            .kinds
            .iter()
            .map(|member| format!("{} {:.2}", member.kind, member.weight))
            .collect();
        let treated = Pair::from_fn(|side: Side| {
            let treatment = &self.study.treatment[side];
            format!(
                "{} ({} parcels, {}, {})",
                self.species(side),
                self.study.species[side].parcels.len(),
                treatment.weights,
                treatment.transform
            )
        });
        let mut words = format!(
            "Methods. Connectivity of {} and {} was embedded by {} and aligned at {} blocks of landmarks by {} on {} axes, \
             chosen by left-out landmarks. Ranks come from {} ({}). Intervals are central 90 % ranges over {} draws of \
             landmark weights ({}{}); they speak of other landmarks{}.",
            treated.a,
            treated.b,
            settings.embedding,
            told.len(),
            space.alignment.in_words(),
            space.axes,
            settings.evidence,
            kinds.join(", "),
            self.answer.replicates,
            settings.resampling,
            match evidence.subject_replicates {
                Some(n) => format!(", individuals drawn again in {n}"),
                None => String::new(),
            },
            match evidence.subject_replicates {
                Some(_) => " and individuals",
                None => " with these connectivities only",
            }
        );
        if let Some(pair) = self.answer.pairs.first() {
            let r = &pair.ruling;
            let _ = write!(
                words,
                " Tests are at {:.0} %. Further apart than homologous pairs: full conformal test on distance divided by the \
                 root of 1 + leverage, the pair joining the {} blocks and every choice made with it. Nearer than unrelated \
                 pairs: the worse of both ranks against {} pairs as far from the landmarks. Found by search: strength of \
                 mutual hold against the best wrong candidate of each left-out landmark. Conserved needs the latter two and \
                 the upper end of the interval within median + 1.15 robust deviations of left-out log distances.",
                100.0 * self.answer.level,
                r.blocks,
                r.nearer.pairs.len()
            );
        }
        let _ = write!(
            words,
            " Seed {}; kinmark {}.",
            settings.seed.0,
            env!("CARGO_PKG_VERSION")
        );
        words
    }
}

/// The grounds of a verdict in a sentence.
fn why(ruling: &Ruling, level: f64, side: Side) -> String {
    let Grounds {
        is_nearer,
        is_no_selection,
        is_within,
        limit_tells,
        enough_landmarks,
        ..
    } = ruling.grounds;
    let percent = format!("{:.0} %", 100.0 * level);
    match ruling.verdict {
        Verdict::Conserved => format!(
            "Nearer than unrelated pairs, better than a search without counterpart returns, and no further apart than \
             homologous pairs are (tests at {percent})."
        ),
        Verdict::Displaced => format!(
            "Further apart than homologous pairs are when left out (p = {}, at {percent}).",
            shown(ruling.further.p)
        ),
        Verdict::CannotShow if !enough_landmarks => format!(
            "{} landmark blocks allow no p of {percent}; at least {:.0} are needed.",
            ruling.blocks,
            (1.0 / level - 1.0 - 1e-9).ceil()
        ),
        Verdict::CannotShow => format!(
            "Left-out homologous pairs lie so far apart that {:.0} % of unrelated pairs lie as near: a position within \
             their reach says nothing.",
            100.0 * ruling.separation.unrelated_within()
        ),
        Verdict::Undetermined => {
            let mut lacking = Vec::new();
            if !is_nearer {
                lacking.push(format!("unrelated pairs rank as near (p = {})", shown(ruling.nearer.p)));
            }
            if !is_no_selection {
                lacking.push(format!(
                    "a search for parcels without counterpart returns as good a candidate (p = {})",
                    shown(ruling.selected.p(side, None))
                ));
            }
            if !is_within {
                lacking.push(String::from("its interval goes beyond the reach of homologous pairs"));
            }
            let tells = if limit_tells { "" } else { " Unrelated pairs often lie as near." };
            format!("Not further apart than homologous pairs, but {}.{tells}", lacking.join(", and "))
        }
    }
}

/// The table of agreement.
fn settings(text: &mut String, checked: &CheckedPair) -> Result {
    writeln!(
        text,
        "  {:<40}{:>11}{:>9}{:>9}{:>8}  verdict",
        "under other settings", "ranks", "further", "nearer", "found"
    )?;
    for row in &checked.variations {
        writeln!(
            text,
            "    {:<38}{:>11}{:>9}{:>9}{:>8}  {}",
            row.setting,
            format!("{}, {}", row.ranks.a, row.ranks.b),
            shown(row.p_further),
            shown(row.p_nearer),
            shown(row.p_selected),
            row.verdict
        )?;
    }
    let agree = checked
        .variations
        .iter()
        .filter(|row| row.verdict == checked.ruling.verdict)
        .count();
    writeln!(
        text,
        "    {agree} of {} agree with the verdict by all landmarks",
        checked.variations.len()
    )
}

/// A p-value to three digits.
fn shown(p: f64) -> String {
    match p < 0.0005 {
        true => String::from("<0.001"),
        false => format!("{p:.3}"),
    }
}

/// A few names, and how many more there are.
fn listed(names: &[String]) -> String {
    let shown: Vec<String> = names.iter().take(LISTED).map(|name| short(name)).collect();
    match names.len() - shown.len() {
        0 => shown.join(", "),
        more => format!("{} and {more} more", shown.join(", ")),
    }
}

fn cut(words: &str) -> String {
    match words.chars().count() > 13 {
        true => words.chars().take(12).chain(['…']).collect(),
        false => words.to_owned(),
    }
}

/// Breaks words into indented lines.
fn paragraph(text: &mut String, words: &str) -> Result {
    let mut line = String::new();
    for word in words.split_whitespace() {
        if !line.is_empty() && line.chars().count() + word.chars().count() + 3 > WIDTH {
            writeln!(text, "  {line}")?;
            line.clear();
        }
        if !line.is_empty() {
            line.push(' ');
        }
        line.push_str(word);
    }
    writeln!(text, "  {line}")
}

/// Everything for other programs.
#[must_use]
pub fn checked_json(study: &Study, answers: &[Checked]) -> Vec<u8> {
    let all: Vec<Value> = answers
        .iter()
        .map(|answer| one_json(&Account { study, answer }))
        .collect();
    let mut bytes = serde_json::to_vec_pretty(&json!({
        "title": study.title,
        "checks": all,
        "caution": super::CAUTION,
    }))
    .expect("plain values");
    bytes.push(b'\n');
    bytes
}

fn one_json(account: &Account<'_>) -> Value {
    let answer = account.answer;
    let (side, to) = (answer.side, answer.side.opposite());
    let names = |side: Side, all: &[usize]| -> Vec<String> {
        all.iter()
            .map(|&p| account.label(side, p).to_owned())
            .collect()
    };
    let pairs: Vec<Value> = answer
        .pairs
        .iter()
        .map(|checked| {
            let r = &checked.ruling;
            json!({
                "a": account.label(Side::A, checked.pair.a),
                "b": account.label(Side::B, checked.pair.b),
                "verdict": checked.verdict,
                "why": account.because(checked),
                "with-all-landmarks": ruling_json(r, side),
                "without-flagged": checked.without_flagged.as_ref().map(|r| ruling_json(r, side)),
                "beyond-landmarks": checked_beyond(answer, checked.pair),
                "not-told-apart": checked.would_pass.as_ref().map(|pass| names(to, pass)),
                "without-each-block": checked.leans.iter().map(|lean| json!({
                    "block": answer.told[lean.block],
                    "verdict": lean.verdict,
                    "p-further": lean.p_further,
                    "p-nearer": lean.p_nearer,
                })).collect::<Vec<_>>(),
                "other-settings": checked.variations.iter().map(|row| json!({
                    "setting": row.setting,
                    "ranks": row.ranks,
                    "p-further": row.p_further,
                    "p-nearer": row.p_nearer,
                    "p-search": row.p_selected,
                    "verdict": row.verdict,
                })).collect::<Vec<_>>(),
            })
        })
        .collect();
    let contrasts: Vec<Value> = answer
        .contrasts
        .iter()
        .map(|c| {
            json!({
                "nearer": account.label(to, c.nearer),
                "other": account.label(to, c.other),
                "ratio": c.ratio,
                "interval": c.interval,
                "share-nearer": c.share_nearer,
                "share-before": c.share_before,
                "landmarks-chose-rightly": c.landmarks,
            })
        })
        .collect();
    let placement = &answer.placement;
    json!({
        "species": study_name(account, side),
        "parcel": account.label(side, answer.parcel),
        "left-out": answer.aside,
        "landmark-blocks": answer.told,
        "flagged": answer.flagged,
        "level": answer.level,
        "candidate-set": names(to, &placement.candidate_set),
        "candidate-set-level": answer.set_level,
        "candidates": placement.candidates,
        "first": placement.counterparts.first().map(|c| account.label(to, c.parcel)),
        "chance": placement.counterparts.first().and_then(|c| c.chance),
        "no-counterpart-p": answer.judged.doubt.map(|doubt| doubt.p),
        "too-little-data": answer.judged.too_little_data,
        "pairs": pairs,
        "contrasts": contrasts,
        "methods": account.methods(),
    })
}

fn study_name(account: &Account<'_>, side: Side) -> String {
    account.study.species[side].parcels.species().to_owned()
}

fn checked_beyond(answer: &Checked, pair: Pair<usize>) -> Pair<f64> {
    Pair::from_fn(|side| answer.beyond[side][pair[side]])
}

fn ruling_json(r: &Ruling, side: Side) -> Value {
    let units = |x: f64| (x - r.usual.centre).exp();
    json!({
        "verdict": r.verdict,
        "grounds": r.grounds,
        "landmark-blocks": r.blocks,
        "p-further": r.further.p,
        "p-further-normal": r.p_by_t,
        "least-p": 1.0 / (1 + r.blocks) as f64,
        "p-nearer": r.nearer.p,
        "p-search": r.selected.p(side, None),
        "strength": r.selected.strength,
        "rank": r.placed.map(|p| p.rank),
        "candidates": r.placed.map(|p| p.candidates),
        "rank-interval": r.rank_intervals,
        "support": r.support,
        "distance": r.distance,
        "distance-in-errors": units(r.separation.own),
        "distance-in-errors-interval": [units(r.separation.interval.0), units(r.separation.interval.1)],
        "limit-in-errors": units(r.usual.limit),
        "unrelated-within": r.separation.unrelated_within(),
        "unrelated-pairs": r.nearer.pairs.len(),
    })
}

/// Columns of `checks.csv` that tell one check from another.
pub const CHECK_KEY: usize = 3;

/// `checks.csv`; `None` where no pair was named.
#[must_use]
pub fn checked_tables(study: &Study, answers: &[Checked]) -> Vec<(&'static str, Vec<u8>)> {
    let mut table = Table::new([
        "a",
        "b",
        "asked_from",
        "verdict",
        "why",
        "level",
        "landmark_blocks",
        "p_further",
        "p_further_normal",
        "least_p",
        "p_nearer",
        "p_search",
        "rank_from_a",
        "rank_from_a_low",
        "rank_from_a_high",
        "candidates_from_a",
        "rank_from_b",
        "rank_from_b_low",
        "rank_from_b_high",
        "candidates_from_b",
        "support_from_a",
        "support_from_b",
        "distance",
        "distance_in_errors",
        "distance_in_errors_low",
        "distance_in_errors_high",
        "limit_in_errors",
        "unrelated_within",
        "beyond_landmarks_a",
        "beyond_landmarks_b",
        "not_told_apart",
        "leans_on",
        "flagged",
        "verdict_with_all",
        "verdict_without_flagged",
        "settings",
        "settings_conserved",
        "settings_displaced",
    ]);
    let mut is_empty = true;
    for answer in answers {
        let account = Account { study, answer };
        let to = answer.side.opposite();
        for checked in &answer.pairs {
            is_empty = false;
            let r = &checked.ruling;
            let units = |x: f64| (x - r.usual.centre).exp().to_string();
            let told: Vec<String> = checked
                .would_pass
                .iter()
                .flatten()
                .map(|&p| account.label(to, p).to_owned())
                .collect();
            let leans: Vec<String> = checked
                .leans
                .iter()
                .filter(|lean| lean.verdict != r.verdict)
                .map(|lean| answer.told[lean.block].clone())
                .collect();
            let under = |verdict: Verdict| {
                let rows = checked.variations.iter();
                rows.filter(|row| row.verdict == verdict)
                    .count()
                    .to_string()
            };
            let mut cells = vec![
                account.label(Side::A, checked.pair.a).to_owned(),
                account.label(Side::B, checked.pair.b).to_owned(),
                answer.side.letter().to_owned(),
                checked.verdict.to_string(),
                account.because(checked),
                answer.level.to_string(),
                r.blocks.to_string(),
                r.further.p.to_string(),
                r.p_by_t.map_or_else(String::new, |p| p.to_string()),
                (1.0 / (1 + r.blocks) as f64).to_string(),
                r.nearer.p.to_string(),
                r.selected.p(answer.side, None).to_string(),
            ];
            for from in Side::BOTH {
                let (low, high) = r.rank_intervals[from];
                cells.extend([
                    r.placed[from].rank.to_string(),
                    low.to_string(),
                    high.to_string(),
                    r.placed[from].candidates.to_string(),
                ]);
            }
            cells.extend(Side::BOTH.map(|from| r.support[from].to_string()));
            cells.extend([
                r.distance.to_string(),
                units(r.separation.own),
                units(r.separation.interval.0),
                units(r.separation.interval.1),
                units(r.usual.limit),
                r.separation.unrelated_within().to_string(),
            ]);
            cells.extend(Side::BOTH.map(|s| answer.beyond[s][checked.pair[s]].to_string()));
            cells.extend([
                told.join(PARCEL_SEPARATOR),
                leans.join(PARCEL_SEPARATOR),
                answer.flagged.join(PARCEL_SEPARATOR),
                r.verdict.to_string(),
                checked
                    .without_flagged
                    .as_ref()
                    .map_or_else(String::new, |r| r.verdict.to_string()),
                checked.variations.len().to_string(),
                under(Verdict::Conserved),
                under(Verdict::Displaced),
            ]);
            table.row(cells);
        }
    }
    match is_empty {
        true => Vec::new(),
        false => vec![("checks.csv", table.bytes())],
    }
}
