//! From a record to the fitted motion.
//!
//! In: [`PositionRecord`]s. Out: a [`MotionFit`], or why there is none. The steps: the door, first guesses, the readings' majority, a plain
//! weighted fit of those that belong to it, the residual's spectrum, the interval of γ, the laws.

use super::guess::{Guess, guesses};
use super::laws::{self, LawTrial, Sinusoid, SinusoidProblem, Weighted};
use super::least_squares::{
    LeastSquaresError, Patience, Solution, minimise, refine, tangent_basis,
};
use super::noise::{self, Enlargement, ResidualDiagnosis, Residue};
use super::profile::Profile;
use super::readings::{MIN_POSITIONS, Readings, median};
use super::robust::majority;
use super::{MotionError, PositionRecord, PositionUse};
use crate::stats::coverage_factor;
use std::f64::consts::TAU;

/// Fewest cycles from which period, decay and centre can be told apart.
pub const MIN_CYCLES: f64 = 1.5;
/// Fewest readings a cycle: two leave the frequency and its mirror above half the rate alike.
const MIN_READINGS_PER_CYCLE: f64 = 2.2;
/// Readings a cycle to ask for where there were too few.
const READINGS_PER_CYCLE_WANTED: f64 = 5.0;
/// Starts tried by the scan for each reading, about: frequencies times decay rates.
const TRIALS_PER_READING: f64 = 10.0;
/// Chance that noise alone passes for a motion.
const FALSE_MOTION: f64 = 1e-3;
/// A leftover with neighbours correlated above this and above that part of the amplitude is a motion of another kind.
const APERIODIC_LAG1: f64 = 0.5;
/// See [`APERIODIC_LAG1`].
const APERIODIC_REL: f64 = 0.5;
/// Plain fits in which the weights follow the velocity; where times are certain one does.
const WEIGHT_ROUNDS: usize = 3;

/// The damped sinusoid x(t) = A e^(−γτ) cos(ωτ + φ) + c, τ = t − `t_ref_s`, fitted to a record.
#[derive(Clone, Debug, PartialEq)]
pub struct MotionFit {
    /// Time of the first used position, in s: A and φ hold there.
    pub t_ref_s: f64,
    /// Time of the last used position, in s.
    pub t_end_s: f64,
    /// A, in m, > 0.
    pub amplitude_m: f64,
    /// φ, in rad, in (−π, π].
    pub phase_rad: f64,
    /// γ, in s⁻¹ (may come out negative where there is no loss).
    pub decay_rate_per_s: f64,
    /// ω (damped), in rad/s.
    pub damped_angular_frequency_rad_per_s: f64,
    /// c, in m.
    pub centre_m: f64,
    /// Covariance of (A, φ, γ, ω, c) in that order, enlarged for residual autocorrelation.
    pub covariance: [[f64; 5]; 5],
    /// 95 % interval of γ, in s⁻¹, by profile likelihood with the same enlargement; the lower end may be negative.
    pub decay_rate_interval95_per_s: [f64; 2],
    /// Degrees of freedom to take Student's t with.
    pub degrees_of_freedom: f64,
    /// One entry a record, in order.
    pub uses: Vec<PositionUse>,
    /// Fitted position at each record's time, in m.
    pub fit_m: Vec<f64>,
    /// Observed minus fitted, in m, for every record.
    pub residual_m: Vec<f64>,
    /// What the residuals are like.
    pub residual: ResidualDiagnosis,
    /// Each law tried.
    pub laws: Vec<LawTrial>,
}

impl MotionFit {
    /// Fitted position at a time, in m.
    #[must_use]
    pub fn position_m(&self, t_s: f64) -> f64 {
        let tau = t_s - self.t_ref_s;
        self.centre_m
            + self.envelope_m(t_s)
                * (self.damped_angular_frequency_rad_per_s * tau + self.phase_rad).cos()
    }
    /// Fitted amplitude A e^(−γτ) at a time, in m.
    #[must_use]
    pub fn envelope_m(&self, t_s: f64) -> f64 {
        self.amplitude_m * (-self.decay_rate_per_s * (t_s - self.t_ref_s)).exp()
    }
    /// T = 2π/ω, in s.
    #[must_use]
    pub fn period_s(&self) -> f64 {
        TAU / self.damped_angular_frequency_rad_per_s
    }
    /// Time from the first used position to the last, in s.
    #[must_use]
    pub fn duration_s(&self) -> f64 {
        self.t_end_s - self.t_ref_s
    }
}

