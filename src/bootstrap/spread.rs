//! How far coordinates stray from their full-sample values over replicates.

use ndarray::{Array2, Zip};

/// Sums of deviations and of their squares, `(parcels, axes)`.
#[derive(Debug, Clone)]
pub struct Spread {
    sum: Array2<f64>,
    squares: Array2<f64>,
    count: usize,
}

impl Spread {
    /// Nothing yet.
    #[must_use]
    pub fn new(parcels: usize, axes: usize) -> Spread {
        Spread {
            sum: Array2::zeros((parcels, axes)),
            squares: Array2::zeros((parcels, axes)),
            count: 0,
        }
    }

    /// Takes in one replicate. Deviations from the full sample, not raw values, are summed, so that
    /// nothing is lost where the spread is small.
    pub fn record(&mut self, replicate: &Array2<f64>, full: &Array2<f64>) {
        Zip::from(&mut self.sum)
            .and(&mut self.squares)
            .and(replicate)
            .and(full)
            .for_each(|sum, square, &x, &at| {
                let gap = x - at;
                *sum += gap;
                *square += gap * gap;
            });
        self.count += 1;
    }

    /// Adds what another block saw.
    pub fn add(&mut self, other: &Spread) {
        self.sum += &other.sum;
        self.squares += &other.squares;
        self.count += other.count;
    }

    /// Standard deviation over replicates (divisor: replicates - 1), the bootstrap's standard error.
    #[must_use]
    pub fn standard_errors(&self) -> Array2<f64> {
        let n = self.count as f64;
        let mut errors = self.squares.clone();
        errors.zip_mut_with(&self.sum, |square, sum| {
            *square = ((*square - sum * sum / n) / (n - 1.0)).max(0.0).sqrt();
        });
        errors
    }
}
