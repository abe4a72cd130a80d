//! The maps of a species: from the tables of a run to one number for each parcel. Nothing is
//! computed, only looked up.

use super::PaintError;
use crate::domain::Side;
use crate::finished::{Run, RunError, Species};
use crate::input::nearest_few;

/// What is said of vertices without a number.
const NO_VALUE: &str = "NaN on vertices of no parcel of the run";

/// The maps of one species.
#[derive(Debug)]
pub struct Maps {
    /// Whose axes they show, where the run has any.
    pub alignment: Option<String>,
    /// One group for each file.
    pub groups: Vec<Group>,
}

/// The maps of one file.
#[derive(Debug)]
pub struct Group {
    /// What the name of the file says of them.
    pub name: String,
    /// The maps.
    pub maps: Vec<ParcelMap>,
}

/// One number for each parcel of a species.
#[derive(Debug)]
pub struct ParcelMap {
    /// Its name.
    pub name: String,
    /// What it shows.
    pub meaning: String,
    /// The numbers, in the order of the species' parcels; NaN where there is none.
    pub values: Vec<f64>,
}

impl Maps {
    /// Looks up what is asked for.
    ///
    /// # Errors
    /// [`PaintError`] for an alignment or a parcel that the run has not, and for changed tables.
    pub fn of(
        run: &Run,
        side: Side,
        alignment: Option<&str>,
        parcels: &[String],
    ) -> Result<Maps, PaintError> {
        let (alignment, axes) = axes(run, side, alignment)?;
        let mut groups = Vec::new();
        if let Some(name) = &alignment {
            groups.push(Group {
                name: format!("axes-{}", in_a_name(name)),
                maps: axes,
            });
        }
        groups.push(Group {
            name: "correspondence".to_owned(),
            maps: correspondence(run, side)?,
        });
        for parcel in parcels {
            let name = format!("from-{}", in_a_name(parcel));
            // Asked twice, painted once.
            if !groups.iter().any(|group| group.name == name) {
                let maps = counterparts(run, side, parcel)?;
                groups.push(Group { name, maps });
            }
        }
        Ok(Maps { alignment, groups })
    }
}

/// Coordinates in the joint space of an alignment.
fn axes(
    run: &Run,
    side: Side,
    asked: Option<&str>,
) -> Result<(Option<String>, Vec<ParcelMap>), PaintError> {
    let header = run.positions.header();
    let known: Vec<String> = header
        .iter()
        .filter_map(|column| column.strip_suffix("_1"))
        .map(str::to_owned)
        .collect();
    let alignment = match asked {
        Some(name) if known.iter().any(|k| k == name) => Some(name.to_owned()),
        Some(name) => {
            return Err(PaintError::NoAlignment {
                found: name.to_owned(),
                known,
            })
        }
        // Distances need not come from an alignment; then any joint space will do.
        None => known
            .iter()
            .find(|k| **k == run.distances_from)
            .or(known.last())
            .cloned(),
    };
    let Some(alignment) = alignment else {
        return Ok((None, Vec::new()));
    };
    let mut maps = Vec::new();
    for axis in 1.. {
        let column = format!("{alignment}_{axis}");
        if !header.contains(&column) {
            break;
        }
        maps.push(ParcelMap {
            meaning: format!(
                "Coordinate on axis {axis} of the {alignment} joint space, in root mean square distances of random cross-species pairs; sign by convention. {NO_VALUE}."
            ),
            values: of_positions(run, side, &column)?,
            name: column,
        });
    }
    Ok((Some(alignment), maps))
}

/// A column of `positions.csv`.
fn of_positions(run: &Run, side: Side, column: &str) -> Result<Vec<f64>, RunError> {
    let at = run.positions.column(column)?;
    run.species[side]
        .rows
        .iter()
        .map(|&row| run.positions.number(&run.positions.rows()[row], at))
        .collect()
}

/// How near and how stable the first counterpart of each parcel is.
fn correspondence(run: &Run, side: Side) -> Result<Vec<ParcelMap>, PaintError> {
    let own = &run.species[side];
    let other = &run.species[side.opposite()].name;
    let [distance, support] = ["distance", "support"].map(|column| {
        looked_up(run, own, "parcel", column, |row| {
            row.from == own.name && row.rank == "1"
        })
    });
    let open = "and on landmarks, whose counterpart was given";
    Ok(vec![
        ParcelMap {
            name: "first_distance".to_owned(),
            meaning: format!(
                "Distance to the first counterpart in {other}; 1 is the root mean square over random cross-species pairs. {NO_VALUE} {open}."
            ),
            values: distance?,
        },
        ParcelMap {
            name: "first_support".to_owned(),
            meaning: format!(
                "Share of bootstrap replicates in which the first counterpart in {other} came first: stability under other landmark weights, not a probability of being right. {NO_VALUE} {open}."
            ),
            values: support?,
        },
        ParcelMap {
            name: "beyond_landmarks".to_owned(),
            meaning: format!(
                "How far outside the landmarks' range a parcel lies; above 1 its placement is extrapolation. {NO_VALUE}."
            ),
            values: of_positions(run, side, "beyond_landmarks")?,
        },
    ])
}

