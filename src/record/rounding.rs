//! Numbers as people read them: rounded to what their uncertainty allows, in a unit of a handy size.

/// Beyond this many decimals a number is written with a power of ten.
const MAX_DECIMALS: i32 = 9;

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
    let exponent: i32 = text
        .rsplit('e')
        .next()
        .and_then(|e| e.parse().ok())
        .unwrap_or(0);
    digits - 1 - exponent
}

/// A number at a given count of decimals, which may be negative, with a true minus sign.
fn at_decimals(value: f64, decimals: i32) -> String {
    let text = match usize::try_from(decimals) {
        Ok(_) if decimals > MAX_DECIMALS => with_power_of_ten(value),
        Ok(places) => fixed(value, places),
        Err(_) => {
            let step = 10f64.powi(-decimals);
            fixed((value / step).round() * step, 0)
        }
    };
    text.replace('-', "−")
}

/// Two significant digits and a power of ten: 1.2 × 10⁻¹¹.
fn with_power_of_ten(value: f64) -> String {
    let text = format!("{value:.1e}");
    let Some((digits, exponent)) = text.split_once('e') else {
        return text;
    };
    let raised: String = exponent
        .chars()
        .map(|c| match c {
            '-' => '⁻',
            '1' => '¹',
            '2' => '²',
            '3' => '³',
            digit => digit
                .to_digit(10)
                .and_then(|d| char::from_u32(0x2070 + d))
                .unwrap_or(digit),
        })
        .collect();
    format!("{digits} × 10{raised}")
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

/// A value with its standard uncertainty named as such, so that nobody takes it for an expanded one.
pub(super) fn with_u(value: f64, u: f64) -> String {
    let (value, u) = rounded(value, u);
    if u.is_empty() {
        value
    } else {
        format!("{value} (u = {u})")
    }
}

/// A number to a count of significant digits; empty where it is not finite.
pub(super) fn significant(value: f64, digits: i32) -> String {
    if value.is_finite() {
        at_decimals(value, decimals_for(value, digits))
    } else {
        String::new()
    }
}

/// A one-sided bound to three significant digits, never rounded towards a stronger claim: a lower bound down, an upper one up.
pub(super) fn bound(value: f64, lower: bool) -> String {
    let decimals = decimals_for(value, 3);
    let step = 10f64.powi(-decimals);
    let steps = if lower {
        (value / step).floor()
    } else {
        (value / step).ceil()
    };
    at_decimals(steps * step, decimals)
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_digits_of_the_uncertainty_decide() {
        assert_eq!(
            rounded(1.234_567, 0.001_23),
            ("1.2346".into(), "0.0012".into())
        );
        assert_eq!(rounded(12_345.0, 234.0), ("12350".into(), "230".into()));
        assert_eq!(
            rounded(0.5, 0.099_6),
            ("0.50".into(), "0.10".into()),
            "a carry must not leave three digits"
        );
        assert_eq!(
            rounded(-0.000_01, 0.01),
            ("0.000".into(), "0.010".into()),
            "no minus zero"
        );
        assert_eq!(rounded(-3.0, 0.5), ("−3.00".into(), "0.50".into()));
    }

    #[test]
    fn without_an_uncertainty_six_digits_are_shown() {
        assert_eq!(rounded(1.0 / 3.0, 0.0), ("0.333333".into(), String::new()));
        assert_eq!(rounded(1.0 / 3.0, f64::NAN).1, "");
        assert_eq!(significant(-1.23e-12, 2), "−1.2 × 10⁻¹²");
    }

    #[test]
    fn small_ratios_are_told_in_parts_per_million() {
        assert_eq!(relative(12.6e-6), "13 ppm");
        assert_eq!(relative(0.0345), "3.5 %");
        assert_eq!(relative(f64::INFINITY), "");
    }
}