/// Fits the motion of a record.
///
/// * `records`: at least 8 positions, strictly increasing in time, over 1.5 cycles or more; gaps and wild values are fine.
///
/// Weights are 1/(u_x² + (v·u_t)²); only their ratios matter, the residuals give the scale. Positions that stand out of
/// the majority's scatter are marked [`PositionUse::Outlier`] and left out. The covariance is (JᵀJ)⁻¹ times the residual variance times the
/// residual's spectrum near ω (near 0 for c) over that of independent errors.
///
/// # Errors
/// [`MotionError`], one variant a cause, each saying what to do.
///
/// # Source
/// [Golub and Pereyra 1973](crate::sources::GolubPereyra73) for the guess, [Huber 1981](crate::sources::Huber81) for the outliers,
/// [Levenberg, Marquardt, Moré](crate::sources::LevenbergMarquardt) for the fit. Its scatter attains the bound of
/// [Yao and Pandit 1995](crate::sources::YaoPandit95).
pub fn fit(records: &[PositionRecord]) -> Result<MotionFit, MotionError> {
    let readings = Readings::new(records)?;
    let starts = guesses(&readings);
    let majority =
        majority(&readings, &starts).map_err(|error| why_not_fitted(&readings, &starts, error))?;
    let used = readings.only(&majority.belongs);
    if used.len() < MIN_POSITIONS {
        return Err(MotionError::TooFewPositions {
            n_positions: used.len(),
            n_needed: MIN_POSITIONS,
        });
    }
    let start = majority
        .sinusoid
        .counted_from(used.t_ref_s - readings.t_ref_s);
    let plain = Plain::new(&used, start)
        .map_err(|error| why_not_fitted(&readings, &starts, error.into()))?;
    let spread = plain.spread()?;
    plain.is_a_motion(&spread)?;
    plain.is_long_and_dense_enough()?;
    let laws = laws::trials(&plain.weighted(&spread))?;
    Ok(assemble(records, &majority.belongs, &plain, &spread, laws))
}

/// The plain weighted fit of the used readings.
struct Plain<'a> {
    used: &'a Readings,
    weight_per_m: Vec<f64>,
    sinusoid: Sinusoid,
    solution: Solution,
}

/// Size and colour of the scatter about the plain fit.
struct Spread {
    diagnosis: ResidualDiagnosis,
    enlargement: Enlargement,
}

