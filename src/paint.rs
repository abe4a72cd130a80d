//! A finished run back onto the brain: from its tables and the label files of a species' surfaces to
//! maps over their vertices.

mod account;
mod fault;
mod maps;
mod request;
mod surface;

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

pub use fault::{OtherParcellation, PaintError};
pub use request::PaintRequest;

use crate::domain::Side;
use crate::finished::Run;
use crate::input::{nearest_few, read_surface_labels};
use crate::report::{self, CAUTION};
use crate::warning::Warning;
use maps::Maps;
use surface::Surface;

/// What was painted.
#[derive(Debug)]
pub struct Painted {
    /// The species whose surfaces these are.
    pub species: String,
    /// The other one.
    pub other: String,
    /// Whose axes were painted, where the run has any.
    pub alignment: Option<String>,
    /// What gave the distances, as the run names it.
    pub distances_from: String,
    /// Parcels of the species that take part in the run.
    pub parcels: usize,
    /// The surfaces, one for each label file.
    pub surfaces: Vec<PaintedSurface>,
    /// What is legal but suspicious.
    pub warnings: Vec<Warning>,
}

/// The maps of one label file.
#[derive(Debug)]
pub struct PaintedSurface {
    /// The label file.
    pub labels: PathBuf,
    /// The part of the brain, where the file says it.
    pub structure: Option<String>,
    /// Vertices.
    pub vertices: usize,
    /// Those that belong to a parcel of the run.
    pub in_parcels: usize,
    /// Parcels of the run on it.
    pub parcels: usize,
    /// Files of maps and the names of the maps in each.
    pub files: Vec<(PathBuf, Vec<String>)>,
}

/// Paints a finished run. Nothing is written unless everything can be.
///
/// # Errors
/// [`PaintError`] for a folder without a finished run, for labels and parcels that it does not know,
/// and where the maps cannot be written.
pub fn paint(request: &PaintRequest) -> Result<Painted, PaintError> {
    let folder = request.folder()?;
    report::keep_out_of_run(&folder, &request.run)?;
    let stems = stems(&request.labels)?;
    let run = Run::read(&request.run)?;
    let side = side(&run, &request.species)?;
    let maps = Maps::of(&run, side, request.alignment.as_deref(), &request.parcels)?;

    let mut surfaces = Vec::new();
    let mut warnings = Vec::new();
    for path in &request.labels {
        let labels = read_surface_labels(path)?;
        let surface = Surface::of(&labels, &run.species[side], &mut warnings);
        if surface.parcels().next().is_none() {
            return Err(no_parcel(path, &labels.names, &run, side));
        }
        surfaces.push((labels, surface));
    }
    warn_of_missing(&run, side, &surfaces, &mut warnings);

    let (own, other) = (&run.species[side].name, &run.species[side.opposite()].name);
    let caution = CAUTION.replace('\n', " ");
    let mut files = Vec::new();
    let mut painted = Vec::new();
    for ((stem, path), (labels, surface)) in stems.iter().zip(&request.labels).zip(&surfaces) {
        let mut about = vec![
            (
                "Program",
                concat!(env!("CARGO_PKG_NAME"), " ", env!("CARGO_PKG_VERSION")),
            ),
            ("Run", run.title.as_str()),
            ("Species", own.as_str()),
            ("ComparedWith", other.as_str()),
            ("DistancesFrom", run.distances_from.as_str()),
            ("Caution", caution.as_str()),
        ];
        if let Some(structure) = &labels.structure {
            about.insert(0, ("AnatomicalStructurePrimary", structure));
        }
        let mut of_surface = Vec::new();
        for group in &maps.groups {
            let name = format!("{stem}.{}.func.gii", group.name);
            let maps: Vec<_> = group.maps.iter().map(|map| surface.paint(map)).collect();
            of_surface.push((
                folder.join(&name),
                maps.iter().map(|map| map.name.clone()).collect(),
            ));
            files.push((name, report::gifti(&about, &maps)));
        }
        painted.push(PaintedSurface {
            labels: path.clone(),
            structure: labels.structure.clone(),
            vertices: labels.vertices.len(),
            in_parcels: surface.vertices_in_parcels(),
            parcels: surface.parcels().count(),
            files: of_surface,
        });
    }
    report::write_maps(&folder, &files, request.replace)?;
    Ok(Painted {
        species: own.clone(),
        other: other.clone(),
        alignment: maps.alignment,
        distances_from: run.distances_from.clone(),
        parcels: run.species[side].parcels.len(),
        surfaces: painted,
        warnings,
    })
}

/// The species of a name; `a` and `b` will do where no species is called so.
fn side(run: &Run, name: &str) -> Result<Side, PaintError> {
    let called = |side: &Side| run.species[*side].name == name;
    let lettered = |side: &Side| side.letter() == name;
    Side::BOTH
        .into_iter()
        .find(called)
        .or_else(|| Side::BOTH.into_iter().find(lettered))
        .ok_or_else(|| PaintError::NoSpecies {
            found: name.to_owned(),
            a: run.species.a.name.clone(),
            b: run.species.b.name.clone(),
        })
}

/// What the names of the maps of each label file begin with.
fn stems(labels: &[PathBuf]) -> Result<Vec<String>, PaintError> {
    let mut seen: BTreeMap<String, &Path> = BTreeMap::new();
    let mut stems = Vec::new();
    for path in labels {
        let name = path.file_name().unwrap_or_default().to_string_lossy();
        let mut stem = name.as_ref();
        for ending in [".gz", ".gii", ".label"] {
            stem = stem.strip_suffix(ending).unwrap_or(stem);
        }
        if let Some(first) = seen.insert(stem.to_owned(), path) {
            return Err(PaintError::SameName {
                first: first.to_owned(),
                second: path.clone(),
            });
        }
        stems.push(stem.to_owned());
    }
    Ok(stems)
}

fn no_parcel(path: &Path, names: &[String], run: &Run, side: Side) -> PaintError {
    let species = &run.species[side];
    let example = names.iter().find_map(|name| {
        let near = nearest_few(name, species.parcels.iter().map(String::as_str));
        near.first().map(|near| (name.clone(), (*near).to_owned()))
    });
    let other = &run.species[side.opposite()];
    PaintError::NoParcel(Box::new(OtherParcellation {
        file: path.to_owned(),
        species: species.name.clone(),
        labels: names.to_vec(),
        parcels: species.parcels.clone(),
        near: example,
        of_other: names
            .iter()
            .any(|name| other.parcels.contains(name))
            .then(|| other.name.clone()),
    }))
}

/// Parcels that none of the surfaces shows: a hemisphere was forgotten, or labels differ.
fn warn_of_missing<L>(
    run: &Run,
    side: Side,
    surfaces: &[(L, Surface)],
    warnings: &mut Vec<Warning>,
) {
    let species = &run.species[side];
    let mut shown = vec![false; species.parcels.len()];
    for parcel in surfaces.iter().flat_map(|(_, surface)| surface.parcels()) {
        shown[parcel] = true;
    }
    let parcels: Vec<String> = species
        .parcels
        .iter()
        .zip(shown)
        .filter(|(_, shown)| !shown)
        .map(|(label, _)| label.clone())
        .collect();
    if !parcels.is_empty() {
        warnings.push(Warning::SurfaceLacks {
            species: species.name.clone(),
            parcels,
            of: species.parcels.len(),
        });
    }
}
