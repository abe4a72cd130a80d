//! What was guessed and what comes next, for people.

use std::path::Path;

use super::Draft;
use crate::domain::Side;

/// Unused files listed before the rest is only counted.
const LISTED: usize = 8;

/// The account of a draft that was written to `file`.
pub fn account(draft: &Draft, file: &Path) -> String {
    let mut lines = vec![format!("Wrote {}. Guessed, please check:", file.display())];
    let mut to_do = Vec::new();
    for side in Side::BOTH {
        let species = &draft.species[side];
        let letter = side.letter();
        match &species.matrix {
            Some(matrix) => {
                lines.push(format!(
                    "  species {letter}  {}: {}, {} parcels",
                    species.name,
                    plain(&matrix.file),
                    matrix.labels.len().max(matrix.rows)
                ));
                for (key, pick) in [
                    ("variable", &matrix.variable),
                    ("label-variable", &matrix.label_variable),
                ] {
                    let Some(pick) = pick else { continue };
                    lines.push(format!("             {key} {}", plain(&pick.name)));
                    if !pick.others.is_empty() {
                        to_do.push(format!(
                            "check {key} of species {letter}; {} might be meant as well",
                            listed(&pick.others)
                        ));
                    }
                }
                if let Some(found) = &matrix.label_file {
                    lines.push(format!("             labels {}", plain(&found.file)));
                    if !found.others.is_empty() {
                        to_do.push(format!(
                            "check labels of species {letter}; {} would fit as well",
                            listed(&found.others)
                        ));
                    }
                }
                if matrix.lacks_labels {
                    to_do.push(format!(
                        "write the {} labels of species {letter}, one a line in the order of the rows, and name their file in the study file",
                        matrix.rows
                    ));
                }
                lines.push(format!(
                    "             weights {}: {}",
                    matrix.guess.kind, matrix.guess.because
                ));
                if let Some(table) = &species.parcels {
                    lines.push(format!(
                        "             parcels {}: describes {} of them",
                        plain(&table.file),
                        table.known.0
                    ));
                }
                if let Some(fault) = &matrix.fault {
                    to_do.push(format!("mend {fault}"));
                }
            }
            None => {
                lines.push(format!("  species {letter}  no second matrix found"));
                to_do.push(format!(
                    "name the matrix of species {letter} in the study file"
                ));
            }
        }
    }
    match &draft.landmarks {
        Some(table) => {
            lines.push(format!(
                "  landmarks  {}, {} rows",
                plain(&table.file),
                table.rows
            ));
            for side in Side::BOTH {
                let (known, all) = table.known[side];
                if known < all && draft.species[side].matrix.is_some() {
                    to_do.push(format!(
                        "compare labels: {} of {all} parcels in column {} of {} are in the matrix of species {}",
                        known,
                        side.letter(),
                        plain(&table.file),
                        side.letter()
                    ));
                }
            }
        }
        None => {
            lines.push("  landmarks  no table found".to_owned());
            to_do.push("write a landmark table; the study file shows how it must look".to_owned());
        }
    }
    for (name, why) in draft.unused.iter().take(LISTED) {
        lines.push(format!("  not used   {}: {why}", plain(name)));
    }
    if draft.unused.len() > LISTED {
        lines.push(format!("  not used   {} more", draft.unused.len() - LISTED));
    }
    if !to_do.is_empty() {
        lines.push("To do before a run:".to_owned());
        lines.extend(to_do.into_iter().map(|what| format!("  - {what}")));
    }
    lines.push("Next:".to_owned());
    lines.push(format!(
        "  kinmark inspect {}",
        quoted(&file.display().to_string())
    ));
    lines.join("\n") + "\n"
}

/// A file's name without anything that would break a line.
fn plain(name: &str) -> String {
    if name.chars().any(char::is_control) {
        format!("{name:?}")
    } else {
        name.to_owned()
    }
}

fn listed(names: &[String]) -> String {
    let names: Vec<String> = names.iter().map(|name| plain(name)).collect();
    names.join(", ")
}

/// A path as a shell takes it.
fn quoted(path: &str) -> String {
    let harmless = |c: char| c.is_alphanumeric() || "/._-+:\\".contains(c);
    if path.chars().all(harmless) {
        path.to_owned()
    } else {
        format!("'{}'", path.replace('\'', r"'\''"))
    }
}
