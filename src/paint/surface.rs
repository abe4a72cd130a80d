//! Vertices and the parcels of a run they belong to.

use std::collections::BTreeSet;

use super::maps::ParcelMap;
use crate::finished::Species;
use crate::input::{nearest_few, SurfaceLabels};
use crate::report::SurfaceMap;
use crate::warning::Warning;

/// The parcel of each vertex of a surface.
#[derive(Debug)]
pub struct Surface {
    vertices: Vec<Option<usize>>,
    parcels: BTreeSet<usize>,
}

impl Surface {
    /// Matches the labels of a surface with the parcels of a run, letter by letter.
    pub fn of(labels: &SurfaceLabels, species: &Species, warnings: &mut Vec<Warning>) -> Surface {
        let parcel: Vec<Option<usize>> = labels
            .names
            .iter()
            .map(|name| species.at.get(name).copied())
            .collect();
        let mut borne = vec![0_usize; labels.names.len()];
        for name in labels.vertices.iter().flatten() {
            borne[*name] += 1;
        }
        let vertices: Vec<Option<usize>> = labels
            .vertices
            .iter()
            .map(|name| name.and_then(|name| parcel[name]))
            .collect();

        let file = labels.file.path.display().to_string();
        if labels.arrays > 1 {
            warnings.push(Warning::SurfaceMoreArrays {
                file: file.clone(),
                arrays: labels.arrays,
            });
        }
        // A table may name both hemispheres; only what is on this one counts.
        let strangers = || (0..parcel.len()).filter(|&i| parcel[i].is_none() && borne[i] > 0);
        let is_aside = |i: &usize| species.set_aside.contains(&labels.names[*i]);
        let (aside, unknown): (Vec<usize>, Vec<usize>) = strangers().partition(is_aside);
        if !aside.is_empty() {
            warnings.push(Warning::SurfaceSetAside {
                file: file.clone(),
                parcels: aside.iter().map(|&i| labels.names[i].clone()).collect(),
                vertices: aside.iter().map(|&i| borne[i]).sum(),
            });
        }
        if !unknown.is_empty() {
            let near = |name: &str| {
                let near = nearest_few(name, species.parcels.iter().map(String::as_str));
                near.into_iter().map(str::to_owned).collect()
            };
            warnings.push(Warning::SurfaceUnknown {
                file: file.clone(),
                labels: unknown
                    .iter()
                    .map(|&i| (labels.names[i].clone(), near(&labels.names[i])))
                    .collect(),
                vertices: unknown.iter().map(|&i| borne[i]).sum(),
            });
        }
        if !labels.nameless.is_empty() {
            warnings.push(Warning::SurfaceNameless {
                file,
                keys: labels.nameless.keys().map(i64::to_string).collect(),
                vertices: labels.nameless.values().sum(),
            });
        }
        Surface {
            parcels: vertices.iter().flatten().copied().collect(),
            vertices,
        }
    }

    /// The parcels on it, in order.
    pub fn parcels(&self) -> impl Iterator<Item = usize> + '_ {
        self.parcels.iter().copied()
    }

    /// How many vertices belong to a parcel of the run.
    pub fn vertices_in_parcels(&self) -> usize {
        self.vertices.iter().flatten().count()
    }

    /// The number of its parcel for each vertex, rounded to single precision; NaN where there is none.
    #[allow(clippy::cast_possible_truncation)] // GIFTI knows no double precision.
    pub fn paint(&self, map: &ParcelMap) -> SurfaceMap {
        SurfaceMap {
            name: map.name.clone(),
            meaning: map.meaning.clone(),
            values: self
                .vertices
                .iter()
                .map(|parcel| parcel.map_or(f32::NAN, |at| map.values[at] as f32))
                .collect(),
        }
    }
}