impl<'a> Plain<'a> {
    fn new(used: &'a Readings, start: Sinusoid) -> Result<Self, LeastSquaresError> {
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

    fn spread(&self) -> Result<Spread, LeastSquaresError> {
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
    fn is_a_motion(&self, spread: &Spread) -> Result<(), MotionError> {
        let (amplitude_m, residual_m) = (self.sinusoid.amplitude_m, spread.diagnosis.rms_m);
        let alike = spread.diagnosis.autocorrelation_lag1 > APERIODIC_LAG1;
        let significant = stands_out(
            self.solution.sum_of_squares / self.weighted_scatter(),
            self.used.len(),
            spread.diagnosis.n_effective,
        );
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

    fn is_long_and_dense_enough(&self) -> Result<(), MotionError> {
        let frequency_hz = self.sinusoid.omega_rad_per_s / TAU;
        dense_enough(self.used.interval_s(), frequency_hz)?;
        long_enough(self.used.span_s(), frequency_hz)
    }

    fn weighted(&self, spread: &Spread) -> Weighted<'_> {
        Weighted {
            readings: self.used,
            weight_per_m: &self.weight_per_m,
            start: self.sinusoid,
            enlargement: spread.enlargement.near_omega,
            degrees_of_freedom: spread.enlargement.degrees_of_freedom,
        }
    }

    /// Covariance of (A, φ, γ, ω, c): rows and columns grow by the root of their own factor, which keeps it positive definite.
    fn covariance(&self, enlargement: &Enlargement) -> [[f64; 5]; 5] {
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

fn dense_enough(interval_s: f64, frequency_hz: f64) -> Result<(), MotionError> {
    let rate_hz = 1.0 / interval_s;
    if frequency_hz * MIN_READINGS_PER_CYCLE > rate_hz {
        return Err(MotionError::AboveNyquist {
            frequency_hz,
            rate_hz,
            rate_needed_hz: (READINGS_PER_CYCLE_WANTED * frequency_hz).ceil(),
        });
    }
    Ok(())
}

fn long_enough(span_s: f64, frequency_hz: f64) -> Result<(), MotionError> {
    let cycles = span_s * frequency_hz;
    if cycles < MIN_CYCLES {
        let period_s = 1.0 / frequency_hz;
        return Err(MotionError::TooShort {
            cycles,
            cycles_needed: MIN_CYCLES,
            period_s,
            duration_needed_s: MIN_CYCLES * period_s,
        });
    }
    Ok(())
}

/// Does the best of all starts leave less of the sum of squares than pure noise lets it once in 1/[`FALSE_MOTION`] records?
///
/// One start leaves a part of at most q in a record of n independent readings with probability q^((n − 3)/2), two of them spent on A and φ
/// and one on c; (n − 5)/2 also pays for the refinement of γ and ω.
fn stands_out(left: f64, n_readings: usize, n_effective: f64) -> bool {
    let trials = TRIALS_PER_READING * n_readings as f64;
    0.5 * (n_effective - 5.0).max(1.0) * -left.ln() > (trials / FALSE_MOTION).ln()
}

/// What to say where the fit itself failed: noise, too short a record and too low a rate are the usual causes, and the scan knows them.
fn why_not_fitted(readings: &Readings, starts: &[Guess], error: MotionError) -> MotionError {
    let n = readings.len() as f64;
    let Some(best) = starts.first() else {
        return MotionError::NoMotion {
            amplitude_m: 0.0,
            noise_m: 0.0,
        };
    };
    if !matches!(error, MotionError::NotFitted(_)) {
        return error;
    }
    if !stands_out(1.0 - best.explained, readings.len(), n) {
        let left: f64 = readings
            .tau_s
            .iter()
            .zip(&readings.x_m)
            .map(|(tau, x)| (x - best.sinusoid.position_m(*tau)).powi(2))
            .sum();
        return MotionError::NoMotion {
            amplitude_m: best.sinusoid.amplitude_m,
            noise_m: (left / n).sqrt(),
        };
    }
    let frequency_hz = best.sinusoid.omega_rad_per_s / TAU;
    long_enough(readings.span_s(), frequency_hz)
        .and_then(|()| dense_enough(readings.interval_s(), frequency_hz))
        .err()
        .unwrap_or(error)
}

fn assemble(
    records: &[PositionRecord],
    belongs: &[bool],
    plain: &Plain,
    spread: &Spread,
    laws: Vec<LawTrial>,
) -> MotionFit {
    let best = plain.sinusoid;
    let covariance = plain.covariance(&spread.enlargement);
    let profile = Profile {
        readings: plain.used,
        weight_per_m: &plain.weight_per_m,
        best,
        sum_of_squares: plain.solution.sum_of_squares,
        variance: plain.solution.residual_variance() * spread.enlargement.near_omega,
        slope: std::array::from_fn(|i| covariance[i][2] / covariance[2][2]),
        u_decay_rate_per_s: covariance[2][2].sqrt(),
    };
    let used = plain.used;
    let fit_m: Vec<f64> = records
        .iter()
        .map(|r| used.x_ref_m + best.position_m(r.t_s - used.t_ref_s))
        .collect();
    MotionFit {
        t_ref_s: used.t_ref_s,
        t_end_s: used.t_ref_s + used.span_s(),
        amplitude_m: best.amplitude_m,
        phase_rad: best.phase_rad,
        decay_rate_per_s: best.decay_rate_per_s,
        damped_angular_frequency_rad_per_s: best.omega_rad_per_s,
        centre_m: best.centre_m + used.x_ref_m,
        covariance,
        decay_rate_interval95_per_s: profile
            .interval(coverage_factor(0.95, spread.enlargement.degrees_of_freedom)),
        degrees_of_freedom: spread.enlargement.degrees_of_freedom,
        uses: belongs
            .iter()
            .map(|b| {
                if *b {
                    PositionUse::Used
                } else {
                    PositionUse::Outlier
                }
            })
            .collect(),
        residual_m: records.iter().zip(&fit_m).map(|(r, x)| r.x_m - x).collect(),
        fit_m,
        residual: spread.diagnosis.clone(),
        laws,
    }
}
