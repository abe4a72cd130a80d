//! Which file of a folder is which: two matrices, a landmark table, tables of parcels.

use std::collections::HashSet;
use std::path::Path;

use super::guess::guess;
use super::labels;
use super::names::names;
use super::{
    Draft, DraftError, DraftSpecies, FoundLabels, FoundLandmarks, FoundMatrix, FoundParcels,
};
use crate::domain::{Pair, Side};
use crate::input::{
    is_binary, read_matrix_of, recognise, LandmarkLooks, Looks, MatrixLooks, ParcelLooks,
    SpeciesFile,
};
use crate::transform;

/// Endings of texts that are looked at. What is binary tells by its first bytes what it is.
const ENDINGS: [&str; 10] = [
    "csv", "tsv", "tab", "txt", "dat", "lst", "edges", "edgelist", "labels", "names",
];

/// Looks at every file of a folder that may hold a table and settles on the likeliest three.
pub fn assign(folder: &Path) -> Result<Draft, DraftError> {
    let mut matrices = Vec::new();
    let mut tables = Vec::new();
    let mut lists = Vec::new();
    let mut described = Vec::new();
    let mut unused = Vec::new();
    for name in files(folder)? {
        match recognise(&folder.join(&name)) {
            Looks::Matrix(looks) => matrices.push((name, *looks)),
            Looks::Landmarks(looks) => tables.push((name, looks)),
            Looks::Labels(labels) => lists.push((name, labels)),
            Looks::Parcels(looks) => described.push((name, looks)),
            Looks::Neither(why) => unused.push((name, why)),
        }
    }
    let landmarks = likeliest_table(&mut tables);
    for (name, _) in tables {
        unused.push((name, "another landmark table has more rows".to_owned()));
    }
    let given = labels::assign(&matrices, &lists, landmarks.as_ref().map(|(_, l)| l));
    let matrices: Vec<FoundMatrix> = matrices
        .into_iter()
        .zip(given)
        .map(|((name, looks), labels)| found(folder, name, looks, labels))
        .collect();
    if matrices.is_empty() {
        unused.extend(lists.iter().map(of_list));
        unused.sort();
        return Err(DraftError::NoMatrix {
            folder: folder.to_path_buf(),
            looked_at: unused,
        });
    }
    let chosen = likeliest_pair(&matrices, landmarks.as_ref().map(|(_, looks)| looks));
    let mut matrices: Vec<Option<FoundMatrix>> = matrices.into_iter().map(Some).collect();
    let chosen = chosen.map(|at| at.and_then(|at| matrices[at].take()));
    for list in &lists {
        let is_used = |m: &FoundMatrix| m.label_file.as_ref().is_some_and(|l| l.file == list.0);
        if !Side::BOTH
            .iter()
            .any(|side| chosen[*side].as_ref().is_some_and(is_used))
        {
            unused.push(of_list(list));
        }
    }
    for matrix in matrices.into_iter().flatten() {
        unused.push((matrix.file, "two other matrices were taken".to_owned()));
    }
    let parcels = parcel_tables(&mut described, &chosen);
    for (name, _) in described {
        unused.push((
            name,
            "it describes parcels, but another table describes more of a matrix".to_owned(),
        ));
    }
    unused.sort();
    let names = names(&chosen.as_ref().map(|m| m.as_ref().map(|m| m.file.clone())));
    let landmarks = landmarks.map(|(file, looks)| FoundLandmarks {
        file,
        rows: looks.rows,
        known: Pair::from_fn(|side| {
            let asked = looks.column(side);
            let known = chosen[side].as_ref().map_or(0, |m| hits(asked, m));
            (known, asked.len())
        }),
    });
    let Pair { a, b } = names;
    Ok(Draft {
        species: Pair {
            a: DraftSpecies {
                name: a,
                matrix: chosen.a,
                parcels: parcels.a,
            },
            b: DraftSpecies {
                name: b,
                matrix: chosen.b,
                parcels: parcels.b,
            },
        },
        landmarks,
        unused,
    })
}

/// Why a list of labels is not used.
fn of_list((name, labels): &(String, Vec<String>)) -> (String, String) {
    let count = labels.len();
    let why = format!("{count} labels, one a line, but no matrix without labels has {count} rows");
    (name.clone(), why)
}

/// Names of the files in a folder that may hold a table, in order; those no study file can spell are
/// passed over.
fn files(folder: &Path) -> Result<Vec<String>, DraftError> {
    let unlisted = |e: std::io::Error| DraftError::Unlisted {
        folder: folder.to_path_buf(),
        reason: e.to_string(),
    };
    let mut names = Vec::new();
    for entry in std::fs::read_dir(folder).map_err(unlisted)? {
        let path = entry.map_err(unlisted)?.path();
        let Some(name) = path.file_name().and_then(|n| n.to_str()) else {
            continue;
        };
        if name.starts_with('.') || !path.is_file() {
            continue;
        }
        if is_called_text(name) || is_binary(&path).unwrap_or(false) {
            names.push(name.to_owned());
        }
    }
    names.sort();
    Ok(names)
}

