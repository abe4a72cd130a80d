//! Rank correlation (Spearman 1904).

/// Spearman's rank correlation of two lists of one length, ties at their average rank; `None` where
/// a side does not vary or there are fewer than three pairs.
///
/// # Panics
/// If the lengths differ or a value is NaN: a fault of the caller.
#[must_use]
pub fn spearman(x: &[f64], y: &[f64]) -> Option<f64> {
    assert_eq!(x.len(), y.len());
    let n = x.len();
    if n < FEWEST_PAIRS {
        return None;
    }
    let centred = |values: &[f64]| -> Vec<f64> {
        let mean = (n as f64 + 1.0) / 2.0;
        average_ranks(values).iter().map(|r| r - mean).collect()
    };
    let (x, y) = (centred(x), centred(y));
    let products = |u: &[f64], v: &[f64]| u.iter().zip(v).map(|(a, b)| a * b).sum::<f64>();
    let own = products(&x, &x) * products(&y, &y);
    (own > 0.0).then(|| (products(&x, &y) / own.sqrt()).clamp(-1.0, 1.0))
}

/// Two pairs always lie on a line.
const FEWEST_PAIRS: usize = 3;

/// Ranks from 1, equals at the mean of the ranks they take up.
fn average_ranks(values: &[f64]) -> Vec<f64> {
    let mut order: Vec<usize> = (0..values.len()).collect();
    order.sort_by(|&i, &j| {
        values[i]
            .partial_cmp(&values[j])
            .expect("values are numbers")
    });
    let mut ranks = vec![0.0; values.len()];
    let mut from = 0;
    while from < order.len() {
        let value = values[order[from]];
        let equal = order[from..].iter().take_while(|&&i| values[i] == value);
        let to = from + equal.count();
        for &i in &order[from..to] {
            // Ranks from + 1 to `to`.
            ranks[i] = (from + 1 + to) as f64 / 2.0;
        }
        from = to;
    }
    ranks
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_the_order_counts_and_ties_share_their_rank() {
        assert_eq!(average_ranks(&[5.0, 1.0, 5.0, 2.0]), [3.5, 1.0, 3.5, 2.0]);
        let x = [1.0, 2.0, 3.0, 4.0];
        assert_eq!(spearman(&x, &[1.0, 10.0, 100.0, 1e6]), Some(1.0));
        assert_eq!(spearman(&x, &[4.0, 3.0, 2.0, -7.0]), Some(-1.0));
        assert_eq!(spearman(&x, &[1.0; 4]), None);
        assert_eq!(spearman(&x[..2], &x[..2]), None);
    }

    /// Intelligence and hours of television of ten people: the usual worked example, -29/165 (from
    /// memory; the sum of squared differences of ranks is 194).
    #[test]
    fn a_worked_example_comes_out() {
        let iq = [86., 97., 99., 100., 101., 103., 106., 110., 112., 113.];
        let hours = [2., 20., 28., 27., 50., 29., 7., 17., 6., 12.];
        let rho = spearman(&iq, &hours).unwrap();
        approx::assert_relative_eq!(rho, -29.0 / 165.0, epsilon = 1e-15);
    }
}
