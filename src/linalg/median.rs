//! The median.

/// The median of values, the mean of the middle two where their number is even; `None` where there
/// is nothing.
#[must_use]
pub fn median(mut values: Vec<f64>) -> Option<f64> {
    values.sort_by(f64::total_cmp);
    let half = values.len() / 2;
    if values.len() % 2 == 1 {
        Some(values[half])
    } else {
        let below = half.checked_sub(1)?;
        Some((values[below] + values[half]) / 2.0)
    }
}

#[cfg(test)]
mod tests {
    use super::median;

    #[test]
    fn the_middle_is_found_whatever_the_order() {
        assert_eq!(median(vec![3.0, 1.0, 2.0]), Some(2.0));
        assert_eq!(median(vec![4.0, 1.0, 2.0, 3.0]), Some(2.5));
        assert_eq!(median(vec![7.0]), Some(7.0));
        assert_eq!(median(Vec::new()), None);
    }
}
