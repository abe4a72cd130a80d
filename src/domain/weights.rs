//! What the numbers of a connectivity are, and how they are put on a scale fit for comparison.

use super::choice::choices;

choices! {
    /// What the entries of a matrix measure.
    pub enum WeightKind {
        /// Numbers of labelled cells, synapses or streamlines; zero or more.
        Counts = "counts",
        /// Shares of an injection or of a parcel's connections; zero or more.
        Fractions = "fractions",
        /// Decimal logarithms of positive weights.
        Log10 = "log10",
        /// Classes such as absent, weak, moderate, strong; zero or more.
        Ordinal = "ordinal",
        /// Correlations between -1 and 1.
        Correlations = "correlations",
        /// Anything else, taken as it is.
        Other = "other",
    }
}

choices! {
    /// How weights are transformed before profiles are compared.
    pub enum Transform {
        /// log(1 + w / median positive w): linear below the median.
        Log1p = "log1p",
        /// 1 + log10(w / smallest positive w), zero for no connection: keeps weak links.
        LogFloor = "log-floor",
        /// Average ranks as a share of all entries, zero for no connection.
        Ranks = "ranks",
        /// Inverse hyperbolic tangent of a correlation.
        FisherZ = "fisher-z",
        /// The weights as they are.
        None = "none",
    }
}

impl WeightKind {
    /// Whether a weight below zero is a mistake.
    #[must_use]
    pub fn is_non_negative(self) -> bool {
        matches!(
            self,
            WeightKind::Counts | WeightKind::Fractions | WeightKind::Ordinal
        )
    }
}

impl Transform {
    /// Why the transform makes no sense on such weights; `None` where it does.
    #[must_use]
    pub fn mismatch(self, weights: WeightKind) -> Option<&'static str> {
        match (self, weights) {
            (Transform::FisherZ, WeightKind::Correlations) => None,
            (Transform::FisherZ, _) => Some("Fisher's z is for correlations between -1 and 1"),
            (Transform::Log1p | Transform::LogFloor, WeightKind::Correlations) => {
                Some("correlations have negative values, which have no logarithm")
            }
            (Transform::Log1p | Transform::LogFloor, WeightKind::Other) => {
                Some("weights of this kind may be negative; call them counts or fractions if they are not")
            }
            _ => None,
        }
    }
}
