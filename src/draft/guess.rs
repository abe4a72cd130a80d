//! What weights seem to measure, by their values.

use crate::domain::WeightKind;
use crate::input::MatrixLooks;

/// Largest class that whole numbers are taken for.
const LARGEST_CLASS: f64 = 3.0;

/// A kind of weights and why it was guessed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Guess {
    /// The kind.
    pub kind: WeightKind,
    /// The reason, after "because".
    pub because: String,
}

/// Guesses from the values of a matrix.
#[must_use]
pub fn guess(matrix: &MatrixLooks) -> Guess {
    let values = &matrix.off_diagonal;
    let (low, high) = values
        .iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), w| {
            (low.min(*w), high.max(*w))
        });
    let whole = values.iter().all(|w| w.fract() == 0.0);
    let (kind, because) = if values.is_empty() {
        return Guess {
            kind: WeightKind::Other,
            because: "it holds no number off the diagonal".to_owned(),
        };
    } else if low < 0.0 && high <= 0.0 && !whole {
        (
            WeightKind::Log10,
            "no entry is above 0 and not all are whole numbers",
        )
    } else if (-1.0..0.0).contains(&low) && high <= 1.0 {
        (
            WeightKind::Correlations,
            "entries lie between -1 and 1 on both sides of 0",
        )
    } else if low < 0.0 {
        (
            WeightKind::Other,
            "some entries are negative, but they are no correlations",
        )
    } else if whole && high <= LARGEST_CLASS {
        (
            WeightKind::Ordinal,
            "entries are whole numbers and few; say counts if they count something",
        )
    } else if whole {
        (WeightKind::Counts, "entries are whole numbers")
    } else if high <= 1.0 && matrix.ones_on_diagonal {
        (
            WeightKind::Correlations,
            "no entry is above 1 and the diagonal holds ones",
        )
    } else if high <= 1.0 {
        (WeightKind::Fractions, "entries lie between 0 and 1")
    } else {
        (
            WeightKind::Other,
            "entries are neither whole numbers nor all below 1; say counts if they are means or densities of counts",
        )
    };
    Guess {
        kind,
        because: format!("{because} (from {low} to {high})"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::input::Form;

    fn kind(values: &[f64]) -> WeightKind {
        let looks = MatrixLooks {
            form: Form::Table,
            rows: 0,
            labels: None,
            variable: None,
            label_variable: None,
            off_diagonal: values.to_vec(),
            ones_on_diagonal: false,
        };
        guess(&looks).kind
    }

    #[test]
    fn values_tell_what_they_measure() {
        assert_eq!(kind(&[0.0, 12.0, 410.0]), WeightKind::Counts);
        assert_eq!(kind(&[0.0, 1.0, 3.0, 2.0]), WeightKind::Ordinal);
        assert_eq!(kind(&[0.0, 0.2, 1e-6]), WeightKind::Fractions);
        assert_eq!(kind(&[-0.3, 0.2, 0.9]), WeightKind::Correlations);
        assert_eq!(kind(&[-5.2, -0.1, 0.0]), WeightKind::Log10);
        assert_eq!(kind(&[-5.0, 0.3, 2.0]), WeightKind::Other);
        assert_eq!(kind(&[0.0, 7.4, 112.9]), WeightKind::Other);
        assert_eq!(kind(&[]), WeightKind::Other);
    }
}
