//! Candidates on the same side of the brain, and whether the landmarks agree.

use crate::domain::{Attributes, Landmarks, Pair, Parcels, Side};
use crate::input::ParcelFault;
use crate::place::{open_parcels, Candidates};
use crate::warning::Warning;

/// The candidates where sides are matched.
///
/// # Errors
/// [`ParcelFault`] where nothing is known of the sides of a species, or a landmark has no two parcels
/// of one side.
pub fn matched(
    parcels: Pair<&Parcels>,
    attributes: Pair<&[Attributes]>,
    landmarks: &Landmarks,
    warnings: &mut Vec<Warning>,
) -> Result<Candidates, ParcelFault> {
    let hemispheres = attributes.map(|of| of.iter().map(|a| a.hemisphere).collect::<Vec<_>>());
    for side in Side::BOTH {
        let labels = parcels[side].labels();
        let unknown: Vec<String> = (0..labels.len())
            .filter(|&i| hemispheres[side][i].is_none())
            .map(|i| labels[i].clone())
            .collect();
        if unknown.len() == labels.len() {
            return Err(ParcelFault::NoHemispheres { side });
        }
        if !unknown.is_empty() {
            warnings.push(Warning::SideUnknown {
                species: parcels[side].species().to_owned(),
                parcels: unknown,
            });
        }
    }
    let candidates = Candidates::same_side(hemispheres);
    for landmark in landmarks.list() {
        let Pair { a, b } = &landmark.parcels;
        let meet = |a: usize| b.iter().any(|&b| candidates.admit(Side::A, a, b));
        if !a.iter().any(|&a| meet(a)) {
            return Err(ParcelFault::LandmarkAcross {
                landmark: landmark.name.clone(),
            });
        }
    }
    let open = open_parcels(landmarks, parcels.map(Parcels::len));
    for side in Side::BOTH {
        let others = &open[side.opposite()];
        let alone: Vec<String> = open[side]
            .iter()
            .filter(|&&i| !others.iter().any(|&j| candidates.admit(side, i, j)))
            .map(|&i| parcels[side].labels()[i].clone())
            .collect();
        if !alone.is_empty() {
            warnings.push(Warning::NoCandidate {
                species: parcels[side].species().to_owned(),
                parcels: alone,
            });
        }
    }
    Ok(candidates)
}
