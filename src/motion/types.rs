// Interface sketch: the room's author moves each type into the file it belongs to.
use super::PositionUse;
use crate::uncertainty::{BudgetRow, Quantity};

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
            + self.amplitude_m
                * (-self.decay_rate_per_s * tau).exp()
                * (self.damped_angular_frequency_rad_per_s * tau + self.phase_rad).cos()
    }
    /// Fitted amplitude A e^(−γτ) at a time, in m.
    #[must_use]
    pub fn envelope_m(&self, t_s: f64) -> f64 {
        self.amplitude_m * (-self.decay_rate_per_s * (t_s - self.t_ref_s)).exp()
    }
}

/// The residuals of the used positions.
#[derive(Clone, Debug, PartialEq)]
pub struct ResidualDiagnosis {
    /// Root mean square, in m.
    pub rms_m: f64,
    /// Lag-1 autocorrelation.
    pub autocorrelation_lag1: f64,
    /// Residual spectrum near ω over its mean: the factor by which the covariance was enlarged (≥ 1).
    pub variance_enlargement: f64,
    /// Number of positions used.
    pub n_used: usize,
    /// n_used / variance_enlargement.
    pub n_effective: f64,
    /// Wald–Wolfowitz runs test: standard score, and two-sided probability.
    pub runs_z: f64,
    /// Two-sided probability of so extreme a number of runs if the residuals were independent.
    pub runs_p: f64,
}

/// One law of loss, fitted to the record.
#[derive(Clone, Debug, PartialEq)]
pub struct LawTrial {
    /// Key: `none`, `viscous`, …
    pub law: &'static str,
    /// Name, value, standard uncertainty (None where held), UCUM unit.
    pub parameters: Vec<(&'static str, f64, Option<f64>, &'static str)>,
    /// Weighted residual rms, in m.
    pub rms_m: f64,
    /// AICc with the effective number of observations.
    pub aicc: f64,
    /// True where the nested test or AICc rules the law out.
    pub excluded: bool,
    /// Why, with the figures, in one sentence.
    pub reason: String,
}

/// Everything derived from the fit, each with its combined standard uncertainty (fit, clock, scale).
#[derive(Clone, Debug, PartialEq)]
pub struct MotionQuantities {
    /// T_d = 2π/ω, s.
    pub period: Quantity,
    /// ω, rad/s.
    pub damped_angular_frequency: Quantity,
    /// T_0 = 2π/√(ω² + γ²), s (viscous law).
    pub undamped_period: Quantity,
    /// γ, s⁻¹.
    pub decay_rate: Quantity,
    /// ζ = γ/√(ω² + γ²), 1.
    pub damping_ratio: Quantity,
    /// δ = γT, 1.
    pub log_decrement: Quantity,
    /// Q = 1/(2ζ), 1; no value where the interval of γ reaches 0, then a lower bound.
    pub quality_factor: Quantity,
    /// 1 − e^(−2δ), 1.
    pub energy_loss_per_cycle: Quantity,
    /// A at `t_ref_s`, m.
    pub amplitude: Quantity,
    /// ln 2/γ, s: time for the amplitude to halve; no value where the interval of γ reaches 0, then a lower bound.
    pub half_life: Quantity,
    /// c, m.
    pub centre: Quantity,
    /// The budget rows behind period, amplitude, decay_rate and the rest.
    pub budget: Vec<BudgetRow>,
}

/// Type B terms that do not come from the record itself.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ExternalTerms {
    /// Relative standard uncertainty of the clock's rate, 1.
    pub u_clock_rel: f64,
    /// True where the clock's limit is our default.
    pub clock_assumed: bool,
    /// Relative standard uncertainty of the scale, 1; None for a table of positions, whose scale is taken as it stands.
    pub u_scale_rel: Option<f64>,
    /// True where a part of the scale's uncertainty is our default.
    pub scale_assumed: bool,
}

/// One cycle of the motion, from one upward passage through the centre to the next.
#[derive(Clone, Debug, PartialEq)]
pub struct Cycle {
    /// 1, 2, …
    pub index: usize,
    /// Upward passage through the centre that starts the cycle, from the local readings, s.
    pub start_s: f64,
    /// Interval to the next upward passage, s, and its standard uncertainty.
    pub period_crossings_s: f64,
    /// Standard uncertainty of `period_crossings_s`, s.
    pub u_period_crossings_s: f64,
    /// Period of a sinusoid fitted to the readings of this cycle alone, s; None where there are too few.
    pub period_local_s: Option<f64>,
    /// Standard uncertainty of `period_local_s`, s.
    pub u_period_local_s: Option<f64>,
    /// Amplitude of this cycle at its middle, m, from a sinusoid of the common ω fitted to its readings alone.
    pub amplitude_m: Option<f64>,
    /// Standard uncertainty of `amplitude_m`, m.
    pub u_amplitude_m: Option<f64>,
    /// (amplitude/amplitude of the previous cycle)²; None for the first cycle.
    pub energy_ratio: Option<f64>,
    /// Standard uncertainty of `energy_ratio`, 1.
    pub u_energy_ratio: Option<f64>,
}
