//! Legal but suspicious: every warning a run can give, worded in one place.

use std::fmt;

use serde::{Serialize, Serializer};

use crate::domain::{RowsAre, Tracer};

/// Parcels named in a warning before the rest is only counted.
const NAMED: usize = 6;

/// Something a careful user would want to know before believing the result.
#[derive(Debug, Clone, PartialEq)]
pub enum Warning {
    /// Columns came in another order than rows and were put in the rows' order.
    ColumnsReordered {
        /// The species.
        species: String,
    },
    /// Entries on the diagonal, which is not data.
    DiagonalNotEmpty {
        /// The species.
        species: String,
        /// Non-zero entries on it.
        entries: usize,
    },
    /// Correlations that differ above and below the diagonal.
    AsymmetricCorrelations {
        /// The species.
        species: String,
        /// Largest difference.
        largest: f64,
    },
    /// Correlations outside [-1, 1], or exactly 1 off the diagonal.
    CorrelationsBeyondOne {
        /// The species.
        species: String,
        /// How many.
        entries: usize,
        /// A parcel pair that has one.
        example: (String, String),
    },
    /// Fractions above 1.
    FractionsAboveOne {
        /// The species.
        species: String,
        /// How many.
        entries: usize,
    },
    /// Zeros among logarithms that are all negative otherwise.
    ZeroLogarithms {
        /// The species.
        species: String,
        /// How many.
        entries: usize,
    },
    /// The network falls apart.
    Components {
        /// The species.
        species: String,
        /// Number of components.
        components: usize,
        /// Parcels outside the largest.
        outside: Vec<String>,
    },
    /// Parcels that cannot be placed.
    SetAside {
        /// The species.
        species: String,
        /// Their labels.
        parcels: Vec<String>,
        /// Whether they were observed, so that they have no connection; else too little of them was.
        observed: bool,
    },
    /// Individuals that cannot be used.
    SubjectsSetAside {
        /// The species.
        species: String,
        /// Their names, and why.
        subjects: Vec<(String, String)>,
        /// Individuals that are left.
        kept: usize,
    },
    /// A group matrix that is not much like the mean of its individuals.
    MatrixIsNotMean {
        /// The species.
        species: String,
        /// Their correlation over all entries.
        correlation: f64,
    },
    /// Draws of individuals that could not be embedded.
    SubjectsNotEmbedded {
        /// How many.
        replicates: usize,
        /// Of how many.
        of: usize,
    },
    /// Landmark parcels that cannot be placed, so that nothing can be anchored to them.
    LandmarksReduced {
        /// The parcels, in words.
        parcels: Vec<String>,
        /// Landmarks that have no parcel left on one side.
        landmarks: Vec<String>,
    },
    /// A matrix from parcels to other areas, or to some of them.
    Rectangular {
        /// The species.
        species: String,
        /// Parcels.
        parcels: usize,
        /// What they are.
        parcels_are: RowsAre,
        /// Entries of each.
        entries: usize,
        /// Of these, how many are no parcels.
        elsewhere: usize,
        /// Whether the study file says so.
        stated: bool,
    },
    /// Injected areas on the side on which the tracer does not put them.
    TracerAgainstShape {
        /// The species.
        species: String,
        /// The tracer.
        tracer: Tracer,
        /// What injected areas are by it.
        injected: RowsAre,
    },
    /// Entries that were never observed.
    MissingEntries {
        /// The species.
        species: String,
        /// How many, off the diagonal.
        entries: usize,
        /// Of these, how many were taken from the other side of the diagonal.
        mirrored: usize,
        /// Lines without any observed entry.
        columns: usize,
    },
    /// Labels of a surface that the run does not know.
    SurfaceUnknown {
        /// The file.
        file: String,
        /// The labels, each with near spellings that the run knows.
        labels: Vec<(String, Vec<String>)>,
        /// Vertices that bear them.
        vertices: usize,
    },
    /// Keys of a surface without a label.
    SurfaceNameless {
        /// The file.
        file: String,
        /// The keys.
        keys: Vec<String>,
        /// Vertices that bear them.
        vertices: usize,
    },
    /// Parcels of a surface that the run has set aside.
    SurfaceSetAside {
        /// The file.
        file: String,
        /// Their labels.
        parcels: Vec<String>,
        /// Vertices that belong to them.
        vertices: usize,
    },
    /// A file with more arrays of labels than the one that is read.
    SurfaceMoreArrays {
        /// The file.
        file: String,
        /// Arrays of labels in it.
        arrays: usize,
    },
    /// Parcels of a run that no surface shows.
    SurfaceLacks {
        /// The species.
        species: String,
        /// Their labels.
        parcels: Vec<String>,
        /// Parcels of the species.
        of: usize,
    },
    /// A run whose page could not be made.
    NoPage(String),
    /// Two landmarks that are the two sides of one area but may be left out one at a time.
    SidesNotBlocked {
        /// One.
        first: String,
        /// The other.
        second: String,
    },
    /// Landmarks whose homology rests on connectivity, or on nothing said.
    Circular {
        /// Their names.
        landmarks: Vec<String>,
    },
    /// A column of the landmark table that means nothing here.
    ColumnIgnored {
        /// Its name.
        column: String,
    },
    /// A column of a table of parcels that means nothing here.
    AttributeIgnored {
        /// The species.
        species: String,
        /// Its name.
        column: String,
        /// A known column it may be a slip for.
        near: Option<String>,
    },
    /// Rows of a table of parcels that the matrix knows nothing of.
    ParcelsUnknown {
        /// The species.
        species: String,
        /// Their labels.
        parcels: Vec<String>,
    },
    /// Parcels of the matrix without a row in the table of parcels.
    ParcelsUndescribed {
        /// The species.
        species: String,
        /// Their labels.
        parcels: Vec<String>,
    },
    /// Distances that depend on the direction.
    DistancesAsymmetric {
        /// The species.
        species: String,
        /// Largest difference.
        largest: f64,
    },
    /// Distances in one half of the matrix only.
    DistancesOneHalf {
        /// The species.
        species: String,
    },
    /// Different parcels at the distance 0.
    DistancesZero {
        /// The species.
        species: String,
        /// Pairs of them.
        pairs: usize,
    },
    /// Sides are matched, but these parcels have none.
    SideUnknown {
        /// The species.
        species: String,
        /// The parcels.
        parcels: Vec<String>,
    },
    /// Open parcels without any candidate on their side.
    NoCandidate {
        /// The species.
        species: String,
        /// The parcels.
        parcels: Vec<String>,
    },
    /// Brains are folded, but these parcels of one side have no copy on the other.
    NoCopy {
        /// The species.
        species: String,
        /// The parcels.
        parcels: Vec<String>,
    },
    /// Landmarks that became the same pair of parcels when brains were folded.
    LandmarksMerged {
        /// The landmark that stays and the one that went into it.
        pairs: Vec<(String, String)>,
    },
    /// A landmark that the others contradict.
    Contradicted {
        /// Its name.
        landmark: String,
        /// Rank of its counterpart seen from a, and among how many.
        from_a: (usize, usize),
        /// The same seen from b.
        from_b: (usize, usize),
    },
    /// Fewer blocks of landmarks than span the axes once one is left out.
    LeftOutUnderdetermined {
        /// Axes.
        axes: usize,
        /// Blocks of landmarks.
        blocks: usize,
    },
    /// The landmarks lie in fewer dimensions than there are axes.
    LandmarksDoNotSpan {
        /// The alignment.
        alignment: &'static str,
        /// Axes of the joint space.
        axes: usize,
        /// Dimensions the landmarks fix.
        fixed: usize,
    },
    /// Resamplings with fewer distinct landmark blocks than the ranking alignment's axes + 1.
    DegenerateReplicates {
        /// How many.
        replicates: usize,
        /// Of how many.
        of: usize,
    },
    /// A kind of evidence takes no part.
    EvidenceUnavailable {
        /// The kind.
        kind: String,
        /// The reason.
        why: String,
    },
    /// The embedding yields fewer axes than could be tried.
    FewAxes {
        /// The species.
        species: String,
        /// Axes it yields.
        axes: usize,
    },
}