/// Whether a file is called as tables of text are, compressed or not.
fn is_called_text(name: &str) -> bool {
    let name = name.to_lowercase();
    let plain = name.strip_suffix(".gz").unwrap_or(&name);
    let ending = plain.rsplit_once('.').map(|(_, ending)| ending);
    ending.is_some_and(|ending| ENDINGS.contains(&ending))
}

/// Reads a matrix as a run would, with the labels and the weights that were guessed.
fn found(
    folder: &Path,
    file: String,
    looks: MatrixLooks,
    label_file: Option<FoundLabels>,
) -> FoundMatrix {
    let guess = guess(&looks);
    let lacks_labels = looks.labels.is_none() && label_file.is_none();
    let (mut transform, mut fault) = (None, None);
    if !lacks_labels {
        let described = SpeciesFile {
            labels: label_file.as_ref().map(|l| folder.join(&l.file)),
            variable: looks.variable.as_ref().map(|pick| pick.name.clone()),
            label_variable: looks.label_variable.as_ref().map(|pick| pick.name.clone()),
            ..SpeciesFile::new("", &folder.join(&file), guess.kind)
        };
        match read_matrix_of(&described, described.source()) {
            Ok(read) => transform = Some(transform::default_for(&read.network, guess.kind)),
            Err(e) => fault = Some(e),
        }
    }
    let of_file = label_file.as_ref().map(|l| l.labels.clone());
    FoundMatrix {
        file,
        form: looks.form,
        rows: looks.rows,
        labels: of_file.or(looks.labels).unwrap_or_default(),
        label_file,
        lacks_labels,
        variable: looks.variable,
        label_variable: looks.label_variable,
        guess,
        transform,
        fault,
    }
}

/// Takes out the table with the most rows; of equals one that is called after landmarks.
fn likeliest_table(tables: &mut Vec<(String, LandmarkLooks)>) -> Option<(String, LandmarkLooks)> {
    let best = (0..tables.len()).max_by_key(|&at| {
        let (name, looks) = &tables[at];
        let named = name.to_lowercase().contains("landmark");
        (looks.rows, named, std::cmp::Reverse(at))
    })?;
    Some(tables.remove(best))
}

/// Takes out, for each matrix, the table that describes most of its parcels, at least half of its own
/// rows; of equals the first by name.
fn parcel_tables(
    tables: &mut Vec<(String, ParcelLooks)>,
    matrices: &Pair<Option<FoundMatrix>>,
) -> Pair<Option<FoundParcels>> {
    let chosen = matrices.as_ref().map(|matrix| {
        let matrix = matrix.as_ref()?;
        tables
            .iter()
            .map(|(file, looks)| FoundParcels {
                file: file.clone(),
                known: (hits(&looks.labels, matrix), looks.labels.len()),
            })
            .filter(|table| 2 * table.known.0 >= table.known.1.max(1))
            .min_by_key(|table| std::cmp::Reverse(table.known.0))
    });
    tables.retain(|(file, _)| {
        let takes = |side| {
            chosen[side]
                .as_ref()
                .is_some_and(|t: &FoundParcels| t.file == *file)
        };
        !Side::BOTH.into_iter().any(takes)
    });
    chosen
}

/// The matrices that the landmarks name; as far as these leave it open those without a fault, then
/// those of different parcels, then the first by name.
fn likeliest_pair(
    matrices: &[FoundMatrix],
    landmarks: Option<&LandmarkLooks>,
) -> Pair<Option<usize>> {
    let known = |side: Side, at: usize| {
        landmarks.map_or(0, |looks| hits(looks.column(side), &matrices[at]))
    };
    let sound = |at: usize| {
        let matrix = &matrices[at];
        usize::from(matrix.fault.is_none() && !matrix.lacks_labels)
    };
    if matrices.len() < 2 {
        let is_b = known(Side::B, 0) > known(Side::A, 0);
        return Pair::from_fn(|side| ((side == Side::B) == is_b).then_some(0));
    }
    let hits = Pair::from_fn(|side| -> Vec<usize> {
        (0..matrices.len()).map(|at| known(side, at)).collect()
    });
    let sets: Vec<HashSet<&String>> = matrices.iter().map(|m| m.labels.iter().collect()).collect();
    let best = (0..matrices.len())
        .flat_map(|a| (0..matrices.len()).map(move |b| (a, b)))
        .filter(|(a, b)| a != b)
        .max_by_key(|&(a, b)| {
            (
                hits.a[a] + hits.b[b],
                sound(a) + sound(b),
                sets[a] != sets[b],
                std::cmp::Reverse((a, b)),
            )
        });
    Pair {
        a: best.map(|(a, _)| a),
        b: best.map(|(_, b)| b),
    }
}

/// How many of these parcels a matrix has.
fn hits(parcels: &[String], matrix: &FoundMatrix) -> usize {
    let labels: HashSet<&String> = matrix.labels.iter().collect();
    parcels.iter().filter(|p| labels.contains(p)).count()
}
