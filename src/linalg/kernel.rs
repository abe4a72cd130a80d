//! The inner loops of ranking, compiled for the widest vectors the processor has.
//!
//! Vector width changes the speed and no bit: every sum runs in the same order, without fused
//! multiply-add.

use pulp::{Arch, Simd, WithSimd};

/// Columns treated together, enough to fill the registers of any processor.
const LANES: usize = 16;

/// Squared distances from one point to many: `point` has one coordinate an axis, `others` holds axis
/// after axis the coordinates of `out.len()` points, `norms` their squared lengths.
///
/// Computed as |x|^2 + |y|^2 - 2 x y, which spares a third of the work and loses digits only where a
/// distance is tiny beside the lengths; one that should be zero may come out a little below.
pub fn squared_distances(point: &[f64], others: &[f64], norms: &[f64], out: &mut [f64]) {
    Arch::new().dispatch(SquaredDistances {
        point,
        others,
        norms,
        out,
    });
}

/// Index of the least entry, the first of equals; `None` where no entry is below infinity.
#[must_use]
pub fn first_least(values: &[f64]) -> Option<usize> {
    Arch::new().dispatch(FirstLeast { values })
}

/// Keeps for every column the least value so far and the row that had it first.
pub fn keep_least(row: u64, values: &[f64], least: &mut [f64], rows: &mut [u64]) {
    Arch::new().dispatch(KeepLeast {
        row,
        values,
        least,
        rows,
    });
}

/// How many values are below a bound, and how many are not above it.
#[must_use]
pub fn count_below(values: &[f64], bound: f64) -> (usize, usize) {
    Arch::new().dispatch(CountBelow { values, bound })
}

/// The least of `values[i] - others[i]` and the first index that has it; infinity and 0 where there
/// are no values.
#[must_use]
pub fn least_difference(values: &[f64], others: &[f64]) -> (f64, usize) {
    Arch::new().dispatch(LeastDifference { values, others })
}

struct LeastDifference<'s> {
    values: &'s [f64],
    others: &'s [f64],
}

impl WithSimd for LeastDifference<'_> {
    type Output = (f64, usize);

    #[inline(always)]
    fn with_simd<S: Simd>(self, _simd: S) -> (f64, usize) {
        let LeastDifference { values, others } = self;
        let others = &others[..values.len()];
        let mut least = [f64::INFINITY; LANES];
        let chunks = values.chunks_exact(LANES).zip(others.chunks_exact(LANES));
        for (values, others) in chunks {
            for lane in 0..LANES {
                let difference = values[lane] - others[lane];
                least[lane] = if difference < least[lane] {
                    difference
                } else {
                    least[lane]
                };
            }
        }
        let whole = values.len() - values.len() % LANES;
        let rest = (whole..values.len()).map(|at| values[at] - others[at]);
        let least = least
            .into_iter()
            .chain(rest)
            .fold(f64::INFINITY, |least, x| if x < least { x } else { least });
        // Subtracting again gives the same bits, so the value can be looked for.
        let at = (0..values.len()).find(|&at| values[at] - others[at] == least);
        (least, at.unwrap_or(0))
    }
}

struct SquaredDistances<'s> {
    point: &'s [f64],
    others: &'s [f64],
    norms: &'s [f64],
    out: &'s mut [f64],
}

impl WithSimd for SquaredDistances<'_> {
    type Output = ();

    // Inlined into a function compiled for wider vectors: that is what widens the loops.
    #[inline(always)]
    fn with_simd<S: Simd>(self, _simd: S) {
        let SquaredDistances {
            point,
            others,
            norms,
            out,
        } = self;
        let count = out.len();
        let own: f64 = point.iter().map(|x| x * x).sum();
        let whole = count - count % LANES;
        for first in (0..whole).step_by(LANES) {
            let norms = &norms[first..][..LANES];
            let mut sums = [own; LANES];
            for lane in 0..LANES {
                sums[lane] += norms[lane];
            }
            for (axis, &x) in point.iter().enumerate() {
                let twice = -2.0 * x;
                let others = &others[axis * count + first..][..LANES];
                for lane in 0..LANES {
                    sums[lane] += twice * others[lane];
                }
            }
            out[first..first + LANES].copy_from_slice(&sums);
        }
        for j in whole..count {
            let mut sum = own + norms[j];
            for (axis, &x) in point.iter().enumerate() {
                sum += -2.0 * x * others[axis * count + j];
            }
            out[j] = sum;
        }
    }
}

struct FirstLeast<'s> {
    values: &'s [f64],
}

impl WithSimd for FirstLeast<'_> {
    type Output = Option<usize>;

    #[inline(always)]
    fn with_simd<S: Simd>(self, _simd: S) -> Option<usize> {
        let whole = self.values.len() - self.values.len() % LANES;
        let mut least = [f64::INFINITY; LANES];
        // Chunk numbers are kept as floats: one mask then serves values and numbers alike.
        let mut chunk_of = [0.0; LANES];
        for (chunk, values) in self.values.chunks_exact(LANES).enumerate() {
            let chunk = chunk as f64;
            for lane in 0..LANES {
                let better = values[lane] < least[lane];
                least[lane] = if better { values[lane] } else { least[lane] };
                chunk_of[lane] = if better { chunk } else { chunk_of[lane] };
            }
        }
        let mut first = (f64::INFINITY, usize::MAX);
        let lanes = (0..LANES).map(|lane| (least[lane], chunk_of[lane] as usize * LANES + lane));
        let rest = (whole..self.values.len()).map(|at| (self.values[at], at));
        for (value, at) in lanes.chain(rest) {
            if value < first.0 || (value == first.0 && at < first.1) {
                first = (value, at);
            }
        }
        (first.0 < f64::INFINITY).then_some(first.1)
    }
}

