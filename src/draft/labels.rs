//! Which file of labels belongs to which matrix.

use std::cmp::Reverse;
use std::collections::HashSet;

use super::names::words;
use super::FoundLabels;
use crate::domain::Side;
use crate::input::{Form, LandmarkLooks, MatrixLooks};

/// A file and what it looks like.
type Named<T> = (String, T);

/// For each matrix the file of its labels, where it needs one and there is one.
pub fn assign(
    matrices: &[Named<MatrixLooks>],
    lists: &[Named<Vec<String>>],
    landmarks: Option<&LandmarkLooks>,
) -> Vec<Option<FoundLabels>> {
    let known: Vec<usize> = lists
        .iter()
        .map(|(_, labels)| {
            let labels: HashSet<&String> = labels.iter().collect();
            let hits = |side: Side| {
                let named = landmarks.map_or(&[][..], |l| l.column(side));
                named.iter().filter(|p| labels.contains(p)).count()
            };
            hits(Side::A).max(hits(Side::B))
        })
        .collect();
    let mut pairs: Vec<(usize, usize)> = (0..matrices.len())
        .flat_map(|matrix| (0..lists.len()).map(move |list| (matrix, list)))
        .filter(|&(matrix, list)| fits(&matrices[matrix].1, &lists[list].1))
        .collect();
    let shared = |&(matrix, list): &(usize, usize)| {
        let of_matrix = words(&matrices[matrix].0);
        let of_list = words(&lists[list].0);
        of_matrix.intersection(&of_list).count()
    };
    // Files that share a word of their names come first, then those the landmarks name, then in
    // order of names.
    pairs.sort_by_key(|pair| (Reverse(shared(pair)), Reverse(known[pair.1]), *pair));

    let mut given: Vec<Option<usize>> = vec![None; matrices.len()];
    let mut taken = vec![false; lists.len()];
    // First each list for one matrix; then two matrices of the same parcels may have one list.
    for again in [false, true] {
        for &(matrix, list) in &pairs {
            if given[matrix].is_none() && (again || !taken[list]) {
                given[matrix] = Some(list);
                taken[list] = true;
            }
        }
    }
    given
        .iter()
        .enumerate()
        .map(|(matrix, list)| {
            let list = (*list)?;
            let told = shared(&(matrix, list)) > 0;
            Some(FoundLabels {
                file: lists[list].0.clone(),
                labels: lists[list].1.clone(),
                others: pairs
                    .iter()
                    .filter(|pair| !told && pair.0 == matrix && pair.1 != list)
                    .map(|pair| lists[pair.1].0.clone())
                    .collect(),
            })
        })
        .collect()
}

/// Whether a list can be the labels of a matrix that needs one.
fn fits(matrix: &MatrixLooks, list: &[String]) -> bool {
    match (&matrix.labels, matrix.form) {
        (None, _) => list.len() == matrix.rows,
        // A list of connections does not name parcels without any.
        (Some(own), Form::Connections) => {
            let list: HashSet<&String> = list.iter().collect();
            !own.is_empty() && own.iter().all(|label| list.contains(label))
        }
        (Some(_), _) => false,
    }
}
