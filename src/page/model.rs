//! What the page and its figures show, read from the tables of a run. Nothing here is estimated anew:
//! what is counted or derived is named in docs/formats.md.

use std::collections::HashMap;

use serde_json::Value;

use crate::domain::{Pair, Side};
use crate::finished::{Row, Run, RunError, Table};

/// Support from which a first candidate counts as stable, as in the summary on the terminal.
pub const STABLE: f64 = 0.5;
/// p-value of doubt from which a parcel is marked, as in the sections of `rank`.
pub const DOUBTFUL: f64 = 0.1;
/// Candidates of a parcel that the page keeps beside those of its candidate set.
pub const KEPT: usize = 10;

/// How settled the counterpart of a parcel is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Standing {
    /// It belongs to a landmark: its counterpart was given.
    Landmark,
    /// Each is the other's first, under at least half of all landmark weights.
    Stable,
    /// First under at least half of all landmark weights, but not the other way round.
    OneSided,
    /// Another comes first under most landmark weights.
    Open,
    /// There is no admissible candidate.
    NoCandidate,
}

impl Standing {
    /// Its name, as shown and filtered by.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            Standing::Landmark => "landmark",
            Standing::Stable => "stable",
            Standing::OneSided => "one-sided",
            Standing::Open => "cannot tell",
            Standing::NoCandidate => "no candidate",
        }
    }
}

/// A candidate for the counterpart of a parcel, a row of `counterparts.csv`.
#[derive(Debug, Clone)]
pub struct Candidate {
    /// The candidate, as an index of [`Model::parcels`].
    pub parcel: usize,
    /// Rank among all candidates.
    pub rank: usize,
    /// Interval of the rank.
    pub interval: (usize, usize),
    /// Distance in the joint space.
    pub distance: f64,
    /// Share of replicates in which it comes first.
    pub support: f64,
    /// Whether each is the other's first; only of rank 1.
    pub mutual: bool,
    /// Kinds of evidence that put it first by themselves.
    pub kinds: Vec<String>,
    /// Estimated chance of being right; only of rank 1.
    pub chance: Option<f64>,
    /// Whether it is in the candidate set.
    pub in_set: bool,
}

/// A parcel of either species.
#[derive(Debug, Clone)]
pub struct Parcel {
    /// Its species.
    pub side: Side,
    /// Its label.
    pub label: String,
    /// The landmark it belongs to, as an index of [`Model::landmarks`].
    pub landmark: Option<usize>,
    /// How far outside the landmarks' range it lies.
    pub beyond: f64,
    /// Hemisphere, group and long name, as far as known.
    pub attributes: [String; 3],
    /// `no_counterpart_p`.
    pub doubt: Option<f64>,
    /// `too_little_data`.
    pub too_little: bool,
    /// Its candidates, best first.
    pub candidates: Vec<Candidate>,
}

impl Parcel {
    /// How settled its counterpart is.
    #[must_use]
    pub fn standing(&self) -> Standing {
        if self.landmark.is_some() {
            return Standing::Landmark;
        }
        match self.candidates.first().filter(|first| first.rank == 1) {
            None => Standing::NoCandidate,
            Some(first) if first.support < STABLE => Standing::Open,
            Some(first) if first.mutual => Standing::Stable,
            Some(_) => Standing::OneSided,
        }
    }
}

/// A landmark, a row of `landmarks.csv`.
#[derive(Debug, Clone)]
pub struct Landmark {
    /// Its name.
    pub name: String,
    /// Its parcels, as indices of [`Model::parcels`].
    pub parcels: Pair<Vec<usize>>,
    /// Its weight, as written.
    pub weight: String,
    /// Its block.
    pub block: String,
    /// What it rests on.
    pub basis: String,
    /// Where its partner comes when it is left out: rank and number of candidates.
    pub left_out: Pair<(usize, usize)>,
    /// Whether the others contradict it.
    pub contradicted: bool,
}

/// One axis of a joint space, a row of `axes.csv`.
#[derive(Debug, Clone)]
pub struct Axis {
    /// Share of the variance of each species.
    pub shares: Pair<f64>,
    /// Correlation of the landmarks, in sample.
    pub in_sample: f64,
    /// The same, each landmark left out.
    pub left_out: Option<f64>,
    /// p-value against permuted pairings.
    pub p: Option<f64>,
    /// Mean correlation with the axis of a replicate.
    pub reliability: Option<f64>,
    /// Whether it is told from noise; `None` in runs of versions that did not say.
    pub replicates: Option<bool>,
    /// Parcels at the low end, then at the high end, outermost first; as indices.
    pub ends: Pair<[Vec<usize>; 2]>,
}

