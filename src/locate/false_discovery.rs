//! Many tests at once (Benjamini & Hochberg 1995, J R Stat Soc B 57:289-300).

/// The q-value of every p-value: the smallest share of false discoveries at which it would be one.
#[must_use]
pub fn q_values(p: &[f64]) -> Vec<f64> {
    let mut order: Vec<usize> = (0..p.len()).collect();
    order.sort_by(|&i, &j| p[j].total_cmp(&p[i]));
    let mut q = vec![1.0; p.len()];
    let mut least: f64 = 1.0;
    for (behind, &at) in order.iter().enumerate() {
        let rank = (p.len() - behind) as f64;
        least = least.min(p[at] * p.len() as f64 / rank);
        // Rounding must not take it below its own p.
        q[at] = least.max(p[at]);
    }
    q
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against `scipy.stats.false_discovery_control(p, method="bh")` (version 1.17.1).
    #[test]
    fn q_values_are_those_of_benjamini_and_hochberg() {
        let p = [0.01, 0.04, 0.03, 0.5, 0.04, 0.9, 0.002];
        let expected = [
            0.035,
            0.055999999999999994,
            0.055999999999999994,
            0.5833333333333334,
            0.055999999999999994,
            0.9,
            0.014,
        ];
        for (q, expected) in q_values(&p).into_iter().zip(expected) {
            assert!((q - expected).abs() < 1e-12, "{q} {expected}");
        }
        assert!(q_values(&[]).is_empty());
    }
}
