//! Quantities with their uncertainty, and the budget behind one.
//!
//! The words are those of the [GUM](crate::sources::Gum): a standard uncertainty `u`, evaluated from the data
//! (type A) or from other knowledge (type B), a sensitivity, an effective number of degrees of freedom.

/// A result: an estimate, its standard uncertainty and the interval that holds the truth with 95 % confidence.
#[derive(Clone, Debug, PartialEq)]
pub struct Quantity {
    /// The estimate; `None` where only a bound can be given (Q when the loss may be zero).
    pub value: Option<f64>,
    /// Combined standard uncertainty, in the same unit; `None` where the estimate is, or where no figure would be honest.
    pub u: Option<f64>,
    /// The unit as a UCUM code (`s`, `m`, `1`, `s-1`, `rad/s`).
    pub unit: &'static str,
    /// Lower and upper end of the 95 % interval; an end that is `None` is open: the interval is a one-sided bound.
    pub interval95: [Option<f64>; 2],
}

impl Quantity {
    /// An estimate with a symmetric interval of half-width `coverage_factor · u`.
    #[must_use]
    pub fn symmetric(value: f64, u: f64, coverage_factor: f64, unit: &'static str) -> Self {
        let half = coverage_factor * u;
        Self {
            value: Some(value),
            u: Some(u),
            unit,
            interval95: [Some(value - half), Some(value + half)],
        }
    }
}

/// How a standard uncertainty was evaluated (GUM 4.2 and 4.3).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Evaluation {
    /// From the scatter of the data of this run.
    A,
    /// From other knowledge: a specification, a declared or an assumed limit of error.
    B,
}

/// One row of an uncertainty budget.
#[derive(Clone, Debug, PartialEq)]
pub struct BudgetRow {
    /// Key of the quantity the row belongs to, as in `result.json`: `period`, `amplitude`, …
    pub quantity: &'static str,
    /// What the uncertainty comes from, in plain words.
    pub source: String,
    /// Type A or type B.
    pub evaluation: Evaluation,
    /// Standard uncertainty of the input, in `unit`.
    pub u: f64,
    /// UCUM code of the input's unit.
    pub unit: &'static str,
    /// ∂(quantity)/∂(input), in the quantity's unit per `unit`.
    pub sensitivity: f64,
    /// |sensitivity| · u, in the quantity's unit.
    pub contribution: f64,
    /// Degrees of freedom behind `u`; `None` stands for infinitely many (a type B term taken as exactly known).
    pub degrees_of_freedom: Option<f64>,
    /// True where the figure is a default of ours, not the user's.
    pub assumed: bool,
}

impl BudgetRow {
    /// A row whose contribution is |sensitivity| · u.
    #[must_use]
    pub fn new(
        quantity: &'static str,
        source: impl Into<String>,
        evaluation: Evaluation,
        u: f64,
        unit: &'static str,
        sensitivity: f64,
    ) -> Self {
        Self {
            quantity,
            source: source.into(),
            evaluation,
            u,
            unit,
            sensitivity,
            contribution: (sensitivity * u).abs(),
            degrees_of_freedom: None,
            assumed: false,
        }
    }

    /// The same row with a finite number of degrees of freedom.
    #[must_use]
    pub fn with_degrees_of_freedom(mut self, nu: f64) -> Self {
        self.degrees_of_freedom = Some(nu);
        self
    }

    /// The same row, marked as resting on a default of ours.
    #[must_use]
    pub fn assumed(mut self, assumed: bool) -> Self {
        self.assumed = assumed;
        self
    }
}

/// Root sum of squares of the contributions: the combined standard uncertainty of independent inputs (GUM 5.1.2).
#[must_use]
pub fn combined(rows: &[BudgetRow]) -> f64 {
    rows.iter()
        .map(|row| row.contribution * row.contribution)
        .sum::<f64>()
        .sqrt()
}

/// Effective degrees of freedom of a combined uncertainty by Welch and Satterthwaite (GUM G.4.1); `None` for infinitely many.
///
/// ν_eff = u_c⁴ / Σ (contribution⁴ / ν), over the rows whose ν is finite.
#[must_use]
pub fn effective_degrees_of_freedom(rows: &[BudgetRow]) -> Option<f64> {
    let sum: f64 = rows
        .iter()
        .filter_map(|row| {
            row.degrees_of_freedom
                .map(|nu| row.contribution.powi(4) / nu)
        })
        .sum();
    (sum > 0.0).then(|| combined(rows).powi(4) / sum)
}

/// Significant digits that a standard uncertainty is given with (GUM 7.2.6: two at most).
const DIGITS_OF_U: i32 = 2;