impl Axis {
    /// Whether it is told from noise, in words.
    #[must_use]
    pub fn verdict(&self) -> &'static str {
        match self.replicates {
            None => "cannot be said",
            Some(true) => "replicates",
            Some(false) => "noise",
        }
    }
}

/// One joint space.
#[derive(Debug, Clone)]
pub struct Space {
    /// Name of the alignment.
    pub name: String,
    /// Its axes.
    pub axes: Vec<Axis>,
    /// Coordinates of all parcels, one list for each axis.
    pub coordinates: Vec<Vec<f64>>,
    /// Their standard errors.
    pub errors: Vec<Vec<f64>>,
}

/// What became of a parcel without a set of landmarks, a row of `influence.csv`.
#[derive(Debug, Clone)]
pub struct Moved {
    /// How far it moves.
    pub by: f64,
    /// Its first candidate without the set, and where its first with all landmarks comes then.
    pub first: Option<(usize, usize)>,
}

/// `influence.csv`.
#[derive(Debug, Clone)]
pub struct Influence {
    /// Blocks of each set, separated by `;`.
    pub sets: Vec<String>,
    /// For each set and parcel what became of it; nothing where the parcel is in the set.
    pub moved: Vec<Vec<Option<Moved>>>,
}

/// A table of an answer that was added to the run, as it stands in its file.
#[derive(Debug, Clone)]
pub struct Answer {
    /// Names of the columns.
    pub header: Vec<String>,
    /// Cells.
    pub rows: Vec<Vec<String>>,
}

impl Answer {
    /// Where a column stands, if there is one of this name.
    #[must_use]
    pub fn column(&self, name: &str) -> Option<usize> {
        self.header.iter().position(|column| column == name)
    }
}

/// Everything that is shown.
#[derive(Debug, Clone)]
pub struct Model {
    /// Title of the study.
    pub title: String,
    /// Names of the species.
    pub species: Pair<String>,
    /// Parcels of a, then of b, in the order of the tables.
    pub parcels: Vec<Parcel>,
    /// Both joint spaces.
    pub spaces: Vec<Space>,
    /// Which of them gives the distances.
    pub shown: usize,
    /// Landmarks in the order of their table.
    pub landmarks: Vec<Landmark>,
    /// `influence.csv`, if it is there.
    pub influence: Option<Influence>,
    /// `checks.csv`, if it is there.
    pub checks: Option<Answer>,
    /// `holdout.csv`, if it is there.
    pub holdout: Option<Answer>,
    /// `rank.csv`, if it is there.
    pub rank: Option<Answer>,
    /// `run.json`.
    pub record: Value,
}

/// A table with the places of the columns that are asked for.
struct Columns<'t, const N: usize> {
    table: &'t Table,
    at: [usize; N],
}

impl<'t, const N: usize> Columns<'t, N> {
    fn of(table: &'t Table, names: [&str; N]) -> Result<Columns<'t, N>, RunError> {
        let mut at = [0; N];
        for (at, name) in at.iter_mut().zip(names) {
            *at = table.column(name)?;
        }
        Ok(Columns { table, at })
    }

    fn rows(&self) -> &'t [Row] {
        self.table.rows()
    }

    fn text(&self, row: &'t Row, which: usize) -> &'t str {
        self.table.text(row, self.at[which])
    }

    fn number(&self, row: &Row, which: usize) -> Result<f64, RunError> {
        self.table.number(row, self.at[which])
    }

    fn optional(&self, row: &Row, which: usize) -> Result<Option<f64>, RunError> {
        Ok(Some(self.number(row, which)?).filter(|x| !x.is_nan()))
    }

    fn count(&self, row: &Row, which: usize) -> Result<usize, RunError> {
        let cell = self.text_of(row, which);
        cell.parse()
            .map_err(|_| self.fault(row, which, "a whole number"))
    }

    fn truth(&self, row: &Row, which: usize) -> Result<bool, RunError> {
        let cell = self.text_of(row, which);
        cell.parse()
            .map_err(|_| self.fault(row, which, "true or false"))
    }

    fn text_of<'r>(&self, row: &'r Row, which: usize) -> &'r str {
        self.table.text(row, self.at[which])
    }

    fn fault(&self, row: &Row, which: usize, expected: &str) -> RunError {
        self.table.fault(row, self.at[which], expected)
    }
}

