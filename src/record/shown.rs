//! A quantity in words: value and expanded uncertainty where the interval is even, its ends or a bound where not.

use super::rounding::{bound, handy_unit, relative, rounded, significant};
use crate::uncertainty::Quantity;

/// Relative asymmetry of an interval above which one figure for both sides would mislead.
const ASYMMETRY_LIMIT: f64 = 0.05;

/// A quantity in the words of a report: the value, the expanded uncertainty or interval, and the relative one.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub(super) struct Shown {
    /// Value, `≥ …`, `≤ …` or `not determined`, without the unit.
    pub(super) value: String,
    /// `± U`, `from … to …`, or what kind of bound it is, without the unit.
    pub(super) spread: String,
    /// Unit as people write it; empty for a pure number.
    pub(super) unit: String,
    /// U over the value; empty for bounds and intervals.
    pub(super) relative: String,
}

impl Shown {
    /// On one line: `1.2346 ± 0.0012 s`, `≥ 120 s (95 %, one-sided)`.
    pub(super) fn line(&self) -> String {
        let Self {
            value,
            spread,
            unit,
            relative: _,
        } = self;
        let words = if spread.starts_with('±') {
            [value, spread, unit]
        } else {
            [value, unit, spread]
        };
        words
            .into_iter()
            .filter(|word| !word.is_empty())
            .map(String::as_str)
            .collect::<Vec<_>>()
            .join(" ")
    }
}

/// A quantity for reading; `percent` shows a pure number as per cent.
pub(super) fn shown(quantity: &Quantity, percent: bool) -> Shown {
    let [low, high] = quantity.interval95;
    let size = quantity.value.or(high).or(low).unwrap_or(0.0);
    let (factor, unit) = if percent {
        (100.0, "%".to_owned())
    } else {
        handy_unit(quantity.unit, size)
    };
    let scaled = |x: f64| x * factor;
    let (value, spread, relative) = match (
        quantity.value.map(scaled),
        low.map(scaled),
        high.map(scaled),
    ) {
        // A loss that may be nothing has the bound 0 below it: the upper end alone says something.
        (Some(_), Some(0.0), Some(high)) => (
            format!("≤ {}", bound(high, false)),
            "(95 %, one-sided)".to_owned(),
            String::new(),
        ),
        (Some(value), Some(low), Some(high)) => between(value, low, high),
        (None, Some(low), None) => (
            format!("≥ {}", bound(low, true)),
            "(95 %, one-sided)".to_owned(),
            String::new(),
        ),
        (None, None, Some(high)) => (
            format!("≤ {}", bound(high, false)),
            "(95 %, one-sided)".to_owned(),
            String::new(),
        ),
        (None, Some(low), Some(high)) => {
            let (low, high) = ends(low, high);
            (
                format!("{low} to {high}"),
                "(95 %)".to_owned(),
                String::new(),
            )
        }
        (Some(value), Some(low), None) => (
            significant(value, 3),
            format!("(≥ {})", bound(low, true)),
            String::new(),
        ),
        (Some(value), None, Some(high)) => (
            significant(value, 3),
            format!("(≤ {})", bound(high, false)),
            String::new(),
        ),
        (Some(value), None, None) => (significant(value, 6), String::new(), String::new()),
        (None, None, None) => {
            return Shown {
                value: "not determined".to_owned(),
                ..Shown::default()
            };
        }
    };
    Shown {
        value,
        spread,
        unit,
        relative,
    }
}

/// A value inside a two-sided interval: ± where the interval lies about it evenly, its ends where not.
fn between(value: f64, low: f64, high: f64) -> (String, String, String) {
    let half = 0.5 * (high - low);
    if (0.5 * (high + low) - value).abs() <= ASYMMETRY_LIMIT * half {
        let (text, u) = rounded(value, half);
        let ratio = if value.abs() > 0.0 {
            relative(half / value)
        } else {
            String::new()
        };
        (text, format!("± {u}"), ratio)
    } else {
        let (low_text, high_text) = ends(low, high);
        (
            rounded(value, half).0,
            format!("({low_text} to {high_text})"),
            String::new(),
        )
    }
}

/// The ends of an interval, rounded to two digits of its half-width.
fn ends(low: f64, high: f64) -> (String, String) {
    let half = 0.5 * (high - low);
    (rounded(low, half).0, rounded(high, half).0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounds_are_told_as_bounds() {
        let lower = Quantity {
            value: None,
            u: None,
            unit: "s",
            interval95: [Some(1237.9), None],
        };
        assert_eq!(
            shown(&lower, false).line(),
            "≥ 1230 s (95 %, one-sided)",
            "1240 would claim too much"
        );
        let upper = Quantity {
            value: None,
            u: None,
            unit: "1",
            interval95: [None, Some(0.012_31)],
        };
        assert_eq!(shown(&upper, false).line(), "≤ 0.0124 (95 %, one-sided)");
        let skew = Quantity {
            value: Some(100.0),
            u: Some(8.0),
            unit: "1",
            interval95: [Some(86.0), Some(122.0)],
        };
        assert_eq!(shown(&skew, false).line(), "100 (86 to 122)");
        let nothing = Quantity {
            value: None,
            u: None,
            unit: "s",
            interval95: [None, None],
        };
        assert_eq!(shown(&nothing, false).line(), "not determined");
    }

    #[test]
    fn lengths_below_a_metre_are_told_in_millimetres() {
        let amplitude = Quantity::symmetric(0.085_213, 0.000_06, 2.0, "m");
        assert_eq!(shown(&amplitude, false).line(), "85.21 ± 0.12 mm");
    }
}
