//! Masses in whole units, so that flows between them are exact.

use crate::domain::choices;

choices! {
    /// What mass parcels have.
    pub enum Mass {
        /// The same for every parcel of a species.
        Uniform = "uniform",
        /// In proportion to the parcel's area.
        Area = "area",
        /// The same for every parcel that is asked; a candidate attracts as much as suits.
        Free = "free",
    }
}

/// Units that masses in proportion to given numbers sum to.
pub const UNIT: i64 = 1 << 32;

/// Masses of the two sides in whole units. Both sides have the same sum.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Masses {
    sources: Vec<i64>,
    sinks: Vec<i64>,
    total: i64,
}

impl Masses {
    /// The same mass for each of `sources` and for each of `sinks`, exactly.
    ///
    /// # Panics
    /// If a side is empty.
    #[must_use]
    pub fn uniform(sources: usize, sinks: usize) -> Masses {
        assert!(sources > 0 && sinks > 0, "both sides have something");
        Masses {
            sources: vec![sinks as i64; sources],
            sinks: vec![sources as i64; sinks],
            total: (sources * sinks) as i64,
        }
    }

    /// Masses proportional to positive numbers, rounded to whole units of which there are [`UNIT`]:
    /// a relative error of 10⁻⁹ of the whole at most. No mass is rounded to nothing.
    ///
    /// # Panics
    /// If a side is empty, or a number is not positive and finite.
    #[must_use]
    pub fn proportional(sources: &[f64], sinks: &[f64]) -> Masses {
        Masses {
            sources: rounded(sources),
            sinks: rounded(sinks),
            total: UNIT,
        }
    }

    /// Units of each source.
    #[must_use]
    pub fn sources(&self) -> &[i64] {
        &self.sources
    }

    /// Units of each sink.
    #[must_use]
    pub fn sinks(&self) -> &[i64] {
        &self.sinks
    }

    /// Units as a share of the whole.
    #[must_use]
    pub fn share(&self, units: i64) -> f64 {
        units as f64 / self.total as f64
    }
}

/// Whole units in proportion to `parts`, by largest remainder; ties go to the first.
fn rounded(parts: &[f64]) -> Vec<i64> {
    assert!(!parts.is_empty(), "both sides have something");
    assert!(
        parts.iter().all(|x| *x > 0.0 && x.is_finite()),
        "masses are positive"
    );
    let sum: f64 = parts.iter().sum();
    let exact: Vec<f64> = parts.iter().map(|x| x / sum * UNIT as f64).collect();
    let mut units: Vec<i64> = exact.iter().map(|x| (x.floor() as i64).max(1)).collect();
    let mut by_remainder: Vec<usize> = (0..parts.len()).collect();
    by_remainder.sort_by(|&i, &j| {
        (exact[j] - exact[j].floor())
            .total_cmp(&(exact[i] - exact[i].floor()))
            .then(i.cmp(&j))
    });
    let mut left = UNIT - units.iter().sum::<i64>();
    for &at in by_remainder.iter().cycle() {
        match left.signum() {
            0 => break,
            1 => {
                units[at] += 1;
                left -= 1;
            }
            _ if units[at] > 1 => {
                units[at] -= 1;
                left += 1;
            }
            _ => {}
        }
    }
    units
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_are_whole_and_sum_to_the_whole() {
        let masses = Masses::proportional(&[1.0, 1.0, 1.0], &[1e-15, 2.0, 3.5, 0.25]);
        assert_eq!(masses.sources().iter().sum::<i64>(), UNIT);
        assert_eq!(masses.sinks().iter().sum::<i64>(), UNIT);
        assert_eq!(masses.sinks()[0], 1);
        assert!((masses.share(masses.sinks()[2]) - 3.5 / 5.75).abs() < 1e-9);
        let uniform = Masses::uniform(161, 180);
        assert_eq!(
            uniform.sources().iter().sum::<i64>(),
            uniform.sinks().iter().sum::<i64>()
        );
        assert_eq!(uniform.share(uniform.sources()[0]), 1.0 / 161.0);
    }
}