/// Where a parcel of the other species falls on this one.
fn counterparts(run: &Run, side: Side, parcel: &str) -> Result<Vec<ParcelMap>, PaintError> {
    let (own, other) = (&run.species[side], &run.species[side.opposite()]);
    check(parcel, other, own)?;
    let column = |name| {
        looked_up(run, own, "counterpart", name, |row| {
            row.from == other.name && row.parcel == parcel && row.to == own.name
        })
    };
    let asked = format!("for {parcel} of {}", other.name);
    let listed = format!(
        "{NO_VALUE} and on parcels that the run does not list among the counterparts (kinmark locate --top all lists every one)"
    );
    Ok(vec![
        ParcelMap {
            name: format!("support {asked}"),
            meaning: format!(
                "Share of bootstrap replicates in which the parcel came first {asked}: stability under other landmark weights, not a probability of being right. {listed}."
            ),
            values: column("support")?,
        },
        ParcelMap {
            name: format!("rank {asked}"),
            meaning: format!("Rank among all candidates {asked}; 1 is first. {listed}."),
            values: column("rank")?,
        },
        ParcelMap {
            name: format!("distance {asked}"),
            meaning: format!(
                "Distance to {parcel} of {}; 1 is the root mean square over random cross-species pairs. {listed}.",
                other.name
            ),
            values: column("distance")?,
        },
    ])
}

/// Sees that a parcel of the other species has counterparts in the tables.
fn check(parcel: &str, other: &Species, own: &Species) -> Result<(), PaintError> {
    let (found, species) = (parcel.to_owned(), other.name.clone());
    match other.at.get(parcel) {
        Some(&at) => match &other.landmarks[at] {
            Some(landmark) => Err(PaintError::IsLandmark {
                found,
                species,
                landmark: landmark.clone(),
            }),
            None => Ok(()),
        },
        None if other.set_aside.iter().any(|label| label == parcel) => {
            Err(PaintError::IsSetAside { found, species })
        }
        None => Err(PaintError::NoSuchParcel {
            found,
            species,
            found_in: own.at.contains_key(parcel).then(|| own.name.clone()),
            near: nearest_few(parcel, other.parcels.iter().map(String::as_str))
                .into_iter()
                .map(str::to_owned)
                .collect(),
        }),
    }
}

/// What tells rows of `counterparts.csv` apart.
struct Asked<'r> {
    from: &'r str,
    parcel: &'r str,
    to: &'r str,
    rank: &'r str,
}

/// A column of those rows of `counterparts.csv` that are wanted, each number at the parcel of the
/// species that the column `by` names.
fn looked_up(
    run: &Run,
    own: &Species,
    by: &str,
    column: &str,
    wanted: impl Fn(Asked<'_>) -> bool,
) -> Result<Vec<f64>, PaintError> {
    let table = &run.counterparts;
    let [from, parcel, to, rank] = ["from", "parcel", "to", "rank"].map(|name| table.column(name));
    let (from, parcel, to, rank) = (from?, parcel?, to?, rank?);
    let (by, column) = (table.column(by)?, table.column(column)?);
    let mut values = vec![f64::NAN; own.parcels.len()];
    for row in table.rows() {
        let asked = Asked {
            from: table.text(row, from),
            parcel: table.text(row, parcel),
            to: table.text(row, to),
            rank: table.text(row, rank),
        };
        if !wanted(asked) {
            continue;
        }
        let at = own.at.get(table.text(row, by));
        let at = at.ok_or_else(|| table.fault(row, by, "a parcel of positions.csv"))?;
        values[*at] = table.number(row, column)?;
    }
    Ok(values)
}

/// A word as part of the name of a file: letters, digits, `-` and `_` stay, every other byte is
/// spelt `%` and two hexadecimal digits, so that no two words become one.
fn in_a_name(word: &str) -> String {
    let mut name = String::new();
    for c in word.chars() {
        if c.is_alphanumeric() || c == '-' || c == '_' {
            name.push(c);
        } else {
            let mut bytes = [0; 4];
            for byte in c.encode_utf8(&mut bytes).bytes() {
                name.push_str(&format!("%{byte:02X}"));
            }
        }
    }
    name
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn different_words_give_different_names_without_folders() {
        assert_eq!(in_a_name("V1-l_2"), "V1-l_2");
        assert_eq!(in_a_name("Tê, <x>"), "Tê%2C%20%3Cx%3E");
        assert_eq!(in_a_name("../a"), "%2E%2E%2Fa");
        assert_ne!(in_a_name("a/b"), in_a_name("a%2Fb"));
    }
}
