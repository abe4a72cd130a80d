//! Names to questions: which parcel, against which candidates.

use std::path::PathBuf;

use thiserror::Error;

use crate::domain::{Landmarks, Pair, Parcels, Side};
use crate::input::{nearest_few, NamedPair};
use crate::prepare::Study;
use crate::settings::Axes;

/// What is to be checked, by name.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct CheckRequest {
    /// Species of the parcel: its name, or a or b; the default is a.
    pub species: Option<String>,
    /// The parcel.
    pub parcel: Option<String>,
    /// Its candidates in the other species.
    pub against: Vec<String>,
    /// Pairs from a file.
    pub pairs: Vec<NamedPair>,
    /// That file, for messages.
    pub file: Option<PathBuf>,
}

/// A parcel and its named candidates.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Question {
    /// Species of the parcel.
    pub side: Side,
    /// The parcel.
    pub parcel: usize,
    /// Candidates in the other species; none where it is asked where the parcel falls.
    pub against: Vec<usize>,
    /// Blocks of landmarks that one of these parcels belongs to: they are left out for this question.
    pub aside: Vec<usize>,
}

/// A question that cannot be asked.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum AskError {
    /// Neither a parcel nor pairs.
    #[error("nothing to check: name a parcel with --parcel, or a table of pairs with --pairs")]
    Nothing,
    /// A species that the study does not have.
    #[error("--species must be {a:?}, {b:?}, a or b; found {found:?}")]
    Species {
        /// What was given.
        found: String,
        /// Name of a.
        a: String,
        /// Name of b.
        b: String,
    },
    /// A parcel that is not there.
    #[error("{place}{parcel:?} is no parcel of {species}{}{}", hint(.near), other_way(*.in_other))]
    Unknown {
        /// Where it was named, for files.
        place: String,
        /// The parcel.
        parcel: String,
        /// The species.
        species: String,
        /// Near spellings.
        near: Vec<String>,
        /// Whether the other species has such a parcel.
        in_other: bool,
    },
    /// A parcel that takes no part.
    #[error("{place}{parcel:?} of {species} {why}, so nothing can be said about it")]
    NotPlaced {
        /// Where it was named, for files.
        place: String,
        /// The parcel.
        parcel: String,
        /// The species.
        species: String,
        /// Why.
        why: &'static str,
    },
    /// A candidate of the other hemisphere.
    #[error("{place}{candidate:?} may not be a counterpart of {parcel:?}: the study matches hemispheres; name one on the same side, or set hemispheres = \"ignore\"")]
    Inadmissible {
        /// Where it was named, for files.
        place: String,
        /// The parcel.
        parcel: String,
        /// The candidate.
        candidate: String,
    },
    /// Too few landmarks besides those that the question is about.
    #[error("{parcel:?} or a candidate belongs to a landmark ({}), which is left out for this question; {left} blocks of landmarks remain, and {needed} are needed", .blocks.join(", "))]
    TooFew {
        /// The parcel.
        parcel: String,
        /// The blocks left out.
        blocks: Vec<String>,
        /// Blocks that remain.
        left: usize,
        /// Blocks needed.
        needed: usize,
    },
}

fn hint(near: &[String]) -> String {
    if near.is_empty() {
        return String::new();
    }
    let words: Vec<String> = near.iter().map(|word| format!("{word:?}")).collect();
    format!(" (did you mean {}?)", words.join(" or "))
}

fn other_way(in_other: bool) -> &'static str {
    match in_other {
        true => "; the other species has one: say --species to ask from there",
        false => "",
    }
}

