//! Scales of figures: from values to lengths, with ticks at round numbers.

/// A scale from values to pixels.
#[derive(Debug, Clone, Copy)]
pub struct Scale {
    from: (f64, f64),
    to: (f64, f64),
    log: bool,
}

impl Scale {
    /// A linear scale from an interval of values to one of pixels.
    pub fn linear(from: (f64, f64), to: (f64, f64)) -> Scale {
        Scale {
            from,
            to,
            log: false,
        }
    }

    /// A logarithmic scale of positive values.
    pub fn log(from: (f64, f64), to: (f64, f64)) -> Scale {
        Scale {
            from: (from.0.ln(), from.1.ln()),
            to,
            log: true,
        }
    }

    /// Where a value lies.
    pub fn at(&self, value: f64) -> f64 {
        let value = if self.log { value.ln() } else { value };
        let span = self.from.1 - self.from.0;
        let share = if span == 0.0 {
            0.5
        } else {
            (value - self.from.0) / span
        };
        self.to.0 + share * (self.to.1 - self.to.0)
    }
}

/// The range of values with room around, never empty.
pub fn range(values: &[f64]) -> (f64, f64) {
    let finite = values.iter().copied().filter(|x| x.is_finite());
    let (low, high) = finite.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), x| {
        (low.min(x), high.max(x))
    });
    if low > high {
        return (-1.0, 1.0);
    }
    // Room for marks and labels at the edge.
    const ROOM: f64 = 0.06;
    let room = match (high - low) * ROOM {
        0.0 => low.abs().max(1.0) * ROOM,
        room => room,
    };
    (low - room, high + room)
}

/// About `count` round values within a range, and how they are written.
pub fn ticks((low, high): (f64, f64), count: usize) -> Vec<(f64, String)> {
    let rough = (high - low) / count.max(1) as f64;
    let power = rough.abs().log10().floor();
    if !power.is_finite() {
        return Vec::new();
    }
    let unit = 10f64.powi(power as i32);
    let step = [1.0, 2.0, 5.0, 10.0]
        .into_iter()
        .map(|factor| factor * unit)
        .find(|step| *step >= rough * 0.999)
        .unwrap_or(10.0 * unit);
    let digits = (-(step.log10().floor()) as i32).clamp(0, 12) as usize;
    let (first, last) = ((low / step).ceil() as i64, (high / step).floor() as i64);
    (first..=last)
        .map(|k| {
            let value = k as f64 * step;
            let text = format!("{:.digits$}", value + 0.0);
            // The sign that typesetting takes.
            (value, text.replace('-', "\u{2212}"))
        })
        .collect()
}

/// Ticks of a logarithmic scale of ranks from 1 to `last`: 1, 2, 5 times powers of ten, thinned out.
pub fn rank_ticks(last: usize) -> Vec<usize> {
    let mut ticks: Vec<usize> = (0..7u32)
        .flat_map(|power| [1, 2, 5].map(|k| k * 10usize.pow(power)))
        .take_while(|tick| *tick <= last)
        .collect();
    if ticks.len() > 8 {
        ticks.retain(|tick| {
            let digits = tick.to_string();
            digits.starts_with('1') || *tick == 5
        });
    }
    ticks
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_inside() {
        let found = ticks((-0.63, 0.72), 6);
        let texts: Vec<&str> = found.iter().map(|(_, text)| text.as_str()).collect();
        assert_eq!(texts, ["−0.5", "0.0", "0.5"]);
        for (value, _) in ticks((3e-5, 9e-5), 5) {
            assert!((3e-5..=9e-5).contains(&value));
        }
        assert!(ticks((1.0, 1.0), 5).is_empty());
    }

    #[test]
    fn a_range_is_never_empty() {
        for values in [&[][..], &[2.0], &[0.0, 0.0], &[f64::NAN]] {
            let (low, high) = range(values);
            assert!(low < high, "{values:?}");
        }
    }

    #[test]
    fn a_logarithmic_scale_spaces_factors_evenly() {
        let scale = Scale::log((1.0, 100.0), (0.0, 50.0));
        approx::assert_relative_eq!(scale.at(10.0), 25.0, max_relative = 1e-12);
    }
}
