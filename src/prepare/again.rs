//! A species with its individuals drawn again: averaged, transformed and embedded as the full sample
//! was, and brought to its axes.

use std::borrow::Cow;

use ndarray::Axis;

use super::arrange::standing;
use super::embedding::embed_strengths;
use super::Study;
use crate::bootstrap::{Purpose, Stream};
use crate::domain::{Pair, Side, Standing};
use crate::embed::{matched, Embedding};
use crate::species::Species;
use crate::transform;

/// Axes of a replicate are sought among this many times those of the full sample: parcels that lose
/// their links in a draw make axes of their own, which are none of the full sample's.
const AXES_SOUGHT: usize = 2;

/// Both species after a draw.
#[derive(Debug, Clone)]
pub struct Again<'s> {
    /// The species; one without individuals is that of the full sample.
    pub species: Pair<Cow<'s, Species>>,
    /// For each parcel whether it had any connection in this draw. One that had none stands at the
    /// centre.
    pub connected: Pair<Vec<bool>>,
}

/// Draws the individuals of every species that has any, for a replicate; `None` where what is drawn
/// cannot be embedded.
#[must_use]
pub fn drawn_again(study: &Study, replicate: usize) -> Option<Again<'_>> {
    let a = one(study, Side::A, replicate)?;
    let b = one(study, Side::B, replicate)?;
    Some(Again {
        species: Pair { a: a.0, b: b.0 },
        connected: Pair { a: a.1, b: b.1 },
    })
}

fn one(study: &Study, side: Side, replicate: usize) -> Option<(Cow<'_, Species>, Vec<bool>)> {
    let full = &study.species[side];
    let n = full.parcels.len();
    let Some(cohort) = &study.cohorts[side] else {
        return Some((Cow::Borrowed(full), vec![true; n]));
    };
    let treatment = &study.treatment[side];
    let index = 2 * replicate as u64 + u64::from(side == Side::B);
    let mut chance = Stream::new(study.settings.seed, Purpose::Subjects, index);
    let drawn = cohort.weighted_mean(&cohort.draw(&mut chance));
    let connected: Vec<bool> = standing(&drawn, treatment.weights, drawn.has_missing())
        .into_iter()
        .map(|standing| standing == Standing::Placed)
        .collect();
    let network = transform::apply(drawn, treatment.weights, treatment.transform);

    let rows: Vec<usize> = (0..n).filter(|&i| connected[i]).collect();
    let columns: Vec<usize> = (0..network.column_labels().len())
        .filter(|&j| network.row_of_column(j).is_none_or(|i| connected[i]))
        .collect();
    let axes = full.embedding.axes();
    let recipe = study.embedded.recipe;
    let found = if rows.len() == n {
        embed_strengths(
            &network,
            treatment,
            &study.settings,
            recipe,
            AXES_SOUGHT * axes,
        )
    } else {
        let part = network.select(&rows, &columns);
        embed_strengths(
            &part,
            treatment,
            &study.settings,
            recipe,
            AXES_SOUGHT * axes,
        )
    }
    .ok()?;
    let there = Embedding {
        coordinates: full.embedding.coordinates.select(Axis(0), &rows),
        ..full.embedding.clone()
    };
    let placed = matched(&there, &found);
    let mut coordinates = full.embedding.coordinates.clone();
    coordinates.fill(0.0);
    for (&row, position) in rows.iter().zip(placed.rows()) {
        coordinates.row_mut(row).assign(&position);
    }
    let species = Species {
        network,
        embedding: Embedding {
            coordinates,
            ..full.embedding.clone()
        },
        // There is nothing left to choose: the draw was brought to the axes of the embedding chosen.
        tried: Vec::new(),
        ..full.clone()
    };
    Some((Cow::Owned(species), connected))
}
