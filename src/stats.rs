//! Distributions: normal, Student t, chi-squared and F, with fractional degrees of freedom.
//!
//! The incomplete beta and gamma functions and the densities are those of statrs. The tails of F are taken from the beta function
//! directly: statrs forms 1 − x first, which costs ten digits where x is near 1. Quantiles are our own Newton steps on the
//! distribution function, kept inside a bracket. All agree with tables computed in 40-digit arithmetic to 1e-10 relative
//! (`fixtures/reference/stats/`).

use statrs::distribution::{
    ChiSquared, Continuous, ContinuousCDF, FisherSnedecor, Normal, StudentsT,
};
use statrs::function::beta::checked_beta_reg;

/// Steps after which a quantile is as exact as its distribution function: bisection alone would halve 1e300 to nothing in these.
const MAX_STEPS: usize = 200;

/// Standard normal distribution function Φ(z).
#[must_use]
pub fn normal_cdf(z: f64) -> f64 {
    Normal::standard().cdf(z)
}

/// Standard normal quantile z of a probability p in 0…1; ∓∞ at the ends and beyond.
#[must_use]
pub fn normal_quantile(p: f64) -> f64 {
    let normal = Normal::standard();
    // The upper half from the survival function: 1 − p keeps the digits that p itself has.
    if p > 0.5 {
        return -lower_quantile(1.0 - p, |z| normal.cdf(z), |z| normal.pdf(z), 0.0);
    }
    lower_quantile(p, |z| normal.cdf(z), |z| normal.pdf(z), 0.0)
}

/// Probability that |z| of a standard normal variable is exceeded: 2(1 − Φ(|z|)), exact in the far tail.
#[must_use]
pub fn normal_two_sided(z: f64) -> f64 {
    2.0 * Normal::standard().cdf(-z.abs())
}

/// Degrees of freedom from which Student's t is taken as normal: the quantiles differ by z(z² + 1)/(4ν), 1e-7 of 2 here, while ν/(ν + t²)
/// of the exact form keeps fewer and fewer digits of t.
const NORMAL_FROM_NU: f64 = 1e7;

/// Student's t distribution function with `nu` > 0 degrees of freedom (fractional ones too).
///
/// Without degrees of freedom (`nu` ≤ 0) nothing is known of t: ½ for every t. An infinite `nu` is not taken here.
#[must_use]
pub fn student_t_cdf(t: f64, nu: f64) -> f64 {
    if nu > NORMAL_FROM_NU {
        return Normal::standard().cdf(t);
    }
    let outside = 0.5 * checked_beta_reg(nu / 2.0, 0.5, nu / (nu + t * t)).unwrap_or(1.0);
    if t <= 0.0 { outside } else { 1.0 - outside }
}

/// Student's t quantile of probability p in 0…1 with `nu` degrees of freedom.
///
/// Without degrees of freedom (`nu` ≤ 0) the quantile is infinite, with the sign of p − ½: the honest coverage factor of a
/// scatter that was never seen. An infinite `nu` gives the normal quantile.
#[must_use]
pub fn student_t_quantile(p: f64, nu: f64) -> f64 {
    if nu > NORMAL_FROM_NU {
        return normal_quantile(p);
    }
    let Ok(dist) = StudentsT::new(0.0, 1.0, nu) else {
        return f64::INFINITY.copysign(p - 0.5);
    };
    let (tail, sign) = if p > 0.5 { (1.0 - p, -1.0) } else { (p, 1.0) };
    sign * lower_quantile(tail, |t| student_t_cdf(t, nu), |t| dist.pdf(t), 0.0)
}

/// Coverage factor k of a two-sided interval ±k·u with coverage `p` (0.95) and `nu` degrees of freedom (GUM G.3).
///
/// # Source
/// [JCGM 100](crate::sources::Gum), annex G.
#[must_use]
pub fn coverage_factor(p: f64, nu: f64) -> f64 {
    -student_t_quantile(0.5 * (1.0 - p), nu)
}

/// χ² distribution function with `nu` > 0 degrees of freedom; 0 where x ≤ 0 or `nu` ≤ 0.
#[must_use]
pub fn chi_squared_cdf(x: f64, nu: f64) -> f64 {
    ChiSquared::new(nu).map_or(0.0, |dist| dist.cdf(x))
}

