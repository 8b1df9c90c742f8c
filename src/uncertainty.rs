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
