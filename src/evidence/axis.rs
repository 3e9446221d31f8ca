//! Scales and ticks.

use super::number::grouped;

/// A linear scale from values to places in a figure.
#[derive(Debug, Clone, Copy)]
pub(super) struct Scale {
    low: f64,
    high: f64,
    start: f64,
    end: f64,
}

impl Scale {
    /// Values `low..high` onto places `start..end`. Equal values are spread by one unit, so that the scale never divides by 0.
    pub(super) fn new((low, high): (f64, f64), (start, end): (f64, f64)) -> Self {
        let (low, high) = if high > low { (low, high) } else { (low - 0.5, low + 0.5) };
        Self { low, high, start, end }
    }

    /// The place of a value; outside the scale, its nearer end.
    pub(super) fn at(&self, value: f64) -> f64 {
        let position = ((value - self.low) / (self.high - self.low)).clamp(0.0, 1.0);
        self.start + position * (self.end - self.start)
    }

    /// About `wanted` round values on the scale, each with its label.
    pub(super) fn ticks(&self, wanted: usize) -> Vec<(f64, String)> {
        ticks(self.low, self.high, wanted)
    }
}

/// The range of all finite numbers among `values`, widened by `margin` of itself on both sides.
pub(super) fn range(values: impl IntoIterator<Item = f64>, margin: f64) -> (f64, f64) {
    let (low, high) = values
        .into_iter()
        .filter(|value| value.is_finite())
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| (low.min(value), high.max(value)));
    if low > high {
        return (0.0, 1.0);
    }
    let by = if high > low { (high - low) * margin } else { low.abs().max(1.0) * margin };
    (low - by, high + by)
}

/// A round step (1, 2 or 5 times a power of ten) that divides `span` into about `wanted` parts.
pub(super) fn round_step(span: f64, wanted: usize) -> f64 {
    let rough = span / wanted.max(1) as f64;
    let power = 10f64.powf(rough.log10().floor());
    let times = rough / power;
    power * [1.0, 2.0, 5.0].into_iter().find(|&step| times <= step * 1.000_001).unwrap_or(10.0)
}

/// About `wanted` round values between `low` and `high`, each with a label that shows no more decimals than it needs.
fn ticks(low: f64, high: f64, wanted: usize) -> Vec<(f64, String)> {
    let step = round_step(high - low, wanted);
    if !(step.is_finite() && step > 0.0) {
        return Vec::new();
    }
    let decimals = (-(step * 1.000_001).log10().floor()).clamp(0.0, 12.0) as usize;
    let first = (low / step - 1e-9).ceil();
    let last = (high / step + 1e-9).floor();
    let count = (last - first).clamp(0.0, 1000.0) as usize;
    let label = |value: f64| match decimals {
        0 => grouped(value),
        _ if value < 0.0 => format!("\u{2212}{:.decimals$}", -value),
        _ => format!("{value:.decimals$}"),
    };
    // Adding zero turns a negative zero into a positive one.
    (0..=count).map(|index| (first + index as f64) * step + 0.0).map(|value| (value, label(value))).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_cover_the_range() {
        let labels = |low, high, wanted| ticks(low, high, wanted).into_iter().map(|(_, text)| text).collect::<Vec<_>>();
        assert_eq!(labels(0.47, 2.03, 4), ["0.5", "1.0", "1.5", "2.0"]);
        assert_eq!(labels(-0.2, 0.4, 3), ["\u{2212}0.2", "0.0", "0.2", "0.4"]);
        assert_eq!(labels(6_500.0, 6_548.0, 5), ["6,500", "6,510", "6,520", "6,530", "6,540"]);
        assert!(ticks(f64::NAN, 1.0, 4).is_empty());
    }

    #[test]
    fn scales_keep_inside_and_survive_one_value() {
        let scale = Scale::new((0.0, 10.0), (100.0, 0.0));
        assert_eq!((scale.at(2.5), scale.at(99.0)), (75.0, 0.0));
        assert_eq!(Scale::new((3.0, 3.0), (0.0, 10.0)).at(3.0), 5.0);
        assert_eq!(range([1.0, f64::NAN, 3.0], 0.5), (0.0, 4.0));
        assert_eq!(range([], 0.5), (0.0, 1.0));
    }
}