/// χ² quantile of probability p in 0…1 with `nu` > 0 degrees of freedom; 0 where `nu` ≤ 0.
#[must_use]
pub fn chi_squared_quantile(p: f64, nu: f64) -> f64 {
    ChiSquared::new(nu).map_or(0.0, |dist| {
        positive_quantile(p, |x| dist.cdf(x), |x| dist.sf(x), |x| dist.pdf(x))
    })
}

/// F distribution function with `nu1` and `nu2` > 0 degrees of freedom; 0 where x ≤ 0 or a ν ≤ 0.
#[must_use]
pub fn f_cdf(x: f64, nu1: f64, nu2: f64) -> f64 {
    checked_beta_reg(
        nu1 / 2.0,
        nu2 / 2.0,
        nu1 * x.max(0.0) / (nu1 * x.max(0.0) + nu2),
    )
    .unwrap_or(0.0)
}

/// Probability that F is exceeded, exact in the far tail; 1 where x ≤ 0 or a ν ≤ 0.
#[must_use]
pub fn f_upper(x: f64, nu1: f64, nu2: f64) -> f64 {
    checked_beta_reg(nu2 / 2.0, nu1 / 2.0, nu2 / (nu1 * x.max(0.0) + nu2)).unwrap_or(1.0)
}

/// F quantile of probability p in 0…1 with `nu1` and `nu2` > 0 degrees of freedom; 0 where a ν ≤ 0.
#[must_use]
pub fn f_quantile(p: f64, nu1: f64, nu2: f64) -> f64 {
    let pdf = |x| FisherSnedecor::new(nu1, nu2).map(|dist| dist.pdf(x));
    if pdf(1.0).is_err() {
        return 0.0;
    }
    positive_quantile(
        p,
        |x| f_cdf(x, nu1, nu2),
        |x| f_upper(x, nu1, nu2),
        |x| pdf(x).unwrap_or(0.0),
    )
}

/// Quantile of a distribution on 0…∞, solved in ln x, where its tails are short.
fn positive_quantile(
    p: f64,
    cdf: impl Fn(f64) -> f64,
    upper: impl Fn(f64) -> f64,
    pdf: impl Fn(f64) -> f64,
) -> f64 {
    if p > 0.5 {
        return (-lower_quantile(
            1.0 - p,
            |y| upper((-y).exp()),
            |y| pdf((-y).exp()) * (-y).exp(),
            0.0,
        ))
        .exp();
    }
    lower_quantile(p, |y| cdf(y.exp()), |y| pdf(y.exp()) * y.exp(), 0.0).exp()
}

