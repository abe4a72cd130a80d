//! Intervals from replicates.

/// Share of replicates inside an interval.
pub const LEVEL: f64 = 0.9;

/// The central interval of replicated whole numbers that leaves at most `(1 - LEVEL) / 2` of them out
/// on either side; both ends are values that occurred. Sorts its argument. `None` without
/// replicates.
pub fn interval(values: &mut [u32]) -> Option<(u32, u32)> {
    values.sort_unstable();
    central(values)
}

/// The same of any replicated numbers.
#[must_use]
pub fn interval_of(mut values: Vec<f64>) -> Option<(f64, f64)> {
    values.sort_by(f64::total_cmp);
    central(&values)
}

fn central<T: Copy>(values: &[T]) -> Option<(T, T)> {
    let n = values.len();
    if n == 0 {
        return None;
    }
    // The slack keeps 5 % of 200 at 10 in spite of rounding.
    let outside = ((1.0 - LEVEL) / 2.0 * n as f64 + 1e-9).floor() as usize;
    let low = outside.min((n - 1) / 2);
    Some((values[low], values[n - 1 - low]))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_tenth_is_left_out_in_all() {
        let mut ranks: Vec<u32> = (1..=200).rev().collect();
        assert_eq!(interval(&mut ranks), Some((11, 190)));
        assert_eq!(interval(&mut [7]), Some((7, 7)));
        assert_eq!(interval(&mut []), None);
        let tenths = (1..=200).map(|x| f64::from(x) / 10.0).collect();
        assert_eq!(interval_of(tenths), Some((1.1, 19.0)));
    }
}
