//! The interval of the decay rate by profile likelihood.
//!
//! In: the weighted readings and their least-squares sinusoid. Out: the two γ at which the smallest sum of squares over all other
//! parameters has grown by t²·s²·(enlargement): the ends of the interval, unequal where the sum is no parabola in γ.

use super::least_squares::{Patience, minimise, refine};
use super::readings::Readings;
use super::sinusoid::{Sinusoid, SinusoidProblem};

/// An end is found when the distance is right to this part of the limit: a ten-thousandth of the interval's width.
const DISTANCE_TOL_REL: f64 = 1e-4;
/// Secant steps for each end; two suffice where the sum of squares is nearly a parabola.
const MAX_STEPS: usize = 20;

/// What the profile is taken of.
#[derive(Debug)]
pub(super) struct Profile<'a> {
    /// The used readings.
    pub(super) readings: &'a Readings,
    /// 1/σ of each, m⁻¹.
    pub(super) weight_per_m: &'a [f64],
    /// The minimum.
    pub(super) best: Sinusoid,
    /// Σ z² there.
    pub(super) sum_of_squares: f64,
    /// Variance of z, enlarged for autocorrelation.
    pub(super) variance: f64,
    /// ∂(A, φ, γ, ω, c)/∂γ along the profile: the covariance's γ column over the variance of γ.
    pub(super) slope: [f64; 5],
    /// Standard uncertainty of γ, s⁻¹.
    pub(super) u_decay_rate_per_s: f64,
}

impl Profile<'_> {
    /// Ends of {γ : (SS(γ) − SS_min)/variance ≤ t²}, s⁻¹.
    ///
    /// An end that cannot be followed (residuals that are rounding errors, a record that no longer determines the rest) is γ ∓ t·u.
    ///
    /// # Source
    /// [Venzon and Moolgavkar 1988](crate::sources::VenzonMoolgavkar88), by root finding on each end.
    pub(super) fn interval(&self, t: f64) -> [f64; 2] {
        let gamma = self.best.decay_rate_per_s;
        [-t, t].map(|limit| {
            self.end(limit)
                .unwrap_or(gamma + limit * self.u_decay_rate_per_s)
        })
    }

    /// The γ at the signed distance `limit`. The distance is nearly linear in γ, so a secant from the quadratic end is quick.
    fn end(&self, limit: f64) -> Option<f64> {
        let gamma = self.best.decay_rate_per_s;
        let mut start = self.best;
        let (mut near, mut near_distance) = (gamma, 0.0);
        let mut at = gamma + limit * self.u_decay_rate_per_s;
        for _ in 0..MAX_STEPS {
            let (distance, there) = self.distance(at, start)?;
            if (distance / limit - 1.0).abs() < DISTANCE_TOL_REL {
                return Some(at);
            }
            let next = at + (limit - distance) * (at - near) / (distance - near_distance);
            if !next.is_finite() || (next - gamma) * limit <= 0.0 {
                return None;
            }
            start = there;
            (near, near_distance, at) = (at, distance, next);
        }
        None
    }

    /// Signed root of the growth of the sum of squares at a held γ, in standard deviations, and the sinusoid there.
    fn distance(&self, gamma: f64, start: Sinusoid) -> Option<(f64, Sinusoid)> {
        let problem = SinusoidProblem {
            readings: self.readings,
            weight_per_m: self.weight_per_m,
            held_decay_rate_per_s: Some(gamma),
        };
        let shift = gamma - start.decay_rate_per_s;
        let from = start.parameters();
        let free =
            problem.free_parameters(std::array::from_fn(|i| from[i] + shift * self.slope[i]));
        let scale = problem.free_parameters(self.best.scale(self.readings.span_s()));
        let solution = refine(&problem, &free)
            .or_else(|_| minimise(&problem, &free, Some(&scale), Patience::Short))
            .ok()?;
        let growth = solution.sum_of_squares - self.sum_of_squares;
        let distance = (growth.max(0.0) / self.variance)
            .sqrt()
            .copysign(gamma - self.best.decay_rate_per_s);
        distance.is_finite().then(|| {
            (
                distance,
                Sinusoid::from_parameters(problem.all_parameters(&solution.parameters)),
            )
        })
    }
}

#[cfg(test)]
#[allow(clippy::expect_used, reason = "a failed expectation is a failed test")]
mod tests {
    use crate::motion::{PositionRecord, fit};
    use crate::stats::coverage_factor;
    use std::f64::consts::TAU;

    fn record(gamma: f64, n: u32, error_m: f64) -> Vec<PositionRecord> {
        let at = |i: u32| {
            let t_s = f64::from(i) / 20.0;
            let error = if (i * i * 7 + i * 3) % 11 < 5 {
                error_m
            } else {
                -error_m
            };
            let x_m = 0.1 * (-gamma * t_s).exp() * (TAU / 1.2 * t_s).cos() + error;
            PositionRecord {
                t_s,
                u_t_s: 0.0,
                x_m,
                u_x_m: 1e-3,
            }
        };
        (0..n).map(at).collect()
    }

    #[test]
    fn a_well_known_decay_rate_has_the_quadratic_interval() {
        let fit = fit(&record(0.02, 600, 1e-5)).expect("a motion");
        let half = coverage_factor(0.95, fit.degrees_of_freedom) * fit.covariance[2][2].sqrt();
        for (end, sign) in fit.decay_rate_interval95_per_s.into_iter().zip([-1.0, 1.0]) {
            assert!(
                ((end - fit.decay_rate_per_s) * sign / half - 1.0).abs() < 1e-3,
                "{end}"
            );
        }
    }

    #[test]
    fn a_badly_known_strong_decay_reaches_further_up_than_down() {
        // Of a motion that is gone after a cycle a faster decay can hardly be told from a still faster one.
        let fit = fit(&record(0.8, 80, 8e-3)).expect("a motion");
        let [low, high] = fit.decay_rate_interval95_per_s;
        let (down, up) = (fit.decay_rate_per_s - low, high - fit.decay_rate_per_s);
        assert!(up > 1.1 * down && low > 0.0, "down {down}, up {up}");
    }
}