struct KeepLeast<'s> {
    row: u64,
    values: &'s [f64],
    least: &'s mut [f64],
    rows: &'s mut [u64],
}

impl WithSimd for KeepLeast<'_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: Simd>(self, _simd: S) {
        let KeepLeast {
            row,
            values,
            least,
            rows,
        } = self;
        let chunks = values
            .chunks(LANES)
            .zip(least.chunks_mut(LANES))
            .zip(rows.chunks_mut(LANES));
        for ((values, least), rows) in chunks {
            // Whole chunks are worked on in copies: writing in place would mask every store.
            if let (Ok(values), Ok(now), Ok(kept)) = (
                <[f64; LANES]>::try_from(values),
                <[f64; LANES]>::try_from(&*least),
                <[u64; LANES]>::try_from(&*rows),
            ) {
                let (mut now, mut kept) = (now, kept);
                for lane in 0..LANES {
                    let better = values[lane] < now[lane];
                    now[lane] = if better { values[lane] } else { now[lane] };
                    kept[lane] = if better { row } else { kept[lane] };
                }
                least.copy_from_slice(&now);
                rows.copy_from_slice(&kept);
            } else {
                for ((value, least), kept) in values.iter().zip(least).zip(rows) {
                    if value < least {
                        *least = *value;
                        *kept = row;
                    }
                }
            }
        }
    }
}

struct CountBelow<'s> {
    values: &'s [f64],
    bound: f64,
}

impl WithSimd for CountBelow<'_> {
    type Output = (usize, usize);

    #[inline(always)]
    fn with_simd<S: Simd>(self, _simd: S) -> (usize, usize) {
        let (mut below, mut up_to) = (0_u64, 0_u64);
        for &value in self.values {
            below += u64::from(value < self.bound);
            up_to += u64::from(value <= self.bound);
        }
        (below as usize, up_to as usize)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn vectors_give_the_plain_loop_to_the_bit() {
        for count in [1, 7, 16, 33, 100] {
            let axes = 5;
            let wave = |i: usize| (i as f64 * 1.37).sin() * 10.0;
            let point: Vec<f64> = (0..axes).map(wave).collect();
            let others: Vec<f64> = (0..axes * count).map(|i| wave(i + 3)).collect();
            let mut out = vec![f64::NAN; count];
            let norms: Vec<f64> = (0..count)
                .map(|j| (0..axes).map(|k| others[k * count + j].powi(2)).sum())
                .collect();
            squared_distances(&point, &others, &norms, &mut out);
            let own: f64 = point.iter().map(|x| x * x).sum();
            for (j, found) in out.iter().enumerate() {
                let mut sum = own + norms[j];
                let mut plain = 0.0;
                for (axis, x) in point.iter().enumerate() {
                    sum += -2.0 * x * others[axis * count + j];
                    plain += (x - others[axis * count + j]).powi(2);
                }
                assert_eq!(*found, sum);
                assert!((found - plain).abs() < 1e-12 * (own + norms[j]));
            }
            let plain = (0..count).min_by(|&i, &j| out[i].total_cmp(&out[j]));
            assert_eq!(first_least(&out), plain);
            let bound = out[count / 2];
            assert_eq!(
                count_below(&out, bound),
                (
                    out.iter().filter(|x| **x < bound).count(),
                    out.iter().filter(|x| **x <= bound).count()
                )
            );
        }
    }

    #[test]
    fn the_least_difference_is_that_of_the_plain_loop() {
        for count in [1, 15, 16, 50] {
            let wave = |i: usize| (i as f64 * 2.1).sin();
            let values: Vec<f64> = (0..count).map(wave).collect();
            let others: Vec<f64> = (0..count).map(|i| wave(3 * i + 1)).collect();
            let plain = (0..count)
                .map(|i| (values[i] - others[i], i))
                .min_by(|x, y| x.0.total_cmp(&y.0));
            assert_eq!(Some(least_difference(&values, &others)), plain);
        }
        assert_eq!(least_difference(&[2.0, 1.0, 1.0], &[0.0; 3]), (1.0, 1));
    }

    #[test]
    fn the_first_of_equals_is_kept() {
        assert_eq!(first_least(&[2.0, 1.0, 1.0]), Some(1));
        assert_eq!(first_least(&[f64::INFINITY]), None);
        let (mut least, mut rows) = (vec![f64::INFINITY; 2], vec![0; 2]);
        keep_least(1, &[3.0, 2.0], &mut least, &mut rows);
        keep_least(2, &[3.0, 1.0], &mut least, &mut rows);
        assert_eq!((least, rows), (vec![3.0, 1.0], vec![1, 2]));
    }
}
