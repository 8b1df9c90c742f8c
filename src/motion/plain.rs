//! The plain weighted fit of the readings that belong to the motion, and the size and colour of the scatter about it.

use super::MotionError;
use super::laws::Weighted;
use super::least_squares::{
    LeastSquaresError, Patience, Solution, minimise, refine, tangent_basis,
};
use super::noise::{self, Enlargement, ResidualDiagnosis, Residue};
use super::readings::{Readings, median};
use super::refusal::{dense_enough, long_enough, stands_out};
use super::sinusoid::{Sinusoid, SinusoidProblem};
use std::f64::consts::TAU;

/// A leftover with neighbours correlated above this and above that part of the amplitude is a motion of another kind.
const APERIODIC_LAG1: f64 = 0.5;
/// Residuals below this part of the amplitude leave no doubt that the motion is a sinusoid.
const CLEAR_REL: f64 = 0.05;
/// See [`APERIODIC_LAG1`].
const APERIODIC_REL: f64 = 0.5;
/// Plain fits in which the weights follow the velocity; where times are certain one does.
const WEIGHT_ROUNDS: usize = 3;

/// The plain weighted fit of the used readings.
pub(super) struct Plain<'a> {
    pub(super) used: &'a Readings,
    pub(super) weight_per_m: Vec<f64>,
    pub(super) sinusoid: Sinusoid,
    pub(super) solution: Solution,
}

/// Size and colour of the scatter about the plain fit.
pub(super) struct Spread {
    pub(super) diagnosis: ResidualDiagnosis,
    pub(super) enlargement: Enlargement,
}

impl<'a> Plain<'a> {
    pub(super) fn new(used: &'a Readings, start: Sinusoid) -> Result<Self, LeastSquaresError> {
        let rounds = if used.u_t_s.iter().any(|u| *u > 0.0) {
            WEIGHT_ROUNDS
        } else {
            1
        };
        let mut fitted = Self::round(used, start)?;
        for _ in 1..rounds {
            fitted = Self::round(used, fitted.sinusoid)?;
        }
        // A negative amplitude was turned over in the sinusoid; the covariance must belong to the same signs.
        if fitted.solution.parameters.first().is_some_and(|a| *a < 0.0) {
            fitted = Self::round(used, fitted.sinusoid)?;
        }
        Ok(fitted)
    }

    fn round(used: &'a Readings, start: Sinusoid) -> Result<Self, LeastSquaresError> {
        let weight_per_m: Vec<f64> = start.sigma_m(used).iter().map(|s| 1.0 / s).collect();
        let problem = SinusoidProblem {
            readings: used,
            weight_per_m: &weight_per_m,
            held_decay_rate_per_s: None,
        };
        let solution = refine(&problem, &start.parameters()).or_else(|_| {
            minimise(
                &problem,
                &start.parameters(),
                Some(&start.scale(used.span_s())),
                Patience::Short,
            )
        })?;
        let sinusoid = Sinusoid::from_parameters(problem.all_parameters(&solution.parameters));
        Ok(Self {
            used,
            weight_per_m,
            sinusoid,
            solution,
        })
    }

    fn residual_m(&self) -> Vec<f64> {
        self.used
            .tau_s
            .iter()
            .zip(&self.used.x_m)
            .map(|(tau, x)| x - self.sinusoid.position_m(*tau))
            .collect()
    }

