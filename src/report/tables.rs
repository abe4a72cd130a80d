//! The CSV tables of a run. Every column is described in docs/formats.md.

use crate::align::Alignment;
use crate::domain::{Attributes, Extent, Landmarks, Pair, Side};
use crate::evidence::Kind;
use crate::locate::{Doubt, Located, SubjectErrors};
use crate::prepare::Study;

/// Separates several parcels in one cell, as in the landmark table.
pub(super) const PARCEL_SEPARATOR: &str = ";";

/// One table being written.
pub(super) struct Table(csv::Writer<Vec<u8>>);

impl Table {
    pub(super) fn new(header: impl IntoIterator<Item = impl AsRef<str>>) -> Table {
        let mut table = Table(csv::Writer::from_writer(Vec::new()));
        table.row(header);
        table
    }

    pub(super) fn row(&mut self, cells: impl IntoIterator<Item = impl AsRef<str>>) {
        for cell in cells {
            self.0
                .write_field(cell.as_ref())
                .expect("writing to memory does not fail");
        }
        self.0
            .write_record(None::<&[u8]>)
            .expect("every row has as many cells as the header");
    }

    pub(super) fn bytes(self) -> Vec<u8> {
        self.0
            .into_inner()
            .expect("writing to memory does not fail")
    }
}

/// All tables of a run with their file names.
#[must_use]
pub fn tables(study: &Study, located: &Located) -> Vec<(&'static str, Vec<u8>)> {
    vec![
        ("positions.csv", positions(study, located)),
        ("counterparts.csv", counterparts(study, located)),
        ("landmarks.csv", landmarks(study, located)),
        ("axes.csv", axes(study, located)),
        ("parcels.csv", parcels(study, located)),
    ]
}

/// Attributes of a parcel that stand in every table of parcels.
const ATTRIBUTES: [&str; 3] = ["hemisphere", "group", "long_name"];

/// The cells of [`ATTRIBUTES`]; empty where nothing is known.
fn attributes(of: &Attributes) -> [String; 3] {
    [
        of.hemisphere.map_or_else(String::new, |h| h.to_string()),
        of.group.clone().unwrap_or_default(),
        of.long_name.clone().unwrap_or_default(),
    ]
}

/// A number, or nothing.
fn optional(number: Option<f64>) -> String {
    number.map_or_else(String::new, |x| x.to_string())
}

fn positions(study: &Study, located: &Located) -> Vec<u8> {
    let mut header: Vec<String> = ["species", "parcel", "landmark", "beyond_landmarks"]
        .map(str::to_owned)
        .into();
    for alignment in Alignment::BOTH {
        let axes = located.spaces[alignment].map.axes();
        header.extend((1..=axes).map(|k| format!("{alignment}_{k}")));
        header.extend((1..=axes).map(|k| format!("{alignment}_{k}_se_landmarks")));
    }
    header.extend(ATTRIBUTES.map(str::to_owned));
    header.extend(["x", "y", "z", "area", "volume"].map(str::to_owned));
    for (alignment, _) in with_subjects(located) {
        let axes = located.spaces[alignment].map.axes();
        for what in ["subjects", "both"] {
            header.extend((1..=axes).map(|k| format!("{alignment}_{k}_se_{what}")));
        }
        header.push(format!("{alignment}_share_subjects"));
    }
    let mut table = Table::new(header);
    for side in Side::BOTH {
        let parcels = &study.species[side].parcels;
        let owners = study.landmarks.owners(side, parcels.len());
        for &parcel in parcels.as_listed() {
            let landmark = owners[parcel].map_or("", |at| &study.landmarks.list()[at].name);
            let mut row = vec![
                parcels.species().to_owned(),
                parcels.labels()[parcel].clone(),
                landmark.to_owned(),
                located.beyond[side][parcel].to_string(),
            ];
            for alignment in Alignment::BOTH {
                let space = &located.spaces[alignment];
                let errors = &space.standard_errors.landmarks[side];
                for values in [&space.positions[side], errors] {
                    row.extend(values.row(parcel).iter().map(f64::to_string));
                }
            }
            let known = &study.species[side].attributes[parcel];
            row.extend(attributes(known));
            row.extend((0..3).map(|axis| optional(known.coordinates.map(|c| c[axis]))));
            row.push(optional(known.extent.and_then(Extent::area)));
            row.push(optional(known.extent.and_then(Extent::volume)));
            for (alignment, errors) in with_subjects(located) {
                for values in [&errors.alone[side], &errors.both[side]] {
                    row.extend(values.row(parcel).iter().map(f64::to_string));
                }
                let all = &located.spaces[alignment].standard_errors;
                row.push(optional(all.share_of_subjects(side, parcel)));
            }
            table.row(row);
        }
    }
    table.bytes()
}

/// Both alignments with the standard errors that subjects are part of; none without subjects.
fn with_subjects(located: &Located) -> impl Iterator<Item = (Alignment, &SubjectErrors)> {
    Alignment::BOTH.into_iter().filter_map(|alignment| {
        let errors = &located.spaces[alignment].standard_errors;
        Some((alignment, errors.subjects.as_ref()?))
    })
}

