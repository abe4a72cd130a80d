//! Which way the lines of a matrix run, and how they were measured.

use super::choice::choices;

choices! {
    /// What the rows of a matrix are; its columns are the opposite.
    pub enum RowsAre {
        /// Where connections start: the usual orientation.
        Sources = "sources",
        /// Where connections end.
        Targets = "targets",
    }
}

choices! {
    /// How injected areas were traced.
    pub enum Tracer {
        /// Label travels back from the injected area, so that injected areas are targets.
        Retrograde = "retrograde",
        /// Label travels forth from the injected area, so that injected areas are sources.
        Anterograde = "anterograde",
    }
}

impl RowsAre {
    /// What the columns are.
    #[must_use]
    pub fn opposite(self) -> RowsAre {
        match self {
            RowsAre::Sources => RowsAre::Targets,
            RowsAre::Targets => RowsAre::Sources,
        }
    }
}

impl Tracer {
    /// What injected areas are.
    #[must_use]
    pub fn injected(self) -> RowsAre {
        match self {
            Tracer::Retrograde => RowsAre::Targets,
            Tracer::Anterograde => RowsAre::Sources,
        }
    }
}
