//! What is known of the parcels besides their connections: sides, groups, places, distances.

use serde::Serialize;

use crate::domain::{Attributes, DistanceSource, Extent, Hemisphere, Side};
use crate::input::without_side;
use crate::linalg::spearman;
use crate::prepare::Study;
use crate::species::Species;

/// How many parcels have which attribute.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct AttributeFacts {
    /// Parcels on the left.
    pub left: usize,
    /// Parcels on the right.
    pub right: usize,
    /// Parcels of the midline or of both sides.
    pub midline: usize,
    /// Parcels of which no side is known.
    pub side_unknown: usize,
    /// Parcels whose labels come in pairs that differ by the side alone.
    pub labelled_by_side: usize,
    /// Parcels made of a left and a right copy.
    pub folded: usize,
    /// Each group and how many parcels it has, largest first, equals by name.
    pub groups: Vec<(String, usize)>,
    /// Parcels with coordinates.
    pub coordinates: usize,
    /// Parcels with an area.
    pub areas: usize,
    /// Parcels with a volume.
    pub volumes: usize,
    /// Parcels with a long name.
    pub long_names: usize,
}

impl AttributeFacts {
    /// Counts the attributes of a species.
    #[must_use]
    pub fn of(species: &Species) -> AttributeFacts {
        let all = &species.attributes;
        let count = |has: &dyn Fn(&Attributes) -> bool| all.iter().filter(|a| has(a)).count();
        let on = |side| count(&|a| a.hemisphere == Some(side));
        let mut groups: Vec<(String, usize)> = Vec::new();
        for group in all.iter().filter_map(|a| a.group.as_ref()) {
            match groups.iter_mut().find(|(known, _)| known == group) {
                Some((_, parcels)) => *parcels += 1,
                None => groups.push((group.clone(), 1)),
            }
        }
        groups.sort_by(|x, y| y.1.cmp(&x.1).then(x.0.cmp(&y.0)));
        AttributeFacts {
            left: on(Hemisphere::Left),
            right: on(Hemisphere::Right),
            midline: on(Hemisphere::Midline),
            side_unknown: count(&|a| a.hemisphere.is_none()),
            labelled_by_side: labelled_by_side(species.parcels.labels()),
            folded: species.parcels.folded(),
            groups,
            coordinates: count(&|a| a.coordinates.is_some()),
            areas: count(&|a| a.extent.and_then(Extent::area).is_some()),
            volumes: count(&|a| a.extent.and_then(Extent::volume).is_some()),
            long_names: count(&|a| a.long_name.is_some()),
        }
    }

    /// How many hemispheres the map seems to have: by what is said of the parcels, else by their
    /// labels. `None` where neither tells.
    #[must_use]
    pub fn hemispheres(&self) -> Option<usize> {
        let parcels = self.left + self.right + self.midline + self.side_unknown;
        match (self.left > 0, self.right > 0) {
            (true, true) => Some(2),
            (false, false) if 2 * self.labelled_by_side >= parcels => Some(2),
            (false, false) => None,
            _ => Some(1),
        }
    }
}

/// How many labels have a partner that is alike but for the side.
fn labelled_by_side(labels: &[String]) -> usize {
    let readings: Vec<_> = labels.iter().map(|label| without_side(label)).collect();
    let mut known = std::collections::HashSet::new();
    for (mark, side, rest) in readings.iter().flatten() {
        known.insert((*mark, *side, rest.to_lowercase()));
    }
    let has_partner = |(mark, side, rest): &(_, Hemisphere, String)| {
        let other = match side {
            Hemisphere::Left => Hemisphere::Right,
            _ => Hemisphere::Left,
        };
        known.contains(&(*mark, other, rest.to_lowercase()))
    };
    readings
        .iter()
        .filter(|r| r.iter().any(has_partner))
        .count()
}

/// Distances between parcels, and what becomes of connections over them.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct DistanceFacts {
    /// Where they come from.
    pub from: DistanceSource,
    /// Pairs of parcels with a distance.
    pub pairs: usize,
    /// Smallest distance of two parcels.
    pub smallest: f64,
    /// Largest distance.
    pub largest: f64,
    /// Entries of the matrix that are a connection and have a distance.
    pub connections: usize,
    /// Spearman's rank correlation of strength and distance over these connections.
    pub strength_with_distance: Option<f64>,
    /// The same over all entries with a distance, absent connections counting as the weakest.
    pub strength_with_distance_all: Option<f64>,
}

impl DistanceFacts {
    /// Looks at a species; `None` where no distance is known.
    #[must_use]
    pub fn of(study: &Study, side: Side) -> Option<DistanceFacts> {
        let species = &study.species[side];
        let from = species.geometry.source()?;
        let n = species.parcels.len();
        let between: Vec<f64> = (0..n)
            .flat_map(|i| (0..i).map(move |j| (i, j)))
            .filter_map(|(i, j)| species.geometry.distance(i, j))
            .collect();
        let (mut strengths, mut distances) = (Vec::new(), Vec::new());
        let network = &species.network;
        let places = |labels: &[String]| -> Vec<Option<usize>> {
            labels.iter().map(|l| species.parcels.find(l)).collect()
        };
        let (sources, targets) = (
            places(network.row_labels()),
            places(network.column_labels()),
        );
        for ((i, j), &strength) in network.weights().indexed_iter() {
            if network.is_self(i, j) || network.is_missing(i, j) {
                continue;
            }
            let (Some(from), Some(to)) = (sources[i], targets[j]) else {
                continue;
            };
            if let Some(distance) = species.geometry.distance(from, to) {
                strengths.push(strength);
                distances.push(distance);
            }
        }
        let linked: Vec<usize> = (0..strengths.len())
            .filter(|&k| strengths[k] != 0.0)
            .collect();
        let pick = |values: &[f64]| -> Vec<f64> { linked.iter().map(|&k| values[k]).collect() };
        Some(DistanceFacts {
            from,
            pairs: between.len(),
            smallest: between.iter().copied().reduce(f64::min)?,
            largest: between.iter().copied().reduce(f64::max)?,
            connections: linked.len(),
            strength_with_distance: spearman(&pick(&strengths), &pick(&distances)),
            strength_with_distance_all: spearman(&strengths, &distances),
        })
    }
}