impl CheckRequest {
    /// Finds the parcels. Pairs of a file that share a's parcel make one question.
    ///
    /// # Errors
    /// [`AskError`].
    pub fn questions(&self, study: &Study) -> Result<Vec<Question>, AskError> {
        let parcels = study.species.as_ref().map(|species| &species.parcels);
        let side = self.side(&parcels)?;
        let mut questions: Vec<Question> = Vec::new();
        if let Some(parcel) = &self.parcel {
            let own = find(&parcels, side, parcel, "")?;
            let mut against = Vec::new();
            for name in &self.against {
                let candidate = find(&parcels, side.opposite(), name, "")?;
                self.admit(study, side, own, candidate, "")?;
                if !against.contains(&candidate) {
                    against.push(candidate);
                }
            }
            questions.push(Question {
                side,
                parcel: own,
                against,
                aside: Vec::new(),
            });
        }
        let file = self
            .file
            .as_ref()
            .map_or_else(String::new, |f| f.display().to_string());
        for pair in &self.pairs {
            let place = format!("{file}:{}: ", pair.line);
            let own = find(&parcels, Side::A, &pair.labels.a, &place)?;
            let candidate = find(&parcels, Side::B, &pair.labels.b, &place)?;
            self.admit(study, Side::A, own, candidate, &place)?;
            let known = questions
                .iter_mut()
                .find(|q| q.side == Side::A && q.parcel == own && !q.against.is_empty());
            match known {
                Some(question) if question.against.contains(&candidate) => {}
                Some(question) => question.against.push(candidate),
                None => questions.push(Question {
                    side: Side::A,
                    parcel: own,
                    against: vec![candidate],
                    aside: Vec::new(),
                }),
            }
        }
        if questions.is_empty() {
            return Err(AskError::Nothing);
        }
        for question in &mut questions {
            question.aside = aside(study, question)?;
        }
        Ok(questions)
    }

    fn side(&self, parcels: &Pair<&Parcels>) -> Result<Side, AskError> {
        let Some(asked) = &self.species else {
            return Ok(Side::A);
        };
        let named = Side::BOTH
            .into_iter()
            .find(|side| parcels[*side].species() == asked);
        let lettered = Side::BOTH.into_iter().find(|side| side.letter() == asked);
        named.or(lettered).ok_or_else(|| AskError::Species {
            found: asked.clone(),
            a: parcels.a.species().to_owned(),
            b: parcels.b.species().to_owned(),
        })
    }

    fn admit(
        &self,
        study: &Study,
        side: Side,
        parcel: usize,
        candidate: usize,
        place: &str,
    ) -> Result<(), AskError> {
        match study.candidates.admit(side, parcel, candidate) {
            true => Ok(()),
            false => Err(AskError::Inadmissible {
                place: place.to_owned(),
                parcel: study.species[side].parcels.labels()[parcel].clone(),
                candidate: study.species[side.opposite()].parcels.labels()[candidate].clone(),
            }),
        }
    }
}

fn find(parcels: &Pair<&Parcels>, side: Side, label: &str, place: &str) -> Result<usize, AskError> {
    let all = parcels[side];
    if let Some(found) = all.find(label) {
        return Ok(found);
    }
    let is_in = |labels: &[String]| labels.iter().any(|l| l == label);
    let why = match (is_in(all.isolated()), is_in(all.uncovered())) {
        (true, _) => Some("has no connection"),
        (_, true) => Some("has too few observed connections"),
        _ => None,
    };
    Err(match why {
        Some(why) => AskError::NotPlaced {
            place: place.to_owned(),
            parcel: label.to_owned(),
            species: all.species().to_owned(),
            why,
        },
        None => AskError::Unknown {
            place: place.to_owned(),
            parcel: label.to_owned(),
            species: all.species().to_owned(),
            near: nearest_few(label, all.labels().iter().map(String::as_str))
                .into_iter()
                .map(str::to_owned)
                .collect(),
            in_other: parcels[side.opposite()].find(label).is_some(),
        },
    })
}

/// The blocks of landmarks that parcels of a question belong to.
fn aside(study: &Study, question: &Question) -> Result<Vec<usize>, AskError> {
    let landmarks = &study.landmarks;
    let other = question.side.opposite();
    let mut blocks: Vec<usize> = landmarks
        .list()
        .iter()
        .filter(|landmark| {
            landmark.parcels[question.side].contains(&question.parcel)
                || landmark.parcels[other]
                    .iter()
                    .any(|p| question.against.contains(p))
        })
        .map(|landmark| landmark.block)
        .collect();
    blocks.sort_unstable();
    blocks.dedup();
    let needed = match study.settings.axes {
        Axes::Number(axes) => (axes + 1).max(Landmarks::FEWEST),
        Axes::Auto => Landmarks::FEWEST,
    };
    let left = landmarks.blocks() - blocks.len();
    if left < needed && !blocks.is_empty() {
        return Err(AskError::TooFew {
            parcel: study.species[question.side].parcels.labels()[question.parcel].clone(),
            blocks: blocks
                .iter()
                .map(|&b| landmarks.block_name(b).to_owned())
                .collect(),
            left,
            needed,
        });
    }
    Ok(blocks)
}