    pub(super) fn spread(&self) -> Result<Spread, LeastSquaresError> {
        let problem = SinusoidProblem {
            readings: self.used,
            weight_per_m: &self.weight_per_m,
            held_decay_rate_per_s: None,
        };
        let parameters = self.sinusoid.parameters();
        let basis = tangent_basis(&problem, &parameters).ok_or(LeastSquaresError::Singular {
            n_parameters: parameters.len(),
        })?;
        let residual_m = self.residual_m();
        let normalised: Vec<f64> = residual_m
            .iter()
            .zip(&self.weight_per_m)
            .map(|(r, w)| r * w)
            .collect();
        let residue = Residue {
            tau_s: &self.used.tau_s,
            normalised: &normalised,
            basis: &basis,
            variance: self.solution.residual_variance(),
            degrees_of_freedom: self.solution.degrees_of_freedom,
        };
        let enlargement = noise::enlargement(
            &residue,
            self.sinusoid.omega_rad_per_s,
            self.sinusoid.decay_rate_per_s,
        );
        let n = residual_m.len() as f64;
        let (runs_z, runs_p) = noise::runs_test(&normalised, median(normalised.clone()));
        let diagnosis = ResidualDiagnosis {
            rms_m: (residual_m.iter().map(|r| r * r).sum::<f64>() / n).sqrt(),
            autocorrelation_lag1: noise::autocorrelation_lag1(&normalised),
            variance_enlargement: enlargement.near_omega,
            n_used: residual_m.len(),
            n_effective: n / enlargement.near_omega,
            runs_z,
            runs_p,
        };
        Ok(Spread {
            diagnosis,
            enlargement,
        })
    }

    /// Refuses noise, and motion that is no oscillation.
    pub(super) fn is_a_motion(&self, spread: &Spread) -> Result<(), MotionError> {
        let (amplitude_m, residual_m) = (self.sinusoid.amplitude_m, spread.diagnosis.rms_m);
        let alike = spread.diagnosis.autocorrelation_lag1 > APERIODIC_LAG1;
        let significant = stands_out(
            self.solution.sum_of_squares / self.weighted_scatter(),
            self.used.len(),
            spread.diagnosis.n_effective,
        );
        // A sinusoid that leaves next to nothing is one, however few of the errors are independent.
        let significant = significant || residual_m < CLEAR_REL * amplitude_m;
        let aperiodic = alike && residual_m > APERIODIC_REL * amplitude_m;
        if aperiodic
            || self.sinusoid.decay_rate_per_s > self.sinusoid.omega_rad_per_s
            || (alike && !significant)
        {
            return Err(MotionError::NoOscillation {
                amplitude_m,
                residual_m,
            });
        }
        significant.then_some(()).ok_or(MotionError::NoMotion {
            amplitude_m,
            noise_m: residual_m,
        })
    }

    /// Σ w²(x − x̄)² about the weighted mean: what a motionless marker would leave.
    fn weighted_scatter(&self) -> f64 {
        let pairs = || {
            self.used
                .x_m
                .iter()
                .zip(&self.weight_per_m)
                .map(|(x, w)| (x, w * w))
        };
        let mean =
            pairs().map(|(x, w2)| x * w2).sum::<f64>() / pairs().map(|(_, w2)| w2).sum::<f64>();
        pairs().map(|(x, w2)| w2 * (x - mean).powi(2)).sum()
    }

    pub(super) fn is_long_and_dense_enough(&self) -> Result<(), MotionError> {
        let frequency_hz = self.sinusoid.omega_rad_per_s / TAU;
        dense_enough(self.used.interval_s(), frequency_hz)?;
        long_enough(self.used.span_s(), frequency_hz)
    }

    pub(super) fn weighted(&self, spread: &Spread) -> Weighted<'_> {
        Weighted {
            readings: self.used,
            weight_per_m: &self.weight_per_m,
            start: self.sinusoid,
            enlargement: spread.enlargement.near_omega,
            degrees_of_freedom: spread.enlargement.degrees_of_freedom,
        }
    }

    /// Covariance of (A, φ, γ, ω, c): rows and columns grow by the root of their own factor, which keeps it positive definite.
    pub(super) fn covariance(&self, enlargement: &Enlargement) -> [[f64; 5]; 5] {
        let near = enlargement.near_omega.sqrt();
        let growth = [near, near, near, near, enlargement.near_zero.sqrt()];
        let (s2, factor) = (
            self.solution.residual_variance(),
            &self.solution.covariance_factor,
        );
        std::array::from_fn(|i| {
            std::array::from_fn(|j| s2 * factor[(i, j)] * growth[i] * growth[j])
        })
    }
}
