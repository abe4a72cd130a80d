//! The kinds of evidence, and how far each is trusted before a study's own landmarks have spoken.

use crate::domain::choices;

choices! {
    /// A kind of evidence.
    pub enum Kind {
        /// Distance after weighted Procrustes alignment.
        Procrustes = "procrustes",
        /// Distance between canonical variates.
        Canonical = "canonical",
        /// Connections with the landmarks, by weights and by affinities.
        Fingerprint = "fingerprint",
        /// Canonical distance with anchors grown step by step.
        Grown = "grown",
        /// Transport between the networks, averaged over replicates.
        Transport = "transport",
    }
}

impl Kind {
    /// All kinds, in the order of the tables.
    pub const ALL: [Kind; 5] = [
        Kind::Procrustes,
        Kind::Canonical,
        Kind::Fingerprint,
        Kind::Grown,
        Kind::Transport,
    ];

    /// Odds of the kind before any landmark is left out. With a dozen landmarks left-out errors are
    /// rough, and on the real pairs of docs/method.md averaged transport ranked better than every
    /// other kind; odds from 4 to 64 ranked alike there.
    #[must_use]
    pub fn prior_odds(self) -> f64 {
        match self {
            Kind::Transport => 8.0,
            _ => 1.0,
        }
    }
}
