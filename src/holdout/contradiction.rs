//! Landmarks that the others contradict.

use super::trials::Placed;
use crate::domain::Pair;

/// Makes the median absolute deviation estimate the standard deviation of normal data.
const MAD_TO_DEVIATION: f64 = 1.4826;
/// Robust deviations of the log distance beyond which a left-out landmark is out of line.
const OUT_OF_LINE: f64 = 3.0;
/// Deviations are not taken for smaller than this (on the log scale): landmarks that agree closely
/// must not condemn one that agrees a little less.
const LEAST_DEVIATION: f64 = 0.2;
/// A landmark is not contradicted while its counterpart is among this share of the candidates.
const PLAUSIBLE_SHARE: f64 = 0.1;

/// Which left-out landmarks lie out of line with the rest: much further from their counterpart than
/// landmarks usually are (median and median absolute deviation of log distances), with the
/// counterpart outside the best tenth of the candidates seen from either side.
///
/// `distances` and `placed` hold one entry for each landmark, left out.
#[must_use]
pub fn contradicted(distances: &[f64], placed: &[Pair<Placed>]) -> Vec<bool> {
    let logs: Vec<f64> = distances
        .iter()
        .map(|d| d.max(f64::MIN_POSITIVE).ln())
        .collect();
    let centre = median(logs.clone());
    let deviation = median(logs.iter().map(|x| (x - centre).abs()).collect()) * MAD_TO_DEVIATION;
    let limit = centre + OUT_OF_LINE * deviation.max(LEAST_DEVIATION);
    logs.iter()
        .zip(placed)
        .map(|(log, placed)| {
            let implausible =
                |p: Placed| p.rank as f64 > 1.0 + PLAUSIBLE_SHARE * p.candidates as f64;
            *log > limit && implausible(placed.a) && implausible(placed.b)
        })
        .collect()
}

fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let n = values.len();
    if n == 0 {
        return 0.0;
    }
    (values[(n - 1) / 2] + values[n / 2]) / 2.0
}