impl fmt::Display for Warning {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Warning::ColumnsReordered { species } => write!(
                f,
                "{species}: columns came in another order than rows and were put in the rows' order"
            ),
            Warning::DiagonalNotEmpty { species, entries } => write!(
                f,
                "{species}: on the diagonal {} not zero; a parcel's link with itself is not used",
                counted(*entries, "entry", "entries")
            ),
            Warning::AsymmetricCorrelations { species, largest } => write!(
                f,
                "{species}: the correlations are not symmetric (largest difference {largest:.3}); the mean of both halves is used"
            ),
            Warning::CorrelationsBeyondOne {
                species,
                entries,
                example,
            } => write!(
                f,
                "{species}: off the diagonal {} 1 or beyond, such as {} with {}; Fisher's z cuts at {}",
                counted(*entries, "correlation", "correlations"),
                example.0,
                example.1,
                crate::transform::LARGEST_CORRELATION
            ),
            Warning::FractionsAboveOne { species, entries } => write!(
                f,
                "{species}: {} above 1; are these counts?",
                counted(*entries, "fraction", "fractions")
            ),
            Warning::ZeroLogarithms { species, entries } => write!(
                f,
                "{species}: {} exactly 0 (a weight of 1) while all others are negative; if 0 stands for no connection, give the weights themselves",
                counted(*entries, "logarithm", "logarithms")
            ),
            Warning::Components {
                species,
                components,
                outside,
            } => write!(
                f,
                "{species}: the network falls into {components} parts; outside the largest: {}",
                listed(outside)
            ),
            Warning::SetAside {
                species,
                parcels,
                observed,
            } => write!(
                f,
                "{species}: set aside, {}: {}",
                if *observed {
                    "no connection at all"
                } else {
                    "too little observed to compare them with others"
                },
                listed(parcels)
            ),
            Warning::SubjectsSetAside {
                species,
                subjects,
                kept,
            } => {
                let named: Vec<String> = subjects
                    .iter()
                    .map(|(name, why)| format!("{name} ({why})"))
                    .collect();
                write!(
                    f,
                    "{species}: subjects set aside: {}; {kept} are left",
                    listed(&named)
                )
            }
            Warning::MatrixIsNotMean {
                species,
                correlation,
            } => write!(
                f,
                "{species}: the matrix correlates with the mean of the subjects by only {correlation:.2}; replicates average subjects, so intervals may not surround what the matrix shows: check that both were processed alike, or leave out the matrix"
            ),
            Warning::SubjectsNotEmbedded { replicates, of } => write!(
                f,
                "{replicates} of {of} draws of subjects could not be used: too few landmarks kept their connections, or the affinity fell apart{}",
                if replicates == of {
                    "; support and intervals speak of landmarks alone"
                } else {
                    ""
                }
            ),
            Warning::LandmarksReduced { parcels, landmarks } => {
                write!(
                    f,
                    "nothing can be anchored to landmark parcels that were set aside: {}",
                    listed(parcels)
                )?;
                if !landmarks.is_empty() {
                    write!(f, "; landmarks not used: {}", listed(landmarks))?;
                }
                Ok(())
            }
            Warning::Rectangular {
                species,
                parcels,
                parcels_are,
                entries,
                elsewhere,
                stated,
            } => {
                let others = match elsewhere {
                    0 => "all of them parcels too".to_owned(),
                    n => format!("{n} of them no parcels"),
                };
                write!(
                    f,
                    "{species}: read as rectangular, {parcels} parcels as {parcels_are} by {entries} {} ({others}); links that the table does not hold are unknown, not absent",
                    parcels_are.opposite()
                )?;
                if !stated {
                    write!(
                        f,
                        ". If it should be square, a row or a column got lost; if not, add rows = \"sources\" or rows = \"targets\" to the study file"
                    )?;
                }
                Ok(())
            }
            Warning::TracerAgainstShape {
                species,
                tracer,
                injected,
            } => write!(
                f,
                "{species}: by a tracer that is {tracer} the injected areas are {injected}, but here {injected} are the longer side; check rows and tracer"
            ),
            Warning::MissingEntries {
                species,
                entries,
                mirrored,
                columns,
            } => {
                write!(
                    f,
                    "{species}: {} missing, which is not zero; parcels are compared where both were observed",
                    counted(*entries, "entry", "entries")
                )?;
                if *mirrored > 0 {
                    write!(
                        f,
                        "; {mirrored} were taken from the other side of the diagonal, since links have no direction"
                    )?;
                }
                if *columns > 0 {
                    write!(
                        f,
                        "; {columns} lines without any entry are taken for areas that were not injected"
                    )?;
                }
                Ok(())
            }
            Warning::SidesNotBlocked { first, second } => write!(
                f,
                "landmarks {first} and {second} look like the two sides of one area; give both the same block, or left-out figures will flatter"
            ),
            Warning::Circular { landmarks } => write!(
                f,
                "homology of {} rests on connectivity or on nothing said; agreement in connectivity is then partly put in by hand",
                listed(landmarks)
            ),
            Warning::ColumnIgnored { column } => {
                write!(f, "landmark table: column {column:?} is not used")
            }
            Warning::AttributeIgnored {
                species,
                column,
                near,
            } => {
                write!(f, "{species}, table of parcels: column {column:?} is not used")?;
                match near {
                    Some(near) => write!(f, "; did you mean {near:?}?"),
                    None => Ok(()),
                }
            }
            Warning::ParcelsUnknown { species, parcels } => write!(
                f,
                "{species}, table of parcels: not in the matrix and not used: {}",
                listed(parcels)
            ),
            Warning::ParcelsUndescribed { species, parcels } => write!(
                f,
                "{species}, table of parcels: no row for {}; their attributes stay empty",
                listed(parcels)
            ),
            Warning::DistancesAsymmetric { species, largest } => write!(
                f,
                "{species}: the distances are not symmetric (largest difference {largest:.3}); the mean of both halves is used"
            ),
            Warning::DistancesOneHalf { species } => write!(
                f,
                "{species}: only one half of the matrix of distances is filled; it is used for both directions"
            ),
            Warning::DistancesZero { species, pairs } => write!(
                f,
                "{species}: {} of different parcels at the distance 0; in a list of connections a pair that is absent has it, so check that all are there",
                if *pairs == 1 { "1 pair".to_owned() } else { format!("{pairs} pairs") }
            ),
            Warning::SideUnknown { species, parcels } => write!(
                f,
                "{species}: no hemisphere is known of {}; their counterparts are sought on both sides",
                listed(parcels)
            ),
            Warning::NoCandidate { species, parcels } => write!(
                f,
                "{species}: no open parcel of the other species lies on the side of {}; they get no counterpart. Where one map has one hemisphere only, hemispheres = \"fold\" may be what you want",
                listed(parcels)
            ),
            Warning::NoCopy { species, parcels } => write!(
                f,
                "{species}: no copy on the other side was found for {}; they are kept as they are",
                listed(parcels)
            ),
            Warning::LandmarksMerged { pairs } => write!(
                f,
                "landmarks that are one when the brains are folded; the first of each counts: {}",
                listed(&pairs.iter().map(|(first, second)| format!("{first} and {second}")).collect::<Vec<_>>())
            ),
            Warning::Contradicted {
                landmark,
                from_a,
                from_b,
            } => write!(
                f,
                "landmark {landmark} is contradicted by the others: left out, its counterpart ranks {} of {} and {} of {} in the joint space; check it, or run again without it",
                from_a.0, from_a.1, from_b.0, from_b.1
            ),
            Warning::SurfaceUnknown {
                file,
                labels,
                vertices,
            } => {
                let named: Vec<String> = labels
                    .iter()
                    .map(|(label, near)| match near.first() {
                        Some(near) => format!("{label:?} (near {near:?})"),
                        None => format!("{label:?}"),
                    })
                    .collect();
                write!(
                    f,
                    "{file}: {} no parcel of the run, so {} without a value: {}; if these are parcels, give them the labels of the matrix",
                    counted(labels.len(), "label", "labels"),
                    counted(*vertices, "vertex", "vertices"),
                    listed(&named)
                )
            }
            Warning::SurfaceNameless {
                file,
                keys,
                vertices,
            } => write!(
                f,
                "{file}: {} without a label in the table, so {} without a value: {}",
                counted(keys.len(), "key", "keys"),
                counted(*vertices, "vertex", "vertices"),
                listed(keys)
            ),
            Warning::SurfaceSetAside {
                file,
                parcels,
                vertices,
            } => write!(
                f,
                "{file}: {} set aside in the run for want of connections, so {} without a value: {}",
                counted(parcels.len(), "parcel", "parcels"),
                counted(*vertices, "vertex", "vertices"),
                listed(parcels)
            ),
            Warning::SurfaceMoreArrays { file, arrays } => write!(
                f,
                "{file}: it holds {arrays} arrays of labels, of which the first is painted; save the one you mean in a file of its own"
            ),
            Warning::SurfaceLacks {
                species,
                parcels,
                of,
            } => write!(
                f,
                "{species}: {} of {of} parcels of the run lie on no vertex of the label files: {}; give the files of both hemispheres in one command, or compare the labels",
                parcels.len(),
                listed(parcels)
            ),
            Warning::NoPage(why) => write!(
                f,
                "the run is complete but has no page: {why}"
            ),
            Warning::LeftOutUnderdetermined { axes, blocks } => write!(
                f,
                "with one of {blocks} landmark blocks left out the rest do not fix {axes} axes; left-out figures are poorer than they need be, so add landmarks or ask for fewer axes"
            ),
            Warning::LandmarksDoNotSpan {
                alignment,
                axes,
                fixed,
            } => write!(
                f,
                "the landmarks fix only {fixed} of {axes} axes of the {alignment} alignment; along the others positions are arbitrary"
            ),
            Warning::DegenerateReplicates { replicates, of } => write!(
                f,
                "{replicates} of {of} replicates drew fewer distinct landmark blocks than axes + 1; use --resampling bayesian"
            ),
            Warning::EvidenceUnavailable { kind, why } => write!(
                f,
                "evidence {kind} takes no part: {why}; the other kinds rank without it"
            ),
            Warning::FewAxes { species, axes } => write!(
                f,
                "{species}: the embedding yields only {axes} {}, fewer than the landmarks could fix",
                if *axes == 1 { "axis" } else { "axes" }
            ),
        }
    }
}

impl Serialize for Warning {
    fn serialize<S: Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
        to.collect_str(self)
    }
}

/// A number of things, and the verb that goes with it.
fn counted(n: usize, one: &str, several: &str) -> String {
    match n {
        1 => format!("1 {one} is"),
        _ => format!("{n} {several} are"),
    }
}

/// The first few names, and how many more there are.
fn listed(names: &[String]) -> String {
    let shown = names
        .iter()
        .take(NAMED)
        .cloned()
        .collect::<Vec<_>>()
        .join(", ");
    match names.len().saturating_sub(NAMED) {
        0 => shown,
        more => format!("{shown} and {more} more"),
    }
}