/// A value rounded to two significant digits of its standard uncertainty: 1.234567 with u = 0.00012 is `1.23457`.
///
/// Both in the same unit; no exponent is used. Where `u` is 0 or not finite there is nothing to round to: six significant digits.
#[must_use]
pub fn rounded(value: f64, u: f64) -> String {
    if !(u.is_finite() && u > 0.0) {
        return significant(value, 6);
    }
    to_decimals(
        value,
        DIGITS_OF_U - 1 - exponent_after_rounding(u, DIGITS_OF_U),
    )
}

/// A value with `digits` ≥ 1 significant digits and no exponent: `significant(0.0123456, 3)` is `0.0123`.
#[must_use]
pub fn significant(value: f64, digits: i32) -> String {
    if value == 0.0 || !value.is_finite() {
        return value.abs().to_string();
    }
    to_decimals(value, digits - 1 - exponent_after_rounding(value, digits))
}

/// A value with `digits` significant digits and the prefix that puts one to three of them before the point: `12.5 µs`, `3.00 mm`.
///
/// * `unit`: a unit that takes prefixes (s, m, N); prefixes from pico to kilo.
#[must_use]
pub fn prefixed(value: f64, unit: &str, digits: i32) -> String {
    const PREFIXES: [(i32, &str); 6] = [
        (-12, "p"),
        (-9, "n"),
        (-6, "µ"),
        (-3, "m"),
        (0, ""),
        (3, "k"),
    ];
    if value == 0.0 || !value.is_finite() {
        return format!("{} {unit}", value.abs());
    }
    let exponent = (exponent_after_rounding(value, digits).div_euclid(3) * 3).clamp(-12, 3);
    let prefix = PREFIXES
        .iter()
        .find(|(power, _)| *power == exponent)
        .map_or("", |(_, prefix)| prefix);
    format!(
        "{} {prefix}{unit}",
        significant(value * 10_f64.powi(-exponent), digits)
    )
}

/// Decimal exponent of a value ≠ 0 rounded to `digits` significant digits: −1 for 0.0996 with two, which rounds to 0.10.
fn exponent_after_rounding(value: f64, digits: i32) -> i32 {
    let exponent = value.abs().log10().floor();
    let unit = 10_f64.powf(exponent - f64::from(digits - 1));
    let rounded_up =
        (value.abs() / unit).round() * unit >= 10_f64.powf(exponent + 1.0) * (1.0 - f64::EPSILON);
    #[expect(
        clippy::cast_possible_truncation,
        reason = "the exponent of a double is within ±324"
    )]
    let exponent = exponent as i32;
    exponent + i32::from(rounded_up)
}

/// A value with that many decimals; negative ones round to tens, hundreds, …
fn to_decimals(value: f64, decimals: i32) -> String {
    let shown = match usize::try_from(decimals) {
        Ok(decimals) => format!("{value:.decimals$}"),
        Err(_) => {
            let unit = 10_f64.powi(-decimals);
            format!("{:.0}", (value / unit).round() * unit)
        }
    };
    // Rounding −0.001 to two decimals must not leave a sign on zero.
    if shown.bytes().all(|b| matches!(b, b'-' | b'0' | b'.')) {
        shown.replace('-', "")
    } else {
        shown
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_value_shows_two_digits_of_its_uncertainty() {
        let cases = [
            (1.234567, 0.00012, "1.23457"),
            (1.2, 0.0996, "1.20"),
            (123_456.0, 1200.0, "123500"),
            (-0.0004, 0.03, "0.000"),
            (2.5e-5, 1.4e-6, "0.0000250"),
            (7.0, 0.0, "7.00000"),
        ];
        for (value, u, want) in cases {
            assert_eq!(rounded(value, u), want, "{value} with u = {u}");
        }
    }

    #[test]
    fn a_prefix_puts_one_to_three_digits_before_the_point() {
        let cases = [
            (1.25e-5, "s", "12.5 µs"),
            (9.999e-4, "s", "1.00 ms"),
            (0.12, "m", "120 mm"),
            (31.0, "N", "31.0 N"),
            (0.0, "s", "0 s"),
        ];
        for (value, unit, want) in cases {
            assert_eq!(prefixed(value, unit, 3), want);
        }
    }

    #[test]
    fn effective_degrees_of_freedom_of_the_guide_come_out() {
        // GUM G.4.1: relative u 0.25 %, 0.57 %, 0.82 % of a product, with 9, 4 and 14 degrees of freedom: u_c = 1.03 %, ν_eff = 19.0.
        let row = |u: f64, nu: f64| {
            BudgetRow::new("product", "input", Evaluation::A, u, "%", 1.0)
                .with_degrees_of_freedom(nu)
        };
        let rows = [row(0.25, 9.0), row(0.57, 4.0), row(0.82, 14.0)];
        assert!(
            (combined(&rows) - 1.03).abs() < 0.005,
            "u_c = {}",
            combined(&rows)
        );
        assert!(effective_degrees_of_freedom(&rows).is_some_and(|nu| (nu - 19.0).abs() < 0.05));
    }
}
