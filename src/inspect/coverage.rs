//! What of a species' connectivity the landmarks speak for.

use ndarray::Array2;
use serde::Serialize;

use super::systems::systems;
use crate::domain::Side;
use crate::prepare::Study;

/// Parcels listed as furthest from the landmarks.
const LISTED: usize = 6;

/// A community of parcels that connect alike.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct System {
    /// Its parcels; those most alike to the others of the system come first.
    pub parcels: Vec<String>,
    /// Landmarks with a parcel in it.
    pub landmarks: Vec<String>,
}

/// A parcel that is no landmark, and the landmark parcel it is most alike.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Far {
    /// The parcel.
    pub parcel: String,
    /// Its largest affinity to a parcel of a landmark.
    pub affinity: f64,
    /// That landmark.
    pub landmark: String,
    /// Its largest affinity to any other parcel, for comparison.
    pub to_any: f64,
}

/// A parcel further out than every landmark.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Beyond {
    /// The parcel.
    pub parcel: String,
    /// Its distance as a multiple of the furthest landmark's.
    pub distance: f64,
}

/// How the landmarks lie among the parcels of one species.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Coverage {
    /// Communities of parcels, largest first.
    pub systems: Vec<System>,
    /// Middle value over open parcels of the largest affinity to a landmark parcel.
    pub median_affinity: Option<f64>,
    /// The open parcels least alike any landmark parcel, least first.
    pub least_covered: Vec<Far>,
    /// Open parcels without any affinity to a landmark parcel, in order of their labels.
    pub unlike_any: Vec<String>,
    /// Parcels beyond every landmark, furthest first.
    pub beyond_landmarks: Vec<Beyond>,
}

impl Coverage {
    /// Looks at one species; `beyond` holds for each parcel its distance as a multiple of the
    /// furthest landmark's.
    #[must_use]
    pub fn of(study: &Study, side: Side, affinity: &Array2<f64>, beyond: &[f64]) -> Coverage {
        let labels = study.species[side].parcels.labels();
        let owners = study.landmarks.owners(side, labels.len());
        let list = study.landmarks.list();

        let mut far: Vec<Far> = (0..labels.len())
            .filter(|&i| owners[i].is_none())
            .filter_map(|i| {
                let likest = |among: &dyn Fn(usize) -> bool| {
                    (0..labels.len())
                        .filter(|&j| j != i && among(j))
                        .max_by(|&j, &k| affinity[(i, j)].total_cmp(&affinity[(i, k)]))
                };
                let nearest = likest(&|j| owners[j].is_some())?;
                Some(Far {
                    parcel: labels[i].clone(),
                    affinity: affinity[(i, nearest)],
                    landmark: list[owners[nearest]?].name.clone(),
                    to_any: affinity[(i, likest(&|_| true)?)],
                })
            })
            .collect();
        far.sort_by(|x, y| x.affinity.total_cmp(&y.affinity));
        let median_affinity = far.get(far.len() / 2).map(|middle| middle.affinity);
        let unlike_any = far
            .iter()
            .take_while(|far| far.affinity == 0.0)
            .map(|far| far.parcel.clone())
            .collect();
        far.truncate(LISTED);

        let mut outer: Vec<Beyond> = (0..labels.len())
            .filter(|&i| beyond[i] > 1.0 && owners[i].is_none())
            .map(|i| Beyond {
                parcel: labels[i].clone(),
                distance: beyond[i],
            })
            .collect();
        outer.sort_by(|x, y| y.distance.total_cmp(&x.distance));

        let systems = systems(affinity)
            .into_iter()
            .map(|mut members| {
                let mut marks: Vec<usize> = members.iter().filter_map(|&i| owners[i]).collect();
                marks.sort_unstable();
                marks.dedup();
                let within: Vec<f64> = (0..labels.len())
                    .map(|i| members.iter().map(|&j| affinity[(i, j)]).sum())
                    .collect();
                members.sort_by(|&i, &j| within[j].total_cmp(&within[i]));
                System {
                    parcels: members.into_iter().map(|i| labels[i].clone()).collect(),
                    landmarks: marks.into_iter().map(|l| list[l].name.clone()).collect(),
                }
            })
            .collect();
        Coverage {
            systems,
            median_affinity,
            least_covered: far,
            unlike_any,
            beyond_landmarks: outer,
        }
    }

    /// Communities of more than one parcel without any landmark.
    pub fn uncovered(&self) -> impl Iterator<Item = &System> {
        self.systems
            .iter()
            .filter(|system| system.landmarks.is_empty() && system.parcels.len() > 1)
    }
}
