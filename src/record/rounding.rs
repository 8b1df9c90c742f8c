//! Numbers as people read them: rounded to what their uncertainty allows, in a unit of a handy size.

use crate::uncertainty::Quantity;

/// Beyond this many decimals a number is written with a power of ten.
const MAX_DECIMALS: i32 = 9;

/// Relative asymmetry of an interval above which one figure for both sides would mislead.
const ASYMMETRY_LIMIT: f64 = 0.05;

/// A number with a fixed count of decimals; never `-0`, empty where it is not finite.
pub(super) fn fixed(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return String::new();
    }
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(digits) if digits.chars().all(|c| c == '0' || c == '.') => digits.to_owned(),
        _ => text,
    }
}

/// The number of decimals that shows `size` to `digits` significant digits (negative: tens, hundreds, …).
fn decimals_for(size: f64, digits: i32) -> i32 {
    // Rounding can carry into a new digit (0.0996 → 0.10), so the exponent is read from the rounded text.
    let precision = usize::try_from(digits - 1).unwrap_or(0);
    let text = format!("{:.precision$e}", size.abs());
    let exponent: i32 = text.rsplit('e').next().and_then(|e| e.parse().ok()).unwrap_or(0);
    digits - 1 - exponent
}

/// A number at a given count of decimals, which may be negative, with a true minus sign.
fn at_decimals(value: f64, decimals: i32) -> String {
    let text = match usize::try_from(decimals) {
        Ok(_) if decimals > MAX_DECIMALS => format!("{value:.1e}"),
        Ok(places) => fixed(value, places),
        Err(_) => {
            let step = 10f64.powi(-decimals);
            fixed((value / step).round() * step, 0)
        }
    };
    text.replace('-', "−")
}

/// A value and its uncertainty, both rounded to two significant digits of the uncertainty (GUM 7.2.6).
///
/// Where the uncertainty is 0 or not finite the value comes with six significant digits and the second text is empty.
pub(super) fn rounded(value: f64, u: f64) -> (String, String) {
    if !(u.is_finite() && u > 0.0) {
        return (significant(value, 6), String::new());
    }
    let decimals = decimals_for(u, 2);
    (at_decimals(value, decimals), at_decimals(u, decimals))
}

/// A number to a count of significant digits; empty where it is not finite.
pub(super) fn significant(value: f64, digits: i32) -> String {
    if value.is_finite() { at_decimals(value, decimals_for(value, digits)) } else { String::new() }
}

/// A ratio in parts per million below 0.1 %, in per cent above.
pub(super) fn relative(ratio: f64) -> String {
    match ratio.abs() {
        size if !size.is_finite() => String::new(),
        size if size < 1e-3 => format!("{} ppm", significant(size * 1e6, 2)),
        size => format!("{} %", significant(size * 100.0, 2)),
    }
}

/// A unit of handy size for a quantity: the factor from its UCUM unit, and the name people write.
pub(super) fn handy_unit(unit: &str, size: f64) -> (f64, String) {
    let small = size.abs() < 1.0;
    match unit {
        "m" if small => (1e3, "mm".to_owned()),
        "J" if small => (1e3, "mJ".to_owned()),
        "1" => (1.0, String::new()),
        "s-1" => (1.0, "s⁻¹".to_owned()),
        "m-1" => (1.0, "m⁻¹".to_owned()),
        "m/s2" => (1.0, "m/s²".to_owned()),
        other => (1.0, other.to_owned()),
    }
}

/// A quantity in the words of a report: the value, the expanded uncertainty or interval, and the relative one.
#[derive(Clone, Debug, PartialEq, Eq)]
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
    /// On one line: `1.2346 ± 0.0012 s`.
    pub(super) fn line(&self) -> String {
        let gap = if self.unit.is_empty() || self.unit == "%" && self.value.is_empty() { "" } else { " " };
        format!("{} {}{gap}{}", self.value, self.spread, self.unit)
    }
}