/// Finds parcels by species and label.
struct Directory<'r> {
    run: &'r Run,
}

impl Directory<'_> {
    /// Index of the first parcel of b.
    fn first_of_b(&self) -> usize {
        self.run.species.a.parcels.len()
    }

    fn find(&self, side: Side, label: &str) -> Option<usize> {
        let at = *self.run.species[side].at.get(label)?;
        Some(match side {
            Side::A => at,
            Side::B => self.first_of_b() + at,
        })
    }

    fn side(&self, name: &str) -> Option<Side> {
        Side::BOTH
            .into_iter()
            .find(|side| self.run.species[*side].name == name)
    }

    /// A parcel named in a cell.
    fn cell<const N: usize>(
        &self,
        columns: &Columns<'_, N>,
        row: &Row,
        which: usize,
        side: Side,
    ) -> Result<usize, RunError> {
        let label = columns.text_of(row, which);
        self.find(side, label).ok_or_else(|| {
            let species = &self.run.species[side].name;
            columns.fault(row, which, &format!("a parcel of {species}"))
        })
    }

    /// The species named in a cell.
    fn species<const N: usize>(
        &self,
        columns: &Columns<'_, N>,
        row: &Row,
        which: usize,
    ) -> Result<Side, RunError> {
        self.side(columns.text_of(row, which))
            .ok_or_else(|| columns.fault(row, which, "a species of the run"))
    }
}

impl Model {
    /// Reads the tables of a run.
    ///
    /// # Errors
    /// [`RunError`] for tables that are missing, lack a column, or were changed after the run.
    pub fn of(run: &Run) -> Result<Model, RunError> {
        let directory = Directory { run };
        let mut parcels = parcels(run)?;
        judgements(run, &directory, &mut parcels)?;
        candidates(run, &directory, &mut parcels)?;
        let landmarks = landmarks(run, &directory)?;
        for (at, landmark) in landmarks.iter().enumerate() {
            for side in Side::BOTH {
                for &parcel in &landmark.parcels[side] {
                    parcels[parcel].landmark = Some(at);
                }
            }
        }
        let spaces = spaces(run, &directory)?;
        let shown = spaces
            .iter()
            .position(|space| space.name == run.distances_from)
            .unwrap_or(0);
        Ok(Model {
            title: run.title.clone(),
            species: run.species.as_ref().map(|species| species.name.clone()),
            influence: influence(run, &directory, parcels.len())?,
            parcels,
            spaces,
            shown,
            landmarks,
            checks: answer(run, "checks.csv")?,
            holdout: answer(run, "holdout.csv")?,
            rank: answer(run, "rank.csv")?,
            record: run.record.clone(),
        })
    }

    /// Parcels of one species, with their indices.
    pub fn of_side(&self, side: Side) -> impl Iterator<Item = (usize, &Parcel)> {
        self.parcels
            .iter()
            .enumerate()
            .filter(move |(_, parcel)| parcel.side == side)
    }

    /// How many open parcels of a species stand so, and how many are open at all.
    #[must_use]
    pub fn count(&self, side: Side, standing: Standing) -> usize {
        self.of_side(side)
            .filter(|(_, parcel)| parcel.standing() == standing)
            .count()
    }

    /// The order of a species' parcels along the first axis of the space that is shown.
    #[must_use]
    pub fn along_first_axis(&self, side: Side) -> Vec<usize> {
        let mut order: Vec<usize> = self.of_side(side).map(|(at, _)| at).collect();
        if let Some(first) = self
            .spaces
            .get(self.shown)
            .and_then(|space| space.coordinates.first())
        {
            order.sort_by(|&x, &y| first[x].total_cmp(&first[y]).then(x.cmp(&y)));
        }
        order
    }
}

fn parcels(run: &Run) -> Result<Vec<Parcel>, RunError> {
    let table = &run.positions;
    let beyond = table.column("beyond_landmarks")?;
    // Tables of earlier versions may lack these.
    let known = ["hemisphere", "group", "long_name"].map(|name| table.column(name).ok());
    let mut parcels = Vec::new();
    for side in Side::BOTH {
        let species = &run.species[side];
        for (label, &row) in species.parcels.iter().zip(&species.rows) {
            let row = &table.rows()[row];
            parcels.push(Parcel {
                side,
                label: label.clone(),
                landmark: None,
                beyond: table.number(row, beyond)?,
                attributes: known
                    .map(|at| at.map_or_else(String::new, |at| table.text(row, at).to_owned())),
                doubt: None,
                too_little: false,
                candidates: Vec::new(),
            });
        }
    }
    Ok(parcels)
}

