//! Where the parcels of a species lie, and how far apart.

use ndarray::Array2;

/// What distances between parcels were taken from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, serde::Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum DistanceSource {
    /// A file of distances.
    File,
    /// Straight lines between coordinates.
    Coordinates,
}

/// Coordinates and distances of one species' parcels, in the order of its parcels.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Geometry {
    coordinates: Vec<Option<[f64; 3]>>,
    /// Taken from a file or worked out; without them coordinates tell.
    distances: Option<Array2<f64>>,
    source: Option<DistanceSource>,
}

impl Geometry {
    /// Takes one entry for each parcel, and distances `(parcels, parcels)` where a file gave them:
    /// symmetric, 0 or more, NaN where unknown.
    ///
    /// # Panics
    /// If the sizes disagree: a fault of the caller, not of the input.
    #[must_use]
    pub fn new(coordinates: Vec<Option<[f64; 3]>>, distances: Option<Array2<f64>>) -> Geometry {
        if let Some(distances) = &distances {
            assert_eq!(distances.dim(), (coordinates.len(), coordinates.len()));
        }
        let source = if distances.is_some() {
            Some(DistanceSource::File)
        } else if coordinates.iter().flatten().count() > 1 {
            Some(DistanceSource::Coordinates)
        } else {
            None
        };
        Geometry {
            coordinates,
            distances,
            source,
        }
    }

    /// The same space with other parcels: their coordinates, and their distances as worked out from
    /// these.
    #[must_use]
    pub fn regrouped(
        &self,
        coordinates: Vec<Option<[f64; 3]>>,
        distance: impl Fn(usize, usize) -> Option<f64>,
    ) -> Geometry {
        let n = coordinates.len();
        Geometry {
            coordinates,
            distances: self.source.map(|_| {
                Array2::from_shape_fn((n, n), |(i, j)| {
                    if i == j {
                        0.0
                    } else {
                        distance(i, j).unwrap_or(f64::NAN)
                    }
                })
            }),
            source: self.source,
        }
    }

    /// The same for some parcels, in the order given.
    #[must_use]
    pub fn select(&self, parcels: &[usize]) -> Geometry {
        Geometry {
            coordinates: parcels.iter().map(|&i| self.coordinates[i]).collect(),
            distances: self.distances.as_ref().map(|distances| {
                Array2::from_shape_fn((parcels.len(), parcels.len()), |(i, j)| {
                    distances[(parcels[i], parcels[j])]
                })
            }),
            source: self.source,
        }
    }

    /// Coordinates of each parcel, where known.
    #[must_use]
    pub fn coordinates(&self) -> &[Option<[f64; 3]>] {
        &self.coordinates
    }

    /// Distance between two parcels: what the file of distances says; without such a file the
    /// Euclidean distance of their coordinates; `None` where neither is known. Straight lines never
    /// fill gaps of a file, since the two do not compare.
    #[must_use]
    pub fn distance(&self, i: usize, j: usize) -> Option<f64> {
        if i == j {
            return Some(0.0);
        }
        if let Some(distances) = &self.distances {
            return Some(distances[(i, j)]).filter(|d| !d.is_nan());
        }
        let (from, to) = (self.coordinates[i]?, self.coordinates[j]?);
        let squares = from.iter().zip(to).map(|(x, y)| (x - y) * (x - y));
        Some(squares.sum::<f64>().sqrt())
    }

    /// Where distances come from; `None` where no two parcels have one.
    #[must_use]
    pub fn source(&self) -> Option<DistanceSource> {
        self.source
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn a_file_of_distances_comes_before_straight_lines() {
        let places = vec![Some([0.0, 0.0, 0.0]), Some([3.0, 4.0, 0.0]), None];
        let straight = Geometry::new(places.clone(), None);
        assert_eq!(straight.distance(0, 1), Some(5.0));
        assert_eq!(straight.distance(0, 2), None);
        assert_eq!(straight.source(), Some(DistanceSource::Coordinates));
        let nan = f64::NAN;
        let file = array![[0.0, 7.0, nan], [7.0, 0.0, 2.0], [nan, 2.0, 0.0]];
        let along = Geometry::new(places, Some(file));
        assert_eq!(along.distance(1, 0), Some(7.0));
        assert_eq!(along.distance(0, 2), None);
        assert_eq!(along.source(), Some(DistanceSource::File));
        assert_eq!(Geometry::new(vec![None, None], None).source(), None);
    }
}