fn counterparts(study: &Study, located: &Located) -> Vec<u8> {
    let mut header: Vec<String> = [
        "from",
        "parcel",
        "to",
        "counterpart",
        "rank",
        "rank_low",
        "rank_high",
        "distance",
        "support",
        "mutual",
        "kinds_agreeing",
        "chance",
    ]
    .map(str::to_owned)
    .into();
    for whose in ["parcel", "counterpart"] {
        header.extend(ATTRIBUTES.map(|attribute| format!("{whose}_{attribute}")));
    }
    header.push("in_candidate_set".to_owned());
    let mut table = Table::new(header);
    for side in Side::BOTH {
        let species = [&study.species[side], &study.species[side.opposite()]];
        let [own, other] = species.map(|s| &s.parcels);
        for placement in &located.placements[side] {
            for found in &placement.counterparts {
                let kinds: Vec<String> = found.kinds_agreeing.iter().map(Kind::to_string).collect();
                let mut row = vec![
                    own.species().to_owned(),
                    own.labels()[placement.parcel].clone(),
                    other.species().to_owned(),
                    other.labels()[found.parcel].clone(),
                    found.rank.to_string(),
                    found.rank_interval.0.to_string(),
                    found.rank_interval.1.to_string(),
                    found.distance.to_string(),
                    found.support.to_string(),
                    found.mutual.to_string(),
                    kinds.join(PARCEL_SEPARATOR),
                    found.chance.map_or_else(String::new, |x| x.to_string()),
                ];
                for (species, parcel) in species.into_iter().zip([placement.parcel, found.parcel]) {
                    row.extend(attributes(&species.attributes[parcel]));
                }
                row.push(found.in_candidate_set.to_string());
                table.row(row);
            }
        }
    }
    table.bytes()
}

fn parcels(study: &Study, located: &Located) -> Vec<u8> {
    let mut table = Table::new([
        "species",
        "parcel",
        "no_counterpart_score",
        "no_counterpart_p",
        "too_little_data",
    ]);
    for side in Side::BOTH {
        let parcels = &study.species[side].parcels;
        for &parcel in parcels.as_listed() {
            let judged = &located.judgements[side][parcel];
            let cell = |of: fn(&Doubt) -> f64| {
                let value = judged.doubt.as_ref().map(of);
                value.map_or_else(String::new, |x| x.to_string())
            };
            table.row([
                parcels.species(),
                &parcels.labels()[parcel],
                &cell(|doubt| doubt.score),
                &cell(|doubt| doubt.p),
                &judged.too_little_data.to_string(),
            ]);
        }
    }
    table.bytes()
}

fn landmarks(study: &Study, located: &Located) -> Vec<u8> {
    let mut table = Table::new([
        "landmark",
        "a",
        "b",
        "weight",
        "block",
        "basis",
        "asked_a",
        "asked_b",
        "rank_from_a",
        "candidates_from_a",
        "percentile_from_a",
        "rank_from_b",
        "candidates_from_b",
        "percentile_from_b",
        "distance",
        "alignment",
        "axes",
        "contradicted",
    ]);
    let label = |side: Side, parcel: usize| study.species[side].parcels.labels()[parcel].as_str();
    let landmarks: &Landmarks = &study.landmarks;
    for (landmark, found) in landmarks.list().iter().zip(&located.left_out) {
        let members = Pair::from_fn(|side| {
            landmark.parcels[side]
                .iter()
                .map(|&p| label(side, p))
                .collect::<Vec<_>>()
                .join(PARCEL_SEPARATOR)
        });
        table.row([
            landmark.name.as_str(),
            &members.a,
            &members.b,
            &landmark.weight.get().to_string(),
            landmarks.block_name(landmark.block),
            landmark.basis.as_ref().map_or("", |basis| basis.0.as_str()),
            label(Side::A, found.asked.a),
            label(Side::B, found.asked.b),
            &found.placed.a.rank.to_string(),
            &found.placed.a.candidates.to_string(),
            &found.placed.a.percentile().to_string(),
            &found.placed.b.rank.to_string(),
            &found.placed.b.candidates.to_string(),
            &found.placed.b.percentile().to_string(),
            &found.distance.to_string(),
            &found.chosen.alignment.to_string(),
            &found.chosen.axes.to_string(),
            &found.contradicted.is_some().to_string(),
        ]);
    }
    table.bytes()
}

fn axes(study: &Study, located: &Located) -> Vec<u8> {
    let ends = located.spaces.procrustes.ends(Side::A, 0).low.len();
    let mut header: Vec<String> = [
        "alignment",
        "axis",
        "share_a",
        "share_b",
        "correlation_in_sample",
        "correlation_left_out",
    ]
    .map(str::to_owned)
    .into();
    for side in Side::BOTH {
        for end in ["low", "high"] {
            header.extend((1..=ends).map(|k| format!("{}_{end}_{k}", side.letter())));
        }
    }
    header.extend(["p", "reliability", "replicates"].map(str::to_owned));
    let mut table = Table::new(header);
    for alignment in Alignment::BOTH {
        let space = &located.spaces[alignment];
        for axis in 0..space.map.axes() {
            let mut row = vec![
                alignment.to_string(),
                (axis + 1).to_string(),
                space.shares.a[axis].to_string(),
                space.shares.b[axis].to_string(),
                space.correlations[axis].to_string(),
                space.correlations_left_out[axis].map_or_else(String::new, |r| r.to_string()),
            ];
            for side in Side::BOTH {
                let labels = study.species[side].parcels.labels();
                let found = space.ends(side, axis);
                for end in [&found.low, &found.high] {
                    row.extend((0..ends).map(|k| {
                        end.get(k)
                            .map_or_else(String::new, |&parcel| labels[parcel].clone())
                    }));
                }
            }
            row.extend([
                space.p[axis].map_or_else(String::new, |p| p.to_string()),
                space.reliability[axis].to_string(),
                space.replicates(axis).to_string(),
            ]);
            table.row(row);
        }
    }
    table.bytes()
}
