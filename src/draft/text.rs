//! The study file as text: every guess explained, every setting in a comment.

use super::{Draft, DraftSpecies, FoundLandmarks, FoundMatrix};
use crate::affinity::{Likeness, Params};
use crate::bootstrap::Resampling;
use crate::domain::{Choice, Hemispheres, Side, Transform, WeightKind};
use crate::embed;
use crate::input::Form;
use crate::settings::{EvidenceChoice, Request};
use crate::transport::Mass;

/// How a landmark table must look.
const LANDMARK_TABLE: &str = "\
#   landmark,a,b,weight,block,basis
#   sight field,LABEL IN MATRIX A,LABEL IN MATRIX B,1,,cytoarchitecture
#   paw field left,LABEL;ANOTHER LABEL,LABEL,1,paw field,microstimulation
#   paw field right,LABEL,LABEL,1,paw field,microstimulation
# One row for each pair of parcels taken for homologous; at least three rows, a dozen is better.
# Several parcels in a cell are separated by ;. The columns weight, block and basis may be left out.
# Left and right copies of one area share a block.";

/// What a table of parcels holds.
const PARCEL_TABLE: &str =
    "Columns: label, and any of hemisphere, x, y, z, area or volume, group, long_name.";

/// Writes the study file.
pub fn study_file(draft: &Draft) -> String {
    let mut lines = vec![
        "# A study of kinmark. What stands here was guessed from the files of this folder:".to_owned(),
        "# please check each line. Lines that begin with # are comments; a setting in a comment shows"
            .to_owned(),
        "# its default. docs/formats.md describes every key.".to_owned(),
        String::new(),
        format!(
            "title = {}",
            text(&format!("{} and {}", draft.species.a.name, draft.species.b.name))
        ),
        String::new(),
    ];
    landmarks(&mut lines, draft.landmarks.as_ref());
    for side in Side::BOTH {
        species(&mut lines, side, &draft.species[side]);
    }
    settings(&mut lines);
    if !draft.unused.is_empty() {
        lines.push(String::new());
        lines.push("# Files of this folder that are not used:".to_owned());
        for (name, why) in &draft.unused {
            lines.push(comment(&format!("  {}: {why}", text(name))));
        }
    }
    lines.join("\n") + "\n"
}

fn landmarks(lines: &mut Vec<String>, found: Option<&FoundLandmarks>) {
    match found {
        Some(table) => {
            lines.push(comment(&format!(
                "The landmark table: its header names landmark, a and b; {} rows.",
                table.rows
            )));
            for side in Side::BOTH {
                let (known, all) = table.known[side];
                lines.push(comment(&format!(
                    "{known} of the {all} parcels in its column {} are in the matrix of species {}.",
                    side.letter(),
                    side.letter()
                )));
            }
            lines.push(format!("landmarks = {}", text(&table.file)));
        }
        None => {
            lines.push(comment(
                "TO DO: no landmark table was found. It must look like this:",
            ));
            lines.extend(LANDMARK_TABLE.lines().map(str::to_owned));
            lines.push("landmarks = \"landmarks.csv\"".to_owned());
        }
    }
}

fn species(lines: &mut Vec<String>, side: Side, species: &DraftSpecies) {
    lines.push(String::new());
    lines.push(format!("[species.{}]", side.letter()));
    let kind = match &species.matrix {
        Some(matrix) => {
            lines.push(comment(
                "From the name of the file as far as that tells; used in every table.",
            ));
            lines.push(format!("name = {}", text(&species.name)));
            lines.push(comment(&stored(matrix)));
            if let Some(fault) = &matrix.fault {
                lines.push(comment(&format!("TO DO: {}", fault.problem)));
            }
            lines.push(format!("matrix = {}", text(&matrix.file)));
            arrays(lines, matrix);
            labels(lines, side, matrix);
            lines.push(comment(&format!(
                "What the entries measure. Guessed {}, because {}.",
                matrix.guess.kind, matrix.guess.because
            )));
            matrix.guess.kind
        }
        None => {
            lines.push(format!("name = {}", text(&species.name)));
            lines.push(comment(
                "TO DO: no second matrix was found. A square table: the first row and the",
            ));
            lines.push(comment(
                "first column name the parcels; row = source, column = target.",
            ));
            lines.push(format!("matrix = \"species-{}.csv\"", side.letter()));
            lines.push(comment("TO DO: what the entries measure."));
            WeightKind::Counts
        }
    };
    choices::<WeightKind>(lines, |_| true);
    lines.push(format!("weights = \"{kind}\""));

    let transform = species.matrix.as_ref().and_then(|m| m.transform);
    lines.push(comment(match transform {
        Some(_) => "How weights become strengths. By default, for these weights:",
        None => "How weights become strengths. By default it follows from the weights, such as:",
    }));
    let allowed = |t: Transform| t.mismatch(kind).is_none();
    let example = transform.unwrap_or(Transform::Ranks);
    lines.push(format!("# transform = \"{example}\""));
    choices::<Transform>(lines, allowed);
    let affinity = Params::default_for(kind);
    lines.push(comment(
        "How two parcels' profiles of connections are compared.",
    ));
    lines.push(format!("# affinity = \"{}\"", affinity.likeness));
    choices::<Likeness>(lines, |_| true);
    lines.push(comment(
        "Share of each parcel's links that its profile keeps, the strongest; above 0, at most 1.",
    ));
    lines.push(format!("# strongest = {:?}", affinity.strongest.get()));
    match &species.parcels {
        Some(table) => {
            let (known, all) = table.known;
            lines.push(comment(&format!(
                "The table of its parcels: {known} of its {all} labels are in the matrix. {PARCEL_TABLE}"
            )));
            lines.push(format!("parcels = {}", text(&table.file)));
        }
        None => {
            lines.push(comment(&format!(
                "A table of its parcels may be added: parcels = \"FILE\". {PARCEL_TABLE}"
            )));
        }
    }
    lines.push(comment(
        "So may distances between them, a matrix of any format: distances = \"FILE\".",
    ));
}