/// A quantity for reading; `percent` shows a pure number as per cent.
pub(super) fn shown(quantity: &Quantity, percent: bool) -> Shown {
    let [low, high] = quantity.interval95;
    let size = quantity.value.or(high).or(low).unwrap_or(0.0);
    let (factor, unit) = if percent { (100.0, "%".to_owned()) } else { handy_unit(quantity.unit, size) };
    let scaled = |x: f64| x * factor;
    let (value, spread, relative) = match (quantity.value.map(scaled), low.map(scaled), high.map(scaled)) {
        (Some(value), Some(low), Some(high)) => between(value, low, high),
        (None, Some(low), None) => (format!("≥ {}", significant(low, 2)), "(95 %, one-sided)".to_owned(), String::new()),
        (None, None, Some(high)) => (format!("≤ {}", significant(high, 2)), "(95 %, one-sided)".to_owned(), String::new()),
        (None, Some(low), Some(high)) => {
            let (low, high) = ends(low, high);
            (format!("{low} to {high}"), "(95 %)".to_owned(), String::new())
        }
        (Some(value), Some(low), None) => (significant(value, 3), format!("(≥ {})", significant(low, 2)), String::new()),
        (Some(value), None, Some(high)) => (significant(value, 3), format!("(≤ {})", significant(high, 2)), String::new()),
        (Some(value), None, None) => (significant(value, 6), String::new(), String::new()),
        (None, None, None) => ("not determined".to_owned(), String::new(), String::new()),
    };
    Shown { value, spread, unit, relative }
}

/// A value inside a two-sided interval: ± where the interval lies about it evenly, its ends where not.
fn between(value: f64, low: f64, high: f64) -> (String, String, String) {
    let half = 0.5 * (high - low);
    if (0.5 * (high + low) - value).abs() <= ASYMMETRY_LIMIT * half {
        let (text, u) = rounded(value, half);
        let ratio = if value.abs() > 0.0 { relative(half / value) } else { String::new() };
        (text, format!("± {u}"), ratio)
    } else {
        let (low_text, high_text) = ends(low, high);
        (rounded(value, half).0, format!("({low_text} to {high_text})"), String::new())
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
    fn two_digits_of_the_uncertainty_decide() {
        assert_eq!(rounded(1.234_567, 0.001_23), ("1.2346".into(), "0.0012".into()));
        assert_eq!(rounded(12_345.0, 234.0), ("12350".into(), "230".into()));
        assert_eq!(rounded(0.5, 0.099_6), ("0.50".into(), "0.10".into()), "a carry must not leave three digits");
        assert_eq!(rounded(-0.000_01, 0.01), ("0.000".into(), "0.010".into()), "no minus zero");
        assert_eq!(rounded(-3.0, 0.5), ("−3.00".into(), "0.50".into()));
    }

    #[test]
    fn without_an_uncertainty_six_digits_are_shown() {
        assert_eq!(rounded(1.0 / 3.0, 0.0), ("0.333333".into(), String::new()));
        assert_eq!(rounded(1.0 / 3.0, f64::NAN).1, "");
    }

    #[test]
    fn small_ratios_are_told_in_parts_per_million() {
        assert_eq!(relative(12.5e-6), "13 ppm");
        assert_eq!(relative(0.0345), "3.5 %");
        assert_eq!(relative(f64::INFINITY), "");
    }

    #[test]
    fn bounds_are_told_as_bounds() {
        let bound = Quantity { value: None, u: None, unit: "1", interval95: [Some(1234.0), None] };
        assert_eq!(shown(&bound, false).line(), "≥ 1200 (95 %, one-sided)");
        let skew = Quantity { value: Some(100.0), u: Some(8.0), unit: "1", interval95: [Some(86.0), Some(122.0)] };
        assert_eq!(shown(&skew, false).line(), "100 (86 to 122)");
        let nothing = Quantity { value: None, u: None, unit: "s", interval95: [None, None] };
        assert_eq!(shown(&nothing, false).value, "not determined");
    }

    #[test]
    fn lengths_below_a_metre_are_told_in_millimetres() {
        let amplitude = Quantity::symmetric(0.085_213, 0.000_06, 2.0, "m");
        assert_eq!(shown(&amplitude, false).line(), "85.21 ± 0.12 mm");
    }
}
