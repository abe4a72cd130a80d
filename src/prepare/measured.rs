//! What was measured of a species: a group matrix, matrices of individuals, or both.

use super::arrange::directionless;
use super::cohort::{Cohort, FEWEST_SUBJECTS};
use crate::domain::{Connectivity, RowsAre};
use crate::input::{self, InputError, InputFile, Place, Problem, SpeciesFile};
use crate::warning::Warning;

/// A group matrix whose correlation with the mean of the individuals is below this is worth a word.
/// Common practice, no source.
const MUCH_THE_SAME: f64 = 0.9;

/// The connectivity of a species as read.
pub struct Measured {
    /// That of the group: the matrix given, else the mean of the individuals.
    pub network: Connectivity,
    /// What its rows are.
    pub rows_are: RowsAre,
    /// The individuals, with the same rows and columns.
    pub cohort: Option<Cohort>,
    /// The file of the group matrix.
    pub matrix: Option<InputFile>,
    /// The files of the individuals.
    pub subjects: Vec<InputFile>,
    /// Files of labels.
    pub labels: Vec<InputFile>,
    /// What is legal but suspicious.
    pub warnings: Vec<Warning>,
}

impl Measured {
    /// Reads everything.
    ///
    /// # Errors
    /// [`InputError`] where a file cannot be read, or too few individuals have the same parcels.
    pub fn read(described: &SpeciesFile) -> Result<Measured, InputError> {
        let group = match &described.matrix {
            Some(matrix) => Some(input::read_matrix_of(described, matrix)?),
            None => None,
        };
        let Some(files) = &described.subjects else {
            let group = group.expect("the study file gives a matrix where it gives no subjects");
            return Ok(Measured {
                network: group.network,
                rows_are: group.rows_are,
                cohort: None,
                matrix: Some(group.file),
                subjects: Vec::new(),
                labels: group.labels,
                warnings: group.warnings,
            });
        };
        let read = input::read_subjects(described, files)?;
        let rows_are = group.as_ref().map_or_else(
            || read.first().map_or(RowsAre::Sources, |s| s.matrix.rows_are),
            |group| group.rows_are,
        );
        let mut warnings = group.as_ref().map_or_else(Vec::new, |g| g.warnings.clone());
        let mut labels = group.as_ref().map_or_else(Vec::new, |g| g.labels.clone());
        let (mut subjects, mut individuals, mut aside) = (Vec::new(), Vec::new(), Vec::new());
        for subject in read {
            // What is odd about all of them is said once.
            for warning in subject.matrix.warnings {
                if !warnings.contains(&warning) {
                    warnings.push(warning);
                }
            }
            // An array of several individuals is one file.
            if !subjects.contains(&subject.matrix.file) {
                subjects.push(subject.matrix.file);
            }
            if labels.is_empty() {
                labels = subject.matrix.labels;
            }
            if subject.matrix.rows_are == rows_are {
                let mut network = subject.matrix.network;
                directionless(&mut network, described.weights);
                individuals.push((subject.name, network));
            } else {
                aside.push((
                    subject.name,
                    "its rows are what are columns elsewhere".to_owned(),
                ));
            }
        }
        let reference = group.as_ref().map(|group| &group.network);
        let (cohort, more) = Cohort::gather(individuals, reference, described.weights);
        aside.extend(more);
        if cohort.len() < FEWEST_SUBJECTS {
            return Err(InputError::new(
                Place::file(files.path()),
                Problem::TooFewSubjects {
                    found: cohort.len(),
                    needed: FEWEST_SUBJECTS,
                    set_aside: aside,
                },
            ));
        }
        if !aside.is_empty() {
            warnings.push(Warning::SubjectsSetAside {
                species: described.name.clone(),
                subjects: aside,
                kept: cohort.len(),
            });
        }
        let mean = cohort.mean();
        if let Some(group) = &group {
            let likeness = likeness(&group.network, &mean);
            if likeness < MUCH_THE_SAME {
                warnings.push(Warning::MatrixIsNotMean {
                    species: described.name.clone(),
                    correlation: likeness,
                });
            }
        }
        let (network, matrix) = match group {
            Some(group) => (group.network, Some(group.file)),
            None => (mean, None),
        };
        Ok(Measured {
            network,
            rows_are,
            cohort: Some(cohort),
            matrix,
            subjects,
            labels,
            warnings,
        })
    }
}

/// Pearson correlation of two matrices over the entries observed in both; 1 where one does not vary.
fn likeness(one: &Connectivity, other: &Connectivity) -> f64 {
    let pairs = || {
        one.weights()
            .indexed_iter()
            .filter(|((i, j), _)| one.is_data(*i, *j) && other.is_data(*i, *j))
            .map(|(at, x)| (*x, other.weights()[at]))
    };
    let n = pairs().count().max(1) as f64;
    let (sum_x, sum_y) = pairs().fold((0.0, 0.0), |(x, y), (a, b)| (x + a, y + b));
    let (mean_x, mean_y) = (sum_x / n, sum_y / n);
    let (mut xx, mut yy, mut xy) = (0.0, 0.0, 0.0);
    for (x, y) in pairs() {
        let (x, y) = (x - mean_x, y - mean_y);
        xx += x * x;
        yy += y * y;
        xy += x * y;
    }
    if xx * yy > 0.0 {
        xy / (xx * yy).sqrt()
    } else {
        1.0
    }
}