fn judgements(
    run: &Run,
    directory: &Directory<'_>,
    parcels: &mut [Parcel],
) -> Result<(), RunError> {
    let table = run.table("parcels.csv")?;
    let columns = Columns::of(
        &table,
        ["species", "parcel", "no_counterpart_p", "too_little_data"],
    )?;
    for row in columns.rows() {
        let side = directory.species(&columns, row, 0)?;
        let parcel = &mut parcels[directory.cell(&columns, row, 1, side)?];
        parcel.doubt = columns.optional(row, 2)?;
        parcel.too_little = columns.truth(row, 3)?;
    }
    Ok(())
}

fn candidates(
    run: &Run,
    directory: &Directory<'_>,
    parcels: &mut [Parcel],
) -> Result<(), RunError> {
    let columns = Columns::of(
        &run.counterparts,
        [
            "from",
            "parcel",
            "counterpart",
            "rank",
            "rank_low",
            "rank_high",
            "distance",
            "support",
            "mutual",
            "kinds_agreeing",
            "chance",
            "in_candidate_set",
        ],
    )?;
    for row in columns.rows() {
        let side = directory.species(&columns, row, 0)?;
        let parcel = directory.cell(&columns, row, 1, side)?;
        let rank = columns.count(row, 3)?;
        let in_set = columns.truth(row, 11)?;
        if rank > KEPT && !in_set {
            continue;
        }
        parcels[parcel].candidates.push(Candidate {
            parcel: directory.cell(&columns, row, 2, side.opposite())?,
            rank,
            interval: (columns.count(row, 4)?, columns.count(row, 5)?),
            distance: columns.number(row, 6)?,
            support: columns.number(row, 7)?,
            mutual: columns.truth(row, 8)?,
            kinds: listed(columns.text(row, 9)).map(str::to_owned).collect(),
            chance: columns.optional(row, 10)?,
            in_set,
        });
    }
    for parcel in parcels {
        parcel.candidates.sort_by_key(|candidate| candidate.rank);
    }
    Ok(())
}

/// What a cell with several entries holds.
fn listed(cell: &str) -> impl Iterator<Item = &str> {
    cell.split(';').filter(|entry| !entry.is_empty())
}

fn landmarks(run: &Run, directory: &Directory<'_>) -> Result<Vec<Landmark>, RunError> {
    let table = run.table("landmarks.csv")?;
    let columns = Columns::of(
        &table,
        [
            "landmark",
            "weight",
            "block",
            "basis",
            "rank_from_a",
            "candidates_from_a",
            "rank_from_b",
            "candidates_from_b",
            "contradicted",
        ],
    )?;
    // Labels may hold the separator of lists, so members are taken from the positions.
    let mut members: HashMap<&str, Pair<Vec<usize>>> = HashMap::new();
    for side in Side::BOTH {
        let species = &run.species[side];
        for (label, landmark) in species.parcels.iter().zip(&species.landmarks) {
            let Some(landmark) = landmark else { continue };
            let of = members
                .entry(landmark)
                .or_insert_with(|| Pair::from_fn(|_| Vec::new()));
            of[side].extend(directory.find(side, label));
        }
    }
    columns
        .rows()
        .iter()
        .map(|row| {
            let name = columns.text(row, 0);
            let placed = |rank: usize, of: usize| {
                let (place, candidates) = (columns.count(row, rank)?, columns.count(row, of)?);
                if place == 0 || place > candidates {
                    return Err(columns.fault(row, rank, "a rank among the candidates"));
                }
                if candidates > run.positions.rows().len() {
                    return Err(columns.fault(row, of, "no more candidates than parcels"));
                }
                Ok((place, candidates))
            };
            Ok(Landmark {
                name: name.to_owned(),
                parcels: members
                    .remove(name)
                    .unwrap_or_else(|| Pair::from_fn(|_| Vec::new())),
                weight: columns.text(row, 1).to_owned(),
                block: columns.text(row, 2).to_owned(),
                basis: columns.text(row, 3).to_owned(),
                left_out: Pair {
                    a: placed(4, 5)?,
                    b: placed(6, 7)?,
                },
                contradicted: columns.truth(row, 8)?,
            })
        })
        .collect()
}

