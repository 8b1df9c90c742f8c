//! From a record to the fitted motion.
//!
//! In: [`PositionRecord`]s. Out: a [`MotionFit`], or why there is none. The steps: the door, first guesses, the readings' majority, a plain
//! weighted fit of those that belong to it, the residual's spectrum, the interval of γ, the laws.

use super::guess::guesses;
use super::laws::{self, LawTrial};
use super::noise::ResidualDiagnosis;
use super::plain::{Plain, Spread};
use super::profile::Profile;
use super::readings::{MIN_POSITIONS, Readings};
use super::refusal::why_not_fitted;
use super::robust::majority;
use super::sinusoid::Sinusoid;
use super::{MotionError, PositionRecord, PositionUse};
use crate::stats::coverage_factor;
use std::f64::consts::TAU;

/// The damped sinusoid x(t) = A e^(−γτ) cos(ωτ + φ) + c, τ = t − `t_ref_s`, fitted to a record.
#[derive(Clone, Debug, PartialEq)]
pub struct MotionFit {
    /// Time of the first position of the record, used or not, in s: A and φ hold there.
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
    /// Time from the first position to the last used one, in s.
    #[must_use]
    pub fn duration_s(&self) -> f64 {
        self.t_end_s - self.t_ref_s
    }
}

/// Fits the motion of a record.
///
/// * `records`: at least 8 positions, strictly increasing in time, over 1.5 cycles or more; gaps and wild values are fine.
///
/// Weights are 1/(u_x² + (v·u_t)²); only their ratios matter, the residuals give the scale. Where the residuals are no noise but what the
/// law misses, their rms is added to every u_x. Positions that stand out of
/// the majority's scatter are marked [`PositionUse::Outlier`] and left out. The covariance is (JᵀJ)⁻¹ times the residual variance times the
/// residual's spectrum near ω (near 0 for c) over that of independent errors.
///
/// Intervals hold their 95 % for independent and for moderately correlated errors from three cycles on (tested by simulation). Not
/// promised: below three cycles, errors that stay alike over a good part of a cycle look like motion, and intervals come out too short.
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
    let mut used = readings.only(&majority.belongs);
    if used.len() < MIN_POSITIONS {
        return Err(MotionError::TooFewPositions {
            n_positions: used.len(),
            n_needed: MIN_POSITIONS,
        });
    }
    if let Some(miss_m) = what_the_law_misses(&used, majority.sinusoid) {
        used.widen(miss_m);
    }
    let plain = Plain::new(&used, majority.sinusoid)
        .map_err(|error| why_not_fitted(&readings, &starts, error.into()))?;
    let spread = plain.spread()?;
    plain.is_a_motion(&spread)?;
    plain.is_long_and_dense_enough()?;
    let laws = laws::trials(&plain.weighted(&spread));
    Ok(assemble(records, &majority.belongs, &plain, &spread, laws))
}

/// RMS of the residuals, m, where they are the law's miss; None where they are noise, or the fit does not settle.
///
/// The readings' own uncertainties then say nothing of how far they lie off, and weights by them would pull the motion towards the slow
/// parts of each swing, where a film sees best.
fn what_the_law_misses(used: &Readings, start: Sinusoid) -> Option<f64> {
    let spread = Plain::new(used, start).ok()?.spread().ok()?;
    let diagnosis = spread.diagnosis;
    diagnosis.is_structured().then_some(diagnosis.rms_m)
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
