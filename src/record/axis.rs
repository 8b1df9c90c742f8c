//! An axis of a plot: its words, its ends and round ticks, linear or logarithmic.

use std::ops::Range;

use plotters::coord::ranged1d::{DefaultFormatting, KeyPointHint, Ranged};

use super::rounding::fixed;

/// An axis: its words, its ends and its ticks.
#[derive(Clone, Debug)]
pub(super) struct Axis {
    label: String,
    range: Range<f64>,
    ticks: Vec<f64>,
    decimals: usize,
    logarithmic: bool,
}

impl Axis {
    /// A linear axis that holds `low` and `high`, with about `n_ticks` round ticks and a margin at both ends.
    pub(super) fn linear(label: impl Into<String>, low: f64, high: f64, n_ticks: u32) -> Self {
        let (low, high) = widened(low, high);
        let step = round_step((high - low) / f64::from(n_ticks.max(1)));
        Self {
            label: label.into(),
            range: low..high,
            ticks: multiples(low, high, step),
            decimals: decimals_of(step),
            logarithmic: false,
        }
    }

    /// The same without a margin: for time, where the plots stand above one another.
    pub(super) fn tight(label: impl Into<String>, low: f64, high: f64, n_ticks: u32) -> Self {
        let high = if high > low { high } else { low + 1.0 };
        let step = round_step((high - low) / f64::from(n_ticks.max(1)));
        Self {
            label: label.into(),
            range: low..high,
            ticks: multiples(low, high, step),
            decimals: decimals_of(step),
            logarithmic: false,
        }
    }

    /// A logarithmic axis for positive values.
    ///
    /// Ticks at 1, 2 and 5 of each power of ten; where fewer than three fall inside, at round values instead.
    pub(super) fn logarithmic(label: impl Into<String>, low: f64, high: f64) -> Self {
        let (log_low, log_high) = widened(low.log10(), high.log10());
        let (low, high) = (10f64.powf(log_low), 10f64.powf(log_high));
        let mut values = one_two_five(low, high);
        let mut decimals = decimals_of(values.first().copied().unwrap_or(1.0));
        if values.len() < 3 || values.len() > 12 {
            let step = round_step((high - low) / 5.0);
            if values.len() < 3 {
                values = multiples(low, high, step);
                decimals = decimals_of(step);
            } else {
                values.retain(|value| value.log10().fract().abs() < 1e-9);
            }
        }
        Self {
            label: label.into(),
            range: low..high,
            ticks: values,
            decimals,
            logarithmic: true,
        }
    }

    /// The words beside the axis.
    pub(super) fn label(&self) -> &str {
        &self.label
    }

    /// A tick's text, with as many decimals as the ticks need.
    pub(super) fn text(&self, value: f64) -> String {
        fixed(value, self.decimals).replace('-', "−")
    }

    /// Where a value stands along the axis, in any unit that grows evenly on paper.
    fn place(&self, value: f64) -> f64 {
        if self.logarithmic {
            value.log10()
        } else {
            value
        }
    }
}

impl Ranged for Axis {
    type FormatOption = DefaultFormatting;
    type ValueType = f64;

    fn map(&self, value: &f64, limit: (i32, i32)) -> i32 {
        let (start, end) = (self.place(self.range.start), self.place(self.range.end));
        let share = (self.place(*value) - start) / (end - start);
        #[expect(
            clippy::cast_possible_truncation,
            reason = "a place on a canvas of some thousand pixels; `as` saturates"
        )]
        let offset = (share * f64::from(limit.1 - limit.0)).round() as i32;
        limit.0.saturating_add(offset)
    }

    fn key_points<Hint: KeyPointHint>(&self, hint: Hint) -> Vec<f64> {
        // The crate asks once for bold and once for light grid lines; we have only the former.
        if hint.weight().allow_light_points() {
            Vec::new()
        } else {
            self.ticks.clone()
        }
    }

    fn range(&self) -> Range<f64> {
        self.range.clone()
    }
}

/// A range with 6 % to spare at both ends; a range of no width, or not finite, becomes one of some width.
fn widened(low: f64, high: f64) -> (f64, f64) {
    if !(low.is_finite() && high.is_finite()) {
        return (0.0, 1.0);
    }
    let width = (high - low)
        .max(1e-9 * high.abs().max(low.abs()))
        .max(f64::MIN_POSITIVE.sqrt());
    (low - 0.06 * width, high + 0.06 * width)
}

/// The nearest of 1, 2, 5 times a power of ten.
fn round_step(raw: f64) -> f64 {
    let power = 10f64.powf(raw.log10().floor());
    let nearest = match raw / power {
        digit if digit < 1.5 => 1.0,
        digit if digit < 3.5 => 2.0,
        digit if digit < 7.5 => 5.0,
        _ => 10.0,
    };
    nearest * power
}

fn multiples(low: f64, high: f64, step: f64) -> Vec<f64> {
    let first = (low / step).ceil();
    (0..64u32)
        .map(|i| (first + f64::from(i)) * step)
        .take_while(|&tick| tick <= high)
        .collect()
}

/// 1, 2 and 5 times the powers of ten between two positive values.
fn one_two_five(low: f64, high: f64) -> Vec<f64> {
    let first = low.log10().floor();
    (0..20u32)
        .map(|i| 10f64.powf(first + f64::from(i)))
        .take_while(|&power| power <= high)
        .flat_map(|power| [1.0, 2.0, 5.0].map(|m| m * power))
        .filter(|&value| value >= low && value <= high)
        .collect()
}

/// The decimals that show a step of 1, 2 or 5 times a power of ten.
fn decimals_of(step: f64) -> usize {
    (0..12usize)
        .find(|&d| step >= 10f64.powi(-i32::try_from(d).unwrap_or(0)) * (1.0 - 1e-9))
        .unwrap_or(12)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_few() {
        let axis = Axis::tight("time, s", 0.0, 30.0, 8);
        assert_eq!(axis.ticks, [0.0, 5.0, 10.0, 15.0, 20.0, 25.0, 30.0]);
        assert_eq!(axis.text(5.0), "5");
        let axis = Axis::linear("x, mm", -0.031, 0.029, 6);
        assert_eq!(
            axis.ticks.iter().map(|&t| axis.text(t)).collect::<Vec<_>>(),
            ["−0.03", "−0.02", "−0.01", "0.00", "0.01", "0.02", "0.03"]
        );
    }

    #[test]
    fn a_logarithmic_axis_has_ticks_within_less_than_a_decade() {
        let wide = Axis::logarithmic("amplitude, mm", 0.9, 120.0);
        assert_eq!(
            wide.ticks.iter().map(|&t| wide.text(t)).collect::<Vec<_>>(),
            ["1", "2", "5", "10", "20", "50", "100"]
        );
        let narrow = Axis::logarithmic("amplitude, mm", 71.0, 84.0);
        assert!(narrow.ticks.len() >= 3, "{:?}", narrow.ticks);
        assert_eq!(narrow.text(narrow.ticks[0]), "72", "{narrow:?}");
    }
}