fn spaces(run: &Run, directory: &Directory<'_>) -> Result<Vec<Space>, RunError> {
    let table = run.table("axes.csv")?;
    let columns = Columns::of(
        &table,
        [
            "alignment",
            "share_a",
            "share_b",
            "correlation_in_sample",
            "correlation_left_out",
        ],
    )?;
    let ends = |row: &Row, side: Side, end: &str| -> Vec<usize> {
        (1..)
            .map_while(|k| {
                table
                    .column(&format!("{}_{end}_{k}", side.letter()))
                    .ok()
                    .map(|at| table.text(row, at))
            })
            .filter_map(|label| directory.find(side, label))
            .collect()
    };
    // Columns that earlier versions did not write.
    let added = |name: &str, row: &Row| {
        let at = table.column(name).ok()?;
        table.number(row, at).ok()
    };
    let mut spaces: Vec<Space> = Vec::new();
    for row in columns.rows() {
        let name = columns.text(row, 0);
        if spaces.last().is_none_or(|space| space.name != name) {
            spaces.push(Space {
                name: name.to_owned(),
                axes: Vec::new(),
                coordinates: Vec::new(),
                errors: Vec::new(),
            });
        }
        let space = spaces.last_mut().expect("one was just added");
        let axis = space.axes.len() + 1;
        let coordinate = format!("{name}_{axis}");
        space.coordinates.push(column(run, &coordinate)?);
        // With individuals, the errors that both they and the landmarks cause.
        let both = format!("{coordinate}_se_both");
        let errors = match run.positions.header().contains(&both) {
            true => both,
            false => format!("{coordinate}_se_landmarks"),
        };
        space.errors.push(column(run, &errors)?);
        space.axes.push(Axis {
            shares: Pair {
                a: columns.number(row, 1)?,
                b: columns.number(row, 2)?,
            },
            in_sample: columns.number(row, 3)?,
            left_out: columns.optional(row, 4)?,
            p: added("p", row),
            reliability: added("reliability", row),
            replicates: match table.column("replicates") {
                Ok(at) => Some(table.text(row, at) == "true"),
                Err(_) => None,
            },
            ends: Pair::from_fn(|side| ["low", "high"].map(|end| ends(row, side, end))),
        });
    }
    if spaces.is_empty() {
        return Err(run.incomplete("its axes.csv has no rows"));
    }
    Ok(spaces)
}

/// A column of `positions.csv`, for the parcels of a, then of b.
fn column(run: &Run, name: &str) -> Result<Vec<f64>, RunError> {
    let at = run.positions.column(name)?;
    Side::BOTH
        .into_iter()
        .flat_map(|side| &run.species[side].rows)
        .map(|&row| run.positions.number(&run.positions.rows()[row], at))
        .collect()
}

fn influence(
    run: &Run,
    directory: &Directory<'_>,
    parcels: usize,
) -> Result<Option<Influence>, RunError> {
    let Some(table) = run.answer("influence.csv")? else {
        return Ok(None);
    };
    let columns = Columns::of(
        &table,
        [
            "held_out",
            "species",
            "parcel",
            "moved",
            "first_without",
            "rank_without",
        ],
    )?;
    let mut found = Influence {
        sets: Vec::new(),
        moved: Vec::new(),
    };
    for row in columns.rows() {
        let set = columns.text(row, 0);
        if found.sets.last().is_none_or(|last| last != set) {
            found.sets.push(set.to_owned());
            found.moved.push(vec![None; parcels]);
        }
        let side = directory.species(&columns, row, 1)?;
        let parcel = directory.cell(&columns, row, 2, side)?;
        let first = match columns.text(row, 4) {
            "" => None,
            _ => Some((
                directory.cell(&columns, row, 4, side.opposite())?,
                columns.count(row, 5)?,
            )),
        };
        let moved = found.moved.last_mut().expect("one was just added");
        moved[parcel] = Some(Moved {
            by: columns.number(row, 3)?,
            first,
        });
    }
    Ok(Some(found))
}

fn answer(run: &Run, name: &str) -> Result<Option<Answer>, RunError> {
    let Some(table) = run.answer(name)? else {
        return Ok(None);
    };
    let header = table.header().to_vec();
    let rows = table
        .rows()
        .iter()
        .map(|row| {
            (0..header.len())
                .map(|at| table.text(row, at).to_owned())
                .collect()
        })
        .collect();
    Ok(Some(Answer { header, rows }))
}