/// Solves cdf(x) = p for an increasing `cdf` with derivative `pdf`, by Newton steps on ln cdf inside a bracket grown from `start`.
///
/// The logarithm makes the step useful far out in the tail, where cdf itself is flat.
fn lower_quantile(p: f64, cdf: impl Fn(f64) -> f64, pdf: impl Fn(f64) -> f64, start: f64) -> f64 {
    if p <= 0.0 {
        return f64::NEG_INFINITY;
    }
    if p >= 1.0 {
        return f64::INFINITY;
    }
    let (mut low, mut high) = (start - 1.0, start + 1.0);
    while cdf(low) > p && low > f64::MIN / 4.0 {
        low -= high - low;
    }
    while cdf(high) < p && high < f64::MAX / 4.0 {
        high += high - low;
    }
    let mut x = 0.5 * (low + high);
    for _ in 0..MAX_STEPS {
        let at = cdf(x);
        if at < p {
            low = x;
        } else {
            high = x;
        }
        let newton = x - at / pdf(x) * (at / p).ln();
        let next = if newton > low && newton < high {
            newton
        } else {
            0.5 * (low + high)
        };
        if (next - x).abs() <= 2.0 * f64::EPSILON * next.abs() {
            return next;
        }
        x = next;
    }
    x
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_scatter_known_ever_better_approaches_the_normal_factor_and_stays_there() {
        let normal = coverage_factor(0.95, f64::INFINITY);
        let mut last = f64::INFINITY;
        for power in 0..300 {
            let k = coverage_factor(0.95, 10_f64.powi(power));
            assert!(k >= normal - 1e-9 && k <= last + 1e-9, "10^{power}: {k}");
            last = k;
        }
        assert!((last - 1.959_963_984_540_054).abs() < 1e-9);
    }

    use std::error::Error;

    /// The check values are printed to 13 digits; a tail of 1e-9 given as p = 0.999999999 has 7 of its own.
    const TABLE_TOL_REL: f64 = 1e-10;

    type Outcome = Result<(), Box<dyn Error>>;

    /// Rows of a table as text cells, header first.
    fn table(text: &str) -> Vec<Vec<&str>> {
        text.lines().map(|line| line.split(',').collect()).collect()
    }

    fn assert_close(got: f64, want: f64, what: &str) {
        assert!(
            (got / want - 1.0).abs() <= TABLE_TOL_REL,
            "{what}: got {got:e}, want {want:e}"
        );
    }

    #[test]
    fn student_t_matches_the_table_for_whole_and_fractional_degrees_of_freedom() -> Outcome {
        let rows = table(include_str!(
            "../fixtures/reference/stats/student_t_two_sided.csv"
        ));
        for row in &rows[1..] {
            let nu = if row[0] == "inf" {
                f64::INFINITY
            } else {
                row[0].parse()?
            };
            for (head, cell) in rows[0].iter().zip(row).skip(1) {
                let p: f64 = head.trim_start_matches("p_").parse()?;
                let want: f64 = cell.parse()?;
                assert_close(
                    coverage_factor(p, nu),
                    want,
                    &format!("t, p = {p}, nu = {nu}"),
                );
                if nu.is_finite() {
                    assert_close(
                        student_t_cdf(want, nu) - student_t_cdf(-want, nu),
                        p,
                        "and back",
                    );
                }
            }
        }
        Ok(())
    }

    #[test]
    fn chi_squared_matches_the_table() -> Outcome {
        let rows = table(include_str!(
            "../fixtures/reference/stats/chi2_quantiles.csv"
        ));
        for row in &rows[1..] {
            for (head, cell) in rows[0].iter().zip(row).skip(1) {
                let (p, nu): (f64, f64) = (head.trim_start_matches("p_").parse()?, row[0].parse()?);
                assert_close(
                    chi_squared_quantile(p, nu),
                    cell.parse()?,
                    &format!("chi2, p = {p}, nu = {nu}"),
                );
                assert_close(chi_squared_cdf(cell.parse()?, nu), p, "and back");
            }
        }
        Ok(())
    }

    #[test]
    fn f_matches_the_table() -> Outcome {
        for row in &table(include_str!("../fixtures/reference/stats/f_quantiles.csv"))[1..] {
            let cells: Vec<f64> = row
                .iter()
                .map(|cell| cell.parse())
                .collect::<Result<_, _>>()?;
            let [p, nu1, nu2, want] = cells[..] else {
                return Err("four columns".into());
            };
            assert_close(
                f_quantile(p, nu1, nu2),
                want,
                &format!("F, p = {p}, nu = {nu1}, {nu2}"),
            );
            assert_close(f_cdf(want, nu1, nu2), p, "and back");
            assert_close(1.0 - f_upper(want, nu1, nu2), p, "from above");
        }
        Ok(())
    }

    #[test]
    fn normal_matches_the_table() -> Outcome {
        for row in &table(include_str!(
            "../fixtures/reference/stats/normal_quantiles.csv"
        ))[1..]
        {
            let (p, want): (f64, f64) = (row[0].parse()?, row[1].parse()?);
            // As a double, 0.999999999 has lost seven digits of its tail; the table means the decimal number.
            let tail = ((1.0 - p) * 1e12).round() / 1e12;
            assert_close(normal_quantile(tail), -want, &format!("z, tail = {tail}"));
            assert!(
                (normal_quantile(p) / want - 1.0).abs() < 1e-9,
                "upper half, p = {p}"
            );
            assert_close(normal_cdf(want), p, "and back");
            assert!((normal_two_sided(want) / (2.0 * (1.0 - p)) - 1.0).abs() < 1e-6);
        }
        Ok(())
    }

    #[test]
    fn without_degrees_of_freedom_the_coverage_factor_is_infinite() {
        assert!(coverage_factor(0.95, 0.0).is_infinite());
        assert!(coverage_factor(0.95, -1.0) > 0.0);
    }
}
