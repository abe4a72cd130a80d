//! Names of species from names of files.

use std::collections::HashSet;
use std::path::Path;

use crate::domain::{Pair, Side};

/// Words of a file name that say what it is and not whose.
const FILLERS: [&str; 18] = [
    "matrix",
    "connectivity",
    "connectome",
    "connections",
    "network",
    "weights",
    "adjacency",
    "species",
    "relmat",
    "edges",
    "edgelist",
    "labels",
    "label",
    "names",
    "parcels",
    "regions",
    "rois",
    "atlas",
];
/// Endings of names of files, of which several may stand one behind the other.
const ENDINGS: [&str; 17] = [
    "csv", "tsv", "tab", "txt", "dat", "lst", "edges", "edgelist", "labels", "names", "gz", "npy",
    "npz", "mat", "nii", "pconn", "dpconn",
];

/// The name of a file without what tells its format.
fn stem(file: &str) -> &str {
    let mut stem = Path::new(file)
        .file_name()
        .and_then(|name| name.to_str())
        .unwrap_or(file);
    while let Some((before, ending)) = stem.rsplit_once('.') {
        if before.is_empty() || !ENDINGS.contains(&ending.to_lowercase().as_str()) {
            break;
        }
        stem = before;
    }
    stem
}

/// The telling words of a file name, in lower case.
pub fn words(file: &str) -> HashSet<String> {
    telling(stem(file)).map(str::to_lowercase).collect()
}

fn telling(stem: &str) -> impl Iterator<Item = &str> {
    stem.split(|c: char| !c.is_alphanumeric())
        .filter(|word| !word.is_empty() && !FILLERS.contains(&word.to_lowercase().as_str()))
}

/// Different names for both species; where a file says nothing, by the side.
pub fn names(files: &Pair<Option<String>>) -> Pair<String> {
    let mut names = Pair::from_fn(|side| {
        files[side]
            .as_deref()
            .and_then(name_of)
            .unwrap_or_else(|| format!("Species {}", side.letter().to_uppercase()))
    });
    if names.a == names.b {
        for side in Side::BOTH {
            names[side] = format!("{} {}", names[side], side.letter().to_uppercase());
        }
    }
    names
}

/// The telling words of a file name, the first one capitalised.
fn name_of(file: &str) -> Option<String> {
    let words: Vec<&str> = telling(stem(file)).collect();
    let name = words.join(" ");
    let mut letters = name.chars();
    let first = letters.next()?;
    // One letter or a number is a side or a counter, not a name.
    if letters.as_str().is_empty() || name.chars().all(char::is_numeric) {
        return None;
    }
    Some(first.to_uppercase().chain(letters).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(a: &str, b: &str) -> (String, String) {
        let names = names(&Pair {
            a: Some(a.to_owned()),
            b: Some(b.to_owned()),
        });
        (names.a, names.b)
    }

    #[test]
    fn files_give_their_names() {
        let pair = |a: &str, b: &str| (a.to_owned(), b.to_owned());
        assert_eq!(
            of("loamick.csv", "pellivane_matrix.tsv"),
            pair("Loamick", "Pellivane")
        );
        assert_eq!(of("a.csv", "b.csv"), pair("Species A", "Species B"));
        assert_eq!(
            of("x.y/tree shrew-2.csv", "1.csv"),
            pair("Tree shrew 2", "Species B")
        );
        assert_eq!(of("vole.csv", "vole.tsv"), pair("Vole A", "Vole B"));
        assert_eq!(
            of("vole.csv.gz", "shrew_relmat.pconn.nii"),
            pair("Vole", "Shrew")
        );
    }
}