/// What a matrix is, in a sentence.
fn stored(matrix: &FoundMatrix) -> String {
    let rows = matrix.labels.len().max(matrix.rows);
    let direction = "Row = source, column = target, 0 = no connection.";
    match matrix.form {
        Form::Table => format!("A square table of {rows} parcels. {direction}"),
        Form::Connections => format!(
            "A list of connections among {rows} parcels; a pair that is not in it has the weight 0."
        ),
        Form::Npy => format!("A NumPy array of {rows} parcels. {direction}"),
        Form::Npz => format!("A matrix of {rows} parcels among NumPy arrays. {direction}"),
        Form::Mat => format!("A matrix of {rows} parcels in a MATLAB file. {direction}"),
        Form::Cifti => format!("A CIFTI-2 matrix of {rows} parcels. {direction}"),
    }
}

/// Which arrays of the file are meant, where it must be told.
fn arrays(lines: &mut Vec<String>, matrix: &FoundMatrix) {
    for (key, pick, what) in [
        ("variable", &matrix.variable, "square matrices"),
        (
            "label-variable",
            &matrix.label_variable,
            "lists of as many texts",
        ),
    ] {
        let Some(pick) = pick else { continue };
        if pick.others.is_empty() {
            lines.push(comment(
                "The only square matrix among the matrices of the file.",
            ));
        } else {
            let others: Vec<String> = pick.others.iter().map(|name| text(name)).collect();
            lines.push(comment(&format!(
                "TO DO: check; the file holds other {what} as well: {}.",
                others.join(", ")
            )));
        }
        lines.push(format!("{key} = {}", text(&pick.name)));
    }
}

/// Where the labels are, if not in the matrix itself.
fn labels(lines: &mut Vec<String>, side: Side, matrix: &FoundMatrix) {
    if let Some(found) = &matrix.label_file {
        lines.push(comment(&format!(
            "Its {} labels, one a line; their order must be that of the rows.",
            found.labels.len()
        )));
        if !found.others.is_empty() {
            let others: Vec<String> = found.others.iter().map(|name| text(name)).collect();
            lines.push(comment(&format!(
                "TO DO: check; these have as many labels: {}.",
                others.join(", ")
            )));
        }
        lines.push(format!("labels = {}", text(&found.file)));
    } else if matrix.lacks_labels {
        lines.push(comment(&format!(
            "TO DO: it holds no labels. Write its {} labels, one a line in the order of its rows,",
            matrix.rows
        )));
        lines.push(comment("without a header, to this file:"));
        lines.push(format!("labels = \"species-{}-labels.txt\"", side.letter()));
    }
}

fn settings(lines: &mut Vec<String>) {
    lines.push(String::new());
    lines.push("[settings]".to_owned());
    lines.push(comment(
        "Each of these is also an option of kinmark locate, such as --replicates 500.",
    ));
    for (key, meaning) in Request::MEANINGS {
        lines.push(comment(meaning.trim()));
        lines.push(format!("# {key} = {}", Request::default_of(key)));
        match *key {
            "embedding" => choices::<embed::Method>(lines, |_| true),
            "evidence" => choices::<EvidenceChoice>(lines, |_| true),
            "mass" => choices::<Mass>(lines, |_| true),
            "resampling" => choices::<Resampling>(lines, |_| true),
            "hemispheres" => choices::<Hemispheres>(lines, |_| true),
            _ => {}
        }
    }
}

/// A list of words and what they mean.
fn choices<C: Choice>(lines: &mut Vec<String>, allowed: impl Fn(C) -> bool) {
    for (choice, word, meaning) in C::CHOICES {
        if allowed(*choice) {
            lines.push(comment(&format!("  {word:<13} {}", meaning.trim())));
        }
    }
}

/// A comment of one line, whatever it says.
fn comment(words: &str) -> String {
    let flat: String = words
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    format!("# {flat}")
}

/// A TOML string in quotes.
fn text(words: &str) -> String {
    let mut quoted = String::from("\"");
    for c in words.chars() {
        match c {
            '"' => quoted.push_str("\\\""),
            '\\' => quoted.push_str("\\\\"),
            c if c.is_control() => quoted.push_str(&format!("\\u{:04X}", u32::from(c))),
            c => quoted.push(c),
        }
    }
    quoted.push('"');
    quoted
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn any_name_survives_its_quotes() {
        for name in [
            "plain",
            "a \"b\" c",
            "back\\slash",
            "line\nbreak\u{7f}",
            "é ☃",
        ] {
            let line = format!("key = {}", text(name));
            let document = toml_edit::Document::parse(line).unwrap();
            assert_eq!(document["key"].as_str(), Some(name));
        }
    }
}
