//! What was painted, for people.

use super::Painted;

impl Painted {
    /// A few lines on what was painted and where it is.
    #[must_use]
    pub fn account(&self) -> String {
        let mut lines = vec![format!(
            "Painted {}, compared with {} (distances: {}). {} parcels take part in the run.",
            self.species, self.other, self.distances_from, self.parcels
        )];
        for surface in &self.surfaces {
            let structure = surface
                .structure
                .as_ref()
                .map_or_else(String::new, |name| format!(" ({name})"));
            lines.push(format!(
                "{}{structure}: {} parcels on {} of {} vertices; the others hold NaN, no value.",
                surface.labels.display(),
                surface.parcels,
                surface.in_parcels,
                surface.vertices
            ));
            for (path, maps) in &surface.files {
                let maps = match &maps[..] {
                    [first, .., last] if maps.len() > 3 => format!("{first} to {last}"),
                    _ => maps.join(", "),
                };
                lines.push(format!("  {}  {maps}", path.display()));
            }
        }
        lines.push(
            "Support is stability under other landmark weights, not a chance of being right."
                .to_owned(),
        );
        lines.join("\n") + "\n"
    }
}
