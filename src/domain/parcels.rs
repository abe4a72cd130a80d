//! The parcels of one species that take part, and those that cannot.

use std::collections::BTreeMap;

/// Whether a parcel takes part, and if not, why.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Standing {
    /// It has connections and was observed well enough.
    Placed,
    /// It has no connection at all.
    Isolated,
    /// Too little of its connections was observed to compare it with others.
    Uncovered,
}

/// One species' parcels. Those with connections stand in bytewise order of their labels, so that no
/// result depends on the order of the input and ties go to the first.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Parcels {
    species: String,
    labels: Vec<String>,
    as_listed: Vec<usize>,
    isolated: Vec<String>,
    uncovered: Vec<String>,
    copies: BTreeMap<String, String>,
}

impl Parcels {
    /// Takes the species' name, the labels in the order of its file, and for each whether the parcel
    /// takes part.
    #[must_use]
    pub fn new(species: &str, listed: &[String], standing: &[Standing]) -> Self {
        let with = |wanted: Standing| -> Vec<usize> {
            (0..listed.len())
                .filter(|&i| standing[i] == wanted)
                .collect()
        };
        let names = |at: Vec<usize>| at.into_iter().map(|i| listed[i].clone()).collect();
        let mut kept = with(Standing::Placed);
        let in_file = kept.clone();
        kept.sort_by(|&i, &j| listed[i].as_bytes().cmp(listed[j].as_bytes()));
        let mut place = vec![usize::MAX; listed.len()];
        for (at, &i) in kept.iter().enumerate() {
            place[i] = at;
        }
        Parcels {
            species: species.to_owned(),
            labels: kept.iter().map(|&i| listed[i].clone()).collect(),
            as_listed: in_file.into_iter().map(|i| place[i]).collect(),
            isolated: names(with(Standing::Isolated)),
            uncovered: names(with(Standing::Uncovered)),
            copies: BTreeMap::new(),
        }
    }

    /// The same parcels, of which some were made of copies: each copy's label and that of the parcel
    /// it went into.
    #[must_use]
    pub fn made_of(self, copies: BTreeMap<String, String>) -> Self {
        Parcels { copies, ..self }
    }

    /// The label of the parcel that a label stands for: that of a copy for the parcel it went into.
    #[must_use]
    pub fn resolve<'l>(&'l self, label: &'l str) -> &'l str {
        self.copies.get(label).map_or(label, String::as_str)
    }

    /// How many parcels, isolated ones included, are made of a left and a right copy.
    #[must_use]
    pub fn folded(&self) -> usize {
        self.copies.len() / 2
    }

    /// The species' name.
    #[must_use]
    pub fn species(&self) -> &str {
        &self.species
    }

    /// Labels of the parcels with connections, in bytewise order.
    #[must_use]
    pub fn labels(&self) -> &[String] {
        &self.labels
    }

    /// Number of parcels with connections.
    #[must_use]
    pub fn len(&self) -> usize {
        self.labels.len()
    }

    /// Whether no parcel has a connection.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.labels.is_empty()
    }

    /// Indices of the parcels in the order of the input file.
    #[must_use]
    pub fn as_listed(&self) -> &[usize] {
        &self.as_listed
    }

    /// Labels of parcels without any connection, in the order of the input file.
    #[must_use]
    pub fn isolated(&self) -> &[String] {
        &self.isolated
    }

    /// Labels of parcels of which too little was observed, in the order of the input file.
    #[must_use]
    pub fn uncovered(&self) -> &[String] {
        &self.uncovered
    }

    /// Index of a parcel that takes part, by its label or by that of a copy.
    #[must_use]
    pub fn find(&self, label: &str) -> Option<usize> {
        let label = self.resolve(label);
        self.labels
            .binary_search_by(|known| known.as_bytes().cmp(label.as_bytes()))
            .ok()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn labels_are_text_in_bytewise_order() {
        use Standing::{Isolated, Placed, Uncovered};
        let listed = ["2", "10", "a", "lone", "dark", "B"].map(str::to_owned);
        let standing = [Placed, Placed, Placed, Isolated, Uncovered, Placed];
        let parcels = Parcels::new("x", &listed, &standing);
        assert_eq!(parcels.labels(), ["10", "2", "B", "a"]);
        assert_eq!(parcels.as_listed(), [1, 0, 3, 2]);
        assert_eq!(parcels.isolated(), ["lone"]);
        assert_eq!(parcels.uncovered(), ["dark"]);
        assert_eq!(parcels.find("2"), Some(1));
        assert_eq!(parcels.find("lone"), None);
    }
}
